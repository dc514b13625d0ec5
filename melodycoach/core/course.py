"""How the course of a line agrees with a mode: where it opens, where it lies, how it comes to rest.

Each of the three is a `Trait`: whether it agrees, and a sentence that says what was found and what
the mode would have. A trait that cannot be told yet neither agrees nor disagrees.
"""

from __future__ import annotations

from dataclasses import dataclass
from statistics import median, median_low
from typing import TYPE_CHECKING

from melodycoach.core.evidence import OPENING_MARGIN_UNITS, OPENING_NOTES
from melodycoach.core.function import Function, find_degree, function_of, meant_units
from melodycoach.core.why import opening_place

if TYPE_CHECKING:
    from collections.abc import Sequence

    from melodycoach.core.mode import Mode
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
    model: ScoringModel,
    heard: Sequence[Heard],
    mode: Mode,
    final_units: int,
    phrases: Sequence[tuple[int, int]],
    first: int = 1,
) -> Course:
    """Hold a line, or a stretch of it, against the course of a mode.

    Parameters
    ----------
    model
        Gives names and tone system.
    heard
        Its notes, at least one.
    mode, final_units
        The mode, and where it stands, in units from A4.
    phrases
        First and last note of each phrase of the line, counted from 1.
    first
        The number of the first of ``heard`` in the line.
    """
    beside = _Beside(model, mode, final_units, tuple(heard))
    last = first + len(heard) - 1
    ends = sorted({*(end for _, end in phrases if first <= end <= last), last})
    told = tuple(beside.phrase_end(end, heard[end - first]) for end in ends)
    return Course(beside.opening(), beside.register(), beside.cadence(told[-1]), told)


@dataclass(frozen=True, slots=True)
class _Beside:
    """A line beside a mode that stands on a final."""

    model: ScoringModel
    mode: Mode
    final_units: int
    heard: tuple[Heard, ...]

    def heights(self) -> list[float]:
        """Give where the notes are meant to lie, in units from A4."""
        system = self.model.pack.system
        return [
            meant_units(self.mode, self.final_units, one.pitch_cents, one.kind, system) for one in self.heard
        ]

    def name(self, height: float) -> str:
        return self.model.pack.names.name_at(round(height))

    def opening(self) -> Trait:
        first, mode = self.heights()[:OPENING_NOTES], self.mode
        start = self.name(first[0])
        if len(first) < OPENING_NOTES:
            return Trait(None, f"too short to tell where it opens; it begins on {start}")
        low, high = mode.opening[0] - OPENING_MARGIN_UNITS, mode.opening[1] + OPENING_MARGIN_UNITS
        inside, begins = (low <= at - self.final_units <= high for at in (median(first), first[0]))
        if inside:
            region = " to ".join(self.name(self.final_units + edge) for edge in mode.opening)
            return Trait(True, f"it opens on {start}, in the region where {mode.name} opens: {region}")
        place = opening_place(mode, self.final_units, self.model)
        lies = f", but its first notes lie round {self.name(median_low(first))}" if begins else ""
        return Trait(False, f"it opens on {start}{lies}; {mode.name} opens {place}")

    def register(self) -> Trait:
        heights, mode = self.heights(), self.mode
        low, high = self.final_units + mode.degrees[0], self.final_units + mode.degrees[-1]
        margin = OPENING_MARGIN_UNITS
        outside = sum(not low - margin <= height <= high + margin for height in heights)
        reach = f"from {self.name(min(heights))} to {self.name(max(heights))}"
        compass = f"{self.name(low)} to {self.name(high)}"
        beyond = f", {outside} of {len(heights)} notes outside" if outside else ""
        agrees = outside <= (1 - INSIDE_SHARE) * len(heights)
        return Trait(agrees, f"it lies {reach}; the compass of {mode.name} is {compass}{beyond}")

    def cadence(self, end: PhraseEnd) -> Trait:
        word, last = self.model.pack.names.word("final"), self.name(end.height)
        if len(self.heard) < OPENING_NOTES:
            return Trait(None, f"too short to tell how it closes; it stops on {last}")
        if end.height == self.final_units:
            return Trait(True, f"it comes to rest on {last}, the {word} of {self.mode.name}")
        closes = self.heard[-1].closes
        ends_there = "ends" if closes else "stops, with no phrase end written,"
        karar = self.name(self.final_units)
        says = f"it {ends_there} on {last}; the {word} of {self.mode.name} is {karar}"
        return Trait(False if closes else None, says)

    def phrase_end(self, number: int, note: Heard) -> PhraseEnd:
        system = self.model.pack.system
        degree = find_degree(self.mode, self.final_units, note.pitch_cents, note.kind, system)
        function = function_of(self.mode, degree, system.divisions)
        told = self.model.pack.names.word(function.value)
        if function is Function.FINAL and degree:
            told = f"octave of the {told}"
        height = round(system.cents_to_units(note.pitch_cents))
        if degree is not None:
            height = self.final_units + degree
        return PhraseEnd(number, height, told)
