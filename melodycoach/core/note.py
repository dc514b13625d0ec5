"""Notes, and the line they stand in.

Conventions
-----------
Onset and duration are in seconds from the start of the session. A line is a sequence of items:
sounding notes, silences and marks. Items never change; an edited line is a new tuple.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum
from typing import TYPE_CHECKING, TypeAlias

if TYPE_CHECKING:
    from collections.abc import Sequence


class InputKind(StrEnum):
    """Where a pitch came from: what is known of its precision and of its noise.

    ``TYPED``: as written, exact. ``KEYS``: a key of a plain twelve-key keyboard, which stands for
    every pitch near it. ``TUNED``: a key whose bend or tuning is known. ``RECORDED``: estimated
    from a performance, with ornaments and errors.
    """

    TYPED = "typed"
    KEYS = "keys"
    TUNED = "tuned"
    RECORDED = "recorded"


class Mark(StrEnum):
    """What stands between notes: a breath, the end of a phrase, a bar line."""

    BREATH = ","
    PHRASE_END = "."
    BAR = "|"


@dataclass(frozen=True, slots=True)
class Note:
    """One sounding note.

    Parameters
    ----------
    pitch_cents
        Cents on the MIDI scale. For ``KEYS`` a multiple of 100.
    onset_s, duration_s
        Seconds from the start of the session.
    kind
        How precise the pitch is.
    beats
        Written length, for typed notes; None for played ones.
    """

    pitch_cents: float
    onset_s: float
    duration_s: float
    kind: InputKind = InputKind.TYPED
    beats: float | None = None


@dataclass(frozen=True, slots=True)
class Silence:
    """A written rest: seconds, and beats when it was typed."""

    duration_s: float
    beats: float | None = None


Item: TypeAlias = Note | Silence | Mark
"""What a line is made of, in order."""


@dataclass(frozen=True, slots=True)
class Heard:
    """A note as the scorer hears it.

    Parameters
    ----------
    pitch_cents, kind
        As in `Note`.
    length_s
        How long it counts: the sounding length, or `TYPED_BEAT_S` for each written beat.
    rests
        The line comes to rest on it: it is long, or a silence, breath or phrase end follows.
    closes
        A phrase ends on it.
    """

    pitch_cents: float
    kind: InputKind
    length_s: float
    rests: bool
    closes: bool


TYPED_BEAT_S = 0.35
"""What one written beat counts, whatever the tempo: an ordinary moving note."""

RESTING_LENGTH_S = 0.4
"""A note that sounds at least so long is one that the line rests on."""

RESTING_GAP_S = 0.25
"""A silence of at least so long makes the note before it one that the line rests on."""


def hear(items: Sequence[Item]) -> tuple[Heard, ...]:
    """Give the notes of a line as the scorer hears them, each with what follows it.

    A note rests when it is at least `RESTING_LENGTH_S` long, or when a breath, a phrase end or a
    silence (written, or at least `RESTING_GAP_S` of nothing played) follows.

    >>> line = (Note(6900, 0, 1, beats=1), Note(7100, 1, 1, beats=1), Mark.BREATH)
    >>> [heard.rests for heard in hear(line)]
    [False, True]
    """
    heard: list[Heard] = []
    note: Note | None = None
    rests = closes = False
    for item in items:
        match item:
            case Note():
                if note is not None:
                    heard.append(_heard(note, rests or _gap_s(note, item) >= RESTING_GAP_S, closes))
                note, rests, closes = item, False, False
            case Mark.PHRASE_END:
                rests = closes = True
            case Mark.BREATH | Silence():
                rests = True
            case Mark.BAR:
                pass
    if note is not None:
        heard.append(_heard(note, rests, closes))
    return tuple(heard)


def _gap_s(note: Note, following: Note) -> float:
    if note.beats is not None or following.beats is not None:
        return 0.0  # written notes touch: their silences are written too
    return following.onset_s - note.onset_s - note.duration_s


def _heard(note: Note, rests: bool, closes: bool) -> Heard:
    length_s = note.duration_s if note.beats is None else note.beats * TYPED_BEAT_S
    long = length_s >= RESTING_LENGTH_S
    return Heard(note.pitch_cents, note.kind, length_s, rests or long, closes)
