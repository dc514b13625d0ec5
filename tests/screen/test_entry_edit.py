"""Keys that change the entry or move its cursor."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.screen import entry_edit
from melodycoach.screen.entry import Entry, entry_of

if TYPE_CHECKING:
    from collections.abc import Callable


def test_typed_line_ends_and_control_characters_become_spaces_or_nothing() -> None:
    assert entry_edit.inserted(entry_of(()), "A4\nB4\t\x1bC5").text == "A4 B4 C5"


@pytest.mark.parametrize(
    ("move", "cursor"),
    [
        (entry_edit.moved_left, 4),
        (entry_edit.moved_right, 6),
        (entry_edit.moved_word_left, 3),
        (entry_edit.moved_word_right, 7),
        (entry_edit.moved_to_start, 0),
        (entry_edit.moved_to_end, 8),
    ],
)
def test_the_cursor_moves(move: Callable[[Entry], Entry], cursor: int) -> None:
    assert move(entry_edit.moved_to(entry_of(("A4", "B4-1")), 5)).cursor == cursor


def test_the_cursor_stops_at_both_ends() -> None:
    entry = entry_edit.moved_to_start(entry_of(("A4",)))
    assert entry_edit.moved_left(entry) == entry
    assert entry_edit.moved_word_left(entry) == entry
    assert entry_edit.erased_before(entry) == entry
    assert entry_edit.erased_word(entry) == entry
    end = entry_edit.moved_to_end(entry)
    assert entry_edit.moved_right(end) == end
    assert entry_edit.moved_word_right(end) == end
    assert entry_edit.erased_after(end) == end


def test_a_letter_and_the_marks_upon_it_are_one_step() -> None:
    entry = entry_edit.inserted(entry_of(()), "du\u0308g")
    left = entry_edit.moved_left(entry_edit.moved_left(entry))
    assert left.cursor == 1
    assert entry_edit.moved_right(left).cursor == 3
    assert entry_edit.erased_after(left).text == "dg"
    assert entry_edit.erased_before(entry_edit.moved_left(entry)).text == "dg"


def test_erasing_a_word_goes_back_to_its_start() -> None:
    assert entry_edit.erased_word(entry_of(("A4", "B4-1"))).text == "A4 "


@given(st.text(max_size=30), st.integers(0, 30), st.integers(0, 30), st.text(max_size=10))
def test_any_text_can_be_typed_anywhere(text: str, one: int, other: int, new: str) -> None:
    entry = entry_edit.inserted(entry_of(("A4", "B4")), text)
    lo, hi = sorted((min(one, len(entry.text)), min(other, len(entry.text))))
    entry = entry_edit.edited(entry, lo, hi, new)
    assert len(entry.items) == len(entry.text.split())
    assert 0 <= entry.cursor <= len(entry.text)
    assert "\n" not in entry.text
