"""Whether the step that is put first is worth playing: it is tried on labelled melodies.

After the first notes of a melody its labelled mode is taken as the target, and the owed step that
the screen would put first is played to the scorer. So is every walk of the same length along the
degrees of that mode. What counts is how much each adds to the log-odds of the labelled mode
against all others together.

Conventions
-----------
Gains are in nats of tempered log-odds. A *walk* goes from the degree nearest to the last note up or
down to the next degree of the rising form, or of those under the final and over the octave, at each
note; both ways are equally likely, and at an end there is only the way back. Its lengths are those
of the step: moving notes, the last one resting.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from melodycoach.core.mode import Need
from melodycoach.core.octave import lie_of, standing_final
from melodycoach.core.owed import follow, start_track
from melodycoach.core.ranking import rank_owed, step_note
from melodycoach.core.scorer import advance, leading, log_posterior, start

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from melodycoach.core.mode import Mode
    from melodycoach.core.model import ScoringModel
    from melodycoach.core.note import Heard, InputKind
    from melodycoach.core.scorer import ScorerState

TRIAL_NOTES = 20
"""Notes of a melody that are heard before a step is tried."""


@dataclass(frozen=True, slots=True)
class OwedTrial:
    """What the top owed step and a walk add to the labelled mode's log-odds, in nats.

    ``walk_nats`` is the mean over every walk of the step's length, each as likely as it is;
    ``walk_beaten`` the share of walks that add less than the step.
    """

    step_nats: float
    walk_nats: float
    walk_beaten: float


def try_owed(model: ScoringModel, notes: Sequence[Heard], hypothesis: int) -> OwedTrial | None:
    """Play the top owed step of a mode, and every walk, after the notes of a melody.

    Parameters
    ----------
    model
        At least two modes.
    notes
        At least one; none of them closes.
    hypothesis
        The labelled mode on its final.

    Returns
    -------
    OwedTrial or None
        None when the mode owes nothing; colour is never owed.
    """
    mode = model.mode_of(hypothesis)
    final_units = standing_final(model, hypothesis, lie_of(notes))
    state = start(model)
    track = start_track(mode, final_units, model.pack.system)
    for note in notes:
        state = advance(model, state, note)
        track = follow(track, note)
    kind = notes[-1].kind
    lean = leading(model, state)
    leads = model.mode_index[lean.best] == model.mode_index[hypothesis]
    rival = lean.rival if leads else lean.best  # as the screen does for a target
    ranked = rank_owed(model, state, hypothesis, track, rival, kind)
    if not ranked or ranked[0].step.need is Need.COLOUR:
        return None
    before = mode_log_odds(model, state, hypothesis)
    pitches = ranked[0].pitches_cents
    after = state
    for place, pitch in enumerate(pitches, 1):
        after = advance(model, after, step_note(pitch, kind, is_last=place == len(pitches)))
    step_nats = mode_log_odds(model, after, hypothesis) - before
    scale = walk_scale(mode)
    units = model.pack.system.cents_to_units(notes[-1].pitch_cents) - final_units
    first = min(range(len(scale)), key=lambda place: abs(scale[place] - units))
    walks = [
        (share, mode_log_odds(model, walked, hypothesis) - before)
        for share, walked in _walks(model, state, scale, final_units, first, len(pitches), kind)
    ]
    return OwedTrial(
        step_nats,
        math.fsum(share * nats for share, nats in walks),
        math.fsum(share for share, nats in walks if nats < step_nats),
    )


def walk_scale(mode: Mode) -> tuple[int, ...]:
    """Give the degrees that a walk goes along, ascending."""
    return tuple(sorted({*mode.rising, *mode.below, *mode.above}))


def _walks(
    model: ScoringModel,
    state: ScorerState,
    scale: Sequence[int],
    final_units: int,
    place: int,
    left: int,
    kind: InputKind,
) -> list[tuple[float, ScorerState]]:
    """Give where every walk of ``left`` notes ends, with its probability."""
    if not left:
        return [(1.0, state)]
    ways = [there for there in (place - 1, place + 1) if 0 <= there < len(scale)]
    ends: list[tuple[float, ScorerState]] = []
    for there in ways:
        pitch = model.pack.system.units_to_cents(final_units + scale[there])
        moved = advance(model, state, step_note(pitch, kind, is_last=left == 1))
        for share, end in _walks(model, moved, scale, final_units, there, left - 1, kind):
            ends.append((share / len(ways), end))
    return ends


def mode_log_odds(model: ScoringModel, state: ScorerState, hypothesis: int) -> float:
    """Give the tempered log-odds of a hypothesis's mode against all other modes together, in nats."""
    by_mode = np.logaddexp.reduce(log_posterior(model, state).reshape(-1, model.n_modes), axis=0)
    mode = int(model.mode_index[hypothesis])
    return float(by_mode[mode] - np.logaddexp.reduce(np.delete(by_mode, mode)))


@dataclass(frozen=True, slots=True)
class OwedFigures:
    """What the trials of many melodies add up to.

    Parameters
    ----------
    n
        Melodies tried.
    n_nothing_owed
        Melodies whose mode owed nothing after the first notes; not among ``n``.
    step_nats, walk_nats
        Mean gains; NaN when there are no trials.
    walk_beaten
        Mean share of walks that add less than the step.
    seed
        Of the random choice of melodies.
    """

    n: int
    n_nothing_owed: int
    step_nats: float
    walk_nats: float
    walk_beaten: float
    seed: int = 0

    @property
    def ratio(self) -> float:
        """How many walks the step is worth; NaN where walks add nothing."""
        return self.step_nats / self.walk_nats if self.walk_nats > 0 else math.nan


def owed_figures(trials: Iterable[OwedTrial | None], seed: int = 0) -> OwedFigures:
    """Add up trials."""
    every = tuple(trials)
    done = [trial for trial in every if trial is not None]
    n = len(done)

    def mean(values: Iterable[float]) -> float:
        return math.fsum(values) / n if n else math.nan

    return OwedFigures(
        n,
        len(every) - n,
        mean(trial.step_nats for trial in done),
        mean(trial.walk_nats for trial in done),
        mean(trial.walk_beaten for trial in done),
        seed,
    )
