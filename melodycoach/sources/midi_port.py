"""A live port: found by name, watched, reopened when it comes back, and read without losing time.

One thread owns a `LivePort` and calls `poll` every millisecond or so. Nothing here raises while
the player plays: what happens to the port is in its `status`, and `port_sentence` puts it in words.
"""

from __future__ import annotations

import re
import sys
from dataclasses import dataclass
from enum import StrEnum
from typing import TYPE_CHECKING

from melodycoach.errors import PortError, nearest_names
from melodycoach.sources.midi_system import CLIENT_NAME, QUEUE_LIMIT, MidiSystem, PortName, RtMidiSystem

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from melodycoach.sources.midi_system import MidiInput

WATCH_EVERY_S = 1.0
"""How often the list of ports is read."""

BATCH = QUEUE_LIMIT
"""At most so many messages are handed over at once, so that a flood cannot stop the rest."""

SLACK_S = 0.02
"""A message may be stamped so much earlier than it could be read."""

_ALSA_NUMBER = re.compile(r"\s+\d+:\d+$")
_WINDOWS_NUMBER = re.compile(r"\s+\d+$")


class PortState(StrEnum):
    """What the listener has to do with a port now."""

    OPEN = "open"
    LOST = "lost"
    ABSENT = "absent"
    SEVERAL = "several"
    REFUSED = "refused"
    UNAVAILABLE = "unavailable"


@dataclass(frozen=True, slots=True)
class PortStatus:
    """The state of a live port.

    Parameters
    ----------
    state
        ``OPEN``: notes come in. ``LOST``: it was open and has gone. ``ABSENT``: none is there, or
        none of the wanted name. ``SEVERAL``: the player has to choose. ``REFUSED``: it is there
        but does not open. ``UNAVAILABLE``: this machine or installation has no MIDI.
    name
        The port that is open, lost or refused.
    wanted
        The name asked for, if any.
    choices
        The other inputs that could be chosen.
    reason
        For ``REFUSED`` and ``UNAVAILABLE``.
    """

    state: PortState
    name: str = ""
    wanted: str = ""
    choices: tuple[str, ...] = ()
    reason: str = ""


def port_sentence(status: PortStatus) -> str:
    """Put a status in a musician's words.

    >>> port_sentence(PortStatus(PortState.LOST, "USB Keys"))
    'USB Keys has gone; plug it in again and it goes on by itself'
    """
    choices = ", ".join(status.choices)
    match status.state:
        case PortState.OPEN:
            return f"listening to {status.name}"
        case PortState.LOST:
            instead = f"; or choose {choices}" if choices else ""
            return f"{status.name} has gone; plug it in again and it goes on by itself{instead}"
        case PortState.ABSENT if status.wanted:
            there = f"there is: {choices}" if choices else "there is none at all"
            return f"no keyboard {status.wanted!r} yet, {there}; it is taken as soon as it appears"
        case PortState.ABSENT:
            return "no keyboard found; type notes, or plug one in at any time"
        case PortState.SEVERAL:
            return f"several keyboards: {choices}; choose one with F6, or start with --port"
        case PortState.REFUSED:
            return f"{status.name} does not open ({status.reason}); another program may hold it; trying on"
        case PortState.UNAVAILABLE:
            return status.reason


def stable_name(name: str, platform: str = sys.platform) -> str:
    """Drop what changes when a keyboard is unplugged and comes back.

    ALSA ends a name in client and port number, Windows in the place in its list.

    >>> stable_name("USB Keys:USB Keys MIDI 1 20:0")
    'USB Keys:USB Keys MIDI 1'
    >>> stable_name("USB Keys 3", platform="win32")
    'USB Keys'
    """
    name = _ALSA_NUMBER.sub("", name)
    return _WINDOWS_NUMBER.sub("", name) if platform == "win32" else name


def is_keyboard(port: PortName) -> bool:
    """Tell a port that may be opened unasked from our own and from the system's loop-back.

    >>> is_keyboard(PortName("Midi Through:Midi Through Port-0 14:0", "ALSA"))
    False
    """
    name = port.name.casefold()
    return not name.startswith(CLIENT_NAME) and "midi through" not in name


def matching_ports(ports: Sequence[PortName], wanted: str) -> tuple[PortName, ...]:
    """Give the ports that a name or a part of one can mean.

    A whole name beats a part, with or without the number at its end; letter case does not count.
    Where one keyboard is offered by two systems, the first one counts.
    """
    words = wanted.casefold()
    for system in dict.fromkeys(port.system for port in ports):
        here = [port for port in ports if port.system == system]
        exact = [port for port in here if port.name.casefold() == words]
        stable = [port for port in here if stable_name(port.name).casefold() == words]
        part = [port for port in here if words in port.name.casefold()]
        if found := exact[:1] or stable[:1] or part:
            return tuple(found)
    return ()


def find_port(ports: Sequence[PortName], wanted: str, kind: str = "input") -> PortName:
    """Find the one input, or output as ``kind`` says, that a name or a part of one means.

    Raises
    ------
    PortError
        None fits, with the nearest names; or several do, with all of them.

    Examples
    --------
    >>> keys = PortName("USB Keys:USB Keys MIDI 1 20:0", "ALSA")
    >>> find_port([keys, PortName("Pad 24:0", "ALSA")], "usb") == keys
    True
    """
    found = matching_ports(ports, wanted)
    if len(found) == 1:
        return found[0]
    if found:
        names = ", ".join(repr(port.name) for port in found)
        raise PortError(f"MIDI {kind} {wanted!r} fits {names}; give more of the name")
    if not ports:
        raise PortError(f"no MIDI {kind} {wanted!r}: there is none at all; run melodycoach ports")
    hint = nearest_names(wanted, [port.name for port in ports])
    raise PortError(f"no MIDI {kind} {wanted!r}; {hint}; run melodycoach ports")


class LivePort:
    """One MIDI input, whatever happens to it.

    Nothing is opened before the first `poll`. Without a wanted name the only keyboard there is
    gets opened; with several the player is asked (`choose`); with none the first that appears is
    taken. A lost one is waited for by name and opened again, with a new client. ``n_openings``
    counts how often a port was opened, ``n_overflows`` how often so much came at once that notes may
    be missing.

    Parameters
    ----------
    clock
        Gives seconds on the scale that messages are to be stamped in.
    wanted
        Name of the input, or a part of it.
    system
        Where ports come from; by default the machine's.
    """

    def __init__(
        self, clock: Callable[[], float], wanted: str = "", system: MidiSystem | None = None
    ) -> None:
        self.n_overflows = 0
        self.n_openings = 0
        self._clock = clock
        self._wanted = wanted
        self._system: MidiSystem = RtMidiSystem() if system is None else system
        self._status = PortStatus(PortState.ABSENT, wanted=wanted)
        self._port: PortName | None = None  # the one that is open, or that is waited for
        self._input: MidiInput | None = None
        self._inputs: tuple[PortName, ...] = ()
        self._watch_at_s: float | None = None
        self._empty_at_s = clock()
        self._last_at_s: float | None = None

    @property
    def status(self) -> PortStatus:
        """What the port is doing now; compare with the last one to see that it changed."""
        return self._status

    @property
    def inputs(self) -> tuple[PortName, ...]:
        """The inputs that there were when the list was last read; any thread may look."""
        return self._inputs

    def poll(self) -> list[tuple[bytes, float]]:
        """Give the messages since the last call, oldest first, each with its time; watch the port.

        The messages are all of one opening. When the status turns from ``OPEN`` to another, or
        `n_openings` has grown, keys may be left sounding: decode what came, then tell the tracker
        to start over.
        """
        messages = self._read()
        now_s = self._clock()
        if self._watch_at_s is None or now_s >= self._watch_at_s:
            self._watch_at_s = now_s + WATCH_EVERY_S
            self._watch()
        return messages

    def choose(self, name: str) -> None:
        """Listen to this input from the next `poll` on: a whole name or a part of one."""
        self._drop()
        self._wanted = name
        self._port = None
        self._watch_at_s = None

    def close(self) -> None:
        """Close the port and let go of the system; a second call does nothing."""
        self._drop()
        self._system.close()

    def _read(self) -> list[tuple[bytes, float]]:
        if self._input is None:
            return []
        began_s = self._clock()
        found: list[tuple[bytes, float]] = []
        for _ in range(BATCH):
            message = self._input.read()
            if message is None:
                break
            found.append(message)
        if not found:
            self._empty_at_s = began_s
            return []
        if len(found) >= QUEUE_LIMIT - 1:
            self.n_overflows += 1
        return self._stamp(found, began_s)

    def _stamp(self, found: list[tuple[bytes, float]], began_s: float) -> list[tuple[bytes, float]]:
        """Turn the driver's intervals into times: never later than now, never before the queue was empty.

        The driver measures intervals well but has another origin, and may drift.
        """
        now_s = self._clock()
        earliest_s = self._empty_at_s - SLACK_S
        last_s = self._last_at_s
        stamped = []
        for message, interval_s in found:
            at_s = now_s if last_s is None else max(last_s, min(max(last_s + interval_s, earliest_s), now_s))
            stamped.append((message, at_s))
            last_s = at_s
        self._last_at_s = last_s
        if len(found) < BATCH:
            self._empty_at_s = began_s
        return stamped

    def _watch(self) -> None:
        ports = self._inputs = self._system.inputs()
        if self._input is not None:
            if self._port in ports:
                return
            self._drop()
        if self._port is not None:
            self._wait_for(self._port, ports)
        else:
            self._look(ports)

    def _wait_for(self, lost: PortName, ports: Sequence[PortName]) -> None:
        for port in ports:
            if port.system == lost.system and stable_name(port.name) == stable_name(lost.name):
                self._open(port)
                return
        others = tuple(port.name for port in ports if is_keyboard(port))
        self._status = PortStatus(PortState.LOST, lost.name, self._wanted, others)

    def _look(self, ports: Sequence[PortName]) -> None:
        keyboards = [port for port in ports if is_keyboard(port)]
        if self._wanted:
            found = matching_ports(ports, self._wanted)
        else:
            found = tuple(port for port in keyboards if port.system == keyboards[0].system)
        if len(found) == 1:
            self._open(found[0])
            return
        problem = "" if ports else self._system.problem()
        if problem:
            self._status = PortStatus(PortState.UNAVAILABLE, wanted=self._wanted, reason=problem)
            return
        state = PortState.SEVERAL if found else PortState.ABSENT
        choices = tuple(port.name for port in (found or keyboards))
        self._status = PortStatus(state, wanted=self._wanted, choices=choices)

    def _open(self, port: PortName) -> None:
        try:
            self._input = self._system.open(port)
        except PortError as error:
            self._status = PortStatus(PortState.REFUSED, port.name, self._wanted, reason=str(error))
            return
        self._port = port
        self.n_openings += 1
        self._last_at_s = None
        self._empty_at_s = self._clock()
        self._status = PortStatus(PortState.OPEN, port.name, self._wanted)

    def _drop(self) -> None:
        if self._input is not None:
            self._input.close()
            self._input = None
