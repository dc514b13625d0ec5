"""The machine's MIDI, with an rtmidi of our own making; the real one plays in test_midi_port.py.

How python-rtmidi behaves (SystemError is an OSError, a client may be made and then refuse, messages
come as a list of integers and an interval) is from its source, version 1.5.8.
"""

from __future__ import annotations

import os
import subprocess
import sys
import types
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from melodycoach.errors import PortError
from melodycoach.sources import midi_system
from melodycoach.sources.midi_system import (
    QUEUE_LIMIT,
    PortList,
    PortName,
    RtMidiSystem,
    jack_server,
    list_ports,
    load_rtmidi,
    quiet_stderr,
)

if TYPE_CHECKING:
    from collections.abc import Callable

ALSA, CORE, JACK, WINDOWS, DUMMY = 2, 1, 3, 4, 5


class FakeRtMidi(types.ModuleType):
    """Stands for the module; ports and failures are set by the test."""

    API_LINUX_ALSA, API_MACOSX_CORE, API_UNIX_JACK, API_WINDOWS_MM = ALSA, CORE, JACK, WINDOWS

    def __init__(self) -> None:
        super().__init__("rtmidi")
        self.compiled = [ALSA, JACK, DUMMY]
        self.broken: set[int] = set()
        self.deaf: set[int] = set()
        self.refuses = False
        self.inputs: dict[int, list[str]] = {ALSA: [], JACK: []}
        self.outputs: dict[int, list[str]] = {ALSA: [], JACK: []}
        self.alive: list[FakeClient] = []

    def get_compiled_api(self) -> list[int]:
        return self.compiled

    def MidiIn(self, api: int, name: str, queue_size_limit: int) -> FakeClient:  # noqa: N802
        assert queue_size_limit == QUEUE_LIMIT
        return self._make(api, name, self.inputs)

    def MidiOut(self, api: int, name: str) -> FakeClient:  # noqa: N802
        return self._make(api, name, self.outputs)

    def _make(self, api: int, name: str, ports: dict[int, list[str]]) -> FakeClient:
        if api in self.broken:
            os.write(2, b"ALSA lib seq_hw.c: open /dev/snd/seq failed\n")
            raise OSError("error creating client")
        self.alive.append(FakeClient(self, api, name, ports))
        return self.alive[-1]


class FakeClient:
    def __init__(self, module: FakeRtMidi, api: int, name: str, ports: dict[int, list[str]]) -> None:
        self.module, self.api, self.name, self.ports = module, api, name, ports
        self.opened = ""
        self.ignored: dict[str, bool] = {}
        self.queue: list[tuple[list[int], float]] = [([0x90, 69, 64], 0.25)]
        self.sent: list[list[int]] = []

    def get_ports(self) -> list[str]:
        if self.api in self.module.deaf:
            raise RuntimeError("no answer")
        return list(self.ports[self.api])

    def ignore_types(self, **ignored: bool) -> None:
        self.ignored = ignored

    def open_port(self, number: int, name: str) -> None:
        if self.module.refuses:
            raise OSError("resource busy")
        self.opened = self.ports[self.api][number]

    def get_message(self) -> tuple[list[int], float] | None:
        return self.queue.pop(0) if self.queue else None

    def send_message(self, message: list[int]) -> None:
        if self.module.refuses:
            raise OSError("resource busy")
        self.sent.append(message)

    def close_port(self) -> None:
        assert self in self.module.alive
        self.opened = ""

    def delete(self) -> None:
        self.module.alive.remove(self)


@pytest.fixture
def rtmidi(monkeypatch: pytest.MonkeyPatch) -> FakeRtMidi:
    module = FakeRtMidi()
    monkeypatch.setitem(sys.modules, "rtmidi", module)
    monkeypatch.setattr(midi_system, "jack_server", lambda: "1")
    return module


def test_alsa_is_listed_before_jack(rtmidi: FakeRtMidi) -> None:
    rtmidi.inputs = {ALSA: ["Keys 20:0"], JACK: ["a2j:Keys"]}
    rtmidi.outputs = {ALSA: ["Synth 24:0"], JACK: []}
    assert list_ports() == PortList(
        inputs=(PortName("Keys 20:0", "ALSA"), PortName("a2j:Keys", "JACK")),
        outputs=(PortName("Synth 24:0", "ALSA"),),
    )
    assert rtmidi.alive == []


def test_one_system_that_works_is_enough(rtmidi: FakeRtMidi) -> None:
    rtmidi.broken = {ALSA}
    rtmidi.inputs[JACK] = ["kanun:out"]
    assert list_ports() == PortList((PortName("kanun:out", "JACK"),), ())


def test_where_no_system_answers_the_problem_is_said(rtmidi: FakeRtMidi) -> None:
    rtmidi.broken = {ALSA, JACK}
    assert list_ports() == PortList(
        (),
        (),
        "no MIDI: neither ALSA nor JACK answers on this machine; "
        "load ALSA's sequencer (sudo modprobe snd-seq) or start JACK",
    )


def test_an_rtmidi_built_for_nothing_is_said(rtmidi: FakeRtMidi) -> None:
    rtmidi.compiled = [DUMMY]
    assert list_ports().problem.startswith("no MIDI: neither any system that we know answers")


def test_listing_again_makes_no_new_client(rtmidi: FakeRtMidi) -> None:
    system = RtMidiSystem()
    assert system.inputs() == ()
    rtmidi.inputs[ALSA] = ["Keys 20:0"]
    assert system.inputs() == (PortName("Keys 20:0", "ALSA"),)
    assert [client.name for client in rtmidi.alive] == ["melodycoach watch"] * 2
    system.close()
    assert rtmidi.alive == []


def test_a_system_that_starts_later_is_found(rtmidi: FakeRtMidi) -> None:
    rtmidi.broken = {ALSA, JACK}
    system = RtMidiSystem()
    assert system.inputs() == ()
    rtmidi.broken = {ALSA}
    rtmidi.inputs[JACK] = ["kanun:out"]
    assert system.inputs() == (PortName("kanun:out", "JACK"),)
    assert system.problem() == ""


def test_a_system_that_does_not_answer_offers_no_ports(rtmidi: FakeRtMidi) -> None:
    rtmidi.inputs = {ALSA: ["Keys 20:0"], JACK: ["kanun:out"]}
    rtmidi.deaf = {ALSA}
    assert RtMidiSystem().inputs() == (PortName("kanun:out", "JACK"),)


def test_an_input_is_a_client_of_its_own_read_as_a_queue(rtmidi: FakeRtMidi) -> None:
    rtmidi.inputs[ALSA] = ["Pad 24:0", "Keys 20:0"]
    system = RtMidiSystem()
    opened = system.open(PortName("Keys 20:0", "ALSA"))
    [client] = rtmidi.alive
    assert client.opened == "Keys 20:0"
    assert client.ignored == {"sysex": False, "timing": True, "active_sense": True}
    assert opened.read() == (b"\x90\x45\x40", 0.25)
    assert opened.read() is None
    opened.close()
    opened.close()
    assert opened.read() is None
    assert rtmidi.alive == []


def test_an_input_that_has_just_gone_is_a_port_error(rtmidi: FakeRtMidi) -> None:
    system = RtMidiSystem()
    with pytest.raises(PortError) as error:
        system.open(PortName("Keys 20:0", "ALSA"))
    assert str(error.value) == "'Keys 20:0': it has just gone"
    assert rtmidi.alive == []


def test_an_input_that_refuses_is_a_port_error(rtmidi: FakeRtMidi) -> None:
    rtmidi.inputs[ALSA] = ["Keys 20:0"]
    rtmidi.refuses = True
    with pytest.raises(PortError) as error:
        RtMidiSystem().open(PortName("Keys 20:0", "ALSA"))
    assert str(error.value) == "'Keys 20:0': resource busy"
    assert rtmidi.alive == []


def test_a_system_that_has_gone_is_a_port_error(rtmidi: FakeRtMidi) -> None:
    rtmidi.broken = {ALSA}
    with pytest.raises(PortError) as error:
        RtMidiSystem().open(PortName("Keys 20:0", "ALSA"))
    assert str(error.value) == "'Keys 20:0': ALSA does not answer"


def test_clients_of_a_dead_jack_server_are_deleted_before_new_ones_are_made(
    rtmidi: FakeRtMidi, monkeypatch: pytest.MonkeyPatch
) -> None:
    rtmidi.broken = {ALSA}
    rtmidi.inputs[JACK] = ["kanun:out"]
    system = RtMidiSystem()
    [port] = system.inputs()
    opened = system.open(port)
    assert len(rtmidi.alive) == 2
    old = list(rtmidi.alive)
    monkeypatch.setattr(midi_system, "jack_server", lambda: "")
    rtmidi.broken = {ALSA, JACK}
    assert system.inputs() == ()
    assert rtmidi.alive == []
    assert opened.read() is None
    opened.close()
    monkeypatch.setattr(midi_system, "jack_server", lambda: "2")
    rtmidi.broken = {ALSA}
    assert system.inputs() == (port,)
    assert not set(old) & set(rtmidi.alive)


def test_a_jack_server_that_cannot_be_watched_is_trusted(
    rtmidi: FakeRtMidi, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(midi_system, "jack_server", lambda: None)
    rtmidi.inputs[JACK] = ["kanun:out"]
    system = RtMidiSystem()
    assert system.inputs() == system.inputs() == (PortName("kanun:out", "JACK"),)


# without rtmidi


def test_without_rtmidi_the_player_is_told_what_to_install(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(sys.modules, "rtmidi", None)  # the import raises ModuleNotFoundError
    text = "no MIDI: python-rtmidi is not installed; run pip install 'melodycoach[midi]'"
    assert load_rtmidi() == (None, text)
    assert list_ports() == PortList((), (), text)


def test_an_rtmidi_that_lacks_a_library_says_which(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    (tmp_path / "rtmidi.py").write_text(
        "raise ImportError('libasound.so.2: cannot open shared object file')", encoding="utf-8"
    )
    monkeypatch.syspath_prepend(tmp_path)
    monkeypatch.delitem(sys.modules, "rtmidi", raising=False)
    module, problem = load_rtmidi()
    assert module is None
    assert problem == (
        "no MIDI: python-rtmidi does not load (libasound.so.2: cannot open shared object file); "
        "on Linux install libasound2"
    )


# standard error


def test_what_drivers_write_goes_to_the_log(tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    log = tmp_path / "new" / "drivers.log"
    os.write(2, b"before\n")
    with quiet_stderr(log):
        os.write(2, b"ALSA lib: noise\n")
        with midi_system._hushed():  # the log is held, so it gets this too
            os.write(2, b"JACK: noise\n")
    os.write(2, b"after\n")
    assert log.read_text(encoding="utf-8") == "ALSA lib: noise\nJACK: noise\n"
    assert capfd.readouterr().err == "before\nafter\n"


def test_a_log_grows_from_one_session_to_the_next(tmp_path: Path) -> None:
    log = tmp_path / "drivers.log"
    for _ in range(2):
        with quiet_stderr(log):
            os.write(2, b"noise\n")
    assert log.read_text(encoding="utf-8") == "noise\nnoise\n"


@pytest.mark.parametrize("place", [None, Path("/dev/null/drivers.log")])
def test_without_a_log_the_noise_goes_nowhere(place: Path | None, capfd: pytest.CaptureFixture[str]) -> None:
    with quiet_stderr(place):
        os.write(2, b"noise\n")
    assert capfd.readouterr().err == ""


def test_an_error_inside_gives_standard_error_back(capfd: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(ZeroDivisionError), quiet_stderr():
        _ = 1 / 0
    os.write(2, b"back\n")
    assert capfd.readouterr().err == "back\n"


def test_a_driver_that_complains_is_not_heard(rtmidi: FakeRtMidi, capfd: pytest.CaptureFixture[str]) -> None:
    rtmidi.broken = {ALSA, JACK}
    list_ports()
    assert capfd.readouterr().err == ""


def test_a_program_without_a_standard_error_is_no_trouble() -> None:
    code = (
        "import os; os.close(2)\n"
        "from melodycoach.sources.midi_system import quiet_stderr\n"
        "with quiet_stderr(): print('inside')\n"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout == "inside\n"


# the JACK server seen from outside

SOCKETS = """Num       RefCount Protocol Flags    Type St Inode Path
0000000000000000: 00000002 00000000 00010000 0001 01 33871 /dev/shm/jack_studio_{uid}_0
0000000000000000: 00000003 00000000 00000000 0001 03 33594 /dev/shm/jack_studio_{uid}_0
0000000000000000: 00000002 00000000 00010000 0001 01 11111 /dev/shm/jack_default_{uid}_0
0000000000000000: 00000002 00000000 00010000 0001 01 22222
"""


@pytest.mark.skipif(not hasattr(os, "getuid"), reason="no user numbers on this system")
@pytest.mark.parametrize(("name", "found"), [("studio", "33871"), (None, "11111"), ("gone", "")])
def test_the_server_is_known_by_the_socket_that_it_listens_on(
    monkeypatch: pytest.MonkeyPatch, tmp_path: Path, name: str | None, found: str
) -> None:
    sockets = tmp_path / "unix"
    sockets.write_text(SOCKETS.format(uid=os.getuid()), encoding="utf-8")
    monkeypatch.setattr(midi_system, "_UNIX_SOCKETS", sockets)
    monkeypatch.delenv("JACK_DEFAULT_SERVER", raising=False)
    if name:
        monkeypatch.setenv("JACK_DEFAULT_SERVER", name)
    assert jack_server() == found


def test_where_sockets_cannot_be_seen_the_server_is_unknown(
    monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    monkeypatch.setattr(midi_system, "_UNIX_SOCKETS", tmp_path / "none")
    assert jack_server() is None


@pytest.mark.jack
def test_the_machine_lists_what_jack_offers(plug_in: Callable[[str], object]) -> None:
    plug_in("kanun")
    ports = list_ports()
    assert PortName("kanun:out", "JACK") in ports.inputs
    assert ports.problem == ""


@pytest.mark.jack
def test_a_running_server_is_seen_from_outside(jack_server: object) -> None:
    first = midi_system.jack_server()
    assert first
    jack_server.stop()
    assert midi_system.jack_server() == ""
    jack_server.start()
    assert midi_system.jack_server() not in ("", first)


# outputs


def test_what_is_sent_goes_to_the_output_of_that_name(rtmidi: FakeRtMidi) -> None:
    rtmidi.outputs[ALSA] = ["Pad 20:0", "Synth 24:0"]
    system = RtMidiSystem()
    output = system.open_output(PortName("Synth 24:0", "ALSA"))
    output.send(bytes.fromhex("90 45 40"))
    [client] = rtmidi.alive
    assert (client.opened, client.sent) == ("Synth 24:0", [[0x90, 0x45, 0x40]])
    output.close()
    output.close()
    assert rtmidi.alive == []
    with pytest.raises(PortError) as error:
        output.send(b"\xf8")
    assert str(error.value) == "'Synth 24:0': it is closed"


def test_a_message_that_the_system_refuses_is_said(rtmidi: FakeRtMidi) -> None:
    rtmidi.outputs[ALSA] = ["Synth 24:0"]
    output = RtMidiSystem().open_output(PortName("Synth 24:0", "ALSA"))
    rtmidi.refuses = True
    with pytest.raises(PortError) as error:
        output.send(b"\xf8")
    assert str(error.value) == "'Synth 24:0': resource busy"


@pytest.mark.parametrize(
    ("spoil", "reason"),
    [
        (lambda module: module.outputs[ALSA].clear(), "it has just gone"),
        (lambda module: setattr(module, "refuses", True), "resource busy"),
        (lambda module: module.broken.add(ALSA), "ALSA does not answer"),
        (lambda module: module.deaf.add(ALSA), "no answer"),
    ],
)
def test_an_output_that_does_not_open_is_refused_and_let_go(
    rtmidi: FakeRtMidi, spoil: Callable[[FakeRtMidi], None], reason: str
) -> None:
    rtmidi.outputs[ALSA] = ["Synth 24:0"]
    system = RtMidiSystem()
    spoil(rtmidi)
    with pytest.raises(PortError) as error:
        system.open_output(PortName("Synth 24:0", "ALSA"))
    assert str(error.value) == f"'Synth 24:0': {reason}"
    assert rtmidi.alive == []


def test_an_output_of_a_dead_jack_server_is_let_go_before_a_new_client_is_made(
    rtmidi: FakeRtMidi, monkeypatch: pytest.MonkeyPatch
) -> None:
    rtmidi.outputs[JACK] = ["synth:in"]
    system = RtMidiSystem()
    output = system.open_output(PortName("synth:in", "JACK"))
    monkeypatch.setattr(midi_system, "jack_server", lambda: "2")
    [old] = rtmidi.alive
    system.open_output(PortName("synth:in", "JACK"))
    assert old not in rtmidi.alive
    with pytest.raises(PortError):
        output.send(b"\xf8")
