"""What a part of a line says by itself: a phrase, a bar, a stretch in one mode.

The notes of a span are heard where they stand, so nothing is scored again: a span says what the
line's evidence gained between its two ends, and it is as sure of that as a line of its length.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from itertools import groupby
from typing import TYPE_CHECKING

from melodycoach.core.arrays import sealed
from melodycoach.core.note import Mark, Note, Silence
from melodycoach.core.scorer import leading, mode_posterior

if TYPE_CHECKING:
    from collections.abc import Sequence

    from melodycoach.core.mode import Mode
    from melodycoach.core.model import ScoringModel
    from melodycoach.core.note import Item
    from melodycoach.core.scorer import Leaning, ScorerState
    from melodycoach.core.sheet import Place

PHRASE_REST_BEATS = 1.0
"""A written rest of at least so long parts two phrases."""


OUTWEIGHED = 4.0
"""Notes are clearly heard in another mode than the one they should be in when that is decided, and so many
times as likely."""


@dataclass(frozen=True, slots=True)
class Span:
    """Some notes in a row and where they lean; ``first`` and ``last`` are note numbers from 1."""

    first: int
    last: int
    leaning: Leaning

    @property
    def n_notes(self) -> int:
        """How many notes it has."""
        return self.last - self.first + 1


def span_state(states: Sequence[ScorerState], first: int, last: int) -> ScorerState:
    """Give what the notes from ``first`` to ``last`` add up to, as a state of the scorer.

    What a phrase end says of the final counts only where the line ends with it: the phrases before
    may rest on any degree.
    """
    before, after = states[first - 1], states[last]
    return replace(
        after,
        loglik=sealed(after.loglik - before.loglik),
        weight=after.weight - before.weight,
        n_notes=last - first + 1,
        latest=after.latest if last == len(states) - 1 else (),
    )


def span(model: ScoringModel, states: Sequence[ScorerState], first: int, last: int) -> Span:
    """Say where the notes from ``first`` to ``last`` lean by themselves.

    Parameters
    ----------
    model
        The scoring model.
    states
        ``states[k]`` is the scorer's state after k notes of the line.
    first, last
        Note numbers from 1; the last one belongs to the span.
    """
    return Span(first, last, leading(model, span_state(states, first, last)))


def mode_probability(model: ScoringModel, states: Sequence[ScorerState], mode: Mode, part: Span) -> float:
    """Give the probability of a mode by what the notes of a span say; 0 for one that does not compete."""
    by_mode = mode_posterior(model, span_state(states, part.first, part.last))
    return sum(float(p) for p, one in zip(by_mode, model.modes, strict=True) if one.id == mode.id)


def heard_instead(model: ScoringModel, states: Sequence[ScorerState], part: Span, mode: Mode) -> int | None:
    """Give the hypothesis that some notes are clearly heard in, if that is another mode than this one."""
    best = part.leaning.best
    if not part.leaning.decided or model.mode_of(best).id == mode.id:
        return None
    outweighed = OUTWEIGHED * mode_probability(model, states, mode, part)
    return best if part.leaning.p_best > outweighed else None


def phrase_bounds(items: Sequence[Item]) -> tuple[tuple[int, int], ...]:
    """Give the first and last note of each phrase, counted from 1.

    A phrase ends at a breath, at a phrase end, and at a rest of `PHRASE_REST_BEATS`.

    >>> a = Note(6900, 0, 1, beats=1)
    >>> phrase_bounds([a, a, Mark.BREATH, a, Mark.BAR, a, Silence(1, beats=0.5), a, Silence(1, beats=1), a])
    ((1, 2), (3, 5), (6, 6))
    """
    bounds: list[tuple[int, int]] = []
    first, last = 1, 0
    for item in items:
        if isinstance(item, Note):
            last += 1
        elif _parts_phrases(item) and last >= first:
            bounds.append((first, last))
            first = last + 1
    return (*bounds, (first, last)) if last >= first else tuple(bounds)


def _parts_phrases(item: Mark | Silence) -> bool:
    if isinstance(item, Mark):
        return item is not Mark.BAR
    return item.beats is None or item.beats >= PHRASE_REST_BEATS


def bar_bounds(places: Sequence[Place]) -> tuple[tuple[str, int, int], ...]:
    """Give the name of each bar that has notes, and its first and last note, counted from 1."""
    bars = []
    for name, group in groupby(enumerate(places, 1), key=lambda numbered: numbered[1].bar):
        numbers = [number for number, _ in group]
        if name:
            bars.append((name, numbers[0], numbers[-1]))
    return tuple(bars)
