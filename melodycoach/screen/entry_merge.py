"""What arrives in the entry: played notes, changes made elsewhere, answers to its edits.

Conventions
-----------
The text follows the line by the smallest change: words that stand for items which are still there
stay untouched, pending words keep their places beside the words around them, and so does the
cursor. Every function gives a new `Entry`.
"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from melodycoach.screen.entry import Edit, Entry, due, gaps
from melodycoach.screen.text import WORD

if TYPE_CHECKING:
    from collections.abc import Sequence

    from melodycoach.screen.view import Refusal


def arrived(entry: Entry, tokens: Sequence[str], handled: int, refusals: Sequence[Refusal] = ()) -> Entry:
    """Take in the newest line, and the answer to the edit under way.

    Parameters
    ----------
    entry
        The entry so far.
    tokens
        The line now.
    handled
        Number of the newest command that is carried out or refused.
    refusals
        The newest refusals; one of them may be that of the edit under way.

    Returns
    -------
    Entry
        Its base is the line, with an edit that is still under way taken in; pending words and the
        cursor have kept their places beside the words around them.
    """
    goal = tuple(tokens)
    sent = entry.sent
    if sent is not None and handled < sent.number:
        start, stop = min(sent.start, len(goal)), min(sent.stop, len(goal))
        return _rebased(entry, goal[:start] + sent.words + goal[stop:])
    if sent is not None:
        answer = next((refusal for refusal in refusals if refusal.number == sent.number), None)
        if answer is not None and sent.words:
            entry = _refused(entry, sent, answer)
        entry = replace(entry, sent=None)
    if handled >= entry.awaited:
        entry = replace(entry, awaited=0)
    entry = _rebased(entry, goal)
    if entry.pressed and not entry.awaited and due(entry) is None:
        entry = replace(entry, pressed=False)
    return entry


def _refused(entry: Entry, edit: Edit, refusal: Refusal) -> Entry:
    """Take a refused edit out of the base again; its words become pending, the wrong ones marked."""
    n_words = len(edit.words)
    end = edit.start + n_words
    base = entry.base[: edit.start] + edit.replaced + entry.base[end:]
    shift = len(edit.replaced) - n_words
    items = tuple(
        item if item is None or item < edit.start else None if item < end else item + shift
        for item in entry.items
    )
    wrong = [word for word in edit.words if word in refusal.words] or edit.words
    unreadable = {**dict(entry.unreadable), **dict.fromkeys(wrong, refusal.sentence)}
    return replace(entry, base=base, items=items, unreadable=tuple(unreadable.items()))


def _rebased(entry: Entry, goal: tuple[str, ...]) -> Entry:
    """Let the text follow the line to its new tokens."""
    old = entry.base
    if goal == old:
        return entry
    start = _n_shared(old, goal)
    tail = _n_shared(old[start:][::-1], goal[start:][::-1])
    stop, new = len(old) - tail, goal[start : len(goal) - tail]
    shift = len(new) - (stop - start)
    draft = _Draft(entry)
    hit = [p for p, item in enumerate(entry.items) if item is not None and start <= item < stop]
    if shift == 0:
        for place in reversed(hit):
            draft.rewrite(place, goal[entry.items[place] or 0])
    else:
        place = hit[0] if hit else _place_for(entry, start)
        for gone in reversed(hit):
            draft.remove(gone)
        draft.items = [item + shift if item is not None and item >= stop else item for item in draft.items]
        draft.insert(place, new, range(start, start + len(new)))
    return replace(entry, text=draft.text, cursor=draft.cursor, base=goal, items=tuple(draft.items))


def _n_shared(one: Sequence[str], other: Sequence[str]) -> int:
    """Count how many values two sequences share from their start."""
    shortest = min(len(one), len(other))
    if one[:shortest] == other[:shortest]:
        return shortest
    return next(place for place in range(shortest) if one[place] != other[place])


def _place_for(entry: Entry, item: int) -> int:
    """Find the place among the words where a new item belongs.

    It comes before what is being typed at that point of the line, but after pending words that
    stand for items before it.
    """
    for gap in gaps(entry):
        if gap.start <= item <= gap.stop:
            return gap.last if gap.start < item else gap.first
    return next((p for p, i in enumerate(entry.items) if i is not None and i >= item), len(entry.items))


class _Draft:
    """Text, cursor and items of an entry while words of it are exchanged, from right to left."""

    def __init__(self, entry: Entry) -> None:
        self.text = entry.text
        self.cursor = entry.cursor
        self.items: list[int | None] = list(entry.items)
        self._spans = [match.span() for match in WORD.finditer(entry.text)]

    def _splice(self, lo: int, hi: int, new: str) -> None:
        self.text = self.text[:lo] + new + self.text[hi:]
        if self.cursor >= hi:
            self.cursor += len(new) - (hi - lo)
        elif self.cursor > lo:
            self.cursor = min(self.cursor, lo + len(new))

    def rewrite(self, place: int, word: str) -> None:
        lo, hi = self._spans[place]
        if self.text[lo:hi] != word:
            self._splice(lo, hi, word)

    def remove(self, place: int) -> None:
        lo, hi = self._spans[place]
        if hi < len(self.text) and (lo == 0 or self.text[lo - 1].isspace()):
            hi += 1
        self._splice(lo, hi, "")
        del self.items[place]

    def insert(self, place: int, words: Sequence[str], items: Sequence[int]) -> None:
        if not words:
            return
        found = [match.start() for match in WORD.finditer(self.text)]
        if place < len(found):
            self._splice(found[place], found[place], " ".join(words) + " ")
        else:
            before = " " if self.text and not self.text[-1].isspace() else ""
            self._splice(len(self.text), len(self.text), before + " ".join(words) + " ")
        self.items[place:place] = items
