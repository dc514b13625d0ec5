"""Files are written whole or not at all."""

from __future__ import annotations

import os
import threading
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from melodycoach.errors import StorageError
from melodycoach.storing import write_whole

if TYPE_CHECKING:
    from collections.abc import Iterator


def test_a_file_is_written_with_its_folders_and_nothing_else_is_left(tmp_path: Path) -> None:
    path = tmp_path / "new" / "folder" / "page.html"
    write_whole(path, ["one ", "two"])
    write_whole(path, ["dügâh"])
    assert path.read_text(encoding="utf-8") == "dügâh"
    assert [one.name for one in path.parent.iterdir()] == ["page.html"]


def test_what_stops_half_way_leaves_the_old_file_as_it_was(tmp_path: Path) -> None:
    path = tmp_path / "page.html"
    path.write_text("old", encoding="utf-8")

    def half() -> Iterator[str]:
        yield "new"
        raise ZeroDivisionError

    with pytest.raises(ZeroDivisionError):
        write_whole(path, half())
    assert path.read_text(encoding="utf-8") == "old"
    assert [one.name for one in tmp_path.iterdir()] == ["page.html"]


def test_a_place_that_cannot_be_written_is_said_with_what_to_do(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("in the way")
    path = tmp_path / "file" / "page.html"
    with pytest.raises(StorageError) as error:
        write_whole(path, ["x"], "try elsewhere")
    assert str(error.value).startswith(f"{path}: ")
    assert str(error.value).endswith("; try elsewhere")


def test_half_a_character_out_of_a_file_name_is_no_reason_to_stop(tmp_path: Path) -> None:
    write_whole(tmp_path / "page.html", ["a\udcffb"])
    assert (tmp_path / "page.html").read_text(encoding="utf-8") == "a?b"


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="needs named pipes")
def test_a_pipe_is_written_into_and_stays_a_pipe(tmp_path: Path) -> None:
    pipe, read = tmp_path / "pipe", []
    os.mkfifo(pipe)
    reader = threading.Thread(target=lambda: read.append(pipe.read_text(encoding="utf-8")))
    reader.start()
    write_whole(pipe, ["into it"])
    reader.join(timeout=10)
    assert read == ["into it"]
    assert pipe.is_fifo()
