"""Waiting for files to be saved."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, NamedTuple

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator, Sequence

POLL_S = 0.3
"""How often the files are looked at."""


class Stamp(NamedTuple):
    """What shows that a file was saved: editors write into it, or put another in its place."""

    modified_ns: int
    n_bytes: int
    inode: int


def stamp_of(path: Path) -> Stamp | None:
    """Give the stamp of a file, or None while it is missing."""
    try:
        found = path.stat()
    except OSError:
        return None
    return Stamp(found.st_mtime_ns, found.st_size, found.st_ino)


class Watch:
    """Tells which files were saved since they were last told of.

    A file is told of once it has kept still from one look to the next, so half a save is not read.

    Parameters
    ----------
    names
        The files, by path; they count as seen now.
    pause
        Waits until it is time for the next look.
    """

    def __init__(self, names: Sequence[str], pause: Callable[[], None]) -> None:
        self._pause = pause
        self._seen = {name: stamp_of(Path(name)) for name in names}
        self._moving: dict[str, Stamp] = {}

    def saved(self) -> Iterator[str]:
        """Give the name of each file that is saved, as long as anyone asks."""
        while True:
            self._pause()
            yield from self._look()

    def _look(self) -> Iterator[str]:
        for name, seen in self._seen.items():
            stamp = stamp_of(Path(name))
            if stamp is None or stamp == seen:
                self._moving.pop(name, None)
            elif self._moving.get(name) != stamp:
                self._moving[name] = stamp
            else:
                del self._moving[name]
                self._seen[name] = stamp
                yield name
