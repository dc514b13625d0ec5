"""Pitch over MIDI.

Outside sources: MIDI 1.0 (A4 is key 69; 14-bit bend, centre 8192, default range 2 semitones; RPN 0,
1, 2; channel mode messages 120-127), MPE (RP-053), the MIDI Tuning Standard. The worked bend bytes
were computed from its formula and parsed back by mido, an independent reader; mido is asked again here.
"""

from __future__ import annotations

import mido
import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.core.event import NoteOff, NoteOn, PitchMoved
from melodycoach.core.note import InputKind
from melodycoach.sources.midi_mpe import MpeZone
from melodycoach.sources.midi_pitch import ChannelTuning, PitchTracker
from melodycoach.sources.midi_tuning import StatedTuning

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


parameters = st.builds(  # random bytes hardly hit a parameter and its entry
    lambda channel, name, control, value: [
        bytes((0xB0 | channel, 101, 0)),
        bytes((0xB0 | channel, 100, name)),
        bytes((0xB0 | channel, control, value)),
    ],
    st.sampled_from([0, 1, 14, 15]),
    st.integers(0, 7),
    st.sampled_from([6, 38, 96, 97]),
    st.one_of(st.integers(0, 16), st.integers(0, 127)),
)
tuning_messages = st.builds(
    lambda head, body: [bytes.fromhex(head) + bytes(body) + b"\xf7"],
    st.sampled_from(["F07E7F0808037F7F", "F07F7F0808037F7F"]),
    st.lists(st.integers(0, 127), min_size=12, max_size=12),
) | st.sampled_from(
    [
        "F07F7F0802000140640000F7",
        "F07F7F0807010101407F7F7EF7",
        "F07F7F04030000F7",
        "F07F7F04030040F7",
        "F07F7F04040000F7",
        "F07F7F0404007FF7",
        "F07E7F0901F7",
        "F043104C080045",
        "F043104C08004529F7",
    ]
).map(lambda text: [bytes.fromhex(text)])
one_message = st.one_of(
    st.binary(max_size=6),
    st.tuples(st.integers(0x80, 0xEF), st.integers(0, 127), st.integers(0, 127)).map(bytes),
    st.tuples(
        st.sampled_from([0x80, 0x90, 0xE0]),
        st.sampled_from([0, 1, 9, 14, 15]),
        st.integers(0, 127),
        st.integers(0, 127),
    ).map(lambda parts: bytes((parts[0] | parts[1], *parts[2:]))),
    st.tuples(st.sampled_from([0xB0, 0xB1]), st.sampled_from([120, 121, 123]), st.just(0)).map(bytes),
).map(lambda message: [message])
stories = st.lists(st.one_of(one_message, parameters, tuning_messages), max_size=40).map(
    lambda groups: [message for group in groups for message in group]
)
settings_of_zones = st.sampled_from([(), (MpeZone(),), (MpeZone(0, 4, 9600), MpeZone(15, 10))])


@given(stories, settings_of_zones)
def test_any_bytes_give_a_sound_and_bounded_story(messages: list[bytes], zones: tuple[MpeZone, ...]) -> None:
    tracker = PitchTracker(zones=zones)
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
                # the ends: a key tuned from 0 to 12800 or a semitone off it; coarse -64 or +63 and fine 100,
                # of the channel and of the instrument; bend range 12799, of a member and its manager
                most = 2 * (6400 + 100 + 12799)
                assert -100 - most <= event.pitch_cents <= 12800 + most
                assert (event.kind == InputKind.KEYS) <= (event.pitch_cents % 100 == 0)
        assert tracker.sounding == tuple(sorted(sounding))
        zone_channels = [channel for zone in tracker.zones for channel in zone.channels]
        assert len(zone_channels) == len(set(zone_channels))
        for tuning in tracker.tunings():
            assert 0 <= tuning.range_cents <= 12799
            assert abs(tuning.bend_cents) <= tuning.range_cents
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


# MPE zones


def zone_bytes(channel: int, n_members: int) -> str:
    """The MPE configuration message: RPN 6 on a manager channel, counted from 0."""
    return f"B{channel:X} 65 00; B{channel:X} 64 06; B{channel:X} 06 {n_members:02X}"


def test_the_worked_mpe_message_sets_up_fifteen_members_with_48_semitones() -> None:
    # RP-053; E1 59 3F is one comma down at range 48: -39 / 8192 * 4800 = -22.852 c
    assert pitch_after(f"{zone_bytes(0, 15)}; E1 59 3F", "91 40 40") == pytest.approx(6377.148, abs=0.001)


def test_the_bends_of_member_and_manager_add() -> None:
    # member -23 c at range 48, manager 50 c up at range 2: 2048 / 8192 * 200
    both = pitch_after(f"{zone_bytes(0, 15)}; E1 59 3F; E0 00 50", "91 40 40")
    assert both == pytest.approx(6400 - 22.852 + 50, abs=0.001)


def test_a_bend_of_the_manager_moves_every_note_of_its_zone_and_no_other() -> None:
    tracker = PitchTracker()
    play(tracker, f"{zone_bytes(0, 3)}; 90 40 40; 91 41 40; 93 42 40; 94 43 40")
    assert play(tracker, "E0 00 60", 1.0) == [
        PitchMoved(1.0, 64, 6500.0, InputKind.TUNED),
        PitchMoved(1.0, 128 + 65, 6600.0, InputKind.TUNED),
        PitchMoved(1.0, 3 * 128 + 66, 6700.0, InputKind.TUNED),
    ]


def test_a_bend_of_a_member_moves_its_own_notes_only() -> None:
    tracker = PitchTracker()
    play(tracker, f"{zone_bytes(15, 2)}; 9E 40 40; 9D 41 40; 9F 42 40")
    assert play(tracker, "EE 00 50") == [PitchMoved(0.0, 14 * 128 + 64, 7600.0, InputKind.TUNED)]


def test_a_new_range_of_one_member_is_that_of_all_members() -> None:
    range_of_member = "B2 65 00; B2 64 00; B2 06 18"  # RPN 0 on channel 3: 24 semitones
    assert pitch_after(f"{zone_bytes(0, 5)}; {range_of_member}; E5 00 00", "95 40 40") == 4000
    assert pitch_after(f"{zone_bytes(0, 5)}; {range_of_member}; E0 00 00", "90 40 40") == 6200
    assert pitch_after(f"{zone_bytes(0, 5)}; {range_of_member}; E6 00 00", "96 40 40") == 6200


def test_a_range_of_the_manager_is_its_own() -> None:
    range_of_manager = "B0 65 00; B0 64 00; B0 06 0C"
    assert pitch_after(f"{zone_bytes(0, 5)}; {range_of_manager}; E1 00 50", "91 40 40") == 6400 + 1200
    assert pitch_after(f"{zone_bytes(0, 5)}; {range_of_manager}; E0 00 50", "91 40 40") == 6400 + 300


def test_a_zone_that_is_set_up_ends_its_notes_and_begins_with_bends_in_the_middle() -> None:
    tracker = PitchTracker()
    play(tracker, "90 40 40; 91 41 40; 95 42 40; E1 00 00")
    assert play(tracker, zone_bytes(0, 2), 2.0) == [NoteOff(2.0, 64), NoteOff(2.0, 128 + 65)]
    assert tracker.sounding == (5 * 128 + 66,)
    assert play(tracker, "91 40 40") == [NoteOn(0.0, 128 + 64, 6400.0, InputKind.KEYS)]


def test_a_zone_that_is_set_up_again_ends_its_notes_and_has_its_first_ranges() -> None:
    tracker = PitchTracker()
    play(tracker, f"{zone_bytes(0, 4)}; B1 65 00; B1 64 00; B1 06 0C; 91 40 40")
    assert play(tracker, zone_bytes(0, 4), 1.0) == [NoteOff(1.0, 128 + 64)]
    assert play(tracker, "E1 00 00; 91 40 40") == [NoteOn(0.0, 128 + 64, 1600.0, InputKind.TUNED)]


def test_a_zone_that_is_switched_off_leaves_ordinary_channels() -> None:
    off = f"{zone_bytes(0, 5)}; E0 00 50; {zone_bytes(0, 0)}"
    assert pitch_after(f"{off}; E1 00 00", "91 40 40") == 6200
    tracker = PitchTracker()
    play(tracker, off)
    assert (tracker.zones, tracker.tunings()) == ((), ())


@pytest.mark.parametrize(
    ("messages", "members"),
    [  # RP-053: the latest message wins and takes what it needs
        ([(0, 7), (15, 7)], [(0, 7), (15, 7)]),
        ([(0, 10), (15, 6)], [(0, 8), (15, 6)]),
        ([(15, 10), (0, 6)], [(0, 6), (15, 8)]),
        ([(0, 15), (15, 3)], [(0, 11), (15, 3)]),
        ([(15, 4), (0, 14)], [(0, 14)]),
        ([(15, 4), (0, 15)], [(0, 15)]),
        ([(0, 15), (15, 0)], [(0, 15)]),
        ([(0, 4), (0, 6)], [(0, 6)]),
        ([(3, 4), (9, 15)], []),  # only channels 1 and 16 manage
        ([(0, 16)], []),
    ],
)
def test_the_latest_zone_wins(messages: list[tuple[int, int]], members: list[tuple[int, int]]) -> None:
    tracker = PitchTracker()
    for manager, n_members in messages:
        play(tracker, zone_bytes(manager, n_members))
    assert [(zone.manager, zone.n_members) for zone in tracker.zones] == members
    assert tracker.n_skipped == (1 if (0, 16) in messages else 0)


def test_the_zone_that_gives_way_keeps_its_bends_and_notes_on_the_channels_that_stay() -> None:
    tracker = PitchTracker()
    play(tracker, f"{zone_bytes(0, 10)}; E1 59 3F; 91 40 40; EA 59 3F; 9A 41 40")
    assert play(tracker, zone_bytes(15, 6), 3.0) == [NoteOff(3.0, 10 * 128 + 65)]
    assert tracker.sounding == (128 + 64,)


def test_only_the_coarse_entry_sets_up_a_zone() -> None:
    tracker = PitchTracker()
    play(tracker, "B0 65 00; B0 64 06; B0 26 05; B0 60 00; B0 61 00")
    assert tracker.zones == ()


def test_channel_10_carries_notes_when_it_belongs_to_a_zone() -> None:
    tracker = PitchTracker()
    assert play(tracker, f"{zone_bytes(0, 15)}; 99 40 40") == [
        NoteOn(0.0, 9 * 128 + 64, 6400.0, InputKind.KEYS)
    ]
    assert play(tracker, f"{zone_bytes(0, 8)}; 99 40 40") == [NoteOff(0.0, 9 * 128 + 64)]


def test_mode_messages_to_a_manager_reach_its_zone() -> None:
    tracker = PitchTracker()
    play(tracker, f"{zone_bytes(0, 3)}; E1 00 50; 91 40 40; 95 41 40")
    assert play(tracker, "B0 79 00", 1.0) == [PitchMoved(1.0, 128 + 64, 6400.0, InputKind.KEYS)]
    assert play(tracker, "B0 7B 00", 2.0) == [NoteOff(2.0, 128 + 64)]


def test_once_a_note_of_a_zone_begins_bent_every_key_of_the_zone_is_tuned() -> None:
    tracker = PitchTracker()
    events = play(
        tracker, f"{zone_bytes(0, 15)}; E1 00 40; 91 40 40; E2 08 40; E2 59 3F; 92 47 40; E3 00 40; 93 45 40"
    )
    assert [event.kind for event in events if isinstance(event, NoteOn)] == ["keys", "tuned", "tuned"]


def test_the_wheel_of_the_manager_alone_leaves_the_keys_of_its_zone_plain() -> None:
    tracker = PitchTracker()
    events = play(tracker, f"{zone_bytes(0, 15)}; E0 00 50; E1 00 40; 91 40 40; E0 00 40; E2 00 40; 92 47 40")
    assert events[-1] == NoteOn(0.0, 2 * 128 + 71, 7100.0, InputKind.KEYS)


def test_a_surface_that_never_announces_itself_can_be_declared() -> None:
    tracker = PitchTracker(zones=(MpeZone(0, 15),))
    [note] = play(tracker, "E1 59 3F; 91 40 40")
    assert isinstance(note, NoteOn)
    assert note.pitch_cents == pytest.approx(6377.148, abs=0.001)
    play(tracker, zone_bytes(0, 2))
    tracker.start_over(1.0)
    assert tracker.zones == (MpeZone(0, 15),)
    [note] = play(tracker, "E9 59 3F; 99 40 40")
    assert isinstance(note, NoteOn)
    assert note.pitch_cents == pytest.approx(6377.148, abs=0.001)


def test_declared_zones_have_the_range_that_is_said() -> None:
    tracker = PitchTracker(zones=(MpeZone(15, 5, 9600),))
    [note] = play(tracker, "EE 00 00; 9E 78 40")
    assert isinstance(note, NoteOn)
    assert note.pitch_cents == 12000 - 9600


def test_declared_zones_that_overlap_are_refused() -> None:
    with pytest.raises(ValueError, match="share a channel"):
        PitchTracker(zones=(MpeZone(0, 10), MpeZone(15, 10)))


# tuning messages

E_DOWN = "40 40 40 40 29 40 40 40 40 40 40 40"
ALL_IN_PLACE = "40 40 40 40 40 40 40 40 40 40 40 40"


def test_an_octave_message_tunes_every_e_and_makes_every_key_known() -> None:
    # the worked one-byte form of the MIDI Tuning Standard, E 23 c down on all channels
    assert play(PitchTracker(), f"F0 7E 7F 08 08 03 7F 7F {E_DOWN} F7; 90 40 40; 95 4C 40; 90 45 40") == [
        NoteOn(0.0, 64, 6377.0, InputKind.TUNED),
        NoteOn(0.0, 5 * 128 + 76, 7577.0, InputKind.TUNED),
        NoteOn(0.0, 69, 6900.0, InputKind.TUNED),
    ]


def test_an_octave_message_with_every_key_in_its_place_makes_keys_plain_again() -> None:
    tracker = PitchTracker()
    play(tracker, f"F0 7E 7F 08 08 03 7F 7F {E_DOWN} F7; F0 7E 7F 08 08 03 7F 7F {ALL_IN_PLACE} F7")
    assert play(tracker, "90 40 40") == [NoteOn(0.0, 64, 6400.0, InputKind.KEYS)]


def test_a_real_time_message_moves_what_sounds() -> None:
    tracker = PitchTracker()
    play(tracker, "90 40 40; 90 45 40")
    assert play(tracker, f"F0 7F 7F 08 08 03 7F 7F {E_DOWN} F7", 1.0) == [
        PitchMoved(1.0, 64, 6377.0, InputKind.TUNED)
    ]
    assert play(tracker, f"F0 7F 7F 08 08 03 7F 7F {ALL_IN_PLACE} F7", 2.0) == [
        PitchMoved(2.0, 64, 6400.0, InputKind.KEYS)
    ]


def test_a_message_that_is_not_real_time_waits_for_the_next_note() -> None:
    tracker = PitchTracker()
    play(tracker, "90 40 40")
    assert play(tracker, f"F0 7E 7F 08 07 00 00 01 40 3F 40 00 F7; F0 7E 7F 08 08 03 7F 7F {E_DOWN} F7") == []
    # a bend of 50 c moves the old note from where it was
    assert play(tracker, "E0 00 50") == [PitchMoved(0.0, 64, 6450.0, InputKind.TUNED)]
    assert play(tracker, "80 40 00; 90 40 40")[1:] == [NoteOn(0.0, 64, 6427.0, InputKind.TUNED)]


def test_tuning_messages_bends_and_coarse_tuning_add() -> None:
    # E -50 c by the worked single-note message, +50 c by a bend, a whole tone down by RPN 2
    single = "F0 7F 7F 08 02 00 01 40 3F 40 00 F7"
    assert pitch_after(f"{single}; E0 00 50; B0 65 00; B0 64 02; B0 06 3E") == 6400 - 50 + 50 - 200


def test_a_single_note_message_holds_for_its_key_on_every_channel() -> None:
    single = "F0 7F 7F 08 02 00 01 40 3F 40 00 F7"
    assert pitch_after(single, "9F 40 40") == 6350
    assert pitch_after(single, "9F 4C 40") == 7600


def test_another_maker_s_message_holds_for_its_part() -> None:
    assert pitch_after("F0 43 10 4C 08 03 45 29 F7", "93 40 40") == 6377
    assert pitch_after("F0 43 10 4C 08 03 45 29 F7", "90 40 40") == 6400


def test_a_tuning_program_is_chosen_by_its_parameter_and_moves_what_sounds() -> None:
    tracker = PitchTracker()
    play(tracker, "F0 7E 7F 08 07 03 05 01 40 3F 40 00 F7; 90 40 40")
    # RPN 4: bank 3, which waits; RPN 3: program 5
    assert play(tracker, "B0 65 00; B0 64 04; B0 06 03") == []
    assert play(tracker, "B0 64 03; B0 06 05") == [PitchMoved(0.0, 64, 6350.0, InputKind.TUNED)]
    assert play(tracker, "B0 60 00") == [PitchMoved(0.0, 64, 6400.0, InputKind.KEYS)]  # program 6


def test_master_coarse_tuning_moves_plain_keys_by_semitones() -> None:
    tracker = PitchTracker()
    play(tracker, "90 40 40")
    assert play(tracker, "F0 7F 7F 04 04 00 3E F7; 90 45 40") == [
        PitchMoved(0.0, 64, 6200.0, InputKind.KEYS),
        NoteOn(0.0, 69, 6700.0, InputKind.KEYS),
    ]


def test_master_fine_tuning_moves_every_key() -> None:
    # 41 31: one comma down, as RPN 1
    [note] = play(PitchTracker(), "F0 7F 7F 04 03 41 31 F7; 97 40 40")
    assert isinstance(note, NoteOn)
    assert (round(note.pitch_cents, 3), note.kind) == (6377.356, InputKind.TUNED)


def test_a_concert_pitch_of_442_hertz_moves_no_note_and_leaves_keys_plain() -> None:
    # 1200 * log2(442 / 440) = 7.851 c = 643 steps of 100 / 8192 c: 43 05 in seven-bit halves
    tracker = PitchTracker()
    assert play(tracker, "F0 7F 7F 04 03 03 45 F7; 90 40 40; E0 00 50; 91 40 40") == [
        NoteOn(0.0, 64, 6400.0, InputKind.KEYS),
        PitchMoved(0.0, 64, 6450.0, InputKind.TUNED),
        NoteOn(0.0, 128 + 64, 6400.0, InputKind.KEYS),
    ]
    assert tracker.concert_cents == pytest.approx(7.85, abs=0.01)


@pytest.mark.parametrize(
    "reset", ["F0 7E 7F 09 01 F7", "F0 41 10 42 12 40 00 7F 00 41 F7", "F0 43 10 4C 00 00 7E 00 F7"]
)
def test_a_reset_puts_every_tuning_back_and_lets_notes_sound(reset: str) -> None:
    tracker = PitchTracker()
    play(
        tracker, f"F0 7E 7F 08 08 03 7F 7F {E_DOWN} F7; F0 7F 7F 04 04 00 3E F7; {range_bytes(12)}; E0 00 00"
    )
    play(tracker, "90 40 40")
    assert play(tracker, reset, 1.0) == [PitchMoved(1.0, 64, 6400.0, InputKind.KEYS)]
    assert tracker.tunings() == ()
    assert play(tracker, "E0 00 00", 2.0) == [PitchMoved(2.0, 64, 6200.0, InputKind.TUNED)]


def test_a_reset_leaves_zones_as_they_are() -> None:
    assert pitch_after(f"{zone_bytes(0, 15)}; F0 7E 7F 09 01 F7; E1 59 3F", "91 40 40") < 6400 - 22


@pytest.mark.parametrize("text", ["F0 7E 7F 08 08 03 F7", "F0 7E 7F 08 08", "F0 43 10 4C 08 00 F7"])
def test_a_damaged_tuning_message_is_counted_and_skipped(text: str) -> None:
    tracker = PitchTracker()
    assert play(tracker, text) == []
    assert tracker.n_skipped == 1


def test_system_messages_about_other_things_are_not_counted() -> None:
    tracker = PitchTracker()
    play(tracker, "F8; F0 7E 7F 06 01 F7; F0 7D 01 F7; F1 00")
    assert tracker.n_skipped == 0


def test_a_megabyte_of_system_exclusive_is_passed_over() -> None:
    tracker = PitchTracker()
    assert tracker.decode(b"\xf0\x7d" + bytes(1_000_000) + b"\xf7", 0.0) == ()
    assert tracker.n_skipped == 0


def test_the_tunings_tell_the_keys_that_a_message_tuned() -> None:
    tracker = PitchTracker()
    play(tracker, "F0 43 10 4C 08 03 45 29 F7")
    [tuning] = tracker.tunings()
    assert tuning.channel == 4
    moved = {key: cents for key, cents in tuning.key_cents.items() if cents}
    assert moved == dict.fromkeys(range(4, 128, 12), -23.0)


# what the player has stated

STATED = StatedTuning(tuple(-23.0 if key == 4 else 0.0 for key in range(12)))


def test_what_the_player_states_stands_after_a_reset_and_a_fresh_start() -> None:
    tracker = PitchTracker(stated=STATED)
    xg_e_down_50 = bytes.fromhex("F0 43 10 4C 08 00 45 0E F7")  # XG: part 1, E, 0E - 40 is -50 cents
    for again in (
        lambda: tracker.decode(bytes.fromhex("F0 7E 7F 09 01 F7"), 0.0),
        lambda: tracker.start_over(0.0),
    ):
        tracker.decode(xg_e_down_50, 0.0)
        [note] = tracker.decode(bytes.fromhex("90 40 40"), 0.0)
        assert note.pitch_cents == 6350.0
        again()
        tracker.decode(bytes.fromhex("80 40 00"), 0.0)
        [note] = tracker.decode(bytes.fromhex("90 40 40"), 0.0)
        assert note.pitch_cents == 6377.0
        tracker.decode(bytes.fromhex("80 40 00"), 0.0)


def test_a_bend_adds_to_what_the_player_states() -> None:
    tracker = PitchTracker(stated=STATED)
    tracker.decode(bytes.fromhex("E0 00 30"), 0.0)  # 50 cents down in MIDI's range of two semitones
    [note] = tracker.decode(bytes.fromhex("90 40 40"), 0.0)
    assert note.pitch_cents == 6327.0
    assert tracker.stated_cents[64] == -23.0
