"""An answer on paper: what a written line says, in the order in which a composer asks.

`check_text` takes an answer as `melodycoach.report.check_data` makes it (docs/check-json.md describes
it) and nothing else. The sections are in `melodycoach.report.check_sections`.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from melodycoach.report.check_sections import SECTIONS
from melodycoach.report.check_words import (
    aim_words,
    outside_words,
    size_words,
    stays_words,
    tempo_words,
    verdict_words,
)
from melodycoach.report.text_lines import BLANK, MIN_COLUMNS, Row, heading, painted, table, wrapped
from melodycoach.report.words import capital, percent

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping

    from melodycoach.report.text_lines import Line

    Answer = Mapping[str, Any]

NEXT_LISTED = 3
"""So many modes are named behind the likeliest one."""

LEAST_LISTED = 0.01
"""Less likely ones are not."""


def check_text(answer: Answer, columns: int = 80, colour: bool = False) -> str:
    """Write the answer for one file.

    Parameters
    ----------
    answer
        The answer as data.
    columns
        Width to fill; taken for 40 where it is less. A word that is wider stands alone on its line.
    colour
        Stress what matters with the colours of a terminal. The words are the same without.

    Returns
    -------
    str
        No line end at its end, and no control character but those of the colours.
    """
    width = max(columns, MIN_COLUMNS)
    lines = _head(answer, width)
    for title, section in SECTIONS:
        body = section(answer, width)
        if body:
            lines += [BLANK, *heading(title(answer), width), *body]
    return painted(lines, colour)


def failed_text(failed: Answer, columns: int = 80) -> str:
    """Say why a file has no answer, and under it what there is to mend."""
    width = max(columns, MIN_COLUMNS)
    file, error = failed["file"], failed["error"]
    says = error if error.startswith(file) else f"{file}: {error}"
    lines = wrapped(says, width, rest="  ")
    for fault in failed["faults"] if failed["faults"] != [error] else ():
        lines += wrapped(fault, width, "  - ", "    ")
    return painted(lines, colour=False)


# --- what is said first


def _head(answer: Answer, width: int) -> list[Line]:
    title = answer["title"] or answer["file"]
    lines = [*heading(title, width, "="), *wrapped(_of_file(answer), width), BLANK]
    for style, sentence in _first_answers(answer):
        lines += wrapped(f"{capital(sentence)}.", width, style=style)
    read = [Row("read", says) for says in answer["read"]]
    return [*lines, BLANK, *table(read, width)] if read else lines


def _of_file(answer: Answer) -> str:
    """Say what was read."""
    facts = (answer["kind"], size_words(answer), tempo_words(answer))
    return f"{answer['file']}: {', '.join(fact for fact in facts if fact)}"


def _first_answers(answer: Answer) -> Iterator[tuple[str, str]]:
    """Give the answers to what is asked first, each with its style."""
    if answer["stay_in"] is not None:
        yield "heard" if answer["stay_in"]["stays"] else "off", stays_words(answer)
    for sentence in verdict_words(answer):
        yield "strong", sentence
    if answer["n_notes"]:
        yield from _likeliest(answer["whole"])
        if answer["in_view"]["is_target"]:
            yield "", aim_words(answer)
        yield "off" if answer["off_notes"] else "", outside_words(answer)
    if answer["lost"]:
        yield "off", "not all of the file could be read; what was lost is said at the end"


def _likeliest(whole: Answer) -> Iterator[tuple[str, str]]:
    """Name the modes behind the one that the verdict names; all of them where it names no one."""
    first = 1 if whole["decided"] else 0
    listed = whole["leanings"][first : first + NEXT_LISTED]
    likely = [
        f"{one['name']} {percent(one['probability'])}" for one in listed if one["probability"] >= LEAST_LISTED
    ]
    if likely:
        yield "faint", f"{'next likeliest' if first else 'the likeliest'}: {', '.join(likely)}"
