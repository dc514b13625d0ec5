"""An evaluation as text and as JSON, drawn whole from answers made up by hand."""

import json
import math
from dataclasses import replace

import numpy as np
import pytest

from melodycoach.core.evaluation import Evaluation
from melodycoach.core.event import PitchReading
from melodycoach.core.note import InputKind
from melodycoach.core.owed_trial import OwedFigures
from melodycoach.core.seams import SeamFigures
from melodycoach.core.tally import Guess, Verdict, tally
from melodycoach.report.evaluation import evaluation_json, evaluation_text, protocol

MODES = ("own/one", "own/two", "own/three", "own/four")


def verdict(label: int, *said: tuple[int, float], found: bool | None = None) -> Verdict:
    guesses = tuple(
        Guess(answer, p, p if answer == label else (1 - p) / 3, int(answer != label), p >= 0.6, found)
        for answer, p in said
    )
    return Verdict(label, 50, guesses)


# answers after 10, 20, 40 and all notes; nothing has "own/four" as its label
VERDICTS = (
    verdict(0, (0, 0.35), (0, 0.45), (0, 0.65), (0, 0.95), found=True),
    verdict(0, (1, 0.35), (0, 0.4), (0, 0.6), (0, 0.85), found=False),
    verdict(1, (0, 0.3), (0, 0.4), (0, 0.5), (0, 0.7), found=True),
    verdict(2, (2, 0.5), (2, 0.7), (2, 0.8), (3, 0.6), found=True),
)

WRITTEN = Evaluation(
    pack_id="own",
    mode_ids=MODES,
    reading=PitchReading.WRITTEN,
    kind=InputKind.TYPED,
    closing=True,
    n=4,
    n_notes=200,
    n_shorter=(0, 0, 0),
    tallies=tally(VERDICTS, 4, 4),
)

TEXT = """\
4 melodies, 200 notes

How it was measured
  Each melody is heard note by note, by the same scorer as a live line;
  nothing is learned from it.
  Input: typed. Final: each mode stands on its own written final.
  4 modes of pack 'own' compete; the answer is the likeliest one, decided or
  not.
  The answer after all notes counts the end of the melody as the end of a
  phrase.
  Macro-F1 is the mean over the modes that occur as labels.
  Calibration error: the expected one, in 10 bins of equal width by the
  answer's probability.

after                         10      20      40     all  notes
accuracy                   0.500   0.750   0.750   0.500
macro-F1                   0.500   0.600   0.600   0.267
label among the first 3    1.000   1.000   1.000   1.000
share undecided            1.000   0.750   0.250   0.000
accuracy when decided          –   1.000   1.000   0.500
calibration error          0.125   0.263   0.362   0.375
log loss, nats             1.182   0.920   0.739   1.133
(one standard error of the accuracy after all notes: 0.250)

Reliability: probability said, share right, number of melodies
probability         10 notes         20 notes         40 notes        all notes
             said right    n  said right    n  said right    n  said right    n
0.0 to 0.1                 –                –                –                –
0.1 to 0.2                 –                –                –                –
0.2 to 0.3                 –                –                –                –
0.3 to 0.4   0.33  0.33    3                –                –                –
0.4 to 0.5                 –  0.42  0.67    3                –                –
0.5 to 0.6   0.50  1.00    1                –  0.50  0.00    1                –
0.6 to 0.7                 –                –  0.62  1.00    2  0.60  0.00    1
0.7 to 0.8                 –  0.70  1.00    1                –  0.70  0.00    1
0.8 to 0.9                 –                –  0.80  1.00    1  0.85  1.00    1
0.9 to 1.0                 –                –                –  0.95  1.00    1

Answers after all notes: rows are labels, columns answers
           1  2  3  4
  1 one    2  ·  ·  ·
  2 two    1  ·  ·  ·
  3 three  ·  ·  ·  1
  Answers that no melody has as its label: 4 four

Confused most after all notes
  two named one 1 of 1
  three named four 1 of 1
"""


def test_the_text_shows_the_protocol_and_every_figure() -> None:
    assert evaluation_text(WRITTEN) == TEXT


def test_the_protocol_says_what_was_left_out_and_what_was_short() -> None:
    found = protocol(
        replace(
            WRITTEN,
            reading=PitchReading.ANY,
            kind=InputKind.RECORDED,
            closing=False,
            n_shorter=(0, 1, 3),
            n_skipped=1,
            left_out={"own/five": 2, "own/six": 1},
            n_without_final=4,
        )
    )
    assert found == (
        "Each melody is heard note by note, by the same scorer as a live line; nothing is learned from it.",
        "Input: recorded. Final: every mode may stand on every pitch.",
        "4 modes of pack 'own' compete; the answer is the likeliest one, decided or not.",
        (
            "Melodies that end before a checkpoint (1 before note 20, 3 before note 40) count there with "
            "their last answer."
        ),
        "The answer after all notes does not count the end of the melody as the end of a phrase.",
        "Macro-F1 is the mean over the modes that occur as labels.",
        "Calibration error: the expected one, in 10 bins of equal width by the answer's probability.",
        "A final is found when it is within a good comma of the label, in any octave.",
        "Left out: 1 melody that could not be read.",
        "Left out: 3 melodies that have labels that do not compete (five, six).",
        "Left out: 4 melodies that have no final.",
    )


def test_the_json_has_the_shape_that_programs_rely_on() -> None:
    found = json.loads(json.dumps(evaluation_json(WRITTEN), allow_nan=False))
    assert {key: found[key] for key in ("n", "as", "accuracy", "macro_f1")} == {
        "n": 4,
        "as": "written",
        # named rightly: 2 (first and last), 3, 3, 2 of 4
        "accuracy": {"10": 0.5, "20": 0.75, "40": 0.75, "all": 0.5},
        # 10: one has F1 2·1/(2+2), two 0, three 1: mean of 1/2, 0, 1
        # 20 and 40: one 2·2/(2+3) = .8, two 0, three 1; all: .8, 0, 0
        "macro_f1": {"10": 0.5, "20": 0.6, "40": 0.6, "all": 0.266667},
    }
    # after all notes: .95 and .85 right, .7 and .6 wrong: (.05 + .15 + .7 + .6) / 4
    assert found["ece"]["all"] == 0.375
    assert found["undecided"] == {"10": 1, "20": 0.75, "40": 0.25, "all": 0}
    assert found["decided_accuracy"] == {"10": None, "20": 1, "40": 1, "all": 0.5}
    assert found["top3"] == {"10": 1, "20": 1, "40": 1, "all": 1}
    assert found["confusion"]["all"] == [[2, 0, 0, 0], [1, 0, 0, 0], [0, 0, 0, 1], [0, 0, 0, 0]]
    assert found["confused"] == [
        {"modes": ["own/one", "own/two"], "first_as_second": 0, "second_as_first": 1},
        {"modes": ["own/three", "own/four"], "first_as_second": 1, "second_as_first": 0},
    ]
    assert found["reliability"]["all"][9] == {
        "from": 0.9,
        "to": 1.0,
        "n": 1,
        "probability": 0.95,
        "accuracy": 1,
    }
    assert found["reliability"]["all"][0]["accuracy"] is None
    assert found["protocol"] == list(protocol(WRITTEN))
    assert not {"final_found", "mode_and_final", "seams", "owed"} & found.keys()


def test_at_any_pitch_the_finals_are_reported() -> None:
    any_pitch = replace(WRITTEN, reading=PitchReading.ANY)
    found = evaluation_json(any_pitch)
    # three of four finals found; with the mode: after all notes the first melody alone
    assert found["final_found"]["all"] == 0.75
    assert found["mode_and_final"]["all"] == 0.25
    text = evaluation_text(any_pitch).splitlines()
    assert "final found                0.750   0.750   0.750   0.750" in text
    assert "mode and final right       0.500   0.500   0.500   0.250" in text


SEAMS = SeamFigures(
    n_seams=8,
    n_noticed=6,
    median_delay=20.5,
    n_right_before=4,
    n_named=3,
    n_excerpts=8,
    n_excerpt_notes=960,
    n_false_alarms=6,
    n_changed_late=2,
    seed=2,
)
OWED = OwedFigures(n=1, n_nothing_owed=0, step_nats=1.2, walk_nats=0.3, walk_beaten=0.875, seed=2)


def test_changes_of_mode_and_owed_steps_are_reported_when_they_were_measured() -> None:
    measured = replace(WRITTEN, seams=SEAMS, owed=OWED)
    found = evaluation_json(measured)
    assert found["seams"] == {
        "n": 8,
        "seed": 2,
        "noticed": 0.75,
        "noticed_by_chance": 0.25,
        "median_delay_notes": 20.5,
        "right_before": 0.5,
        "named": 0.75,
        "excerpts": 8,
        "false_alarms_per_100_notes": 0.625,
    }
    assert found["owed"] == {
        "n": 1,
        "seed": 2,
        "nothing_owed": 0,
        "after_notes": 20,
        "step_nats": 1.2,
        "walk_nats": 0.3,
        "ratio": 4,
        "walks_beaten": 0.875,
    }
    assert evaluation_text(measured).removeprefix(TEXT) == (
        """
Change of mode
  8 lines of 60 notes of one melody and 60 of another, of another mode; 8
  excerpts of 120 notes without a seam (seed 2). Melodies may change mode
  themselves, so the false alarms are an upper bound.
seams noticed                      0.750
noticed where there is none        0.250
median delay, notes                 20.5
first mode named at the seam       0.500
… and then the second one          0.750
false alarms in 100 notes          0.625

Owed steps
  After 20 notes of 1 melody (seed 2), with the labelled mode as the target,
  the step that is put first is played, and every walk of its length along its
  degrees. Gains are in log-odds of the labelled mode against all others, in
  nats.
mean gain of the step              1.200
mean gain of a walk                0.300
ratio                              4.000
walks that add less                0.875
"""
    )


def test_a_figure_of_nothing_is_null_and_a_dash() -> None:
    unnoticed = replace(SEAMS, n_noticed=0, median_delay=math.nan)
    measured = replace(WRITTEN, seams=unnoticed, owed=replace(OWED, walk_nats=-0.1))
    assert evaluation_json(measured)["seams"]["median_delay_notes"] is None
    assert evaluation_json(measured)["owed"]["ratio"] is None
    lines = evaluation_text(measured).splitlines()
    assert "median delay, notes                    –" in lines
    assert "ratio                                  –" in lines


def test_without_mistakes_no_pair_is_named() -> None:
    right = tally((verdict(label, *[(label, 0.9)] * 4) for label in range(3)), 4, 4)
    text = evaluation_text(replace(WRITTEN, tallies=right))
    assert text.endswith("No melody is named wrongly after all notes.\n")
    assert "Answers that no melody" not in text


@pytest.mark.parametrize("columns", [20, 60, 80, 120])
@pytest.mark.parametrize("n_modes", [3, 20, 60])
def test_no_line_is_wider_than_the_page(columns: int, n_modes: int) -> None:
    # every label is answered by every mode once, and the first one by 1234 melodies
    confusion = np.ones((n_modes, n_modes), np.int64)
    confusion[0, 0] = 1234
    confusion[:, -1] += 3
    filled = [replace(one, confusion=confusion) for one in WRITTEN.tallies]
    wide = replace(
        WRITTEN,
        mode_ids=tuple(f"own/{'n' * 12}{number}" for number in range(n_modes)),
        tallies=tuple(filled),
        seams=SEAMS,
        owed=OWED,
    )
    limit = max(columns, 79)  # the tables of figures have one width
    assert max(map(len, evaluation_text(wide, columns).splitlines())) <= limit


def test_a_confusion_that_does_not_fit_becomes_a_list() -> None:
    confusion = np.zeros((30, 30), np.int64)
    confusion[0, :] = 1
    confusion[0, 7] = 5
    confusion[2, 2] = 4
    tallies = tuple(replace(one, confusion=confusion) for one in WRITTEN.tallies)
    modes = tuple(f"own/mode{number}" for number in range(30))
    text = evaluation_text(replace(WRITTEN, mode_ids=modes, tallies=tallies))
    part = text[text.index("Answers after all notes") : text.index("Confused most")]
    # label 0 has 29 answers of one melody and one of five; label 2 is always right
    assert (
        part
        == """\
Answers after all notes: label, named rightly, named instead
  mode0      1 of 34    mode7 5, mode1 1, mode2 1, mode3 1, mode4 1, mode5 1,
                        mode6 1, mode8 1, mode9 1, mode10 1, mode11 1, mode12 1,
                        mode13 1, mode14 1, mode15 1, mode16 1, mode17 1,
                        mode18 1, mode19 1, mode20 1, mode21 1, mode22 1,
                        mode23 1, mode24 1, mode25 1, mode26 1, mode27 1,
                        mode28 1, mode29 1
  mode2      4 of 4     –

"""
    )
