"""What keys do to the entry: typing, erasing, moving the cursor.

Conventions
-----------
Every function gives a new `Entry`. Words that a change does not touch keep their items; all others
become pending. A letter and the combining marks upon it are one step for the cursor.
"""

from __future__ import annotations

import unicodedata
from dataclasses import replace

from melodycoach.screen.entry import Entry, gaps
from melodycoach.screen.text import WORD


def edited(entry: Entry, lo: int, hi: int, new: str) -> Entry:
    """Put new text in place of the characters ``lo`` to ``hi``, with the cursor behind it.

    Words that the change does not touch keep their items; all others become pending.

    >>> from melodycoach.screen.entry import entry_of
    >>> edited(entry_of(("A4",)), 3, 3, "C5").items
    (0, None)
    """
    new = _typable(new)
    kept: dict[tuple[int, int], int | None] = {}
    shift = len(new) - (hi - lo)
    for match, item in zip(WORD.finditer(entry.text), entry.items, strict=True):
        if match.end() <= lo:
            kept[match.span()] = item
        elif match.start() >= hi:
            kept[match.start() + shift, match.end() + shift] = item
    text = entry.text[:lo] + new + entry.text[hi:]
    items = tuple(kept.get(match.span()) for match in WORD.finditer(text))
    changed = replace(entry, text=text, cursor=lo + len(new), items=items, pressed=False, aside=None)
    return _recognised(changed)


def _typable(text: str) -> str:
    """Turn line ends and tabs into spaces and drop what cannot be part of note text."""
    spaced = "".join(" " if character.isspace() else character for character in text)
    return "".join(c for c in spaced if unicodedata.category(c) not in {"Cc", "Cs", "Co", "Cn"})


def _recognised(entry: Entry) -> Entry:
    """Let pending words that equal the items of their gap, from either end, stand for them again."""
    words = entry.text.split()
    items = list(entry.items)
    for start, stop, first, last in gaps(entry):
        while first < last and start < stop and words[first] == entry.base[start]:
            items[first] = start
            first, start = first + 1, start + 1
        while first < last and start < stop and words[last - 1] == entry.base[stop - 1]:
            items[last - 1] = stop - 1
            last, stop = last - 1, stop - 1
    return replace(entry, items=tuple(items))


def inserted(entry: Entry, text: str) -> Entry:
    """Type or paste text at the cursor."""
    return edited(entry, entry.cursor, entry.cursor, text)


def erased_before(entry: Entry) -> Entry:
    """Take away the character before the cursor."""
    lo = _cluster_before(entry.text, entry.cursor)
    return edited(entry, lo, entry.cursor, "") if lo < entry.cursor else entry


def erased_after(entry: Entry) -> Entry:
    """Take away the character after the cursor."""
    hi = _cluster_after(entry.text, entry.cursor)
    return edited(entry, entry.cursor, hi, "") if hi > entry.cursor else entry


def erased_word(entry: Entry) -> Entry:
    """Take away what stands before the cursor, back to the start of a word."""
    lo = _word_before(entry)
    return edited(entry, lo, entry.cursor, "") if lo < entry.cursor else entry


def moved_to(entry: Entry, cursor: int) -> Entry:
    """Put the cursor before the character of that number, or at the nearest end."""
    return replace(entry, cursor=min(max(cursor, 0), len(entry.text)))


def moved_to_start(entry: Entry) -> Entry:
    """Put the cursor at the start of the text."""
    return moved_to(entry, 0)


def moved_to_end(entry: Entry) -> Entry:
    """Put the cursor at the end of the text."""
    return moved_to(entry, len(entry.text))


def moved_left(entry: Entry) -> Entry:
    """Move the cursor one character to the left."""
    return moved_to(entry, _cluster_before(entry.text, entry.cursor))


def moved_right(entry: Entry) -> Entry:
    """Move the cursor one character to the right."""
    return moved_to(entry, _cluster_after(entry.text, entry.cursor))


def moved_word_left(entry: Entry) -> Entry:
    """Move the cursor to the start of the word before it."""
    return moved_to(entry, _word_before(entry))


def moved_word_right(entry: Entry) -> Entry:
    """Move the cursor to the end of the word after it."""
    match = WORD.search(entry.text, entry.cursor)
    return moved_to(entry, match.end() if match else len(entry.text))


def _word_before(entry: Entry) -> int:
    starts = [match.start() for match in WORD.finditer(entry.text) if match.start() < entry.cursor]
    return starts[-1] if starts else 0


def _cluster_before(text: str, cursor: int) -> int:
    """Step over one character and the combining marks upon it."""
    place = max(cursor - 1, 0)
    while place > 0 and unicodedata.combining(text[place]):
        place -= 1
    return place


def _cluster_after(text: str, cursor: int) -> int:
    place = min(cursor + 1, len(text))
    while place < len(text) and unicodedata.combining(text[place]):
        place += 1
    return place


def confirmed(entry: Entry) -> Entry:
    """Enter was pressed: hand over every pending word, the refused ones once more.

    At the end of the text a space follows, so that the next word can be typed at once.
    """
    text, cursor = entry.text, entry.cursor
    if cursor == len(text) and text and not text[-1].isspace():
        text, cursor = text + " ", cursor + 1
    return replace(entry, text=text, cursor=cursor, unreadable=(), pressed=True)
