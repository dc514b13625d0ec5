"""Did you mean another file?"""

from __future__ import annotations

from typing import TYPE_CHECKING

from melodycoach.sources.near_files import near_files

if TYPE_CHECKING:
    from pathlib import Path


def test_only_files_called_nearly_alike_are_named_nearest_first(tmp_path: Path) -> None:
    for name in ("morning.txt", "morning-2.txt", "zurna.txt"):
        (tmp_path / name).touch()
    (tmp_path / "mornig.txt.d").mkdir()
    assert near_files(tmp_path / "mornig.txt") == "did you mean 'morning.txt' or 'morning-2.txt'?"
    assert near_files(tmp_path / "evening-song") == ""


def test_a_file_that_is_there_or_a_folder_that_is_not_has_no_neighbours(tmp_path: Path) -> None:
    (tmp_path / "a.txt").touch()
    assert near_files(tmp_path / "a.txt") == ""
    assert near_files(tmp_path / "none" / "a.txt") == ""
