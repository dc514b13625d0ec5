"""Lines of our own that state a makam by the book: where it opens, its half cadence, its close."""

from __future__ import annotations

from typing import TYPE_CHECKING

from melodycoach.core.note import Heard, InputKind, hear
from melodycoach.sources.note_text import read_note_text

if TYPE_CHECKING:
    from melodycoach.core.model import ScoringModel

BY_THE_BOOK = {
    "rast": "rast dügâh segâh çargâh nevâ:3 , hüseynî nevâ çargâh segâh dügâh rast:4 .",
    "huseyni": "hüseynî:2 eviç gerdâniye eviç hüseynî:3 , nevâ çargâh hüseynî nevâ çargâh segâh dügâh:4 .",
    "hicaz": "dügâh dik-kürdî nim-hicaz nevâ:3 , eviç hüseynî:2 nevâ nim-hicaz dik-kürdî dügâh:4 .",
    "saba": "dügâh segâh çargâh:3 , hicaz çargâh segâh dügâh rast segâh dügâh:4 .",
    "segah": "segâh:2 kürdî segâh çargâh nevâ:3 , çargâh segâh dügâh segâh:4 .",
    "nihavend": "rast dügâh kürdî:2 çargâh nevâ:3 , nim-hisar nevâ çargâh kürdî dügâh rast:4 .",
}


def by_the_book(model: ScoringModel, slug: str, n_notes: int, kind: InputKind) -> list[Heard]:
    """Repeat a line until it has so many notes; the last note is just a note."""
    notes = hear(read_note_text(BY_THE_BOOK[slug], model.pack.names).items)
    cents = [note.pitch_cents if kind is InputKind.TYPED else round(note.pitch_cents, -2) for note in notes]
    line = [
        Heard(pitch, kind, note.length_s, note.rests, note.closes)
        for pitch, note in zip(cents, notes, strict=True)
    ]
    return [line[at % len(line)] for at in range(n_notes)]
