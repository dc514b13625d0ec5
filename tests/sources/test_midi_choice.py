"""Which notes of a MIDI file are taken for the melody.

The rule is ours; what it rests on is common practice: the melody of an arrangement lies above its
bass, sounds one note at a time, and its track is often called so. Outside source: MPE (RP-053) for
the configuration message, which says that channels belong together.
"""

from __future__ import annotations

import pytest
from midi_bytes import chord, midi, name, note, notes, track

from melodycoach.errors import MusicFileError
from melodycoach.sources.midi_choice import Choice, choose_part, count_drum_notes
from melodycoach.sources.midi_file import read_midi_file

MELODY = notes(69, 71, 72, 74, 72, 71, 69, 69)
BASS = notes(45, 52, 45, 52)
CHORDS = chord(57, 60, 64) + chord(55, 59, 62) + chord(57, 60, 64)
DRUMS = notes(36, 38, 36, 38, channel=10)


def choose(*tracks: bytes, asked: str = "", channel: int | None = None, midi_format: int = 1) -> Choice:
    return choose_part(read_midi_file(midi(*tracks, midi_format=midi_format)), "a.mid", asked, channel)


def taken(*tracks: bytes, asked: str = "", channel: int | None = None) -> tuple[int, list[int]]:
    """The number of the track that is taken, and the channels, counted from 1."""
    part = choose(*tracks, asked=asked, channel=channel).part
    return part.track.number, sorted(one + 1 for one in part.channels)


def refusal(*tracks: bytes, asked: str = "", channel: int | None = None) -> str:
    with pytest.raises(MusicFileError) as refused:
        choose(*tracks, asked=asked, channel=channel)
    return str(refused.value)


def on_channel(events: str, channel: int) -> str:
    """Take events of channel 1 to another."""
    number = f"{channel - 1:X}"
    return " ".join(
        f"{byte[0]}{number}" if byte in ("80", "90") else byte
        for byte in bytes.fromhex(events).hex(" ").split()
    )


def test_the_only_track_with_notes_is_taken() -> None:
    choice = choose(track(name("Yol")), track(DRUMS), track(MELODY))
    assert (choice.part.track.number, choice.reason, choice.others) == (
        3,
        "the only one with notes that are no drums",
        (),
    )


def test_the_melody_is_told_from_bass_and_chords() -> None:
    assert taken(track(BASS), track(CHORDS), track(MELODY)) == (3, [1])
    assert taken(track(MELODY), track(CHORDS), track(BASS)) == (1, [1])


def test_a_busy_low_part_is_no_melody() -> None:
    # four times as many notes, one at a time, but the lowest
    busy = notes(*[45, 52, 57, 52] * 8, ticks=120)
    choice = choose(track(busy), track(MELODY))
    assert choice.part.track.number == 2
    assert choice.reason == "it always sounds one note at a time, it is the highest"


def test_a_few_high_notes_are_no_melody() -> None:
    assert taken(track(note(96, wait=3000)), track(MELODY), track(BASS)) == (2, [1])


def test_of_two_equal_parts_the_one_that_is_called_so_is_the_melody() -> None:
    # the lower of two has 1 + 1 + 0 + 1 points, the higher 1 + 1 + 1 + 0: then the first in the file
    low, high = notes(60, 62, 64, 65), notes(72, 74, 76, 77)
    assert taken(track(name("NEY-2"), low), track(name("Kanun"), high)) == (1, [1])
    assert taken(track(name("Kanun"), high), track(name("Ney"), low), track(notes(50, 50, 50, 50))) == (
        2,
        [1],
    )
    reason = choose(track(name("Ney"), low), track(high), track(BASS)).reason
    assert reason == (
        "it always sounds one note at a time, it is not the lowest, it has many notes, "
        "its name speaks of a melody"
    )


def test_a_reason_tells_how_often_notes_sound_alone() -> None:
    # 480 ticks of a chord, then 480 * 3 of single notes: 75 %
    mixed = chord(72, 76) + notes(77, 79, 81)
    assert choose(track(mixed), track(BASS)).reason.startswith("75% of its time it sounds one note at a time")


def test_notes_of_no_length_are_alone() -> None:
    assert choose(track(notes(69, 71, ticks=0))).part.alone == 1


def test_a_single_track_is_chosen_from_by_channel() -> None:
    together = track(MELODY, CHORDS) + b""
    assert taken(together) == (1, [1])
    # melody, chords and bass at once, as a file of format 0 has them
    both = " ".join(
        f"00 90 {high:02X} 40 00 91 2D 40 00 91 34 40 83 60 80 {high:02X} 40 00 81 2D 40 00 81 34 40"
        for high in (69, 71, 72)
    )
    assert taken(track(both)) == (1, [1])


def test_channels_that_hand_over_to_each_other_are_one_line() -> None:
    # as notation exports write a comma: on another channel, whose bend stays
    line = notes(69) + notes(71, channel=2) + notes(72) + notes(71, channel=2) + notes(74, channel=3)
    assert taken(track("00 E1 61 38", line)) == (1, [1, 2, 3])


def test_channels_that_sound_together_are_parts_of_their_own() -> None:
    both = " ".join(
        f"00 90 {key:02X} 40 00 91 {key - 24:02X} 40 83 60 80 {key:02X} 40 00 81 {key - 24:02X} 40"
        for key in (69, 71)
    )
    choice = choose(track(both))
    assert sorted(choice.part.channels) == [0]
    assert [sorted(part.channels) for part in choice.others] == [[1]]


def mpe_notes(*keys: int, bends: bool = True) -> str:
    """Each note on the next of channels 2, 3, 4, bent, and held on for long into the next one."""
    ons = [(place * 480, place % 3 + 1, key) for place, key in enumerate(keys)]
    timed = [
        (tick, order, [f"E{channel:X} 61 38"] * bends + [f"9{channel:X} {key:02X} 40"])
        for order, (tick, channel, key) in enumerate(ons)
    ]
    timed += [(tick + 900, -1, [f"8{channel:X} {key:02X} 40"]) for tick, channel, key in ons]
    events, before = [], 0
    for tick, _, messages in sorted(timed):
        for message in messages:
            delta = tick - before
            events.append(f"{delta >> 7 | 0x80:02X} {delta & 0x7F:02X} {message}")
            before = tick
    return " ".join(events)


KEYS = (69, 71, 72, 74, 76, 74, 72, 71)


def test_notes_that_have_each_a_channel_and_a_bend_are_one_line() -> None:
    assert taken(track(mpe_notes(*KEYS))) == (1, [2, 3, 4])
    # without bends the channels are voices that sound together
    assert len(taken(track(mpe_notes(*KEYS, bends=False)))[1]) == 1


def test_bent_voices_that_are_struck_together_are_not_one_line() -> None:
    voices = "".join(f"00 E{channel:X} 61 38 " for channel in range(3)) + " ".join(
        " ".join(f"00 9{channel:X} {key + 7 * channel:02X} 40" for channel in range(3))
        + " "
        + " ".join(
            f"{'83 60' if not channel else '00'} 8{channel:X} {key + 7 * channel:02X} 40"
            for channel in range(3)
        )
        for key in (60, 62, 64)
    )
    assert taken(track(voices)) == (1, [3])


ZONE = "00 B0 65 00 00 B0 64 06 00 B0 06 {:02X}"


def test_the_channels_of_an_mpe_zone_are_one_line() -> None:
    # RPN 6 on channel 1: three members, channels 2 to 4, though they sound together and have no bends
    assert taken(track(ZONE.format(3)), track(mpe_notes(*KEYS, bends=False))) == (2, [2, 3, 4])


def test_an_upper_zone_takes_its_channels_from_the_lower_one() -> None:
    # 15 members below; then 12 members on channel 16 take channels 4 to 15
    upper = ZONE.format(12).replace("B0 ", "BF ")
    part = choose(track(ZONE.format(15), upper), track(mpe_notes(*KEYS, bends=False))).part
    assert sorted(part.zone) in ([0, 1, 2], list(range(3, 16)))


def test_a_zone_that_is_switched_off_at_the_end_still_counts() -> None:
    assert taken(track(ZONE.format(3), mpe_notes(*KEYS, bends=False), ZONE.format(0))) == (1, [2, 3, 4])


def test_channel_10_of_a_zone_is_no_drum() -> None:
    line = notes(69, 71, channel=10) + notes(72, channel=2)
    midi_file = read_midi_file(midi(track(ZONE.format(15), line)))
    part = choose_part(midi_file, "a.mid").part
    assert (sorted(part.channels), count_drum_notes(midi_file, part)) == ([1, 9], 0)


def test_drum_notes_are_counted() -> None:
    midi_file = read_midi_file(midi(track(MELODY), track(DRUMS)))
    assert count_drum_notes(midi_file, choose_part(midi_file, "a.mid").part) == 4
    assert count_drum_notes(midi_file, choose_part(midi_file, "a.mid", channel=10).part) == 0


FOUR = (track(name("Yol")), track(name("Ney"), MELODY), track(name("Kânûn bas"), BASS), track(DRUMS))


def test_a_track_is_asked_for_by_number_or_by_a_part_of_its_name() -> None:
    assert taken(*FOUR, asked="3") == (3, [1])
    assert taken(*FOUR, asked="KANUN") == (3, [1])
    choice = choose(*FOUR, asked=" 3 ")
    assert choice.reason == "as you asked"
    assert [part.track.number for part in choice.others] == [2]


def test_of_several_tracks_of_that_name_the_melody_is_taken() -> None:
    # "n" is in Ney and in Kanun
    assert taken(*FOUR, asked="n") == (2, [1])


def test_a_channel_is_asked_for_in_any_track() -> None:
    assert taken(track(MELODY), track(on_channel(BASS, 5)), channel=5) == (2, [5])
    assert taken(*FOUR, channel=10) == (4, [10])
    assert taken(track(MELODY, on_channel(BASS, 5)), asked="1", channel=5) == (1, [5])


LISTING = (
    "the file holds track 1 'Yol': 0 notes; track 2 'Ney': 8 notes on channel 1; "
    "track 3 'Kânûn bas': 4 notes on channel 1; track 4: 4 notes on channel 10"
)


@pytest.mark.parametrize("asked", ["5", "0", "zurna", "٣٣", "9" * 5000, "?"])
def test_a_track_that_does_not_exist_is_refused(asked: str) -> None:
    shown = asked if len(asked) <= 40 else "9" * 39 + "…"
    assert refusal(*FOUR, asked=asked) == f"a.mid: no track {shown!r} found; choose another: {LISTING}"


def test_a_track_without_notes_is_refused() -> None:
    assert refusal(*FOUR, asked="yol") == f"a.mid: no notes found in track 1 'Yol'; {LISTING}"


def test_a_channel_without_notes_is_refused() -> None:
    assert refusal(*FOUR, channel=7) == f"a.mid: no notes on channel 7 found in 4 tracks; {LISTING}"
    assert refusal(*FOUR, asked="ney", channel=7).startswith(
        "a.mid: no notes on channel 7 found in track 2 'Ney'; "
    )


def test_a_track_of_drums_alone_is_refused() -> None:
    assert refusal(*FOUR, asked="4").startswith(
        "a.mid: only 4 drum notes (channel 10) found in track 4; --channel 10 takes them for pitches; "
    )


def test_a_file_of_drums_alone_is_refused() -> None:
    assert refusal(track(DRUMS), track(notes(36, channel=10))) == (
        "a.mid: only 5 drum notes (channel 10) found in 2 tracks; --channel 10 takes them for pitches; "
        "the file holds track 1: 4 notes on channel 10; track 2: 1 note on channel 10"
    )


def test_a_file_without_notes_is_refused() -> None:
    assert refusal(track(name("Yol")), track("00 E0 61 38 00 80 45 40")) == (
        "a.mid: no notes found in 2 tracks, expected a melody; save it anew with its notes"
    )


def test_a_damaged_file_without_notes_says_what_is_damaged() -> None:
    assert refusal(track("00 F4")) == (
        "a.mid: no notes found in 1 track; track 1 stopped at byte 23 of the file: F4 was found, "
        "which MIDI does not define; save it anew as a MIDI file"
    )


def test_many_tracks_are_listed_in_part() -> None:
    tracks = [track(name("x" * 60))] * 13 + [track(MELODY)]
    text = refusal(*tracks, asked="40")
    assert text.endswith("; …")
    assert text.count("track ") == 13  # the one asked for, and twelve


def test_several_channels_are_listed() -> None:
    text = refusal(track(notes(69), notes(69, channel=3), notes(69, channel=4)), asked="2")
    assert text.endswith("the file holds track 1: 3 notes on channels 1, 3 and 4")
