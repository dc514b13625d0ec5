"""Shares of the screen."""

from __future__ import annotations

from hypothesis import given
from hypothesis import strategies as st

from melodycoach.screen.layout import Form, lay_out

COLUMNS, ROWS, QUESTION = st.integers(1, 250), st.integers(1, 90), st.sampled_from([0, 2])


@given(COLUMNS, ROWS, QUESTION, st.booleans())
def test_the_shares_fill_the_screen_and_none_is_negative(
    columns: int, rows: int, question: int, complaint: bool
) -> None:
    layout = lay_out(columns, rows, question, complaint)
    below = layout.question + layout.entry + layout.status + layout.hints
    match layout.form:
        case Form.SENTENCE:
            total = below + max(rows - below, 0)
        case Form.STACK:
            middle = layout.leanings + layout.owed + layout.why + layout.line
            total = 1 + layout.attention + middle + below
        case Form.PAIR:
            assert layout.top == 2 + layout.leanings + layout.why == 1 + layout.owed
            assert layout.mending < layout.line
            total = 1 + layout.attention + layout.top + layout.line + below
    assert total == rows
    assert min(layout.leanings, layout.owed, layout.why, layout.line, layout.entry, layout.left) >= 0


def test_the_forms_follow_the_size() -> None:
    assert lay_out(80, 24).form is Form.PAIR
    assert lay_out(71, 24).form is Form.STACK
    assert lay_out(120, 19).form is Form.STACK
    assert lay_out(40, 12).form is Form.STACK
    assert lay_out(39, 12).form is Form.SENTENCE
    assert lay_out(200, 11).form is Form.SENTENCE


def test_every_area_is_there_at_the_smallest_full_size() -> None:
    layout = lay_out(40, 12)
    assert min(layout.leanings, layout.owed, layout.why, layout.line, layout.entry, layout.hints) >= 1


def test_the_lowest_screen_is_all_sentence() -> None:
    assert lay_out(80, 1).entry == 0
    assert lay_out(80, 2).entry == 1
    assert lay_out(80, 1, question_rows=2).question == 1


def test_a_complaint_takes_a_row_for_itself() -> None:
    assert lay_out(40, 12).entry == 1
    assert lay_out(40, 12, complaint=True).entry == 2
