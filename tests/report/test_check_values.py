"""The parts of an answer: how a change of mode is told when it is clear, half clear, or a question."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import pytest
from sheets import sheet_of

from melodycoach.core.check import check_sheet
from melodycoach.core.model import build_model
from melodycoach.report.check_values import change_data, names_alone
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
MODEL = build_model(PACK, PACK.modes)
CHECKED = check_sheet(
    MODEL,
    sheet_of(
        "E5 D5 E5 F#5 G5 F#5 E5:2 , D5 C5 B4-1 A4:2 . E5 D5 E5 F#5 G5 F#5 E5:2 , D5 C5 B4-1 A4:2 . "
        "D5 E5 D5 C#5 Bb4+1 A4:2 , Bb4+1 C#5 D5:2 C#5 Bb4+1 A4 G4 A4:2 . D5 C#5 D5 C#5 Bb4+1 A4:4 .",
        PACK.names,
    ),
)
HICAZ_FAMILY = PACK.find("hicaz").family


def turned(*among: str, before: str = "huseyni", decided: bool = False, family: str = "") -> dict[str, Any]:
    """Give the change of a line that turns to Hicaz, as if its notes left it open between these modes."""
    one, other = CHECKED.stretches
    indices = tuple(MODEL.modes.index(PACK.find(name)) for name in among)
    leaning = replace(
        other.span.leaning, best=indices[0], p_best=0.6, decided=decided, among=indices, family=family
    )
    after = replace(
        other, mode=PACK.find("hicaz"), probability=0.43, span=replace(other.span, leaning=leaning)
    )
    return change_data(CHECKED, replace(one, mode=PACK.find(before)), after)


def test_a_change_to_a_mode_that_is_named_alone_is_clear() -> None:
    change = turned("hicaz", decided=True, family=HICAZ_FAMILY)
    assert change["says"] == "turns from Hüseynî to Hicaz, 43 %"
    assert (change["decided"], change["family"], change["among"]) == (True, "", ["makam/hicaz"])


def test_a_change_to_one_of_another_family_is_clear_though_the_member_is_open() -> None:
    change = turned("hicaz", "humayun", family=HICAZ_FAMILY)
    assert change["says"] == "turns from Hüseynî to the hicaz family: undecided between Hicaz and Hümâyun"
    assert (change["decided"], change["family"]) == (False, "hicaz family")
    assert change["among"] == ["makam/hicaz", "makam/humayun"]


@pytest.mark.parametrize(
    ("change", "says"),
    [
        (
            turned("hicaz", "nikriz"),
            "may turn from Hüseynî to Hicaz, 43 % (undecided between Hicaz and Nikriz)",
        ),
        (
            turned("hicaz", "uzzal", before="humayun", family=HICAZ_FAMILY),
            (
                "may turn from Hümâyun to Hicaz, 43 % "
                "(undecided between Hicaz and Uzzal, both of the hicaz family)"
            ),
        ),
        (
            turned("rast", decided=True, family=PACK.find("rast").family),
            "may turn from Hüseynî to Hicaz, 43 % (leaning to Rast, 60 %)",
        ),
        (
            turned("hicaz", family=HICAZ_FAMILY),
            "may turn from Hüseynî to Hicaz, 43 % (undecided; Hicaz is nearest)",
        ),
    ],
    ids=["no family", "within one family", "heard in a third mode", "one candidate that is not likely"],
)
def test_any_other_change_is_a_question(change: dict[str, Any], says: str) -> None:
    assert change["says"] == says
    assert (change["decided"], change["family"]) == (False, "")


def test_the_change_and_its_stretch_agree_on_what_is_decided() -> None:
    [before, after] = CHECKED.stretches
    assert change_data(CHECKED, before, after)["decided"] == names_alone(CHECKED, after)
