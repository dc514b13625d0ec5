"""What each printed sign means, and telling the notation of a score from its signs."""

import os
import re
from fractions import Fraction
from importlib.util import find_spec
from math import log2
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.core.pitch import COMMA_CENTS, COMMAS_53, SEMITONES_12, TONE_SYSTEMS
from melodycoach.sources.accidental_table import TABLE, Notation
from melodycoach.sources.accidentals import (
    HOMES,
    Sign,
    grid_sign,
    guess_notation,
    home_of,
    is_plain,
    natural_cents,
    raised_cents,
    read_sign,
)

MUSIC_XML_4 = """
sharp natural flat double-sharp sharp-sharp flat-flat natural-sharp natural-flat quarter-flat quarter-sharp
three-quarters-flat three-quarters-sharp sharp-down sharp-up natural-down natural-up flat-down flat-up
double-sharp-down double-sharp-up flat-flat-down flat-flat-up arrow-down arrow-up triple-sharp triple-flat
slash-quarter-sharp slash-sharp slash-flat double-slash-flat sharp-1 sharp-2 sharp-3 sharp-5 flat-1 flat-2
flat-3 flat-4 sori koron other
"""
"""The type ``accidental-value`` of the W3C's schema of MusicXML 4.0, all 41."""

GLYPH_CODES = {
    "E26": "Flat Natural Sharp DoubleSharp DoubleFlat TripleSharp TripleFlat NaturalFlat NaturalSharp "
    "SharpSharp",
    "E27": "QuarterToneFlatArrowUp ThreeQuarterTonesFlatArrowDown QuarterToneSharpNaturalArrowUp "
    "QuarterToneFlatNaturalArrowDown ThreeQuarterTonesSharpArrowUp QuarterToneSharpArrowDown "
    "FiveQuarterTonesSharpArrowUp ThreeQuarterTonesSharpArrowDown ThreeQuarterTonesFlatArrowUp "
    "FiveQuarterTonesFlatArrowDown ArrowUp ArrowDown",
    "E28": "QuarterToneFlatStein ThreeQuarterTonesFlatZimmermann QuarterToneSharpStein "
    "ThreeQuarterTonesSharpStein NarrowReversedFlat NarrowReversedFlatAndFlat",
    "E44": "BuyukMucennebFlat KucukMucennebFlat BakiyeFlat KomaFlat KomaSharp BakiyeSharp "
    "KucukMucennebSharp BuyukMucennebSharp",
    "E45": "1CommaSharp 2CommaSharp 3CommaSharp 5CommaSharp 1CommaFlat 2CommaFlat 3CommaFlat 4CommaFlat",
    "E46": "Koron Sori",
    "ED3": "DoubleFlatArabic ThreeQuarterTonesFlatArabic FlatArabic QuarterToneFlatArabic NaturalArabic "
    "QuarterToneSharpArabic SharpArabic ThreeQuarterTonesSharpArabic DoubleSharpArabic",
}
"""The glyphs of SMuFL 1.4 (glyphnames.json) by the first three digits of their code, in its order."""

GLYPH_OF_VALUE = {
    **{"sharp": "E262", "natural": "E261", "flat": "E260", "double-sharp": "E263", "sharp-sharp": "E269"},
    **{"flat-flat": "E264", "natural-sharp": "E268", "natural-flat": "E267", "quarter-flat": "E280"},
    **{"quarter-sharp": "E282", "three-quarters-flat": "E281", "three-quarters-sharp": "E283"},
    **{
        "slash-quarter-sharp": "E446",
        "slash-sharp": "E447",
        "slash-flat": "E442",
        "double-slash-flat": "E440",
    },
    **{"sharp-1": "E450", "sharp-2": "E451", "sharp-3": "E452", "sharp-5": "E453", "flat-1": "E454"},
    **{"flat-2": "E455", "flat-3": "E456", "flat-4": "E457", "sori": "E461", "koron": "E460"},
}
"""The glyph beside a value in the W3C's documentation of MusicXML 4.0; those of plain signs from memory."""

SAID_IN_NAME = {"ThreeQuarter": 150, "FiveQuarter": 250, "Quarter": 50, "Double": 200, "Triple": 300}


def codes() -> dict[str, str]:
    return {
        f"{start}{place:X}": f"accidental{name}"
        for start, names in GLYPH_CODES.items()
        for place, name in enumerate(names.split())
    }


def commas(sign: Sign, notation: Notation) -> float | None:
    cents = raised_cents(sign, notation)
    return None if cents is None else round(cents / COMMA_CENTS, 9)


def test_every_accidental_of_musicxml_4_has_one_row():
    assert len(MUSIC_XML_4.split()) == 41
    assert [row.value for row in TABLE if row.value] == MUSIC_XML_4.split()


def test_every_glyph_is_one_of_smufl_and_every_glyph_of_these_ranges_is_in_the_table():
    glyphs = [row.glyph for row in TABLE if row.glyph]
    assert len(glyphs) == len(set(glyphs))
    assert set(glyphs) == set(codes().values())


def test_a_value_has_the_glyph_that_the_w3c_prints_beside_it():
    name = codes()
    glyph = {row.value: row.glyph for row in TABLE}
    assert {value: glyph[value] for value in GLYPH_OF_VALUE} == {
        value: name[code] for value, code in GLYPH_OF_VALUE.items()
    }


@pytest.mark.parametrize("row", [row for row in TABLE if "Tones" in row.glyph or "Tone" in row.glyph])
def test_quarter_tones_are_what_their_glyph_names_say(row):
    # the names of SMuFL: "accidentalThreeQuarterTonesFlatArrowUp" is 150 cents flat
    size = next(cents for word, cents in SAID_IN_NAME.items() if word in row.glyph)
    wanted = size if "Sharp" in row.glyph else -size
    assert row.arabic == wanted
    assert row.literal in (wanted, None)


def test_numbered_folk_signs_raise_the_commas_that_their_glyph_names_say():
    # the names of SMuFL: "accidental3CommaFlat"; MusicXML's own numbers are the same
    numbered = [row for row in TABLE if "Comma" in row.glyph]
    assert len(numbered) == 8
    for row in numbered:
        found = re.fullmatch(r"accidental(\d)Comma(Sharp|Flat)", row.glyph)
        assert found
        assert row.folk == int(found[1]) * (1 if found[2] == "Sharp" else -1)
        assert row.value == f"{found[2].lower()}-{found[1]}"


def test_the_plain_signs_fill_the_two_gaps_in_the_numbers_of_folk_music():
    # the W3C's MusicXML has neither sharp-4 nor flat-5: these are the plain ones
    assert commas(Sign("sharp"), Notation.FOLK) == 4
    assert commas(Sign("flat"), Notation.FOLK) == -5
    assert home_of(Sign("sharp-4")) is home_of(Sign("flat-5")) is None


@pytest.mark.parametrize(
    ("token", "glyph", "size"),
    [
        # common practice: the signs of AEU theory and their commas, as its textbooks print them
        ("quarter-flat", "accidentalKomaFlat", -1),
        ("slash-flat", "accidentalBakiyeFlat", -4),
        ("flat", "accidentalKucukMucennebFlat", -5),
        ("double-slash-flat", "accidentalBuyukMucennebFlat", -8),
        ("quarter-sharp", "accidentalKomaSharp", 1),
        ("sharp", "accidentalBakiyeSharp", 4),
        ("slash-quarter-sharp", "accidentalKucukMucennebSharp", 5),
        ("slash-sharp", "accidentalBuyukMucennebSharp", 8),
    ],
)
def test_an_aeu_sign_raises_the_same_by_value_and_by_glyph(token: str, glyph: str, size: int):
    assert commas(Sign(token), Notation.AEU) == size
    assert commas(Sign("other", glyph), Notation.AEU) == size


SHAPES = {
    "doublesharp": "double-sharp",
    "sharp.slashslashslash.stemstem": "slash-sharp",
    "sharp.slashslashslash.stem": "slash-quarter-sharp",
    "sharp": "sharp",
    "sharp.slashslash.stem": "quarter-sharp",
    "natural": "natural",
    "mirroredflat": "quarter-flat",
    "flat.slash": "slash-flat",
    "flat": "flat",
    "flat.slashslash": "double-slash-flat",
    "flatflat": "flat-flat",
}
"""LilyPond names the shape of a sign; the MusicXML value that prints the same shape."""


def lilypond_glyphs() -> str:
    found = sorted(Path("/usr/share/lilypond").glob("*/ly/makam.ly"))
    if not found:
        if os.environ.get("MELODYCOACH_REQUIRE_LILYPOND") == "1":
            pytest.fail("MELODYCOACH_REQUIRE_LILYPOND=1, but lilypond-data has no makam.ly here")
        pytest.skip("lilypond-data is not installed")
    return found[-1].read_text(encoding="utf-8")


def test_aeu_signs_raise_what_lilypond_gives_for_their_shapes():
    # makam.ly in Debian's package lilypond-data: alterations in whole tones of nine commas
    rows = re.findall(r'\((-?\d+(?:/\d+)?) \. "accidentals\.([a-z.]+)"\)', lilypond_glyphs())
    theirs = {SHAPES[shape]: 9 * Fraction(size) for size, shape in rows}
    assert set(theirs) == set(SHAPES.values())
    assert theirs == {token: commas(Sign(token), Notation.AEU) for token in theirs}


def test_the_lilypond_table_is_missed_only_where_that_is_allowed(monkeypatch: pytest.MonkeyPatch):
    monkeypatch.setattr(Path, "glob", lambda self, pattern: iter(()))
    monkeypatch.setenv("MELODYCOACH_REQUIRE_LILYPOND", "1")
    with pytest.raises(pytest.fail.Exception, match="lilypond-data"):
        lilypond_glyphs()
    monkeypatch.delenv("MELODYCOACH_REQUIRE_LILYPOND")
    with pytest.raises(pytest.skip.Exception):
        lilypond_glyphs()


AEU_FROM_KABA_CARGAH = (
    "C C:sharp D:slash-flat D:quarter-flat D E:flat E:slash-flat E:quarter-flat E F F:quarter-sharp F:sharp "
    "F:slash-quarter-sharp F:slash-sharp G G:sharp A:slash-flat A:quarter-flat A B:flat B:slash-flat "
    "B:quarter-flat B C5:quarter-flat C5"
)
"""The 24 tones of AEU theory as a makam score prints them, upwards from C4, and the octave."""


def test_the_24_tones_of_aeu_sound_as_the_theory_has_them_when_printed():
    # turkish_aeu.scl of the Scala archive (music21's copy), from kaba çargâh = C4
    spec = find_spec("music21")
    assert spec
    assert spec.origin
    scale = Path(spec.origin).parent / "scale" / "scala" / "scl" / "turkish_aeu.scl"
    lines = [line for line in scale.read_text("utf-8").splitlines() if not line.startswith("!")]
    ratios = [Fraction(1), *(Fraction(line.strip()) for line in lines[2:] if line.strip())]
    c4 = natural_cents("C", 4, Notation.AEU, COMMAS_53)
    for printed, ratio in zip(AEU_FROM_KABA_CARGAH.split(), ratios, strict=True):
        letter, _, token = printed.partition(":")
        natural = natural_cents(letter[0], int(letter[1:] or 4), Notation.AEU, COMMAS_53)
        raised = raised_cents(Sign(token or "natural"), Notation.AEU)
        assert raised is not None
        # within a cent: the comma is a 53rd of the octave, and the theory is Pythagorean
        assert natural + raised - c4 == pytest.approx(1200 * log2(ratio), abs=1.0), printed


MUSIC21_NAMES = {
    **{"sharp": "sharp", "natural": "natural", "flat": "flat", "double-sharp": "double-sharp"},
    **{"flat-flat": "double-flat", "triple-sharp": "triple-sharp", "triple-flat": "triple-flat"},
    **{"quarter-flat": "half-flat", "quarter-sharp": "half-sharp"},
    **{"three-quarters-flat": "one-and-a-half-flat", "three-quarters-sharp": "one-and-a-half-sharp"},
}


@pytest.mark.parametrize(("token", "name"), MUSIC21_NAMES.items())
def test_literal_signs_raise_what_music21_gives_them(token: str, name: str):
    from music21.pitch import Accidental

    assert raised_cents(Sign(token), Notation.LITERAL) == Accidental(name).alter * 100


@pytest.mark.parametrize("notation", [Notation.ARABIC, Notation.PERSIAN, Notation.LITERAL])
def test_cents_notations_lie_on_quarter_tones(notation: Notation):
    sizes = [raised_cents(Sign(row.value, row.glyph), notation) for row in TABLE]
    assert all(size is None or size % 50 == 0 for size in sizes)
    assert all(getattr(row, notation) is None or abs(getattr(row, notation)) <= 300 for row in TABLE)


def test_a_slashed_flat_is_four_commas_in_a_makam_score_and_a_quarter_tone_in_an_arabic_one():
    # common practice: one shape, U+E442, serves both
    assert commas(Sign("slash-flat"), Notation.AEU) == -4
    assert raised_cents(Sign("slash-flat"), Notation.ARABIC) == -50


def test_koron_and_sori_are_quarter_tones_in_persian_scores_and_nowhere_else():
    # SMuFL 1.4: "Koron (quarter tone flat)", "Sori (quarter tone sharp)"
    assert raised_cents(Sign("koron"), Notation.PERSIAN) == -50
    assert raised_cents(Sign("sori"), Notation.PERSIAN) == 50
    assert home_of(Sign("koron")) is home_of(Sign("sori")) is Notation.PERSIAN
    assert raised_cents(Sign("koron"), Notation.AEU) is None


def test_a_glyph_name_counts_before_the_value_beside_it():
    sign = Sign("flat", "accidental2CommaFlat")
    assert commas(sign, Notation.FOLK) == -2
    assert raised_cents(sign, Notation.AEU) is None
    assert str(sign) == "flat-2"


def test_an_unknown_glyph_name_leaves_the_value_to_count():
    assert commas(Sign("flat", "accidentalFlatSmall"), Notation.AEU) == -5


def test_flats_lower_and_sharps_raise_in_every_notation():
    for row in TABLE:
        sizes = [getattr(row, notation) for notation in Notation if getattr(row, notation) is not None]
        assert all(size > 0 for size in sizes) or all(size < 0 for size in sizes) or not any(sizes), row


def test_homes_name_every_notation():
    assert sorted(HOMES) == sorted(Notation)


def test_an_unknown_sign_has_no_home_and_is_shown_in_quotes_and_short():
    assert home_of(Sign("other")) is None
    assert str(Sign("x" * 80)) == repr("x" * 39 + "…")


def test_plain_signs_are_those_of_whole_keys():
    assert {row.value for row in TABLE if row.value and is_plain(Sign(row.value))} == {
        "sharp", "natural", "flat", "double-sharp", "sharp-sharp", "flat-flat", "natural-sharp",
        "natural-flat", "triple-sharp", "triple-flat",
    }  # fmt: skip


def test_an_alter_on_the_quarter_tones_means_the_sign_that_raises_as_much():
    for alter in (-2, -1.5, -1, -0.5, 0, 0.5, 1, 1.5, 2):
        sign = grid_sign(alter)
        assert sign
        assert raised_cents(sign, Notation.LITERAL) == alter * 100
    assert grid_sign(0.25) is grid_sign(7) is None


@pytest.mark.parametrize("system", TONE_SYSTEMS.values(), ids=lambda system: f"{system.divisions}")
@pytest.mark.parametrize("notation", Notation)
def test_a4_is_440_hz_in_every_notation_and_octaves_are_octaves(notation, system):
    assert natural_cents("A", 4, notation, system) == 6900
    for letter in "CDEFGAB":
        low, high = (natural_cents(letter, octave, notation, system) for octave in (3, 4))
        assert high - low == pytest.approx(1200)


def test_naturals_are_commas_in_turkish_notations_and_white_keys_in_the_others():
    # E above C: 18 commas, or four keys
    for notation, wanted in zip(Notation, (18 * COMMA_CENTS,) * 2 + (400,) * 3, strict=True):
        c, e = (natural_cents(letter, 4, notation, COMMAS_53) for letter in "CE")
        assert e - c == pytest.approx(wanted)


def test_empty_accidental_elements_print_nothing():
    # some programs write <accidental/> beside a note
    assert read_sign("") is read_sign("  \n") is read_sign(None, "") is None


# --- the notation of a score


def pairs(*texts: str) -> set[tuple[Sign | None, float | None]]:
    """Read "slash-flat@-0.5", "sharp", "@1": a sign, an alter, or both; glyph names as they are."""
    seen = set()
    for text in texts:
        token, _, alter = text.partition("@")
        glyph = token if token.startswith("accidental") else ""
        seen.add((read_sign("other" if glyph else token, glyph), float(alter) if alter else None))
    return seen


@pytest.mark.parametrize(
    ("seen", "notation"),
    [
        (["flat-2", "sharp@1"], Notation.FOLK),
        (["flat-2", "double-slash-flat"], Notation.FOLK),
        (["accidental3CommaSharp"], Notation.FOLK),
        (["double-slash-flat"], Notation.AEU),
        (["slash-quarter-sharp", "flat@-1"], Notation.AEU),
        (["slash-sharp"], Notation.AEU),
        (["accidentalKomaFlat@-0.5"], Notation.AEU),
        (["slash-flat"], Notation.AEU),
        (["slash-flat@-0.44"], Notation.AEU),
        (["slash-flat@-0.5", "slash-sharp"], Notation.AEU),
        (["slash-flat@-0.5", "quarter-flat@-0.5"], Notation.AEU),
        (["quarter-flat@-0.5", "sharp@1"], Notation.AEU),
        (["quarter-sharp"], Notation.AEU),
        (["koron@-0.67"], Notation.PERSIAN),
        (["accidentalSori"], Notation.PERSIAN),
        (["koron", "slash-flat@-0.5"], Notation.PERSIAN),
        (["slash-flat@-0.5"], Notation.ARABIC),
        (["slash-flat@-0.5", "quarter-sharp@0.5", "flat@-1"], Notation.ARABIC),
        (["accidentalQuarterToneFlatArabic"], Notation.ARABIC),
        (["three-quarters-flat@-1.5", "quarter-flat@-0.5"], Notation.LITERAL),
        (["natural-up@0.5"], Notation.LITERAL),
        (["@-0.22", "@1"], Notation.LITERAL),
        (["@-0.5"], Notation.LITERAL),
        (["sharp@1", "@-0.22"], Notation.AEU),
        (["sharp@1", "flat@-1", "natural"], Notation.AEU),
        (["@1", "@-1"], Notation.AEU),
        (["no-such-sign"], Notation.AEU),
        ([], Notation.AEU),
    ],
)
def test_the_signs_of_a_score_tell_its_notation(seen: list[str], notation: Notation):
    assert guess_notation(pairs(*seen), COMMAS_53).notation is notation


@pytest.mark.parametrize("seen", [["sharp@1"], [], ["quarter-flat@-0.5"], ["@1"]])
def test_with_a_pack_of_semitones_plain_signs_and_quarter_tones_are_literal(seen: list[str]):
    assert guess_notation(pairs(*seen), SEMITONES_12).notation is Notation.LITERAL


def test_with_a_pack_of_semitones_telling_signs_still_tell():
    assert guess_notation(pairs("flat-2"), SEMITONES_12).notation is Notation.FOLK


@pytest.mark.parametrize(
    ("seen", "reason"),
    [
        (
            ["flat-2", "sharp-1", "sharp-3", "flat-4"],
            (
                "accidentals read as Turkish folk, because the score prints flat-2, flat-4 and others; if "
                "they mean something else: --accidentals aeu, arabic, persian or literal"
            ),
        ),
        (
            ["slash-flat@-0.5"],
            (
                "accidentals read as Arabic, because its slash-flat is given as a quarter tone, and no other "
                "sign is of AEU; if they mean something else: --accidentals aeu, folk, persian or literal"
            ),
        ),
        (
            ["flat@-1"],
            (
                "only plain sharps and flats: read as AEU, where a sharp is 4 commas and a flat 5; if they "
                "are meant as piano keys: --accidentals literal"
            ),
        ),
        (
            ["@-0.3"],
            (
                "accidentals read as literal (piano keys), because the score prints no sign at all, and its "
                "notes lie between the piano's keys; if they mean something else: --accidentals aeu, folk, "
                "arabic or persian"
            ),
        ),
    ],
)
def test_the_reason_names_what_was_seen_and_ends_with_how_to_choose_another(seen: list[str], reason: str):
    assert guess_notation(pairs(*seen), COMMAS_53).reason == reason


@given(
    st.lists(
        st.tuples(
            st.one_of(
                st.none(),
                st.builds(Sign, st.text(max_size=5), st.sampled_from([row.glyph for row in TABLE])),
                st.builds(Sign, st.sampled_from(MUSIC_XML_4.split())),
            ),
            st.one_of(st.none(), st.floats(allow_nan=False, allow_infinity=False)),
        ),
        max_size=8,
    ),
    st.sampled_from([COMMAS_53, SEMITONES_12]),
)
def test_any_set_of_signs_gives_one_guess_whatever_their_order(seen, system):
    guess = guess_notation(seen, system)
    assert guess == guess_notation(reversed(seen), system)
    assert "--accidentals" in guess.reason
