"""Where everything of a chart stands: notes along the line, pitches up and down, labels side by side.

Conventions
-----------
Lengths are in pixels of CSS at 96 to the inch, so that a chart prints at its size. A line is cut into
*pieces* that the browser sets one behind the other like words: as many in a row as there is room for.
Every piece has the ladder at its left, in a gutter that the piece before it covers; so the ladder is
seen at the beginning of each row, wherever the rows break. Therefore no piece but the last is narrower
than the gutter, and a gutter with the widest piece fits a narrow telephone: a piece that is still too
narrow takes one more note, of at most the widest slot.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from statistics import median
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

USUAL_SLOT = 24.0
"""Room along the line for a note of the usual length."""

SLOTS = (14.0, 110.0)
"""The least and the most room for a note: grace notes stay visible, long ones take no whole row."""

GUTTERS = (72.0, 126.0)
"""The least and the most room for the ladder."""

WIDEST_PIECE = 190.0
"""A piece that is wide enough to cover a ladder ends before it grows wider than this."""

WIDEST_ROW = 250.0
"""What a narrow telephone has beside the widest ladder; the last note is cut short to fit."""

END_LABELS = 104.0
"""Room behind the last note, for the names of the likeliest modes."""

OCTAVE = 180.0
"""Height of an octave, unless the line is so wide that it must be less."""

LOWEST_CONTOUR, HIGHEST_CONTOUR = 90.0, 430.0
LETTER, BOLD_LETTER = 6.3, 6.8
"""Width of a usual letter of the small print."""


@dataclass(frozen=True, slots=True)
class Slot:
    """Room for one note: its number, where it begins in its piece, how wide it is, how much of it sounds."""

    number: int
    x: float
    width: float
    sounding: float

    @property
    def end(self) -> float:
        """Where the next note begins."""
        return self.x + self.width


@dataclass(frozen=True, slots=True)
class Piece:
    """A piece of the line: its notes, and how wide it is."""

    slots: tuple[Slot, ...]
    width: float

    @property
    def first(self) -> int:
        """The number of its first note."""
        return self.slots[0].number

    @property
    def last(self) -> int:
        """The number of its last note."""
        return self.slots[-1].number


@dataclass(frozen=True, slots=True)
class Scale:
    """Up and down: the highest and the lowest pitch, in units from A4, and the height of one unit."""

    lowest: float
    highest: float
    unit: float

    @property
    def height(self) -> float:
        """Height of the whole."""
        return (self.highest - self.lowest) * self.unit

    def y(self, height: float) -> float:
        """Tell how far below the highest pitch another one stands."""
        return (self.highest - height) * self.unit


def pieces_of(
    notes: Sequence[Mapping[str, Any]], seams: Mapping[int, float], gutter: float
) -> tuple[Piece, ...]:
    """Cut a line into pieces, at bar lines, phrases and seams where that can be.

    Parameters
    ----------
    notes
        The notes of an answer.
    seams
        The notes with which the mode changes, by their numbers: how wide the label of each is. A piece
        has room for its labels.
    gutter
        Width of the ladder, which no piece but the last may fall short of.
    """
    pieces: list[Piece] = []
    slots: list[Slot] = []
    x, least = 0.0, gutter
    for at, (width, sounding) in enumerate(_widths(notes)):
        ends = at == len(notes) - 1
        wanted = at > 0 and (_begins(notes[at - 1], notes[at]) or at + 1 in seams)
        if slots and x >= least and (wanted or x + width + ends * END_LABELS > WIDEST_PIECE):
            pieces.append(Piece(tuple(slots), x))
            slots, x, least = [], 0.0, gutter
        if ends:
            width = min(width, WIDEST_ROW - x - END_LABELS)
        least = max(least, seams.get(at + 1, 0.0))
        slots.append(Slot(at + 1, x, width, min(sounding, width)))
        x += width
    return (*pieces, Piece(tuple(slots), x + END_LABELS)) if slots else ()


def _begins(before: Mapping[str, Any], note: Mapping[str, Any]) -> bool:
    """Tell whether a bar begins with a note, or a phrase where there are no bars."""
    return bool(note["bar"] != before["bar"] if note["bar"] else note["phrase"] != before["phrase"])


def _widths(notes: Sequence[Mapping[str, Any]]) -> list[tuple[float, float]]:
    """Give the room of each note, and how much of it sounds."""
    onsets = [note["onset_s"] for note in notes]
    gaps = [max(later - earlier, 0.0) for earlier, later in pairwise(onsets)]
    gaps += [note["length_s"] for note in notes[-1:]]
    usual = median(gap for gap in gaps if gap > 0) if any(gaps) else 1.0
    widths = []
    for note, gap in zip(notes, gaps, strict=True):
        width = min(max(gap * USUAL_SLOT / usual, SLOTS[0]), SLOTS[1])
        share = min(note["length_s"] / gap, 1.0) if gap > 0 else 1.0
        widths.append((width, max(width * share, 6.0)))
    return widths


def scale_of(answer: Mapping[str, Any]) -> Scale:
    """Find the pitches that a chart has to show: the notes, what would mend them, and the final."""
    heights = [float(answer["in_view"]["final"]["height"])]
    for note in answer["notes"]:
        heights += [note["height"]] + ([note["off"]["mend_height"]] if note["off"] else [])
    lowest, highest = min(heights), max(heights)
    unit = OCTAVE / answer["divisions"]
    missing = LOWEST_CONTOUR / unit - (highest - lowest)
    if missing > 0:
        lowest, highest = lowest - missing / 2, highest + missing / 2
    return Scale(lowest, highest, min(unit, HIGHEST_CONTOUR / (highest - lowest)))


def gutter_of(labels: Sequence[str]) -> float:
    """Give the width of the ladder, for the longest of its labels."""
    longest = max(map(len, labels), default=0) * LETTER + 14
    return min(max(longest, GUTTERS[0]), GUTTERS[1])


def spread(wanted: Sequence[float], gap: float, lowest: float, highest: float) -> list[float]:
    """Move labels apart that would stand on each other, each as little as its order allows.

    Parameters
    ----------
    wanted
        Where each label would stand best, rising.
    gap
        How far apart they have to be.
    lowest, highest
        The bounds. Where they leave too little room the labels stand evenly between them.

    Examples
    --------
    >>> spread([10, 12, 40], 10, 0, 50)
    [10, 20, 40]
    >>> spread([10, 45, 48], 10, 0, 50)
    [10, 40, 50]
    >>> spread([1, 2, 3], 30, 0, 40)
    [0.0, 20.0, 40.0]
    """
    if not wanted:
        return []
    if gap * (len(wanted) - 1) > highest - lowest:
        step = (highest - lowest) / (len(wanted) - 1)
        return [lowest + step * at for at in range(len(wanted))]
    placed: list[float] = []
    for y in wanted:
        placed.append(max(y, placed[-1] + gap if placed else lowest))
    limit = highest
    for at in reversed(range(len(placed))):
        placed[at] = min(placed[at], limit)
        limit = placed[at] - gap
    return placed
