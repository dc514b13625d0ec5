"""A folder of answers: a page for each file, one that leads to them, and all of them as data."""

from __future__ import annotations

import json
from pathlib import Path, PurePath
from typing import TYPE_CHECKING, Any

from melodycoach import __version__
from melodycoach.report.check_data import FORMAT, check_json
from melodycoach.report.check_page import check_page, whole_page
from melodycoach.report.page_html import Html
from melodycoach.report.page_index import IndexEntry, index_entry, index_page
from melodycoach.storing import refuse_to_lose, write_whole

if TYPE_CHECKING:
    from collections.abc import Iterable, Iterator, Sequence

INDEX, DATA = "index.html", "answers.json"
LONGEST_NAME = 80
"""The name of a page is cut after so many characters."""

PAGE_SIGN = whole_page("", Html("")).partition("sha256-")[0]
"""Every page of ours begins so, up to the name of its script: by this one of an older version is known."""

DATA_SIGN = json.dumps({"format": FORMAT})[:-1]
"""The data begin so."""


def page_names(files: Sequence[str]) -> tuple[str, ...]:
    """Give the name of the page of each file: like the file, plain, and no two the same.

    >>> page_names(["a.txt", "b/a.txt", "../index.mid"])
    ('a.html', 'a-2.html', 'index-2.html')
    """
    taken = {INDEX.casefold()}
    names: list[str] = []
    for file in files:
        stem = _plain(PurePath(file).stem)
        name, number = f"{stem}.html", 1
        while name.casefold() in taken:
            number += 1
            name = f"{stem}-{number}.html"
        taken.add(name.casefold())
        names.append(name)
    return tuple(names)


def _plain(stem: str) -> str:
    kept = "".join(c if c.isalnum() or c in "-_." else "-" for c in stem).strip("-.")
    return kept[:LONGEST_NAME] or "line"


def refuse_to_lose_a_file(page: Path, files: Sequence[str]) -> None:
    """Refuse to write a page onto one of the files that are checked, or onto what is no page of ours.

    Raises
    ------
    StorageError
        The file would be lost.
    """
    refuse_to_lose(page, [Path(name) for name in files], PAGE_SIGN)


def refuse_to_lose_files(folder: Path, names: Sequence[str], files: Sequence[str]) -> None:
    """Refuse the same of a folder of pages.

    Parameters
    ----------
    folder
        Where the pages are to be written.
    names
        The name of the page of each file.
    files
        The files that are checked.

    Raises
    ------
    StorageError
        A file would be lost.
    """
    for name in (*names, INDEX):
        refuse_to_lose_a_file(folder / name, files)
    refuse_to_lose(folder / DATA, [Path(name) for name in files], DATA_SIGN)


def write_pages(folder: Path, names: Sequence[str], answers: Iterable[dict[str, Any]]) -> None:
    """Write the pages, the index and the data into a folder.

    Every answer is written when it is there and then let go, so memory does not grow with their
    number.

    Parameters
    ----------
    folder
        It is made if it is not there; files of the same names are replaced (see `refuse_to_lose_files`).
    names
        The name of the page of each answer.
    answers
        One for each name; what could not be read has no page.

    Raises
    ------
    StorageError
        Something cannot be written.
    """
    entries: list[IndexEntry] = []

    def texts() -> Iterator[str]:
        opening, _, closing = json.dumps(check_json((), __version__)).partition("[]")
        yield f"{opening}["
        for name, answer in zip(names, answers, strict=True):
            if "error" not in answer:
                write_whole(folder / name, [check_page(answer, INDEX)])
            yield f"{',' if entries else ''}\n{json.dumps(answer, ensure_ascii=False)}"
            entries.append(index_entry(answer, name))
        yield f"\n]{closing}\n"

    write_whole(folder / DATA, texts())
    write_whole(folder / INDEX, [index_page(entries)])
