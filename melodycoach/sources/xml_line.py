"""From one voice of one part of a score to a line: pitches, ties, chords, rests, marks, places.

Conventions
-----------
All notes of a part are followed, since an accidental holds for every voice of its staff; those of
one voice make the line. Of what a voice lets sound together the highest note is taken. Repeats are
read once. The line is in sounding pitch.

References
----------
W3C MusicXML 4.0: ``transpose`` says what has to be added to the written pitch to give the sounding
one. A fermata, a breath and a caesura stand at the note before them. In comma notations a
transposition keeps to the commas: a whole tone is 9 and the half tone between two letters 4, which
makes ``5 * semitones - steps`` for every interval (Pythagorean order, as in `core.pitch`).
"""

from __future__ import annotations

import math
from collections import Counter
from dataclasses import dataclass
from operator import attrgetter
from typing import TYPE_CHECKING

from melodycoach.core.note import InputKind, Mark, Note, Silence
from melodycoach.core.pitch import COMMA_CENTS, HIGHEST_CENTS, KEY_CENTS, LOWEST_CENTS, OCTAVE_CENTS
from melodycoach.core.sheet import Place, usual_beat
from melodycoach.sources.accidentals import COMMA_NOTATIONS
from melodycoach.sources.note_token import LONGEST_BEATS, SHORTEST_BEATS
from melodycoach.sources.staff_pitch import StaffPitch

if TYPE_CHECKING:
    from collections.abc import Iterable, Iterator, Sequence

    from melodycoach.core.note import Item
    from melodycoach.core.pitch import ToneSystem
    from melodycoach.sources.accidental_table import Notation
    from melodycoach.sources.xml_score import Bar, KeyChange, Part, Shift, WrittenNote

GRACE_BEATS = 0.25
"""A grace note is so long in the line, and takes nothing from the notes beside it."""

OUT_OF_REACH = "a note out of the reach of MIDI, left out"

_STEPS_BY_SEMITONES = (0, 1, 1, 2, 2, 3, 3, 4, 5, 5, 6, 6)  # how an interval is usually written
_NEAR = 1e-6  # quarter notes
_NO_TIE = (math.nan, 0.0)
_at, _cents = attrgetter("at"), attrgetter("cents")


@dataclass(frozen=True, slots=True)
class VoiceLine:
    """The line of a voice, not laid out in time.

    Parameters
    ----------
    items, places
        As in `Sheet`; the notes still have no onset and no duration.
    beat
        The note value that one beat is, in quarter notes.
    conflicts
        What `StaffPitch` has to say.
    n_graces, has_chords
        What the voice holds.
    shifts
        The transpositions that were applied, each once, in order.
    staff
        The one that is kept, where the voice stands on several at once; else empty.
    """

    items: tuple[Item, ...]
    places: tuple[Place, ...]
    beat: float
    conflicts: tuple[str, ...]
    n_graces: int
    has_chords: bool
    shifts: tuple[Shift, ...]
    staff: str


@dataclass(slots=True)
class _Tone:
    """A note of the part with its pitch; it grows while notes are tied to it."""

    written: WrittenNote
    cents: float
    kind: InputKind
    tied: bool
    quarters: float


def read_voice(
    part: Part, voice: str, notation: Notation, system: ToneSystem, *, signs_printed: bool
) -> VoiceLine:
    """Make the line of one voice.

    Parameters
    ----------
    part
        Its damage grows by the notes that are out of reach.
    voice
        As the file names it.
    notation, system, signs_printed
        As `StaffPitch` takes them.
    """
    staves = {
        staff: StaffPitch(notation, system, signs_printed=signs_printed)
        for staff in sorted({note.staff for bar in part.bars for note in bar.notes})
    }
    kept = _staff_kept(part, voice)
    line = _Line(part, notation)
    for bar, tones in _sounding(part, staves):
        of_voice = [tone for tone in tones if tone.written.voice == voice]
        line.add_bar(bar, [tone for tone in of_voice if kept in ("", tone.written.staff)])
    conflicts = dict.fromkeys(said for staff in staves.values() for said in staff.conflicts)
    return line.finish(tuple(conflicts), kept)


def _staff_kept(part: Part, voice: str) -> str:
    """Give the staff to read of a voice that stands on several at once: the one with the most notes.

    A voice that goes from staff to staff is read on all of them, and so is a chord over two: then
    the text is empty.
    """
    of_voice = [[note for note in bar.notes if note.voice == voice] for bar in part.bars]
    n_by_staff = Counter(note.staff for notes in of_voice for note in notes)
    if len(n_by_staff) > 1 and any(map(_on_several_staves, of_voice)):
        return n_by_staff.most_common(1)[0][0]
    return ""


def _on_several_staves(notes: Iterable[WrittenNote]) -> bool:
    """Tell whether a note of a bar begins on one staff while one of another staff still sounds."""
    ends: dict[str, float] = {}
    for note in sorted((note for note in notes if not note.grace and not note.chord), key=_at):
        if any(end > note.at + _NEAR for staff, end in ends.items() if staff != note.staff):
            return True
        ends[note.staff] = note.at + note.length
    return False


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


def _sounding(part: Part, staves: dict[str, StaffPitch]) -> Iterator[tuple[Bar, list[_Tone]]]:
    """Give the notes of each bar with their written pitches, in the order in which they sound."""
    open_ties: dict[tuple[str, str, int], tuple[float, float]] = {}  # voice and pitch: end, cents
    begins = 0.0
    for bar in part.bars:
        for staff in staves.values():
            staff.new_bar()
        keys = sorted(bar.keys, key=_at, reverse=True)
        tones: list[_Tone] = []
        for note in sorted(bar.notes, key=_at):
            while keys and keys[-1].at <= note.at + _NEAR:
                _change_key(staves, keys.pop())
            who = (note.voice, note.step, note.octave)
            ended, held = open_ties.pop(who, _NO_TIE) if open_ties else _NO_TIE
            tied = abs(ended - begins - note.at) < _NEAR
            on_staff = staves[note.staff]
            sound = on_staff.pitch(note.step, note.octave, note.sign, note.alter, held if tied else None)
            if note.tie_starts:
                open_ties[who] = (begins + note.at + note.length, sound.cents)
            tones.append(_Tone(note, sound.cents, sound.kind, tied, note.length))
        while keys:
            _change_key(staves, keys.pop())
        begins += bar.length
        yield bar, tones


def _change_key(staves: dict[str, StaffPitch], change: KeyChange) -> None:
    for number, staff in staves.items():
        if change.staff in ("", number):
            staff.set_key(change.key)


class _Line:
    """The line while it is put together; a silence is a plain count of quarter notes."""

    def __init__(self, part: Part, notation: Notation) -> None:
        self._part, self._notation = part, notation
        self._items: list[_Tone | float | Mark] = []
        self._places: list[Place] = []
        self._end: int | None = None  # where the breath or phrase end behind the last of them stands
        self._last: _Tone | None = None  # which a tie or an overlap can still change
        self._cursor = 0.0  # where in the bar the line has come to
        self._lacks = 0.0  # what the bar lacks, at its start, when it is a pickup
        self._n_bars = 0
        self._n_graces = 0
        self._has_chords = False
        self._shifts: dict[Shift, float] = {}

    def add_bar(self, bar: Bar, tones: Sequence[_Tone]) -> None:
        """Take the notes that the voice has in a bar, in order of time."""
        marks = sorted(bar.marks, key=lambda mark: mark[0], reverse=True)
        while marks and marks[-1][0] <= 0:
            self._mark(marks.pop()[1])
        if self._n_bars:
            self._mark(Mark.BAR)
        self._cursor = 0.0
        is_first = self._n_bars == 0 and len(self._part.bars) > 1
        self._lacks = max(bar.meter.quarters - bar.length, 0.0) if is_first else 0.0
        for group in _groups(tones):
            at = group[0].written.at
            while marks and marks[-1][0] <= at + _NEAR:
                self._mark(marks.pop()[1])
            self._rest_until(at)
            self._sound(bar, group)
        self._rest_until(bar.length)
        while marks:
            self._mark(marks.pop()[1])
        self._n_bars += 1

    def finish(self, conflicts: tuple[str, ...], staff: str) -> VoiceLine:
        """End the line, and count it in beats."""
        self._mark(Mark.PHRASE_END)
        tones = [item for item in self._items if isinstance(item, _Tone)]
        beat = usual_beat([tone.quarters for tone in tones if not tone.written.grace])
        return VoiceLine(
            tuple(_item(item, beat) for item in self._items),
            tuple(self._places),
            beat,
            conflicts,
            self._n_graces,
            self._has_chords,
            tuple(self._shifts),
            staff,
        )

    def _sound(self, bar: Bar, group: Sequence[_Tone]) -> None:
        """Add the highest of the notes that start together."""
        top = self._shifted(group[0])
        if len(group) > 1:
            top = max(top, *map(self._shifted, group[1:]), key=_cents)
            self._has_chords = True
        written, last = top.written, self._last
        if not LOWEST_CENTS <= top.cents <= HIGHEST_CENTS:
            self._part.damaged(OUT_OF_REACH, bar.label)
            return
        if last is not None and written.at < self._cursor - _NEAR:
            last.quarters -= self._cursor - written.at
            self._has_chords = True
        if (
            last is not None
            and top.tied
            and (last.written.step, last.written.octave) == (written.step, written.octave)
        ):
            last.quarters += written.length
        else:
            self._add(top)
            beat = round(1 + (written.at + self._lacks) / bar.meter.beat, 6)
            self._places.append(Place(bar.label, beat))
            self._n_graces += written.grace
            self._last = top
        self._cursor = written.at + written.length
        for tone in group:
            if tone.written.mark is not None:
                self._mark(tone.written.mark)

    def _shifted(self, tone: _Tone) -> _Tone:
        """Move a note of a transposing part to where it sounds."""
        shift = tone.written.shift
        if shift is None:
            return tone
        if shift not in self._shifts:
            self._shifts[shift] = shift_cents(shift, self._notation)
        tone.cents += self._shifts[shift]
        if tone.kind is InputKind.KEYS and tone.cents % KEY_CENTS:
            tone.kind = InputKind.TUNED
        return tone

    def _rest_until(self, at: float) -> None:
        if at > self._cursor + _NEAR:
            self._add(at - self._cursor)
            self._cursor = at
            self._last = None

    def _add(self, item: _Tone | float) -> None:
        self._items.append(item)
        self._end = None

    def _mark(self, mark: Mark) -> None:
        """Add a mark, unless one that says as much stands there; nothing ends before the first note."""
        if not self._items:
            return
        if mark is Mark.BAR:  # there are as many bar lines as bars, also under a long note
            self._items.append(mark)
        elif self._end is None:
            self._end = len(self._items)
            self._items.append(mark)
        elif mark is Mark.PHRASE_END:
            self._items[self._end] = mark


def _groups(tones: Iterable[_Tone]) -> Iterator[list[_Tone]]:
    """Put together what starts together: chords, and notes of the voice that stand at one time."""
    group: list[_Tone] = []
    for tone in tones:
        note = tone.written
        together = group and not note.grace and abs(note.at - group[0].written.at) < _NEAR
        if group and (note.chord or (together and not group[0].written.grace)):
            group.append(tone)
            continue
        if group:
            yield group
        group = [tone]
    if group:
        yield group


def _item(item: _Tone | float | Mark, beat: float) -> Item:
    """Give an item of the line, counted in beats and without times."""
    if isinstance(item, _Tone):
        graced = GRACE_BEATS if item.written.grace else 0.0
        return Note(item.cents, 0.0, 0.0, item.kind, _beats(graced + item.quarters / beat))
    return item if isinstance(item, Mark) else Silence(0.0, _beats(item / beat))


def _beats(beats: float) -> float:
    return min(max(beats, SHORTEST_BEATS), LONGEST_BEATS)
