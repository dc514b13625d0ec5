"""Which owed step would settle the mode best."""

from math import log

import numpy as np
import pytest

from melodycoach.core.event import PitchReading
from melodycoach.core.mode import CharacteristicStep, Need, StepKind
from melodycoach.core.model import ScoringModel, build_model
from melodycoach.core.note import Heard, InputKind
from melodycoach.core.owed import StepTrack, follow, start_track
from melodycoach.core.ranking import MOVING_S, NEED_NATS, RESTING_S, placed, rank_owed
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
    ranked = rank_owed(FAMILY, state, hypothesis(FAMILY, "huseyni"), track, cents(0))
    assert track.heard  # the line has heard some
    assert sorted(owed.step.id for owed in ranked) == sorted(step.id for step in track.owed)


def test_the_gain_is_what_the_scorer_says_when_the_step_is_played() -> None:
    state, track = played(FAMILY, "huseyni", LINE)
    h, rival = hypothesis(FAMILY, "huseyni"), hypothesis(FAMILY, "ussak")
    for owed in rank_owed(FAMILY, state, h, track, cents(0), rival):
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
    first = rank_owed(FAMILY, state, h, track, cents(0))[0]
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
    first = rank_owed(FAMILY, state, h, track, cents(0))[0]
    after = state
    for n, pitch in enumerate(first.pitches_cents, start=1):
        last = n == len(first.pitches_cents)
        after = advance(FAMILY, after, Heard(pitch, TYPED, RESTING_S if last else MOVING_S, last, False))
    lost = mode_posterior(FAMILY, state) - mode_posterior(FAMILY, after)
    lost[h] = -np.inf
    assert first.rules_out == int(lost.argmax())


def test_gains_fall_but_for_what_need_is_worth() -> None:
    state, track = played(FAMILY, "huseyni", "0 8 13")
    ranked = rank_owed(FAMILY, state, hypothesis(FAMILY, "huseyni"), track, cents(13))
    worth = [owed.gain_nats + NEED_NATS[owed.step.need] for owed in ranked]
    assert worth == sorted(worth, reverse=True)
    assert len({owed.step.need for owed in ranked}) > 1


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
    ranked = rank_owed(FAMILY, start(FAMILY), hypothesis(FAMILY, "huseyni"), track, cents(22))
    assert [owed.step.id for owed in ranked] == ["core", "usual", "colour"]
    assert len({owed.gain_nats for owed in ranked}) == 1


def test_a_target_that_does_not_lead_gains_on_the_leading_mode() -> None:
    state, track = played(FAMILY, "huseyni", "22 31! 39 44 39 31! 35 31 22 13! 8 0!")
    h = hypothesis(FAMILY, "ussak")
    track = start_track(PACK.find("ussak"), 0, PACK.system)
    first = rank_owed(FAMILY, state, h, track, cents(0))[0]
    assert first.gain_nats > 0
    assert first.rules_out == hypothesis(FAMILY, "huseyni")


def test_the_end_of_a_phrase_is_not_held_against_what_follows() -> None:
    open_end, track = played(FAMILY, "huseyni", LINE)
    ended, _ = played(FAMILY, "huseyni", LINE.removesuffix("!") + ".")
    h = hypothesis(FAMILY, "huseyni")
    gains = [
        [owed.gain_nats for owed in rank_owed(FAMILY, state, h, track, cents(0))]
        for state in (open_end, ended)
    ]
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
        rank_owed(model, start(model), h, track, cents(-9), kind=kind)[0].gain_nats
        for kind in (TYPED, InputKind.KEYS)
    ]
    assert gain[0] > gain[1] + 0.5


def test_a_mode_without_competitors_has_nothing_to_gain() -> None:
    model = build_model(PACK, (PACK.find("rast"),))
    state, track = played(model, "rast", "-9 0 8")
    ranked = rank_owed(model, state, 0, track, cents(0))
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
    ranked = rank_owed(model, state, h, track, cents(0))
    assert len(ranked) == len(mode.steps)
    assert ranked[0].rules_out == 1 - model.mode_index[h]


HUSEYNI = PACK.find("huseyni")


def at(kind: StepKind, degrees: tuple[int, ...], recent: float, final: int = 0) -> list[float]:
    step = CharacteristicStep("s", kind, Need.CORE, degrees)
    pitches = placed(step, HUSEYNI, final, PACK.system, cents(recent))
    return [round(PACK.system.cents_to_units(pitch), 6) for pitch in pitches]


@pytest.mark.parametrize(
    ("kind", "degrees", "recent", "units"),
    [
        (KIND.HALF_CADENCE, (39, 31), 20, [39, 31]),
        (KIND.COLOUR_INTERVAL, (13, 22), 70, [66, 75]),  # tiz çargâh, tiz nevâ: above the octave
        (KIND.COLOUR_INTERVAL, (44, 53), -5, [-9, 0]),  # rast, dügâh: below the octave
        (KIND.COLOUR_INTERVAL, (13, 27), 70, [13, 27]),  # the mode has no 80
        (KIND.OPENING, (22, 31), 80, [22, 31]),
        (KIND.REGISTER, (44, 53), -9, [44, 53]),
        (KIND.FINAL_CADENCE, (13, 8, 0), 60, [13, 8, 0]),
        (KIND.LEADING_TONE, (0, -9, 0), 60, [0, -9, 0]),
    ],
)
def test_a_step_is_placed_where_it_would_be_played(
    kind: StepKind, degrees: tuple[int, ...], recent: float, units: list[float]
) -> None:
    assert at(kind, degrees, recent) == units


def test_a_line_that_lives_octaves_away_takes_the_cadence_with_it() -> None:
    low, high = HUSEYNI.degrees[0], HUSEYNI.degrees[-1]
    assert at(KIND.FINAL_CADENCE, (13, 8, 0), low - 13) == [13, 8, 0]  # 53 // 4 = 13
    assert at(KIND.FINAL_CADENCE, (13, 8, 0), low - 14) == [-40, -45, -53]
    assert at(KIND.FINAL_CADENCE, (13, 8, 0), high + 14) == [66, 61, 53]
    assert at(KIND.FINAL_CADENCE, (13, 8, 0), low - 14 - 53) == [13 - 106, 8 - 106, -106]
    assert at(KIND.COLOUR_INTERVAL, (13, 27), low - 14) == [13 - 53, 27 - 53]
    assert at(KIND.OPENING, (22, 31), low - 14) == [22, 31]


def test_a_step_is_placed_over_the_final_that_is_given() -> None:
    assert at(KIND.HALF_CADENCE, (39, 31), 10, final=-9) == [30, 22]
