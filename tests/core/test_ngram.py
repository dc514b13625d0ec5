from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from melodycoach.core.ngram import Counts, ModeCounts, Token, build_table, count_tokens, snap_to_scale
from melodycoach.core.theory import FoldedScale

SNAP = np.arange(4)
EVEN = np.full((2, 4), 0.25)


def token(unit: int, weight: float = 1.0, *, rests: bool = False) -> Token:
    return Token(unit, weight, rests)


def test_every_ngram_of_a_melody_is_counted_with_its_notes_weight() -> None:
    counts = count_tokens([[token(0), token(1, 0.5), token(0, 2.0, rests=True)]], SNAP, order=3)
    assert counts.single.tolist() == [[1, 0.5, 0, 0], [2, 0, 0, 0]]
    assert {context: row.tolist() for context, row in counts.after.items()} == {
        (0,): [0, 0.5, 0, 0],
        (1,): [2, 0, 0, 0],
        (0, 1): [2, 0, 0, 0],
    }
    assert (counts.order, counts.n_melodies) == (3, 1)


def test_no_ngram_crosses_from_one_melody_to_the_next() -> None:
    counts = count_tokens([[token(0)], [token(1)]], SNAP, order=2)
    assert counts.after == {}
    assert counts.order == 1


def test_counting_in_two_goes_is_counting_at_once_and_leaves_the_first_as_it_was() -> None:
    melodies = [[token(0), token(1)], [token(0), token(2)]]
    first = count_tokens(melodies[:1], SNAP, order=2)
    both = count_tokens(melodies[1:], SNAP, order=2, start=first)
    at_once = count_tokens(melodies, SNAP, order=2)
    assert both.single.tolist() == at_once.single.tolist()
    assert both.after[(0,)].tolist() == at_once.after[(0,)].tolist() == [0, 1, 1, 0]
    assert both.n_melodies == 2
    assert first.after[(0,)].tolist() == [0, 1, 0, 0]


def test_an_order_below_one_is_refused() -> None:
    with pytest.raises(ValueError, match="order 0, expected 1 or more"):
        count_tokens([], SNAP, order=0)


def test_counts_have_the_order_of_their_longest_ngram() -> None:
    assert Counts().order == 1
    one = count_tokens([[token(0)]], SNAP, order=1)
    three = count_tokens([[token(0), token(1), token(2)]], SNAP, order=3)
    assert Counts({"a": one, "b": three}).order == 3


def test_a_context_takes_the_nearest_degree_of_the_mode_and_leaves_foreign_units_alone() -> None:
    scale = FoldedScale(np.array([0.0, 8.0]), np.array([0.0, 7.0]), np.ones((2, 2)) / 2)
    snap = snap_to_scale(scale, 1.6, 53)
    assert snap[[0, 1, 52, 8, 9, 7, 6]].tolist() == [0, 0, 0, 8, 8, 8, 8]  # 6 is near 7, played for 8
    assert snap[[20, 51, 5]].tolist() == [20, 51, 5]


def test_a_count_and_a_prior_are_averaged_by_their_weights() -> None:
    # one moving note on 0, prior even, mass 1:
    #   own  = (1 + 1 * 1/4) / (1 + 1) = .625, both = the same, base = .625
    #   P(0) = (1 + 1 * .625) / (1 + 1) = .8125
    counts = count_tokens([[token(0)]], SNAP, order=1)
    table = build_table([EVEN], [counts], [SNAP], (1.0,), 0.0, order=1)
    assert table.probability[0, 0].tolist() == pytest.approx([0.8125, 0.0625, 0.0625, 0.0625])
    # no resting note: own = the prior 1/4, both = .625, base = .4375
    assert table.probability[1, 0, 0] == pytest.approx(0.4375)


def test_a_longer_context_leans_on_the_shorter_one() -> None:
    # after 0 came 1 once: P(1 | 0) = (1 + 2 P(1)) / (1 + 2)
    counts = count_tokens([[token(0), token(1)]], SNAP, order=2)
    table = build_table([EVEN], [counts], [SNAP], (1.0, 2.0), 0.0, order=2)
    alone, after_0 = table.row(0, ()), table.row(0, (0,))
    assert after_0 != alone
    assert table.probability[0, after_0, 1] == pytest.approx((1 + 2 * table.probability[0, alone, 1]) / 3)


def test_the_longest_known_suffix_of_a_context_is_used() -> None:
    counts = count_tokens([[token(0), token(1), token(2), token(3)]], SNAP, order=3)
    table = build_table([EVEN], [counts], [SNAP], (1.0,), 0.0, order=3)
    rows = table.row_by_context[0]
    assert table.row(0, (3, 1)) == rows[(1,)]
    assert table.row(0, (0, 1)) == rows[(0, 1)]
    assert table.row(0, (1, 3)) == rows[()]


def test_counts_that_lost_a_context_lean_on_a_shorter_one() -> None:
    full = count_tokens([[token(0), token(1), token(2)]], SNAP, order=3)
    pruned = ModeCounts(full.single, {(0, 1): full.after[(0, 1)]}, 1)
    table = build_table([EVEN], [pruned], [SNAP], (1.0,), 0.0, order=3)
    alone, after_both = table.row(0, ()), table.row(0, (0, 1))
    # P(2 | 0 1) = (1 + 1 * P(2)) / (1 + 1), as nothing is known of what follows 1
    assert table.probability[0, after_both, 2] == pytest.approx((1 + table.probability[0, alone, 2]) / 2)


def test_a_mode_without_counts_keeps_what_theory_implies() -> None:
    theory = np.array([[0.7, 0.1, 0.1, 0.1], [0.4, 0.4, 0.1, 0.1]])
    counts = count_tokens([[token(0), token(1)]], SNAP, order=2)
    table = build_table([EVEN, theory], [counts, None], [SNAP, SNAP], (1.0,), 0.0, order=2)
    assert table.probability[:, table.root[1]].tolist() == theory.tolist()
    assert table.row(1, (0,)) == table.root[1]


def test_counted_pitches_are_spread() -> None:
    prior = np.full((2, 53), 1 / 53)
    counts = count_tokens([[token(10)]], np.arange(53), order=1)
    table = build_table([prior], [counts], [np.arange(53)], (1.0,), 0.9, order=1)
    row = table.probability[0, 0]
    assert row[10] > row[11] > row[12] > row[20]
    assert row[9] == pytest.approx(row[11])


melodies_of_four = st.lists(
    st.lists(
        st.builds(Token, st.integers(0, 3), st.floats(0.01, 1.0), st.booleans()), min_size=1, max_size=12
    ),
    min_size=1,
    max_size=4,
)


@settings(derandomize=True, max_examples=60, deadline=None)
@given(melodies_of_four, st.integers(1, 4), st.floats(0.1, 100.0), st.floats(0.0, 1.0))
def test_every_context_sums_to_one_over_the_octave(
    melodies: list[list[Token]], order: int, mass: float, blur: float
) -> None:
    counts = count_tokens(melodies, SNAP, order)
    table = build_table([EVEN, EVEN], [counts, None], [SNAP, SNAP], (mass,), blur, order)
    assert table.probability.sum(axis=2) == pytest.approx(1.0)
    assert table.probability.min() > 0


@settings(derandomize=True, max_examples=60, deadline=None)
@given(melodies_of_four, st.integers(2, 4), st.lists(st.integers(0, 3), max_size=8))
def test_walking_the_table_note_by_note_finds_the_longest_known_suffix(
    melodies: list[list[Token]], order: int, walk: list[int]
) -> None:
    counts = count_tokens(melodies, SNAP, order)
    table = build_table([EVEN], [counts], [SNAP], (1.0,), 0.0, order)
    row = int(table.root[0])
    for unit in walk:
        row = int(table.next_row[row, unit])
    assert row == table.row(0, tuple(walk))
