"""Events: everything that can change a session, in the order in which it happened.

Conventions
-----------
``at_s`` counts seconds from the start of the session. A *voice* is one sounding key of one input:
any integer that its note-on and note-off share. A session is the outcome of its events, so a
recorded list of them gives the same session again.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum
from typing import TYPE_CHECKING, TypeAlias

if TYPE_CHECKING:
    from melodycoach.core.note import InputKind, Item


class PitchReading(StrEnum):
    """What is taken as known about the final.

    ``WRITTEN``: every mode stands on its own written final. ``FINAL``: the player has said which
    pitch is the final. ``ANY``: every mode may stand on every pitch.
    """

    WRITTEN = "written"
    FINAL = "final"
    ANY = "any"


@dataclass(frozen=True, slots=True)
class NoteOn:
    """A key went down."""

    at_s: float
    voice: int
    pitch_cents: float
    kind: InputKind


@dataclass(frozen=True, slots=True)
class NoteOff:
    """A key came up."""

    at_s: float
    voice: int


@dataclass(frozen=True, slots=True)
class PitchMoved:
    """A sounding key was bent to another pitch."""

    at_s: float
    voice: int
    pitch_cents: float
    kind: InputKind


@dataclass(frozen=True, slots=True)
class LineEdited:
    """Items ``start`` to ``stop`` of the line were replaced by ``items``."""

    at_s: float
    start: int
    stop: int
    items: tuple[Item, ...]


@dataclass(frozen=True, slots=True)
class Undone:
    """The last change of the line was taken back."""

    at_s: float


@dataclass(frozen=True, slots=True)
class Redone:
    """A change that was taken back was made again."""

    at_s: float


@dataclass(frozen=True, slots=True)
class FreshStart:
    """The line was laid aside and a new one begun."""

    at_s: float


@dataclass(frozen=True, slots=True)
class TargetChosen:
    """The player aims at a mode; None: at none."""

    at_s: float
    mode_id: str | None


@dataclass(frozen=True, slots=True)
class ReadingChosen:
    """What is known of the final; ``final_cents`` goes with ``PitchReading.FINAL`` alone."""

    at_s: float
    reading: PitchReading
    final_cents: float | None = None

    def __post_init__(self) -> None:
        """Refuse a final that does not go with the reading."""
        if (self.reading is PitchReading.FINAL) != (self.final_cents is not None):
            raise ValueError(
                f"final_cents {self.final_cents!r} does not go with reading {str(self.reading)!r}"
            )


@dataclass(frozen=True, slots=True)
class ModesRestricted:
    """Only these modes compete from now on; an empty tuple: every mode of the pack."""

    at_s: float
    mode_ids: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class TimePassed:
    """Nothing happened until now: a sounding note grew, or a silence did."""

    at_s: float


Event: TypeAlias = (
    NoteOn
    | NoteOff
    | PitchMoved
    | LineEdited
    | Undone
    | Redone
    | FreshStart
    | TargetChosen
    | ReadingChosen
    | ModesRestricted
    | TimePassed
)
