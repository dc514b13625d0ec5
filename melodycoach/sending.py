"""Messages on their way out: an output found by a part of its name, opened, told, and closed."""

from __future__ import annotations

from typing import TYPE_CHECKING

from melodycoach.errors import PortError
from melodycoach.sources.midi_port import find_port
from melodycoach.sources.midi_system import RtMidiSystem

if TYPE_CHECKING:
    from collections.abc import Iterable


def send_to(wanted: str, messages: Iterable[bytes]) -> str:
    """Send messages to the one output that a name or a part of one means; give its whole name.

    Raises
    ------
    PortError
        This machine has no MIDI, none or several outputs fit, or the output refuses.
    """
    system = RtMidiSystem()
    try:
        outputs = system.outputs()
        if not outputs:
            system.inputs()  # what works at all is known when both have been looked for
        if not outputs and system.problem():
            raise PortError(f"output {wanted!r}: {system.problem()}")
        port = find_port(outputs, wanted, "output")
        output = system.open_output(port)
        try:
            for message in messages:
                output.send(message)
        finally:
            output.close()
        return port.name
    finally:
        system.close()
