"""The command line: exit codes, messages, JSON, and what the help says."""

import json
import subprocess
import sys
from pathlib import Path

import pytest

from melodycoach.cli import main

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


@pytest.mark.parametrize("command", ["listen", "demo", "modes", "ports", "evaluate"])
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
        (["listen", "nowhere.txt", "--plain", "--no-log"], "nowhere.txt: No such file or directory"),
        (["listen", "--replay", "nowhere.jsonl"], "nowhere.jsonl"),
        (["listen", "--fast"], "--fast goes with --replay"),
        (["listen", "a.txt", "--replay", "b.jsonl"], "one line to begin with at a time"),
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
    assert any(line.startswith("1 ") and "A4" in line for line in ran.stdout.splitlines())


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
