"""An output found by a part of its name; a real one is met in the `jack` test of commands/test_retune.py."""

from __future__ import annotations

import pytest

from melodycoach import sending
from melodycoach.errors import PortError
from melodycoach.sending import send_to
from melodycoach.sources.midi_system import PortName


class Output:
    def __init__(self, machine: Machine) -> None:
        self._machine = machine

    def send(self, message: bytes) -> None:
        if message == b"\xff":
            raise PortError("'Synth 24:0': resource busy")
        self._machine.sent.append(message)

    def close(self) -> None:
        self._machine.closed.append("output")


class Machine:
    """A machine with these outputs."""

    def __init__(self, *names: str, problem: str = "") -> None:
        self.names, self._problem = names, problem
        self.sent: list[bytes] = []
        self.closed: list[str] = []
        self.opened: list[PortName] = []

    def problem(self) -> str:
        return self._problem

    def inputs(self) -> tuple[PortName, ...]:
        return ()

    def outputs(self) -> tuple[PortName, ...]:
        return tuple(PortName(name, "ALSA") for name in self.names)

    def open_output(self, port: PortName) -> Output:
        self.opened.append(port)
        return Output(self)

    def close(self) -> None:
        self.closed.append("system")


def on(monkeypatch: pytest.MonkeyPatch, machine: Machine) -> Machine:
    monkeypatch.setattr(sending, "RtMidiSystem", lambda: machine)
    return machine


def test_a_part_of_the_name_finds_the_output_and_all_is_closed(monkeypatch: pytest.MonkeyPatch) -> None:
    machine = on(monkeypatch, Machine("Pad 20:0", "Synth 24:0"))
    assert send_to("synth", [b"\x90\x45\x40", b"\x80\x45\x00"]) == "Synth 24:0"
    assert machine.opened == [PortName("Synth 24:0", "ALSA")]
    assert machine.sent == [b"\x90\x45\x40", b"\x80\x45\x00"]
    assert machine.closed == ["output", "system"]


@pytest.mark.parametrize(
    ("machine", "said"),
    [
        (Machine(problem="no MIDI: nothing answers"), "output 'synth': no MIDI: nothing answers"),
        (Machine(), "no MIDI output 'synth': there is none at all; run melodycoach ports"),
        (Machine("Sinth"), "no MIDI output 'synth'; did you mean 'Sinth'?; run melodycoach ports"),
        (
            Machine("Synth A", "Synth B"),
            "MIDI output 'synth' fits 'Synth A', 'Synth B'; give more of the name",
        ),
    ],
)
def test_an_output_that_is_not_there_is_refused_in_words(
    machine: Machine, said: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    on(monkeypatch, machine)
    with pytest.raises(PortError) as error:
        send_to("synth", [b"\x90\x45\x40"])
    assert str(error.value) == said
    assert machine.closed == ["system"]


def test_an_output_that_fails_half_way_is_closed(monkeypatch: pytest.MonkeyPatch) -> None:
    machine = on(monkeypatch, Machine("Synth 24:0"))
    with pytest.raises(PortError):
        send_to("synth", [b"\x90\x45\x40", b"\xff", b"\x80\x45\x00"])
    assert machine.sent == [b"\x90\x45\x40"]
    assert machine.closed == ["output", "system"]
