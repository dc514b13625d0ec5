"""The whole screen: golden files, and what holds at every size."""

from __future__ import annotations

import sys
import time
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from melodycoach.core.ladder import Rung
from melodycoach.screen import entry as typing
from melodycoach.screen import entry_edit, entry_merge
from melodycoach.screen import question as asking
from melodycoach.screen.draw import draw, draw_help, picture
from melodycoach.screen.entry import Entry, entry_of
from melodycoach.screen.question import Question, QuestionKind
from melodycoach.screen.text import line_width, plain_text
from melodycoach.screen.view import (
    LeaningRow,
    LineNote,
    OwedRow,
    Refusal,
    Status,
    ViewState,
    WhyRow,
)

if TYPE_CHECKING:
    from collections.abc import Callable

GOLDEN = Path(__file__).parent / "golden"
SIZES = ((40, 12), (60, 15), (80, 24), (120, 40))
NAMES = ("nothing", "undecided", "decided", "target", "off", "change", "long", "error")


def text_of(view: ViewState, columns: int, rows: int, *more: object, ascii_only: bool = False) -> str:
    """Draw a view and give its characters, with a bar at the right edge of each line."""
    lines = draw(view, columns, rows, *more, ascii_only=ascii_only)  # type: ignore[arg-type]
    return "".join(f"{plain_text(line)}|\n" for line in lines)


def with_refused_word(view: ViewState) -> Entry:
    """Give the entry in which a word was typed that is no note."""
    entry = entry_edit.inserted(entry_of(view.tokens), "H5 ")
    edit = typing.due(entry)
    assert edit is not None
    sentence = "entry: column 1: 'H5' is no note; did you mean 'A5'?"
    refusals = (Refusal(1, sentence, ("H5",)),)
    return entry_merge.arrived(typing.handed_over(entry, edit, 1), view.tokens, 1, refusals)


def asked() -> Question:
    """Give a question with a few letters typed and a choice picked."""
    choices = ("Beyâtî", "Hicaz", "Hüseynî", "Hüzzam", "Muhayyer", "Rast")
    question = asking.typed(asking.ask(QuestionKind.TARGET, choices), "hu")
    return asking.picked_next(question, 1)


# ------------------------------------------------------------------------------ golden files


@pytest.mark.parametrize("size", SIZES, ids=lambda size: f"{size[0]}x{size[1]}")
@pytest.mark.parametrize("name", NAMES)
def test_the_screen_is_as_in_the_golden_file(
    name: str,
    size: tuple[int, int],
    views: dict[str, ViewState],
    check_golden: Callable[[Path, str], None],
) -> None:
    check_golden(GOLDEN / f"{name}.{size[0]}x{size[1]}.txt", text_of(views[name], *size))


@pytest.mark.parametrize("size", SIZES, ids=lambda size: f"{size[0]}x{size[1]}")
def test_refused_word_and_question_are_as_in_the_golden_file(
    size: tuple[int, int], views: dict[str, ViewState], check_golden: Callable[[Path, str], None]
) -> None:
    view = views["decided"]
    text = text_of(view, *size, with_refused_word(view), asked())
    check_golden(GOLDEN / f"asked.{size[0]}x{size[1]}.txt", text)


def test_plain_letters_are_as_in_the_golden_file(
    views: dict[str, ViewState], check_golden: Callable[[Path, str], None]
) -> None:
    text = text_of(views["change"], 80, 24, ascii_only=True)
    assert text.isascii()
    check_golden(GOLDEN / "ascii.80x24.txt", text)


@pytest.mark.parametrize("size", SIZES, ids=lambda size: f"{size[0]}x{size[1]}")
def test_the_help_is_as_in_the_golden_file(
    size: tuple[int, int], check_golden: Callable[[Path, str], None]
) -> None:
    lines = draw_help(*size, standing=("Arel-Ezgi-Uzdilek theory. Schools differ.", "log: ~/a.events.jsonl"))
    text = "".join(f"{plain_text(line)}|\n" for line in lines)
    check_golden(GOLDEN / f"help.{size[0]}x{size[1]}.txt", text)


def test_no_golden_file_is_left_over() -> None:
    sizes = [f"{columns}x{rows}" for columns, rows in SIZES]
    expected = {f"{name}.{size}.txt" for name in (*NAMES, "asked", "help") for size in sizes}
    assert {path.name for path in GOLDEN.iterdir()} == expected | {"ascii.80x24.txt"}


# ------------------------------------------------------------------------- what must be there


@pytest.mark.parametrize("size", SIZES, ids=lambda size: f"{size[0]}x{size[1]}")
def test_verdict_leading_mode_next_step_reason_and_entry_are_on_every_full_size(
    size: tuple[int, int], views: dict[str, ViewState]
) -> None:
    text = text_of(views["decided"], *size)
    for words in ("leaning to Hüseynî, 72 %", "Hüseynî  █", "segâh dügâh rast dügâh", "+1.3", "E5:2 ,"):
        assert words in text


@pytest.mark.parametrize("size", SIZES, ids=lambda size: f"{size[0]}x{size[1]}")
def test_a_note_off_the_mode_and_what_mends_it_are_on_every_full_size(
    size: tuple[int, int], views: dict[str, ViewState]
) -> None:
    assert "✗ 15 hisar: hüseynî mends it (not in" in text_of(views["off"], *size)


@pytest.mark.parametrize("size", SIZES, ids=lambda size: f"{size[0]}x{size[1]}")
def test_a_change_of_mode_is_on_every_full_size(size: tuple[int, int], views: dict[str, ViewState]) -> None:
    assert "right now it sounds like Karc" in text_of(views["change"], *size)


@pytest.mark.parametrize("size", SIZES, ids=lambda size: f"{size[0]}x{size[1]}")
def test_a_warning_is_on_every_full_size(size: tuple[int, int], views: dict[str, ViewState]) -> None:
    assert "! the log cannot be written" in text_of(views["error"], *size)


def test_the_target_is_listed_although_it_comes_last(views: dict[str, ViewState]) -> None:
    assert "» Sultânîyegâh" in text_of(views["target"], 80, 24)
    assert "your aim" in text_of(views["target"], 80, 24)


def test_whose_theory_it_is_stands_on_the_first_screen_of_every_full_size(
    views: dict[str, ViewState],
) -> None:
    for size in SIZES:
        assert "Arel-Ezgi-Uzdilek theory" in text_of(views["nothing"], *size)


LOG = "log: ~/.local/share/melodycoach/sessions/2031-05-04-101502.events.jsonl"


def test_input_tuning_log_and_theory_are_all_there_from_thirty_six_rows_on(
    views: dict[str, ViewState],
) -> None:
    for name in ("nothing", "decided", "long"):
        text = text_of(views[name], 120, 36)
        for words in (views[name].status.input_line, "stands for every perde near it", LOG):
            assert words in text
        assert "Arel-Ezgi-Uzdilek theory" in text


@pytest.mark.parametrize("rows", [20, 24, 30])
def test_where_the_log_goes_is_said_on_lower_screens_as_long_as_the_entry_leaves_a_row(
    rows: int, views: dict[str, ViewState]
) -> None:
    lines = text_of(views["decided"], 80, rows).splitlines()
    assert [line for line in lines if LOG in line] == [f"{LOG:80}|"]
    assert sum("listening to USB Keys 61" in line for line in lines) == 1
    assert (LOG in text_of(views["long"], 80, rows)) == (rows == 30)


def test_a_warning_does_not_drive_out_where_the_log_goes(views: dict[str, ViewState]) -> None:
    view = replace(views["decided"], status=replace(views["decided"].status, warning="no mode 'rats'"))
    for size in ((80, 24), (120, 40)):
        text = text_of(view, *size)
        assert "! no mode 'rats'" in text
        assert text.count(LOG) == 1
        assert "Arel-Ezgi-Uzdilek theory" in text


def test_a_log_that_stands_beside_the_input_is_not_said_twice(views: dict[str, ViewState]) -> None:
    status = Status(input_line="listening to Pad", log_line="log: a.events.jsonl")
    text = text_of(replace(views["decided"], status=status), 80, 24)
    assert text.count("a.events.jsonl") == 1
    assert "listening to Pad · log: a.events.jsonl" in text


def test_a_refusal_is_not_said_twice(views: dict[str, ViewState]) -> None:
    view = views["decided"]
    entry = with_refused_word(view)
    view = replace(view, status=replace(view.status, warning=typing.complaint(entry)))
    assert text_of(view, 80, 24, entry).count("is no note") == 1


def test_colour_is_never_the_only_carrier(views: dict[str, ViewState]) -> None:
    lines = draw(views["change"], 120, 40)
    signs = {
        "class:rising": "▲",
        "class:falling": "▼",
        "class:heard": "✓",
        "class:off": "✗",
        "class:mend": "◌",
        "class:for": "+",
        "class:against": "−",
    }
    for style, sign in signs.items():
        texts = [text for line in lines for name, text in line if name == style]
        assert texts
        assert all(sign in text or text.startswith("     ") or not text.strip() for text in texts), style


def test_the_note_under_the_cursor_of_the_entry_is_shown_in_the_contour(
    views: dict[str, ViewState],
) -> None:
    view = views["long"]
    entry = entry_edit.moved_to_start(entry_of(view.tokens))
    lines = draw(view, 80, 24, entry)
    assert any("class:note.focus" in style for line in lines for style, _ in line)
    assert " 1 " in plain_text(lines[-5])
    assert "95" in plain_text(draw(view, 80, 24)[-5])


def test_the_cursor_stands_behind_what_is_typed(views: dict[str, ViewState]) -> None:
    view = views["undecided"]
    drawn = picture(view, 80, 24, entry_edit.inserted(entry_of(view.tokens), "G4"))
    assert plain_text(drawn.lines[drawn.row])[: drawn.column] == "› D5 E5 D5 C5:2 , G4"


def test_the_cursor_stands_in_the_question(views: dict[str, ViewState]) -> None:
    drawn = picture(views["decided"], 80, 24, None, asked())
    assert plain_text(drawn.lines[drawn.row])[: drawn.column] == "aim at which mode? hu"


# --------------------------------------------------------------------------------- any size

WORDS = st.text(st.characters(exclude_categories=["Cs"]), max_size=14)
NATS = st.floats(-9, 9)
ROWS = st.builds(LeaningRow, WORDS, WORDS, WORDS, st.floats(0, 1), st.floats(-1, 1), st.booleans())
STEPS = st.builds(
    OwedRow,
    WORDS,
    st.sampled_from(["core", "usual", "colour", "other"]),
    *[st.lists(WORDS, max_size=5).map(tuple)] * 3,
    st.none() | st.integers(1, 400),
    NATS,
)
NOTES = st.builds(
    LineNote,
    st.integers(1, 9999),
    st.floats(-80, 120),
    WORDS,
    WORDS,
    st.floats(0, 5),
    st.booleans(),
    st.sampled_from(["", "not in it"]),
    WORDS,
    st.sampled_from(["", ",", ".", "|"]),
    st.integers(-1, 500),
    st.none() | st.floats(-80, 120),
)
RUNGS = st.builds(
    Rung,
    st.integers(-80, 120),
    WORDS,
    st.sampled_from(["", "final", "dominant", "leading tone"]),
    st.sampled_from(["", "final", "dominant"]),
)
VIEWS = st.builds(
    ViewState,
    verdict=WORDS,
    now=WORDS,
    decided=st.booleans(),
    leanings=st.lists(ROWS, max_size=9).map(tuple),
    in_view=WORDS,
    rival=WORDS,
    is_target=st.booleans(),
    owed=st.lists(STEPS, max_size=9).map(tuple),
    line=st.lists(NOTES, max_size=60).map(tuple),
    ladder=st.lists(RUNGS, max_size=20).map(tuple),
    why=st.lists(st.builds(WhyRow, WORDS, NATS), max_size=6).map(tuple),
    keyboard_note=WORDS,
    tokens=st.lists(st.sampled_from(["A4", "B4-1", "D5:2", ","]), max_size=60).map(tuple),
    n_notes=st.integers(0, 999),
    reading=WORDS,
    restricted=WORDS,
    theory=WORDS,
    caution=WORDS,
    can_undo=st.booleans(),
    can_redo=st.booleans(),
    status=st.builds(Status, WORDS, WORDS, WORDS, WORDS),
)
COLUMNS = st.integers(1, 130)
HEIGHTS = st.integers(1, 50)
QUESTIONS = st.none() | st.builds(
    asking.typed, st.sampled_from([asking.ask(kind, ("Rast", "Uşşak")) for kind in QuestionKind]), WORDS
)


@settings(suppress_health_check=[HealthCheck.too_slow], deadline=None)
@given(VIEWS, COLUMNS, HEIGHTS, QUESTIONS, WORDS, st.booleans())
def test_any_view_fills_any_size_exactly(
    view: ViewState, columns: int, rows: int, question: Question | None, typed: str, ascii_only: bool
) -> None:
    entry = entry_edit.inserted(entry_of(view.tokens), typed)
    drawn = picture(view, columns, rows, entry, question, ascii_only)
    assert len(drawn.lines) == rows
    assert [line_width(line) for line in drawn.lines] == [columns] * rows
    assert 0 <= drawn.row < rows
    assert 0 <= drawn.column < columns
    for line in drawn.lines:
        assert plain_text(line).isprintable()
        assert not ascii_only or plain_text(line).isascii()


@given(st.integers(1, 130), st.integers(1, 60), st.integers(-5, 60), st.booleans(), WORDS)
def test_the_help_fills_any_size_exactly(
    columns: int, rows: int, first: int, ascii_only: bool, theory: str
) -> None:
    lines = draw_help(columns, rows, first, ascii_only, (theory, theory))
    assert len(lines) == rows
    assert all(line_width(line) == columns for line in lines)


@pytest.mark.parametrize("columns", [1, 2, 5, 39, 40, 60, 80, 120])
@pytest.mark.parametrize("rows", [1, 2, 3, 11, 12, 15, 24, 40])
def test_every_hand_made_view_fills_every_size(columns: int, rows: int, views: dict[str, ViewState]) -> None:
    for view in views.values():
        entry = with_refused_word(view)
        for question in (None, asked()):
            lines = draw(view, columns, rows, entry, question)
            assert [line_width(line) for line in lines] == [columns] * rows


def test_below_the_smallest_size_there_is_one_sentence(views: dict[str, ViewState]) -> None:
    sentence = (
        "13 hüseynî E5; leaning to Hüseynî, 72 %; next: final cadence on dügâh (karar), çargâh segâh dügâh"
    )
    entry = "› E5 E5 G5 F#5 E5:2 , D5 C5 B4-1 A4:2 . G4 A4 D5 E5:2 ,"
    assert text_of(views["decided"], 100, 3) == (f"{sentence:100}|\n{'rast dügâh':100}|\n{entry:100}|\n")


def test_the_largest_usual_screen_is_drawn_in_five_milliseconds(views: dict[str, ViewState]) -> None:
    view = views["long"]
    draw(view, 120, 40)
    times_s = []
    for _ in range(30):
        start_s = time.perf_counter()
        draw(view, 120, 40)
        times_s.append(time.perf_counter() - start_s)
    slowed_down = 4 if sys.gettrace() else 1  # by the measuring of coverage
    assert min(times_s) < 0.005 * slowed_down
