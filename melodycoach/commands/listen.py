"""`melodycoach listen`: a live session, played or typed."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import TYPE_CHECKING, Any

from melodycoach.commands.options import add_aim, add_live, add_only, add_pack, names, new_command
from melodycoach.errors import UsageError

if TYPE_CHECKING:
    import argparse

    from melodycoach.app import Settings


def add_listen(commands: Any) -> None:
    """Add the command."""
    says = "play or type a line and see which mode it implies (the default command)"
    command = new_command(commands, "listen", _run, says, "listen --target huseyni --port usb")
    command.add_argument(
        "file", nargs="?", metavar="FILE", help="a line to begin with: note text, a MIDI file or MusicXML"
    )
    add_pack(command)
    add_only(command)
    add_aim(command)
    add_live(command)
    command.add_argument(
        "--resume",
        nargs="?",
        const="",
        metavar="LOG",
        help="go on with an earlier session, to its last note (default: the newest one with notes in it)",
    )
    command.add_argument("--replay", metavar="LOG", help="play back the event log of an earlier session")
    command.add_argument("--fast", action="store_true", help="with --replay: do not wait between the notes")


def _run(options: argparse.Namespace) -> int:
    from melodycoach.app import Settings

    if options.fast and not options.replay:
        raise UsageError("--fast goes with --replay")
    if options.replay and options.file:
        raise UsageError("--replay and FILE: one line to begin with at a time; leave one of them out")
    ignored = (options.only, options.target, options.final, options.any_pitch, options.port, options.keys)
    if options.replay and any(ignored):
        raise UsageError(
            "--replay shows a session as it was: leave out --only, --target, --final, --any-pitch, --port "
            "and --keys"
        )
    _refuse_with_resume(options)
    settings = Settings(
        pack=options.pack,
        only=names(options.only),
        target=options.target,
        final=options.final,
        any_pitch=options.any_pitch,
        port=options.port,
        keys=options.keys,
        log=not options.no_log,
        open_file=Path(options.file) if options.file else None,
        replay=Path(options.replay) if options.replay else None,
        resume=options.resume,
        fast=options.fast,
    )
    return run_live(settings, plain=options.plain)


def _refuse_with_resume(options: argparse.Namespace) -> None:
    """Refuse what a resumed session brings with it."""
    if options.resume is None:
        return
    if options.replay or options.file:
        raise UsageError("--resume, --replay and FILE: one line to begin with at a time; name one of them")
    if any((options.only, options.target, options.final, options.any_pitch)):
        raise UsageError(
            "--resume brings a session back with its own settings: leave out --only, --target, --final "
            "and --any-pitch, and change them on the screen"
        )


def run_live(settings: Settings, *, plain: bool) -> int:
    """Choose the screen, full or, when asked for or when nobody looks at a terminal, plain; run on it."""
    from melodycoach.app import listen

    full_screen = not plain and sys.stdout.isatty() and sys.stdin.isatty()
    return listen(settings, full_screen=full_screen, say=_say)


def _say(text: str) -> None:
    print(text, flush=True)
