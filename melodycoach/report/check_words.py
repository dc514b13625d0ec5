"""What an answer comes to, in the sentences that text, page and the report of a change share.

Each fact has one wording, here; the reports only choose where it stands. An answer is what
`melodycoach.report.check_data` makes.
"""

from __future__ import annotations

from itertools import groupby
from typing import TYPE_CHECKING, Any, NamedTuple

from melodycoach.report.places import place_words, stretch_words
from melodycoach.report.words import counted, listed, percent, plain, times

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


# --- what was read


def size_words(answer: Answer) -> str:
    """Say how long the line is."""
    bars = f" in {counted(len(answer['bars']), 'bar')}" if answer["bars"] else ""
    return f"{counted(answer['n_notes'], 'note')}{bars}"


def tempo_words(answer: Answer) -> str:
    """Say how fast the line is; empty where the file does not."""
    return f"{plain(answer['tempo'])} beats a minute" if answer["tempo"] else ""


# --- where the line leans


def verdict_words(answer: Answer) -> list[str]:
    """Say in which mode the line is: in the first sentence, and what else is to be said of that.

    Of a line that turns for sure the modes that it goes through are the answer, and where it leans
    taken as one comes second; of one that only may turn it is the other way round.
    """
    whole = answer["whole"]["verdict"]
    if not answer["changes"]:
        return [whole]
    path = path_words(answer)
    if any(map(is_clear, answer["changes"])):
        return [path, f"taken as one, the line is {whole}"]
    return [f"as a whole {whole}", path]


def headline(answer: Answer) -> str:
    """Say in one sentence in which mode the line is."""
    return verdict_words(answer)[0]


def path_words(answer: Answer) -> str:
    """Name the modes that the line goes through in turn; of too many, how often it changes and between which.

    What the line only may turn to stands behind ``perhaps``.
    """
    changes = answer["changes"]
    steps = [("" if is_clear(one) else "perhaps ") + turned_to(one) for one in changes]
    path = ", then ".join([changes[0]["from"], *steps])
    n_clear = sum(map(is_clear, changes))
    if len(changes) <= CHANGES_NAMED:
        return path if n_clear else f"it may change mode: {path}"
    names = list(dict.fromkeys([changes[0]["from"], *map(turned_to, changes)]))
    between = f", between {listed(names)}" if len(names) <= CHANGES_NAMED else ""
    return f"it {_how_often(n_clear, len(changes) - n_clear)}{between}"


def _how_often(n_clear: int, n_open: int) -> str:
    if not n_clear:
        return f"may change mode {times(n_open)}"
    more = f", and perhaps {times(n_open)} more" if n_open else ""
    return f"changes mode {times(n_clear)}{more}"


def changes_words(answer: Answer) -> str:
    """Count the changes of mode."""
    if not answer["changes"]:
        return "no change of mode"
    n_clear = sum(map(is_clear, answer["changes"]))
    n_open = len(answer["changes"]) - n_clear
    clear = counted(n_clear, "change of mode", "changes of mode")
    if not n_open:
        return clear
    return (
        f"{clear}, {n_open} more possible"
        if n_clear
        else counted(n_open, "possible change of mode", "possible changes of mode")
    )


def aim_words(answer: Answer) -> str:
    """Say at which mode the line aims, and how near it comes; empty where nobody said."""
    view, whole = answer["in_view"], answer["whole"]
    if not view["is_target"]:
        return ""
    if whole["decided"] and whole["mode"] == view["mode"]:
        return f"{view['name']} is the mode that it aims at"
    share = [one["probability"] for one in whole["leanings"] if one["mode"] == view["mode"]]
    if not share:
        return f"it aims at {view['name']}, which is not among the modes that it was compared with"
    over = " over the whole line" if answer["changes"] else ""
    return f"it aims at {view['name']}, {percent(share[0])} likely{over}"


def judge_words(answer: Answer) -> str:
    """Name what the notes are judged by: a mode, or of several stretches that of each."""
    view = answer["in_view"]
    return "the mode of its stretch" if _judged_apart(answer) else str(view["name"])


def _judged_apart(answer: Answer) -> bool:
    return not answer["in_view"]["is_target"] and len(answer["stretches"]) > 1


def off_title(answer: Answer) -> str:
    """Head the list of notes that break what they are judged by."""
    return f"Notes off the mode{' of their stretch' if _judged_apart(answer) else ''}"


def outside_words(answer: Answer) -> str:
    """Count the notes that break what they are judged by."""
    n_off = len(answer["off_notes"])
    open_ = not (answer["in_view"]["is_target"] or answer["whole"]["decided"] or _judged_apart(answer))
    lie = counted(n_off, "note lies", "notes lie") if n_off else "no note lies"
    return f"{lie} outside {judge_words(answer)}{', the likeliest' if open_ else ''}"


# --- whether it stays in its mode


def stays_words(answer: Answer) -> str:
    """Answer whether the line stays in the mode that was asked about; where it leaves it, and why."""
    asked = answer["stay_in"]
    why = "" if asked["stays"] else f": {asked['first']['says']}"
    return f"{stays_in_short(answer)}{why}"


def stays_in_short(answer: Answer) -> str:
    """Answer whether the line stays in the mode that was asked about, and where it leaves it."""
    asked = answer["stay_in"]
    if asked["stays"]:
        return f"stays in {asked['name']}"
    if sounds_elsewhere(answer):
        return f"does not stay in {asked['name']}"
    return f"leaves {asked['name']} at {place_words(asked['first']['place'], asked['first']['note'])}"


def sounds_elsewhere(answer: Answer) -> bool:
    """Tell whether no one place leaves the mode that was asked about: the line sounds like another."""
    first = answer["stay_in"]["first"]
    return bool(first["note"] == 1 and answer["notes"][0]["off"] is None)


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


def rest_words(answer: Answer) -> str:
    """Say what all reasons that are not told add up to, and for which mode; empty where that is little."""
    rival = answer["rival"]
    listed_nats = sum(one["nats"] for key in ("for_leader", "for_rival") for one in rival[key])
    told_nats = sum(one["nats"] for _, reasons in rival_sides(answer) for one in reasons)
    rest = rival["rest_nats"] + listed_nats - told_nats
    if abs(rest) <= LEAST_NATS:
        return ""
    name = answer["in_view"]["name"] if rest > 0 else rival["name"]
    return f"all the rest together, for {name}: {abs(rest):.1f}"


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
