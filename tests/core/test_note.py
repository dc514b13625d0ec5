"""Lines, and how the scorer hears them."""

from dataclasses import FrozenInstanceError

import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.core.note import (
    RESTING_GAP_S,
    RESTING_LENGTH_S,
    TYPED_BEAT_S,
    Heard,
    InputKind,
    Item,
    Mark,
    Note,
    Silence,
    hear,
)


def typed(beats: float = 1.0, cents: float = 6900.0) -> Note:
    return Note(cents, 0.0, beats, beats=beats)


def played(onset_s: float, duration_s: float, cents: float = 6900.0) -> Note:
    return Note(cents, onset_s, duration_s, InputKind.KEYS)


def rests(*items: Item) -> list[bool]:
    return [heard.rests for heard in hear(items)]


def closes(*items: Item) -> list[bool]:
    return [heard.closes for heard in hear(items)]


def test_a_line_without_notes_is_not_heard():
    assert hear(()) == ()
    assert hear((Mark.PHRASE_END, Silence(1.0), Mark.BAR)) == ()


def test_a_typed_note_counts_its_beats_whatever_its_seconds():
    # 1 beat = 0.35 s = TYPED_BEAT_S, though it lasts 3 s on the clock
    assert hear((Note(6900.0, 0.0, 3.0, beats=1.0),)) == (
        Heard(6900.0, InputKind.TYPED, TYPED_BEAT_S, rests=False, closes=False),
    )


def test_a_played_note_counts_its_seconds():
    assert hear((played(0.0, 0.3),)) == (Heard(6900.0, InputKind.KEYS, 0.3, rests=False, closes=False),)


@pytest.mark.parametrize(
    ("note", "long"),
    [
        (played(0.0, RESTING_LENGTH_S), True),
        (played(0.0, RESTING_LENGTH_S - 0.01), False),
        (typed(1.0), False),  # 0.35 s
        (typed(1.5), True),  # 0.525 s
        (typed(0.5), False),
    ],
)
def test_a_long_note_rests(note: Note, long: bool):
    assert rests(note, typed()) == [long, False]


@pytest.mark.parametrize("after", [Mark.BREATH, Mark.PHRASE_END, Silence(0.1, 1.0)])
def test_a_breath_a_phrase_end_and_a_silence_make_the_note_before_them_rest(after: Item):
    assert rests(typed(), after, typed()) == [True, False]
    assert rests(typed(), after) == [True]


def test_a_bar_line_changes_nothing():
    assert hear((typed(), Mark.BAR, typed(), Mark.BAR)) == hear((typed(), typed()))


def test_only_a_phrase_end_closes():
    assert closes(typed(), Mark.BREATH, typed(), Mark.PHRASE_END, typed(4.0)) == [False, True, False]


def test_marks_before_the_first_note_belong_to_none():
    assert closes(Mark.PHRASE_END, typed()) == [False]
    assert rests(Mark.BREATH, typed()) == [False]


@pytest.mark.parametrize(("gap_s", "rested"), [(RESTING_GAP_S, True), (RESTING_GAP_S - 0.01, False)])
def test_nothing_played_for_a_while_makes_the_note_before_rest(gap_s: float, rested: bool):
    assert rests(played(0.0, 0.25), played(0.25 + gap_s, 0.25)) == [rested, False]


@given(
    st.lists(st.sampled_from([typed(), typed(2.0), Silence(0.5, 1.0), *Mark]), max_size=12),
    st.integers(0, 12),
)
def test_what_follows_changes_only_the_last_note_heard_before(items: list[Item], cut: int):
    earlier, whole = hear(items[:cut]), hear(items)
    assert whole[: max(0, len(earlier) - 1)] == earlier[:-1]
    assert len(whole) == sum(isinstance(item, Note) for item in items)


def test_items_cannot_be_changed():
    with pytest.raises(FrozenInstanceError):
        typed().beats = 2.0  # type: ignore[misc]


def evenly(lengths_s: list[float]) -> list[Note]:
    notes, onset_s = [], 0.0
    for length_s in lengths_s:
        notes.append(Note(6900.0, onset_s, length_s, InputKind.TUNED))
        onset_s += length_s
    return notes


def test_the_notes_of_a_slow_exercise_do_not_all_rest_but_a_longer_one_does() -> None:
    heard = hear(evenly([1.0, 1.0, 1.1, 0.9, 1.0, 1.6, 1.0]))
    assert [one.rests for one in heard] == [True, False, False, False, False, True, False]


def test_staccato_at_an_even_pace_does_not_rest() -> None:
    line = [Note(6900.0, 0.8 * number, 0.3, InputKind.KEYS) for number in range(6)]
    assert [one.rests for one in hear(line)] == [True, False, False, False, False, False]


def test_notes_heard_already_set_the_pace_and_are_not_given_again() -> None:
    line = evenly([1.0] * 12)
    assert hear(line)[-2:] == hear(line[-10:], n_known=8)
