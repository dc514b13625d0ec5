"""`melodycoach ports`: the MIDI inputs and outputs of this machine."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from melodycoach.commands.exit_codes import DONE
from melodycoach.commands.options import add_json, new_command
from melodycoach.commands.printing import print_result

if TYPE_CHECKING:
    import argparse


def add_ports(commands: Any) -> None:
    """Add the command."""
    says = "list the MIDI inputs and outputs, and what to do when there are none"
    add_json(new_command(commands, "ports", _run, says, "ports"))


def _run(options: argparse.Namespace) -> int:
    from melodycoach.app import ports
    from melodycoach.report.ports import ports_text

    found = ports()
    print_result(options.json, found, lambda: ports_text(found))
    return DONE
