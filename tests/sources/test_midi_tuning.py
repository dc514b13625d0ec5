"""Tuning messages, from bytes to what they say, and the tables that follow them.

Outside sources, named beside each check: the MIDI Tuning Standard (layout of the messages; its table
of worked frequency words, written down here from memory and recomputed from A4 = 440 Hz), a
synthesiser maker's manual with a worked Arabian scale in a GS message, the published GS and XG
addresses. The examples on E, a comma or a quarter tone down, were decoded by the synthesiser
FluidSynth 2.3.1, an independent reader: -22.64404 c by a word or by two bytes, -23 c by a single
byte, and -50 c by each. mido parses every message again.
"""

from __future__ import annotations

import math
from functools import reduce
from operator import xor

import mido
import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.sources.midi_tuning import (
    ALL_CHANNELS,
    NOTHING_STATED,
    MasterCoarse,
    MasterFine,
    Other,
    StatedTuning,
    TunedKeys,
    TunedOctave,
    TuningTables,
    read_tuning,
    word_cents,
)

E = 4
COMMA_WORD, QUARTER_WORD = "3F 63 02", "3F 40 00"
NAME = "4D 61 6B 61 6D 20 20 20 20 20 20 20 20 20 20 20"  # 16 letters


def octave_bytes(value: str, default: str = "40") -> str:
    """Twelve values, C to B, with one on E."""
    return " ".join(value if place == E else default for place in range(12))


def with_checksum(text: str) -> str:
    """End a dump by the exclusive or of all its bytes after F0 (MIDI sample and tuning dump standards)."""
    total = reduce(xor, bytes.fromhex(text)[1:])
    return f"{text} {total & 0x7F:02X} F7"


WORDS = [f"{key:02X} 00 00" for key in range(128)]
WORDS_WITH_COMMA = [COMMA_WORD if key == 64 else word for key, word in enumerate(WORDS)]

E_MESSAGES = {
    "single note, real time": ("F0 7F 7F 08 02 00 01 40 3F 63 02 F7", -22.64404),
    "single note, real time, quarter tone": ("F0 7F 7F 08 02 00 01 40 3F 40 00 F7", -50.0),
    "single note with bank, later": ("F0 7E 7F 08 07 00 00 01 40 3F 63 02 F7", -22.64404),
    "single note with bank, later, quarter tone": ("F0 7E 7F 08 07 00 00 01 40 3F 40 00 F7", -50.0),
    "single note with bank, real time": ("F0 7F 7F 08 07 00 00 01 40 3F 63 02 F7", -22.64404),
    "bulk dump": (with_checksum(f"F0 7E 7F 08 01 00 {NAME} {' '.join(WORDS_WITH_COMMA)}"), -22.64404),
    "bulk dump with bank": (
        with_checksum(f"F0 7E 7F 08 04 00 00 {NAME} {' '.join(WORDS_WITH_COMMA)}"),
        -22.64404,
    ),
    "octave dump, one byte": (with_checksum(f"F0 7E 7F 08 05 00 00 {NAME} {octave_bytes('29')}"), -23.0),
    "octave dump, two bytes": (
        with_checksum(f"F0 7E 7F 08 06 00 00 {NAME} {octave_bytes('31 41', '40 00')}"),
        -22.64404,
    ),
    "octave, one byte, later": (f"F0 7E 7F 08 08 03 7F 7F {octave_bytes('29')} F7", -23.0),
    "octave, one byte, later, quarter tone": (f"F0 7E 7F 08 08 03 7F 7F {octave_bytes('0E')} F7", -50.0),
    "octave, one byte, real time": (f"F0 7F 7F 08 08 03 7F 7F {octave_bytes('29')} F7", -23.0),
    "octave, two bytes, later": (f"F0 7E 7F 08 09 03 7F 7F {octave_bytes('31 41', '40 00')} F7", -22.64404),
    "octave, two bytes, real time": (
        f"F0 7F 7F 08 09 03 7F 7F {octave_bytes('31 41', '40 00')} F7",
        -22.64404,
    ),
    "octave, two bytes, quarter tone": (
        f"F0 7F 7F 08 09 03 7F 7F {octave_bytes('20 00', '40 00')} F7",
        -50.0,
    ),
    "GS, one note": ("F0 41 10 42 12 40 11 44 29 42 F7", -23.0),
    "GS, one note, quarter tone": ("F0 41 10 42 12 40 11 44 0E 5D F7", -50.0),
    "XG, one note": ("F0 43 10 4C 08 00 45 29 F7", -23.0),
}
"""Messages that put E4, on channel 1, so many cents off its place."""


def tables_after(*texts: str) -> TuningTables:
    tables = TuningTables()
    for text in texts:
        match read_tuning(bytes.fromhex(text)):
            case TunedKeys() as told:
                tables.tune_keys(told)
            case TunedOctave() as told:
                tables.tune_octave(told)
            case other:
                pytest.fail(f"{text} gives {other}")
    return tables


@pytest.mark.parametrize(("text", "cents"), E_MESSAGES.values(), ids=E_MESSAGES.keys())
def test_the_worked_messages_tune_e_as_an_independent_reader_says(text: str, cents: float) -> None:
    # FluidSynth 2.3.1 for the universal forms; the makers' single notes: value - 64 = cents
    tables = tables_after(text)
    assert tables.key_cents(0, 64) == pytest.approx(cents, abs=0.0001)
    assert tables.key_cents(0, 65) == 0.0


@pytest.mark.parametrize(("text", "cents"), E_MESSAGES.values(), ids=E_MESSAGES.keys())
def test_mido_takes_every_example_for_one_whole_message(text: str, cents: float) -> None:
    message = mido.Message.from_bytes(bytes.fromhex(text))
    assert message.type == "sysex"
    assert bytes(message.bytes()) == bytes.fromhex(text)


@pytest.mark.parametrize("name", [name for name in E_MESSAGES if "real time" in name or "later" in name])
def test_real_time_messages_act_at_once_and_the_others_later(name: str) -> None:
    told = read_tuning(bytes.fromhex(E_MESSAGES[name][0]))
    assert isinstance(told, TunedKeys | TunedOctave)
    assert told.at_once == ("real time" in name)


def test_the_lengths_are_those_of_the_standard() -> None:
    # MIDI Tuning Standard: a bulk dump has 408 bytes, the octave forms 21 and 33
    assert len(bytes.fromhex(E_MESSAGES["bulk dump"][0])) == 408
    assert len(bytes.fromhex(E_MESSAGES["octave, one byte, later"][0])) == 21
    assert len(bytes.fromhex(E_MESSAGES["octave, two bytes, later"][0])) == 33


@pytest.mark.parametrize(
    ("word", "hertz"),
    [  # the worked table of the MIDI Tuning Standard, from memory
        ("00 00 00", 8.1758),
        ("01 00 00", 8.6620),
        ("0C 00 00", 16.3516),
        ("3C 00 00", 261.6256),
        ("3D 00 00", 277.1827),
        ("44 7F 7F", 439.9984),
        ("45 00 00", 440.0000),
        ("45 00 01", 440.0016),
        ("78 00 00", 8372.0181),
        ("7F 00 00", 12543.8540),
        ("7F 7F 7E", 13289.7300),
    ],
)
def test_the_frequency_words_of_the_standard_give_their_frequencies(word: str, hertz: float) -> None:
    cents = word_cents(bytes.fromhex(word))
    assert 440 * math.exp2((cents - 6900) / 1200) == pytest.approx(hertz, rel=1e-5)


def test_7f_7f_7f_leaves_a_key_as_it_is() -> None:
    # MIDI Tuning Standard: 7F 7F 7F means no change
    told = read_tuning(bytes.fromhex("F0 7F 7F 08 02 00 02 40 7F 7F 7F 41 41 40 00 F7"))
    assert isinstance(told, TunedKeys)
    assert dict(told.cents_by_key) == {65: 6550.0}


@given(st.integers(0, 127 * 16384 + 16382))
def test_every_pitch_comes_back_from_its_word(pitch: int) -> None:
    # n = pitch in semitones times 16384: xx = n >> 14, yy = n >> 7 & 7F, zz = n & 7F
    word = bytes((pitch >> 14, pitch >> 7 & 127, pitch & 127))
    assert word_cents(word) == pytest.approx(pitch * 100 / 16384, abs=1e-9)


def test_a_message_names_its_bank_and_program() -> None:
    told = read_tuning(bytes.fromhex("F0 7E 7F 08 07 03 05 01 40 3F 40 00 F7"))
    assert told == TunedKeys(3, 5, {64: 6350.0}, at_once=False)


@pytest.mark.parametrize(
    ("mask", "channels"),
    [  # MIDI Tuning Standard: channels 15-16, 8-14 and 1-7, lowest bit lowest channel
        ("03 7F 7F", tuple(range(16))),
        ("00 00 01", (0,)),
        ("00 01 00", (7,)),
        ("01 00 00", (14,)),
        ("02 40 40", (6, 13, 15)),
        ("7C 00 02", (1,)),  # reserved bits say nothing
        ("00 00 00", ()),
    ],
)
def test_an_octave_message_names_its_channels(mask: str, channels: tuple[int, ...]) -> None:
    told = read_tuning(bytes.fromhex(f"F0 7E 7F 08 08 {mask} {octave_bytes('29')} F7"))
    assert isinstance(told, TunedOctave)
    assert told.channels == channels


def test_the_ends_of_the_octave_forms() -> None:
    # one byte: -64 to +63 c; two bytes: -100 to +99.99 c (MIDI Tuning Standard)
    low = tables_after(f"F0 7E 7F 08 08 03 7F 7F {octave_bytes('00', '7F')} F7")
    assert (low.key_cents(0, 64), low.key_cents(0, 60)) == (-64.0, 63.0)
    wide = tables_after(f"F0 7E 7F 08 09 03 7F 7F {octave_bytes('00 00', '7F 7F')} F7")
    assert wide.key_cents(0, 64) == -100.0
    assert wide.key_cents(0, 60) == pytest.approx(99.99, abs=0.003)


ARABIAN = "F0 41 10 42 12 40 11 40 3A 6D 3E 34 0D 38 6B 3C 6F 40 36 0F 76 F7"


def test_a_makers_worked_arabian_scale_is_read() -> None:
    # a synthesiser manual's GS message; the offsets are the bytes minus 64, C to B
    tables = tables_after(ARABIAN)
    offsets = [-6, 45, -2, -12, -51, -8, 43, -4, 47, 0, -10, -49]
    assert [tables.key_cents(0, 60 + place) for place in range(12)] == offsets
    assert tables.key_cents(1, 64) is None


@pytest.mark.parametrize(("block", "channel"), [("11", 0), ("19", 8), ("10", 9), ("1A", 10), ("1F", 15)])
def test_gs_part_blocks_are_channels_with_part_10_first(block: str, channel: int) -> None:
    checksum = -(0x40 + int(block, 16) + 0x44 + 0x29) % 128
    told = read_tuning(bytes.fromhex(f"F0 41 10 42 12 40 {block} 44 29 {checksum:02X} F7"))
    assert told == TunedOctave((channel,), {E: -23.0}, at_once=True)


def test_a_gs_message_that_runs_on_past_b_tunes_up_to_b() -> None:
    checksum = -(0x40 + 0x11 + 0x4B + 0x29 + 0x29) % 128
    told = read_tuning(bytes.fromhex(f"F0 41 10 42 12 40 11 4B 29 29 {checksum:02X} F7"))
    assert told == TunedOctave((0,), {11: -23.0}, at_once=True)


def test_xg_tunes_one_part_from_c_to_b() -> None:
    # XG multi part parameters 41 to 4C
    assert read_tuning(bytes.fromhex("F0 43 10 4C 08 02 41 41 F7")) == TunedOctave((2,), {0: 1.0}, True)
    assert read_tuning(bytes.fromhex("F0 43 1F 4C 08 0F 4C 00 F7")) == TunedOctave((15,), {11: -64.0}, True)


@pytest.mark.parametrize(
    "text",
    [
        "F0 7E 7F 09 01 F7",  # General MIDI on
        "F0 7E 7F 09 02 F7",  # off
        "F0 7E 7F 09 03 F7",  # General MIDI 2 on
        "F0 41 10 42 12 40 00 7F 00 41 F7",  # GS reset
        "F0 43 10 4C 00 00 7E 00 F7",  # XG system on
    ],
)
def test_resets_are_known(text: str) -> None:
    assert read_tuning(bytes.fromhex(text)) is Other.RESET


def test_master_tuning_is_read() -> None:
    # device control 04 03: ll mm, the unit of RPN 1; 04 04: 00 mm, 40 is none (MIDI 1.0)
    assert read_tuning(bytes.fromhex("F0 7F 7F 04 03 00 20 F7")) == MasterFine(-50.0)
    comma = read_tuning(bytes.fromhex("F0 7F 7F 04 03 41 31 F7"))
    assert isinstance(comma, MasterFine)
    assert comma.cents == pytest.approx(-22.644, abs=0.001)
    assert read_tuning(bytes.fromhex("F0 7F 7F 04 04 00 3E F7")) == MasterCoarse(-2)


@pytest.mark.parametrize(
    "text",
    [
        "F0 7E 7F 08 00 00 F7",  # asks for a dump
        "F0 7E 7F 08 03 00 00 F7",  # asks for a dump, with bank
        "F0 7E 7F 06 01 F7",  # asks who is there
        "F0 7F 7F 04 01 00 40 F7",  # master volume
        "F0 41 10 42 12 40 11 13 40 5C F7",  # GS, another parameter of a part
        "F0 41 10 42 12 40 21 44 29 32 F7",  # GS, another block
        "F0 41 10 42 11 40 11 40 0C 63 F7",  # GS, a request
        "F0 41 10 16 12 40 11 44 29 42 F7",  # another instrument of that maker
        "F0 43 10 4C 08 00 0B 40 F7",  # XG, volume of a part
        "F0 43 10 4C 02 01 00 01 F7",  # XG, an effect
        "F0 43 10 4C 08 10 45 29 F7",  # XG, part 17, which no channel of this port plays
        "F0 43 00 4C 00 00 F7",  # XG, a dump
        "F0 43 F7",
        "F0 7D 01 02 F7",  # private use
        "F0 7E F7",
        "F0 F7",
    ],
)
def test_what_says_nothing_of_tuning_is_passed_over(text: str) -> None:
    assert read_tuning(bytes.fromhex(text)) is Other.SILENT


@pytest.mark.parametrize(
    "text",
    [
        "",
        "F0",
        "F7",
        "F0 7E 7F 08 08 03 7F 7F 40 40",  # no end
        "F0 7E 7F 08 08 03 7F 7F 40 40 F7",  # cut off
        f"F0 7E 7F 08 08 03 7F 7F {octave_bytes('40')} 40 F7",
        f"F0 7E 7F 08 08 03 7F 7F {octave_bytes('90')} F7",  # a status byte inside
        f"F0 7E 7F 08 09 03 7F 7F {octave_bytes('40')} F7",  # half the bytes
        f"F0 7E 7F 08 05 00 00 {NAME} {octave_bytes('40')} F7",  # no checksum
        "F0 7E 7F 08 05 F7",
        "F0 7E 7F 08 08 F7",
        "F0 7E 7F 08 01 00 F7",
        "F0 7E 7F 08 04 00 00 F7",
        "F0 7F 7F 08 02 F7",
        "F0 7F 7F 08 02 00 02 40 3F 63 02 F7",  # two announced, one there
        "F0 7E 7F 08 02 00 01 40 3F 63 02 F7",  # 02 is for real time only
        "F0 7F 7F 08 01 00 F7",  # a dump in real time
        "F0 7E 7F 08 0A 00 F7",  # no such form
        "F0 7F 7F 04 03 00 F7",
        "F0 7F 7F 04 04 00 40 00 F7",
        "F0 7E 7F 09 01 00 F7",
        "F0 41 10 42 12 40 11 44 29 43 F7",  # GS, wrong checksum
        "F0 41 10 42 12 40 11 F7",
        "F0 43 10 4C 08 00 F7",
    ],
)
def test_a_tuning_message_of_no_known_form_is_damaged(text: str) -> None:
    assert read_tuning(bytes.fromhex(text)) is Other.DAMAGED


@pytest.mark.parametrize("body", [(0x7E, -1, 8), (0x7E, 300, 8)])
def test_numbers_that_are_no_bytes_are_damage(body: tuple[int, ...]) -> None:
    assert read_tuning((0xF0, *body, 0xF7)) is Other.DAMAGED


def test_the_checksum_of_a_dump_is_not_looked_at() -> None:
    dump = bytearray.fromhex(E_MESSAGES["bulk dump"][0])
    dump[-2] ^= 0x55
    assert isinstance(read_tuning(bytes(dump)), TunedKeys)


near_tuning = st.builds(
    lambda head, body, end: bytes.fromhex(head) + body + end,
    st.sampled_from(
        ["F07E7F08", "F07F7F08", "F07E0009", "F07F0004", "F04110421240", "F043104C08", "F0", "F043104C"]
    ),
    st.binary(max_size=40).map(lambda body: bytes(byte & 0x7F for byte in body)),
    st.sampled_from([b"\xf7", b""]),
)
damaged_examples = st.builds(
    lambda example, place, byte: example[:place] + byte + example[place + 1 :],
    st.sampled_from([bytes.fromhex(text) for text, _ in E_MESSAGES.values()]),
    st.integers(0, 420),
    st.binary(max_size=2),
)


@given(st.lists(st.one_of(st.binary(max_size=30), near_tuning, damaged_examples), max_size=8))
def test_any_bytes_keep_the_tables_in_their_ranges(messages: list[bytes]) -> None:
    tables = TuningTables()
    for message in messages:
        match read_tuning(message):
            case TunedKeys() as told:
                assert all(0 <= key < 128 and 0 <= cents < 12800 for key, cents in told.cents_by_key.items())
                tables.tune_keys(told)
            case TunedOctave() as told:
                assert all(-100 <= cents <= 100 for cents in told.cents_by_class.values())
                tables.tune_octave(told)
            case MasterFine(cents):
                assert -100 <= cents <= 100
            case MasterCoarse(semitones):
                assert -64 <= semitones <= 63
            case other:
                assert isinstance(other, Other)
    for channel in ALL_CHANNELS:
        for key, cents in tables.table(channel).items():
            assert 0 <= key < 128
            assert -100 <= 100 * key + cents <= 12800


# tables


def test_the_latest_message_on_a_key_counts() -> None:
    octave, single = E_MESSAGES["octave, one byte, later"][0], E_MESSAGES["single note, real time"][0]
    assert tables_after(octave, single).key_cents(0, 64) == pytest.approx(-22.64404, abs=0.0001)
    assert tables_after(octave, single).key_cents(0, 76) == -23.0
    assert tables_after(single, octave).key_cents(0, 64) == -23.0


def test_a_channel_whose_keys_are_all_back_is_plain() -> None:
    off, back = octave_bytes("29"), octave_bytes("40")
    tables = tables_after(*(f"F0 7E 7F 08 08 03 7F 7F {offsets} F7" for offsets in (off, back)))
    assert tables.key_cents(0, 64) is None


def test_a_key_that_is_left_alone_on_a_tuned_channel_is_known_to_be_in_its_place() -> None:
    assert tables_after(E_MESSAGES["single note, real time"][0]).key_cents(0, 69) == 0.0


def test_a_stored_tuning_waits_until_it_is_chosen() -> None:
    tables = tables_after("F0 7E 7F 08 07 03 05 01 40 3F 40 00 F7")
    assert tables.key_cents(2, 64) is None
    tables.choose(2, 3, 5)
    assert tables.key_cents(2, 64) == -50.0
    assert tables.key_cents(1, 64) is None
    tables.choose(2, 3, 6)  # never sent
    assert tables.key_cents(2, 64) is None


def test_single_keys_of_a_stored_tuning_come_together_from_several_messages() -> None:
    # bank 3, program 5: key 64, then key 71, each half a semitone down
    tables = tables_after("F0 7E 7F 08 07 03 05 01 40 3F 40 00 F7", "F0 7E 7F 08 07 03 05 01 47 46 40 00 F7")
    tables.choose(0, 3, 5)
    assert (tables.key_cents(0, 64), tables.key_cents(0, 71)) == (-50.0, -50.0)


def test_a_stored_tuning_is_not_changed_by_an_octave_message() -> None:
    tables = tables_after(
        E_MESSAGES["single note, real time"][0], E_MESSAGES["octave, one byte, later, quarter tone"][0]
    )
    tables.choose(0, 0, 0)
    assert tables.key_cents(0, 64) == pytest.approx(-22.64404, abs=0.0001)


def test_channels_that_were_tuned_alike_share_their_table() -> None:
    tables = tables_after(E_MESSAGES["octave, one byte, later"][0], E_MESSAGES["XG, one note"][0])
    assert tables.table(1) is tables.table(15)
    assert tables.table(0) is not tables.table(1)


# what the player has stated

STATED = StatedTuning(tuple(-23.0 if key == E else 0.0 for key in range(12)))


def test_every_channel_begins_with_what_the_player_states() -> None:
    tables = TuningTables(STATED.table())
    assert {tables.key_cents(channel, 64) for channel in ALL_CHANNELS} == {-23.0}
    assert tables.key_cents(0, 65) == 0.0  # the others of the channel are exactly in their places


def test_a_statement_that_moves_no_key_leaves_them_plain() -> None:
    assert StatedTuning((0.5,) * 12).table() == {}
    assert TuningTables(NOTHING_STATED.table()).key_cents(0, 64) is None


def test_a_message_on_a_key_goes_before_what_the_player_states() -> None:
    tables = TuningTables(STATED.table())
    tables.tune_octave(TunedOctave((0,), {11: -50.0}, True))
    assert (tables.key_cents(0, 71), tables.key_cents(0, 64)) == (-50.0, -23.0)
    tables.tune_octave(TunedOctave((0,), {11: 0.0, 4: 0.0}, True))
    assert tables.key_cents(0, 64) is None
    assert tables.key_cents(1, 64) == -23.0


def test_a_stored_tuning_that_is_chosen_leaves_the_other_keys_as_stated() -> None:
    tables = TuningTables(STATED.table())
    tables.tune_keys(TunedKeys(0, 5, {71: 7050.0}, True))
    assert tables.key_cents(3, 71) == 0.0
    tables.choose(3, 0, 5)
    assert (tables.key_cents(3, 71), tables.key_cents(3, 64)) == (-50.0, -23.0)
    tables.choose(3, 0, 6)  # never sent
    assert (tables.key_cents(3, 71), tables.key_cents(3, 64)) == (0.0, -23.0)
