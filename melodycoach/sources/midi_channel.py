"""One MIDI channel: its bend, its registered parameters, and which keys sound on it.

What a key sounds like, in cents on the MIDI scale::

    100 * (key + coarse tuning) + what a tuning message or the player says of the key + fine tuning
        + bend / 8192 * bend range (+ the same of the zone's manager)

Coarse and fine tuning are sums of the channel's own and the instrument's (`Master`), which holds the
transposition that the player states, too.

References
----------
MIDI 1.0 detailed specification: pitch bend, registered parameters 0 (pitch bend sensitivity), 1 and 2
(channel fine and coarse tuning), 3 and 4 (tuning program and bank), data entry.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from types import MappingProxyType
from typing import TYPE_CHECKING

from melodycoach.core.note import InputKind
from melodycoach.sources.midi_tuning import CENTRE, PLAIN_CENTS

if TYPE_CHECKING:
    from collections.abc import Mapping

CONCERT_PITCH_CENTS = 20.0
"""A master tuning up to here, A4 from 435 to 445 Hz, is a concert pitch: notes keep their names."""

COARSE_CENTRE = 64
DEFAULT_RANGE_CENTS = 200
"""What a bend spans until the keyboard says otherwise: two semitones (MIDI 1.0)."""

BEND_RANGE, FINE_TUNING, COARSE_TUNING, TUNING_PROGRAM, TUNING_BANK, MPE_ZONE = 0, 1, 2, 3, 4, 6
"""Registered parameters that say something of pitch, by their fine byte; the coarse one is 0."""

NO_PARAMETER = (127, 127)
DATA_COARSE, DATA_FINE, DATA_UP, DATA_DOWN = 6, 38, 96, 97
_STEPS = MappingProxyType({DATA_UP: 1, DATA_DOWN: -1})


@dataclass(frozen=True, slots=True)
class Form:
    """How a registered parameter counts: where it starts, what its coarse byte is worth, its top.

    >>> bend_range = Form(start=200, coarse_worth=100, top=12799)
    >>> bend_range.entered(250, DATA_COARSE, 3), bend_range.entered(250, DATA_FINE, 7)
    (300, 207)
    """

    start: int
    coarse_worth: int
    top: int

    def entered(self, now: int, control: int, value: int) -> int:
        """Give the value after a data entry; the coarse byte alone is enough and clears the fine one."""
        if control == DATA_COARSE:
            now = value * self.coarse_worth
        elif control == DATA_FINE:
            now += min(value, self.coarse_worth - 1) - now % self.coarse_worth
        else:
            now += _STEPS[control]
        return min(max(now, 0), self.top)


FORMS: Mapping[int, Form] = MappingProxyType(
    {
        BEND_RANGE: Form(DEFAULT_RANGE_CENTS, 100, 12799),  # semitones and cents
        FINE_TUNING: Form(CENTRE, 128, 2 * CENTRE - 1),
        COARSE_TUNING: Form(COARSE_CENTRE, 1, 127),
        TUNING_PROGRAM: Form(0, 1, 127),
        TUNING_BANK: Form(0, 1, 127),
    }
)


@dataclass(slots=True)
class Master:
    """What moves every key of the instrument."""

    fine_cents: float = 0.0  # -100 to 100
    semitones: int = 0  # -64 to 63
    stated_semitones: int = 0  # by the player; no message changes it

    @property
    def concert_cents(self) -> float:
        """How far the concert pitch is from A4 = 440 Hz; it moves no note from its name."""
        return self.fine_cents if abs(self.fine_cents) <= CONCERT_PITCH_CENTS else 0.0

    @property
    def tuning_cents(self) -> float:
        """What is added to every key."""
        return self.fine_cents - self.concert_cents


@dataclass(slots=True)
class Sounding:
    """A key that sounds: what a tuning message said of it (None: nothing), and its pitch."""

    key_cents: float | None
    pitch_cents: float


@dataclass(slots=True)
class Channel:
    """State of one channel; every value stays in the range that its comment or its form gives."""

    master: Master
    sounding: dict[int, Sounding] = field(default_factory=dict)  # by key
    values: dict[int, int] = field(default_factory=lambda: {n: form.start for n, form in FORMS.items()})
    parameter: tuple[int, int] = NO_PARAMETER  # coarse and fine byte of the selected one
    range_sent: bool = False
    bend: int = 0  # -8192 to 8191
    n_bends: int = 0  # bend messages since the last note-on
    is_tuned: bool = False  # a bend before a note has shown that bends tune, here
    manager: Channel | None = None  # of the zone in which this channel is a member

    def bend_cents(self) -> float:
        """Give what the channel's own bend comes to."""
        return self.bend * self.values[BEND_RANGE] / CENTRE

    def fine_cents(self) -> float:
        """Give what the channel's own fine tuning comes to."""
        return (self.values[FINE_TUNING] - CENTRE) * 100 / CENTRE

    def own_cents(self) -> float:
        """Give what the channel's own bend and fine tuning come to."""
        return self.bend_cents() + self.fine_cents()

    def offset_cents(self) -> float:
        """Give what is added to every key, whole semitones apart."""
        offset = self.own_cents() + self.master.tuning_cents
        return offset if self.manager is None else offset + self.manager.bend_cents()

    def semitones(self) -> int:
        """Give by how many semitones the keys are moved."""
        return self.values[COARSE_TUNING] - COARSE_CENTRE + self.master.semitones

    def tuning_cents(self) -> float:
        """Give what fine and coarse tuning come to, of the channel and of the instrument."""
        return self.fine_cents() + self.master.tuning_cents + 100 * self.semitones()

    def shows_tuning(self) -> bool:
        """Whether the bend before the note that begins now is there to tune it.

        A hand on a wheel sends many bends. In a zone every bend at the start of a note is its own.
        """
        return (self.n_bends == 1 or self.manager is not None) and abs(self.own_cents()) >= PLAIN_CENTS

    def sound(self, key: int, key_cents: float | None) -> tuple[float, InputKind]:
        """Say where a key sounds and how sure that is.

        ``key_cents`` is what a tuning message says of it: None on a plain channel.
        """
        place = 100.0 * (key + self.semitones() + self.master.stated_semitones)
        offset = self.offset_cents()
        if key_cents is not None:
            return place + key_cents + offset, InputKind.TUNED
        if abs(offset) < PLAIN_CENTS and not self.is_tuned:
            return place, InputKind.KEYS
        return place + offset, InputKind.TUNED

    def recentre(self) -> None:
        """Put the bend to the middle, and forget what bends have shown."""
        self.bend, self.n_bends, self.is_tuned = 0, 0, False
