"""The sections of an answer on paper: each takes the answer and a width, and gives lines, or none.

`SECTIONS` lists them in the order in which a composer asks. A section that has nothing to say gives
no line, and its title is left out.
"""

from __future__ import annotations

from collections import Counter
from itertools import groupby
from typing import TYPE_CHECKING, Any

from melodycoach.core.verdict import percent
from melodycoach.report.page_words import beside, capital, counted, pitch, signed
from melodycoach.report.places import bars_words, place_words, scattered_words, stretch_words
from melodycoach.report.text_lines import Row, table, tied, wrapped

if TYPE_CHECKING:
    from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence

    from melodycoach.report.text_lines import Line

    Answer = Mapping[str, Any]

LONG = 24
"""Of a longer list of phrases, those in a row that say the same are told together."""

PLACES_LISTED = 40
"""So many places are given of a pitch that breaks the mode; the others are counted."""

NEAREST_LISTED = 3
"""So many modes are named that undecided bars come nearest to."""

MANY_PARTS = 5
"""Of more stretches changes and steps are told in short, with so many of the steps that are owed:"""

OWED_IN_SHORT = 2

_AGREES = {True: "agrees", False: "does not agree", None: "cannot be told"}
_NATS = "The numbers are nats: 0.7 doubles the odds, 2.3 makes them ten times as high."


# --- where it changes mode


def _changes(answer: Answer, width: int) -> list[Line]:
    notes, changes = answer["notes"], answer["changes"]
    by_first = {stretch["first"]: stretch for stretch in answer["stretches"]}
    told = _turn if len(changes) > MANY_PARTS else _turn_in_full
    rows = [
        Row(place_words(one["place"], one["note"]), told(one, by_first[one["note"]], notes))
        for one in changes
    ]
    return table(rows, width)


def _turn(change: Answer, stretch: Answer, notes: Sequence[Answer]) -> str:
    turns = "turns" if stretch["decided"] else "may turn"
    return f"{turns} from {change['from']} to {change['to']}, {percent(change['probability'])}"


def _turn_in_full(change: Answer, stretch: Answer, notes: Sequence[Answer]) -> str:
    says = _turn(change, stretch, notes)
    if not stretch["decided"]:
        says += f" ({stretch['verdict']})"
    noticed = change["noticed_at"]
    if noticed is None or noticed == change["note"]:
        return says
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
    """Say for each stretch what was heard and what is owed; with a target, for that over the whole line."""
    view, stretches = answer["in_view"], answer["stretches"]
    if view["is_target"]:
        aimed = [(f"{view['name']}, over the whole line", view)] if stretches else []
        stretches = [one for one in stretches if one["mode"] != view["mode"]]
    else:
        aimed = []
    parts = [*aimed, *((_title_of(one, answer["notes"]), one) for one in stretches)]
    if len(parts) > MANY_PARTS:
        return table([Row(title, _in_short(part["steps"])) for title, part in parts], width)
    return [line for title, part in parts for line in _part(title, part["steps"], width)]


def _title_of(stretch: Answer, notes: Sequence[Answer]) -> str:
    return f"{stretch['name']}, {stretch_words(notes, stretch['first'], stretch['last'])}"


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
    course = answer["course"]
    if course is None:
        return []
    rows = [
        Row(f"{key}: {_AGREES[course[key]['agrees']]}", course[key]["says"])
        for key in ("opening", "register", "cadence")
    ]
    ends = Counter(_phrase_end(end) for end in course["phrase_ends"])
    rests = ", ".join(tied(f"{end} {times}×" if times > 1 else end) for end, times in ends.items())
    if len(course["phrase_ends"]) > 1:
        rows.append(Row("phrases end on", rests))
    return table(rows, width)


def _course_title(answer: Answer) -> str:
    return f"{capital(beside('course', answer['words']))} beside that of {answer['course']['name']}"


def _phrase_end(end: Answer) -> str:
    name, does = end["pitch"]["name"], end["function"]
    return f"{name} ({does})" if does else f"{name}"


# --- the rival


def _rival(answer: Answer, width: int) -> list[Line]:
    rival = answer["rival"]
    if rival is None:
        return []
    lines: list[Line] = []
    for name, key in ((answer["in_view"]["name"], "for_leader"), (rival["name"], "for_rival")):
        lines += wrapped(f"for {name}{'' if rival[key] else ': nothing of weight'}", width, style="strong")
        lines += table([_reason(one, answer["notes"]) for one in rival[key]], width)
    return [*lines, *wrapped(_NATS, width, style="faint")]


def _reason(reason: Answer, notes: Sequence[Answer]) -> Row:
    where = scattered_words(notes, reason["notes"])
    return Row(signed(abs(reason["nats"])), f"{reason['says']}{f' ({where})' if where else ''}")


def _rival_title(answer: Answer) -> str:
    rival = answer["rival"]
    share = percent(rival["probability"])
    if rival["mode"] == answer["whole"]["mode"]:
        return f"{answer['in_view']['name']} against the likeliest: {rival['name']}, {share}"
    return f"The closest rival: {rival['name']}, {share}"


# --- phrase by phrase, bar by bar


def _phrases(answer: Answer, width: int) -> list[Line]:
    spans = answer["phrases"]
    if len(spans) < 2:
        return []
    groups = list(_alike(spans)) if len(spans) > LONG else [[span] for span in spans]
    rows = []
    for group in groups:
        where = stretch_words(answer["notes"], group[0]["first"], group[-1]["last"])
        says = group[0]["verdict"] if len(group) == 1 else f"{len(group)} phrases: {_in_common(group)}"
        rows.append(_span_row(where, says, group, answer))
    return table(rows, width)


def _bars(answer: Answer, width: int) -> list[Line]:
    rows = [
        _span_row(bars_words([bar["bar"] for bar in group]), _in_common(group), group, answer)
        for group in _alike(answer["bars"])
    ]
    return table(rows, width)


def _alike(spans: Iterable[Answer]) -> Iterator[list[Answer]]:
    """Join spans in a row that say the same."""
    for _, group in groupby(spans, key=_kind):
        yield list(group)


def _kind(span: Answer) -> tuple[object, ...]:
    return span["decided"] and span["name"], span["stretch_mode"], span["fits"], bool(span["off_notes"])


def _in_common(group: Sequence[Answer]) -> str:
    if group[0]["decided"]:
        return f"leaning to {group[0]['name']}"
    nearest = [name for name, _ in Counter(one["name"] for one in group).most_common()]
    more = ["…"] if len(nearest) > NEAREST_LISTED else []
    return f"undecided; nearest {', '.join(nearest[:NEAREST_LISTED] + more)}"


def _span_row(where: str, says: str, group: Sequence[Answer], answer: Answer) -> Row:
    """Say of spans that say the same whether they fit, where that is not plain."""
    span = group[0]
    n_off = sum(len(one["off_notes"]) for one in group)
    mode = answer["in_view"]["name"] if answer["in_view"]["is_target"] else span["stretch_mode"]
    if n_off:
        says += f"; {tied(counted(n_off, 'note'))} off the mode"
    elif not span["fits"]:
        says += f"; does not fit {mode}"
    elif len(answer["stretches"]) > 1:
        says += f"; fits {mode}"
    return Row(where, says, "" if span["fits"] else "off")


# --- how it was read


def _how(answer: Answer, width: int) -> list[Line]:
    rows = [Row("lost", says, "off") for says in answer["lost"]]
    rows += [Row("read", says) for says in answer["read"]]
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
    (lambda answer: f"Notes off the mode: {len(answer['off_notes'])}", _off_notes),
    (_fixed("Characteristic steps, heard and owed"), _steps),
    (_course_title, _course),
    (_rival_title, _rival),
    (_fixed("Phrase by phrase: what each says by itself"), _phrases),
    (_fixed("Bar by bar: what each says by itself"), _bars),
    (_fixed("How it was read"), _how),
)
"""Title and lines of each section."""
