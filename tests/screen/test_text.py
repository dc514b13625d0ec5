"""Widths, cutting, wrapping."""

from __future__ import annotations

from hypothesis import given
from hypothesis import strategies as st

from melodycoach.screen.text import (
    cut,
    fit,
    line_width,
    pad,
    pad_left,
    plain_text,
    tidy_lines,
    to_ascii,
    width,
    wrap,
)

TEXTS = st.text(st.characters(exclude_categories=["Cs"]), max_size=40)
COLUMNS = st.integers(0, 30)


def test_a_wide_letter_is_not_cut_in_half() -> None:
    assert cut("音楽音", 4) == "音…"
    assert pad("音楽音", 4) == "音… "
    assert plain_text(fit([("", "音楽音")], 4)) == "音… "


def test_ascii_keeps_the_letters_under_the_marks() -> None:
    assert to_ascii("Hüseynîaşîran İsfahân ığ ✓ ♭ 音") == "Huseyniasiran Isfahan ig + b ?"


def test_lines_can_be_made_ascii() -> None:
    assert tidy_lines([[("s", "dügâh\t")]], ascii_only=True) == [[("s", "dugah ")]]


def test_padding_to_the_left() -> None:
    assert pad_left("rast", 6) == "  rast"


def test_a_line_that_fits_is_filled_and_one_that_does_not_is_cut() -> None:
    assert fit([("a", "dügâh"), ("b", "")], 7) == [("a", "dügâh"), ("", "  ")]
    assert fit([("a", "dügâh"), ("b", "segâh")], 5) == [("a", "dügâ…")]
    assert fit([("a", "dügâh")], 5) == [("a", "dügâh")]


def test_words_wider_than_a_row_are_broken() -> None:
    assert wrap("a sultanîyegâh b", 6) == ["a", "sultan", "îyegâh", "b"]
    assert wrap("音楽", 1) == ["音", "楽"]
    assert wrap("", 10) == []
    assert wrap("a", 0) == []


@given(TEXTS, COLUMNS)
def test_no_cut_text_is_too_wide(text: str, columns: int) -> None:
    assert width(cut(text, columns)) <= columns
    assert width(pad(text, columns)) == columns


@given(st.lists(st.tuples(st.just("s"), TEXTS), max_size=4), COLUMNS)
def test_a_fitted_line_is_exactly_as_wide_as_asked(line: list[tuple[str, str]], columns: int) -> None:
    assert line_width(fit(line, columns)) == columns


@given(TEXTS)
def test_ascii_text_is_ascii(text: str) -> None:
    assert to_ascii(text).isascii()


@given(TEXTS, st.integers(2, 30))
def test_wrapping_loses_no_letter(text: str, columns: int) -> None:
    rows = wrap(text, columns)
    assert "".join(rows).replace(" ", "") == "".join(text.split()).replace(" ", "")
    assert all(width(row) <= columns for row in rows)
