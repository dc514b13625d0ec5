"""The event log: written as things happen, faults said once, read back after a crash."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
from datetime import datetime
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from melodycoach.core.event import Event, FreshStart, NoteOff, NoteOn, TargetChosen, TimePassed
from melodycoach.core.note import InputKind
from melodycoach.errors import EventLogError, StorageError
from melodycoach.sources import event_log
from melodycoach.sources.event_json import LogHeader
from melodycoach.sources.event_log import (
    EventLog,
    RecordedLog,
    has_line,
    is_being_written,
    log_path,
    logs_in,
    read_event_log,
)

STARTED = datetime(2026, 5, 1, 18, 4, 9)
HEADER = LogHeader("0.1.0", STARTED, "makam", {"pitch": "written", "only": ["rast", "mahur"]})
PHRASE: tuple[Event, ...] = (
    NoteOn(0.5, 69, 6900.0, InputKind.KEYS),
    NoteOff(0.75, 69),
    TargetChosen(1.0, "makam/uşşak"),
    FreshStart(1.0 / 3.0),
)
FULL = Path("/dev/full")


def write(path: Path, events: tuple[Event, ...] = PHRASE) -> None:
    with EventLog(path, HEADER) as log:
        for event in events:
            assert log.append(event) is None


def test_what_was_logged_is_read_back(tmp_path: Path) -> None:
    path = tmp_path / "new" / "folders" / "take.events.jsonl"
    write(path)
    assert read_event_log(path) == RecordedLog(HEADER, PHRASE)


def test_every_event_is_in_the_file_as_soon_as_it_was_appended(tmp_path: Path) -> None:
    path = tmp_path / "take.events.jsonl"
    with EventLog(path, HEADER) as log:
        for number, event in enumerate(PHRASE):
            log.append(event)
            assert read_event_log(path).events == PHRASE[: number + 1]


@given(st.lists(st.text(), max_size=5))
def test_any_text_comes_back(tmp_path_factory: pytest.TempPathFactory, names: list[str]) -> None:
    path = tmp_path_factory.mktemp("log") / "take.events.jsonl"
    events = tuple(TargetChosen(0.0, name) for name in [*names, "\ud800", "\u2028\u0085"])
    write(path, events)
    assert read_event_log(path).events == events


def test_a_file_that_holds_something_is_left_alone(tmp_path: Path) -> None:
    path = tmp_path / "take.events.jsonl"
    path.write_text("my notes", encoding="utf-8")
    with EventLog(path, HEADER) as log:
        assert log.fault == (
            f"{path}: the file already holds something; this session is not recorded, playing goes on"
        )
        assert log.append(PHRASE[0]) is None
    assert path.read_text(encoding="utf-8") == "my notes"


def test_a_folder_that_cannot_be_made_is_said_from_the_start(tmp_path: Path) -> None:
    (tmp_path / "logs").write_text("a file, no folder", encoding="utf-8")
    path = tmp_path / "logs" / "take.events.jsonl"
    log = EventLog(path, HEADER)
    assert log.fault == f"{path}: file exists; this session is not recorded, playing goes on"
    assert [log.append(event) for event in PHRASE] == [None] * 4
    assert log.close() is None


@pytest.mark.skipif(not FULL.exists(), reason="this system has no /dev/full")
def test_a_full_disk_is_said_once_and_counted_at_the_end() -> None:
    log = EventLog(FULL, HEADER)
    # the header is what meets the full disk first
    assert log.fault == "/dev/full: no space left on device; playing goes on, and the log is tried again"
    assert [log.append(event) for event in PHRASE] == [None] * 4
    assert log.close() == "/dev/full: the last 5 lines could not be written"
    assert log.close() is None


class Disk:
    """A file on a disk that has room for so many bytes."""

    def __init__(self, room: int) -> None:
        self.room = room
        self.content = b""
        self.closed = False

    def write(self, data: bytes) -> int:
        if not self.room:
            raise OSError(28, "No space left on device")
        taken = data[: self.room]
        self.content += bytes(taken)
        self.room -= len(taken)
        return len(taken)

    def close(self) -> None:
        self.closed = True


def on_disk(tmp_path: Path, room: int) -> tuple[EventLog, Disk]:
    log = EventLog(tmp_path / "take.events.jsonl", HEADER)
    disk = Disk(room)
    assert log._file is not None
    log._file.close()
    log._file = disk  # type: ignore[assignment]
    return log, disk


@given(room=st.integers(0, 300), later=st.integers(0, 300))
@settings(suppress_health_check=[HealthCheck.function_scoped_fixture])
def test_a_disk_that_has_room_again_gets_every_byte_in_order(
    tmp_path_factory: pytest.TempPathFactory, room: int, later: int
) -> None:
    folder = tmp_path_factory.mktemp("log")
    reference = folder / "reference.events.jsonl"
    write(reference)
    whole = reference.read_bytes().partition(b"\n")[2]
    log, disk = on_disk(folder, room)
    said = [log.append(event) for event in PHRASE[:2]]
    disk.room += later
    said.append(log.append(PHRASE[2]))
    disk.room = 10_000
    said.append(log.append(PHRASE[3]))
    assert disk.content == whole
    assert log.close() is None
    assert sum(text is not None for text in said) <= 1
    assert (log.fault is None) == (said == [None] * 4)


def test_the_fault_is_returned_by_the_event_that_met_it(tmp_path: Path) -> None:
    log, _ = on_disk(tmp_path, 100)
    said = [log.append(event) for event in PHRASE]
    fault = f"{log.path}: no space left on device; playing goes on, and the log is tried again"
    assert said == [None, fault, None, None]


def test_a_disk_that_stays_full_does_not_eat_the_memory(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(event_log, "WAITING_LIMIT_BYTES", 1000)
    log, disk = on_disk(tmp_path, 0)
    for number in range(100):
        log.append(TimePassed(float(number)))
    assert disk.closed
    assert not log._waiting
    assert log.fault is not None


def test_a_device_that_takes_nothing_is_not_waited_for(tmp_path: Path) -> None:
    log, disk = on_disk(tmp_path, 0)
    disk.write = lambda _: 0  # type: ignore[method-assign, assignment]
    assert log.append(PHRASE[0]) is None
    assert log.close() == f"{log.path}: the last 1 lines could not be written"


def test_an_event_that_cannot_be_written_is_said_and_the_rest_goes_on(tmp_path: Path) -> None:
    path = tmp_path / "take.events.jsonl"
    with EventLog(path, HEADER) as log:
        fault = log.append(FreshStart(float("nan")))
        assert fault is not None
        assert fault.removesuffix(": nan") == (  # as Python 3.12 and later add
            f"{path}: event FreshStart(at_s=nan) cannot be written: "
            "Out of range float values are not JSON compliant"
        )
        assert log.append(PHRASE[0]) is None
    assert read_event_log(path).events == PHRASE[:1]


def test_of_several_events_those_that_can_be_written_are(tmp_path: Path) -> None:
    path = tmp_path / "take.events.jsonl"
    with EventLog(path, HEADER) as log:
        fault = log.append_all((PHRASE[0], FreshStart(float("inf")), PHRASE[1]))
        assert fault is not None
        assert "event FreshStart(at_s=inf) cannot be written" in fault
    assert read_event_log(path).events == PHRASE[:2]


def test_a_folder_that_is_not_there_has_no_logs_and_other_files_are_none(tmp_path: Path) -> None:
    assert logs_in(tmp_path / "nowhere") == ()
    (tmp_path / "notes.txt").write_text("A4", encoding="utf-8")
    assert logs_in(tmp_path) == ()


def test_a_log_has_a_line_once_something_was_played_or_typed(tmp_path: Path) -> None:
    path = tmp_path / "take.events.jsonl"
    assert not has_line(path)
    write(path, PHRASE[1:])
    assert not has_line(path)
    path.unlink()
    write(path, PHRASE)
    assert has_line(path)


@pytest.mark.skipif(sys.platform == "win32", reason="no such locks there")
def test_a_log_is_being_written_until_it_is_closed(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    import fcntl

    path = tmp_path / "take.events.jsonl"
    assert not is_being_written(path)
    with EventLog(path, HEADER):
        assert is_being_written(path)
        monkeypatch.setattr(fcntl, "flock", no_locks)
        assert not is_being_written(path)  # nothing is known: it counts as free
        monkeypatch.undo()
    assert not is_being_written(path)


def no_locks(*_: object) -> None:
    raise OSError(95, "Operation not supported")


@pytest.mark.skipif(sys.platform == "win32", reason="no such locks there")
def test_a_disk_without_locks_gets_its_log_all_the_same(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("fcntl.flock", no_locks)
    path = tmp_path / "take.events.jsonl"
    write(path)
    assert read_event_log(path).events == PHRASE


def test_a_last_line_cut_short_is_left_out_and_said_at_every_place(tmp_path: Path) -> None:
    path = tmp_path / "take.events.jsonl"
    write(path)
    raw = path.read_bytes()
    header_end = raw.index(b"\n") + 1
    for cut in range(header_end, len(raw)):
        path.write_bytes(raw[:cut])
        n_whole = raw[:cut].count(b"\n") - 1
        log = read_event_log(path)
        if raw[cut - 1 : cut] == b"\n":
            assert (log.events, log.notice) == (PHRASE[:n_whole], "")
        elif raw[cut : cut + 1] == b"\n":  # only the line end is missing
            assert (log.events, log.notice) == (PHRASE[: n_whole + 1], "")
        else:
            assert log.events == PHRASE[:n_whole]
            assert log.notice == (
                f"{path}: line {n_whole + 2} was cut short and left out; "
                f"the {n_whole} events before it are whole"
            )


def test_a_program_killed_while_it_writes_leaves_what_it_wrote(tmp_path: Path) -> None:
    path = tmp_path / "take.events.jsonl"
    program = (
        "import sys; from datetime import datetime; from pathlib import Path\n"
        "from melodycoach.core.event import TimePassed\n"
        "from melodycoach.sources.event_log import EventLog, LogHeader\n"
        f"log = EventLog(Path({str(path)!r}), LogHeader('0', datetime(2026, 5, 1), 'makam'))\n"
        "for number in range(10**9):\n"
        "    log.append(TimePassed(float(number)))\n"
        "    if number == 500: print('going', flush=True)\n"
    )
    with subprocess.Popen([sys.executable, "-c", program], stdout=subprocess.PIPE) as process:
        assert process.stdout is not None
        assert process.stdout.readline() == b"going\n"
        process.send_signal(signal.SIGKILL)
    log = read_event_log(path)
    assert len(log.events) > 500
    assert log.events == tuple(TimePassed(float(number)) for number in range(len(log.events)))


def test_every_damaged_line_is_named(tmp_path: Path) -> None:
    path = tmp_path / "take.events.jsonl"
    write(path)
    lines = path.read_text(encoding="utf-8").splitlines()
    lines[2] = lines[2].replace("69", '"sixty-nine"')
    lines[4] = "\0\0\0"
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")
    with pytest.raises(EventLogError) as error:
        read_event_log(path)
    first = f"{path}: line 3: note-off, 'voice': found 'sixty-nine', expected a whole number"
    assert str(error.value) == f"{first} (and 1 more)"
    assert error.value.faults == (
        first,
        f"{path}: line 5: found '\\x00\\x00\\x00', expected a JSON object",
    )


def test_one_damaged_line_is_the_whole_text(tmp_path: Path) -> None:
    path = tmp_path / "take.events.jsonl"
    write(path, ())
    with path.open("a", encoding="utf-8") as file:
        file.write("{}\n")
    with pytest.raises(EventLogError) as error:
        read_event_log(path)
    assert str(error.value) == f"{path}: line 2: found '{{}}', expected an object with 'event'"


@pytest.mark.parametrize("content", [b"", b'{"format": "melodycoach ev'])
def test_a_log_without_a_whole_header_says_so(tmp_path: Path, content: bytes) -> None:
    path = tmp_path / "take.events.jsonl"
    path.write_bytes(content)
    with pytest.raises(EventLogError) as error:
        read_event_log(path)
    assert str(error.value) == f"{path}: no whole line found, expected an event log"


def test_a_file_of_another_kind_is_told_from_a_log(tmp_path: Path) -> None:
    path = tmp_path / "song.txt"
    path.write_text("A4 B4 C5\n", encoding="utf-8")
    with pytest.raises(EventLogError) as error:
        read_event_log(path)
    assert str(error.value) == f"{path}: line 1: found 'A4 B4 C5', expected a JSON object"


def test_a_missing_log_says_so(tmp_path: Path) -> None:
    path = tmp_path / "none.events.jsonl"
    with pytest.raises(StorageError) as error:
        read_event_log(path)
    assert str(error.value) == f"{path}: no such file or directory, expected an event log to read"


def test_logs_of_one_second_get_names_of_their_own(tmp_path: Path) -> None:
    names = []
    for _ in range(3):
        path = log_path(tmp_path, STARTED)
        write(path, ())
        names.append(path.name)
    assert names == [
        "2026-05-01-180409.events.jsonl",
        "2026-05-01-180409-2.events.jsonl",
        "2026-05-01-180409-3.events.jsonl",
    ]


@pytest.mark.skipif(os.name != "posix" or os.geteuid() == 0, reason="root may write everywhere")
def test_an_unwritable_folder_is_said_from_the_start(tmp_path: Path) -> None:
    tmp_path.chmod(0o500)
    path = tmp_path / "take.events.jsonl"
    assert EventLog(path, HEADER).fault == (
        f"{path}: permission denied; this session is not recorded, playing goes on"
    )
