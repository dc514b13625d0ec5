"""The live line and files of other kinds than note text: opened, moved in time, never written over."""

from __future__ import annotations

from datetime import date
from pathlib import Path
from typing import TYPE_CHECKING

import mido
import pytest

from melodycoach.core.event import PitchReading
from melodycoach.core.model import build_model
from melodycoach.core.note import InputKind, Mark, Note, Silence
from melodycoach.core.session import empty_line, rewrite
from melodycoach.core.sheet import Sheet, SheetKind
from melodycoach.errors import MusicFileError, NoteTextError, StorageError
from melodycoach.line_text import (
    Page,
    _page_of,
    open_line,
    path_to_save,
    played_until,
    save_line,
    text_path,
)
from melodycoach.sources.note_text import Headers, read_note_text
from melodycoach.sources.pack_file import load_pack

if TYPE_CHECKING:
    from melodycoach.core.session import Line

PACK = load_pack("makam")
NAMES = PACK.names
MODEL = build_model(PACK, PACK.restrict(("huseyni", "rast")), PitchReading.WRITTEN)


def line_of(*items: object) -> Line:
    return rewrite(MODEL, empty_line(MODEL), tuple(items))  # type: ignore[arg-type]


@pytest.fixture
def midi(tmp_path: Path) -> Path:
    """Let mido, which is not us, write two keys of half a second each."""
    file, track = mido.MidiFile(), mido.MidiTrack()
    file.tracks.append(track)
    track.append(mido.MetaMessage("track_name", name="Ney"))
    for key in (69, 71):
        track += [mido.Message("note_on", note=key), mido.Message("note_off", note=key, time=480)]
    file.save(tmp_path / "draft.mid")
    return tmp_path / "draft.mid"


def test_a_midi_file_is_opened_with_its_plain_keys_as_plain_keys(midi: Path) -> None:
    page, items = open_line(midi, NAMES)
    notes = [item for item in items if isinstance(item, Note)]
    assert [(note.pitch_cents, note.kind) for note in notes] == [
        (6900.0, InputKind.KEYS),
        (7100.0, InputKind.KEYS),
    ]
    assert page.kind is SheetKind.MIDI
    assert page.says


def test_note_text_is_opened_with_its_remarks(tmp_path: Path) -> None:
    path = tmp_path / "line.txt"
    path.write_text("title: Sketch\n# first\nA4 B4-1 # last\n", encoding="utf-8-sig")
    page, items = open_line(path, NAMES)
    assert page.kind is SheetKind.NOTE_TEXT
    assert page.says == page.lost == ()
    assert [(remark.text, note) for remark, note in page.remarks] == [("first", items[0]), ("last", None)]


@pytest.mark.parametrize(
    ("data", "fault"),
    [(b"A4 \xff", NoteTextError), (b"A4 zz", NoteTextError), (b"MThd", MusicFileError)],
)
def test_what_cannot_be_read_is_refused(tmp_path: Path, data: bytes, fault: type[Exception]) -> None:
    (tmp_path / "line").write_bytes(data)
    with pytest.raises(fault):
        open_line(tmp_path / "line", NAMES)


def test_of_what_a_file_says_of_itself_note_text_keeps_what_it_can_say(tmp_path: Path) -> None:
    odd = Sheet(SheetKind.MIDI, (), (), "Line\x00 \udcff one", "rast", 6900.0, 1000.0, ("said",), ("lost",))
    page = _page_of(odd)
    assert page == Page(Headers("Line  one", "rast", 6900.0, None), (), SheetKind.MIDI, ("said",), ("lost",))
    assert _page_of(Sheet(SheetKind.MIDI, (), (), tempo=90.5)).headers.tempo == 90.5
    save_line(tmp_path / "a.txt", page, line_of(Note(6900.0, 0.0, 0.5, InputKind.KEYS)), NAMES)
    read = read_note_text((tmp_path / "a.txt").read_text(encoding="utf-8"), NAMES)
    assert read.headers.title == "Line one"


def test_a_line_that_is_longer_than_the_session_is_moved_to_end_now() -> None:
    line = (Note(6900.0, 1.0, 2.0), Silence(0.5), Note(7100.0, 3.5, 1.5), Mark.PHRASE_END)
    moved = played_until(line, 2.0)  # it ends at 5: three seconds earlier
    assert moved == (Note(6900.0, -2.0, 2.0), Silence(0.5), Note(7100.0, 0.5, 1.5), Mark.PHRASE_END)
    assert played_until(line, 5.0) == line
    assert played_until((Mark.BREATH,), 0.0) == (Mark.BREATH,)


@pytest.mark.parametrize("name", ["draft.mid", "draft.musicxml", "draft.mxl", "draft"])
def test_a_line_is_saved_under_a_name_of_note_text(tmp_path: Path, name: str) -> None:
    assert text_path(tmp_path / name) == tmp_path / "draft.txt"


@pytest.mark.parametrize(
    ("data", "kind"),
    [
        (b"MThd\0\0\0\6", "MIDI file"),
        (b"PK\x03\x04", "MusicXML"),
        (b"<?xml", "MusicXML"),
        (b"%PDF-1.7", "a document"),
    ],
)
def test_a_file_of_another_kind_is_never_written_over(tmp_path: Path, data: bytes, kind: str) -> None:
    path = tmp_path / "draft.mid"
    path.write_bytes(data)
    with pytest.raises(StorageError) as error:
        save_line(path, Page(), line_of(Note(6900.0, 0.0, 0.5, beats=1.0)), NAMES)
    assert str(error.value) == (
        f"{path}: there is a file of another kind there, {kind}, and a line is saved as note text; "
        f"save it as {tmp_path / 'draft.txt'}"
    )
    assert path.read_bytes() == data


def test_a_line_is_saved_in_its_own_file_or_beside_one_that_holds_no_text() -> None:
    day = date(2026, 3, 9)
    assert path_to_save(Path("drafts/sketch.notes"), SheetKind.NOTE_TEXT, day) == Path("drafts/sketch.notes")
    assert path_to_save(Path("drafts/sketch.mid"), SheetKind.MIDI, day) == Path("drafts/sketch.txt")
    assert path_to_save(Path("song.musicxml"), SheetKind.MUSIC_XML, day) == Path("song.txt")


def test_a_line_from_nowhere_is_saved_under_the_day_and_never_where_there_is_a_file(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    names = []
    for _ in range(3):
        path = path_to_save(None, SheetKind.NOTE_TEXT, date(2026, 3, 9))
        path.touch()
        names.append(str(path))
    assert names == ["line-2026-03-09.txt", "line-2026-03-09-2.txt", "line-2026-03-09-3.txt"]
