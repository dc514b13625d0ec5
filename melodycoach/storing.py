"""Files that are written whole or not at all."""

from __future__ import annotations

import contextlib
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
    in_place = path.exists() and not path.is_file()
    unfinished = path if in_place else path.with_name(f"{path.name}.unfinished")
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        with unfinished.open("w", encoding="utf-8", errors="replace") as file:
            file.writelines(texts)
        if not in_place:
            unfinished.replace(path)
    except OSError as error:
        raise StorageError(f"{path}: {system_reason(error)}; {advice}") from error
    finally:
        if not in_place:
            with contextlib.suppress(OSError):
                unfinished.unlink()
