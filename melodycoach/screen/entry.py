"""The entry: the line as editable text, into which played notes keep arriving.

Conventions
-----------
The *base* is the line as tokens, one for each item. A *word* of the text either stands for an item
of the base, whose place it knows, or is *pending*: typed, but not yet part of the line. Pending
words between two words that stand for items, and the items between them that no word stands for
any more, are one *gap*: what was typed, in place of what was taken away.

Words are handed over as soon as the cursor touches none of them (a space does that), or on Enter.
One edit at a time is under way; until it is answered its words count as if they had been taken.
A refused word stays in the text, is never lost, and is not handed over again until it changes.
`entry_edit` holds what keys do to an entry, `entry_merge` what arrives from the session. Every function
gives a new `Entry`; nothing is changed in place.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, NamedTuple

from melodycoach.screen.text import WORD

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence


@dataclass(frozen=True, slots=True)
class Edit:
    """Items ``start`` to ``stop`` give way to ``words``; ``first`` is the place of these in the text.

    ``replaced`` holds the tokens that give way; ``number`` is that of the command that carries it.
    """

    start: int
    stop: int
    words: tuple[str, ...]
    replaced: tuple[str, ...]
    first: int
    number: int = 0


@dataclass(frozen=True, slots=True)
class Entry:
    """The text, its cursor, and how its words belong to the line.

    Parameters
    ----------
    text, cursor
        What is shown; the cursor stands before the character of that number.
    base
        The line as tokens, with the edit under way taken in.
    items
        For each word of the text the item that it stands for, None for a pending word. The
        numbers rise from left to right.
    awaited
        Number of the newest command whose answer is awaited; 0: none.
    sent
        The edit under way.
    unreadable
        Words that were refused, each with the sentence that says why.
    pressed
        Enter was pressed: the word that the cursor touches is to be handed over too.
    aside
        The entry before its pending words were taken back, for the way forward.
    """

    text: str = ""
    cursor: int = 0
    base: tuple[str, ...] = ()
    items: tuple[int | None, ...] = ()
    awaited: int = 0
    sent: Edit | None = None
    unreadable: tuple[tuple[str, str], ...] = ()
    pressed: bool = False
    aside: Entry | None = None


class Span(NamedTuple):
    """One word of the text: where it stands, and ``taken``, ``pending`` or ``unreadable``."""

    lo: int
    hi: int
    state: str


class Gap(NamedTuple):
    """Pending words ``first`` to ``last`` of the text stand for items ``start`` to ``stop``."""

    start: int
    stop: int
    first: int
    last: int


def entry_of(tokens: Sequence[str]) -> Entry:
    """Give the entry that shows a line, with the cursor at its end.

    >>> entry_of(("A4", "B4-1"))
    Entry(text='A4 B4-1 ', cursor=8, base=('A4', 'B4-1'), items=(0, 1), ...
    """
    text = " ".join(tokens) + " " if tokens else ""
    return Entry(text, len(text), tuple(tokens), tuple(range(len(tokens))))


def spans(entry: Entry) -> list[Span]:
    """Give the words of the text and how each belongs to the line."""
    refused = dict(entry.unreadable)
    found: list[Span] = []
    for match, item in zip(WORD.finditer(entry.text), entry.items, strict=True):
        state = "taken" if item is not None else "unreadable" if match[0] in refused else "pending"
        found.append(Span(match.start(), match.end(), state))
    return found


def complaint(entry: Entry) -> str:
    """Say what is wrong with the unreadable word nearest to the cursor; empty if all can be read."""
    if not entry.unreadable:
        return ""
    refused = dict(entry.unreadable)
    wrong = [span for span in spans(entry) if span.state == "unreadable"]
    if not wrong:
        return ""
    near = min(wrong, key=lambda span: max(span.lo - entry.cursor, entry.cursor - span.hi))
    return refused[entry.text[near.lo : near.hi]]


def item_at(entry: Entry) -> int | None:
    """Give the item on which the cursor stands; None in pending words and at the end."""
    for span, item in zip(WORD.finditer(entry.text), entry.items, strict=True):
        if entry.cursor <= span.end():
            return item
    return None


def gaps(entry: Entry) -> Iterator[Gap]:
    """Give each place where text and line differ, from left to right."""
    start = first = 0
    for place, item in enumerate(entry.items):
        if item is None:
            continue
        if place > first or item > start:
            yield Gap(start, item, first, place)
        start, first = item + 1, place + 1
    if first < len(entry.items) or start < len(entry.base):
        yield Gap(start, len(entry.base), first, len(entry.items))


def has_pending(entry: Entry) -> bool:
    """Tell whether the text differs from the line."""
    return next(gaps(entry), None) is not None


def taken_back(entry: Entry) -> Entry:
    """Give the text of the line as it is, and keep what was pending for `brought_again`."""
    plain = entry_of(entry.base)
    return replace(plain, awaited=entry.awaited, sent=entry.sent, unreadable=entry.unreadable, aside=entry)


def brought_again(entry: Entry) -> Entry | None:
    """Give back the pending words that were taken back; None unless the line is again as it was."""
    before = entry.aside
    if before is None or before.base != entry.base:
        return None
    return replace(before, awaited=entry.awaited, sent=entry.sent, unreadable=entry.unreadable)


def due(entry: Entry) -> Edit | None:
    """Give the next edit to hand over, or None while there is none or an answer is awaited.

    >>> from melodycoach.screen.entry_edit import inserted
    >>> due(inserted(entry_of(("A4",)), "C5")) is None
    True
    >>> due(inserted(entry_of(("A4",)), "C5 "))
    Edit(start=1, stop=1, words=('C5',), replaced=(), first=1, number=0)
    """
    if entry.awaited:
        return None
    found: list[Span] | None = None
    for gap in gaps(entry):
        if gap.first == gap.last:
            return Edit(gap.start, gap.stop, (), entry.base[gap.start : gap.stop], gap.first)
        found = spans(entry) if found is None else found
        edit = _due_in(entry, gap, found)
        if edit is not None:
            return edit
    return None


def _due_in(entry: Entry, gap: Gap, found: Sequence[Span]) -> Edit | None:
    """Find the first pending words of a gap that can be handed over.

    The items of the gap give way to its first word; words behind a held one come after them.
    """
    first = gap.first
    while first < gap.last and _held(entry, found[first]):
        first += 1
    if first == gap.last:
        return None
    last = first
    while last < gap.last and not _held(entry, found[last]):
        last += 1
    start = gap.start if first == gap.first else gap.stop
    words = tuple(entry.text[span.lo : span.hi] for span in found[first:last])
    return Edit(start, gap.stop, words, entry.base[start : gap.stop], first)


def _held(entry: Entry, span: Span) -> bool:
    """Tell whether a pending word is to be kept back: refused before, or still being typed."""
    touched = span.lo <= entry.cursor <= span.hi
    return span.state == "unreadable" or (touched and not entry.pressed)


def handed_over(entry: Entry, edit: Edit, number: int) -> Entry:
    """Take an edit into the base, as if it had been carried out, and await the answer to it."""
    base = entry.base[: edit.start] + edit.words + entry.base[edit.stop :]
    shift = len(edit.words) - (edit.stop - edit.start)
    items = [item if item is None or item < edit.stop else item + shift for item in entry.items]
    items[edit.first : edit.first + len(edit.words)] = range(edit.start, edit.start + len(edit.words))
    return replace(entry, base=base, items=tuple(items), awaited=number, sent=replace(edit, number=number))


def awaiting(entry: Entry, number: int) -> Entry:
    """Hand nothing over until another command that changes the line, such as undo, is answered."""
    return replace(entry, awaited=max(number, entry.awaited))
