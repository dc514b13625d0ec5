"""`melodycoach evaluate`: how well the modes of a labelled collection are named."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

from melodycoach.commands.exit_codes import DONE
from melodycoach.commands.options import (
    add_json,
    add_only,
    add_pack,
    count,
    load_named_pack,
    names,
    new_command,
)
from melodycoach.commands.printing import Progress, columns, print_result

if TYPE_CHECKING:
    import argparse


def add_evaluate(commands: Any) -> None:
    """Add the command."""
    says = "measure how well the modes of a labelled collection are named"
    example = "evaluate collection.jsonl.gz --only rast,mahur,ussak --json"
    command = new_command(commands, "evaluate", _run, says, example)
    command.add_argument("collection", metavar="COLLECTION", help="JSON lines, gzipped or not")
    add_pack(command)
    add_only(command)
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
    command.add_argument("--seams", type=count, default=0, metavar="N", help="also splice N pairs")
    command.add_argument(
        "--owed", type=count, default=0, metavar="N", help="also try owed steps on N melodies"
    )
    command.add_argument("--seed", type=int, default=1, metavar="N", help="of random choices (default: 1)")
    command.add_argument("--strict", action="store_true", help="stop at the first bad record")
    add_json(command)


def _run(options: argparse.Namespace) -> int:
    from melodycoach.core.event import PitchReading
    from melodycoach.core.note import InputKind
    from melodycoach.measure import evaluate_collection
    from melodycoach.report.evaluation import evaluation_json, evaluation_text

    progress = Progress()
    evaluation = evaluate_collection(
        Path(options.collection),
        load_named_pack(options.pack),
        names(options.only),
        PitchReading(options.reading),
        InputKind(options.input),
        strict=options.strict,
        on_fault=progress.complain,
        progress=progress.melodies,
        seams=options.seams,
        owed=options.owed,
        seed=options.seed,
    )
    progress.clear()
    print_result(options.json, evaluation_json(evaluation), lambda: evaluation_text(evaluation, columns()))
    return DONE
