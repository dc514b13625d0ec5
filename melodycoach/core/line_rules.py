"""What a key is that goes down while a line is played: the rules, one table of them.

The newest note wins: it ends the one before it, whether that is still held or not. Where that would
be wrong, because the key belongs to a chord, doubles the line, or is a drone, a rule of `RULES` says
what it is instead. docs/playing.md explains each of them to players.

Every rule decides at once, from what is known when the key goes down; what it takes for an
accompaniment may still be heard (`Fate.WAITS`), so that no grace note and no legato costs a note.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum
from typing import TYPE_CHECKING, NamedTuple

if TYPE_CHECKING:
    from collections.abc import Callable

    from melodycoach.core.note import InputKind, Note
    from melodycoach.core.resting_pitch import PitchPath

CHORD_S = 0.03
"""Keys that go down within so much of the first are struck together: no hand is more even."""

DOUBLING_S = 0.08
"""Two hands that double a line in octaves strike within so much of each other."""

OVERLAP_S = 0.15
"""Legato: the key before may stay down so long after the next one has gone down."""

OUTLIVE_S = 0.05
"""The fingers of a short chord come up within so much of each other."""

HELD_S = 4.0
"""A key held so long is a drone rather than a melody note: it hides no other key any more."""

DRONE_S = 2.0
DRONE_NOTES = 3
"""A key is a drone once so many higher notes have begun while it was held, for at least so long."""

OCTAVE_CENTS, OCTAVE_SLACK_CENTS = 1200.0, 30.0
"""An octave, and how far a tuned one may be from it."""

SAME_KEY_CENTS = 50.0
"""Two pitches nearer than this belong to one key."""

MOST_KEYS, MOST_DRONES = 20, 4
"""No player holds more keys, nor sounds more drones; older ones are forgotten."""


@dataclass(frozen=True, slots=True)
class LineRules:
    """What a player can choose.

    Parameters
    ----------
    split_key
        MIDI key from which on the melody is played; what sounds below it is left out. None: no split.
    """

    split_key: int | None = None


@dataclass(frozen=True, slots=True)
class Key:
    """A key that is down; ``waits``: it is no melody note unless it outlives the one above it."""

    voice: int
    pitch_cents: float
    kind: InputKind
    at_s: float
    n_above: int = 0
    waits: bool = False


@dataclass(frozen=True, slots=True)
class Taking:
    """What has to be known of the playing so far.

    Parameters
    ----------
    rules
        What the player has chosen.
    now_s
        Time of the last event.
    note
        The newest note of the line, as far as it has sounded; None: there is none, or the player
        has changed the line since and the note is left as it is.
    struck
        The voice of that note.
    ended_s
        When its key came up; None while it is down, or with no note.
    path
        How its pitch has moved.
    keys
        What is down, in the order in which it went down.
    drones
        Pitches in cents that were heard as drones.
    """

    rules: LineRules = LineRules()
    now_s: float = 0.0
    note: Note | None = None
    struck: int | None = None
    ended_s: float | None = None
    path: PitchPath | None = None
    keys: tuple[Key, ...] = ()
    drones: tuple[float, ...] = ()

    @property
    def sounding(self) -> int | None:
        """Voice of the newest note while its key is down, or None."""
        return self.struck if self.ended_s is None else None


class Fate(Enum):
    """What a key that goes down is."""

    BEGINS = "a note of the melody"
    RAISES = "the pitch of the note that sounds: both were struck together"
    GOES_ON = "the same note, struck twice by a key that bounces"
    WAITS = "no note, unless it stays down when the one above it is let go at once"
    LEFT_OUT = "no note"


class Rule(NamedTuple):
    """One rule: when it applies to a key that goes down, and what that key is then."""

    applies: Callable[[Taking, Key], bool]
    fate: Fate


def _is_below_split(taking: Taking, key: Key) -> bool:
    split = taking.rules.split_key
    return split is not None and key.pitch_cents < 100.0 * split - SAME_KEY_CENTS


def _bounces(taking: Taking, key: Key) -> bool:
    return taking.note is not None and key.voice == taking.struck and _age_s(taking, key) <= CHORD_S


def _tops_chord(taking: Taking, key: Key) -> bool:
    return _above_cents(taking, key) > 0 and _age_s(taking, key) <= CHORD_S


def _is_under_chord(taking: Taking, key: Key) -> bool:
    return taking.sounding is not None and _age_s(taking, key) <= CHORD_S


def _doubles_above(taking: Taking, key: Key) -> bool:
    octaves, off_cents = divmod(_above_cents(taking, key) + OCTAVE_SLACK_CENTS, OCTAVE_CENTS)
    is_octave = octaves in (1, 2) and off_cents <= 2 * OCTAVE_SLACK_CENTS
    return is_octave and _age_s(taking, key) <= DOUBLING_S


def _is_far_below(taking: Taking, key: Key) -> bool:
    far = _above_cents(taking, key) <= OCTAVE_SLACK_CENTS - OCTAVE_CENTS
    return far and _age_s(taking, key) < HELD_S


def _is_drone_below(taking: Taking, key: Key) -> bool:
    return _above_cents(taking, key) < 0 and is_drone(taking, key.pitch_cents)


def _is_drone_under_line(taking: Taking, key: Key) -> bool:
    if taking.note is None or not is_drone(taking, key.pitch_cents):
        return False
    return key.pitch_cents - taking.note.pitch_cents <= OCTAVE_SLACK_CENTS - OCTAVE_CENTS


RULES = (
    Rule(_is_below_split, Fate.LEFT_OUT),
    Rule(_bounces, Fate.GOES_ON),
    Rule(_tops_chord, Fate.RAISES),
    Rule(_is_under_chord, Fate.WAITS),
    Rule(_doubles_above, Fate.RAISES),
    Rule(_is_drone_under_line, Fate.LEFT_OUT),
    Rule(_is_far_below, Fate.WAITS),
    Rule(_is_drone_below, Fate.WAITS),
)
"""What a key is that goes down: the first rule that applies says it. With none, the newest note wins."""


def _age_s(taking: Taking, key: Key) -> float:
    """Say how long before the key the newest note began."""
    assert taking.note is not None
    return key.at_s - taking.note.onset_s


def _above_cents(taking: Taking, key: Key) -> float:
    """Say how far the key is above the note that sounds; 0 with none."""
    if taking.note is None or taking.sounding is None:
        return 0.0
    return key.pitch_cents - taking.note.pitch_cents


def is_drone(taking: Taking, pitch_cents: float) -> bool:
    """Say whether this pitch was heard as a drone."""
    return any(abs(pitch_cents - drone) < SAME_KEY_CENTS for drone in taking.drones)
