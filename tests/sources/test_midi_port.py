"""Live ports: on a machine of our own making, and over a real JACK server."""

from __future__ import annotations

import subprocess
import sys
import time
from typing import TYPE_CHECKING

import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.core.event import NoteOff, NoteOn, PitchMoved
from melodycoach.core.note import InputKind
from melodycoach.errors import PortError
from melodycoach.sources.midi_pitch import PitchTracker
from melodycoach.sources.midi_port import (
    SLACK_S,
    LivePort,
    PortState,
    PortStatus,
    find_port,
    is_keyboard,
    matching_ports,
    port_sentence,
    stable_name,
)
from melodycoach.sources.midi_system import QUEUE_LIMIT, PortName

if TYPE_CHECKING:
    from collections.abc import Callable

KEYS = PortName("USB Keys:USB Keys MIDI 1 20:0", "ALSA")
KEYS_AGAIN = PortName("USB Keys:USB Keys MIDI 1 24:0", "ALSA")
PAD = PortName("Pad:Pad MIDI 1 28:0", "ALSA")
THROUGH = PortName("Midi Through:Midi Through Port-0 14:0", "ALSA")
KEYS_IN_JACK = PortName("a2j:USB Keys [20] (capture): USB Keys MIDI 1", "JACK")
OURS = PortName("melodycoach demo:out", "JACK")


class Wire:
    """An open input of the machine below."""

    def __init__(self) -> None:
        self.waiting: list[tuple[bytes, float]] = []
        self.closed = False

    def read(self) -> tuple[bytes, float] | None:
        return self.waiting.pop(0) if self.waiting else None

    def close(self) -> None:
        self.closed = True


class Machine:
    """A machine whose ports come and go as a test says; its clock stands still until moved."""

    def __init__(self, *ports: PortName) -> None:
        self.ports = list(ports)
        self.wires: list[Wire] = []
        self.opened: list[PortName] = []
        self.refuses = ""
        self.without_midi = ""
        self.closed = False
        self.now_s = 10.0

    def clock(self) -> float:
        return self.now_s

    def problem(self) -> str:
        return self.without_midi

    def inputs(self) -> tuple[PortName, ...]:
        return tuple(self.ports)

    def open(self, port: PortName) -> Wire:
        if self.refuses:
            raise PortError(self.refuses)
        self.opened.append(port)
        self.wires.append(Wire())
        return self.wires[-1]

    def close(self) -> None:
        self.closed = True

    def listen(self, wanted: str = "") -> LivePort:
        port = LivePort(self.clock, wanted, system=self)
        port.poll()
        return port

    def after(self, seconds: float, port: LivePort) -> PortStatus:
        self.now_s += seconds
        port.poll()
        return port.status


# names


@pytest.mark.parametrize(
    ("wanted", "found"),
    [
        ("USB Keys:USB Keys MIDI 1 20:0", KEYS),
        ("usb keys:usb keys midi 1", KEYS),
        ("keys", KEYS),
        ("20:0", KEYS),
        ("a2j", KEYS_IN_JACK),
        ("through", THROUGH),
        ("demo", OURS),
    ],
)
def test_a_name_or_a_part_of_it_finds_the_port(wanted: str, found: PortName) -> None:
    assert find_port([THROUGH, KEYS, PAD, KEYS_IN_JACK, OURS], wanted) == found


def test_one_keyboard_in_two_systems_is_no_question() -> None:
    assert matching_ports([KEYS, KEYS_IN_JACK], "USB Keys") == (KEYS,)


def test_two_ports_of_one_name_are_told_apart_by_number() -> None:
    with pytest.raises(PortError) as error:
        find_port([KEYS, KEYS_AGAIN], "usb")
    assert str(error.value) == (
        "MIDI input 'usb' fits 'USB Keys:USB Keys MIDI 1 20:0', 'USB Keys:USB Keys MIDI 1 24:0'; "
        "give more of the name"
    )
    assert find_port([KEYS, KEYS_AGAIN], "24:0") == KEYS_AGAIN


def test_an_unknown_port_is_answered_with_those_there_are() -> None:
    with pytest.raises(PortError) as error:
        find_port([KEYS, PAD], "Piano")
    assert str(error.value) == (
        "no MIDI input 'Piano'; known: Pad:Pad MIDI 1 28:0, USB Keys:USB Keys MIDI 1 20:0; "
        "run melodycoach ports"
    )


def test_a_misspelt_port_is_answered_with_the_nearest() -> None:
    with pytest.raises(PortError) as error:
        find_port([PortName("Stage 88", "CoreMIDI"), PortName("Pad", "CoreMIDI")], "Stgae 88")
    assert str(error.value) == "no MIDI input 'Stgae 88'; did you mean 'Stage 88'?; run melodycoach ports"


def test_a_machine_without_inputs_says_so() -> None:
    with pytest.raises(PortError) as error:
        find_port([], "Piano")
    assert str(error.value) == "no MIDI input 'Piano': there is none at all; run melodycoach ports"


@pytest.mark.parametrize(
    ("name", "platform", "stable"),
    [
        ("USB Keys:USB Keys MIDI 1 20:0", "linux", "USB Keys:USB Keys MIDI 1"),
        ("USB Keys 3", "linux", "USB Keys 3"),
        ("USB Keys 3", "win32", "USB Keys"),
        ("20:0", "linux", "20:0"),
    ],
)
def test_the_number_that_changes_at_every_plugging_is_dropped(name: str, platform: str, stable: str) -> None:
    assert stable_name(name, platform) == stable


def test_the_loop_back_and_our_own_ports_are_no_keyboards() -> None:
    loop_in_jack = PortName("a2j:Midi Through [14] (capture): Midi Through Port-0", "JACK")
    ports = [KEYS, THROUGH, OURS, loop_in_jack]
    assert [is_keyboard(port) for port in ports] == [True, False, False, False]


# coming and going


def test_the_only_keyboard_is_opened_unasked() -> None:
    machine = Machine(THROUGH, KEYS, OURS)
    port = machine.listen()
    assert machine.opened == [KEYS]
    assert port.status == PortStatus(PortState.OPEN, KEYS.name)


def test_nothing_is_opened_before_the_first_poll() -> None:
    machine = Machine(KEYS)
    assert LivePort(machine.clock, system=machine).status == PortStatus(PortState.ABSENT)
    assert machine.opened == []


def test_the_loop_back_alone_is_not_opened_unless_asked_for() -> None:
    assert Machine(THROUGH, OURS).listen().status == PortStatus(PortState.ABSENT)
    machine = Machine(THROUGH)
    assert machine.listen("Midi Through").status.state == PortState.OPEN


def test_with_several_keyboards_the_player_is_asked() -> None:
    machine = Machine(KEYS, PAD)
    port = machine.listen()
    assert port.status == PortStatus(PortState.SEVERAL, choices=(KEYS.name, PAD.name))
    port.choose(PAD.name)
    assert machine.after(0.0, port) == PortStatus(PortState.OPEN, PAD.name, wanted=PAD.name)


def test_a_part_of_the_name_chooses_among_several() -> None:
    machine = Machine(KEYS, PAD)
    assert machine.listen("pad").status == PortStatus(PortState.OPEN, PAD.name, wanted="pad")


def test_a_wanted_name_that_fits_several_asks_again() -> None:
    machine = Machine(KEYS, KEYS_AGAIN, PAD)
    assert machine.listen("usb").status == PortStatus(
        PortState.SEVERAL, wanted="usb", choices=(KEYS.name, KEYS_AGAIN.name)
    )


def test_a_wanted_keyboard_that_is_not_there_is_waited_for() -> None:
    machine = Machine(PAD)
    port = machine.listen("usb")
    assert port.status == PortStatus(PortState.ABSENT, wanted="usb", choices=(PAD.name,))
    machine.ports.append(KEYS)
    assert machine.after(1.0, port).state == PortState.OPEN
    assert machine.opened == [KEYS]


def test_a_keyboard_that_appears_is_taken_within_a_second() -> None:
    machine = Machine()
    port = machine.listen()
    machine.ports.append(KEYS)
    assert machine.after(0.9, port).state == PortState.ABSENT
    assert machine.after(0.1, port).state == PortState.OPEN


def test_a_lost_keyboard_is_closed_and_opened_anew_under_its_new_number() -> None:
    machine = Machine(KEYS, THROUGH)
    port = machine.listen()
    machine.ports = [THROUGH]
    assert machine.after(1.0, port) == PortStatus(PortState.LOST, KEYS.name)
    assert machine.wires[0].closed
    machine.ports = [THROUGH, KEYS_AGAIN]
    assert machine.after(1.0, port) == PortStatus(PortState.OPEN, KEYS_AGAIN.name)
    assert machine.opened == [KEYS, KEYS_AGAIN]
    assert not machine.wires[1].closed


def test_a_keyboard_replugged_between_two_looks_is_opened_anew() -> None:
    machine = Machine(KEYS)
    port = machine.listen()
    machine.ports = [KEYS_AGAIN]
    assert machine.after(1.0, port) == PortStatus(PortState.OPEN, KEYS_AGAIN.name)
    assert machine.wires[0].closed
    assert port.n_openings == 2


def test_another_keyboard_does_not_take_the_place_of_a_lost_one_unasked() -> None:
    machine = Machine(KEYS)
    port = machine.listen()
    machine.ports = [PAD, THROUGH]
    assert machine.after(1.0, port) == PortStatus(PortState.LOST, KEYS.name, choices=(PAD.name,))
    port.choose("pad")
    assert machine.after(0.0, port) == PortStatus(PortState.OPEN, PAD.name, wanted="pad")


def test_choosing_closes_the_one_before() -> None:
    machine = Machine(KEYS, PAD)
    port = machine.listen("usb")
    port.choose("pad")
    port.poll()
    assert [wire.closed for wire in machine.wires] == [True, False]
    assert port.n_openings == 2


def test_a_keyboard_that_refuses_is_tried_again() -> None:
    machine = Machine(KEYS)
    machine.refuses = "'USB Keys': it is busy"
    port = machine.listen()
    assert port.status == PortStatus(PortState.REFUSED, KEYS.name, reason="'USB Keys': it is busy")
    machine.refuses = ""
    assert machine.after(1.0, port).state == PortState.OPEN


def test_a_machine_without_midi_says_why() -> None:
    machine = Machine()
    machine.without_midi = "no MIDI: python-rtmidi is not installed"
    port = machine.listen()
    assert port.status == PortStatus(PortState.UNAVAILABLE, reason=machine.without_midi)


def test_what_was_played_before_the_loss_is_still_handed_over() -> None:
    machine = Machine(KEYS)
    port = machine.listen()
    machine.wires[0].waiting = [(b"\x90\x45\x40", 0.0)]
    machine.ports = []
    machine.now_s += 1.0
    assert [message for message, _ in port.poll()] == [b"\x90\x45\x40"]
    assert port.status.state == PortState.LOST
    assert port.poll() == []


def test_closing_lets_go_of_everything() -> None:
    machine = Machine(KEYS)
    port = machine.listen()
    port.close()
    port.close()
    assert machine.wires[0].closed
    assert machine.closed


# time


def times(machine: Machine, port: LivePort, *waiting: tuple[bytes, float]) -> list[float]:
    machine.wires[-1].waiting = list(waiting)
    return [at_s for _, at_s in port.poll()]


def test_messages_keep_the_time_between_them_though_they_are_read_at_once() -> None:
    machine = Machine(KEYS)
    port = machine.listen()
    machine.now_s = 10.5
    assert times(machine, port, (b"a", 0.0)) == [10.5]
    machine.now_s = 11.0
    # 0.1 and 0.2 s after the first, as the driver measured it
    assert times(machine, port, (b"b", 0.1), (b"c", 0.1)) == pytest.approx([10.6, 10.7])


def test_a_message_is_never_later_than_now() -> None:
    machine = Machine(KEYS)
    port = machine.listen()
    times(machine, port, (b"a", 0.0))
    machine.now_s += 0.5
    assert times(machine, port, (b"b", 0.9)) == [machine.now_s]


def test_a_driver_whose_clock_lags_is_put_right() -> None:
    machine = Machine(KEYS)
    port = machine.listen()
    times(machine, port, (b"a", 0.0))
    machine.now_s = 99.0
    assert times(machine, port) == []  # the queue was empty then
    machine.now_s = 100.0
    assert times(machine, port, (b"b", 50.0)) == [99.0 - SLACK_S]


@given(st.lists(st.tuples(st.floats(0, 2), st.lists(st.floats(0, 3), max_size=4)), max_size=12))
def test_times_never_run_back_nor_ahead_of_the_clock(turns: list[tuple[float, list[float]]]) -> None:
    machine = Machine(KEYS)
    port = machine.listen()
    last_s = machine.now_s
    for step_s, intervals in turns:
        machine.now_s += step_s
        for at_s in times(machine, port, *((b"x", interval_s) for interval_s in intervals)):
            assert last_s <= at_s <= machine.now_s
            last_s = at_s


def test_a_queue_that_was_full_is_counted() -> None:
    machine = Machine(KEYS)
    port = machine.listen()
    assert len(times(machine, port, *[(b"x", 0.0)] * (QUEUE_LIMIT + 5))) == QUEUE_LIMIT
    assert port.n_overflows == 1
    assert len(port.poll()) == 5
    assert port.n_overflows == 1


# words

SENTENCES = [
    (PortStatus(PortState.OPEN, "Keys"), "listening to Keys"),
    (PortStatus(PortState.LOST, "Keys"), "Keys has gone; plug it in again and it goes on by itself"),
    (
        PortStatus(PortState.LOST, "Keys", choices=("Pad", "Pipe")),
        "Keys has gone; plug it in again and it goes on by itself; or choose Pad, Pipe",
    ),
    (PortStatus(PortState.ABSENT), "no keyboard found; type notes, or plug one in at any time"),
    (
        PortStatus(PortState.ABSENT, wanted="Keys", choices=("Pad",)),
        "no keyboard 'Keys' yet, there is: Pad; it is taken as soon as it appears",
    ),
    (
        PortStatus(PortState.ABSENT, wanted="Keys"),
        "no keyboard 'Keys' yet, there is none at all; it is taken as soon as it appears",
    ),
    (
        PortStatus(PortState.SEVERAL, choices=("Keys", "Pad")),
        "several keyboards: Keys, Pad; choose one with F6, or start with --port",
    ),
    (
        PortStatus(PortState.REFUSED, "Keys", reason="busy"),
        "Keys does not open (busy); another program may hold it; trying on",
    ),
    (PortStatus(PortState.UNAVAILABLE, reason="no MIDI: why"), "no MIDI: why"),
]


@pytest.mark.parametrize(("status", "sentence"), SENTENCES)
def test_every_state_has_its_sentence(status: PortStatus, sentence: str) -> None:
    assert port_sentence(status) == sentence


def test_every_state_was_put_in_words() -> None:
    assert {status.state for status, _ in SENTENCES} == set(PortState)


def test_loading_the_module_does_not_load_rtmidi() -> None:
    code = "import sys, melodycoach.sources.midi_port; print({'rtmidi', '_rtmidi'} & set(sys.modules))"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout == "set()\n"


# over JACK

DEADLINE_S = 10.0


def wait_for(port: LivePort, state: PortState, within_s: float = DEADLINE_S) -> float:
    """Poll until the port is in a state; give the seconds that it took."""
    began_s = time.monotonic()
    while port.status.state != state:
        assert time.monotonic() - began_s < within_s, f"{port.status} after {within_s} s, expected {state}"
        port.poll()
        time.sleep(0.001)
    return time.monotonic() - began_s


def hear(port: LivePort, tracker: PitchTracker, n_events: int) -> list[object]:
    """Poll until so many events have come."""
    events: list[object] = []
    deadline_s = time.monotonic() + DEADLINE_S
    while len(events) < n_events:
        assert time.monotonic() < deadline_s, f"only {events} came"
        events += [event for message, at_s in port.poll() for event in tracker.decode(message, at_s)]
        time.sleep(0.001)
    return events


@pytest.mark.jack
def test_a_phrase_played_over_jack_arrives_in_order_and_in_time(plug_in: Callable[[str], object]) -> None:
    keyboard = plug_in("kanun")
    port = LivePort(time.monotonic)
    wait_for(port, PortState.OPEN)
    phrase = [69, 71, 72, 74, 72, 71, 69, 67]
    lines = []
    for key in phrase:
        lines += [f"90 {key:02X} 40", "wait 0.05", f"90 {key:02X} 00"]
    keyboard.send(*lines)
    events = hear(port, PitchTracker(), 16)
    port.close()
    ons = [event for event in events if isinstance(event, NoteOn)]
    assert [(event.pitch_cents, event.kind) for event in ons] == [
        (100.0 * key, InputKind.KEYS) for key in phrase
    ]
    assert [type(event) for event in events] == [NoteOn, NoteOff] * 8
    lengths = [off.at_s - on.at_s for on, off in zip(events[::2], events[1::2], strict=True)]
    # each note was held for 50 ms; a JACK period is 5.3 ms, and this may be a busy machine
    assert sorted(lengths)[4] == pytest.approx(0.05, abs=0.03)


@pytest.mark.jack
def test_bends_over_jack_are_followed(plug_in: Callable[[str], object]) -> None:
    keyboard = plug_in("ney")
    port = LivePort(time.monotonic, "ney")
    wait_for(port, PortState.OPEN)
    # range 12 sent, then one comma flat: -155 * 1200 / 8192 = -22.705 c
    keyboard.play("B0 65 00", "B0 64 00", "B0 06 0C", "E0 65 3E", "90 47 40", "E0 00 40", "80 47 00")
    events = hear(port, PitchTracker(), 3)
    port.close()
    on, moved, off = events
    assert isinstance(on, NoteOn)
    assert on.pitch_cents == pytest.approx(7100 - 22.705, abs=0.001)
    assert isinstance(moved, PitchMoved)
    assert moved.pitch_cents == 7100
    assert isinstance(off, NoteOff)


@pytest.mark.jack
def test_tuning_messages_pass_and_clock_does_not(plug_in: Callable[[str], object]) -> None:
    keyboard = plug_in("org")
    port = LivePort(time.monotonic)
    wait_for(port, PortState.OPEN)
    keyboard.play("F8", "FE", "F0 7E 7F 08 08 03 7F 7F 40 40 40 40 29 40 40 40 40 40 40 40 F7", "90 45 40")
    got: list[bytes] = []
    deadline_s = time.monotonic() + DEADLINE_S
    while len(got) < 2 and time.monotonic() < deadline_s:
        got += [message for message, _ in port.poll()]
        time.sleep(0.001)
    port.close()
    assert [message[0] for message in got] == [0xF0, 0x90]
    assert len(got[0]) == 21


@pytest.mark.jack
def test_an_unplugged_keyboard_is_seen_within_2_s_and_heard_again_within_2_s(
    plug_in: Callable[[str], object],
) -> None:
    keyboard = plug_in("tanbur")
    port, tracker = LivePort(time.monotonic), PitchTracker()
    wait_for(port, PortState.OPEN)
    keyboard.play("90 45 40")
    assert len(hear(port, tracker, 1)) == 1
    keyboard.unplug()
    assert wait_for(port, PortState.LOST) < 2.0
    assert [type(event) for event in tracker.start_over(0.0)] == [NoteOff]
    keyboard = plug_in("tanbur")
    assert wait_for(port, PortState.OPEN) < 2.0
    keyboard.play("90 47 40", "90 47 00")
    assert [type(event) for event in hear(port, tracker, 2)] == [NoteOn, NoteOff]
    port.close()


@pytest.mark.jack
def test_a_keyboard_plugged_in_later_is_taken(jack_server: object, plug_in: Callable[[str], object]) -> None:
    port = LivePort(time.monotonic)
    port.poll()
    assert port.status == PortStatus(PortState.ABSENT)
    keyboard = plug_in("ud")
    assert wait_for(port, PortState.OPEN) < 2.0
    keyboard.play("90 45 40")
    assert len(hear(port, PitchTracker(), 1)) == 1
    port.close()


CLOSE_WHILE_PLAYING = """
import time
from melodycoach.sources.midi_port import LivePort, PortState
for turn in range(20):
    port = LivePort(time.monotonic, "flood")
    deadline_s, n = time.monotonic() + 5, 0
    while n < 20:
        n += len(port.poll())
        assert time.monotonic() < deadline_s, port.status
    port.close()
    assert port.poll() == []
print("20 times")
"""


@pytest.mark.jack
def test_a_port_closed_while_notes_arrive_never_crashes(plug_in: Callable[[str], object]) -> None:
    keyboard = plug_in("flood")
    keyboard.send(*["90 45 40", "90 45 00", "wait 0.002"] * 3_000)
    done = subprocess.run(
        [sys.executable, "-X", "faulthandler", "-c", CLOSE_WHILE_PLAYING],
        capture_output=True,
        text=True,
        check=False,
        timeout=120,
    )
    assert (done.returncode, done.stdout) == (0, "20 times\n"), done.stderr


OUTLIVE_THE_SERVER = """
import sys, time
from melodycoach.sources.midi_port import LivePort, PortState
port = LivePort(time.monotonic)
last = None
deadline_s = time.monotonic() + 30
while time.monotonic() < deadline_s:
    n = len(port.poll())
    if n:
        print("notes", flush=True)
        if last == "end":
            break
    if port.status.state != last:
        last = port.status.state
        print(last, flush=True)
    time.sleep(0.001)
"""


@pytest.mark.jack
@pytest.mark.parametrize("kill", [False, True], ids=["ended", "killed"])
def test_a_server_that_dies_and_comes_back_is_outlived(
    jack_server: object, plug_in: Callable[[str], object], *, kill: bool
) -> None:
    keyboard = plug_in("saz")
    with subprocess.Popen(
        [sys.executable, "-X", "faulthandler", "-c", OUTLIVE_THE_SERVER],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    ) as listener:
        assert listener.stdout is not None
        try:
            said = listener.stdout.readline().strip()
            while said in ("absent", "unavailable"):
                said = listener.stdout.readline().strip()
            assert said == "open"
            jack_server.stop(kill=kill)
            keyboard.unplug()  # a client that outlives its server disturbs the next one
            assert listener.stdout.readline() == "lost\n"
            jack_server.start()
            keyboard = plug_in("saz")
            assert listener.stdout.readline() == "open\n"
            keyboard.play("90 45 40")
            assert listener.stdout.readline() == "notes\n"
        finally:
            listener.terminate()
