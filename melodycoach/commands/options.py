"""What more than one command can be told, and what becomes of it."""

from __future__ import annotations

import argparse
import sys
from typing import TYPE_CHECKING, Any

from melodycoach import DEFAULT_PACK

if TYPE_CHECKING:
    from collections.abc import Callable

    from melodycoach.core.mode import ModePack

LARGEST_COUNT = 100_000


def new_command(
    commands: Any, name: str, run: Callable[[argparse.Namespace], int], says: str, example: str
) -> Any:
    """Begin a command: its help, its example, and the options that every command has.

    Parameters
    ----------
    commands
        What ``add_subparsers`` gave.
    run
        Takes the options and gives the exit code.
    says
        What the command does, in a sentence without its capital and full stop.
    example
        Its words on the command line, beginning with its name.
    """
    command = commands.add_parser(
        name,
        help=says,
        description=says[0].upper() + says[1:] + ".",
        epilog=f"example:\n  melodycoach {example}",
        formatter_class=argparse.RawDescriptionHelpFormatter,
    )
    command.set_defaults(run=run)
    command.add_argument("--debug", action="store_true", help="show where in the program an error arose")
    return command


def add_pack(command: Any) -> None:
    """Add the choice of the mode pack."""
    command.add_argument(
        "--pack", default=DEFAULT_PACK, metavar="NAME|FILE", help=f"mode pack (default: {DEFAULT_PACK})"
    )


def add_only(command: Any) -> None:
    """Add the choice of the modes that compete."""
    command.add_argument("--only", default="", metavar="A,B,…", help="let only these modes compete")


def add_aim(command: Any) -> None:
    """Add what is known beforehand: the mode that is aimed at, and the final."""
    command.add_argument("--target", metavar="MODE", help="the mode that you aim at")
    final = command.add_mutually_exclusive_group()
    final.add_argument("--final", metavar="PITCH", help="the final, as a note or perde: A4, dügâh")
    final.add_argument("--any-pitch", action="store_true", help="every mode may stand on every pitch")


def add_live(command: Any) -> None:
    """Add what a live session can be told."""
    command.add_argument("--port", metavar="NAME", help="MIDI input; a part of its name will do")
    command.add_argument("--keys", metavar="PROFILE", help="what your keyboard does not say: a profile of it")
    command.add_argument("--plain", action="store_true", help="one line of text a note, no full screen")
    command.add_argument("--no-log", action="store_true", help="keep no event log of the session")


def add_json(command: Any) -> None:
    """Add the choice of JSON."""
    command.add_argument("--json", action="store_true", help="print JSON")


def count(text: str) -> int:
    """Read a number of things.

    Raises
    ------
    argparse.ArgumentTypeError
        It is no number, or one beyond `LARGEST_COUNT`.
    """
    value = int(text) if text.isdecimal() else -1
    if not 0 <= value <= LARGEST_COUNT:
        raise argparse.ArgumentTypeError(f"{text!r} is not a number from 0 to {LARGEST_COUNT}")
    return value


def names(text: str) -> tuple[str, ...]:
    """Give the names in what was typed for ``--only``."""
    from melodycoach.core.mode import names_in

    return names_in(text)


def load_named_pack(name: str) -> ModePack:
    """Load a pack, and say when it is one of the player's own in place of one that is shipped."""
    from melodycoach.core.pitch import fold_name
    from melodycoach.folders import user_pack_dir
    from melodycoach.sources.pack_file import load_pack, shadowed_packs

    pack = load_pack(name, user_pack_dir())
    for own, path in shadowed_packs(user_pack_dir()).items():
        if fold_name(own) == fold_name(name):
            says = f"{path} is used in place of the pack {own!r} that comes with the program"
            print(f"melodycoach: {says}", file=sys.stderr)
    return pack
