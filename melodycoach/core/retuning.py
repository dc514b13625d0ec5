"""Which twelve offsets put the keys of a keyboard on the degrees of a mode, and what does not fit.

A keyboard repeats one octave, so a key has one offset in all of them; a mode may want two of it.

Conventions
-----------
A key counts from 0, C. An offset is in cents from twelve equal keys to the octave, with A4 on 440 Hz
in its place, and lies within half a key.

- A degree belongs to the key nearest to where it sounds. Exactly between two it belongs to the key
  that is nearest to where it is written, and if that does not tell either, to the upper one.
- Of several degrees on one key the one that ranks first (`Rank`) keeps it; in one rank the one that
  is nearer to the key, then the lower one.
- A key on which no degree lies keeps its place.

References
----------
MIDI Tuning Standard, scale/octave tuning: twelve offsets for the keys C to B of every octave.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import IntEnum, StrEnum
from math import floor
from typing import TYPE_CHECKING

from melodycoach.core.pitch import KEY_CENTS, KEY_NAMES, OCTAVE_CENTS

if TYPE_CHECKING:
    from collections.abc import Iterable

    from melodycoach.core.mode import Mode
    from melodycoach.core.pitch import PitchNames, ToneSystem

KEYS = len(KEY_NAMES)

SAME_CENTS = 0.05
"""Two degrees whose offsets differ by less than this want the same of their key."""

_EXACTLY = 1e-6  # cents


class Intonation(StrEnum):
    """Which pitch a degree is given: the one it is written with, or the one it is usually played at."""

    WRITTEN = "written"
    PLAYED = "played"


def manner_words(intonation: Intonation) -> str:
    """Say which pitches the degrees have.

    >>> manner_words(Intonation.PLAYED), manner_words(Intonation.WRITTEN)
    ('as usually played', 'as written')
    """
    return "as usually played" if intonation is Intonation.PLAYED else "as written"


class Rank(IntEnum):
    """What a degree is in its mode, in the order in which degrees are served."""

    FINAL = 0
    DOMINANT = 1
    RISING = 2
    FALLING = 3
    LEADING = 4
    BEYOND = 5
    PASSING = 6


RANK_WORDS = {
    Rank.FINAL: "the final",
    Rank.DOMINANT: "the dominants",
    Rank.RISING: "the rising scale",
    Rank.FALLING: "the falling form",
    Rank.LEADING: "the leading tones",
    Rank.BEYOND: "the notes beyond the octave",
    Rank.PASSING: "the passing colours",
}


@dataclass(frozen=True, slots=True)
class Wish:
    """What a degree of the mode asks of its key.

    ``written_cents`` is where the degree is written, on the MIDI scale; ``offset_cents`` how far from the
    key it is to sound.
    """

    degree: int
    written_cents: float
    offset_cents: float
    rank: Rank


@dataclass(frozen=True, slots=True)
class RetunedKey:
    """One of the twelve keys: its offset, the degree that it serves (None: none), and those it does not."""

    key: int
    offset_cents: float
    served: Wish | None = None
    unserved: tuple[Wish, ...] = ()

    @property
    def name(self) -> str:
        """The key's name."""
        return KEY_NAMES[self.key]


@dataclass(frozen=True, slots=True)
class Retuning:
    """Twelve keys, C to B, on the degrees of a mode that stands on a final, in cents on the MIDI scale."""

    mode: Mode
    final_cents: float
    intonation: Intonation
    keys: tuple[RetunedKey, ...]

    @property
    def offsets(self) -> tuple[float, ...]:
        """The twelve offsets in cents, C to B."""
        return tuple(key.offset_cents for key in self.keys)


def retune(
    mode: Mode,
    system: ToneSystem,
    intonation: Intonation = Intonation.PLAYED,
    final_cents: float | None = None,
) -> Retuning:
    """Give every key its offset for a mode.

    Parameters
    ----------
    mode, system
        The mode, and the tone system of its pack.
    intonation
        As written, or as usually played.
    final_cents
        Where the mode stands, in cents on the MIDI scale; None: on its written final.
    """
    if final_cents is None:
        final_cents = system.units_to_cents(mode.final_units)
    wishes: list[list[Wish]] = [[] for _ in range(KEYS)]
    for degree in mode.degrees:
        key, wish = _wish(mode, degree, final_cents, system.unit_cents, intonation)
        wishes[key % KEYS].append(wish)
    keys = tuple(_served(key, _distinct(wished)) for key, wished in enumerate(wishes))
    return Retuning(mode, final_cents, intonation, keys)


def rank_of(mode: Mode, degree: int) -> Rank:
    """Say in which order a degree of a mode is served."""
    ranks = (
        (degree == 0, Rank.FINAL),
        (degree in mode.dominants, Rank.DOMINANT),
        (degree in mode.rising, Rank.RISING),
        (degree in mode.falling, Rank.FALLING),
        (degree in mode.leading, Rank.LEADING),
        (degree in (*mode.below, *mode.above), Rank.BEYOND),
    )
    return next((rank for is_so, rank in ranks if is_so), Rank.PASSING)


def octave_scale(
    mode: Mode, system: ToneSystem, intonation: Intonation = Intonation.PLAYED
) -> tuple[tuple[int, float], ...]:
    """Give the scale of a mode in one octave: degrees, each with its cents above the final, ascending.

    It holds the rising and the falling form and the leading tones, all within the octave over the
    final; the final itself and its octave are left out.
    """
    found: dict[int, float] = {}
    home = _units(mode, 0, intonation)
    for degree in (*mode.rising, *mode.falling, *mode.leading):
        cents = (_units(mode, degree, intonation) - home) * system.unit_cents % OCTAVE_CENTS
        taken = (0.0, OCTAVE_CENTS, *found.values())
        is_final = degree % system.divisions == 0
        if not is_final and all(abs(cents - one) >= SAME_CENTS for one in taken):
            found[degree % system.divisions] = cents
    return tuple(sorted(found.items(), key=lambda item: item[1]))


def conflict_sentences(retuning: Retuning, names: PitchNames) -> tuple[str, ...]:
    """Say of each degree that lost its key to another which one has it, why, and how it will sound."""
    return tuple(
        _conflict(key, key.served, lost, names)
        for key in retuning.keys
        if key.served is not None
        for lost in key.unserved
    )


def off_words(cents: float, system: ToneSystem) -> str:
    """Write how far a pitch is off, in cents and in units where the system's are finer than keys.

    >>> from melodycoach.core.pitch import COMMAS_53, SEMITONES_12
    >>> off_words(-22.6, COMMAS_53), off_words(34.0, COMMAS_53), off_words(34.0, SEMITONES_12)
    ('23 c (1 comma)', '34 c (1.5 commas)', '34 c')
    """
    size = f"{abs(cents):.0f} c"
    if system.divisions <= KEYS:
        return size
    units = f"{abs(cents) / system.unit_cents:.1f}".removesuffix(".0")
    return f"{size} ({units} {system.unit_name}{'' if units == '1' else 's'})"


def _wish(
    mode: Mode, degree: int, final_cents: float, unit_cents: float, intonation: Intonation
) -> tuple[int, Wish]:
    written = final_cents + degree * unit_cents
    sounds = final_cents + _units(mode, degree, intonation) * unit_cents
    key = _nearest_key(sounds, written)
    return key, Wish(degree, written, sounds - KEY_CENTS * key, rank_of(mode, degree))


def _units(mode: Mode, degree: int, intonation: Intonation) -> float:
    return mode.played_units(degree) if intonation is Intonation.PLAYED else float(degree)


def _nearest_key(sounds: float, written: float) -> int:
    """Give the key nearest to a pitch; of two equally near, the one on the side of the written pitch."""
    place = sounds / KEY_CENTS
    below = floor(place)
    if abs(place - below - 0.5) > _EXACTLY / KEY_CENTS:
        return floor(place + 0.5)
    return below if written < sounds - _EXACTLY else below + 1


def _distinct(wishes: Iterable[Wish]) -> list[Wish]:
    """Order wishes as they are served; of those that want the same the first stands for all."""
    found: list[Wish] = []
    for wish in sorted(wishes, key=lambda one: (one.rank, abs(one.offset_cents), one.degree)):
        if all(abs(wish.offset_cents - one.offset_cents) >= SAME_CENTS for one in found):
            found.append(wish)
    return found


def _served(key: int, wishes: list[Wish]) -> RetunedKey:
    if not wishes:
        return RetunedKey(key, 0.0)
    return RetunedKey(key, wishes[0].offset_cents, wishes[0], tuple(wishes[1:]))


def _conflict(key: RetunedKey, served: Wish, lost: Wish, names: PitchNames) -> str:
    away = served.offset_cents - lost.offset_cents
    return (
        f"{key.name}: {names.name(served.written_cents)} keeps the key ({_reason(served, lost)}); "
        f"{names.name(lost.written_cents)} sounds {off_words(away, names.system)} too "
        f"{'high' if away > 0 else 'low'} on it"
    )


def _reason(served: Wish, lost: Wish) -> str:
    if served.rank is lost.rank:
        return f"both are of {RANK_WORDS[served.rank]}, and it is nearer to the key"
    return f"{RANK_WORDS[served.rank]} comes before {RANK_WORDS[lost.rank]}"
