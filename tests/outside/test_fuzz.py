"""Whatever the bytes are: a sheet comes out, or one of our own errors, and soon.

Hypothesis makes bytes out of nothing, and out of whole files by what happens to files: bits turn, pieces are
cut out, put in, or there twice, and the end is missing. Bombs go through the command line, in a process of
their own, so that its time and its memory can be taken.
"""

from __future__ import annotations

import subprocess
import sys
import time
import zipfile
from io import BytesIO
from typing import TYPE_CHECKING

import pytest
from book_lines import BY_THE_BOOK
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from written_out import as_midi, as_music_xml, in_score

from melodycoach.core.note import Note
from melodycoach.errors import MelodycoachError
from melodycoach.sources.accidentals import Notation
from melodycoach.sources.note_text import read_note_text
from melodycoach.sources.pack_file import load_pack
from melodycoach.sources.sheet_file import ReadOptions, read_sheet

if TYPE_CHECKING:
    from collections.abc import Callable
    from pathlib import Path

NAMES = load_pack("makam").names
MOST_S, MOST_MB = 2.0, 200.0
TEXT = f"title: Deneme\ntempo: 80\n\n{BY_THE_BOOK['hicaz']}\n{BY_THE_BOOK['segah']}\n"
LINE = read_note_text(TEXT, NAMES)


def packed(score: bytes) -> bytes:
    file = BytesIO()
    with zipfile.ZipFile(file, "w", zipfile.ZIP_DEFLATED) as zipped:
        root = '<container><rootfiles><rootfile full-path="a.xml"/></rootfiles></container>'
        zipped.writestr("META-INF/container.xml", root)
        zipped.writestr("a.xml", score)
    return file.getvalue()


WHOLE = {
    "note text": TEXT.encode(),
    "MIDI": as_midi(LINE),
    "MusicXML": as_music_xml(LINE),
    "MusicXML in UTF-16": as_music_xml(LINE).decode().replace("UTF-8", "UTF-16").encode("utf-16"),
    "compressed MusicXML": packed(as_music_xml(LINE)),
}
STARTS = {
    "nothing": b"",
    "MIDI": b"MThd\0\0\0\6\0\0\0\1\0`MTrk",
    "RIFF": b"RIFF\0\0\0\0RMID",
    "XML": b"<",
    "zip": b"PK\3\4",
}

options = st.builds(
    ReadOptions,
    track=st.sampled_from(["", "1", "2", "ney"]),
    channel=st.sampled_from([None, 1, 10, 16]),
    part=st.sampled_from(["", "1", "9", "ney"]),
    voice=st.sampled_from(["", "1", "2"]),
    notation=st.sampled_from([None, *Notation]),
)


def read_or_refuse(data: bytes, chosen: ReadOptions | None = None) -> None:
    """Read it: notes that can be played come out, or an error in one line."""
    began_s = time.perf_counter()
    try:
        sheet = read_sheet(data, "file", NAMES, chosen, strict=False)
    except MelodycoachError as error:
        said = [str(error), *error.faults]
    else:
        said = [*sheet.says, *sheet.lost, sheet.title, sheet.mode]
        notes = [item for item in sheet.items if isinstance(item, Note)]
        assert len(notes) == len(sheet.places)
        # keys 0 and 127 can be bent further, and the widest bend is 96 semitones (MPE)
        assert all(-9_600 <= note.pitch_cents <= 22_300 for note in notes)
        assert all(note.duration_s >= 0 and (note.beats is None or note.beats > 0) for note in notes)
    assert [one for one in said if not one.isprintable()] == []
    assert time.perf_counter() - began_s < MOST_S


# --- bytes out of nothing ----------------------------------------------------------------------


@pytest.mark.parametrize("start", STARTS)
@given(rest=st.binary(max_size=400), chosen=options)
def test_bytes_out_of_nothing_are_read_or_refused(start: str, rest: bytes, chosen: ReadOptions) -> None:
    read_or_refuse(STARTS[start] + rest, chosen)


@given(text=st.text(max_size=200))
def test_any_text_is_read_or_refused(text: str) -> None:
    read_or_refuse(text.encode("utf-8", "surrogatepass"))


# --- whole files that something happened to ----------------------------------------------------


def turn(data: bytes, at: int, size: int, other: bytes) -> bytes:
    """Turn one bit."""
    return data[:at] + bytes([data[at] ^ (1 << size % 8)]) + data[at + 1 :]


def write_over(data: bytes, at: int, size: int, other: bytes) -> bytes:
    return data[:at] + other + data[at + len(other) :]


def cut_out(data: bytes, at: int, size: int, other: bytes) -> bytes:
    return data[:at] + data[at + size :]


def cut_off(data: bytes, at: int, size: int, other: bytes) -> bytes:
    return data[:at]


def put_in(data: bytes, at: int, size: int, other: bytes) -> bytes:
    return data[:at] + other + data[at:]


def double(data: bytes, at: int, size: int, other: bytes) -> bytes:
    return data[: at + size] + data[at:]


CHANGES: list[Callable[[bytes, int, int, bytes], bytes]] = [
    turn,
    write_over,
    cut_out,
    cut_off,
    put_in,
    double,
]
# pieces that mean something in one of the formats
PIECES = [
    b"</note>", b"<note>", b"<chord/>", b"<grace/>", b"<rest/>", b"</measure>", b"<measure>", b"<part>",
    b"<backup><duration>99</duration></backup>", b"<forward><duration>-9</duration></forward>",
    b"<divisions>0</divisions>", b"<alter>1e308</alter>", b"<octave>99</octave>", b"<fifths>99999</fifths>",
    b"<transpose><chromatic>1e30</chromatic></transpose>", b'<tie type="start"/>', b"NaN", b"inf", b"-1",
    b"\xff\x51\x03\0\0\0", b"\xff\x58\x04\0\0\0\0", b"\xff\x59\x02\x7f\x7f", b"\xf0\x7f\x7f", b"\xff\xff",
    b"MTrk\x7f\xff\xff\xff", b"\0\x90\x45\x40", b"\0\xe0\x7f\x7f", b"\xb0\x65\0\0\xb0\x64\0\0\xb0\x06\x7f",
    b":1/0", b":1e9", b"~", b"title:", b"key: B-1", "\u0663".encode(), "½".encode(), b"\0", b"\x1b[2J",
]  # fmt: skip
changes = st.lists(
    st.tuples(
        st.sampled_from(CHANGES),
        st.floats(0, 1, exclude_max=True),
        st.integers(1, 200),
        st.one_of(st.sampled_from(PIECES), st.binary(min_size=1, max_size=8)),
    ),
    min_size=1,
    max_size=6,
)


@pytest.mark.parametrize("kind", WHOLE)
@settings(max_examples=150, suppress_health_check=[HealthCheck.too_slow])
@given(happened=changes, chosen=options)
def test_a_damaged_file_is_read_or_refused(kind: str, happened: list, chosen: ReadOptions) -> None:
    data = WHOLE[kind]
    for change, where, size, other in happened:
        data = change(data, int(where * len(data)), size, other) if data else other
    read_or_refuse(data, chosen)


@pytest.mark.parametrize("kind", WHOLE)
def test_a_file_that_is_whole_is_read(kind: str) -> None:
    sheet = read_sheet(WHOLE[kind], "file", NAMES)
    assert len(sheet.places) == 19
    assert sheet.lost == ()


@pytest.mark.parametrize("kind", ["note text", "MIDI", "MusicXML"])
def test_a_file_that_breaks_off_anywhere_is_read_or_refused(kind: str) -> None:
    step = len(WHOLE[kind]) // 400 + 1
    for end in range(0, len(WHOLE[kind]), step):
        read_or_refuse(WHOLE[kind][:end])


NUMBERS = [
    "0",
    "-1",
    "1e308",
    "-1e308",
    "1e-320",
    "9" * 30,
    "inf",
    "nan",
    "",
    " ",
    "1.5",
    "0x10",
    "1_0",
    "\u0663",
]
ELEMENTS = {
    "divisions": "<attributes><divisions>{}</divisions></attributes>",
    "fifths": "<attributes><key><fifths>{}</fifths></key></attributes>",
    "key-alter": "<attributes><key><key-step>B</key-step><key-alter>{}</key-alter></key></attributes>",
    "key-octave": (
        "<attributes><key><key-step>B</key-step><key-alter>-1</key-alter>"
        '<key-octave number="1">{}</key-octave></key></attributes>'
    ),
    "beats": "<attributes><time><beats>{}</beats><beat-type>4</beat-type></time></attributes>",
    "beat-type": "<attributes><time><beats>4</beats><beat-type>{}</beat-type></time></attributes>",
    "chromatic": "<attributes><transpose><chromatic>{}</chromatic></transpose></attributes>",
    "diatonic": (
        "<attributes><transpose><diatonic>{}</diatonic><chromatic>2</chromatic></transpose></attributes>"
    ),
    "octave-change": (
        "<attributes><transpose><chromatic>0</chromatic><octave-change>{}</octave-change></transpose>"
        "</attributes>"
    ),
    "tempo": '<sound tempo="{}"/>',
    "per-minute": (
        "<direction><direction-type><metronome><beat-unit>quarter</beat-unit><per-minute>{}</per-minute>"
        "</metronome></direction-type></direction>"
    ),
    "backup": "<backup><duration>{}</duration></backup>",
    "forward": "<forward><duration>{}</duration></forward>",
    "duration": (
        "<note><pitch><step>B</step><octave>4</octave></pitch><duration>{}</duration><voice>1</voice></note>"
    ),
    "octave": (
        "<note><pitch><step>B</step><octave>{}</octave></pitch><duration>48</duration><voice>1</voice></note>"
    ),
    "alter": (
        "<note><pitch><step>B</step><alter>{}</alter><octave>4</octave></pitch><duration>48</duration>"
        "<voice>1</voice></note>"
    ),
}


@pytest.mark.parametrize("notation", [None, *Notation], ids=str)
@pytest.mark.parametrize("name", ELEMENTS)
def test_any_number_in_a_score_is_read_or_refused(name: str, notation: Notation | None) -> None:
    whole = WHOLE["MusicXML"].decode()
    for number in NUMBERS:
        score = whole.replace("<note>", ELEMENTS[name].format(number) + "<note>", 1)
        assert score != whole
        read_or_refuse(score.encode(), ReadOptions(notation=notation))
        # alone, so that no other sign of the score decides
        bare = in_score([f'<measure number="1">{ELEMENTS[name].format(number)}{A_NOTE}</measure>'])
        read_or_refuse(bare.encode(), ReadOptions(notation=notation))


A_NOTE = "<note><pitch><step>A</step><octave>4</octave></pitch><duration>1</duration><voice>1</voice></note>"


# --- bombs -------------------------------------------------------------------------------------


def billion_laughs() -> bytes:
    laughs = "".join(f'<!ENTITY l{n} "{f"&l{n - 1};" * 10}">' for n in range(1, 10))
    text = '<?xml version="1.0"?><!DOCTYPE score-partwise [<!ENTITY l0 "ha">' + laughs + "]>"
    return (text + "<score-partwise><part-list/>&l9;</score-partwise>").encode()


def one_long_entity() -> bytes:
    text = f'<?xml version="1.0"?><!DOCTYPE score-partwise [<!ENTITY a "{"a" * 50_000}">]>'
    return (text + "<score-partwise>" + "&a;" * 50_000 + "</score-partwise>").encode()


def another_file() -> bytes:
    text = '<?xml version="1.0"?><!DOCTYPE score-partwise [<!ENTITY a SYSTEM "file:///etc/passwd">]>'
    return (text + "<score-partwise><work><work-title>&a;</work-title></work></score-partwise>").encode()


def deep() -> bytes:
    return b"<score-partwise>" + b"<a>" * 3_000_000


def many_names() -> bytes:
    return b"<score-partwise>" + b"".join(b"<a%d/>" % n for n in range(1_500_000))


def zip_bomb() -> bytes:
    return packed(b"<score-partwise>" + b" " * 100_000_000)


def zip_of_many() -> bytes:
    file = BytesIO()
    with zipfile.ZipFile(file, "w") as zipped:
        for number in range(60_000):
            zipped.writestr(f"{number}.xml", "")
    return file.getvalue()


def long_midi_track() -> bytes:
    return b"MThd\0\0\0\6\0\0\0\1\0`MTrk\x7f\xff\xff\xff" + b"\0\x90\x45\x40" * 5_000_000


def many_midi_tracks() -> bytes:
    return b"MThd\0\0\0\6\0\1\xff\xff\0`" + (b"MTrk\0\0\0\4\0\xff\x2f\0" * 1_600_000)


def long_note_text() -> bytes:
    return b"A4 " * 7_000_000


BOMBS = [
    billion_laughs, one_long_entity, another_file, deep, many_names, zip_bomb, zip_of_many, long_midi_track,
    many_midi_tracks, long_note_text,
]  # fmt: skip

# the peak of this process alone: ru_maxrss would count the one that started it
CHECK_AND_MEASURE = """
import re, sys
from melodycoach.cli import main
code = main(["check", sys.argv[1]])
with open("/proc/self/status") as status:
    sys.stdout.write(re.search(r"VmHWM:\\s+(\\d+)", status.read())[1])
sys.exit(code)
"""


@pytest.mark.skipif(not sys.platform.startswith("linux"), reason="the peak of memory is read from /proc")
@pytest.mark.slow
@pytest.mark.parametrize("bomb", BOMBS, ids=lambda bomb: bomb.__name__)
def test_a_bomb_is_refused_in_one_sentence_soon_and_at_little_cost(
    bomb: Callable[[], bytes], tmp_path: Path
) -> None:
    path = tmp_path / "bomb"
    path.write_bytes(bomb())
    began_s = time.perf_counter()
    done = subprocess.run(
        [sys.executable, "-c", CHECK_AND_MEASURE, str(path)], capture_output=True, check=False, text=True
    )
    took_s = time.perf_counter() - began_s
    assert done.returncode == 2, done.stderr
    assert len(done.stderr.strip().splitlines()) == 1
    assert "root:" not in done.stdout + done.stderr
    assert took_s < MOST_S
    assert int(done.stdout) / 1024 < MOST_MB
