"""One token of note text, read and written."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.core.note import InputKind, Mark, Note, Silence
from melodycoach.core.pitch import COMMAS_53, SEMITONES_12, NamedPitch, PitchNames, Spelling
from melodycoach.errors import shorten
from melodycoach.sources.note_token import (
    Misread,
    complete,
    find_pitch_name,
    item_token,
    lay_out,
    name_token,
    plain_token,
    read_beats,
    read_key_mark,
    read_token,
    write_beats,
    write_pitch,
)
from melodycoach.sources.pack_file import load_pack

NAMES = load_pack("makam").names
TWELVE = PitchNames(SEMITONES_12)
FLAT_B, SHARP_F = Spelling("B", 0, -1, 0), Spelling("F", 1, 0, 0)
KEY = (FLAT_B, SHARP_F)
BOTH_NAMES = pytest.mark.parametrize(
    "names", [NAMES, PitchNames(COMMAS_53), TWELVE], ids=["makam", "53", "12"]
)


def units_of(token: str, names: PitchNames = NAMES, key: tuple[Spelling, ...] = ()) -> float:
    item = read_token(token, names, key)
    assert isinstance(item, Note), item
    assert item.kind is InputKind.TYPED
    return round(names.system.cents_to_units(item.pitch_cents), 6)


def problem_of(token: str, names: PitchNames = NAMES) -> str:
    item = read_token(token, names)
    assert isinstance(item, Misread), item
    return item.problem


def note_at(units: float, names: PitchNames = NAMES, beats: float | None = 1.0) -> Note:
    return Note(names.system.units_to_cents(units), 0.0, 0.0, beats=beats)


# --- written notes -----------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("token", "units"),
    [
        ("A4", 0),
        ("a4", 0),
        ("B4-1", 8),  # 9 - 1
        ("b4-1", 8),
        ("bb4", 4),  # B flat: 9 - 5
        ("bbb4", -1),  # B double flat: 9 - 2 * 5
        ("Bb4+1", 5),
        ("B♭4+1", 5),
        ("B4−1", 8),  # the sign minus
        ("B4–1", 8),  # a dash
        ("C♯5", 17),
        ("F##5", 43),  # 35 + 2 * 4
        ("B4-1.4", 7.6),
        ("B4-.4", 8.6),
        ("B4+0", 9),
        ("B=4", 9),
        ("B4-1.234567", 7.77),  # to a hundredth
        ("C(-1)+1", -304),  # C4 is 40 under A4, five octaves of 53 lower: -305, + 1
        ("A\u200b4", 0),  # a space without width, as web pages have
    ],
)
def test_a_written_note_is_letter_marks_octave_and_commas(token: str, units: float):
    assert units_of(token) == units


def test_in_twelve_the_marks_and_units_are_semitones():
    assert [units_of(token, TWELVE) for token in ("A4", "Bb4", "C#5", "A4+0.5", "F##5")] == [0, 1, 4, 0.5, 10]


@pytest.mark.parametrize(
    ("token", "cents"),
    [
        ("A4~", 6900),
        ("F#5~", 7800),  # F5 is key 77
        ("Gb5~", 7800),
        ("Cb4~", 5900),  # one under C4 = 60
        ("B#3~", 6000),
        ("C(-1)~", 0),
        ("G9~", 12700),
        ("bb4~", 7000),
        ("F=5~", 7700),
    ],
)
@BOTH_NAMES
def test_a_plain_key_is_its_ordinary_note_name_in_every_tone_system(
    token: str, cents: float, names: PitchNames
):
    assert read_token(token, names, KEY) == Note(cents, 0.0, 0.0, InputKind.KEYS, 1.0)


@pytest.mark.parametrize(
    ("token", "units"),
    [("B4", 8), ("B5", 61), ("F5", 39), ("b4", 8), ("B=4", 9), ("Bb4", 4), ("B4+0", 9), ("A4", 0)],
)
def test_a_bare_letter_takes_its_mark_from_the_key_signature(token: str, units: float):
    assert units_of(token, key=KEY) == units


# --- pitch names -------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("token", "units"),
    [
        ("segâh", 8),
        ("SEGÂH", 8),
        ("sega\u0302h", 8),  # a + combining circumflex
        ("TİZ-SEGÂH", 61),
        ("tız-segah", 61),
        ("tizsegah", 61),
        ("tiz_segah", 61),
        ("DİK-KÜRDÎ", 5),
        ("Dik-Kurdi", 5),
        ("segah-1", 7),
        ("segah+0.5", 8.5),
        ("tiz-segah-1.25", 59.75),
        ("hüseynîaşîran", -22),
    ],
)
def test_a_pitch_name_is_read_in_any_spelling_and_may_have_commas(token: str, units: float):
    assert units_of(token) == units


def test_a_pitch_name_looks_not_at_the_key_signature():
    assert units_of("bûselik", key=KEY) == 9


@pytest.mark.parametrize(
    "token", ["segah?", "-segah", "segah-", "'segah", "segah.", "日本segah", "", "se*gah", "¨"]
)
def test_a_pitch_name_with_anything_foreign_in_it_is_not_read(token: str):
    assert find_pitch_name(token, NAMES) is None


def test_a_name_of_the_pack_that_ends_in_a_number_is_not_taken_for_commas():
    names = PitchNames(
        COMMAS_53,
        (NamedPitch("step", 3, Spelling("A", 0, 3, 4)), NamedPitch("step 2", 5, Spelling("B", -1, 1, 4))),
    )
    assert units_of("step-2", names) == 5
    assert units_of("step-1", names) == 2
    # 3 - 2 = 1 would be written step-2, which is another pitch, so it is written as a note
    assert item_token(note_at(1, names), names, as_names=True) == "A4+1"


# --- lengths, rests, marks ---------------------------------------------------------------------


@pytest.mark.parametrize(
    ("text", "beats"),
    [
        ("2", 2),
        ("1/2", 0.5),
        ("0.5", 0.5),
        (".5", 0.5),
        ("3/2", 1.5),
        ("1/3", 1 / 3),
        ("0.01", 0.01),
        ("10000", 1e4),
    ],
)
def test_a_length_is_a_number_a_fraction_or_a_decimal(text: str, beats: float):
    assert read_beats(text) == beats


@pytest.mark.parametrize(
    "text",
    [
        "",
        "0",
        "-1",
        "1/0",
        "0/1",
        "nan",
        "inf",
        "1e3",
        "10001",
        "0.009",
        "1,5",
        "1.",
        "½",
        "²",
        "٣",
        "1/2/3",
        "9" * 5000,
    ],
)
def test_any_other_length_is_refused(text: str):
    assert read_beats(text) == Misread(
        f"has the length {shorten(text)!r}", "beats such as 2, 1/2 or 0.75, from 0.01 to 10000"
    )


def test_rests_and_marks_are_tokens_of_their_own():
    assert read_token("-", NAMES) == Silence(0.0, 1.0)
    assert read_token("-:1/2", NAMES) == Silence(0.0, 0.5)
    assert [read_token(mark, NAMES) for mark in ",.|"] == [Mark.BREATH, Mark.PHRASE_END, Mark.BAR]


@pytest.mark.parametrize(
    ("token", "problem"),
    [
        ("B", "has no octave"),
        ("F#-1", "has no octave"),
        ("B~", "has no octave"),
        ("B4-1~", "is a plain key with units"),
        ("G#9~", "is out of range"),
        ("Cb(-1)~", "is out of range"),
        ("G9+10", "is out of range"),
        ("C(-1)", "is out of range"),  # Pythagorean C is 5.66 cents under key 0
        ("C99", "is out of range"),
        ("segah+400", "is out of range"),
        ("segah~", "is a pitch name with '~'"),
        ("A4:x", "has the length 'x'"),
        ("-:0", "has the length '0'"),
        ("C-2", "has no octave"),
        ("AB4", "is neither a note nor a pitch name"),
        ("A#b4", "is neither a note nor a pitch name"),
        ("A#####4", "is neither a note nor a pitch name"),
        ("A4,", "is neither a note nor a pitch name"),
        ("A4.", "is neither a note nor a pitch name"),
        ("B4-1.", "is neither a note nor a pitch name"),
        ("A٤", "is neither a note nor a pitch name"),
        ("", "is neither a note nor a pitch name"),
        (":2", "is neither a note nor a pitch name"),
        ("~", "is neither a note nor a pitch name"),
        ("H4", "is neither a note nor a pitch name"),
    ],
)
def test_what_cannot_be_read_says_why(token: str, problem: str):
    assert problem_of(token) == problem


def test_under_a_key_with_marks_only_bare_letters_change():
    assert read_token("B4~", NAMES, KEY) == Note(7100.0, 0.0, 0.0, InputKind.KEYS, 1.0)


# --- key signatures ----------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("token", "spelling"),
    [
        ("B-1", FLAT_B),
        ("b-1", FLAT_B),
        ("F#", SHARP_F),
        ("Bb+1", Spelling("B", -1, 1, 0)),
        ("bb", Spelling("B", -1, 0, 0)),
        ("segah", FLAT_B),
        ("E-0.5", Spelling("E", 0, -0.5, 0)),
    ],
)
def test_a_key_signature_has_letters_without_octave_or_pitch_names(token: str, spelling: Spelling):
    assert read_key_mark(token, NAMES) == spelling


@pytest.mark.parametrize(
    ("token", "problem"),
    [
        ("B", "alters nothing"),
        ("B+0", "alters nothing"),
        ("rast", "alters nothing"),
        ("B4-1", "is no mark of a key signature"),
        ("", "is no mark of a key signature"),
        ("B-53", "alters by an octave or more"),
    ],
)
def test_other_marks_of_a_key_signature_are_refused(token: str, problem: str):
    mark = read_key_mark(token, NAMES)
    assert isinstance(mark, Misread)
    assert mark.problem == problem


# --- writing -----------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("beats", "text"),
    [
        (1.0, ""),
        (2.0, ":2"),
        (10.0, ":10"),
        (0.5, ":0.5"),
        (1.25, ":1.25"),
        (1 / 3, ":1/3"),
        (0.125, ":1/8"),
        (2 / 3, ":2/3"),
        (0.123456789, ":0.123456789"),
        (0.0, ":0.01"),
        (1e9, ":10000"),
    ],
)
def test_a_length_is_written_in_the_shortest_exact_way(beats: float, text: str):
    assert write_beats(beats) == text


@given(st.floats(0.01, 10_000) | st.fractions(1, 100, max_denominator=64).map(float))
def test_every_length_reads_back_exactly(beats: float):
    assert read_beats(write_beats(beats).removeprefix(":") or "1") == beats


@BOTH_NAMES
@given(
    hundredths=st.integers(-6900 * 53 // 12 + 1, 5800 * 53 // 12),
    key=st.sampled_from([(), KEY]),
    named=st.booleans(),
)
def test_every_typed_pitch_on_the_grid_reads_back_exactly(names, hundredths, key, named):
    units = hundredths / 100
    if not 0 <= names.system.units_to_cents(units) <= 12700:
        units /= 5
    note = note_at(round(units, 2), names)
    assert read_token(item_token(note, names, key=key, as_names=named), names, key) == note


@pytest.mark.parametrize("number", range(128))
def test_every_key_reads_back_exactly(number: int):
    note = Note(100.0 * number, 0.0, 0.0, InputKind.KEYS, 1.0)
    for names in (NAMES, TWELVE):
        assert read_token(item_token(note, names, key=KEY), names, KEY) == note


@pytest.mark.parametrize(
    ("item", "token"),
    [
        (Note(7100.0, 3.0, 0.5, InputKind.KEYS), "B4~:0.5"),
        (Note(7800.0, 3.0, 1.1, InputKind.KEYS), "F#5~"),
        (Note(7081.13, 3.0, 2.3, InputKind.TUNED), "B4-1:2.5"),
        (Note(7072.0, 3.0, 0.04, InputKind.RECORDED), "B4-1.4:0.5"),  # 172 / 22.6415 = 7.597 commas
        (Silence(3.1), "-:3"),
        (Mark.BREATH, ","),
        (Mark.PHRASE_END, "."),
        (Mark.BAR, "|"),
    ],
)
def test_played_items_have_their_length_to_the_half_beat(item, token: str):
    assert item_token(item, NAMES, 60) == token


def test_the_tempo_turns_played_seconds_into_beats():
    # 0.5 s at 120 beats a minute: 0.5 * 120 / 60 = 1 beat
    assert item_token(Note(6900.0, 0.0, 0.5, InputKind.KEYS), NAMES, 120) == "A4~"


def test_typed_lengths_are_written_exactly_at_any_tempo():
    assert item_token(Note(6900.0, 0.0, 0.1, beats=1 / 3), NAMES, 200) == "A4:1/3"


def test_pitches_that_have_a_name_can_be_written_by_it():
    written = [item_token(note_at(units), NAMES, as_names=True) for units in (8, 61, 7.6, 1)]
    assert written == ["segâh", "tiz-segâh", "segâh-0.4", "A4+1"]


def test_under_a_key_signature_bare_letters_are_written_where_they_suffice():
    written = [item_token(note_at(units), NAMES, key=KEY) for units in (8, 9, 61, 4, 39, 35, 0)]
    assert written == ["B4", "B=4", "B5", "Bb4", "F5", "F=5", "A4"]


def test_a_pitch_beyond_midi_is_written_at_its_edge():
    assert write_pitch(Note(-50.0, 0, 0, InputKind.KEYS), NAMES) == "C(-1)~"
    assert write_pitch(Note(13000.0, 0, 0, InputKind.KEYS), NAMES) == "G9~"
    for cents in (-1e9, 1e9):
        assert isinstance(read_token(write_pitch(Note(cents, 0, 0), NAMES), NAMES), Note)


@pytest.mark.parametrize("wrong", [math.nan, math.inf, -math.inf])
def test_what_is_not_finite_is_the_callers_mistake(wrong: float):
    with pytest.raises(ValueError, match="no finite pitch"):
        item_token(Note(wrong, 0.0, 1.0), NAMES)
    with pytest.raises(ValueError, match=r"no finite length at 72\.0 beats a minute"):
        item_token(Note(6900.0, 0.0, wrong), NAMES)
    with pytest.raises(ValueError, match="no finite length: "):
        item_token(Note(6900.0, 0.0, 1.0, beats=wrong), NAMES)


def test_a_tempo_of_nothing_is_the_callers_mistake():
    with pytest.raises(ValueError, match="no finite length at 0 beats a minute"):
        item_token(Note(6900.0, 0.0, 1.0), NAMES, 0)


# --- times -------------------------------------------------------------------------------------


def test_written_items_follow_one_another_and_a_silence_takes_its_time():
    # at 120 beats a minute a beat is 0.5 s: 1 beat, 2 beats of rest, 1 beat
    line = lay_out([note_at(0), Silence(0.0, 2.0), Mark.BAR, note_at(9)], 10.0, 120)
    assert line == (
        Note(6900.0, 10.0, 0.5, beats=1.0),
        Silence(1.0, 2.0),
        Mark.BAR,
        Note(note_at(9).pitch_cents, 11.5, 0.5, beats=1.0),
    )


def test_a_played_item_cannot_be_laid_out():
    with pytest.raises(ValueError, match="an item without beats cannot be laid out: Silence"):
        lay_out([Silence(1.0)])


# --- completion --------------------------------------------------------------------------------


def test_a_half_typed_name_completes_to_the_names_that_start_so_then_to_those_with_such_a_word():
    assert complete("SEG", NAMES) == ("segâh", "kaba-segâh", "tiz-segâh")
    assert complete("dık-k", NAMES) == ("dik-kürdî",)
    assert complete("hüs", NAMES)[:2] == ("hüseynîaşîran", "hüseynî")


@pytest.mark.parametrize("prefix", ["", "-", "B4", "a4-1", "segah:", "xyz", "日本"])
def test_what_is_no_beginning_of_a_name_completes_to_nothing(prefix: str):
    assert complete(prefix, NAMES) == ()


@pytest.mark.parametrize("named", NAMES.named, ids=lambda named: name_token(named.name))
def test_every_name_completes_from_its_first_letters_and_reads_back(named: NamedPitch):
    token = name_token(named.name)
    assert token in complete(token[:3], NAMES)
    assert units_of(token) == named.units


# --- small things ------------------------------------------------------------------------------


@given(st.text(max_size=20))
def test_reading_a_token_never_raises(token: str):
    for names in (NAMES, TWELVE):
        read_token(token, names, KEY)
        read_key_mark(token, names)
        complete(token, names)
        plain_token(token)


@given(st.from_regex(r"[A-Ga-gHr]?[#b=]{0,3}\(?-?\d{0,3}\)?[+-]?[\d.]{0,4}~?:?[\d./]{0,4}", fullmatch=True))
def test_what_nearly_is_a_note_is_read_and_written_alike_or_refused(token: str):
    item = read_token(token, NAMES)
    if not isinstance(item, Misread):
        assert read_token(item_token(item, NAMES), NAMES) == item


def test_long_texts_are_cut_in_messages():
    assert shorten("a" * 40) == "a" * 40
    assert shorten("a" * 41) == "a" * 39 + "…"
