"""Hearing labelled melodies: the answers are those of a live line at each checkpoint."""

import random

import numpy as np
import pytest

from melodycoach.core.evaluation import CHECKPOINTS, Evaluation, guess, judge
from melodycoach.core.event import PitchReading
from melodycoach.core.model import ScoringModel, build_model
from melodycoach.core.note import Heard, InputKind
from melodycoach.core.scorer import advance, leading, mode_posterior, start
from melodycoach.core.tally import tally
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
MODES = PACK.restrict(("rast", "ussak", "hicaz", "saba", "nihavend"))
MODEL = build_model(PACK, MODES)


def line(mode: str, length: int, seed: int = 1, shift_units: float = 0.0) -> list[Heard]:
    """Wander over a mode's rising form; every fifth note rests, the last one is the final and closes."""
    chooser = random.Random(seed)
    found = PACK.find(mode)
    degrees = [chooser.choice(found.rising) for _ in range(length - 1)] + [0]
    return [
        Heard(
            PACK.system.units_to_cents(found.final_units + degree + shift_units),
            InputKind.TYPED,
            0.35 if number % 5 else 0.9,
            number % 5 == 0 or number == length,
            number == length,
        )
        for number, degree in enumerate(degrees, 1)
    ]


def place(mode: str, model: ScoringModel = MODEL) -> int:
    return [m.slug for m in model.modes].index(mode)


@pytest.mark.parametrize("mode", ["rast", "hicaz", "saba"])
def test_each_checkpoint_holds_the_answer_of_a_line_that_ends_there(mode: str) -> None:
    notes = line(mode, 55)
    verdict = judge(MODEL, notes, place("ussak"))
    assert (verdict.label, verdict.n_notes, len(verdict.guesses)) == (place("ussak"), 55, 4)
    for length, found in zip((*CHECKPOINTS, 55), verdict.guesses, strict=True):
        state = start(MODEL)
        for note in notes[:length]:
            state = advance(MODEL, state, note)
        probabilities = mode_posterior(MODEL, state)
        assert found.answer == int(np.argmax(probabilities))
        assert found.probability == pytest.approx(float(probabilities.max()))
        assert found.label_probability == float(probabilities[place("ussak")])
        assert found.label_rank == sorted(probabilities, reverse=True).index(probabilities[place("ussak")])
        assert found.decided == leading(MODEL, state).decided
        assert found.final_found is None


def test_a_melody_that_ends_sooner_counts_with_its_answer_at_the_end() -> None:
    notes = line("hicaz", 20)
    verdict = judge(MODEL, notes, place("hicaz"))
    # the second checkpoint is the end itself, so its answer counts the closing
    assert verdict.guesses[1] == verdict.guesses[2] == verdict.guesses[3]
    assert verdict.guesses[0] != verdict.guesses[3]
    assert verdict.guesses[0] == judge(MODEL, notes[:10], place("hicaz")).guesses[3]


def test_only_the_end_counts_the_closing() -> None:
    notes = line("rast", 41)
    last = notes[-1]
    still_open = [*notes[:-1], Heard(last.pitch_cents, last.kind, last.length_s, last.rests, False)]
    closed, unclosed = (judge(MODEL, heard, place("rast")) for heard in (notes, still_open))
    assert closed.guesses[:3] == unclosed.guesses[:3]
    assert closed.guesses[3] != unclosed.guesses[3]


@pytest.mark.parametrize(("notes", "label"), [([], 0), (line("rast", 3), -1), (line("rast", 3), 5)])
def test_no_notes_and_a_label_that_is_no_place_are_mistakes(notes: list[Heard], label: int) -> None:
    with pytest.raises(ValueError, match=f"{len(notes)} notes with label {label} of 5 modes"):
        judge(MODEL, notes, label)


@pytest.mark.parametrize("shift", [0, 7, -20])
def test_at_any_pitch_the_final_is_found_in_any_octave(shift: int) -> None:
    model = build_model(PACK, PACK.restrict(("rast", "hicaz")), PitchReading.ANY)
    final_cents = PACK.system.units_to_cents(PACK.find("hicaz").final_units + shift)
    notes = line("hicaz", 60, shift_units=shift)
    for octaves, cents_off, found in ((0, 0, True), (1200, 0, True), (-2400, 24, True), (0, 26, False)):
        verdict = judge(model, notes, place("hicaz", model), final_cents + octaves + cents_off)
        assert verdict.guesses[-1].answer == place("hicaz", model)
        assert verdict.guesses[-1].final_found is found
    assert judge(model, notes, 0).guesses[-1].final_found is None


def test_a_single_candidate_is_always_answered() -> None:
    model = build_model(PACK, PACK.restrict(("rast",)))
    state = advance(model, start(model), line("saba", 2)[0])
    found = guess(model, state, 0)
    assert (found.answer, found.probability, found.label_rank, found.decided) == (0, 1.0, 0, True)


def test_the_tallies_of_an_evaluation_go_by_the_names_of_the_checkpoints() -> None:
    verdicts = [judge(MODEL, line(mode.slug, 50, seed), i) for i, mode in enumerate(MODES) for seed in (1, 2)]
    tallies = tally(verdicts, len(MODES), 4)
    evaluation = Evaluation(
        "makam",
        tuple(mode.id for mode in MODES),
        PitchReading.WRITTEN,
        InputKind.TYPED,
        True,
        10,
        500,
        (0, 0, 0),
        tallies,
    )
    assert list(evaluation.tally_by_checkpoint) == ["10", "20", "40", "all"]
    assert evaluation.tally_by_checkpoint["all"] is tallies[3]
    # notes of one mode alone, typed without a slip: the five scales differ, so all must be named
    assert tallies[3].accuracy == 1
