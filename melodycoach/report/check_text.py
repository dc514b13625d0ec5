"""An answer on paper: what a written line says, in the order in which a composer asks.

`check_text` takes an answer as `melodycoach.report.check_data` makes it (docs/check-json.md describes
it) and nothing else. The sections are in `melodycoach.report.check_sections`.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from melodycoach.core.verdict import percent
from melodycoach.report.check_sections import SECTIONS
from melodycoach.report.page_words import capital, counted, plain
from melodycoach.report.places import place_words
from melodycoach.report.text_lines import BLANK, MIN_COLUMNS, heading, painted, wrapped

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping

    from melodycoach.report.text_lines import Line

    Answer = Mapping[str, Any]

CHANGES_NAMED = 4
"""Of a line with more changes the modes are not named at once."""

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
    return lines


def _of_file(answer: Answer) -> str:
    """Say what was read."""
    bars = f" in {counted(len(answer['bars']), 'bar')}" if answer["bars"] else ""
    tempo = f", {plain(answer['tempo'])} beats a minute" if answer["tempo"] else ""
    return f"{answer['file']}: {answer['kind']}, {counted(answer['n_notes'], 'note')}{bars}{tempo}"


def _first_answers(answer: Answer) -> Iterator[tuple[str, str]]:
    """Give the answers to what is asked first, each with its style."""
    if answer["stay_in"] is not None:
        yield _stay_in(answer["stay_in"])
    yield "strong", _verdict(answer)
    if answer["n_notes"]:
        yield from _likeliest(answer["whole"])
        yield from _aimed_at(answer)
        if not answer["off_notes"]:
            yield "", f"no note lies outside {_judge(answer)}"
    if answer["lost"]:
        yield "off", "not all of the file could be read; what was lost is said at the end"


def _stay_in(asked: Answer) -> tuple[str, str]:
    if asked["stays"]:
        return "heard", f"stays in {asked['name']}"
    first = asked["first"]
    return "off", f"leaves {asked['name']} at {place_words(first['place'], first['note'])}: {first['says']}"


def _verdict(answer: Answer) -> str:
    """Say where the line leans; one that changes its mode, through which modes it goes."""
    verdict, n_changes = answer["whole"]["verdict"], len(answer["changes"])
    if not n_changes:
        return str(verdict)
    often = "once" if n_changes == 1 else f"{n_changes} times"
    names = ", then ".join(stretch["name"] for stretch in answer["stretches"])
    path = f": {names}" if n_changes <= CHANGES_NAMED else ""
    return f"as a whole {verdict}; it changes mode {often}{path}"


def _aimed_at(answer: Answer) -> Iterator[tuple[str, str]]:
    view, whole = answer["in_view"], answer["whole"]
    if not view["is_target"]:
        return
    share = [one["probability"] for one in whole["leanings"] if one["mode"] == view["mode"]]
    if whole["decided"] and whole["mode"] == view["mode"]:
        yield "", f"{view['name']} is the mode that it aims at"
    elif share:
        yield "", f"it aims at {view['name']}, {percent(share[0])} likely"
    else:
        yield "", f"it aims at {view['name']}, which is not among the modes that it was compared with"


def _likeliest(whole: Answer) -> Iterator[tuple[str, str]]:
    """Name the modes behind the one that the verdict names; all of them where it names no one."""
    first = 1 if whole["decided"] else 0
    listed = whole["leanings"][first : first + NEXT_LISTED]
    likely = [
        f"{one['name']} {percent(one['probability'])}" for one in listed if one["probability"] >= LEAST_LISTED
    ]
    if likely:
        yield "faint", f"{'next' if first else 'the likeliest'}: {', '.join(likely)}"


def _judge(answer: Answer) -> str:
    one_mode = answer["in_view"]["is_target"] or len(answer["stretches"]) == 1
    return answer["in_view"]["name"] if one_mode else "the mode of its stretch"
