"""Cents, tone systems, written names and pitch names."""

import math
from fractions import Fraction
from importlib.util import find_spec
from itertools import pairwise
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.core.pitch import (
    COMMAS_53,
    LETTERS,
    SEMITONES_12,
    TONE_SYSTEMS,
    NamedPitch,
    PitchNames,
    Spelling,
    ToneSystem,
    fold_name,
)
from melodycoach.sources.pack_file import load_pack

SYSTEMS = pytest.mark.parametrize("system", TONE_SYSTEMS.values(), ids=lambda system: f"{system.divisions}")
SMALL = PitchNames(
    COMMAS_53,
    (
        NamedPitch("segâh", 8, Spelling("B", 0, -1, 4)),
        NamedPitch("dik kürdî", 5, Spelling("B", -1, 1, 4)),
        NamedPitch("dügâh", 0, Spelling("A", 0, 0, 4)),
    ),
)


def ratios_of(scala_file: str) -> list[Fraction]:
    """The pitches of one file of the Scala archive, as music21 ships it; the first is 1/1."""
    spec = find_spec("music21")
    assert spec is not None
    assert spec.origin is not None
    path = Path(spec.origin).parent / "scale" / "scala" / "scl" / scala_file
    lines = [line for line in path.read_text("utf-8").splitlines() if not line.startswith("!")]
    ratios = [Fraction(line.strip()) for line in lines[2:] if line.strip()]
    assert len(ratios) == int(lines[1])
    return [Fraction(1), *ratios]


def cents_of(ratio: Fraction) -> float:
    return 1200 * math.log2(ratio)


# --- the MIDI scale ----------------------------------------------------------------------------


def test_a4_is_key_69_and_c4_key_60():
    # MIDI Tuning Standard, frequency table: key 45 hex = 69 is 440 Hz, 3C hex = 60 is 261.6256 Hz
    a4 = SEMITONES_12.spelling_cents(Spelling("A", 0, 0, 4))
    c4 = SEMITONES_12.spelling_cents(Spelling("C", 0, 0, 4))
    assert (a4, c4) == (6900, 6000)
    assert 440 * 2 ** ((c4 - a4) / 1200) == pytest.approx(261.6256, abs=5e-5)


def test_the_lowest_and_the_highest_midi_key_are_c_minus_1_and_g9():
    # key 0 and key 127, counted in octaves of 12 from C4 = 60: 60 - 5 * 12 = 0; 60 + 5 * 12 + 7 = 127
    assert SEMITONES_12.spelling_cents(Spelling("C", 0, 0, -1)) == 0
    assert SEMITONES_12.spelling_cents(Spelling("G", 0, 0, 9)) == 12700


@SYSTEMS
def test_an_octave_is_1200_cents_in_every_tone_system(system: ToneSystem):
    assert system.unit_cents * system.divisions == pytest.approx(1200)
    assert system.units_to_cents(system.divisions) == pytest.approx(8100)


@SYSTEMS
@given(cents=st.floats(0, 12700))
def test_cents_to_units_and_back_gives_the_same_pitch(system: ToneSystem, cents: float):
    assert system.units_to_cents(system.cents_to_units(cents)) == pytest.approx(cents, abs=1e-9)


# --- AEU arithmetic ----------------------------------------------------------------------------


def test_the_naturals_are_nine_commas_apart_and_four_at_the_half_tones():
    # common practice in AEU notation: C D E F G A B C = tanini 9, tanini 9, bakiye 4, 9, 9, 9, 4
    octave = [*COMMAS_53.natural_units, 53]
    assert [high - low for low, high in pairwise(octave)] == [9, 9, 4, 9, 9, 9, 4]


@pytest.mark.parametrize(
    ("written", "units"),
    [
        (Spelling("G", 0, 0, 4), -9),  # rast: one whole tone of 9 commas under dügâh
        (Spelling("B", 0, -1, 4), 8),  # segâh: 9 - 1
        (Spelling("B", -1, 0, 4), 4),  # kürdî: 9 - 5
        (Spelling("B", -1, 1, 4), 5),  # dik kürdî: 9 - 5 + 1
        (Spelling("C", 0, 0, 5), 13),  # çargâh: 9 + 4
        (Spelling("C", 1, 0, 5), 17),  # nim hicaz: 13 + 4
        (Spelling("D", 0, 0, 5), 22),  # nevâ: 13 + 9
        (Spelling("F", 1, 0, 5), 39),  # eviç: 22 + 9 + 4 + 4
        (Spelling("F", 2, 0, 5), 43),  # two sharps: 35 + 2 * 4
        (Spelling("A", 0, 0, 5), 53),  # muhayyer
    ],
    ids=str,
)
def test_written_notes_count_the_commas_that_aeu_gives_them(written: Spelling, units: int):
    assert COMMAS_53.spelling_units(written) == units


def test_the_24_tones_of_aeu_lie_within_a_cent_of_the_comma_grid_and_are_the_perdes_of_the_pack():
    # turkish_aeu.scl of the Scala archive (music21's copy), from kaba çargâh = C4 = -40 commas
    tones = [cents_of(ratio) for ratio in ratios_of("turkish_aeu.scl")]
    commas = [round(cents / COMMAS_53.unit_cents) for cents in tones]
    for cents, comma in zip(tones, commas, strict=True):
        assert cents == pytest.approx(comma * COMMAS_53.unit_cents, abs=1.0)
    perdes = sorted(named.units for named in load_pack("makam").names.named)
    assert [units for units in perdes if -40 <= units <= 13] == sorted(comma - 40 for comma in commas)


def test_yektas_24_tones_lie_within_two_cents_of_the_comma_grid():
    # turkish_24.scl of the Scala archive (music21's copy), from yegâh = D4 = -31 commas
    for ratio in ratios_of("turkish_24.scl"):
        units = COMMAS_53.cents_to_units(COMMAS_53.units_to_cents(-31) + cents_of(ratio))
        assert abs(units - round(units)) * COMMAS_53.unit_cents < 2.0


def test_the_naturals_are_pythagorean_within_a_cent():
    # a fifth 3/2 is 31 commas: F C G D A E B are one fifth apart
    above_f = [31 * fifths % 53 for fifths in range(7)]
    by_letter = dict(zip("FCGDAEB", above_f, strict=True))
    f_units = COMMAS_53.natural_units[LETTERS.index("F")]
    for letter, units in zip(LETTERS, COMMAS_53.natural_units, strict=True):
        assert (units - f_units) % 53 == by_letter[letter]
    assert 31 * COMMAS_53.unit_cents == pytest.approx(1200 * math.log2(1.5), abs=1.0)


# --- spelling ----------------------------------------------------------------------------------


@SYSTEMS
@pytest.mark.parametrize("units", range(-120, 131))
def test_every_unit_spells_and_reads_back_to_itself(system: ToneSystem, units: int):
    spelling = system.spell(units)
    assert system.spelling_units(spelling) == units
    assert PitchNames(system).spell(system.units_to_cents(units)) == spelling


@SYSTEMS
@given(hundredths=st.integers(-12000, 13000))
def test_a_pitch_between_units_spells_and_reads_back_to_a_hundredth(system: ToneSystem, hundredths: int):
    units = hundredths / 100
    spelling = PitchNames(system).spell(system.units_to_cents(units))
    assert system.spelling_units(spelling) == pytest.approx(units, abs=1e-9)


@SYSTEMS
@given(units=st.integers(-120, 130))
def test_an_octave_higher_is_the_same_letter_an_octave_higher(system: ToneSystem, units: int):
    low, high = system.spell(units), system.spell(units + system.divisions)
    assert (low.letter, low.accidentals, low.units, low.octave + 1) == (
        high.letter,
        high.accidentals,
        high.units,
        high.octave,
    )


def test_the_twelve_keys_are_spelled_without_a_remainder():
    # C# Eb F# G# Bb: the usual black keys
    keys = " ".join(str(SEMITONES_12.spell(units)) for units in range(-9, 3))
    assert keys == "C4 C#4 D4 Eb4 E4 F4 F#4 G4 G#4 A4 Bb4 B4"


@pytest.mark.parametrize(
    ("spelling", "text", "sign"),
    [
        (Spelling("B", 0, -1, 4), "B4-1", "B-1"),
        (Spelling("B", -1, 1, 4), "Bb4+1", "Bb+1"),
        (Spelling("F", 2, 0.0, 5), "F##5", "F##"),
        (Spelling("E", 0, -0.25, 5), "E5-0.25", "E-0.25"),
        (Spelling("A", 0, 0.001, 4), "A4", "A"),
        (Spelling("C", 0, 10.0, -1), "C(-1)+10", "C+10"),
    ],
)
def test_a_spelling_writes_itself_with_and_without_its_octave(spelling: Spelling, text: str, sign: str):
    assert (str(spelling), spelling.sign) == (text, sign)


# --- names -------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "spelled",
    [
        "dik kürdî",
        "dik-kürdi",
        "DİK KÜRDÎ",
        "Dik Kurdi",
        "dık kürdı",
        "di\u0307k ku\u0308rdi\u0302",
        "dikkurdi",
    ],
)
def test_any_spelling_finds_a_name(spelled: str):
    assert SMALL.find(spelled) == SMALL.named[1]


@pytest.mark.parametrize("unknown", ["", "---", "kürdî", "dik kürdî dik", "İ", "日本"])
def test_an_unknown_name_is_not_found(unknown: str):
    assert SMALL.find(unknown) is None


@given(st.text())
def test_folding_a_name_twice_changes_nothing_more(text: str):
    folded = fold_name(text)
    assert fold_name(folded) == folded
    assert folded == "" or (folded.isascii() and folded.isalnum() and folded == folded.lower())


def test_a_pitch_near_a_named_one_is_spelled_from_it():
    assert str(SMALL.spell(COMMAS_53.units_to_cents(7.6))) == "B4-1.4"
    assert str(SMALL.spell(COMMAS_53.units_to_cents(5.25))) == "Bb4+1.25"


def test_a_pitch_without_a_name_is_named_as_it_is_written():
    assert SMALL.name(COMMAS_53.units_to_cents(8.3)) == "segâh"
    assert SMALL.name(COMMAS_53.units_to_cents(13)) == "C5"


def test_a_named_pitch_is_found_by_its_place():
    assert SMALL.at(8) == SMALL.named[0]
    assert SMALL.at(7) is None


def test_the_word_of_the_trade_stands_in_the_place_of_the_english_one_or_beside_it():
    # karar, güçlü, yeden, asma karar, seyir, çıkıcı, inici: common practice
    names = load_pack("makam").names
    words = ["final", "dominant", "leading tone", "suspended cadence", "course", "ascending", "descending"]
    assert [names.word(english) for english in words] == [
        "karar",
        "güçlü",
        "yeden",
        "asma karar",
        "seyir",
        "çıkıcı",
        "inici",
    ]
    assert names.word("ascending-descending") == "inici-çıkıcı"
    assert names.beside("leading tone") == " (yeden)"


def test_a_term_without_a_word_of_the_trade_is_said_in_english_alone():
    # the words belong to the pack: the tone system alone brings none
    assert PitchNames(COMMAS_53).word("dominant") == "dominant"
    assert PitchNames(COMMAS_53).beside("dominant") == ""
    half = PitchNames(COMMAS_53, words=(("dominant", "güçlü"),))
    assert (half.word("dominant"), half.beside("final")) == ("güçlü", "")


def test_names_and_words_can_be_hashed():
    assert hash(load_pack("makam").names) == hash(load_pack("makam").names)


def test_every_perde_of_the_makam_pack_is_written_and_named_both_ways():
    names = load_pack("makam").names
    assert len(names.named) >= 60
    for perde in names.named:
        cents = names.system.units_to_cents(perde.units)
        assert names.system.spelling_units(perde.spelling) == perde.units
        assert names.spell(cents) == perde.spelling
        assert names.name(cents) == perde.name
        assert names.find(perde.name) == names.find(fold_name(perde.name)) == names.at(perde.units) == perde
