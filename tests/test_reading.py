"""Files from the disk and from standard input: what is no file, too much, or missing is refused."""

from __future__ import annotations

import io
import os
import sys
from pathlib import Path

import pytest

from melodycoach import reading
from melodycoach.core.sheet import SheetKind
from melodycoach.errors import StorageError, UnknownModeError
from melodycoach.reading import mode_named, read_bytes, read_file
from melodycoach.sources.pack_file import load_pack
from melodycoach.sources.sheet_file import read_sheet

PACK = load_pack("makam")
WANTED = "name a file of note text, a MIDI file or MusicXML"


def refusal(path: Path | str) -> str:
    with pytest.raises(StorageError) as error:
        read_bytes(str(path))
    return str(error.value)


def test_a_file_is_read_to_a_sheet(tmp_path: Path) -> None:
    path = tmp_path / "line.txt"
    path.write_text("mode: rast\nG4 A4 .", encoding="utf-8")
    sheet = read_sheet(read_bytes(str(path)), path.name, PACK.names)
    assert (sheet.kind, sheet.mode, len(sheet.places)) == (SheetKind.NOTE_TEXT, "rast", 2)


def test_a_missing_file_is_said_with_the_one_beside_it(tmp_path: Path) -> None:
    (tmp_path / "evening.mid").write_bytes(b"")
    assert refusal(tmp_path / "evning.mid") == (
        f"{tmp_path / 'evning.mid'}: no such file or directory; did you mean 'evening.mid'?"
    )
    assert refusal(tmp_path / "rain.txt") == f"{tmp_path / 'rain.txt'}: no such file or directory; {WANTED}"


def test_a_folder_is_no_file(tmp_path: Path) -> None:
    assert refusal(tmp_path) == f"{tmp_path}: is a folder, expected a file; name the files in it"


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="needs named pipes")
def test_a_pipe_that_nobody_writes_into_is_refused_and_not_waited_for(tmp_path: Path) -> None:
    os.mkfifo(tmp_path / "pipe")
    assert refusal(tmp_path / "pipe") == (
        f"{tmp_path / 'pipe'}: a pipe or device, expected a file; to pipe a line in, name it -"
    )


def test_a_name_that_no_file_can_have_is_refused() -> None:
    assert refusal("a\0b") == f"a\0b: embedded null byte; {WANTED}"


def test_a_huge_file_is_refused_without_being_read_whole(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(reading, "MAX_FILE_BYTES", 1000)
    (tmp_path / "most").write_bytes(b"a" * 1000)
    assert len(read_file(tmp_path / "most")) == 1000
    with (tmp_path / "huge").open("wb") as file:
        file.truncate(10_000_000_000)  # a hole: it takes no room on the disk
    assert refusal(tmp_path / "huge") == (
        f"{tmp_path / 'huge'}: larger than 1,000 bytes, expected one melody; {WANTED}"
    )


def test_a_dash_is_what_is_piped_in_as_bytes(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sys, "stdin", io.TextIOWrapper(io.BytesIO(b"A4 \xff")))
    assert read_bytes("-") == b"A4 \xff"
    monkeypatch.setattr(sys, "stdin", io.TextIOWrapper(io.BytesIO(b"G4 A4")))
    assert len(read_sheet(read_bytes("-"), "standard input", PACK.names).items) == 2


def test_without_a_standard_input_that_is_said(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sys, "stdin", None)
    assert refusal("-") == f"standard input: there is none; {WANTED}"


def test_too_much_piped_in_is_refused(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(reading, "MAX_FILE_BYTES", 10)
    monkeypatch.setattr(sys, "stdin", io.TextIOWrapper(io.BytesIO(b"A4 " * 10)))
    assert refusal("-").startswith("standard input: larger than 10 bytes")


def test_the_mode_that_a_file_names_is_found_in_any_spelling() -> None:
    mode, says = mode_named(PACK, SheetKind.MIDI, "HÜSEYNİ")
    assert (mode.slug if mode else None, says) == ("huseyni", "")
    assert mode_named(PACK, SheetKind.NOTE_TEXT, "") == (None, "")


def test_an_unknown_mode_is_a_slip_in_note_text_and_passed_over_elsewhere() -> None:
    with pytest.raises(UnknownModeError, match="'major'"):
        mode_named(PACK, SheetKind.NOTE_TEXT, "major")
    assert mode_named(PACK, SheetKind.MUSIC_XML, "major") == (
        None,
        "the file names the mode 'major', which pack 'makam' does not have: it is passed over",
    )
