"""What is said of a keyboard's tuning.

Outside sources of the messages, named beside each: MIDI 1.0, MPE, the MIDI Tuning Standard, XG.
"""

from __future__ import annotations

from dataclasses import replace

import pytest

from melodycoach.sources.keyboard_profile import KeyboardProfile
from melodycoach.sources.midi_mpe import MpeZone
from melodycoach.sources.midi_pitch import PitchTracker
from melodycoach.tuning_words import tuning_sentence

PLAIN = "plain keys: each stands for every perde near it"
E_AND_B_DOWN = "40 40 40 40 29 40 40 40 40 40 40 29"


def tracked(*messages: str, zones: tuple[MpeZone, ...] = ()) -> str:
    tracker = PitchTracker(zones=zones)
    for message in messages:
        tracker.decode(bytes.fromhex(message), 0.0)
    return tuning_sentence(tracker)


def test_an_assumed_bend_range_is_said_to_be_assumed() -> None:
    assert tracked("E1 00 30") == (
        "bends read on channel 2, range ±2 semitones (none was sent: MIDI's default)"
    )


def test_a_bend_range_that_was_sent_is_said_to_be_sent() -> None:
    # registered parameter 0, data entry 24 semitones and 50 cents (MIDI 1.0)
    assert tracked("B0 65 00", "B0 64 00", "B0 06 18", "B0 26 32") == (
        "bends read on channel 1, range ±24.5 semitones (sent by the keyboard)"
    )


def test_of_several_channels_the_one_that_is_bent_most_is_spoken_of() -> None:
    assert "channel 3," in tracked("E0 00 3F", "E2 00 30", "E3 00 41")


def test_keys_that_a_message_tuned_are_named_by_letter_where_all_octaves_agree() -> None:
    # MIDI Tuning Standard, octave form of single bytes on all channels: 29 is 23 c down
    assert tracked(f"F0 7E 7F 08 08 03 7F 7F {E_AND_B_DOWN} F7") == (
        "tuned by a message from the keyboard: E -23 c, B -23 c"
    )


def test_a_key_that_is_tuned_by_itself_is_named_with_its_octave() -> None:
    # key 64 is E4, as A4 is 69; 3F 40 00 is half a semitone below it
    assert tracked("F0 7F 7F 08 02 00 01 40 3F 40 00 F7") == "tuned by a message from the keyboard: E4 -50 c"


def test_the_channels_that_a_message_tuned_are_named_unless_it_tuned_all() -> None:
    # XG scale tuning of part 1 and 4
    assert (
        tracked("F0 43 10 4C 08 03 45 29 F7") == "tuned by a message from the keyboard on channel 4: E -23 c"
    )
    assert tracked("F0 43 10 4C 08 00 45 29 F7", "F0 43 10 4C 08 03 45 29 F7") == (
        "tuned by a message from the keyboard on channels 1 and 4: E -23 c"
    )
    assert tracked(f"F0 7E 7F 08 08 03 7F 7F {E_AND_B_DOWN} F7", "F0 43 10 4C 08 01 45 40 F7") == (
        "tuned by a message from the keyboard on 15 channels: E -23 c, B -23 c, other channels differently"
    )


def test_of_many_keys_the_first_twelve_are_named() -> None:
    changes = " ".join(f"{key:02X} {key:02X} 20 00" for key in range(60, 75))
    said = tracked(f"F0 7F 7F 08 02 00 0F {changes} F7")
    assert said.startswith("tuned by a message from the keyboard: C4 +25 c, C#4 +25 c, D4 +25 c, Eb4 +25 c")
    assert said.endswith("Bb4 +25 c, B4 +25 c, and 3 more")


def test_keys_put_back_in_their_places_are_plain() -> None:
    assert tracked("F0 43 10 4C 08 03 45 29 F7", "F0 43 10 4C 08 03 45 40 F7") == PLAIN


@pytest.mark.parametrize(
    ("n_members", "words"), [(15, "15 channels"), (1, "1 channel"), (0, ""), (4, "4 channels")]
)
def test_a_zone_that_the_keyboard_set_up_is_said(n_members: int, words: str) -> None:
    # MPE: RPN 6 on channel 1
    said = tracked("B0 65 00", "B0 64 06", f"B0 06 {n_members:02X}", "E1 59 3F")
    if n_members:
        assert said == f"MPE, {words}, range ±48 semitones (sent by the keyboard)"
    else:
        assert said == "bends read on channel 2, range ±2 semitones (none was sent: MIDI's default)"


def test_a_zone_that_the_player_set_is_said_to_be_the_players() -> None:
    zones = (MpeZone(0, 7, 2400), MpeZone(15, 7, 2400))
    assert tracked(zones=zones) == "MPE, 7 and 7 channels, range ±24 semitones (as you have set it)"
    assert tracked("E3 00 00", zones=zones) == (
        "MPE, 7 and 7 channels, range ±24 semitones (as you have set it)"
    )
    # RPN 0 to one member: 12 semitones
    assert tracked("B2 65 00", "B2 64 00", "B2 06 0C", zones=zones) == (
        "MPE, 7 and 7 channels, range ±12 semitones (sent by the keyboard)"
    )


def test_bends_beside_a_zone_are_said_too() -> None:
    assert tracked("EF 00 00", zones=(MpeZone(0, 4),)) == (
        "MPE, 4 channels, range ±48 semitones (as you have set it); "
        "bends read on channel 16, range ±2 semitones (none was sent: MIDI's default)"
    )


def test_transposition_leaves_keys_plain_and_is_said() -> None:
    # master coarse tuning (04 04), a whole tone down; RPN 2 on channel 3, a semitone up
    assert tracked("F0 7F 7F 04 04 00 3E F7") == (
        f"{PLAIN}; every key moved by -2 semitones (sent by the keyboard)"
    )
    assert tracked("B2 65 00", "B2 64 02", "B2 06 41") == (
        f"{PLAIN}; keys of channel 3 moved by +1 semitone (sent by the keyboard)"
    )


def test_fine_tuning_is_said() -> None:
    # RPN 1 and master fine tuning (04 03): 20 00 is 50 c down
    assert tracked("B0 65 00", "B0 64 01", "B0 06 20") == (
        "keys of channel 1 moved by -50 c (sent by the keyboard)"
    )
    assert tracked("F0 7F 7F 04 03 00 20 F7") == "every key moved by -50 c (sent by the keyboard)"


def test_a_concert_pitch_is_said_and_leaves_keys_plain() -> None:
    # 643 of 100 / 8192 c above the middle, 1200 * log2(442 / 440) = 7.85 c
    assert tracked("F0 7F 7F 04 03 03 45 F7") == (f"{PLAIN}; concert pitch A = 442 Hz (sent by the keyboard)")


# with a profile

E_AND_B = (0.0, 0.0, 0.0, 0.0, -23.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, -41.5)
HOME = KeyboardProfile("home", E_AND_B)


def profiled(profile: KeyboardProfile, *messages: str) -> str:
    tracker = profile.tracker()
    for message in messages:
        tracker.decode(bytes.fromhex(message), 0.0)
    return tuning_sentence(tracker, profile)


def test_the_tuning_of_a_profile_is_said_with_what_it_is() -> None:
    assert profiled(HOME) == "tuned by your profile 'home': E -23 c, B -42 c"
    named = replace(HOME, tuning="Segâh, as usually played")
    assert profiled(named) == "tuned by your profile 'home' (Segâh, as usually played): E -23 c, B -42 c"


def test_a_message_over_a_profile_is_said_to_be_over_it() -> None:
    # XG scale tuning of part 1: E 50 cents down
    assert profiled(HOME, "F0 43 10 4C 08 00 45 0E F7") == (
        "tuned by a message from the keyboard over your profile 'home' on channel 1: E -50 c, B -42 c, "
        "other channels differently"
    )
    # MIDI Tuning Standard, all channels
    assert profiled(HOME, f"F0 7E 7F 08 08 03 7F 7F {E_AND_B_DOWN} F7") == (
        "tuned by a message from the keyboard over your profile 'home': E -23 c, B -23 c"
    )


def test_keys_that_a_message_put_back_are_said_to_be_put_back() -> None:
    plain = " ".join(["40"] * 12)
    assert profiled(HOME, f"F0 7E 7F 08 08 03 7F 7F {plain} F7") == (
        "plain keys, put back by a message from the keyboard over your profile 'home': each stands for every "
        "perde near it"
    )


def test_a_profile_without_offsets_leaves_keys_plain_and_says_its_transposition() -> None:
    assert profiled(KeyboardProfile("k")) == PLAIN
    assert profiled(KeyboardProfile("k", semitones=-12)) == (
        f"{PLAIN}; every key moved by -12 semitones (by your profile 'k')"
    )
    assert profiled(KeyboardProfile("k", semitones=1), "F0 7F 7F 04 04 00 3E F7") == (
        f"{PLAIN}; every key moved by +1 semitone (by your profile 'k'); "
        "every key moved by -2 semitones (sent by the keyboard)"
    )


def test_the_zone_of_a_profile_is_said_to_be_the_players() -> None:
    said = profiled(replace(HOME, zones=(MpeZone(0, 7, 2400),)))
    assert said.startswith("MPE, 7 channels, range ±24 semitones (as you have set it); tuned by your profile")
