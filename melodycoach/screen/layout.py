"""Who gets how many rows and columns: pure arithmetic, from the size of the terminal alone.

Conventions
-----------
Shares depend on the size and on what the player is doing, never on the notes, so that nothing on
the screen jumps while someone plays. Only a complaint, which wants to be seen, takes a row more.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum

SMALLEST_COLUMNS, SMALLEST_ROWS = 40, 12
"""Below this size there is one plain sentence, and the entry."""

_TWO_COLUMNS, _TWO_ROWS = 72, 20
"""From this size on leanings and owed steps stand side by side."""


class Form(StrEnum):
    """The three forms of the screen."""

    SENTENCE = "sentence"
    STACK = "stack"
    PAIR = "pair"


@dataclass(frozen=True, slots=True)
class Layout:
    """Rows of each area (0: it is left out) and, side by side, the columns of the left half."""

    form: Form
    attention: int = 0
    top: int = 0
    leanings: int = 0
    owed: int = 0
    why: int = 0
    line: int = 0
    mending: int = 0
    question: int = 0
    entry: int = 0
    status: int = 0
    hints: int = 0
    left: int = 0
    gutter: int = 0


def lay_out(columns: int, rows: int, question_rows: int = 0, complaint: bool = False) -> Layout:
    """Share out the screen.

    Parameters
    ----------
    columns, rows
        Size of the terminal.
    question_rows
        Rows that a question wants; 0: none is asked.
    complaint
        A word of the entry is unreadable, and a row is wanted to say why.

    Returns
    -------
    Layout
        The rows, with one for the verdict, add up to ``rows``.

    Examples
    --------
    >>> lay_out(80, 24)
    Layout(form=<Form.PAIR: 'pair'>, attention=1, top=9, leanings=4, owed=8, why=3, line=9, ...
    """
    if columns < SMALLEST_COLUMNS or rows < SMALLEST_ROWS:
        question = min(question_rows, max(rows - 1, 1)) if question_rows else 0
        entry = min(1 + complaint, max(rows - 1 - question, 0))
        return Layout(Form.SENTENCE, question=question, entry=entry)
    entry = 3 if rows >= 36 else 2 if rows >= 20 else 1
    entry = max(entry, 2) if complaint else entry
    status = 3 if rows >= 36 else 2 if rows >= 30 else 1 if rows >= 15 else 0
    if columns < _TWO_COLUMNS or rows < _TWO_ROWS:
        return _stack(columns, rows, question_rows, entry, status)
    body = rows - 3 - question_rows - entry - status
    top = (body + 1) // 2
    leanings = round((top - 2) * 0.57)
    return Layout(
        Form.PAIR,
        attention=1,
        top=top,
        leanings=leanings,
        owed=top - 1,
        why=top - 2 - leanings,
        line=body - top,
        mending=2 if body >= 28 else 0,
        question=question_rows,
        entry=entry,
        status=status,
        hints=1,
        left=round(columns * 0.45),
    )


_TURNS = ("leanings", "owed", "line", "why", "owed", "line", "line", "owed")


def _stack(columns: int, rows: int, question_rows: int, entry: int, status: int) -> Layout:
    """Share out a narrow or low screen: everything in one column, the least needed left out."""
    attention = 1 if rows >= 15 else 0
    left = rows - 2 - attention - entry - status - question_rows
    share = {"leanings": 2, "owed": 1, "line": 0, "why": 0}
    left -= 3
    for area, least in (("line", 4), ("why", 1)):
        if left >= least:
            share[area] = least
            left -= least
    turn = 0
    while left > 0:
        share[_TURNS[turn % len(_TURNS)]] += 1
        left, turn = left - 1, turn + 1
    return Layout(
        Form.STACK,
        attention=attention,
        leanings=share["leanings"],
        owed=share["owed"],
        why=share["why"],
        line=share["line"],
        question=question_rows,
        entry=entry,
        status=status,
        hints=1,
        gutter=6 if columns >= 56 else 0,
    )
