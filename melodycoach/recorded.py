"""Sessions as logs: how one is recorded, begun as it was recorded, and gone on with.

A resumed session goes on in a log of its own, which begins with everything that the old one holds:
each log is whole by itself, the old one stays as it is, and time goes on from where it stopped.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any

from melodycoach import DEFAULT_PACK, __version__
from melodycoach.core.event import NoteOff, PitchReading, TimePassed
from melodycoach.core.line_rules import LineRules
from melodycoach.core.session import apply, begin, replay
from melodycoach.errors import EventLogError, StorageError
from melodycoach.folders import session_log_dir, user_pack_dir
from melodycoach.sources.event_json import LogHeader
from melodycoach.sources.event_log import (
    EventLog,
    has_line,
    is_being_written,
    log_path,
    logs_in,
    read_event_log,
)
from melodycoach.sources.midi_choice import n_of
from melodycoach.sources.pack_file import is_pack_file, load_pack

if TYPE_CHECKING:
    from melodycoach.core.event import Event
    from melodycoach.core.session import SessionState
    from melodycoach.sources.event_log import RecordedLog


def open_log(session: SessionState, pack: str) -> EventLog:
    """Open the log of a session that begins now, with its pack as it was asked for."""
    kept: dict[str, Any] = {
        "only": list(session.only),
        "reading": session.reading.value,
        "final_cents": session.final_cents,
        "target": session.target.id if session.target else None,
        "split_key": session.taking.rules.split_key,
        "pack": _pack_to_keep(pack),
    }
    header = LogHeader(__version__, datetime.now().astimezone(), session.pack.id, kept)
    return _new_log(header)


def recorded_beginning(recorded: RecordedLog, path: Path, asked_pack: str = DEFAULT_PACK) -> SessionState:
    """Begin as a recorded session began. Its pack may have moved since: another one is looked at.

    Raises
    ------
    EventLogError
        Its settings are damaged, or the pack is another one.
    UnknownModeError
        The pack has lost a mode.
    """
    kept, pack_id = recorded.header.settings, recorded.header.pack_id
    asked = asked_pack != DEFAULT_PACK
    pack = load_pack(asked_pack if asked else str(kept.get("pack", pack_id)), user_pack_dir())
    if pack.id != pack_id:
        raise EventLogError(
            f"{path}: recorded with pack {pack_id!r}, found {pack.id!r}; name its file with --pack"
        )
    only, reading = kept.get("only", []), kept.get("reading", PitchReading.WRITTEN)
    final_cents, target, split_key = kept.get("final_cents"), kept.get("target"), kept.get("split_key")
    sound = (
        isinstance(only, list)
        and all(isinstance(mode_id, str) for mode_id in only)
        and reading in list(PitchReading)
        and (isinstance(final_cents, int | float) if reading == PitchReading.FINAL else final_cents is None)
        and (target is None or isinstance(target, str))
        and (split_key is None or isinstance(split_key, int))
    )
    if not sound:
        raise EventLogError(f"{path}: line 1: found settings {dict(kept)!r}, expected those of a session")
    rules = LineRules(split_key)
    return begin(pack, tuple(only), PitchReading(reading), final_cents, target, rules=rules)


@dataclass(frozen=True, eq=False, slots=True)
class Resumed:
    """A session that is gone on with.

    Parameters
    ----------
    session
        As it was after the last event of its log, with no key down.
    header
        That of the log in which it goes on.
    events
        What has happened in it; whatever was still held is let go at the end.
    says
        Which session it is, for the player.
    """

    session: SessionState
    header: LogHeader
    events: tuple[Event, ...]
    says: str

    def open_log(self) -> EventLog:
        """Open the log in which it goes on; what has happened is in it already."""
        log = _new_log(self.header)
        log.append_all(self.events)
        return log


def resume(path: Path | None = None, asked_pack: str = DEFAULT_PACK) -> Resumed:
    """Bring a session back as it was after the last event of its log.

    Parameters
    ----------
    path
        Its log; None: the newest one that holds a line and that no running session writes.
    asked_pack
        As for `recorded_beginning`.

    Raises
    ------
    StorageError
        There is none, it cannot be read, or a running session writes it.
    EventLogError, UnknownModeError
        As for `recorded_beginning`, and when the log is damaged.
    """
    path = _newest_with_a_line() if path is None else path
    if is_being_written(path):
        raise StorageError(f"{path}: a session that is running writes it; end that one first")
    recorded = read_event_log(path)
    session = recorded_beginning(recorded, path, asked_pack)
    kept = dict(recorded.header.settings)
    if asked_pack != DEFAULT_PACK:
        kept["pack"] = _pack_to_keep(asked_pack)
    session = replay(session, recorded.events)
    held = sorted((key.voice for key in session.taking.keys), key=lambda voice: voice == session.sounding)
    ups = tuple(NoteOff(session.now_s, voice) for voice in held)  # the melody's own key last
    for event in ups:
        session = apply(session, event)
    counted = n_of(len(session.line.heard), "note")
    says = f"the session of {_when(recorded)} goes on, with {counted} in its line ({path.name})"
    return Resumed(
        session=session,
        header=replace(recorded.header, program=__version__, settings=kept),
        events=(*recorded.events, *ups),
        says=f"{says}; the last line of that log was cut short and is left out" if recorded.notice else says,
    )


def cut_short() -> str:
    """Say that the last session was cut short, and how to go on with it; else nothing.

    Only the newest log is looked at, so this is said once: the next session has a newer one.
    """
    newest = next((path for path in logs_in(session_log_dir()) if not is_being_written(path)), None)
    if newest is None or not has_line(newest):
        return ""
    try:
        recorded = read_event_log(newest)
    except (EventLogError, StorageError):
        return ""
    if recorded.events and isinstance(recorded.events[-1], TimePassed):
        return ""
    return f"the session of {_when(recorded)} was cut short; melodycoach listen --resume goes on with it"


def _newest_with_a_line() -> Path:
    for path in logs_in(session_log_dir()):
        if has_line(path) and not is_being_written(path):
            return path
    raise StorageError(
        f"{session_log_dir()}: found no log of a session with notes in it, expected one to resume; "
        "name a log, or begin with melodycoach listen"
    )


def _new_log(header: LogHeader) -> EventLog:
    """Open a log that is named by the present moment."""
    return EventLog(log_path(session_log_dir(), datetime.now().astimezone()), header)


def _pack_to_keep(pack: str) -> str:
    """Name a pack so that it is found again from any folder."""
    return str(Path(pack).absolute()) if is_pack_file(pack) else pack


def _when(recorded: RecordedLog) -> str:
    return f"{recorded.header.started:%Y-%m-%d, %H:%M}"
