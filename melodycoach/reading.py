"""Files of music, from the disk or from standard input: whole, and never more than makes sense."""

from __future__ import annotations

import os
import stat
import sys
from pathlib import Path
from typing import TYPE_CHECKING, BinaryIO

from melodycoach.core.sheet import SheetKind
from melodycoach.errors import StorageError, UnknownModeError, system_reason
from melodycoach.sources.near_files import near_files

if TYPE_CHECKING:
    from melodycoach.core.mode import Mode, ModePack

MAX_FILE_BYTES = 64 * 1024 * 1024
"""A larger file is not read: no melody takes so much."""

STDIN = "-"
"""The name that stands for what is piped in."""

STDIN_NAME = "standard input"
"""What it is called in messages."""

_READ_BYTES = 1024 * 1024  # at a time
_WANTED = "name a file of note text, a MIDI file or MusicXML"


def called(name: str) -> str:
    """Give what a file is called in messages."""
    return STDIN_NAME if name == STDIN else name


def read_bytes(name: str) -> bytes:
    """Read a whole file, or all that is piped in.

    Raises
    ------
    StorageError
        It is missing, no file, or larger than `MAX_FILE_BYTES`; or the system refuses it.
    """
    return _read_stdin() if name == STDIN else read_file(Path(name))


def read_file(path: Path) -> bytes:
    """Read a whole file.

    Raises
    ------
    StorageError
        It is missing, no file, or larger than `MAX_FILE_BYTES`; or the system refuses it.
    """
    try:
        data = _read_regular(path)
    except IsADirectoryError as error:
        raise StorageError(f"{path}: is a folder, expected a file; name the files in it") from error
    except StorageError:
        raise
    except (OSError, ValueError) as error:  # a name with a zero byte in it is a ValueError
        reason = system_reason(error) if isinstance(error, OSError) else str(error)
        raise StorageError(f"{path}: {reason}; {near_files(path) or _WANTED}") from error
    return _refuse_too_much(data, str(path))


def _read_stdin() -> bytes:
    if sys.stdin is None:  # the program was started with none
        raise StorageError(f"{STDIN_NAME}: there is none; {_WANTED}")
    return _refuse_too_much(_at_most(sys.stdin.buffer), STDIN_NAME)


def _refuse_too_much(data: bytes, where: str) -> bytes:
    if len(data) > MAX_FILE_BYTES:
        raise StorageError(f"{where}: larger than {MAX_FILE_BYTES:,} bytes, expected one melody; {_WANTED}")
    return data


def _read_regular(path: Path) -> bytes:
    with open(path, "rb", opener=_without_waiting) as file:
        if not stat.S_ISREG(os.fstat(file.fileno()).st_mode):
            raise StorageError(f"{path}: a pipe or device, expected a file; to pipe a line in, name it -")
        return _at_most(file)


def _without_waiting(name: str, flags: int) -> int:
    """Open a file; a pipe that nobody writes into is no reason to wait."""
    return os.open(name, flags | getattr(os, "O_NONBLOCK", 0))


def _at_most(file: BinaryIO) -> bytes:
    """Read a file to its end, or a little more than is allowed."""
    data = bytearray()
    while len(data) <= MAX_FILE_BYTES and (more := file.read(_READ_BYTES)):
        data += more
    return bytes(data)


def mode_named(pack: ModePack, kind: SheetKind, word: str) -> tuple[Mode | None, str]:
    """Find the mode that a file names as its own.

    What a MIDI file or a score names may be anything, so it is passed over where the pack does not
    have it; note text is written for this program, and a slip in it is a slip.

    Returns
    -------
    Mode or None, str
        None where no mode is named or it is unknown; then a sentence says so.

    Raises
    ------
    UnknownModeError
        Note text names a mode that the pack does not have.
    """
    if not word:
        return None, ""
    try:
        return pack.find(word), ""
    except UnknownModeError:
        if kind is SheetKind.NOTE_TEXT:
            raise
        return (
            None,
            f"the file names the mode {word!r}, which pack {pack.id!r} does not have: it is passed over",
        )
