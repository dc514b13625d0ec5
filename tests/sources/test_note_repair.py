"""The nearest readable token."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.core.pitch import COMMAS_53, SEMITONES_12, PitchNames, Spelling
from melodycoach.sources.note_repair import nearest_token
from melodycoach.sources.note_token import Misread, read_token
from melodycoach.sources.pack_file import load_pack

NAMES = load_pack("makam").names
BARE = PitchNames(COMMAS_53)


@pytest.mark.parametrize(
    ("token", "nearest"),
    [
        # a missing octave: near A4, where a line begins
        ("B", "B4"),
        ("bb", "Bb4"),
        ("F#:2", "F#4:2"),
        ("E-1", "E4-1"),
        ("C~", "C5~"),
        # an octave that is too high
        ("C44", "C9"),
        ("G10:1/2", "G9:1/2"),
        ("B9~", "B8~"),
        # marks in other places, other letters
        ("F5#", "F#5"),
        ("BB4", "Bb4"),
        ("A4b-1", "Ab4-1"),
        ("H4", "B4"),
        ("la4", "A4"),
        ("sib4", "Bb4"),
        ("sol", "G4"),
        ("4A", "A4"),
        ("4f#", "f#4"),
        ("B4-1~", "B4-1"),
        ("B4~-1", "B4~"),
        # lengths
        ("A4:1,5", "A4:1.5"),
        ("A4:-2", "A4:2"),
        ("A4:0", "A4"),
        ("A4:99999", "A4"),
        ("A4:", "A4"),
        ("A4:2:3", "A4:2"),
        ("A4:.", "A4"),
        ("A4:1,", "A4:1 ,"),
        ("A4*2", "A4:2"),
        ("A4x1", "A4"),
        ("D5/2", "D5:1/2"),
        ("B4-1,5", "B4-1.5"),
        ("-2", "-:2"),
        ("-:x", "-"),
        # what was not parted
        ("A4,", "A4 ,"),
        ("D5:2.", "D5:2 ."),
        ("D5;", "D5 ,"),
        ("segah|", "segah |"),
        ("B,", "B4 ,"),
        ("A4,B,C5", "A4 , B4 , C5"),
        ("A4|B4", "A4 | B4"),
        # other signs
        (";", ","),
        ("||", "|"),
        ("?", "."),
        ("r", "-"),
        ("--", "-"),
        ("(A4)", "A4"),
        ("“segah”", "segah"),
        ("Ａ４", "A4"),  # full width
        ("A4(2)", "A4"),
        ("\x00A4", "A4"),
        # names
        ("segh", "segâh"),
        ("segh:2", "segâh:2"),
        ("segh-1", "segâh-1"),
        ("tiz-segahh", "tiz-segâh"),
        ("gerd", "gerdâniye"),
        ("hüseyn", "hüseynî"),  # and not hüseynî-aşîran, which begins so, too
        ("hüseyn:2", "hüseynî:2"),
        ("acema", "acem"),  # and not acem-aşîran
        ("tiz-hü", "tiz-hüseynî"),  # it begins so; tiz mahur has the same letters, too
        ("segah:1,5", "segah:1.5"),
        ("segah~", "B4~"),
        ("segah+999", "segâh"),
        # nothing near
        ("xx", ""),
        ("~", ""),
        ("", ""),
        ("q" * 50, ""),
        ("tiz-segahh" * 5, ""),
    ],
)
def test_the_nearest_token_is_what_was_meant(token: str, nearest: str):
    assert nearest_token(token, NAMES) == nearest


@pytest.mark.parametrize(
    ("near_cents", "nearest"), [(3000, "B1"), (6900, "B4"), (7600, "B4"), (7900, "B5"), (0, "B0")]
)
def test_a_missing_octave_is_chosen_near_the_note_before(near_cents: float, nearest: str):
    assert nearest_token("B", NAMES, near_cents) == nearest


def test_without_names_in_the_pack_only_notes_are_offered():
    assert nearest_token("segh", BARE) == ""
    assert nearest_token("B", PitchNames(SEMITONES_12)) == "B4"


@given(st.text(max_size=45) | st.text("ABHbdo#b=45+-~:.,|/1 segahtiz", max_size=12))
def test_what_is_offered_can_be_read(token: str):
    key = (Spelling("B", 0, -1, 0),)
    for word in nearest_token(token, NAMES, 7000.0, key).split():
        assert not isinstance(read_token(word, NAMES, key), Misread)
