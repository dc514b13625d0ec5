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


class Sight(NamedTuple):
    """What is seen of a file: it was saved, or it has gone."""

    name: str
    is_there: bool


class Watch:
    """Tells which files were saved, and which have gone, since they were last told of.

    A file is told of once it has kept still from one look to the next, so half a save is not read, and
    an editor may take it away for a moment to put another in its place. One that has gone is told of
    once; when it comes back it counts as saved.

    Parameters
    ----------
    names
        The files, by path; they count as seen now.
    pause
        Waits until it is time for the next look.
    """

    def __init__(self, names: Sequence[str], pause: Callable[[], None]) -> None:
        self._pause = pause
        self._told: dict[str, Stamp | None] = {name: stamp_of(Path(name)) for name in names}
        self._last = dict(self._told)

    def sights(self) -> Iterator[Sight]:
        """Give what is seen of each file, as long as anyone asks."""
        while True:
            self._pause()
            yield from self._look()

    def _look(self) -> Iterator[Sight]:
        for name, told in self._told.items():
            stamp, before = stamp_of(Path(name)), self._last[name]
            self._last[name] = stamp
            if stamp == before and stamp != told:
                self._told[name] = stamp
                yield Sight(name, stamp is not None)
