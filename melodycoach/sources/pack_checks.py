"""The tests behind the rules of a mode pack: what is wrong with one value of its TOML.

Conventions
-----------
A test gets the value of a key and a `Here`, and gives one tuple for each breach: the arguments of
the rule's sentence (see `melodycoach.sources.pack_rules`). No breach, no tuple. A test may trust
that the values it looks at have the right types, because shape is tested first.
"""

from __future__ import annotations

import re
from collections import Counter
from dataclasses import dataclass
from itertools import pairwise
from typing import TYPE_CHECKING, Any, TypeAlias

from melodycoach.core.pitch import LETTERS, Spelling, ToneSystem, fold_name
from melodycoach.errors import nearest_names, shorten

if TYPE_CHECKING:
    from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence

MAX_PLAYED_CENTS = 70.0
"""A played degree further from its theory degree than this is taken for a slip of the pen."""

DEGREE_LISTS = ("rising", "falling", "below", "above", "passing")
"""The keys of a mode that name its degrees."""

_ID = re.compile(r"[a-z0-9]+(-[a-z0-9]+)*")
_SPELLING = re.compile(r"([A-G])(#{0,2}|b{0,2})(\d?)([+-]\d{1,2})?")
_SHOWN_CHARACTERS = 48

Table: TypeAlias = "Mapping[str, Any]"
Breaches: TypeAlias = "Iterable[tuple[object, ...]]"
Test: TypeAlias = "Callable[[Any, Here], Breaches]"


@dataclass(frozen=True, slots=True)
class Known:
    """What the whole file offers to the rules of its parts.

    Parameters
    ----------
    system
        The pack's tone system.
    taken
        For each kind of thing that must be unique or exist (``mode``, ``source``, ``family``,
        ``perde name``, ``perde pitch``, ``mode name``) the keys in use, in order, repeats included.
    """

    system: ToneSystem
    taken: Mapping[str, Sequence[str]]


@dataclass(frozen=True, slots=True)
class Here:
    """Where a test stands: its TOML table, the one around it, and the whole file."""

    item: Table
    parent: Table
    known: Known

    @property
    def octave(self) -> int:
        """Units in the octave."""
        return self.known.system.divisions


def shown(value: object) -> str:
    """Write a value that was found, cut to what fits in a sentence."""
    return shorten(repr(value), _SHOWN_CHARACTERS)


def read_spelling(text: str, *, octave: bool) -> Spelling | None:
    """Read a written pitch such as ``B4-1``, or a sign at the clef such as ``B-1``; None if it is neither.

    >>> read_spelling("Bb4+1", octave=True)
    Spelling(letter='B', accidentals=-1, units=1, octave=4)
    >>> read_spelling("F#", octave=False)
    Spelling(letter='F', accidentals=1, units=0, octave=0)
    >>> read_spelling("H4", octave=True) is None, read_spelling("F#4", octave=False) is None
    (True, True)
    """
    found = _SPELLING.fullmatch(text)
    if found is None or bool(found[3]) is not octave:
        return None
    sign = 1 if found[2].startswith("#") else -1
    return Spelling(found[1], sign * len(found[2]), int(found[4] or 0), int(found[3] or 0))


def degrees_of(mode: Table) -> list[int]:
    """Every degree that a mode's table names, ascending."""
    return sorted({degree for key in DEGREE_LISTS for degree in mode.get(key, ())})


def pitch_key(note: str, system: ToneSystem) -> str:
    """Give a text that is the same for all spellings of one pitch."""
    spelling = read_spelling(note, octave=True)
    return str(system.spelling_units(spelling)) if spelling else note


def mode_names(mode: Table) -> Iterator[str]:
    """Every name that a mode answers to, folded, each once."""
    also = mode.get("also", ())
    names = [mode.get("id"), mode.get("name"), *(also if isinstance(also, list) else ())]
    yield from dict.fromkeys(fold_name(name) for name in names if isinstance(name, str))


def _texts(value: str | Sequence[str]) -> Sequence[str]:
    return [value] if isinstance(value, str) else value


# --- texts and words


def blank_or_unprintable(value: Any, here: Here) -> Breaches:
    """Find text that would not show, or that would upset a terminal."""
    return [(text,) for text in _texts(value) if not text.strip() or not text.isprintable()]


def not_an_id(value: Any, here: Here) -> Breaches:
    """Find an id with anything but small letters, digits and single dashes."""
    return [] if _ID.fullmatch(value) else [(value,)]


def not_one_of(words: Iterable[object]) -> Test:
    """Find a word outside a closed list."""
    known = tuple(words)
    return lambda value, here: [] if value in known else [(value, _nearest(value, known))]


def _nearest(value: object, known: Sequence[object]) -> str:
    if isinstance(value, str):
        return nearest_names(value, [str(word) for word in known])
    return "known: " + ", ".join(str(word) for word in known)


def unknown_id(kind: str) -> Test:
    """Find a reference to something that the pack does not define."""

    def test(value: Any, here: Here) -> Breaches:
        known = here.known.taken[kind]
        return [(one, nearest_names(one, known)) for one in _texts(value) if one not in known]

    return test


def taken_id(kind: str) -> Test:
    """Find an id that more than one table of the kind bears."""
    return lambda value, here: [(value,)] if list(here.known.taken[kind]).count(value) > 1 else []


def taken_name(value: Any, here: Here) -> Breaches:
    """Find a name that also finds another mode; spelling with or without diacritics is the same name."""
    count = Counter(here.known.taken["mode name"])
    return [(name,) for name in _texts(value) if count[fold_name(name)] > 1]


def taken_perde_name(value: Any, here: Here) -> Breaches:
    """Find a perde name that another perde bears."""
    return [(value,)] if list(here.known.taken["perde name"]).count(fold_name(value)) > 1 else []


def taken_perde_pitch(value: Any, here: Here) -> Breaches:
    """Find a pitch that another perde has."""
    key = pitch_key(value, here.known.system)
    return [(value,)] if list(here.known.taken["perde pitch"]).count(key) > 1 else []


def unreadable_note(value: Any, here: Here) -> Breaches:
    """Find a written pitch that cannot be read."""
    return [] if read_spelling(value, octave=True) else [(value,)]


def unreadable_sign(value: Any, here: Here) -> Breaches:
    """Find a sign at the clef that cannot be read, or that changes nothing."""
    for text in value:
        sign = read_spelling(text, octave=False)
        if sign is None or not (sign.accidentals or sign.units):
            yield (text,)


def letter_signed_twice(value: Any, here: Here) -> Breaches:
    """Find two signs for one letter."""
    count = Counter(text[:1] for text in value)
    return [(letter,) for letter in LETTERS if count[letter] > 1]


# --- degrees


def outside_compass(value: Any, here: Here) -> Breaches:
    """Find a degree more than one octave below the final or two above it."""
    low, high = -here.octave, 2 * here.octave
    degrees = [value] if isinstance(value, int) else value
    return [(degree, low, high) for degree in degrees if not low <= degree <= high]


def repeated(value: Any, here: Here) -> Breaches:
    """Find one entry of a list more than once."""
    return [(one,) for one, count in Counter(value).items() if count > 1]


def shorter_than(least: int) -> Test:
    """Find a list with too few entries."""
    return lambda value, here: [] if len(value) >= least else [(len(value), least)]


def not_from_zero(value: Any, here: Here) -> Breaches:
    """Find a scale that does not begin on the final."""
    return [] if value[:1] in ([0], []) else [(value[0],)]


def not_rising(value: Any, here: Here) -> Breaches:
    """Find a scale that steps back or stands still."""
    return [(low, high) for low, high in pairwise(value) if high <= low]


def wrong_end(*keys: str) -> Test:
    """Find a scale that ends neither on the octave nor on the degree that a key puts in its place."""

    def test(value: Any, here: Here) -> Breaches:
        key = next((key for key in keys if key in here.item), None)
        end = here.item[key] if key else here.octave
        wanted = f"{end} (as {key} says)" if key else f"{end} (one octave)"
        return [] if value[-1:] in ([end], []) else [(value[-1], wanted)]

    return test


def far_from_octave(value: Any, here: Here) -> Breaches:
    """Find a closing degree that is no stand-in for the octave."""
    far = here.octave // 4
    return [] if abs(value - here.octave) <= far else [(value, far, here.octave)]


def not_below_final(value: Any, here: Here) -> Breaches:
    """Find a degree that should lie under the final."""
    return [(degree,) for degree in value if degree >= 0]


def not_above_scale(value: Any, here: Here) -> Breaches:
    """Find a degree that should lie over the end of the scale."""
    last = max(here.item["rising"], default=0)
    return [(degree, last) for degree in value if degree <= last]


def no_degree_of_mode(value: Any, here: Here) -> Breaches:
    """Find a degree that the mode's lists do not name."""
    mode = here.parent if "degrees" in here.item else here.item
    named = degrees_of(mode)
    for degree in dict.fromkeys(int(one) for one in value):
        if degree not in named:
            near = sorted(sorted(named, key=lambda one: abs(one - degree))[:2])
            yield degree, " and ".join(str(one) for one in near)


def outside_mode(value: Any, here: Here) -> Breaches:
    """Find a degree below the mode's lowest or above its highest."""
    named = degrees_of(here.item) or [0]
    return [(degree, named[0], named[-1]) for degree in value if not named[0] <= degree <= named[-1]]


def not_a_region(value: Any, here: Here) -> Breaches:
    """Find anything but two degrees, the lower one first."""
    return [] if len(value) == 2 and value[0] < value[1] else [(value,)]


def played_not_numbers(value: Any, here: Here) -> Breaches:
    """Find an entry of `played` that is not a whole degree with a number."""
    for degree, played in value.items():
        whole = re.fullmatch(r"-?\d{1,3}", degree)
        if not whole or isinstance(played, bool) or not isinstance(played, int | float):
            yield degree if whole else shown(degree), shown(played)


def played_far_off(value: Any, here: Here) -> Breaches:
    """Find a usual intonation that is nowhere near its degree."""
    for degree, played in value.items():
        cents = abs(played - int(degree)) * here.known.system.unit_cents
        if not cents <= MAX_PLAYED_CENTS:
            yield degree, played, f"{cents:.0f}", f"{MAX_PLAYED_CENTS:.0f}"


# --- steps and neighbours


def note_again_at_once(value: Any, here: Here) -> Breaches:
    """Find the same degree twice running: a step says where the line goes, not how often it strikes."""
    return [(low,) for low, high in pairwise(value) if low == high]


def step_again(value: Any, here: Here) -> Breaches:
    """Find a step that the mode has already."""
    earlier = _before(here.item, here.parent["step"])
    mine = (here.item.get("kind"), value)
    return [(place,) for place, one in enumerate(earlier) if (one.get("kind"), one.get("degrees")) == mine]


def neighbour_again(value: Any, here: Here) -> Breaches:
    """Find a neighbour that the mode has already."""
    earlier = _before(here.item, here.parent["neighbour"])
    return [(value, place) for place, one in enumerate(earlier) if one.get("mode") == value]


def _before(item: Table, items: Sequence[Table]) -> Sequence[Table]:
    return items[: next(place for place, one in enumerate(items) if one is item)]


def itself(value: Any, here: Here) -> Breaches:
    """Find a mode named as its own neighbour."""
    return [()] if value == here.parent.get("id") else []
