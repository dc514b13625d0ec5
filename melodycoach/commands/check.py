"""`melodycoach check`: what a written line says, and what there is to mend in it."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from melodycoach.commands.check_answers import print_answers, print_pages, refuse_to_lose_files
from melodycoach.commands.check_watch import watch
from melodycoach.commands.options import (
    add_aim,
    add_json,
    add_only,
    add_pack,
    load_named_pack,
    names,
    new_command,
)
from melodycoach.errors import UsageError

if TYPE_CHECKING:
    import argparse

    from melodycoach.checking import Question

NOTATIONS = ("aeu", "folk", "arabic", "persian", "literal")
"""The values of `melodycoach.sources.accidental_table.Notation`, which is loaded with a score only."""

_CHANNELS = 16


def add_check(commands: Any) -> None:
    """Add the command."""
    says = "say which mode a written line is in, where it leaves it, and what mends that"
    command = new_command(commands, "check", _run, says, "check draft.txt --stay-in huseyni")
    command.add_argument(
        "files", nargs="+", metavar="FILE", help="note text, MIDI file or MusicXML; - for what is piped in"
    )
    add_pack(command)
    add_only(command)
    add_aim(command)
    command.add_argument(
        "--stay-in", metavar="MODE", help="does the line stay in this mode? exit code 0: yes, 1: no"
    )
    lines = command.add_argument_group("which line of a file (with many files: of those that it fits)")
    lines.add_argument("--track", default="", metavar="TRACK", help="of a MIDI file: number or part of name")
    lines.add_argument("--channel", type=_channel, metavar="N", help="of a MIDI file: 1 to 16")
    lines.add_argument("--part", default="", metavar="PART", help="of a score: number or part of name")
    lines.add_argument("--voice", default="", metavar="VOICE", help="of a score: as numbered in it")
    lines.add_argument(
        "--accidentals", choices=NOTATIONS, help="what the signs of a score mean (default: guessed, and said)"
    )
    shown = command.add_argument_group("how the answer is shown")
    add_json(shown)
    shown.add_argument("--html", metavar="PAGE", help="also write a page to look at; - prints the page alone")
    shown.add_argument("--out", metavar="FOLDER", help="write a page for each file, an index, answers.json")
    shown.add_argument("--watch", action="store_true", help="answer again at each save, with what changed")
    shown.add_argument(
        "--color",
        choices=("auto", "always", "never"),
        default="auto",
        help="colour in the text (default: auto, on a terminal)",
    )


def _channel(text: str) -> int:
    from argparse import ArgumentTypeError

    value = int(text) if text.isdecimal() else 0
    if not 1 <= value <= _CHANNELS:
        raise ArgumentTypeError(f"{text!r} is not a channel from 1 to {_CHANNELS}")
    return value


def _run(options: argparse.Namespace) -> int:
    files = tuple(dict.fromkeys(options.files))
    _refuse_what_does_not_go_together(options, files)
    question = _question(options, strict=len(files) == 1)
    refuse_to_lose_files(options, files)
    if options.watch:
        return watch(options, question, files)
    from melodycoach.checking import answers

    found = answers(question, files)
    if options.out is not None:
        return print_pages(options, found, files)
    return print_answers(options, found)


def _refuse_what_does_not_go_together(options: argparse.Namespace, files: tuple[str, ...]) -> None:
    many = len(files) > 1
    wrong = (
        (options.html and options.out, "--html and --out: a page or a folder of them; leave one out"),
        (options.html and many, "--html is a page for one file; write a folder of pages with --out"),
        (options.html == "-" and options.json, "--html - and --json both print; name a file for the page"),
        (options.html == "-" and options.watch, "--watch prints answers; name a file for the page"),
        (options.json and options.out, "--json and --out: the folder holds answers.json; leave one out"),
        (options.watch and options.json, "--watch and --json: it talks to people; leave one out"),
        (options.watch and options.out, "--watch and --out: it answers on the terminal; leave one out"),
        (options.watch and "-" in files, "--watch waits for a file to be saved; what is piped in never is"),
    )
    for is_so, sentence in wrong:
        if is_so:
            raise UsageError(sentence)


def _question(options: argparse.Namespace, *, strict: bool) -> Question:
    from melodycoach.checking import Question
    from melodycoach.core.event import PitchReading
    from melodycoach.line_text import read_final
    from melodycoach.sources.sheet_file import ReadOptions

    pack = load_named_pack(options.pack)
    reading: PitchReading | None = PitchReading.ANY if options.any_pitch else None
    final_cents: float | None = None
    if options.final is not None:
        reading, final_cents = read_final(options.final, pack.names)
    return Question(
        pack=pack,
        modes=pack.restrict(names(options.only)),
        reading=reading,
        final_cents=final_cents,
        target=pack.find(options.target) if options.target else None,
        stay_in=pack.find(options.stay_in) if options.stay_in else None,
        options=ReadOptions(
            options.track, options.channel, options.part, options.voice, _notation(options.accidentals)
        ),
        strict=strict,
        debug=options.debug,
    )


def _notation(name: str | None) -> Any:
    if name is None:
        return None
    from melodycoach.sources.accidental_table import Notation

    return Notation(name)
