"""The answers of `melodycoach check`, shown: as text, as JSON, as pages; and what the program ends with."""

from __future__ import annotations

import os
import sys
from pathlib import Path
from typing import TYPE_CHECKING, Any

from melodycoach.commands.exit_codes import ANSWER_IS_NO, BAD_INPUT, DONE
from melodycoach.commands.printing import Progress, columns, complain, json_text

if TYPE_CHECKING:
    import argparse
    from collections.abc import Iterable, Iterator, Sequence

_A_FILE = {"MIDI file": "a MIDI file", "MusicXML": "MusicXML"}
_WORDS = {"notation": "accidentals"}  # options of a file that have another name on the command line


def print_answers(options: argparse.Namespace, found: Iterable[dict[str, Any]]) -> int:
    """Print each answer when it is there, or all of them as one document."""
    kept: list[dict[str, Any]] = []
    said = False
    for one in found:
        kept.append(one if options.json else _outcome(one))
        if "error" in one:
            complain(one["error"], one["faults"])
            continue
        if not options.json and options.html != "-":
            print(f"\n{text_of(options, one)}" if said else text_of(options, one))
            said = True
        if options.html is not None:
            write_page(options.html, one)
    if options.json:
        print(json_text(_document(kept)))
    return _ended(options, kept)


def _outcome(answer: dict[str, Any]) -> dict[str, Any]:
    """Keep of an answer what the end depends on: many of them may come."""
    return {key: answer[key] for key in ("error", "kind", "stay_in") if key in answer}


def _ended(options: argparse.Namespace, kept: Sequence[dict[str, Any]]) -> int:
    """Name what was asked of no file, and give the exit code."""
    from melodycoach.sources.sheet_file import OPTION_KINDS

    kinds = {one.get("kind") for one in kept}
    for name, kind in OPTION_KINDS.items():
        if len(kept) > 1 and getattr(options, _WORDS.get(name, name)) and kind not in kinds:
            complain(
                f"--{_WORDS.get(name, name)} says nothing of these files: none of them is {_A_FILE[kind]}"
            )
    return _exit_code(kept)


def _exit_code(kept: Sequence[dict[str, Any]]) -> int:
    """Give 2 where a file could not be read, else 1 where a line does not stay, else 0."""
    if any("error" in one for one in kept):
        return BAD_INPUT
    strayed = any(one["stay_in"] is not None and not one["stay_in"]["stays"] for one in kept)
    return ANSWER_IS_NO if strayed else DONE


def _document(found: list[dict[str, Any]]) -> dict[str, Any]:
    from melodycoach import __version__
    from melodycoach.report.check_data import check_json

    return check_json(found, __version__)


def text_of(options: argparse.Namespace, answer: dict[str, Any]) -> str:
    """Write an answer as text, for this terminal."""
    from melodycoach.report.check_text import check_text

    return check_text(answer, columns(), colour=_in_colour(options.color))


def _in_colour(asked: str) -> bool:
    if asked != "auto":
        return asked == "always"
    plain = os.environ.get("NO_COLOR") or os.environ.get("TERM") == "dumb"
    return sys.stdout.isatty() and not plain


def refuse_to_lose_files(options: argparse.Namespace, files: Sequence[str]) -> None:
    """Refuse to write pages where something would be lost: before anything is answered.

    Raises
    ------
    StorageError
        A file that is checked, or that is no page of ours, stands there.
    """
    if options.out is not None:
        from melodycoach import check_pages

        check_pages.refuse_to_lose_files(Path(options.out), check_pages.page_names(files), files)
    elif options.html not in (None, "-"):
        from melodycoach import check_pages

        check_pages.refuse_to_lose_a_file(Path(options.html), files)


def write_page(name: str, answer: dict[str, Any]) -> None:
    """Write the page of an answer into a file, or print it where that is asked for."""
    from melodycoach.report.check_page import check_page

    if name == "-":
        print(check_page(answer))
        return
    from melodycoach.storing import write_whole

    write_whole(Path(name), [check_page(answer)])


def print_pages(options: argparse.Namespace, found: Iterable[dict[str, Any]], files: tuple[str, ...]) -> int:
    """Write a folder of pages, saying on a terminal how far that has come."""
    from melodycoach.check_pages import INDEX, page_names, write_pages

    progress, kept = Progress(), []

    def watched() -> Iterator[dict[str, Any]]:
        progress.files(0, len(files), files[0])
        for done, one in enumerate(found, 1):
            if "error" in one:
                progress.clear()
                complain(one["error"], one["faults"])
            progress.files(done, len(files), one["file"])
            kept.append(_outcome(one))
            yield one

    folder = Path(options.out)
    try:
        write_pages(folder, page_names(files), watched())
    finally:
        progress.clear()
    failed = sum("error" in one for one in kept)
    left = f", {failed} could not be read" if failed else ""
    print(f"{len(kept) - failed} of {len(kept)} files answered{left}; open {folder / INDEX}")
    return _ended(options, kept)
