"""Rows of the entry, and where the cursor stands."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

from hypothesis import given
from hypothesis import strategies as st

from melodycoach.screen import entry_edit
from melodycoach.screen import question as asking
from melodycoach.screen.entry import entry_of
from melodycoach.screen.entry_lines import (
    break_text,
    draw_entry,
    draw_question,
    moved_up_or_down,
    question_rows,
    row_of,
)
from melodycoach.screen.question import QuestionKind
from melodycoach.screen.signs import UNICODE
from melodycoach.screen.text import plain_text, width

TEXT = "A4 B4-1 C5 D5:2 E5"


def rows_of(text: str, columns: int) -> list[str]:
    return [text[lo:hi] for lo, hi in break_text(text, columns)]


def test_rows_break_between_words() -> None:
    assert rows_of(TEXT, 8) == ["A4 B4-1 ", "C5 D5:2 ", "E5"]
    assert rows_of(TEXT, 7) == ["A4 B4-1 ", "C5 D5:2 ", "E5"]


def test_a_word_longer_than_a_row_is_broken_anywhere() -> None:
    assert rows_of("sultanîyegâh A4", 5) == ["sulta", "nîyeg", "âh A4"]


def test_a_full_row_is_followed_by_one_for_the_cursor() -> None:
    assert rows_of("A4 B4 ", 5) == ["A4 B4 ", ""]
    assert rows_of("", 5) == [""]


def test_the_cursor_at_a_break_stands_at_the_start_of_the_next_row() -> None:
    rows = break_text(TEXT, 8)
    assert [row_of(rows, cursor) for cursor in (0, 7, 8, 16, 18)] == [0, 0, 1, 2, 2]


def test_the_cursor_moves_up_and_down_in_its_column() -> None:
    assert moved_up_or_down(TEXT, 1, 10, 1) == 9
    assert moved_up_or_down(TEXT, 9, 10, -1) == 1
    assert moved_up_or_down(TEXT, 15, 10, 1) == 18
    assert moved_up_or_down(TEXT, 1, 10, -1) == 0
    assert moved_up_or_down(TEXT, 17, 10, 1) == len(TEXT)


def test_the_rows_round_the_cursor_are_shown_and_the_margin_tells_of_others() -> None:
    entry = entry_of(tuple(TEXT.split()))
    end = draw_entry(entry, 10, 2, UNICODE)
    assert [plain_text(line) for line in end.lines] == ["… C5 D5:2 ", "  E5 "]
    assert (end.row, end.column) == (1, 5)
    start = draw_entry(entry_edit.moved_to_start(entry), 10, 2, UNICODE)
    assert [plain_text(line) for line in start.lines] == ["› A4 B4-1 ", "… C5 D5:2 "]
    assert (start.row, start.column) == (0, 2)


def test_pending_words_are_underlined() -> None:
    entry = entry_edit.inserted(entry_of(("A4",)), "C5")
    line = draw_entry(entry, 20, 1, UNICODE).lines[0]
    assert ("class:entry.pending", "C5") in line


def test_a_pending_word_broken_over_rows_is_underlined_on_each() -> None:
    entry = entry_edit.inserted(entry_of(()), "sultanîyegâh")
    lines = draw_entry(entry, 8, 3, UNICODE).lines
    assert [line[-2] for line in lines] == [
        ("class:entry.pending", "sultan"),
        ("class:entry.pending", "îyegâh"),
        ("class:entry", ""),
    ][: len(lines)]


def test_a_long_answer_is_shown_from_where_the_cursor_is() -> None:
    question = asking.typed(asking.ask(QuestionKind.SAVE, ()), "/a/very/long/path/to/line.txt")
    drawn = draw_question(question, 40, 2, UNICODE)
    text = plain_text(drawn.lines[0])
    assert text.startswith("save as which file? ")
    assert text.endswith("line.txt")
    assert width(text) <= 40
    assert drawn.column == width(text)


def test_below_the_question_stand_choices_advice_or_complaint() -> None:
    question = asking.ask(QuestionKind.FINAL, ("written", "any"))

    def below(question: asking.Question, columns: int = 60) -> str:
        return plain_text(draw_question(question, columns, 2, UNICODE).lines[1])

    assert below(question) == " written  any "
    assert below(question, 12) == " written …"
    assert below(asking.picked_next(question, -1)) == " written [any]"
    assert below(asking.picked_next(question, -1), 12) == "[any]"
    assert below(replace(question, choices=())).strip() == question.advice
    assert below(replace(question, awaited=1)) == "  …"
    assert below(replace(question, complaint="no")) == "! no"
    assert len(draw_question(question, 60, 1, UNICODE).lines) == 1
    assert draw_question(question, 60, 0, UNICODE).lines == []


def test_a_question_wants_two_rows() -> None:
    assert question_rows(None) == 0
    assert question_rows(asking.ask(QuestionKind.FINAL, ())) == 2


@given(st.text(st.sampled_from("A4 B-1â音"), max_size=60), st.integers(1, 20))
def test_rows_cover_the_text_and_each_fits(text: str, columns: int) -> None:
    rows = break_text(text, columns)
    assert rows[0][0] == 0
    assert rows[-1][1] == len(text)
    assert all(one[1] == other[0] for one, other in pairwise(rows))
    assert all(width(text[lo:hi].rstrip()) <= max(columns, 2) for lo, hi in rows)


@given(st.text(st.sampled_from("A4 B-1â"), max_size=60), st.integers(1, 30), st.integers(1, 5), st.data())
def test_the_cursor_is_always_on_the_screen(text: str, columns: int, rows: int, data: st.DataObject) -> None:
    entry = entry_edit.inserted(entry_of(("A4", "B4")), text)
    entry = entry_edit.moved_to(entry, data.draw(st.integers(0, len(entry.text))))
    drawn = draw_entry(entry, columns, rows, UNICODE)
    assert 0 <= drawn.row < len(drawn.lines) <= rows
    assert 0 <= drawn.column < columns
