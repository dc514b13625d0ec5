"""Pitch over MIDI.

Outside sources: MIDI 1.0 (A4 is key 69; 14-bit bend, centre 8192, default range 2 semitones; RPN 0,
1, 2; channel mode messages 120-127). The worked bend bytes were computed from its formula and
parsed back by mido, an independent reader; mido is asked again here.
"""

from __future__ import annotations

import mido
import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.core.event import NoteOff, NoteOn, PitchMoved
from melodycoach.core.note import InputKind
from melodycoach.sources.midi_pitch import ChannelTuning, PitchTracker

COMMA = 1200 / 53


def play(tracker: PitchTracker, text: str, at_s: float = 0.0) -> list[object]:
    """Feed messages written in hex, separated by semicolons."""
    return [event for part in text.split(";") for event in tracker.decode(bytes.fromhex(part), at_s)]


def pitch_after(text: str, note: str = "90 40 40") -> float:
    """Where a key sounds after some messages; E4 on channel 1 unless another is given."""
    tracker = PitchTracker()
    play(tracker, text)
    [event] = play(tracker, note)
    assert isinstance(event, NoteOn)
    return event.pitch_cents


def range_bytes(semitones: int, cents: int = 0) -> str:
    return f"B0 65 00; B0 64 00; B0 06 {semitones:02X}; B0 26 {cents:02X}; B0 65 7F; B0 64 7F"


def test_a4_is_key_69_at_6900_cents() -> None:
    # MIDI Tuning Standard: key 69 = A4 = 440 Hz
    assert play(PitchTracker(), "90 45 40", 1.5) == [NoteOn(1.5, 69, 6900.0, InputKind.KEYS)]


def test_a_note_off_ends_the_note() -> None:
    assert play(PitchTracker(), "90 45 40; 80 45 40", 2.0)[1:] == [NoteOff(2.0, 69)]


def test_velocity_zero_ends_the_note() -> None:
    assert play(PitchTracker(), "90 45 40; 90 45 00", 2.0)[1:] == [NoteOff(2.0, 69)]


def test_a_note_off_without_a_note_says_nothing() -> None:
    assert play(PitchTracker(), "80 45 40; 90 45 00") == []


def test_a_key_struck_twice_ends_and_begins_anew() -> None:
    assert play(PitchTracker(), "90 45 40; 90 45 50; 80 45 00; 80 45 00") == [
        NoteOn(0.0, 69, 6900.0, InputKind.KEYS),
        NoteOff(0.0, 69),
        NoteOn(0.0, 69, 6900.0, InputKind.KEYS),
        NoteOff(0.0, 69),
    ]


def test_ports_channels_and_keys_have_voices_of_their_own() -> None:
    # port 2, channel 3 (counted from 0), key 69: 2 * 2048 + 3 * 128 + 69 = 4549
    [note] = play(PitchTracker(port_number=2), "93 45 40")
    assert isinstance(note, NoteOn)
    assert note.voice == 4549


# range in semitones, bend bytes, cents: -1 comma and -50 c at each range, from v / 8192 * 100 * range
WORKED_BENDS = [
    (2, "E0 61 38", -22.632),
    (2, "E0 00 30", -50.000),
    (12, "E0 65 3E", -22.705),
    (12, "E0 2B 3D", -49.951),
    (24, "E0 33 3F", -22.559),
    (24, "E0 55 3E", -50.098),
    (48, "E0 59 3F", -22.852),
    (48, "E0 2B 3F", -49.805),
    (96, "E0 6D 3F", -22.266),
    (96, "E0 55 3F", -50.391),
]


@pytest.mark.parametrize(("semitones", "bend", "cents"), WORKED_BENDS)
def test_the_worked_bends_of_midi_1_0_give_their_cents(semitones: int, bend: str, cents: float) -> None:
    assert pitch_after(f"{range_bytes(semitones)}; {bend}") == pytest.approx(6400 + cents, abs=0.0006)


@pytest.mark.parametrize(("semitones", "bend", "cents"), WORKED_BENDS)
def test_mido_reads_the_same_bend(semitones: int, bend: str, cents: float) -> None:
    value = mido.Message.from_bytes(bytes.fromhex(bend)).pitch
    assert pitch_after(f"{range_bytes(semitones)}; {bend}") == 6400 + value * 100 * semitones / 8192


def test_the_range_is_two_semitones_until_it_is_sent() -> None:
    assert pitch_after("E0 61 38") == pytest.approx(6400 - COMMA, abs=0.02)


def test_full_bends_are_not_symmetric() -> None:
    # v runs from -8192 to +8191
    assert pitch_after("E0 00 00") == 6200
    assert pitch_after("E0 7F 7F") == 6400 + 200 * 8191 / 8192


def test_the_range_has_cents_too() -> None:
    assert pitch_after(f"{range_bytes(1, 50)}; E0 00 00") == 6250  # 150 cents down


def test_the_order_of_the_parameter_bytes_does_not_matter() -> None:
    assert pitch_after("B0 64 00; B0 65 00; B0 06 0C; E0 00 00") == 5200


def test_a_selected_parameter_takes_more_than_one_entry() -> None:
    assert pitch_after("B0 65 00; B0 64 00; B0 06 0C; B0 06 05; E0 00 00") == 5900


def test_the_coarse_entry_alone_is_enough_and_clears_the_cents() -> None:
    assert pitch_after(f"{range_bytes(1, 50)}; B0 65 00; B0 64 00; B0 06 03; E0 00 00") == 6100


@pytest.mark.parametrize(
    "selected",
    [
        "B0 65 7F; B0 64 7F",  # the null parameter
        "B0 65 00; B0 64 00; B0 63 01; B0 62 08",  # an NRPN deselects
        "B0 65 00; B0 64 00; B0 62 08",  # half of one does too
        "B0 65 00; B0 64 00; B0 79 00",  # reset controllers
        "B0 65 00; B0 64 05",  # modulation depth: no pitch
        "B0 65 00",  # half a parameter
    ],
)
def test_data_entry_without_a_pitch_parameter_changes_nothing(selected: str) -> None:
    assert pitch_after(f"{selected}; B0 06 0C; B0 26 20; B0 60 00; B0 61 00; E0 00 00") == 6200


def test_data_steps_move_the_range_by_a_cent() -> None:
    # that a step is one cent for RPN 0 is from memory of the MIDI recommended practice for 96 and 97
    assert pitch_after("B0 65 00; B0 64 00; B0 60 00; E0 00 00") == 6400 - 201
    assert pitch_after("B0 65 00; B0 64 00; B0 61 00; E0 00 00") == 6400 - 199


def test_steps_stop_at_the_ends_of_a_value() -> None:
    assert pitch_after(f"{range_bytes(0)}; B0 65 00; B0 64 00; B0 61 00; E0 00 00") == 6400
    assert pitch_after("B0 65 00; B0 64 01; B0 06 7F; B0 26 7F; B0 60 00") == 6400 + 100 * 8191 / 8192
    assert pitch_after("B0 65 00; B0 64 02; B0 06 00; B0 61 00") == 0


def test_the_range_belongs_to_its_channel() -> None:
    assert pitch_after(f"{range_bytes(12)}; E1 00 00", "91 40 40") == 6200


def test_channel_fine_tuning_adds() -> None:
    # 31 26 41: (0x31 << 7 | 0x41) - 8192 = -1855, times 100 / 8192 = -22.644 c
    assert pitch_after("B0 65 00; B0 64 01; B0 06 31; B0 26 41") == pytest.approx(6400 - 22.644, abs=0.001)
    assert pitch_after("B0 65 00; B0 64 01; B0 06 20; B0 26 00") == 6350


def test_channel_coarse_tuning_moves_by_semitones_and_stays_plain() -> None:
    tracker = PitchTracker()
    assert play(tracker, "B0 65 00; B0 64 02; B0 06 3E; B0 26 10; 90 40 40") == [
        NoteOn(0.0, 64, 6200.0, InputKind.KEYS)
    ]


def test_bend_and_fine_tuning_that_cancel_give_a_plain_key() -> None:
    tracker = PitchTracker()
    # fine tuning +50 c, bend -50 c at the default range
    assert play(tracker, "B0 65 00; B0 64 01; B0 06 60; E0 00 30; 90 40 40") == [
        NoteOn(0.0, 64, 6400.0, InputKind.KEYS)
    ]


@pytest.mark.parametrize(("bend", "kind"), [(8192 + 40, "keys"), (8192 + 41, "tuned"), (8192 - 41, "tuned")])
def test_a_key_is_plain_below_one_cent_of_offset(bend: int, kind: str) -> None:
    # 40 * 200 / 8192 = 0.977 c, 41 * 200 / 8192 = 1.001 c
    [note] = play(PitchTracker(), f"E0 {bend & 127:02X} {bend >> 7:02X}; 90 40 40")
    assert isinstance(note, NoteOn)
    assert note.kind == kind


def test_a_bend_moves_the_keys_that_sound_and_no_others() -> None:
    tracker = PitchTracker()
    play(tracker, "90 40 40; 90 45 40; 91 45 40; 80 45 00")
    assert play(tracker, "E0 00 30", 3.0) == [PitchMoved(3.0, 64, 6350.0, InputKind.TUNED)]
    assert play(tracker, "E0 00 40", 4.0) == [PitchMoved(4.0, 64, 6400.0, InputKind.KEYS)]


def test_a_bend_to_where_it_stands_says_nothing() -> None:
    assert play(PitchTracker(), "90 40 40; E0 00 40; E0 01 40")[1:] == []


def test_a_new_range_moves_what_sounds() -> None:
    tracker = PitchTracker()
    play(tracker, "E0 00 00; 90 40 40")
    assert play(tracker, "B0 65 00; B0 64 00; B0 06 0C") == [PitchMoved(0.0, 64, 5200.0, InputKind.TUNED)]


def test_reset_controllers_centres_the_bend_and_keeps_the_range() -> None:
    tracker = PitchTracker()
    play(tracker, f"{range_bytes(12)}; E0 00 00; 90 40 40")
    assert play(tracker, "B0 79 00; E0 00 00") == [
        PitchMoved(0.0, 64, 6400.0, InputKind.KEYS),
        PitchMoved(0.0, 64, 5200.0, InputKind.TUNED),
    ]


@pytest.mark.parametrize("control", [120, 123, 124, 125, 126, 127])
def test_all_notes_off_ends_the_notes_of_its_channel(control: int) -> None:
    tracker = PitchTracker()
    play(tracker, "90 45 40; 90 40 40; 91 40 40")
    assert play(tracker, f"B0 {control:02X} 00", 1.0) == [NoteOff(1.0, 64), NoteOff(1.0, 69)]
    assert tracker.sounding == (128 + 64,)


def test_local_control_and_other_controllers_end_nothing() -> None:
    assert play(PitchTracker(), "90 45 40; B0 7A 00; B0 40 7F; B0 07 00; C0 05; D0 40; A0 45 20")[1:] == []


def test_channel_10_is_taken_for_drums() -> None:
    # common practice: General MIDI keeps channel 10 for percussion
    tracker = PitchTracker()
    assert play(tracker, "99 24 40; 89 24 00; E9 00 00") == []
    assert tracker.n_ignored_notes == 1


def test_channel_10_can_be_listened_to() -> None:
    tracker = PitchTracker(ignored_channels=frozenset())
    assert play(tracker, "99 45 40") == [NoteOn(0.0, 9 * 128 + 69, 6900.0, InputKind.KEYS)]


def test_silence_ends_everything_and_keeps_the_tuning() -> None:
    tracker = PitchTracker()
    play(tracker, "E1 00 30; 90 45 40; 91 40 40")
    assert tracker.silence(5.0) == (NoteOff(5.0, 69), NoteOff(5.0, 192))
    assert tracker.silence(6.0) == ()
    [note] = play(tracker, "91 40 40")
    assert isinstance(note, NoteOn)
    assert note.pitch_cents == 6350


def test_starting_over_forgets_bends_and_ranges() -> None:
    tracker = PitchTracker()
    play(tracker, f"{range_bytes(12)}; E0 00 30; 90 45 40")
    assert tracker.start_over(5.0) == (NoteOff(5.0, 69),)
    assert play(tracker, "90 45 40") == [NoteOn(0.0, 69, 6900.0, InputKind.KEYS)]
    assert play(tracker, "E0 00 00") == [PitchMoved(0.0, 69, 6700.0, InputKind.TUNED)]


def test_a_system_reset_starts_over() -> None:
    tracker = PitchTracker()
    assert play(tracker, "E0 00 30; 90 45 40; FF", 1.0)[1:] == [NoteOff(1.0, 69)]
    assert tracker.tunings() == ()


def test_real_time_and_system_exclusive_messages_change_nothing() -> None:
    assert play(PitchTracker(), "90 45 40; F8; FE; FA; F0 7E 7F 09 01 F7; F1 00; FF 2F 00")[1:] == []


@pytest.mark.parametrize(
    "damaged",
    [
        b"",
        b"\x45",
        b"\x90",
        b"\x90\x45",
        b"\x90\x45\x40\x00",
        b"\x90\x80\x40",
        b"\xe0\x00\xff",
        b"\xc0\x00\x00",
    ],
)
def test_a_damaged_message_is_counted_and_skipped(damaged: bytes) -> None:
    tracker = PitchTracker()
    assert tracker.decode(damaged, 0.0) == ()
    assert tracker.n_skipped == 1


def test_the_tunings_tell_what_is_believed() -> None:
    tracker = PitchTracker()
    play(tracker, f"{range_bytes(12)}; E1 00 30; B2 65 00; B2 64 02; B2 06 41; B2 64 01; B2 06 20")
    assert tracker.tunings() == (
        ChannelTuning(1, 0.0, 1200, range_sent=True, tuning_cents=0.0),
        ChannelTuning(2, -50.0, 200, range_sent=False, tuning_cents=0.0),
        ChannelTuning(3, 0.0, 200, range_sent=False, tuning_cents=50.0),  # +1 semitone, -50 c
    )


whole_messages = st.one_of(
    st.binary(max_size=6),
    st.tuples(st.integers(0x80, 0xEF), st.integers(0, 127), st.integers(0, 127)).map(bytes),
    st.tuples(  # parameters and data entry, which random bytes hardly hit
        st.sampled_from([0xB0, 0xB1]),
        st.sampled_from([6, 38, 96, 97, 98, 99, 100, 101, 120, 121, 123]),
        st.sampled_from([0, 1, 2, 127, 64]),
    ).map(bytes),
)


@given(st.lists(whole_messages, max_size=60))
def test_any_bytes_give_a_sound_and_bounded_story(messages: list[bytes]) -> None:
    tracker = PitchTracker()
    sounding: set[int] = set()
    for number, message in enumerate(messages):
        for event in tracker.decode(message, float(number)):
            assert event.at_s == number
            match event:
                case NoteOn():
                    assert event.voice not in sounding
                    sounding.add(event.voice)
                case NoteOff():
                    sounding.remove(event.voice)
                case PitchMoved():
                    assert event.voice in sounding
                case _:
                    pytest.fail(f"unexpected {event}")
            if isinstance(event, NoteOn | PitchMoved):
                # the ends: key 0 or 127, coarse -64 or +63, fine 100, bend range 12799
                assert -6400 - 12900 <= event.pitch_cents <= 12700 + 6300 + 12900
                assert (event.kind == InputKind.KEYS) <= (event.pitch_cents % 100 == 0)
        assert tracker.sounding == tuple(sorted(sounding))
    assert {event.voice for event in tracker.silence(0.0)} == sounding


@given(st.integers(0, 127), st.integers(0, 16383), st.integers(0, 96), st.integers(0, 99))
def test_bends_before_and_during_a_note_agree(key: int, bend: int, semitones: int, cents: int) -> None:
    bent = f"E0 {bend & 127:02X} {bend >> 7:02X}"
    before = pitch_after(f"{range_bytes(semitones, cents)}; {bent}", f"90 {key:02X} 40")
    tracker = PitchTracker()
    events = play(tracker, f"{range_bytes(semitones, cents)}; 90 {key:02X} 40; {bent}")
    last = events[-1]
    assert isinstance(last, NoteOn | PitchMoved)
    assert last.pitch_cents == before


def test_a_single_bend_before_a_note_shows_that_the_keys_of_this_channel_are_tuned() -> None:
    tracker = PitchTracker()
    tracker.decode(bytes.fromhex("E0 61 38"), 0.0)
    tracker.decode(bytes.fromhex("90 47 40"), 0.1)
    tracker.decode(bytes.fromhex("E0 00 40"), 0.4)
    [unbent] = tracker.decode(bytes.fromhex("90 45 40"), 0.5)
    assert unbent == NoteOn(0.5, 69, 6900.0, InputKind.TUNED)


def test_a_wheel_that_a_hand_has_moved_leaves_the_keys_plain() -> None:
    tracker = PitchTracker()
    for value in ("61 38", "00 3A", "00 40"):
        tracker.decode(bytes.fromhex(f"E0 {value}"), 0.0)
    [note] = tracker.decode(bytes.fromhex("90 45 40"), 0.5)
    assert note == NoteOn(0.5, 69, 6900.0, InputKind.KEYS)
