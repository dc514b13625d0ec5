"""The desk: entry, questions and help together, without a terminal."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import pytest

from melodycoach.screen import entry_edit
from melodycoach.screen import question as asking
from melodycoach.screen.command import Command, Fresh, Redo, ReplaceText, Save, SetPort, SetTarget, Undo
from melodycoach.screen.desk import Desk
from melodycoach.screen.question import QuestionKind
from melodycoach.screen.text import plain_text
from melodycoach.screen.view import Refusal

if TYPE_CHECKING:
    from collections.abc import Mapping

    from melodycoach.screen.view import ViewState


class Session:
    """The other end: keeps the commands, shows the view that a test gives it."""

    def __init__(self, view: ViewState) -> None:
        self.view = view
        self.commands: list[Command] = []
        self.proposed: tuple[str, ...] = ()
        self.desk = Desk(lambda: self.view, self.commands.append, self.choices)

    def choices(self, kind: QuestionKind) -> tuple[str, ...]:
        return self.proposed if kind is QuestionKind.SAVE else ("Hicaz", "Rast")

    def show(self, **changes: object) -> None:
        self.view = replace(self.view, **changes)  # type: ignore[arg-type]
        self.desk.take_view()

    def text(self, columns: int = 80, rows: int = 24) -> str:
        return "\n".join(plain_text(line) for line in self.desk.drawn(columns, rows).lines)


@pytest.fixture
def session(views: Mapping[str, ViewState]) -> Session:
    return Session(replace(views["decided"], tokens=("A4", "B4-1")))


def test_finished_words_are_sent_and_their_answer_lets_the_next_ones_go(session: Session) -> None:
    for character in "C5 D5 E5":
        session.desk.type_text(character)
    assert session.commands == [ReplaceText(2, 2, "C5", 1)]
    session.show(tokens=("A4", "B4-1", "C5"), handled=1)
    assert session.commands[1:] == [ReplaceText(3, 3, "D5", 2)]
    session.show(tokens=("A4", "B4-1", "C5", "D5"), handled=2)
    assert session.desk.entry.text == "A4 B4-1 C5 D5 E5"


def test_undo_takes_back_what_is_typed_before_it_touches_the_line(session: Session) -> None:
    session.desk.type_text("C5")
    session.desk.undo()
    assert (session.desk.entry.text, session.commands) == ("A4 B4-1 ", [])
    session.desk.redo()
    assert (session.desk.entry.text, session.commands) == ("A4 B4-1 C5", [])
    session.desk.undo()
    session.desk.undo()
    assert session.commands == [Undo(1)]
    session.show(tokens=("A4",), handled=1)
    session.desk.redo()
    assert session.commands == [Undo(1), Redo(2)]
    session.show(tokens=("A4", "B4-1"), handled=2)
    session.desk.redo()
    assert session.desk.entry.text == "A4 B4-1 C5"


def test_a_fresh_start_is_asked_for_once(session: Session) -> None:
    session.desk.fresh()
    assert session.commands == [Fresh(1)]


def test_an_answer_is_sent_once_and_the_question_closes_when_it_is_carried_out(session: Session) -> None:
    desk = session.desk
    desk.answer()
    desk.change_question(asking.cleared)
    assert session.commands == []
    desk.ask(QuestionKind.TARGET)
    assert (desk.asking, desk.editing) == (True, False)
    desk.change_question(lambda question: asking.typed(question, "hic"))
    desk.answer()
    desk.answer()
    assert session.commands == [SetTarget("Hicaz", 1)]
    session.show(handled=1, refusals=(Refusal(1, "no mode 'hic'"),))
    assert "no mode 'hic'" in session.text()
    desk.answer()
    session.show(handled=2)
    assert desk.editing


def test_an_answer_of_nothing_closes_the_question_without_a_command(session: Session) -> None:
    session.desk.ask(QuestionKind.FINAL)
    session.desk.answer()
    assert (session.desk.editing, session.commands) == (True, [])
    session.desk.ask(QuestionKind.FINAL)
    session.desk.drop_question()
    assert session.desk.editing


@pytest.mark.parametrize("kind", [QuestionKind.SAVE, QuestionKind.OPEN])
def test_a_path_that_is_missing_is_asked_for(session: Session, kind: QuestionKind) -> None:
    session.desk.ask(kind)
    session.desk.answer()
    assert (session.desk.asking, session.commands) == (True, [])
    assert "nothing typed, expected" in session.text()
    session.desk.drop_question()
    assert session.desk.editing


def test_the_line_is_saved_where_it_is_proposed_with_one_key(session: Session) -> None:
    session.proposed = ("drafts/sketch.txt",)
    session.desk.ask(QuestionKind.SAVE)
    assert "save as which file? drafts/sketch.txt" in session.text()
    session.desk.answer()
    assert session.commands == [Save("drafts/sketch.txt", 1)]


def with_inputs(session: Session, several: bool) -> None:
    session.show(status=replace(session.view.status, asks_input=several))


def test_which_of_several_inputs_is_asked_once_and_the_answer_is_sent(session: Session) -> None:
    with_inputs(session, several=True)
    assert "listen to which input?" in session.text()
    assert "Hicaz" in session.text()  # what is on offer here
    with_inputs(session, several=True)
    session.desk.change_question(lambda question: asking.typed(question, "ra"))
    session.desk.answer()
    assert session.commands == [SetPort("Rast", 1)]
    session.show(handled=1)
    assert session.desk.editing
    with_inputs(session, several=True)
    assert session.desk.editing


def test_a_player_who_escapes_from_the_question_of_inputs_is_not_asked_again(session: Session) -> None:
    with_inputs(session, several=True)
    session.desk.drop_question()
    with_inputs(session, several=True)
    with_inputs(session, several=False)
    with_inputs(session, several=True)
    assert session.desk.editing


def test_the_question_of_inputs_waits_for_a_word_the_help_and_another_question(session: Session) -> None:
    desk = session.desk
    desk.open_help()
    with_inputs(session, several=True)
    assert desk.question is None
    desk.close_help()
    desk.ask(QuestionKind.TARGET)
    desk.take_view()
    assert desk.question is not None
    assert desk.question.kind is QuestionKind.TARGET
    desk.drop_question()
    desk.type_text("C")
    desk.take_view()
    assert desk.question is None
    desk.undo()
    desk.take_view()
    assert desk.asking


def test_the_question_of_inputs_goes_when_only_one_is_left_unless_an_answer_was_begun(
    session: Session,
) -> None:
    with_inputs(session, several=True)
    with_inputs(session, several=False)
    assert session.desk.editing
    with_inputs(session, several=True)
    assert session.desk.asking
    session.desk.change_question(lambda question: asking.typed(question, "r"))
    with_inputs(session, several=False)
    assert session.desk.asking


def test_the_help_covers_the_screen_and_scrolls_to_its_end_and_no_further(session: Session) -> None:
    desk = session.desk
    desk.open_help()
    assert session.text(60, 15).startswith("Keys")
    assert (desk.helping, desk.asking, desk.editing) == (True, False, False)
    desk.scroll_help(999)
    assert "teacher." in session.text(60, 15)
    assert "~/.local/share/melodycoach/sessions/" in session.text(60, 15)
    end = session.text(60, 15)
    desk.scroll_help(5)
    assert session.text(60, 15) == end
    desk.scroll_help(-999)
    assert session.text(60, 15).startswith("Keys")
    desk.close_help()
    assert desk.editing


def test_the_cursor_moves_between_the_rows_of_the_entry(session: Session) -> None:
    session.show(tokens=("A4",) * 20)
    session.text(42, 24)
    session.desk.move_row(-1)
    cursor = session.desk.entry.cursor
    assert 0 < cursor < len(session.desk.entry.text) - 30
    session.desk.move_row(1)
    assert session.desk.entry.cursor == len(session.desk.entry.text)


def test_leaving_a_changed_word_by_the_arrows_sends_it(session: Session) -> None:
    session.desk.change_entry(lambda entry: entry_edit.moved_to(entry, 2))
    session.desk.change_entry(lambda entry: entry_edit.inserted(entry, ":2"))
    session.text()
    assert session.commands == []
    session.desk.move_row(1)
    assert session.commands == [ReplaceText(0, 1, "A4:2", 1)]
