"""The one pitch of a note whose key is bent while it sounds: the pitch where it rests.

The rule:

- The note is where it stayed longest, and the later a stay, the more it counts: a moment weighs as
  much as the time since the key went down. So a slide is one note at its goal, and a wheel that is
  let go at the very end of a note takes nothing away.
- Stays within `NEAR_CENTS` of each other are one place; the note is the median of its time there.
  So a vibrato is the pitch round which it swings.
- The pitch that was struck has a start of `HEAD_S`: a note does not jump at the first wobble.
- A bend within `EARLY_S` of the key is part of striking it: some surfaces send it just after.

A path grows with each bend and is small whatever the number of bends: time is kept by places
`PLACE_CENTS` wide. What it says depends on the bends and their times alone, not on how often it is
asked.
"""

from __future__ import annotations

from bisect import bisect_left, bisect_right
from dataclasses import dataclass, field, replace
from itertools import accumulate
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Mapping

    from melodycoach.core.note import InputKind

NEAR_CENTS = 50.0
"""Pitches so near each other are one place: a vibrato of half a semitone either way rests."""

HEAD_S = 0.1
"""The pitch that was struck counts as if it had sounded so long before the key went down."""

EARLY_S = 0.01
"""A bend so soon after the key went down belongs to the stroke."""

PLACE_CENTS = 5.0
"""How finely the time spent at each pitch is kept; the pitch itself stays exact."""

MOST_PLACES = 256
"""With more places than this, those where the note stayed least are forgotten."""


@dataclass(frozen=True, slots=True)
class Place:
    """A pitch at which a note has stayed.

    Parameters
    ----------
    pitch_cents, kind
        Those of the longest single stay.
    longest, weight
        How much that stay and all stays there count, in seconds squared.
    """

    pitch_cents: float
    kind: InputKind
    longest: float
    weight: float


@dataclass(frozen=True, slots=True)
class PitchPath:
    """How a sounding note has moved.

    Parameters
    ----------
    struck_s
        When its key went down.
    pitch_cents, kind, since_s
        Where it is now, and since when.
    places
        Where it was before.
    """

    struck_s: float
    pitch_cents: float
    kind: InputKind
    since_s: float
    places: Mapping[int, Place] = field(default_factory=dict)


def strike(pitch_cents: float, kind: InputKind, at_s: float) -> PitchPath:
    """Begin the path of a note."""
    return PitchPath(at_s, pitch_cents, kind, at_s - HEAD_S)


def bend(path: PitchPath, pitch_cents: float, kind: InputKind, at_s: float) -> PitchPath:
    """Give the path after one more bend."""
    if at_s - path.struck_s <= EARLY_S:
        return strike(pitch_cents, kind, path.struck_s)
    places = dict(path.places)
    number = round(path.pitch_cents / PLACE_CENTS)
    places[number] = _stayed(path, places.get(number), at_s)
    if len(places) > MOST_PLACES:
        heaviest = sorted(places, key=lambda place: places[place].weight)[-MOST_PLACES // 2 :]
        places = {place: places[place] for place in heaviest}
    return replace(path, pitch_cents=pitch_cents, kind=kind, since_s=at_s, places=places)


def _stayed(path: PitchPath, known: Place | None, until_s: float) -> Place:
    """Put the stay that ends now to the earlier ones at the same place."""
    origin_s = path.struck_s - HEAD_S
    weight = ((until_s - origin_s) ** 2 - (path.since_s - origin_s) ** 2) / 2
    stay = Place(path.pitch_cents, path.kind, weight, weight)
    if known is None:
        return stay
    longest = stay if stay.longest >= known.longest else known
    return replace(longest, weight=known.weight + weight)


def rests_at(path: PitchPath, at_s: float) -> tuple[float, InputKind]:
    """Give the pitch of the note as far as it has sounded, in cents, and its kind.

    Examples
    --------
    >>> from melodycoach.core.note import InputKind
    >>> path = strike(7100.0, InputKind.KEYS, 1.0)
    >>> path = bend(path, 7000.0, InputKind.TUNED, 1.2)
    >>> rests_at(path, 1.25)[0], rests_at(path, 1.5)[0]
    (7100.0, 7000.0)
    """
    if not path.places:
        return path.pitch_cents, path.kind
    number = round(path.pitch_cents / PLACE_CENTS)
    places = {**path.places, number: _stayed(path, path.places.get(number), at_s)}
    rising = sorted(places.values(), key=lambda place: place.pitch_cents)
    pitches = [place.pitch_cents for place in rising]
    until = [0.0, *accumulate(place.weight for place in rising)]
    nearby = [
        (bisect_left(pitches, cents - NEAR_CENTS), bisect_right(pitches, cents + NEAR_CENTS))
        for cents in pitches
    ]
    first, stop = max(nearby, key=lambda span: until[span[1]] - until[span[0]])
    half = (until[first] + until[stop]) / 2
    rests = rising[min(max(bisect_left(until, half) - 1, first), stop - 1)]
    return rests.pitch_cents, rests.kind
