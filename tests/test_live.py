"""The program as a player meets it: on a real terminal, with a keyboard on a real JACK server."""

from __future__ import annotations

import signal
from typing import TYPE_CHECKING

import pytest
from pseudo_terminal import LEAVES_FULL_SCREEN, PseudoTerminal

from melodycoach.sources.event_log import read_event_log

if TYPE_CHECKING:
    from collections.abc import Callable
    from pathlib import Path

    from conftest import Keyboard


# Typed on a plain keyboard: hüseynî, nevâ, çargâh, segâh, dügâh (E5 D5 C5 B4 A4), 0.3 s each.
DESCENT = [
    word for key in (76, 74, 72, 71, 69) for word in (f"90 {key:02X} 50", "wait 0.3", f"80 {key:02X} 00")
]


@pytest.mark.slow
@pytest.mark.parametrize(("columns", "rows"), [(40, 12), (80, 24), (120, 40)])
def test_a_typed_phrase_is_named_on_the_screen(
    open_terminal: Callable[..., PseudoTerminal], columns: int, rows: int
) -> None:
    terminal = open_terminal("listen", "--no-log", "--only", "huseyni,hicaz,rast", columns=columns, rows=rows)
    terminal.wait_for("nothing heard yet")
    terminal.type("D5 C#5 Bb4+1 A4 Bb4+1 C#5 D5 C#5 Bb4+1 A4 ")
    assert "Hicaz" in terminal.wait_for("leaning to Hicaz")
    terminal.type("\x03")
    assert terminal.ends() == 0
    assert LEAVES_FULL_SCREEN in terminal.written


@pytest.mark.slow
def test_what_cannot_be_read_stays_in_the_entry_and_is_explained(
    open_terminal: Callable[..., PseudoTerminal],
) -> None:
    terminal = open_terminal("listen", "--no-log", "--only", "huseyni,hicaz")
    terminal.wait_for("nothing heard yet")
    terminal.type("E5 H5 ")
    assert "E5 H5" in terminal.wait_for("'H5'")


@pytest.mark.slow
@pytest.mark.parametrize("number", [signal.SIGTERM, signal.SIGHUP, signal.SIGINT])
def test_a_signal_leaves_the_terminal_restored_and_the_log_complete(
    open_terminal: Callable[..., PseudoTerminal], tmp_path: Path, number: signal.Signals
) -> None:
    terminal = open_terminal("listen")
    terminal.wait_for("nothing heard yet")
    terminal.type("E5 D5 C5 ")
    terminal.wait_for("3 notes")
    terminal.send_signal(number)
    terminal.ends()
    assert LEAVES_FULL_SCREEN in terminal.written
    [log] = (tmp_path / "data" / "melodycoach" / "sessions").iterdir()
    recorded = read_event_log(log)
    assert recorded.notice == ""
    assert len(recorded.events) >= 3


@pytest.mark.slow
def test_the_screen_survives_being_resized_down_to_nothing(
    open_terminal: Callable[..., PseudoTerminal],
) -> None:
    terminal = open_terminal("listen", "--no-log", "--only", "huseyni,hicaz,rast")
    terminal.wait_for("nothing heard yet")
    terminal.type("E5 D5 E5 ")
    terminal.wait_for("3 notes")
    for columns, rows in ((1, 1), (10, 3), (40, 12), (200, 60), (80, 24)):
        terminal.resize(columns, rows)
        terminal.send_signal(signal.SIGWINCH)
        terminal.read(0.3)
    terminal.wait_for("3 notes")
    assert terminal.process.poll() is None


@pytest.mark.jack
def test_a_phrase_played_over_jack_is_read_off_the_screen(
    plug_in: Callable[[str], Keyboard], open_terminal: Callable[..., PseudoTerminal], tmp_path: Path
) -> None:
    keyboard = plug_in("old upright")
    terminal = open_terminal("listen", "--port", "old upright")
    terminal.wait_for("listening to old upright")
    keyboard.play(*DESCENT)
    shown = terminal.wait_for("5 notes", "E5~ D5~ C5~ B4~ A4~")
    assert "dügâh" in shown
    terminal.type("\x03")
    assert terminal.ends() == 0
    [log] = (tmp_path / "data" / "melodycoach" / "sessions").iterdir()
    [again] = [open_terminal("listen", "--replay", str(log), "--fast")]
    again.wait_for("is done", "5 notes", "E5~ D5~ C5~ B4~ A4~")


@pytest.mark.jack
def test_bends_sent_before_the_notes_are_read_as_commas(
    plug_in: Callable[[str], Keyboard], open_terminal: Callable[..., PseudoTerminal]
) -> None:
    keyboard = plug_in("bender")
    terminal = open_terminal("listen", "--no-log")
    terminal.wait_for("listening to bender")
    # B4 bent down by 19 cents with the default range of two semitones: segâh, one comma under B4
    # (7100 - 18.87 = 7081.13 cents = 8 commas above A4); -773 of 8192 steps, 8192 - 773 = 0x1CFB.
    keyboard.play("E0 7B 39", "90 47 50", "wait 0.3", "80 47 00")
    terminal.wait_for("B4-1", "segâh")


@pytest.mark.jack
def test_a_keyboard_that_is_unplugged_is_missed_and_goes_on_when_it_is_back(
    plug_in: Callable[[str], Keyboard], open_terminal: Callable[..., PseudoTerminal]
) -> None:
    keyboard = plug_in("wanderer")
    terminal = open_terminal("listen", "--no-log")
    terminal.wait_for("listening to wanderer")
    keyboard.play("90 45 50", "wait 0.3", "80 45 00")
    terminal.wait_for("1 note")
    keyboard.unplug()
    terminal.wait_for("wanderer", "has gone", deadline_s=4.0)
    again = plug_in("wanderer")
    terminal.wait_for("listening to wanderer", gone="has gone", deadline_s=6.0)
    again.play("90 47 50", "wait 0.3", "80 47 00")
    terminal.wait_for("2 notes")


@pytest.mark.jack
def test_a_keyboard_that_appears_later_is_taken(
    plug_in: Callable[[str], Keyboard], open_terminal: Callable[..., PseudoTerminal]
) -> None:
    terminal = open_terminal("listen", "--no-log")
    terminal.wait_for("no keyboard found")
    late = plug_in("latecomer")
    terminal.wait_for("listening to latecomer")
    late.play("90 45 50", "wait 0.2", "80 45 00")
    terminal.wait_for("1 note")


@pytest.mark.jack
def test_with_several_keyboards_the_player_is_asked(
    plug_in: Callable[[str], Keyboard], open_terminal: Callable[..., PseudoTerminal]
) -> None:
    plug_in("left hand")
    right = plug_in("right hand")
    terminal = open_terminal("listen", "--no-log")
    terminal.wait_for("several keyboards", "listen to which input?", "left hand")
    terminal.type("right\r")
    terminal.wait_for("listening to right hand", gone="listen to which input?")
    right.play("90 45 50", "wait 0.2", "80 45 00")
    terminal.wait_for("1 note")


@pytest.mark.jack
def test_with_several_keyboards_a_player_who_would_rather_type_can_choose_later(
    plug_in: Callable[[str], Keyboard], open_terminal: Callable[..., PseudoTerminal]
) -> None:
    plug_in("left hand")
    plug_in("right hand")
    terminal = open_terminal("listen", "--no-log")
    terminal.wait_for("listen to which input?")
    terminal.type("\x1b")
    terminal.wait_for("several keyboards", gone="listen to which input?")
    terminal.type("E5 ")
    terminal.wait_for("1 note", gone="listen to which input?")
    terminal.type("\x1bOP")  # F1: help, and away again
    terminal.read(0.3)
    terminal.type("\x1bOP")
    terminal.type("\x1b[17~left hand\r")  # F6: which input?
    terminal.wait_for("listening to left hand")
