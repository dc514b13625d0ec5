"""The scorer: what each note says for each hypothesis, and what all of them say together.

A state goes in and a state comes out; `advance` is the only way from one to the next, so a line
scored note by note and a line scored at once are the same.

Conventions
-----------
``loglik`` is the summed evidence of the notes so far, in nats and *untempered*. Notes of one melody
are far from independent, so the sum is multiplied by `temper` before it becomes a probability. The
*closing* factor speaks for the modes on whose final the latest notes come to rest; it enters when a
phrase ends there and is never kept in the sum. So, exactly, for hypotheses a and b:

    log_odds(a, b) = prior + temper * (sum of increments + closing), each a minus b

Arrays have shape (n_hypotheses,) and the order of the model's hypotheses.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from melodycoach.core.arrays import sealed
from melodycoach.core.change import NONE, ChangeState, Field, advance_change, start_change
from melodycoach.core.event import PitchReading
from melodycoach.core.sounding import MEMORY_OCTAVES, MEMORY_OCTAVES_BELOW, sounding_of
from melodycoach.core.theory import MOVING, RESTING
from melodycoach.errors import ImpossibleEvidenceError

if TYPE_CHECKING:
    from melodycoach.core.arrays import FloatArray, IntArray
    from melodycoach.core.model import ScoringModel
    from melodycoach.core.note import Heard
    from melodycoach.core.sounding import Sounding


@dataclass(frozen=True, eq=False, slots=True)
class ScorerState:
    """Everything that the notes so far have said.

    Parameters
    ----------
    loglik : float64, shape (n_hypotheses,), nats
        Untempered; closing is not in it.
    weight
        Summed weight of the notes.
    n_notes
        How many notes there were.
    context : int64, shape (n_hypotheses,)
        Row of each hypothesis's context in the n-gram tables; empty when the order is 1.
    memory : float64, shape (`MEMORY_OCTAVES` * divisions,)
        Weight heard so far near each unit; A4 stands after `MEMORY_OCTAVES_BELOW` octaves.
    latest
        The last notes, as many as closing looks at.
    change
        The change filter's state.
    """

    loglik: FloatArray
    weight: float
    n_notes: int
    context: IntArray
    memory: FloatArray
    latest: tuple[Heard, ...]
    change: ChangeState

    @property
    def changed_at(self) -> int | None:
        """The note at which the change filter last announced another mode, or None."""
        return self.change.changed_at


@dataclass(frozen=True, eq=False, slots=True)
class NoteEvidence:
    """What one note says, untempered, in nats, shape (n_hypotheses,): by its degree and its octave."""

    degree: FloatArray
    register: FloatArray

    @property
    def total(self) -> FloatArray:
        """Both together: what `advance` adds."""
        return self.degree + self.register


@dataclass(frozen=True, slots=True)
class Leaning:
    """Where the line leans.

    Parameters
    ----------
    best, rival
        Hypotheses: the best one of the likeliest mode, and the best one of the mode after it;
        without a second mode the rival is None.
    p_best, p_rival
        Probabilities of those two modes, over all their finals.
    decided
        The leaning is clear enough to be named alone.
    among
        Modes to name, likeliest first: one when decided, else those between which it is open.
    family
        The family that they share, or an empty string.
    """

    best: int
    rival: int | None
    p_best: float
    p_rival: float
    decided: bool
    among: tuple[int, ...]
    family: str


def start(model: ScoringModel) -> ScorerState:
    """Give the state before the first note."""
    n_hypotheses = len(model.mode_index)
    loglik = np.zeros(n_hypotheses)
    memory = np.zeros(MEMORY_OCTAVES * model.pack.system.divisions)
    context = np.zeros(0, dtype=np.int64)
    if model.order > 1:
        grams = model.tables(next(iter(model.parameters.hearing))).grams
        assert grams is not None
        context = grams.root[model.mode_index]
    change = start_change(model.log_prior)
    return ScorerState(sealed(loglik), 0.0, 0, sealed(context), sealed(memory), (), change)


def note_weight(model: ScoringModel, heard: Heard) -> float:
    """Give how much a note counts for its length."""
    length_s = min(max(heard.length_s, 0.0), model.parameters.longest_s)
    return float(length_s**model.parameters.length_power)


def advance(model: ScoringModel, state: ScorerState, heard: Heard) -> ScorerState:
    """Give the state after one more note; the old one is left as it was."""
    fresh, after = _added(model, state, heard)
    fresh *= model.parameters.hearing[heard.kind].change_power
    field = Field(model.n_modes, model.log_prior, model.final_units)
    opens_phrase = bool(state.latest) and state.latest[-1].closes
    change = advance_change(state.change, fresh, field, after.n_notes, model.parameters, opens_phrase)
    return replace(after, change=change)


def advance_unwatched(model: ScoringModel, state: ScorerState, heard: Heard) -> ScorerState:
    """Give the state after one more note, but do not watch for a change of mode: half the work."""
    return _added(model, state, heard)[1]


def _added(model: ScoringModel, state: ScorerState, heard: Heard) -> tuple[FloatArray, ScorerState]:
    """Give the evidence without the line's memory, and the state with the note but the change as it was."""
    weight, sounding = note_weight(model, heard), sounding_of(model, heard)
    fresh, evidence, context = _score(model, state, heard, weight, sounding)
    after = ScorerState(
        loglik=sealed(state.loglik + evidence.total),
        weight=state.weight + weight,
        n_notes=state.n_notes + 1,
        context=sealed(context),
        memory=sealed(_remember(state.memory, model.tables(heard.kind).bell, sounding, weight)),
        latest=(*state.latest, heard)[-model.parameters.closing_notes :],
        change=state.change,
    )
    return fresh, after


def evidence_of(model: ScoringModel, state: ScorerState, heard: Heard) -> NoteEvidence:
    """Give what one more note would say, split into its degree and its octave."""
    return _score(model, state, heard, note_weight(model, heard), sounding_of(model, heard))[1]


def increments(model: ScoringModel, state: ScorerState, heard: Heard) -> FloatArray:
    """Give what `advance` would add to ``loglik`` for one more note."""
    return evidence_of(model, state, heard).total


def _score(
    model: ScoringModel, state: ScorerState, heard: Heard, weight: float, sounding: Sounding
) -> tuple[FloatArray, NoteEvidence, IntArray]:
    """Give the evidence without the line's memory (for the change filter), with it, and the context."""
    tables, size, mass = model.tables(heard.kind), model.pack.system.divisions, model.parameters.memory_mass
    shares, memory = sounding.shares, state.memory
    known = sum(
        share * memory[at % size :: size].sum() for share, at in zip(shares, sounding.places, strict=True)
    )
    known = float(known) / mass
    scale = weight / (1.0 if tables.grams is None else 1.0 + model.parameters.counts_power)
    fresh = scale * sounding.log_theory
    total = scale * np.log(sounding.by_theory + known)
    context = state.context
    if tables.grams is not None:
        role = RESTING if heard.rests else MOVING
        rows = context if len(context) else tables.grams.root[model.mode_index]
        by_counts = shares @ tables.grams.probability[role, rows, sounding.columns]
        fresh += scale * model.parameters.counts_power * np.log(by_counts)
        total += scale * model.parameters.counts_power * np.log(by_counts + known)
        if len(context):
            meant = _meant(sounding.columns, tables.theory, model.mode_index, shares)
            context = tables.grams.next_row[rows, meant]
    total -= weight * math.log1p(state.weight / mass)
    if sounding.by_octave is None or sounding.log_octave is None:
        return fresh, NoteEvidence(total, np.zeros(len(fresh))), context
    power = weight * tables.register_power
    known = float(shares @ memory[sounding.places]) / mass
    fresh += power * sounding.log_octave
    register = power * np.log((sounding.by_octave + known) / (1 + state.weight / mass))
    return fresh, NoteEvidence(total, register), context


def _meant(columns: IntArray, theory: FloatArray, mode_index: IntArray, shares: FloatArray) -> IntArray:
    """Give for each hypothesis the folded unit that a heard pitch most likely stands for."""
    if len(columns) == 1:
        return np.asarray(columns[0], dtype=np.int64)
    likely = shares[:, None] * theory.sum(axis=1)[mode_index, columns]
    return np.asarray(columns[likely.argmax(axis=0), np.arange(columns.shape[1])], dtype=np.int64)


def _remember(memory: FloatArray, bell: FloatArray, sounding: Sounding, weight: float) -> FloatArray:
    """Give the memory with a note added, spread as widely as the input is blurred."""
    reach = len(bell) // 2
    memory = memory.copy()
    for at, part in zip(sounding.places, weight * sounding.shares / sounding.shares.sum(), strict=True):
        at = min(max(at, reach), len(memory) - 1 - reach)
        memory[at - reach : at + reach + 1] += part * bell
    return memory


def temper(model: ScoringModel, state: ScorerState) -> float:
    """Give the power on the likelihood that makes the posterior mean what it says."""
    parameters = model.parameters
    return float(parameters.temper * (1 + state.weight / parameters.temper_weight) ** -parameters.temper_fall)


def closing(model: ScoringModel, state: ScorerState) -> FloatArray:
    """Give what the end of a phrase says, untempered, in nats; zeros where no phrase ends."""
    if not state.latest or not state.latest[-1].closes:
        return np.zeros(len(state.loglik))
    return closing_if_ended(model, state)


def closing_if_ended(model: ScoringModel, state: ScorerState) -> FloatArray:
    """Give what the end of a phrase would say if it ended with the latest note."""
    total = np.zeros(len(state.loglik))
    finals, parameters, size = _closing_finals(model, state), model.parameters, model.pack.system.divisions
    for heard in state.latest:
        sounding, tables = sounding_of(model, heard), model.tables(heard.kind)
        likely = sounding.shares @ tables.closing[model.mode_index, sounding.columns]
        if finals is not None and parameters.hearing[heard.kind].knows_octave:
            resting = sounding.shares @ tables.theory[model.mode_index, RESTING, sounding.columns]
            noise = sounding.shares.sum() * parameters.closing_noise / size
            elsewhere = parameters.closing_final * noise + (1 - parameters.closing_final) * resting
            at = model.pack.system.cents_to_units(heard.pitch_cents) - model.final_shift
            likely = np.where(abs(at - finals) <= size / 2, likely, elsewhere)
        total += note_weight(model, heard) * np.log(likely)
    return parameters.closing_power * min(1.0, parameters.closing_temper / temper(model, state)) * total


def _closing_finals(model: ScoringModel, state: ScorerState) -> FloatArray | None:
    """Give where each final stands in the octave in which the line lies; None where it has no octave."""
    if model.reading is PitchReading.ANY or not state.weight:
        return None  # or no note has sounded long enough to weigh anything
    size = model.pack.system.divisions
    units = np.arange(len(state.memory)) - MEMORY_OCTAVES_BELOW * size
    middle = float(units @ state.memory) / float(state.memory.sum())
    octaves = np.round((middle - model.final_units - model.home_middle[model.mode_index]) / size)
    return np.asarray(model.final_units + octaves * size, dtype=np.float64)


def log_posterior(model: ScoringModel, state: ScorerState) -> FloatArray:
    """Give the log of `posterior`.

    Raises
    ------
    ImpossibleEvidenceError
        Every hypothesis is ruled out.
    """
    nats = model.log_prior + temper(model, state) * (state.loglik + closing(model, state))
    top = nats.max()
    if not np.isfinite(top):
        raise ImpossibleEvidenceError("no mode is left: every hypothesis is ruled out by the notes so far")
    nats = nats - top
    return np.asarray(nats - np.log(np.exp(nats).sum()), dtype=np.float64)


def posterior(model: ScoringModel, state: ScorerState) -> FloatArray:
    """Give the probability of each hypothesis; sums to 1.

    Raises
    ------
    ImpossibleEvidenceError
        Every hypothesis is ruled out.
    """
    return np.exp(log_posterior(model, state))


def mode_posterior(model: ScoringModel, state: ScorerState) -> FloatArray:
    """Give the probability of each mode over all its finals, shape (n_modes,); sums to 1."""
    return np.asarray(posterior(model, state).reshape(-1, model.n_modes).sum(axis=0), dtype=np.float64)


def log_odds(model: ScoringModel, state: ScorerState, a: int, b: int) -> float:
    """Give the tempered evidence for hypothesis ``a`` against ``b``, in nats."""
    both = np.array([a, b])
    prior = model.log_prior[both]
    nats = prior + temper(model, state) * (state.loglik + closing(model, state))[both]
    return float(nats[0] - nats[1])


def leading(model: ScoringModel, state: ScorerState) -> Leaning:
    """Say where the line leans, which mode is closest behind, and whether that is decided."""
    parameters = model.parameters
    by_hypothesis = posterior(model, state).reshape(-1, model.n_modes)
    by_mode = by_hypothesis.sum(axis=0)
    ranked = np.argsort(-by_mode, kind="stable")
    finals = by_hypothesis.argmax(axis=0)
    best = int(ranked[0])
    p_best = float(by_mode[best])
    rival: int | None = None
    p_rival = 0.0
    if len(ranked) > 1:
        mode = int(ranked[1])
        rival, p_rival = int(finals[mode]) * model.n_modes + mode, float(by_mode[mode])
    decided = p_best >= parameters.decided_at or (
        p_best >= parameters.decided_half and p_best >= parameters.decided_ratio * p_rival
    )
    among = [best]
    while (
        not decided
        and by_mode[among].sum() < parameters.among_share
        and len(among) < min(parameters.among_most, len(ranked))
    ):
        among.append(int(ranked[len(among)]))
    families = {model.modes[index].family for index in among}
    family = families.pop() if len(families) == 1 else ""
    at = int(finals[best]) * model.n_modes + best
    return Leaning(at, rival, p_best, p_rival, decided, tuple(among), family)


def announced(model: ScoringModel, state: ScorerState) -> int | None:
    """Give the mode that the change filter announces right now, or None."""
    at = state.change.announced
    return None if at == NONE else at % model.n_modes
