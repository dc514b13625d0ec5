"""What plays into a session: a keyboard that comes and goes, the demo before it, a recorded log."""

from __future__ import annotations

import time
from datetime import datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any

import pytest

from melodycoach.core.event import Event, LineEdited, NoteOff, NoteOn, PitchMoved, TimePassed
from melodycoach.core.note import InputKind
from melodycoach.demo import HAND_OVER, STAGES, DemoPlayer
from melodycoach.errors import PortError
from melodycoach.players import DemoKeyboard, Keyboard, Replay
from melodycoach.sources.event_json import LogHeader
from melodycoach.sources.event_log import RecordedLog
from melodycoach.sources.keyboard_profile import KeyboardProfile
from melodycoach.sources.midi_port import WATCH_EVERY_S, PortState
from melodycoach.sources.midi_system import PortName
from melodycoach.sources.pack_file import load_pack

if TYPE_CHECKING:
    from collections.abc import Callable, Iterable

NAMES = load_pack("makam").names
KEYS = PortName("Upright 20:0", "ALSA")
PAD = PortName("Pad 28:0", "ALSA")
PLAIN = "plain keys: each stands for every perde near it"


class Wire:
    """An open input of the room below."""

    def __init__(self) -> None:
        self.waiting: list[tuple[bytes, float]] = []
        self.closed = False

    def read(self) -> tuple[bytes, float] | None:
        return self.waiting.pop(0) if self.waiting else None

    def close(self) -> None:
        self.closed = True


class Room:
    """A room with keyboards that are carried in and out; its clock stands still until moved."""

    def __init__(self, *ports: PortName) -> None:
        self.ports = list(ports)
        self.wires: list[Wire] = []
        self.now_s = 100.0
        self.closed = False

    def clock(self) -> float:
        return self.now_s

    def problem(self) -> str:
        return ""

    def inputs(self) -> tuple[PortName, ...]:
        return tuple(self.ports)

    def open(self, port: PortName) -> Wire:
        self.wires.append(Wire())
        return self.wires[-1]

    def close(self) -> None:
        self.closed = True

    def keyboard(self, wanted: str = "", profile: KeyboardProfile | None = None) -> Keyboard:
        """Give a keyboard that has looked round once."""
        keyboard = Keyboard(self.clock, wanted, system=self, profile=profile)
        assert keyboard.poll(self.now_s) == []
        return keyboard

    def play(self, *messages: str) -> None:
        """Send messages, in hex, into the newest wire."""
        self.wires[-1].waiting += [(bytes.fromhex(message), 0.0) for message in messages]

    def later(self, keyboard: Keyboard, seconds: float = WATCH_EVERY_S) -> list[Event]:
        self.now_s += seconds
        return list(keyboard.poll(self.now_s))


# a keyboard


def test_keys_become_events_with_their_time() -> None:
    room = Room(KEYS)
    keyboard = room.keyboard()
    room.play("90 45 50", "80 45 00")
    assert room.later(keyboard, 0.25) == [
        NoteOn(100.25, 69, 6900.0, InputKind.KEYS),
        NoteOff(100.25, 69),
    ]
    assert keyboard.status.state is PortState.OPEN
    assert keyboard.input_line(100.25) == "listening to Upright 20:0"
    assert keyboard.tuning_line() == PLAIN


def test_a_port_that_goes_leaves_no_key_sounding() -> None:
    room = Room(KEYS)
    keyboard = room.keyboard()
    room.play("90 45 50", "90 48 50")
    room.later(keyboard, 0.125)
    room.ports.clear()
    assert room.later(keyboard) == [NoteOff(101.125, 69), NoteOff(101.125, 72)]
    assert keyboard.status.state is PortState.LOST
    assert room.later(keyboard) == []


def test_a_port_that_is_back_before_it_was_missed_leaves_no_key_sounding_either() -> None:
    room = Room(KEYS)
    keyboard = room.keyboard()
    room.play("90 45 50")
    room.later(keyboard, 0.125)
    room.ports = [PortName("Upright 24:0", "ALSA")]  # ALSA counts on when it is plugged in again
    assert room.later(keyboard) == [NoteOff(101.125, 69)]
    assert keyboard.status.state is PortState.OPEN
    assert len(room.wires) == 2


def test_what_was_played_just_before_the_port_went_is_still_heard_and_ended() -> None:
    room = Room(KEYS)
    keyboard = room.keyboard()
    room.play("90 45 50")
    room.ports.clear()
    assert [type(event) for event in room.later(keyboard)] == [NoteOn, NoteOff]


def test_choosing_another_input_ends_what_sounds_and_forgets_how_it_was_tuned() -> None:
    room = Room(KEYS, PAD)
    keyboard = room.keyboard("upright")
    assert keyboard.inputs() == (KEYS.name, PAD.name)
    room.play("E0 00 30", "90 47 50")  # bent down by a quarter tone
    [struck] = room.later(keyboard, 0.125)
    assert struck == NoteOn(100.125, 71, 7050.0, InputKind.TUNED)
    keyboard.choose("Pad")
    assert room.later(keyboard, 0.125) == [NoteOff(100.25, 71)]
    assert room.wires[0].closed
    assert keyboard.tuning_line() == PLAIN
    room.play("90 47 50")
    assert room.later(keyboard, 0.125) == [NoteOn(100.375, 71, 7100.0, InputKind.KEYS)]
    assert keyboard.input_line(0.0) == "listening to Pad 28:0"


def test_the_player_is_asked_when_there_are_several_inputs_and_none_was_named() -> None:
    room = Room(KEYS, PAD)
    assert not room.keyboard("upright").asks_input()
    keyboard = room.keyboard()
    assert keyboard.asks_input()
    keyboard.choose("Pad")
    room.later(keyboard, 0.125)
    assert not keyboard.asks_input()
    assert not Room().keyboard().asks_input()


def test_an_input_that_is_not_there_is_waited_for() -> None:
    room = Room(KEYS)
    keyboard = room.keyboard()
    room.play("90 45 50")
    room.later(keyboard, 0.125)
    keyboard.choose("organ")
    assert room.later(keyboard, 0.125) == [NoteOff(100.25, 69)]
    assert keyboard.input_line(0.0).startswith("no keyboard 'organ' yet, there is: Upright 20:0")


def test_a_keyboard_is_read_and_spoken_of_as_its_profile_says() -> None:
    room = Room(KEYS)
    tuned = tuple(-23.0 if key == 9 else 0.0 for key in range(12))
    keyboard = room.keyboard(profile=KeyboardProfile("home", tuned, channel=2))
    assert keyboard.tuning_line() == "tuned by your profile 'home': A -23 c"
    room.play("90 45 50", "80 45 00")
    assert room.later(keyboard, 0.125) == []
    assert keyboard.input_line(0.0) == (
        "listening to Upright 20:0; only channel 3 is heard, by your profile 'home': send on that one, or "
        "change the profile"
    )
    room.play("92 45 50")
    assert room.later(keyboard, 0.125) == [NoteOn(100.125, 2 * 128 + 69, 6877.0, InputKind.TUNED)]
    assert keyboard.input_line(0.0) == "listening to Upright 20:0"
    room.play("F0 43 10 4C 08 02 4A 0E F7")  # XG scale tuning of part 3: A 50 cents down
    room.later(keyboard, 0.125)
    assert keyboard.tuning_line().startswith("tuned by a message from the keyboard over your profile 'home'")


def test_a_profile_with_no_channel_leaves_the_drums_out() -> None:
    room = Room(KEYS)
    keyboard = room.keyboard(profile=KeyboardProfile("home"))
    room.play("99 45 50")
    room.later(keyboard, 0.125)
    assert "notes on channel 10 are taken for drums" in keyboard.input_line(0.0)


def test_notes_on_the_drum_channel_are_spoken_of_until_others_are_heard() -> None:
    room = Room(KEYS)
    keyboard = room.keyboard()
    room.play("99 45 50", "89 45 00")
    assert room.later(keyboard, 0.125) == []
    assert keyboard.input_line(0.0) == (
        "listening to Upright 20:0; notes on channel 10 are taken for drums and not heard: "
        "send on another channel"
    )
    room.play("90 45 50")
    room.later(keyboard, 0.125)
    assert keyboard.input_line(0.0) == "listening to Upright 20:0"


def test_a_keyboard_is_never_over_and_closes_its_port() -> None:
    room = Room(KEYS)
    keyboard = room.keyboard()
    assert not keyboard.is_over(1e9)
    keyboard.close()
    assert room.wires[0].closed
    assert room.closed


# tuning


def test_a_tuning_message_changes_what_is_believed_until_the_keyboard_is_plugged_in_again() -> None:
    room = Room(KEYS)
    keyboard = room.keyboard()
    keyboard.poll(0.0)
    assert keyboard.tuning_line() == PLAIN
    # MIDI Tuning Standard, scale/octave of single bytes on all channels: every E 23 c down
    room.play("F0 7E 7F 08 08 03 7F 7F 40 40 40 40 29 40 40 40 40 40 40 40 F7", "90 40 50")
    assert keyboard.poll(0.1) == [NoteOn(100.0, 64, 6377.0, InputKind.TUNED)]
    assert keyboard.tuning_line() == "tuned by a message from the keyboard: E -23 c"
    keyboard.choose(KEYS.name)
    assert [type(event) for event in keyboard.poll(0.2)] == [NoteOff]
    assert keyboard.tuning_line() == PLAIN


@pytest.mark.jack
def test_a_bulk_dump_of_408_bytes_arrives_whole_over_jack(plug_in: Callable[[str], Any]) -> None:
    # MIDI Tuning Standard, bulk dump: a word of three bytes for each key, here key 64 half a semitone down
    words = "".join("3F4000" if key == 64 else f"{key:02X}0000" for key in range(128))
    wire = plug_in("org")
    keyboard = Keyboard(time.monotonic)
    deadline_s = time.monotonic() + 10
    events: list[Event] = []
    is_sent = False
    while len(events) < 1 and time.monotonic() < deadline_s:
        events += keyboard.poll(time.monotonic())
        if keyboard.status.state is PortState.OPEN and not is_sent:
            wire.play(f"F07E7F0801004D616B616D2020202020202020202020{words}00F7", "90 40 50")
            is_sent = True
        time.sleep(0.001)
    said = keyboard.tuning_line()
    keyboard.close()
    assert [(event.pitch_cents, event.kind) for event in events] == [(6350.0, InputKind.TUNED)]
    assert said == "tuned by a message from the keyboard: E4 -50 c"


# the demo


def demo_in(room: Room) -> tuple[DemoKeyboard, float]:
    return DemoKeyboard(NAMES, Keyboard(room.clock, system=room)), DemoPlayer(NAMES).ends_s


def test_while_the_demo_plays_the_keyboard_is_left_alone() -> None:
    room = Room(KEYS)
    demo, ends_s = demo_in(room)
    events = [event for step in range(int(ends_s)) for event in demo.poll(float(step))]
    assert any(isinstance(event, NoteOn) for event in events)
    assert room.wires == []
    assert not demo.is_over(ends_s - 1)
    assert demo.input_line(2.0) == f"demo: {STAGES[0].says}"
    assert demo.tuning_line() == ("bends read on channel 1, range ±2 semitones (sent by the keyboard)")


def test_after_the_demo_the_line_is_the_players() -> None:
    room = Room(KEYS)
    demo, ends_s = demo_in(room)
    demo.poll(ends_s)
    assert demo.is_over(ends_s)
    assert demo.input_line(ends_s) == f"{HAND_OVER}; listening to Upright 20:0"
    assert demo.inputs() == (KEYS.name,)
    room.play("90 45 50")
    assert demo.poll(ends_s + 1) == [NoteOn(100.0, 69, 6900.0, InputKind.KEYS)]
    assert demo.tuning_line() == PLAIN


def test_the_demo_asks_for_an_input_only_when_it_is_over() -> None:
    room = Room(KEYS, PAD)
    demo, ends_s = demo_in(room)
    demo.poll(1.0)
    assert not demo.asks_input()
    demo.poll(ends_s)
    assert demo.asks_input()


def test_a_keyboard_chosen_during_the_demo_is_opened_after_it() -> None:
    room = Room(KEYS, PAD)
    demo, ends_s = demo_in(room)
    demo.poll(1.0)
    demo.choose("Pad")
    demo.poll(ends_s)
    assert demo.input_line(ends_s).endswith("listening to Pad 28:0")
    demo.close()
    assert room.wires[0].closed


def test_the_demo_and_the_keyboard_never_share_a_voice() -> None:
    room = Room(KEYS)
    demo, ends_s = demo_in(room)
    played = {event.voice for event in demo.poll(ends_s) if isinstance(event, NoteOn)}
    room.play(*(f"90 {key:02X} 50" for key in range(128)))
    keyed = {event.voice for event in demo.poll(ends_s) if isinstance(event, NoteOn)}
    assert len(keyed) == 128
    assert not played & keyed


# a recorded log


def replay_of(*events: Event, notice: str = "") -> Replay:
    header = LogHeader("0.1.0", datetime(2026, 5, 1, 18, 4, 9), "makam")
    return Replay(RecordedLog(header, events, notice), Path("sessions") / "may.events.jsonl")


def played_until(replay: Replay, times_s: Iterable[float]) -> list[list[Event]]:
    return [list(replay.poll(now_s)) for now_s in times_s]


def test_a_replay_gives_each_event_once_in_order_when_its_time_has_come() -> None:
    events = (
        NoteOn(0.5, 1, 6900.0, InputKind.KEYS),
        PitchMoved(0.6, 1, 6950.0, InputKind.TUNED),
        NoteOff(1.5, 1),
        LineEdited(1.5, 0, 1, ()),
    )
    replay = replay_of(*events)
    assert played_until(replay, (0.4, 0.5, 1.0, 1.5, 9.0)) == [
        [],
        [events[0]],
        [events[1]],
        [events[2], events[3]],
        [],
    ]


def test_a_replay_says_how_far_it_has_come() -> None:
    replay = replay_of(TimePassed(1.0), TimePassed(2.0))
    replay.poll(1.0)
    assert replay.input_line(1.0) == "replaying may.events.jsonl: event 1 of 2"
    assert not replay.is_over(1.0)
    replay.poll(2.0)
    assert replay.input_line(2.0) == "replay of may.events.jsonl is done"
    assert replay.is_over(2.0)


def test_what_was_cut_off_a_log_is_said_all_the_way() -> None:
    replay = replay_of(TimePassed(1.0), notice="line 3 was cut short")
    assert replay.input_line(0.0).endswith("event 0 of 1; line 3 was cut short")
    replay.poll(1.0)
    assert replay.input_line(1.0) == "replay of may.events.jsonl is done; line 3 was cut short"


def test_a_replay_has_nothing_to_listen_to() -> None:
    replay = replay_of()
    assert replay.is_over(0.0)
    assert replay.inputs() == ()
    assert not replay.asks_input()
    assert replay.tuning_line() == "pitches as they were recorded"
    with pytest.raises(PortError) as error:
        replay.choose("Upright")
    assert str(error.value) == ("port 'Upright': a replay listens to no keyboard; run melodycoach listen")
    replay.close()
