"""What the notes of a part sound like: its staves, keys, ties and transposition, bar by bar.

Conventions
-----------
All notes of a part are followed, since an accidental holds for every voice of its staff.

References
----------
W3C MusicXML 4.0: ``transpose`` says what has to be added to the written pitch to give the sounding
one. In comma notations a transposition keeps to the commas: a whole tone is 9 and the half tone
between two letters 4, which makes ``5 * semitones - steps`` for every interval (Pythagorean order, as
in `core.pitch`).
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from operator import attrgetter
from typing import TYPE_CHECKING

from melodycoach.core.note import InputKind
from melodycoach.core.pitch import COMMA_CENTS, KEY_CENTS, OCTAVE_CENTS
from melodycoach.sources.accidentals import COMMA_NOTATIONS
from melodycoach.sources.staff_pitch import StaffPitch
from melodycoach.sources.xml_score import NEAR

if TYPE_CHECKING:
    from melodycoach.core.pitch import ToneSystem
    from melodycoach.sources.accidental_table import Notation
    from melodycoach.sources.xml_score import Bar, KeyChange, Part, Shift, WrittenNote

_STEPS_BY_SEMITONES = (0, 1, 1, 2, 2, 3, 3, 4, 5, 5, 6, 6)  # how an interval is usually written
_NO_TIE = (math.nan, 0.0)
_at = attrgetter("at")


@dataclass(slots=True)
class Tone:
    """A note of a voice as it sounds.

    Parameters
    ----------
    written
        The note in the score.
    cents, kind
        The pitch that sounds, and how exact it is.
    tied
        It goes on from the note before it that has its pitch.
    quarters
        How long it is, in quarter notes; it changes with what is tied to it and what overlaps it.
    """

    written: WrittenNote
    cents: float
    kind: InputKind
    tied: bool
    quarters: float


def shift_cents(shift: Shift, notation: Notation) -> float:
    """Give what a transposing part sounds higher than it is written.

    >>> from melodycoach.sources.accidental_table import Notation
    >>> from melodycoach.sources.xml_score import Shift
    >>> whole_tone_down = Shift(-2, -1, 0)
    >>> round(shift_cents(whole_tone_down, Notation.AEU) / COMMA_CENTS), shift_cents(
    ...     whole_tone_down, Notation.LITERAL
    ... )
    (-9, -200.0)
    """
    octaves = shift.octaves * OCTAVE_CENTS
    if notation not in COMMA_NOTATIONS or shift.semitones % 1:
        return shift.semitones * KEY_CENTS + octaves
    steps = shift.steps
    if steps is None:
        size = int(abs(shift.semitones))
        steps = size // 12 * 7 + _STEPS_BY_SEMITONES[size % 12]
        steps = int(math.copysign(steps, shift.semitones))
    return (5 * shift.semitones - steps) * COMMA_CENTS + octaves


class Sounding:
    """What the notes of a part sound like, followed from bar to bar on all its staves and voices."""

    def __init__(self, part: Part, notation: Notation, system: ToneSystem, *, signs_printed: bool) -> None:
        self._notation = notation
        self._staves = {
            staff: StaffPitch(notation, system, signs_printed=signs_printed)
            for staff in sorted({note.staff for bar in part.bars for note in bar.notes})
        }
        self._open_ties: dict[tuple[str, str, int], tuple[float, float]] = {}  # who: its end, its cents
        self._begins = 0.0  # the bar, in quarter notes from the start
        self.shifts: dict[Shift, float] = {}

    def conflicts(self) -> tuple[str, ...]:
        """Say what all staves have to say, once for each kind."""
        return tuple(dict.fromkeys(said for staff in self._staves.values() for said in staff.conflicts))

    def tones(self, bar: Bar, voice: str) -> list[Tone]:
        """Give the notes that a voice has in the next bar, in the order in which they sound."""
        for staff in self._staves.values():
            staff.new_bar()
        keys = sorted(bar.keys, key=_at, reverse=True)
        tones: list[Tone] = []
        for note in sorted(bar.notes, key=_at):
            while keys and keys[-1].at <= note.at + NEAR:
                self._change_key(keys.pop())
            held = self._held(note) if self._open_ties else None
            cents, kind = self._staves[note.staff].pitch(*note.pitch, held)
            if note.tied_on:
                end = self._begins + note.at + note.length
                self._open_ties[who(note)] = end, cents
            if note.voice == voice:
                if note.shift is not None:
                    cents, kind = self._shifted(cents, kind, note.shift)
                tones.append(Tone(note, cents, kind, held is not None, note.length))
        while keys:
            self._change_key(keys.pop())
        self._begins += bar.length
        return tones

    def _held(self, note: WrittenNote) -> float | None:
        """Give the pitch of the note that this one is tied to, and close the tie."""
        ended, cents = self._open_ties.pop(who(note), _NO_TIE)
        return cents if abs(ended - self._begins - note.at) < NEAR else None

    def _change_key(self, change: KeyChange) -> None:
        for number, staff in self._staves.items():
            if change.staff in ("", number):
                staff.set_key(change.key)

    def _shifted(self, cents: float, kind: InputKind, shift: Shift) -> tuple[float, InputKind]:
        """Move a note of a transposing part to where it sounds."""
        if shift not in self.shifts:
            self.shifts[shift] = shift_cents(shift, self._notation)
        cents += self.shifts[shift]
        off_keys = kind is InputKind.KEYS and cents % KEY_CENTS
        return cents, InputKind.TUNED if off_keys else kind


def who(note: WrittenNote) -> tuple[str, str, int]:
    """Give what two notes that are tied have in common."""
    return note.voice, note.pitch.step, note.pitch.octave
