"""In which octave a mode stands for a line."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.core.event import PitchReading
from melodycoach.core.mode import Mode
from melodycoach.core.model import ScoringModel, build_model
from melodycoach.core.note import Heard, InputKind
from melodycoach.core.octave import lie_of, moved_final, placed_final, standing_final
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
SYSTEM = PACK.system
HUSEYNI, MUHAYYER = PACK.find("huseyni"), PACK.find("muhayyer")
WRITTEN = build_model(PACK, (HUSEYNI, MUHAYYER))
ANY = build_model(PACK, (HUSEYNI, MUHAYYER), PitchReading.ANY)

# dügâh is 0; çargâh segâh … down to dügâh, and the whole of Hüseynî's octave: common practice
HUSEYNI_LINE = "22 31 35 31! 22 13 8 0!"
MUHAYYER_LINE = "53 61 66 53! 44 39 31! 22 13 8 0!"
HIGH_IN_MUHAYYER = "53 61 66 75! 75 66 61 53!"


def sung(text: str, octaves: int = 0) -> list[Heard]:
    """Commas from A4; ``!`` behind a note: the line rests on it."""
    return [
        Heard(SYSTEM.units_to_cents(int(word.rstrip("!")) + 53 * octaves), InputKind.TYPED, 0.3, rests, False)
        for word in text.split()
        for rests in [word.endswith("!")]
    ]


def moved(mode: Mode, line: list[Heard]) -> int:
    return moved_final(mode, mode.final_units, lie_of(line), SYSTEM) - mode.final_units


@pytest.mark.parametrize("octaves", [-2, -1, 0, 1, 2])
@pytest.mark.parametrize(("mode", "line"), [(HUSEYNI, HUSEYNI_LINE), (MUHAYYER, MUHAYYER_LINE)])
def test_a_whole_line_in_another_octave_takes_the_mode_with_it(mode: Mode, line: str, octaves: int) -> None:
    assert moved(mode, sung(line, octaves)) == 53 * octaves


def test_a_line_that_lives_in_the_upper_region_leaves_the_final_where_it_is_written() -> None:
    assert moved(MUHAYYER, sung(HIGH_IN_MUHAYYER)) == 0
    assert moved(HUSEYNI, sung(HIGH_IN_MUHAYYER)) == 0


def test_before_the_first_note_the_final_is_where_it_is_written() -> None:
    assert moved(HUSEYNI, []) == 0


def test_notes_must_lie_a_third_of_an_octave_nearer_on_average() -> None:
    # home of Hüseynî is 0 to 53; a third of 53 is 17.67
    assert moved(HUSEYNI, sung("-18 -17")) == 0
    assert moved(HUSEYNI, sung("-18 -18")) == -53
    assert moved(HUSEYNI, sung("70 71")) == 0
    assert moved(HUSEYNI, sung("71 71")) == 53


def test_of_octaves_that_are_as_near_the_one_nearest_to_the_written_one_is_taken() -> None:
    assert moved(HUSEYNI, sung("-53 -53")) == -53
    assert moved(HUSEYNI, sung("106 106")) == 53


def test_three_octaves_are_the_most_that_a_mode_moves() -> None:
    assert moved(HUSEYNI, sung("0 53", 9)) == 159  # three octaves at most


@given(st.lists(st.integers(0, 53), min_size=3, max_size=12), st.integers(0, 11), st.integers(-62, 115))
def test_one_stray_note_in_a_line_of_four_or_more_moves_nothing(
    units: list[int], at: int, stray: int
) -> None:
    # a stray 62 commas from home, among four: 62 / 4 is less than a third of an octave, 17.67
    line = [*units]
    line.insert(at, stray)
    assert moved(HUSEYNI, sung(" ".join(map(str, line)))) == 0


def final_of(model: ScoringModel, mode: Mode, final: int) -> int:
    """Give the hypothesis of a mode on a final, whatever the octave."""
    index = model.modes.index(mode)
    return next(
        h
        for h in range(len(model.final_units))
        if model.mode_index[h] == index and (model.final_units[h] - final) % 53 == 0
    )


@pytest.mark.parametrize("octaves", [-1, 0, 1])
@pytest.mark.parametrize(
    ("mode", "line"),
    [
        (HUSEYNI, HUSEYNI_LINE),
        (HUSEYNI, "0 -9 -18 -9 0!"),  # round dügâh, which lies low in Hüseynî
        (HUSEYNI, "0 8 13 8 0!"),
        (HUSEYNI, "8 0! 8 13 22 31"),
        (MUHAYYER, "53 61 53!"),  # it opens on the octave and may rest there
        (MUHAYYER, HIGH_IN_MUHAYYER),
        (MUHAYYER, MUHAYYER_LINE),
    ],
)
def test_with_any_pitch_the_mode_stands_where_the_line_rests(mode: Mode, line: str, octaves: int) -> None:
    hypothesis = final_of(ANY, mode, 0)
    assert placed_final(ANY, hypothesis, lie_of(sung(line, octaves))) == 53 * octaves
    assert standing_final(ANY, hypothesis, lie_of(sung(line, octaves))) == 53 * octaves


def test_until_the_line_rests_all_its_notes_count() -> None:
    assert placed_final(ANY, final_of(ANY, HUSEYNI, 0), lie_of(sung("31 39 44"))) == 0
    assert placed_final(ANY, final_of(ANY, MUHAYYER, 0), lie_of(sung("53 61"))) == 0


def test_before_the_first_note_a_hypothesis_of_any_pitch_has_its_own_octave() -> None:
    hypothesis = final_of(ANY, HUSEYNI, 5)
    assert placed_final(ANY, hypothesis, lie_of([])) == ANY.final_units[hypothesis]


def test_as_written_a_mode_keeps_its_place_among_reasons_but_moves_with_the_line_for_its_steps() -> None:
    low = sung(HUSEYNI_LINE, -1)
    assert placed_final(WRITTEN, 0, lie_of(low)) == 0
    assert standing_final(WRITTEN, 0, lie_of(low)) == -53
