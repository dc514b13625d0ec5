"""The answer to one file as one page: HTML that needs no network and no other file.

It is made from the data of `melodycoach.report.check_data` and from nothing else. What stands in the
page comes in the order in which a composer asks: does it hold, what was read, where, what else.
"""

from __future__ import annotations

from itertools import pairwise
from typing import TYPE_CHECKING, Any

from melodycoach.report import page_parts as parts
from melodycoach.report import page_sections as sections
from melodycoach.report.check_words import (
    aim_words,
    changes_words,
    headline,
    outside_words,
    size_words,
    sounds_elsewhere,
    tempo_words,
    verdict_words,
)
from melodycoach.report.page_blocks import where
from melodycoach.report.page_chances import DASHES
from melodycoach.report.page_chart import chart
from melodycoach.report.page_html import Html, bullets, element, joined
from melodycoach.report.page_ladder import guests
from melodycoach.report.page_script import POLICY, SCRIPT
from melodycoach.report.page_style import STYLE
from melodycoach.report.words import capital, short_percent

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping

    from melodycoach.report.page_html import Content

__all__ = ["check_page", "whole_page"]

_KEYS = (
    "Point at a note, or step into the chart with Tab: the arrow keys left and right go from note to note, "
    "up and down to the notes off the mode, and the numbers stand at the foot."
)

_MARKS = (
    ("cross", "M4 3l8 8m0 -8l-8 8", "off the mode"),
    ("ring", "M3 7a5 3.5 0 1 0 10 0a5 3.5 0 1 0 -10 0", "the perde that mends it"),
    ("tone rests", "M4 7h8", "the line rests on it"),
    ("breath", "M6 12l4 -10", "breath; two strokes: end of a phrase"),
    ("seam", "M8 0v14", "the mode changes: the name is what the notes behind it say by themselves"),
)
"""The marks of the chart: class, shape, meaning."""


def check_page(answer: Mapping[str, Any], index: str = "") -> str:
    """Write the page of one file.

    Parameters
    ----------
    answer
        One ANSWER of schema version 1; docs/check-json.md describes it.
    index
        Name of the page that lists all files, to link back to; empty for none.

    Returns
    -------
    str
        A whole HTML document, to be written as UTF-8.
    """
    title = answer["title"] or answer["file"]
    body = joined(
        [
            _header(answer, title, index),
            element("main", *_main(answer)),
            element(
                "footer",
                element("p", "Checked by melodycoach"),
            ),
            element("script", Html(SCRIPT)),
        ]
    )
    return whole_page(f"{title}: {headline(answer)}", body)


def _main(answer: Mapping[str, Any]) -> Iterator[Html | None]:
    """Give the sections, in the order in which a composer asks."""
    yield _verdict(answer)
    if answer["n_notes"]:
        yield _chart(answer)
        yield element("div", sections.changes(answer), sections.off_notes(answer), class_="two")
        yield parts.steps(answer)
        yield element("div", parts.course(answer), parts.rival(answer), class_="two")
        yield sections.phrases(answer)
        yield sections.bars(answer)
        yield element("div", sections.ladder(answer), sections.how(answer), class_="two")
        yield sections.notes(answer)
    else:
        yield sections.how(answer)


def whole_page(title: str, body: Html) -> str:
    """Put a body into a document with the style of all pages."""
    head = element(
        "head",
        element("meta", charset="utf-8"),
        element("meta", http_equiv="Content-Security-Policy", content=POLICY),
        element("meta", name="viewport", content="width=device-width, initial-scale=1"),
        element("meta", name="color-scheme", content="light dark"),
        element("title", title),
        element("style", Html(STYLE)),
    )
    return f"<!DOCTYPE html>\n{element('html', head, element('body', body), lang='en')}\n"


def _header(answer: Mapping[str, Any], title: str, index: str) -> Html:
    back = element("p", element("a", "all files", href=index), class_="hint") if index else None
    facts = [element("bdi", answer["file"]), answer["kind"], size_words(answer), tempo_words(answer)]
    return element(
        "header",
        back,
        element("h1", element("bdi", title)),
        element("p", joined([fact for fact in facts if fact], " · "), class_="quiet"),
    )


def _verdict(answer: Mapping[str, Any]) -> Html:
    first, *more = verdict_words(answer)
    return element(
        "section",
        element("h2", "The answer", class_="aside"),
        _stay_in(answer),
        element("p", capital(first), class_="verdict"),
        *(element("p", f"{capital(sentence)}.") for sentence in more),
        *(_at_a_glance(answer) if answer["n_notes"] else ()),
        sections.reading(answer),
        sections.leanings(answer["whole"]) if answer["n_notes"] else None,
        id="answer",
    )


def _at_a_glance(answer: Mapping[str, Any]) -> Iterator[Html]:
    """Give what is asked next: how near the line comes to its aim, how often it errs and turns."""
    aim, off, turns = aim_words(answer), capital(outside_words(answer)), changes_words(answer)
    if aim:
        yield element("p", f"{capital(aim)}.")
    glance = [
        element("a", off, href="#off-notes", class_="off") if answer["off_notes"] else off,
        element("a", turns, href="#changes") if answer["changes"] else turns,
    ]
    yield element("p", joined(glance, " · "), class_="glance")


def _stay_in(answer: Mapping[str, Any]) -> Html | None:
    """Answer whether the line stays in the mode that was asked for."""
    asked = answer["stay_in"]
    if asked is None:
        return None
    if asked["stays"]:
        return element("p", f"It stays in {asked['name']}.", class_="stays", data_stays="yes")
    if sounds_elsewhere(answer):
        why: tuple[Content, ...] = (f": {asked['first']['says']}.",)
    else:
        why = (".", *_leaves(asked["first"]))
    says = joined([f"It does not stay in {asked['name']}", *why])
    return element("p", says, class_="leaves", data_stays="no")


def _leaves(first: Mapping[str, Any]) -> Iterator[Content]:
    yield " It leaves first with "
    yield where(first["place"], first["note"])
    yield f": {first['says']}."


def _chart(answer: Mapping[str, Any]) -> Html:
    view, words = answer["in_view"], answer["words"]
    aim = ", the mode that it aims at" if view["is_target"] else ""
    final, dominant = words.get("final", "final"), words.get("dominant", "dominant")
    says = (
        f"The ladder at the left is that of {view['name']}{aim}: a full line is its {final}, a dashed one "
        f"its {dominant}. Below the line is how likely the modes are after each note, from 0 to 100 %, "
        "of the whole line up to there."
    )
    if guests(answer):
        says += " A dotted line is a perde that the melody uses and this ladder does not have."
    return element(
        "section",
        element("h2", "The line"),
        element("p", says, class_="quiet"),
        element("p", element("a", "All of it as a table", href="#notes"), class_="quiet hint"),
        element("p", _KEYS, class_="quiet hint", id="keys", hidden=True),
        _key(answer),
        chart(answer),
        element(
            "div",
            id="shown",
            role="status",
            aria_live="polite",
            class_="hint",
        ),
        id="line",
    )


def _key(answer: Mapping[str, Any]) -> Html:
    """Explain the marks that occur in this chart, and the line of each mode."""
    notes = answer["notes"]
    occurs = {
        "cross": bool(answer["off_notes"]),
        "ring": bool(answer["off_notes"]),
        "tone rests": any(note["rests"] for note in notes),
        "breath": any(one["phrase"] != two["phrase"] for one, two in pairwise(notes)),
        "seam": bool(answer["changes"]),
    }
    marks = [
        joined([_sample(16, element("path", d=shape, class_=name)), f" {says}"])
        for name, shape, says in _MARKS
        if occurs[name]
    ]
    last = answer["likelihoods"]["after"][-1] if notes else ()
    modes = [
        joined([_sample(28, _dashed(at)), f" {mode['name']} {short_percent(probability)}"])
        for at, (mode, probability) in enumerate(zip(answer["likelihoods"]["modes"], last, strict=False))
    ]
    return bullets([*marks, *modes], "key")


def _sample(width: int, drawing: Html) -> Html:
    return element("svg", drawing, width=width, height=14, aria_hidden="true")


def _dashed(at: int) -> Html:
    return element("line", x2=28, y1=7, y2=7, class_=f"mode-{at + 1}", stroke_dasharray=DASHES[at])
