"""The change filter: which mode a line is in *right now*, and when it moved to another.

The scorer's running sums say what the whole line is; they are slow to see that it has moved on. The
filter looks for the moment from which another mode explains the notes better than the announced
one. It works in two stages:

*Before anything is announced* it holds a belief over the hypotheses, in which each may be left
again at every note with a small probability, and announces the first mode that keeps a high belief
for a few notes.

*From then on* the mode that explains the current stretch best is the *reference*. Each hypothesis has
a *gain*: the evidence for it and against the reference, summed since the note at which it began to
rise (it never falls below 0). When the gains together, each weighed by its prior, pass a threshold,
the line has left the reference's mode, and the note at which the largest of them began to rise is the
*seam*. The gains need not agree on where it went: that is asked of the whole stretch that begins at
the seam, over and over as it grows. So near-twins do not hold each other up, and a hasty first name
is mended without a second change.

Both stages take every note at a constant power, so their numbers are too sure of themselves: they
are never shown as probabilities, only the announcements are.

Conventions
-----------
Arrays are of shape (n_hypotheses,), in nats; hypothesis ``h`` is of mode ``h % n_modes``; -1 stands
for none. Notes are counted from 1.

References
----------
The belief is the forward algorithm of a hidden Markov model: L. Rabiner, "A tutorial on hidden
Markov models" (1989), section III A. The gain is the cumulative-sum test: E. Page, "Continuous
inspection schemes" (1954). Weighing many gains instead of waiting for one is the mixture rule:
T. L. Lai, "Sequential changepoint detection in quality control and dynamical systems" (1995).
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any

import numpy as np

from melodycoach.core.arrays import sealed

if TYPE_CHECKING:
    from melodycoach.core.arrays import FloatArray, IntArray
    from melodycoach.core.parameters import ScoringParameters

NONE = -1


@dataclass(frozen=True, eq=False, slots=True)
class Field:
    """Who competes.

    Parameters
    ----------
    n_modes
        Hypothesis ``h`` is of mode ``h % n_modes``.
    log_prior : float64, shape (n_hypotheses,), nats
        The probabilities sum to 1.
    final_units : int64, shape (n_hypotheses,)
        The final of each.
    """

    n_modes: int
    log_prior: FloatArray
    final_units: IntArray


@dataclass(frozen=True, eq=False, slots=True)
class ChangeState:
    """What the filter holds after some notes.

    Parameters
    ----------
    log_belief : float64, shape (n_hypotheses,), nats
        Kept up to date until the first announcement.
    holder, held_notes
        The mode that holds the announcing belief, or -1, and for how many notes running.
    reference
        The hypothesis that explains the stretch best, or -1 before the first announcement.
    announced
        As `reference`, but slower to move: another mode must lead it by ``announce_lead_nats``.
    gain : float64, shape (n_hypotheses,), nats
        Evidence for each hypothesis against the reference since it began to rise.
    risen_from : int64, shape (n_hypotheses,)
        The note at which each gain began to rise.
    total : float64, shape (n_hypotheses,), nats
        Evidence of all notes.
    past
        The totals before each of the last ``change_window`` notes, the oldest first.
    base : float64, shape (n_hypotheses,), nats
        The total before the stretch, less what speaks for a mode before its first note; zeros while
        the stretch is the whole line.
    changed_at
        The note at which a mode gave way to another one last, or None.
    seam_at
        The first note of the stretch in that other mode, as found at ``changed_at``, or None.
    phrase_from
        The first note of the phrase: a seam does not reach back over a phrase end.
    """

    log_belief: FloatArray
    gain: FloatArray
    risen_from: IntArray
    total: FloatArray
    base: FloatArray
    past: tuple[FloatArray, ...] = ()
    holder: int = NONE
    held_notes: int = 0
    reference: int = NONE
    announced: int = NONE
    changed_at: int | None = None
    seam_at: int | None = None
    phrase_from: int = 1


def start_change(log_prior: FloatArray) -> ChangeState:
    """Give the filter's state before the first note."""
    nothing, risen_from = sealed(np.zeros(len(log_prior))), np.ones(len(log_prior), dtype=np.int64)
    return ChangeState(log_prior, nothing, sealed(risen_from), nothing, nothing)


def advance_change(
    state: ChangeState,
    nats: FloatArray,
    field: Field,
    n_notes: int,
    parameters: ScoringParameters,
    opens_phrase: bool = False,
) -> ChangeState:
    """Give the filter's state after one more note.

    Parameters
    ----------
    nats : float64, shape (n_hypotheses,)
        What the note says for each hypothesis, to the power that its input has in this filter.
    field
        Who competes, the same at every note.
    n_notes
        The number of this note.
    opens_phrase
        The note before it ended a phrase.
    """
    known: dict[str, Any] = {
        "total": sealed(state.total + nats),
        "past": (*state.past, state.total)[-parameters.change_window :],
        "phrase_from": n_notes if opens_phrase else state.phrase_from,
    }
    if state.reference == NONE:
        return _first(state, nats, field.n_modes, parameters, known)
    gain = np.maximum(state.gain + (nats - nats[state.reference]), 0.0)
    risen_from = np.where(state.gain > 0, state.risen_from, n_notes)
    state = replace(state, **known, gain=sealed(gain), risen_from=sealed(risen_from))
    return _departed(state, field, n_notes, parameters) or _followed(state, field.log_prior, parameters)


def departure_nats(gain: FloatArray, log_prior: FloatArray) -> float:
    """Give how strongly some of many gains speak for a change, in nats: their weighed mean.

    One gain of 5 among four equal hypotheses counts 5 less the log of four, and a little more for
    the others:

    >>> round(departure_nats(np.array([5.0, 0, 0, 0]), np.log([0.25] * 4)), 2)
    3.63
    """
    nats = gain + log_prior
    top = nats.max()
    return float(top + np.log(np.exp(nats - top).sum()))


def _first(
    state: ChangeState,
    nats: FloatArray,
    n_modes: int,
    parameters: ScoringParameters,
    known: dict[str, Any],
) -> ChangeState:
    """Follow the belief until a mode is announced; ``known`` is what every note changes."""
    belief = np.exp(state.log_belief)
    if len(belief) > 1:
        rate = parameters.change_rate
        belief = (1 - rate) * belief + rate * (1 - belief) / (len(belief) - 1)
    log_belief = np.log(belief) + nats
    log_belief -= log_belief.max()
    log_belief -= np.log(np.exp(log_belief).sum())
    by_mode = np.exp(log_belief).reshape(-1, n_modes).sum(axis=0)
    leader = int(by_mode.argmax())
    holder = leader if by_mode[leader] >= parameters.announce_at else NONE
    held = state.held_notes + 1 if holder == state.holder else 1
    first = NONE
    if holder != NONE and held >= parameters.announce_notes:
        first = int(log_belief.reshape(-1, n_modes)[:, holder].argmax()) * n_modes + holder
    return replace(
        state,
        **known,
        log_belief=sealed(log_belief),
        holder=holder,
        held_notes=held,
        reference=first,
        announced=first,
    )


def _departed(
    state: ChangeState, field: Field, n_notes: int, parameters: ScoringParameters
) -> ChangeState | None:
    """Give the state after the line has left the reference, or None while it has not."""
    gain, risen_from = state.gain, state.risen_from
    grown = np.where(risen_from <= n_notes + 1 - parameters.change_notes, gain, -np.inf)
    grown[state.reference] = -np.inf
    best = int((grown + field.log_prior).argmax())
    if grown[best] > 0 and departure_nats(grown, field.log_prior) >= parameters.change_nats:
        rose = int(risen_from[best])
        if state.phrase_from <= n_notes + 1 - parameters.change_notes:
            rose = max(rose, state.phrase_from)
        back = min(n_notes + 1 - rose, len(state.past))
        keeps_final = field.final_units == field.final_units[state.reference]
        base = sealed(state.past[-back] - parameters.same_final_nats * keeps_final)
        to = int((field.log_prior + state.total - base).argmax())
        if to != state.reference:
            moved = (to - state.reference) % field.n_modes != 0
            return replace(
                state,
                gain=sealed(np.zeros(len(gain))),
                base=base,
                reference=to,
                announced=to,
                changed_at=n_notes if moved else state.changed_at,
                seam_at=max(n_notes + 1 - back, state.phrase_from) if moved else state.seam_at,
            )
    return None


def _followed(state: ChangeState, log_prior: FloatArray, parameters: ScoringParameters) -> ChangeState:
    """Let the reference be what explains the stretch best, and the announced one come after it."""
    nats = log_prior + state.total - state.base
    best = int(nats.argmax())
    if best != state.reference:
        state = replace(state, reference=best, gain=sealed(np.zeros(len(nats))))
    if nats[best] > nats[state.announced] + parameters.announce_lead_nats:
        state = replace(state, announced=best)
    return state
