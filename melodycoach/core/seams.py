"""How soon a change of mode is noticed: lines spliced from two melodies, and unspliced ones.

The *seam* is where the notes of one melody end and those of another, of another mode, begin. What
counts is the mode that the change filter announces: whether and when the announcement changes
after the seam, and how often it changes where there is no seam.

Conventions
-----------
A delay is the number of notes heard after the seam, the announcing one included. Melodies may
contain real modulations, so the false alarms are an upper bound.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from statistics import median
from typing import TYPE_CHECKING

from melodycoach.core.scorer import advance, announced, start

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from melodycoach.core.model import ScoringModel
    from melodycoach.core.note import Heard

SIDE_NOTES = 60
"""Notes on each side of a seam; an unspliced excerpt has as many as both sides."""


@dataclass(frozen=True, slots=True)
class Crossing:
    """One spliced line.

    Parameters
    ----------
    announced
        Place of the mode announced at the seam, or None.
    left_after
        Delay until another mode was announced than at the seam, or None.
    named_after
        Delay until the mode after the seam was announced, or None.
    """

    announced: int | None
    left_after: int | None
    named_after: int | None


def cross(model: ScoringModel, before: Sequence[Heard], after: Sequence[Heard], label_after: int) -> Crossing:
    """Hear a line with a seam; ``label_after`` is the place of the mode that follows it."""
    state = start(model)
    for note in before:
        state = advance(model, state, note)
    at_seam = announced(model, state)
    left_after = named_after = None
    for delay, note in enumerate(after, 1):
        state = advance(model, state, note)
        now = announced(model, state)
        if left_after is None and now is not None and now != at_seam:
            left_after = delay
        if named_after is None and now == label_after:
            named_after = delay
    return Crossing(at_seam, left_after, named_after)


def count_changes(model: ScoringModel, notes: Sequence[Heard]) -> int:
    """Count how often one announced mode is replaced by another in a line without a seam."""
    state = start(model)
    changes = 0
    last = announced(model, state)
    for note in notes:
        state = advance(model, state, note)
        now = announced(model, state)
        changes += last is not None and now is not None and now != last
        last = last if now is None else now
    return changes


@dataclass(frozen=True, slots=True)
class SeamFigures:
    """What spliced and unspliced lines add up to.

    Parameters
    ----------
    n_seams
        Spliced lines.
    n_noticed
        Those where the announcement changed within `SIDE_NOTES` after the seam.
    median_delay
        Of those, in notes; NaN when there are none.
    n_right_before
        Lines whose first mode was announced at the seam.
    n_named
        Of those, how many had the second mode announced within `SIDE_NOTES`.
    n_excerpts, n_excerpt_notes, n_false_alarms
        Unspliced excerpts, their notes, and the changes announced in them.
    seed
        Of the random choice of lines.
    """

    n_seams: int
    n_noticed: int
    median_delay: float
    n_right_before: int
    n_named: int
    n_excerpts: int
    n_excerpt_notes: int
    n_false_alarms: int
    seed: int = 0

    @property
    def noticed(self) -> float:
        """Share of seams that were noticed."""
        return _share(self.n_noticed, self.n_seams)

    @property
    def right_before(self) -> float:
        """Share of seams at which the first mode was announced."""
        return _share(self.n_right_before, self.n_seams)

    @property
    def named(self) -> float:
        """Share of second modes named, where the first one had been."""
        return _share(self.n_named, self.n_right_before)

    @property
    def false_alarms_per_100(self) -> float:
        """Changes announced in 100 notes without a seam."""
        return 100 * _share(self.n_false_alarms, self.n_excerpt_notes)


def _share(part: int, whole: int) -> float:
    return part / whole if whole else math.nan


def seam_figures(
    crossings: Iterable[tuple[int, Crossing]], changes: Iterable[tuple[int, int]], seed: int = 0
) -> SeamFigures:
    """Add up spliced lines and unspliced excerpts.

    Parameters
    ----------
    crossings
        The place of the mode before the seam, and what was heard.
    changes
        For each excerpt its number of notes and of changes.
    seed
        Kept with the figures.
    """
    lines, excerpts = tuple(crossings), tuple(changes)
    delays = [line.left_after for _, line in lines if line.left_after is not None]
    right = [line for label, line in lines if line.announced == label]
    return SeamFigures(
        n_seams=len(lines),
        n_noticed=len(delays),
        median_delay=float(median(delays)) if delays else math.nan,
        n_right_before=len(right),
        n_named=sum(line.named_after is not None for line in right),
        n_excerpts=len(excerpts),
        n_excerpt_notes=sum(n_notes for n_notes, _ in excerpts),
        n_false_alarms=sum(n_changes for _, n_changes in excerpts),
        seed=seed,
    )
