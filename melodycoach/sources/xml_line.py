"""From one voice of one part of a score to a line: chords, overlaps, rests, marks, places, beats.

Conventions
-----------
Of what a voice lets sound together the highest note is taken. Repeats are read once. The line is in
sounding pitch.

References
----------
W3C MusicXML 4.0: a fermata, a breath and a caesura stand at the note before them.
"""

from __future__ import annotations

from dataclasses import dataclass
from operator import attrgetter, itemgetter
from typing import TYPE_CHECKING

from melodycoach.core.note import Mark, Note, Silence
from melodycoach.core.pitch import HIGHEST_CENTS, LOWEST_CENTS
from melodycoach.core.sheet import Place, usual_beat
from melodycoach.sources.note_token import DEFAULT_TEMPO, LONGEST_BEATS, SHORTEST_BEATS
from melodycoach.sources.xml_score import NEAR
from melodycoach.sources.xml_sounding import Sounding, Tone, who

if TYPE_CHECKING:
    from collections.abc import Iterable, Iterator, Sequence

    from melodycoach.core.note import Item
    from melodycoach.core.pitch import ToneSystem
    from melodycoach.sources.accidental_table import Notation
    from melodycoach.sources.xml_score import Bar, Part, Shift

GRACE_BEATS = 0.25
"""A grace note is so long in the line, and takes nothing from the notes beside it."""

OUT_OF_REACH = "a note out of the reach of MIDI, left out"

_cents, _first = attrgetter("cents"), itemgetter(0)


@dataclass(frozen=True, slots=True)
class VoiceLine:
    """The line of a voice.

    Parameters
    ----------
    items, places, tempo
        As in `Sheet`.
    beat
        The note value that one beat is, in quarter notes.
    conflicts
        What `StaffPitch` has to say.
    n_graces, has_chords
        What the voice holds.
    shifts
        The transpositions that were applied, each once, in order.
    """

    items: tuple[Item, ...]
    places: tuple[Place, ...]
    tempo: float | None
    beat: float
    conflicts: tuple[str, ...]
    n_graces: int
    has_chords: bool
    shifts: tuple[Shift, ...]


def read_voice(
    part: Part,
    voice: str,
    staff: str,
    notation: Notation,
    system: ToneSystem,
    *,
    signs_printed: bool,
    quarters_a_minute: float | None,
) -> VoiceLine:
    """Make the line of one voice.

    Parameters
    ----------
    part
        Its damage grows by the notes that are out of reach.
    voice, staff
        As the file names them; all staves where it is empty.
    notation, system, signs_printed
        As `StaffPitch` takes them.
    quarters_a_minute
        The tempo; None where the score gives none.
    """
    sounding = Sounding(part, notation, system, signs_printed=signs_printed)
    line = _Line(part)
    for bar in part.bars:
        tones = sounding.tones(bar, voice)
        line.add_bar(bar, [tone for tone in tones if staff in ("", tone.written.staff)])
    items, beat, tempo = line.finish(quarters_a_minute)
    return VoiceLine(
        items,
        tuple(line.places),
        tempo,
        beat,
        sounding.conflicts(),
        line.n_graces,
        line.has_chords,
        tuple(sounding.shifts),
    )


class _Line:
    """The line while it is put together; a silence is a plain count of quarter notes."""

    def __init__(self, part: Part) -> None:
        self._part = part
        self._items: list[Tone | float | Mark] = []
        self._end: int | None = None  # where the breath or phrase end behind the last of them stands
        self._last: Tone | None = None  # which a tie or an overlap can still change
        self._cursor = 0.0  # where in the bar the line has come to
        self._lacks = 0.0  # what the bar lacks, at its start, when it is a pickup
        self._n_bars = 0
        self.places: list[Place] = []
        self.n_graces = 0
        self.has_chords = False

    def add_bar(self, bar: Bar, tones: Sequence[Tone]) -> None:
        """Take the notes that the voice has in a bar, in order of time."""
        marks = sorted(bar.marks, key=_first, reverse=True)
        while marks and marks[-1][0] <= 0:
            self._mark(marks.pop()[1])
        if self._n_bars:
            self._mark(Mark.BAR)
        self._cursor = 0.0
        is_first = self._n_bars == 0 and len(self._part.bars) > 1
        self._lacks = max(bar.meter.quarters - bar.length, 0.0) if is_first else 0.0
        for group in _groups(tones):
            at = group[0].written.at
            while marks and marks[-1][0] <= at + NEAR:
                self._mark(marks.pop()[1])
            self._rest_until(at)
            self._sound(bar, group)
        self._rest_until(bar.length)
        while marks:
            self._mark(marks.pop()[1])
        self._n_bars += 1

    def finish(self, quarters_a_minute: float | None) -> tuple[tuple[Item, ...], float, float | None]:
        """End the line; give it counted in beats and laid out in time, with the beat and the tempo."""
        self._mark(Mark.PHRASE_END)
        beat = usual_beat(
            [item.quarters for item in self._items if isinstance(item, Tone) and not item.written.grace]
        )
        tempo = quarters_a_minute / beat if quarters_a_minute else None
        return tuple(_laid_out(self._items, beat, tempo or DEFAULT_TEMPO)), beat, tempo

    def _sound(self, bar: Bar, group: Sequence[Tone]) -> None:
        """Add the highest of the notes that start together."""
        top = group[0]
        if len(group) > 1:
            top = max(group, key=_cents)
            self.has_chords = True
        written, last = top.written, self._last
        if not LOWEST_CENTS <= top.cents <= HIGHEST_CENTS:
            self._part.damaged(OUT_OF_REACH, bar.label)
            return
        if last is not None and written.at < self._cursor - NEAR:
            last.quarters -= self._cursor - written.at
            self.has_chords = True
        if last is not None and top.tied and who(last.written) == who(written):
            last.quarters += written.length
        else:
            self._last = top
            self._add(top)
            self.places.append(Place(bar.label, round(1 + (written.at + self._lacks) / bar.meter.beat, 6)))
            self.n_graces += written.grace
        self._cursor = written.at + written.length
        for tone in group:
            if tone.written.mark is not None:
                self._mark(tone.written.mark)

    def _rest_until(self, at: float) -> None:
        if at > self._cursor + NEAR:
            self._add(at - self._cursor)
            self._cursor = at
            self._last = None

    def _add(self, item: Tone | float) -> None:
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


def _groups(tones: Iterable[Tone]) -> Iterator[list[Tone]]:
    """Put together what starts together: chords, and notes of the voice that stand at one time."""
    group: list[Tone] = []
    for tone in tones:
        note = tone.written
        together = group and not note.grace and abs(note.at - group[0].written.at) < NEAR
        if group and (note.chord or (together and not group[0].written.grace)):
            group.append(tone)
            continue
        if group:
            yield group
        group = [tone]
    if group:
        yield group


def _laid_out(items: Iterable[Tone | float | Mark], beat: float, tempo: float) -> Iterator[Item]:
    """Give the items of a line, counted in beats, one after another in time."""
    beat_s = 60.0 / tempo
    gone = 0.0
    for item in items:
        if isinstance(item, Tone):
            graced = GRACE_BEATS if item.written.grace else 0.0
            beats = _beats(graced + item.quarters / beat)
            yield Note(item.cents, gone * beat_s, beats * beat_s, item.kind, beats)
        elif isinstance(item, Mark):
            yield item
            continue
        else:
            beats = _beats(item / beat)
            yield Silence(beats * beat_s, beats)
        gone += beats


def _beats(beats: float) -> float:
    return min(max(beats, SHORTEST_BEATS), LONGEST_BEATS)
