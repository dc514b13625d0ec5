"""Where the ticks of a MIDI file lie: in seconds, and in bars and beats.

Conventions
-----------
A tick is the unit in which a Standard MIDI File counts, from 0 at its start. A tempo is microseconds
a quarter note. All sums are of whole numbers, so a time is as exact as a float can say it.

References
----------
Standard MIDI Files 1.0 (RP-001): division, tempo and time signature; 120 quarters a minute and 4/4
until the file says otherwise; a division in film frames counts absolute time.
"""

from __future__ import annotations

from bisect import bisect_right
from dataclasses import dataclass, field
from fractions import Fraction
from itertools import pairwise
from typing import TYPE_CHECKING, TypeAlias

if TYPE_CHECKING:
    from collections.abc import Sequence

MICROSECONDS = 1_000_000
USUAL_TEMPO = 500_000
"""Microseconds a quarter until the file says otherwise: 120 quarters a minute (RP-001)."""

USUAL_DIVISION = 480
"""Ticks a quarter where the file gives none that means something; a common choice, from memory."""

FRAMES_A_SECOND = {24: Fraction(24), 25: Fraction(25), 29: Fraction(30_000, 1001), 30: Fraction(30)}
"""Film frames a second by the number that the file writes: 29 stands for 29.97 (RP-001)."""

BEAT_PLACES = 2
"""A beat is given to so many decimal places; what rounds to the next bar line stands on it."""

TempoChange: TypeAlias = tuple[int, int]
"""A tick, and the microseconds a quarter from there on."""


@dataclass(frozen=True, slots=True)
class TimeSignature:
    """From ``tick`` on a bar has ``beats`` beats, each a 1/``unit`` note."""

    tick: int
    beats: int
    unit: int


COMMON_TIME = TimeSignature(0, 4, 4)


@dataclass(frozen=True, slots=True)
class Division:
    """How a file counts: ticks a quarter note, or ticks a second.

    Parameters
    ----------
    ticks
        More than 0.
    is_seconds
        The file counts in film frames, so a tick has a length of its own, whatever the tempo, and
        there are no bars.
    """

    ticks: Fraction
    is_seconds: bool = False

    @staticmethod
    def of_word(word: int) -> Division | None:
        """Read the 16-bit word of the header; None where it means nothing.

        Examples
        --------
        >>> Division.of_word(480)
        Division(ticks=Fraction(480, 1), is_seconds=False)
        >>> Division.of_word(0xE728), Division.of_word(0)
        (Division(ticks=Fraction(1000, 1), is_seconds=True), None)
        """
        if word < 0x8000:
            return Division(Fraction(word)) if word else None
        frames, parts = FRAMES_A_SECOND.get(256 - (word >> 8)), word & 0xFF
        return Division(frames * parts, is_seconds=True) if frames and parts else None


@dataclass(frozen=True, slots=True)
class TempoMap:
    """From ticks to seconds.

    Parameters
    ----------
    division
        How the file counts. Where it counts in seconds, tempos say nothing.
    tempos
        By tick, ascending; of several at one tick the last one holds. None has 0 microseconds.

    Examples
    --------
    Two quarters at 120 a minute, then one at 60:

    >>> times = TempoMap(Division(Fraction(480)), ((960, 1_000_000),))
    >>> times.seconds(960), times.seconds(1440)
    (1.0, 2.0)
    """

    division: Division
    tempos: tuple[TempoChange, ...] = ()
    _starts: list[int] = field(init=False, repr=False, compare=False)
    _tempos: list[int] = field(init=False, repr=False, compare=False)
    _sums: list[int] = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        """Sum ticks times microseconds up to each change."""
        usual = MICROSECONDS if self.division.is_seconds else USUAL_TEMPO
        changes = {0: usual} if self.division.is_seconds else {0: usual, **dict(self.tempos)}
        starts, sums = sorted(changes), [0]
        for before, after in pairwise(starts):
            sums.append(sums[-1] + (after - before) * changes[before])
        object.__setattr__(self, "_starts", starts)
        object.__setattr__(self, "_tempos", [changes[start] for start in starts])
        object.__setattr__(self, "_sums", sums)

    def seconds(self, tick: int) -> float:
        """Give the time of a tick, from the start of the file."""
        at = bisect_right(self._starts, tick) - 1
        total = self._sums[at] + (tick - self._starts[at]) * self._tempos[at]
        ticks = self.division.ticks
        return total * ticks.denominator / (MICROSECONDS * ticks.numerator)


class BarMap:
    """From ticks to bars and beats.

    A time signature that comes inside a bar ends it: a new bar begins there.

    Parameters
    ----------
    ticks_a_quarter
        More than 0.
    signatures
        By tick, ascending; of several at one tick the last one holds. 4/4 before the first.

    Examples
    --------
    Two bars of 4/4, then 9/8; the last beat of the third bar:

    >>> bars = BarMap(480, [TimeSignature(3840, 9, 8)])
    >>> bars.place(0), bars.place(3600), bars.place(3840 + 8 * 240)
    ((1, 1.0), (2, 4.5), (3, 9.0))
    """

    def __init__(self, ticks_a_quarter: int, signatures: Sequence[TimeSignature] = ()) -> None:
        self._whole = 4 * ticks_a_quarter
        by_tick = {signature.tick: signature for signature in (COMMON_TIME, *signatures)}
        self._signatures = [by_tick[tick] for tick in sorted(by_tick)]
        self._starts = [signature.tick for signature in self._signatures]
        self._first_bars = [1]
        for one, following in pairwise(self._signatures):
            units, bar_units = (following.tick - one.tick) * one.unit, one.beats * self._whole
            self._first_bars.append(self._first_bars[-1] + -(-units // bar_units))

    def place(self, tick: int) -> tuple[int, float]:
        """Give the bar, from 1, and the beat in it, from 1, of a tick."""
        at = bisect_right(self._starts, tick) - 1
        signature = self._signatures[at]
        units = (tick - signature.tick) * signature.unit
        bars, rest = divmod(units, signature.beats * self._whole)
        beat = round(1 + rest / self._whole, BEAT_PLACES)
        bar = self._first_bars[at] + bars
        return (bar, beat) if beat < signature.beats + 1 else (bar + 1, 1.0)
