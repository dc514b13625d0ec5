"""By which mode each note of a line is judged: that of its own stretch, or the one aimed at.

A change of mode leaves what was right before it right.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, NamedTuple

from melodycoach.core.change import NONE
from melodycoach.core.octave import Lie, lie_of, moved_final, standing_final
from melodycoach.core.scorer import posterior
from melodycoach.core.span import Span, better_name, span
from melodycoach.core.stretch import stretch_of

if TYPE_CHECKING:
    from collections.abc import Sequence

    from melodycoach.core.change import ChangeState
    from melodycoach.core.mode import Mode
    from melodycoach.core.model import ScoringModel
    from melodycoach.core.note import Heard
    from melodycoach.core.scorer import Leaning, ScorerState

SHORTEST_STRETCH = 8
"""Notes that a change of mode has to last before it counts as one when another follows."""


class InView(NamedTuple):
    """The mode that owed steps and ladder speak of, where it stands, and what it is compared with.

    ``final_units`` counts from A4. ``hypothesis`` is None for a target that does not compete, and
    ``rival`` then too, or where no other mode competes.
    """

    mode: Mode
    final_units: int
    hypothesis: int | None
    rival: int | None


def in_view(
    model: ScoringModel,
    state: ScorerState,
    lie: Lie,
    target: Mode | None,
    lean: Leaning,
) -> InView:
    """Give the mode in view: the target, where there is one, and else the leading mode.

    Parameters
    ----------
    model, state
        The scoring model, and what it holds after the line.
    lie
        Where the line lies.
    target
        The mode that is aimed at, or None.
    lean
        Where the line leans.
    """
    if target is None:
        final_units = standing_final(model, lean.best, lie)
        return InView(model.mode_of(lean.best), final_units, lean.best, lean.rival)
    candidates = [i for i, index in enumerate(model.mode_index) if model.modes[index].id == target.id]
    if not candidates:
        final_units = moved_final(target, target.final_units, lie, model.pack.system)
        return InView(target, final_units, None, None)
    chance = posterior(model, state)
    best = max(candidates, key=lambda i: chance[i])
    rival = lean.rival if model.mode_index[lean.best] == model.mode_index[best] else lean.best
    return InView(target, standing_final(model, best, lie), best, rival)


class Judge(NamedTuple):
    """The mode that notes are judged by: from a note on, counted from 1, until the next judge's."""

    since: int
    mode: Mode
    final_units: int


def judges(
    model: ScoringModel,
    states: Sequence[ScorerState],
    lie: Lie,
    in_view: tuple[Mode, int],
    leader: int | None,
) -> tuple[Judge, ...]:
    """Say by which mode each note of a line is off or not, the newest notes first.

    With a target, or while no change of mode was noticed, that is the mode in view for the whole
    line. After a change each stretch is judged by the mode that was announced for it, so what was
    right before the change stays right after it; a stretch of less than `SHORTEST_STRETCH` notes is
    no change but an excursion, judged by the mode before it. The newest stretch is judged by the
    mode in view as long as nothing else is said of it.

    Parameters
    ----------
    model, states
        The scoring model, and the state after each number of notes.
    lie
        Where the line lies.
    in_view
        The mode in view and where it stands, in units from A4.
    leader
        The hypothesis that leads the line as a whole; None where the player aims at a mode.
    """
    change = states[-1].change
    if leader is None or change.seam_at is None:
        return (Judge(1, *in_view),)
    found: list[Judge] = []
    if stretch_of(model, states[-1], leader) is None:
        found.append(Judge(change.seam_at, *in_view))
        change = _before(states, change)
    while change.announced != NONE:
        since = change.seam_at or 1
        is_excursion = since > 1 and bool(found) and found[-1].since - since < SHORTEST_STRETCH
        if not is_excursion:
            final_units = standing_final(model, change.announced, lie)
            found.append(Judge(since, model.mode_of(change.announced), final_units))
        if change.seam_at is None:
            break
        change = _before(states, change)
    return tuple(found)


def stretch_judges(
    model: ScoringModel, states: Sequence[ScorerState], heard: Sequence[Heard], whole: Leaning
) -> tuple[tuple[Judge, Span], ...]:
    """Give the stretches of a finished line and by which mode each is heard, from note 1 on.

    Their judges are those of the line without a target, mended by hindsight: a stretch that is clearly
    heard in another mode than the one announced for it gets that one, and neighbours in the same mode
    are one stretch.
    """
    lie = lie_of(heard)
    leader = in_view(model, states[-1], lie, None, whole)
    found = judges(model, states, lie, leader[:2], whole.best)[::-1]
    found = (found[0]._replace(since=1), *found[1:])
    known: dict[tuple[int, int], Span] = {}
    while True:
        ends = [*(judge.since - 1 for judge in found[1:]), len(heard)]
        bounds = [(judge.since, last) for judge, last in zip(found, ends, strict=True)]
        known |= {pair: span(model, heard, *pair) for pair in bounds if pair not in known}
        parts = [known[pair] for pair in bounds]
        named = [_renamed(model, lie, judge, part) for judge, part in zip(found, parts, strict=True)]
        merged = tuple(one for at, one in enumerate(named) if not at or one[1:] != named[at - 1][1:])
        if merged == found:
            return tuple(zip(found, parts, strict=True))
        found = merged


def _renamed(model: ScoringModel, lie: Lie, judge: Judge, part: Span) -> Judge:
    instead = better_name(model, part, judge.mode)
    if instead is None:
        return judge
    return Judge(judge.since, model.mode_of(instead), standing_final(model, instead, lie))


def _before(states: Sequence[ScorerState], change: ChangeState) -> ChangeState:
    """Give what the change filter held just before the change that it noticed last."""
    assert change.changed_at is not None
    return states[change.changed_at - 1].change
