"""The line and its ladder as the screen shows them: what each note is called, and which are off.

A note is judged by the mode of its own stretch, so a change of mode leaves what was right before it.
"""

from __future__ import annotations

from bisect import bisect_left
from itertools import islice
from typing import TYPE_CHECKING, NamedTuple

from melodycoach.core.function import meant_units
from melodycoach.core.note import Mark, Note, shared_start
from melodycoach.core.offmode import off_mode, off_mode_words
from melodycoach.screen.view import LineNote

if TYPE_CHECKING:
    from collections.abc import Sequence

    from melodycoach.core.judge import Judge
    from melodycoach.core.note import Heard, Item
    from melodycoach.core.pitch import PitchNames
    from melodycoach.core.session import SessionState

NOTES_SHOWN = 300
"""So many of the newest notes are handed to the screen."""


TOLD_AT_MOST = 4096
"""Of so many pitches under so many modes is it remembered what there is to say."""


class LineMaker:
    """Makes the rows of one line, view after view; rows that stay the same are taken again."""

    def __init__(self) -> None:
        self._items: tuple[Item, ...] = ()
        self._heard: tuple[Heard, ...] = ()
        self._judged_by: tuple[Judge, ...] = ()
        self._rows: tuple[LineNote, ...] = ()  # of the newest notes
        self._told: dict[tuple[object, ...], _Judgement] = {}

    def line_notes(self, session: SessionState, judged_by: tuple[Judge, ...]) -> tuple[LineNote, ...]:
        """Give the newest notes, each with the mark after it and with what is wrong with it.

        Parameters
        ----------
        session
            The session as it is now.
        judged_by
            The judges of its line, the newest first.
        """
        items, heard = session.line.items, session.line.heard
        places = _newest_places(items)
        first = len(heard) - len(places)
        kept = self._kept(items, heard, judged_by, places, first)
        ends = [*places[1:], len(items)]
        rows = list(kept)
        for number in range(first + len(kept), len(heard)):
            at, until = places[number - first], ends[number - first]
            judge = next(one for one in judged_by if one.since <= number + 1)
            marks = [item for item in items[at + 1 : until] if isinstance(item, Mark)]
            rows.append(self._row(number, at, heard[number], judge, marks, session.pack.names))
        self._items, self._heard, self._judged_by, self._rows = items, heard, judged_by, tuple(rows)
        return self._rows

    def _kept(
        self,
        items: tuple[Item, ...],
        heard: tuple[Heard, ...],
        judged_by: tuple[Judge, ...],
        places: Sequence[int],
        first: int,
    ) -> tuple[LineNote, ...]:
        """Give the rows from note ``first`` on that are as they were in the last view."""
        before = len(self._heard) - len(self._rows)  # the first note that has a row
        if judged_by != self._judged_by or first < before:
            return ()
        n_items = shared_start(self._items, items)
        n_same = min(shared_start(self._heard, heard), first + bisect_left(places, n_items) - 1)
        return self._rows[first - before : max(n_same, first) - before]

    def _row(
        self, number: int, at: int, note: Heard, judge: Judge, marks: Sequence[Mark], names: PitchNames
    ) -> LineNote:
        pitch = (note.pitch_cents, note.kind, note.rests, judge.mode.id, judge.final_units)
        if len(self._told) > TOLD_AT_MOST:
            self._told.clear()
        told = self._told[pitch] = self._told.get(pitch) or _judged(note, judge, names)
        return LineNote(
            number=number + 1,
            height=told.height,
            name=told.name,
            written=told.written,
            length_s=note.length_s,
            rests=note.rests,
            off_mode=told.off_mode,
            mend=told.mend,
            mark=marks[-1].value if marks else "",
            item=at,
            mend_height=told.mend_height,
        )


def _newest_places(items: Sequence[Item]) -> list[int]:
    """Give where the newest notes stand among the items, in order."""
    backwards = (at for at in range(len(items) - 1, -1, -1) if isinstance(items[at], Note))
    return list(islice(backwards, NOTES_SHOWN))[::-1]


class _Judgement(NamedTuple):
    """What notes of one pitch have in common; the words are those of `LineNote`."""

    height: float
    name: str
    written: str
    off_mode: str
    mend: str
    mend_height: float | None


def _judged(note: Heard, judge: Judge, names: PitchNames) -> _Judgement:
    """Give height, name and written name of a note, what is wrong with it, and what mends it."""
    mode, final_units = judge.mode, judge.final_units
    off = off_mode(mode, final_units, note, names)
    wrong, mend = off_mode_words(off, mode, names) if off is not None else ("", "")
    height = meant_units(mode, final_units, note.pitch_cents, note.kind, names.system)
    cents = names.system.units_to_cents(height)
    mend_height = float(final_units + off.mend_degree) if off is not None else None
    return _Judgement(round(height, 2), names.name(cents), str(names.spell(cents)), wrong, mend, mend_height)
