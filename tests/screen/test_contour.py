"""The contour on its ladder."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from melodycoach.core.ladder import Rung
from melodycoach.screen.contour import draw_contour, mending, off_words
from melodycoach.screen.signs import ASCII, UNICODE
from melodycoach.screen.text import plain_text
from melodycoach.screen.view import LineNote

if TYPE_CHECKING:
    from collections.abc import Mapping

    from melodycoach.screen.view import ViewState


def note(number: int, height: float, name: str, **more: object) -> LineNote:
    return LineNote(number, height, name, name, 0.3, item=number - 1, **{"rests": False, **more})  # type: ignore[arg-type]


def drawn(view: ViewState, columns: int, rows: int, focus: int | None = None) -> list[str]:
    return [plain_text(line) for line in draw_contour(view, columns, rows, UNICODE, focus)]


def small(view: ViewState, *notes: LineNote) -> ViewState:
    ladder = (Rung(0, "dügâh", "karar", "final"), Rung(8, "segâh"), Rung(13, "çargâh"))
    return replace(view, line=notes, ladder=ladder)


def test_notes_stand_on_their_rungs_highest_on_top(views: Mapping[str, ViewState]) -> None:
    view = small(views["decided"], note(1, 0, "dügâh"), note(2, 8, "segâh"), note(3, 13, "çargâh"))
    assert drawn(view, 40, 3) == [
        "       çargâh ┤      ●                  ",
        "        segâh ┤   ●                     ",
        "karar   dügâh ┤●┄┄┄┄┄┄┄┄┄┄┄┄┄┄┄┄┄┄┄┄┄┄┄┄",
    ]


def test_a_note_between_rungs_gets_a_rung_where_there_is_room(views: Mapping[str, ViewState]) -> None:
    view = small(views["decided"], note(1, 4, "kürdî"))
    assert any(line.split("┤")[0].strip() == "kürdî" for line in drawn(view, 40, 4))


def test_without_room_it_is_drawn_over_or_under_the_nearest_rung(views: Mapping[str, ViewState]) -> None:
    view = small(views["decided"], note(1, 3, "x"), note(2, 12, "y"), note(3, 0, "dügâh"))
    lines = drawn(view, 40, 1)
    assert len(lines) == 1
    assert "▴" in lines[0]
    assert lines[0].index("●") > lines[0].index("▴")
    view = replace(view, line=(note(1, -4, "z"),), ladder=view.ladder[:1])
    assert "▾" in drawn(view, 40, 1)[0]


def test_a_resting_note_is_held_and_a_breath_crosses_the_ladder(views: Mapping[str, ViewState]) -> None:
    notes = (note(1, 8, "segâh", rests=True, mark=","), note(2, 0, "dügâh", mark="."), note(3, 8, "segâh"))
    lines = drawn(small(views["decided"], *notes), 40, 3)
    assert "●━ ╎   │●" in lines[1]
    assert all("╎" in line and "│" in line for line in lines)


def test_a_note_off_the_mode_shows_its_sign_and_where_it_ought_to_be(views: Mapping[str, ViewState]) -> None:
    view = small(views["decided"], note(1, 8, "segâh", off_mode="not in it", mend="çargâh", mend_height=13.0))
    lines = drawn(view, 40, 6)
    assert "◌" in lines[0]
    assert "✗" in lines[1]
    assert lines[-1].strip() == "✗1"


def rungs(lines: list[str]) -> list[str]:
    return [line.split("┤")[0].split()[-1] for line in lines if "┤" in line]


def test_when_rows_are_few_a_note_off_the_mode_and_the_degree_that_mends_it_keep_theirs(
    views: Mapping[str, ViewState],
) -> None:
    kurdi = note(1, 4, "kürdî", off_mode="not in it", mend="segâh", mend_height=8.0)
    others = [note(2 + i, 22 + 9 * (i % 2), ("nevâ", "hüseynî")[i % 2]) for i in range(12)]
    lines = drawn(replace(views["decided"], line=(kurdi, *others)), 80, 4)
    assert rungs(lines) == ["hüseynî", "segâh", "kürdî", "dügâh"]
    assert "◌" in lines[1]
    assert "✗" in lines[2]


def test_of_many_notes_off_the_mode_the_newest_keep_their_rows_and_the_final_has_one(
    views: Mapping[str, ViewState],
) -> None:
    notes = (
        note(1, 4, "kürdî", off_mode="not in it", mend="segâh", mend_height=8.0),
        note(2, 17, "hicaz", off_mode="not in it", mend="çargâh", mend_height=13.0),
        note(3, 27, "bayatî", off_mode="not in it", mend="nevâ", mend_height=22.0),
    )
    lines = drawn(replace(views["decided"], line=notes), 80, 5)
    assert rungs(lines) == ["bayatî", "nevâ", "hicaz", "çargâh", "dügâh"]


def test_a_degree_that_mends_but_is_no_rung_of_this_ladder_gets_a_row(views: Mapping[str, ViewState]) -> None:
    # it was off in the mode that the line has left since
    off = note(1, 8, "segâh", off_mode="not in Kürdî", mend="kürdî", mend_height=4.0)
    lines = drawn(small(views["decided"], off), 40, 4)
    assert rungs(lines) == ["çargâh", "segâh", "kürdî", "dügâh"]
    assert "◌" in lines[2]


def test_without_room_for_the_degree_that_mends_it_only_the_note_is_marked(
    views: Mapping[str, ViewState],
) -> None:
    off = note(1, 8, "segâh", off_mode="not in it", mend="çargâh", mend_height=13.0)
    [line] = drawn(small(views["decided"], off), 40, 1)
    assert "✗" in line
    assert "◌" not in line


def test_the_newest_notes_are_shown_and_numbered_when_there_is_no_room_for_all(
    views: Mapping[str, ViewState],
) -> None:
    notes = tuple(note(number, 0, "dügâh") for number in range(1, 101))
    lines = drawn(small(views["decided"], *notes), 40, 6)
    assert "100" in lines[-1]
    assert " 1 " not in lines[-1]


def test_the_part_round_the_cursor_is_shown_when_it_stands_in_older_notes(
    views: Mapping[str, ViewState],
) -> None:
    notes = tuple(note(number, 0, "dügâh") for number in range(1, 101))
    lines = drawn(small(views["decided"], *notes), 40, 6, focus=44)
    assert "45" in lines[-1]
    assert "100" not in lines[-1]
    assert " 1 " in f"{drawn(small(views['decided'], *notes), 40, 6, focus=0)[-1]} "


def test_final_and_dominant_keep_their_rungs_when_rows_are_few(views: Mapping[str, ViewState]) -> None:
    names = [line.split("┤")[0].split()[-1] for line in drawn(views["decided"], 80, 4)]
    assert {"dügâh", "hüseynî"} <= set(names)


def test_a_narrow_ladder_keeps_names_and_drops_functions(views: Mapping[str, ViewState]) -> None:
    lines = drawn(views["decided"], 40, 10)
    assert any(line.strip().startswith("hüseynî ┤") for line in lines)


def test_a_function_that_does_not_fit_beside_its_name_is_left_out(views: Mapping[str, ViewState]) -> None:
    ladder = (Rung(0, "acemaşîran", "suspended cadence"), Rung(9, "rast", "final"))
    view = replace(views["decided"], ladder=ladder, line=(note(1, 0, "acemaşîran"),))
    text = "\n".join(drawn(view, 60, 3))
    assert "susp" not in text
    assert "final rast ┤" in text


def test_notes_off_the_mode_in_a_row_do_not_write_over_each_other(views: Mapping[str, ViewState]) -> None:
    notes = tuple(note(number, 8, "segâh", off_mode="not in it") for number in range(21, 24))
    assert drawn(small(views["decided"], *notes), 40, 6)[-1].split() == ["✗", "✗", "✗23"]


def test_no_room_and_no_notes_draw_nothing_much(views: Mapping[str, ViewState]) -> None:
    view = views["decided"]
    assert drawn(view, 0, 5) == []
    assert drawn(view, 5, 0) == []
    assert drawn(replace(view, ladder=(), line=()), 30, 5) == []
    assert all(len(line) == 1 for line in drawn(view, 1, 5))


def test_mending_lists_the_newest_first(views: Mapping[str, ViewState]) -> None:
    lines = [plain_text(line).rstrip() for line in mending(views["change"], 80, 1, ASCII)]
    assert lines == ["x 18 hisar: hüseynî mends it (not in Hüseynî, 2 commas below hüseynî)"]
    assert mending(views["decided"], 80, 2, ASCII) == []


def test_a_note_that_nothing_mends_is_only_named() -> None:
    assert off_words(note(3, 0, "x", off_mode="not in Rast")) == "3 x: not in Rast"
