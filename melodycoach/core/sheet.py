"""A sheet: the line that a file holds, whatever the file was, and where its notes stand in it.

Note text, MIDI files and scores are all read to a `Sheet`, so that everything behind the readers
works on one kind of value.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum
from math import floor, log2
from statistics import median
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Sequence

    from melodycoach.core.note import Item

LONGEST_BEAT, SHORTEST_BEAT = 2.0, 1 / 16
"""Bounds of the note value that can count as one beat, in quarter notes."""


class SheetKind(StrEnum):
    """What kind of file a line was read from."""

    NOTE_TEXT = "note text"
    MIDI = "MIDI file"
    MUSIC_XML = "MusicXML"


@dataclass(frozen=True, slots=True)
class Place:
    """Where a note stands, for the one who looks for it.

    Parameters
    ----------
    bar
        Its bar as printed, such as ``"12"``; empty where the file has no bars.
    beat
        Counted from 1 in beats of the time signature, or of the note text; 0 where there is no bar.
    at
        Where to look in the file, such as ``line 4, column 7`` or ``0:12.4``; empty where bar and
        beat say it all.
    """

    bar: str = ""
    beat: float = 0.0
    at: str = ""


@dataclass(frozen=True, slots=True)
class Sheet:
    """The line of one file.

    Parameters
    ----------
    kind
        What was read.
    items
        The line, as a session has it.
    places
        Where each note of ``items`` stands: as many as there are notes.
    title, mode, final_cents, tempo
        What the file says of itself: free words; the mode it is meant to be in, as written; the
        final; beats a minute. Empty or None where it says nothing.
    says
        What the reader did with the file and why, in sentences.
    lost
        What could not be read, in sentences that say where.
    """

    kind: SheetKind
    items: tuple[Item, ...]
    places: tuple[Place, ...]
    title: str = ""
    mode: str = ""
    final_cents: float | None = None
    tempo: float | None = None
    says: tuple[str, ...] = ()
    lost: tuple[str, ...] = ()


def usual_beat(quarters: Sequence[float]) -> float:
    """Give the note value that counts as one beat of a written line, in quarter notes.

    A written beat stands for an ordinary moving note, so a score in eighths must not count as one
    in which every note is short: the beat is the largest power of two that the median of the note
    lengths reaches.

    Parameters
    ----------
    quarters
        The lengths of the notes, in quarter notes.

    Examples
    --------
    >>> usual_beat([1, 1, 2]), usual_beat([0.5, 0.5, 0.25, 1]), usual_beat([0.75]), usual_beat([])
    (1.0, 0.5, 0.5, 1.0)
    """
    lengths = [length for length in quarters if length > 0]
    if not lengths:
        return 1.0
    beat = 2.0 ** floor(log2(median(lengths)) + 1e-9)
    return min(max(beat, SHORTEST_BEAT), LONGEST_BEAT)


_BEAT_NAMES = {
    2.0: "a half note",
    1.0: "a quarter note",
    0.5: "an eighth",
    0.25: "a 16th",
    0.125: "a 32nd",
    0.0625: "a 64th",
}


def beat_words(beat: float) -> str:
    """Say which note value counts as one beat.

    >>> beat_words(0.5)
    'one beat is an eighth, the usual note of the line'
    """
    return f"one beat is {_BEAT_NAMES[beat]}, the usual note of the line"
