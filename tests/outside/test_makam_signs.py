"""The signs of makam scores through the whole reader: by their names, by their glyphs, in every wrapping.

The tables below are written from these sources, not from our own:

- W3C MusicXML 4.0, ``accidental-value``: the names of the accidentals (compared once with the schema file
  ``musicxml.xsd`` 4.0, all 41), and the glyph that each prints.
- W3C SMuFL 1.4 (compared once with its ``glyphnames.json``), "Arel-Ezgi-Uzdilek (AEU) accidentals"
  (U+E440 to U+E447) and "Turkish folk music
  accidentals" (U+E450 to U+E457): the names of the glyphs.
- How much each raises or lowers: Arel-Ezgi-Uzdilek theory (koma 1, bakiye 4, küçük mücenneb 5, büyük
  mücenneb 8 commas of 1200/53 cents), and the numbers that the folk signs bear. Common practice.
"""

from __future__ import annotations

import zipfile
from io import BytesIO

import pytest
from written_out import in_score

from melodycoach.core.note import InputKind, Note
from melodycoach.sources.accidentals import Notation
from melodycoach.sources.pack_file import load_pack
from melodycoach.sources.sheet_file import ReadOptions, read_sheet

NAMES = load_pack("makam").names
COMMA = 1200 / 53
B4, E5 = 9, 31  # commas above A4: a whole tone, and a fifth

# MusicXML 4.0 value: code point of the glyph it prints, commas
AEU_VALUES = {
    "double-slash-flat": (0xE440, -8),  # büyük mücenneb
    "flat": (0xE260, -5),  # küçük mücenneb
    "slash-flat": (0xE442, -4),  # bakiye
    "quarter-flat": (0xE280, -1),  # koma: a reversed flat, as U+E443 is
    "natural": (0xE261, 0),
    "quarter-sharp": (0xE282, 1),  # koma: a sharp with one upright stroke, as U+E444 is
    "sharp": (0xE262, 4),  # bakiye
    "slash-quarter-sharp": (0xE446, 5),  # küçük mücenneb
    "slash-sharp": (0xE447, 8),  # büyük mücenneb
}
# SMuFL 1.4: code point, glyph name, commas
AEU_GLYPHS = {
    0xE440: ("accidentalBuyukMucennebFlat", -8),
    0xE441: ("accidentalKucukMucennebFlat", -5),
    0xE442: ("accidentalBakiyeFlat", -4),
    0xE443: ("accidentalKomaFlat", -1),
    0xE444: ("accidentalKomaSharp", 1),
    0xE445: ("accidentalBakiyeSharp", 4),
    0xE446: ("accidentalKucukMucennebSharp", 5),
    0xE447: ("accidentalBuyukMucennebSharp", 8),
}
# there is no sharp-4 and no flat-5: the plain signs stand for them
FOLK_VALUES = {
    "sharp-1": (0xE450, 1),
    "sharp-2": (0xE451, 2),
    "sharp-3": (0xE452, 3),
    "sharp": (0xE262, 4),
    "sharp-5": (0xE453, 5),
    "flat-1": (0xE454, -1),
    "flat-2": (0xE455, -2),
    "flat-3": (0xE456, -3),
    "flat-4": (0xE457, -4),
    "flat": (0xE260, -5),
}
FOLK_GLYPHS = {
    0xE450: ("accidental1CommaSharp", 1),
    0xE451: ("accidental2CommaSharp", 2),
    0xE452: ("accidental3CommaSharp", 3),
    0xE453: ("accidental5CommaSharp", 5),
    0xE454: ("accidental1CommaFlat", -1),
    0xE455: ("accidental2CommaFlat", -2),
    0xE456: ("accidental3CommaFlat", -3),
    0xE457: ("accidental4CommaFlat", -4),
}
ALL_VALUES = """
    sharp natural flat double-sharp sharp-sharp flat-flat natural-sharp natural-flat quarter-flat
    quarter-sharp three-quarters-flat three-quarters-sharp sharp-down sharp-up natural-down natural-up
    flat-down flat-up
    double-sharp-down double-sharp-up flat-flat-down flat-flat-up arrow-down arrow-up triple-sharp triple-flat
    slash-quarter-sharp slash-sharp slash-flat double-slash-flat sharp-1 sharp-2 sharp-3 sharp-5
    flat-1 flat-2 flat-3 flat-4 sori koron other
""".split()  # noqa: SIM905 (a table reads better so)

ALTERS = {
    "no alter": None,
    "an empty alter": "",
    "an alter of half a semitone": "-0.5",
    "an alter of a semitone": "1",
    "an alter of two decimals": "-0.44",
}


def note(step: str, octave: int, sign: str = "", alter: str | None = None) -> str:
    raised = "" if alter is None else f"<alter>{alter}</alter>"
    return (
        f"<note><pitch><step>{step}</step>{raised}<octave>{octave}</octave></pitch>"
        f"<duration>1</duration><voice>1</voice>{sign}</note>"
    )


def printed(value: str) -> str:
    return f"<accidental>{value}</accidental>"


def glyph(name: str, value: str = "other") -> str:
    return f'<accidental smufl="{name}">{value}</accidental>'


def score(*bars: str, key: str = "", encoding: str = "UTF-8") -> str:
    attributes = f"<attributes><divisions>1</divisions>{key}</attributes>"
    measures = "".join(
        f'<measure number="{number}">{attributes if number == 1 else ""}{bar}</measure>'
        for number, bar in enumerate(bars, start=1)
    )
    return in_score([measures], encoding=encoding)


def packed(text: str) -> bytes:
    """A compressed score, as MusicXML 4.0 describes it: ``META-INF/container.xml`` names the root file."""
    file = BytesIO()
    with zipfile.ZipFile(file, "w", zipfile.ZIP_DEFLATED) as zipped:
        zipped.writestr("mimetype", "application/vnd.recordare.musicxml", zipfile.ZIP_STORED)
        root = '<container><rootfiles><rootfile full-path="line.musicxml"/></rootfiles></container>'
        zipped.writestr("META-INF/container.xml", root)
        zipped.writestr("line.musicxml", text)
    return file.getvalue()


def commas(data: bytes | str, notation: Notation | None = None) -> list[float]:
    """Commas above A4 of each note."""
    options = ReadOptions(notation=notation)
    data = data.encode() if isinstance(data, str) else data
    notes = [item for item in read_sheet(data, "score", NAMES, options).items if isinstance(item, Note)]
    assert len({one.kind for one in notes}) == 1
    assert notes[0].kind in (InputKind.TYPED, InputKind.TUNED)  # folk signs are rounder: see staff_pitch
    return [round((one.pitch_cents - 6900) / COMMA, 6) for one in notes]


# --- the tables themselves ---------------------------------------------------------------------


def test_the_two_tables_of_each_notation_say_the_same_of_a_glyph() -> None:
    for values, glyphs in ((AEU_VALUES, AEU_GLYPHS), (FOLK_VALUES, FOLK_GLYPHS)):
        both = [(size, glyphs[code][1]) for code, size in values.values() if code in glyphs]
        assert len(both) >= 4
        assert all(one == other for one, other in both)


def test_musicxml_4_0_has_41_values() -> None:
    assert len(set(ALL_VALUES)) == len(ALL_VALUES) == 41
    assert {*AEU_VALUES, *FOLK_VALUES} < set(ALL_VALUES)


# --- each sign, printed and by its glyph -------------------------------------------------------


@pytest.mark.parametrize("alter", ALTERS.values(), ids=ALTERS)
@pytest.mark.parametrize("value", AEU_VALUES)
def test_a_sign_of_aeu_raises_its_commas_whatever_alter_says(value: str, alter: str | None) -> None:
    size = AEU_VALUES[value][1]
    text = score(note("B", 4, printed(value), alter) + note("E", 5, printed(value), alter))
    assert commas(text, Notation.AEU) == [B4 + size, E5 + size]


@pytest.mark.parametrize("alter", ALTERS.values(), ids=ALTERS)
@pytest.mark.parametrize("value", FOLK_VALUES)
def test_a_sign_of_folk_music_raises_its_commas_whatever_alter_says(value: str, alter: str | None) -> None:
    size = FOLK_VALUES[value][1]
    text = score(note("B", 4, printed(value), alter) + note("E", 5, printed(value), alter))
    assert commas(text, Notation.FOLK) == [B4 + size, E5 + size]


@pytest.mark.parametrize(("name", "size"), AEU_GLYPHS.values())
@pytest.mark.parametrize("value", ["other", "flat", "sharp", ""])
def test_a_glyph_name_of_aeu_counts_before_the_value_beside_it(name: str, size: int, value: str) -> None:
    text = score(note("B", 4, glyph(name, value), "-0.5") + note("E", 5, glyph(name, value)))
    assert commas(text, Notation.AEU) == [B4 + size, E5 + size]


@pytest.mark.parametrize(("name", "size"), FOLK_GLYPHS.values())
def test_a_glyph_name_of_folk_music_counts(name: str, size: int) -> None:
    text = score(note("B", 4, glyph(name)) + note("E", 5, glyph(name), "1"))
    assert commas(text, Notation.FOLK) == [B4 + size, E5 + size]


def test_all_signs_of_aeu_in_one_score_are_told_from_each_other_without_being_asked() -> None:
    bars = [note("B", 4, printed(value)) for value in AEU_VALUES]
    assert commas(score(*bars)) == [B4 + size for _, size in AEU_VALUES.values()]


def test_all_glyphs_of_aeu_in_one_score_are_told_from_each_other_without_being_asked() -> None:
    bars = [note("B", 4, glyph(name)) for name, _ in AEU_GLYPHS.values()]
    assert commas(score(*bars)) == [B4 + size for _, size in AEU_GLYPHS.values()]


def test_all_signs_of_folk_music_in_one_score_are_told_from_each_other_without_being_asked() -> None:
    bars = [note("B", 4, printed(value)) for value in FOLK_VALUES]
    assert commas(score(*bars)) == [B4 + size for _, size in FOLK_VALUES.values()]


@pytest.mark.parametrize("value", ALL_VALUES)
@pytest.mark.parametrize("notation", Notation)
def test_every_value_of_musicxml_is_read_in_every_notation(value: str, notation: Notation) -> None:
    sheet = read_sheet(
        score(note("B", 4, printed(value))).encode(), "score", NAMES, ReadOptions(notation=notation)
    )
    (only,) = (item for item in sheet.items if isinstance(item, Note))
    assert abs(only.pitch_cents - 7100) <= 330  # a triple sharp is 3 semitones, and B4 4 cents above its key


# --- where a sign holds ------------------------------------------------------------------------


@pytest.mark.parametrize("value", AEU_VALUES)
def test_a_sign_holds_to_the_end_of_its_bar_in_its_octave(value: str) -> None:
    # MusicXML 4.0 prints a sign once in a bar, as common practice does; alter need not repeat it
    size = AEU_VALUES[value][1]
    first = note("B", 4, printed(value)) + note("A", 4) + note("B", 4) + note("B", 3) + note("B", 4)
    assert commas(score(first, note("B", 4)), Notation.AEU) == [
        B4 + size, 0, B4 + size, B4 - 53, B4 + size, B4
    ]  # fmt: skip


def key_of(*signs: tuple[str, str, str]) -> str:
    """A key signature of its own: letter, what stands as its alter, and its accidental element."""
    return "<key>" + "".join(
        f"<key-step>{step}</key-step><key-alter>{alter}</key-alter>{sign}" for step, alter, sign in signs
    ) + "</key>"  # fmt: skip


@pytest.mark.parametrize("alter", ["-0.5", "-1", "2", "-0.44"])
@pytest.mark.parametrize("value", [value for value in AEU_VALUES if value != "natural"])
def test_a_sign_in_the_key_signature_holds_in_every_octave_and_bar(value: str, alter: str) -> None:
    size = AEU_VALUES[value][1]
    key = key_of(("B", alter, f"<key-accidental>{value}</key-accidental>"))
    bars = (
        note("B", 4) + note("E", 5) + note("B", 3),
        note("B", 4, printed("natural")) + note("B", 4),
        note("B", 4),
    )
    assert commas(score(*bars, key=key), Notation.AEU) == [
        B4 + size, E5, B4 - 53 + size, B4, B4, B4 + size
    ]  # fmt: skip


@pytest.mark.parametrize(("name", "size"), AEU_GLYPHS.values())
def test_a_glyph_in_the_key_signature_holds(name: str, size: int) -> None:
    key = key_of(("B", "-1", f'<key-accidental smufl="{name}">other</key-accidental>'))
    assert commas(score(note("B", 4) + note("E", 5), key=key), Notation.AEU) == [B4 + size, E5]


def test_the_signature_of_a_makam_with_two_signs_is_read_without_being_asked() -> None:
    # W3C MusicXML 4.0's own example of a key of a makam writes alters that are no semitones: signs count
    key = key_of(
        ("B", "-1", "<key-accidental>quarter-flat</key-accidental>"),
        ("F", "2", "<key-accidental>sharp</key-accidental>"),
    )
    assert commas(score(note("B", 4) + note("F", 5) + note("C", 5), key=key)) == [B4 - 1, 39, 13]


def test_an_ordinary_key_signature_holds_too_and_a_sign_of_the_bar_outweighs_it() -> None:
    key = "<key><fifths>-1</fifths></key>"  # one flat: B
    bars = note("B", 4) + note("B", 4, printed("quarter-flat")) + note("B", 4), note("B", 4)
    assert commas(score(*bars, key=key), Notation.AEU) == [B4 - 5, B4 - 1, B4 - 1, B4 - 5]


# --- in every wrapping -------------------------------------------------------------------------

WRAPPINGS = {
    "UTF-8 with a mark": lambda text: b"\xef\xbb\xbf" + text.encode(),
    "UTF-16, low byte first": lambda text: b"\xff\xfe" + text.replace("UTF-8", "UTF-16").encode("utf-16-le"),
    "UTF-16, high byte first": lambda text: b"\xfe\xff" + text.replace("UTF-8", "UTF-16").encode("utf-16-be"),
    "UTF-16 without a mark": lambda text: text.replace("UTF-8", "UTF-16").encode("utf-16-le"),
    "UTF-16 that says it were UTF-8": lambda text: b"\xff\xfe" + text.encode("utf-16-le"),
    "compressed": packed,
    "lines and spaces": lambda text: text.replace("><", ">\r\n\t <").encode(),
}


@pytest.mark.parametrize("wrap", WRAPPINGS.values(), ids=WRAPPINGS)
@pytest.mark.parametrize("notation", [Notation.AEU, None], ids=str)
def test_the_signs_are_the_same_in_every_wrapping(wrap, notation: Notation | None) -> None:
    bars = [note("B", 4, printed(value), "-0.5") for value in AEU_VALUES]
    bars += [note("E", 5, glyph(name)) for name, _ in AEU_GLYPHS.values()]
    expected = [B4 + size for _, size in AEU_VALUES.values()] + [E5 + size for _, size in AEU_GLYPHS.values()]
    assert commas(wrap(score(*bars)), notation) == expected


def test_letters_of_the_trade_in_a_title_do_not_change_the_signs() -> None:
    text = score(
        note("B", 4, printed("slash-flat")) + note("B", 4, printed("slash-sharp")), encoding="iso-8859-9"
    )
    titled = text.replace("<part-list>", "<work><work-title>Uşşak şarkı</work-title></work><part-list>")
    assert commas(titled.encode("iso-8859-9")) == [B4 - 4, B4 + 8]
    sheet = read_sheet(titled.encode("iso-8859-9"), "score", NAMES)
    assert sheet.title == "Uşşak şarkı"
