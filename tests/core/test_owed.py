"""The tracker: which characteristic steps a line has heard."""

from types import MappingProxyType

import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from melodycoach.core.mode import CharacteristicStep, Course, Mode, Need, StepKind
from melodycoach.core.note import Heard, InputKind
from melodycoach.core.owed import StepTrack, follow, start_track
from melodycoach.core.pitch import COMMAS_53, SEMITONES_12, ToneSystem

KIND = StepKind
TYPED, KEYS, RECORDED = InputKind.TYPED, InputKind.KEYS, InputKind.RECORDED


def one_step(*degrees: int, kind: StepKind = KIND.COLOUR_INTERVAL) -> Mode:
    """A mode with a single characteristic step."""
    return with_steps(CharacteristicStep("s", kind, Need.CORE, degrees))


def with_steps(*steps: CharacteristicStep, **changes: object) -> Mode:
    given: dict[str, object] = {
        "id": "test/one",
        "name": "One",
        "final_units": 0,
        "rising": (0, 8, 13, 22, 31, 39, 44, 53),
        "falling": (0, 8, 13, 22, 31, 35, 44, 53),
        "below": (-9,),
        "above": (66,),
        "passing": (),
        "played": MappingProxyType({8: 7.0}),
        "genera": (),
        "dominants": (31,),
        "leading": (-9,),
        "suspended": (13,),
        "course": Course.ASCENDING,
        "opening": (22, 44),
        "steps": steps,
        "neighbours": (),
    }
    return Mode(**(given | changes))  # type: ignore[arg-type]


def sung(text: str, kind: InputKind = TYPED, system: ToneSystem = COMMAS_53) -> list[Heard]:
    """Units from A4; ``!`` behind a note: the line rests on it, ``.``: a phrase ends there too."""
    notes = []
    for word in text.split():
        cents = system.units_to_cents(float(word.rstrip("!.")))
        if kind is KEYS:
            cents = 100.0 * round(cents / 100)
        notes.append(Heard(cents, kind, 0.35, word[-1] in "!.", word.endswith(".")))
    return notes


def track(mode: Mode, text: str, kind: InputKind = TYPED, final: int = 0) -> StepTrack:
    now = start_track(mode, final, COMMAS_53)
    for note in sung(text, kind):
        now = follow(now, note)
    return now


def heard_at(mode: Mode, text: str, kind: InputKind = TYPED, final: int = 0) -> int | None:
    return track(mode, text, kind, final).heard_at[0]


def test_nothing_is_heard_before_the_first_note() -> None:
    before = start_track(one_step(0, 13), 0, COMMAS_53)
    assert (before.heard_at, before.n_notes, before.heard) == ((None,), 0, {})
    assert [step.id for step in before.owed] == ["s"]


def test_degrees_in_order_are_heard_with_the_note_that_completes_them() -> None:
    after = track(one_step(0, 13, 22), "31 0 13 22")
    assert (after.heard, after.owed, after.n_notes) == ({"s": 4}, (), 4)


def test_degrees_out_of_order_are_not_heard() -> None:
    assert heard_at(one_step(0, 13, 22), "22 13 0 22") is None


def test_a_step_keeps_the_note_that_completed_it_first() -> None:
    assert heard_at(one_step(0, 13), "0 13 0 13 0 13") == 2


@pytest.mark.parametrize(
    ("line", "at"),
    [
        ("0 0 13 13 22", 5),  # repeated notes
        ("0 8 13 22", 4),  # one foreign note
        ("0 8 22 13 22", 5),  # two
        ("0 8 22 8 13 22", None),  # three
        ("0 8 8 0 8 8 13 22", 8),  # the return of the degree begins to count anew
        ("0 8! 13 22", None),  # the line rests on a foreign note
        ("0 13! 22", 3),  # and may rest on a degree of the step
        ("0 13 0 8 13 22", 6),  # an earlier degree returns
        ("0 13 0 22", 4),  # here the 0 is a note between 13 and 22
        ("13 22 0 13", None),
        ("0 13. 22", None),  # a phrase ends on the way
    ],
)
def test_ornaments_and_repeated_notes_may_stand_between_degrees(line: str, at: int | None) -> None:
    assert heard_at(one_step(0, 13, 22), line) == at


def test_a_step_that_returns_to_a_degree_needs_it_twice() -> None:
    assert heard_at(one_step(0, -9, 0), "0 -9") is None
    assert heard_at(one_step(0, -9, 0), "0 -9 0") == 3
    assert heard_at(one_step(0, 0), "0 13") is None
    assert heard_at(one_step(0, 0), "0 0") == 2


@pytest.mark.parametrize("kind", [KIND.HALF_CADENCE, KIND.SUSPENDED_CADENCE, KIND.FINAL_CADENCE])
def test_a_cadence_is_heard_only_when_its_last_note_rests(kind: StepKind) -> None:
    cadence = one_step(13, 22, kind=kind)
    assert heard_at(cadence, "13 22 31") is None
    assert heard_at(cadence, "13! 22") is None
    assert heard_at(cadence, "13 22!") == 2
    assert heard_at(cadence, "13 22 22!") == 3  # the last degree repeated
    assert heard_at(cadence, "13 22 31 22.") == 4  # and decorated


@pytest.mark.parametrize("kind", [KIND.LEADING_TONE, KIND.ALTERATION, KIND.OPENING])
def test_other_steps_are_heard_in_passing(kind: StepKind) -> None:
    assert heard_at(one_step(13, 22, kind=kind), "13 22 31") == 2


@pytest.mark.parametrize("octave", [-2, -1, 1, 2])
def test_a_whole_step_may_stand_in_any_octave(octave: int) -> None:
    moved = f"{13 + 53 * octave} {22 + 53 * octave}"
    assert heard_at(one_step(13, 22), moved) == 2


@pytest.mark.parametrize(
    ("kind", "degrees"),
    [
        (KIND.FINAL_CADENCE, (13, 8, 0)),
        (KIND.LEADING_TONE, (8, 0, -9, 0)),
        (KIND.HALF_CADENCE, (61, 53)),  # a dominant an octave over the final: lower, it would be the final
    ],
)
def test_a_step_to_the_final_or_its_octave_counts_only_where_it_is_written(
    kind: StepKind, degrees: tuple[int, ...]
) -> None:
    mode = one_step(*degrees, kind=kind)

    def line(octave: int) -> str:
        return " ".join(str(degree + 53 * octave) for degree in degrees) + "!"

    assert heard_at(mode, line(0)) == len(degrees)
    assert [heard_at(mode, line(octave)) for octave in (-2, -1, 1, 2)] == [None] * 4
    assert heard_at(mode, line(-1), final=-53) == len(degrees)


@pytest.mark.parametrize("octave", [-2, 0, 1])
@pytest.mark.parametrize("kind", [TYPED, InputKind.KEYS, InputKind.RECORDED])
def test_the_track_knows_in_which_octave_a_step_was_heard(octave: int, kind: InputKind) -> None:
    line = f"{13 + 53 * octave} {22 + 53 * octave}!"
    assert track(one_step(13, 22), line, kind).heard_octave == (octave,)
    assert track(one_step(13, 22), line.split()[0], kind).heard_octave == (0,)


def test_the_degrees_of_a_step_stand_in_one_octave() -> None:
    assert heard_at(one_step(13, 22), "13 75 66") is None
    assert heard_at(one_step(13, 22), "13 75 22") == 3  # the foreign note is 22 in another octave


@pytest.mark.parametrize("kind", [KIND.OPENING, KIND.REGISTER])
def test_an_opening_or_register_step_counts_only_where_it_is_written(kind: StepKind) -> None:
    assert heard_at(one_step(44, 53, kind=kind), "-9 0") is None
    assert heard_at(one_step(44, 53, kind=kind), "44 53") == 2


@pytest.mark.parametrize(
    ("kind", "line", "at"),
    [
        (TYPED, "22 13.7", 2),  # 0.7 commas off
        (TYPED, "22 14", None),  # a comma off is another perde
        (InputKind.TUNED, "22 11.6", 2),
        (InputKind.TUNED, "22 11.4", None),
        (RECORDED, "22 14.9", 2),
        (RECORDED, "22 15.1", None),
        (KEYS, "22 11", None),  # 249 cents: the B key; 13 commas are 294, the C key
        (KEYS, "22 12", 2),  # 272 cents: the C key
    ],
)
def test_a_degree_matches_within_the_tolerance_of_the_input(
    kind: InputKind, line: str, at: int | None
) -> None:
    assert heard_at(one_step(22, 13), line, kind) == at


def test_a_degree_matches_as_it_is_played() -> None:
    assert heard_at(one_step(13, 8), "13 6.3") == 2  # 0.7 under the played 7, 1.7 under the written 8
    assert heard_at(one_step(13, 8), "13 8.7") == 2
    assert heard_at(one_step(13, 8), "13 71", KEYS) is None
    assert heard_at(one_step(13, 8), "13 7", KEYS) == 2


def test_of_two_close_degrees_a_written_pitch_means_the_nearest_one() -> None:
    # segâh and bûselik over rast, 17 and 18 commas: common practice
    both = with_steps(
        CharacteristicStep("segah", KIND.COLOUR_INTERVAL, Need.CORE, (22, 17)),
        CharacteristicStep("buselik", KIND.COLOUR_INTERVAL, Need.CORE, (22, 18)),
        rising=(0, 9, 17, 22, 31, 40, 48, 53),
        passing=(18,),
        played=MappingProxyType({}),
    )
    assert track(both, "22 17").heard == {"segah": 2}
    assert track(both, "22 18").heard == {"buselik": 2}
    assert track(both, "22 17.5").heard == {"segah": 2, "buselik": 2}
    assert track(both, "22 17", RECORDED).heard == {"segah": 2, "buselik": 2}  # too blurred to tell
    assert track(both, "22 17", KEYS).heard == {"segah": 2, "buselik": 2}  # one key


def test_the_track_stands_on_the_final_that_it_is_given() -> None:
    assert heard_at(one_step(0, 13), "-9 4", final=-9) == 2
    assert heard_at(one_step(0, 13), "0 13", final=-9) is None


def test_semitones_are_followed_as_well() -> None:
    dorian = with_steps(
        CharacteristicStep("s", KIND.HALF_CADENCE, Need.CORE, (3, 2, 7)),
        rising=(0, 2, 3, 5, 7, 9, 10, 12),
        falling=(0, 2, 3, 5, 7, 9, 10, 12),
        below=(-2,),
        above=(14,),
        played=MappingProxyType({}),
    )
    now = start_track(dorian, -7, SEMITONES_12)
    for note in sung("-4 -5 0!", system=SEMITONES_12):
        now = follow(now, note)
    assert now.heard == {"s": 3}


def test_following_leaves_the_earlier_track_as_it_was() -> None:
    # the last note of a live line is provisional: it rests, or it does not
    cadence = one_step(13, 22, kind=KIND.HALF_CADENCE)
    before = track(cadence, "31 13")
    moving, resting = sung("22 22!")
    assert follow(before, moving).heard == {}
    assert follow(before, resting).heard == {"s": 3}
    assert follow(before, moving).heard == {}
    assert (before.heard, before.n_notes) == ({}, 2)


LAW_MODE = with_steps(
    CharacteristicStep("a", KIND.HALF_CADENCE, Need.CORE, (13, 22, 31)),
    CharacteristicStep("b", KIND.LEADING_TONE, Need.USUAL, (8, 0, -9, 0)),
    CharacteristicStep("c", KIND.OPENING, Need.CORE, (22, 31)),
)
WORDS = st.lists(
    st.sampled_from(["0", "8", "13", "22", "31", "-9", "0!", "31!", "22.", "75", "4"]), max_size=14
)


@given(WORDS, st.integers(-2, 2))
@example(["8", "0", "-9", "0", "22", "31"], 1)
def test_every_octave_of_a_line_hears_the_same_steps_but_those_tied_to_their_place(
    words: list[str], octave: int
) -> None:
    def moved(word: str) -> str:
        tail = word[-1] if word[-1] in "!." else ""
        return f"{int(word.rstrip('!.')) + 53 * octave}{tail}"

    here, there = track(LAW_MODE, " ".join(words)), track(LAW_MODE, " ".join(map(moved, words)))
    assert here.heard_at[0] == there.heard_at[0]
    if octave:  # leading tone and opening count where they are written, and no word is an octave of theirs
        assert there.heard_at[1:] == (None, None)


@given(WORDS)
def test_a_step_is_heard_exactly_when_some_choice_of_notes_spells_it(words: list[str]) -> None:
    """Against the definition itself, searched by brute force."""
    notes = sung(" ".join(words))
    step = LAW_MODE.steps[1]  # 8 0 -9 0, anywhere, need not rest

    def spells(at: int, place: int, octave: int, foreign: int) -> set[int]:
        """Notes that can complete the step when ``place`` degrees are matched up to note ``at``."""
        if place == len(step.degrees):
            return {at}
        found: set[int] = set()
        if at == len(notes) or (at and notes[at - 1].closes):
            return found
        units = round(COMMAS_53.cents_to_units(notes[at].pitch_cents)) - 53 * octave
        if units == step.degrees[place]:
            found |= spells(at + 1, place + 1, octave, 0)
        if units == step.degrees[place - 1]:
            found |= spells(at + 1, place, octave, 0)
        elif foreign < 2 and not notes[at].rests:
            found |= spells(at + 1, place, octave, foreign + 1)
        return found

    ends = set()
    for octave in (-1, 0, 1):
        for at, note in enumerate(notes):
            if round(COMMAS_53.cents_to_units(note.pitch_cents)) - 53 * octave == step.degrees[0]:
                ends |= spells(at + 1, 1, octave, 0) if not note.closes else set()
    expected = min(ends) if ends else None
    assert track(LAW_MODE, " ".join(words)).heard_at[1] == expected
