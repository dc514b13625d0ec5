"""Scala scales written: the degrees of a scale in the open text format that softsynths read.

References
----------
The Scala scale file format, as its page describes it: lines that begin with an exclamation mark are
comments; then a description, the number of notes, and a line for each note above the first, whose
1/1 is understood; a value with a period is in cents, what stands behind it is not read; the last note
is the period of the scale. Files are Latin-1, so what is written here is plain ASCII.
"""

from __future__ import annotations

import unicodedata
from typing import TYPE_CHECKING

from melodycoach.core.pitch import OCTAVE_CENTS

if TYPE_CHECKING:
    from collections.abc import Iterable

SUFFIX = ".scl"
_DOTLESS = str.maketrans({"ı": "i", "–": "-", "−": "-", "’": "'"})


def write_scala(name: str, description: str, notes: Iterable[tuple[float, str]]) -> str:
    """Write a scale of one octave.

    Parameters
    ----------
    name
        The name of the file, for its first line.
    description
        One line about the scale.
    notes
        Cents above the first note, each with a name; the first note and its octave are left out.

    Examples
    --------
    >>> print(write_scala("five.scl", "a fifth, and the octave", [(701.886792, "nevâ")]))
    ! five.scl
    !
    a fifth, and the octave
     2
    !
     701.88679 neva
     1200.00000
    <BLANKLINE>
    """
    lines = [f" {cents:.5f} {_ascii(label)}".rstrip() for cents, label in [*notes, (OCTAVE_CENTS, "")]]
    head = [f"! {_ascii(name)}", "!", _ascii(description).lstrip("!"), f" {len(lines)}", "!"]
    return "\n".join([*head, *lines, ""])


def looks_like_scala(start: bytes) -> bool:
    r"""Tell a scale from another file by how it begins.

    >>> looks_like_scala(b"! a.scl\n!\n"), looks_like_scala(b"MThd"), looks_like_scala(b"")
    (True, False, True)
    """
    return not start or start.lstrip().startswith(b"!")


def _ascii(text: str) -> str:
    """Write a text in plain letters on one line."""
    spread = unicodedata.normalize("NFKD", text.translate(_DOTLESS))
    kept = (letter for letter in spread if not unicodedata.combining(letter))
    plain = "".join(letter if letter.isascii() and letter.isprintable() else " " for letter in kept)
    return " ".join(plain.split())
