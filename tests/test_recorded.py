"""Sessions as logs: whatever ended a session, its line is there again, to the last note."""

from __future__ import annotations

import os
import resource
import shutil
import signal
import subprocess
import sys
from datetime import datetime
from typing import TYPE_CHECKING

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from melodycoach.core.event import (
    Event,
    FreshStart,
    LineEdited,
    ModesRestricted,
    NoteOff,
    NoteOn,
    PitchMoved,
    PitchReading,
    ReadingChosen,
    Redone,
    TargetChosen,
    TimePassed,
    Undone,
)
from melodycoach.core.line_rules import LineRules
from melodycoach.core.note import InputKind, Mark, Note
from melodycoach.core.session import SessionState, apply, begin
from melodycoach.errors import EventLogError, StorageError
from melodycoach.folders import session_log_dir
from melodycoach.recorded import cut_short, open_log, resume
from melodycoach.sources.event_json import LogHeader
from melodycoach.sources.event_log import EventLog, logs_in, read_event_log
from melodycoach.sources.pack_file import load_pack

if TYPE_CHECKING:
    from collections.abc import Callable
    from pathlib import Path

    from conftest import Keyboard
    from pseudo_terminal import PseudoTerminal

KEYS = InputKind.KEYS
PACK = load_pack("makam")
ONLY = ("makam/rast", "makam/huseyni", "makam/hicaz")
DEADLINE_S = 20.0
TYPED = Note(6900.0, 0.0, 0.8, InputKind.TYPED, beats=1.0)
PLAYED: tuple[Event, ...] = (
    NoteOn(0.5, 69, 6900.0, KEYS),
    NoteOff(0.75, 69),
    NoteOn(1.0, 71, 7100.0, KEYS),
    NoteOn(1.5, 72, 7200.0, KEYS),
)


@pytest.fixture(autouse=True)
def home(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Give a home that is empty."""
    for name in ("XDG_DATA_HOME", "XDG_CONFIG_HOME"):
        monkeypatch.setenv(name, str(tmp_path / name))


def logged(name: str, *events: Event, session: SessionState | None = None) -> Path:
    """Write a log under a name of its own."""
    log = open_log(session or begin(PACK, ONLY), "makam")
    log.append_all(events)
    log.close()
    return log.path.rename(log.path.with_name(f"{name}.events.jsonl"))


def played(*events: Event, session: SessionState | None = None) -> SessionState:
    session = session or begin(PACK, ONLY)
    for event in events:
        session = apply(session, event)
    return session


EVENTS = st.lists(
    st.sampled_from(
        [
            *(NoteOn(0.0, voice, 100.0 * voice, KEYS) for voice in (57, 69, 71)),
            *(NoteOff(0.0, voice) for voice in (57, 69, 71)),
            PitchMoved(0.0, 69, 6877.0, InputKind.TUNED),
            LineEdited(0.0, 0, 0, (TYPED, Mark.BREATH)),
            LineEdited(0.0, 0, 1, ()),
            Undone(0.0),
            Redone(0.0),
            FreshStart(0.0),
            TargetChosen(0.0, "makam/hicaz"),
            ReadingChosen(0.0, PitchReading.FINAL, 6900.0),
            ModesRestricted(0.0, ("makam/rast", "makam/saba")),
        ]
    ),
    max_size=15,
)


@given(EVENTS, st.sampled_from([None, LineRules(split_key=60)]))
@settings(max_examples=40, suppress_health_check=[HealthCheck.function_scoped_fixture])
def test_a_resumed_session_is_the_one_that_was_left_with_no_key_down(
    events: list[Event], rules: LineRules | None
) -> None:
    shutil.rmtree(session_log_dir(), ignore_errors=True)
    timed = [type(event)(0.3 * n, *_fields(event)) for n, event in enumerate(events)]  # type: ignore[arg-type]
    beginning = begin(PACK, ONLY, target="makam/rast", rules=rules)
    left = played(*timed, session=beginning)
    resumed = resume(logged("left", *timed, session=beginning))
    session = resumed.session
    kept = left if left.sounding is None else apply(left, NoteOff(left.now_s, left.sounding))
    assert session.line.items == kept.line.items
    assert (session.past, session.future, session.only) == (kept.past, kept.future, left.only)
    assert (session.target, session.reading, session.final_cents) == (
        left.target,
        left.reading,
        left.final_cents,
    )
    assert session.taking.rules == beginning.taking.rules
    assert (session.taking.keys, session.sounding) == ((), None)
    again = resume(_closed(resumed.open_log())).session
    assert again.line.items == session.line.items


def _fields(event: Event) -> tuple[object, ...]:
    return tuple(getattr(event, name) for name in list(event.__slots__)[1:])


def _closed(log: EventLog) -> Path:
    log.close()
    return log.path


def test_the_newest_session_with_notes_in_it_goes_on_in_a_log_of_its_own() -> None:
    logged("2026-05-01-180000", *PLAYED[:1])
    left = logged("2026-05-01-180409", *PLAYED)
    logged("2026-05-02-090000", TargetChosen(1.0, "makam/rast"), TimePassed(2.0))
    before = left.read_bytes()
    resumed = resume()
    name = left.name
    started = read_event_log(left).header.started
    assert (
        resumed.says == f"the session of {started:%Y-%m-%d, %H:%M} goes on, with 3 notes in its line ({name})"
    )
    assert resumed.session.now_s == 1.5
    log = resumed.open_log()
    log.append(TimePassed(2.0))
    log.close()
    recorded = read_event_log(log.path)
    assert recorded.events == (*PLAYED, NoteOff(1.5, 69 + 2), NoteOff(1.5, 72), TimePassed(2.0))
    assert recorded.header == read_event_log(left).header
    assert left.read_bytes() == before


def test_the_session_that_was_begun_last_in_one_second_is_the_newest() -> None:
    names = ["2026-05-01-180409", "2026-05-01-180409-2", "2026-05-01-180409-10", "2026-05-01-180410"]
    for name in names:
        logged(name, *PLAYED)
    found = [path.name.removesuffix(".events.jsonl") for path in logs_in(session_log_dir())]
    assert found == names[::-1]


def test_with_nothing_to_resume_that_is_said() -> None:
    with pytest.raises(StorageError) as error:
        resume()
    assert str(error.value) == (
        f"{session_log_dir()}: found no log of a session with notes in it, expected one to resume; "
        "name a log, or begin with melodycoach listen"
    )


def test_a_log_that_is_not_there_is_named(tmp_path: Path) -> None:
    with pytest.raises(StorageError, match="no such file or directory, expected an event log"):
        resume(tmp_path / "gone.events.jsonl")


def test_a_last_line_that_was_cut_is_said_and_what_is_before_it_is_back() -> None:
    path = logged("left", *PLAYED)
    path.write_bytes(path.read_bytes()[:-10])
    resumed = resume(path)
    assert len(resumed.session.line.heard) == 2
    assert resumed.says.endswith("; the last line of that log was cut short and is left out")


def test_a_session_that_is_running_is_not_resumed_and_not_taken_for_one_cut_short() -> None:
    older = logged("2026-05-01-180409", *PLAYED, TimePassed(2.0))
    log = open_log(begin(PACK, ONLY), "makam")
    log.append_all(PLAYED)
    with pytest.raises(StorageError) as error:
        resume(log.path)
    assert str(error.value) == f"{log.path}: a session that is running writes it; end that one first"
    assert older.name in resume().says
    assert cut_short() == ""
    log.close()
    assert log.path.name in resume().says
    assert cut_short() != ""


def test_a_session_that_was_cut_short_is_spoken_of_once() -> None:
    assert cut_short() == ""
    path = logged("2026-05-01-180409", *PLAYED)
    started = read_event_log(path).header.started
    assert cut_short() == (
        f"the session of {started:%Y-%m-%d, %H:%M} was cut short; melodycoach listen --resume goes on with it"
    )
    logged("2026-05-01-190000")  # the session in which it was said
    assert cut_short() == ""
    assert path.name in resume().says


@pytest.mark.parametrize("end", [[TimePassed(2.0)], []])
def test_a_session_that_ended_in_good_order_or_without_a_note_is_not_spoken_of(end: list[Event]) -> None:
    logged("2026-05-01-180409", *(PLAYED if end else ()), *end)
    assert cut_short() == ""


def test_a_log_that_cannot_be_read_is_not_spoken_of_at_the_start() -> None:
    path = logged("2026-05-01-180409", *PLAYED)
    path.write_text("no log, but 'note-on' stands in it: \"note-on\"\n", encoding="utf-8")
    assert cut_short() == ""
    with pytest.raises(EventLogError):
        resume()


def test_a_session_with_a_pack_that_has_moved_is_resumed_with_the_pack_that_is_named(tmp_path: Path) -> None:
    header = LogHeader("0", datetime(2026, 5, 1), "makam", {"pack": str(tmp_path / "gone.toml")})
    path = tmp_path / "left.events.jsonl"
    with EventLog(path, header) as log:
        log.append_all(PLAYED)
    moved = tmp_path / "here.toml"
    from melodycoach.sources.pack_file import SHIPPED

    shutil.copy(SHIPPED / "makam.toml", moved)
    resumed = resume(path, str(moved))
    assert resumed.header.settings["pack"] == str(moved)
    assert len(resumed.session.line.heard) == 3


# --- kill -9, full disks -----------------------------------------------------------------------


class Program:
    """The program, line by line, with typed notes."""

    def __init__(self, *arguments: str, limit: Callable[[], None] | None = None) -> None:
        self.process = subprocess.Popen(
            [sys.executable, "-m", "melodycoach", "listen", "--plain", *arguments],
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            stderr=subprocess.STDOUT,
            text=True,
            encoding="utf-8",
            preexec_fn=limit,
        )
        self.said: list[str] = []

    def type(self, text: str, until: str) -> None:
        """Type, and wait for a line that begins so."""
        assert self.process.stdin is not None
        self.process.stdin.write(f"{text}\n")
        self.process.stdin.flush()
        self.wait_for(until)

    def wait_for(self, beginning: str) -> None:
        """Wait for a line that begins so."""
        assert self.process.stdout is not None
        while not (line := self.process.stdout.readline()).startswith(beginning):
            assert line, f"it ended, having said {self.said}"
            self.said.append(line.rstrip())
        self.said.append(line.rstrip())

    def kill(self) -> None:
        """End it as no program can prevent, in the middle of what it does."""
        self.process.send_signal(signal.SIGKILL)
        self.process.communicate(timeout=DEADLINE_S)

    def end(self) -> list[str]:
        """Let it end by itself; give everything that it said."""
        said, _ = self.process.communicate(timeout=DEADLINE_S)
        return [*self.said, *said.splitlines()]


@pytest.mark.slow
@pytest.mark.skipif(sys.platform == "win32", reason="there is no kill -9")
def test_after_kill_9_the_line_is_resumed_to_the_last_note_and_goes_on() -> None:
    program = Program("--only", "hicaz,rast", "--target", "rast")
    program.type("D5 C#5 Bb4+1", until="3 ")
    program.kill()
    [left] = logs_in(session_log_dir())
    again = Program("--resume")
    again.type("A4 .", until="4 ")
    assert again.process.stdin is not None
    said = again.end()
    assert f"with 3 notes in its line ({left.name})" in "".join(said)
    assert "leaning to Hicaz" in said[-1]
    newest, _ = logs_in(session_log_dir())
    assert len(resume(newest).session.line.heard) == 4
    assert resume(newest).session.target is not None
    assert isinstance(read_event_log(newest).events[-1], TimePassed)


@pytest.mark.slow
@pytest.mark.skipif(sys.platform == "win32", reason="there is no kill -9")
def test_the_next_session_says_once_that_there_is_one_to_resume() -> None:
    program = Program("--only", "hicaz,rast")
    program.type("D5", until="1 ")
    program.kill()
    first, second = (Program("--only", "hicaz,rast").end() for _ in range(2))
    assert sum("was cut short; melodycoach listen --resume" in line for line in first) == 1
    assert not any("cut short" in line for line in second)


def _small_disk() -> None:
    resource.setrlimit(resource.RLIMIT_FSIZE, (900, 900))


@pytest.mark.slow
@pytest.mark.skipif(sys.platform == "win32", reason="there are no limits of that kind")
def test_when_no_more_can_be_written_that_is_said_once_and_playing_goes_on() -> None:
    program = Program("--only", "hicaz,rast", limit=_small_disk)
    for n in range(1, 9):
        program.type("D5", until=f"{n} ")
    said = program.end()
    assert sum("playing goes on, and the log is tried again" in line for line in said) == 1
    [left] = logs_in(session_log_dir())
    assert left.stat().st_size == 900
    assert 1 <= len(resume(left).session.line.heard) < 8  # what there was room for


@pytest.mark.slow
@pytest.mark.skipif(os.name != "posix", reason="the folder is named as on Unix")
def test_a_folder_that_cannot_be_written_is_said_once_and_playing_goes_on() -> None:
    folder = session_log_dir()
    folder.parent.mkdir(parents=True)
    folder.write_text("a file, no folder", encoding="utf-8")
    program = Program("--only", "hicaz,rast")
    for n in range(1, 4):
        program.type("D5", until=f"{n} ")
    said = program.end()
    assert sum("this session is not recorded, playing goes on" in line for line in said) == 1


@pytest.mark.jack
def test_after_kill_9_in_the_middle_of_playing_every_note_is_there(
    plug_in: Callable[[str], Keyboard], open_terminal: Callable[..., PseudoTerminal], tmp_path: Path
) -> None:
    keyboard = plug_in("old upright")
    terminal = open_terminal("listen", "--port", "old upright", "--target", "huseyni")
    terminal.wait_for("listening to old upright")
    keyboard.play(
        *(word for key in (76, 74, 72) for word in (f"90 {key:02X} 50", "wait 0.2", f"80 {key:02X} 00"))
    )
    keyboard.play("90 45 50")  # dügâh is still held
    terminal.wait_for("4 notes")
    terminal.send_signal(signal.SIGKILL)
    terminal.ends()
    [left] = (tmp_path / "data" / "melodycoach" / "sessions").iterdir()
    downs = [event for event in read_event_log(left).events if isinstance(event, NoteOn)]
    assert [event.voice for event in downs] == [76, 74, 72, 69]
    again = open_terminal("listen", "--resume", "--port", "old upright")
    again.wait_for("goes on, with 4 notes", "E5~ D5~ C5~ A4~", "» Hüseynî")
    keyboard.play("80 45 00", "90 47 50", "wait 0.2", "80 47 00")
    again.wait_for("5 notes")
