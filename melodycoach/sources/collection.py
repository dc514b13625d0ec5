"""Labelled melodies from a file: JSON lines, one melody a line, plain or gzipped.

A line is an object with ``id``, ``mode`` and ``notes``; ``group`` and ``final`` may be left out::

    {"id": "t1", "group": "t1", "mode": "makam/rast", "final": 6696.2, "notes": [[0, 0.5, 6696.2], …]}

A note is ``[onset in seconds, duration in seconds, cents on the MIDI scale]``. Melodies of one
group are variants of each other. Other keys are left alone. The file is read line by line, so
memory does not grow with it.
"""

from __future__ import annotations

import gzip
import json
import zlib
from dataclasses import dataclass
from typing import TYPE_CHECKING, NoReturn

from melodycoach.core.note import InputKind, Note
from melodycoach.core.pitch import HIGHEST_CENTS, LOWEST_CENTS
from melodycoach.errors import CollectionError, nearest_names

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator
    from io import BufferedIOBase, BufferedReader
    from pathlib import Path

MAX_LINE_BYTES = 8_000_000
"""A longer line is no melody, and is not taken into memory."""

MAX_SECONDS = 86_400.0
"""No onset and no duration is longer than a day."""

_CHUNK_BYTES = 1 << 16
_GZIP_START = b"\x1f\x8b"
_NOTE_FORM = "[onset_s, duration_s, cents]"


@dataclass(frozen=True, slots=True)
class Melody:
    """One labelled melody.

    Parameters
    ----------
    id
        Names it in reports.
    group
        Melodies of one group are variants of each other, and stay on one side of any split.
    mode_id
        The label, as it stands in the file.
    final_cents
        The labelled final in cents on the MIDI scale, or None.
    notes
        At least one, in order of onset.
    """

    id: str
    group: str
    mode_id: str
    final_cents: float | None
    notes: tuple[Note, ...]


def read_collection(
    path: Path,
    *,
    kind: InputKind = InputKind.RECORDED,
    strict: bool = False,
    on_fault: Callable[[str], None] | None = None,
) -> Iterator[Melody]:
    """Give the melodies of a file one by one.

    Parameters
    ----------
    path
        JSON lines in UTF-8, plain or gzipped (told by its first bytes, not by its name).
    kind
        Where the pitches came from; goes into every note. With ``KEYS`` each pitch is taken to
        its nearest key.
    strict
        The first bad record stops the reading. So it does without ``on_fault``: nothing is
        skipped in silence.
    on_fault
        Called with one sentence for each bad record, which is then skipped.

    Raises
    ------
    CollectionError
        At the first bad record, when it is not to be skipped; at a file that cannot be opened;
        at gzip data that breaks off or is damaged, whatever ``strict`` says, since nothing after
        that point can be read.
    """
    number = 0
    with _open(path) as raw:
        try:
            file = gzip.GzipFile(fileobj=raw) if raw.peek(2)[:2] == _GZIP_START else raw
            for number, line in _lines(file):
                try:
                    melody = _melody(line, kind, first=number == 1)
                except _BadRecordError as bad:
                    fault = f"{path}: line {number}: {bad}"
                    if strict or on_fault is None:
                        raise CollectionError(fault) from None
                    on_fault(f"{fault}; skipped")
                else:
                    if melody is not None:
                        yield melody
        except (EOFError, zlib.error, gzip.BadGzipFile) as damage:
            raise CollectionError(
                f"{path}: the gzip data are damaged after line {number} ({damage}); "
                "make or fetch the file again"
            ) from None
        except OSError as error:
            raise CollectionError(
                f"{path}: cannot be read after line {number} ({error.strerror or error})"
            ) from None


class _BadRecordError(Exception):
    """What is wrong with one line; never leaves this module."""


def _bad(text: str) -> NoReturn:
    raise _BadRecordError(text)


def _open(path: Path) -> BufferedReader:
    try:
        file = path.open("rb")
    except FileNotFoundError:
        folder = path.parent
        names = [entry.name for entry in folder.iterdir()] if folder.is_dir() else []
        hint = f"; {nearest_names(path.name, names)}" if names else ""
        raise CollectionError(f"{path}: no such file{hint}") from None
    except IsADirectoryError:
        raise CollectionError(f"{path}: is a folder, expected a file of JSON lines") from None
    except OSError as error:
        raise CollectionError(f"{path}: cannot be opened ({error.strerror or error})") from None
    return file


def _lines(file: BufferedIOBase) -> Iterator[tuple[int, bytes | None]]:
    """Give each line with its number; None stands for one that is too long to take."""
    number = 0
    while line := file.readline(MAX_LINE_BYTES + 1):
        number += 1
        if len(line) <= MAX_LINE_BYTES:
            yield number, line
            continue
        while line and not line.endswith(b"\n"):
            line = file.readline(_CHUNK_BYTES)
        yield number, None


def _melody(line: bytes | None, kind: InputKind, *, first: bool) -> Melody | None:
    """Read one line; None when it is blank."""
    if line is None:
        _bad(f"longer than {MAX_LINE_BYTES} bytes, expected one melody")
    try:
        text = line.decode("utf-8-sig" if first else "utf-8").strip()
    except UnicodeDecodeError as error:
        _bad(f"byte {error.start + 1} is not UTF-8")
    if not text:
        return None
    try:
        record = json.loads(text)
    except json.JSONDecodeError as error:
        _bad(f"column {error.colno}: not JSON ({error.msg.lower()})")
    except (ValueError, RecursionError):  # a number of thousands of digits, brackets without end
        _bad("not JSON that can be read, expected one melody")
    if not isinstance(record, dict):
        _bad(f"found {_shown(record)}, expected an object with 'id', 'mode' and 'notes'")
    identity = _word(record, "id")
    group = _word(record, "group") if "group" in record else identity
    mode_id = _word(record, "mode")
    final = record.get("final")
    final_cents = None if final is None else _number(final, "'final'", LOWEST_CENTS, HIGHEST_CENTS, "cents")
    return Melody(identity, group, mode_id, final_cents, _notes(record, kind))


def _word(record: dict[str, object], key: str) -> str:
    if key not in record:
        _bad(f"no {key!r}, expected it beside {_shown(sorted(record))}")
    value = record[key]
    if not isinstance(value, str) or not value.strip():
        _bad(f"{key!r} is {_shown(value)}, expected a word")
    return value


def _notes(record: dict[str, object], kind: InputKind) -> tuple[Note, ...]:
    found = record.get("notes")
    if not isinstance(found, list):
        _bad(f"'notes' is {_shown(found)}, expected a list of {_NOTE_FORM}")
    if not found:
        _bad("'notes' is empty, expected at least one note")
    notes: list[Note] = []
    before_s = 0.0
    for number, triple in enumerate(found, 1):
        if not isinstance(triple, list) or len(triple) != 3:
            _bad(f"note {number} is {_shown(triple)}, expected {_NOTE_FORM}")
        onset_s = _number(triple[0], f"note {number}: the onset", 0.0, MAX_SECONDS, "seconds")
        duration_s = _number(triple[1], f"note {number}: the duration", 0.0, MAX_SECONDS, "seconds")
        cents = _number(triple[2], f"note {number}: the pitch", LOWEST_CENTS, HIGHEST_CENTS, "cents")
        if onset_s < before_s:
            _bad(f"note {number}: begins at {onset_s:g} s, before note {number - 1} ({before_s:g} s)")
        before_s = onset_s
        if kind is InputKind.KEYS:
            cents = 100.0 * round(cents / 100)
        notes.append(Note(cents, onset_s, duration_s, kind))
    return tuple(notes)


def _number(value: object, what: str, low: float, high: float, unit: str) -> float:
    if isinstance(value, bool) or not isinstance(value, int | float) or not low <= value <= high:
        _bad(f"{what} is {_shown(value)}, expected {low:g} to {high:g} {unit}")
    return float(value)  # finite: NaN fails every comparison


def _shown(value: object) -> str:
    """Write a value that was found, cut to what fits in a sentence."""
    text = repr(value)
    return text if len(text) <= 60 else f"{text[:57]}…"
