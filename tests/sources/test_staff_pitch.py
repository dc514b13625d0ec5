"""What printed notes sound like: signs, the bar's memory, key signatures, ties, and conflicts."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.core.note import InputKind
from melodycoach.core.pitch import COMMA_CENTS, COMMAS_53, LETTERS, SEMITONES_12, TONE_SYSTEMS, Spelling
from melodycoach.sources.accidental_table import TABLE, Notation
from melodycoach.sources.accidentals import Sign
from melodycoach.sources.pack_file import load_pack
from melodycoach.sources.staff_pitch import MOST_CONFLICTS, StaffPitch, traditional_key

NAMES = load_pack("makam").names
FLAT, SHARP, NATURAL = Sign("flat"), Sign("sharp"), Sign("natural")
KOMA, BAKIYE = Sign("quarter-flat"), Sign("slash-flat")
HUSEYNI = [("B", -0.5, KOMA, None), ("F", 1.0, SHARP, None)]
"""The key signature of Hüseynî as makam scores print it: B a comma flat, F sharp (common practice)."""


def staff(notation: Notation = Notation.AEU, key=0, **settings: bool) -> StaffPitch:
    made = StaffPitch(notation, COMMAS_53, **settings)
    made.set_key(key)
    return made


def written(one: StaffPitch, step: str, octave: int = 4, *rest) -> str:
    """Write what a note sounds like on its own letter, as note text does: the plain sign that is near it."""
    units = COMMAS_53.cents_to_units(one.pitch(step, octave, *rest).cents)
    spellings = [
        Spelling(
            step, signs, round(units - COMMAS_53.spelling_units(Spelling(step, signs, 0, octave)), 6), octave
        )
        for signs in (0, 1, -1, 2, -2)
    ]
    return str(min(spellings, key=lambda spelling: abs(spelling.units) + abs(spelling.accidentals)))


# --- perdes, against the makam pack


@pytest.mark.parametrize(
    ("step", "octave", "token", "perde"),
    [
        # common practice: how AEU notation writes these perdes
        ("B", 4, "quarter-flat", "segâh"),
        ("B", 4, "flat", "kürdî"),
        ("B", 4, "slash-flat", "dik kürdî"),
        ("B", 4, "natural", "bûselik"),
        ("F", 4, "sharp", "ırak"),
        ("F", 5, "sharp", "eviç"),
        ("F", 5, "slash-quarter-sharp", "mahur"),
        ("C", 5, "sharp", "nim hicaz"),
        ("D", 5, "slash-flat", "hicaz"),
        ("E", 5, "flat", "nim hisar"),
        ("E", 5, "quarter-flat", "dik hisar"),
        ("A", 4, "slash-flat", "zirgüle"),
        ("G", 5, "sharp", "nim şehnaz"),
        ("F", 5, "quarter-sharp", "dik acem"),
        ("F", 5, "slash-sharp", "dik mahur"),
        ("A", 4, None, "dügâh"),
    ],
)
def test_a_printed_sign_gives_the_perde_that_it_is_known_for(step, octave, token, perde):
    note = staff().pitch(step, octave, Sign(token) if token else None)
    assert NAMES.name(note.cents) == perde


def test_numbered_folk_signs_lower_by_their_commas():
    # common practice: folk music writes the second degree of Uşşak and its kin as B flat 2
    assert written(staff(Notation.FOLK), "B", 4, Sign("flat-2")) == "B4-2"
    assert written(staff(Notation.FOLK), "F", 5, Sign("sharp-3")) == "F#5-1"


def test_arabic_and_persian_quarter_tones_lie_between_the_keys_of_a_piano():
    # B4 is key 71
    assert staff(Notation.ARABIC).pitch("B", 4, BAKIYE).cents == 7050
    assert staff(Notation.PERSIAN).pitch("B", 4, Sign("koron")).cents == 7050


# --- what holds: the sign at the note, in the bar, in the key


def test_a_sign_holds_to_the_end_of_the_bar():
    one = staff()
    one.pitch("B", 4, BAKIYE)
    assert written(one, "B") == "Bb4+1"
    one.new_bar()
    assert written(one, "B") == "B4"


def test_a_sign_holds_only_in_its_octave_and_on_its_letter():
    one = staff()
    one.pitch("B", 4, FLAT)
    assert written(one, "B", 5) == "B5"
    assert written(one, "A", 4) == "A4"


def test_a_natural_cancels_the_key_to_the_end_of_the_bar():
    one = staff(key=HUSEYNI)
    assert written(one, "B") == "B4-1"
    assert written(one, "B", 4, NATURAL) == "B4"
    assert written(one, "B") == "B4"
    one.new_bar()
    assert written(one, "B") == "B4-1"
    assert one.conflicts == ()


def test_the_key_holds_in_every_octave():
    one = staff(key=HUSEYNI)
    assert [written(one, "F", octave) for octave in (3, 4, 5)] == ["F#3", "F#4", "F#5"]


def test_a_sign_of_the_key_holds_in_every_octave_wherever_it_is_printed():
    # MusicXML 4.0: key-octave says in which octave an element of the key appears
    one = staff(key=[("B", -0.5, KOMA, 4)])
    assert [written(one, "B", octave) for octave in (3, 5)] == ["B3-1", "B5-1"]


def test_a_letter_with_a_sign_in_each_octave_follows_its_own_or_the_nearest():
    one = staff(key=[("B", None, KOMA, 4), ("B", None, FLAT, 5)])
    assert [written(one, "B", octave) for octave in (3, 4, 5, 6)] == ["B3-1", "B4-1", "Bb5", "Bb6"]


def test_an_entry_for_one_octave_stands_beside_one_for_all():
    one = staff(key=[("B", None, KOMA, None), ("B", None, FLAT, 5)])
    assert [written(one, "B", octave) for octave in (3, 4, 5, 6)] == ["B3-1", "B4-1", "Bb5", "B6-1"]


def test_a_new_key_takes_the_place_of_the_old_one_and_of_the_bar():
    one = staff(key=HUSEYNI)
    one.pitch("C", 5, SHARP)
    one.set_key([])
    assert [written(one, step, 5) for step in "BFC"] == ["B5", "F5", "C5"]


@pytest.mark.parametrize(
    ("fifths", "letters"),
    [(0, ""), (1, "F"), (2, "FC"), (7, "FCGDAEB"), (-1, "B"), (-3, "BEA"), (-7, "BEADGCF")],
)
def test_traditional_keys_alter_the_letters_of_the_circle_of_fifths(fifths: int, letters: str):
    # common practice: the order of sharps and flats
    entries = traditional_key(fifths)
    assert "".join(step for step, *_ in entries) == letters
    assert {sign for _, _, sign, _ in entries} <= {SHARP if fifths > 0 else FLAT}


def test_keys_beyond_seven_fifths_double_signs_and_absurd_ones_are_bounded():
    assert traditional_key(8)[0] == ("F", 2, Sign("double-sharp"), None)
    assert traditional_key(-8)[0] == ("B", -2, Sign("flat-flat"), None)
    assert traditional_key(10**9) == traditional_key(21)
    assert {alter for _, alter, _, _ in traditional_key(-(10**9))} == {-3}


def test_a_traditional_key_has_the_plain_signs_of_the_notation():
    assert written(staff(key=1), "F") == "F#4"
    assert staff(Notation.ARABIC, key=1).pitch("F", 4).cents == 6600


def test_a_key_without_sign_names_is_read_from_its_numbers():
    one = staff(key=[("B", -1, None, None), ("E", -0.31, None, None), ("A", None, None, None)])
    assert written(one, "B") == "Bb4"
    assert one.pitch("E", 5).cents == pytest.approx(COMMAS_53.units_to_cents(31) - 31)
    assert written(one, "A") == "A4"


# --- ties


def test_a_tie_carries_a_pitch_over_the_bar_line_but_not_its_sign():
    one = staff()
    first = one.pitch("B", 4, BAKIYE)
    one.new_bar()
    assert one.pitch("B", 4, tied_from=first.cents) == first
    assert written(one, "B") == "B4"


def test_a_sign_printed_at_a_tied_note_counts():
    one = staff()
    first = one.pitch("B", 4, FLAT)
    one.new_bar()
    assert one.pitch("B", 4, FLAT, tied_from=first.cents) == first
    assert written(one, "B") == "Bb4"


# --- alter


def test_an_alter_that_says_what_the_key_says_is_no_conflict():
    # the usual case: programs write the alter of every note, and no sign where the key has it
    one = staff(key=HUSEYNI)
    assert [written(one, "F", 5, None, 1.0), written(one, "B", 4, None, -0.5)] == ["F#5", "B4-1"]
    one.pitch("C", 5, SHARP, 1.0)
    assert written(one, "C", 5, None, 1.0) == "C#5"
    assert one.conflicts == ()


@pytest.mark.parametrize(
    ("alter", "spelling"),
    [(1, "F#4"), (-1, "Fb4"), (2, "F##4+1"), (-2, "Fbb4+1"), (0, "F4"), (0.5, "F4+1"), (-0.5, "F4-1")],
)
def test_an_alter_with_no_sign_in_force_means_that_sign_of_the_notation(alter: float, spelling: str):
    assert written(staff(), "F", 4, None, alter) == spelling


def test_an_alter_between_the_quarter_tones_is_taken_in_cents_where_no_sign_holds():
    b4 = COMMAS_53.units_to_cents(9)
    assert staff().pitch("B", 4, None, -0.22).cents == pytest.approx(b4 - 22)


def test_a_quarter_tone_that_folk_music_has_no_sign_for_is_taken_in_cents():
    b4 = COMMAS_53.units_to_cents(9)
    assert staff(Notation.FOLK).pitch("B", 4, None, -0.5).cents == pytest.approx(b4 - 50)


def test_where_no_sign_is_printed_anywhere_alter_comes_before_the_key():
    one = staff(key=1, signs_printed=False)
    spelled = [written(one, "F", 4, None, alter) for alter in (1.0, None, 0.0, -1.0)]
    assert spelled == ["F#4", "F4", "F4", "Fb4"]
    assert one.pitch("F", 4, None, 0.7).cents == pytest.approx(one.pitch("F", 4).cents + 70)
    assert one.conflicts == ()


def test_where_no_sign_is_printed_the_key_still_says_which_flat_is_meant():
    # a key by numbers alone: 0.44 of a semitone is no plain sign, so it holds without an alter too
    one = staff(key=[("B", -0.44, None, None), ("E", -1, None, None)], signs_printed=False)
    b4 = COMMAS_53.units_to_cents(9)
    assert one.pitch("B", 4).cents == pytest.approx(b4 - 44)
    assert one.pitch("B", 4, None, -0.5).cents == pytest.approx(b4 - 44)
    assert written(one, "E", 5, None, -1) == "Eb5"


# --- literal


def test_literal_notes_are_keys_or_tuned_and_alter_comes_first():
    one = staff(Notation.LITERAL, key=HUSEYNI)
    assert one.pitch("F", 4, None, 1.0).cents == 6600
    assert one.pitch("F", 4, None, 1.0).kind is InputKind.KEYS
    assert one.pitch("B", 4, None, -0.5).kind is InputKind.TUNED
    assert one.pitch("B", 4, FLAT, -0.9).cents == 6980 + 30
    assert one.conflicts == ()


def test_a_literal_note_without_alter_is_natural_whatever_a_plain_key_says():
    one = staff(Notation.LITERAL, key=1)
    assert one.pitch("F", 4).cents == 6500
    assert one.pitch("F", 4, SHARP).cents == 6600
    assert one.pitch("F", 4).cents == 6500
    assert one.conflicts == ()


def test_a_literal_note_without_alter_takes_a_sign_between_the_keys_from_the_bar():
    one = staff(Notation.LITERAL)
    assert one.pitch("B", 4, KOMA).cents == one.pitch("B", 4).cents == 7050
    assert one.pitch("B", 4, Sign("flat-2")).cents == pytest.approx(7100 - 2 * COMMA_CENTS)


def test_a_literal_sign_without_a_meaning_there_is_read_by_its_alter_in_silence():
    one = staff(Notation.LITERAL)
    assert one.pitch("B", 4, BAKIYE, -0.5).cents == 7050
    assert one.conflicts == ()


def test_a_literal_tie_keeps_its_kind():
    assert staff(Notation.LITERAL).pitch("B", 4, tied_from=7050.0).kind is InputKind.TUNED


@pytest.mark.parametrize("notation", [Notation.AEU, Notation.ARABIC, Notation.PERSIAN])
def test_notes_of_aeu_and_of_quarter_tones_are_typed(notation: Notation):
    assert staff(notation).pitch("B", 4, FLAT).kind is InputKind.TYPED


def test_folk_signs_are_rounder_than_the_degrees_they_stand_for():
    """F sharp 3 stands for eviç (4 commas in AEU), B flat 2 for segâh (1 comma): common practice."""
    assert staff(Notation.FOLK).pitch("F", 5, Sign("sharp-3")).kind is InputKind.TUNED


# --- conflicts


def test_a_sign_and_an_alter_that_disagree_are_told_once_for_each_kind():
    one = staff(key=HUSEYNI)
    for _ in range(3):
        assert written(one, "B", 4, BAKIYE, -0.44) == "Bb4+1"
    one.pitch("E", 5, Sign("slash-sharp"), 0.0)
    assert one.conflicts == (
        "slash-flat with alter -0.44: read as 4 commas down, as the sign says, not 44 cents down (3 times)",
        "slash-sharp with alter 0: read as 8 commas up, as the sign says, not natural",
    )


def test_a_conflict_says_where_the_sign_stands_when_it_is_not_at_the_note():
    one = staff(key=HUSEYNI)
    assert written(one, "F", 5, None, 0.0) == "F#5"
    assert written(one, "F", 4) == "F#4"
    one.pitch("E", 5, BAKIYE)
    assert written(one, "E", 5, None, 1) == "Eb5+1"
    assert one.conflicts == (
        "sharp in the key signature with alter 0: read as 4 commas up, as the sign says, not natural",
        "sharp in the key signature with no alter: read as 4 commas up, as the sign says, not natural",
        (
            "slash-flat earlier in the bar with alter 1: read as 4 commas down, as the sign says, "
            "not 100 cents up"
        ),
    )


def test_a_key_that_disagrees_with_its_own_numbers_is_told():
    # the W3C's example of a makam key writes -1 for a comma flat
    one = staff(key=[("B", -1, KOMA, None)])
    assert written(one, "B") == "B4-1"
    assert one.conflicts == (
        (
            "quarter-flat in the key signature with alter -1: read as 1 comma down, as the sign says, "
            "not 100 cents down"
        ),
    )


@pytest.mark.parametrize(("alter", "told"), [(None, 0), (-0.61, 0), (-1.2, 0), (-0.6, 1), (-1.21, 1)])
def test_more_than_thirty_cents_are_a_conflict_and_an_alter_left_out_is_none(alter: float | None, told: int):
    # the slashed flat lowers by 4 commas, 90.57 cents
    one = staff()
    one.pitch("B", 4, BAKIYE, alter)
    assert len(one.conflicts) == told


def test_in_literal_the_number_is_believed_and_the_sign_is_told():
    one = staff(Notation.LITERAL)
    assert one.pitch("B", 4, FLAT, -0.5).cents == 7050
    assert one.conflicts == (
        "flat with alter -0.5: read as 50 cents down, as alter says, not 100 cents down",
    )


def test_a_foreign_sign_is_read_as_at_home_and_told():
    one = staff()
    b4 = COMMAS_53.units_to_cents(9)
    assert one.pitch("B", 4, Sign("koron"), -0.5).cents == pytest.approx(b4 - 50)
    assert one.pitch("B", 4).cents == pytest.approx(b4 - 50)
    assert one.conflicts == ("koron is no AEU (Turkish makam) sign: read as Persian, 50 cents down",)


def test_a_sign_that_nobody_knows_is_read_by_its_alter_or_left_out():
    one = staff(key=HUSEYNI)
    assert written(one, "F", 5, Sign("wiggle"), -1.0) == "Fb5"
    assert written(one, "F", 4, Sign("wiggle")) == "F#4"
    assert one.conflicts[:2] == (
        "'wiggle' is no accidental that is known: read as its alter -1 says",
        "'wiggle' is no accidental that is known: left out",
    )


def test_a_key_sign_that_nobody_knows_is_read_by_its_number():
    assert written(staff(key=[("B", -1, Sign("wiggle"), None)]), "B") == "Bb4"
    assert written(staff(key=[("B", None, Sign("wiggle"), None)]), "B") == "B4"


def test_a_score_full_of_conflicts_is_told_in_a_few_lines():
    one = staff()
    for n in range(MOST_CONFLICTS + 5):
        one.pitch("B", 4, FLAT, 3 + n / 10)
    assert len(one.conflicts) == MOST_CONFLICTS + 1
    assert one.conflicts[-1] == "and 5 more of this sort"


# --- laws

steps = st.sampled_from(LETTERS)
octaves = st.integers(0, 9)
alters = st.one_of(st.none(), st.sampled_from([-1.0, -0.5, 0.0, 0.5, 1.0]), st.floats(-9, 9))
known = st.sampled_from([Sign(row.value, row.glyph) for row in TABLE])
signs = st.one_of(st.none(), known, st.builds(Sign, st.text(min_size=1, max_size=50), st.text(max_size=5)))
notes = st.tuples(steps, octaves, signs, alters, st.one_of(st.none(), st.floats(0, 12700)))
entries = st.lists(st.tuples(steps, alters, signs, st.one_of(st.none(), octaves)), max_size=4)
keys = st.one_of(st.integers(), entries)
moves = st.lists(st.one_of(notes, keys, st.just("bar")), max_size=12)


@given(st.sampled_from(Notation), st.sampled_from([COMMAS_53, SEMITONES_12]), st.booleans(), moves)
def test_nothing_that_a_score_can_hold_raises_and_every_note_has_a_pitch(
    notation, system, signs_printed, moves
):
    one = StaffPitch(notation, system, signs_printed=signs_printed)
    for move in moves:
        if move == "bar":
            one.new_bar()
        elif isinstance(move, tuple):
            note = one.pitch(*move)
            assert math.isfinite(note.cents)
            assert note.kind is not InputKind.KEYS or note.cents % 100 == 0
        else:
            one.set_key(move)
    assert all(isinstance(said, str) for said in one.conflicts)


@given(st.sampled_from(Notation), keys, st.lists(notes, max_size=6), st.lists(notes, max_size=4))
def test_a_bar_sounds_the_same_whatever_came_in_the_bars_before_it(notation, key, before, bar):
    one, fresh = staff(notation, key), staff(notation, key)
    for note in before:
        one.pitch(*note)
    one.new_bar()
    assert [one.pitch(*note) for note in bar] == [fresh.pitch(*note) for note in bar]


@pytest.mark.parametrize("step", ["H", "", "c", "CD"])
def test_a_step_that_is_no_letter_is_the_callers_mistake(step: str):
    with pytest.raises(ValueError, match="no step"):
        staff().pitch(step, 4)


@pytest.mark.parametrize("alter", [math.nan, math.inf])
def test_an_alter_that_is_no_number_is_the_callers_mistake(alter: float):
    with pytest.raises(ValueError, match="no alter"):
        staff().set_key([("B", alter, None, None)])


@pytest.mark.parametrize("system", TONE_SYSTEMS.values(), ids=lambda system: f"{system.divisions}")
def test_makam_signs_sound_in_commas_whatever_the_pack_counts_in(system):
    one = StaffPitch(Notation.AEU, system)
    assert one.pitch("B", 4, KOMA).cents == pytest.approx(COMMAS_53.units_to_cents(8))
