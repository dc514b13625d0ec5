"""The change filter: which mode a line is in *right now*, and when it moved to another.

The scorer's running sums say what the whole line is; they are slow to see that it has moved on. The
filter looks for the moment from which another mode explains the notes better than the announced
one. It works in two stages:

*Before anything is announced* it holds a belief over the hypotheses, in which each may be left
again at every note with a small probability, and announces the first mode that keeps a high belief
for a few notes.

*From then on* each hypothesis has a *gain*: the evidence for it and against the announced one,
summed since the note at which it began to rise (it never falls below 0). A hypothesis is announced
when its gain passes a threshold and leaves every other mode's gain behind. Its gain began to rise at
the *seam*, which is therefore known too.

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
inspection schemes" (1954).
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from melodycoach.core.arrays import sealed

if TYPE_CHECKING:
    from melodycoach.core.arrays import FloatArray, IntArray
    from melodycoach.core.parameters import ScoringParameters

NONE = -1


@dataclass(frozen=True, eq=False, slots=True)
class ChangeState:
    """What the filter holds after some notes.

    Parameters
    ----------
    log_belief : float64, shape (n_hypotheses,), nats
        Kept up to date until the first announcement.
    holder, held_notes
        The mode that holds the announcing belief, or -1, and for how many notes running.
    announced
        The hypothesis announced last, or -1.
    gain : float64, shape (n_hypotheses,), nats
        Evidence for each hypothesis against the announced one since it began to rise.
    risen_from : int64, shape (n_hypotheses,)
        The note at which each gain began to rise.
    changed_at
        The note at which a mode gave way to another one last, or None.
    seam_at
        The first note of that other mode, as found at ``changed_at``, or None.
    """

    log_belief: FloatArray
    gain: FloatArray
    risen_from: IntArray
    holder: int = NONE
    held_notes: int = 0
    announced: int = NONE
    changed_at: int | None = None
    seam_at: int | None = None


def start_change(log_prior: FloatArray) -> ChangeState:
    """Give the filter's state before the first note."""
    gain, risen_from = np.zeros(len(log_prior)), np.ones(len(log_prior), dtype=np.int64)
    return ChangeState(log_prior, sealed(gain), sealed(risen_from))


def change_threshold(n_hypotheses: int, parameters: ScoringParameters) -> float:
    """Give the gain that announces a change, in nats: the more could have gained it, the higher."""
    return parameters.change_nats + float(np.log(max(n_hypotheses - 1, 1)))


def advance_change(
    state: ChangeState, nats: FloatArray, n_modes: int, n_notes: int, parameters: ScoringParameters
) -> ChangeState:
    """Give the filter's state after one more note.

    Parameters
    ----------
    nats : float64, shape (n_hypotheses,)
        What the note says for each hypothesis, to the power that its input has in this filter.
    n_notes
        The number of this note.
    """
    if state.announced == NONE:
        return _first(state, nats, n_modes, parameters)
    return _next(state, nats, n_modes, n_notes, parameters)


def _first(state: ChangeState, nats: FloatArray, n_modes: int, parameters: ScoringParameters) -> ChangeState:
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
    announced = NONE
    if holder != NONE and held >= parameters.announce_notes:
        announced = int(log_belief.reshape(-1, n_modes)[:, holder].argmax()) * n_modes + holder
    return replace(state, log_belief=sealed(log_belief), holder=holder, held_notes=held, announced=announced)


def _next(
    state: ChangeState, nats: FloatArray, n_modes: int, n_notes: int, parameters: ScoringParameters
) -> ChangeState:
    gain = np.maximum(state.gain + (nats - nats[state.announced]), 0.0)
    risen_from = np.where(state.gain > 0, state.risen_from, n_notes)
    best = int(gain.argmax())
    announced, changed_at, seam_at = state.announced, state.changed_at, state.seam_at
    threshold = change_threshold(len(gain), parameters)
    if gain[best] >= threshold:
        by_mode = gain.reshape(-1, n_modes).max(axis=0)
        mode, top = best % n_modes, float(gain[best])
        by_mode[mode] = 0.0
        if top >= by_mode.max() + parameters.change_lead_nats or top >= 2 * threshold:
            if mode != announced % n_modes:
                changed_at, seam_at = n_notes, int(risen_from[best])
            announced = best
            gain = np.zeros(len(gain))
    return replace(
        state,
        gain=sealed(gain),
        risen_from=sealed(risen_from),
        announced=announced,
        changed_at=changed_at,
        seam_at=seam_at,
    )
