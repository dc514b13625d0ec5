"""Files are written whole or not at all."""

from __future__ import annotations

import os
import sys
import threading
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from melodycoach.errors import StorageError
from melodycoach.storing import refuse_to_lose, write_whole

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


def test_an_error_from_within_is_told_as_it_is(tmp_path: Path) -> None:
    def failing() -> Iterator[str]:
        yield "one"
        raise StorageError("Page.html: no space left; choose another place")

    with pytest.raises(StorageError, match=r"^Page\.html: no space left; choose another place$"):
        write_whole(tmp_path / "a.json", failing())


def test_a_file_that_looks_like_one_half_written_is_left_alone(tmp_path: Path) -> None:
    mine = tmp_path / "page.html.unfinished"
    mine.write_text("mine", encoding="utf-8")
    write_whole(tmp_path / "page.html", ["page"])
    assert mine.read_text(encoding="utf-8") == "mine"
    assert sorted(one.name for one in tmp_path.iterdir()) == ["page.html", "page.html.unfinished"]


def test_a_name_that_is_too_long_is_said(tmp_path: Path) -> None:
    path = tmp_path / ("x" * 400)
    for wanted in (lambda: write_whole(path, ["x"]), lambda: refuse_to_lose(path, [], "sign")):
        with pytest.raises(StorageError, match="name too long"):
            wanted()


# --- what is not written onto ------------------------------------------------------------------


@pytest.mark.parametrize("holds", ["", "sign", "sign, and more", None])
def test_what_was_written_here_and_what_is_empty_or_not_there_may_be_replaced(
    tmp_path: Path, holds: str | None
) -> None:
    path = tmp_path / "page.html"
    if holds is not None:
        path.write_text(holds, encoding="utf-8")
    refuse_to_lose(path, [tmp_path / "draft.txt", tmp_path / "none.txt"], "sign")


@pytest.mark.parametrize("holds", ["A4 B4 .", "sig", "Sign", " sign"])
def test_what_was_not_written_here_is_not_replaced(tmp_path: Path, holds: str) -> None:
    path = tmp_path / "page.html"
    path.write_text(holds, encoding="utf-8")
    with pytest.raises(StorageError) as error:
        refuse_to_lose(path, [], "sign")
    assert str(error.value) == (
        f"{path}: holds something else, expected no file yet or one that was written here before; "
        "name another place, or move it away"
    )


@pytest.mark.parametrize("way", ["itself", "symlink", "link", "dots"])
def test_a_file_that_is_read_is_not_written_onto_by_whatever_name(tmp_path: Path, way: str) -> None:
    draft, other = tmp_path / "draft.txt", tmp_path / "other.txt"
    draft.write_text("sign", encoding="utf-8")  # even if it could be a page of ours
    if way == "symlink":
        other.symlink_to(draft)
    elif way == "link":
        os.link(draft, other)
    else:
        other = draft if way == "itself" else tmp_path / "." / ".." / tmp_path.name / "draft.txt"
    with pytest.raises(StorageError) as error:
        refuse_to_lose(other, [tmp_path / "none.txt", draft], "sign")
    assert str(error.value) == (
        f"{other}: is itself one of the files that are read, expected a file of its own to write into; "
        "name another place"
    )


def test_what_is_no_ordinary_file_is_written_into(tmp_path: Path) -> None:
    refuse_to_lose(tmp_path, [], "sign")  # a folder: the writing says what is wrong
    if sys.platform != "win32":
        refuse_to_lose(Path("/dev/null"), [], "sign")
