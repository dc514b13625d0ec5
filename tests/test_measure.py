"""Measuring a collection from file to figures."""

import json
import math
import random
from collections.abc import Callable
from pathlib import Path

import pytest

from melodycoach import measure
from melodycoach.core.evaluation import Evaluation
from melodycoach.core.event import PitchReading
from melodycoach.core.note import InputKind
from melodycoach.errors import CollectionError, UnknownModeError, UsageError
from melodycoach.measure import Bench, evaluate_collection
from melodycoach.report.evaluation import evaluation_json
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
ONLY = ("rast", "ussak", "hicaz")
NO_RASST = "no mode 'makam/rasst' in pack 'makam'; did you mean 'rast'?"


def record(name: str, mode: str, length: int, seed: int, final: bool = True) -> str:
    """Wander over the rising form of a mode and close on its final; no melody of anyone's."""
    chooser = random.Random(seed)
    found = PACK.find(mode)
    degrees = [chooser.choice(found.rising) for _ in range(length - 1)] + [0]
    notes = [
        [0.4 * n, 0.35, round(PACK.system.units_to_cents(found.final_units + degree), 1)]
        for n, degree in enumerate(degrees)
    ]
    melody = {"id": name, "mode": f"makam/{mode}", "notes": notes}
    if final:
        melody["final"] = round(PACK.system.units_to_cents(found.final_units), 1)
    return json.dumps(melody)


@pytest.fixture
def collection(tmp_path: Path) -> Callable[..., Path]:
    def write(*lines: str) -> Path:
        path = tmp_path / "c.jsonl"
        path.write_text("\n".join(lines) + "\n", encoding="utf-8")
        return path

    return write


def same(a: Evaluation, b: Evaluation) -> bool:
    return json.dumps(evaluation_json(a)) == json.dumps(evaluation_json(b))


def test_a_collection_is_measured(collection: Callable[..., Path]) -> None:
    path = collection(*(record(f"{mode}{n}", mode, 30 + n, n) for mode in ONLY for n in range(3)))
    done: list[int] = []
    found = evaluate_collection(path, PACK, ONLY, kind=InputKind.TYPED, progress=done.append)
    assert (found.pack_id, found.mode_ids) == ("makam", tuple(mode.id for mode in PACK.restrict(ONLY)))
    assert (found.n, found.n_notes, found.n_shorter) == (9, 3 * (30 + 31 + 32), (0, 0, 9))
    assert (found.n_skipped, found.left_out, found.n_without_final) == (0, {}, 0)
    # notes of one mode alone, typed without a slip: the three scales differ, so all are named
    assert found.tally_by_checkpoint["all"].accuracy == 1
    assert done == list(range(1, 10))
    assert found.seams is None
    assert found.owed is None


@pytest.mark.parametrize("reading", [PitchReading.WRITTEN, PitchReading.FINAL, PitchReading.ANY])
def test_every_reading_names_clean_lines(collection: Callable[..., Path], reading: PitchReading) -> None:
    path = collection(*(record(mode, mode, 60, 5) for mode in ONLY))
    found = evaluate_collection(path, PACK, ONLY, reading, InputKind.TYPED)
    assert found.tally_by_checkpoint["all"].accuracy == 1
    asked = found.tally_by_checkpoint["all"].n_finals
    assert asked == (3 if reading is PitchReading.ANY else 0)


def test_without_closing_the_last_answer_is_another(collection: Callable[..., Path]) -> None:
    path = collection(record("a", "rast", 45, 2))
    with_it = evaluate_collection(path, PACK, ONLY)
    without = evaluate_collection(path, PACK, ONLY, closing=False)
    assert with_it.tallies[2].log_loss == without.tallies[2].log_loss
    assert with_it.tallies[3].log_loss != without.tallies[3].log_loss


def test_what_cannot_be_measured_is_counted_and_said(collection: Callable[..., Path]) -> None:
    path = collection(
        record("a", "rast", 12, 1),
        "no JSON",
        record("b", "saba", 12, 2),  # in the pack, but does not compete
        record("c", "rast", 12, 3).replace("makam/rast", "makam/rasst"),
        record("d", "rast", 12, 4).replace("makam/rast", "makam/rasst"),
        record("e", "hicaz", 12, 5, final=False),
    )
    said: list[str] = []
    found = evaluate_collection(path, PACK, ONLY, PitchReading.FINAL, on_fault=said.append)
    assert (found.n, found.n_skipped, found.n_without_final) == (1, 1, 1)
    assert found.left_out == {"makam/rasst": 2, "makam/saba": 1}
    assert said == [
        f"{path}: line 2: column 1: not JSON (expecting value); skipped",
        f"{path}: melody 'c': {NO_RASST}; every melody with this label is left out",
    ]
    assert same(found, evaluate_collection(path, PACK, ONLY, PitchReading.FINAL))  # nobody listens


def test_strict_stops_at_an_unknown_label_and_at_a_bad_record(collection: Callable[..., Path]) -> None:
    path = collection(record("a", "rast", 12, 1).replace("makam/rast", "makam/rasst"))
    with pytest.raises(CollectionError) as caught:
        evaluate_collection(path, PACK, ONLY, strict=True)
    assert str(caught.value) == f"{path}: melody 'a': {NO_RASST}"
    with pytest.raises(CollectionError, match="line 1: 'notes' is empty"):
        evaluate_collection(collection('{"id": "a", "mode": "m", "notes": []}'), PACK, strict=True)


def test_a_collection_with_nothing_to_measure_is_said(collection: Callable[..., Path]) -> None:
    for lines, reading, sentence in (
        ([""], PitchReading.WRITTEN, "no melodies in it, expected JSON lines"),
        (
            [record("a", "saba", 9, 1)],
            PitchReading.WRITTEN,
            (
                "no melody has the label of a mode that competes; found 'makam/saba'; "
                "choose another pack or other modes"
            ),
        ),
        (
            [record("a", "rast", 9, 1, final=False)],
            PitchReading.FINAL,
            "no melody has a 'final', which this reading needs",
        ),
    ):
        path = collection(*lines)
        with pytest.raises(CollectionError) as caught:
            evaluate_collection(path, PACK, ONLY, reading)
        assert str(caught.value) == f"{path}: {sentence}"


def test_unknown_candidates_are_said(collection: Callable[..., Path]) -> None:
    with pytest.raises(UnknownModeError, match="did you mean 'rast'"):
        evaluate_collection(collection(""), PACK, ("rasst",))


def test_measures_that_do_not_go_with_a_reading_are_said(tmp_path: Path) -> None:
    path = tmp_path / "not-read.jsonl"
    with pytest.raises(UsageError, match="spliced lines have two finals"):
        evaluate_collection(path, PACK, ONLY, PitchReading.FINAL, seams=3)
    with pytest.raises(UsageError, match="owed steps stand on a known final"):
        evaluate_collection(path, PACK, ONLY, PitchReading.ANY, owed=3)
    with pytest.raises(UsageError, match="let at least two compete"):
        evaluate_collection(path, PACK, ("rast",), owed=3)


def test_seams_and_owed_steps_are_measured_the_same_for_one_seed(collection: Callable[..., Path]) -> None:
    lines = [record(f"{mode}{n}", mode, 130 + n, n) for mode in ONLY for n in range(2)]
    path = collection(*lines, record("short", "rast", 19, 9))

    def measured(seed: int) -> Evaluation:
        return evaluate_collection(path, PACK, ONLY, kind=InputKind.TYPED, seams=6, owed=4, seed=seed)

    found = measured(1)
    assert found.seams is not None
    assert found.owed is not None
    assert (found.seams.n_seams, found.seams.n_excerpts, found.seams.n_excerpt_notes) == (6, 6, 720)
    # clean scales of three modes: most changes are heard
    assert found.seams.noticed >= 0.5
    assert found.owed.n == 4
    assert same(found, measured(1))
    assert not same(found, measured(2))


def test_seams_and_owed_steps_need_melodies_that_are_long_enough(collection: Callable[..., Path]) -> None:
    path = collection(record("a", "rast", 130, 1), record("b", "hicaz", 19, 2))
    with pytest.raises(CollectionError) as caught:
        evaluate_collection(path, PACK, ONLY, seams=2)
    assert str(caught.value) == (
        f"{path}: spliced lines need melodies of 120 notes or more in two modes, found 1 in 1"
    )
    with pytest.raises(CollectionError) as caught:
        evaluate_collection(collection(record("b", "hicaz", 19, 2)), PACK, ONLY, owed=2)
    assert str(caught.value) == f"{path}: owed steps need melodies of 20 notes or more, found none"


def test_a_sample_holds_each_of_a_stream_with_the_same_chance() -> None:
    # 3 of 12, drawn 4000 times: each is expected 1000 times, standard deviation sqrt(4000·¼·¾) = 27
    chooser = random.Random(1)
    times = [0] * 12
    for _ in range(4000):
        kept = measure._sample(iter(range(12)), 3, chooser)
        assert len(set(kept)) == 3
        for item in kept:
            times[item] += 1
    assert all(abs(n - 1000) < 5 * math.sqrt(750) for n in times)
    assert measure._sample(iter("ab"), 3, chooser) == ["a", "b"]


def test_models_for_many_finals_do_not_pile_up() -> None:
    bench = Bench(PACK, PACK.restrict(ONLY), PitchReading.FINAL, measure.ScoringParameters(), True)
    first = bench.model(6900.0)
    assert bench.model(6900.0) is first
    for cents in range(200):
        bench.model(6000.0 + cents)
    assert len(bench._models) <= measure._MODELS_KEPT
    written = Bench(PACK, PACK.restrict(ONLY), PitchReading.WRITTEN, measure.ScoringParameters(), True)
    assert written.model(6900.0) is written.model(7100.0)


@pytest.mark.slow
def test_the_figures_do_not_depend_on_the_number_of_processes(collection: Callable[..., Path]) -> None:
    path = collection(*(record(f"{n}", ONLY[n % 3], 25 + n % 7, n) for n in range(61)))
    done: list[int] = []
    alone = evaluate_collection(path, PACK, ONLY, workers=1, seams=0, owed=60)
    together = evaluate_collection(path, PACK, ONLY, workers=2, seams=0, owed=60, progress=done.append)
    assert same(alone, together)
    assert done == list(range(1, 62))
