"""Text in character cells: cutting, padding, wrapping it to a width.

Conventions
-----------
A *fragment* is a pair (style, text) and a *line* is a list of fragments, as the terminal takes
them. How wide a text is, and what of it may be shown, `melodycoach.core.cells` knows. Nothing here
prints.
"""

from __future__ import annotations

import re
import unicodedata
from typing import TYPE_CHECKING, TypeAlias

from melodycoach.core.cells import character_width as character_width
from melodycoach.core.cells import tidy as tidy
from melodycoach.core.cells import width as width

if TYPE_CHECKING:
    from collections.abc import Iterable

Fragment: TypeAlias = tuple[str, str]
Line: TypeAlias = list[Fragment]

WORD = re.compile(r"\S+")
"""A word: what stands between spaces."""

_LETTERS = str.maketrans(
    {
        "ı": "i",
        "×": "x",
        "·": "-",
        "–": "-",
        "—": "-",
        "−": "-",
        "…": "~",
        "‘": "'",
        "’": "'",
        "“": '"',
        "”": '"',
        "✓": "+",
        "✗": "x",
        "→": ">",
        "♭": "b",
        "♯": "#",
    }
)


def to_ascii(text: str) -> str:
    """Write a text with plain letters only, for terminals that know no others.

    >>> to_ascii("Sultânîyegâh · karcığar…")
    'Sultaniyegah - karcigar~'
    """
    if text.isascii():
        return text
    spread = unicodedata.normalize("NFKD", text.translate(_LETTERS))
    return "".join(c if c.isascii() else "" if unicodedata.combining(c) else "?" for c in spread)


def cut(text: str, columns: int, sign: str = "…") -> str:
    """Shorten a text to a width; the sign shows that something is missing.

    >>> cut("acemaşîran", 6), cut("rast", 6), cut("rast", 0)
    ('acema…', 'rast', '')
    """
    if columns <= 0:
        return ""
    if width(text) <= columns:
        return text
    room = columns - width(sign)
    if room < 0:
        return ""
    kept: list[str] = []
    for character in text:
        room -= character_width(character)
        if room < 0:
            break
        kept.append(character)
    return "".join(kept).rstrip() + sign


def pad(text: str, columns: int, sign: str = "…") -> str:
    """Cut a text to a width, or fill it with spaces on the right.

    >>> pad("nevâ", 6)
    'nevâ  '
    """
    short = cut(text, columns, sign)
    return short + " " * (columns - width(short))


def pad_left(text: str, columns: int, sign: str = "…") -> str:
    """Cut a text to a width, or fill it with spaces on the left."""
    short = cut(text, columns, sign)
    return " " * (columns - width(short)) + short


def wrap(text: str, columns: int) -> list[str]:
    """Break a text into rows at its spaces; a word wider than a row is broken anywhere.

    >>> wrap("eviç mends it, not acem", 10)
    ['eviç mends', 'it, not', 'acem']
    """
    if columns <= 0:
        return []
    rows: list[str] = []
    row = ""
    for word in text.split():
        if row and width(row) + 1 + width(word) <= columns:
            row = f"{row} {word}"
            continue
        if row:
            rows.append(row)
        row = word
        while width(row) > columns:
            head = _head(row, columns)
            rows.append(head)
            row = row[len(head) :]
    return [*rows, row] if row else rows


def wrap_within(text: str, columns: int, rows: int, sign: str = "…") -> list[str]:
    """Break a text into so many rows at most; the last one is cut where there is more.

    >>> wrap_within("eviç mends it, not acem", 10, 2)
    ['eviç mends', 'it, not a…']
    """
    texts = wrap(text, columns)
    if len(texts) <= rows:
        return texts
    return [*texts[: rows - 1], cut(" ".join(texts[rows - 1 :]), columns, sign)] if rows > 0 else []


def _head(text: str, columns: int) -> str:
    """Take as many characters as fit, and at least one."""
    room = columns
    for place, character in enumerate(text):
        room -= character_width(character)
        if room < 0 and place > 0:
            return text[:place]
    return text


def line_width(line: Iterable[Fragment]) -> int:
    """Count the cells that a line fills."""
    return sum(width(text) for _, text in line)


def fit(line: Iterable[Fragment], columns: int, sign: str = "…", style: str = "") -> Line:
    """Cut a line to a width, or fill it with spaces; the result is exactly so wide.

    A character of two cells that would straddle the edge gives way to a space.

    >>> fit([("class:a", "dügâh"), ("", " segâh")], 8)
    [('class:a', 'dügâh'), ('', ' s…')]
    """
    fragments = list(line)
    room = columns
    if line_width(fragments) <= columns:
        fitted = [fragment for fragment in fragments if fragment[1]]
        room -= line_width(fitted)
    else:
        fitted = []
        for fragment_style, text in fragments:
            size = width(text)
            if size >= room:
                piece = cut(text + " " if size == room else text, room, sign)
                fitted.append((fragment_style, piece))
                room -= width(piece)
                break
            fitted.append((fragment_style, text))
            room -= size
    if room > 0:
        fitted.append((style, " " * room))
    return fitted


def tidy_lines(lines: Iterable[Line], ascii_only: bool = False) -> list[Line]:
    """Make lines fit to be shown, with plain letters only where that is asked for."""
    tidied = [[(style, tidy(text)) for style, text in line] for line in lines]
    if not ascii_only:
        return tidied
    return [[(style, to_ascii(text)) for style, text in line] for line in tidied]


def plain_text(line: Iterable[Fragment]) -> str:
    """Give the characters of a line without its styles."""
    return "".join(text for _, text in line)
