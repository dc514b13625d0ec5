"""Character cells: how wide a text is, and what of it may reach a terminal."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.core.cells import character_width, tidy, width


def test_turkish_letters_are_one_cell_composed_or_not() -> None:
    assert width("Sûzinâk İşgğı") == 13
    assert width("dügâh") == 5  # u + diaeresis, a + circumflex


def test_wide_letters_are_two_cells() -> None:
    assert width("音楽") == 4  # Unicode: East Asian Width W


def test_line_ends_tabs_and_control_characters_cannot_reach_the_screen() -> None:
    assert tidy("a\r\nb\tc\x1b[31m\x9b\u202e") == "a  b c?[31m?"


def test_decomposed_letters_are_composed() -> None:
    assert tidy("dügâh") == "dügâh"


@pytest.mark.parametrize(
    ("text", "shown"),
    [
        ("\x1b[2J", "?[2J"),
        ("a\nb\tc\u2028d", "a b c d"),
        ("quay\u202edark", "quaydark"),  # right-to-left override: Unicode Standard Annex 9
        ("\x9b31m", "?31m"),  # the one-byte control sequence introducer of ECMA-48
        ("\ud800", "?"),
        ("\u00a0", " "),
    ],
)
def test_a_text_of_a_file_cannot_steer_the_terminal(text: str, shown: str) -> None:
    assert tidy(text) == shown


@given(st.text())
def test_what_is_tidy_is_printable_and_stays_as_it_is(text: str) -> None:
    shown = tidy(text)
    assert shown.isprintable()
    assert tidy(shown) == shown
    assert width(shown) == sum(map(character_width, shown))
