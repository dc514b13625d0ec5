"""What can play into a session: a keyboard, the guided demo, a recorded log.

Each is a `Player`: asked for the events since the last time, it gives them in
order, and it says in a sentence what is being listened to.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Protocol

from melodycoach.demo import DemoPlayer
from melodycoach.errors import PortError
from melodycoach.sources.midi_pitch import PitchTracker
from melodycoach.sources.midi_port import LivePort, PortState, PortStatus, port_sentence
from melodycoach.tuning_words import tuning_sentence

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence
    from pathlib import Path

    from melodycoach.core.event import Event
    from melodycoach.core.pitch import PitchNames
    from melodycoach.sources.event_log import RecordedLog
    from melodycoach.sources.keyboard_profile import KeyboardProfile
    from melodycoach.sources.midi_system import MidiSystem


class Player(Protocol):
    """Something that plays into the session: a keyboard, the demo, a recorded log."""

    def poll(self, now_s: float) -> Sequence[Event]:
        """Give the events since the last call, in order."""

    def input_line(self, now_s: float) -> str:
        """Say in a sentence what is being listened to."""

    def tuning_line(self) -> str:
        """Say in a sentence which tuning is believed, and why."""

    def inputs(self) -> tuple[str, ...]:
        """Name the inputs that can be listened to; any thread may ask."""

    def asks_input(self) -> bool:
        """Whether there are several inputs, and the player has to say which one."""

    def choose(self, name: str) -> None:
        """Listen to the input of this name, or to a part of it."""

    def is_over(self, now_s: float) -> bool:
        """Whether nothing more will come by itself."""

    def close(self) -> None:
        """Let go of everything."""


class Keyboard:
    """A live port and the tracker that reads its bytes.

    Parameters
    ----------
    clock
        Seconds from the start of the session.
    wanted
        Name of the input, or a part of it; empty: the only one there is.
    system
        Where ports come from; by default the machine's.
    profile
        What the player says of the keyboard.
    """

    def __init__(
        self,
        clock: Callable[[], float],
        wanted: str = "",
        system: MidiSystem | None = None,
        profile: KeyboardProfile | None = None,
    ) -> None:
        self.port = LivePort(clock, wanted, system)
        self._profile = profile
        self._tracker = PitchTracker() if profile is None else profile.tracker()
        self._tuning_line = tuning_sentence(self._tracker, profile)
        self._has_played = False
        self._opening = (0, False)

    def poll(self, now_s: float) -> Sequence[Event]:
        """Give what has been played since the last call."""
        events: list[Event] = []
        messages = self.port.poll()
        for message, at_s in messages:
            events += self._tracker.decode(message, at_s)
        opening = (self.port.n_openings, self.port.status.state is PortState.OPEN)
        if opening != self._opening:
            events += self._tracker.start_over(now_s)  # no note-off comes from a port that has gone
        if messages or opening != self._opening:
            self._tuning_line = tuning_sentence(self._tracker, self._profile)
        self._opening = opening
        self._has_played = self._has_played or bool(events)
        return events

    @property
    def status(self) -> PortStatus:
        """What the port is doing now."""
        return self.port.status

    def input_line(self, now_s: float) -> str:
        """Say what is being listened to."""
        sentence = port_sentence(self.port.status)
        if self._tracker.n_ignored_notes and not self._has_played:
            sentence += f"; {self._unheard()}"
        return sentence

    def _unheard(self) -> str:
        """Say why nothing is heard though keys are played."""
        if self._profile is None or self._profile.channel is None:
            return "notes on channel 10 are taken for drums and not heard: send on another channel"
        only = f"only channel {self._profile.channel + 1} is heard, by your profile {self._profile.name!r}"
        return f"{only}: send on that one, or change the profile"

    def tuning_line(self) -> str:
        """Say which tuning is believed, and why."""
        return self._tuning_line

    def inputs(self) -> tuple[str, ...]:
        """Name the inputs that can be listened to."""
        return tuple(port.name for port in self.port.inputs)

    def asks_input(self) -> bool:
        """Whether there are several, and none of them was named."""
        return self.port.status.state is PortState.SEVERAL

    def choose(self, name: str) -> None:
        """Listen to another input from now on."""
        self.port.choose(name)

    def is_over(self, now_s: float) -> bool:
        """Never by itself: the player may play on at any time."""
        return False

    def close(self) -> None:
        """Close the port."""
        self.port.close()


class DemoKeyboard:
    """The demo's own keyboard first, then the player's.

    Parameters
    ----------
    names
        Pitch names of the pack, to read the demo's line with.
    keyboard
        Takes over when the demo is done.
    """

    def __init__(self, names: PitchNames, keyboard: Keyboard) -> None:
        self._demo = DemoPlayer(names)
        self._tracker = PitchTracker(port_number=1)
        self._keyboard = keyboard
        self._handed_over = False

    def poll(self, now_s: float) -> Sequence[Event]:
        """Give what the demo, and after it the player, has played since the last call."""
        played = self._demo.poll(now_s)
        events = [event for message, at_s in played for event in self._tracker.decode(message, at_s)]
        self._handed_over = self._demo.is_over(now_s)
        if self._handed_over:
            events += self._keyboard.poll(now_s)
        return events

    def input_line(self, now_s: float) -> str:
        """Say what to look at, and after the demo what is being listened to."""
        says = self._demo.says(now_s)
        if not self._demo.is_over(now_s):
            return f"demo: {says}"
        return f"{says}; {self._keyboard.input_line(now_s)}"

    def tuning_line(self) -> str:
        """Say which tuning is believed of the one that plays now, and why."""
        return self._keyboard.tuning_line() if self._handed_over else tuning_sentence(self._tracker)

    def inputs(self) -> tuple[str, ...]:
        """Name the inputs that can be listened to."""
        return self._keyboard.inputs()

    def asks_input(self) -> bool:
        """Whether the player has to choose a keyboard; not before the demo is over."""
        return self._handed_over and self._keyboard.asks_input()

    def choose(self, name: str) -> None:
        """Choose the player's keyboard."""
        self._keyboard.choose(name)

    def is_over(self, now_s: float) -> bool:
        """Whether the demo is done."""
        return self._demo.is_over(now_s)

    def close(self) -> None:
        """Close the player's keyboard."""
        self._keyboard.close()


class Replay:
    """A recorded log, played back.

    Parameters
    ----------
    log
        What was recorded.
    path
        Where it was read from, for people.
    """

    def __init__(self, log: RecordedLog, path: Path) -> None:
        self._events = log.events
        self._path = path
        self._notice = log.notice
        self._next = 0

    def poll(self, now_s: float) -> Sequence[Event]:
        """Give the events whose time has come."""
        first = self._next
        while self._next < len(self._events) and self._events[self._next].at_s <= now_s:
            self._next += 1
        return self._events[first : self._next]

    def input_line(self, now_s: float) -> str:
        """Say how far the replay has come."""
        notice = f"; {self._notice}" if self._notice else ""
        if self.is_over(now_s):
            return f"replay of {self._path.name} is done{notice}"
        return f"replaying {self._path.name}: event {self._next} of {len(self._events)}{notice}"

    def tuning_line(self) -> str:
        """Say that pitches are as recorded."""
        return "pitches as they were recorded"

    def inputs(self) -> tuple[str, ...]:
        """Name none: a replay listens to nothing."""
        return ()

    def asks_input(self) -> bool:
        """Never: a replay listens to nothing."""
        return False

    def choose(self, name: str) -> None:
        """Refuse: a replay listens to nothing.

        Raises
        ------
        PortError
            Always.
        """
        raise PortError(f"port {name!r}: a replay listens to no keyboard; run melodycoach listen")

    def is_over(self, now_s: float) -> bool:
        """Whether every event has been given."""
        return self._next >= len(self._events)

    def close(self) -> None:
        """Do nothing: there is nothing open."""
