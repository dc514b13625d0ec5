"""The perde ladder of a chart: a line for each step of the mode in view, and its name at the left."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from melodycoach.errors import shorten
from melodycoach.report.page_frame import CONTOUR_Y, LABEL_GAP
from melodycoach.report.page_html import Html, element
from melodycoach.report.page_layout import LETTER, spread

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping

    from melodycoach.report.page_frame import Frame
    from melodycoach.report.page_layout import Piece, Scale

KEPT = ("final", "dominant")
"""The steps whose function stands beside their name, and which a crowded ladder keeps."""


def rungs_of(answer: Mapping[str, Any], scale: Scale) -> list[Mapping[str, Any]]:
    """Give the steps of the ladder that the chart reaches, and the guests, highest first."""
    ladder = [*answer["in_view"]["ladder"], *guests(answer)]
    reached = (rung for rung in ladder if scale.lowest <= rung["height"] <= scale.highest)
    return sorted(reached, key=lambda rung: -rung["height"])


def guests(answer: Mapping[str, Any]) -> list[dict[str, Any]]:
    """Give the perdes that the line uses, and rightly so, and that the ladder does not have.

    They belong to the mode of another stretch, or are colours.
    """
    own = {rung["height"] for rung in answer["in_view"]["ladder"]}
    names = {note["height"]: note["name"] for note in answer["notes"] if not note["off"]}
    return [
        {"height": height, "name": name, "function": "", "role": "guest"}
        for height, name in names.items()
        if height not in own
    ]


def label(rung: Mapping[str, Any]) -> str:
    """Name a step, with what it does where it is one of those that matter most."""
    return f"{rung['function']} {rung['name']}" if rung["role"] in KEPT else rung["name"]


def lines(shared: Frame, piece: Piece) -> Iterator[Html]:
    """Draw the steps as lines across a piece."""
    for rung in shared.rungs:
        y = shared.pitch_y(rung["height"])
        yield element("line", x2=piece.width, y1=y, y2=y, class_=f"rung {rung['role']}")


def names(shared: Frame) -> Iterator[Html]:
    """Write the names of the steps in the gutter, moved apart where they stand close."""
    rungs = shared.rungs
    if len(rungs) * LABEL_GAP > shared.scale.height + 2 * LABEL_GAP:
        rungs = [rung for rung in rungs if rung["role"] in KEPT]
    wanted = [shared.pitch_y(rung["height"]) for rung in rungs]
    bounds = (CONTOUR_Y - LABEL_GAP / 2, CONTOUR_Y + shared.scale.height + LABEL_GAP / 2)
    longest = int((shared.gutter - 12) / LETTER)
    for rung, y in zip(rungs, spread(wanted, LABEL_GAP, *bounds), strict=True):
        name, says = rung["name"], label(rung)
        does = element("tspan", f"{rung['function']} ", class_="does") if says != name else None
        yield element(
            "text",
            does,
            shorten(name, max(longest - (len(says) - len(name)), 4)),
            x=shared.gutter - 8,
            y=y + 4,
            class_=f"perde {rung['role']}",
        )
        own = shared.pitch_y(rung["height"])
        yield element("line", x1=shared.gutter - 6, y1=y, x2=shared.gutter, y2=own, class_="tick")
