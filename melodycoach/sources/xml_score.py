"""What a score in MusicXML holds, before any part of it is chosen: parts, bars, notes as written.

Conventions
-----------
Times are in quarter notes from the start of a bar. A pitch is kept as it is printed: letter,
octave, sign, and the number that the file gives as ``alter``.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING, NamedTuple

if TYPE_CHECKING:
    from melodycoach.core.note import Mark
    from melodycoach.sources.accidentals import Sign
    from melodycoach.sources.staff_pitch import KeyEntry


NEAR = 1e-6
"""What is no further apart, in quarter notes, is at one time."""


class Shift(NamedTuple):
    """How much higher a transposing part sounds than it is written.

    ``steps`` of the staff and ``semitones`` together say which interval it is; None where the file
    does not give the steps. ``octaves`` come on top.
    """

    semitones: float
    steps: int | None
    octaves: int


class Meter(NamedTuple):
    """A time signature: its beats, in quarter notes each, and how many quarter notes fill a bar."""

    beat: float
    quarters: float


NO_METER = Meter(1.0, 0.0)
"""Where a score gives no time signature: beats are quarter notes, bars are as long as they are."""


class PrintedPitch(NamedTuple):
    """Where a note stands on its staff and what is printed beside it, as `StaffPitch.pitch` takes it."""

    step: str
    octave: int
    sign: Sign | None
    alter: float | None


@dataclass(slots=True)
class WrittenNote:
    """One note of a score.

    Parameters
    ----------
    at, length
        In quarter notes; a grace note has no length.
    voice, staff
        As the file numbers them.
    pitch
        As printed.
    shift
        Of a transposing part, else None.
    grace, chord
        Grace notes take no time; a note of a chord starts with the note before it.
    tied_on
        It is tied to the note after it.
    mark
        What stands behind it.
    """

    at: float
    length: float
    voice: str
    staff: str
    pitch: PrintedPitch
    shift: Shift | None
    grace: bool
    chord: bool
    tied_on: bool
    mark: Mark | None


class KeyChange(NamedTuple):
    """A key signature.

    Parameters
    ----------
    at
        In quarter notes.
    staff
        The staff that it is for; empty for all.
    key
        How many sharps (positive) or flats (negative) a traditional one has, or the letters that any
        other alters, as `StaffPitch.set_key` takes them.
    """

    at: float
    staff: str
    key: int | tuple[KeyEntry, ...]


@dataclass(slots=True)
class Bar:
    """One bar of a part.

    Parameters
    ----------
    label
        Its number as printed.
    meter
        The time signature at its start.
    implicit
        The file says that it does not count, as a pickup.
    length
        What it holds, in quarter notes.
    notes
        In the order of the file: voice by voice, as a rule.
    keys
        Changes of key.
    marks
        Where a phrase ends at a line, in quarter notes.
    opens_repeat, closes_repeat, is_ending, jumps
        What would have a player go back or on from here.
    """

    label: str
    meter: Meter
    implicit: bool = False
    length: float = 0.0
    notes: list[WrittenNote] = field(default_factory=list)
    keys: list[KeyChange] = field(default_factory=list)
    marks: list[tuple[float, Mark]] = field(default_factory=list)
    opens_repeat: bool = False
    closes_repeat: bool = False
    is_ending: bool = False
    jumps: bool = False


@dataclass(slots=True)
class Part:
    """One part of a score.

    Parameters
    ----------
    id, name
        As the file gives them; the name may be empty.
    bars
        In order.
    n_unpitched, n_cues
        Notes that are left out: of percussion, and small ones that show another part.
    is_percussion
        It stands in a percussion clef or plays on the percussion channel.
    ornaments
        Words for the signs that stand for notes which are not written.
    damage
        Kinds of damage, each with the labels of the bars where it was found.
    """

    id: str
    name: str = ""
    bars: list[Bar] = field(default_factory=list)
    n_unpitched: int = 0
    n_cues: int = 0
    is_percussion: bool = False
    ornaments: set[str] = field(default_factory=set)
    damage: dict[str, list[str]] = field(default_factory=dict)

    @property
    def has_notes(self) -> bool:
        """Tell whether there is a note with a pitch in it."""
        return any(bar.notes for bar in self.bars)

    def damaged(self, kind: str, label: str) -> None:
        """Keep that something in a bar was not as it must be."""
        labels = self.damage.setdefault(kind, [])
        if label not in labels[-1:]:
            labels.append(label)


@dataclass(frozen=True, slots=True)
class Score:
    """A whole score.

    Parameters
    ----------
    title
        Of the work or the movement, or empty.
    parts
        In the order of the file; those that hold no bar are left out.
    tempos
        Quarter notes a minute: the first, and one that differs from it if there is one.
    says
        What the parser had to say of the file.
    """

    title: str
    parts: tuple[Part, ...]
    tempos: tuple[float, ...]
    says: tuple[str, ...]
