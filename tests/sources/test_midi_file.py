"""MIDI files as a whole: headers, chunks, wrappers, damages, caps.

Outside sources: Standard MIDI Files 1.0 (RP-001) for chunks, formats and division. mido, a general
MIDI library, writes files that are read here; it refuses most of the damaged ones. The list of
damages is that of files which are known to break readers, found by trying mido with them.
"""

from __future__ import annotations

import io
import time
import tracemalloc
from contextlib import suppress

import mido
import pytest
from hypothesis import given
from hypothesis import strategies as st
from midi_bytes import END, chunk, header, midi, name, note, notes, tempo, track

from melodycoach.errors import MelodycoachError, MusicFileError
from melodycoach.sources import midi_file
from melodycoach.sources.midi_file import MAX_FILE_BYTES, MidiFile, read_midi_file

ONE_NOTE = track(note(69))
TWO_NOTES = track(notes(69, 71))


def counts(read: MidiFile) -> list[int]:
    """How many note-ons each track has."""
    return [sum(message[0] & 0xF0 == 0x90 for _, message in one.events) for one in read.tracks]


def saved(written: mido.MidiFile) -> bytes:
    file = io.BytesIO()
    written.save(file=file)
    return file.getvalue()


def test_a_whole_file_in_hex_is_read() -> None:
    read = read_midi_file(
        bytes.fromhex(
            "4D 54 68 64 00 00 00 06  00 01 00 02 01 E0"  # MThd, 6 bytes: format 1, 2 tracks, 480 a quarter
            "4D 54 72 6B 00 00 00 13"  # MTrk, 19 bytes
            "00 FF 51 03 0F 42 40"  # 1,000,000 microseconds a quarter
            "00 FF 58 04 0A 03 18 08"  # 10/8
            "00 FF 2F 00"
            "4D 54 72 6B 00 00 00 15"  # MTrk, 21 bytes
            "00 FF 03 03 4E 65 79"  # its name: Ney
            "00 90 45 40  83 60 45 00"  # A4 down, and after 480 ticks up, by running status
            "00 FF 2F 00"
        )
    )
    assert read.losses == ()
    first, second = read.tracks
    assert (second.number, second.name, second.end_tick) == (2, "Ney", 480)
    assert [message.hex() for _, message in second.events] == ["904540", "904500"]
    # tempo and time signature stand in the first track and hold for the second
    assert read.tempo_map(second).seconds(480) == 1.0
    assert [(sign.beats, sign.unit) for sign in read.signatures(second)] == [(10, 8)]
    assert (first.tempos, second.tempos) == (((0, 1_000_000),), ())


def test_tempos_of_any_track_hold_for_all() -> None:
    read = read_midi_file(midi(track(note(69)), track(tempo(250_000), note(69))))
    assert read.tempo_map(read.tracks[0]).seconds(480) == 0.25


def test_tracks_that_are_apart_have_each_its_time() -> None:
    read = read_midi_file(midi(track(note(69)), track(tempo(250_000), note(69)), midi_format=2))
    assert read.tracks_apart
    assert [read.tempo_map(one).seconds(480) for one in read.tracks] == [0.5, 0.25]


@pytest.mark.parametrize(
    "wrapper",
    [
        b"RIFF" + (99).to_bytes(4, "little") + b"RMIDdata" + (99).to_bytes(4, "little"),
        b"\x00" * 128,
        b"rubbish MT " * 300,
        b"MThX",
    ],
)
def test_a_header_is_found_behind_a_wrapper_or_rubbish(wrapper: bytes) -> None:
    read = read_midi_file(wrapper + midi(ONE_NOTE))
    assert (counts(read), read.losses) == ([1], ())


@pytest.mark.parametrize("tail", [b"", b"\x00" * 7, b"LIST\x04\x00\x00\x00INFO", b"the end", b"\r\n"])
def test_what_stands_behind_the_last_track_says_nothing(tail: bytes) -> None:
    read = read_midi_file(midi(ONE_NOTE) + tail)
    assert (counts(read), read.losses) == ([1], ())


def test_unknown_chunks_are_passed_over() -> None:
    data = header(2) + ONE_NOTE + chunk(b"XFIH", b"\x90\x45\x40" * 5) + chunk(b"ABCD", b"") + TWO_NOTES
    read = read_midi_file(data)
    assert (counts(read), read.losses) == ([1, 2], ())


def test_rubbish_between_tracks_is_told() -> None:
    # the header takes 14 bytes, the first track 8 + 13
    read = read_midi_file(header(2) + ONE_NOTE + b"\xff" * 5 + TWO_NOTES)
    assert counts(read) == [1, 2]
    assert read.losses == ("5 bytes from byte 35 of the file on belong to no track",)


def test_a_longer_header_is_passed_over() -> None:
    read = read_midi_file(chunk(b"MThd", bytes.fromhex("0001 0001 01E0 AAAA BBBB")) + ONE_NOTE)
    assert (counts(read), read.losses) == ([1], ())


@pytest.mark.parametrize("length", [0, 5, 9, 0xFFFFFFFF])
def test_a_header_of_a_wrong_length_is_read(length: int) -> None:
    data = b"MThd" + length.to_bytes(4) + bytes.fromhex("0001 0001 01E0") + ONE_NOTE
    read = read_midi_file(data)
    assert (counts(read), read.losses) == ([1], ())


def test_a_missing_header_is_told() -> None:
    read = read_midi_file(ONE_NOTE)
    assert counts(read) == [1]
    assert read.losses == (
        "the file header is missing",
        "the file does not say how it counts time (division 0000); 480 ticks a quarter note were assumed",
    )


def test_a_file_that_ends_in_its_header_is_told() -> None:
    read = read_midi_file(midi(ONE_NOTE)[:11])
    assert read.tracks == ()
    assert read.losses[0] == "the file ends in its header, at byte 11"


@pytest.mark.parametrize("division", [0, 0xFF00, 0xE700, 0x9960])
def test_a_division_that_means_nothing_is_told(division: int) -> None:
    read = read_midi_file(midi(ONE_NOTE, division=division))
    assert read.tempo_map(read.tracks[0]).seconds(480) == 0.5
    assumed = "480 ticks a quarter note were assumed"
    assert read.losses == (f"the file does not say how it counts time (division {division:04X}); {assumed}",)


def test_an_unknown_format_is_read_as_format_1() -> None:
    read = read_midi_file(midi(ONE_NOTE, TWO_NOTES, midi_format=7))
    assert (counts(read), read.tracks_apart) == ([1, 2], False)
    assert read.losses == ("the file is of format 7, which MIDI does not define; it was read as format 1",)


@pytest.mark.parametrize("n_said", [0, 1])
def test_more_tracks_than_said_are_read(n_said: int) -> None:
    read = read_midi_file(header(n_said) + ONE_NOTE + TWO_NOTES)
    assert (counts(read), read.losses) == ([1, 2], ())


def test_a_single_track_that_is_missing_is_told_in_the_singular() -> None:
    assert read_midi_file(header(1)).losses == ("the file says that it holds 1 track, and 0 were found",)


@pytest.mark.parametrize("n_said", [3, 0x8000])
def test_fewer_tracks_than_said_are_told(n_said: int) -> None:
    read = read_midi_file(header(n_said) + ONE_NOTE + TWO_NOTES)
    assert counts(read) == [1, 2]
    assert read.losses == (f"the file says that it holds {n_said} tracks, and 2 were found",)


@pytest.mark.parametrize("length", [0, 1, 5, 12, 14, 400, 0xFFFFFFFF])
def test_a_track_of_a_wrong_length_is_read_whole(length: int) -> None:
    # ONE_NOTE holds 13 bytes; a length that leads to no chunk is not believed
    wrong = b"MTrk" + length.to_bytes(4) + ONE_NOTE[8:]
    read = read_midi_file(header(2) + wrong + TWO_NOTES)
    assert (counts(read), read.losses) == ([1, 2], ())


def test_a_length_that_swallows_the_next_track_is_not_believed() -> None:
    wrong = b"MTrk" + (len(ONE_NOTE) - 8 + len(TWO_NOTES)).to_bytes(4) + ONE_NOTE[8:]
    read = read_midi_file(header(2) + wrong + TWO_NOTES)
    assert (counts(read), read.losses) == ([1, 2], ())


def test_a_missing_end_of_track_loses_nothing() -> None:
    data = chunk(b"MTrk", bytes.fromhex(notes(69, 71)))
    read = read_midi_file(header(2) + data + ONE_NOTE)
    assert (counts(read), read.losses) == ([2, 1], ())


def test_a_damaged_track_does_not_harm_the_next() -> None:
    # 14 + 8 = 22: the note takes 9 bytes, a time one more
    broken = track(note(69), "00 F4 00", note(71))
    read = read_midi_file(header(2) + broken + TWO_NOTES)
    assert counts(read) == [1, 2]
    assert read.losses == (
        "track 1 stopped at byte 32 of the file: F4 was found, which MIDI does not define",
    )


def test_every_way_to_cut_a_file_keeps_what_came_before() -> None:
    data = midi(track(tempo(400_000)), track(name("Ney"), notes(69, 71, 72), note(74)))
    whole = read_midi_file(data)
    events = [event for one in whole.tracks for event in one.events]
    for length in range(14, len(data)):
        cut = read_midi_file(data[:length])
        kept = [event for one in cut.tracks for event in one.events]
        assert kept == events[: len(kept)]
        assert cut.losses, f"cut at {length}, nothing told"
        at_most_lost = (len(data) - length) // 4 + 2  # an event of a note takes 4 or 5 bytes
        assert len(kept) >= len(events) - at_most_lost


def test_losses_are_told_up_to_a_number() -> None:
    read = read_midi_file(midi(*[track("00 FF 59 00")] * 30))
    assert len(read.losses) == 21
    assert read.losses[-1] == "and 10 more of this kind"


def test_tracks_beyond_the_cap_are_left_out(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(midi_file, "MAX_CHUNKS", 2)
    read = read_midi_file(midi(ONE_NOTE, TWO_NOTES, ONE_NOTE))
    assert counts(read) == [1, 2]
    assert read.losses[0] == "what comes after the first 2 tracks was left out"
    assert read_midi_file(midi(ONE_NOTE, TWO_NOTES)).losses == ()


def test_a_file_beyond_the_cap_is_refused() -> None:
    with pytest.raises(MusicFileError) as refused:
        read_midi_file(bytes(MAX_FILE_BYTES + 1), "long.mid")
    assert str(refused.value) == (
        "long.mid: 16777217 bytes found, at most 16777216 can be read; save the melody alone as a MIDI file"
    )


@pytest.mark.parametrize("data", [b"", b"MTh", b"A4 B4-1 C5", b"\x00" * 100_000 + b"MThd"])
def test_what_is_no_midi_file_is_refused(data: bytes) -> None:
    with pytest.raises(MusicFileError) as refused:
        read_midi_file(data, "a.mid")
    assert str(refused.value) == (
        "a.mid: no MIDI file header found; expected a Standard MIDI File (.mid); save it anew as one"
    )


timed_notes = st.lists(
    st.tuples(st.integers(0, 127), st.integers(1, 127), st.integers(0, 5000), st.integers(0, 15)), max_size=30
)


@given(
    st.lists(timed_notes, max_size=4),
    st.integers(1, 0x7FFF),
    st.lists(st.integers(10_000, 0xFFFFFF), max_size=3),
)
def test_files_that_mido_writes_are_read_the_same(
    tracks: list[list[tuple[int, int, int, int]]], division: int, tempos: list[int]
) -> None:
    written = mido.MidiFile(type=1, ticks_per_beat=division)
    conductor = mido.MidiTrack(
        mido.MetaMessage("set_tempo", tempo=one, time=700 * place) for place, one in enumerate(tempos)
    )
    written.tracks = [conductor] + [
        mido.MidiTrack(
            mido.Message(kind, note=key, velocity=velocity, channel=channel, time=time)
            for key, velocity, time, channel in one
            for kind in ("note_on", "note_off")
        )
        for one in tracks
    ]
    read = read_midi_file(saved(written))
    assert read.losses == ()
    for theirs, ours in zip(written.tracks, read.tracks, strict=True):
        expected = [bytes(message.bytes()) for message in theirs if not message.is_meta]
        assert [message for _, message in ours.events] == expected
    # mido's own walk over the merged file gives seconds
    heard, now_s = [], 0.0
    for message in written:
        now_s += message.time
        if not message.is_meta:
            heard.append(now_s)
    seconds = read.tempo_map(read.tracks[0]).seconds
    ours_s = sorted(seconds(tick) for one in read.tracks for tick, _ in one.events)
    assert ours_s == pytest.approx(heard, rel=1e-6, abs=1e-6)


VALID = midi(
    track(name("Yol"), tempo(400_000), "00 FF 58 04 09 03 18 08", "00 FF 59 02 FE 01"),
    track(name("Ney"), "00 E0 61 38", notes(69, 71, 72, 74), "00 F0 05 7E 7F 09 01 F7", notes(72, 71)),
    track(notes(36, 38, channel=10), END),
)


@given(st.binary(max_size=400))
def test_no_bytes_raise_anything_but_our_own_errors(data: bytes) -> None:
    for start in (b"", header(2), header(1) + b"MTrk" + len(data).to_bytes(4)):
        with suppress(MelodycoachError):
            read_midi_file(start + data)


@given(st.lists(st.tuples(st.integers(0, len(VALID) - 1), st.integers(0, 255)), min_size=1, max_size=6))
def test_no_change_of_bytes_breaks_the_reader(changes: list[tuple[int, int]]) -> None:
    data = bytearray(VALID)
    for place, byte in changes:
        data[place] = byte
    with suppress(MelodycoachError):
        read = read_midi_file(bytes(data))
        assert all(message[0] >= 0x80 for one in read.tracks for _, message in one.events)


def hostile(events: str, times: int) -> bytes:
    """A file of one track that says the same over and over."""
    return header(1) + chunk(b"MTrk", bytes.fromhex(events) * times)


# one packet of 2 MiB, and then very many that go on with it
MANY_PACKETS = bytes.fromhex("00 F0 FF FF 7F") + b"1" * (2**21 - 1) + b"\x00\xf7\x01\x01" * 100_000


@pytest.mark.slow
@pytest.mark.parametrize(
    "data",
    [
        chunk(b"XXXX", b"") * 2_000_000,
        chunk(b"MTrk", b"") * 2_000_000,
        chunk(b"MTrk", MANY_PACKETS),
        chunk(b"MTrk", bytes.fromhex("00 FF 59 00") * 200_000),
        bytes(16_000_000),
    ],
    ids=["chunks", "tracks", "packets", "bad metas", "zeros"],
)
def test_large_and_hostile_files_are_read_in_time(data: bytes) -> None:
    # each takes some tenths of a second; work that grows with the square of the size takes minutes
    began_s = time.perf_counter()
    read_midi_file(header(1) + data)
    assert time.perf_counter() - began_s < 10


@pytest.mark.slow
def test_a_hundred_thousand_events_take_no_two_seconds() -> None:
    written = mido.MidiFile(type=0)
    one = mido.MidiTrack()
    for place in range(50_000):
        one.append(mido.Message("note_on", note=60 + place % 12, velocity=1 + place % 100, time=3))
        one.append(mido.Message("note_off", note=60 + place % 12, time=97))
    written.tracks.append(one)
    data = saved(written)
    began_s = time.perf_counter()
    read = read_midi_file(data)
    assert time.perf_counter() - began_s < 2
    assert counts(read) == [50_000]
    tracemalloc.start()
    read_midi_file(data)
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert peak < 30e6  # of the 300 MB that the program may take for such a file
