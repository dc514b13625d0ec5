"""Which degree a pitch stands for, and what that degree does."""

from types import MappingProxyType

import pytest

from melodycoach.core.function import (
    Function,
    degrees_near,
    find_degree,
    function_of,
    meant_units,
    tolerance_units,
)
from melodycoach.core.mode import Course, Mode
from melodycoach.core.note import InputKind
from melodycoach.core.pitch import COMMAS_53, SEMITONES_12, key_of
from melodycoach.sources.pack_file import load_pack

TYPED, KEYS, RECORDED = InputKind.TYPED, InputKind.KEYS, InputKind.RECORDED


def mode(**changes: object) -> Mode:
    given: dict[str, object] = {
        "id": "test/one",
        "name": "One",
        "final_units": 0,
        "rising": (0, 8, 13, 22, 31, 39, 44, 53),
        "falling": (0, 8, 13, 22, 31, 35, 44, 53),
        "below": (-9, -14),
        "above": (62, 66),
        "passing": (27,),
        "played": MappingProxyType({8: 7.0}),
        "genera": (),
        "dominants": (31,),
        "leading": (-9,),
        "suspended": (13,),
        "course": Course.ASCENDING_DESCENDING,
        "opening": (22, 44),
        "steps": (),
        "neighbours": (),
    }
    return Mode(**(given | changes))  # type: ignore[arg-type]


def found(units: float, kind: InputKind = TYPED, of: Mode | None = None) -> int | None:
    return find_degree(of or mode(), 0, COMMAS_53.units_to_cents(units), kind, COMMAS_53)


@pytest.mark.parametrize(
    ("units", "degree"),
    [
        (0, 0),
        (8, 8),
        (7, 8),  # as played
        (6.3, 8),  # 0.7 commas under the played degree
        (6.2, None),  # 0.8 commas under it, 1.8 under the written one
        (9, None),  # a comma over the written one: another perde
        (10, None),
        (27, 27),  # a passing colour belongs to the mode
        (35, 35),  # so does the falling form
        (33, None),
        (-9, -9),
        (-14, -14),
        (-18, -18),  # 35 an octave lower
        (62, 62),
        (61, 61),  # 8 an octave higher, nearer than 62
        (75, 75),  # 22 an octave higher
        (119, 119),  # 66 an octave higher: 13 two octaves up
        (115, 115),  # 62 an octave higher, of the degrees above
        (-67, -67),  # -14 an octave lower, of the degrees below
    ],
)
def test_a_written_pitch_stands_for_the_nearest_degree_within_the_tolerance(
    units: float, degree: int | None
) -> None:
    assert found(units) == degree


def test_a_degree_below_the_final_does_not_spread_to_the_octave_above_it() -> None:
    without_evic = mode(rising=(0, 8, 13, 22, 31, 35, 44, 53), passing=())
    assert found(-14, of=without_evic) == -14
    assert found(39, of=without_evic) is None


def test_a_recorded_pitch_has_the_wider_tolerance() -> None:
    assert found(33, RECORDED) is not None  # 2 commas from both 31 and 35
    assert found(10.1, RECORDED) is None  # 2.1 from 8, 2.9 from 13


@pytest.mark.parametrize(
    ("key", "degree"),
    [
        (69, 0),
        (70, None),  # 4.4 commas: no degree between 0 and 7
        (71, 8),  # 8 commas are 181 cents, 7 are 158: both the B key
        (74, 22),
        (75, 27),  # 27 commas, 611 cents: key 75
        (77, 35),  # 35 commas, 792 cents: key 77
        (78, 39),  # 39 commas, 883 cents: key 78
        (60, -9 - 53 + 22),  # C4 is -40 commas: 13 an octave lower
    ],
)
def test_a_key_stands_for_the_degree_that_it_plays(key: int, degree: int | None) -> None:
    assert find_degree(mode(), 0, 100.0 * key, KEYS, COMMAS_53) == degree


def test_a_key_stands_for_a_degree_of_the_scale_before_a_passing_colour() -> None:
    both = mode(passing=(9,), played=MappingProxyType({}))  # 9 commas are 204 cents, nearer to the key
    assert find_degree(both, 0, 7100.0, KEYS, COMMAS_53) == 8


def test_the_tolerance_is_a_pitch_difference_whatever_the_tone_system() -> None:
    # 0.75 commas = 0.75 * 1200 / 53 = 16.98 cents
    assert tolerance_units(TYPED, COMMAS_53) == pytest.approx(0.75)
    assert tolerance_units(TYPED, SEMITONES_12) == pytest.approx(0.1698, abs=1e-4)
    assert tolerance_units(KEYS, SEMITONES_12) == 0.5


def test_the_nearest_degree_may_be_any_distance_away() -> None:
    assert degrees_near(mode(), 3.0, 53, 53)[0] == 0
    assert degrees_near(mode(), 5.0, 53, 53)[0] == 8  # 2 from the played 7, 5 from 0
    assert degrees_near(mode(), 56.0, 53, 53)[0] == 53  # 3 from 53, 4 from the played copy 60
    assert degrees_near(mode(), 58.0, 53, 53)[0] == 61


def test_a_key_border_belongs_to_the_upper_key() -> None:
    assert [key_of(cents) for cents in (-50.0, 49.9, 50.0, 149.9)] == [0, 0, 1, 1]


@pytest.mark.parametrize(
    ("degree", "function"),
    [
        (None, Function.OUTSIDE),
        (0, Function.FINAL),
        (53, Function.FINAL),
        (31, Function.DOMINANT),
        (84, Function.DOMINANT),
        (-9, Function.LEADING),
        (44, Function.OPENING),
        (13, Function.SUSPENDED),
        (66, Function.SUSPENDED),
        (35, Function.FALLING),
        (27, Function.PASSING),
        (39, Function.OPENING),
        (8, Function.DEGREE),
    ],
)
def test_a_degree_has_its_most_telling_function(degree: int | None, function: Function) -> None:
    assert function_of(mode(), degree, 53) is function


def test_an_octave_that_is_a_dominant_is_no_final() -> None:
    upper = mode(dominants=(53, 31))
    assert function_of(upper, 53, 53) is Function.DOMINANT
    assert function_of(upper, 0, 53) is Function.FINAL


def test_a_plain_key_means_the_degree_of_the_mode_that_lies_on_it() -> None:
    # common practice: segâh is a comma under the B key's bûselik; Uşşak has segâh, Bûselik has bûselik
    pack = load_pack("makam")
    b4 = 7100.0
    for slug, units in (("ussak", 8), ("buselik", 9)):
        makam = pack.find(slug)
        assert meant_units(makam, makam.final_units, b4, InputKind.KEYS, pack.system) == units
    rast = pack.find("rast")
    assert meant_units(rast, rast.final_units, b4 + 3.8, InputKind.TYPED, pack.system) == pytest.approx(
        9, abs=0.01
    )
    assert meant_units(rast, rast.final_units, 7000.0, InputKind.KEYS, pack.system) == pytest.approx(
        100 / (1200 / 53)
    )
