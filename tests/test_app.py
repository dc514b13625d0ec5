"""The wiring: from settings to a session that runs, is logged, and ends in good order."""

from __future__ import annotations

import io
import json
import os
import signal
import subprocess
import sys
import threading
import time
from typing import TYPE_CHECKING, Any

import mido
import pytest

from melodycoach import app
from melodycoach.app import Settings, listen, ports
from melodycoach.clock import Clock
from melodycoach.core.event import LineEdited, NoteOn, TimePassed
from melodycoach.core.note import InputKind, Note
from melodycoach.demo import HAND_OVER, STAGES, DemoPlayer
from melodycoach.errors import (
    EventLogError,
    NoteTextError,
    PortError,
    StorageError,
    UnknownModeError,
    UnknownNameError,
)
from melodycoach.folders import session_log_dir
from melodycoach.line_text import Page
from melodycoach.report.ports import ports_text
from melodycoach.screen.command import ReplaceText
from melodycoach.sources.event_log import RecordedLog, read_event_log
from melodycoach.sources.midi_system import PortList, PortName
from melodycoach.sources.note_text import read_tokens
from melodycoach.sources.pack_file import SHIPPED, load_pack

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator
    from pathlib import Path

KEYS = PortName("Upright 20:0", "ALSA")
THREE = ("hicaz", "huseyni", "rast")
THREE_IDS = ["makam/rast", "makam/huseyni", "makam/hicaz"]  # in the pack's order
DEADLINE_S = 20.0
NAMES = load_pack("makam").names


class Wire:
    """An open input; what waits in it comes at once."""

    def __init__(self, waiting: list[bytes]) -> None:
        self._waiting = waiting

    def read(self) -> tuple[bytes, float] | None:
        if self._waiting and self._waiting[0] == b"":
            raise RuntimeError("the driver has gone mad")
        return (self._waiting.pop(0), 0.0) if self._waiting else None

    def close(self) -> None:
        self._waiting.clear()


class Machine:
    """The machine's MIDI: what is plugged in, and what is played as soon as it is listened to."""

    def __init__(self) -> None:
        self.list = PortList((), ())
        self.played: list[bytes] = []

    def problem(self) -> str:
        return self.list.problem

    def inputs(self) -> tuple[PortName, ...]:
        return self.list.inputs

    def open(self, port: PortName) -> Wire:
        return Wire(self.played)

    def close(self) -> None:
        pass


@pytest.fixture(autouse=True)
def machine(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Iterator[Machine]:
    """Give a machine of our own, and a home that is empty."""
    machine = Machine()
    for name in ("XDG_DATA_HOME", "XDG_CONFIG_HOME"):
        monkeypatch.setenv(name, str(tmp_path / name))
    monkeypatch.setattr("melodycoach.sources.midi_port.RtMidiSystem", lambda: machine)
    monkeypatch.setattr(app, "list_ports", lambda: machine.list)
    monkeypatch.setattr(sys, "stdin", io.StringIO())
    interval_s = sys.getswitchinterval()
    yield machine
    sys.setswitchinterval(interval_s)


@pytest.fixture
def run_plain(monkeypatch: pytest.MonkeyPatch) -> Callable[..., list[str]]:
    """Give a function that runs a session line by line and returns what was said."""

    def run(settings: Settings, typed: str = "") -> list[str]:
        said: list[str] = []
        monkeypatch.setattr(sys, "stdin", io.StringIO(typed))
        assert listen(settings, full_screen=False, say=said.append) == 0
        return said

    return run


def logs() -> list[Path]:
    folder = session_log_dir()
    return sorted(folder.iterdir()) if folder.exists() else []


def only_log() -> RecordedLog:
    [path] = logs()
    return read_event_log(path)


def notes_in(said: list[str]) -> list[str]:
    return [line for line in said if line[:1].isdigit()]


def wait_until(come: Callable[[], object]) -> None:
    deadline_s = time.monotonic() + DEADLINE_S
    while not come():
        assert time.monotonic() < deadline_s, "it did not come"
        time.sleep(0.005)


# line by line


def test_typed_lines_give_a_line_a_note_after_the_words_about_the_world(
    run_plain: Callable[..., list[str]],
) -> None:
    said = run_plain(Settings(only=THREE), "D5 C#5\nBb4+1 A4 .\n")
    assert "follow your teacher" in said[0]
    assert said[1] == "(no keyboard found; type notes, or plug one in at any time)"
    assert said[2] == f"(log: {logs()[0]})"
    assert [line.split()[0] for line in notes_in(said)] == ["1", "2", "3", "4"]
    assert said[3:] == notes_in(said)
    assert "leaning to Hicaz" in said[-1]


def test_the_log_of_a_session_is_whole_and_ends_with_the_time(run_plain: Callable[..., list[str]]) -> None:
    run_plain(Settings(only=THREE), "D5 C#5\n")
    recorded = only_log()
    assert [type(event) for event in recorded.events] == [LineEdited, LineEdited, TimePassed]
    assert recorded.notice == ""


@pytest.mark.parametrize(
    ("settings", "kept"),
    [
        (Settings(), {"only": [], "reading": "written", "final_cents": None, "target": None}),
        (Settings(any_pitch=True, only=THREE), {"only": THREE_IDS, "reading": "any", "final_cents": None}),
        (
            Settings(final="A4", target="HİCAZ"),
            {"reading": "final", "final_cents": 6900.0, "target": "makam/hicaz"},
        ),
        (Settings(final="written"), {"reading": "written", "final_cents": None}),
    ],
)
def test_the_header_of_a_log_keeps_what_was_asked_for(
    run_plain: Callable[..., list[str]], settings: Settings, kept: dict[str, Any]
) -> None:
    run_plain(settings)
    header = only_log().header
    assert header.pack_id == "makam"
    assert {key: header.settings[key] for key in kept} == kept
    assert header.settings["pack"] == "makam"


def test_no_log_is_kept_when_none_is_wanted(run_plain: Callable[..., list[str]]) -> None:
    said = run_plain(Settings(only=THREE, log=False), "A4\n")
    assert not logs()
    assert not any("log" in line for line in said[1:])


def test_a_word_about_the_world_is_said_when_it_is_new(run_plain: Callable[..., list[str]]) -> None:
    said = run_plain(Settings(only=THREE, log=False), "X9\nX9\nA4\nX9\n")
    assert [line[:6] for line in said if "X9" in line] == ["('X9' "] * 2
    assert len(notes_in(said)) == 1


def test_bytes_that_are_no_text_spoil_their_word_and_not_the_rest(
    run_plain: Callable[..., list[str]], monkeypatch: pytest.MonkeyPatch
) -> None:
    said: list[str] = []
    raw = io.BytesIO(b"E5 \xff\nC5\n")
    monkeypatch.setattr(sys, "stdin", io.TextIOWrapper(raw, encoding="utf-8", errors="strict"))
    assert listen(Settings(only=THREE, log=False), full_screen=False, say=said.append) == 0
    assert any("\N{REPLACEMENT CHARACTER}" in line for line in said)
    assert len(notes_in(said)) == 2


def test_lines_are_taken_as_they_come(monkeypatch: pytest.MonkeyPatch) -> None:
    said: list[str] = []

    def fingers() -> Iterator[str]:
        yield "A4\n"
        wait_until(lambda: notes_in(said))
        yield "B4-1\n"

    monkeypatch.setattr(sys, "stdin", fingers())
    assert listen(Settings(only=THREE, log=False), full_screen=False, say=said.append) == 0
    assert len(notes_in(said)) == 2


@pytest.mark.parametrize("stdin", [None, "closed"])
def test_without_a_standard_input_the_program_ends_as_if_nothing_were_typed(
    monkeypatch: pytest.MonkeyPatch, stdin: str | None
) -> None:
    closed = io.StringIO()
    closed.close()
    monkeypatch.setattr(sys, "stdin", None if stdin is None else closed)
    said: list[str] = []
    assert listen(Settings(only=THREE, log=False), full_screen=False, say=said.append) == 0
    assert not notes_in(said)


def test_a_file_to_begin_with_is_said_note_by_note(
    run_plain: Callable[..., list[str]], tmp_path: Path
) -> None:
    path = tmp_path / "line.txt"
    path.write_text("mode: rast\nG4 A4 B4-1 .\n", encoding="utf-8")
    said = run_plain(Settings(only=THREE, open_file=path), "G4\n")
    assert notes_in(said)[-1].startswith("4 rast")
    assert any(line.startswith("1 to 3 rast") for line in said)


def test_what_the_reader_says_of_a_midi_file_is_said_line_by_line_too(
    tmp_path: Path, run_plain: Callable[..., list[str]]
) -> None:
    file, track = mido.MidiFile(), mido.MidiTrack()
    file.tracks.append(track)
    track += [mido.Message("note_on", note=67), mido.Message("note_off", note=67, time=480)]
    file.save(tmp_path / "draft.mid")
    said = run_plain(Settings(only=THREE, open_file=tmp_path / "draft.mid"), "G4\n")
    assert sum("took track 1" in line for line in said) == 1
    assert notes_in(said)[-1].startswith("2 rast")


@pytest.mark.parametrize("full_screen", [False, True])
def test_a_file_that_goes_before_it_is_opened_ends_the_session_with_a_whole_log(
    tmp_path: Path, full_screen: bool, monkeypatch: pytest.MonkeyPatch
) -> None:
    settings = Settings(only=THREE, open_file=tmp_path / "nowhere.txt")
    monkeypatch.setattr(app, "open_line", lambda *_: (Page(), ()))  # it was there a moment ago
    with pytest.raises(StorageError):
        listen(settings, full_screen=full_screen, say=print)
    assert [type(event) for event in only_log().events] == [TimePassed]


@pytest.mark.parametrize(
    ("text", "fault"),
    [(None, StorageError), ("A4 zz", NoteTextError), ("mode: nowhere\n\nA4", UnknownModeError)],
)
def test_a_file_that_cannot_be_used_is_refused_before_there_is_a_log(
    tmp_path: Path, text: str | None, fault: type[Exception]
) -> None:
    path = tmp_path / "line.txt"
    if text is not None:
        path.write_text(text, encoding="utf-8")
    said: list[str] = []
    with pytest.raises(fault):
        listen(Settings(only=THREE, open_file=path), full_screen=False, say=said.append)
    assert (said, logs()) == ([], [])


def test_the_demo_ends_by_itself_where_nobody_types(run_plain: Callable[..., list[str]]) -> None:
    said = run_plain(Settings(demo=True, fast=True, only=THREE))
    assert len(notes_in(said)) > 40
    assert HAND_OVER in said[-1]
    assert any(isinstance(event, NoteOn) for event in only_log().events)


def test_a_hurried_demo_tells_every_note_once_and_its_words_in_order(
    run_plain: Callable[..., list[str]], monkeypatch: pytest.MonkeyPatch
) -> None:
    began = Clock.__init__

    def late(clock: Clock, speed: float = 1.0) -> None:
        began(clock, speed)
        clock._began_s -= 0.07  # a slow machine: at the demo's pace, 28 s have gone when it begins

    monkeypatch.setattr(Clock, "__init__", late)
    said = run_plain(Settings(demo=True, fast=True, only=THREE, log=False))
    n_notes = sum(
        isinstance(item, Note) for stage in STAGES for item in read_tokens(stage.line, NAMES, 0.0, 60)
    )
    assert [line.split()[0] for line in notes_in(said)] == [str(number + 1) for number in range(n_notes)]
    assert not [line for line in said if line.startswith("the line now has")]
    words = [line for line in said if line.startswith("(")]
    assert [line for line in words if HAND_OVER in line] == words[-1:]


def test_what_is_typed_ahead_of_the_demo_waits_for_its_end(run_plain: Callable[..., list[str]]) -> None:
    said = run_plain(Settings(demo=True, fast=True, only=THREE, log=False), "B4\n")
    assert notes_in(said)[-1].split(";")[0].endswith("B4")


# ports


def test_a_port_that_is_not_there_is_refused_with_those_that_are(machine: Machine) -> None:
    machine.list = PortList((KEYS,), ())
    with pytest.raises(PortError) as error:
        listen(Settings(port="Upritgh"), full_screen=False, say=print)
    assert str(error.value) == (
        "no MIDI input 'Upritgh'; did you mean 'Upright 20:0'?; run melodycoach ports"
    )
    assert not logs()


def test_a_port_on_a_machine_without_midi_is_refused_with_the_reason(machine: Machine) -> None:
    machine.list = PortList((), (), "no MIDI: nothing answers")
    with pytest.raises(PortError) as error:
        listen(Settings(port="Upright"), full_screen=False, say=print)
    assert str(error.value) == "port 'Upright': no MIDI: nothing answers"


# keyboard profiles


def home_keyboard(*lines: str) -> None:
    folder = app.user_keyboard_dir()
    folder.mkdir(parents=True)
    (folder / "home.toml").write_text("\n".join(["[keyboard]", 'name = "home"', *lines]), encoding="utf-8")


def play_under_and_over_the_split(machine: Machine, said: list[str]) -> None:
    """Play A2, then A4 for a moment, and end by a signal when a note was told."""
    machine.played = [bytes((0x90, 45, 80)), bytes((0x80, 45, 0)), bytes((0x90, 69, 80))]

    def come() -> bool:
        if not machine.played:
            time.sleep(0.05)
            machine.played.append(bytes((0x80, 69, 0)))
        return bool(notes_in(said))

    end_by_signal_when(come)


def test_a_profile_is_in_force_from_the_first_note_and_said(machine: Machine) -> None:
    home_keyboard("cents = [0, 0, 0, 0, 0, 0, 0, 0, 0, -23, 0, 0]", 'split = "C4"', "transposition = -12")
    machine.list = PortList((KEYS,), ())
    said: list[str] = []
    play_under_and_over_the_split(machine, said)
    assert listen(Settings(only=THREE, keys="home"), full_screen=False, say=said.append) == 0
    tuning = (
        "(tuned by your profile 'home': A -23 c; every key moved by -12 semitones (by your profile 'home'))"
    )
    assert tuning in said[:4]
    log = only_log()
    played = [event.pitch_cents for event in log.events if isinstance(event, NoteOn)]
    assert played == [3277.0, 5677.0]  # the log keeps what is played under the split, too
    assert [line[:2] for line in notes_in(said)] == ["1 "]  # and the line does not
    assert log.header.settings["split_key"] == 48


def test_a_profile_that_is_not_there_is_refused_before_there_is_a_log() -> None:
    home_keyboard()
    with pytest.raises(UnknownNameError) as error:
        listen(Settings(keys="hoem"), full_screen=False, say=print)
    assert str(error.value).endswith("did you mean 'home'?")
    assert not logs()


def test_a_replay_leaves_out_what_was_played_under_the_split(
    run_plain: Callable[..., list[str]], machine: Machine
) -> None:
    home_keyboard('split = "C4"')
    machine.list = PortList((KEYS,), ())
    said: list[str] = []
    play_under_and_over_the_split(machine, said)
    listen(Settings(only=THREE, keys="home"), full_screen=False, say=said.append)
    [path] = logs()
    again = notes_in(run_plain(Settings(replay=path, fast=True)))
    assert [line[:9] for line in again] == ["1 dügâh A"]


def test_profiles_are_listed_with_the_ports(machine: Machine) -> None:
    home_keyboard("channel = 17")
    assert [one["name"] for one in ports()["keyboards"]] == ["home"]
    text = ports_text(ports())
    assert "Your keyboard profiles, for melodycoach listen --keys NAME:\n  home  " in text
    assert "1 fault in this keyboard profile" in text


def end_by_signal_when(come: Callable[[], object]) -> threading.Thread:
    """Send ourselves SIGTERM as soon as something has come."""

    def send() -> None:
        wait_until(come)
        os.kill(os.getpid(), signal.SIGTERM)

    thread = threading.Thread(target=send, daemon=True)
    thread.start()
    return thread


def test_an_open_keyboard_is_listened_to_until_a_signal_though_nobody_types(machine: Machine) -> None:
    machine.list = PortList((KEYS,), ())
    machine.played = [bytes((0x90, 69, 80)), bytes((0x80, 69, 0))]
    before = signal.getsignal(signal.SIGTERM)
    said: list[str] = []
    sender = end_by_signal_when(lambda: notes_in(said))
    assert listen(Settings(port="upright", only=THREE), full_screen=False, say=said.append) == 0
    sender.join()
    assert "(listening to Upright 20:0)" in said
    assert [line[:9] for line in notes_in(said)] == ["1 dügâh A"]
    first = only_log().events[0]
    assert isinstance(first, NoteOn)
    assert (first.voice, first.pitch_cents, first.kind) == (69, 6900.0, InputKind.KEYS)
    assert isinstance(only_log().events[-1], TimePassed)
    assert signal.getsignal(signal.SIGTERM) is before


def test_a_session_may_run_in_a_thread_that_gets_no_signals(run_plain: Callable[..., list[str]]) -> None:
    said: list[str] = []
    thread = threading.Thread(target=lambda: said.extend(run_plain(Settings(only=THREE, log=False), "A4\n")))
    thread.start()
    thread.join(DEADLINE_S)
    assert len(notes_in(said)) == 1


@pytest.mark.parametrize(("number", "code"), [(signal.SIGTERM, 0), (signal.SIGHUP, 0), (signal.SIGINT, 130)])
def test_a_signal_ends_the_program_in_good_order_with_the_log_whole(
    number: signal.Signals, code: int
) -> None:
    process = subprocess.Popen(
        [sys.executable, "-m", "melodycoach", "--plain", "--only", "hicaz,rast"],
        stdin=subprocess.PIPE,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        encoding="utf-8",
    )
    assert process.stdin is not None
    assert process.stdout is not None
    try:
        process.stdin.write("D5 A4\n")
        process.stdin.flush()
        while not process.stdout.readline().startswith("2 "):
            assert process.poll() is None
        process.send_signal(number)
        _, error = process.communicate(timeout=DEADLINE_S)
    finally:
        process.kill()
        process.wait()
    assert (process.returncode, error) == (code, "")
    assert [type(event) for event in only_log().events] == [LineEdited, LineEdited, TimePassed]


def test_no_ports_are_listed_with_what_to_do(machine: Machine) -> None:
    text = ports_text(ports())
    assert text.startswith("MIDI inputs:\n  none\nMIDI outputs:\n  none\n")
    assert "Plug one in and switch it on" in text
    assert ports() == {"inputs": [], "outputs": [], "problem": "", "keyboards": []}


def test_ports_are_listed_with_their_system(machine: Machine) -> None:
    machine.list = PortList((KEYS,), (PortName("Synth 30:0", "ALSA"),))
    text = ports_text(ports())
    assert text.startswith("MIDI inputs:\n  Upright 20:0  (ALSA)\nMIDI outputs:\n  Synth 30:0  (ALSA)\n")
    assert "--port NAME" in text
    assert json.loads(json.dumps(ports())) == {
        "inputs": [{"name": "Upright 20:0", "system": "ALSA"}],
        "outputs": [{"name": "Synth 30:0", "system": "ALSA"}],
        "problem": "",
        "keyboards": [],
    }


def test_a_machine_without_midi_says_why(machine: Machine) -> None:
    machine.list = PortList((), (), "no MIDI: nothing answers")
    assert ports_text(ports()).endswith("\n  none\nno MIDI: nothing answers")
    assert ports()["problem"] == "no MIDI: nothing answers"


# replay


def recorded(run_plain: Callable[..., list[str]], settings: Settings) -> tuple[Path, list[str]]:
    said = run_plain(settings, "D5 C#5 Bb4+1 A4 .\n")
    [path] = logs()
    return path, notes_in(said)


def test_a_replay_says_what_the_session_said_with_its_settings(
    run_plain: Callable[..., list[str]],
) -> None:
    path, before = recorded(run_plain, Settings(only=THREE, target="rast", any_pitch=True))
    again = run_plain(Settings(replay=path, fast=True))
    assert [line.split("; ")[:2] for line in notes_in(again)] == [line.split("; ")[:2] for line in before]
    assert f"(replay of {path.name} is done)" in again
    assert logs() == [path]  # a replay is not recorded again


def with_settings(path: Path, **changed: object) -> Path:
    """Write a log again with other settings in its header."""
    first, *rest = path.read_text(encoding="utf-8").splitlines(keepends=True)
    header = json.loads(first)
    header["settings"] = {**header["settings"], **changed}
    path.write_text(json.dumps(header) + "\n" + "".join(rest), encoding="utf-8")
    return path


@pytest.mark.parametrize(
    "changed",
    [
        {"reading": "upside down"},
        {"reading": "final"},
        {"reading": ["any"]},
        {"final_cents": 6900.0},
        {"reading": "final", "final_cents": "A4"},
        {"only": "rast"},
        {"only": [1]},
        {"target": 5},
        {"split_key": "C4"},
    ],
)
def test_damaged_settings_of_a_log_are_said_and_not_guessed(
    run_plain: Callable[..., list[str]], changed: dict[str, object]
) -> None:
    path, _ = recorded(run_plain, Settings(only=THREE))
    with pytest.raises(EventLogError) as error:
        run_plain(Settings(replay=with_settings(path, **changed)))
    assert str(error.value).startswith(f"{path}: line 1: found settings {{")


def test_a_log_with_a_mode_that_the_pack_has_lost_is_refused(run_plain: Callable[..., list[str]]) -> None:
    path, _ = recorded(run_plain, Settings(only=THREE))
    with pytest.raises(UnknownModeError):
        run_plain(Settings(replay=with_settings(path, only=["makam/no-such"])))


def test_a_log_of_an_earlier_version_has_no_pack_name_and_is_found_by_the_pack_s_id(
    run_plain: Callable[..., list[str]],
) -> None:
    path, before = recorded(run_plain, Settings(only=THREE))
    first, *rest = path.read_text(encoding="utf-8").splitlines(keepends=True)
    header = json.loads(first)
    del header["settings"]["pack"]
    path.write_text(json.dumps(header) + "\n" + "".join(rest), encoding="utf-8")
    assert len(notes_in(run_plain(Settings(replay=path, fast=True)))) == len(before)


# resuming


def test_a_resumed_session_goes_on_with_its_numbers_its_target_and_its_time(
    run_plain: Callable[..., list[str]],
) -> None:
    path, _ = recorded(run_plain, Settings(only=THREE, target="rast"))
    left = read_event_log(path)
    said = run_plain(Settings(resume=""), "D5\n")
    assert any("goes on, with 4 notes in its line" in line for line in said)
    assert [line.split()[0] for line in notes_in(said)] == ["5"]
    newest = next(log for log in logs() if log != path)
    events = read_event_log(newest).events
    assert events[: len(left.events)] == left.events
    assert [event.at_s for event in events] == sorted(event.at_s for event in events)
    assert read_event_log(newest).header.settings == left.header.settings


def test_a_resumed_session_need_not_be_recorded(run_plain: Callable[..., list[str]]) -> None:
    path, _ = recorded(run_plain, Settings(only=THREE))
    run_plain(Settings(resume=str(path), log=False), "D5\n")
    assert logs() == [path]


def test_a_session_that_was_cut_short_is_spoken_of_but_not_in_the_demo(
    run_plain: Callable[..., list[str]],
) -> None:
    path, _ = recorded(run_plain, Settings(only=THREE))
    *whole, _ended = path.read_bytes().splitlines(keepends=True)
    path.write_bytes(b"".join(whole))
    demo = run_plain(Settings(demo=True, fast=True, log=False))
    plain = run_plain(Settings(only=THREE))
    assert [sum("was cut short" in line for line in said) for said in (demo, plain)] == [0, 1]


def own_pack(folder: Path) -> Path:
    """Write a pack under a name that is not its id."""
    folder.mkdir()
    path = folder / "of-mine.toml"
    text = (SHIPPED / "makam.toml").read_text(encoding="utf-8")
    path.write_text(text.replace('id = "makam"', 'id = "mine"', 1), encoding="utf-8")
    return path


def test_a_session_with_a_pack_from_a_file_can_be_replayed_even_when_the_file_has_moved(
    run_plain: Callable[..., list[str]], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    pack = own_pack(tmp_path / "packs")
    monkeypatch.chdir(tmp_path)
    path, before = recorded(run_plain, Settings(pack="packs/of-mine.toml", only=THREE))
    assert read_event_log(path).header.pack_id == "mine"
    monkeypatch.chdir("/")
    assert len(notes_in(run_plain(Settings(replay=path, fast=True)))) == len(before) == 4
    moved = pack.rename(tmp_path / "moved.toml")
    with pytest.raises(StorageError):
        run_plain(Settings(replay=path))
    assert len(notes_in(run_plain(Settings(replay=path, pack=str(moved), fast=True)))) == 4


def test_a_log_is_not_replayed_with_another_pack(run_plain: Callable[..., list[str]], tmp_path: Path) -> None:
    pack = own_pack(tmp_path / "packs")
    path, _ = recorded(run_plain, Settings(only=THREE))
    with pytest.raises(EventLogError) as error:
        run_plain(Settings(replay=path, pack=str(pack)))
    assert str(error.value) == (
        f"{path}: recorded with pack 'makam', found 'mine'; name its file with --pack"
    )


# full screen


class Screen:
    """Stands in for the terminal: runs what a test does with the four things that a screen is given."""

    def __init__(self, act: Callable[[Screen], None]) -> None:
        self._act = act
        self.n_refreshes = 0

    def __call__(self, latest_view: Any, send: Any, subscribe: Any, choices: Any) -> None:
        self.latest_view, self.send, self.choices = latest_view, send, choices
        subscribe(self.refresh)
        self._act(self)

    def refresh(self) -> None:
        self.n_refreshes += 1


@pytest.fixture
def run_screen(monkeypatch: pytest.MonkeyPatch) -> Callable[..., Screen]:
    """Give a function that runs a session in full screen."""

    def run(settings: Settings, act: Callable[[Screen], None]) -> Screen:
        screen = Screen(act)
        monkeypatch.setattr("melodycoach.screen.terminal.run_screen", screen)
        assert listen(settings, full_screen=True, say=print) == 0
        return screen

    return run


def test_the_screen_is_asked_to_draw_what_its_commands_have_changed(
    run_screen: Callable[..., Screen],
) -> None:
    def act(screen: Screen) -> None:
        screen.send(ReplaceText(0, 0, "D5 A4", 1))
        wait_until(lambda: screen.latest_view().n_notes == 2)
        wait_until(lambda: screen.n_refreshes)

    run_screen(Settings(only=THREE), act)
    assert [type(event) for event in only_log().events] == [LineEdited, TimePassed]


def test_the_screen_offers_names_for_each_question(
    machine: Machine, run_screen: Callable[..., Screen]
) -> None:
    machine.list = PortList((KEYS,), ())
    offered: dict[str, tuple[str, ...]] = {}

    def act(screen: Screen) -> None:
        wait_until(lambda: "listening" in screen.latest_view().status.input_line)
        offered.update({kind: screen.choices(kind) for kind in ("target", "only", "final", "port", "open")})

    run_screen(Settings(only=THREE, log=False), act)
    pack = load_pack("makam")
    assert offered["target"] == offered["only"] == tuple(mode.name for mode in pack.modes)
    assert offered["final"][:2] == ("written", "any")
    assert "dügâh" in offered["final"]
    assert offered["port"] == (KEYS.name,)
    assert offered["open"] == ()


def test_a_fault_in_the_thread_of_the_coach_reaches_the_screen_and_the_log_is_whole(
    machine: Machine, run_screen: Callable[..., Screen]
) -> None:
    machine.list = PortList((KEYS,), ())
    machine.played = [bytes((0x90, 69, 80)), b""]  # the wire raises when it comes to the empty one
    seen: list[Screen] = []

    def act(screen: Screen) -> None:
        seen.append(screen)
        wait_until(lambda: screen.latest_view() is None)

    with pytest.raises(RuntimeError, match="gone mad"):
        run_screen(Settings(only=THREE), act)
    assert seen[0].n_refreshes
    assert isinstance(only_log().events[-1], TimePassed)


def test_after_a_hurried_demo_the_screen_s_clock_goes_on_in_real_time(
    run_screen: Callable[..., Screen],
) -> None:
    def act(screen: Screen) -> None:
        wait_until(lambda: HAND_OVER in screen.latest_view().status.input_line)
        time.sleep(0.1)  # 40 s at the demo's pace
        screen.send(ReplaceText(0, 0, "B4", 1))
        wait_until(lambda: screen.latest_view().handled == 1)

    run_screen(Settings(demo=True, fast=True, only=THREE), act)
    [edit] = [event for event in only_log().events if isinstance(event, LineEdited)]
    last_s = max(event.at_s for event in only_log().events if isinstance(event, NoteOn))
    assert edit.at_s > last_s
    ends_s = DemoPlayer(load_pack("makam").names).ends_s
    assert only_log().events[-1].at_s - edit.at_s < 5.0
    assert edit.at_s > ends_s
