"""The full screen on a terminal: keystrokes in, characters out, through prompt_toolkit and pyte."""

from __future__ import annotations

import asyncio
import os
import re
import signal
import statistics
import sys
import time
from dataclasses import replace
from typing import TYPE_CHECKING, Any

import pyte
import pytest
from prompt_toolkit.data_structures import Size
from prompt_toolkit.input import create_pipe_input
from prompt_toolkit.output.color_depth import ColorDepth
from prompt_toolkit.output.vt100 import Vt100_Output

from melodycoach.screen.command import (
    Command,
    Fresh,
    Open,
    Quit,
    Redo,
    ReplaceText,
    Save,
    SetFinal,
    SetOnly,
    SetPort,
    SetTarget,
    Undo,
)
from melodycoach.screen.question import QuestionKind
from melodycoach.screen.terminal import run_screen, run_screen_async
from melodycoach.screen.view import Refusal

if TYPE_CHECKING:
    from collections.abc import Awaitable, Callable, Coroutine, Mapping

    from melodycoach.screen.view import ViewState

DEADLINE_S = 20.0
ESCAPE = "\x1b"
KEYS = {
    "F1": "\x1bOP",
    "F2": "\x1bOQ",
    "F3": "\x1bOR",
    "F4": "\x1bOS",
    "F5": "\x1b[15~",
    "F6": "\x1b[17~",
    "F7": "\x1b[18~",
    "F8": "\x1b[19~",
    "up": "\x1b[A",
    "down": "\x1b[B",
    "right": "\x1b[C",
    "left": "\x1b[D",
    "home": "\x1b[H",
    "end": "\x1b[F",
    "delete": "\x1b[3~",
    "page down": "\x1b[6~",
}
"""What terminals of the xterm kind send for these keys."""


class Stage:
    """A terminal of characters, a keyboard, and a session that does as it is told."""

    def __init__(self, view: ViewState, columns: int = 80, rows: int = 24) -> None:
        self.view = view
        self.commands: list[Command] = []
        self.refuse: dict[str, str] = {}
        self.raw = ""
        self.size = Size(rows=rows, columns=columns)
        self.screen = pyte.Screen(columns, rows)
        self._stream = pyte.Stream(self.screen)
        self.refresh: Callable[[], None] = lambda: None
        self.keys: Any = None
        self.obeys = True
        self.asked: list[QuestionKind] = []

    # what prompt_toolkit writes to
    encoding = "utf-8"

    def write(self, data: str) -> None:
        self.raw += data
        self._stream.feed(data)

    def flush(self) -> None:
        """Everything is written at once."""

    def isatty(self) -> bool:
        return True

    def fileno(self) -> int:
        raise OSError("no file")

    # what the screen talks to
    def send(self, command: Command) -> None:
        self.commands.append(command)
        if not self.obeys:
            return
        tokens = self.view.tokens
        text = getattr(command, "text", "") or ""
        wrong = [word for word in text.split() if word in self.refuse]
        refusals = self.view.refusals
        if wrong:
            refusals = (*refusals, Refusal(command.number, self.refuse[wrong[0]], tuple(wrong)))
        elif isinstance(command, ReplaceText):
            tokens = (*tokens[: command.start], *text.split(), *tokens[command.stop :])
        self.show(tokens=tokens, handled=command.number, refusals=refusals)

    def show(self, **changes: object) -> None:
        self.view = replace(self.view, **changes)  # type: ignore[arg-type]
        self.refresh()

    def subscribe(self, refresh: Callable[[], None]) -> None:
        self.refresh = refresh

    def choices(self, kind: QuestionKind) -> tuple[str, ...]:
        self.asked.append(kind)
        return () if kind is QuestionKind.SAVE else ("Hicaz", "Hüseynî", "Hüzzam")

    # what a test does
    def text(self) -> str:
        return "\n".join(self.screen.display)

    def type(self, keys: str) -> None:
        self.keys.send_text(KEYS.get(keys, keys))

    async def until(self, true: Callable[[], bool]) -> None:
        """Wait for something to become true; the deadline is that of the whole test."""
        while not true():
            await asyncio.sleep(0.005)

    async def shows(self, words: str) -> None:
        await self.until(lambda: words in self.text())

    def play(self, script: Callable[[Stage], Coroutine[Any, Any, None]], **more: Any) -> None:
        """Run the screen while a script presses keys; at the end Ctrl-C is pressed for it."""
        more.setdefault("ascii_only", False)

        async def both() -> None:
            with create_pipe_input() as keys:
                self.keys = keys
                output = Vt100_Output(self, lambda: self.size, term="xterm", enable_cpr=False)
                run: Awaitable[None] = run_screen_async(
                    lambda: self.view,
                    self.send,
                    self.subscribe,
                    self.choices,
                    input=keys,
                    output=output,
                    **more,
                )
                running = asyncio.ensure_future(run)
                await self.until(lambda: running.done() or "F1 help" in self.text())
                playing = asyncio.ensure_future(script(self))
                await asyncio.wait({running, playing}, return_when=asyncio.FIRST_COMPLETED)
                if not running.done():
                    await playing
                    self.type("\x03")
                elif not playing.done():
                    playing.cancel()
                await running

        asyncio.run(asyncio.wait_for(both(), DEADLINE_S))


@pytest.fixture
def stage(views: Mapping[str, ViewState]) -> Stage:
    return Stage(replace(views["decided"], tokens=("A4", "B4-1")))


def test_a_typed_note_is_sent_and_shown(stage: Stage) -> None:
    async def script(stage: Stage) -> None:
        stage.type("C5 ")
        await stage.until(lambda: stage.commands == [ReplaceText(2, 2, "C5", 1)])
        await stage.shows("› A4 B4-1 C5 ")

    stage.play(script)
    assert stage.commands[-1] == Quit(2)


def test_turkish_letters_are_typed_and_shown(stage: Stage) -> None:
    async def script(stage: Stage) -> None:
        stage.type("dügâh çargâh ")
        await stage.shows("› A4 B4-1 dügâh çargâh ")

    stage.play(script)


def test_played_notes_appear_before_what_is_being_typed(stage: Stage) -> None:
    async def script(stage: Stage) -> None:
        stage.type("D5")
        await stage.shows("B4-1 D5")
        stage.show(tokens=("A4", "B4-1", "C5"))
        await stage.shows("A4 B4-1 C5 D5")
        stage.type("\r")
        await stage.until(lambda: stage.commands == [ReplaceText(3, 3, "D5", 1)])

    stage.play(script)


def test_a_refused_word_stays_with_the_reason_below_it(stage: Stage) -> None:
    stage.refuse = {"H5": "entry: 'H5' is no note"}

    async def script(stage: Stage) -> None:
        stage.type("H5 C5 ")
        await stage.shows("A4 B4-1 H5 C5")
        await stage.shows("! entry: 'H5' is no note")
        await stage.until(lambda: stage.view.tokens == ("A4", "B4-1", "C5"))

    stage.play(script)


def test_keys_edit_in_the_middle_of_the_line(stage: Stage) -> None:
    async def script(stage: Stage) -> None:
        for key in ("home", "right", "right", ":2", "end", "left", "left", "\x7f", "delete", "up", "\x17"):
            stage.type(key)
        await stage.until(lambda: stage.view.tokens == ("A4:2", "B4"))
        stage.type("\x1b[1;5D")  # Ctrl-left
        stage.type("\x1b[1;5C")  # Ctrl-right
        stage.type("down")
        stage.type("\x1b[200~D5 E5\n\x1b[201~")  # pasted between brackets, as terminals do
        await stage.until(lambda: stage.view.tokens[-2:] == ("D5", "E5"))

    stage.play(script)


@pytest.mark.parametrize("keys", ["F2", "\x14", ESCAPE + "t"])
def test_the_target_is_chosen_by_name(stage: Stage, keys: str) -> None:
    async def script(stage: Stage) -> None:
        stage.type(keys)
        await stage.shows("aim at which mode?")
        stage.type("hu")
        await stage.shows(" Hüseynî  Hüzzam ")
        for key in ("\t", "down", "up", "down"):
            stage.type(key)
        await stage.shows(" Hüseynî [Hüzzam]")
        stage.type("\r")
        await stage.until(lambda: SetTarget("Hüzzam", 1) in stage.commands)
        await stage.until(lambda: "aim at which mode?" not in stage.text())

    stage.play(script)


@pytest.mark.parametrize(
    ("keys", "command"),
    [
        *((key, SetFinal("x", 1)) for key in ("F3", "\x06", ESCAPE + "f")),
        *((key, SetOnly("x", 1)) for key in ("F4", "\x0c", ESCAPE + "m")),
        *((key, SetPort("x", 1)) for key in ("F6", "\x10", ESCAPE + "i")),
        *((key, Open("x", 1)) for key in ("F7", "\x0f", ESCAPE + "o")),
        *((key, Save("x", 1)) for key in ("F8", "\x0b", ESCAPE + "s")),
    ],
)
def test_every_question_has_a_function_key_and_two_others(stage: Stage, keys: str, command: Command) -> None:
    async def script(stage: Stage) -> None:
        stage.type(keys)
        await stage.until(lambda: bool(stage.asked))
        stage.type("x\r")
        await stage.until(lambda: command in stage.commands)

    stage.play(script)


@pytest.mark.parametrize(
    ("keys", "command"),
    [
        *((key, Fresh(1)) for key in ("F5", "\x0e", ESCAPE + "n")),
        *((key, Undo(1)) for key in ("\x1a", ESCAPE + "u")),
        *((key, Redo(1)) for key in ("\x19", ESCAPE + "r")),
    ],
)
def test_fresh_start_undo_and_redo_have_more_than_one_key(stage: Stage, keys: str, command: Command) -> None:
    async def script(stage: Stage) -> None:
        stage.type(keys)
        await stage.until(lambda: stage.commands == [command])

    stage.play(script)


def test_a_refused_answer_stays_with_its_reason_until_escape(stage: Stage) -> None:
    stage.refuse = {"hixaz": "no mode 'hixaz'; did you mean 'hicaz'?"}

    async def script(stage: Stage) -> None:
        stage.type("F2")
        stage.type("hixaz\r")
        await stage.shows("! no mode 'hixaz'; did you mean 'hicaz'?")
        await stage.shows("aim at which mode? hixaz")
        for key in ("left", "right", "home", "delete", "end", "\x7f"):
            stage.type(key)
        await stage.shows("aim at which mode? ixa ")
        stage.type(ESCAPE)
        await stage.until(lambda: "aim at" not in stage.text())
        assert stage.view.tokens == ("A4", "B4-1")

    stage.play(script)


@pytest.mark.parametrize("keys", ["F1", "?", ESCAPE + "h"])
def test_the_help_opens_scrolls_and_closes(stage: Stage, keys: str) -> None:
    async def script(stage: Stage) -> None:
        stage.type(keys)
        await stage.shows("Esc back to the line")
        stage.type("page down")
        await stage.until(lambda: not stage.screen.display[0].startswith("Keys"))
        stage.type(ESCAPE)
        await stage.shows("› A4 B4-1")
        assert stage.commands == []

    stage.play(script)


def test_the_screen_follows_the_size_of_the_terminal(stage: Stage) -> None:
    async def script(stage: Stage) -> None:
        for columns, rows in ((120, 40), (40, 12), (20, 3), (1, 1), (80, 24)):
            stage.screen.resize(rows, columns)
            stage.size = Size(rows=rows, columns=columns)
            stage.raw = ""
            stage.refresh()
            words = "› A4 B4-1" if columns > 20 else "13" if columns > 1 else "…"
            await stage.until(lambda: bool(stage.raw))
            await stage.shows(words)

    stage.play(script)


def test_leaving_restores_the_terminal(stage: Stage) -> None:
    async def script(stage: Stage) -> None:
        assert "\x1b[?1049h" in stage.raw  # xterm: the alternate screen is entered

    stage.play(script)
    assert stage.raw.rfind("\x1b[?1049l") > stage.raw.rfind("\x1b[?1049h")
    stage.refresh()  # a note that comes late does no harm


def test_escape_q_leaves_too(stage: Stage) -> None:
    async def script(stage: Stage) -> None:
        stage.type(ESCAPE + "q")
        await asyncio.sleep(DEADLINE_S)

    stage.play(script)
    assert stage.commands == [Quit(1)]


def test_an_error_while_a_view_is_taken_leaves_the_screen_and_is_raised(stage: Stage) -> None:
    async def script(stage: Stage) -> None:
        stage.view = None  # type: ignore[assignment]
        stage.refresh()
        await asyncio.sleep(DEADLINE_S)

    with pytest.raises(AttributeError):
        stage.play(script)
    assert "\x1b[?1049l" in stage.raw
    assert stage.commands == [Quit(1)]


def test_an_error_in_a_key_leaves_the_screen_and_is_raised(stage: Stage) -> None:
    def broken(kind: QuestionKind) -> tuple[str, ...]:
        raise OSError("no ports today")

    stage.choices = broken  # type: ignore[method-assign]

    async def script(stage: Stage) -> None:
        stage.type("F6")
        await asyncio.sleep(DEADLINE_S)

    with pytest.raises(OSError, match="no ports today"):
        stage.play(script)
    assert "\x1b[?1049l" in stage.raw


def test_a_terminal_that_goes_away_ends_the_screen(stage: Stage) -> None:
    async def script(stage: Stage) -> None:
        stage.keys.close()
        await asyncio.sleep(DEADLINE_S)

    stage.play(script)
    assert stage.commands == [Quit(1)]


@pytest.mark.skipif(sys.platform == "win32", reason="no SIGTERM handler in the loop of Windows")
def test_sigterm_restores_the_terminal(stage: Stage) -> None:
    async def script(stage: Stage) -> None:
        os.kill(os.getpid(), signal.SIGTERM)
        await asyncio.sleep(DEADLINE_S)

    stage.play(script)
    assert "\x1b[?1049l" in stage.raw
    assert stage.commands == [Quit(1)]


COLOUR = re.compile(r"\x1b\[[0-9;]*(?:\b3[0-7]|\b9[0-7]|\b38;)[0-9;]*m")


def test_no_color_is_honoured(stage: Stage, monkeypatch: pytest.MonkeyPatch) -> None:
    async def script(stage: Stage) -> None:
        assert not COLOUR.search(stage.raw)

    monkeypatch.setenv("NO_COLOR", "1")  # no-color.org: when set and not empty
    stage.play(script)


def test_colour_is_used_where_it_is_not_unwanted(stage: Stage, monkeypatch: pytest.MonkeyPatch) -> None:
    async def script(stage: Stage) -> None:
        assert COLOUR.search(stage.raw)

    monkeypatch.delenv("NO_COLOR", raising=False)
    monkeypatch.setenv("PROMPT_TOOLKIT_COLOR_DEPTH", ColorDepth.DEPTH_4_BIT.value)
    stage.play(script)


def test_no_key_waits_fifty_milliseconds_while_views_pour_in(views: Mapping[str, ViewState]) -> None:
    stage = Stage(views["long"], 120, 40)
    waits_s: list[float] = []

    async def script(stage: Stage) -> None:
        for count in range(12):
            stage.show(n_notes=count)
            n_before = len(stage.commands)
            start_s = time.perf_counter()
            stage.type("A4 ")
            while len(stage.commands) == n_before:
                await asyncio.sleep(0.001)
            waits_s.append(time.perf_counter() - start_s)
            await stage.until(lambda: stage.view.handled == len(stage.commands))

    stage.play(script)
    assert statistics.median(waits_s) < 0.05


def test_frames_are_not_drawn_more_than_fifteen_times_a_second(stage: Stage) -> None:
    frames = 0
    latest = stage.view

    async def script(stage: Stage) -> None:
        nonlocal frames
        end_s = time.perf_counter() + 0.6
        drawn = stage.raw
        while time.perf_counter() < end_s:
            stage.show(n_notes=(latest.n_notes + frames) % 900 + 1)
            await asyncio.sleep(0.002)
            if stage.raw != drawn:
                frames, drawn = frames + 1, stage.raw

    stage.play(script)
    assert 1 <= frames <= 10


def test_the_screen_runs_on_a_loop_of_its_own(stage: Stage) -> None:
    with create_pipe_input() as keys:
        keys.send_text("\x03")
        output = Vt100_Output(stage, lambda: stage.size, term="xterm", enable_cpr=False)
        run_screen(lambda: stage.view, stage.send, stage.subscribe, input=keys, output=output)
    assert stage.commands == [Quit(1)]


@pytest.mark.parametrize(("encoding", "dots"), [("utf-8", "›"), ("latin-1", ">")])
def test_plain_letters_are_drawn_where_the_terminal_knows_no_others(
    stage: Stage, monkeypatch: pytest.MonkeyPatch, encoding: str, dots: str
) -> None:
    stage.encoding = encoding  # type: ignore[misc]
    monkeypatch.setattr(sys, "stdout", stage)
    output = Vt100_Output(stage, lambda: stage.size, term="xterm", enable_cpr=False)
    monkeypatch.setattr("melodycoach.screen.terminal.create_output", lambda **_: output)
    with create_pipe_input() as keys:
        keys.send_text("\x03")
        run_screen(lambda: stage.view, stage.send, stage.subscribe, input=keys)
    assert f"{dots} A4 B4-1" in re.sub(r"\x1b\[[0-9;?]*[a-zA-Z]", "", stage.raw)
