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
Every function gives a new `Entry`; nothing is changed in place.
"""

from __future__ import annotations

import unicodedata
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, NamedTuple

from melodycoach.screen.text import WORD

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from melodycoach.screen.view import Refusal


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


class _Gap(NamedTuple):
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


# ---------------------------------------------------------------------------------- editing


def edited(entry: Entry, lo: int, hi: int, new: str) -> Entry:
    """Put new text in place of the characters ``lo`` to ``hi``, with the cursor behind it.

    Words that the change does not touch keep their items; all others become pending.

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
    for start, stop, first, last in _gaps(entry):
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


def has_pending(entry: Entry) -> bool:
    """Tell whether the text differs from the line."""
    return next(_gaps(entry), None) is not None


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


# ---------------------------------------------------------------- handing over and answers


def due(entry: Entry) -> Edit | None:
    """Give the next edit to hand over, or None while there is none or an answer is awaited.

    >>> due(edited(entry_of(("A4",)), 3, 3, "C5")) is None
    True
    >>> due(edited(entry_of(("A4",)), 3, 3, "C5 "))
    Edit(start=1, stop=1, words=('C5',), replaced=(), first=1, number=0)
    """
    if entry.awaited:
        return None
    found: list[Span] | None = None
    for gap in _gaps(entry):
        if gap.first == gap.last:
            return Edit(gap.start, gap.stop, (), entry.base[gap.start : gap.stop], gap.first)
        found = spans(entry) if found is None else found
        edit = _due_in(entry, gap, found)
        if edit is not None:
            return edit
    return None


def _due_in(entry: Entry, gap: _Gap, found: Sequence[Span]) -> Edit | None:
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


# ------------------------------------------------------------------------- following the line


def _gaps(entry: Entry) -> Iterator[_Gap]:
    """Give each place where text and line differ, from left to right."""
    start = first = 0
    for place, item in enumerate(entry.items):
        if item is None:
            continue
        if place > first or item > start:
            yield _Gap(start, item, first, place)
        start, first = item + 1, place + 1
    if first < len(entry.items) or start < len(entry.base):
        yield _Gap(start, len(entry.base), first, len(entry.items))


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
    for gap in _gaps(entry):
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
