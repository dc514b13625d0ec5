"""What an answer comes to, in the sentences that text, page and the report of a change share.

Each fact has one wording, here; the reports only choose where it stands. An answer is what
`melodycoach.report.check_data` makes.
"""

from __future__ import annotations

from itertools import groupby
from typing import TYPE_CHECKING, Any, NamedTuple

from melodycoach.report.places import stretch_words
from melodycoach.report.words import counted, listed, percent

if TYPE_CHECKING:
    from collections.abc import Iterable, Iterator, Mapping, Sequence

    Answer = Mapping[str, Any]

CHANGES_NAMED = 4
"""Of a line with more changes the modes are not named at once."""

LEAST_NATS = 0.2
"""Reasons that weigh less are not told."""

REASONS_TOLD = 5
"""So many are told for each of two modes."""

NATS = "A number says how strongly a reason speaks: 0.7 doubles the odds, 2.3 makes them ten times as high."


# --- where the line leans


def verdict_words(answer: Answer) -> str:
    """Say where the line leans; one that changes its mode may lean, as one, to a mode of no part of it."""
    whole, stretches = answer["whole"], answer["stretches"]
    if len(stretches) < 2:
        return str(whole["verdict"])
    if {stretch["mode"] for stretch in stretches} & {whole["mode"], *whole["among"]}:
        return f"as a whole {whole['verdict']}"
    names = list(dict.fromkeys(stretch["name"] for stretch in stretches))
    lean = f"lean to {listed(names)}" if len(names) <= CHANGES_NAMED else "lean to others"
    return f"taken as one, the line is {whole['verdict']}; its stretches {lean}"


def path_words(answer: Answer) -> str:
    """Say how often the mode changes, and through which modes the line goes; empty if it does not."""
    changes = answer["changes"]
    if not changes:
        return ""
    n_changes, n_clear = len(changes), sum(map(is_clear, changes))
    often = "once" if n_changes == 1 else f"{n_changes} times"
    if n_changes > CHANGES_NAMED:
        path = ""
    else:
        path = f": {', then '.join([changes[0]['from'], *map(turned_to, changes)])}"
    if 0 < n_clear < n_changes:
        return f"it changes mode {often}, {n_clear} of them clear{path}"
    return f"it {'changes' if n_clear else 'may change'} mode {often}{path}"


def aim_words(answer: Answer) -> str:
    """Say at which mode the line aims, and how near it comes; empty where nobody said."""
    view, whole = answer["in_view"], answer["whole"]
    if not view["is_target"]:
        return ""
    if whole["decided"] and whole["mode"] == view["mode"]:
        return f"{view['name']} is the mode that it aims at"
    share = [one["probability"] for one in whole["leanings"] if one["mode"] == view["mode"]]
    near = (
        f"{percent(share[0])} likely" if share else "which is not among the modes that it was compared with"
    )
    return f"it aims at {view['name']}, {near}"


# --- a change of mode


def is_clear(change: Answer) -> bool:
    """Tell whether the line turns for sure: to one mode, or to one of a family."""
    return bool(change["decided"] or change["family"])


def turned_to(change: Answer) -> str:
    """Name what the line turns to: a mode, or a family whose member is open."""
    return f"the {change['family']}" if change["family"] else str(change["to"])


# --- parts of the line that are held against a mode


class Part(NamedTuple):
    """Notes that are held against one mode: the whole line, or a stretch of it.

    ``of`` is the view or the stretch as the answer has it: ``name``, ``final``, ``steps``. A part that
    is the whole line has no ``first`` and ``last``.
    """

    of: Answer
    course: Answer | None
    first: int = 0
    last: int = 0


def parts_of(answer: Answer) -> list[Part]:
    """Give what is held against which mode: with a target the line, without one each of its stretches."""
    view, stretches = answer["in_view"], answer["stretches"]
    if view["is_target"]:
        return [Part(view, answer["course"])]
    if len(stretches) == 1:
        return [Part(stretches[0], stretches[0]["course"])]
    return [Part(one, one["course"], one["first"], one["last"]) for one in stretches]


def place_of(part: Part, answer: Answer) -> str:
    """Say which notes a part is."""
    return stretch_words(answer["notes"], part.first, part.last) if part.first else "over the whole line"


def how_sure(part: Part) -> str:
    """Say of a part that nobody aimed at, where it is so, that its mode is only the likeliest."""
    return "" if part.of.get("decided", True) else " (the likeliest, not decided)"


# --- the rival


def rival_title(answer: Answer) -> str:
    """Say which mode comes closest, to which other one."""
    view, rival = answer["in_view"], answer["rival"]
    share = percent(rival["probability"])
    if rival["mode"] == answer["whole"]["mode"]:
        return f"{view['name']} against the likeliest: {rival['name']}, {share}"
    where = ", over the whole line" if len(answer["stretches"]) > 1 else ""
    return f"The closest rival to {view['name']}{where}: {rival['name']}, {share}"


def rival_sides(answer: Answer) -> list[tuple[str, list[Answer]]]:
    """Name the mode in view and its rival, each with the reasons that weigh something, weightiest first."""
    rival = answer["rival"]
    sides = ((answer["in_view"]["name"], "for_leader"), (rival["name"], "for_rival"))
    return [
        (str(name), [one for one in rival[key] if abs(one["nats"]) >= LEAST_NATS][:REASONS_TOLD])
        for name, key in sides
    ]


# --- phrases and bars


def alike(spans: Iterable[Answer], answer: Answer) -> Iterator[list[Answer]]:
    """Join spans in a row of which the same is said."""
    for _, group in groupby(spans, key=lambda span: _kind(span, answer)):
        yield list(group)


def _kind(span: Answer, answer: Answer) -> tuple[object, ...]:
    return judge_of(span, answer), heard_in(span, answer), span["fits"], bool(span["off_notes"])


def judge_of(span: Answer, answer: Answer) -> str:
    """Name the mode that a span should be in: the target, else that of its stretch."""
    view = answer["in_view"]
    return str(view["name"] if view["is_target"] else span["stretch_mode"])


def heard_in(span: Answer, answer: Answer) -> str:
    """Name the mode that a span is heard in by itself, if that is clear and another than it should be in."""
    other = span["decided"] and span["name"] != judge_of(span, answer)
    return str(span["name"]) if other else ""


def span_words(group: Sequence[Answer], answer: Answer) -> str:
    """Say of spans of which the same is said what matters: what breaks the mode, what is heard elsewhere."""
    span, many = group[0], len(group) > 1
    judge, other = judge_of(span, answer), heard_in(span, answer)
    n_off = sum(len(one["off_notes"]) for one in group)
    if n_off:
        says = f"{counted(n_off, 'note')} off the mode"
    elif span["fits"]:
        says = f"{'fit' if many else 'fits'} {judge}"
    else:
        says = f"{'do' if many else 'does'} not fit {judge}"
    if not other:
        return says
    sure = "" if many else f", {percent(span['probability'])}"
    return f"{says}; by {'themselves' if many else 'itself'} leaning to {other}{sure}"
