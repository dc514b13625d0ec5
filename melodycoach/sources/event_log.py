"""The event log: JSON lines, written as things happen, read back into the same events.

Each line is handed to the system whole, so a program that is killed leaves all lines but perhaps
the last one complete. A write that fails never raises: what could not be written is kept and
tried again with the next event, in order, so a disk that has room again gets the whole log.

A log is locked while it is written, where the system has such locks: so a session that is running is
told from one that was cut short. The system lets the lock go with the program, however that ends.
"""

from __future__ import annotations

import os
import sys
from dataclasses import dataclass
from typing import TYPE_CHECKING

from melodycoach.errors import EventLogError, StorageError, system_reason
from melodycoach.sources.event_json import (
    LogHeader,
    event_from_json,
    event_to_json,
    header_from_json,
    header_to_json,
)
from melodycoach.sources.near_files import near_files

if TYPE_CHECKING:
    from collections.abc import Iterable
    from datetime import datetime
    from io import FileIO
    from pathlib import Path
    from types import TracebackType

    from melodycoach.core.event import Event

SUFFIX = ".events.jsonl"
WAITING_LIMIT_BYTES = 16 * 1024 * 1024
"""How much a log keeps while the disk takes nothing: days of playing. Past it, it gives up."""


@dataclass(frozen=True)
class RecordedLog:
    """A log read back; ``notice`` is empty, or says that the last line was cut short and left out."""

    header: LogHeader
    events: tuple[Event, ...]
    notice: str = ""


def log_path(folder: Path, started: datetime) -> Path:
    """Name a log by its start; a number is added where the name is taken.

    >>> from datetime import datetime
    >>> from pathlib import Path
    >>> log_path(Path("nowhere"), datetime(2026, 5, 1, 18, 4, 9)).name
    '2026-05-01-180409.events.jsonl'
    """
    stem = f"{started:%Y-%m-%d-%H%M%S}"
    path = folder / f"{stem}{SUFFIX}"
    number = 2
    while path.exists():
        path = folder / f"{stem}-{number}{SUFFIX}"
        number += 1
    return path


def logs_in(folder: Path) -> tuple[Path, ...]:
    """Give the logs in a folder, as `log_path` names them, the newest first.

    A folder that is not there or cannot be read has none.
    """
    try:
        found = [path for path in folder.iterdir() if path.name.endswith(SUFFIX)]
    except OSError:
        return ()
    n_of_time = len("2026-05-01-180409")
    return tuple(
        sorted(found, key=lambda path: (path.name[:n_of_time], len(path.name), path.name), reverse=True)
    )


def has_line(path: Path) -> bool:
    """Say whether anything was played or typed in the session of this log; not if it cannot be read."""
    try:
        with path.open("rb") as file:
            return any(b'"note-on"' in line or b'"line-edited"' in line for line in file)
    except OSError:
        return False


def is_being_written(path: Path) -> bool:
    """Say whether a running session writes this log."""
    try:
        with path.open("rb", buffering=0) as file:
            return not _lock(file, for_writing=False)
    except OSError:
        return False


def _lock(file: FileIO, for_writing: bool) -> bool:
    """Lock a file until it is closed; False: another program holds it."""
    if sys.platform == "win32":  # nothing to be had there: every log counts as free
        return True
    import fcntl

    try:
        fcntl.flock(file, (fcntl.LOCK_EX if for_writing else fcntl.LOCK_SH) | fcntl.LOCK_NB)
    except BlockingIOError:
        return False
    except OSError:  # a disk without locks
        return True
    return True


class EventLog:
    """Writes a log as things happen. It never raises; `fault` says what went wrong first.

    Folders on the way to the file are made. A file that already holds something is left alone.
    An instance belongs to one thread.

    What cannot even be opened is said in `fault` from the start.

    Examples
    --------
    >>> from datetime import datetime
    >>> from pathlib import Path
    >>> from tempfile import TemporaryDirectory
    >>> from melodycoach.core.event import FreshStart
    >>> header = LogHeader("0.1.0", datetime(2026, 5, 1), "makam")
    >>> with TemporaryDirectory() as folder, EventLog(log_path(Path(folder), header.started), header) as log:
    ...     log.append(FreshStart(2.5))
    ...     read_event_log(log.path).events
    (FreshStart(at_s=2.5),)
    """

    def __init__(self, path: Path, header: LogHeader) -> None:
        self.path = path
        self.fault: str | None = None
        self._file: FileIO | None = None
        self._waiting = bytearray()
        first_line = header_to_json(header)
        try:
            path.parent.mkdir(parents=True, exist_ok=True)
            self._file = path.open("ab", buffering=0)
            taken = os.fstat(self._file.fileno()).st_size > 0
            _lock(self._file, for_writing=True)
        except OSError as error:
            self._give_up(f"{path}: {system_reason(error)}")
        else:
            if taken:
                self._give_up(f"{path}: the file already holds something")
        self._write(first_line)

    def append(self, event: Event) -> str | None:
        """Write one event.

        Returns
        -------
        str or None
            The fault, the first time that there is one; the same text stays in `fault`.
        """
        return self.append_all((event,))

    def append_all(self, events: Iterable[Event]) -> str | None:
        """Write several events at once; as `append`."""
        before = self.fault
        lines = []
        for event in events:
            try:
                lines.append(event_to_json(event))
            except (TypeError, ValueError) as error:  # not a value that JSON has
                self.fault = self.fault or f"{self.path}: event {event!r} cannot be written: {error}"
        self._write(*lines)
        return self.fault if before is None else None

    def close(self) -> str | None:
        """Write what still waits and close the file; say what could not be written, if anything.

        A second call does nothing.
        """
        if self._file is None:
            return None
        self._flush()
        n_lost = self._waiting.count(b"\n")
        self._give_up("")
        return f"{self.path}: the last {n_lost} lines could not be written" if n_lost else None

    def __enter__(self) -> EventLog:
        """Give the log itself; it was opened when it was made."""
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        """Close the log."""
        self.close()

    def _write(self, *lines: str) -> None:
        if self._file is None:
            return
        self._waiting += b"".join(line.encode("utf-8", "surrogatepass") + b"\n" for line in lines)
        self._flush()
        if len(self._waiting) > WAITING_LIMIT_BYTES:
            self._give_up("")

    def _flush(self) -> None:
        assert self._file is not None
        try:
            while self._waiting:
                written = self._file.write(self._waiting)
                if not written:
                    return
                del self._waiting[:written]
        except OSError as error:
            reason = f"{self.path}: {system_reason(error)}"
            self.fault = self.fault or f"{reason}; playing goes on, and the log is tried again"

    def _give_up(self, reason: str) -> None:
        if self._file is not None:
            self._file.close()
            self._file = None
        self._waiting.clear()
        if reason and self.fault is None:
            self.fault = f"{reason}; this session is not recorded, playing goes on"


def read_event_log(path: Path) -> RecordedLog:
    """Read a log back.

    A last line that was cut short, as by a crash, is left out and said in ``notice``.

    Raises
    ------
    StorageError
        The file cannot be read.
    EventLogError
        It is no log of ours, or of a newer version, or lines are damaged; every damaged line is
        one of the error's `faults`.
    """
    try:
        raw = path.read_bytes()
    except OSError as error:
        advice = f"; {near}" if (near := near_files(path)) else ""
        raise StorageError(
            f"{path}: {system_reason(error)}, expected an event log to read{advice}"
        ) from error
    lines = raw.split(b"\n")
    tail = lines.pop()  # what follows the last line end: nothing, or a line cut short
    if not lines:
        raise EventLogError(f"{path}: no whole line found, expected an event log")
    try:
        header = header_from_json(lines[0])
    except EventLogError as damage:
        raise EventLogError(f"{path}: line 1: {damage}") from damage
    events: list[Event] = []
    faults: list[str] = []
    for number, line in enumerate(lines[1:], start=2):
        try:
            events.append(event_from_json(line))
        except EventLogError as damage:
            faults.append(f"{path}: line {number}: {damage}")
    if faults:
        more = f" (and {len(faults) - 1} more)" if len(faults) > 1 else ""
        raise EventLogError(faults[0] + more, faults)
    notice = ""
    if tail:
        try:
            events.append(event_from_json(tail))
        except EventLogError:
            notice = (
                f"{path}: line {len(lines) + 1} was cut short and left out; "
                f"the {len(events)} events before it are whole"
            )
    return RecordedLog(header, tuple(events), notice)
