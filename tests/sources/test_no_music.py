"""Pictures, recordings and documents are known for what they are, and nothing that we read is."""

from __future__ import annotations

import io
import wave
import zipfile

import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.core.sheet import SheetKind
from melodycoach.errors import MusicFileError
from melodycoach.sources.no_music import no_music
from melodycoach.sources.pack_file import load_pack
from melodycoach.sources.sheet_file import kind_of, read_sheet, read_text

NAMES = load_pack("makam").names


def zipped(name: str, content: str) -> bytes:
    """Let zipfile, which is not us, pack one file; what word processors write begins with such a one."""
    written = io.BytesIO()
    with zipfile.ZipFile(written, "w") as file:
        file.writestr(name, content)
    return written.getvalue()


def sound() -> bytes:
    """Let wave, which is not us, write a recording of silence."""
    written = io.BytesIO()
    with wave.open(written, "wb") as file:
        file.setnchannels(1)
        file.setsampwidth(2)
        file.setframerate(8000)
        file.writeframes(b"\0" * 16)
    return written.getvalue()


# the bytes below are from memory, but for what the two functions above let others write
OTHERS = [
    ("page.png", b"\x89PNG\r\n\x1a\n\0\0\0\rIHDR", "a picture"),
    ("page.jpg", b"\xff\xd8\xff\xe0\0\x10JFIF", "a picture"),
    ("page.gif", b"GIF89a\1\0", "a picture"),
    ("page.tif", b"II*\0\x08\0\0\0", "a picture"),
    ("page.webp", b"RIFF\x10\0\0\0WEBPVP8 ", "a picture"),
    ("take.wav", sound(), "a recording"),
    ("take.aiff", b"FORM\0\0\0\x20AIFFCOMM", "a recording"),
    ("take.ogg", b"OggS\0\2\0\0", "a recording"),
    ("take.flac", b"fLaC\0\0\0\x22", "a recording"),
    ("take.mp3", b"ID3\4\0\0\0\0\0\0", "a recording"),
    ("take2.mp3", b"\xff\xfb\x90\x44", "a recording"),
    ("take.m4a", b"\0\0\0\x20ftypM4A ", "a recording or a film"),
    ("draft.pdf", b"%PDF-1.7\n", "a document"),
    ("draft.rtf", b"{\\rtf1\\ansi", "a document"),
    ("draft.doc", b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1", "a document"),
    ("draft.docx", zipped("[Content_Types].xml", "<Types/>"), "a document"),
    ("draft.odt", zipped("mimetype", "application/vnd.oasis.opendocument.text"), "a document"),
]


@pytest.mark.parametrize(("name", "data", "kind"), OTHERS, ids=[name for name, _, _ in OTHERS])
def test_what_is_no_line_of_notes_is_named_and_what_to_do_is_said(name: str, data: bytes, kind: str) -> None:
    says = f"{name}: is {kind}, not a line of notes; export MusicXML or MIDI"
    with pytest.raises(MusicFileError) as error:
        read_sheet(data, name, NAMES)
    assert str(error.value) == says
    with pytest.raises(MusicFileError) as error:
        read_text(data, name)
    assert str(error.value) == says


@pytest.mark.parametrize(
    "data",
    [
        b"MThd\0\0\0\6",
        b"RIFF\x10\0\0\0RMIDdata",
        zipped("META-INF/container.xml", "<container/>"),
        zipped("mimetype", "application/vnd.recordare.musicxml"),
        "<score>".encode("utf-16"),
        "\ufeffA4".encode("utf-16-le"),
        "\ufeffA4".encode("utf-16-be"),
        b"",
    ],
)
def test_what_we_read_is_no_such_file(data: bytes) -> None:
    assert no_music(data) == ""


@given(st.text(st.characters(min_codepoint=10, max_codepoint=0x17F), max_size=60).map(str.encode))
def test_a_text_is_taken_for_another_file_only_where_it_begins_like_one(data: bytes) -> None:
    plain = kind_of(data) is SheetKind.NOTE_TEXT and not data.startswith((b"%", b"{", b"OggS", b"fLaC"))
    assert not plain or no_music(data) == "" or data[4:8] == b"ftyp"
