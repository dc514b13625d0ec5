"""How likely the modes are after each note: the lower part of a chart, on the axis of the notes.

Each mode has a dash pattern, and its name beside its line where a row begins and where the line ends.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from melodycoach.errors import shorten
from melodycoach.report.page_frame import LABEL_GAP
from melodycoach.report.page_html import Html, element, joined, number
from melodycoach.report.page_layout import spread
from melodycoach.report.places import notes_between
from melodycoach.report.words import listed, short_percent

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping, Sequence

    from melodycoach.report.page_frame import Frame
    from melodycoach.report.page_layout import Piece

LONGEST_NAME = 15
DASHES = ("none", "7 3", "2 3", "9 3 2 3", "4 2")
"""How the line of each mode is dashed."""


def axis(shared: Frame) -> Iterator[Html]:
    """Write the ends of the axis."""
    for label, y in (("100 %", shared.likelihoods_y - 5), ("0 %", shared.bottom + 14)):
        yield element("text", label, x=shared.gutter - 2, y=y, class_="chance")


def mode_labels(answer: Mapping[str, Any]) -> list[str]:
    """Give what the gutter has to have room for: the names, and a dash beside each."""
    return [shorten(mode["name"], LONGEST_NAME) + "...." for mode in answer["likelihoods"]["modes"]]


def _chances(shared: Frame, note: int) -> Sequence[float]:
    """Give the probabilities after a note, of each of the few modes shown."""
    row: Sequence[float] = shared.answer["likelihoods"]["after"][note - 1]
    return row


def likelihoods(shared: Frame, piece: Piece) -> Html:
    """Draw how the likelihoods went: each point stands at the end of the note after which it holds."""
    modes = shared.answer["likelihoods"]["modes"]
    right = piece.slots[-1].end
    grid = [
        element("line", x2=right, y1=shared.chance_y(at), y2=shared.chance_y(at), class_="grid")
        for at in (0.0, 0.5, 1.0)
    ]
    points = [(0.0, piece.first - 1)] if piece.first > 1 else []
    points += [(slot.end, slot.number) for slot in piece.slots]
    lines = []
    for at in range(len(modes)):
        way = " ".join(
            f"{number(x)},{number(shared.chance_y(_chances(shared, note)[at]))}" for x, note in points
        )
        lines.append(element("polyline", points=way, class_=f"mode-{at + 1}", stroke_dasharray=DASHES[at]))
    return element("g", *grid, *lines, role="img", class_="chances", aria_label=_said(shared, piece))


def _said(shared: Frame, piece: Piece) -> str:
    """Say in words how the likelihoods went in a piece."""
    before, after = _chances(shared, max(piece.first - 1, 1)), _chances(shared, piece.last)
    ways = [
        f"{mode['name']} from {short_percent(was)} to {short_percent(now)}"
        for mode, was, now in zip(shared.answer["likelihoods"]["modes"], before, after, strict=True)
    ]
    return f"likelihoods, {notes_between(piece.first, piece.last)}: {listed(ways)}"


def names(shared: Frame, piece: Piece) -> Iterator[Html]:
    """Write the names of the modes beside their lines, as they stand where a piece begins."""
    right = shared.gutter - 22
    for at, y in _apart(shared, _chances(shared, max(piece.first - 1, 1))):
        name = shorten(shared.answer["likelihoods"]["modes"][at]["name"], LONGEST_NAME)
        yield element("text", name, x=right, y=y + 4, class_=f"chance mode-{at + 1}")
        yield element(
            "line",
            x1=right + 4,
            x2=right + 20,
            y1=y,
            y2=y,
            class_=f"mode-{at + 1}",
            stroke_dasharray=DASHES[at],
        )


def ends(shared: Frame, piece: Piece) -> Iterator[Html]:
    """Write at the end of the line how likely each mode is."""
    if piece.last < len(shared.notes):
        return
    chances, x = _chances(shared, piece.last), piece.slots[-1].end
    for at, y in _apart(shared, chances):
        name = shorten(shared.answer["likelihoods"]["modes"][at]["name"], 10)
        yield element(
            "text",
            joined([name, short_percent(chances[at])], " "),
            x=x + 6,
            y=y + 4,
            class_=f"last mode-{at + 1}",
        )


def _apart(shared: Frame, chances: Sequence[float]) -> Iterator[tuple[int, float]]:
    """Give each mode with the place of its label, the likeliest at the top."""
    order = sorted(range(len(chances)), key=lambda at: -chances[at])
    wanted = [shared.chance_y(chances[at]) for at in order]
    yield from zip(order, spread(wanted, LABEL_GAP, shared.likelihoods_y + 5, shared.bottom), strict=True)
