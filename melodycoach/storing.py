"""Files that are written whole or not at all."""

from __future__ import annotations

import contextlib
from itertools import count
from typing import TYPE_CHECKING

from melodycoach.errors import StorageError, system_reason

if TYPE_CHECKING:
    from collections.abc import Iterable
    from pathlib import Path


def write_whole(path: Path, texts: Iterable[str], advice: str = "choose another place") -> None:
    """Write a text file, with its folders: all of it, or nothing.

    It is written beside the old file and then put in its place, so a reader never sees half of it.
    What is no ordinary file, such as a pipe, is written into. What UTF-8 cannot hold (half a
    character out of an odd file name) becomes a question mark.

    Parameters
    ----------
    path
        Where to.
    texts
        What it is to hold, piece by piece.
    advice
        What to do when it cannot be written.

    Raises
    ------
    StorageError
        The file cannot be written.
    """
    try:
        if path.exists() and not path.is_file():
            _write(path, texts)
        else:
            path.parent.mkdir(parents=True, exist_ok=True)
            _replace(path, texts)
    except StorageError:
        raise
    except OSError as error:
        raise StorageError(f"{path}: {system_reason(error)}; {advice}") from error


def refuse_to_lose(path: Path, read: Iterable[Path], sign: str) -> None:
    """Refuse to write onto a file that this program did not write, or that it is about to read.

    Parameters
    ----------
    path
        Where something is to be written.
    read
        The files that are read: they are not written onto, by whatever name and through whatever link.
    sign
        What every file begins with that may be replaced. An empty file may, too: nothing is lost.

    Raises
    ------
    StorageError
        Something would be lost, or the file cannot be looked at.
    """
    wanted = sign.encode()
    try:
        if not path.is_file():
            return
        is_read = any(one.exists() and one.samefile(path) for one in read)
        with path.open("rb") as file:
            start = file.read(len(wanted))
    except OSError as error:
        raise StorageError(f"{path}: {system_reason(error)}; name another place") from error
    if is_read:
        raise StorageError(
            f"{path}: is itself one of the files that are read, expected a file of its own to write into; "
            "name another place"
        )
    if start not in (b"", wanted):
        raise StorageError(
            f"{path}: holds something else, expected no file yet or one that was written here before; "
            "name another place, or move it away"
        )


def _replace(path: Path, texts: Iterable[str]) -> None:
    """Write a file beside the old one, and put it in its place."""
    unfinished = _beside(path)
    try:
        _write(unfinished, texts)
        unfinished.replace(path)
    finally:
        with contextlib.suppress(OSError):
            unfinished.unlink()


def _write(path: Path, texts: Iterable[str]) -> None:
    with path.open("w", encoding="utf-8", errors="replace") as file:
        file.writelines(texts)


def _beside(path: Path) -> Path:
    """Give a name beside a file that nothing has yet."""
    names = (f"{path.name}.unfinished{number or ''}" for number in count())
    return next(one for one in map(path.with_name, names) if not one.exists())
