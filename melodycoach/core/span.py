"""What a part of a line says by itself: a phrase, a bar, a stretch in one mode.

A span is heard afresh, by the same scorer, as if it were the whole line: in a long line each further
note adds less, since what was heard is expected again, and the last bar would say nothing. How its
notes rest and how long they count is taken from the line that they stand in.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from itertools import groupby
from typing import TYPE_CHECKING

from melodycoach.core.note import Mark, Note, Silence
from melodycoach.core.scorer import advance_unwatched, leading, mode_posterior, start

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from melodycoach.core.arrays import FloatArray
    from melodycoach.core.mode import Mode
    from melodycoach.core.model import ScoringModel
    from melodycoach.core.note import Heard, Item
    from melodycoach.core.scorer import Leaning, ScorerState
    from melodycoach.core.sheet import Place

PHRASE_REST_BEATS = 1.0
"""A written rest of at least so long parts two phrases."""


OUTWEIGHED = 4.0
"""A mode that is decided, and so many times as likely as another, is the better name for some notes."""

UNLIKELY, EXCLUDED = 0.05, 0.02
"""Notes are not heard in a mode that is less likely than the first while another is decided, or less
likely than the second whatever else they may be in."""

LEAST_NOTES = 5
"""Fewer notes are no ground to say that they are heard in another mode."""


@dataclass(frozen=True, eq=False, slots=True)
class Span:
    """Some notes in a row and where they lean by themselves.

    Parameters
    ----------
    first, last
        Note numbers from 1; the last one belongs to it.
    leaning
        As the scorer has it.
    by_mode : float64, shape (n_modes,)
        The probability of each mode; sums to 1.
    """

    first: int
    last: int
    leaning: Leaning
    by_mode: FloatArray

    @property
    def n_notes(self) -> int:
        """How many notes it has."""
        return self.last - self.first + 1


def span(model: ScoringModel, heard: Sequence[Heard], first: int, last: int) -> Span:
    """Say where the notes from ``first`` to ``last`` lean by themselves.

    Parameters
    ----------
    model
        The scoring model.
    heard
        The notes of the whole line.
    first, last
        Note numbers from 1; the last one belongs to the span.
    """
    *_, state = _states_from(model, heard, first, last)
    return Span(first, last, leading(model, state), mode_posterior(model, state))


def growing_spans(model: ScoringModel, heard: Sequence[Heard], first: int, last: int) -> tuple[Span, ...]:
    """Give the spans that begin with note ``first`` and grow, a note at a time, to ``last``."""
    return tuple(
        Span(first, number, leading(model, state), mode_posterior(model, state))
        for number, state in enumerate(_states_from(model, heard, first, last), first)
    )


def _states_from(model: ScoringModel, heard: Sequence[Heard], first: int, last: int) -> Iterator[ScorerState]:
    state = start(model)
    for number in range(first, last + 1):
        state = advance_unwatched(model, state, heard[number - 1])
        yield state if number == len(heard) else before_closing(state)


def before_closing(state: ScorerState) -> ScorerState:
    """Give a state without what the end of a phrase says of the final.

    That counts only where a line ends: the phrases before may rest on any degree.
    """
    return replace(state, latest=())


def mode_probability(model: ScoringModel, part: Span, mode: Mode) -> float:
    """Give the probability of a mode by what the notes of a span say; 0 for one that does not compete."""
    return sum(float(p) for p, one in zip(part.by_mode, model.modes, strict=True) if one.id == mode.id)


def better_name(model: ScoringModel, part: Span, mode: Mode) -> int | None:
    """Give the hypothesis that names some notes clearly better than a mode does, or None."""
    best = _other(model, part, mode)
    outweighed = OUTWEIGHED * mode_probability(model, part, mode)
    return best if part.leaning.decided and part.leaning.p_best > outweighed else None


def heard_instead(model: ScoringModel, part: Span, mode: Mode) -> int | None:
    """Give the likeliest hypothesis where some notes are clearly not heard in a mode, or None."""
    best, chance = _other(model, part, mode), mode_probability(model, part, mode)
    return best if chance < (UNLIKELY if part.leaning.decided else EXCLUDED) else None


def _other(model: ScoringModel, part: Span, mode: Mode) -> int | None:
    """Give the likeliest hypothesis if it is of another mode and there are notes enough to say so."""
    best = part.leaning.best
    return None if part.n_notes < LEAST_NOTES or model.mode_of(best).id == mode.id else best


def phrase_bounds(items: Sequence[Item]) -> tuple[tuple[int, int], ...]:
    """Give the first and last note of each phrase, counted from 1.

    A phrase ends where its end is written. A line in which none is written before its last note has
    phrases that end at a breath and at a rest of `PHRASE_REST_BEATS`.

    >>> a, end = Note(6900, 0, 1, beats=1), Mark.PHRASE_END
    >>> phrase_bounds([a, a, Mark.BREATH, a, end, a, end])
    ((1, 3), (4, 4))
    >>> phrase_bounds([a, a, Mark.BREATH, a, Mark.BAR, a, Silence(1, beats=0.5), a, Silence(1, beats=1), a])
    ((1, 2), (3, 5), (6, 6))
    """
    places = [at for at, item in enumerate(items) if isinstance(item, Note)]
    inner = items[: places[-1]] if places else ()
    parts = _is_end if any(map(_is_end, inner)) else _is_breath
    bounds: list[tuple[int, int]] = []
    first, last = 1, 0
    for item in items:
        if isinstance(item, Note):
            last += 1
        elif parts(item) and last >= first:
            bounds.append((first, last))
            first = last + 1
    return (*bounds, (first, last)) if last >= first else tuple(bounds)


def _is_end(item: Item) -> bool:
    return item is Mark.PHRASE_END


def _is_breath(item: Item) -> bool:
    if isinstance(item, Silence):
        return item.beats is None or item.beats >= PHRASE_REST_BEATS
    return item is Mark.BREATH or item is Mark.PHRASE_END


def bar_bounds(places: Sequence[Place]) -> tuple[tuple[str, int, int], ...]:
    """Give the name of each bar that has notes, and its first and last note, counted from 1."""
    bars = []
    for name, group in groupby(enumerate(places, 1), key=lambda numbered: numbered[1].bar):
        numbers = [number for number, _ in group]
        if name:
            bars.append((name, numbers[0], numbers[-1]))
    return tuple(bars)
