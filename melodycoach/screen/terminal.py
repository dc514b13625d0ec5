"""The full screen on a terminal: the only file that knows prompt_toolkit.

Conventions
-----------
One control draws the desk, and each key calls one of its methods. All of it happens in one thread;
only the function that is handed to ``subscribe`` may be called from others.
"""

from __future__ import annotations

import asyncio
import signal
import sys
import threading
from contextlib import contextmanager, suppress
from functools import partial
from typing import TYPE_CHECKING

from prompt_toolkit.application import Application
from prompt_toolkit.data_structures import Point
from prompt_toolkit.filters import Condition
from prompt_toolkit.key_binding import KeyBindings
from prompt_toolkit.keys import Keys
from prompt_toolkit.layout import Layout, UIContent, UIControl, Window
from prompt_toolkit.output.color_depth import ColorDepth
from prompt_toolkit.output.defaults import create_output
from prompt_toolkit.styles import Style

from melodycoach.screen import entry_edit
from melodycoach.screen import question as asking
from melodycoach.screen.command import Quit
from melodycoach.screen.desk import Desk
from melodycoach.screen.question import QuestionKind
from melodycoach.screen.signs import STYLES

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator, Sequence

    from prompt_toolkit.formatted_text import StyleAndTextTuples
    from prompt_toolkit.input import Input
    from prompt_toolkit.key_binding.key_processor import KeyPressEvent
    from prompt_toolkit.output import Output

    from melodycoach.screen.command import Command
    from melodycoach.screen.entry import Entry
    from melodycoach.screen.entry_lines import Drawn
    from melodycoach.screen.question import Question
    from melodycoach.screen.view import ViewState

MIN_REDRAW_INTERVAL_S = 0.07
"""Not more than 15 frames a second."""

ESCAPE_WAIT_S = 0.05
"""So long after Esc the rest of a function key may still come in."""

PREFIX_WAIT_S = 0.5
"""So long after Esc the letter that goes with it may still be pressed."""


def no_choices(kind: QuestionKind) -> tuple[str, ...]:
    """Offer nothing."""
    return ()


def run_screen(
    latest_view: Callable[[], ViewState],
    send: Callable[[Command], None],
    subscribe: Callable[[Callable[[], None]], None],
    choices: Callable[[QuestionKind], Sequence[str]] = no_choices,
    *,
    input: Input | None = None,
    output: Output | None = None,
    ascii_only: bool | None = None,
) -> None:
    """Show the screen until the player quits, or SIGTERM or SIGHUP comes.

    Parameters
    ----------
    latest_view
        Gives the newest view; called before each frame, in this thread. What it raises ends the
        screen and is raised again from here.
    send
        Takes the commands; must not block. The last one is always `Quit`.
    subscribe
        Called once, with a function that asks for a new frame. That function may be called from
        any thread, at any time, also after the screen has ended.
    choices
        Gives the names to offer for a kind of question; called when the question is asked.
    input, output
        Where keys come from and frames go; None: the terminal.
    ascii_only
        Draw with plain letters only; None: where the terminal's encoding is not UTF-8.

    Raises
    ------
    Exception
        Whatever went wrong in a key or a frame, after the terminal has been restored.
    """
    asyncio.run(
        run_screen_async(
            latest_view, send, subscribe, choices, input=input, output=output, ascii_only=ascii_only
        )
    )


async def run_screen_async(
    latest_view: Callable[[], ViewState],
    send: Callable[[Command], None],
    subscribe: Callable[[Callable[[], None]], None],
    choices: Callable[[QuestionKind], Sequence[str]] = no_choices,
    *,
    input: Input | None = None,
    output: Output | None = None,
    ascii_only: bool | None = None,
) -> None:
    """Show the screen inside a running event loop; see `run_screen`."""
    if ascii_only is None:
        ascii_only = output is None and not _speaks_utf8()
    desk = Desk(latest_view, send, choices, ascii_only)
    application = _application(desk, input, output or create_output(stdout=sys.stdout))
    subscribe(partial(_ask_for_frame, application))
    try:
        # EOFError: the terminal is gone; leave as if the player had quit
        with suppress(EOFError), _ended_by_signal(application):
            await application.run_async(set_exception_handler=False)
    finally:
        send(Quit(desk.next_number()))


def _ask_for_frame(application: Application[None]) -> None:
    with suppress(RuntimeError):  # the loop was closed this very moment
        application.invalidate()


def _speaks_utf8() -> bool:
    return (sys.stdout.encoding or "").lower().replace("-", "").replace("_", "") == "utf8"


@contextmanager
def _ended_by_signal(application: Application[None]) -> Iterator[None]:
    """Let SIGTERM and SIGHUP end the application, so that the terminal is restored."""
    loop = asyncio.get_running_loop()
    taken: list[int] = []
    if threading.current_thread() is threading.main_thread():
        for number in (signal.SIGTERM, getattr(signal, "SIGHUP", signal.SIGTERM)):
            with suppress(NotImplementedError):  # Windows
                loop.add_signal_handler(number, _leave, application)
                taken.append(number)
    try:
        yield
    finally:
        for number in taken:
            loop.remove_signal_handler(number)


def _leave(application: Application[None], error: Exception | None = None) -> None:
    """End the application, once; with an error it is raised from its run."""
    if not application.is_running or application.is_done:
        return
    if error is None:
        application.exit()
    else:
        application.exit(exception=error)


def _guarded(application: Application[None], act: Callable[[], object]) -> None:
    """Do something; if it fails, leave the full screen with the error.

    Left to itself prompt_toolkit would wait for Enter and go on.
    """
    try:
        act()
    except Exception as error:  # noqa: BLE001 - raised again by the run of the application
        _leave(application, error)


class _Picture(UIControl):
    """The one control: asks the desk for the lines that fill its window."""

    def __init__(self, desk: Desk) -> None:
        self._desk = desk

    def create_content(self, width: int, height: int) -> UIContent:
        drawn: Drawn = self._desk.drawn(width, height)
        lines: list[StyleAndTextTuples] = [list(line) for line in drawn.lines]
        return UIContent(
            get_line=lambda place: lines[place],
            line_count=len(lines),
            cursor_position=Point(x=drawn.column, y=drawn.row),
            show_cursor=not self._desk.helping,
        )

    def is_focusable(self) -> bool:
        return True


def _application(desk: Desk, source: Input | None, output: Output) -> Application[None]:
    """Build the application round a desk."""
    window = Window(_Picture(desk))
    application: Application[None] = Application(
        layout=Layout(window, focused_element=window),
        key_bindings=_Keys(desk).bindings,
        style=Style.from_dict(STYLES),
        full_screen=True,
        mouse_support=False,
        color_depth=ColorDepth.from_env(),
        min_redraw_interval=MIN_REDRAW_INTERVAL_S,
        before_render=lambda app: _guarded(app, desk.take_view),
        input=source,
        output=output,
    )
    application.ttimeoutlen = ESCAPE_WAIT_S
    application.timeoutlen = PREFIX_WAIT_S
    return application


class _Keys:
    """Which key does what, for the entry, a question and the help."""

    def __init__(self, desk: Desk) -> None:
        self._desk = desk
        self.bindings = KeyBindings()
        self._editing = Condition(lambda: desk.editing)
        self._asking = Condition(lambda: desk.asking)
        self._helping = Condition(lambda: desk.helping)
        for key in ("c-c", "<sigint>"):
            self.bindings.add(key)(lambda event: _leave(event.app))
        self.bindings.add("escape", "q", filter=self._editing)(lambda event: _leave(event.app))
        self._bind_help()
        self._bind_question()
        self._bind_entry()

    def _bind(self, when: Condition, act: Callable[[], object], *keys: str) -> None:
        """Let keys do something; ``escape x`` is Esc and then x."""

        def handler(event: KeyPressEvent) -> None:
            _guarded(event.app, act)

        for key in keys:
            self.bindings.add(*key.split(" "), filter=when)(handler)

    def _bind_text(self, when: Condition, take: Callable[[str], None]) -> None:
        """Let characters that are typed or pasted be taken."""

        def handler(event: KeyPressEvent) -> None:
            _guarded(event.app, partial(take, event.data))

        self.bindings.add(Keys.Any, filter=when)(handler)
        self.bindings.add(Keys.BracketedPaste, filter=when)(handler)

    def _bind_help(self) -> None:
        desk = self._desk
        self._bind(self._editing, desk.open_help, "f1", "?", "escape h")
        self._bind(self._helping, desk.close_help, "f1", "?", "escape", "enter", "q")
        for key, step in (("up", -1), ("down", 1), ("pageup", -10), ("pagedown", 10), ("home", -999)):
            self._bind(self._helping, partial(desk.scroll_help, step), key)

    def _bind_question(self) -> None:
        desk = self._desk
        questions: tuple[tuple[QuestionKind, tuple[str, ...]], ...] = (
            (QuestionKind.TARGET, ("f2", "c-t", "escape t")),
            (QuestionKind.FINAL, ("f3", "c-f", "escape f")),
            (QuestionKind.ONLY, ("f4", "c-l", "escape m")),
            (QuestionKind.PORT, ("f6", "c-p", "escape i")),
            (QuestionKind.OPEN, ("f7", "c-o", "escape o")),
            (QuestionKind.SAVE, ("f8", "c-k", "escape s")),
        )
        for kind, keys in questions:
            self._bind(self._editing, partial(desk.ask, kind), *keys)
        self._bind(self._asking, desk.drop_question, "escape")
        self._bind(self._asking, desk.answer, "enter", "c-j")
        changes: tuple[tuple[Callable[[Question], Question], tuple[str, ...]], ...] = (
            (asking.completed, ("tab",)),
            (partial(asking.picked_next, step=1), ("down",)),
            (partial(asking.picked_next, step=-1), ("up", "s-tab")),
            (asking.erased_before, ("backspace",)),
            (asking.erased_after, ("delete",)),
            (asking.cleared, ("c-u",)),
            (partial(asking.moved, step=-1), ("left",)),
            (partial(asking.moved, step=1), ("right",)),
            (asking.moved_to_start, ("home", "c-a")),
            (asking.moved_to_end, ("end", "c-e")),
        )
        for change, keys in changes:
            self._bind(self._asking, partial(desk.change_question, change), *keys)
        self._bind_text(self._asking, lambda text: desk.change_question(partial(asking.typed, new=text)))

    def _bind_entry(self) -> None:
        desk = self._desk
        changes: tuple[tuple[Callable[[Entry], Entry], tuple[str, ...]], ...] = (
            (entry_edit.erased_before, ("backspace",)),
            (entry_edit.erased_after, ("delete",)),
            (entry_edit.erased_word, ("c-w", "escape backspace")),
            (entry_edit.moved_left, ("left",)),
            (entry_edit.moved_right, ("right",)),
            (entry_edit.moved_word_left, ("c-left",)),
            (entry_edit.moved_word_right, ("c-right",)),
            (entry_edit.moved_to_start, ("home", "c-home", "c-a")),
            (entry_edit.moved_to_end, ("end", "c-end", "c-e")),
            (entry_edit.confirmed, ("enter", "c-j")),
        )
        for change, keys in changes:
            self._bind(self._editing, partial(desk.change_entry, change), *keys)
        self._bind(self._editing, partial(desk.move_row, -1), "up")
        self._bind(self._editing, partial(desk.move_row, 1), "down")
        self._bind(self._editing, desk.undo, "c-z", "escape u")
        self._bind(self._editing, desk.redo, "c-y", "escape r")
        self._bind(self._editing, desk.fresh, "f5", "c-n", "escape n")
        self._bind_text(self._editing, desk.type_text)
