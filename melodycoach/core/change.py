"""The change filter: which mode a line is in *right now*, and when it moved to another.

The scorer's running sums say what the whole line is. The filter says what its latest notes are: it
gives every hypothesis a small chance to be left at each note, so that old evidence fades as soon
as new evidence speaks against it. It keeps every note's evidence at a constant power, so its
numbers are too sure of themselves and are never shown as probabilities; only its announcements are.

Conventions
-----------
``log_belief`` is float64, shape (n_hypotheses,), nats, normalised. Modes are numbered as in the
model; -1 stands for none. Notes are counted from 1.

References
----------
The forward algorithm of a hidden Markov model whose states are the hypotheses: L. Rabiner, "A
tutorial on hidden Markov models" (1989), section III A.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from melodycoach.core.parameters import ScoringParameters
    from melodycoach.core.theory import FloatArray

NO_MODE = -1


@dataclass(frozen=True, eq=False, slots=True)
class ChangeState:
    """What the filter believes after some notes, and what it has announced.

    Parameters
    ----------
    log_belief : float64, shape (n_hypotheses,), nats
    holder
        The mode that holds the announcing probability now, or -1.
    held_notes
        For how many notes running it has held it.
    announced
        The mode announced last, or -1.
    changed_at
        The note at which an announced mode gave way to another one last, or None.
    """

    log_belief: FloatArray
    holder: int = NO_MODE
    held_notes: int = 0
    announced: int = NO_MODE
    changed_at: int | None = None


def advance_change(
    state: ChangeState, nats: FloatArray, n_modes: int, n_notes: int, parameters: ScoringParameters
) -> ChangeState:
    """Give the filter's state after one more note.

    Parameters
    ----------
    nats : float64, shape (n_hypotheses,)
        What the note says for each hypothesis.
    n_modes
        Hypothesis ``h`` is of mode ``h % n_modes``.
    n_notes
        The number of this note.
    """
    belief = np.exp(state.log_belief)
    if len(belief) > 1:
        rate = parameters.change_rate
        belief = (1 - rate) * belief + rate * (1 - belief) / (len(belief) - 1)
    log_belief = np.log(belief) + parameters.change_power * nats
    log_belief -= log_belief.max()
    belief = np.exp(log_belief)
    total = belief.sum()
    log_belief -= np.log(total)
    by_mode = belief.reshape(-1, n_modes).sum(axis=0) if len(belief) > n_modes else belief
    leader = int(by_mode.argmax())
    holder = leader if by_mode[leader] >= parameters.announce_at * total else NO_MODE
    held = state.held_notes + 1 if holder == state.holder else 1
    announced, changed_at = state.announced, state.changed_at
    if holder not in (NO_MODE, announced) and held >= parameters.announce_notes:
        changed_at = changed_at if announced == NO_MODE else n_notes
        announced = holder
    log_belief.setflags(write=False)
    return ChangeState(log_belief, holder, held, announced, changed_at)
