"""The contour: the notes of the line as points on a ladder of named pitches.

Conventions
-----------
Heights are in units from A4. A *row* of the contour is a rung of the ladder, the highest first; a
*slot* is the cells that one note takes, and a breath or phrase end takes one cell more. Where the
line is too long for the width, the newest part is shown, or the part round the note in focus.
"""

from __future__ import annotations

from bisect import bisect_left
from dataclasses import dataclass
from typing import TYPE_CHECKING

from melodycoach.screen.text import Line, pad, pad_left, width

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from melodycoach.core.ladder import Rung
    from melodycoach.screen.signs import Signs
    from melodycoach.screen.view import LineNote, ViewState

WIDEST_SLOT = 3
"""More cells than this for a note would tear the line apart."""

_ROLE_STYLES = {"final": "class:final", "dominant": "class:dominant"}
_ON_A_RUNG = 0.75
"""A note this near to a rung, in units, stands on it."""


@dataclass(frozen=True, slots=True)
class _Row:
    height: float
    name: str
    function: str
    role: str


@dataclass(frozen=True, slots=True)
class _Cell:
    sign: str
    style: str


def draw_contour(
    view: ViewState, columns: int, rows: int, signs: Signs, focus: int | None = None
) -> list[Line]:
    """Draw the line as points on the ladder, with a row of note numbers below where there is room.

    Parameters
    ----------
    view
        Its ``line`` and ``ladder`` are drawn.
    columns, rows
        The room; at most so many lines come back.
    signs
        What to draw with.
    focus
        The place in ``view.tokens`` on which the entry's cursor stands, None for the end.
    """
    if rows <= 0 or columns <= 0:
        return []
    ruled = rows >= 6
    labels = _label_columns(view.ladder, columns)
    room = columns - labels
    notes, slot = _window(view.line, room, focus)
    ladder = _choose_rows(view.ladder, notes, rows - ruled)
    grid, ruler = _plot(notes, ladder, slot, room, signs, focus)
    lines = [[*_label(row, labels, signs), *_runs(cells)] for row, cells in zip(ladder, grid, strict=True)]
    if ruled and lines:
        lines.append([("class:faint", " " * labels), *_runs(ruler)])
    return lines


def _label_columns(ladder: Sequence[Rung], columns: int) -> int:
    """Give the labels what they need, but no more than two fifths of the width."""
    names = max((width(rung.name) for rung in ladder), default=4)
    functions = max((width(rung.function) for rung in ladder), default=0)
    whole = names + (functions + 2 if functions else 0) + 2
    if whole <= columns * 0.4:
        return whole
    return min(names + 2, int(columns * 0.4))


def _label(row: _Row, columns: int, signs: Signs) -> Line:
    """Write name, function and edge of a rung; the function gives way first."""
    style = _ROLE_STYLES.get(row.role, "class:name")
    room = columns - 2
    if room <= 0:
        return [("", " " * columns)]
    function = row.function if width(row.name) + 1 + width(row.function) <= room else ""
    if not function:
        return [(style, pad_left(row.name, room, signs.more)), ("class:faint", " " + signs.edge)]
    name = pad_left(row.name, room - width(function) - 1, signs.more)
    return [("class:faint", function + " "), (style, name), ("class:faint", " " + signs.edge)]


def _window(line: Sequence[LineNote], room: int, focus: int | None) -> tuple[Sequence[LineNote], int]:
    """Pick the notes to show and the cells for each."""
    if room < 2 or not line:
        return (), 2
    breaks = sum(1 for note in line if note.mark in {",", "."})
    for slot in range(WIDEST_SLOT, 1, -1):
        if len(line) * slot + breaks < room:
            return line, slot
    stop = len(line)
    if focus is not None:
        here = bisect_left([note.item for note in line], focus)
        stop = min(stop, max(here, 0) + room // 6 + 1)
    start, used = stop, 0
    while start > 0:
        used += 2 + (line[start - 1].mark in {",", "."})
        if used >= room:
            break
        start -= 1
    while stop < len(line) and used + 3 < room:
        used += 2 + (line[stop].mark in {",", "."})
        stop += 1
    return line[start:stop], 2


def _choose_rows(ladder: Sequence[Rung], notes: Sequence[LineNote], rows: int) -> list[_Row]:
    """Pick the rungs to draw, the highest first.

    The notes off the mode and the degrees that mend them come first, the newest before the others;
    then final and dominants, then rungs with notes, then the rest. A note between two rungs gets a
    rung of its own while there is room.
    """
    if rows <= 0:
        return []
    by_height: dict[float, _Row] = {
        rung.height: _Row(rung.height, rung.name, rung.function, rung.role or rung.function)
        for rung in ladder
    }
    for note in notes:  # what was off in another mode may be mended by a degree that this one lacks
        if note.off_mode and note.mend_height is not None and note.mend_height not in by_height:
            by_height[note.mend_height] = _Row(note.mend_height, note.mend, "", "")
    heights = sorted(by_height)
    n_notes: dict[float, int] = {}
    faults: list[tuple[float, ...]] = []
    for note in notes:
        near = _nearest(heights, note.height)
        own = near is None or abs(near - note.height) > _ON_A_RUNG
        height = round(note.height) if own or near is None else near
        if own and height not in by_height:
            by_height[height] = _Row(height, note.name, "", "")
        n_notes[height] = n_notes.get(height, 0) + 1
        if note.off_mode:
            faults.append((height,) if note.mend_height is None else (height, note.mend_height))
    chosen: list[_Row] = []
    for fault in reversed(faults):
        wanted = [by_height[height] for height in dict.fromkeys(fault) if by_height[height] not in chosen]
        if len(chosen) + len(wanted) < rows:  # one row is left, for the final
            chosen += wanted
    for role, most in (("final", max(rows // 2, 1)), ("dominant", rows // 3)):
        chosen += [row for row in by_height.values() if row.role == role and row not in chosen][:most]
    left = {height: row for height, row in by_height.items() if row not in chosen}
    while left and len(chosen) < rows:
        chosen.append(left.pop(_most_wanted(left, [row.height for row in chosen], n_notes)))
    return sorted(chosen[:rows], key=lambda row: -row.height)


def _most_wanted(left: Mapping[float, _Row], chosen: Sequence[float], n_notes: Mapping[float, int]) -> float:
    """Find the rung that brings the notes nearest to their rungs; then one with a function, near to them."""
    away = {height: min((abs(height - other) for other in chosen), default=200.0) for height in n_notes}

    def gain(height: float) -> float:
        return sum(n_notes[place] * max(far - abs(height - place), 0.0) for place, far in away.items() if far)

    def distance(height: float) -> float:
        return min((abs(height - place) for place in n_notes), default=0.0)

    return max(
        left, key=lambda height: (gain(height), bool(left[height].function), -distance(height), -height)
    )


def _nearest(heights: Sequence[float], height: float) -> float | None:
    """Find the value nearest to a height among ascending ones."""
    if not heights:
        return None
    place = bisect_left(heights, height)
    around = heights[max(place - 1, 0) : place + 1]
    return min(around, key=lambda candidate: abs(candidate - height))


def _plot(
    notes: Sequence[LineNote],
    ladder: Sequence[_Row],
    slot: int,
    room: int,
    signs: Signs,
    focus: int | None,
) -> tuple[list[list[_Cell]], list[_Cell]]:
    """Put the notes on the rungs; give the cells of each rung and of the ruler below."""
    guides = {"final": signs.final_guide, "dominant": " " + signs.dominant_guide}
    grid = [_guide(guides.get(row.role, " "), room) for row in ladder]
    ruler = [_Cell(" ", "class:faint")] * max(room, 0)
    heights = sorted(row.height for row in ladder)
    place_of = {row.height: place for place, row in enumerate(ladder)}
    free = 0
    column = 0
    for place, note in enumerate(notes):
        near = _nearest(heights, note.height)
        if near is not None and column < room:
            focused = focus is not None and note.item == focus
            cells = grid[place_of[near]]
            style = "class:off" if note.off_mode else "class:note"
            style += " class:note.focus" if focused else ""
            cells[column] = _Cell(_note_sign(note, note.height - near, signs), style)
            if note.rests and column + 1 < room:
                cells[column + 1] = _Cell(signs.held, style)
            if note.off_mode:
                mended = None if note.mend_height is None else place_of.get(note.mend_height)
                if mended is not None and mended != place_of[near]:
                    grid[mended][column] = _Cell(signs.mend, "class:mend")
                ruler[column] = _Cell(signs.off, "class:off")
            number = str(note.number)
            wanted = note.off_mode or note.number % 5 == 0 or note.number == 1
            crowded = any(other.off_mode for other in notes[place + 1 : place + 1 + len(number) // slot + 1])
            at = column + 1 if note.off_mode else column
            if wanted and not crowded and at >= free and at + len(number) <= room:
                ruler[at : at + len(number)] = [_Cell(digit, "class:faint") for digit in number]
                free = at + len(number) + 1
        column += slot
        if note.mark in {",", "."} and column < room:
            sign = signs.breath if note.mark == "," else signs.phrase_end
            for cells in grid:
                cells[column] = _Cell(sign, "class:faint")
            if column >= free:
                ruler[column] = _Cell(note.mark, "class:faint")
            column += 1
    return grid, ruler


def _guide(pattern: str, room: int) -> list[_Cell]:
    """Fill a rung with its pattern."""
    return [_Cell(pattern[place % len(pattern)], "class:faint") for place in range(room)]


def _note_sign(note: LineNote, over: float, signs: Signs) -> str:
    if note.off_mode:
        return signs.off
    if abs(over) <= _ON_A_RUNG:
        return signs.note
    return signs.above if over > 0 else signs.below


def _runs(cells: Sequence[_Cell]) -> Line:
    """Join neighbouring cells of one style."""
    line: Line = []
    style, text = "", ""
    for cell in cells:
        if cell.style != style and text:
            line.append((style, text))
            text = ""
        style = cell.style
        text += cell.sign
    if text:
        line.append((style, text))
    return line


def mending(view: ViewState, columns: int, rows: int, signs: Signs) -> list[Line]:
    """Say in words which notes are off the mode and what would mend each, the newest first."""
    lines: list[Line] = []
    for note in reversed(view.line):
        if len(lines) >= rows:
            break
        if note.off_mode:
            lines.append(
                [("class:off", f"{signs.off} "), ("", pad(off_words(note), columns - 2, signs.more))]
            )
    return lines


def off_words(note: LineNote) -> str:
    """Say which note is off the mode, what mends it, and what is wrong with it.

    >>> from melodycoach.screen.view import LineNote
    >>> off_words(LineNote(7, 35, "acem", "F5", 0.3, False, "not in Rast, 4 commas below eviç", "eviç"))
    '7 acem: eviç mends it (not in Rast, 4 commas below eviç)'
    """
    if not note.mend:
        return f"{note.number} {note.name}: {note.off_mode}"
    return f"{note.number} {note.name}: {note.mend} mends it ({note.off_mode})"
