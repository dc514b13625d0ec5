"""The command line: arguments in, exit code out. Only this file and the commands print.

Nothing heavy is imported before the arguments are understood, so that ``--help`` is quick.
"""

from __future__ import annotations

import argparse
import sys
import traceback
from difflib import get_close_matches
from pathlib import Path
from typing import TYPE_CHECKING, NoReturn

from melodycoach import __version__
from melodycoach.commands.check import add_check
from melodycoach.commands.demo import add_demo
from melodycoach.commands.evaluate import add_evaluate
from melodycoach.commands.exit_codes import BAD_INPUT, DONE, INTERRUPTED, OUR_FAULT
from melodycoach.commands.listen import add_listen
from melodycoach.commands.modes import add_modes
from melodycoach.commands.ports import add_ports
from melodycoach.commands.printing import complain
from melodycoach.commands.retune import add_retune
from melodycoach.errors import MelodycoachError, system_reason
from melodycoach.output import accept_every_letter, silence_stdout

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

DEFAULT_COMMAND = "listen"

_EPILOG = """\
examples:
  melodycoach                       play or type a line, full screen
  melodycoach demo                  see it at work, with no keyboard
  melodycoach check draft.txt       what a written line says, and what to mend
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
            complain(f"no command and no file {words[0]!r}; did you mean melodycoach {meant[0]}?")
            return BAD_INPUT
        words.insert(0, DEFAULT_COMMAND)
    options = parser.parse_args(words)
    try:
        return _run(options)
    except MelodycoachError as error:
        if options.debug:
            raise
        complain(str(error), error.faults)
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
        complain(f"{where}: {system_reason(error)}; --debug shows where it arose")
        return BAD_INPUT
    except Exception:  # noqa: BLE001  (the last door: a fault of ours is shown whole, and told from an answer)
        traceback.print_exc()
        complain("this is a fault of the program, not yours; the log of a live session is kept")
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
    for add in (add_listen, add_check, add_demo, add_modes, add_retune, add_ports, add_evaluate):
        add(commands)
    return parser, tuple(commands.choices)


class _Parser(argparse.ArgumentParser):
    def error(self, message: str) -> NoReturn:
        self.exit(BAD_INPUT, f"melodycoach: {message}; see {self.prog} --help\n")
