"""Which owed step would settle the mode best."""

from math import log

import numpy as np
import pytest

from melodycoach.core.event import PitchReading
from melodycoach.core.mode import CharacteristicStep, Need, StepKind
from melodycoach.core.model import ScoringModel, build_model
from melodycoach.core.note import Heard, InputKind
from melodycoach.core.owed import StepTrack, follow, start_track
from melodycoach.core.ranking import CORE_NATS, MOVING_S, RESTING_S, rank_owed, step_pitches
from melodycoach.core.scorer import ScorerState, advance, log_odds, mode_posterior, posterior, start
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
KIND = StepKind
TYPED = InputKind.TYPED
FAMILY = build_model(PACK, PACK.restrict(("ussak", "huseyni", "muhayyer", "neva", "rast", "hicaz")))


def hypothesis(model: ScoringModel, slug: str) -> int:
    return [mode.slug for mode in model.modes].index(slug)


def cents(units: float) -> float:
    return PACK.system.units_to_cents(units)


def sung(text: str) -> list[Heard]:
    """Commas from A4; ``!`` behind a note: the line rests on it; ``.``: a phrase ends there too."""
    return [
        Heard(cents(float(word.rstrip("!."))), TYPED, 0.35, word[-1] in "!.", word[-1] == ".")
        for word in text.split()
    ]


def played(model: ScoringModel, slug: str, text: str) -> tuple[ScorerState, StepTrack]:
    state = start(model)
    h = hypothesis(model, slug)
    track = start_track(model.modes[model.mode_index[h]], int(model.final_units[h]), PACK.system)
    for note in sung(text):
        state, track = advance(model, state, note), follow(track, note)
    return state, track


LINE = "22 31! 22 13 8 0!"


def test_only_owed_steps_are_ranked_and_each_once() -> None:
    state, track = played(FAMILY, "huseyni", LINE)
    ranked = rank_owed(FAMILY, state, hypothesis(FAMILY, "huseyni"), track)
    assert track.heard  # the line has heard some
    assert sorted(owed.step.id for owed in ranked) == sorted(step.id for step in track.owed)


def test_the_gain_is_what_the_scorer_says_when_the_step_is_played() -> None:
    state, track = played(FAMILY, "huseyni", LINE)
    h, rival = hypothesis(FAMILY, "huseyni"), hypothesis(FAMILY, "ussak")
    for owed in rank_owed(FAMILY, state, h, track, rival):
        after = state
        for n, pitch in enumerate(owed.pitches_cents, start=1):
            last = n == len(owed.pitches_cents)
            note = Heard(pitch, TYPED, RESTING_S if last else MOVING_S, last, False)
            after = advance(FAMILY, after, note)
        gain = log_odds(FAMILY, after, h, rival) - log_odds(FAMILY, state, h, rival)
        assert owed.gain_nats == pytest.approx(gain, abs=1e-9)


def test_without_a_rival_the_gain_is_against_all_others() -> None:
    state, track = played(FAMILY, "huseyni", LINE)
    h = hypothesis(FAMILY, "huseyni")
    first = rank_owed(FAMILY, state, h, track)[0]
    after = state
    for n, pitch in enumerate(first.pitches_cents, start=1):
        last = n == len(first.pitches_cents)
        after = advance(FAMILY, after, Heard(pitch, TYPED, RESTING_S if last else MOVING_S, last, False))
    before_p, after_p = (float(posterior(FAMILY, s)[h]) for s in (state, after))
    odds = log(after_p / (1 - after_p)) - log(before_p / (1 - before_p))
    assert first.gain_nats == pytest.approx(odds, abs=1e-9)


def test_it_rules_out_the_mode_that_loses_most_probability() -> None:
    state, track = played(FAMILY, "huseyni", LINE)
    h = hypothesis(FAMILY, "huseyni")
    first = rank_owed(FAMILY, state, h, track)[0]
    after = state
    for n, pitch in enumerate(first.pitches_cents, start=1):
        last = n == len(first.pitches_cents)
        after = advance(FAMILY, after, Heard(pitch, TYPED, RESTING_S if last else MOVING_S, last, False))
    lost = mode_posterior(FAMILY, state) - mode_posterior(FAMILY, after)
    lost[h] = -np.inf
    assert first.rules_out == int(lost.argmax())


def test_gains_fall_but_for_what_core_is_worth_and_colour_comes_last() -> None:
    state, track = played(FAMILY, "huseyni", "0 8 13")
    ranked = rank_owed(FAMILY, state, hypothesis(FAMILY, "huseyni"), track)
    places = [
        (
            owed.step.need is Need.COLOUR,
            -owed.gain_nats - (CORE_NATS if owed.step.need is Need.CORE else 0),
        )
        for owed in ranked
    ]
    assert places == sorted(places)
    assert {owed.step.need for owed in ranked} == set(Need)


def test_colour_comes_after_what_is_owed_even_if_it_gains_more() -> None:
    steps = (
        CharacteristicStep("colour", KIND.COLOUR_INTERVAL, Need.COLOUR, (31, 39, 31)),
        CharacteristicStep("usual", KIND.COLOUR_INTERVAL, Need.USUAL, (5, 17)),
    )
    mode = PACK.find("huseyni")
    odd = type(mode)(**{**{k: v for k, v in vars(mode).items() if k not in vars(type(mode))}, "steps": steps})
    track = start_track(odd, 0, PACK.system)
    ranked = rank_owed(FAMILY, start(FAMILY), hypothesis(FAMILY, "huseyni"), track)
    assert [owed.step.id for owed in ranked] == ["usual", "colour"]
    assert ranked[0].gain_nats < 0 < ranked[1].gain_nats  # 5 17 is the second of Hicaz: common practice


def test_a_core_step_stands_before_a_colour_of_the_same_notes() -> None:
    mode = PACK.find("huseyni")
    steps = tuple(
        CharacteristicStep(need.value, KIND.COLOUR_INTERVAL, need, (22, 31))
        for need in (Need.COLOUR, Need.USUAL, Need.CORE)
    )
    twin = type(mode)(
        **{**{k: v for k, v in vars(mode).items() if k not in vars(type(mode))}, "steps": steps}
    )
    track = start_track(twin, 0, PACK.system)
    ranked = rank_owed(FAMILY, start(FAMILY), hypothesis(FAMILY, "huseyni"), track)
    assert [owed.step.id for owed in ranked] == ["core", "usual", "colour"]
    assert len({owed.gain_nats for owed in ranked}) == 1


def test_a_target_that_does_not_lead_gains_on_the_leading_mode() -> None:
    state, track = played(FAMILY, "huseyni", "22 31! 39 44 39 31! 35 31 22 13! 8 0!")
    h = hypothesis(FAMILY, "ussak")
    track = start_track(PACK.find("ussak"), 0, PACK.system)
    first = rank_owed(FAMILY, state, h, track)[0]
    assert first.gain_nats > 0
    assert first.rules_out == hypothesis(FAMILY, "huseyni")


def test_the_end_of_a_phrase_is_not_held_against_what_follows() -> None:
    open_end, track = played(FAMILY, "huseyni", LINE)
    ended, _ = played(FAMILY, "huseyni", LINE.removesuffix("!") + ".")
    h = hypothesis(FAMILY, "huseyni")
    gains = [[owed.gain_nats for owed in rank_owed(FAMILY, state, h, track)] for state in (open_end, ended)]
    assert gains[0] == pytest.approx(gains[1])


def test_a_plain_keyboard_gains_nothing_by_tuning() -> None:
    # rast and mahur: segâh or bûselik, one key; the third mode has a flat third: common practice
    model = build_model(PACK, PACK.restrict(("rast", "mahur")))
    h = hypothesis(model, "rast")
    third = CharacteristicStep("third", KIND.COLOUR_INTERVAL, Need.CORE, (0, 9, 17))
    mode = PACK.find("rast")
    twin = type(mode)(
        **{**{k: v for k, v in vars(mode).items() if k not in vars(type(mode))}, "steps": (third,)}
    )
    track = start_track(twin, -9, PACK.system)
    gain = [
        rank_owed(model, start(model), h, track, kind=kind)[0].gain_nats for kind in (TYPED, InputKind.KEYS)
    ]
    assert gain[0] > gain[1] + 0.5


def test_a_mode_without_competitors_has_nothing_to_gain() -> None:
    model = build_model(PACK, (PACK.find("rast"),))
    state, track = played(model, "rast", "-9 0 8")
    ranked = rank_owed(model, state, 0, track)
    assert {owed.gain_nats for owed in ranked} == {0.0}
    assert {owed.rules_out for owed in ranked} == {None}


def test_any_pitch_ranks_against_other_finals_too() -> None:
    model = build_model(PACK, PACK.restrict(("rast", "ussak")), PitchReading.ANY)
    state = start(model)
    for note in sung("0 9 17! 22 17 9 0!"):
        state = advance(model, state, note)
    h = int(posterior(model, state).argmax())
    mode = model.modes[model.mode_index[h]]
    track = start_track(mode, int(model.final_units[h]), PACK.system)
    ranked = rank_owed(model, state, h, track)
    assert len(ranked) == len(mode.steps)
    assert ranked[0].rules_out == 1 - model.mode_index[h]


HUSEYNI = PACK.find("huseyni")


@pytest.mark.parametrize("line", ["0 8 13 22!", "-18 -22!", "53 61 66 75!", "31"])
def test_every_step_is_played_where_it_is_written_however_high_or_low_the_line_ended(line: str) -> None:
    state, track = played(FAMILY, "huseyni", line)
    for owed in rank_owed(FAMILY, state, hypothesis(FAMILY, "huseyni"), track):
        units = [PACK.system.cents_to_units(pitch) for pitch in owed.pitches_cents]
        assert units == pytest.approx(owed.step.degrees)  # the final is A4, zero


def test_a_step_stands_over_the_final_that_is_given_and_in_the_octave_that_is_asked_for() -> None:
    step = CharacteristicStep("s", KIND.HALF_CADENCE, Need.CORE, (39, 31))
    assert step_pitches(step, -9, PACK.system) == pytest.approx((cents(30), cents(22)))
    assert step_pitches(step, 0, PACK.system, octaves=-1) == pytest.approx((cents(-14), cents(-22)))
