"""Wiring: from settings to a running coach, in full screen or line by line.

The full screen draws in the main thread and the coach runs in one of its own; line by line, one
thread does both. Either way the terminal is restored and the log complete, however it ends.
"""

from __future__ import annotations

import contextlib
import gc
import io
import signal
import sys
import threading
import time
from dataclasses import dataclass, replace
from pathlib import Path
from queue import Empty, SimpleQueue
from typing import TYPE_CHECKING, Any

from melodycoach import DEFAULT_PACK
from melodycoach.clock import Clock
from melodycoach.coach import TURN_S, Coach
from melodycoach.core.event import PitchReading
from melodycoach.core.line_rules import LineRules
from melodycoach.core.session import begin
from melodycoach.errors import MelodycoachError, PortError
from melodycoach.folders import driver_log_path, user_keyboard_dir, user_pack_dir
from melodycoach.line_text import open_line, read_final
from melodycoach.players import DemoKeyboard, Keyboard, Player, Replay
from melodycoach.reading import mode_named
from melodycoach.recorded import cut_short, open_log, recorded_beginning, resume
from melodycoach.screen.plain import plain_line
from melodycoach.sources.event_log import read_event_log
from melodycoach.sources.keyboard_profile import list_keyboards, load_keyboard
from melodycoach.sources.midi_port import PortState, find_port
from melodycoach.sources.midi_system import list_ports, quiet_stderr
from melodycoach.sources.pack_file import load_pack

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator

    from melodycoach.core.session import SessionState
    from melodycoach.screen.view import ViewState
    from melodycoach.sources.event_log import EventLog
    from melodycoach.sources.keyboard_profile import KeyboardProfile

HURRIED = 400.0
"""How much faster than real time a hurried demo or replay runs."""

SWITCH_INTERVAL_S = 0.001
"""How soon Python hands the processor from the drawing thread to the coach."""

COLLECT_AFTER = (20_000, 50, 1_000)
"""New values after which the young ones are looked through, and how often before the older ones are."""


@dataclass(frozen=True, slots=True)
class Settings:
    """What the command line asks of a live session, as it was typed."""

    pack: str = DEFAULT_PACK
    only: tuple[str, ...] = ()
    target: str | None = None
    final: str | None = None
    any_pitch: bool = False
    port: str | None = None
    keys: str | None = None
    log: bool = True
    open_file: Path | None = None
    replay: Path | None = None
    resume: str | None = None  # a log; empty: the newest one
    demo: bool = False
    fast: bool = False


def listen(settings: Settings, full_screen: bool, say: Callable[[str], None]) -> int:
    """Run a live session to its end.

    Parameters
    ----------
    settings
        What the command line asks for.
    full_screen
        Draw a screen; else one line of text for each note goes to ``say``.
    say
        Prints a line.

    Returns
    -------
    int
        The exit code.
    """
    clock = Clock(HURRIED if settings.fast else 1.0)
    session, player, log, notice = _prepare(settings, clock)
    if full_screen:
        coach = Coach(session, player, clock, log, notice=notice)
        _open_first_file(coach, settings)
        return _run_full_screen(coach, player, clock)
    printer = _Printer(say)
    coach = Coach(session, player, clock, log, on_note=printer.note, notice=notice)
    printer.begin(coach)
    if settings.keys is not None:
        say(f"({player.tuning_line()})")
    _open_first_file(coach, settings)
    return _run_plain(coach, player, clock, printer)


def _prepare(settings: Settings, clock: Clock) -> tuple[SessionState, Player, EventLog | None, str]:
    """Read everything that a session needs, and refuse early what cannot be; say where it comes from."""
    if settings.replay is not None:
        recorded = read_event_log(settings.replay)
        beginning = recorded_beginning(recorded, settings.replay, settings.pack)
        return beginning, Replay(recorded, settings.replay), None, ""
    profile = load_keyboard(settings.keys, user_keyboard_dir()) if settings.keys is not None else None
    if settings.resume is not None:
        resumed = resume(Path(settings.resume) if settings.resume else None, settings.pack)
        clock.go_on_from(resumed.session.now_s)
        keyboard = _keyboard(settings, clock, profile)
        log = resumed.open_log() if settings.log else None
        return resumed.session, keyboard, log, resumed.says
    session = _begin(settings, profile)
    keyboard = _keyboard(settings, clock, profile)
    player: Player = DemoKeyboard(session.pack.names, keyboard) if settings.demo else keyboard
    notice = "" if settings.demo else cut_short()
    return session, player, open_log(session, settings.pack) if settings.log else None, notice


def _begin(settings: Settings, profile: KeyboardProfile | None) -> SessionState:
    """Begin a session as the command line asks."""
    pack = load_pack(settings.pack, user_pack_dir())
    reading, final_cents = PitchReading.WRITTEN, None
    if settings.any_pitch:
        reading = PitchReading.ANY
    elif settings.final is not None:
        reading, final_cents = read_final(settings.final, pack.names)
    if settings.open_file is not None:
        page, _ = open_line(settings.open_file, pack.names)
        mode_named(pack, page.kind, page.headers.mode)
    only = tuple(mode.id for mode in pack.restrict(settings.only)) if settings.only else ()
    rules = LineRules(profile.split_sounds) if profile else LineRules()
    return begin(pack, only, reading, final_cents, settings.target, rules=rules)


def _keyboard(settings: Settings, clock: Clock, profile: KeyboardProfile | None) -> Keyboard:
    """Listen to the keyboard that is asked for; one that is named has to be there."""
    if settings.port is not None:
        ports = list_ports()
        if ports.problem:
            raise PortError(f"port {settings.port!r}: {ports.problem}")
        find_port(ports.inputs, settings.port)
    return Keyboard(clock, settings.port or "", profile=profile)


def _open_first_file(coach: Coach, settings: Settings) -> None:
    if settings.open_file is not None:
        try:
            coach.open_text(settings.open_file)
        except MelodycoachError:
            coach.close()
            raise


# --- full screen -------------------------------------------------------------------------------


def _run_full_screen(coach: Coach, player: Player, clock: Clock) -> int:
    from melodycoach.screen.terminal import run_screen

    runner = _Runner(coach, player, clock)
    sys.setswitchinterval(SWITCH_INTERVAL_S)
    _collect_seldom()
    with quiet_stderr(driver_log_path()):
        runner.start()
        try:
            run_screen(runner.latest_view, coach.send, runner.subscribe, _choices(coach))
        finally:
            runner.stop()
    return 0


def _collect_seldom() -> None:
    """Keep the collector of unreachable values from stopping a note on its way to the screen.

    It goes through everything that is alive, which takes tens of milliseconds. What is there at the
    start is never looked at again, and the rest seldom: views and states hold no cycles.
    """
    gc.collect()
    gc.freeze()
    gc.set_threshold(*COLLECT_AFTER)


class _Runner(threading.Thread):
    """The thread that owns the coach."""

    def __init__(self, coach: Coach, player: Player, clock: Clock) -> None:
        super().__init__(name="coach", daemon=True)
        self._coach = coach
        self._player = player
        self._clock = clock
        self._fault: Exception | None = None
        self._refresh: Callable[[], None] = lambda: None
        self._stopping = threading.Event()

    def subscribe(self, refresh: Callable[[], None]) -> None:
        """Say whom to tell of a new view."""
        self._refresh = refresh

    def latest_view(self) -> ViewState:
        """Give the newest view, or raise what has stopped the coach: the screen then leaves."""
        if self._fault is not None:
            raise self._fault
        return self._coach.view

    def run(self) -> None:
        """Turn until asked to stop; close the log whatever happens."""
        try:
            while not self._stopping.is_set():
                if self._coach.turn():
                    self._refresh()
                if self._player.is_over(self._clock()):
                    self._clock.slow_down()  # whoever plays on is not hurried
                self._stopping.wait(TURN_S)
        except Exception as fault:  # noqa: BLE001  (raised again in the thread of the screen)
            self._fault = fault
            self._refresh()
        finally:
            self._coach.close()

    def stop(self) -> None:
        """Ask the thread to end, and wait until the log is complete."""
        self._stopping.set()
        self.join(timeout=5.0)


def _choices(coach: Coach) -> Callable[[str], tuple[str, ...]]:
    """Give the names that a question of the screen can be answered with, by its kind."""

    def choices(kind: str) -> tuple[str, ...]:
        session = coach.session
        match kind:
            case "target" | "only":
                return tuple(mode.name for mode in session.pack.modes)
            case "final":
                return ("written", "any", *(pitch.name for pitch in session.pack.names.named))
            case "port":
                return coach.inputs()
            case "save":
                return (str(coach.save_path()),)
            case _:
                return ()

    return choices


# --- line by line ------------------------------------------------------------------------------


class _Printer:
    """Prints a line for each note, and the sentences about the world when they change."""

    def __init__(self, say: Callable[[str], None]) -> None:
        self._say = say
        self._previous: ViewState | None = None  # of the last note
        self._status: tuple[str, ...] = ()

    def begin(self, coach: Coach) -> None:
        self._say(f"{coach.view.theory}. {coach.view.caution}")
        self._previous = coach.view  # before anything is heard, even in haste
        coach.turn()  # the ports are looked at: there is something true to say of them
        self.world(coach.view)

    def note(self, view: ViewState) -> None:
        self.world(view)
        before = self._previous
        known = None if before is None else replace(before, status=view.status)  # said by `world`
        self._say(plain_line(view, known))
        self._previous = view

    def world(self, view: ViewState) -> None:
        """Say what is new about input, log, warnings and what was done."""
        status = (view.status.input_line, view.status.log_line, view.status.warning, view.status.notice)
        for new in status:
            if new and new not in self._status:
                self._say(f"({new})")
        self._status = status


def _run_plain(coach: Coach, player: Player, clock: Clock, printer: _Printer) -> int:
    """Read what is typed and played until there is no more of either."""
    typed: SimpleQueue[str | None] = SimpleQueue()
    threading.Thread(target=_read_lines, args=(typed,), name="typed lines", daemon=True).start()
    typing = True
    try:
        with _ending_by_signal():
            while True:
                if coach.turn():
                    printer.world(coach.view)
                played_out = player.is_over(clock())
                if played_out:
                    clock.slow_down()
                if typing and (played_out or not _plays_by_itself(player)):
                    typing = _take_typed(coach, typed)
                if not typing and (played_out or not _may_still_play(player)):
                    coach.turn()  # what has come to be said in between
                    printer.world(coach.view)
                    break
                time.sleep(TURN_S)
    finally:
        coach.close()
    return 0


def _plays_by_itself(player: Player) -> bool:
    return not isinstance(player, Keyboard)


def _may_still_play(player: Player) -> bool:
    """Whether there is someone to wait for when nobody types any more."""
    return _plays_by_itself(player) or (
        isinstance(player, Keyboard) and player.status.state in (PortState.OPEN, PortState.LOST)
    )


def _read_lines(typed: SimpleQueue[str | None]) -> None:
    if isinstance(sys.stdin, io.TextIOWrapper):
        sys.stdin.reconfigure(errors="replace")  # a byte that is no text spoils its word, not the rest
    with contextlib.suppress(OSError, ValueError, TypeError):  # closed, or never there
        for line in sys.stdin:
            typed.put(line)
    typed.put(None)


def _take_typed(coach: Coach, typed: SimpleQueue[str | None]) -> bool:
    """Put what has been typed behind the line, note by note; False at the end of input."""
    try:
        line = typed.get_nowait()
    except Empty:
        return True
    if line is None:
        return False
    coach.append_text(line)
    return True


class _Ended(BaseException):
    """The system asked the program to end."""


@contextlib.contextmanager
def _ending_by_signal() -> Iterator[None]:
    """Leave in good order when the system asks the program to end."""

    def end(*_: object) -> None:
        raise _Ended

    asked = [getattr(signal, name) for name in ("SIGTERM", "SIGHUP") if hasattr(signal, name)]
    if threading.current_thread() is not threading.main_thread():
        asked = []  # signals belong to the main thread; a test may run the session elsewhere
    before = {number: signal.signal(number, end) for number in asked}
    with contextlib.suppress(_Ended):
        try:
            yield
        finally:
            for number, handler in before.items():
                signal.signal(number, handler)


# --- ports -------------------------------------------------------------------------------------


def ports() -> dict[str, Any]:
    """List the ports of this machine, and the player's keyboard profiles, as plain values."""
    found = list_ports()
    profiles = list_keyboards(user_keyboard_dir())
    return {
        "inputs": [{"name": port.name, "system": port.system} for port in found.inputs],
        "outputs": [{"name": port.name, "system": port.system} for port in found.outputs],
        "problem": found.problem,
        "keyboards": [{"name": name, "path": str(path), "fault": fault} for name, path, fault in profiles],
    }
