"""The figures of an evaluation: worked by hand, and against plain loops written here."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.core.tally import (
    N_BINS,
    ConfusedPair,
    Guess,
    ReliabilityBin,
    Tally,
    Verdict,
    bin_of,
    confused_pairs,
    macro_f1,
    tally,
)


def said(
    answer: int,
    probability: float,
    label_probability: float = 0.1,
    label_rank: int = 0,
    decided: bool = False,
    final_found: bool | None = None,
) -> Guess:
    return Guess(answer, probability, label_probability, label_rank, decided, final_found)


def tallied(*labelled: tuple[int, Guess], n_modes: int = 3) -> Tally:
    (one,) = tally((Verdict(label, 10, (guess,)) for label, guess in labelled), n_modes, 1)
    return one


# Five melodies of three modes:
#   label 0: named 0 at .95 (right), named 1 at .55 (wrong), named 0 at .85 (right)
#   label 1: named 1 at .52 (right)
#   label 2: named 0 at .91 (wrong)
FIVE = (
    (0, said(0, 0.95, 0.95, 0, True, True)),
    (0, said(1, 0.55, 0.25, 1, False, True)),
    (0, said(0, 0.85, 0.85, 0, True, False)),
    (1, said(1, 0.52, 0.52, 0, False, False)),
    (2, said(0, 0.91, 0.05, 3, True, None)),
)


def test_accuracy_is_the_share_of_right_answers() -> None:
    found = tallied(*FIVE)
    assert found.n == 5
    assert found.accuracy == 3 / 5
    # sqrt(.6 · .4 / 5) = sqrt(.048)
    assert found.accuracy_error == pytest.approx(0.048**0.5)
    assert found.confusion.tolist() == [[2, 1, 0], [0, 1, 0], [1, 0, 0]]


def test_macro_f1_is_the_mean_over_the_labelled_modes() -> None:
    # mode 0: labelled 3, answered 3, right 2: P = R = 2/3, F1 = 2/3
    # mode 1: labelled 1, answered 2, right 1: P = 1/2, R = 1, F1 = 2/3
    # mode 2: labelled 1, answered 0, right 0: F1 = 0
    # mean: (2/3 + 2/3 + 0) / 3 = 4/9
    assert tallied(*FIVE).macro_f1 == pytest.approx(4 / 9)


def test_a_mode_that_is_only_answered_does_not_enter_the_mean_but_its_mistakes_do() -> None:
    # labels 0 and 1 only; one melody of mode 1 is named 2
    # mode 0: 1 of 1, F1 = 1; mode 1: labelled 1, answered 0: F1 = 0; mode 2 is no label
    assert macro_f1(np.array([[1, 0, 0], [0, 0, 1], [0, 0, 0]])) == 0.5


def test_calibration_error_weighs_the_gap_of_each_bin_by_its_melodies() -> None:
    # bin .9: .95 right, .91 wrong: mean said .93, right .5, gap .43, two melodies
    # bin .8: .85 right: gap .15, one melody
    # bin .5: .55 wrong, .52 right: mean said .535, right .5, gap .035, two melodies
    # (2 · .43 + 1 · .15 + 2 · .035) / 5 = (.86 + .15 + .07) / 5 = .216
    assert tallied(*FIVE).calibration_error == pytest.approx(0.216)


def test_the_reliability_table_has_a_row_for_each_bin() -> None:
    rows = tallied(*FIVE).reliability
    assert [row.n for row in rows] == [0, 0, 0, 0, 0, 2, 0, 0, 1, 2]
    assert [(row.low, row.high) for row in rows][-1] == (0.9, 1.0)
    assert rows[5] == ReliabilityBin(0.5, 0.6, 2, pytest.approx(0.535), 0.5)
    assert math.isnan(rows[0].probability)
    assert math.isnan(rows[0].accuracy)


def test_undecided_melodies_do_not_count_in_the_accuracy_when_decided() -> None:
    # decided: .95 right, .85 right, .91 wrong
    found = tallied(*FIVE)
    assert found.undecided == 2 / 5
    assert found.decided_accuracy == 2 / 3


def test_the_label_is_listed_when_at_most_two_modes_are_likelier() -> None:
    # ranks 0, 1, 0, 0, 3
    assert tallied(*FIVE).listed == 4 / 5
    assert tallied((0, said(0, 0.5, label_rank=2))).listed == 1


def test_the_final_is_a_share_of_the_melodies_that_have_one() -> None:
    # found, found (mode wrong), not found, not found, not asked for
    found = tallied(*FIVE)
    assert found.final_found == 2 / 4
    assert found.both_found == 1 / 4


def test_log_loss_is_the_mean_of_minus_the_log_of_the_labels_probability() -> None:
    # probabilities 1/2 and 1/8: (ln 2 + ln 8) / 2 = 2 ln 2
    assert tallied((0, said(0, 0.5, 0.5)), (1, said(0, 0.8, 0.125))).log_loss == pytest.approx(
        2 * math.log(2)
    )
    assert tallied((0, said(1, 1.0, 0.0))).log_loss == pytest.approx(12 * math.log(10))


def test_nothing_gives_shares_that_are_no_numbers() -> None:
    found = tallied()
    assert found.n == 0
    for figure in (
        found.accuracy,
        found.accuracy_error,
        found.macro_f1,
        found.calibration_error,
        found.decided_accuracy,
        found.final_found,
        found.log_loss,
    ):
        assert math.isnan(figure)


def test_each_checkpoint_is_counted_by_itself() -> None:
    verdicts = [Verdict(0, 30, (said(1, 0.4), said(0, 0.6))), Verdict(1, 30, (said(1, 0.7), said(0, 0.9)))]
    first, second = tally(verdicts, 2, 2)
    assert first.confusion.tolist() == [[0, 1], [0, 1]]
    assert second.confusion.tolist() == [[1, 0], [1, 0]]
    with pytest.raises(ValueError, match="zip"):
        tally(verdicts, 2, 3)


def test_a_tally_cannot_be_changed() -> None:
    with pytest.raises(ValueError, match="read-only"):
        tallied(*FIVE).confusion[0, 0] = 7


def test_the_most_confused_pairs_come_first() -> None:
    confusion = np.array([[5, 2, 1, 0], [1, 5, 0, 0], [0, 0, 5, 4], [0, 0, 0, 5]])
    # pairs either way: 2-3: 4 + 0; 0-1: 2 + 1; 0-2: 1 + 0
    assert confused_pairs(confusion) == (
        ConfusedPair(2, 3, 4, 0),
        ConfusedPair(0, 1, 2, 1),
        ConfusedPair(0, 2, 1, 0),
    )
    assert [pair.n for pair in confused_pairs(confusion, 2)] == [4, 3]


@pytest.mark.parametrize("tenth", range(N_BINS))
def test_a_bin_begins_with_its_lower_edge(tenth: int) -> None:
    assert bin_of(tenth / 10) == tenth
    assert bin_of(tenth / 10 + 0.05) == tenth


# --- against plain loops -------------------------------------------------------------------------

N_MODES = 4
guesses = st.builds(
    said,
    st.integers(0, N_MODES - 1),
    st.floats(0, 1),
    st.floats(1e-9, 1),
    st.integers(0, N_MODES - 1),
    st.booleans(),
)
melodies = st.lists(st.tuples(st.integers(0, N_MODES - 1), guesses), min_size=1, max_size=40)


def f1_by_loop(labelled: list[tuple[int, Guess]]) -> float:
    scores = []
    for mode in range(N_MODES):
        right = wrong = missed = 0
        for label, guess in labelled:
            if guess.answer == mode and label == mode:
                right += 1
            elif guess.answer == mode:
                wrong += 1
            elif label == mode:
                missed += 1
        if right + missed == 0:
            continue
        precision = right / (right + wrong) if right + wrong else 0.0
        recall = right / (right + missed)
        both = precision + recall
        scores.append(2 * precision * recall / both if both else 0.0)
    return sum(scores) / len(scores)


def calibration_error_by_loop(labelled: list[tuple[int, Guess]]) -> float:
    error = 0.0
    for k in range(10):
        inside = [
            (guess.probability, guess.answer == label)
            for label, guess in labelled
            if round(guess.probability * 10, 9) >= k and (k == 9 or round(guess.probability * 10, 9) < k + 1)
        ]
        if inside:
            said_mean = sum(p for p, _ in inside) / len(inside)
            right_mean = sum(right for _, right in inside) / len(inside)
            error += len(inside) / len(labelled) * abs(right_mean - said_mean)
    return error


@given(melodies)
def test_every_figure_is_what_a_plain_loop_gives(labelled: list[tuple[int, Guess]]) -> None:
    found = tallied(*labelled, n_modes=N_MODES)
    n = len(labelled)
    assert found.accuracy == pytest.approx(sum(guess.answer == label for label, guess in labelled) / n)
    assert found.macro_f1 == pytest.approx(f1_by_loop(labelled))
    assert found.calibration_error == pytest.approx(calibration_error_by_loop(labelled), abs=1e-12)
    assert found.listed == pytest.approx(sum(guess.label_rank < 3 for _, guess in labelled) / n)
    assert found.log_loss == pytest.approx(
        -sum(math.log(guess.label_probability) for _, guess in labelled) / n
    )
    decided = [guess.answer == label for label, guess in labelled if guess.decided]
    assert found.undecided == pytest.approx(1 - len(decided) / n)
    if decided:
        assert found.decided_accuracy == pytest.approx(sum(decided) / len(decided))
    assert sum(pair.n for pair in confused_pairs(found.confusion)) == sum(
        guess.answer != label for label, guess in labelled
    )
