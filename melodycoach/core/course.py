"""How the course of a line agrees with a mode: where it opens, where it lies, how it comes to rest.

Each of the three is a `Trait`: whether it agrees, and a sentence that says what was found and what
the mode would have. A trait that cannot be told yet neither agrees nor disagrees.
"""

from __future__ import annotations

from dataclasses import dataclass
from statistics import median
from typing import TYPE_CHECKING

from melodycoach.core.evidence import OPENING_MARGIN_UNITS, OPENING_NOTES
from melodycoach.core.function import find_degree, function_of, meant_units
from melodycoach.core.why import opening_place

if TYPE_CHECKING:
    from collections.abc import Sequence

    from melodycoach.core.judge import InView
    from melodycoach.core.model import ScoringModel
    from melodycoach.core.note import Heard

INSIDE_SHARE = 0.9
"""A line lies where its mode lies when so many of its notes are within the mode's compass."""


@dataclass(frozen=True, slots=True)
class Trait:
    """Whether one side of the course agrees with the mode (None: cannot be told), and a sentence."""

    agrees: bool | None
    says: str


@dataclass(frozen=True, slots=True)
class PhraseEnd:
    """A phrase that ends: its last note, where that is meant to lie in units from A4, and what it does."""

    number: int
    height: int
    function: str


@dataclass(frozen=True, slots=True)
class Course:
    """The course of a line beside that of a mode."""

    opening: Trait
    register: Trait
    cadence: Trait
    phrase_ends: tuple[PhraseEnd, ...]


def course_of(
    model: ScoringModel, heard: Sequence[Heard], view: InView, phrases: Sequence[tuple[int, int]]
) -> Course:
    """Hold a line against the course of a mode.

    Parameters
    ----------
    model
        Gives names and tone system.
    heard
        The notes of the line, at least one.
    view
        The mode, and where it stands.
    phrases
        First and last note of each phrase, counted from 1.
    """
    ends = tuple(_phrase_end(model, heard, view, last) for _, last in phrases)
    return Course(
        opening=_opening(model, heard, view),
        register=_register(model, heard, view),
        cadence=_cadence(model, heard, view, ends[-1]),
        phrase_ends=ends,
    )


def _heights(model: ScoringModel, heard: Sequence[Heard], view: InView) -> list[float]:
    system = model.pack.system
    return [meant_units(view.mode, view.final_units, one.pitch_cents, one.kind, system) for one in heard]


def _opening(model: ScoringModel, heard: Sequence[Heard], view: InView) -> Trait:
    names, mode = model.pack.names, view.mode
    first = _heights(model, heard[:OPENING_NOTES], view)
    low, high = mode.opening
    inside = low - OPENING_MARGIN_UNITS <= median(first) - view.final_units <= high + OPENING_MARGIN_UNITS
    start = names.name_at(round(first[0]))
    if len(first) < OPENING_NOTES:
        return Trait(None, f"too short to tell where it opens; it begins on {start}")
    place = opening_place(mode, view.final_units, model)
    return Trait(inside, f"it opens on {start}; {mode.name} opens {place}")


def _register(model: ScoringModel, heard: Sequence[Heard], view: InView) -> Trait:
    names, mode = model.pack.names, view.mode
    heights = _heights(model, heard, view)
    low, high = (view.final_units + degree for degree in (mode.degrees[0], mode.degrees[-1]))
    margin = OPENING_MARGIN_UNITS
    outside = sum(not low - margin <= height <= high + margin for height in heights)
    reach = f"from {names.name_at(round(min(heights)))} to {names.name_at(round(max(heights)))}"
    compass = f"{names.name_at(low)} to {names.name_at(high)}"
    beyond = f", {outside} of {len(heights)} notes outside" if outside else ""
    agrees = outside <= (1 - INSIDE_SHARE) * len(heights)
    return Trait(agrees, f"it lies {reach}; the compass of {mode.name} is {compass}{beyond}")


def _cadence(model: ScoringModel, heard: Sequence[Heard], view: InView, end: PhraseEnd) -> Trait:
    names = model.pack.names
    karar = names.name_at(view.final_units)
    word = names.word("final")
    last = names.name_at(end.height)
    if end.height == view.final_units:
        return Trait(True, f"it comes to rest on {last}, the {word} of {view.mode.name}")
    ends_there = "ends" if heard[-1].closes else "stops, with no phrase end written,"
    agrees = False if heard[-1].closes else None
    return Trait(agrees, f"it {ends_there} on {last}; the {word} of {view.mode.name} is {karar}")


def _phrase_end(model: ScoringModel, heard: Sequence[Heard], view: InView, number: int) -> PhraseEnd:
    note, system = heard[number - 1], model.pack.system
    degree = find_degree(view.mode, view.final_units, note.pitch_cents, note.kind, system)
    function = function_of(view.mode, degree, system.divisions)
    height = round(system.cents_to_units(note.pitch_cents))
    if degree is not None:
        height = view.final_units + degree
    return PhraseEnd(number, height, model.pack.names.word(function.value))
