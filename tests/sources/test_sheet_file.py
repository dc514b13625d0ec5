"""Any file of music to a sheet: its kind by its content, options that fit, places in note text."""

from __future__ import annotations

import io
from contextlib import suppress

import mido
import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.core.note import Note
from melodycoach.core.sheet import Place, SheetKind
from melodycoach.errors import MelodycoachError, NoteTextError, UsageError
from melodycoach.sources.accidental_table import Notation
from melodycoach.sources.pack_file import load_pack
from melodycoach.sources.sheet_file import (
    OPTION_KINDS,
    ReadOptions,
    kind_of,
    read_note_sheet,
    read_sheet,
    read_text,
)

NAMES = load_pack("makam").names

SCORE = (
    b'<score-partwise version="4.0"><part-list><score-part id="P1"><part-name>Ney</part-name></score-part>'
    b'</part-list><part id="P1"><measure number="1"><attributes><divisions>1</divisions></attributes>'
    b"<note><pitch><step>A</step><octave>4</octave></pitch><duration>1</duration></note>"
    b"</measure></part></score-partwise>"
)


def midi_file() -> bytes:
    """Let mido, which is not us, write two keys."""
    file, track = mido.MidiFile(), mido.MidiTrack()
    file.tracks.append(track)
    for key in (69, 71):
        track += [mido.Message("note_on", note=key), mido.Message("note_off", note=key, time=480)]
    written = io.BytesIO()
    file.save(file=written)
    return written.getvalue()


@pytest.mark.parametrize(
    ("data", "kind"),
    [
        (b"", SheetKind.NOTE_TEXT),
        (b"A4 B4-1", SheetKind.NOTE_TEXT),
        ("\ufeffA4".encode(), SheetKind.NOTE_TEXT),
        ("A4".encode("utf-16"), SheetKind.NOTE_TEXT),  # no score: it does not begin with <
        (b"MThd\0\0\0\6", SheetKind.MIDI),
        (b"RIFF\x10\0\0\0RMIDdata", SheetKind.MIDI),
        (b"\0junk" * 1000 + b"MThd\0\0\0\6", SheetKind.MIDI),
        (b"\1\2MTrk\0\0\0\4\0\xff\x2f\0", SheetKind.MIDI),  # its header is lost
        (b"A4 # MThd and MTrk are chunks", SheetKind.NOTE_TEXT),
        (b"RIFF\x10\0\0\0WAVEfmt ", SheetKind.NOTE_TEXT),
        (b"PK\x03\x04....", SheetKind.MUSIC_XML),
        (b"<?xml version='1.0'?>", SheetKind.MUSIC_XML),
        (b" \n<score-partwise>", SheetKind.MUSIC_XML),
        ("\ufeff<score-partwise>".encode(), SheetKind.MUSIC_XML),
        ("<score>".encode("utf-16"), SheetKind.MUSIC_XML),
        ("\ufeff<score>".encode("utf-16-be"), SheetKind.MUSIC_XML),
        ("<score>".encode("utf-16-le"), SheetKind.MUSIC_XML),
    ],
)
def test_the_kind_of_a_file_is_told_by_how_it_begins(data: bytes, kind: SheetKind) -> None:
    assert kind_of(data) is kind


def test_each_kind_goes_to_its_reader_whatever_the_file_is_called() -> None:
    text = read_sheet(b"A4 B4-1", "line.mid", NAMES)
    assert (text.kind, len(text.places)) == (SheetKind.NOTE_TEXT, 2)
    midi = read_sheet(midi_file(), "line.txt", NAMES)
    assert (midi.kind, len(midi.places)) == (SheetKind.MIDI, 2)
    score = read_sheet(SCORE, "line.txt", NAMES)
    assert (score.kind, len(score.places)) == (SheetKind.MUSIC_XML, 1)


SAID = ReadOptions(track="1", channel=1, part="Ney", voice="1", notation=Notation.AEU)


def test_every_option_is_said_of_one_kind_of_file() -> None:
    assert SAID.unfit(SheetKind.NOTE_TEXT) == tuple(OPTION_KINDS)
    assert SAID.unfit(SheetKind.MIDI) == ("part", "voice", "notation")
    assert SAID.unfit(SheetKind.MUSIC_XML) == ("track", "channel")
    assert SAID.fitting(SheetKind.MIDI) == ReadOptions(track="1", channel=1)
    assert SAID.fitting(SheetKind.NOTE_TEXT) == ReadOptions()
    assert ReadOptions().unfit(SheetKind.NOTE_TEXT) == ()


@pytest.mark.parametrize(
    ("options", "said"),
    [
        (ReadOptions(track="2"), "a.txt: the track is chosen in a MIDI file, found note text; leave it out"),
        (
            ReadOptions(channel=2),
            "a.txt: the channel is chosen in a MIDI file, found note text; leave it out",
        ),
        (ReadOptions(part="Ney"), "a.txt: the part is chosen in MusicXML, found note text; leave it out"),
    ],
)
def test_an_option_that_says_nothing_of_a_file_is_refused(options: ReadOptions, said: str) -> None:
    with pytest.raises(UsageError) as error:
        read_sheet(b"A4", "a.txt", NAMES, options)
    assert str(error.value) == said


def test_an_option_that_says_nothing_of_one_of_many_files_is_passed_over() -> None:
    assert len(read_sheet(b"A4", "a.txt", NAMES, SAID, strict=False).items) == 1
    assert read_sheet(midi_file(), "a.mid", NAMES, SAID, strict=False).kind is SheetKind.MIDI


def test_the_track_and_channel_reach_the_reader_of_midi_files() -> None:
    with pytest.raises(MelodycoachError, match=r"a\.mid: .*'no such track'"):
        read_sheet(midi_file(), "a.mid", NAMES, ReadOptions(track="no such track"))


def test_the_part_reaches_the_reader_of_scores() -> None:
    with pytest.raises(MelodycoachError, match=r"a\.xml: .*'Kanun'"):
        read_sheet(SCORE, "a.xml", NAMES, ReadOptions(part="Kanun"))


# --- note text ---------------------------------------------------------------------------------


def places(text: str) -> list[Place]:
    return list(read_note_sheet(text, NAMES).places)


def test_a_note_of_a_text_with_bar_lines_has_its_bar_and_beat() -> None:
    # 1 beat, 2 beats, a rest of 1/2: the third note of bar 1 begins on beat 4.5
    assert places("A4 B4-1:2 -:1/2 C5 | D5:3 E5 |\n A4") == [
        Place("1", 1.0, "line 1, column 1"),
        Place("1", 2.0, "line 1, column 4"),
        Place("1", 4.5, "line 1, column 17"),
        Place("2", 1.0, "line 1, column 22"),
        Place("2", 4.0, "line 1, column 27"),
        Place("3", 1.0, "line 2, column 2"),
    ]


def test_a_text_without_bar_lines_has_places_in_the_text_alone() -> None:
    assert places("title: x\n\nA4 , B4-1 .") == [Place(at="line 3, column 1"), Place(at="line 3, column 6")]


def test_a_bar_line_that_nothing_stands_before_begins_no_bar() -> None:
    assert [place.bar for place in places("| A4 | , | B4-1 | - | C5 |")] == ["1", "2", "4"]


def test_thirds_of_a_beat_add_up() -> None:
    assert [place.beat for place in places("A4:1/3 A4:1/3 A4:1/3 A4 | A4")] == [
        pytest.approx(1),
        pytest.approx(4 / 3),
        pytest.approx(5 / 3),
        2.0,
        1.0,
    ]


def test_headers_are_what_the_sheet_says_of_itself() -> None:
    sheet = read_note_sheet("title: Sketch\nmode: huseyni\nfinal: A4\ntempo: 90\nA4 .", NAMES)
    assert (sheet.title, sheet.mode, sheet.final_cents, sheet.tempo) == ("Sketch", "huseyni", 6900.0, 90.0)
    assert sheet.says == sheet.lost == ()


def test_all_bad_tokens_of_a_text_are_named_at_once() -> None:
    with pytest.raises(NoteTextError) as error:
        read_sheet(b"A4 H5\nB4 qq:2", "a.txt", NAMES)
    assert [fault.split(": ")[0] for fault in error.value.faults] == ["a.txt:1:4", "a.txt:2:4"]


def test_a_text_that_is_no_utf_8_is_refused_with_the_byte() -> None:
    with pytest.raises(NoteTextError) as error:
        read_sheet("A4 dügâh".encode("latin-1"), "a.txt", NAMES)
    assert str(error.value) == "a.txt: byte 4 is not UTF-8 text; save the file as UTF-8"
    assert read_text("\ufeffdügâh".encode(), "a.txt") == "dügâh"


@pytest.mark.parametrize("encoding", ["utf-16-le", "utf-16-be"])
def test_a_text_in_utf_16_with_its_mark_is_read(encoding: str) -> None:
    data = "\ufefftitle: Dügâh\nA4 B4-1 dügâh".encode(encoding)
    sheet = read_sheet(data, "a.txt", NAMES)
    assert (sheet.kind, sheet.title, len(sheet.places)) == (SheetKind.NOTE_TEXT, "Dügâh", 3)
    with pytest.raises(NoteTextError) as error:
        read_text(data[:-1], "a.txt")
    assert str(error.value) == f"a.txt: byte {len(data) - 2} is not UTF-16 text; save the file as UTF-8"


@given(st.binary(max_size=300) | st.text(max_size=100).map(str.encode))
def test_any_bytes_at_all_are_read_or_refused_by_our_own_errors(data: bytes) -> None:
    with suppress(MelodycoachError):
        sheet = read_sheet(data, "any", NAMES)
        assert len(sheet.places) == sum(isinstance(item, Note) for item in sheet.items)
