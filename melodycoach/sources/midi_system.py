"""The machine's MIDI: which ports there are, and how one is opened. All of python-rtmidi is here.

python-rtmidi is loaded when it is first needed, so the rest of the program works without it.
Inputs are read as queues and never through a callback: closing a port under a callback crashes.

The rules for JACK, each found the hard way: a closed input cannot be opened again, so each opening
makes a new one; when the server dies its clients notice nothing, and once a new client has been
made after that, touching an old one crashes. So the server is watched from outside, and all
clients of a dead one are deleted before a new one is made.
"""

from __future__ import annotations

import contextlib
import os
import sys
import time
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any, Protocol

from melodycoach.errors import PortError

if TYPE_CHECKING:
    from collections.abc import Iterator

CLIENT_NAME = "melodycoach"
"""How this program's own ports begin, so that it never listens to itself."""

QUEUE_LIMIT = 8192
"""Messages that an input keeps between two readings; rtmidi drops the newest beyond it."""

LEAVE_S = 0.1
"""How long an output stays open after the last message, so that the system can carry it off."""

_UNIX_SOCKETS = Path("/proc/net/unix")
_LISTENS = "00010000"
_FAILURES = (OSError, ValueError, RuntimeError)  # what rtmidi's errors are


@dataclass(frozen=True, slots=True)
class PortName:
    """One port: its full name, and the system that offers it (``ALSA``, ``JACK``, …)."""

    name: str
    system: str


@dataclass(frozen=True, slots=True)
class PortList:
    """All ports of the machine; ``problem`` is empty or says why there can be none."""

    inputs: tuple[PortName, ...]
    outputs: tuple[PortName, ...]
    problem: str = ""


class MidiInput(Protocol):
    """An open input."""

    def read(self) -> tuple[bytes, float] | None:
        """Take the oldest waiting message and the seconds since the one before it; None if none waits."""

    def close(self) -> None:
        """Close it; a second call does nothing, and reading gives None from then on."""


class MidiOutput(Protocol):
    """An open output."""

    def send(self, message: bytes) -> None:
        """Send one whole message; `PortError` if it is closed or cannot be sent."""

    def close(self) -> None:
        """Close it when what was sent has left; a second call does nothing."""


class MidiSystem(Protocol):
    """What a live port needs of the machine; tests give one of their own."""

    def problem(self) -> str:
        """Say why there can be no ports at all, or nothing."""

    def inputs(self) -> tuple[PortName, ...]:
        """List the inputs that exist now."""

    def open(self, port: PortName) -> MidiInput:
        """Open an input; `PortError` if it is gone or refuses."""

    def close(self) -> None:
        """Let go of everything."""


_n_held = 0


@contextlib.contextmanager
def quiet_stderr(log_path: Path | None = None) -> Iterator[None]:
    """Send file descriptor 2 to a log file, or to nowhere, for as long as the context lasts.

    libasound, libjack and RtMidi write there from C, at any time, past ``sys.stderr``. The full
    screen holds this open. A log that cannot be opened means nowhere; never an error.
    """
    global _n_held
    with contextlib.suppress(AttributeError, OSError, ValueError):
        sys.stderr.flush()
    try:
        saved = os.dup(2)
    except OSError:  # started without a standard error: there is nothing to protect
        yield
        return
    target = _open_log(log_path)
    os.dup2(target, 2)
    os.close(target)
    _n_held += 1
    try:
        yield
    finally:
        _n_held -= 1
        with contextlib.suppress(AttributeError, OSError, ValueError):
            sys.stderr.flush()
        os.dup2(saved, 2)
        os.close(saved)


def _open_log(log_path: Path | None) -> int:
    if log_path is not None:
        with contextlib.suppress(OSError):
            log_path.parent.mkdir(parents=True, exist_ok=True)
            return os.open(log_path, os.O_WRONLY | os.O_CREAT | os.O_APPEND, 0o600)
    return os.open(os.devnull, os.O_WRONLY)


def _hushed() -> contextlib.AbstractContextManager[None]:
    """Keep a call into a driver quiet; where a log is held open already, let it write there."""
    return contextlib.nullcontext() if _n_held else quiet_stderr()


def load_rtmidi() -> tuple[Any, str]:
    """Give python-rtmidi, or None and a sentence that says what to install."""
    try:
        import rtmidi
    except ModuleNotFoundError:
        return None, "no MIDI: python-rtmidi is not installed; run pip install 'melodycoach[midi]'"
    except ImportError as error:  # a library that it needs is missing
        return None, f"no MIDI: python-rtmidi does not load ({error}); on Linux install libasound2"
    return rtmidi, ""


def jack_server() -> str | None:
    """Tell one run of the JACK server from the next, from outside.

    Returns
    -------
    str or None
        The identity of the socket that the server listens on; empty when none listens; None where
        this system cannot tell.
    """
    try:
        lines = _UNIX_SOCKETS.read_text(errors="replace").splitlines()
    except OSError:  # not Linux
        return None
    ending = f"/jack_{os.environ.get('JACK_DEFAULT_SERVER', 'default')}_{os.getuid()}_0"
    found = (line.split(maxsplit=7) for line in lines if line.endswith(ending))
    return ",".join(sorted(fields[6] for fields in found if fields[3] == _LISTENS))


def _delete(client: Any) -> None:
    with _hushed():
        client.delete()


class _QueuedInput:
    """An rtmidi input read as a queue."""

    def __init__(self, midi_in: Any) -> None:
        self._midi_in: Any = midi_in

    def read(self) -> tuple[bytes, float] | None:
        if self._midi_in is None:
            return None
        found = self._midi_in.get_message()
        return None if found is None else (bytes(found[0]), found[1])

    def close(self) -> None:
        midi_in, self._midi_in = self._midi_in, None
        if midi_in is not None:
            with _hushed():
                midi_in.close_port()
                midi_in.delete()


class _Output:
    """An rtmidi output. Sending on a closed one would crash, so it is asked of nobody."""

    def __init__(self, midi_out: Any, name: str) -> None:
        self._midi_out: Any = midi_out
        self._name = name

    def send(self, message: bytes) -> None:
        if self._midi_out is None:
            raise PortError(f"{self._name!r}: it is closed")
        try:
            with _hushed():
                self._midi_out.send_message(list(message))
        except _FAILURES as error:
            raise PortError(f"{self._name!r}: {error}") from error

    def close(self) -> None:
        midi_out, self._midi_out = self._midi_out, None
        if midi_out is not None:
            with _hushed():
                time.sleep(LEAVE_S)
                midi_out.close_port()
                midi_out.delete()


class RtMidiSystem:
    """Every MIDI system that python-rtmidi was built for and that works here.

    It keeps one spare client for each system, which lists ports and is never opened. An instance,
    its inputs and its outputs belong to one thread.
    """

    def __init__(self) -> None:
        self._rtmidi, self._missing = load_rtmidi()
        self._api_by_system: dict[str, int] = {}
        self._spare_by_system: dict[str, Any] = {}
        self._open_in_jack: list[_QueuedInput | _Output] = []
        self._jack_server: str | None = None
        if self._rtmidi is not None:
            shown = {
                self._rtmidi.API_LINUX_ALSA: "ALSA",
                self._rtmidi.API_UNIX_JACK: "JACK",
                self._rtmidi.API_MACOSX_CORE: "CoreMIDI",
                self._rtmidi.API_WINDOWS_MM: "Windows",
            }
            for api in self._rtmidi.get_compiled_api():
                if api in shown:
                    self._api_by_system[shown[api]] = api

    def problem(self) -> str:
        """Say why there can be no ports at all, or nothing."""
        if self._missing or self._spare_by_system:
            return self._missing
        tried = " nor ".join(self._api_by_system) or "any system that we know"
        return (
            f"no MIDI: neither {tried} answers on this machine; "
            "load ALSA's sequencer (sudo modprobe snd-seq) or start JACK"
        )

    def inputs(self) -> tuple[PortName, ...]:
        """List the inputs that exist now, in the order of the systems: ALSA before JACK."""
        self._let_go_of_dead_jack()
        found = []
        for system in self._api_by_system:
            spare = self._spare_by_system.get(system)
            if spare is None:
                spare = self._client(system, f"{CLIENT_NAME} watch")
                if spare is None:
                    continue
                self._spare_by_system[system] = spare
                self._watch_jack(system)
            with _hushed(), contextlib.suppress(*_FAILURES):
                found += [PortName(name, system) for name in spare.get_ports()]
        return tuple(found)

    def outputs(self) -> tuple[PortName, ...]:
        """List the outputs that exist now."""
        self._let_go_of_dead_jack()
        found = []
        for system, api in self._api_by_system.items():
            with _hushed():
                try:
                    client = self._rtmidi.MidiOut(api, name=f"{CLIENT_NAME} list")
                except _FAILURES:
                    continue
                found += [PortName(name, system) for name in client.get_ports()]
                client.delete()
        return tuple(found)

    def open(self, port: PortName) -> MidiInput:
        """Open an input with a client of its own.

        Raises
        ------
        PortError
            It is gone, or the system refuses.
        """
        self._let_go_of_dead_jack()
        client = self._client(port.system, CLIENT_NAME)
        if client is None:
            raise PortError(f"{port.name!r}: {port.system} does not answer")
        try:
            client.ignore_types(sysex=False, timing=True, active_sense=True)
            with _hushed():
                names = client.get_ports()
                if port.name in names:
                    client.open_port(names.index(port.name), name="in")
        except _FAILURES as error:
            _delete(client)
            raise PortError(f"{port.name!r}: {error}") from error
        if port.name not in names:
            _delete(client)
            raise PortError(f"{port.name!r}: it has just gone")
        opened = _QueuedInput(client)
        if port.system == "JACK":
            self._open_in_jack.append(opened)
        return opened

    def open_output(self, port: PortName) -> MidiOutput:
        """Open an output with a client of its own.

        Raises
        ------
        PortError
            It is gone, or the system refuses.
        """
        self._let_go_of_dead_jack()
        with _hushed():
            try:
                client = self._rtmidi.MidiOut(self._api_by_system[port.system], name=CLIENT_NAME)
            except _FAILURES as error:
                raise PortError(f"{port.name!r}: {port.system} does not answer") from error
        self._watch_jack(port.system)
        try:
            with _hushed():
                names = client.get_ports()
                if port.name in names:
                    client.open_port(names.index(port.name), name="out")
        except _FAILURES as error:
            _delete(client)
            raise PortError(f"{port.name!r}: {error}") from error
        if port.name not in names:
            _delete(client)
            raise PortError(f"{port.name!r}: it has just gone")
        opened = _Output(client, port.name)
        if port.system == "JACK":
            self._open_in_jack.append(opened)
        return opened

    def close(self) -> None:
        """Delete the spare clients. Inputs and outputs are closed by whoever opened them."""
        for spare in self._spare_by_system.values():
            _delete(spare)
        self._spare_by_system.clear()

    def _client(self, system: str, name: str) -> Any:
        with _hushed():
            try:
                api = self._api_by_system[system]
                return self._rtmidi.MidiIn(api, name=name, queue_size_limit=QUEUE_LIMIT)
            except _FAILURES:  # no sequencer, no server
                return None

    def _watch_jack(self, system: str) -> None:
        """Remember which run of the server a client that was just made belongs to."""
        if system == "JACK" and self._jack_server is None:
            self._jack_server = jack_server() or None

    def _let_go_of_dead_jack(self) -> None:
        if self._jack_server is None or jack_server() == self._jack_server:
            return
        self._jack_server = None
        for opened in self._open_in_jack:
            opened.close()
        self._open_in_jack.clear()
        spare = self._spare_by_system.pop("JACK", None)
        if spare is not None:
            _delete(spare)


def list_ports() -> PortList:
    """List every input and output of the machine, once."""
    system = RtMidiSystem()
    try:
        inputs = system.inputs()
        return PortList(inputs, system.outputs(), system.problem())
    finally:
        system.close()
