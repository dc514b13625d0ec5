r"""Text in character cells: how wide it is, and what of it may be shown on a terminal.

Conventions
-----------
A width is a count of character cells: most characters fill one, East Asian wide ones two, combining
ones none. Text that comes from outside (a title, a file name, a port) passes through `tidy` before
it is measured or shown.

References
----------
Unicode Standard Annex 11, East Asian Width; Annex 15, normalization form C.
"""

from __future__ import annotations

import unicodedata
from functools import lru_cache

_NO_WIDTH = frozenset(("Mn", "Me", "Cf"))
_UNPRINTABLE = frozenset(("Cc", "Cs", "Co", "Cn", "Zl", "Zp"))


@lru_cache(maxsize=4096)
def character_width(character: str) -> int:
    """Count the cells that one character fills: 0, 1 or 2.

    Examples
    --------
    >>> [character_width(c) for c in ("a", "î", "音", chr(0x302))]
    [1, 1, 2, 0]
    """
    if unicodedata.category(character) in _NO_WIDTH:
        return 0
    return 2 if unicodedata.east_asian_width(character) in "WF" else 1


def width(text: str) -> int:
    """Count the cells that a text fills.

    >>> width("dügâh"), width("u" + chr(0x308))
    (5, 1)
    """
    return len(text) if text.isascii() else sum(map(character_width, text))


def tidy(text: str) -> str:
    r"""Make a text fit to be shown: composed letters, no line ends, tabs or control characters.

    >>> tidy("USB\tKeys\x1b[0m\n2")
    'USB Keys?[0m 2'
    """
    if not unicodedata.is_normalized("NFC", text):
        text = unicodedata.normalize("NFC", text)
    return text if text.isprintable() else "".join(map(_tidy_character, text))


def _tidy_character(character: str) -> str:
    if character.isspace():
        return " "
    category = unicodedata.category(character)
    return "" if category == "Cf" else "?" if category in _UNPRINTABLE else character
