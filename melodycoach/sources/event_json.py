"""Events as lines of JSON, and back into the same events.

A line is one JSON object: ``event`` for its kind, ``at_s`` for its time, and the fields of that
event. One table at the end of the module says which fields there are and how each is read. The
first line of a log is a header instead: format, version, program, start, pack, settings.

>>> event_to_json(NoteOn(1.5, 69, 6900.0, InputKind.KEYS))
'{"event": "note-on", "at_s": 1.5, "voice": 69, "pitch_cents": 6900.0, "kind": "keys"}'
"""

from __future__ import annotations

import json
import math
from dataclasses import dataclass, field
from datetime import datetime
from enum import StrEnum
from typing import TYPE_CHECKING, Any, TypeVar

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
from melodycoach.core.note import InputKind, Item, Mark, Note, Silence
from melodycoach.errors import EventLogError, nearest_names, shorten

if TYPE_CHECKING:
    from collections.abc import Callable, Mapping

FORMAT = "melodycoach event log"
VERSION = 1

_Choice = TypeVar("_Choice", bound=StrEnum)


@dataclass(frozen=True)
class LogHeader:
    """What a log is of.

    Parameters
    ----------
    program
        Version of the program that wrote it.
    started
        When ``at_s`` was 0.
    pack_id
        The mode pack in use.
    settings
        Whatever else is needed to play it again; plain JSON values.
    """

    program: str
    started: datetime
    pack_id: str
    settings: Mapping[str, Any] = field(default_factory=dict)


def event_to_json(event: Event) -> str:
    """Write an event as one line of JSON, without the line end.

    Raises
    ------
    ValueError, TypeError
        A number is not finite, or a value is none that JSON has.
    """
    name = _NAME_BY_CLASS[type(event)]
    _, readers = _EVENT_BY_NAME[name]
    fields: dict[str, Any] = {"event": name, "at_s": event.at_s}
    for key in readers:
        value = getattr(event, key)
        fields[key] = [_item_to_plain(item) for item in value] if key == "items" else value
    return json.dumps(fields, ensure_ascii=False, allow_nan=False)


def event_from_json(line: bytes | str) -> Event:
    """Read one line of a log.

    Raises
    ------
    EventLogError
        The line is damaged; the text says what was found and what was expected.
    """
    fields = _object(line)
    if "event" not in fields:
        raise EventLogError(f"found {_shown(line)}, expected an object with 'event'")
    name = fields.pop("event")
    if not isinstance(name, str) or name not in _EVENT_BY_NAME:
        hint = nearest_names(str(name), _EVENT_BY_NAME)
        raise EventLogError(f"no event {name!r}; {hint}")
    kind, readers = _EVENT_BY_NAME[name]
    values = _read_fields(fields, {"at_s": _number, **readers}, name)
    try:
        event: Event = kind(**values)
    except ValueError as error:
        raise EventLogError(f"{name}: {error}") from error
    return event


def header_to_json(header: LogHeader) -> str:
    """Write the first line of a log, without the line end."""
    fields = {
        "format": FORMAT,
        "version": VERSION,
        "program": header.program,
        "started": header.started.isoformat(),
        "pack": header.pack_id,
        "settings": dict(header.settings),
    }
    return json.dumps(fields, ensure_ascii=False)


def header_from_json(line: bytes | str) -> LogHeader:
    """Read the first line of a log.

    Raises
    ------
    EventLogError
        It is no header, or one of another version.
    """
    fields = _object(line)
    if fields.pop("format", None) != FORMAT:
        raise EventLogError(f"found {_shown(line)}, expected the header of an event log")
    version = fields.pop("version", None)
    if version != VERSION:
        raise EventLogError(
            f"found format version {version!r}, expected {VERSION}; read it with the program that wrote it"
        )
    readers = {"program": _text, "started": _time, "pack": _text, "settings": _mapping}
    known = _read_fields(fields, readers, "header")
    return LogHeader(known["program"], known["started"], known["pack"], known["settings"])


def _read_fields(
    fields: dict[str, Any], readers: Mapping[str, Callable[[object], Any]], what: str
) -> dict[str, Any]:
    for key in fields:
        if key not in readers:
            raise EventLogError(f"{what} has no field {key!r}; {nearest_names(key, readers)}")
    values = {}
    for key, reader in readers.items():
        if key not in fields:
            raise EventLogError(f"{what} without {key!r}")
        try:
            values[key] = reader(fields[key])
        except EventLogError as damage:
            raise EventLogError(f"{what}, {key!r}: {damage}") from damage
    return values


def _object(line: bytes | str) -> dict[str, Any]:
    try:
        fields = json.loads(line, parse_constant=_refuse_constant)
    except (ValueError, RecursionError) as error:  # UnicodeDecodeError is a ValueError
        raise EventLogError(f"found {_shown(line)}, expected a JSON object") from error
    if not isinstance(fields, dict):
        raise EventLogError(f"found {_shown(line)}, expected a JSON object")
    return fields


def _refuse_constant(word: str) -> float:
    raise ValueError(word)


def _shown(line: bytes | str) -> str:
    text = line.decode(errors="replace") if isinstance(line, bytes) else line
    return repr(shorten(text))


def _number(value: object) -> float:
    if isinstance(value, int | float) and not isinstance(value, bool):
        try:
            number = float(value)
        except OverflowError:
            number = math.inf
        if math.isfinite(number):
            return number
    raise EventLogError(f"found {value!r}, expected a number")


def _integer(value: object) -> int:
    if isinstance(value, int) and not isinstance(value, bool):
        return value
    raise EventLogError(f"found {value!r}, expected a whole number")


def _text(value: object) -> str:
    if isinstance(value, str):
        return value
    raise EventLogError(f"found {value!r}, expected text")


def _time(value: object) -> datetime:
    try:
        return datetime.fromisoformat(_text(value))
    except ValueError as error:
        raise EventLogError(f"found {value!r}, expected a date and time") from error


def _mapping(value: object) -> dict[str, Any]:
    if isinstance(value, dict):
        return value
    raise EventLogError(f"found {value!r}, expected an object")


def _list(value: object) -> list[Any]:
    if isinstance(value, list):
        return value
    raise EventLogError(f"found {value!r}, expected a list")


def _texts(value: object) -> tuple[str, ...]:
    return tuple(_text(text) for text in _list(value))


def _one_of(choices: type[_Choice]) -> Callable[[object], _Choice]:
    def read(value: object) -> _Choice:
        try:
            return choices(_text(value))
        except ValueError as error:
            raise EventLogError(f"found {value!r}, expected one of {', '.join(choices)}") from error

    return read


def _or_none(reader: Callable[[object], Any]) -> Callable[[object], Any]:
    return lambda value: None if value is None else reader(value)


def _item_to_plain(item: Item) -> dict[str, Any]:
    match item:
        case Note():
            return {"item": "note"} | {key: getattr(item, key) for key in _NOTE_FIELDS}
        case Silence():
            return {"item": "silence"} | {key: getattr(item, key) for key in _SILENCE_FIELDS}
        case Mark():
            return {"item": "mark", "sign": item}


def _items(value: object) -> tuple[Item, ...]:
    return tuple(_item(item) for item in _list(value))


def _item(value: object) -> Item:
    fields = dict(_mapping(value))
    name = fields.pop("item", None)
    if name == "note":
        return Note(**_read_fields(fields, _NOTE_FIELDS, "note"))
    if name == "silence":
        return Silence(**_read_fields(fields, _SILENCE_FIELDS, "silence"))
    if name == "mark":
        sign: Mark = _read_fields(fields, {"sign": _one_of(Mark)}, "mark")["sign"]
        return sign
    raise EventLogError(f"no item {name!r}; known: mark, note, silence")


_NOTE_FIELDS: dict[str, Callable[[object], Any]] = {
    "pitch_cents": _number,
    "onset_s": _number,
    "duration_s": _number,
    "kind": _one_of(InputKind),
    "beats": _or_none(_number),
}
_SILENCE_FIELDS: dict[str, Callable[[object], Any]] = {"duration_s": _number, "beats": _or_none(_number)}

_EVENT_BY_NAME: dict[str, tuple[type[Any], dict[str, Callable[[object], Any]]]] = {
    "note-on": (NoteOn, {"voice": _integer, "pitch_cents": _number, "kind": _one_of(InputKind)}),
    "note-off": (NoteOff, {"voice": _integer}),
    "pitch-moved": (PitchMoved, {"voice": _integer, "pitch_cents": _number, "kind": _one_of(InputKind)}),
    "line-edited": (LineEdited, {"start": _integer, "stop": _integer, "items": _items}),
    "undone": (Undone, {}),
    "redone": (Redone, {}),
    "fresh-start": (FreshStart, {}),
    "target-chosen": (TargetChosen, {"mode_id": _or_none(_text)}),
    "reading-chosen": (
        ReadingChosen,
        {"reading": _one_of(PitchReading), "final_cents": _or_none(_number)},
    ),
    "modes-restricted": (ModesRestricted, {"mode_ids": _texts}),
    "time-passed": (TimePassed, {}),
}
"""Every event: its word in the log, its class, and how each of its own fields is read."""

_NAME_BY_CLASS: dict[type[Any], str] = {kind: name for name, (kind, _) in _EVENT_BY_NAME.items()}
