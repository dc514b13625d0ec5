"""Answers held against labels: what they add up to, and the figures worked out from that.

Conventions
-----------
Modes are counted by their place in the list of candidates. Confusion matrices have labels as rows
and answers as columns. A share of nothing is NaN.

Metrics
-------
*Accuracy*: share of melodies whose likeliest mode is the label. *Macro-F1*: mean over the modes
that occur as labels of 2PR / (P + R) = 2·right / (labelled + answered). *Expected calibration
error*: ten bins of equal width by the probability of the likeliest mode; the mean over the bins,
weighted by how many melodies fall into each, of |share right - mean probability|. *Log loss*: mean
of -ln(probability of the label), in nats.

References
----------
Guo, Pleiss, Sun, Weinberger, *On calibration of modern neural networks*, 2017: the calibration
error. Manning, Raghavan, Schütze, *Introduction to information retrieval*, 2008, chapter 13:
macro-averaged F1. (Both from memory.)
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from melodycoach.core.arrays import sealed

if TYPE_CHECKING:
    from collections.abc import Iterable

    from melodycoach.core.arrays import FloatArray, IntArray

N_BINS = 10
"""Bins of the reliability table, of equal width from 0 to 1."""

LISTED = 3
"""How many modes a listener would look at: the label among so many is counted too."""

LEAST_PROBABILITY = 1e-12
"""What a probability of 0 counts as in the log loss."""


@dataclass(frozen=True, slots=True)
class Guess:
    """What the model said at one checkpoint.

    Parameters
    ----------
    answer
        Place of the likeliest mode in ``model.modes``.
    probability
        Its probability.
    label_probability
        The probability of the labelled mode.
    label_rank
        How many modes were likelier than the labelled one.
    decided
        The model named the mode, and did not say *undecided*.
    final_found
        The leading hypothesis stands on the labelled final, whatever the octave; None where the
        final is not asked for or not labelled.
    """

    answer: int
    probability: float
    label_probability: float
    label_rank: int
    decided: bool
    final_found: bool | None = None


@dataclass(frozen=True, slots=True)
class Verdict:
    """One melody: the place of its label, its length, a guess for each checkpoint and for the end."""

    label: int
    n_notes: int
    guesses: tuple[Guess, ...]


@dataclass(frozen=True, eq=False, slots=True)
class Tally:
    """What the guesses of one checkpoint add up to.

    Parameters
    ----------
    confusion : int64, shape (n_modes, n_modes)
        Melodies by label (row) and answer (column).
    bin_count, bin_right : int64, shape (N_BINS,)
        Melodies, and those answered rightly, by the probability of the answer.
    bin_probability : float64, shape (N_BINS,)
        Sum of those probabilities.
    n_listed
        Melodies whose label is among the `LISTED` likeliest modes.
    n_decided, n_decided_right
        Melodies for which the model named a mode, and named the right one.
    n_finals, n_finals_found, n_both_found
        Melodies whose final was asked for, found, and found with the right mode.
    loss_nats
        Sum of -ln(probability of the label).
    """

    confusion: IntArray
    bin_count: IntArray
    bin_right: IntArray
    bin_probability: FloatArray
    n_listed: int
    n_decided: int
    n_decided_right: int
    n_finals: int
    n_finals_found: int
    n_both_found: int
    loss_nats: float

    @property
    def n(self) -> int:
        """Number of melodies."""
        return int(self.confusion.sum())

    @property
    def accuracy(self) -> float:
        """Share of melodies whose likeliest mode is the label."""
        return share(int(np.trace(self.confusion)), self.n)

    @property
    def accuracy_error(self) -> float:
        """Standard error of the accuracy: sqrt(p (1 - p) / n)."""
        return math.sqrt(self.accuracy * (1 - self.accuracy) / self.n) if self.n else math.nan

    @property
    def macro_f1(self) -> float:
        """Mean F1 over the modes that occur as labels."""
        return macro_f1(self.confusion)

    @property
    def calibration_error(self) -> float:
        """Expected calibration error of the likeliest mode's probability."""
        gaps = np.abs(self.bin_right - self.bin_probability)  # count · |share right - mean probability|
        return share(float(gaps.sum()), self.n)

    @property
    def listed(self) -> float:
        """Share of melodies whose label is among the `LISTED` likeliest modes."""
        return share(self.n_listed, self.n)

    @property
    def undecided(self) -> float:
        """Share of melodies for which no mode was named."""
        return share(self.n - self.n_decided, self.n)

    @property
    def decided_accuracy(self) -> float:
        """Share of right answers among the melodies for which a mode was named."""
        return share(self.n_decided_right, self.n_decided)

    @property
    def log_loss(self) -> float:
        """Mean of -ln(probability of the label), in nats."""
        return share(self.loss_nats, self.n)

    @property
    def final_found(self) -> float:
        """Share of found finals among those that were asked for."""
        return share(self.n_finals_found, self.n_finals)

    @property
    def both_found(self) -> float:
        """Share of melodies with both mode and final right among the finals asked for."""
        return share(self.n_both_found, self.n_finals)

    @property
    def reliability(self) -> tuple[ReliabilityBin, ...]:
        """The reliability table, one row for each bin, empty ones included."""
        return tuple(
            ReliabilityBin(
                k / N_BINS,
                (k + 1) / N_BINS,
                int(count),
                share(float(self.bin_probability[k]), int(count)),
                share(float(self.bin_right[k]), int(count)),
            )
            for k, count in enumerate(self.bin_count)
        )


@dataclass(frozen=True, slots=True)
class ReliabilityBin:
    """One row of a reliability table: ``low`` ≤ probability < ``high`` (the last: ≤ 1).

    ``probability`` and ``accuracy`` are means over the ``n`` melodies, NaN when there are none.
    """

    low: float
    high: float
    n: int
    probability: float
    accuracy: float


@dataclass(frozen=True, slots=True)
class ConfusedPair:
    """Two modes (places, ``first`` < ``second``) and how often one was answered for the other.

    ``first_as_second`` counts melodies of the first that were named the second.
    """

    first: int
    second: int
    first_as_second: int
    second_as_first: int

    @property
    def n(self) -> int:
        """Mistakes either way."""
        return self.first_as_second + self.second_as_first


def share(part: float, whole: int) -> float:
    """Give how much of a whole a part is; a share of nothing is NaN."""
    return part / whole if whole else math.nan


def bin_of(probability: float) -> int:
    """Give the bin of a probability; 1 falls into the last.

    >>> bin_of(0.0), bin_of(0.3), bin_of(0.9999), bin_of(1.0)
    (0, 3, 9, 9)
    """
    # rounding first: 0.7 is a little under 7/10 in binary
    return min(int(round(probability * N_BINS, 9)), N_BINS - 1)


def macro_f1(confusion: IntArray) -> float:
    """Mean over the modes that occur as labels of 2·right / (labelled + answered).

    Parameters
    ----------
    confusion : int64, shape (n_modes, n_modes)
        Labels as rows, answers as columns.

    Examples
    --------
    Of two melodies of the first mode one is named rightly, one as the second, which has one
    melody, named rightly: (2·1 / (2+1) + 2·1 / (1+2)) / 2.

    >>> round(macro_f1(np.array([[1, 1], [0, 1]])), 3)
    0.667
    """
    labelled, answered = confusion.sum(axis=1), confusion.sum(axis=0)
    occurs = labelled > 0
    if not occurs.any():
        return math.nan
    return float(np.mean(2 * np.diag(confusion)[occurs] / (labelled + answered)[occurs]))


def confused_pairs(confusion: IntArray, count: int = 10) -> tuple[ConfusedPair, ...]:
    """Give the pairs of modes with most mistakes between them, the most first."""
    either = np.triu(confusion + confusion.T, 1)
    pairs = [
        ConfusedPair(int(a), int(b), int(confusion[a, b]), int(confusion[b, a]))
        for a, b in np.argwhere(either > 0)
    ]
    return tuple(sorted(pairs, key=lambda pair: (-pair.n, pair.first, pair.second))[:count])


def tally(verdicts: Iterable[Verdict], n_modes: int, n_checkpoints: int) -> tuple[Tally, ...]:
    """Count the guesses of every checkpoint.

    The verdicts are taken one by one and not kept, so memory does not grow with them.

    Parameters
    ----------
    verdicts
        Each with ``n_checkpoints`` guesses.
    n_modes
        Number of candidates.
    n_checkpoints
        Length of the answer.
    """
    counts = [_Counts(n_modes) for _ in range(n_checkpoints)]
    for verdict in verdicts:
        for count, guessed in zip(counts, verdict.guesses, strict=True):
            count.add(verdict.label, guessed)
    return tuple(count.tally() for count in counts)


class _Counts:
    """A tally in the making; lives only inside `tally`."""

    def __init__(self, n_modes: int) -> None:
        self.confusion = np.zeros((n_modes, n_modes), np.int64)
        self.bin_count = np.zeros(N_BINS, np.int64)
        self.bin_right = np.zeros(N_BINS, np.int64)
        self.bin_probability = np.zeros(N_BINS, np.float64)
        self.n_listed = self.n_decided = self.n_decided_right = 0
        self.n_finals = self.n_finals_found = self.n_both_found = 0
        self.loss_nats = 0.0

    def add(self, label: int, guessed: Guess) -> None:
        right = guessed.answer == label
        in_bin = bin_of(guessed.probability)
        self.confusion[label, guessed.answer] += 1
        self.bin_count[in_bin] += 1
        self.bin_right[in_bin] += right
        self.bin_probability[in_bin] += guessed.probability
        self.n_listed += guessed.label_rank < LISTED
        self.n_decided += guessed.decided
        self.n_decided_right += guessed.decided and right
        if guessed.final_found is not None:
            self.n_finals += 1
            self.n_finals_found += guessed.final_found
            self.n_both_found += guessed.final_found and right
        self.loss_nats -= math.log(max(guessed.label_probability, LEAST_PROBABILITY))

    def tally(self) -> Tally:
        return Tally(
            sealed(self.confusion),
            sealed(self.bin_count),
            sealed(self.bin_right),
            sealed(self.bin_probability),
            self.n_listed,
            self.n_decided,
            self.n_decided_right,
            self.n_finals,
            self.n_finals_found,
            self.n_both_found,
            self.loss_nats,
        )
