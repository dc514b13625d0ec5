"""What a pitch does in a mode: the degree that it stands for, and the function of that degree.

Conventions
-----------
A degree is *placed*: it stands in its own octave. Inside the octave over the final a mode has
exactly the degrees that it names there. Under the final and over the octave it has those that it
names and, beside them, the copies of the degrees of the octave.

A pitch stands for a degree when it lies within a tolerance of it, as written or as usually played
(`TOLERANCE_COMMAS`, by the kind of input). A key of a plain keyboard stands for every degree that
this key plays.
"""

from __future__ import annotations

from enum import StrEnum
from functools import lru_cache
from math import floor, inf
from typing import TYPE_CHECKING

from melodycoach.core.note import InputKind
from melodycoach.core.pitch import COMMA_CENTS, KEY_CENTS, key_of

if TYPE_CHECKING:
    from typing import TypeAlias

    from melodycoach.core.mode import Mode
    from melodycoach.core.pitch import ToneSystem

    _Places: TypeAlias = tuple[tuple[int, float], ...]

TOLERANCE_COMMAS = {InputKind.TYPED: 0.75, InputKind.TUNED: 1.5, InputKind.RECORDED: 2.0}
"""How far a pitch may lie from the degree that it stands for, as written or as played; plain keys are
compared as keys. What is typed is meant: a comma off is another perde."""


class Function(StrEnum):
    """What a degree does in its mode, the most telling thing first."""

    FINAL = "final"
    DOMINANT = "dominant"
    LEADING = "leading tone"
    SUSPENDED = "suspended cadence"
    FALLING = "falling form"
    PASSING = "passing colour"
    OPENING = "opening region"
    DEGREE = "degree"
    OUTSIDE = "not in the mode"


def tolerance_units(kind: InputKind, system: ToneSystem) -> float:
    """Give the tolerance of a kind of input in units; half a key for plain keys."""
    commas = TOLERANCE_COMMAS.get(kind)
    cents = KEY_CENTS / 2 if commas is None else commas * COMMA_CENTS
    return cents / system.unit_cents


def degrees_near(mode: Mode, units: float, divisions: int, reach: float) -> tuple[int, ...]:
    """Give the placed degrees within reach of a pitch, so many units above the final, the nearest first."""
    away = sorted((_distance(place, units), place[0]) for place in _placed(mode, units, divisions))
    return tuple(degree for distance, degree in away if distance <= reach)


def is_passing(mode: Mode, degree: int, divisions: int) -> bool:
    """Say whether a placed degree is a mere colour of the mode, in whatever octave."""
    own = {*mode.rising, *mode.falling, *mode.below, *mode.above}
    folded = {one % divisions for one in own}
    return degree not in own and degree % divisions in {one % divisions for one in mode.passing} - folded


def find_degree(
    mode: Mode, final_units: int, pitch_cents: float, kind: InputKind, system: ToneSystem
) -> int | None:
    """Give the placed degree that a pitch stands for, or None if it is none of the mode's.

    Parameters
    ----------
    mode, final_units
        The mode and where it stands, in units from A4.
    pitch_cents
        Cents on the MIDI scale.
    kind
        Where the pitch came from; it decides the tolerance.
    system
        The tone system of the pack.

    Returns
    -------
    int or None
        Units above the final. Of several degrees within the tolerance, the nearest; of several on
        one key of a plain keyboard, one that is no mere passing colour before one that is.
    """
    units = system.cents_to_units(pitch_cents) - final_units
    places = _placed(mode, units, system.divisions)
    if kind is InputKind.KEYS:
        key = key_of(pitch_cents)
        places = tuple(
            place
            for place in places
            if any(key_of(system.units_to_cents(final_units + at)) == key for at in place)
        )
        if not places:
            return None
        return min(places, key=lambda place: (place[0] in mode.passing, _distance(place, units)))[0]
    degree, away = _nearest(places, units)
    return degree if away <= tolerance_units(kind, system) else None


def meant_units(
    mode: Mode, final_units: int, pitch_cents: float, kind: InputKind, system: ToneSystem
) -> float:
    """Give where a pitch is meant to lie, in units from A4.

    A key of a plain keyboard stands for every pitch near it: it means the degree of the mode that
    lies on it. Any other pitch, and a key on which the mode has none, means itself.
    """
    degree = find_degree(mode, final_units, pitch_cents, kind, system) if kind is InputKind.KEYS else None
    return system.cents_to_units(pitch_cents) if degree is None else float(final_units + degree)


def function_of(mode: Mode, degree: int | None, divisions: int) -> Function:
    """Say what a placed degree does in its mode; None stands for a pitch outside the mode.

    Dominants and suspended cadences keep their function in other octaves; the leading tone is one
    only under the final; the octave of the final counts as the final unless it is a dominant.
    """
    if degree is None:
        return Function.OUTSIDE
    folded = degree % divisions
    if degree in mode.dominants:
        return Function.DOMINANT
    if folded == 0:
        return Function.FINAL
    if degree in mode.leading:
        return Function.LEADING
    if folded in {d % divisions for d in mode.dominants}:
        return Function.DOMINANT
    if folded in {d % divisions for d in mode.suspended}:
        return Function.SUSPENDED
    if degree in mode.falling and degree not in mode.rising:
        return Function.FALLING
    if degree in mode.passing:
        return Function.PASSING
    low, high = mode.opening
    return Function.OPENING if low <= degree <= high else Function.DEGREE


def _placed(mode: Mode, units: float, divisions: int) -> _Places:
    """Give every degree that could stand near a pitch, so many units above the final."""
    return _places_in_octave(
        mode.degrees,
        tuple(degree for degree in (*mode.rising, *mode.falling, *mode.passing) if 0 <= degree <= divisions),
        mode.below,
        mode.above,
        tuple(mode.played.items()),
        floor(units / divisions),
        divisions,
    )


@lru_cache(maxsize=1024)
def _places_in_octave(
    named: tuple[int, ...],
    inner: tuple[int, ...],
    below: tuple[int, ...],
    above: tuple[int, ...],
    played: tuple[tuple[int, float], ...],
    octave: int,
    divisions: int,
) -> _Places:
    """Give (degree, degree as played): those named, and their copies in an octave beside the first."""
    deviation = {degree: at - degree for degree, at in played}
    shifted = [(degree, 0) for degree in named]
    if octave:
        shifted += [(degree, octave * divisions) for degree in inner]
        outer, beyond = (above, octave - 1) if octave > 0 else (below, octave + 1)
        shifted += [(degree, beyond * divisions) for degree in outer]
    places = {
        degree + shift: degree + shift + deviation.get(degree, 0.0) for degree, shift in reversed(shifted)
    }
    return tuple(sorted(places.items()))


def _nearest(places: _Places, units: float) -> tuple[int, float]:
    """Give the nearest degree, as written or as played, and how far it is."""
    nearest, least = 0, inf
    for degree, played in places:
        away = abs(units - degree)
        if played != degree:
            away = min(away, abs(units - played))
        if away < least:
            nearest, least = degree, away
    return nearest, least


def _distance(place: tuple[int, float], units: float) -> float:
    return min(abs(units - place[0]), abs(units - place[1]))
