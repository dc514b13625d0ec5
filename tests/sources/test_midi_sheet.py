"""MIDI files become lines: notes, times, bars, and what is said of them.

Outside sources: MIDI 1.0 and Standard MIDI Files 1.0 (RP-001) for bends, tempo and time signature;
MPE (RP-053). mido, a general MIDI library, writes files and reckons their times by itself.
"""

from __future__ import annotations

import io
import time
import tracemalloc
from contextlib import suppress
from itertools import pairwise

import mido
import pytest
from hypothesis import given
from hypothesis import strategies as st
from midi_bytes import chord, midi, name, note, notes, tempo, track

from melodycoach.core.note import InputKind, Mark, Note, Silence
from melodycoach.core.sheet import Place, Sheet, SheetKind
from melodycoach.errors import MelodycoachError, UsageError
from melodycoach.sources.midi_sheet import read_midi

COMMA = 1200 / 53
TWO_FOUR = "00 FF 58 04 02 02 18 08"
BEND_A_COMMA_DOWN = "00 E0 61 38"  # at two semitones: 0x61 + 128 * 0x38 = 7265, 927 below the middle
OFF = "07 B0 07 64"  # a volume, seven ticks late: what follows is off the beats, as if it were played
RANGE_12 = "00 B0 65 00 00 B0 64 00 00 B0 06 0C"


def read(*tracks: bytes, midi_format: int = 1, division: int = 480, **asked: object) -> Sheet:
    return read_midi(midi(*tracks, midi_format=midi_format, division=division), "a.mid", **asked)  # type: ignore[arg-type]


def line(sheet: Sheet) -> list[Note]:
    return [item for item in sheet.items if isinstance(item, Note)]


def pitches(sheet: Sheet) -> list[float]:
    return [round(one.pitch_cents, 1) for one in line(sheet)]


def spans(sheet: Sheet) -> list[tuple[float, float]]:
    return [(one.onset_s, one.duration_s) for one in line(sheet)]


def test_a_melody_is_read() -> None:
    sheet = read(track(name("Sabah Yolu"), tempo(1_000_000), TWO_FOUR), track(name("Ney"), notes(69, 71, 72)))
    keys = InputKind.KEYS
    assert sheet == Sheet(
        kind=SheetKind.MIDI,
        items=(
            Note(6900, 0, 1, keys, beats=1),
            Note(7100, 1, 1, keys, beats=1),
            Mark.BAR,
            Note(7200, 2, 1, keys, beats=1),
            Mark.PHRASE_END,
        ),
        places=(Place("1", 1, "0:00.0"), Place("1", 2, "0:01.0"), Place("2", 1, "0:02.0")),
        title="Sabah Yolu",
        tempo=60,
        says=(
            "took track 2 'Ney' (channel 1, 3 notes) of 2 tracks: the only one with notes that are no drums",
            "plain keys: no bend or tuning moves a note, so each key stands for every pitch near it",
            "its notes lie on the beats, as written: one beat is a quarter note, the usual note of the line",
        ),
    )


def test_what_was_played_has_seconds_and_no_beats() -> None:
    sheet = read(track(tempo(960_000), OFF, notes(69, 71)))  # a tick is 2 ms
    keys = InputKind.KEYS
    assert sheet.items == (Note(6900, 0.014, 0.96, keys), Note(7100, 0.974, 0.96, keys), Mark.PHRASE_END)
    assert sheet.tempo == 62.5
    assert sheet.says[2] == "its notes lie off the beats, as played: lengths are taken in seconds"


def test_a_tempo_change_is_followed() -> None:
    # 120 a minute for one quarter, then 60
    sheet = read(track(tempo(500_000), notes(69), tempo(1_000_000), notes(71)))
    assert spans(sheet) == [(0, 0.5), (0.5, 1)]
    assert [one.beats for one in line(sheet)] == [1, 1]


def test_the_tempo_is_that_in_force_when_the_first_note_sounds() -> None:
    # two at one tick, the last of which holds; then another, later
    assert read(track(tempo(500_000), tempo(600_000), notes(69), tempo(1_000_000), notes(71))).tempo == 100
    assert read(track(notes(69), tempo(1_000_000), notes(71))).tempo is None
    # a beat is an eighth
    assert read(track(tempo(500_000), notes(69, 71, ticks=240))).tempo == 240


def test_without_a_tempo_none_is_given() -> None:
    assert read(track(notes(69))).tempo is None


def test_film_frames_have_no_bars() -> None:
    sheet = read(track(tempo(250_000), TWO_FOUR, note(69, ticks=1500)), division=0xE728)
    assert (spans(sheet), sheet.tempo) == ([(0, 1.5)], None)
    assert sheet.places == (Place(at="0:00.0"),)
    assert Mark.BAR not in sheet.items
    assert sheet.says[-1] == (
        "the file counts in film frames and not in beats, so its notes are placed by time alone"
    )


def test_without_a_time_signature_there_are_no_bar_lines() -> None:
    sheet = read(track(notes(69, 71, 72, 74, 76)))
    assert Mark.BAR not in sheet.items
    assert (sheet.places[4].bar, sheet.places[4].beat) == ("2", 1)
    assert sheet.says[-1] == "the file gives no time signature; bars are counted in 4/4"


def test_one_bar_line_stands_before_a_note_however_many_bars_are_empty() -> None:
    # a bar of 2/4 is 960 ticks; the second note begins in the fourth bar, 2.5 s after the first ends
    sheet = read(track(TWO_FOUR, note(69), note(71, wait=2400)))
    assert sheet.items[1:3] == (Silence(2.5, beats=5), Mark.PHRASE_END)  # 2,400 ticks are five quarters
    assert [item for item in sheet.items if isinstance(item, Mark)] == [
        Mark.PHRASE_END,
        Mark.BAR,
        Mark.PHRASE_END,
    ]
    assert sheet.places[1] == Place("4", 1, "0:03.0")


def test_minutes_are_counted() -> None:
    # 125 quarters of half a second, and 0.25 s
    assert read(track(note(69, wait=125 * 480 + 240))).places[0].at == "1:02.8"


@pytest.mark.parametrize("before", ["", OFF])
def test_the_line_ends_with_a_phrase_end_and_nothing_after(before: str) -> None:
    # C5 is the melody; A4 under it hangs until the track ends, three seconds after C5
    sheet = read(track(before, "00 90 45 40 00 90 48 40", "83 60 80 48 40", "96 40 B0 07 40"))
    assert pitches(sheet) == [7200]
    assert sheet.items[-1] is Mark.PHRASE_END
    assert isinstance(sheet.items[-2], Note)


def test_a_note_that_never_ends_ends_with_its_track() -> None:
    sheet = read(track("00 90 45 40", "83 60 FF 06 01 41"))
    assert spans(sheet) == [(0, 0.5)]


def test_a_release_without_a_strike_says_nothing() -> None:
    assert pitches(read(track("00 80 45 40", "00 90 40 00", notes(71)))) == [7100]


def test_velocity_zero_ends_the_note() -> None:
    assert spans(read(track("00 90 45 40", "83 60 45 00"))) == [(0, 0.5)]


def test_a_pedal_does_not_prolong_a_note() -> None:
    sheet = read(track("00 B0 40 7F", note(69), "87 40 B0 40 00", note(71)))
    assert spans(sheet)[0] == (0, 0.5)


def test_a_key_struck_again_at_the_tick_of_its_release_sounds_on() -> None:
    # on, then at 480 on before off, twice; the last off at 1440
    again = "00 90 45 40 83 60 90 45 40 00 80 45 40 83 60 90 45 40 00 80 45 40 83 60 80 45 40"
    assert spans(read(track(again))) == [(0, 0.5), (0.5, 0.5), (1, 0.5)]


def test_a_key_struck_again_while_it_is_down_sounds_to_its_second_release() -> None:
    # on 0, on 480, off 600, off 960: the first release is that of the first strike
    overlap = "00 90 45 40 83 60 90 45 40 78 80 45 40 82 68 80 45 40"
    assert spans(read(track(overlap))) == [(0, 0.5), (0.5, 0.5)]


def test_a_grace_note_whose_release_is_written_first_is_left_out() -> None:
    # B4 has no length: released and struck at the tick at which A4 begins, and struck again later
    grace = "00 80 47 40 00 90 47 40 00 90 45 40 83 60 80 45 40"
    sheet = read(track(grace, notes(72, 71)))
    assert pitches(sheet) == [6900, 7200, 7100]
    assert spans(sheet) == [(0, 0.5), (0.5, 0.5), (1, 0.5)]
    assert sheet.says[3] == "1 note without length, as grace notes are, left out"


def test_a_key_whose_release_is_missing_ends_with_the_next_one() -> None:
    # on 0 without release, on 480, off 720, on 960, off 1200
    missing = "00 90 45 40 83 60 90 45 40 81 70 80 45 40 81 70 90 45 40 81 70 80 45 40"
    assert spans(read(track(missing))) == [(0, 0.5), (0.5, 0.25), (1, 0.25)]


def test_a_key_held_under_another_keeps_its_release() -> None:
    # A4 down; C5 down and up; A4 up: the newest wins, and the releases match by key
    held = "00 90 45 40 83 60 90 48 40 83 60 80 48 40 83 60 80 45 40"
    assert spans(read(track(held))) == [(0, 0.5), (0.5, 0.5)]


def test_the_top_of_a_chord_is_the_melody_and_stands_where_it_was_struck() -> None:
    sheet = read(track(TWO_FOUR, notes(69), chord(60, 64, 72), notes(71)))
    assert pitches(sheet) == [6900, 7200, 7100]
    assert [(place.bar, place.beat) for place in sheet.places] == [("1", 1), ("1", 2), ("2", 1)]


def test_bends_are_read_in_their_usual_range() -> None:
    sheet = read(track(BEND_A_COMMA_DOWN, OFF, notes(64)))
    [one] = line(sheet)
    assert one.pitch_cents == pytest.approx(6400 - COMMA, abs=0.02)
    assert one.kind is InputKind.TUNED
    assert sheet.says[1] == (
        "pitch bends are read with a range of ±2 semitones (none was sent: MIDI's usual range)"
    )


def test_a_bend_range_in_another_track_holds() -> None:
    # at 12 semitones: 0x65 + 128 * 0x3E = 8037, 155 below the middle: -155 / 8192 * 1200 = -22.7
    sheet = read(track(RANGE_12), track("00 E0 65 3E", OFF, notes(64)))
    assert pitches(sheet) == [6377.3]
    assert sheet.says[1] == "pitch bends are read with a range of ±12 semitones"


def test_a_setup_in_a_later_track_holds_from_its_tick() -> None:
    sheet = read(track("00 E0 65 3E", OFF, notes(64, 65)), track("83 67 B0 65 00 00 B0 64 00 00 B0 06 0C"))
    # -155 / 8192 * 200 = -3.8 until the second note
    assert pitches(sheet)[1] == 6477.3


def test_the_bends_of_another_part_on_the_same_channel_are_its_own() -> None:
    assert pitches(read(track(name("Ney"), notes(74, 76)), track(BEND_A_COMMA_DOWN, notes(45, 47)))) == [
        7400,
        7600,
    ]


def test_a_tuning_message_in_any_track_is_read() -> None:
    # MIDI Tuning Standard, octave form of one byte: every E 23 cents lower, on all channels
    sysex = "00 F0 14 7E 7F 08 08 03 7F 7F 40 40 40 40 29 40 40 40 40 40 40 40 F7"
    sheet = read(track(sysex), track(OFF, notes(64, 65)))
    assert pitches(sheet) == [6377, 6500]
    assert sheet.says[2] == "tuning messages were read: E -23 cents, in every octave"


def test_a_tuning_message_for_one_key_is_told() -> None:
    # MIDI Tuning Standard, single-note change: E4 to 3F 63 02, -22.644 cents
    sheet = read(track("00 F0 0B 7F 7F 08 02 00 01 40 3F 63 02 F7", OFF, notes(64, 76)))
    assert pitches(sheet) == [6377.4, 7600]
    assert sheet.says[2] == "tuning messages were read: they move 1 key of 128"


def test_fine_tuning_is_told() -> None:
    # RPN 1, coarse byte 20 hex: half of the way down, -50 cents
    sheet = read(track("00 B0 65 00 00 B0 64 01 00 B0 06 20", notes(69)))
    assert pitches(sheet) == [6850]
    assert sheet.says[2] == "the channel is tuned by -50 cents as a whole"


def test_a_concert_pitch_moves_no_note_and_is_told() -> None:
    # master fine tuning 7F 41: (0x41 << 7 | 0x7F) - 8192 = 255 of 8192 of a semitone, 3.1 cents
    sheet = read(track("00 F0 07 7F 7F 04 03 7F 41 F7", notes(69)))
    assert pitches(sheet) == [6900]
    assert sheet.says[2] == (
        "the file asks for a concert pitch +3 cents off A4 = 440 Hz; the notes are read as they stand"
    )


def test_damaged_tuning_messages_are_told_as_lost() -> None:
    sheet = read(track("00 F0 05 7E 7F 08 08 F7", notes(69)))
    assert sheet.lost == ("1 damaged message among those that tune were passed over",)


def test_an_mpe_zone_is_one_line_with_the_range_of_its_members() -> None:
    # RP-053: a member bends by 48 semitones; 0x59 + 128 * 0x3F = 8153, 39 below: -39 / 8192 * 4800 = -22.9
    zone = "00 B0 65 00 00 B0 64 06 00 B0 06 03"
    first = "00 E1 59 3F 07 91 45 40 83 60 81 45 40"
    second = "00 E2 00 40 00 92 47 40 83 60 82 47 40"
    sheet = read(track(zone), track(first, second))
    assert pitches(sheet) == [6877.1, 7100]
    assert all(one.kind is InputKind.TUNED for one in line(sheet))
    assert sheet.says[1] == "pitch bends are read with a range of ±48 semitones"
    assert sheet.says[0].startswith("took track 2 (channels 2 and 3, 2 notes) of 2 tracks: ")


def test_what_is_left_out_is_told() -> None:
    drums = notes(36, 38, channel=10)
    sheet = read(track(name("Ney"), notes(69, 71)), track(name("Bas"), notes(45)), track(drums))
    assert sheet.says[0] == (
        "took track 1 'Ney' (channel 1, 2 notes) of 3 tracks: it always sounds one note at a time, it is the "
        "highest, it has many notes, its name speaks of a melody; --track and --channel choose another, "
        "such as track 2 'Bas' (channel 1, 1 note)"
    )
    assert sheet.says[3:5] == ("2 drum notes on channel 10 left out", "1 note of 1 other part left out")


def test_a_track_and_a_channel_can_be_asked_for() -> None:
    tracks = (track(name("Ney"), notes(69, 71)), track(name("Bas"), notes(45), notes(36, channel=10)))
    assert pitches(read(*tracks, track="bas")) == [4500]
    assert pitches(read(*tracks, track="2", channel=10)) == [3600]
    assert pitches(read(*tracks, channel=1)) == [6900, 7100]


@pytest.mark.parametrize("channel", [0, 17, -1])
def test_a_channel_that_midi_does_not_have_is_refused(channel: int) -> None:
    with pytest.raises(UsageError) as refused:
        read(track(notes(69)), channel=channel)
    assert str(refused.value) == f"--channel: {channel} was found, expected a channel from 1 to 16"


def test_tracks_that_are_apart_do_not_mix() -> None:
    # format 2: neither the tempo nor the bend range of the first track holds for the second
    sheet = read(
        track(tempo(1_000_000), RANGE_12),
        track(name("İkinci"), BEND_A_COMMA_DOWN, OFF, notes(64)),
        midi_format=2,
    )
    assert [length for _, length in spans(sheet)] == [0.5]
    assert (sheet.tempo, sheet.title) == (None, "İkinci")
    assert pitches(sheet) == [6377.4]


def test_losses_are_handed_on() -> None:
    sheet = read(track(notes(69), "00 F4"))
    assert (pitches(sheet), len(sheet.lost)) == ([6900], 1)


def test_channel_10_is_read_where_a_zone_takes_it_in_late() -> None:
    late = "00 B0 65 00 00 B0 64 06 00 B0 06 0F"
    assert pitches(read(track(notes(69, channel=10), late))) == [6900]


@pytest.mark.parametrize(
    ("track_name", "title"),
    [
        ("Sabah Yolu", "Sabah Yolu"),
        ("Ney Taksimi", "Ney Taksimi"),
        ("Grand Piano", ""),
        ("Keman 2", ""),
        ("Track-1", ""),
        ("SAĞ EL", ""),
        ("", ""),
    ],
)
def test_a_title_is_no_name_of_an_instrument(track_name: str, title: str) -> None:
    assert read(track(name(track_name), notes(69))).title == title


def test_a_track_named_like_its_instrument_gives_no_title() -> None:
    assert read(track(name("Zurna"), "00 FF 04 05 5A 75 72 6E 61", notes(69))).title == ""


melodies = st.lists(
    st.tuples(st.integers(0, 127), st.integers(10, 2000), st.integers(0, 3000)), min_size=1, max_size=30
)


@given(melodies, st.integers(60, 960), st.lists(st.integers(100_000, 2_000_000), max_size=3))
def test_a_melody_that_mido_writes_has_the_same_notes_and_times(
    melody: list[tuple[int, int, int]], division: int, tempos: list[int]
) -> None:
    written = mido.MidiFile(type=1, ticks_per_beat=division)
    written.tracks.append(
        mido.MidiTrack(
            mido.MetaMessage("set_tempo", tempo=one, time=division * place)
            for place, one in enumerate(tempos)
        )
    )
    one = mido.MidiTrack()
    for key, length, wait in melody:
        one.append(mido.Message("note_on", note=key, time=wait))
        one.append(mido.Message("note_off", note=key, time=length))
    written.tracks.append(one)
    file = io.BytesIO()
    written.save(file=file)
    heard, now_s = [], 0.0
    for message in written:
        now_s += message.time
        if not message.is_meta:
            heard.append(now_s)
    sheet = read_midi(file.getvalue(), "a.mid")
    assert pitches(sheet) == [100.0 * key for key, _, _ in melody]
    assert [at for onset, length in spans(sheet) for at in (onset, onset + length)] == pytest.approx(heard)
    assert len(sheet.places) == len(melody)


VALID = midi(
    track(name("Yol"), tempo(400_000), "00 FF 58 04 09 03 18 08"),
    track(
        name("Ney"), RANGE_12, BEND_A_COMMA_DOWN, notes(69, 71, 72, 74), chord(60, 64), notes(72, channel=3)
    ),
    track("00 F0 0C 7F 7F 08 02 00 01 40 3F 63 02 00 F7", notes(36, 38, channel=10)),
)


@given(
    st.lists(st.tuples(st.integers(0, len(VALID) - 1), st.integers(0, 255)), max_size=6),
    st.integers(0, len(VALID)),
    st.sampled_from(["", "1", "2", "ney", "9"]),
    st.sampled_from([None, 1, 3, 10, 16]),
)
def test_no_change_of_bytes_breaks_the_reader(
    changes: list[tuple[int, int]], length: int, asked: str, channel: int | None
) -> None:
    data = bytearray(VALID)
    for place, byte in changes:
        data[place] = byte
    for mutated in (bytes(data), bytes(data[:length])):
        with suppress(MelodycoachError):
            sheet = read_midi(mutated, "a.mid", track=asked, channel=channel)
            assert len(sheet.places) == len(line(sheet))
            assert sheet.items[-1] is Mark.PHRASE_END
            assert all(one.onset_s <= other.onset_s for one, other in pairwise(line(sheet)))


events = st.lists(
    st.one_of(
        st.binary(min_size=1, max_size=4),
        st.builds(
            lambda wait, status, first, second: bytes((wait, status, first, second)),
            st.integers(0, 127),
            st.sampled_from([0x80, 0x81, 0x90, 0x91, 0x99, 0xB0, 0xE0, 0xE1]),
            st.integers(0, 127),
            st.integers(0, 127),
        ),
    ),
    max_size=60,
)


@given(events, st.integers(0, 0xFFFF), st.integers(0, 3))
def test_no_events_raise_anything_but_our_own_errors(
    parts: list[bytes], division: int, midi_format: int
) -> None:
    one = track(b"".join(parts).hex())
    with suppress(MelodycoachError):
        sheet = read_midi(midi(one, one, division=division, midi_format=midi_format), "a.mid")
        assert len(sheet.places) == len(line(sheet))


@pytest.mark.slow
def test_a_hundred_thousand_events_are_read_in_five_seconds_and_300_megabytes() -> None:
    one = mido.MidiTrack()
    for place in range(33_333):
        one.append(mido.Message("pitchwheel", pitch=place % 900 - 450, time=3))
        one.append(mido.Message("note_on", note=60 + place % 12, velocity=1 + place % 100))
        one.append(mido.Message("note_off", note=60 + place % 12, time=97))
    written = mido.MidiFile(type=0)
    written.tracks.append(one)
    file = io.BytesIO()
    written.save(file=file)
    began_s = time.perf_counter()
    sheet = read_midi(file.getvalue(), "a.mid")
    assert time.perf_counter() - began_s < 5
    assert len(sheet.places) == 33_333
    tracemalloc.start()
    read_midi(file.getvalue(), "a.mid")
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert peak < 100e6  # the program and its libraries take less than the other 200
