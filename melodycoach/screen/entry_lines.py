"""Drawing the entry and the question above it: rows of words, and where the cursor stands.

Conventions
-----------
Rows break between words, never inside one that would fit. Row and column count from 0.
"""

from __future__ import annotations

import re
from bisect import bisect_right
from dataclasses import dataclass
from typing import TYPE_CHECKING

from melodycoach.screen.entry import Entry, Span, complaint, spans
from melodycoach.screen.question import Question, offered
from melodycoach.screen.text import Line, character_width, cut, width

if TYPE_CHECKING:
    from collections.abc import Sequence

    from melodycoach.screen.signs import Signs

_WORD_AND_SPACES = re.compile(r"\s+|\S+\s*")
_MARGIN = 2
_STYLES = {
    "pending": "class:entry.pending",
    "unreadable": "class:entry.unreadable",
}


@dataclass(frozen=True, slots=True)
class Drawn:
    """Lines, and the row and column of the cursor among them."""

    lines: list[Line]
    row: int
    column: int


def break_text(text: str, columns: int) -> list[tuple[int, int]]:
    """Break a text into rows, given as character ranges that together cover it.

    Spaces stay at the end of the row before them, even beyond its width. There is always a row
    for the cursor at the end of the text.

    >>> break_text("A4 B4-1 C5 ", 8)
    [(0, 8), (8, 11)]
    """
    columns = max(columns, 1)
    rows: list[tuple[int, int]] = []
    start = used = 0
    for match in _WORD_AND_SPACES.finditer(text):
        size = width(match[0].rstrip())
        if used and used + size > columns:
            rows.append((start, match.start()))
            start, used = match.start(), 0
        if size > columns:
            for place in range(match.start(), match.end()):
                step = character_width(text[place])
                if used and used + step > columns and not text[place].isspace():
                    rows.append((start, place))
                    start, used = place, 0
                used += step
            continue
        used += width(match[0])
    rows.append((start, len(text)))
    if used > columns:
        rows.append((len(text), len(text)))
    return rows


def row_of(rows: Sequence[tuple[int, int]], cursor: int) -> int:
    """Find the row on which the cursor stands: at a break, that of the character after it."""
    return next((place for place, (_, hi) in enumerate(rows) if cursor < hi), len(rows) - 1)


def moved_up_or_down(text: str, cursor: int, columns: int, step: int) -> int:
    """Find the cursor's place one row higher (``step`` -1) or lower (1), in the same column."""
    rows = break_text(text, columns - _MARGIN)
    here = row_of(rows, cursor)
    there = here + step
    if not 0 <= there < len(rows):
        return 0 if there < 0 else len(text)
    lo, hi = rows[there]
    last = hi if there == len(rows) - 1 else hi - 1
    return min(lo + cursor - rows[here][0], last)


def draw_entry(entry: Entry, columns: int, rows: int, signs: Signs) -> Drawn:
    """Draw the part of the entry round the cursor; pending words are underlined.

    The last row says in a sentence what is wrong with an unreadable word, which is set off by
    ``!`` before it in that sentence and by its style.
    """
    if rows <= 0 or columns <= 0:
        return Drawn([], 0, 0)
    wrong = complaint(entry)
    below: list[Line] = []
    if wrong and rows >= 2:
        below = [[("class:warning", cut(f"{signs.warning} {wrong}", columns, signs.more))]]
        rows -= 1
    ranges = break_text(entry.text, columns - _MARGIN)
    here = row_of(ranges, entry.cursor)
    top = max(0, min(here - rows // 2, len(ranges) - rows))
    shown = ranges[top : top + rows]
    words = spans(entry)
    lines: list[Line] = []
    for place, (lo, hi) in enumerate(shown, start=top):
        hidden = (place == top > 0) or (place == top + rows - 1 < len(ranges) - 1)
        margin = signs.more if hidden else signs.entry if place == 0 else " "
        lines.append([("class:key", pad_margin(margin, columns)), *_words(entry.text, words, lo, hi)])
    column = _MARGIN + width(entry.text[ranges[here][0] : entry.cursor])
    return Drawn([*lines, *below], here - top, min(column, columns - 1))


def _words(text: str, words: Sequence[Span], lo: int, hi: int) -> Line:
    """Write the characters ``lo`` to ``hi``, each word in the style of its state."""
    line: Line = []
    at = lo
    first = bisect_right(words, lo, key=lambda span: span.hi)
    for span in words[first:]:
        if span.lo >= hi:
            break
        if span.state == "taken":
            continue
        start, stop = max(span.lo, lo), min(span.hi, hi)
        line += [("class:entry", text[at:start]), (_STYLES[span.state], text[start:stop])]
        at = stop
    return [*line, ("class:entry", text[at:hi])]


def pad_margin(sign: str, columns: int) -> str:
    """Give the margin of a row, with its sign, where the width allows for one."""
    return f"{sign} "[: max(columns - 1, 0)]


def question_rows(question: Question | None) -> int:
    """Count the rows that a question takes: itself, and its choices or what was wrong."""
    return 0 if question is None else 2


def draw_question(question: Question, columns: int, rows: int, signs: Signs) -> Drawn:
    """Draw a question with what is typed so far, and below it the choices or the complaint."""
    if rows <= 0 or columns <= 0:
        return Drawn([], 0, 0)
    label = cut(f"{question.label} ", max(columns - 8, 0), signs.more)
    room = max(columns - width(label) - 1, 1)
    start = 0
    while width(question.text[start : question.cursor]) > room - 1 and start < question.cursor:
        start += 1
    shown = question.text[start:]
    line: Line = [("class:question", label), ("class:entry.pending", cut(shown, room, signs.more))]
    column = width(label) + width(question.text[start : question.cursor])
    lines = [line]
    if rows >= 2:
        lines.append(_below(question, columns, signs))
    return Drawn(lines, 0, min(column, columns - 1))


def _below(question: Question, columns: int, signs: Signs) -> Line:
    if question.complaint:
        return [("class:warning", cut(f"{signs.warning} {question.complaint}", columns, signs.more))]
    if question.awaited:
        return [("class:faint", cut(f"  {signs.more}", columns, signs.more))]
    choices = offered(question)
    if not choices:
        return [("class:faint", cut(f"  {question.advice}", columns, signs.more))]
    line: Line = []
    room = columns
    first = 0
    while question.picked and sum(width(c) + 2 for c in choices[first : question.picked + 1]) > columns - 1:
        first += 1
    for place, choice in enumerate(choices[first:], start=first):
        picked = place == question.picked
        text = f"[{choice}]" if picked else f" {choice} "
        if width(text) > room - (1 if place + 1 < len(choices) else 0):
            line.append(("class:faint", signs.more[:room]))
            break
        line.append(("class:choice.picked" if picked else "class:choice", text))
        room -= width(text)
    return line
