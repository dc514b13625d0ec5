"""Sheets of our own lines, as the readers would give them."""

from __future__ import annotations

from melodycoach.core.note import Mark, Note, Silence
from melodycoach.core.pitch import PitchNames
from melodycoach.core.sheet import Place, Sheet, SheetKind
from melodycoach.sources.note_text import read_note_text


def sheet_of(text: str, names: PitchNames) -> Sheet:
    """Give note text as a sheet, its bars counted from 1 and its beats from 1 in each bar."""
    read = read_note_text(text, names)
    places, bar, beat = [], 1, 1.0
    for item in read.items:
        if isinstance(item, Note):
            places.append(Place(str(bar), beat))
        if item is Mark.BAR:
            bar, beat = bar + 1, 1.0
        elif isinstance(item, Note | Silence):
            beat += item.beats or 0.0
    head = read.headers
    return Sheet(
        SheetKind.NOTE_TEXT, read.items, tuple(places), head.title, head.mode, head.final_cents, head.tempo
    )
