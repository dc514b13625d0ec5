"""What is said of two answers for one file: what is new, and nothing else."""

from __future__ import annotations

from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from melodycoach.core.check import check_sheet
from melodycoach.core.event import PitchReading
from melodycoach.core.model import build_model
from melodycoach.report.check_change import (
    LISTED,
    NOTES_ONLY,
    NOTHING,
    READABLE_AGAIN,
    _moved,
    what_changed,
)
from melodycoach.report.check_data import answer_json
from melodycoach.sources.pack_file import load_pack
from melodycoach.sources.sheet_file import read_note_sheet

PACK = load_pack("makam")
MODEL = build_model(PACK, PACK.restrict(("huseyni", "hicaz", "rast", "ussak")), PitchReading.WRITTEN)
LINE = "A4 E5 D5 E5:2 , | D5 C5 B4-1 A4:2 , | E5 F#5 G5 F#5 E5:2 , | D5 E5 D5 C5 B4-1 A4:2 ."
HICAZ = " D5 C#5 Bb4+1 A4 Bb4+1 C#5 D5 E5 D5 C#5 Bb4+1 A4:2 . D5 C#5 Bb4+1 A4 Bb4+1 C#5 D5 C#5 Bb4+1 A4:2 ."
HICAZ_AT = "bar 4, beat 8"  # where the second half of the spliced line begins
FAILED = {"file": "a.txt", "error": "a.txt: 2 places", "faults": ["a.txt:1:1: one", "a.txt:2:1: two"]}


def answer(text: str, target: str = "", stay_in: str = "") -> dict[str, Any]:
    aim = PACK.find(stay_in or target) if stay_in or target else None
    checked = check_sheet(MODEL, read_note_sheet(text, PACK.names), aim)
    return answer_json(checked, "a.txt", aim if stay_in else None)


def test_the_same_text_gives_no_change() -> None:
    assert what_changed(answer(LINE), answer(LINE)) == [NOTHING]
    assert what_changed(answer(LINE), answer(f"\n\n  {LINE}")) == [NOTHING]  # places in the text moved


def test_an_edit_that_changes_no_answer_is_said_to_be_that() -> None:
    after = answer(LINE)
    after["notes"][5]["length_s"] += 0.5
    assert what_changed(answer(LINE), after) == [NOTES_ONLY]


def test_a_text_that_can_no_longer_be_read_says_every_fault() -> None:
    assert what_changed(answer(LINE), FAILED) == ["a.txt: 2 places", "a.txt:1:1: one", "a.txt:2:1: two"]
    assert what_changed(FAILED, answer(LINE)) == [READABLE_AGAIN]


def test_a_note_that_leaves_the_mode_is_said_with_its_place_and_again_when_it_is_mended() -> None:
    wrong = LINE.replace("C5 B4-1 A4:2 , | E5", "C5 Bb4+1 A4:2 , | E5")
    there = what_changed(answer(LINE, "huseyni"), answer(wrong, "huseyni"))
    wrong_note = "off the mode: note 7, bar 2, beat 3, dik kürdî: not in Hüseynî, 3 commas below segâh"
    assert f"{wrong_note}; segâh (B4-1) mends it" in there
    back = what_changed(answer(wrong, "huseyni"), answer(LINE, "huseyni"))
    assert "off no more: note 7, bar 2, beat 3, dik kürdî" in back
    assert "no note is off the mode now" in back


def test_notes_put_in_before_an_off_note_do_not_make_it_a_new_one() -> None:
    wrong = LINE.replace("C5 B4-1 A4:2 , | E5", "C5 Bb4+1 A4:2 , | E5")
    said = what_changed(answer(wrong, stay_in="huseyni"), answer(f"A4 E5 | {wrong}", stay_in="huseyni"))
    assert said[0] == "21 notes, 2 more than before"
    assert not any("off the mode" in one or "leaves" in one for one in said)


def test_the_question_of_staying_is_answered_anew() -> None:
    wrong = LINE.replace("C5 B4-1 A4:2 , | E5", "C5 Bb4+1 A4:2 , | E5")
    worse = wrong.replace("A4 E5 D5 E5:2", "A4 E5 Eb5+1 E5:2")
    said = what_changed(answer(LINE, stay_in="huseyni"), answer(wrong, stay_in="huseyni"))
    assert (
        "it no longer stays in Hüseynî: note 7, bar 2, beat 3: "
        "dik kürdî is not in Hüseynî, 3 commas below segâh; segâh would mend it"
    ) in said
    moved = what_changed(answer(wrong, stay_in="huseyni"), answer(worse, stay_in="huseyni"))
    assert any(
        one.startswith("it first leaves Hüseynî elsewhere now: note 3, bar 1, beat 3") for one in moved
    )
    assert "it stays in Hüseynî now" in what_changed(
        answer(wrong, stay_in="huseyni"), answer(LINE, stay_in="huseyni")
    )


def test_a_change_of_mode_that_appears_and_goes_is_said() -> None:
    turned = LINE + HICAZ
    said = what_changed(answer(LINE), answer(turned))
    assert any(one.startswith("new: the change from Hüseynî to Hicaz at note 2") for one in said)
    assert "the verdict is now: Hüseynî, then Hicaz; it was: leaning to Hüseynî, over 99 %" in said
    back = what_changed(answer(turned), answer(LINE))
    assert any(one.startswith("no longer there: the change from Hüseynî to Hicaz at note 2") for one in back)


def test_a_change_of_mode_that_only_shifts_with_the_notes_before_it_is_no_news() -> None:
    said = what_changed(answer(LINE + HICAZ), answer(f"A4 E5 D5 E5:2 , | {LINE}{HICAZ}"))
    assert not any("the change from" in one for one in said)


def test_a_change_of_mode_at_another_note_has_moved() -> None:
    after = answer(LINE + HICAZ)
    [change] = after["changes"]
    change["note"] += 3
    said = what_changed(answer(LINE + HICAZ), after)
    assert len(said) == 1
    assert said[0].startswith(f"the change from Hüseynî to Hicaz is now at note {change['note']}, ")


def test_of_two_changes_between_the_same_modes_each_is_held_against_the_nearest() -> None:
    before = answer(LINE + HICAZ)
    first = before["changes"][0]
    second = {**first, "note": first["note"] + 12}
    before["changes"] = [first, second]
    assert what_changed(before, {**before, "changes": [second]}) == [
        "the verdict is now: Hüseynî, then Hicaz; it was: Hüseynî, then Hicaz, then Hicaz",
        f"no longer there: the change from Hüseynî to Hicaz at note {first['note']}, {HICAZ_AT}",
    ]


def test_a_step_that_is_newly_heard_or_owed_again_is_said() -> None:
    without = LINE.replace("C5 B4-1 A4:2", "D5 C5 D5:2")  # it never comes to rest on its final
    said = what_changed(answer(without, "huseyni"), answer(LINE, "huseyni"))
    heard = [one for one in said if one.startswith("heard now, of Hüseynî: ")]
    assert len(heard) == 1
    again = what_changed(answer(LINE, "huseyni"), answer(without, "huseyni"))
    assert heard[0].replace("heard now", "owed again") in again


def test_a_line_that_sounds_like_another_mode_has_no_place_where_it_leaves_its_own() -> None:
    before, after = answer(LINE, stay_in="huseyni"), answer(LINE, stay_in="huseyni")
    first = {"note": 1, "place": after["notes"][0] | {}, "says": "it sounds like Rast"}
    after["stay_in"] |= {"stays": False, "first": first}
    assert what_changed(before, after) == ["it no longer stays in Hüseynî: it sounds like Rast"]


def test_a_step_that_is_only_welcome_is_not_called_owed() -> None:
    before, after = answer(LINE), answer(LINE + HICAZ)
    welcome = [
        step for part in after["stretches"] for step in part["steps"]["owed"] if step["need"] == "colour"
    ]
    assert welcome
    said = what_changed(before, after)
    assert not [one for one in said for step in welcome if "owed" in one and step["says"] in one]


def test_the_steps_of_a_mode_that_the_line_turns_to_are_said() -> None:
    said = what_changed(answer(LINE), answer(LINE + HICAZ))
    assert any(one.startswith("owed now, of Hicaz: ") for one in said)


def test_another_target_is_said() -> None:
    said = what_changed(answer(LINE, "huseyni"), answer(LINE, "ussak"))
    assert "notes are held against Uşşak now, before against Hüseynî" in said


def test_a_likelihood_that_moves_far_is_said_in_points() -> None:
    before, after = answer(LINE), answer(LINE)
    before["whole"]["probability"], after["whole"]["probability"] = 0.81, 0.702
    assert what_changed(before, after) == ["Hüseynî is less likely now: 70 %, before 81 %"]
    assert what_changed(after, before) == ["Hüseynî is likelier now: 81 %, before 70 %"]


def test_what_the_reader_says_anew_is_said() -> None:
    before, after = answer(LINE), answer(LINE)
    after["lost"] = ["track 1, byte 90: cut short"]
    after["read"] = ["took track 2"]
    assert what_changed(before, after) == ["track 1, byte 90: cut short", "took track 2"]


def test_many_sentences_of_one_sort_are_counted() -> None:
    said = what_changed(answer(LINE, "huseyni"), answer(LINE + HICAZ, "huseyni"))
    off = [one for one in said if one.startswith("off the mode: ")]
    assert len(off) == LISTED
    assert said[said.index(off[-1]) + 1].startswith("and ")


def note(height: int) -> dict[str, float]:
    return {"pitch_cents": 100.0 * height, "length_s": 1.0}


HEIGHTS = st.lists(st.integers(0, 3), max_size=12)


@settings(max_examples=60)
@given(HEIGHTS, HEIGHTS, HEIGHTS, HEIGHTS)
def test_notes_around_an_edit_are_known_again(
    start: list[int], old: list[int], new: list[int], end: list[int]
) -> None:
    before, after = [note(h) for h in (*start, *old, *end)], [note(h) for h in (*start, *new, *end)]
    moved = _moved(before, after)
    assert all(before[then - 1] == after[now - 1] for then, now in moved.items())
    assert list(moved.values()) == [moved[then] for then in moved]
    assert sorted(moved) == sorted(set(moved))
    by_then = [moved[then] for then in sorted(moved)]
    assert by_then == sorted(set(by_then))  # in order, and no note twice
    assert len(moved) >= len(start) + len(end)


def test_a_text_that_is_all_new_is_not_compared_note_by_note(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("melodycoach.report.check_change._LARGEST_MATCH", 5)
    assert _moved([note(1), note(2), note(3)], [note(2), note(3), note(4)]) == {}


def test_a_change_is_named_as_surely_as_it_is_heard() -> None:
    line = answer(LINE)
    sure = {"from": "Rast", "to": "Hicaz", "note": 9, "place": {"bar": "3", "beat": 1.0, "at": ""}}
    sure |= {"decided": True, "family": ""}
    for more, says in (
        ({}, "new: the change from Rast to Hicaz at note 9, bar 3, beat 1"),
        (
            {"decided": False, "family": "hicaz family"},
            "new: the change from Rast to the hicaz family at note 9, bar 3, beat 1",
        ),
        ({"decided": False}, "new: a possible change from Rast to Hicaz at note 9, bar 3, beat 1"),
    ):
        assert says in what_changed(line, line | {"changes": [*line["changes"], sure | more]})
