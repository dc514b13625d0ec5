"""`melodycoach modes`: the modes of a pack, one of them, or whether a pack can be used."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

from melodycoach.commands.exit_codes import DONE
from melodycoach.commands.options import add_json, add_pack, load_named_pack, new_command
from melodycoach.commands.printing import columns, complain, print_result

if TYPE_CHECKING:
    import argparse


def add_modes(commands: Any) -> None:
    """Add the command."""
    says = "list the modes, or say what one of them is made of"
    command = new_command(commands, "modes", _run, says, "modes huseyni")
    command.add_argument("mode", nargs="?", metavar="MODE", help="one mode, in any spelling")
    add_pack(command)
    command.add_argument("--check", metavar="FILE", help="say whether a mode pack of yours can be used")
    add_json(command)


def _run(options: argparse.Namespace) -> int:
    from melodycoach.report.modes import mode_json, mode_text, modes_json, modes_text
    from melodycoach.sources.pack_file import read_pack

    if options.check:
        checked = read_pack(Path(options.check))
        print(f"{options.check}: pack {checked.id!r} with {len(checked.modes)} modes can be used")
        return DONE
    pack = load_named_pack(options.pack)
    if options.mode:
        mode = pack.find(options.mode)
        print_result(options.json, mode_json(pack, mode), lambda: mode_text(pack, mode, columns()))
    else:
        print_result(options.json, modes_json(pack), lambda: modes_text(pack, columns()))
        _name_other_packs(options.pack, options.json)
    return DONE


def _name_other_packs(in_use: str, as_json: bool) -> None:
    """Say which packs there are beside the one that was listed, and which of them are damaged."""
    from melodycoach.core.pitch import fold_name
    from melodycoach.folders import user_pack_dir
    from melodycoach.sources.pack_file import find_packs, list_packs

    folder = user_pack_dir()
    if {fold_name(name) for name in find_packs(folder)} <= {fold_name(in_use)}:
        return
    for entry in list_packs(folder):
        if entry.pack is None:
            count = "1 fault" if len(entry.faults) == 1 else f"{len(entry.faults)} faults"
            complain(
                f"pack {entry.name!r} cannot be used, {count}; see melodycoach modes --check {entry.path}"
            )
        elif not as_json and fold_name(entry.name) != fold_name(in_use):
            print(f"Another pack: {entry.pack.name}: melodycoach modes --pack {entry.name}")
