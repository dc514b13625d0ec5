"""One track of a MIDI file: what is read of its events, and what a damage costs.

Outside sources: Standard MIDI Files 1.0 (RP-001) for delta times, running status, packets of system
exclusive messages and meta events. mido reads the same messages from what mido has written.
"""

from __future__ import annotations

import io

import mido
import pytest
from hypothesis import given
from hypothesis import strategies as st
from midi_bytes import END, chunk, header, midi, name, track

from melodycoach.sources import midi_track
from melodycoach.sources.midi_file import MidiFile, read_midi_file
from melodycoach.sources.midi_track import Track, decode_text


def only(*events: str) -> Track:
    """Read a file of one track of these events, in which nothing is lost."""
    read = read_midi_file(midi(track(*events)))
    assert read.losses == ()
    [one] = read.tracks
    return one


def messages(one: Track) -> list[tuple[int, str]]:
    return [(tick, message.hex(" ").upper()) for tick, message in one.events]


def damaged(*events: str) -> MidiFile:
    """Read a file of one track that ends with these events; they begin at byte 22 of the file."""
    read = read_midi_file(midi(track(*events)))
    assert read.losses
    return read


A4 = "00 90 45 40"
A4_READ = (0, "90 45 40")


def test_times_are_added_up() -> None:
    # 60 = 96 ticks; 81 48 = 128 + 72 = 200 ticks; FF FF FF 7F = 2^28 - 1, the greatest (RP-001)
    read = messages(only(A4, "60 80 45 40", "81 48 90 47 40", "FF FF FF 7F 80 47 40"))
    assert [tick for tick, _ in read] == [0, 96, 296, 296 + 2**28 - 1]


def test_messages_of_two_and_of_three_bytes_are_read() -> None:
    read = messages(only("00 C0 05", "00 D0 40", "00 E0 61 38", "00 B0 65 00", "00 A0 45 01"))
    assert [message for _, message in read] == ["C0 05", "D0 40", "E0 61 38", "B0 65 00", "A0 45 01"]


def test_running_status_repeats_the_status() -> None:
    assert messages(only(A4, "60 45 00", "00 47 40")) == [A4_READ, (96, "90 45 00"), (96, "90 47 40")]


def test_running_status_goes_on_after_a_meta_event() -> None:
    # RP-001 says it ends there, but there are files in which it does not
    assert messages(only(A4, "00 FF 01 01 41", "60 45 00")) == [A4_READ, (96, "90 45 00")]


@pytest.mark.parametrize("packet", ["F0 02 01 F7", "F7 01 01"])
def test_running_status_ends_with_a_system_exclusive_message(packet: str) -> None:
    read = damaged(A4, f"00 {packet}", "60 45 00")
    at = 22 + 4 + 1 + len(packet.split()) + 1
    reason = "45 was found, where a message was expected"
    assert read.losses == (f"track 1 stopped at byte {at} of the file: {reason}",)
    assert messages(read.tracks[0])[0] == A4_READ


def test_a_value_without_a_status_stops_the_track() -> None:
    # 22: time, 23: the value
    assert damaged("00 45 40").losses == (
        "track 1 stopped at byte 23 of the file: 45 was found, where a message was expected",
    )


def test_a_system_exclusive_message_is_given_whole() -> None:
    assert messages(only("00 F0 05 7E 7F 09 01 F7")) == [(0, "F0 7E 7F 09 01 F7")]


def test_packets_of_one_message_are_joined() -> None:
    # the example of RP-001: three packets, 200 and 100 ticks apart
    read = messages(only("00 F0 03 43 12 00", "81 48 F7 06 43 12 00 43 12 00", "64 F7 04 43 12 00 F7"))
    assert read == [(300, "F0 43 12 00 43 12 00 43 12 00 43 12 00 F7")]


@pytest.mark.parametrize("following", [[A4], ["00 F0 02 02 F7"], []])
def test_a_message_without_its_end_is_ended(following: list[str]) -> None:
    assert messages(only("00 F0 01 01", *following))[0] == (0, "F0 01 F7")


def test_an_escape_gives_a_message_that_bears_on_pitch() -> None:
    assert messages(only("00 F7 03 90 45 40", "00 F7 03 F0 01 F7")) == [A4_READ, (0, "F0 01 F7")]


@pytest.mark.parametrize(
    "escaped", ["00", "01 F3", "02 90 45", "03 90 45 80", "04 90 45 40 00", "02 F0 01", "01 45"]
)
def test_an_escape_of_anything_else_is_passed_over(escaped: str) -> None:
    assert messages(only(f"00 F7 {escaped}", A4)) == [A4_READ]


@pytest.mark.parametrize("system", ["F8", "FE", "F6", "F1 00", "F3 00", "F2 00 00"])
def test_live_messages_in_a_file_are_passed_over(system: str) -> None:
    assert messages(only(f"00 {system}", A4)) == [A4_READ]


@pytest.mark.parametrize("status", ["F4", "F5", "F9", "FD"])
def test_a_status_that_midi_does_not_define_stops_the_track(status: str) -> None:
    read = damaged(A4, f"00 {status}", A4)
    assert read.losses == (
        f"track 1 stopped at byte 27 of the file: {status} was found, which MIDI does not define",
    )
    assert messages(read.tracks[0]) == [A4_READ]


def test_a_velocity_above_127_is_read_as_127() -> None:
    assert messages(only("00 90 45 FF", "60 80 45 90")) == [(0, "90 45 7F"), (96, "80 45 7F")]


@pytest.mark.parametrize(("event", "shown"), [("90 C5 40", "C5 40"), ("E0 00 80", "00 80"), ("C0 80", "80")])
def test_another_value_above_127_stops_the_track(event: str, shown: str) -> None:
    read = damaged(A4, f"00 {event}", A4)
    assert read.losses == (f"track 1 stopped at byte 28 of the file: the values {shown} are above 7F",)
    assert messages(read.tracks[0]) == [A4_READ]


def test_a_time_of_more_than_four_bytes_stops_the_track() -> None:
    assert damaged(A4, "81 80 80 80 00 90 45 40").losses == (
        "track 1 stopped at byte 26 of the file: a time or a length takes more than 4 bytes",
    )


def test_times_beyond_the_cap_stop_the_track() -> None:
    # 4 * (2^28 - 1) = 1,073,741,820 is more than 1,000,000,000; the fourth begins at 22 + 3 * 7
    far = "FF FF FF 7F 90 45 40"
    read = damaged(far, far, far, far)
    assert read.losses == ("track 1 stopped at byte 43 of the file: it counts further than 1000000000 ticks",)
    assert len(read.tracks[0].events) == 3


def test_events_beyond_the_cap_are_left_out(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(midi_track, "MAX_EVENTS", 3)
    monkeypatch.setattr("melodycoach.sources.midi_file.MAX_EVENTS", 3)
    read = read_midi_file(midi(track(A4), track(A4, A4)))  # the end of a track is an event too
    assert [len(one.events) for one in read.tracks] == [1, 1]
    assert read.losses == (
        "track 2 stopped at byte 42 of the file: only the first 3 events of a file are read",
    )


@pytest.mark.parametrize(
    ("tail", "reason"),
    [
        ("00", "it ends after a time, where a message was expected"),
        ("81", "it ends inside a number"),
        ("00 90 45", "it ends inside a message"),
        ("00 FF", "it ends inside a message"),
        ("00 FF 03", "it ends inside a number"),
        ("00 F0 05 01", "5 bytes are announced, and 1 are left"),
        ("00 FF 03 7F 41", "127 bytes are announced, and 1 are left"),
        ("", "its end is missing"),
    ],
)
def test_a_track_that_breaks_off_keeps_what_came_before(tail: str, reason: str) -> None:
    data = bytes.fromhex(A4 + tail)
    # the length says 99, so it is not believed: the file has been cut
    read = read_midi_file(header(1) + b"MTrk" + (99).to_bytes(4) + data)
    [loss] = read.losses
    assert loss.startswith("track 1 stopped at byte ")
    assert loss.endswith(f" of the file: {reason}")
    assert messages(read.tracks[0]) == [A4_READ]


def test_names_are_read_once() -> None:
    one = only(name("Ney"), name("Other"), "00 FF 04 02 55 64")
    assert (one.name, one.instrument) == ("Ney", "Ud")


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "cp1254"])
def test_turkish_names_are_read_in_either_encoding(encoding: str) -> None:
    assert only(name("Uşşak Peşrevi, İkinci", encoding)).name == "Uşşak Peşrevi, İkinci"


def test_a_name_in_no_known_encoding_is_read_all_the_same() -> None:
    # 81 is no letter in the Turkish code page; Latin-1 takes every byte, and controls become spaces
    assert decode_text(b"\x81 a\x00\n b\xfe") == "a bþ"


def test_a_long_name_is_cut_between_letters() -> None:
    # 199 bytes, then two-byte letters: the cut at 200 would fall inside the first
    assert decode_text(("x" * 199 + "şşş").encode()) == "x" * 199
    assert decode_text(b"\x80" * 300) == ""


def test_the_end_of_the_track_has_a_tick() -> None:
    assert only(A4, "81 48 80 45 40").end_tick == 200


def test_music_after_the_end_of_the_track_is_read() -> None:
    assert messages(only(A4, END, "60 80 45 40")) == [A4_READ, (96, "80 45 40")]


def test_zeros_after_the_end_of_the_track_say_nothing() -> None:
    data = bytes.fromhex(f"{A4} {END}") + bytes(5)
    read = read_midi_file(header(1) + chunk(b"MTrk", data))
    assert (read.losses, messages(read.tracks[0])) == ((), [A4_READ])


@pytest.mark.parametrize(
    ("meta", "what"),
    [
        ("51 03 00 00 00", "tempo"),  # time would stand still
        ("51 03 00 27 0F", "tempo"),  # 9,999 microseconds a quarter: more than 6,000 a minute
        ("51 02 07 A1", "tempo"),
        ("51 04 07 A1 20 00", "tempo"),
        ("51 00", "tempo"),
        ("58 04 00 02 18 08", "time signature"),  # no beats
        ("58 04 04 20 18 08", "time signature"),  # beats of 1/2^32
        ("58 01 04", "time signature"),
        ("59 02 40 40", "key signature"),
        ("59 02 08 00", "key signature"),
        ("59 02 F8 00", "key signature"),
        ("59 01 00", "key signature"),
        ("59 00", "key signature"),
    ],
)
def test_a_bad_meta_event_loses_only_itself(meta: str, what: str) -> None:
    read = damaged(f"00 FF {meta}", A4)
    assert read.losses == (f"track 1: the {what} at byte 23 of the file is damaged and was passed over",)
    assert messages(read.tracks[0]) == [A4_READ]
    assert (read.tracks[0].tempos, read.tracks[0].signatures) == ((), ())


def test_good_meta_events_are_read() -> None:
    # 07 A1 20 = 500,000; 9 beats of 1/2^3; five flats, minor; a marker, a port, something unknown
    one = only(
        *("00 FF 51 03 07 A1 20", "60 FF 58 04 09 03 18 08", "00 FF 59 02 FB 01"),
        *("00 FF 06 01 41", "00 FF 21 01 00", "00 FF 7A 02 01 02", "00 FF 58 02 02 02"),
    )
    assert one.tempos == ((0, 500_000),)
    assert [(sign.tick, sign.beats, sign.unit) for sign in one.signatures] == [(96, 9, 8), (96, 2, 4)]


channel_messages = st.builds(
    lambda kind, channel, values: mido.Message.from_bytes(
        [kind | channel, *values[: 1 if kind & 0xE0 == 0xC0 else 2]]
    ),
    st.sampled_from([0x80, 0x90, 0xA0, 0xB0, 0xC0, 0xD0, 0xE0]),
    st.integers(0, 15),
    st.tuples(st.integers(0, 127), st.integers(0, 127)),
)
sysex_messages = st.builds(
    lambda data: mido.Message("sysex", data=data), st.lists(st.integers(0, 127), max_size=200)
)


@given(st.lists(st.tuples(st.one_of(channel_messages, sysex_messages), st.integers(0, 2**28 - 1))))
def test_what_mido_writes_is_read_as_the_same_messages(timed: list[tuple[mido.Message, int]]) -> None:
    timed = timed[:3]  # longer ones would count beyond the cap
    written = mido.MidiFile(type=0)
    written.tracks.append(mido.MidiTrack(message.copy(time=time) for message, time in timed))
    file = io.BytesIO()
    written.save(file=file)
    [one] = read_midi_file(file.getvalue()).tracks
    ticks, total = [], 0
    for _, time in timed:
        total += time
        ticks.append(total)
    assert [message for _, message in one.events] == [bytes(message.bytes()) for message, _ in timed]
    assert [tick for tick, _ in one.events] == ticks
