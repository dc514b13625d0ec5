"""Trying the top owed step: gains worked out by themselves, walks against an enumeration."""

import math
from dataclasses import replace
from itertools import product

import numpy as np
import pytest

from melodycoach.core.event import PitchReading
from melodycoach.core.mode import CharacteristicStep, Need, StepKind
from melodycoach.core.model import ScoringModel, build_model
from melodycoach.core.note import Heard, InputKind
from melodycoach.core.owed_trial import (
    OwedTrial,
    mode_log_odds,
    owed_figures,
    try_owed,
    walk_scale,
)
from melodycoach.core.scorer import ScorerState, advance, mode_posterior, start
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
MODES = PACK.restrict(("rast", "ussak", "huseyni"))
MODEL = build_model(PACK, MODES)
RAST, USSAK = 0, 1


def heard(units: float, kind: InputKind = InputKind.TYPED, length_s: float = 0.3) -> Heard:
    cents = PACK.system.units_to_cents(units)
    if kind is InputKind.KEYS:
        cents = 100.0 * round(cents / 100)
    return Heard(cents, kind, length_s, length_s > 0.4, False)


def state_after(model: ScoringModel, notes: list[Heard]) -> ScorerState:
    state = start(model)
    for note in notes:
        state = advance(model, state, note)
    return state


# rast on G4 (9 commas under A4): its degrees 0 9 17 22, and 9 last
OPENING = [0, 9, 17, 22, 9]


@pytest.mark.parametrize("kind", [InputKind.TYPED, InputKind.RECORDED, InputKind.KEYS])
@pytest.mark.parametrize("degrees", [(31, 22), (31, 22, 17), (22, 31, 40, 31)])
def test_a_step_gains_what_its_notes_add_and_a_walk_the_mean_of_all_walks(
    degrees: tuple[int, ...], kind: InputKind
) -> None:
    # the mode owes this one step; its degrees lie in the octave in which the line is
    step = CharacteristicStep("one", StepKind.HALF_CADENCE, Need.CORE, degrees)
    model = build_model(PACK, (replace(MODES[RAST], steps=(step,)), *MODES[1:]))
    notes = [heard(-9 + degree, kind) for degree in OPENING]
    trial = try_owed(model, notes, RAST)
    state = state_after(model, notes)
    before = mode_log_odds(model, state, RAST)

    def gain(played: list[int]) -> float:
        after = state
        for number, degree in enumerate(played, 1):
            after = advance(model, after, heard(-9 + degree, kind, 0.8 if number == len(played) else 0.3))
        return mode_log_odds(model, after, RAST) - before

    scale = walk_scale(MODES[RAST])
    walks = []
    for moves in product((-1, 1), repeat=len(degrees)):
        at = scale.index(9)  # the last note; far from both ends of the scale every move is possible
        walk = []
        for move in moves:
            at += move
            walk.append(scale[at])
        walks.append(gain(walk))
    assert trial is not None
    assert trial.step_nats == pytest.approx(gain(list(degrees)))
    assert trial.walk_nats == pytest.approx(sum(walks) / len(walks))
    assert trial.walk_beaten == sum(walk < trial.step_nats for walk in walks) / len(walks)


def test_at_an_end_of_the_scale_there_is_only_the_way_back() -> None:
    mode = MODES[RAST]
    scale = walk_scale(mode)
    top = heard(mode.final_units + scale[-1])
    trial = try_owed(MODEL, [top], RAST)
    assert trial is not None  # no index runs out of the scale
    assert math.isfinite(trial.walk_nats)


def test_the_odds_are_those_of_the_mode_against_all_others() -> None:
    for reading in (PitchReading.WRITTEN, PitchReading.ANY):
        model = build_model(PACK, MODES, reading)
        state = state_after(model, [heard(-9 + degree) for degree in OPENING])
        p = mode_posterior(model, state)
        for hypothesis in (RAST, USSAK):
            odds = math.log(p[hypothesis]) - math.log(np.delete(p, hypothesis).sum())
            assert mode_log_odds(model, state, hypothesis) == pytest.approx(odds)


def test_the_scale_of_a_walk_is_the_rising_form_with_what_lies_under_and_over_it() -> None:
    rast = MODES[RAST]
    assert set(walk_scale(rast)) == {*rast.rising, *rast.below, *rast.above}
    assert list(walk_scale(rast)) == sorted(walk_scale(rast))
    assert 44 not in walk_scale(rast)  # acem is of the falling form: common practice


def test_a_mode_that_owes_nothing_is_not_tried() -> None:
    stepless = tuple(replace(mode, steps=()) for mode in MODES)
    assert try_owed(build_model(PACK, stepless), [heard(0)], RAST) is None


def test_the_step_is_worth_more_than_a_walk_after_an_opening_that_says_little() -> None:
    # rast and mahur share their close on G4; four notes around it leave both open (common practice)
    model = build_model(PACK, PACK.restrict(("rast", "mahur", "nihavend")))
    trial = try_owed(model, [heard(units) for units in (-9, 0, -9, -9)], 0)
    assert trial is not None
    assert trial.step_nats > trial.walk_nats
    assert trial.walk_beaten > 0.5


def test_the_figures_of_some_trials() -> None:
    # gains 1 and 2 of steps, .25 and .5 of walks: means 1.5 and .375, ratio 4
    found = owed_figures(iter([OwedTrial(1, 0.25, 1.0), None, OwedTrial(2, 0.5, 0.5)]), seed=3)
    assert (found.n, found.n_nothing_owed, found.seed) == (2, 1, 3)
    assert (found.step_nats, found.walk_nats, found.ratio) == (1.5, 0.375, 4)
    assert found.walk_beaten == 0.75


def test_without_trials_or_gains_of_walks_there_is_no_ratio() -> None:
    assert math.isnan(owed_figures([None]).step_nats)
    assert math.isnan(owed_figures([None]).ratio)
    assert math.isnan(owed_figures([OwedTrial(1, -0.5, 1)]).ratio)
