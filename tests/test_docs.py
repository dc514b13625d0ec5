"""Docs that can fail: pages that come from the program, links, examples, and the README's commands."""

import re
import sys
from pathlib import Path

import pytest

from melodycoach.cli import main
from melodycoach.commands.exit_codes import ANSWER_IS_NO
from melodycoach.core.event import LineEdited
from melodycoach.core.scorer import leading
from melodycoach.core.session import apply, begin
from melodycoach.sources.note_text import read_note_text
from melodycoach.sources.pack_file import load_pack

ROOT = Path(__file__).resolve().parent.parent
PAGES = sorted([*ROOT.glob("*.md"), *ROOT.glob("docs/*.md")])
EXAMPLES = sorted(ROOT.glob("examples/*.txt"))
MAKAM = load_pack("makam")


def test_pages_and_examples_were_found() -> None:
    assert len(PAGES) >= 10
    assert len(EXAMPLES) >= 4


@pytest.mark.skipif(
    sys.version_info[:2] != (3, 11), reason="argparse words its help differently in each Python"
)
def test_the_page_of_the_command_line_is_what_the_program_says() -> None:
    sys.path.insert(0, str(ROOT / "docs"))
    try:
        from make_cli_page import PAGE, page
    finally:
        sys.path.pop(0)
    assert PAGE.read_text(encoding="utf-8") == page(), "run python docs/make_cli_page.py"


@pytest.mark.parametrize("page", PAGES, ids=lambda page: page.name)
def test_every_link_to_a_file_leads_somewhere(page: Path) -> None:
    for target in re.findall(r"\]\(([^)#]+?)(?:#[^)]*)?\)", page.read_text(encoding="utf-8")):
        if "://" not in target:
            assert (page.parent / target).exists(), f"{page.name} links to {target}"


def test_ci_runs_the_test_command_of_the_readme() -> None:
    commands = re.findall(
        r"```sh\n(python3 -m venv.*?)\n```", (ROOT / "README.md").read_text(encoding="utf-8")
    )
    assert len(commands) == 2
    assert commands[0].endswith("melodycoach demo")
    assert commands[1] in (ROOT / ".ci" / "run").read_text(encoding="utf-8")


def test_the_page_on_checking_shows_its_example_and_what_the_program_says_of_it(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("COLUMNS", "80")
    monkeypatch.chdir(ROOT / "examples")
    assert main(["check", "waiting.txt", "--stay-in", "huseyni"]) == ANSWER_IS_NO
    printed = capsys.readouterr().out
    page = (ROOT / "docs" / "check.md").read_text(encoding="utf-8")
    line, answer = (block[1:] for block in page.split("```")[1::2] if block.startswith("\n"))
    assert line == (ROOT / "examples" / "waiting.txt").read_text(encoding="utf-8")
    assert printed.startswith(answer)
    assert len(answer.splitlines()) > 10


@pytest.mark.parametrize("path", EXAMPLES, ids=lambda path: path.name)
def test_an_example_states_the_makam_that_it_names(path: Path) -> None:
    read = read_note_text(path.read_text(encoding="utf-8"), MAKAM.names, path.name)
    session = apply(begin(MAKAM), LineEdited(0.0, 0, 0, read.items))
    lean = leading(session.model, session.line.states[-1])
    if read.headers.mode:
        assert session.model.modes[session.model.mode_index[lean.best]].slug == read.headers.mode
    else:
        assert path.name == "two-minds.txt"  # it turns from one makam to another
