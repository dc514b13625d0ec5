"""`melodycoach check` through its own door: words in; text, JSON, pages and exit codes out."""

from __future__ import annotations

import io
import json
import subprocess
import sys
from pathlib import Path
from typing import Any

import mido
import pytest

from melodycoach.cli import main
from melodycoach.commands.check import NOTATIONS
from melodycoach.errors import StorageError
from melodycoach.sources.accidental_table import Notation

LINE = "A4 E5 D5 E5:2 , | D5 C5 B4-1 A4:2 , | E5 F#5 G5 F#5 E5:2 , | D5 E5 D5 C5 B4-1 A4:2 ."
WRONG = LINE.replace("C5 B4-1 A4:2 , | E5", "C5 Bb4+1 A4:2 , | E5")
FEW = ("--only", "huseyni,hicaz,rast")
MIDI_KEYS = (69, 76, 74, 76, 74, 72, 71, 69)


@pytest.fixture
def draft(tmp_path: Path) -> Path:
    return saved(tmp_path / "draft.txt", LINE)


@pytest.fixture
def wrong(tmp_path: Path) -> Path:
    return saved(tmp_path / "wrong.txt", WRONG)


@pytest.fixture
def midi(tmp_path: Path) -> Path:
    """Let mido, which is not us, write a line of plain keys."""
    file, track = mido.MidiFile(), mido.MidiTrack()
    file.tracks.append(track)
    for key in MIDI_KEYS:
        track += [mido.Message("note_on", note=key), mido.Message("note_off", note=key, time=480)]
    file.save(tmp_path / "draft.mid")
    return tmp_path / "draft.mid"


def saved(path: Path, text: str) -> Path:
    path.parent.mkdir(exist_ok=True)
    path.write_text(text, encoding="utf-8")
    return path


def check(*words: str | Path) -> int:
    return main(["check", *FEW, *map(str, words)])


def document(capsys: pytest.CaptureFixture[str]) -> dict[str, Any]:
    read: dict[str, Any] = json.loads(capsys.readouterr().out)
    return read


# --- answers -----------------------------------------------------------------------------------


def test_a_line_is_answered_for_in_text_of_80_columns(
    draft: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert check(draft) == 0
    printed = capsys.readouterr()
    assert "eaning to Hüseynî" in printed.out
    assert max(map(len, printed.out.replace(str(draft), "draft.txt").splitlines())) <= 80
    assert "\x1b" not in printed.out
    assert printed.err == ""


def test_a_line_is_answered_for_as_one_json_document(draft: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert check(draft, "--json") == 0
    found = document(capsys)
    assert (found["format"], found["version"]) == ("melodycoach-check", 1)
    assert [one["whole"]["name"] for one in found["files"]] == ["Hüseynî"]


@pytest.mark.parametrize(("colour", "coloured"), [("always", True), ("never", False), ("auto", False)])
def test_colour_is_asked_for_or_left_to_the_terminal(
    draft: Path, capsys: pytest.CaptureFixture[str], colour: str, coloured: bool
) -> None:
    assert check(draft, "--color", colour) == 0
    assert ("\x1b[" in capsys.readouterr().out) is coloured


class Terminal(io.StringIO):
    def isatty(self) -> bool:
        return True


@pytest.mark.parametrize(
    ("environment", "coloured"),
    [({}, True), ({"NO_COLOR": "1"}, False), ({"NO_COLOR": ""}, True), ({"TERM": "dumb"}, False)],
)
def test_a_terminal_gets_colour_unless_it_or_the_player_wants_none(
    draft: Path, monkeypatch: pytest.MonkeyPatch, environment: dict[str, str], coloured: bool
) -> None:
    monkeypatch.delenv("NO_COLOR")
    monkeypatch.setenv("TERM", "xterm")
    for key, value in environment.items():
        monkeypatch.setenv(key, value)
    terminal = Terminal()
    monkeypatch.setattr(sys, "stdout", terminal)
    assert check(draft) == 0
    assert ("\x1b[" in terminal.getvalue()) is coloured


def test_the_question_of_staying_is_answered_by_the_exit_code(
    draft: Path, wrong: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert check(draft, "--stay-in", "HÜSEYNİ") == 0
    assert "tays in Hüseynî" in capsys.readouterr().out
    assert check(wrong, "--stay-in", "huseyni") == 1
    said = capsys.readouterr().out
    assert "bar 2, beat 3" in said
    assert "dik kürdî" in said
    assert check(draft, wrong, "--stay-in", "huseyni", "--json") == 1
    assert [one["stay_in"]["stays"] for one in document(capsys)["files"]] == [True, False]


def test_target_and_final_are_told_as_in_a_live_session(
    draft: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert check(draft, "--target", "rast", "--json") == 0
    assert document(capsys)["files"][0]["in_view"]["name"] == "Rast"
    assert check(draft, "--final", "dügâh", "--json") == 0
    given = document(capsys)["files"][0]["reading"]
    assert check(draft, "--any-pitch", "--json") == 0
    any_pitch = document(capsys)["files"][0]["reading"]
    assert check(draft, "--json") == 0
    assert len({given, any_pitch, document(capsys)["files"][0]["reading"]}) == 3


def test_the_same_line_as_note_text_and_piped_in_is_one_answer(
    draft: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    assert check(draft, "--json") == 0
    from_file = document(capsys)["files"][0]
    monkeypatch.setattr(sys, "stdin", io.TextIOWrapper(io.BytesIO(draft.read_bytes())))
    assert check("-", "--json") == 0
    piped = document(capsys)["files"][0]
    assert piped == {**from_file, "file": "standard input"}


def test_a_midi_file_piped_in_is_known_for_what_it_is(
    midi: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(sys, "stdin", io.TextIOWrapper(io.BytesIO(midi.read_bytes())))
    assert check("-", "--json", "--track", "1", "--channel", "1") == 0
    found = document(capsys)["files"][0]
    assert (found["kind"], found["n_notes"]) == ("MIDI file", len(MIDI_KEYS))


def test_the_notation_of_a_score_is_one_that_its_reader_knows() -> None:
    assert [notation.value for notation in Notation] == list(NOTATIONS)


def test_the_notation_reaches_the_reader_of_scores(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    note = (
        "<note><pitch><step>B</step><alter>-1</alter><octave>4</octave></pitch><duration>1</duration>"
        "<accidental>quarter-flat</accidental></note>"
    )
    score = (
        '<score-partwise version="4.0"><part-list><score-part id="P1"><part-name>Ney</part-name>'
        '</score-part></part-list><part id="P1"><measure number="1"><attributes><divisions>1</divisions>'
        f"</attributes>{note}</measure></part></score-partwise>"
    )
    pitches = []
    for notation in ("aeu", "arabic"):
        path = saved(tmp_path / "draft.musicxml", score)
        assert check(path, "--json", "--accidentals", notation, "--part", "Ney", "--voice", "1") == 0
        pitches.append(document(capsys)["files"][0]["notes"][0]["pitch_cents"])
    assert pitches[0] != pitches[1]


# --- many files, bad files ---------------------------------------------------------------------


def test_answers_of_many_files_stand_one_after_the_other(
    draft: Path, wrong: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert check(draft, wrong, draft) == 0
    said = capsys.readouterr().out
    assert said.index(str(draft)) < said.index(str(wrong))
    assert said.count("closest rival") == 2  # a file that is named twice is answered for once


def test_every_bad_token_is_told_and_other_files_are_still_answered_for(
    draft: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    bad = saved(tmp_path / "bad.txt", "A4 H9 C5\nqq:2 D5")
    assert check(bad, draft, "--stay-in", "rast") == 2
    printed = capsys.readouterr()
    first, second, third = printed.err.splitlines()
    assert first.startswith(f"melodycoach: {bad}: 2 places that cannot be read: ")
    assert second.startswith(f"  {bad}:1:4: 'H9' is neither a note nor a pitch name, expected ")
    assert second.endswith("; did you mean 'B8'?")
    assert third.startswith(f"  {bad}:2:1: 'qq:2' is ")
    assert str(draft) in printed.out
    assert not printed.out.startswith("\n")


def test_a_single_fault_is_told_once(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert check(saved(tmp_path / "bad.txt", "A4 H9")) == 2
    assert capsys.readouterr().err.count("H9") == 1


def test_a_bad_file_has_its_place_in_the_document(
    draft: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert check(tmp_path / "none.txt", draft, "--json") == 2
    failed, answered = document(capsys)["files"]
    assert failed["error"].startswith(f"{tmp_path / 'none.txt'}: no such file or directory")
    assert answered["n_notes"] == 19


def test_the_name_of_a_file_cannot_upset_the_terminal(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert check(tmp_path / "\x1b[2Jnone\n.txt") == 2
    said = capsys.readouterr().err
    assert "\x1b" not in said
    assert said.count("\n") == 1


def test_with_debug_what_is_wrong_with_a_file_is_raised(tmp_path: Path) -> None:
    with pytest.raises(StorageError):
        check(tmp_path / "none.txt", "--debug")


def test_options_of_midi_files_are_passed_over_for_others_and_named_when_there_is_none(
    draft: Path, wrong: Path, midi: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert check(draft, midi, "--track", "1") == 0
    assert capsys.readouterr().err == ""
    assert check(draft, wrong, "--track", "1", "--accidentals", "aeu") == 0
    assert capsys.readouterr().err == (
        "melodycoach: --track says nothing of these files: none of them is a MIDI file\n"
        "melodycoach: --accidentals says nothing of these files: none of them is MusicXML\n"
    )
    assert check(draft, "--track", "1") == 2
    assert "the track is chosen in a MIDI file, found note text" in capsys.readouterr().err


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (["a", "--html", "p", "--out", "o"], "--html and --out: a page or a folder of them; leave one out"),
        (["a", "b", "--html", "p"], "--html is a page for one file; write a folder of pages with --out"),
        (["a", "--html", "-", "--json"], "--html - and --json both print; name a file for the page"),
        (["a", "--html", "-", "--watch"], "--watch prints answers; name a file for the page"),
        (["a", "--json", "--out", "o"], "--json and --out: the folder holds answers.json; leave one out"),
        (["a", "--json", "--watch"], "--watch and --json: it talks to people; leave one out"),
        (["a", "--out", "o", "--watch"], "--watch and --out: it answers on the terminal; leave one out"),
        (["-", "--watch"], "--watch waits for a file to be saved; what is piped in never is"),
        (["a", "--target", "rast", "--stay-in", "hicaz"], "a line that is to stay in Hicaz aims at it"),
        (["a", "--target", "segah"], "Segâh is not among the modes that compete"),
        (["a", "--stay-in", "rasst"], "no mode 'rasst' in pack 'makam'; did you mean 'rast'?"),
        (["a", "--final", "H4"], "final: found 'H4', expected one pitch"),
    ],
)
def test_what_does_not_go_together_is_said_in_one_line(
    words: list[str], said: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert check(*words) == 2
    printed = capsys.readouterr()
    assert printed.err.startswith(f"melodycoach: {said}")
    assert printed.err.count("\n") == 1
    assert printed.out == ""


@pytest.mark.parametrize("channel", ["0", "17", "x", "-1"])
def test_a_channel_is_one_of_sixteen(channel: str, capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as ended:
        check("a", f"--channel={channel}")
    assert ended.value.code == 2
    assert f"'{channel}' is not a channel from 1 to 16" in capsys.readouterr().err


# --- pages -------------------------------------------------------------------------------------


def test_a_page_is_written_beside_the_text_or_printed_alone(
    draft: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    page = tmp_path / "new" / "page.html"
    assert check(draft, "--html", page) == 0
    assert "closest rival" in capsys.readouterr().out
    written = page.read_text(encoding="utf-8")
    assert check(draft, "--html", "-") == 0
    printed = capsys.readouterr().out
    assert printed == f"{written}\n"
    assert printed.startswith("<!")


def test_a_page_and_json_go_together(draft: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert check(draft, "--html", tmp_path / "page.html", "--json") == 0
    assert document(capsys)["files"]
    assert (tmp_path / "page.html").exists()


def test_a_page_that_cannot_be_written_is_said(draft: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert check(draft, "--html", draft / "page.html") == 2
    assert "choose another place" in capsys.readouterr().err


@pytest.mark.parametrize("option", ["--html", "--out"])
def test_a_draft_is_not_lost_to_a_page_of_it(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], option: str
) -> None:
    """A slip of the hand: the draft is named twice; or it has the name that its page will have."""
    draft = saved(tmp_path / "index.html", LINE)
    assert check(draft, option, draft if option == "--html" else tmp_path) == 2
    printed = capsys.readouterr()
    assert printed.err == (
        f"melodycoach: {draft}: is itself one of the files that are read, expected a file of its own "
        "to write into; name another place\n"
    )
    assert printed.out == ""
    assert draft.read_text(encoding="utf-8") == LINE
    assert list(tmp_path.iterdir()) == [draft]


@pytest.mark.parametrize("name", ["draft.html", "index.html", "answers.json"])
def test_a_file_of_someone_else_is_not_lost_to_a_page(
    draft: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str], name: str
) -> None:
    mine = saved(tmp_path / "out" / name, "<!DOCTYPE html>\n<html lang='tr'><p>mine</p></html>")
    assert check(draft, "--out", mine.parent) == 2
    assert check(draft, "--html", mine) == 2
    assert check(draft, "--html", mine, "--watch") == 2  # before it begins to watch
    printed = capsys.readouterr()
    assert printed.out == ""
    assert printed.err.count(f"melodycoach: {mine}: holds something else, expected no file yet or ") == 3
    assert "mine" in mine.read_text(encoding="utf-8")
    assert list(mine.parent.iterdir()) == [mine]


def test_a_page_takes_the_place_of_its_older_self(draft: Path, tmp_path: Path) -> None:
    page, folder = tmp_path / "page.html", tmp_path / "out"
    for line in (LINE, WRONG):
        saved(draft, f"title: {line[-9:]}\n{line}")
        assert check(draft, "--html", page) == 0
        assert check(draft, "--out", folder) == 0
    assert "dik kürdî" in page.read_text(encoding="utf-8")
    assert "dik kürdî" in (folder / "draft.html").read_text(encoding="utf-8")


def test_a_bad_file_has_no_page(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert check(tmp_path / "none.txt", "--html", tmp_path / "page.html") == 2
    assert not (tmp_path / "page.html").exists()


def test_many_files_become_a_folder_of_pages(
    draft: Path, wrong: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    folder = tmp_path / "out"
    assert check(draft, wrong, "--out", folder, "--stay-in", "huseyni") == 1
    assert capsys.readouterr().out == f"2 of 2 files answered; open {folder / 'index.html'}\n"
    assert sorted(path.name for path in folder.iterdir()) == [
        "answers.json",
        "draft.html",
        "index.html",
        "wrong.html",
    ]
    assert check(draft, tmp_path / "none.txt", "--out", folder) == 2
    printed = capsys.readouterr()
    assert printed.out == f"1 of 2 files answered, 1 could not be read; open {folder / 'index.html'}\n"
    assert printed.err.startswith(f"melodycoach: {tmp_path / 'none.txt'}: no such file")
    assert "none.txt" in (folder / "index.html").read_text(encoding="utf-8")


def test_a_bar_on_the_terminal_says_how_far_it_has_come(
    draft: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    terminal = Terminal()
    monkeypatch.setattr(sys, "stderr", terminal)
    assert check(draft, tmp_path / ("none" * 20 + "\x1b"), "--out", tmp_path / "out") == 2
    shown = terminal.getvalue().replace("\033[K", "").split("\r")
    bars = [line for line in shown if line.startswith("[")]
    assert [bar.split("] ")[1].split(" ")[0] for bar in bars] == ["0/2", "1/2", "2/2"]
    assert bars[1].startswith("[############............] 1/2 ")
    assert max(map(len, bars)) <= 79
    assert shown[-1] == ""  # nothing is left on the line
    assert "\x1b" not in "".join(shown)


# --- from outside ------------------------------------------------------------------------------


def test_the_program_answers_from_a_pipe_in_a_process_of_its_own() -> None:
    ran = subprocess.run(
        [sys.executable, "-m", "melodycoach", "check", "-", "--stay-in", "huseyni", *FEW],
        input=WRONG.encode(),
        capture_output=True,
        timeout=60,
        check=False,
    )
    assert (ran.returncode, ran.stderr) == (1, b"")
    assert "dik kürdî" in ran.stdout.decode()


def test_a_reader_who_has_gone_is_no_error(draft: Path) -> None:
    ran = subprocess.run(
        f'"{sys.executable}" -m melodycoach check "{draft}" --json | head -c 1',
        shell=True,
        capture_output=True,
        timeout=60,
        check=False,
    )
    assert (ran.stdout, ran.stderr) == (b"{", b"")
