"""A folder of answers: names that cannot clash or stray, an index, and everything as data."""

from __future__ import annotations

import json
from typing import TYPE_CHECKING

import pytest

from melodycoach import __version__
from melodycoach.check_pages import (
    DATA,
    DATA_SIGN,
    INDEX,
    LONGEST_NAME,
    PAGE_SIGN,
    page_names,
    refuse_to_lose_a_file,
    refuse_to_lose_files,
    write_pages,
)
from melodycoach.checking import Question, answers
from melodycoach.errors import StorageError
from melodycoach.report.check_data import check_json
from melodycoach.sources.pack_file import load_pack

if TYPE_CHECKING:
    from pathlib import Path

PACK = load_pack("makam")
QUESTION = Question(PACK, PACK.restrict(("huseyni", "rast")))


@pytest.mark.parametrize(
    ("files", "names"),
    [
        (["a.txt", "b/a.txt", "A.mid"], ["a.html", "a-2.html", "A-3.html"]),
        (["index.txt"], ["index-2.html"]),
        (["../../etc/passwd", "/", "..", "-"], ["passwd.html", "line.html", "line-2.html", "line-3.html"]),
        (["a b<c>.txt", "düğüm.mid"], ["a-b-c.html", "düğüm.html"]),
        ([".hidden", "a-2.txt", "a.txt", "a.mid"], ["hidden.html", "a-2.html", "a.html", "a-3.html"]),
        (["x" * 300 + ".txt"], ["x" * LONGEST_NAME + ".html"]),
        (["a\udcff\x1b.txt"], ["a.html"]),
    ],
)
def test_every_file_has_a_page_of_its_own_inside_the_folder(files: list[str], names: list[str]) -> None:
    assert list(page_names(files)) == names


def test_a_folder_has_a_page_a_file_and_an_index_and_the_data(tmp_path: Path) -> None:
    for name in ("a.txt", "b.txt"):
        (tmp_path / name).write_text(f"title: About {name}\nA4 E5 D5 C5 B4-1 A4:2 .", encoding="utf-8")
    (tmp_path / "bad.txt").write_text("A4 H9", encoding="utf-8")
    files = [str(tmp_path / name) for name in ("a.txt", "bad.txt", "b.txt")]
    found = list(answers(QUESTION, files))
    folder = tmp_path / "out"
    write_pages(folder, page_names(files), found)
    assert sorted(path.name for path in folder.iterdir()) == ["a.html", DATA, "b.html", INDEX]
    assert "About a.txt" in (folder / "a.html").read_text(encoding="utf-8")
    assert INDEX in (folder / "a.html").read_text(encoding="utf-8")  # a way back
    index = (folder / INDEX).read_text(encoding="utf-8")
    assert 'href="a.html"' in index
    assert "H9" in index
    data = json.loads((folder / DATA).read_text(encoding="utf-8"))
    assert data == check_json(found, __version__)


def test_a_second_run_replaces_the_first_and_leaves_other_files_alone(tmp_path: Path) -> None:
    (tmp_path / "a.txt").write_text("A4 E5 D5 .", encoding="utf-8")
    folder = tmp_path / "out"
    folder.mkdir()
    (folder / "mine.html").write_text("mine", encoding="utf-8")
    for _ in range(2):
        write_pages(folder, ["a.html"], answers(QUESTION, [str(tmp_path / "a.txt")]))
    assert (folder / "mine.html").read_text(encoding="utf-8") == "mine"
    assert len(json.loads((folder / DATA).read_text(encoding="utf-8"))["files"]) == 1


# --- what is not written onto ------------------------------------------------------------------


def test_all_that_was_written_is_known_again(tmp_path: Path) -> None:
    (tmp_path / "a.txt").write_text("title: <sha256-\nA4 E5 D5 .", encoding="utf-8")
    files, folder = [str(tmp_path / "a.txt")], tmp_path / "out"
    write_pages(folder, ["a.html"], answers(QUESTION, files))
    for name, sign in (("a.html", PAGE_SIGN), (INDEX, PAGE_SIGN), (DATA, DATA_SIGN)):
        assert (folder / name).read_text(encoding="utf-8").startswith(sign)
    refuse_to_lose_files(folder, ["a.html"], files)


def test_the_signs_are_too_long_to_be_met_by_chance() -> None:
    assert "Content-Security-Policy" in PAGE_SIGN
    assert "melodycoach-check" in DATA_SIGN


@pytest.mark.parametrize("name", ["a.html", INDEX, DATA])
@pytest.mark.parametrize("holds", ["<!DOCTYPE html>\n<html><p>mine</p></html>", '{"format": "another"}'])
def test_a_file_that_is_not_ours_is_not_replaced(tmp_path: Path, name: str, holds: str) -> None:
    mine = tmp_path / name
    mine.write_text(holds, encoding="utf-8")
    with pytest.raises(StorageError) as error:
        refuse_to_lose_files(tmp_path, ["a.html"], [])
    assert str(error.value).startswith(f"{mine}: holds something else, expected ")


@pytest.mark.parametrize("name", ["a.html", INDEX, DATA])
def test_a_file_that_is_checked_is_not_replaced(tmp_path: Path, name: str) -> None:
    mine = tmp_path / name
    mine.write_text(DATA_SIGN if name == DATA else PAGE_SIGN, encoding="utf-8")
    refuse_to_lose_files(tmp_path, ["a.html"], [])
    with pytest.raises(StorageError, match="is itself one of the files that are read"):
        refuse_to_lose_files(tmp_path, ["a.html"], [str(mine)])


def test_a_page_of_data_is_no_page_and_the_other_way_round(tmp_path: Path) -> None:
    page = tmp_path / "page.html"
    page.write_text(DATA_SIGN, encoding="utf-8")
    with pytest.raises(StorageError):
        refuse_to_lose_a_file(page, [])
    page.write_text(PAGE_SIGN, encoding="utf-8")
    refuse_to_lose_a_file(page, [])
    page.rename(tmp_path / DATA)
    with pytest.raises(StorageError):
        refuse_to_lose_files(tmp_path, [], [])
