"""How the course of a line agrees with a mode: seyir, as the pack defines it."""

import pytest
from sheets import sheet_of

from melodycoach.core.check import Checked, check_sheet
from melodycoach.core.course import Course
from melodycoach.core.model import build_model
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
MODEL = build_model(PACK, PACK.modes)


def checked(text: str, target: str) -> Checked:
    return check_sheet(MODEL, sheet_of(text, PACK.names), PACK.find(target))


def course(text: str, target: str) -> Course:
    found = checked(text, target).course
    assert found is not None
    return found


def test_muhayyer_opens_an_octave_above_its_final_and_huseyni_on_its_dominant() -> None:
    """The course of both is common practice; the pack names its sources for it."""
    high = "A5 G5 A5 B5-1 A5:2 , G5 F#5 E5:2 D5 C5 B4-1 A4:3 ."
    low = "E5 D5 E5 F#5 E5:2 , D5 C5 B4-1 A4:3 ."
    assert course(high, "muhayyer").opening.agrees is True
    assert course(low, "muhayyer").opening.agrees is False
    assert course(low, "huseyni").opening.agrees is True
    assert course(low, "muhayyer").opening.says == (
        "it opens on hüseynî; Muhayyer opens round muhayyer, an octave above its final"
    )


def test_an_opening_that_begins_well_and_goes_elsewhere_is_told_as_that() -> None:
    opening = course("E5 D5 C5 B4-1 A4:3 .", "huseyni").opening
    assert (opening.agrees, opening.says) == (
        False,
        "it opens on hüseynî, but its first notes lie round çargâh; Hüseynî opens round hüseynî",
    )


def test_three_notes_are_too_few_to_say_where_a_line_opens() -> None:
    opening = course("E5 D5 E5", "huseyni").opening
    assert (opening.agrees, opening.says) == (
        None,
        "too short to tell where it opens; it begins on hüseynî",
    )


@pytest.mark.parametrize(
    ("text", "agrees", "says"),
    [
        ("E5 D5 C5 B4-1 A4:3 .", True, "it comes to rest on dügâh, the karar of Hüseynî"),
        ("A4 B4-1 C5 D5 E5:3 .", False, "it ends on hüseynî; the karar of Hüseynî is dügâh"),
        (
            "A4 B4-1 C5 D5 E5:3",
            None,
            "it stops, with no phrase end written, on hüseynî; the karar of Hüseynî is dügâh",
        ),
    ],
)
def test_a_line_closes_on_the_final_or_says_where_else_it_ends(
    text: str, agrees: bool | None, says: str
) -> None:
    cadence = course(text, "huseyni").cadence
    assert (cadence.agrees, cadence.says) == (agrees, says)


def test_a_line_far_below_the_compass_does_not_lie_where_the_mode_lies() -> None:
    register = course("E5 D5 C5 B4-1 A4:2 E3 D3 C3 D3 E3 A4:3 .", "huseyni").register
    assert register.agrees is False
    assert "5 of 11 notes outside" in register.says
    assert course("E5 D5 C5 B4-1 A4:3 .", "huseyni").register.agrees is True


def test_each_phrase_end_is_named_by_what_it_does_in_the_mode() -> None:
    ends = course("E5 D5 E5:2 , D5 C5:2 , C5 B4-1 A4:3 .", "huseyni").phrase_ends
    assert [(end.number, end.height, end.function) for end in ends] == [
        (3, 31, "güçlü"),
        (5, 13, "asma karar"),
        (8, 0, "karar"),
    ]


def test_a_line_an_octave_away_closes_on_the_final_there() -> None:
    low = course("E4 D4 E4 F#4 E4:2 , D4 C4 B3-1 A3:3 .", "huseyni")
    assert low.opening.agrees is True
    assert low.cadence.agrees is True
