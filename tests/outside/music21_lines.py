"""The line that music21 reads out of a score or a MIDI file, to be held against ours.

It is taken by the rules that ours follows (`melodycoach.core.melody`, `melodycoach.sources.xml_line`), but
from music21's notes: of what starts together the highest note counts, tied notes are one, grace notes have
no length of their own, chord symbols and notes without a pitch are no melody.
"""

from __future__ import annotations

import warnings
from dataclasses import dataclass, replace
from fractions import Fraction
from pathlib import Path
from typing import TYPE_CHECKING

import music21
from music21 import chord, converter, harmony, midi, note, percussion, stream, tempo

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

ROOT = Path(music21.__file__).parent
"""Where music21 lies; its corpus and its test files with it."""


@dataclass(frozen=True)
class LineNote:
    """A note of a line: MIDI number (69.5 is a quarter tone over A4), length, bar, beat from 1.

    The length is in quarter notes, of a MIDI file in seconds if it was played; None for a grace note.
    """

    pitch: float
    length: float | None
    bar: str = ""
    beat: float = 0.0


def parsed(path: Path) -> stream.Score:
    """Let music21 read a file anew, without its cache, and without rounding what MIDI gives."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        score: stream.Score = converter.parse(path, forceSource=True, quantizePost=False)
    return score


# --- scores ------------------------------------------------------------------------------------


def line_of_score(
    score: stream.Score, part: int = 1, voice: str = "1", *, one_sided_ties: bool = False
) -> list[LineNote]:
    """Give the line of one part; in bars with several voices, that of the one so named.

    ``one_sided_ties``: where a tie starts is what counts, not where it ends: a note that starts one goes
    on in the next if that is the same pitch.
    """
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        sounding = score.parts[part - 1].toSoundingPitch()
    line: list[LineNote] = []
    tie_open, beat_type = False, 4
    for bar in sounding.getElementsByClass(stream.Measure):
        beat_type = bar.timeSignature.denominator if bar.timeSignature else beat_type
        voices = {str(one.id): one for one in bar.voices}
        for one, top in _tops(voices.get(voice, bar) if voices else bar):
            length = None if one.duration.isGrace else float(one.quarterLength)
            kind = top.tie.type if top.tie is not None else ""
            goes_on = tie_open if one_sided_ties else kind in ("stop", "continue")
            last = line[-1] if line else None
            if goes_on and last and last.pitch == top.pitch.ps and last.length is not None and length:
                line[-1] = replace(last, length=last.length + length)
            else:
                beat = 1 + float(one.offset + bar.paddingLeft) * beat_type / 4
                line.append(LineNote(top.pitch.ps, length, bar.measureNumberWithSuffix(), beat))
            tie_open = kind in ("start", "continue")
    return line


def _tops(found: stream.Stream) -> Iterator[tuple[note.NotRest, note.Note]]:
    """Give each note or chord with the highest note of it."""
    for one in found.notes:
        if isinstance(one, harmony.Harmony | note.Unpitched | percussion.PercussionChord):
            continue
        members = one.notes if isinstance(one, chord.Chord) else (one,)
        yield one, max(members, key=lambda member: member.pitch.ps)


# --- MIDI --------------------------------------------------------------------------------------


@dataclass(frozen=True)
class Struck:
    """A note of a MIDI line: MIDI number; its start, its end and the next one's start in quarter notes."""

    pitch: float
    at: Fraction
    until: Fraction
    following: Fraction | None


def line_of_midi(score: stream.Score, part: int = 1) -> list[Struck]:
    """Give the line of one part: the newest note wins, and of a chord the highest."""
    struck = _struck(score.parts[part - 1])
    times = sorted(struck)
    line = []
    for at, following in zip(times, [*times[1:], None], strict=True):
        top = max(struck[at])
        until = struck[at][top] if following is None else min(struck[at][top], following)
        line.append(Struck(top, at, until, following))
    return line


def in_seconds(score: stream.Score, line: Sequence[Struck]) -> list[LineNote]:
    """Give the line as it was played, by the tempos of the file."""
    marks = score.recurse().getElementsByClass(tempo.MetronomeMark)
    tempos = [(Fraction(mark.getOffsetInHierarchy(score)), float(mark.getQuarterBPM())) for mark in marks]
    tempos.sort(key=lambda one: one[0])  # at one place the last one counts
    return [LineNote(one.pitch, _seconds(tempos, one.until) - _seconds(tempos, one.at)) for one in line]


def _struck(part: stream.Part) -> dict[Fraction, dict[float, Fraction]]:
    """Give when each pitch goes down and when it comes up; music21 cuts notes at bar lines and ties them."""
    sounding: dict[float, tuple[Fraction, Fraction]] = {}  # pitch: since, until
    struck: dict[Fraction, dict[float, Fraction]] = {}  # since: pitch, until
    for one in part.flatten().notes:
        at = Fraction(one.offset)
        until = at + Fraction(one.quarterLength)
        for member in one.notes if isinstance(one, chord.Chord) else (one,):
            pitch = member.pitch.ps
            since, ended = sounding.get(pitch, (at, Fraction(-1)))
            tied = member.tie is not None and member.tie.type in ("stop", "continue") and ended == at
            since = since if tied else at
            struck.setdefault(since, {})[pitch] = until
            sounding[pitch] = since, until
    return struck


def _seconds(tempos: Sequence[tuple[Fraction, float]], at: Fraction) -> float:
    """Give the time of a place in quarter notes; the tempo is 120 until one is set (MIDI 1.0)."""
    gone, since, beats_a_minute = 0.0, Fraction(0), 120.0
    for place, following in tempos:
        if place > at:
            break
        gone += float(place - since) * 60 / beats_a_minute
        since, beats_a_minute = place, following
    return gone + float(at - since) * 60 / beats_a_minute


def written_by_music21(score: stream.Score, part: int = 1) -> bytes:
    """Let music21 write one part as a MIDI file."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        data: bytes = midi.translate.streamToMidiFile(score.parts[part - 1]).writestr()
    return data
