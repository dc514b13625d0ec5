"""The command line: arguments in, exit code out. The only file that prints.

Nothing heavy is imported before the arguments are understood, so that ``--help`` is quick.
"""

from __future__ import annotations

import argparse
import json
import sys
import traceback
from difflib import get_close_matches
from pathlib import Path
from typing import TYPE_CHECKING, Any, NoReturn

from melodycoach import DEFAULT_PACK, __version__
from melodycoach.errors import MelodycoachError, UsageError, system_reason
from melodycoach.output import accept_every_letter, silence_stdout

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from melodycoach.app import Settings
    from melodycoach.core.mode import ModePack

DONE, ANSWER_IS_NO, BAD_INPUT, OUR_FAULT, INTERRUPTED = 0, 1, 2, 70, 130
DEFAULT_COMMAND = "listen"

_EPILOG = """\
examples:
  melodycoach                       play or type a line, full screen
  melodycoach demo                  see it at work, with no keyboard
  melodycoach listen --plain        one line of text for each note
  melodycoach modes huseyni         what one makam is made of
  melodycoach COMMAND --help        the options of one command
"""


def main(argv: Sequence[str] | None = None) -> int:
    """Run the program and give its exit code; docs/cli.md says what each means."""
    accept_every_letter()
    words = list(sys.argv[1:] if argv is None else argv)
    parser, commands = _parser()
    if not words or words[0] not in (*commands, "-h", "--help", "--version"):
        meant = get_close_matches(words[0], commands, n=1, cutoff=0.7) if words else []
        if meant and not Path(words[0]).exists():
            says = f"no command and no file {words[0]!r}; did you mean melodycoach {meant[0]}?"
            print(f"melodycoach: {says}", file=sys.stderr)
            return BAD_INPUT
        words.insert(0, DEFAULT_COMMAND)
    options = parser.parse_args(words)
    try:
        return _run(options)
    except MelodycoachError as error:
        if options.debug:
            raise
        print(f"melodycoach: {error}", file=sys.stderr)
        for fault in error.faults:
            print(f"  {fault}", file=sys.stderr)
        return error.exit_code
    except KeyboardInterrupt:
        return INTERRUPTED
    except BrokenPipeError:
        silence_stdout()  # nobody reads on: say no more
        return DONE
    except OSError as error:  # whatever can be said more exactly was said by who met it
        if options.debug:
            raise
        silence_stdout()
        where = error.filename or "output"
        print(f"melodycoach: {where}: {system_reason(error)}; --debug shows where it arose", file=sys.stderr)
        return BAD_INPUT
    except Exception:  # noqa: BLE001  (the last door: a fault of ours is shown whole, and told from an answer)
        traceback.print_exc()
        print(
            "melodycoach: this is a fault of the program, not yours; the log of the session is kept",
            file=sys.stderr,
        )
        return OUR_FAULT


def _run(options: argparse.Namespace) -> int:
    run: Callable[[argparse.Namespace], int] = options.run
    code = run(options)
    sys.stdout.flush()  # so that a reader who has gone is noticed here and not at the exit
    return code


def _parser() -> tuple[argparse.ArgumentParser, Sequence[str]]:
    parser = _Parser(
        prog="melodycoach",
        description="Hears a phrase, played or typed, and says note by note which mode it\n"
        "implies, which characteristic steps it still owes that mode, and why.",
        epilog=_EPILOG,
        formatter_class=argparse.RawDescriptionHelpFormatter,
    )
    parser.add_argument("--version", action="version", version=f"melodycoach {__version__}")
    commands = parser.add_subparsers(title="commands", metavar="COMMAND")
    _add_listen(commands)
    _add_demo(commands)
    _add_modes(commands)
    _add_ports(commands)
    _add_evaluate(commands)
    return parser, tuple(commands.choices)


class _Parser(argparse.ArgumentParser):
    def error(self, message: str) -> NoReturn:
        self.exit(BAD_INPUT, f"melodycoach: {message}; see {self.prog} --help\n")


def _command(
    commands: Any, name: str, run: Callable[[argparse.Namespace], int], says: str, example: str
) -> Any:
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


def _add_pack(command: Any) -> None:
    command.add_argument(
        "--pack", default=DEFAULT_PACK, metavar="NAME|FILE", help=f"mode pack (default: {DEFAULT_PACK})"
    )


def _add_only(command: Any) -> None:
    command.add_argument("--only", default="", metavar="A,B,…", help="let only these modes compete")


def _add_live(command: Any) -> None:
    command.add_argument("--port", metavar="NAME", help="MIDI input; a part of its name will do")
    command.add_argument("--plain", action="store_true", help="one line of text a note, no full screen")
    command.add_argument("--no-log", action="store_true", help="keep no event log of the session")


# --- listen and demo ---------------------------------------------------------------------------


def _add_listen(commands: Any) -> None:
    says = "play or type a line and see which mode it implies (the default command)"
    command = _command(commands, "listen", _listen, says, "listen --target huseyni --port usb")
    command.add_argument("file", nargs="?", metavar="FILE", help="a line in note text to begin with")
    _add_pack(command)
    _add_only(command)
    command.add_argument("--target", metavar="MODE", help="the mode that you aim at")
    final = command.add_mutually_exclusive_group()
    final.add_argument("--final", metavar="PITCH", help="the final, as a note or perde: A4, dügâh")
    final.add_argument("--any-pitch", action="store_true", help="every mode may stand on every pitch")
    _add_live(command)
    command.add_argument("--replay", metavar="LOG", help="play back the event log of an earlier session")
    command.add_argument("--fast", action="store_true", help="with --replay: do not wait between the notes")


def _listen(options: argparse.Namespace) -> int:
    from melodycoach.app import Settings, listen

    if options.fast and not options.replay:
        raise UsageError("--fast goes with --replay")
    if options.replay and options.file:
        raise UsageError("--replay and FILE: one line to begin with at a time; leave one of them out")
    ignored = (options.only, options.target, options.final, options.any_pitch, options.port)
    if options.replay and any(ignored):
        raise UsageError(
            "--replay shows a session as it was: leave out --only, --target, --final, --any-pitch and --port"
        )
    settings = Settings(
        pack=options.pack,
        only=_names(options.only),
        target=options.target,
        final=options.final,
        any_pitch=options.any_pitch,
        port=options.port,
        log=not options.no_log,
        open_file=Path(options.file) if options.file else None,
        replay=Path(options.replay) if options.replay else None,
        fast=options.fast,
    )
    return _run_live(settings, options.plain, listen)


def _add_demo(commands: Any) -> None:
    says = "hear a line of ours through the whole live path, with no keyboard; then it is your turn"
    command = _command(commands, "demo", _demo, says, "demo")
    _add_live(command)
    command.add_argument("--fast", action="store_true", help="as fast as the machine can")


def _demo(options: argparse.Namespace) -> int:
    from melodycoach.app import Settings, listen

    settings = Settings(port=options.port, log=not options.no_log, demo=True, fast=options.fast)
    return _run_live(settings, options.plain, listen)


def _run_live(settings: Settings, plain: bool, listen: Callable[..., int]) -> int:
    """Choose the screen: full, or plain when asked for or when nobody looks at a terminal."""
    full_screen = not plain and sys.stdout.isatty() and sys.stdin.isatty()
    return listen(settings, full_screen=full_screen, say=_say)


def _say(text: str) -> None:
    print(text, flush=True)


# --- modes, ports, evaluate --------------------------------------------------------------------


def _add_modes(commands: Any) -> None:
    says = "list the modes, or say what one of them is made of"
    command = _command(commands, "modes", _modes, says, "modes huseyni")
    command.add_argument("mode", nargs="?", metavar="MODE", help="one mode, in any spelling")
    _add_pack(command)
    command.add_argument("--check", metavar="FILE", help="say whether a mode pack of yours can be used")
    command.add_argument("--json", action="store_true", help="print JSON")


def _modes(options: argparse.Namespace) -> int:
    from melodycoach.report.modes import mode_json, mode_text, modes_json, modes_text
    from melodycoach.sources.pack_file import read_pack

    if options.check:
        checked = read_pack(Path(options.check))
        print(f"{options.check}: pack {checked.id!r} with {len(checked.modes)} modes can be used")
        return DONE
    pack = _pack(options.pack)
    if options.mode:
        mode = pack.find(options.mode)
        _print_result(options.json, mode_json(pack, mode), lambda: mode_text(pack, mode, _columns()))
    else:
        _print_result(options.json, modes_json(pack), lambda: modes_text(pack, _columns()))
        _name_other_packs(options.pack, options.json)
    return DONE


def _name_other_packs(in_use: str, as_json: bool) -> None:
    """Say which packs there are beside the one that was listed, and which of them are damaged."""
    from melodycoach.app import user_pack_dir
    from melodycoach.core.pitch import fold_name
    from melodycoach.sources.pack_file import find_packs, list_packs

    folder = user_pack_dir()
    if {fold_name(name) for name in find_packs(folder)} <= {fold_name(in_use)}:
        return
    for entry in list_packs(folder):
        if entry.pack is None:
            count = "1 fault" if len(entry.faults) == 1 else f"{len(entry.faults)} faults"
            says = f"pack {entry.name!r} cannot be used, {count}; see melodycoach modes --check {entry.path}"
            print(f"melodycoach: {says}", file=sys.stderr)
        elif not as_json and fold_name(entry.name) != fold_name(in_use):
            print(f"Another pack: {entry.pack.name}: melodycoach modes --pack {entry.name}")


def _add_ports(commands: Any) -> None:
    command = _command(
        commands,
        "ports",
        _ports,
        "list the MIDI inputs and outputs, and what to do when there are none",
        "ports",
    )
    command.add_argument("--json", action="store_true", help="print JSON")


def _ports(options: argparse.Namespace) -> int:
    from melodycoach.app import ports
    from melodycoach.report.ports import ports_text

    found = ports()
    _print_result(options.json, found, lambda: ports_text(found))
    return DONE


def _add_evaluate(commands: Any) -> None:
    says = "measure how well the modes of a labelled collection are named"
    example = "evaluate collection.jsonl.gz --only rast,mahur,ussak --json"
    command = _command(commands, "evaluate", _evaluate, says, example)
    command.add_argument("collection", metavar="COLLECTION", help="JSON lines, gzipped or not")
    _add_pack(command)
    _add_only(command)
    command.add_argument(
        "--as",
        dest="reading",
        choices=("written", "final", "any"),
        default="written",
        help="what is known of the final (default: written)",
    )
    command.add_argument(
        "--input",
        choices=("typed", "keys", "tuned", "recorded"),
        default="recorded",
        help="how the notes came about: sets noise and blur (default: recorded)",
    )
    command.add_argument("--seams", type=_count, default=0, metavar="N", help="also splice N pairs")
    command.add_argument(
        "--owed", type=_count, default=0, metavar="N", help="also try owed steps on N melodies"
    )
    command.add_argument("--seed", type=int, default=1, metavar="N", help="of random choices (default: 1)")
    command.add_argument("--strict", action="store_true", help="stop at the first bad record")
    command.add_argument("--json", action="store_true", help="print JSON")


def _evaluate(options: argparse.Namespace) -> int:
    from melodycoach.core.event import PitchReading
    from melodycoach.core.note import InputKind
    from melodycoach.measure import evaluate_collection
    from melodycoach.report.evaluation import evaluation_json, evaluation_text

    progress = _Progress()
    evaluation = evaluate_collection(
        Path(options.collection),
        _pack(options.pack),
        _names(options.only),
        PitchReading(options.reading),
        InputKind(options.input),
        strict=options.strict,
        on_fault=progress.complain,
        progress=progress.show,
        seams=options.seams,
        owed=options.owed,
        seed=options.seed,
    )
    progress.clear()
    _print_result(options.json, evaluation_json(evaluation), lambda: evaluation_text(evaluation, _columns()))
    return DONE


class _Progress:
    """Says on the terminal how far a long work has come; silent where there is none."""

    def __init__(self) -> None:
        self._on = sys.stderr.isatty()

    def show(self, done: int) -> None:
        if self._on:
            print(f"\r{done} melodies", end="", file=sys.stderr, flush=True)

    def clear(self) -> None:
        if self._on:
            print("\r\033[K", end="", file=sys.stderr, flush=True)

    def complain(self, fault: str) -> None:
        self.clear()
        print(f"melodycoach: {fault}", file=sys.stderr)


def _count(text: str) -> int:
    value = int(text) if text.isdecimal() else -1
    if not 0 <= value <= 100_000:
        raise argparse.ArgumentTypeError(f"{text!r} is not a number from 0 to 100000")
    return value


# --- shared ------------------------------------------------------------------------------------


def _names(text: str) -> tuple[str, ...]:
    from melodycoach.core.mode import names_in

    return names_in(text)


def _pack(name: str) -> ModePack:
    from melodycoach.app import user_pack_dir
    from melodycoach.core.pitch import fold_name
    from melodycoach.sources.pack_file import load_pack, shadowed_packs

    pack = load_pack(name, user_pack_dir())
    for own, path in shadowed_packs(user_pack_dir()).items():
        if fold_name(own) == fold_name(name):
            says = f"{path} is used in place of the pack {own!r} that comes with the program"
            print(f"melodycoach: {says}", file=sys.stderr)
    return pack


def _columns() -> int:
    from shutil import get_terminal_size

    return max(40, min(get_terminal_size((80, 24)).columns, 120))


def _print_result(as_json: bool, data: object, text: Callable[[], str]) -> None:
    print(json.dumps(data, ensure_ascii=False, indent=2) if as_json else text())
