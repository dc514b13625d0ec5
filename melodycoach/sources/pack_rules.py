"""What a mode pack must be: one table of rules, each with the sentence that a breach gets.

Conventions
-----------
A pack passes four gates. *Syntax* is the business of `tomllib`. The other three are in `RULES`:
for each kind of TOML table its rules in the order *shape* (keys and types), *range* (each value by
itself), *sense* (values against each other). A rule is tried only where it can be, with the shape
of every key that it reads in order. All faults are collected.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import IntEnum
from typing import TYPE_CHECKING, Any

from melodycoach.core.function import Function
from melodycoach.core.mode import Confidence, Course, Need, Repertoire, StepKind
from melodycoach.core.pitch import COMMAS_53, TONE_SYSTEMS, fold_name
from melodycoach.errors import nearest_names
from melodycoach.sources import pack_checks as checks
from melodycoach.sources.pack_checks import DEGREE_LISTS, Here, Known, Table, Test, shown

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator, Mapping, Sequence

FACTS = (
    "rising", "falling", "below", "above", "passing", "played", "dominants", "leading", "suspended",
    "course", "opening", "signature", "genera", "steps", "neighbours", "repertoire",
)  # fmt: skip
"""What a mode's sources may be given for."""

WORDS = (
    *(one.value for one in (Function.FINAL, Function.DOMINANT, Function.LEADING, Function.SUSPENDED)),
    "course",
    *(one.value for one in Course),
)
"""The English terms that a pack may give the trade's own word for: those that the program shows."""

_LONGEST_LABEL = 40


class Gate(IntEnum):
    """The gates after the syntax, in the order in which a value passes them."""

    SHAPE = 1
    RANGE = 2
    SENSE = 3


@dataclass(frozen=True, slots=True)
class Rule:
    """One line of the table: which gate, which key, what to test, what to say; and what it rests on.

    ``sentence`` takes the arguments of a breach as ``{0}``, ``{1}``…; ``needs`` names the other
    keys that the test reads; those of the table around it have a dot in front.
    """

    gate: Gate
    key: str
    test: Test
    sentence: str
    needs: tuple[str, ...] = ()
    when_absent: bool = False


# --- shape


def _is_text(value: object) -> bool:
    return isinstance(value, str)


def _is_whole(value: object) -> bool:
    return isinstance(value, int) and not isinstance(value, bool)


def _is_table(value: object) -> bool:
    return isinstance(value, dict)


def _list_of(fits: Callable[[object], bool]) -> Callable[[object], bool]:
    return lambda value: isinstance(value, list) and all(fits(one) for one in value)


_TYPES: Mapping[str, Callable[[object], bool]] = {
    "text": _is_text,
    "a whole number": _is_whole,
    "a list of whole numbers": _list_of(_is_whole),
    "a list of texts": _list_of(_is_text),
    "a table": _is_table,
    "a list of tables": _list_of(_is_table),
}


def _may(kind: str, *keys: str) -> tuple[Rule, ...]:
    """Keys that may be there, and then are of this kind."""
    fits = _TYPES[kind]
    test: Test = lambda value, here: [] if fits(value) else [(shown(value),)]  # noqa: E731
    return tuple(Rule(Gate.SHAPE, key, test, f"{key} is {{0}}, expected {kind}") for key in keys)


def _must(kind: str, *keys: str) -> tuple[Rule, ...]:
    """Keys that must be there, and be of this kind."""
    absent: Test = lambda value, here: [()] if value is None else []  # noqa: E731
    missing = (Rule(Gate.SHAPE, key, absent, f"{key} is missing, expected {kind}", (), True) for key in keys)
    return (*missing, *_may(kind, *keys))


def _range(key: str, test: Test, sentence: str) -> Rule:
    return Rule(Gate.RANGE, key, test, sentence)


def _sense(key: str, test: Test, sentence: str, *needs: str) -> Rule:
    return Rule(Gate.SENSE, key, test, sentence, needs)


# --- rules that several tables share

_NO_DEGREE = "{0}, which is no degree of the mode; the nearest are {1}"
_LISTS_AROUND = tuple(f".{key}" for key in DEGREE_LISTS)


def _displayed(*keys: str) -> tuple[Rule, ...]:
    says = "holds {0!r}, expected text that is not blank and has no control characters"
    return tuple(_range(key, checks.blank_or_unprintable, f"{key} {says}") for key in keys)


def _unique_id(kind: str) -> tuple[Rule, ...]:
    return (
        _range("id", checks.not_an_id, "id is {0!r}, expected small letters a-z, digits and single dashes"),
        _sense("id", checks.taken_id(kind), f"id {{0!r}} belongs to another {kind} too; give each its own"),
    )


def _degrees(*keys: str) -> Iterator[Rule]:
    for key in keys:
        yield _range(key, checks.outside_compass, f"{key} has {{0}}, expected degrees from {{1}} to {{2}}")


def _once(*keys: str) -> Iterator[Rule]:
    for key in keys:
        yield _range(key, checks.repeated, f"{key} has {{0}} more than once")


def _function(*keys: str) -> Iterator[Rule]:
    for key in keys:
        yield _sense(key, checks.no_degree_of_mode, f"{key} names {_NO_DEGREE}", *DEGREE_LISTS)


def _scale(key: str, *closes: str) -> tuple[Rule, ...]:
    few = f"{key} has {{0}} degrees, expected at least {{1}}"
    again = f"{key} has {{1}} after {{0}}, expected degrees in ascending order"
    return (
        _range(key, checks.shorter_than(5), few),
        _sense(key, checks.not_from_zero, f"{key} begins on {{0}}, expected 0 (the final)"),
        _sense(key, checks.not_rising, again),
        _sense(key, checks.wrong_end(*closes), f"{key} ends at {{0}}, expected {{1}}", *closes),
    )


# --- the table

RULES: Mapping[str, tuple[Rule, ...]] = {
    "pack file": (
        *_must("a table", "pack"),
        *_must("a list of tables", "mode"),
        *_may("a table", "words"),
        *_may("a list of tables", "perde", "source", "family"),
        _range("mode", checks.shorter_than(1), "no mode, expected at least one"),
    ),
    "pack": (
        *_must("text", "id", "name", "theory", "caution"),
        *_must("a whole number", "tone_system"),
        *_displayed("name", "theory", "caution"),
        _range("id", checks.not_an_id, "id is {0!r}, expected small letters a-z, digits and single dashes"),
        _range("tone_system", checks.not_one_of(TONE_SYSTEMS), "tone_system is {0}; {1}"),
    ),
    "words": (*_may("text", *WORDS), *_displayed(*WORDS)),
    "perde": (
        *_must("text", "name", "note"),
        *_displayed("name"),
        _range("note", checks.unreadable_note, "note is {0!r}, expected a written pitch such as 'B4-1'"),
        _sense("name", checks.taken_perde_name, "name {0!r} belongs to another perde too; give each its own"),
        _sense("note", checks.taken_perde_pitch, "note {0!r} is the pitch of another perde too"),
    ),
    "source": (*_must("text", "id", "kind", "title"), *_displayed("kind", "title"), *_unique_id("source")),
    "family": (*_must("text", "id", "name"), *_displayed("name"), *_unique_id("family")),
    "mode": (
        *_must("text", "id", "name", "final", "course"),
        *_must("a list of whole numbers", "rising", "dominants", "opening"),
        *_must("a list of tables", "step"),
        *_may("text", "family", "confidence", "repertoire"),
        *_may("a list of texts", "also", "signature"),
        *_may("a list of whole numbers", "falling", "below", "above", "passing", "leading", "suspended"),
        *_may("a whole number", "closes", "falling_closes"),
        *_may("a table", "played", "sources"),
        Rule(
            Gate.SHAPE, "played", checks.played_not_numbers, "played has {0} = {1}, expected degree = number"
        ),
        *_may("a list of tables", "genera", "neighbour"),
        *_displayed("name", "also"),
        *_unique_id("mode"),
        *_degrees(*DEGREE_LISTS),
        *_once("below", "above", "passing", "dominants", "leading", "suspended"),
        _range("final", checks.unreadable_note, "final is {0!r}, expected a written pitch such as 'F#4'"),
        _range("course", checks.not_one_of(Course), "course is {0!r}; {1}"),
        _range("confidence", checks.not_one_of(Confidence), "confidence is {0!r}; {1}"),
        _range("repertoire", checks.not_one_of(Repertoire), "repertoire is {0!r}; {1}"),
        _range("signature", checks.unreadable_sign, "signature has {0!r}, expected a sign such as 'B-1'"),
        _range("closes", checks.far_from_octave, "closes is {0}, expected within {1} of the octave ({2})"),
        _range("falling_closes", checks.far_from_octave, "falling_closes is {0}, expected within {1} of {2}"),
        _range("dominants", checks.shorter_than(1), "dominants is empty, expected at least one degree"),
        _range("step", checks.shorter_than(1), "no step, expected at least one characteristic step"),
        _range("opening", checks.not_a_region, "opening is {0}, expected two degrees, the lower one first"),
        _range("played", checks.played_far_off, "played has {0} = {1}, {2} cents off, expected at most {3}"),
        *_scale("rising", "closes"),
        *_scale("falling", "falling_closes", "closes"),
        _sense("below", checks.not_below_final, "below has {0}, expected degrees below 0 (the final)"),
        _sense("above", checks.not_above_scale, "above has {0}, expected degrees above {1}", "rising"),
        _sense("leading", checks.not_below_final, "leading has {0}, expected degrees below 0 (the final)"),
        *_function("dominants", "leading", "suspended", "played"),
        _sense("opening", checks.outside_mode, "opening has {0}, the mode spans {1} to {2}", *DEGREE_LISTS),
        _sense("signature", checks.letter_signed_twice, "signature has two signs for {0}"),
        _sense("name", checks.taken_name, "name {0!r} finds another mode too; give each its own", "also"),
        _sense("also", checks.taken_name, "also {0!r} finds another mode too; give each its own", "name"),
        _sense("family", checks.unknown_id("family"), "family {0!r} is not in the pack; {1}"),
    ),
    "genera": (
        *_must("text", "name"),
        *_must("a whole number", "at"),
        *_may("text", "when"),
        *_displayed("name", "when"),
        _range("at", checks.outside_compass, "at is {0}, expected a degree from {1} to {2}"),
    ),
    "step": (
        *_must("text", "kind", "need"),
        *_must("a list of whole numbers", "degrees"),
        *_may("text", "note"),
        *_displayed("note"),
        _range("kind", checks.not_one_of(StepKind), "kind is {0!r}; {1}"),
        _range("need", checks.not_one_of(Need), "need is {0!r}; {1}"),
        _range("degrees", checks.shorter_than(2), "degrees has {0}, expected at least {1} of them"),
        _sense("degrees", checks.note_again_at_once, "degrees has {0} twice running"),
        _sense("degrees", checks.no_degree_of_mode, f"degrees names {_NO_DEGREE}", *_LISTS_AROUND),
        _sense("degrees", checks.step_again, "the same kind and degrees as step[{0}]", "kind"),
    ),
    "neighbour": (
        *_must("text", "mode", "difference"),
        *_displayed("difference"),
        _sense("mode", checks.itself, "mode is the mode itself, expected another one"),
        _sense("mode", checks.unknown_id("mode"), "mode {0!r} is not in the pack; {1}"),
        _sense("mode", checks.neighbour_again, "mode {0!r} stands in neighbour[{1}] already"),
    ),
    "sources": (
        *_may("a list of texts", *FACTS),
        *(
            _sense(fact, checks.unknown_id("source"), f"{fact}: source {{0!r}} is not in the pack; {{1}}")
            for fact in FACTS
        ),
    ),
}

_CHILDREN: Mapping[str, tuple[str, ...]] = {
    "pack file": ("pack", "words", "perde", "source", "family", "mode"),
    "mode": ("genera", "step", "neighbour", "sources"),
}


# --- walking a file


def faults_in(data: Table, where: str) -> list[str]:
    """Give every fault of a parsed pack file, in the order of the file, with its place in front.

    Parameters
    ----------
    data
        What `tomllib` read.
    where
        What the file is called in the sentences.
    """
    top = Here(data, {}, _known(data))
    return list(_walk("pack file", top, f"{where}: ", frozenset()))


def _walk(kind: str, here: Here, where: str, misshapen_around: frozenset[str]) -> Iterator[str]:
    misshapen: set[str] = set()
    rules = RULES[kind]
    keys = {rule.key for rule in rules}
    for key in here.item:
        if key not in keys:
            yield f"{where}unknown key {key!r}; {nearest_names(key, keys)}"
    for rule in rules:
        value = here.item.get(rule.key)
        if value is None and not rule.when_absent:
            continue
        if not misshapen.isdisjoint((rule.key, *rule.needs)) or not misshapen_around.isdisjoint(rule.needs):
            continue
        found = [rule.sentence.format(*breach) for breach in rule.test(value, here)]
        if found and rule.gate is Gate.SHAPE:
            misshapen.add(rule.key)
        yield from (f"{where}{sentence}" for sentence in found)
    for key in _CHILDREN.get(kind, ()):
        yield from _walk_children(key, here, where, frozenset(f".{one}" for one in misshapen))


def _walk_children(kind: str, here: Here, where: str, misshapen: frozenset[str]) -> Iterator[str]:
    inside = here.item.get(kind)
    if isinstance(inside, dict):
        yield from _walk(kind, Here(inside, here.item, here.known), f"{where}{kind}: ", misshapen)
    elif isinstance(inside, list):
        for place, item in enumerate(inside):
            if isinstance(item, dict):
                name = item.get("id", item.get("mode", item.get("name")))
                shown = isinstance(name, str) and name.isprintable() and len(name) <= _LONGEST_LABEL
                label = f'{kind}[{place}] "{name}"' if shown else f"{kind}[{place}]"
                yield from _walk(kind, Here(item, here.item, here.known), f"{where}{label}: ", misshapen)


def _known(data: Table) -> Known:
    head = data.get("pack")
    divisions = head.get("tone_system") if isinstance(head, dict) else None
    system = TONE_SYSTEMS.get(divisions, COMMAS_53) if isinstance(divisions, int) else COMMAS_53
    perdes = list(_tables(data, "perde"))
    taken: dict[str, Sequence[str]] = {
        kind: [one["id"] for one in _tables(data, kind) if isinstance(one.get("id"), str)]
        for kind in ("mode", "source", "family")
    }
    taken["mode name"] = [name for mode in _tables(data, "mode") for name in checks.mode_names(mode)]
    taken["perde name"] = [fold_name(one["name"]) for one in perdes if isinstance(one.get("name"), str)]
    taken["perde pitch"] = [
        checks.pitch_key(one["note"], system) for one in perdes if isinstance(one.get("note"), str)
    ]
    return Known(system, taken)


def _tables(data: Table, kind: str) -> Iterator[dict[str, Any]]:
    items = data.get(kind)
    yield from (item for item in items if isinstance(item, dict)) if isinstance(items, list) else ()
