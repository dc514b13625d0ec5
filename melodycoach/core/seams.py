"""How soon a change of mode is noticed: lines spliced from two melodies, and unspliced ones.

The *seam* is where the notes of one melody end and those of another, of another mode, begin. What
counts is what the change filter announces: whether and when it says after the seam that the mode has
changed, and how often it says so where there is no seam; and which mode it then announces.

Conventions
-----------
A delay is the number of notes heard after the seam, the announcing one included. A first
announcement is no change, and so is another name for the same stretch: neither is noticed nor a false
alarm. Melodies may contain real modulations, so the false alarms are an upper bound.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from statistics import median
from typing import TYPE_CHECKING

from melodycoach.core.scorer import advance, announced, start
from melodycoach.core.tally import share

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
        Delay until a change was announced, or None.
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
        if left_after is None and state.changed_at == len(before) + delay:
            left_after = delay
        if named_after is None and announced(model, state) == label_after:
            named_after = delay
    return Crossing(at_seam, left_after, named_after)


@dataclass(frozen=True, slots=True)
class Excerpt:
    """One line without a seam.

    Parameters
    ----------
    n_notes
        Its length.
    n_changes
        How often a change was announced.
    changed_late
        One was after `SIDE_NOTES` notes: a seam there would have been called noticed.
    """

    n_notes: int
    n_changes: int
    changed_late: bool


def hear_excerpt(model: ScoringModel, notes: Sequence[Heard]) -> Excerpt:
    """Hear a line that has no seam."""
    state = start(model)
    changed_at: list[int] = []
    for number, note in enumerate(notes, 1):
        state = advance(model, state, note)
        if state.changed_at == number:
            changed_at.append(number)
    return Excerpt(len(notes), len(changed_at), any(number > SIDE_NOTES for number in changed_at))


@dataclass(frozen=True, slots=True)
class SeamFigures:
    """What spliced and unspliced lines add up to.

    Parameters
    ----------
    n_seams
        Spliced lines.
    n_noticed
        Those where a change was announced within `SIDE_NOTES`.
    median_delay
        Of those, in notes; NaN when there are none.
    n_right_before
        Lines whose first mode was announced at the seam.
    n_named
        Of those, how many had the second mode announced within `SIDE_NOTES`.
    n_excerpts, n_excerpt_notes, n_false_alarms
        Unspliced excerpts, their notes, and the changes announced in them.
    n_changed_late
        Excerpts with a change in their second half: what `n_noticed` is to be held against.
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
    n_changed_late: int
    seed: int = 0

    @property
    def noticed(self) -> float:
        """Share of seams that were noticed."""
        return share(self.n_noticed, self.n_seams)

    @property
    def right_before(self) -> float:
        """Share of seams at which the first mode was announced."""
        return share(self.n_right_before, self.n_seams)

    @property
    def named(self) -> float:
        """Share of second modes named, where the first one had been."""
        return share(self.n_named, self.n_right_before)

    @property
    def noticed_by_chance(self) -> float:
        """Share of lines without a seam that would have been called noticed."""
        return share(self.n_changed_late, self.n_excerpts)

    @property
    def false_alarms_per_100(self) -> float:
        """Changes announced in 100 notes without a seam."""
        return 100 * share(self.n_false_alarms, self.n_excerpt_notes)


def seam_figures(
    crossings: Iterable[tuple[int, Crossing]], excerpts: Iterable[Excerpt], seed: int = 0
) -> SeamFigures:
    """Add up spliced lines and unspliced excerpts.

    Parameters
    ----------
    crossings
        The place of the mode before the seam, and what was heard.
    excerpts
        The lines without a seam.
    seed
        Kept with the figures.
    """
    lines, unspliced = tuple(crossings), tuple(excerpts)
    delays = [line.left_after for _, line in lines if line.left_after is not None]
    right = [line for label, line in lines if line.announced == label]
    return SeamFigures(
        n_seams=len(lines),
        n_noticed=len(delays),
        median_delay=float(median(delays)) if delays else math.nan,
        n_right_before=len(right),
        n_named=sum(line.named_after is not None for line in right),
        n_excerpts=len(unspliced),
        n_excerpt_notes=sum(excerpt.n_notes for excerpt in unspliced),
        n_false_alarms=sum(excerpt.n_changes for excerpt in unspliced),
        n_changed_late=sum(excerpt.changed_late for excerpt in unspliced),
        seed=seed,
    )
