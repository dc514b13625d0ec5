"""Which owed step would settle the mode best if it were played next: computed, not canned.

Every owed step is played to the scorer at the end of the line, where it is written over the final
on which the mode stands, and the change of the odds is its gain. A gain can be bought by playing
odd things. So steps that are owed, core and usual, come before colour, which is only welcome; and
among those of like gain, core before usual.

Conventions
-----------
Gains are in nats of tempered log-odds, as the posterior has them; a phrase that happens to end
with the line's last note is not held against the step that goes on from there.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from melodycoach.core.mode import Need, StepKind
from melodycoach.core.note import Heard, InputKind
from melodycoach.core.pitch import KEY_CENTS, key_of
from melodycoach.core.scorer import advance_unwatched, temper

if TYPE_CHECKING:
    from melodycoach.core.arrays import FloatArray
    from melodycoach.core.mode import CharacteristicStep
    from melodycoach.core.model import ScoringModel
    from melodycoach.core.owed import StepTrack
    from melodycoach.core.pitch import ToneSystem
    from melodycoach.core.scorer import ScorerState

MOVING_S = 0.3
"""Length of the moving notes of a step that is tried out."""

RESTING_S = 0.8
"""Length of its last note, which rests."""

CORE_NATS = 0.2
"""What being core is worth beside the gain when owed steps are put in order: gains that differ by
less are alike."""


@dataclass(frozen=True, slots=True)
class OwedStep:
    """A step that the line owes, where it would be played, and what that would do.

    Parameters
    ----------
    step
        The characteristic step.
    pitches_cents
        Its notes where it is written over the final, in cents on the MIDI scale.
    gain_nats
        What playing it next adds to the log-odds of the mode against its rival, or against all
        others; 0 when nothing competes.
    rules_out
        Index of the mode that loses the most probability by it, or None when there is no other.
    """

    step: CharacteristicStep
    pitches_cents: tuple[float, ...]
    gain_nats: float
    rules_out: int | None


def rank_owed(
    model: ScoringModel,
    state: ScorerState,
    hypothesis: int,
    track: StepTrack,
    rival: int | None = None,
    kind: InputKind = InputKind.TYPED,
) -> tuple[OwedStep, ...]:
    """Put the steps that a line still owes a mode in the order of what they would do for it.

    Parameters
    ----------
    model, state
        The scoring model, and where the line stands in it.
    hypothesis
        The mode in view on its final: the target or the leading one.
    track
        Its steps, followed through the same line.
    rival
        The hypothesis to gain on. None: all others together; the closest one, which is the leading
        one when the mode in view does not lead, counts most in them.
    kind
        How the player will play: a plain keyboard cannot gain by tuning.

    Returns
    -------
    tuple of OwedStep
        The best next step first: those owed by gain, core before usual at like gain, then colour
        by gain; openings last once a phrase has ended, since the line is open.
    """
    before = _nats(model, state)
    odds = _log_odds(before, hypothesis, rival)
    share = _by_mode(model, before)
    tried: dict[tuple[float, ...], ScorerState] = {(): state}
    ranked: list[OwedStep] = []
    for step in track.owed:
        pitches = step_pitches(step, track.final_units, model.pack.system)
        after = _nats(model, _play(model, tried, pitches, kind))
        lost = share - _by_mode(model, after)
        lost[model.mode_index[hypothesis]] = -np.inf
        rules_out = int(lost.argmax()) if len(lost) > 1 else None
        ranked.append(OwedStep(step, pitches, _log_odds(after, hypothesis, rival) - odds, rules_out))
    return tuple(sorted(ranked, key=lambda owed: _order(owed, track.has_closed)))


def _order(owed: OwedStep, has_closed: bool) -> tuple[bool, bool, float]:
    worth = owed.gain_nats + (CORE_NATS if owed.step.need is Need.CORE else 0.0)
    too_late = has_closed and owed.step.kind is StepKind.OPENING
    return owed.step.need is Need.COLOUR, too_late, -worth


def _log_odds(nats: FloatArray, hypothesis: int, rival: int | None) -> float:
    """Give the odds of a hypothesis against another one, or against all others together."""
    if rival is not None:
        return float(nats[hypothesis] - nats[rival])
    others = np.delete(nats, hypothesis)
    if not len(others):
        return 0.0
    top = others.max()
    return float(nats[hypothesis] - top - np.log(np.exp(others - top).sum()))


def step_pitches(
    step: CharacteristicStep, final_units: int, system: ToneSystem, octaves: int = 0
) -> tuple[float, ...]:
    """Give the pitches of a step over a final, so many octaves over where it is written, in cents."""
    base = final_units + octaves * system.divisions
    return tuple(system.units_to_cents(base + degree) for degree in step.degrees)


def _nats(model: ScoringModel, state: ScorerState) -> FloatArray:
    """Give the log-posterior, not normalised, without what a phrase end says."""
    return model.log_prior + temper(model, state) * state.loglik


def _by_mode(model: ScoringModel, nats: FloatArray) -> FloatArray:
    likely = np.exp(nats - nats.max())
    by_mode = likely.reshape(-1, model.n_modes).sum(axis=0)
    return np.asarray(by_mode / by_mode.sum(), dtype=np.float64)


def _play(
    model: ScoringModel,
    tried: dict[tuple[float, ...], ScorerState],
    pitches: tuple[float, ...],
    kind: InputKind,
) -> ScorerState:
    """Play a step at the end of the line; states of beginnings played before are taken again."""
    state = tried[()]
    for n, pitch in enumerate(pitches[:-1], start=1):
        known = tried.get(pitches[:n])
        if known is None:
            known = advance_unwatched(model, state, step_note(pitch, kind, is_last=False))
            tried[pitches[:n]] = known
        state = known
    return advance_unwatched(model, state, step_note(pitches[-1], kind, is_last=True))


def step_note(pitch_cents: float, kind: InputKind, *, is_last: bool) -> Heard:
    """Give one note of a step that is tried out: the last one rests; a plain keyboard plays its keys."""
    if kind is InputKind.KEYS:
        pitch_cents = KEY_CENTS * key_of(pitch_cents)
    return Heard(pitch_cents, kind, RESTING_S if is_last else MOVING_S, rests=is_last, closes=False)
