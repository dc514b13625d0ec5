"""How soon a played note is seen, what it costs, whether that stays so, and how soon the program is up.

``python tests/bench/live.py`` prints every figure beside its bound; ``test_live_bench.py`` holds them.
``python tests/bench/live.py latency`` (or ``floods``, ``costs``, ``soak``, ``start``) prints a part.

Processes of their own play, listen and show the screen: this file again, with the name of a part in
``PARTS`` as its first argument. All stamps are ``time.monotonic()``, which processes share on Linux.
A note is stamped just before it is handed to JACK, so the wait for the next period counts as ours.
"""

from __future__ import annotations

import contextlib
import fcntl
import functools
import json
import os
import pty
import random
import statistics
import struct
import subprocess
import sys
import tempfile
import termios
import threading
import time
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

sys.path.insert(0, str(Path(__file__).resolve().parent.parent))  # when it runs as a script

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator, Mapping

    from melodycoach.core.event import PitchReading
    from melodycoach.core.mode import ModePack
    from melodycoach.core.note import InputKind
    from melodycoach.sources.midi_system import PortName

LATENCY_MEDIAN_MS, LATENCY_P99_MS, SHARE_P99_MS = 6.0, 15.0, 3.0
NOTE_US = {"written": 150.0, "any": 1000.0}
EDIT_MS = 150.0
SOAK_MB, SOAK_RATIO = 50.0, 1.2
HELP_MS, FRAME_MS = 150.0, 700.0

COLUMNS, ROWS = 120, 40
DEADLINE_S = 30.0
HASTE = 0.9
"""A player who is late makes up for it with gaps shortened to this, so that no two notes become a chord."""

QUIET_S = 1.0
"""A log that has not grown for so long has everything."""

NOTES_BEHIND = 10_000
EDITED_NOTES = 2_000
WINDOW = 10_000
"""The first and the last notes of a soak that are compared."""

BATCH = 100
"""So many notes of a soak are played between two turns of the coach."""

Plan = list[tuple[float, int, bool]]
"""When, in seconds from the start, which key goes down, or up."""


# --- what is played ----------------------------------------------------------------------------


def keys_played(n_notes: int) -> list[int]:
    """Give the keys of a line by the book: never twice the same, nor an octave, one after the other."""
    from bench.reading import NAMES, long_text

    from melodycoach.core.note import Note
    from melodycoach.sources.note_text import read_note_text

    items = read_note_text(long_text(2 * n_notes + 100), NAMES).items
    keys = [round(item.pitch_cents / 100) for item in items if isinstance(item, Note)]
    chosen = [keys[0]]
    for key in keys:
        if (key - chosen[-1]) % 12:
            chosen.append(key)
    return chosen[:n_notes]


def a_line(n_notes: int, every_s: float = 0.05) -> Plan:
    """Play a fast line, one note after the other, not quite evenly: no beat with the period of JACK."""
    chance, at_s, plan = random.Random(4), 0.2, []
    for key in keys_played(n_notes):
        plan += [(at_s, key, True), (at_s + 0.6 * every_s, key, False)]
        at_s += every_s * chance.uniform(0.8, 1.2)
    return plan


def a_flood(rate: float, for_s: float) -> Plan:
    """Play as many notes a second as no hand can."""
    plan: Plan = []
    for number, key in enumerate(keys_played(round(rate * for_s))):
        plan += [(0.2 + number / rate, key, True), (0.2 + (number + 0.5) / rate, key, False)]
    return plan


def be_player(name: str) -> None:
    """Offer a port; play the plan that comes in; write when each key went down; stay until the end."""
    import rtmidi

    out = rtmidi.MidiOut(rtmidi.API_UNIX_JACK, name=name)
    out.open_virtual_port("out")
    _say("ready")
    (haste, plan), stamps = json.loads(sys.stdin.readline()), []
    began_s = sent_s = time.monotonic()
    before_s = 0.0
    for at_s, key, down in plan:
        due_s = max(began_s + at_s, sent_s + haste * (at_s - before_s))
        time.sleep(max(0.0, due_s - time.monotonic()))
        sent_s, before_s = time.monotonic(), at_s
        if down:
            stamps.append(time.monotonic())
        out.send_message([0x90 if down else 0x80, key, 80 if down else 0])
    _say(json.dumps(stamps))
    sys.stdin.read()
    out.close_port()
    out.delete()


class Player:
    """A keyboard in a process of its own."""

    def __init__(self, name: str, environment: Mapping[str, str]) -> None:
        self._process = _helper("player", name, environment=environment)
        assert self._process.stdout is not None
        assert self._process.stdout.readline().strip() == "ready"

    def play(self, plan: Plan, haste: float) -> list[float]:
        """Play it to its end; give when each key went down. ``haste``: how short a gap may become."""
        assert self._process.stdin is not None
        assert self._process.stdout is not None
        self._process.stdin.write(json.dumps([haste, plan]) + "\n")
        self._process.stdin.flush()
        stuck = threading.Timer(plan[-1][0] + DEADLINE_S, self._process.kill)  # JACK takes no more
        stuck.start()
        try:
            return list(json.loads(self._process.stdout.readline()))
        finally:
            stuck.cancel()

    def close(self) -> None:
        """Take the port away."""
        try:
            self._process.communicate(timeout=DEADLINE_S)
        finally:
            self._process.kill()


# --- who listens -------------------------------------------------------------------------------


def be_bare_loop(name: str, n_notes: str) -> None:
    """Poll the port as the coach does, and do nothing but stamp the notes."""
    import rtmidi

    from melodycoach.coach import TURN_S

    port, stamps = rtmidi.MidiIn(rtmidi.API_UNIX_JACK, name="bare", queue_size_limit=8192), []
    port.open_port(next(at for at, there in enumerate(port.get_ports()) if name in there), name="in")
    _say("ready")
    last_s = time.monotonic()
    while len(stamps) < int(n_notes) and time.monotonic() - last_s < DEADLINE_S:
        while (found := port.get_message()) is not None:
            if found[0][0] == 0x90:
                stamps.append(time.monotonic())
                last_s = stamps[-1]
        time.sleep(TURN_S)
    port.close_port()
    port.delete()
    _say(json.dumps(stamps))


def be_screen(name: str, folder: str) -> None:
    """Run a session in full screen as the program does, and stamp what the coach takes and publishes."""
    from melodycoach import app
    from melodycoach.core.event import NoteOn

    taken: list[float] = []
    published: list[tuple[float, int]] = []

    class StampingCoach(app.Coach):
        def take(self, event: Any) -> None:
            if isinstance(event, NoteOn):
                taken.append(time.monotonic())
            super().take(event)

        def _publish(self, now_s: float) -> bool:
            is_new = super()._publish(now_s)
            if is_new:
                published.append((time.monotonic(), self.view.n_notes))
                if self.view.status.input_line.startswith("listening to"):
                    Path(folder, "ready").touch()
            return is_new

    app.Coach = StampingCoach  # type: ignore[misc]
    app.listen(app.Settings(port=name), full_screen=True, say=_say)
    Path(folder, "stamps").write_text(json.dumps({"taken": taken, "published": published}))


class Terminal:
    """Something that a program takes for a terminal; what it writes is taken in and thrown away."""

    def __init__(self, command: list[str], environment: Mapping[str, str], home: Path) -> None:
        self._end, inner = pty.openpty()
        fcntl.ioctl(inner, termios.TIOCSWINSZ, struct.pack("HHHH", ROWS, COLUMNS, 0, 0))
        self.n_written = 0
        self._waits_for, self._found = b"nothing heard yet", threading.Event()
        self.process = subprocess.Popen(
            command,
            stdin=inner,
            stdout=inner,
            stderr=inner,
            start_new_session=True,
            env={
                **environment,
                "TERM": "xterm-256color",
                "LANG": "C.UTF-8",
                "HOME": str(home),
                "XDG_DATA_HOME": str(home / "data"),
                "XDG_CONFIG_HOME": str(home / "config"),
            },
        )
        os.close(inner)
        self._reader = threading.Thread(target=self._read, daemon=True)
        self._reader.start()

    def _read(self) -> None:
        kept = b""
        with contextlib.suppress(OSError):  # the program has closed its side
            while new := os.read(self._end, 65536):
                self.n_written += len(new)
                if not self._found.is_set():
                    kept += new
                    if self._waits_for in kept:
                        self._found.set()

    def wait_for_frame(self) -> None:
        """Return as soon as the first frame has been written."""
        assert self._found.wait(DEADLINE_S), "no first frame"

    def close(self) -> int:
        """Ask the program to end, and give its exit code."""
        self.process.terminate()
        try:
            return self.process.wait(DEADLINE_S)
        finally:
            if self.process.poll() is None:
                self.process.kill()
                self.process.wait()
            self._reader.join(DEADLINE_S)
            os.close(self._end)


# --- latency and floods ------------------------------------------------------------------------


@dataclass(frozen=True)
class Heard:
    """What became of a plan: when its notes were sent, taken and published, and what the log holds.

    ``sent``, ``taken``: seconds, one for each note. ``published``: seconds and notes in the line of each
    view. ``logged``: the keys that the log says went down, in order.
    """

    sent: list[float]
    taken: list[float]
    published: list[tuple[float, int]]
    logged: list[int]
    n_written: int

    def latencies_ms(self) -> list[float]:
        """Give, for each note, how long it took until a view held it; infinite if none did."""
        found, views = [], iter(self.published)
        at_s, n_notes = next(views)
        for number, sent_s in enumerate(self.sent, start=1):
            while n_notes < number:
                at_s, n_notes = next(views, (float("inf"), number))
            found.append(1000 * (at_s - sent_s))
        return found

    def most_behind_ms(self) -> float:
        """How long at most a note waited until the coach took it."""
        return 1000 * max(taken - sent for sent, taken in zip(self.sent, self.taken, strict=True))


def heard_on_screen(plan: Plan, environment: Mapping[str, str], haste: float = 0.0) -> Heard:
    """Play a plan to the whole program, in full screen, with its log."""
    from melodycoach.core.event import NoteOn
    from melodycoach.sources.event_log import read_event_log

    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        player = Player("bench keys", environment)
        command = [sys.executable, __file__, "screen", "bench keys", name]
        terminal = Terminal(command, environment, folder)
        try:
            _wait_until((folder / "ready").exists)
            sent = player.play(plan, haste)
            (log,) = (folder / "data" / "melodycoach" / "sessions").iterdir()
            _wait_until_quiet(log)
        finally:
            terminal.close()
            player.close()
        stamps = json.loads((folder / "stamps").read_text())
        events = read_event_log(log).events
    logged = [round(event.pitch_cents / 100) for event in events if isinstance(event, NoteOn)]
    return Heard(sent, stamps["taken"], stamps["published"], logged, terminal.n_written)


def heard_by_bare_loop(plan: Plan, environment: Mapping[str, str]) -> list[float]:
    """Play a plan to a bare polling loop; give how long each note took, in milliseconds."""
    player = Player("bench keys", environment)
    n_notes = sum(down for _, _, down in plan)
    loop = _helper("bare", "bench keys", str(n_notes), environment=environment)
    assert loop.stdout is not None
    assert loop.stdout.readline().strip() == "ready"
    sent = player.play(plan, HASTE)
    try:
        found = json.loads(loop.communicate(timeout=2 * DEADLINE_S)[0])
    finally:
        loop.kill()
        player.close()
    return [1000 * (at_s - sent_s) for sent_s, at_s in zip(sent, found, strict=True)]


@dataclass(frozen=True)
class Latency:
    """Milliseconds from a note's entering JACK to the view that holds it, and to a bare polling loop."""

    median_ms: float
    p99_ms: float
    worst_ms: float
    bare_median_ms: float
    bare_p99_ms: float

    @property
    def share_p99_ms(self) -> float:
        """What the coach itself adds, at the 99th percentile."""
        return self.p99_ms - self.bare_p99_ms


def measured_latency(n_notes: int, environment: Mapping[str, str]) -> Latency:
    """Play a line to the program, and the same line to a bare polling loop."""
    plan = a_line(n_notes)
    heard = heard_on_screen(plan, environment, HASTE)
    assert len(heard.sent) == len(heard.logged) == heard.published[-1][1] == n_notes
    ours, bare = heard.latencies_ms(), heard_by_bare_loop(plan, environment)
    return Latency(statistics.median(ours), _p99(ours), max(ours), statistics.median(bare), _p99(bare))


def _p99(values: list[float]) -> float:
    return sorted(values)[max(0, -(-99 * len(values) // 100) - 1)]


# --- the cost of a note ------------------------------------------------------------------------


@functools.cache
def _pack() -> ModePack:
    from melodycoach.sources.pack_file import load_pack

    return load_pack("makam")


def _model(reading: PitchReading) -> Any:
    from melodycoach.core.model import build_model

    pack = _pack()
    return build_model(pack, pack.modes, reading)


def advance_us(reading: PitchReading, kind: InputKind, n_behind: int = NOTES_BEHIND, n: int = 200) -> float:
    """Give the median cost of scoring one note, in microseconds, with so many scored before it."""
    from book_lines import BY_THE_BOOK, by_the_book

    from melodycoach.core.scorer import advance, start

    model = _model(reading)
    assert model.n_modes == 62
    part = [by_the_book(model, slug, 100, kind) for slug in BY_THE_BOOK]
    line = [heard for heard_once in part for heard in heard_once]
    state = start(model)
    for at in range(n_behind):
        state = advance(model, state, line[at % len(line)])
    times = []
    for at in range(n):
        began_s = time.perf_counter()
        state = advance(model, state, line[at % len(line)])
        times.append(time.perf_counter() - began_s)
    return 1e6 * statistics.median(times)


def apply_us(reading: PitchReading, n_behind: int = NOTES_BEHIND, n: int = 200) -> tuple[float, float, float]:
    """Give the median cost of a key down and of a key up in a session, and the worst key down: microseconds.

    The notes behind it were played, so the line has let its beginning go as it does with a player. The
    worst is such a moment: notes are played until there has been one.
    """
    from melodycoach.core.event import NoteOff, NoteOn
    from melodycoach.core.note import InputKind
    from melodycoach.core.session import LONGEST_LINE, apply, begin, replay

    keys = keys_played(n_behind + LONGEST_LINE)
    events = [
        event
        for at, key in enumerate(keys)
        for event in (NoteOn(0.4 * at, key, 100.0 * key, InputKind.KEYS), NoteOff(0.4 * at + 0.35, key))
    ]
    session = replay(begin(_pack(), reading=reading), events[: 2 * n_behind])
    downs, ups = [], []
    cut = False
    for down, up in zip(events[2 * n_behind :: 2], events[2 * n_behind + 1 :: 2], strict=True):
        n_items, began_s = len(session.line.items), time.perf_counter()
        session = apply(session, down)
        middle_s = time.perf_counter()
        session = apply(session, up)
        downs.append(middle_s - began_s)
        ups.append(time.perf_counter() - middle_s)
        cut = cut or len(session.line.items) < n_items
        if cut and len(downs) >= n:
            break
    assert cut
    return 1e6 * statistics.median(downs), 1e6 * statistics.median(ups), 1e6 * max(downs)


def typed_us(reading: PitchReading, n_behind: int = NOTES_BEHIND, n: int = 50) -> float:
    """Give the median cost, in microseconds, of a note that is typed behind a typed line of so many."""
    from melodycoach.core.event import LineEdited
    from melodycoach.core.session import apply, begin

    items = _typed_items(n_behind + n)
    session = apply(begin(_pack(), reading=reading), LineEdited(0.0, 0, 0, items[:n_behind]))
    times = []
    for at in range(n_behind, n_behind + n):
        began_s = time.perf_counter()
        session = apply(session, LineEdited(0.0, at, at, items[at : at + 1]))
        times.append(time.perf_counter() - began_s)
    assert len(session.line.items) == n_behind + n
    return 1e6 * statistics.median(times)


def _typed_items(n_notes: int) -> tuple[Any, ...]:
    from bench.reading import NAMES, long_text

    from melodycoach.core.note import Note
    from melodycoach.sources.note_text import read_note_text

    return tuple(item for item in read_note_text(long_text(n_notes), NAMES).items if isinstance(item, Note))


def edit_ms(played: bool, n_notes: int = EDITED_NOTES, tries: int = 5) -> float:
    """Change the first note of a line, as the screen does; give the median until the new view, in ms."""
    from dataclasses import replace

    from melodycoach.coach import Coach
    from melodycoach.core.event import LineEdited
    from melodycoach.core.note import InputKind
    from melodycoach.core.session import begin
    from melodycoach.players import Keyboard
    from melodycoach.screen.command import ReplaceText

    items = _typed_items(n_notes)
    if played:
        items = tuple(
            replace(note, pitch_cents=float(round(note.pitch_cents, -2)), kind=InputKind.KEYS)
            for note in items
        )
    coach = Coach(begin(_pack()), Keyboard(time.monotonic, system=_NoPorts()), time.monotonic)
    coach.take(LineEdited(0.0, 0, 0, items))
    coach.turn()
    times = []
    for number in range(tries):
        before = coach.view
        coach.send(ReplaceText(0, 1, ("C5", "D5")[number % 2], number + 1))
        began_s = time.perf_counter()
        coach.turn()
        times.append(time.perf_counter() - began_s)
        assert coach.view.tokens[0] != before.tokens[0]
        assert coach.view.n_notes == n_notes
    coach.close()
    return 1000 * statistics.median(times)


# --- soak --------------------------------------------------------------------------------------


class _NoPorts:
    """A machine with no ports."""

    def problem(self) -> str:
        return ""

    def inputs(self) -> tuple[PortName, ...]:
        return ()

    def open(self, port: PortName) -> Any:
        raise AssertionError(port)

    def close(self) -> None:
        pass


class _Endless(_NoPorts):
    """A machine with one port, on which a line is played for ever, a batch at a time, and its clock."""

    def __init__(self) -> None:
        self.now_s = 0.0
        self._keys = keys_played(5_000)
        self._played = 0
        self._waiting: Iterator[tuple[bytes, float]] = iter(())

    def __call__(self) -> float:
        return self.now_s

    def inputs(self) -> tuple[PortName, ...]:
        from melodycoach.sources.midi_system import PortName

        return (PortName("soak", "ALSA"),)

    def open(self, port: PortName) -> Any:
        return self

    def read(self) -> tuple[bytes, float] | None:
        return next(self._waiting, None)

    def play(self, n_notes: int) -> None:
        """Let so many notes have been played: short ones, resting ones, now and then a silence."""
        messages = []
        for _ in range(n_notes):
            key, place = self._keys[self._played % len(self._keys)], self._played % 13
            length_s = 0.9 if place in (4, 12) else 0.28
            rest_s = 2.8 if place == 12 else 1.2 if place == 4 else 0.02
            self._played += 1
            messages += [(bytes((0x90, key, 80)), rest_s), (bytes((0x80, key, 0)), length_s)]
            self.now_s += length_s + rest_s
        self._waiting = iter(messages)


@dataclass(frozen=True)
class Soak:
    """What so many notes did: how long they took and how long they would take a player, memory, cost."""

    n_notes: int
    took_s: float
    played_s: float
    before_mb: float
    after_first_mb: float
    after_mb: float
    first_us: float
    last_us: float
    log_mb: float

    @property
    def grown_mb(self) -> float:
        """What memory has grown by since the line had all that it ever holds."""
        return self.after_mb - self.after_first_mb

    @property
    def ratio(self) -> float:
        """Cost of a note at the end against one at the beginning."""
        return self.last_us / self.first_us


def soaked(n_notes: int, with_log: bool) -> Soak:
    """Play so many notes into a coach, in a process of its own."""
    with tempfile.TemporaryDirectory() as folder:
        command = _helper("soak-alone", str(n_notes), folder if with_log else "", environment=os.environ)
        return Soak(**json.loads(command.communicate()[0]))


def be_soak(n_notes: str, folder: str) -> None:
    """Play so many notes into a coach, a batch between two turns; write the figures.

    The cost is the time of this thread on the processor, which other work on the machine hardly
    changes; with it is a view for each batch.
    """
    from datetime import UTC, datetime

    from melodycoach.coach import Coach
    from melodycoach.core.session import begin
    from melodycoach.players import Keyboard
    from melodycoach.sources.event_json import LogHeader
    from melodycoach.sources.event_log import EventLog

    machine = _Endless()
    path = Path(folder, "soak.events.jsonl")
    log = EventLog(path, LogHeader("bench", datetime.now(UTC), _pack().id, {})) if folder else None
    coach = Coach(begin(_pack()), Keyboard(machine, system=machine), machine, log)
    coach.turn()
    before_mb, memory_mb, costs_us = _resident_mb(), [], []
    began_s = time.perf_counter()
    for _ in range(int(n_notes) // WINDOW):
        window_s = time.thread_time()
        for _ in range(WINDOW // BATCH):
            machine.play(BATCH)
            coach.turn()
        costs_us.append(1e6 * (time.thread_time() - window_s) / WINDOW)
        memory_mb.append(_resident_mb())
    took_s, ended_s = time.perf_counter() - began_s, machine.now_s
    n_heard = coach.session.taking.now_s
    assert ended_s - n_heard < 5.0, "the coach has not heard everything"
    coach.close()
    log_mb = path.stat().st_size / 1e6 if log else 0.0
    found = Soak(
        int(n_notes),
        took_s,
        ended_s,
        before_mb,
        memory_mb[0],
        max(memory_mb),
        costs_us[0],
        costs_us[-1],
        log_mb,
    )
    _say(json.dumps(vars(found)))


def _resident_mb() -> float:
    for line in Path("/proc/self/status").read_text().splitlines():
        if line.startswith("VmRSS:"):
            return int(line.split()[1]) / 1024
    raise AssertionError("no VmRSS")


# --- start -------------------------------------------------------------------------------------


def help_ms(tries: int = 5) -> float:
    """Run ``melodycoach --help``; give the median, in milliseconds, with everything read before once."""

    def run_ms() -> float:
        began_s = time.perf_counter()
        subprocess.run([sys.executable, "-m", "melodycoach", "--help"], capture_output=True, check=True)
        return 1000 * (time.perf_counter() - began_s)

    run_ms()
    return statistics.median(run_ms() for _ in range(tries))


def frame_ms(tries: int = 5) -> float:
    """Start ``melodycoach listen`` in a terminal; give the median until its first frame, in milliseconds."""

    def run_ms() -> float:
        with tempfile.TemporaryDirectory() as home:
            began_s = time.perf_counter()
            terminal = Terminal([sys.executable, "-m", "melodycoach", "listen"], os.environ, Path(home))
            terminal.wait_for_frame()
            took_ms = 1000 * (time.perf_counter() - began_s)
            terminal.close()
        return took_ms

    run_ms()
    return statistics.median(run_ms() for _ in range(tries))


# --- processes ---------------------------------------------------------------------------------


def _say(text: str) -> None:
    sys.stdout.write(text + "\n")
    sys.stdout.flush()


def _helper(*arguments: str, environment: Mapping[str, str]) -> subprocess.Popen[str]:
    """Run a part of this file in a process of its own."""
    return subprocess.Popen(
        [sys.executable, __file__, *arguments],
        stdin=subprocess.PIPE,
        stdout=subprocess.PIPE,
        env=environment,
        text=True,
    )


def _wait_until(done: Callable[[], bool]) -> None:
    deadline_s = time.monotonic() + DEADLINE_S
    while not done():
        assert time.monotonic() < deadline_s, "it did not happen in time"
        time.sleep(0.05)


def _wait_until_quiet(log: Path) -> None:
    """Wait until a log grows no more."""
    deadline_s, size, since_s = time.monotonic() + 4 * DEADLINE_S, -1, time.monotonic()
    while time.monotonic() - since_s < QUIET_S:
        assert time.monotonic() < deadline_s, "the log grows for ever"
        if log.stat().st_size != size:
            size, since_s = log.stat().st_size, time.monotonic()
        time.sleep(0.05)


PARTS = {"player": be_player, "bare": be_bare_loop, "screen": be_screen, "soak-alone": be_soak}


# --- all of it ---------------------------------------------------------------------------------


def report(name: str, found: float, bound: float | None, unit: str, note: str = "") -> str:
    """Write a figure beside its bound, and how busy the machine is.

    >>> report("edit", 151.0, 150.0, "ms").partition("  load")[0]
    'edit: 151.0 ms (bound 150 ms: MISSED)'
    """
    kept = "" if bound is None else f" (bound {bound:g} {unit}: {'kept' if found <= bound else 'MISSED'})"
    tail = f"; {note}" if note else ""
    return f"{name}: {found:.1f} {unit}{kept}{tail}  load {os.getloadavg()[0]:.1f}"


def say_latency(n_notes: int = 1_000) -> None:
    """Print how soon a note is seen."""
    with patient_jack() as environment:
        found = measured_latency(n_notes, environment)
    bare = f"bare loop {found.bare_median_ms:.2f} ms"
    _say(report(f"note to view, median of {n_notes:,}", found.median_ms, LATENCY_MEDIAN_MS, "ms", bare))
    bare = f"bare loop {found.bare_p99_ms:.2f} ms; worst {found.worst_ms:.1f} ms"
    _say(report("note to view, 99th percentile", found.p99_ms, LATENCY_P99_MS, "ms", bare))
    _say(report("the coach's own share of it", found.share_p99_ms, SHARE_P99_MS, "ms"))


def say_floods() -> None:
    """Print how many notes are lost."""
    with patient_jack() as environment:
        for rate, for_s in ((200, 60.0), (1_000, 3.0)):
            plan = a_flood(rate, for_s)
            heard = heard_on_screen(plan, environment)
            keys = [key for _, key, down in plan if down]
            lost = len(keys) - len(heard.logged)
            behind = f"{len(keys):,} sent, at most {heard.most_behind_ms() if not lost else -1:.0f} ms behind"
            order = "in order" if heard.logged == keys else "NOT the same keys"
            took_s = heard.sent[-1] - heard.sent[0]
            note = f"{behind}, {order}, really {(len(keys) - 1) / took_s:.0f}/s"
            _say(report(f"lost at {rate} notes/s for {for_s:.0f} s", lost, 0, "notes", note))


def say_costs() -> None:
    """Print what a note costs."""
    from melodycoach.core.event import PitchReading
    from melodycoach.core.note import InputKind

    for reading in (PitchReading.WRITTEN, PitchReading.ANY):
        bound = NOTE_US[reading.value]
        for kind in (InputKind.TYPED, InputKind.KEYS):
            _say(report(f"advance, {reading}, {kind}", advance_us(reading, kind), bound, "µs"))
        down_us, up_us, worst_us = apply_us(reading)
        _say(report(f"apply, {reading}, key down", down_us, bound, "µs"))
        _say(report(f"apply, {reading}, key up", up_us, bound, "µs"))
        _say(report(f"apply, {reading}, when the line lets its beginning go", worst_us / 1000, None, "ms"))
        _say(report(f"apply, {reading}, typed at the end", typed_us(reading), bound, "µs"))
    for played in (False, True):
        kind_of = "played" if played else "typed"
        _say(report(f"first of {EDITED_NOTES:,} {kind_of} notes edited", edit_ms(played), EDIT_MS, "ms"))


def say_soak(n_notes: int = 1_000_000, n_logged: int | None = None) -> None:
    """Print what very many notes do, without a log and with one."""
    for with_log, count in ((False, n_notes), (True, n_logged or n_notes)):
        found = soaked(count, with_log)
        name = f"soak of {count:,} notes {'with' if with_log else 'without'} a log"
        speed = f"{found.played_s / found.took_s:.0f} times as fast as played, in {found.took_s:.0f} s"
        grown = (
            f"{found.before_mb:.0f} before, {found.after_first_mb:.0f} after {WINDOW:,}, "
            f"{found.after_mb:.0f} MB at most; log {found.log_mb:.0f} MB; {speed}"
        )
        _say(report(f"{name}: memory grown beyond the line", found.grown_mb, SOAK_MB, "MB", grown))
        cost = (
            f"{found.ratio:.3f}: a note costs {found.first_us:.0f} µs at first, {found.last_us:.0f} at last"
        )
        _say(report(f"{name}: last to first", found.ratio, SOAK_RATIO, "times", cost))


def say_start() -> None:
    """Print how soon the program is up."""
    _say(report("melodycoach --help, median of five", help_ms(), HELP_MS, "ms"))
    _say(report("first frame of listen, median of five", frame_ms(), FRAME_MS, "ms"))


@contextlib.contextmanager
def patient_jack() -> Iterator[Mapping[str, str]]:
    """Run a JACK server of our own; give what a process needs to meet it.

    It waits for its clients (``-S``). One that does not wait throws away what it had for a client that
    was not run in time, and on a busy machine without real-time rights that happens to any client.
    """
    name = f"melodycoach-bench-{os.getpid()}-{time.monotonic_ns()}"
    environment = {**os.environ, "JACK_DEFAULT_SERVER": name, "JACK_NO_START_SERVER": "1"}
    command = ["jackd", "-n", name, "-r", "-S", "-t", "5000", "-d", "dummy", "-r", "48000", "-p", "256"]
    client = [sys.executable, "-c", "import rtmidi; rtmidi.MidiIn(rtmidi.API_UNIX_JACK).delete()"]
    server = subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
    try:
        _wait_until(
            lambda: not subprocess.run(client, env=environment, capture_output=True, check=False).returncode
        )
        yield environment
    finally:
        server.terminate()
        server.wait(DEADLINE_S)
        for left in Path("/dev/shm").glob(f"jack*_{name}_*"):
            left.unlink(missing_ok=True)


CHAPTERS = {
    "start": say_start,
    "latency": say_latency,
    "floods": say_floods,
    "costs": say_costs,
    "soak": say_soak,
}


def main(arguments: list[str]) -> None:
    """Measure everything, or a chapter, and print it."""
    if arguments and arguments[0] in PARTS:
        PARTS[arguments[0]](*arguments[1:])
        return
    for chapter in arguments or CHAPTERS:
        CHAPTERS[chapter]()


if __name__ == "__main__":
    main(sys.argv[1:])
