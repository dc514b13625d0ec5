"""`melodycoach demo`: the live session at work, with no keyboard."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from melodycoach.commands.listen import run_live
from melodycoach.commands.options import add_live, new_command

if TYPE_CHECKING:
    import argparse


def add_demo(commands: Any) -> None:
    """Add the command."""
    says = "hear a line of ours through the whole live path, with no keyboard; then it is your turn"
    command = new_command(commands, "demo", _run, says, "demo")
    add_live(command)
    command.add_argument("--fast", action="store_true", help="as fast as the machine can")


def _run(options: argparse.Namespace) -> int:
    from melodycoach.app import Settings

    settings = Settings(
        port=options.port, keys=options.keys, log=not options.no_log, demo=True, fast=options.fast
    )
    return run_live(settings, plain=options.plain)
