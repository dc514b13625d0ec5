"""One melody line out of what is played: the rules, and how they make a whole recording a line.

The rules:

- The newest note wins: it ends the one before it, whether that is still held or not.
- Notes struck at the same instant (within `CHORD_S`) and held together are a chord; its top note is
  the melody.
- A note ends when its own key comes up; that another key comes up ends nothing.
- A bent key moves the note that sounds.
- A silence of `BREATH_GAP_S` is written as a breath, one of `PHRASE_GAP_S` as the end of a phrase.

A live session follows them event by event (`melodycoach.core.session`); `take_melody` gives the same
line from all events at once, without scoring it.
"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from melodycoach.core.event import NoteOff, NoteOn, PitchMoved
from melodycoach.core.note import Mark, Note

if TYPE_CHECKING:
    from collections.abc import Iterable

    from melodycoach.core.event import Event
    from melodycoach.core.note import Item

BREATH_GAP_S = 1.0
"""A silence of at least so long between played notes is a breath."""

PHRASE_GAP_S = 2.5
"""A silence of at least so long after a played note ends the phrase."""

CHORD_S = 0.005
"""Keys that go down within so much of each other go down at once."""


def mark_of_silence(silence_s: float) -> Mark | None:
    """Give what a silence of this length is written as, or None for one that is too short.

    >>> mark_of_silence(0.4), str(mark_of_silence(1.0)), str(mark_of_silence(2.5))
    (None, ',', '.')
    """
    if silence_s >= PHRASE_GAP_S:
        return Mark.PHRASE_END
    return Mark.BREATH if silence_s >= BREATH_GAP_S else None


def is_struck_with(note: Note | None, at_s: float) -> bool:
    """Say whether a key that goes down now is struck together with the note that sounds."""
    return note is not None and note.beats is None and at_s - note.onset_s <= CHORD_S


def take_melody(events: Iterable[Event], end_s: float | None = None) -> tuple[Item, ...]:
    """Give the line that a session would have after these events.

    Parameters
    ----------
    events
        What was played, by time; events that are no notes are passed over.
    end_s
        When the recording ends; None: with its last event.

    Examples
    --------
    >>> from melodycoach.core.note import InputKind
    >>> keys = InputKind.KEYS
    >>> take_melody([NoteOn(0, 60, 6000, keys), NoteOff(0.5, 60), NoteOn(2, 62, 6200, keys)], 2.25)[1:]
    (<Mark.BREATH: ','>, Note(pitch_cents=6200, onset_s=2, duration_s=0.25, kind=<InputKind.KEYS: 'keys'>, \
beats=None))
    """
    return take_melody_indexed(events, end_s)[0]


def take_melody_indexed(
    events: Iterable[Event], end_s: float | None = None
) -> tuple[tuple[Item, ...], tuple[int, ...]]:
    """Give the line, and for each of its notes the place of its note-on among the events."""
    items: list[Item] = []
    places: list[int] = []
    note: Note | None = None  # the newest one, not yet among the items
    voice: int | None = None  # its key while that is down
    now_s = 0.0

    def grown() -> Note | None:
        return note if note is None or voice is None else replace(note, duration_s=now_s - note.onset_s)

    for place, event in enumerate(events):
        now_s = max(event.at_s, now_s)
        note = grown()
        match event:
            case NoteOn():
                if voice is None or note is None or not is_struck_with(note, now_s):
                    items += _with_silence(note, now_s)
                    note, voice = Note(event.pitch_cents, now_s, 0.0, event.kind), event.voice
                    places.append(place)
                elif event.pitch_cents > note.pitch_cents:
                    note, voice = replace(note, pitch_cents=event.pitch_cents, kind=event.kind), event.voice
                    places[-1] = place
            case NoteOff(voice=ended) if ended == voice:
                voice = None
            case PitchMoved(voice=moved) if moved == voice and note is not None:
                note = replace(note, pitch_cents=event.pitch_cents, kind=event.kind)
    now_s = now_s if end_s is None else max(end_s, now_s)
    items += _with_silence(grown(), now_s)
    return tuple(items), tuple(places)


def _with_silence(note: Note | None, until_s: float) -> tuple[Item, ...]:
    """Give a finished note, and what the silence after it is written as."""
    if note is None:
        return ()
    mark = mark_of_silence(until_s - note.onset_s - note.duration_s)
    return (note,) if mark is None else (note, mark)
