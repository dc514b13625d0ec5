"""N-grams over folded degrees: counting them, smoothing them, and the table that scores them.

Conventions
-----------
A *token* is a folded unit above the final, 0 to ``divisions - 1``. A *context* is the tuple of the
tokens before a note, the newest last, each moved to the nearest degree of the mode
(`snap_to_scale`), so that ornaments and intonation do not scatter the counts. Order k means
contexts of at most k - 1 tokens; the longest context that was counted is used. Each note counts
with its weight, so counts are floats.

The smoothing is a chain of Dirichlet priors: order by order

    P_k(token | context) = (C_k(context, token) + m_k P_(k-1)) / (C_k(context) + m_k)

where P_0 is what theory implies and m_k a pseudo-weight. A context that was never counted
leaves P_(k-1) as it is. Each row sums to 1 over the octave.

References
----------
The chain: D. MacKay and L. Bauman Peto, "A hierarchical Dirichlet language model" (1995), with
fixed masses in the place of fitted ones.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from types import MappingProxyType
from typing import TYPE_CHECKING, TypeAlias

import numpy as np

from melodycoach.core.arrays import sealed
from melodycoach.core.theory import MOVING, RESTING, apart, circular_blur

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping, Sequence

    from melodycoach.core.arrays import FloatArray, IntArray
    from melodycoach.core.theory import FoldedScale

Context: TypeAlias = tuple[int, ...]


@dataclass(frozen=True, slots=True)
class Token:
    """A note as counts see it: folded unit, weight, and whether the line rests on it."""

    unit: int
    weight: float
    rests: bool


@dataclass(frozen=True, eq=False, slots=True)
class ModeCounts:
    """What was counted in the melodies of one mode.

    Parameters
    ----------
    single : float64, shape (2, divisions)
        Weight of each token among moving and among resting notes.
    after
        Weight of each token after each context of one token or more; arrays of shape (divisions,).
    n_melodies
        How many melodies were counted.
    """

    single: FloatArray
    after: Mapping[Context, FloatArray]
    n_melodies: int

    @property
    def order(self) -> int:
        """Length of the longest n-gram counted."""
        return 1 + max((len(context) for context in self.after), default=0)


@dataclass(frozen=True, eq=False, slots=True)
class Counts:
    """Counts for any number of modes, by mode id; a mode that is missing has none."""

    by_mode: Mapping[str, ModeCounts] = field(default_factory=lambda: MappingProxyType({}))

    @property
    def order(self) -> int:
        """Length of the longest n-gram counted in any mode."""
        return max((counts.order for counts in self.by_mode.values()), default=1)


def snap_to_scale(scale: FoldedScale, near_units: float, divisions: int) -> IntArray:
    """Give for each folded unit the written degree that it stands for in a context.

    A unit further than ``near_units`` from every written and every played degree is foreign to the
    mode and stands for itself.

    Returns
    -------
    int64, shape (divisions,)
    """
    units = np.arange(divisions, dtype=np.float64)
    written = np.concatenate([scale.book, scale.book])
    places = np.concatenate([scale.book, scale.played])
    away = abs(apart(units[:, None], places[None, :], divisions))
    nearest = away.argmin(axis=1)
    snapped = np.where(away.min(axis=1) <= near_units, written[nearest].round(), units)
    return np.asarray(snapped, dtype=np.int64) % divisions


def count_tokens(
    melodies: Iterable[Sequence[Token]], snap: IntArray, order: int, start: ModeCounts | None = None
) -> ModeCounts:
    """Count the n-grams of melodies of one mode, on top of what was counted before.

    Parameters
    ----------
    melodies
        Each a sequence of tokens; an n-gram never crosses from one melody to the next.
    snap : int64, shape (divisions,)
        From `snap_to_scale`.
    order
        Length of the longest n-gram, 1 or more.
    start
        Counts to add to; they are left unchanged.

    Examples
    --------
    >>> line = [Token(0, 1.0, False), Token(9, 0.5, False), Token(0, 1.0, True)]
    >>> counts = count_tokens([line], np.arange(53), order=2)
    >>> float(counts.after[(0,)][9]), float(counts.single[1, 0])
    (0.5, 1.0)
    """
    if order < 1:
        raise ValueError(f"order {order!r}, expected 1 or more")
    divisions = len(snap)
    single = np.zeros((2, divisions)) if start is None else start.single.copy()
    after = {} if start is None else {context: row.copy() for context, row in start.after.items()}
    n_melodies = 0 if start is None else start.n_melodies
    for melody in melodies:
        n_melodies += 1
        context: Context = ()
        for token in melody:
            single[RESTING if token.rests else MOVING, token.unit] += token.weight
            for length in range(1, len(context) + 1):
                row = after.setdefault(context[-length:], np.zeros(divisions))
                row[token.unit] += token.weight
            context = (*context, int(snap[token.unit]))[-(order - 1) :] if order > 1 else ()
    return ModeCounts(sealed(single), MappingProxyType({c: sealed(r) for c, r in after.items()}), n_melodies)


@dataclass(frozen=True, eq=False, slots=True)
class NgramTable:
    """Probabilities of the next token in every context, for several modes at once.

    A *row* is one context of one mode; the rows of a mode follow each other, its empty context
    first.

    Parameters
    ----------
    probability : float64, shape (2, n_rows, divisions)
        Moving and resting; each row sums to 1.
    root : int64, shape (n_modes,)
        Row of each mode's empty context.
    next_row : int64, shape (n_rows, divisions)
        Row of the longest known suffix once a token has followed the row's context.
    row_by_context
        For each mode, context to row.
    """

    probability: FloatArray
    root: IntArray
    next_row: IntArray
    row_by_context: tuple[Mapping[Context, int], ...]

    def row(self, mode_index: int, context: Context) -> int:
        """Find the row of the longest suffix of a snapped context that the mode knows."""
        rows = self.row_by_context[mode_index]
        for start in range(len(context)):
            if context[start:] in rows:
                return rows[context[start:]]
        return rows[()]


def build_table(
    priors: Sequence[FloatArray],
    counts: Sequence[ModeCounts | None],
    snaps: Sequence[IntArray],
    masses: Sequence[float],
    blur_units: float,
    order: int,
) -> NgramTable:
    """Interpolate counts with theory and lay the result out for scoring.

    Parameters
    ----------
    priors : float64, shape (2, divisions) for each mode
        What theory implies.
    counts
        For each mode; None where nothing was counted.
    snaps : int64, shape (divisions,) for each mode
        From `snap_to_scale`.
    masses
        Pseudo-weight of the prior at order 1, 2, …; the last one serves all higher orders.
    blur_units
        Standard deviation by which counted tokens are spread; 0 leaves them sharp.
    order
        Longest n-gram to use.
    """
    divisions = priors[0].shape[1]
    spread = np.eye(divisions)
    if blur_units > 0:
        spread = circular_blur(np.arange(divisions, dtype=np.float64), blur_units, divisions)
    rows: list[FloatArray] = []
    roots: list[int] = []
    jumps: list[IntArray] = []
    indices: list[Mapping[Context, int]] = []
    for prior, counted, snap in zip(priors, counts, snaps, strict=True):
        index: dict[Context, int] = {(): len(rows)}
        roots.append(len(rows))
        if counted is None:
            rows.append(prior)
        else:
            rows.append(_first_order(prior, counted.single @ spread, masses[0]))
            known = sorted((c for c in counted.after if len(c) < order), key=lambda c: (len(c), c))
            for context in known:
                shorter = rows[_longest(index, context[1:])]
                mass = masses[min(len(context), len(masses) - 1)]
                row = counted.after[context] @ spread
                index[context] = len(rows)
                rows.append((row + mass * shorter) / (row.sum() + mass))
        jumps += [jump[snap] for jump in _jumps(index, divisions)]
        indices.append(MappingProxyType(index))
    probability = np.ascontiguousarray(np.stack(rows, axis=1))
    next_row = np.stack(jumps)
    root = np.array(roots, dtype=np.int64)
    return NgramTable(sealed(probability), sealed(root), sealed(next_row), tuple(indices))


def _first_order(prior: FloatArray, single: FloatArray, mass: float) -> FloatArray:
    """Interpolate the single tokens: each role leans on theory, half by way of both roles together.

    Few resting notes are counted, so they borrow from all notes before they borrow from theory.
    """
    both = (single.sum(axis=0) + mass * prior.mean(axis=0)) / (single.sum() + mass)
    each = single.sum(axis=1, keepdims=True)
    own = (single + mass * prior) / (each + mass)
    base = 0.5 * both + 0.5 * own
    return np.asarray((single + mass * base) / (each + mass), dtype=np.float64)


def _jumps(index: Mapping[Context, int], divisions: int) -> list[IntArray]:
    """Give for each context, and each snapped token that follows it, the row of what comes then.

    ``index`` holds shorter contexts first, so a context starts from the jumps of its own suffix.
    """
    followers: dict[Context, list[Context]] = {}
    for context in index:
        if context:
            followers.setdefault(context[:-1], []).append(context)
    root = index[()]
    jumps: list[IntArray] = []
    for context in index:
        jump = jumps[_longest(index, context[1:]) - root].copy() if context else np.full(divisions, root)
        for longer in followers.get(context, ()):
            jump[longer[-1]] = index[longer]
        jumps.append(jump)
    return jumps


def _longest(index: Mapping[Context, int], context: Context) -> int:
    while context not in index:
        context = context[1:]
    return index[context]
