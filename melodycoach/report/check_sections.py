"""The sections of an answer on paper: each takes the answer and a width, and gives lines, or none.

`SECTIONS` lists them in the order in which a composer asks. A section that has nothing to say gives
no line, and its title is left out.
"""

from __future__ import annotations

from collections import Counter
from typing import TYPE_CHECKING, Any

from melodycoach.report.check_words import (
    NATS,
    alike,
    how_sure,
    off_title,
    parts_of,
    place_of,
    rest_words,
    rival_sides,
    rival_title,
    span_words,
)
from melodycoach.report.places import bars_words, place_words, scattered_words, stretch_words
from melodycoach.report.text_lines import Row, table, tied, wrapped
from melodycoach.report.words import beside, capital, pitch, signed

if TYPE_CHECKING:
    from collections.abc import Callable, Mapping, Sequence

    from melodycoach.report.check_words import Part
    from melodycoach.report.text_lines import Line

    Answer = Mapping[str, Any]

PLACES_LISTED = 40
"""So many places are given of a pitch that breaks the mode; the others are counted."""

MANY_PARTS = 5
"""Of more stretches changes and steps are told in short, with so many of the steps that are owed:"""

OWED_IN_SHORT = 2

_COURSE = ("opening", "register", "cadence")
_AGREES = {True: "agrees", False: "does not agree", None: "cannot be told"}


# --- where it changes mode


def _changes(answer: Answer, width: int) -> list[Line]:
    notes, changes = answer["notes"], answer["changes"]
    in_full = len(changes) <= MANY_PARTS
    rows = []
    for one in changes:
        says = _turn_in_full(one, notes) if in_full else str(one["says"])
        rows.append(Row(place_words(one["place"], one["note"]), says))
    return table(rows, width)


def _turn_in_full(change: Answer, notes: Sequence[Answer]) -> str:
    says, noticed = change["says"], change["noticed_at"]
    if noticed is None or noticed == change["note"]:
        return str(says)
    return f"{says}; a listener notices it at {tied(place_words(notes[noticed - 1], noticed))}"


# --- which notes break the mode


def _off_notes(answer: Answer, width: int) -> list[Line]:
    notes = [answer["notes"][number - 1] for number in answer["off_notes"]]
    alike: dict[tuple[str, str], list[Answer]] = {}
    for note in notes:
        alike.setdefault((note["written"], note["off"]["says"]), []).append(note)
    return table([_off_row(group) for group in alike.values()], width)


def _off_row(alike: Sequence[Answer]) -> Row:
    note = alike[0]
    off = note["off"]
    mend = pitch({"name": off["mend"], "written": off["mend_written"]})
    says = f"{pitch(note)} is {off['says']}; {mend} mends it"
    if len(alike) > 1:
        places = [tied(place_words(one, one["number"])) for one in alike[1:]]
        more = [f"{len(places) - PLACES_LISTED} more places"] if len(places) > PLACES_LISTED else []
        says += f". The same at {'; '.join(places[:PLACES_LISTED] + more)}"
    return Row(place_words(note, note["number"]), says, "off")


# --- characteristic steps


def _steps(answer: Answer, width: int) -> list[Line]:
    """Say of each part of the line which steps of its mode were heard, and which are owed."""
    parts = parts_of(answer) if answer["n_notes"] else []
    if len(parts) > MANY_PARTS:
        return table([Row(_title_of(part, answer), _in_short(part.of["steps"])) for part in parts], width)
    return [line for part in parts for line in _part(_title_of(part, answer), part.of["steps"], width)]


def _title_of(part: Part, answer: Answer) -> str:
    return f"{part.of['name']}, {place_of(part, answer)}{how_sure(part)}"


def _in_short(steps: Answer) -> str:
    owed = [step["says"] for step in _owed(steps)]
    more = [f"{len(owed) - OWED_IN_SHORT} more"] if len(owed) > OWED_IN_SHORT else []
    shown = "; ".join([*owed[:OWED_IN_SHORT], *more]) or "nothing"
    return f"{len(steps['heard'])} heard; owed: {shown}"


def _owed(steps: Answer) -> list[Answer]:
    return [step for step in steps["owed"] if step["need"] != "colour"]


def _part(title: str, steps: Answer, width: int) -> list[Line]:
    owed = _owed(steps)
    groups = (
        (
            "heard",
            [
                Row(place_words(step["place"], step["heard_at"]), step["says"], "heard")
                for step in steps["heard"]
            ],
        ),
        ("owed, the best to play next first", [Row(step["need"], _to_play(step), "owed") for step in owed]),
        (
            "welcome, not owed",
            [Row("-", _to_play(step)) for step in steps["owed"] if step not in owed],
        ),
    )
    lines = wrapped(title, width, style="strong")
    for name, rows in groups:
        if rows:
            lines += [*wrapped(name, width, "  ", style="faint"), *table(rows, width, "    ")]
    return lines


def _to_play(step: Answer) -> str:
    names, written = (" ".join(one[key] for one in step["notes"]) for key in ("name", "written"))
    played = names if names == written else f"{names} {tied(f'({written})')}"
    return f"{step['says']}; play {played}"


# --- the course


def _course(answer: Answer, width: int) -> list[Line]:
    parts = [(part, part.course) for part in parts_of(answer) if part.course is not None]
    if len(parts) > MANY_PARTS:
        return table(
            [Row(_title_of(part, answer), _course_in_short(course)) for part, course in parts], width
        )
    lines: list[Line] = []
    for part, course in parts:
        title = wrapped(_title_of(part, answer), width, style="strong") if len(parts) > 1 else []
        lines += [*title, *_course_of(course, width)]
    return lines


def _course_in_short(course: Answer) -> str:
    return "; ".join(f"{key} {_AGREES[course[key]['agrees']]}" for key in _COURSE)


def _course_of(course: Answer, width: int) -> list[Line]:
    rows = [Row(f"{key}: {_AGREES[course[key]['agrees']]}", course[key]["says"]) for key in _COURSE]
    ends = Counter(_phrase_end(end) for end in course["phrase_ends"])
    rests = ", ".join(tied(f"{end} {times}×" if times > 1 else end) for end, times in ends.items())
    if len(course["phrase_ends"]) > 1:
        rows.append(Row("phrases end on", rests))
    return table(rows, width)


def _course_title(answer: Answer) -> str:
    parts = parts_of(answer)
    whose = f"beside that of {parts[0].of['name']}" if len(parts) == 1 else "of each stretch"
    return f"{capital(beside('course', answer['words']))} {whose}"


def _phrase_end(end: Answer) -> str:
    name, does = end["pitch"]["name"], end["function"]
    return f"{name} ({does})" if does else f"{name}"


# --- the rival


def _rival(answer: Answer, width: int) -> list[Line]:
    if answer["rival"] is None:
        return []
    lines: list[Line] = []
    sides = rival_sides(answer)
    for name, reasons in sides:
        lines += wrapped(f"for {name}{'' if reasons else ': nothing of weight'}", width, style="strong")
        lines += table([_reason(one, answer["notes"]) for one in reasons], width)
    rest = rest_words(answer)
    lines += wrapped(rest, width)
    return lines + (wrapped(NATS, width, style="faint") if rest or any(told for _, told in sides) else [])


def _reason(reason: Answer, notes: Sequence[Answer]) -> Row:
    where = scattered_words(notes, reason["notes"])
    return Row(signed(abs(reason["nats"])), f"{reason['says']}{f' ({where})' if where else ''}")


# --- phrase by phrase, bar by bar


def _phrases(answer: Answer, width: int) -> list[Line]:
    spans = answer["phrases"]
    if len(spans) < 2:
        return []
    rows = []
    for group in alike(spans, answer):
        where = stretch_words(answer["notes"], group[0]["first"], group[-1]["last"])
        count = f", {len(group)} phrases" if len(group) > 1 else ""
        rows.append(_span_row(f"{where}{count}", group, answer))
    return table(rows, width)


def _bars(answer: Answer, width: int) -> list[Line]:
    rows = [
        _span_row(bars_words([bar["bar"] for bar in group]), group, answer)
        for group in alike(answer["bars"], answer)
    ]
    return table(rows, width)


def _span_row(where: str, group: Sequence[Answer], answer: Answer) -> Row:
    return Row(where, span_words(group, answer), "" if group[0]["fits"] else "off")


# --- how it was read


def _how(answer: Answer, width: int) -> list[Line]:
    rows = [Row("lost", says, "off") for says in answer["lost"]]
    facts = (
        ("pitch", answer["reading"]),
        ("compared", answer["compete"]),
        ("plain keys", answer["keyboard_note"]),
        ("theory", answer["theory"]),
        ("caution", answer["caution"]),
    )
    return table([*rows, *(Row(label, says) for label, says in facts if says)], width)


def _fixed(title: str) -> Callable[[Answer], str]:
    return lambda _: title


SECTIONS: tuple[tuple[Callable[[Answer], str], Callable[[Answer, int], list[Line]]], ...] = (
    (_fixed("Where it changes mode"), _changes),
    (lambda answer: f"{off_title(answer)}: {len(answer['off_notes'])}", _off_notes),
    (_fixed("Characteristic steps, heard and owed"), _steps),
    (_course_title, _course),
    (rival_title, _rival),
    (_fixed("Phrase by phrase"), _phrases),
    (_fixed("Bar by bar"), _bars),
    (_fixed("How it was read"), _how),
)
"""Title and lines of each section."""
