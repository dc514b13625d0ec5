"""Notes, and the line they stand in.

Conventions
-----------
Onset and duration are in seconds from the start of the session. A line is a sequence of items:
sounding notes, silences and marks. Items never change; an edited line is a new tuple.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum
from statistics import median
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
"""A note that the line rests on sounds at least so long, however fast the line moves."""

RESTING_GAP_S = 0.25
"""A silence of less than this, however fast the line moves, is no rest."""

RESTING_RATIO = 1.3
"""A note that the line rests on takes so many times as long as the notes before it usually do."""

PACE_NOTES = 8
"""How many notes before a note say how long notes usually take; their median counts."""


def hear(items: Sequence[Item], n_known: int = 0) -> tuple[Heard, ...]:
    """Give the notes of a line as the scorer hears them, each with what follows it.

    A note rests when a written silence, a breath or a phrase end follows. It also rests when it is
    long, or is followed by a silence while nothing else is played, measured against the pace of
    the line: from its start to the next note it takes at least `RESTING_RATIO` times what the
    `PACE_NOTES` notes before it usually took, and either sounds for `RESTING_LENGTH_S` or is
    followed by `RESTING_GAP_S` of silence. So the notes of a slow exercise do not all rest.

    Parameters
    ----------
    items
        The line, or a stretch of it.
    n_known
        The first notes of the stretch, at least `PACE_NOTES` or all that there are before the
        rest, are heard already: they set the pace and are not given again.

    Examples
    --------
    >>> line = (Note(6900, 0, 1, beats=1), Note(7100, 1, 1, beats=1), Mark.BREATH)
    >>> [heard.rests for heard in hear(line)]
    [False, True]
    """
    heard: list[Heard] = []
    spans_s: list[float] = []
    places = [place for place, item in enumerate(items) if isinstance(item, Note)]
    for number, place in enumerate(places):
        until = places[number + 1] if number + 1 < len(places) else len(items)
        note = items[place]
        assert isinstance(note, Note)
        after = items[place + 1 : until]
        length_s = note.duration_s if note.beats is None else note.beats * TYPED_BEAT_S
        gap_s = _gap_s(note, items[until]) if until < len(items) else 0.0
        if number >= n_known:
            long = length_s >= RESTING_LENGTH_S or gap_s >= RESTING_GAP_S
            slow = length_s + gap_s >= RESTING_RATIO * _usual_s(spans_s)
            closes = Mark.PHRASE_END in after
            rests = closes or any(item is not Mark.BAR for item in after) or (long and slow)
            heard.append(Heard(note.pitch_cents, note.kind, length_s, rests, closes))
        spans_s.append(length_s + gap_s)
    return tuple(heard)


def _usual_s(spans_s: Sequence[float]) -> float:
    """Give how long the last notes usually took, from one's start to the next; 0 with no notes."""
    return median(spans_s[-PACE_NOTES:]) if spans_s else 0.0


def _gap_s(note: Note, following: Item) -> float:
    """Give the silence between two played notes; written ones touch, and write their silences."""
    if not isinstance(following, Note) or note.beats is not None or following.beats is not None:
        return 0.0
    return max(following.onset_s - note.onset_s - note.duration_s, 0.0)


def shared_start(old: Sequence[object], new: Sequence[object]) -> int:
    """Count the members that two sequences have in common at their start.

    >>> shared_start((1, 2, 3), (1, 2, 4, 5)), shared_start((), (1,))
    (2, 0)
    """
    for place, (one, other) in enumerate(zip(old, new, strict=False)):
        if one is not other and one != other:
            return place
    return min(len(old), len(new))
