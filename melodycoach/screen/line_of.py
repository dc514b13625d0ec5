"""The line and its ladder as the screen shows them: what each note is called, and which are off.

A note is judged by the mode of its own stretch, so a change of mode leaves what was right before it.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, NamedTuple

from melodycoach.core.function import Function, meant_units
from melodycoach.core.judge import Judge, judges
from melodycoach.core.note import InputKind, Mark, Note
from melodycoach.core.offmode import off_mode, off_mode_words
from melodycoach.screen.view import LineNote

if TYPE_CHECKING:
    from melodycoach.core.mode import Mode
    from melodycoach.core.note import Heard
    from melodycoach.core.pitch import PitchNames
    from melodycoach.core.session import SessionState

NOTES_SHOWN = 300
"""So many of the newest notes are handed to the screen."""

_FUNCTIONS_ON_LADDER = {Function.FINAL, Function.DOMINANT, Function.LEADING, Function.SUSPENDED}


def line_notes(session: SessionState, mode: Mode, final_units: int, leader: int) -> tuple[LineNote, ...]:
    """Give the newest notes, each with the mark after it and with what is wrong with it."""
    names = session.pack.names
    items, heard = session.line.items, session.line.heard
    places = [i for i, item in enumerate(items) if isinstance(item, Note)]
    first = max(len(places) - NOTES_SHOWN, 0)
    led_by = leader if session.target is None else None
    judged_by = judges(session.model, session.line.states, heard, (mode, final_units), led_by)
    known: dict[tuple[float, InputKind, int], _Judgement] = {}
    rows = []
    for number in range(first, len(places)):
        at, note = places[number], heard[number]
        judge = next(one for one in judged_by if one.since <= number + 1)
        until = places[number + 1] if number + 1 < len(places) else len(items)
        marks = [item for item in items[at + 1 : until] if isinstance(item, Mark)]
        key = (note.pitch_cents, note.kind, judge.since)
        if key not in known:
            known[key] = _judged(note, judge, names)
        same = known[key]
        rows.append(
            LineNote(
                number=number + 1,
                height=same.height,
                name=same.name,
                written=same.written,
                length_s=note.length_s,
                rests=note.rests,
                off_mode=same.off_mode,
                mend=same.mend,
                mark=marks[-1].value if marks else "",
                item=at,
                mend_height=same.mend_height,
            )
        )
    return tuple(rows)


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
    off = off_mode(mode, final_units, note, names.system)
    wrong, mend = off_mode_words(off, mode, names) if off is not None else ("", "")
    height = meant_units(mode, final_units, note.pitch_cents, note.kind, names.system)
    cents = names.system.units_to_cents(height)
    mend_height = float(final_units + off.mend_degree) if off is not None else None
    return _Judgement(round(height, 2), names.name(cents), str(names.spell(cents)), wrong, mend, mend_height)
