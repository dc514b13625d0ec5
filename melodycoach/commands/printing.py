"""How results are printed, and how a long work says how far it has come."""

from __future__ import annotations

import json
import sys
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

FEWEST_COLUMNS, USUAL_COLUMNS, MOST_COLUMNS = 40, 80, 120
_BAR_CELLS = 24


def columns() -> int:
    """Give the width of a text for this terminal; `USUAL_COLUMNS` where there is none."""
    from shutil import get_terminal_size

    return max(FEWEST_COLUMNS, min(get_terminal_size((USUAL_COLUMNS, 24)).columns, MOST_COLUMNS))


def print_result(as_json: bool, data: object, text: Callable[[], str]) -> None:
    """Print a result as JSON or as text."""
    print(json_text(data) if as_json else text())


def json_text(data: object) -> str:
    """Write a result as JSON, as every command prints it."""
    return json.dumps(data, ensure_ascii=False, indent=2)


def say(sentence: str, indent: str = "") -> None:
    """Print a sentence at once, as wide as the terminal; what does not fit stands further in, below it.

    A file's name or title in it cannot upset the terminal.
    """
    from melodycoach.report.text_lines import painted, wrapped

    print(painted(wrapped(sentence, columns(), indent, f"{indent}  "), colour=False), flush=True)


def complain(sentence: str, faults: Sequence[str] = ()) -> None:
    """Say what went wrong, and under it what there is to mend; a file's name cannot upset the terminal."""
    from melodycoach.screen.text import tidy

    print(f"melodycoach: {tidy(sentence)}", file=sys.stderr)
    for fault in faults if list(faults) != [sentence] else ():
        print(f"  {tidy(fault)}", file=sys.stderr)


class Progress:
    """Says on the terminal how far a long work has come; silent where there is none."""

    def __init__(self) -> None:
        self._on = sys.stderr.isatty()

    def melodies(self, done: int) -> None:
        """Say how many melodies are done, where nobody knows how many there will be."""
        self._show(f"{done} melodies")

    def files(self, done: int, n_files: int, name: str) -> None:
        """Draw a bar of the files that are done, with the name of the last one."""
        filled = _BAR_CELLS * done // max(n_files, 1)
        bar = "#" * filled + "." * (_BAR_CELLS - filled)
        self._show(f"[{bar}] {done}/{n_files} {name}")

    def clear(self) -> None:
        """Leave nothing on the line."""
        if self._on:
            print("\r\033[K", end="", file=sys.stderr, flush=True)

    def complain(self, fault: str) -> None:
        """Say what went wrong, on a line of its own."""
        self.clear()
        complain(fault)

    def _show(self, text: str) -> None:
        if self._on:
            from shutil import get_terminal_size

            from melodycoach.screen.text import cut, tidy

            room = get_terminal_size((USUAL_COLUMNS, 24)).columns - 1  # the last column would break the line
            print(f"\r\033[K{cut(tidy(text), room)}", end="", file=sys.stderr, flush=True)
