"""Modes as data: what a pack says of each mode, checked once and then trusted.

Conventions
-----------
A *degree* is a pitch of a mode in units (commas or semitones) above its final; below the final it
is negative. ``final_units`` is the written final, in units from A4. Nothing here knows the name of
a tradition or of a mode.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from enum import StrEnum
from functools import cached_property
from typing import TYPE_CHECKING

from melodycoach.core.pitch import PitchNames, Spelling, ToneSystem, fold_name
from melodycoach.errors import UnknownModeError, nearest_names

if TYPE_CHECKING:
    from collections.abc import Mapping


class Course(StrEnum):
    """Where a line opens and how it moves: the seyir."""

    ASCENDING = "ascending"
    ASCENDING_DESCENDING = "ascending-descending"
    DESCENDING = "descending"


class Repertoire(StrEnum):
    """How often the trade's repertoire uses a mode: what a listener expects before the first note."""

    COMMON = "common"
    OCCASIONAL = "occasional"
    RARE = "rare"


class StepKind(StrEnum):
    """What a characteristic step does in its mode."""

    OPENING = "opening"
    HALF_CADENCE = "half cadence"
    SUSPENDED_CADENCE = "suspended cadence"
    LEADING_TONE = "leading tone"
    ALTERATION = "alteration"
    REGISTER = "register"
    COLOUR_INTERVAL = "colour interval"
    FINAL_CADENCE = "final cadence"


class Need(StrEnum):
    """How much a phrase owes a step: core is indispensable, usual expected, colour optional."""

    CORE = "core"
    USUAL = "usual"
    COLOUR = "colour"


class Confidence(StrEnum):
    """How well the sources of a definition agree."""

    HIGH = "high"
    MEDIUM = "medium"
    LOW = "low"


@dataclass(frozen=True, slots=True)
class Genus:
    """A tetrachord, pentachord or trichord: its name, where it stands, when it is used."""

    name: str
    at: int
    when: str = ""


@dataclass(frozen=True, slots=True)
class CharacteristicStep:
    """A short sequence of degrees that marks a mode; a phrase has it heard or owes it.

    ``degrees`` holds two or more theory degrees, in the order in which they sound.
    """

    id: str
    kind: StepKind
    need: Need
    degrees: tuple[int, ...]
    note: str = ""


@dataclass(frozen=True, slots=True)
class Neighbour:
    """A mode that is easily heard instead, and the sharpest practical difference."""

    mode_id: str
    difference: str


@dataclass(frozen=True)
class Mode:
    """A named melodic type.

    Parameters
    ----------
    id
        ``pack/slug``.
    name
        As written by the trade, with diacritics.
    final_units
        The written final, in units from A4.
    rising, falling
        Degrees of one octave, ascending, first 0, last the octave or the degree that serves for
        it. ``falling`` equals ``rising`` where the theory names no other form.
    below, above
        Degrees used under the final and over the octave.
    passing
        Occasional degrees (colours and passing modulations).
    played
        Degrees whose usual intonation differs from the written comma: theory degree to played
        degree, fractional.
    dominants
        Half-cadence degrees, the first one first.
    leading
        Degrees of the leading tone (below the final), the usual one first.
    suspended
        Degrees of suspended cadences, the most frequent first.
    course, opening
        Seyir, and the region (low, high) where a line opens and mostly lives.
    signature
        Accidentals at the clef, as spellings without octave meaning (octave 0).
    sources
        Fact to the ids of the sources in the pack that state it.
    confidence
        How well the sources agree.
    repertoire
        How often the trade's repertoire uses it.
    """

    id: str
    name: str
    final_units: int
    rising: tuple[int, ...]
    falling: tuple[int, ...]
    below: tuple[int, ...]
    above: tuple[int, ...]
    passing: tuple[int, ...]
    played: Mapping[int, float]
    genera: tuple[Genus, ...]
    dominants: tuple[int, ...]
    leading: tuple[int, ...]
    suspended: tuple[int, ...]
    course: Course
    opening: tuple[int, int]
    steps: tuple[CharacteristicStep, ...]
    neighbours: tuple[Neighbour, ...]
    signature: tuple[Spelling, ...] = ()
    also: tuple[str, ...] = ()
    family: str = ""
    sources: Mapping[str, tuple[str, ...]] = field(default_factory=dict)
    confidence: Confidence = Confidence.MEDIUM
    repertoire: Repertoire = Repertoire.COMMON

    @property
    def slug(self) -> str:
        """The part of the id after the pack's."""
        return self.id.partition("/")[2]

    @cached_property
    def degrees(self) -> tuple[int, ...]:
        """Every degree that the definition names, ascending."""
        named = {*self.rising, *self.falling, *self.below, *self.above, *self.passing}
        return tuple(sorted(named))

    def played_units(self, degree: int) -> float:
        """Where a degree is usually played, in units above the final."""
        return self.played.get(degree, float(degree))


@dataclass(frozen=True, slots=True)
class Source:
    """A text or table that a definition rests on."""

    id: str
    kind: str
    title: str


def names_in(text: str) -> tuple[str, ...]:
    """Read names with commas between them.

    >>> names_in("rast, ,uşşak")
    ('rast', 'uşşak')
    """
    return tuple(name.strip() for name in text.split(",") if name.strip())


@dataclass(frozen=True)
class ModePack:
    """A set of modes that share a tone system, pitch names and a body of theory.

    ``theory`` names whose theory it shows; ``caution`` says in one sentence what a player must
    know about its limits; both are shown to people.
    """

    id: str
    name: str
    system: ToneSystem
    names: PitchNames
    theory: str
    caution: str
    modes: tuple[Mode, ...]
    sources: tuple[Source, ...] = ()

    @cached_property
    def _by_name(self) -> dict[str, Mode]:
        table: dict[str, Mode] = {}
        for mode in self.modes:
            for name in (mode.slug, mode.name, *mode.also):
                table.setdefault(fold_name(name), mode)
        for mode in self.modes:
            table[fold_name(mode.slug)] = mode
        return table

    def find(self, text: str) -> Mode:
        """Look a mode up by id, slug, name or other name, in any spelling.

        Raises
        ------
        UnknownModeError
            With the nearest names.
        """
        prefix, slash, rest = text.partition("/")
        mode = self._by_name.get(fold_name(rest if slash else text))
        if mode is None or (slash and fold_name(prefix) != fold_name(self.id)):
            hint = nearest_names(fold_name(rest or text), [m.slug for m in self.modes])
            raise UnknownModeError(f"no mode {text!r} in pack {self.id!r}; {hint}")
        return mode

    def restrict(self, names: tuple[str, ...]) -> tuple[Mode, ...]:
        """Give the modes named, in the pack's order; an empty tuple of names means all of them."""
        if not names:
            return self.modes
        wanted = {self.find(name).id for name in names}
        return tuple(mode for mode in self.modes if mode.id in wanted)
