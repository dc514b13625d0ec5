"""Which files were saved, and which have gone, since they were last looked at."""

from __future__ import annotations

from itertools import islice
from typing import TYPE_CHECKING

from melodycoach.watching import Watch, stamp_of

if TYPE_CHECKING:
    from collections.abc import Callable
    from pathlib import Path


def saves(names: list[Path], steps: list[Callable[[], object]], n_told: int) -> tuple[list[str], int]:
    """Do one thing before each look; give what is told, and how many looks that took."""
    looks = iter(steps)
    done = 0

    def pause() -> None:
        nonlocal done
        done += 1
        next(looks)()

    told = Watch([str(name) for name in names], pause).sights()
    return [
        name.rpartition("/")[2] + ("" if is_there else " has gone") for name, is_there in islice(told, n_told)
    ], done


def nothing() -> None:
    """Let one look pass."""


def test_a_save_is_told_once_the_file_keeps_still(tmp_path: Path) -> None:
    path = tmp_path / "a"
    path.write_text("1")
    half, whole = (lambda: path.write_text("12")), (lambda: path.write_text("123"))
    assert saves([path], [nothing, half, whole, nothing], 1) == (["a"], 4)


def test_an_editor_that_puts_another_file_in_its_place_is_noticed(tmp_path: Path) -> None:
    path, other = tmp_path / "a", tmp_path / "b"
    path.write_text("1")

    def replaced() -> None:
        other.write_text("2")
        other.replace(path)

    assert saves([path], [replaced, nothing], 1) == (["a"], 2)


def test_a_file_that_is_missing_for_a_moment_is_waited_for(tmp_path: Path) -> None:
    path = tmp_path / "a"
    path.write_text("1")
    steps = [path.unlink, lambda: path.write_text("22"), nothing]
    assert saves([path], steps, 1) == (["a"], 3)


def test_a_file_that_has_gone_is_told_once_and_saved_when_it_is_back_even_as_it_was(tmp_path: Path) -> None:
    path, elsewhere = tmp_path / "a", tmp_path / "b"
    path.write_text("1")
    away, back = (lambda: path.rename(elsewhere)), (lambda: elsewhere.rename(path))
    steps = [away, nothing, nothing, nothing, back, nothing]
    assert saves([path], steps, 2) == (["a has gone", "a"], 6)


def test_a_file_that_goes_while_it_is_being_saved_is_not_told(tmp_path: Path) -> None:
    path = tmp_path / "a"
    path.write_text("1")
    steps = [lambda: path.write_text("22"), path.unlink, lambda: path.write_text("333"), nothing]
    assert saves([path], steps, 1) == (["a"], 4)


def test_each_of_several_files_is_told_as_often_as_it_is_saved(tmp_path: Path) -> None:
    a, b = tmp_path / "a", tmp_path / "b"
    a.write_text("1")
    b.write_text("1")

    def both() -> None:
        a.write_text("22")
        b.write_text("22")

    assert saves([a, b], [both, nothing, lambda: b.write_text("333"), nothing], 3) == (["a", "b", "b"], 4)


def test_a_missing_file_has_no_stamp(tmp_path: Path) -> None:
    assert stamp_of(tmp_path / "none") is None
