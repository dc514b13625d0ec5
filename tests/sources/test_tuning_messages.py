"""Twelve offsets as MIDI messages.

Outside sources: the MIDI Tuning Standard, scale/octave tuning of one byte and of two, with worked bytes for
E a comma and a quarter tone down that FluidSynth 2.3.1 decoded to -22.64404 c, -23 c and -50 c; MIDI 1.0,
registered parameter 1. mido parses every message again. Our own reader, tested against other sources
in test_midi_tuning.py, gives the offsets back.
"""

from __future__ import annotations

import mido
import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.core.pitch import COMMA_CENTS
from melodycoach.sources.midi_pitch import PitchTracker
from melodycoach.sources.midi_tuning import TunedOctave, read_tuning
from melodycoach.sources.tuning_messages import (
    MELODIC_CHANNELS,
    TuningForm,
    channel_of_key,
    tuning_messages,
)

E = 4
OFFSETS = st.lists(st.floats(-50, 50), min_size=12, max_size=12)
CHANNELS = st.one_of(st.none(), st.lists(st.integers(0, 15), min_size=12, unique=True))
WORKED = "40 00 40 00 40 00 40 00 {} 40 00 40 00 40 00 40 00 40 00 40 00 40 00"


def on_e(cents: float) -> list[float]:
    return [cents if key == E else 0.0 for key in range(12)]


@pytest.mark.parametrize(
    ("form", "cents", "written"),
    [
        # MIDI Tuning Standard; the pairs 31 41 and 20 00 are the worked ones
        (TuningForm.TWO_BYTES, -COMMA_CENTS, f"F0 7F 7F 08 09 03 7F 7F {WORKED.format('31 41')} F7"),
        (TuningForm.TWO_BYTES, -50.0, f"F0 7F 7F 08 09 03 7F 7F {WORKED.format('20 00')} F7"),
        (TuningForm.ONE_BYTE, -COMMA_CENTS, "F0 7F 7F 08 08 03 7F 7F 40 40 40 40 29 40 40 40 40 40 40 40 F7"),
        (TuningForm.ONE_BYTE, -50.0, "F0 7F 7F 08 08 03 7F 7F 40 40 40 40 0E 40 40 40 40 40 40 40 F7"),
    ],
)
def test_an_octave_is_written_as_the_standard_s_examples_are(
    form: TuningForm, cents: float, written: str
) -> None:
    assert tuning_messages(on_e(cents), form) == (bytes.fromhex(written),)


def test_messages_have_the_lengths_that_the_standard_gives() -> None:
    forms = (TuningForm.ONE_BYTE, TuningForm.TWO_BYTES)
    assert [len(tuning_messages([0.0] * 12, form)[0]) for form in forms] == [21, 33]


def test_the_channels_of_a_message_are_a_mask_from_16_down_to_1() -> None:
    # ff gg hh: channels 15-16, 8-14, 1-7 (MIDI Tuning Standard)
    [message] = tuning_messages([0.0] * 12, TuningForm.ONE_BYTE, [0, 7, 15])
    assert message[5:8].hex(" ") == "02 01 01"


def test_a_channel_for_each_key_is_tuned_by_its_registered_parameter() -> None:
    # RPN 1: 65 00 64 01, then 31 41 for a comma down, then the null parameter; E is the fifth key. The fine
    # byte, 26, stands on both sides of the coarse one, 06: FluidSynth takes the first, the standard the last
    messages = tuning_messages(on_e(-COMMA_CENTS), TuningForm.CHANNELS)
    assert len(messages) == 12 * 7
    assert b"".join(messages[28:35]).hex(" ") == (
        "b4 65 00 b4 64 01 b4 26 41 b4 06 31 b4 26 41 b4 65 7f b4 64 7f"
    )
    assert b"".join(messages[:7]).hex(" ") == (
        "b0 65 00 b0 64 01 b0 26 00 b0 06 40 b0 26 00 b0 65 7f b0 64 7f"
    )


def test_a_channel_for_each_key_passes_the_drums_by() -> None:
    # channel 10 carries drums: common practice
    assert channel_of_key() == (0, 1, 2, 3, 4, 5, 6, 7, 8, 10, 11, 12)
    assert 9 not in MELODIC_CHANNELS
    assert channel_of_key(range(2, 16)) == tuple(range(2, 14))


@given(OFFSETS, CHANNELS)
def test_mido_parses_what_is_written_and_gives_it_back(
    offsets: list[float], channels: list[int] | None
) -> None:
    for form in TuningForm:
        for message in tuning_messages(offsets, form, channels):
            parsed = mido.Message.from_bytes(message)
            assert bytes(parsed.bytes()) == message
            assert parsed.type in ("sysex", "control_change")
        stream = mido.Parser()
        stream.feed(b"".join(tuning_messages(offsets, form, channels)))
        assert stream.pending() == len(tuning_messages(offsets, form, channels))


@given(OFFSETS, CHANNELS)
def test_our_reader_gives_an_octave_back_within_what_its_form_can_hold(
    offsets: list[float], channels: list[int] | None
) -> None:
    for form, error in ((TuningForm.ONE_BYTE, 0.5), (TuningForm.TWO_BYTES, 0.0062)):
        [message] = tuning_messages(offsets, form, channels)
        told = read_tuning(message)
        assert isinstance(told, TunedOctave)
        assert told.at_once
        assert told.channels == (tuple(range(16)) if channels is None else tuple(sorted(channels)))
        assert all(abs(told.cents_by_class[key] - offsets[key]) <= error for key in range(12))


@given(OFFSETS)
def test_our_tracker_hears_each_key_on_its_own_channel_in_tune(offsets: list[float]) -> None:
    tracker = PitchTracker()
    for message in tuning_messages(offsets, TuningForm.CHANNELS):
        tracker.decode(message, 0.0)
    for key, channel in enumerate(channel_of_key()):
        [note] = tracker.decode([0x90 | channel, 60 + key, 64], 0.0)
        expected = 100.0 * (60 + key) + offsets[key]
        assert abs(note.pitch_cents - expected) <= (1.0 if abs(offsets[key]) < 1.01 else 0.0062)


def test_what_a_form_cannot_hold_becomes_the_nearest_that_it_can() -> None:
    # one byte holds -64 to +63 c, two bytes -100 to +99.99 c
    [single] = tuning_messages([-90.0, 90.0] + [0.0] * 10, TuningForm.ONE_BYTE)
    assert single[8:10].hex(" ") == "00 7f"
    [double] = tuning_messages([-200.0, 200.0] + [0.0] * 10, TuningForm.TWO_BYTES)
    assert double[8:12].hex(" ") == "00 00 7f 7f"


def test_what_cannot_be_meant_is_a_mistake_of_the_caller() -> None:
    with pytest.raises(ValueError, match="11 offsets, expected 12"):
        tuning_messages([0.0] * 11, TuningForm.TWO_BYTES)
    with pytest.raises(ValueError, match="expected 0 to 15"):
        tuning_messages([0.0] * 12, TuningForm.TWO_BYTES, [16])
    with pytest.raises(ValueError, match="3 channels, expected 12 or more"):
        tuning_messages([0.0] * 12, TuningForm.CHANNELS, [0, 1, 2])
