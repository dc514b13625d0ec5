"""Questions: typing an answer, choosing among names, refusals."""

from __future__ import annotations

from dataclasses import replace

import pytest

from melodycoach.screen import question as asking
from melodycoach.screen.command import Command, Open, Save, SetFinal, SetOnly, SetPort, SetTarget
from melodycoach.screen.question import Question, QuestionKind
from melodycoach.screen.view import Refusal

MODES = ("Beyâtî", "Hicaz", "Hüseynî", "Hüzzam", "Muhayyer", "Uşşak")


def about(kind: QuestionKind, text: str = "", choices: tuple[str, ...] = MODES) -> Question:
    """Ask and type; where to save nothing is proposed."""
    return asking.typed(asking.ask(kind, () if kind is QuestionKind.SAVE else choices), text)


def test_names_are_found_in_any_spelling_and_those_that_begin_so_come_first() -> None:
    assert asking.offered(about(QuestionKind.TARGET, "HÜ")) == ("Hüseynî", "Hüzzam")
    assert asking.offered(about(QuestionKind.TARGET, "usak")) == ()
    assert asking.offered(about(QuestionKind.TARGET, "şş")) == ("Uşşak",)
    assert asking.offered(about(QuestionKind.TARGET, "ay")) == ("Muhayyer",)


def test_paths_are_offered_letter_by_letter() -> None:
    paths = ("a line.txt", "B line.txt")
    assert asking.offered(about(QuestionKind.OPEN, "b", paths)) == ()
    assert asking.offered(about(QuestionKind.OPEN, "B", paths)) == ("B line.txt",)


def test_of_a_list_the_last_name_is_completed() -> None:
    question = about(QuestionKind.ONLY, "Hicaz, muh")
    assert asking.completed(question).text == "Hicaz, Muhayyer"


def test_tab_completes_a_single_name_and_else_picks_one() -> None:
    assert asking.completed(about(QuestionKind.TARGET, "huz")).text == "Hüzzam"
    picked = asking.completed(about(QuestionKind.TARGET, "hu"))
    assert (picked.text, picked.picked) == ("hu", 0)
    assert asking.completed(asking.picked_next(picked, 1)).text == "Hüzzam"
    assert asking.completed(about(QuestionKind.TARGET, "qq")).text == "qq"


def test_picking_goes_round_both_ways() -> None:
    question = about(QuestionKind.TARGET, "hu")
    assert asking.picked_next(question, -1).picked == 1
    assert asking.picked_next(asking.picked_next(asking.picked_next(question, 1), 1), 1).picked == 0
    assert asking.picked_next(about(QuestionKind.TARGET, "qq"), 1).picked is None


@pytest.mark.parametrize(
    ("kind", "text", "command"),
    [
        (QuestionKind.TARGET, " hicaz ", SetTarget("hicaz", 3)),
        (QuestionKind.TARGET, "", SetTarget(None, 3)),
        (QuestionKind.FINAL, "any", SetFinal("any", 3)),
        (QuestionKind.FINAL, "", None),
        (QuestionKind.ONLY, "hicaz, rast", SetOnly("hicaz, rast", 3)),
        (QuestionKind.ONLY, "", SetOnly("", 3)),
        (QuestionKind.PORT, "usb", SetPort("usb", 3)),
        (QuestionKind.PORT, "", None),
        (QuestionKind.SAVE, "~/line.txt", Save("~/line.txt", 3)),
        (QuestionKind.SAVE, "", None),
        (QuestionKind.OPEN, "line.txt", Open("line.txt", 3)),
        (QuestionKind.OPEN, "", None),
    ],
)
def test_an_answer_becomes_a_command(kind: QuestionKind, text: str, command: Command | None) -> None:
    assert asking.answer(about(kind, text), 3) == command


def test_where_to_save_is_proposed_and_a_path_that_was_emptied_is_asked_for() -> None:
    question = asking.ask(QuestionKind.SAVE, ("drafts/sketch.txt",))
    assert (question.text, question.cursor, asking.offered(question)) == ("drafts/sketch.txt", 17, ())
    assert asking.answer(question, 3) == Save("drafts/sketch.txt", 3)
    assert asking.answer(asking.typed(asking.cleared(question), "b.txt"), 4) == Save("b.txt", 4)
    emptied = asking.unanswered(asking.cleared(question))
    assert emptied is not None
    assert (
        emptied.complaint
        == "nothing typed, expected a path such as line.txt; Esc goes back and saves nothing"
    )
    assert asking.typed(emptied, "c").complaint == ""


def test_a_picked_name_is_the_answer() -> None:
    question = asking.picked_next(about(QuestionKind.TARGET, "hu"), 1)
    assert asking.answer(question, 1) == SetTarget("Hüseynî", 1)


def test_a_question_waits_for_its_answer_to_be_carried_out() -> None:
    waiting = replace(about(QuestionKind.TARGET, "hicaz"), awaited=4)
    assert asking.answer_arrived(waiting, 3, ()) == waiting
    assert asking.answer_arrived(waiting, 4, ()) is None
    refused = asking.answer_arrived(waiting, 5, (Refusal(2, "other"), Refusal(4, "no mode 'hicaz'")))
    assert refused is not None
    assert (refused.text, refused.complaint, refused.awaited) == ("hicaz", "no mode 'hicaz'", 0)
    assert asking.typed(refused, "x").complaint == ""
    for unchanged in (asking.typed(waiting, "x"), asking.picked_next(waiting, 1), asking.completed(waiting)):
        assert unchanged == waiting


def test_the_answer_is_edited_like_a_line() -> None:
    question = about(QuestionKind.SAVE, "ab")
    assert asking.erased_before(question).text == "a"
    assert asking.erased_before(asking.moved_to_start(question)).text == "ab"
    assert asking.erased_after(asking.moved_to_start(question)).text == "b"
    assert asking.erased_after(question).text == "ab"
    assert asking.typed(asking.moved(question, -1), "x\n").text == "axb"
    assert asking.moved(question, 99).cursor == 2
    assert asking.moved_to_end(asking.moved_to_start(question)).cursor == 2
    assert asking.cleared(question).text == ""


def test_every_question_has_its_words() -> None:
    for kind in QuestionKind:
        assert about(kind).label.endswith("?")
        assert about(kind).advice


def test_a_part_of_a_name_stands_for_the_only_choice_that_it_fits() -> None:
    names = ("Beyâtî", "Uşşak", "Hüseynî", "Hüseynîaşîran")
    assert asking.answer(asking.typed(asking.ask(QuestionKind.TARGET, names), "uss"), 1) == SetTarget(
        "Uşşak", 1
    )
    assert asking.answer(asking.typed(asking.ask(QuestionKind.TARGET, names), "huseyni"), 2) == SetTarget(
        "huseyni", 2
    )
    assert asking.answer(asking.typed(asking.ask(QuestionKind.ONLY, names), "bey, uss"), 3) == SetOnly(
        "bey, Uşşak", 3
    )
