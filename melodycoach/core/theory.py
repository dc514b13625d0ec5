"""From the definition of a mode to the probabilities that it implies, with no melody counted.

Conventions
-----------
The octave is folded: a degree is taken modulo the divisions of the tone system, counted upwards
from the final. A mode gives two distributions over the folded units, one for notes that move on
and one for notes that the line rests on (`MOVING`, `RESTING`), and beside them a distribution over
the unfolded compass, the *register*. All arrays are float64 and hold probabilities.

References
----------
docs/mathematics.md, "From a definition to probabilities".
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from melodycoach.core.arrays import sealed

if TYPE_CHECKING:
    from collections.abc import Iterable

    from melodycoach.core.arrays import FloatArray
    from melodycoach.core.mode import Mode
    from melodycoach.core.parameters import FunctionWeights, Hearing, ScoringParameters
    from melodycoach.core.pitch import ToneSystem

MOVING, RESTING = 0, 1
"""Rows of every table that tells moving from resting notes."""

OCTAVES_BELOW, OCTAVES_ABOVE = 1, 2
"""Compass of the register around the final; pitches beyond it count as its ends."""

_TINY = 1e-300
"""Stands in for a bell that has vanished to 0, so that nothing is divided by 0."""


@dataclass(frozen=True, eq=False, slots=True)
class FoldedScale:
    """The degrees of a mode within one octave, and how likely each is.

    Parameters
    ----------
    book, played : float64, shape (n_degrees,), units above the final
        Where each degree is written and where it is usually played.
    weight : float64, shape (2, n_degrees)
        Share of each degree among moving and among resting notes; both rows sum to 1.
    """

    book: FloatArray
    played: FloatArray
    weight: FloatArray


def fold_scale(mode: Mode, parameters: ScoringParameters, system: ToneSystem) -> FoldedScale:
    """Fold a mode's degrees into one octave and weigh each by what it does.

    A degree that stands closer than ``same_degree_cents`` to one already taken is that one; the
    order is: rising form, falling form, occasional degrees, leading tones and degrees just below
    the final.
    """
    size = system.divisions
    limit = parameters.below_limit_cents / system.unit_cents
    near = parameters.same_degree_cents / system.unit_cents
    margin = parameters.opening_margin_cents / system.unit_cents
    deviation = {degree % size: played - degree for degree, played in mode.played.items()}
    degrees: list[float] = []
    base: list[str] = []
    groups: tuple[tuple[str, Iterable[int]], ...] = (
        ("main", mode.rising),
        ("falling", mode.falling),
        ("passing", mode.passing),
        ("below", (*mode.leading, *(degree for degree in mode.below if degree >= -limit))),
    )
    for kind, group in groups:
        for degree in group:
            folded = degree % size
            if not degrees or abs(apart(np.array(degrees), folded, size)).min() >= near:
                degrees.append(folded)
                base.append(kind)
    book = np.array(degrees, dtype=np.float64)
    played = book + np.array([deviation.get(int(degree), 0.0) for degree in degrees])

    def nearest(degree: float) -> int:
        return int(abs(apart(book, degree % size, size)).argmin())

    final = nearest(0)
    dominants = list(dict.fromkeys(nearest(degree) for degree in mode.dominants))
    octave_leads = bool(dominants) and dominants[0] == final
    dominants = [at for at in dominants if at != final]
    suspended = {nearest(degree) for degree in mode.suspended} - {final, *dominants}
    low, high = mode.opening[0] - margin, mode.opening[1] + margin
    octaves = size * np.arange(-OCTAVES_BELOW - 1, OCTAVES_ABOVE + 1)
    copies = book[:, None] + octaves[None, :]
    opening = ((copies >= low) & (copies <= high)).any(axis=1)

    def weigh(weights: FunctionWeights) -> FloatArray:
        weight = np.array([getattr(weights, kind) for kind in base], dtype=np.float64)
        weight[final] *= weights.final * (weights.upper_final if octave_leads else 1.0)
        for at, factor in zip(dominants, (weights.dominant, weights.second_dominant), strict=False):
            weight[at] *= factor
        for at in suspended:
            weight[at] *= weights.suspended
        weight[opening] *= weights.opening
        return np.asarray(weight / weight.sum(), dtype=np.float64)

    weight = np.stack([weigh(parameters.moving), weigh(parameters.resting)])
    return FoldedScale(sealed(book), sealed(played), sealed(weight))


def apart(positions: FloatArray, degree: FloatArray | float, size: int) -> FloatArray:
    """Give the signed way round the octave from a degree to each position, in [-size/2, size/2).

    >>> apart(np.array([1.0, 30.0]), 52.0, 53).tolist()
    [2.0, -22.0]
    """
    return np.asarray((positions - degree + size / 2) % size - size / 2, dtype=np.float64)


_NARROWEST = 1e-6
"""A blur of less than this, in units, is none."""


def circular_blur(positions: FloatArray, sigma: float, size: int) -> FloatArray:
    """Spread positions over the units of an octave by a Gaussian that wraps around.

    Parameters
    ----------
    positions : float64, shape (n,)
        In units; may be fractional.
    sigma
        Standard deviation in units.
    size
        Units in the octave.

    Returns
    -------
    float64, shape (n, size)
        Each row sums to 1.
    """
    away = apart(np.arange(size, dtype=np.float64)[None, :], positions[:, None], size)
    bell = np.exp(-0.5 * (away / max(sigma, _NARROWEST)) ** 2) + _TINY
    return np.asarray(bell / bell.sum(axis=1, keepdims=True), dtype=np.float64)


def folded_distributions(scale: FoldedScale, hearing: Hearing, system: ToneSystem) -> FloatArray:
    """Give how likely each folded unit is to be heard, moving and resting.

    Returns
    -------
    float64, shape (2, divisions)
        Unit 0 is the final; each row sums to 1.
    """
    size, sigma = system.divisions, hearing.blur_cents / system.unit_cents
    bells = hearing.book_share * circular_blur(scale.book, sigma, size)
    bells += (1 - hearing.book_share) * circular_blur(scale.played, sigma, size)
    clean = scale.weight @ bells
    return np.asarray((1 - hearing.noise) * clean + hearing.noise / size, dtype=np.float64)


def compass(system: ToneSystem) -> tuple[int, int]:
    """Give the lowest and the highest unit of the register, counted from the final."""
    return -OCTAVES_BELOW * system.divisions, OCTAVES_ABOVE * system.divisions


def register_distribution(
    mode: Mode, hearing: Hearing, parameters: ScoringParameters, system: ToneSystem
) -> FloatArray:
    """Give how likely each unit of the compass is, octave by octave.

    Returns
    -------
    float64, shape (units of the compass,)
        From `compass`'s lowest unit upwards; sums to 1.
    """
    lowest, highest = compass(system)
    octave = system.divisions
    degrees = sorted({*mode.below, *mode.leading, *mode.rising, *mode.falling, *mode.passing, *mode.above})
    main = set(mode.rising)
    margin = parameters.opening_margin_cents / system.unit_cents
    low, high = mode.opening[0] - margin, mode.opening[1] + margin
    under = [degree for degree in degrees if degree < 0]
    over = [degree for degree in degrees if degree > octave]
    deviation = {degree % octave: played - degree for degree, played in mode.played.items()}
    units = np.arange(lowest, highest + 1, dtype=np.float64)
    sigma = hearing.blur_cents / system.unit_cents
    total = np.zeros(len(units))
    for degree in degrees:
        weight = parameters.register_main if degree in main else 1.0
        weight *= parameters.register_final if degree == 0 else 1.0
        weight *= parameters.register_dominant if degree in mode.dominants[:1] else 1.0
        weight *= parameters.register_opening if low <= degree <= high else 1.0
        if degree < 0:
            weight *= parameters.register_decay ** (len(under) - 1 - under.index(degree))
        elif degree > octave:
            weight *= parameters.register_decay ** (over.index(degree) + 1)
        place = degree + (1 - hearing.book_share) * deviation.get(degree % octave, 0.0)
        bell = np.exp(-0.5 * ((units - place) / sigma) ** 2)
        total += weight * bell / max(bell.sum(), _TINY)
    total /= total.sum()
    return np.asarray(
        (1 - parameters.register_noise) * total + parameters.register_noise / len(units), dtype=np.float64
    )
