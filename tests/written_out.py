"""A line of ours as another program would write it: MusicXML with AEU accidentals, MIDI with bends.

Ways out that owe nothing to our readers: MusicXML as plain text and by music21, MIDI by mido and by
music21. They follow the tables named here, and know nothing of how the file will be read.

- AEU accidentals: the names are those of ``accidental-value`` in MusicXML 4.0 (W3C), which gives each its
  glyph; what each glyph raises or lowers, in commas, is that of Arel-Ezgi-Uzdilek theory.
- ``<alter>`` is in whole and half semitones, or missing, as programs without commas write it: it misleads.
- An accidental holds to the end of its bar, for its line and octave (MusicXML 4.0, and common practice).
- MIDI: RPN 0 sets the bend range to 2 semitones; a bend of 8192 is that range (MIDI 1.0).
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from fractions import Fraction
from io import BytesIO
from math import ceil
from typing import TYPE_CHECKING

import mido

from melodycoach.core.note import Mark, Note, Silence
from melodycoach.core.pitch import COMMA_CENTS, LETTERS
from melodycoach.sources.note_text import DEFAULT_TEMPO

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    import music21

    from melodycoach.sources.note_text import NoteText

NATURALS = dict(zip(LETTERS, (0, 9, 18, 22, 31, 40, 49), strict=True))
"""Commas above C, in Pythagorean order: a whole tone is 9, a half tone 4 (AEU theory)."""

AEU = {
    0: ("natural", ""),
    -1: ("quarter-flat", "-0.5"),
    1: ("quarter-sharp", "0.5"),
    4: ("sharp", "1"),
    -5: ("flat", "-1"),
    -4: ("slash-flat", ""),
    5: ("slash-quarter-sharp", ""),
    8: ("slash-sharp", ""),
    -8: ("double-slash-flat", ""),
}
"""What a sign raises, in commas: its name, and what stands in ``<alter>`` beside it; the usual ones first."""

BAR_BEATS = 4
DIVISIONS = 48  # of a quarter note, so that the thirds and sixteenths of a beat are whole
TICKS = 480
BEND_RANGE = 2  # semitones
PAUSE_S = {Mark.BREATH: 1.2, Mark.PHRASE_END: 3.0}  # note text has signs for them; a player only waits


class CannotWriteError(ValueError):
    """AEU has no sign for this pitch."""


@dataclass(frozen=True)
class Piece:
    """A note or a rest, or what of it stands in one bar."""

    pitch: tuple[str, int, int] | None  # letter, octave, commas of its sign; None: a rest
    beats: Fraction
    tied_from: bool = False
    tied_to: bool = False
    mark: Mark | None = None  # what follows it: a breath or the end of a phrase


def spelled(cents: float) -> tuple[str, int, int]:
    """Give letter, octave and commas of the sign, with the most usual sign that will do."""
    units = (cents - 6900) / COMMA_CENTS + 40  # A4 lies 40 commas above C4
    if abs(units - round(units)) > 1e-6:
        raise CannotWriteError(f"{cents} cents lie between two commas")
    for commas in AEU:
        for letter, natural in NATURALS.items():
            octaves, left = divmod(round(units) - commas - natural, 53)
            if left == 0:
                return letter, 4 + octaves, commas
    raise CannotWriteError(f"{cents} cents: no sign of AEU")


def bars_of(read: NoteText) -> list[list[Piece]]:
    """Cut a line into bars of four beats; a phrase that ends, ends its bar as well."""
    bars: list[list[Piece]] = [[]]
    left = Fraction(BAR_BEATS)
    for piece in _pieces(read):
        rest = piece.beats
        while rest:
            if not left:
                bars.append([])
                left = Fraction(BAR_BEATS)
            now = min(rest, left)
            left, rest = left - now, rest - now
            goes_on, went_on = piece.pitch is not None and rest > 0, rest + now < piece.beats
            bars[-1].append(
                replace(
                    piece,
                    beats=now,
                    tied_from=went_on and piece.pitch is not None,
                    tied_to=goes_on,
                    mark=None if rest else piece.mark,
                )
            )
        if piece.mark is Mark.PHRASE_END:
            left = Fraction(0)
    return bars


def _pieces(read: NoteText) -> Iterator[Piece]:
    for place, item in enumerate(read.items):
        if isinstance(item, Mark):
            continue
        assert item.beats is not None
        after = {mark for mark in _marks_after(read, place) if mark is not Mark.BAR}
        mark = max(after, key=lambda one: PAUSE_S[one], default=None)
        pitch = spelled(item.pitch_cents) if isinstance(item, Note) else None
        yield Piece(pitch, Fraction(item.beats).limit_denominator(DIVISIONS), mark=mark)


def _marks_after(read: NoteText, place: int) -> Iterator[Mark]:
    for item in read.items[place + 1 :]:
        if not isinstance(item, Mark):
            return
        yield item


# --- MusicXML as plain text --------------------------------------------------------------------

DOCTYPE = (
    '<!DOCTYPE score-partwise PUBLIC "-//Recordare//DTD MusicXML 4.0 Partwise//EN"'
    ' "http://www.musicxml.org/dtds/partwise.dtd">'
)


def as_music_xml(read: NoteText) -> bytes:
    """Write the line as a score of one part in quarter notes; see the head of this file."""
    bars = bars_of(read)
    measures = [_measure(number, bar, last=bar is bars[-1]) for number, bar in enumerate(bars, start=1)]
    attributes = (
        f"<attributes><divisions>{DIVISIONS}</divisions><key><fifths>0</fifths></key>"
        f"<time><beats>{BAR_BEATS}</beats><beat-type>4</beat-type></time>"
        "<clef><sign>G</sign><line>2</line></clef></attributes>"
        f'<sound tempo="{read.headers.tempo or DEFAULT_TEMPO:g}"/>'
    )
    measures[0] = measures[0].replace(">", ">" + attributes, 1)
    return in_score(measures, read.headers.title).encode()


def in_score(measures: Sequence[str], title: str = "", encoding: str = "UTF-8") -> str:
    """Put written measures into a score of one part."""
    return "\n".join(
        [
            f'<?xml version="1.0" encoding="{encoding}"?>',
            DOCTYPE,
            f'<score-partwise version="4.0"><work><work-title>{title}</work-title></work>',
            '<part-list><score-part id="P1"><part-name>Ney</part-name></score-part></part-list>',
            '<part id="P1">',
            *measures,
            "</part></score-partwise>",
        ]
    )


def _measure(number: int, bar: list[Piece], *, last: bool) -> str:
    notes = "".join(_note(piece, printed) for piece, printed in _with_signs(bar))
    style = "light-heavy" if last else "light-light" if bar[-1].mark is Mark.PHRASE_END else ""
    line = f'<barline location="right"><bar-style>{style}</bar-style></barline>' if style else ""
    return f'<measure number="{number}">{notes}{line}</measure>'


def _with_signs(bar: list[Piece]) -> Iterator[tuple[Piece, bool]]:
    """Say of each piece whether its sign must be printed: it is not in force already."""
    in_force: dict[tuple[str, int], int] = {}
    for piece in bar:
        printed = False
        if piece.pitch is not None and not piece.tied_from:
            letter, octave, commas = piece.pitch
            printed = in_force.get((letter, octave), 0) != commas
            if printed:
                in_force[letter, octave] = commas
        yield piece, printed


def _note(piece: Piece, printed: bool) -> str:
    duration = f"<duration>{piece.beats * DIVISIONS}</duration>"
    if piece.pitch is None:
        return f"<note><rest/>{duration}<voice>1</voice></note>"
    letter, octave, commas = piece.pitch
    name, alter = AEU[commas]
    ties = [kind for kind, is_so in (("stop", piece.tied_from), ("start", piece.tied_to)) if is_so]
    marks = "<articulations><breath-mark/></articulations>" if piece.mark is Mark.BREATH else ""
    notations = "".join(f'<tied type="{kind}"/>' for kind in ties) + marks
    return (
        f"<note><pitch><step>{letter}</step>{f'<alter>{alter}</alter>' if alter else ''}"
        f"<octave>{octave}</octave></pitch>{duration}"
        + "".join(f'<tie type="{kind}"/>' for kind in ties)
        + "<voice>1</voice>"
        + (f"<accidental>{name}</accidental>" if printed else "")
        + (f"<notations>{notations}</notations>" if notations else "")
        + "</note>"
    )


# --- MusicXML by music21 -----------------------------------------------------------------------


def as_music21(read: NoteText) -> bytes:
    """Let music21 write the file; it has the names of the AEU signs, and no pitch for them."""
    from music21 import bar, metadata, musicxml, stream

    part = stream.Part()
    for number, pieces in enumerate(bars_of(read), start=1):
        measure = stream.Measure(number=number)
        measure.append([_music21_note(piece, printed) for piece, printed in _with_signs(pieces)])
        if pieces[-1].mark is Mark.PHRASE_END:
            measure.rightBarline = bar.Barline("double")
        part.append(measure)
    score = stream.Score([part])
    score.metadata = metadata.Metadata(title=read.headers.title)
    writer = musicxml.m21ToXml.GeneralObjectExporter(score)
    writer.makeNotation = False  # it is made
    written: bytes = writer.parse()
    return written


def _music21_note(piece: Piece, printed: bool) -> music21.note.GeneralNote:
    from music21 import articulations, note, pitch, tie

    if piece.pitch is None:
        return note.Rest(quarterLength=piece.beats)
    letter, octave, commas = piece.pitch
    one = note.Note(f"{letter}{octave}", quarterLength=piece.beats)
    if commas or printed:
        one.pitch.accidental = pitch.Accidental()
        one.pitch.accidental.name = _MUSIC21_NAMES.get(AEU[commas][0], AEU[commas][0])
        one.pitch.accidental.displayStatus = printed
    if piece.mark is Mark.BREATH:
        one.articulations.append(articulations.BreathMark())
    ties = {(False, True): "start", (True, True): "continue", (True, False): "stop"}
    if (piece.tied_from, piece.tied_to) in ties:
        one.tie = tie.Tie(ties[piece.tied_from, piece.tied_to])
    return one


_MUSIC21_NAMES = {"quarter-flat": "half-flat", "quarter-sharp": "half-sharp"}

# --- MIDI by mido ------------------------------------------------------------------------------


def as_midi(read: NoteText) -> bytes:
    """Write the line as a MIDI file: the nearest key, bent to the pitch before it goes down."""
    tempo = read.headers.tempo or DEFAULT_TEMPO
    track = mido.MidiTrack()
    track.append(mido.MetaMessage("set_tempo", tempo=mido.bpm2tempo(tempo)))
    for control, value in ((101, 0), (100, 0), (6, BEND_RANGE), (38, 0), (101, 127), (100, 127)):
        track.append(mido.Message("control_change", control=control, value=value))
    silent_ticks = 0
    for item in read.items:
        match item:
            case Mark():
                silent_ticks += ceil(PAUSE_S.get(item, 0) * tempo / 60) * TICKS  # whole beats
            case Silence():
                silent_ticks += round((item.beats or 0) * TICKS)
            case Note():
                key = round(item.pitch_cents / 100)
                bend = round((item.pitch_cents - 100 * key) / (100 * BEND_RANGE) * 8192)
                track.append(mido.Message("pitchwheel", pitch=bend, time=silent_ticks))
                track.append(mido.Message("note_on", note=key, velocity=80))
                assert item.beats is not None
                track.append(mido.Message("note_off", note=key, time=round(item.beats * TICKS)))
                silent_ticks = 0
    track.append(mido.MetaMessage("end_of_track", time=silent_ticks))
    file = mido.MidiFile(type=0, ticks_per_beat=TICKS, tracks=[track])
    written = BytesIO()
    file.save(file=written)
    return written.getvalue()


def as_music21_midi(read: NoteText) -> bytes:
    """Let music21 write bends: it rounds to a cent, and takes the bend of the first note back at once."""
    from music21 import midi, note, stream, tempo

    part = stream.Part([tempo.MetronomeMark(number=read.headers.tempo or DEFAULT_TEMPO)])
    for item in read.items:
        match item:
            case Note():
                one = note.Note(quarterLength=item.beats)
                one.pitch.ps = round(item.pitch_cents / 100)
                one.pitch.microtone = item.pitch_cents - 100 * round(item.pitch_cents / 100)
                part.append(one)
            case Silence():
                part.append(note.Rest(quarterLength=item.beats))
    written: bytes = midi.translate.streamToMidiFile(part).writestr()
    return written
