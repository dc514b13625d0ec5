"""What is asked of a file, and its answer: what the file says of itself, and what wins over it."""

from __future__ import annotations

import io
import sys
from dataclasses import replace
from typing import TYPE_CHECKING, Any

import pytest

from melodycoach import checking
from melodycoach.checking import MOST_NOTES, Question, aim_of, answer, answers
from melodycoach.core.event import PitchReading
from melodycoach.core.note import Note, Silence
from melodycoach.core.sheet import Place, Sheet, SheetKind
from melodycoach.errors import MelodycoachError, MusicFileError, NoteTextError, StorageError, UsageError
from melodycoach.sources.pack_file import load_pack
from melodycoach.sources.sheet_file import ReadOptions, read_note_sheet

if TYPE_CHECKING:
    from pathlib import Path

PACK = load_pack("makam")
ONLY = PACK.restrict(("huseyni", "hicaz", "rast"))
HUSEYNI, RAST, SEGAH = PACK.find("huseyni"), PACK.find("rast"), PACK.find("segah")
LINE = "A4 E5 D5 E5:2 , D5 C5 B4-1 A4:2 , E5 F#5 G5 F#5 E5:2 , D5 E5 D5 C5 B4-1 A4:2 ."


def saved(folder: Path, text: str, name: str = "line.txt") -> str:
    (folder / name).write_text(text, encoding="utf-8")
    return str(folder / name)


def test_a_line_is_answered_for(tmp_path: Path) -> None:
    found = answer(Question(PACK, ONLY), saved(tmp_path, f"title: Sketch\n{LINE}"))
    assert found["file"] == str(tmp_path / "line.txt")
    assert found["title"] == "Sketch"
    assert found["whole"]["name"] == "Hüseynî"
    assert found["stay_in"] is None
    assert not found["in_view"]["is_target"]


def test_a_header_names_the_mode_that_is_aimed_at_and_what_is_asked_wins(tmp_path: Path) -> None:
    path = saved(tmp_path, f"mode: rast\n{LINE}")
    assert answer(Question(PACK, ONLY), path)["in_view"]["name"] == "Rast"
    asked = answer(Question(PACK, ONLY, target=HUSEYNI), path)
    assert asked["in_view"]["name"] == "Hüseynî"
    assert asked["stay_in"] is None


def test_the_mode_to_stay_in_is_the_target_too(tmp_path: Path) -> None:
    found = answer(Question(PACK, ONLY, stay_in=HUSEYNI), saved(tmp_path, f"mode: rast\n{LINE}"))
    assert found["in_view"]["name"] == "Hüseynî"
    assert found["stay_in"]["stays"] is True


def test_a_header_names_the_final_and_what_is_asked_wins(tmp_path: Path) -> None:
    path = saved(tmp_path, f"final: D5\n{LINE}")
    assert "nevâ" in answer(Question(PACK, ONLY), path)["reading"]
    asked = Question(PACK, ONLY, PitchReading.FINAL, 6900.0)
    assert "dügâh" in answer(asked, path)["reading"]
    written = answer(Question(PACK, ONLY, PitchReading.WRITTEN), path)
    assert written["reading"] == answer(Question(PACK, ONLY), saved(tmp_path, LINE, "b.txt"))["reading"]


def test_a_model_is_built_once_for_a_final(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    built: list[float | None] = []
    build = checking.build_model

    def counted(*arguments: Any) -> Any:
        built.append(arguments[3])
        return build(*arguments)

    monkeypatch.setattr(checking, "build_model", counted)
    monkeypatch.setattr(checking, "_MODELS_KEPT", 2)
    question = Question(PACK, ONLY)
    texts = [LINE, LINE, f"final: D5\n{LINE}", f"final: D5\n{LINE}", f"final: E5\n{LINE}", LINE]
    for number, text in enumerate(texts):
        assert "error" not in answer(question, saved(tmp_path, text, f"{number}.txt"))
    # a comma is 1200/53 cents: D5 lies 22 above A4 and E5 31; the third final has pushed out the first two
    assert [cents and round(cents) for cents in built] == [None, 7398, 7602, None]


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("", "{path}: no notes in it, expected at least one"),
        ("title: Sketch\n| , - .", "{path}: no notes in it, expected at least one"),
        ("mode: husseyni\nA4", "{path}: header 'mode': no mode 'husseyni' in pack 'makam'; did you mean "),
        ("A4 H9", "{path}:1:4: 'H9' is neither a note nor a pitch name"),
    ],
)
def test_a_file_with_no_answer_has_the_reason_in_its_place(tmp_path: Path, text: str, said: str) -> None:
    path = saved(tmp_path, text)
    found = answer(Question(PACK, ONLY), path)
    assert set(found) == {"file", "error", "faults"}
    assert found["error"].startswith(said.format(path=path))
    assert found["faults"] == []


def test_every_fault_of_a_text_is_kept(tmp_path: Path) -> None:
    found = answer(Question(PACK, ONLY), saved(tmp_path, "A4 H9\nqq"))
    assert len(found["faults"]) == 2


def test_with_debug_what_is_wrong_with_a_file_is_raised(tmp_path: Path) -> None:
    with pytest.raises(StorageError):
        answer(Question(PACK, ONLY, debug=True), str(tmp_path / "none.txt"))


def sheet(kind: SheetKind, mode: str) -> Sheet:
    line = read_note_sheet("A4 B4-1", PACK.names)
    return Sheet(kind, line.items, line.places, mode=mode, says=("took part 1",))


def test_an_unknown_mode_in_a_score_is_passed_over_and_said() -> None:
    read, mode = aim_of(Question(PACK, ONLY), sheet(SheetKind.MUSIC_XML, "major"), "a.xml")
    assert mode is None
    assert read.says == (
        "took part 1",
        "the file names the mode 'major', which pack 'makam' does not have: it is passed over",
    )


@pytest.mark.parametrize("kind", list(SheetKind))
def test_a_mode_that_does_not_compete_is_passed_over_and_said(kind: SheetKind) -> None:
    read, mode = aim_of(Question(PACK, ONLY), sheet(kind, "segah"), "a.xml")
    assert mode is None
    assert read.says[-1] == "its mode, segah, is not among those that compete: it is passed over"


def test_a_score_without_notes_is_refused_as_a_file_of_music() -> None:
    for kind, wrong in ((SheetKind.MUSIC_XML, MusicFileError), (SheetKind.NOTE_TEXT, NoteTextError)):
        with pytest.raises(wrong, match=r"^a: no notes in it"):
            aim_of(Question(PACK, ONLY), Sheet(kind, (), ()), "a")


@pytest.mark.parametrize("kind", [SheetKind.NOTE_TEXT, SheetKind.MIDI])
def test_a_line_of_too_many_notes_is_refused_before_it_is_checked(kind: SheetKind) -> None:
    note = Note(6900.0, 0.0, 1.0, beats=1.0)
    longest = Sheet(kind, (*(note,) * MOST_NOTES, Silence(1.0, beats=1.0)), (Place(),) * MOST_NOTES)
    assert aim_of(Question(PACK, ONLY), longest, "a")[0] is longest
    wrong = NoteTextError if kind is SheetKind.NOTE_TEXT else MusicFileError
    with pytest.raises(wrong) as error:
        aim_of(Question(PACK, ONLY), replace(longest, items=(*longest.items, note)), "a")
    assert str(error.value) == (
        "a: a line of 20,001 notes, expected at most 20,000; cut it into parts and check each of them"
    )


def test_the_cap_holds_for_a_file(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(checking, "MOST_NOTES", 18)
    path = saved(tmp_path, LINE)
    assert answer(Question(PACK, ONLY), path)["error"] == (
        f"{path}: a line of 19 notes, expected at most 18; cut it into parts and check each of them"
    )
    monkeypatch.setattr(checking, "MOST_NOTES", 19)
    assert "error" not in answer(Question(PACK, ONLY), path)


@pytest.mark.parametrize(
    ("asked", "said"),
    [
        ({"target": SEGAH}, "Segâh is not among the modes that compete; name it with the others"),
        ({"stay_in": SEGAH}, "Segâh is not among the modes that compete; name it with the others"),
        (
            {"target": RAST, "stay_in": HUSEYNI},
            "a line that is to stay in Hüseynî aims at it, and not at Rast; name one mode",
        ),
    ],
)
def test_what_cannot_be_asked_is_refused(asked: dict[str, Any], said: str) -> None:
    with pytest.raises(UsageError) as error:
        Question(PACK, ONLY, **asked)
    assert str(error.value) == said
    Question(PACK, ONLY, target=HUSEYNI, stay_in=HUSEYNI)


def test_options_that_do_not_fit_are_refused_for_one_file_and_passed_over_for_many(tmp_path: Path) -> None:
    path, options = saved(tmp_path, LINE), ReadOptions(track="2")
    assert (
        "the track is chosen in a MIDI file" in answer(Question(PACK, ONLY, options=options), path)["error"]
    )
    assert "error" not in answer(Question(PACK, ONLY, options=options, strict=False), path)


def test_answers_come_in_the_order_of_the_files_and_a_bad_one_stops_nothing(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(sys, "stdin", io.TextIOWrapper(io.BytesIO(b"G4 A4 B4-1 G4:2 .")))
    files = [saved(tmp_path, LINE, "a.txt"), str(tmp_path / "none.txt"), "-", saved(tmp_path, LINE, "b.txt")]
    found = list(answers(Question(PACK, ONLY), files))
    assert [one["file"] for one in found] == [files[0], files[1], "standard input", files[3]]
    assert ["error" in one for one in found] == [False, True, False, False]
    assert found[2]["n_notes"] == 4


def test_a_standard_input_that_cannot_be_read_is_answered_like_a_bad_file(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.setattr(sys, "stdin", None)
    [found] = answers(Question(PACK, ONLY), ["-"])
    assert found["error"].startswith("standard input: there is none")


@pytest.mark.slow  # processes are started
def test_many_files_are_answered_by_several_processes_as_by_one(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("melodycoach.parallel.PARALLEL_FROM", 3)
    files = [saved(tmp_path, LINE, f"{n}.txt") for n in range(6)] + [str(tmp_path / "none.txt")]
    question = Question(PACK, ONLY, stay_in=HUSEYNI)
    assert list(answers(question, files, workers=2)) == [answer(question, name) for name in files]


def test_errors_of_ours_are_not_taken_for_errors_of_a_file(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def slip(*_: object) -> None:
        raise ZeroDivisionError

    monkeypatch.setattr(checking, "check_sheet", slip)
    with pytest.raises(ZeroDivisionError):
        answer(Question(PACK, ONLY), saved(tmp_path, LINE))
    assert not issubclass(ZeroDivisionError, MelodycoachError)
