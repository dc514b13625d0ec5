"""The command line: exit codes, messages, JSON, and what the help says."""

from __future__ import annotations

import io
import json
import os
import re
import runpy
import subprocess
import sys
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from melodycoach.app import Settings, user_pack_dir
from melodycoach.cli import main
from melodycoach.errors import UnknownModeError
from melodycoach.sources.midi_system import PortList
from melodycoach.sources.pack_file import SHIPPED

if TYPE_CHECKING:
    from collections.abc import Callable

PACKAGE_ROOT = Path(__file__).resolve().parent.parent


@pytest.fixture(autouse=True)
def at_home(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    for name in ("XDG_DATA_HOME", "XDG_CONFIG_HOME"):
        monkeypatch.setenv(name, str(tmp_path / name))
    monkeypatch.setenv("HOME", str(tmp_path))
    monkeypatch.setenv("COLUMNS", "80")
    monkeypatch.setenv("NO_COLOR", "1")


def run(*arguments: str, typed: str = "") -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-m", "melodycoach", *arguments],
        input=typed,
        capture_output=True,
        text=True,
        encoding="utf-8",
        timeout=60,
        check=False,
    )


@pytest.mark.parametrize("command", ["listen", "check", "demo", "modes", "ports", "evaluate"])
def test_every_command_has_help_with_an_example(command: str, capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as ended:
        main([command, "--help"])
    assert ended.value.code == 0
    assert f"example:\n  melodycoach {command}" in capsys.readouterr().out


def test_the_version_is_told(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit):
        main(["--version"])
    assert capsys.readouterr().out.startswith("melodycoach ")


def test_help_loads_nothing_heavy() -> None:
    script = (
        "import sys\nfrom melodycoach.cli import main\n"
        "try:\n    main(['--help'])\nexcept SystemExit:\n    pass\n"
        "heavy = {'numpy', 'mido', 'rtmidi', 'prompt_toolkit', 'platformdirs'} & set(sys.modules)\n"
        "sys.exit(bool(heavy))"
    )
    ran = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=False)
    assert ran.returncode == 0, ran.stderr


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["modes", "husseyni"], "no mode 'husseyni' in pack 'makam'; did you mean 'huseyni'"),
        (["modes", "--pack", "makham"], "did you mean 'makam'?"),
        (["listen", "--target", "rasst"], "no mode 'rasst' in pack 'makam'; did you mean 'rast'?"),
        (["listen", "--only", "rast,nothing"], "no mode 'nothing'"),
        (["listen", "--final", "H4"], "final: found 'H4', expected one pitch such as A4 or dügâh"),
        (["listen", "--final", "dugha"], "did you mean 'dügâh'?"),
        (["listen", "nowhere.txt", "--plain", "--no-log"], "nowhere.txt: no such file or directory"),
        (
            ["evalute", "collection.jsonl"],
            "did you mean melodycoach evaluate?",
        ),
        (["listen", "--replay", "nowhere.jsonl"], "nowhere.jsonl"),
        (["listen", "--fast"], "--fast goes with --replay"),
        (["listen", "a.txt", "--replay", "b.jsonl"], "one line to begin with at a time"),
        (["listen", "--replay", "b.jsonl", "--target", "rast"], "--replay shows a session as it was"),
        (["listen", "--resume"], "found no log of a session with notes in it"),
        (["listen", "--resume", "nowhere.jsonl"], "nowhere.jsonl"),
        (["listen", "--resume", "b.jsonl", "a.txt"], "name one of them"),
        (["listen", "--resume", "--replay", "b.jsonl"], "name one of them"),
        (["listen", "--resume", "--any-pitch"], "--resume brings a session back with its own settings"),
        (["evaluate", "nowhere.jsonl"], "nowhere.jsonl"),
    ],
)
def test_what_does_not_exist_is_said_in_one_line_with_exit_code_2(
    arguments: list[str], said: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(arguments) == 2
    error = capsys.readouterr().err
    assert said in error
    assert error.startswith("melodycoach: ")
    assert error.count("\n") == 1


@pytest.mark.parametrize("arguments", [["--nonsense"], ["evaluate"], ["evaluate", "a", "--seams", "x"]])
def test_wrong_usage_points_to_the_help(arguments: list[str], capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as ended:
        main(arguments)
    assert ended.value.code == 2
    assert "--help" in capsys.readouterr().err


def test_a_missing_file_is_refused_before_anything_is_said_or_logged(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setenv("XDG_DATA_HOME", str(tmp_path / "data"))
    (tmp_path / "evening.txt").write_text("A4", encoding="utf-8")
    assert main(["listen", str(tmp_path / "evning.txt"), "--plain"]) == 2
    said = capsys.readouterr()
    assert said.out == ""
    assert said.err.endswith("evning.txt: no such file or directory; did you mean 'evening.txt'?\n")
    assert not (tmp_path / "data").exists()


def test_a_missing_log_is_said_with_the_one_beside_it(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    (tmp_path / "monday.events.jsonl").write_text("", encoding="utf-8")
    assert main(["listen", "--replay", str(tmp_path / "mondy.events.jsonl")]) == 2
    assert capsys.readouterr().err.endswith("; did you mean 'monday.events.jsonl'?\n")


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="needs /dev/full, a disk that is always full")
@pytest.mark.parametrize("arguments", [["modes"], ["--plain", "--no-log"]])
def test_an_output_that_takes_nothing_is_said_in_one_line(arguments: list[str]) -> None:
    with Path("/dev/full").open("w") as full:
        ran = subprocess.run(
            [sys.executable, "-m", "melodycoach", *arguments],
            stdin=subprocess.DEVNULL,
            stdout=full,
            stderr=subprocess.PIPE,
            text=True,
            check=False,
        )
    assert ran.returncode == 2
    assert ran.stderr == "melodycoach: output: no space left on device; --debug shows where it arose\n"


def test_debug_shows_where_an_error_arose() -> None:
    ran = run("modes", "nothing-such", "--debug")
    assert "Traceback" in ran.stderr


def test_modes_lists_at_least_45_makams_as_json(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["modes", "--json"]) == 0
    listed = json.loads(capsys.readouterr().out)
    assert len(listed["modes"]) >= 45


def test_one_mode_is_described_in_80_columns(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["modes", "HÜSEYNİ"]) == 0
    text = capsys.readouterr().out
    assert "güçlü" in text
    assert max(map(len, text.splitlines())) <= 80


def test_a_damaged_pack_is_refused_with_every_fault(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = tmp_path / "mine.toml"
    path.write_text('[pack]\nid = "Mine"\nname = "Mine"\ntone_system = 17\n', encoding="utf-8")
    assert main(["modes", "--check", str(path)]) == 2
    error = capsys.readouterr().err
    assert "mine.toml" in error
    assert error.count("\n") >= 4
    assert "tone_system is 17" in error


def test_typed_notes_from_a_pipe_give_one_line_a_note() -> None:
    ran = run("--plain", "--no-log", "--only", "hicaz,huseyni", typed="D5 C#5 Bb4+1\nA4 .\n")
    assert ran.returncode == 0, ran.stderr
    lines = [line for line in ran.stdout.splitlines() if line[:1].isdigit()]
    assert [line.split()[0] for line in lines] == ["1", "2", "3", "4"]
    assert "Hicaz" in lines[-1]


def test_a_bad_word_in_a_pipe_is_explained_and_the_rest_goes_on() -> None:
    ran = run("--plain", "--no-log", "--only", "hicaz,huseyni", typed="D5 Q5\nA4\n")
    assert ran.returncode == 0
    assert "'Q5'" in ran.stdout
    notes = [line.split(";")[0] for line in ran.stdout.splitlines() if line[:1].isdigit()]
    assert notes == ["1 nevâ D5", "2 dügâh A4"]


def test_a_line_of_note_text_can_be_opened(tmp_path: Path) -> None:
    path = tmp_path / "line.txt"
    path.write_text("mode: rast\nG4 A4 B4-1 G4:2 .\n", encoding="utf-8")
    ran = run(str(path), "--plain", "--no-log")
    assert ran.returncode == 0, ran.stderr
    assert "aim" in ran.stdout or "Rast" in ran.stdout


def test_the_demo_runs_to_its_end_without_a_terminal() -> None:
    ran = run("demo", "--fast", "--plain", "--no-log")
    assert ran.returncode == 0, ran.stderr
    assert "the demo is over and the line is yours" in ran.stdout
    assert ran.stderr == ""


def test_a_session_is_logged_and_can_be_replayed(tmp_path: Path) -> None:
    ran = run("--plain", "--only", "hicaz,huseyni", typed="D5 C#5 Bb4+1 A4 .\n")
    assert ran.returncode == 0, ran.stderr
    [log] = (tmp_path / "XDG_DATA_HOME" / "melodycoach" / "sessions").iterdir()
    again = run("--plain", "--replay", str(log), "--fast")
    assert again.returncode == 0, again.stderr
    verdicts = [
        [line.split(";")[1] for line in one.stdout.splitlines() if line.startswith("4 ")]
        for one in (ran, again)
    ]
    assert verdicts[0] == verdicts[1]
    assert verdicts[0]


def test_a_log_that_cannot_be_written_is_said_once_and_playing_goes_on(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    (tmp_path / "blocked").write_text("a file where a folder is needed")
    monkeypatch.setenv("XDG_DATA_HOME", str(tmp_path / "blocked"))
    ran = run("--plain", typed="D5 C5\nA4\n")
    assert ran.returncode == 0, ran.stderr
    assert ran.stdout.count("blocked") == 1
    assert sum(line[:1].isdigit() for line in ran.stdout.splitlines()) == 3


def test_evaluate_prints_figures_as_json(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = tmp_path / "lines.jsonl"
    comma = 1200 / 53
    fall = [6900 + comma * units for units in (22, 17, 5, 0, 5, 17, 22, 17, 5, 0)]
    notes = [[0.4 * n, 0.35, round(cents, 1)] for n, cents in enumerate(fall)]
    record = {"id": "a", "group": "a", "mode": "makam/hicaz", "final": 6900, "notes": notes}
    path.write_text(json.dumps(record) + "\nnot json\n", encoding="utf-8")
    assert main(["evaluate", str(path), "--only", "hicaz,rast", "--json"]) == 0
    printed = capsys.readouterr()
    figures = json.loads(printed.out)
    assert figures["n"] == 1
    assert figures["as"] == "written"
    assert figures["accuracy"]["all"] == 1.0
    assert (
        set(figures["accuracy"])
        == {"10", "20", "40", "all"}
        == set(figures["macro_f1"])
        == set(figures["ece"])
    )
    assert "2" in printed.err


def test_the_package_runs_as_a_program(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setattr(sys, "argv", ["melodycoach", "modes", "rast"])
    with pytest.raises(SystemExit) as ended:
        runpy.run_module("melodycoach", run_name="__main__")
    assert ended.value.code == 0
    assert "Rast" in capsys.readouterr().out


class Asked:
    """Stands in for the live session: keeps what it was asked for."""

    def __init__(self, monkeypatch: pytest.MonkeyPatch, raises: BaseException | None = None) -> None:
        self._raises = raises
        monkeypatch.setattr("melodycoach.app.listen", self)

    def __call__(self, settings: Settings, full_screen: bool, say: Callable[[str], None]) -> int:
        self.settings, self.full_screen = settings, full_screen
        say("something")
        if self._raises is not None:
            raise self._raises
        return 0


def test_what_is_typed_on_the_command_line_is_asked_of_the_session(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    asked = Asked(monkeypatch)
    assert main(["line.txt", "--only", "rast, ,hicaz", "--target", "rast", "--any-pitch", "--no-log"]) == 0
    assert asked.settings == Settings(
        only=("rast", "hicaz"), target="rast", any_pitch=True, log=False, open_file=Path("line.txt")
    )
    assert not asked.full_screen  # nobody looks at a terminal
    assert main(["listen", "--replay", "old.jsonl", "--fast"]) == 0
    assert asked.settings == Settings(replay=Path("old.jsonl"), fast=True)
    assert main(["listen", "--resume", "--port", "Keys"]) == 0
    assert asked.settings == Settings(resume="", port="Keys")
    assert main(["listen", "--resume", "old.jsonl"]) == 0
    assert asked.settings == Settings(resume="old.jsonl")
    assert main(["--final", "A4", "--port", "Keys"]) == 0
    assert asked.settings == Settings(final="A4", port="Keys")
    assert main(["demo", "--fast", "--port", "Keys"]) == 0
    assert asked.settings == Settings(demo=True, fast=True, port="Keys")
    assert capsys.readouterr().out == "something\n" * 6


class Terminal(io.StringIO):
    def isatty(self) -> bool:
        return True


def test_the_full_screen_is_for_terminals_and_plain_wins(monkeypatch: pytest.MonkeyPatch) -> None:
    asked = Asked(monkeypatch)
    monkeypatch.setattr(sys, "stdin", Terminal())
    monkeypatch.setattr(sys, "stdout", Terminal())
    assert main([]) == 0
    assert asked.full_screen
    assert main(["--plain"]) == 0
    assert not asked.full_screen
    monkeypatch.setattr(sys, "stdin", io.StringIO())
    assert main([]) == 0
    assert not asked.full_screen


def test_an_interrupt_has_the_exit_code_of_one(monkeypatch: pytest.MonkeyPatch) -> None:
    Asked(monkeypatch, KeyboardInterrupt())
    assert main([]) == 130


def test_when_nobody_reads_on_the_program_ends_without_a_word(
    monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    Asked(monkeypatch, BrokenPipeError())
    with (tmp_path / "out").open("w", encoding="utf-8") as out:
        monkeypatch.setattr(sys, "stdout", out)
        assert main([]) == 0
        print("to nobody", file=out, flush=True)
    assert (tmp_path / "out").read_text(encoding="utf-8") == "something\n"


@pytest.mark.parametrize("arguments", [("modes", "hicaz"), ("modes", "--json"), ("--plain", "--no-log")])
def test_a_reader_who_has_gone_is_no_error(arguments: tuple[str, ...]) -> None:
    reading, writing = os.pipe()
    os.close(reading)
    environment = {key: value for key, value in os.environ.items() if key != "PYTHONUNBUFFERED"}
    ran = subprocess.run(
        [sys.executable, "-m", "melodycoach", *arguments],
        input=b"A4\n",
        stdout=writing,
        stderr=subprocess.PIPE,
        env=environment,
        timeout=60,
        check=False,
    )
    os.close(writing)
    assert (ran.returncode, ran.stderr) == (0, b"")


def test_a_letter_that_the_output_cannot_write_is_no_reason_to_stop(monkeypatch: pytest.MonkeyPatch) -> None:
    raw = io.BytesIO()
    monkeypatch.setattr(sys, "stdout", io.TextIOWrapper(raw, encoding="ascii"))
    assert main(["modes", "karcigar"]) == 0
    assert b"Karcigar" in raw.getvalue()
    assert raw.getvalue().isascii()


def test_a_pack_that_can_be_used_is_said_to_be(capsys: pytest.CaptureFixture[str]) -> None:
    path = PACKAGE_ROOT / "melodycoach" / "mode_packs" / "makam.toml"
    assert main(["modes", "--check", str(path)]) == 0
    assert capsys.readouterr().out.startswith(f"{path}: pack 'makam' with ")


def own_packs(tmp_path: Path, **texts: str) -> Path:
    """Put packs into the player's own folder, by name."""
    folder = user_pack_dir()
    assert tmp_path in folder.parents
    folder.mkdir(parents=True)
    for name, text in texts.items():
        (folder / f"{name}.toml").write_text(text, encoding="utf-8")
    return folder


def makam_text(**changes: str) -> str:
    text = (SHIPPED / "makam.toml").read_text(encoding="utf-8")
    for key, value in changes.items():
        text = re.sub(rf'^{key} = ".*"$', f'{key} = "{value}"', text, count=1, flags=re.MULTILINE)
    return text


@pytest.mark.parametrize("arguments", [[], ["--json"], ["rast"], ["--pack", "MAKAM"]])
def test_a_pack_of_the_players_own_that_stands_in_for_a_shipped_one_is_named(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], arguments: list[str]
) -> None:
    folder = own_packs(tmp_path, makam=makam_text(name="Makams of my own"))
    assert main(["modes", *arguments]) == 0
    printed = capsys.readouterr()
    assert printed.err == (
        f"melodycoach: {folder / 'makam.toml'} is used in place of the pack 'makam' "
        "that comes with the program\n"
    )
    assert "Another pack" not in printed.out


def test_a_shipped_pack_alone_is_listed_with_nothing_beside_it(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["modes"]) == 0
    printed = capsys.readouterr()
    assert printed.err == ""
    assert printed.out.rstrip().endswith("melodycoach modes NAME, in any spelling.")


def test_other_packs_are_named_and_damaged_ones_reported_when_modes_are_listed(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    folder = own_packs(tmp_path, mine=makam_text(id="mine", name="Mine"), bad="[pack", worse="[pack]\n")
    assert main(["modes"]) == 0
    printed = capsys.readouterr()
    assert printed.out.endswith("\nAnother pack: Mine: melodycoach modes --pack mine\n")
    first, second = printed.err.splitlines()
    assert first == (
        "melodycoach: pack 'bad' cannot be used, 1 fault; "
        f"see melodycoach modes --check {folder / 'bad.toml'}"
    )
    assert second.startswith("melodycoach: pack 'worse' cannot be used, ")
    assert second.endswith(f" faults; see melodycoach modes --check {folder / 'worse.toml'}")
    assert main(["modes", "--pack", "mine"]) == 0
    assert "Another pack: Turkish makam: melodycoach modes --pack makam" in capsys.readouterr().out


def test_json_stays_json_beside_other_packs(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    own_packs(tmp_path, mine=makam_text(id="mine"), bad="[pack")
    assert main(["modes", "--json"]) == 0
    printed = capsys.readouterr()
    assert json.loads(printed.out)["modes"]
    assert "'bad' cannot be used" in printed.err


def test_ports_are_listed_for_people_and_for_programs(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setattr("melodycoach.app.list_ports", lambda: PortList((), (), "no MIDI: none at all"))
    assert main(["ports"]) == 0
    assert "no MIDI: none at all" in capsys.readouterr().out
    assert main(["ports", "--json"]) == 0
    assert json.loads(capsys.readouterr().out)["problem"] == "no MIDI: none at all"


def test_a_long_evaluation_says_on_a_terminal_how_far_it_has_come(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    path = tmp_path / "lines.jsonl"
    notes = [[0.4 * n, 0.35, cents] for n, cents in enumerate((7400, 7300, 7000, 6900) * 3)]
    record = {"id": "a", "group": "a", "mode": "makam/hicaz", "final": 6900, "notes": notes}
    path.write_text("not json\n" + json.dumps(record) + "\n", encoding="utf-8")
    terminal = Terminal()
    monkeypatch.setattr(sys, "stderr", terminal)
    assert main(["evaluate", str(path), "--only", "hicaz,rast"]) == 0
    said = terminal.getvalue()
    assert said.endswith("\r\033[K")  # nothing is left on the line
    assert "\rmelodycoach" not in said
    assert f"\033[Kmelodycoach: {path}" in said or "\033[Kmelodycoach: " in said
    assert "hicaz" in capsys.readouterr().out.casefold()


@pytest.mark.parametrize("count", ["-1", "100001"])
def test_a_count_has_bounds(count: str, capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as ended:
        main(["evaluate", "a", f"--seams={count}"])
    assert ended.value.code == 2
    assert f"'{count}' is not a number from 0 to 100000" in capsys.readouterr().err


def test_debug_lets_an_error_through(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(UnknownModeError):
        main(["modes", "nothing-such", "--debug"])
    assert capsys.readouterr().err == ""


def test_a_fault_of_ours_is_shown_whole_and_told_from_an_answer(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    Asked(monkeypatch, ZeroDivisionError("a slip"))
    assert main([]) == 70
    error = capsys.readouterr().err
    assert "ZeroDivisionError: a slip" in error
    assert "a fault of the program, not yours" in error
