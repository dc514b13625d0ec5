"""Did you mean another file? What to say where a file is missing."""

from __future__ import annotations

from typing import TYPE_CHECKING

from melodycoach.errors import did_you_mean

if TYPE_CHECKING:
    from pathlib import Path


def near_files(path: Path) -> str:
    """Name the files beside a missing one that are called nearly like it, to end an error text with.

    Returns
    -------
    str
        Empty, if there are none, or if the file is not missing at all.

    Examples
    --------
    >>> from pathlib import Path
    >>> from tempfile import TemporaryDirectory
    >>> with TemporaryDirectory() as folder:
    ...     _ = (Path(folder) / "evening.txt").write_text("A4")
    ...     near_files(Path(folder) / "evning.txt"), near_files(Path(folder) / "rain.txt")
    ("did you mean 'evening.txt'?", '')
    """
    try:
        names = [] if path.exists() else sorted(one.name for one in path.parent.iterdir() if one.is_file())
    except OSError:
        return ""
    return did_you_mean(path.name, names, cutoff=0.75)
