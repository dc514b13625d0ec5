"""Scores and MIDI files that are not ours, read by music21 and by us: the same notes, the same lengths.

The files are those that music21 carries: its MusicXML conformance suite, its corpus, the MIDI files of its
own tests; and MIDI that music21 and mido write from them. They stay where they are installed.
`music21_lines` takes the line out of what music21 read.

Every difference is listed here with its reason. What is not listed fails; so does what is listed and no
longer differs. Pitches are MIDI numbers in literal notation, since music21 knows no commas.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from io import BytesIO
from typing import TYPE_CHECKING

import mido
import pytest
from outside.music21_lines import (
    ROOT,
    LineNote,
    Struck,
    in_seconds,
    line_of_midi,
    line_of_score,
    parsed,
    written_by_music21,
)

from melodycoach.core.note import Note
from melodycoach.core.sheet import usual_beat
from melodycoach.errors import MusicFileError
from melodycoach.sources.accidentals import Notation
from melodycoach.sources.pack_file import load_pack
from melodycoach.sources.sheet_file import ReadOptions, read_sheet

if TYPE_CHECKING:
    from collections.abc import Sequence
    from pathlib import Path

NAMES = load_pack("makam").names
SUITE_FILES = ("*TestSuite/*.xml", "*TestSuite/*.mxl", "test*.xml", "test*.mxl")
SUITE = sorted(path for wanted in SUITE_FILES for path in (ROOT / "musicxml").glob(wanted))
GRACE_BEATS = 0.25  # docs: a grace note is read as a quarter of a beat
NEAR = 2e-3  # quarter notes or seconds: a file may round a third of a quarter note to its divisions


@dataclass(frozen=True)
class Case:
    """A score: where it lies, and which line of it is read."""

    path: str
    part: int = 1
    voice: str = ""


# --- what differs, and why ---------------------------------------------------------------------

NO_MELODY = {
    "02a-Rests-Durations": "rests alone",
    "02b-Rests-PitchedRests": "rests alone",
    "02c-Rests-MultiMeasureRests": "rests alone",
    "12ab-Clefs-Percussion-NonTrad": "percussion: music21 gives notes without a pitch",
    "41b-MultiParts-MoreThan10": "rests alone",
    "41f-StaffGroups-Overlapping": "rests alone",
    "41g-PartNoId": "rests alone",
    "41h-TooManyParts": "rests alone",
    "45a-SimpleRepeat": "rests alone",
    "45c-RepeatMultipleTimes": "rests alone",
    "45d-Repeats-Nested-Alternatives": "rests alone",
    "45e-Repeats-Nested-Alternatives": "rests alone",
    "45f-Repeats-InvalidEndings": "rests alone",
    "46a-Barlines": "rests alone",
    "51b-Header-Quotes": "rests alone",
    "51c-MultipleRights": "rests alone",
    "51d-EmptyTitle": "rests alone",
    "52a-PageLayout": "rests alone",
    "testTab": "tablature without <pitch>: music21 puts a C4 in the place of each note",
}
"""No line can be read here, and we say so in a sentence."""

CHOSEN_VOICE = {
    "23f-Tuplets-DurationButNoBracket": (1, "1"),
    "42b-MultiVoice-MidMeasureClefChange": (1, "1"),
}
"""A part on two staves: music21 makes two parts of it, we take one voice; so a voice is asked for."""

ONE_SIDED_TIES = {
    "33i-Ties-NotEnded": "the tie of bar 1 has no end in bar 2",
    "monteverdi/madrigal.4.9.mxl": "no tie of the file has an end",
    "monteverdi/madrigal.4.18.mxl": "no tie of the file has an end",
}
"""A tie begins and never ends; the note after it is the same pitch. We tie them, music21 does not."""

OTHER_BAR_NAMES = {
    "46c-Midmeasure-Clef": ("X1", "2X1"),
    "46d-PickupMeasure-ImplicitMeasures": ("X1", "1X1"),
    "liliuokalani/aloha_oe.mxl": ("X2", "12X2"),
}
"""An implicit bar with a name that is no number: we call it as it is printed, music21 adds a number."""

ONE_NOTE_FOR_CHORD = {
    "21f-Chord-ElementInBetween": "a direction stands between the notes of a chord: music21 loses the chord",
}
"""Music21 gives the notes of a chord one after another; ours is the first and highest of them."""

TWO_STAVES_ONE_VOICE = {
    "43d-MultiStaff-StaffChange": "one voice goes from staff to staff: music21 puts each staff in a part",
}
"""Music21's notes are among ours in their order, and the others are on the second staff."""


_ONE_BAR = "its only bar is not full: music21 takes it for an upbeat"
_SPLIT_BAR = "an implicit bar goes on with the bar before it: music21 counts its beats on, we count from 1"
OTHER_BEATS = {
    "03b": _ONE_BAR,
    "21a": _ONE_BAR,
    "24b": _ONE_BAR,
    "61i": _ONE_BAR,
    "99a": _ONE_BAR,
    "46c": _SPLIT_BAR,
    "46d": _SPLIT_BAR,
    "liliuokalani/aloha_oe.mxl-1": _SPLIT_BAR,
    "beethoven/opus18no1/movement3.mxl-1": "bar 39 is short, and music21 takes it for an upbeat",
    "haydn/opus1no1/movement4.mxl-2": "bar 42 is short, and music21 takes it for an upbeat",
    "11d": "5/2 and 1/8 in one signature: music21 counts eighths, we halves",
}
"""The same bar, and another beat in it: by number in the suite, by file and part in the corpus."""

DAMAGED = {
    "11b-TimeSignatures-NoTime": "a backup of 384 quarters in a bar of 4; music21 passes over it in silence",
}
"""The notes are the same, and we say what is wrong with the file."""


# --- how they are compared ---------------------------------------------------------------------


def name_of(path: Path) -> str:
    corpus = ROOT / "corpus"
    return str(path.relative_to(corpus)) if corpus in path.parents else path.stem


def our_line(path: Path, theirs: Sequence[LineNote], options: ReadOptions) -> list[LineNote]:
    """Read it, and give lengths in quarter notes, by the beat that music21's lengths make usual."""
    beat = usual_beat([one.length for one in theirs if one.length])
    sheet = read_sheet(path.read_bytes(), "score", NAMES, options)
    assert bool(sheet.lost) == (name_of(path) in DAMAGED), sheet.lost
    notes = [item for item in sheet.items if isinstance(item, Note)]
    return [
        LineNote(round(one.pitch_cents / 100, 6), (one.beats or 0.0) * beat, place.bar, place.beat)
        for one, place in zip(notes, sheet.places, strict=True)
    ]


def same(ours: Sequence[LineNote], theirs: Sequence[LineNote], near: float) -> bool:
    """Say whether two lines have the same pitches and lengths, and bars where both know them."""
    beat = usual_beat([one.length for one in theirs if one.length])
    return len(ours) == len(theirs) and all(
        abs(one.pitch - other.pitch) < 1e-3
        and abs((one.length or 0) - (GRACE_BEATS * beat if other.length is None else other.length)) < near
        and one.bar == other.bar
        for one, other in zip(ours, theirs, strict=True)
    )


def same_beats(ours: Sequence[LineNote], theirs: Sequence[LineNote]) -> bool:
    """Say whether two lines stand on the same beats."""
    return all(abs(one.beat - other.beat) < 0.01 for one, other in zip(ours, theirs, strict=True))


def compared(path: Path, part: int = 1, voice: str = "") -> tuple[list[LineNote], list[LineNote]]:
    """Read a score twice, with the listed difference of its kind taken away where there is one."""
    name = name_of(path)
    score = parsed(path)
    theirs = line_of_score(score, part, voice or "1")
    options = ReadOptions(notation=Notation.LITERAL, part=str(part), voice=voice)
    if name in ONE_SIDED_TIES:
        plain = our_line(path, theirs, options)
        assert not same(plain, theirs, NEAR), "listed, and does not differ"
        theirs = line_of_score(score, part, voice or "1", one_sided_ties=True)
    if name in OTHER_BAR_NAMES:
        printed, theirs_name = OTHER_BAR_NAMES[name]
        assert any(one.bar == theirs_name for one in theirs), "listed, and does not differ"
        theirs = [replace(one, bar=one.bar.replace(theirs_name, printed)) for one in theirs]
    return our_line(path, theirs, options), theirs


# --- the conformance suite ---------------------------------------------------------------------


def test_the_suite_is_there() -> None:
    assert len(SUITE) >= 140
    listed = {*NO_MELODY, *CHOSEN_VOICE, *ONE_NOTE_FOR_CHORD, *TWO_STAVES_ONE_VOICE}
    assert listed <= {path.stem for path in SUITE}


@pytest.mark.parametrize("path", SUITE, ids=lambda path: path.stem)
def test_a_score_of_the_suite_has_the_notes_that_music21_reads(path: Path) -> None:
    if path.stem in NO_MELODY:
        with pytest.raises(MusicFileError):
            read_sheet(path.read_bytes(), "score", NAMES)
        return
    ours, theirs = compared(path, *CHOSEN_VOICE.get(path.stem, (1, "")))
    if path.stem in ONE_NOTE_FOR_CHORD:
        assert (len(ours), len(theirs)) == (1, 3)
        assert ours[0].pitch == max(one.pitch for one in theirs)
    elif path.stem in TWO_STAVES_ONE_VOICE:
        left = iter(ours)
        assert len(ours) > len(theirs)
        assert all(any(same([one], [other], NEAR) for one in left) for other in theirs)
    else:
        assert same(ours, theirs, NEAR), list(zip(ours, theirs, strict=False))
        assert same_beats(ours, theirs) == (path.stem.split("-")[0] not in OTHER_BEATS)


# --- the corpus --------------------------------------------------------------------------------

FEW = [
    Case("bach/bwv66.6.mxl"),
    Case("bach/bwv165.6.mxl", part=4),
    Case("corelli/opus3no1/1grave.xml"),
    Case("leadSheet/fosterBrownHair.mxl"),
    Case("monteverdi/madrigal.4.18.mxl"),
    Case("trecento/PMFC_12_24-Benedicamus.xml"),
    Case("webern/webern_dormi_jesu_op_16_no_2.mxl", part=2),
]
NESTED_TUPLETS = sorted(path.name for path in (ROOT / "corpus" / "demos").glob("nested_tuplet_*.xml"))
MANY = [
    Case("bach/bwv248.23-s.mxl", part=2),
    Case("beach/prayer_of_a_tired_child.musicxml"),
    Case("beethoven/opus18no1/movement3.mxl"),
    Case("beethoven/opus18no1/movement3.mxl", part=4),
    Case("ciconia/quod_jactatur.xml"),
    Case("cpebach/h186.mxl", voice="1"),
    Case("demos/ComprehensiveChordSymbolsTestFile.mxl"),
    Case("demos/chorale_with_parallels.mxl"),
    Case("demos/chord_realization_exercise.mxl"),
    Case("demos/incorrect_time_signature_pv.mxl"),
    *(Case(f"demos/{name}") for name in NESTED_TUPLETS),
    Case("demos/two-voices.xml", voice="4"),
    Case("handel/rinaldo/Lascia_chio_pianga.mxl"),
    Case("haydn/opus1no1/movement2.mxl"),
    Case("haydn/opus1no1/movement4.mxl", part=2, voice="1"),
    Case("johnson_j_r/lift_every_voice.mxl"),
    Case("joplin/maple_leaf_rag.mxl", voice="1"),
    Case("leadSheet/berlinAlexandersRagtime.mxl"),
    Case("liliuokalani/aloha_oe.mxl"),
    Case("luca/gloria.xml"),
    Case("lusitano/allor_che_ignuda.mxl"),
    Case("monteverdi/madrigal.4.9.mxl"),
    Case("mozart/k156/movement3.mxl"),
    Case("mozart/k156/movement4.mxl", part=3),
    Case("mozart/k458/movement2.mxl"),
    Case("mozart/k545/movement1_exposition.mxl"),
    Case("mozart/k80/movement3.mxl"),
    Case("schubert/Lindenbaum.xml"),
    Case("schumann_clara/polonaise_op1n2.mxl", voice="1"),
    Case("schumann_clara/polonaise_op1n4.mxl", voice="1"),
    Case("schumann_robert/opus41no1/movement2.mxl"),
    Case("schumann_robert/opus48no2.mxl"),
    Case("theoryExercises/TriadExercise.mxl"),
    Case("theoryExercises/checker_demo.mxl", part=3),
    Case("trecento/PMFC_12_22-Benedicamus PMFC12.22.xml"),
    Case("trecento/PMFC_13_01-Kyrie-Summe-Clementissime.mxl"),
    Case("trecento/PMFC_13_02-Kyrie-Questa-fanciulla.mxl"),
    Case("verdi/laDonnaEMobile.mxl", voice="1"),
    Case("weber/concertino_clarinet.mxl"),
]


def check_case(case: Case) -> None:
    ours, theirs = compared(ROOT / "corpus" / case.path, case.part, case.voice)
    assert len(theirs) >= 8
    assert same(ours, theirs, NEAR), [
        (one, other) for one, other in zip(ours, theirs, strict=False) if not same([one], [other], NEAR)
    ]
    assert same_beats(ours, theirs) == (f"{case.path}-{case.part}" not in OTHER_BEATS)


def test_every_difference_of_beats_is_of_a_score_that_is_read() -> None:
    numbers = [path.stem.split("-")[0] for path in SUITE]
    parts = [f"{case.path}-{case.part}" for case in (*FEW, *MANY)]
    assert all([*numbers, *parts].count(key) == 1 for key in OTHER_BEATS)
    assert len(NESTED_TUPLETS) >= 2


@pytest.mark.parametrize("case", FEW, ids=lambda case: case.path)
def test_a_score_of_the_corpus_has_the_notes_that_music21_reads(case: Case) -> None:
    check_case(case)


@pytest.mark.slow
@pytest.mark.parametrize("case", MANY, ids=lambda case: f"{case.path}-{case.part}{case.voice}")
def test_another_score_of_the_corpus_has_the_notes_that_music21_reads(case: Case) -> None:
    check_case(case)


# --- MIDI files --------------------------------------------------------------------------------

MIDI_FILES = sorted(
    path
    for path in [*ROOT.glob("midi/testPrimitive/*.mid"), *ROOT.glob("omr/*short.mid")]
    if path.stat().st_size < 15_000  # music21 takes ten seconds for a long one
)
MIDI_BENT = {
    "test19": "notes slide to and from where they rest: near the key, which is what music21 gives",
    "test21": "notes slide to and from where they rest: near the key, which is what music21 gives",
}
MIDI_FAR_BELOW = {"test03": (233, 277)}
"""Notes of music21's line that begin more than an octave under one that is held: no melody for us."""


def our_midi_line(data: bytes) -> list[LineNote]:
    """Read the line, in seconds, as it sounds."""
    sheet = read_sheet(data, "file", NAMES)
    assert sheet.lost == ()
    notes = [item for item in sheet.items if isinstance(item, Note)]
    return [LineNote(one.pitch_cents / 100, one.duration_s) for one in notes]


def lengths_fit(data: bytes, struck: Sequence[Struck]) -> bool:
    """Say whether written lengths lie between what music21 has sound and the start of the next note."""
    items = read_sheet(data, "file", NAMES).items
    notes = [item for item in items if isinstance(item, Note) and item.duration_s]
    if notes[0].beats is None:  # it was played
        return True
    return any(_outside(notes, struck, beat) == 0 for beat in BEATS)


def _outside(notes: Sequence[Note], struck: Sequence[Struck], beat: float) -> int:
    return sum(
        not float(one.until - one.at) - NEAR
        <= (note.beats or 0.0) * beat
        <= float((one.following or one.until) - one.at) + NEAR
        for note, one in zip(notes[:-1], struck, strict=False)
    )


BEATS = [2.0**power for power in range(-4, 2)]  # what one beat may be, in quarter notes


def test_the_midi_files_are_there() -> None:
    assert len(MIDI_FILES) >= 18
    assert {*MIDI_BENT, *MIDI_FAR_BELOW} <= {path.stem for path in MIDI_FILES}


def without(struck: Sequence[Struck], places: Sequence[int]) -> list[Struck]:
    """Leave out notes far below the one before them, which goes on in their stead."""
    kept = list(struck)
    for at in sorted(places, reverse=True):
        below = kept.pop(at)
        assert below.pitch <= kept[at - 1].pitch - 12
        assert below.at == kept[at - 1].until  # cut off in music21's line
        kept[at - 1] = replace(kept[at - 1], until=below.until, following=below.following)
    return kept


@pytest.mark.parametrize("path", MIDI_FILES, ids=lambda path: path.stem)
def test_a_midi_file_has_the_notes_that_music21_reads(path: Path) -> None:
    score = parsed(path)
    struck = without(line_of_midi(score), MIDI_FAR_BELOW.get(path.stem, ()))
    ours, theirs = our_midi_line(path.read_bytes()), in_seconds(score, struck)
    if path.stem in MIDI_BENT:
        bends = [abs(one.pitch - other.pitch) for one, other in zip(ours, theirs, strict=True)]
        assert 0.01 < max(bends) < 0.1  # semitones
        ours = [replace(one, pitch=other.pitch) for one, other in zip(ours, theirs, strict=True)]
    assert same(ours, theirs, NEAR), list(zip(ours, theirs, strict=False))
    assert lengths_fit(path.read_bytes(), struck)


@pytest.mark.parametrize("case", FEW, ids=lambda case: case.path)
def test_midi_that_music21_writes_has_the_notes_that_music21_reads_in_it(case: Case, tmp_path: Path) -> None:
    path = tmp_path / "line.mid"
    path.write_bytes(written_by_music21(parsed(ROOT / "corpus" / case.path), case.part))
    score = parsed(path)
    struck = line_of_midi(score)
    ours, theirs = our_midi_line(path.read_bytes()), in_seconds(score, struck)
    assert len(theirs) >= 8
    assert same(ours, theirs, NEAR), list(zip(ours, theirs, strict=False))
    assert lengths_fit(path.read_bytes(), struck)


@pytest.mark.parametrize("case", FEW, ids=lambda case: case.path)
def test_midi_that_mido_writes_has_the_notes_of_the_score(case: Case) -> None:
    line = [one for one in line_of_score(parsed(ROOT / "corpus" / case.path), case.part) if one.length]
    notes = [item for item in read_sheet(by_mido(line), "file", NAMES).items if isinstance(item, Note)]
    beat = usual_beat([one.length or 0.0 for one in line])
    ours = [LineNote(one.pitch_cents / 100, (one.beats or 0.0) * beat) for one in notes]
    assert same(ours, [LineNote(one.pitch, one.length) for one in line], NEAR)


QUARTERS_A_MINUTE, TICKS = 96, 960


def by_mido(line: Sequence[LineNote]) -> bytes:
    """Write a line with mido, note after note."""
    track = mido.MidiTrack([mido.MetaMessage("set_tempo", tempo=mido.bpm2tempo(QUARTERS_A_MINUTE))])
    for one in line:
        track.append(mido.Message("note_on", note=round(one.pitch), velocity=70))
        track.append(mido.Message("note_off", note=round(one.pitch), time=round((one.length or 0) * TICKS)))
    written = BytesIO()
    mido.MidiFile(type=1, ticks_per_beat=TICKS, tracks=[track]).save(file=written)
    return written.getvalue()
