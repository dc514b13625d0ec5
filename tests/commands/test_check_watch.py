"""`melodycoach check --watch`: the answer at once, and what changed after each save."""

from __future__ import annotations

import os
import select
import signal
import subprocess
import sys
import time
from functools import partial
from typing import TYPE_CHECKING

import pytest

from melodycoach.cli import main

if TYPE_CHECKING:
    from collections.abc import Callable
    from pathlib import Path

LINE = "A4 E5 D5 E5:2 , | D5 C5 B4-1 A4:2 , | E5 F#5 G5 F#5 E5:2 , | D5 E5 D5 C5 B4-1 A4:2 ."
WRONG = LINE.replace("C5 B4-1 A4:2 , | E5", "C5 Bb4+1 A4:2 , | E5")
FEW = ("--only", "huseyni,hicaz,rast")


@pytest.fixture
def draft(tmp_path: Path) -> Path:
    path = tmp_path / "draft.txt"
    path.write_text(LINE, encoding="utf-8")
    return path


def watched(
    monkeypatch: pytest.MonkeyPatch, draft: Path, texts: list[str | None], *words: str, before: str = LINE
) -> int:
    """Save one text after the other, each kept still for two looks, or take the file away; then interrupt."""
    draft.write_text(before, encoding="utf-8")

    def interrupt() -> None:
        raise KeyboardInterrupt

    steps: list[Callable[[], object]] = []
    for text in texts:
        save = draft.unlink if text is None else partial(draft.write_text, text, encoding="utf-8")
        steps += [save, lambda: None]
    looks = iter([*steps, interrupt])
    monkeypatch.setattr("time.sleep", lambda _: next(looks)())
    return main(["check", str(draft), "--watch", *FEW, *words])


def news(said: str) -> list[list[str]]:
    """Give what was said after each save, without the line that names the file; each sentence on one line."""
    _, *parts = said.replace("\n    ", " ").split(" saved\n")
    rows = [[row for row in part.splitlines() if row.startswith("  ")] for part in parts]
    return [[row.strip() for row in part if "draft.txt" not in row] for part in rows]


def test_the_whole_answer_comes_first_then_what_each_save_changed(
    draft: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    texts = [WRONG, f"{WRONG}\n", LINE]
    assert watched(monkeypatch, draft, texts, "--stay-in", "huseyni") == 130
    out = capsys.readouterr().out
    said = " ".join(out.split())
    assert said.index("closest rival") < said.index(f"watching {draft}; Ctrl-C ends")
    assert said.count("closest rival") == 1
    first, second, third = news(out)
    assert any(one.startswith("it no longer stays in Hüseynî: note 7, bar 2, beat 3") for one in first)
    assert second == ["nothing changed"]
    assert "it stays in Hüseynî now" in third


def test_a_text_that_cannot_be_read_shows_its_faults_and_is_still_watched(
    draft: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    assert watched(monkeypatch, draft, ["A4 H9\nqq", WRONG], "--target", "huseyni") == 130
    said = capsys.readouterr().out
    assert "'H9'" in said
    assert "'qq'" in said
    last = news(said)[-1]
    assert last[0] == "it can be read again"
    assert any(one.startswith("off the mode: note 7") for one in last)  # since the last that could be read


def test_a_text_that_could_never_be_read_gives_its_whole_answer_when_it_can(
    draft: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    assert watched(monkeypatch, draft, [LINE], before="A4 H9") == 130
    said = capsys.readouterr().out
    assert "'H9'" in said.split("watching")[0]
    assert "closest rival" in said.split("watching")[1]


def test_what_does_not_fit_beside_its_beginning_stands_further_in(
    draft: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setenv("COLUMNS", "50")
    assert watched(monkeypatch, draft, [WRONG], "--target", "huseyni") == 130
    rows = capsys.readouterr().out.split(" saved\n")[1].splitlines()
    at = rows.index("  off the mode: note 7, bar 2, beat 3, dik kürdî:")
    assert rows[at + 1 : at + 3] == [
        "    not in Hüseynî, 3 commas below segâh; segâh",
        "    (B4-1) mends it",
    ]
    assert max(map(len, rows)) <= 50


def test_a_file_that_has_gone_is_said_once_and_answered_again_when_it_is_back(
    draft: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setenv("COLUMNS", "120")
    assert watched(monkeypatch, draft, [None], "--target", "huseyni") == 130
    said = capsys.readouterr().out
    assert said.replace("\n  ", " ").count("is gone; waiting for it to come back") == 1
    assert watched(monkeypatch, draft, [None, WRONG], "--target", "huseyni") == 130
    last = news(capsys.readouterr().out)[-1]
    assert any(one.startswith("off the mode: note 7") for one in last)


def test_the_page_is_written_again_at_every_save(
    draft: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    page = tmp_path / "page.html"
    texts = [f"title: Second\n{LINE}", "H9", f"title: Third\n{LINE}"]
    assert watched(monkeypatch, draft, texts[:1], "--html", str(page), before=f"title: First\n{LINE}") == 130
    assert "Second" in page.read_text(encoding="utf-8")
    assert watched(monkeypatch, draft, texts[:2], "--html", str(page)) == 130
    assert "Second" in page.read_text(encoding="utf-8")  # a text that cannot be read leaves it alone
    assert watched(monkeypatch, draft, texts, "--html", str(page)) == 130
    assert "Third" in page.read_text(encoding="utf-8")


def test_a_file_that_is_not_there_is_not_waited_for(
    tmp_path: Path, draft: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["check", str(tmp_path / "drafd.txt"), "--watch", *FEW]) == 2
    assert capsys.readouterr().err.endswith("no such file or directory; did you mean 'draft.txt'?\n")


def read_until(stream: int, sign: bytes, seconds: float = 30) -> bytes:
    read, end = b"", time.monotonic() + seconds
    while sign not in read:
        ready, _, _ = select.select([stream], [], [], max(end - time.monotonic(), 0))
        assert ready, f"waited {seconds} s for {sign!r}, found {read!r}"
        more = os.read(stream, 65536)
        assert more, f"ended without {sign!r}: {read!r}"
        read += more
    return read


@pytest.mark.slow  # it waits for a program that looks at a file
@pytest.mark.skipif(sys.platform == "win32", reason="interrupts are sent another way there")
def test_the_program_sees_a_save_and_ends_quietly_when_interrupted(draft: Path) -> None:
    watching = subprocess.Popen(
        [sys.executable, "-m", "melodycoach", "check", str(draft), "--watch", *FEW],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        preexec_fn=lambda: signal.signal(signal.SIGINT, signal.default_int_handler),
    )
    assert watching.stdout is not None
    out = watching.stdout.fileno()
    try:
        read_until(out, b"ends\n")
        other = draft.with_name("other")
        other.write_text(WRONG, encoding="utf-8")
        other.replace(draft)  # as editors do
        read_until(out, b"k\xc3\xbcrd\xc3\xae")
        watching.send_signal(signal.SIGINT)
        _, error = watching.communicate(timeout=10)
        assert (watching.returncode, error) == (130, b"")
    finally:
        watching.kill()
        watching.wait()
