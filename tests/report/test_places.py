"""Places in words: where a note, a run of notes, or several notes stand."""

import pytest

from melodycoach.report.places import bars_words, place_words, scattered_words, stretch_words


def notes(*bars: str) -> list[dict[str, object]]:
    return [{"bar": bar, "beat": 1.0, "at": ""} for bar in bars]


@pytest.mark.parametrize(
    ("bar", "beat", "at", "says"),
    [
        ("3", 2.0, "line 4, column 7", "bar 3, beat 2"),
        ("3", 2.5, "", "bar 3, beat 2.5"),
        ("X1", 0.0, "0:12.4", "bar X1"),
        ("", 0.0, "0:12.4", "note 9, 0:12.4"),
        ("", 0.0, "", "note 9"),
    ],
)
def test_a_place_is_bar_and_beat_or_else_the_note_and_where_to_look(
    bar: str, beat: float, at: str, says: str
) -> None:
    assert place_words({"bar": bar, "beat": beat, "at": at}, 9) == says


def test_notes_in_a_row_are_named_by_their_bars() -> None:
    line = notes("1", "1", "2", "3")
    assert stretch_words(line, 1, 2) == "bar 1"
    assert stretch_words(line, 2, 4) == "bars 1–3"


def test_notes_in_a_row_are_named_by_number_where_one_end_has_no_bar() -> None:
    assert stretch_words(notes("1", "1", ""), 2, 3) == "notes 2 to 3"
    assert stretch_words(notes("", "1"), 1, 1) == "note 1"


def test_scattered_notes_are_named_by_the_bars_they_lie_in_each_once() -> None:
    line = notes("0", "1", "1", "2", "3", "12a", "13")
    assert scattered_words(line, [7, 2, 3]) == "bars 1, 13"
    assert scattered_words(line, [1, 2, 4, 6]) == "bars 0–2, 12a"
    assert scattered_words(line, [3]) == "bar 1"
    assert scattered_words(line, []) == ""


def test_a_bar_that_is_printed_twice_counts_as_one_place() -> None:
    # a first and a second ending may both be printed as bar 8
    assert scattered_words(notes("7", "8", "8", "9"), [2, 3]) == "bar 8"


def test_bars_in_a_row_are_named_by_the_first_and_the_last() -> None:
    assert bars_words(["4"]) == "bar 4"
    assert bars_words(["4", "5", "5a"]) == "bars 4–5a"
