"""The sections of a page that hold the line against a mode: steps, course, and the closest rival."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from melodycoach.report.check_words import (
    NATS,
    how_sure,
    parts_of,
    place_of,
    rest_words,
    rival_sides,
    rival_title,
)
from melodycoach.report.page_blocks import folded, note_link, section, where
from melodycoach.report.page_html import Html, bullets, element, joined
from melodycoach.report.places import runs
from melodycoach.report.words import beside, capital, pitch, signed

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping, Sequence

    from melodycoach.report.check_words import Part
    from melodycoach.report.page_html import Content

_OWED = {"core": ("○", "core"), "usual": ("○", "usual"), "colour": ("+", "welcome, not owed")}
_COURSE = ("opening", "register", "cadence")
_AGREES = {True: ("✓", "agrees"), False: ("✗", "does not agree"), None: ("–", "cannot be told")}

MANY_PARTS = 3
"""Where more parts of the line are told of than this, each is folded at first."""


def steps(answer: Mapping[str, Any]) -> Html:
    """Say of each part which characteristic steps were heard, and which the line still owes."""
    told = [(part, _counts(part), _heard_and_owed(part.of["steps"])) for part in parts_of(answer)]
    return section("Characteristic steps", *_parts(told, answer), id_="steps")


def course(answer: Mapping[str, Any]) -> Html:
    """Say of each part how opening, register and cadence agree with its mode."""
    parts = [(part, part.course) for part in parts_of(answer) if part.course is not None]
    told = [(part, _agreements(course), _course(course)) for part, course in parts]
    return section(beside("course", answer["words"]), *_parts(told, answer), id_="course")


def _parts(told: Sequence[tuple[Part, str, Html]], answer: Mapping[str, Any]) -> Iterator[Html]:
    """Head what is told of each part with its mode; of many each is folded, and said in short."""
    folds = len(told) > MANY_PARTS
    for part, short, content in told:
        title = f"{part.of['name']} on {pitch(part.of['final'])}, {place_of(part, answer)}{how_sure(part)}"
        if part.first:
            head = element("summary", element("h3", title), f": {short}" if folds else None)
            yield element("details", head, content, class_="folded", open=not folds)
        else:
            yield element("h3", title)
            yield content


def _counts(part: Part) -> str:
    heard, owed = part.of["steps"]["heard"], part.of["steps"]["owed"]
    return f"{len(heard)} heard, {sum(one['need'] != 'colour' for one in owed)} owed"


def _agreements(of: Mapping[str, Any]) -> str:
    return ", ".join(f"{key} {_AGREES[of[key]['agrees']][1]}" for key in _COURSE)


def _heard_and_owed(of: Mapping[str, Any]) -> Html:
    heard = [_step("✓", one, one["need"], " · ", where(one["place"], one["heard_at"])) for one in of["heard"]]
    owed = [_step(sign, one, need) for one in of["owed"] for sign, need in [_OWED[one["need"]]]]
    return element(
        "div",
        _side("Heard", heard, "none yet", "step heard"),
        _side("Owed, the best to play next first", owed, "nothing", "step owed"),
        class_="two sides",
    )


def _side(title: str, items: Sequence[Html], nothing: str, class_: str) -> Html:
    shown = bullets(items, class_) if items else element("p", capital(nothing), ".")
    return element("div", element("p", element("strong", title)), shown)


def _step(sign: str, step: Mapping[str, Any], *tail: Content) -> Html:
    names, written = (" ".join(one[key] for one in step["notes"]) for key in ("name", "written"))
    played = names if names == written else f"{names} ({written})"
    return joined(
        [
            element("span", sign, class_="sign", aria_hidden="true"),
            capital(step["says"]),
            element("br"),
            played,
            element("br"),
            element("span", *tail, class_="quiet"),
        ]
    )


def _course(of: Mapping[str, Any]) -> Html:
    pairs: list[Content] = []
    for key in _COURSE:
        sign, says = _AGREES[of[key]["agrees"]]
        pairs += [
            element("dt", key, ": ", element("span", f"{sign} ", aria_hidden="true"), says),
            element("dd", capital(of[key]["says"])),
        ]
    ends = [
        joined([pitch(one["pitch"]), _function(one), ", ", where(one["place"], one["note"])])
        for one in of["phrase_ends"]
    ]
    tail = folded("Where phrases end", len(ends), bullets(ends), level="h4") if ends else None
    return joined([element("dl", *pairs), tail])


def _function(end: Mapping[str, Any]) -> str | None:
    return f", {end['function']}" if end["function"] else None


def rival(answer: Mapping[str, Any]) -> Html:
    """Name the closest rival, and what speaks for each."""
    if answer["rival"] is None:
        return section("The closest rival", element("p", "No other mode comes near."), id_="rival")
    sides = rival_sides(answer)
    rest = rest_words(answer)
    nats = element("p", NATS, class_="quiet") if rest or any(reasons for _, reasons in sides) else None
    told = (block for name, reasons in sides for block in _reasons(name, reasons))
    more = element("p", f"{capital(rest)}.") if rest else None
    return section(rival_title(answer), *told, more, nats, id_="rival")


def _reasons(name: str, reasons: Sequence[Mapping[str, Any]]) -> tuple[Html, Html]:
    """List what speaks for one of two modes; it is said under its name, so all of it counts upwards."""
    items = [
        joined([f"{signed(abs(one['nats']))} {capital(one['says'])}", *_at_notes(one["notes"])])
        for one in reasons
    ]
    shown = bullets(items) if items else element("p", "Nothing of weight.")
    return element("h3", f"What speaks for {name}"), shown


def _at_notes(notes: Sequence[int]) -> Iterator[Content]:
    """Lead to the notes that a reason speaks of; a run of them stands as its first and last."""
    if notes:
        links = (
            note_link(first) if first == last else joined([note_link(first), "–", note_link(last)])
            for first, last in runs(notes)
        )
        yield joined([" (", "note " if len(notes) == 1 else "notes ", joined(links, ", "), ")"])
