r"""Lines of a text report: wrapped to a width, set beside labels, painted for a terminal.

Conventions
-----------
A width is a count of character cells. Every text that comes from a file passes through `clean` on
its way into a `Line`, so that no title or file name can speak to the terminal. A style is a name of
`SGR`; it only stresses what the words say by themselves.
"""

from __future__ import annotations

import re
from typing import TYPE_CHECKING, NamedTuple

from melodycoach.core.cells import tidy, width

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

MIN_COLUMNS = 40
LEAST_TEXT = 24
"""A text beside its label has at least so many columns, and half of the line; else it stands below."""

SGR = {"": "", "strong": "1", "faint": "2", "off": "31", "heard": "32", "owed": "33"}
"""What a style asks of the terminal: numbers of ECMA-48, Select Graphic Rendition."""


class Line(NamedTuple):
    """A line of the report, and how it is stressed."""

    text: str
    style: str = ""


BLANK = Line("")

_TIE = "\u00a0"
_GAP = re.compile(rf"[^\S{_TIE}]+")


def tied(text: str) -> str:
    """Keep the words of a text on one line."""
    return text.replace(" ", _TIE)


def clean(text: str) -> str:
    r"""Make a text fit to be shown, with its words tied where they are.

    >>> clean("Quay\x1b[31m\tat\u202e night\n")
    'Quay?[31m at night '
    """
    return _TIE.join(map(tidy, text.split(_TIE)))


def wrapped(text: str, columns: int, first: str = "", rest: str | None = None, style: str = "") -> list[Line]:
    """Break a text into lines between its words; a word that is wider than a line stands alone.

    Parameters
    ----------
    text
        What to say; spaces and line ends in it only part words. `tied` ones stay together, and so do a
        number and its %.
    columns
        How wide a line may be.
    first, rest
        What stands before the first line, and before the others (None: the same).
    style
        How the lines are stressed.
    """
    later = first if rest is None else rest
    lines, line, empty = [], clean(first), True
    for word in _GAP.split(clean(text).replace(" %", f"{_TIE}%").strip()):
        if not empty and width(line) + 1 + width(word) > columns:
            lines.append(line)
            line, empty = later, True
        line += word if empty else f" {word}"
        empty = False
    return [Line(line.replace(_TIE, " ").rstrip(), style) for line in [*lines, line] if line.strip()]


def heading(text: str, columns: int, rule: str = "-") -> list[Line]:
    """Write a title with a rule under it, as wide as the title."""
    lines = wrapped(text, columns, style="strong")
    size = max((width(line.text) for line in lines), default=0)
    return [*lines, Line(rule * min(size, columns), "faint")]


class Row(NamedTuple):
    """A label and what stands beside it."""

    label: str
    text: str
    style: str = ""


def table(rows: Sequence[Row], columns: int, indent: str = "  ") -> list[Line]:
    """Set texts beside their labels, all at the same column; under them where that is too narrow."""
    labels = [clean(row.label) for row in rows]
    size = max(map(width, labels), default=0)
    start = len(indent) + size + 2
    below = columns - start < max(LEAST_TEXT, columns // 2)
    lines: list[Line] = []
    for label, row in zip(labels, rows, strict=True):
        if below:
            lines += wrapped(label, columns, indent, style=row.style)
            lines += wrapped(row.text, columns, f"{indent}  ")
        else:
            pad = " " * (size - width(label) + 2)
            lines += wrapped(row.text, columns, f"{indent}{label}{pad}", " " * start, row.style)
    return lines


def painted(lines: Iterable[Line], colour: bool) -> str:
    """Give the text of the lines, stressed in colour or not at all."""
    return "\n".join(_paint(*line) if colour else line.text for line in lines)


def _paint(text: str, style: str) -> str:
    codes = SGR[style]
    return f"\x1b[{codes}m{text}\x1b[0m" if codes and text else text
