"""Verdict, leanings, owed steps, reasons, status, keys."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from melodycoach.screen.panels import (
    draw_hints,
    draw_leanings,
    draw_now,
    draw_owed,
    draw_status,
    draw_verdict,
    draw_why,
    gain_words,
    log_left_out,
    owed_title,
    theory_words,
    title_line,
    why_title,
)
from melodycoach.screen.signs import UNICODE
from melodycoach.screen.text import Line, plain_text

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from melodycoach.screen.view import ViewState


def texts(lines: Sequence[Line]) -> list[str]:
    return [plain_text(line).rstrip() for line in lines]


def test_the_verdict_gets_a_number_where_it_has_none(views: Mapping[str, ViewState]) -> None:
    view = replace(views["decided"], verdict="leaning to Hüseynî")
    assert plain_text(draw_verdict(view, 30, UNICODE)) == "◆ leaning to Hüseynî  72%"
    assert plain_text(draw_verdict(views["undecided"], 200, UNICODE)).startswith("◇ undecided between")


def test_the_verdict_comes_before_its_circumstances(views: Mapping[str, ViewState]) -> None:
    view = views["decided"]
    assert "13 notes" in plain_text(draw_verdict(view, 40, UNICODE))
    assert "written pitch" in plain_text(draw_verdict(view, 120, UNICODE))
    assert plain_text(draw_verdict(view, 12, UNICODE)) == "◆ leaning to…"[:11] + "…"
    assert plain_text(draw_verdict(replace(view, n_notes=1), 40, UNICODE)).endswith(" 1 note")


def test_the_row_below_it_says_what_wants_notice(views: Mapping[str, ViewState]) -> None:
    change = plain_text(draw_now(views["change"], 80, UNICODE, theory=True))
    assert change == "▸ right now it sounds like Karcığar, since note 14"
    assert plain_text(draw_now(views["undecided"], 80, UNICODE, theory=True)).startswith("  plain keys")
    assert "AEU" not in plain_text(draw_now(views["decided"], 80, UNICODE, theory=False))
    assert plain_text(draw_now(views["decided"], 80, UNICODE, theory=False)).strip() == ""


def test_leanings_show_direction_and_size_of_the_change(views: Mapping[str, ViewState]) -> None:
    first, second, *_, steady = texts(draw_leanings(views["decided"], 60, 6, UNICODE))
    assert first.startswith("  Hüseynî")
    assert "72% ▲ 12  dügâh" in first
    assert "14% ▼  5  dügâh" in second
    assert "=" in steady


def test_a_tiny_share_still_shows_how_long_its_bar_is(views: Mapping[str, ViewState]) -> None:
    bars = [line.split()[1] for line in texts(draw_leanings(views["decided"], 60, 5, UNICODE))]
    assert bars[0].startswith("████")
    assert sorted(bars, key=len, reverse=True) == bars


def test_leanings_fit_the_narrowest_room(views: Mapping[str, ViewState]) -> None:
    assert len(draw_leanings(views["decided"], 3, 2, UNICODE)) == 2
    assert draw_leanings(views["decided"], 40, 0, UNICODE) == []


def test_steps_are_grouped_by_need_with_notes_and_keys_where_there_is_room(
    views: Mapping[str, ViewState],
) -> None:
    lines = texts(draw_owed(views["decided"], 80, 30, UNICODE))
    assert lines[:4] == [
        "▸ play next: final cadence on dügâh (karar)" + " " * 28 + "core +1.8",
        "    çargâh segâh dügâh rast dügâh",
        "    written C5 B4-1 A4 G4 A4   keys C5 B4 A4 G4 A4",
        "core",
    ]
    assert [line for line in lines if not line.startswith((" ", "○", "+", "✓", "▸"))] == [
        "core",
        "usual",
        "colour",
    ]
    assert "    G5 F5 E5   keys G5 F5 E5" in lines
    assert any(line.startswith("✓ eviç hüseynî") and line.endswith("note 5") for line in lines)


def test_with_little_room_owed_steps_come_before_heard_ones_but_leave_them_a_row(
    views: Mapping[str, ViewState],
) -> None:
    lines = texts(draw_owed(views["decided"], 42, 8, UNICODE))
    assert len(lines) == 8
    assert [line[0] for line in lines[3:]] == ["○", "○", "○", "+", "✓"]
    assert "core +1.1" in lines[3]


def test_two_rows_and_one_row_hold_the_notes_of_the_best_step(views: Mapping[str, ViewState]) -> None:
    view = views["decided"]
    assert texts(draw_owed(view, 60, 2, UNICODE))[1] == "    çargâh segâh dügâh rast dügâh   C5 B4 A4 G4 A4"
    assert texts(draw_owed(view, 40, 2, UNICODE))[1] == "    çargâh segâh dügâh rast dügâh"
    assert texts(draw_owed(view, 40, 1, UNICODE)) == ["▸ çargâh segâh dügâh rast dügâh"]
    assert "final cadence" in texts(draw_owed(view, 90, 1, UNICODE))[0]
    assert draw_owed(view, 40, 0, UNICODE) == []


def test_a_step_without_keys_shows_its_written_notes(views: Mapping[str, ViewState]) -> None:
    view = views["decided"]
    owed = tuple(replace(row, keys=()) for row in view.owed)
    lines = texts(draw_owed(replace(view, owed=owed), 80, 30, UNICODE))
    assert lines[2] == "    written C5 B4-1 A4 G4 A4"
    assert "    G5 F5 E5" in lines


def test_long_notes_and_keys_take_a_row_each(views: Mapping[str, ViewState]) -> None:
    lines = texts(draw_owed(views["decided"], 30, 8, UNICODE))
    assert "    written C5 B4-1 A4 G4 A4" in lines
    assert "    keys C5 B4 A4 G4 A4" in lines


def test_once_every_step_is_heard_the_area_says_so(views: Mapping[str, ViewState]) -> None:
    owed = tuple(replace(row, heard_at=3) for row in views["decided"].owed)
    lines = texts(draw_owed(replace(views["decided"], owed=owed), 60, 4, UNICODE))
    assert lines[0] == "✓ every step that Hüseynî needs is heard"
    assert len(lines) == 4


def test_colour_has_a_sign_of_its_own_and_is_never_put_first_nor_counted(
    views: Mapping[str, ViewState],
) -> None:
    view = views["decided"]
    owed = tuple(row if row.is_colour else replace(row, heard_at=3) for row in view.owed)
    view = replace(view, owed=tuple(replace(row, gain_nats=7.8) if row.is_colour else row for row in owed))
    lines = texts(draw_owed(view, 60, 20, UNICODE))
    assert lines[0] == "✓ every step that Hüseynî needs is heard"
    assert not any("▸" in line or "○" in line for line in lines)
    assert [line[:21] for line in lines if "+7.8" in line] == ["+ gerdâniye muhayyer "]
    assert owed_title(view, UNICODE)[1] == "7 of 7 heard"
    assert texts(draw_owed(view, 60, 1, UNICODE)) == lines[:1]


def test_steps_keep_the_order_of_the_view(views: Mapping[str, ViewState]) -> None:
    view = views["decided"]
    reordered = replace(view, owed=(view.owed[2], view.owed[0], *view.owed[3:]))
    lines = texts(draw_owed(reordered, 80, 30, UNICODE))
    assert lines[0].startswith("▸ play next: suspended cadence on çargâh")


def test_before_the_first_note_the_area_says_what_it_is_for(views: Mapping[str, ViewState]) -> None:
    assert "which you owe" in " ".join(texts(draw_owed(views["nothing"], 60, 5, UNICODE)))
    assert texts(draw_owed(views["nothing"], 60, 1, UNICODE)) == ["owed steps will stand here"]
    aimed = replace(views["nothing"], is_target=True)
    assert texts(draw_owed(aimed, 60, 5, UNICODE))[0].startswith("▸ play next")


def test_a_need_that_the_pack_makes_up_gets_a_heading_too(views: Mapping[str, ViewState]) -> None:
    view = views["decided"]
    owed = (*view.owed, replace(view.owed[-1], need="rare"))
    assert "rare" in texts(draw_owed(replace(view, owed=owed), 80, 30, UNICODE))


def test_titles_name_the_mode_the_aim_and_the_rival(views: Mapping[str, ViewState]) -> None:
    assert owed_title(views["decided"], UNICODE) == ("owed · Hüseynî", "3 of 7 heard")
    assert owed_title(views["target"], UNICODE)[0] == "owed · Sultânîyegâh (your aim)"
    assert owed_title(views["nothing"], UNICODE) == ("owed", "")
    assert why_title(views["decided"]) == "why Hüseynî, not Muhayyer"
    assert why_title(views["nothing"]) == "why"


def test_a_title_fills_its_width_with_a_rule() -> None:
    assert plain_text(title_line("why", 12, UNICODE)) == "why ────────"
    assert plain_text(title_line("why", 12, UNICODE, "nats")) == "why ─── nats"
    assert plain_text(title_line("leanings", 5, UNICODE, "nats")) == "lean…"


def test_reasons_are_weighed_and_wrapped(views: Mapping[str, ViewState]) -> None:
    lines = texts(draw_why(views["decided"], 40, 5, UNICODE))
    assert lines[0] == " +1.3 you opened on hüseynî; Muhayyer"
    assert lines[1] == "      opens an octave above the final"
    assert len(lines) == 5
    assert lines[-1].endswith("Hüseynî") or lines[-1].startswith(" +0.4")
    assert " −0.2 nevâ" in " ".join(texts(draw_why(views["decided"], 90, 9, UNICODE)))
    assert texts(draw_why(views["decided"], 40, 1, UNICODE))[0].endswith("…")
    assert draw_why(views["nothing"], 40, 0, UNICODE) == []


def test_a_gain_of_nothing_has_no_sign() -> None:
    assert gain_words(-0.04, UNICODE) == " 0.0"


def test_a_warning_comes_before_everything_else(views: Mapping[str, ViewState]) -> None:
    view = views["error"]
    assert texts(draw_status(view, 100, 1, UNICODE))[0].startswith("! the log cannot be written")
    lines = texts(draw_status(view, 50, 2, UNICODE))
    assert lines[1].startswith("  ")
    assert texts(draw_status(view, 30, 1, UNICODE))[0].endswith("…")
    assert draw_status(view, 50, 0, UNICODE) == []


def test_the_status_says_input_tuning_log_and_theory_as_room_allows(views: Mapping[str, ViewState]) -> None:
    view = views["decided"]
    world = (
        "listening to USB Keys 61:USB Keys 61 MIDI 1 20:0 · plain keys: each stands for every perde near it"
    )
    log = view.status.log_line
    assert texts(draw_status(view, 120, 3, UNICODE)) == [world, log, theory_words(view)]
    assert texts(draw_status(view, 120, 2, UNICODE)) == [world, log]
    assert texts(draw_status(view, 200, 1, UNICODE)) == [f"{world} · {log}"]
    assert texts(draw_status(view, 120, 1, UNICODE)) == [world]


def test_where_the_log_goes_is_left_out_only_where_the_rows_do_not_hold_it(
    views: Mapping[str, ViewState],
) -> None:
    view = views["decided"]
    log = view.status.log_line
    assert log_left_out(view, 120, 1, UNICODE) == log
    assert log_left_out(view, 200, 1, UNICODE) == ""
    assert log_left_out(view, 40, 2, UNICODE) == ""
    noticed = replace(view, status=replace(view.status, notice="saved as a.txt"))
    assert log_left_out(noticed, 120, 2, UNICODE) == log
    assert log_left_out(replace(view, status=replace(view.status, log_line="")), 9, 0, UNICODE) == ""


def test_theory_and_caution_are_two_sentences(views: Mapping[str, ViewState]) -> None:
    view = replace(views["decided"], theory="AEU theory", caution="schools differ")
    assert theory_words(view) == "AEU theory. schools differ"
    assert theory_words(replace(view, theory="")) == "schools differ"


def test_keys_are_shown_as_far_as_they_fit_and_only_when_they_do_something(
    views: Mapping[str, ViewState],
) -> None:
    assert plain_text(draw_hints(views["decided"], 24)) == "F1 help  F2 aim  ^Z undo"
    assert "redo" in plain_text(draw_hints(views["off"], 120))
    assert "undo" not in plain_text(draw_hints(views["nothing"], 120))
    assert plain_text(draw_hints(views["decided"], 3)) == ""
