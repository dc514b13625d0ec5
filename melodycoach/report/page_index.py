"""The page that lists many files, each with a short answer and a way to its own page."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from melodycoach.report.check_page import whole_page
from melodycoach.report.check_words import headline, stays_in_short
from melodycoach.report.page_html import Html, bullets, element, joined, table
from melodycoach.report.words import capital, counted

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from melodycoach.report.page_html import Content


@dataclass(frozen=True, slots=True)
class IndexEntry:
    """One file of a list.

    Parameters
    ----------
    file
        Its name, as it was given.
    page
        Name of its page, relative to the list; empty where it has none.
    title
        What the file calls itself, or empty.
    verdict
        The answer in one sentence; empty where there is an error.
    n_changes, n_off
        How many changes of mode, and how many notes off the mode.
    stay_in
        Whether it stays in the mode that was asked for, as a sentence; empty where none was.
    stays
        The same as yes or no; None where none was asked for.
    error, faults
        Why the file could not be read, and each fault of it.
    """

    file: str
    page: str = ""
    title: str = ""
    verdict: str = ""
    n_changes: int = 0
    n_off: int = 0
    stay_in: str = ""
    stays: bool | None = None
    error: str = ""
    faults: tuple[str, ...] = ()


def index_entry(answer: Mapping[str, Any], page: str = "") -> IndexEntry:
    """Make an entry of one ANSWER or FAILED of the schema.

    >>> index_entry({"file": "a.mid", "error": "a.mid: no notes", "faults": []}).error
    'a.mid: no notes'
    """
    if "error" in answer:
        return IndexEntry(answer["file"], error=answer["error"], faults=tuple(answer["faults"]))
    asked = answer["stay_in"]
    return IndexEntry(
        answer["file"],
        page,
        answer["title"],
        headline(answer),
        len(answer["changes"]),
        len(answer["off_notes"]),
        stays_in_short(answer) if asked else "",
        asked["stays"] if asked else None,
    )


def index_page(entries: Sequence[IndexEntry], title: str = "Lines checked") -> str:
    """Write the page that lists files.

    Parameters
    ----------
    entries
        The files in the order in which they shall stand.
    title
        What the list is called.

    Returns
    -------
    str
        A whole HTML document, to be written as UTF-8.
    """
    answered = [entry for entry in entries if not entry.error]
    failed = [entry for entry in entries if entry.error]
    body = joined(
        [
            element("header", element("h1", title), element("p", _summary(answered, failed), class_="quiet")),
            element("main", _answered(answered), _failed(failed)),
        ]
    )
    return whole_page(title, body)


def _summary(answered: Sequence[IndexEntry], failed: Sequence[IndexEntry]) -> str:
    parts = [counted(len(answered) + len(failed), "file")]
    asked = [entry.stays for entry in answered if entry.stays is not None]
    if asked:
        parts += [f"{sum(asked)} of {len(asked)} stay in the mode asked for"]
    if failed:
        parts += [f"{len(failed)} could not be read"]
    return ", ".join(parts)


def _answered(entries: Sequence[IndexEntry]) -> Html | None:
    if not entries:
        return None
    asked = any(entry.stay_in for entry in entries)
    heads = (
        "file",
        "title",
        "answer",
        "changes of mode",
        "notes off the mode",
        *(("asked",) if asked else ()),
    )
    rows = [_row(entry)[: len(heads)] for entry in entries]
    return element(
        "section", element("h2", "Answers"), table(heads, rows, "One file in each row"), id="answers"
    )


def _row(entry: IndexEntry) -> tuple[Content, ...]:
    name = element("bdi", entry.file)
    sign = {True: "✓ ", False: "✗ ", None: ""}[entry.stays]
    return (
        element("a", name, href=entry.page) if entry.page else name,
        entry.title,
        capital(entry.verdict),
        str(entry.n_changes),
        str(entry.n_off),
        f"{sign}{entry.stay_in}",
    )


def _failed(entries: Sequence[IndexEntry]) -> Html | None:
    if not entries:
        return None
    items = [
        joined([element("bdi", _failure(entry)), bullets(entry.faults) if entry.faults else None])
        for entry in entries
    ]
    return element("section", element("h2", "Could not be read"), bullets(items, "lost"), id="failed")


def _failure(entry: IndexEntry) -> str:
    """Give the error with the file it is about, once."""
    return entry.error if entry.error.startswith(entry.file) else f"{entry.file}: {entry.error}"
