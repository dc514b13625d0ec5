"""Commands: what the keys of the screen ask for.

Conventions
-----------
A command carries text as the player typed it; whoever carries it out reads the text. Commands are
numbered from 1 in the order in which they are sent; `ViewState.handled` and `ViewState.refusals`
answer by that number. 0 means that nobody waits for an answer.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TypeAlias


@dataclass(frozen=True, slots=True)
class ReplaceText:
    """Put note text in place of items ``start`` to ``stop`` of the line.

    Indices beyond the end of the line mean its end. Either all of the text is taken or, if a word
    of it cannot be read, none.
    """

    start: int
    stop: int
    text: str
    number: int = 0


@dataclass(frozen=True, slots=True)
class Undo:
    """Take the last change of the line back."""

    number: int = 0


@dataclass(frozen=True, slots=True)
class Redo:
    """Make the change again that was taken back."""

    number: int = 0


@dataclass(frozen=True, slots=True)
class Fresh:
    """Lay the line aside and begin a new one."""

    number: int = 0


@dataclass(frozen=True, slots=True)
class SetTarget:
    """Aim at a mode; None: at none."""

    text: str | None
    number: int = 0


@dataclass(frozen=True, slots=True)
class SetFinal:
    """Say where the final is: a pitch, ``written`` or ``any``."""

    text: str
    number: int = 0


@dataclass(frozen=True, slots=True)
class SetOnly:
    """Let only these modes compete, names with commas between; empty: all."""

    text: str
    number: int = 0


@dataclass(frozen=True, slots=True)
class SetPort:
    """Listen to the input with this name, or the one whose name contains it."""

    text: str
    number: int = 0


@dataclass(frozen=True, slots=True)
class Save:
    """Write the line to a file as note text."""

    path: str
    number: int = 0


@dataclass(frozen=True, slots=True)
class Open:
    """Put the line of a file in place of this one."""

    path: str
    number: int = 0


@dataclass(frozen=True, slots=True)
class Quit:
    """Leave the program."""

    number: int = 0


Command: TypeAlias = (
    ReplaceText | Undo | Redo | Fresh | SetTarget | SetFinal | SetOnly | SetPort | Save | Open | Quit
)
