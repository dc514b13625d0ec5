"""Write docs/cli.md from the program's own help: ``python docs/make_cli_page.py``."""

import contextlib
import io
import os
from pathlib import Path

from melodycoach.cli import main

PAGE = Path(__file__).with_name("cli.md")
COMMANDS = ("", "listen", "check", "demo", "modes", "retune", "ports", "evaluate")
OPENING = """# The command line

This page is written by `docs/make_cli_page.py` from the program's own help; a test compares the two.

Exit codes: 0 done, 1 the answer is no, 2 wrong usage or input, 70 a fault of the program, 130
interrupted. `NO_COLOR` is honoured. Your own mode packs are looked for in `packs/` under the
configuration folder of melodycoach (on Linux `~/.config/melodycoach/packs`), and event logs are kept
in `sessions/` under its data folder (on Linux `~/.local/share/melodycoach/sessions`).
"""


def help_of(command: str) -> str:
    """Give the help of a command, 80 columns wide and without colour."""
    os.environ.update(COLUMNS="80", NO_COLOR="1")
    printed = io.StringIO()
    with contextlib.redirect_stdout(printed), contextlib.suppress(SystemExit):
        main([word for word in (command, "--help") if word])
    return printed.getvalue().rstrip()


def page() -> str:
    """Give the whole page."""
    parts = [OPENING]
    for command in COMMANDS:
        title = f"melodycoach {command}".rstrip()
        parts.append(f"## {title}\n\n```\n{help_of(command)}\n```\n")
    return "\n".join(parts)


if __name__ == "__main__":
    PAGE.write_text(page(), encoding="utf-8")
