"""The table of accidentals: what each sign raises or lowers in each notation.

Conventions
-----------
Commas in the columns of makam and folk scores, cents in the others; negative lowers, ``___`` has no
meaning there.

References
----------
The values of an accidental, and the glyph that each prints: W3C MusicXML 4.0, ``accidental-value``.
Glyph names and the quarter tones that they name: W3C SMuFL 1.4 (standard accidentals U+E260, Gould
arrows U+E270, Stein-Zimmermann U+E280, AEU U+E440, Turkish folk U+E450, Persian U+E460, Arabic
U+ED30). The commas of the AEU signs, double sharp and double flat (a whole tone, tanini) among
them: the glyph table of LilyPond's ``makam.ly``. The numbers of folk signs count commas; there is
no sharp-4 and no flat-5, since these are the plain ones. Koron and sori are taken as the quarter
tones that SMuFL calls them; players take them from about 30 to 70 cents (common practice). What a
triple sharp raises in commas is a double and a plain one together, by our own reckoning.
"""

from __future__ import annotations

from enum import StrEnum
from typing import NamedTuple


class Notation(StrEnum):
    """What the accidentals of a score mean.

    ``AEU``: Arel-Ezgi-Uzdilek, as makam scores are written. ``FOLK``: Turkish folk music, numbered
    signs. ``ARABIC``: quarter tones. ``PERSIAN``: koron and sori. ``LITERAL``: as the file's
    ``alter`` gives it, from the keys of a piano.
    """

    AEU = "aeu"
    FOLK = "folk"
    ARABIC = "arabic"
    PERSIAN = "persian"
    LITERAL = "literal"


class Row(NamedTuple):
    """One sign.

    Parameters
    ----------
    value
        Its value in MusicXML; empty for a glyph that no value prints by itself.
    glyph
        Its name in SMuFL; empty for ``other``.
    aeu, folk
        What it raises there, in commas; None where it has no meaning.
    arabic, persian, literal
        The same, in cents.
    """

    value: str
    glyph: str
    aeu: float | None
    folk: float | None
    arabic: float | None
    persian: float | None
    literal: float | None

    def only_in(self) -> Notation | None:
        """Give the one notation in which the sign has a meaning, so that it tells the notation of a score.

        >>> [row.only_in() for row in TABLE if row.value in ("slash-flat", "koron")]
        [None, <Notation.PERSIAN: 'persian'>]
        """
        having = [notation for notation in Notation if getattr(self, notation.value) is not None]
        return having[0] if len(having) == 1 else None


___ = None

# fmt: off
TABLE: tuple[Row, ...] = (
    #   MusicXML                SMuFL                                     aeu folk arabic persian literal
    Row("sharp",                "accidentalSharp",                             4,   4,  100,  100,  100),
    Row("natural",              "accidentalNatural",                           0,   0,    0,    0,    0),
    Row("flat",                 "accidentalFlat",                             -5,  -5, -100, -100, -100),
    Row("double-sharp",         "accidentalDoubleSharp",                       9,   9,  200,  200,  200),
    Row("sharp-sharp",          "accidentalSharpSharp",                        9,   9,  200,  200,  200),
    Row("flat-flat",            "accidentalDoubleFlat",                       -9,  -9, -200, -200, -200),
    Row("natural-sharp",        "accidentalNaturalSharp",                      4,   4,  100,  100,  100),
    Row("natural-flat",         "accidentalNaturalFlat",                      -5,  -5, -100, -100, -100),
    Row("quarter-flat",         "accidentalQuarterToneFlatStein",             -1, ___,  -50,  -50,  -50),
    Row("quarter-sharp",        "accidentalQuarterToneSharpStein",             1, ___,   50,   50,   50),
    Row("three-quarters-flat",  "accidentalThreeQuarterTonesFlatZimmermann", ___, ___, -150, -150, -150),
    Row("three-quarters-sharp", "accidentalThreeQuarterTonesSharpStein",     ___, ___,  150,  150,  150),
    Row("sharp-down",           "accidentalQuarterToneSharpArrowDown",       ___, ___,   50,   50,   50),
    Row("sharp-up",             "accidentalThreeQuarterTonesSharpArrowUp",   ___, ___,  150,  150,  150),
    Row("natural-down",         "accidentalQuarterToneFlatNaturalArrowDown", ___, ___,  -50,  -50,  -50),
    Row("natural-up",           "accidentalQuarterToneSharpNaturalArrowUp",  ___, ___,   50,   50,   50),
    Row("flat-down",            "accidentalThreeQuarterTonesFlatArrowDown",  ___, ___, -150, -150, -150),
    Row("flat-up",              "accidentalQuarterToneFlatArrowUp",          ___, ___,  -50,  -50,  -50),
    Row("double-sharp-down",    "accidentalThreeQuarterTonesSharpArrowDown", ___, ___,  150,  150,  150),
    Row("double-sharp-up",      "accidentalFiveQuarterTonesSharpArrowUp",    ___, ___,  250,  250,  250),
    Row("flat-flat-down",       "accidentalFiveQuarterTonesFlatArrowDown",   ___, ___, -250, -250, -250),
    Row("flat-flat-up",         "accidentalThreeQuarterTonesFlatArrowUp",    ___, ___, -150, -150, -150),
    Row("arrow-down",           "accidentalArrowDown",                       ___, ___,  -50,  -50,  -50),
    Row("arrow-up",             "accidentalArrowUp",                         ___, ___,   50,   50,   50),
    Row("triple-sharp",         "accidentalTripleSharp",                      13,  13,  300,  300,  300),
    Row("triple-flat",          "accidentalTripleFlat",                      -14, -14, -300, -300, -300),
    Row("slash-quarter-sharp",  "accidentalKucukMucennebSharp",                5, ___,  ___,  ___,  ___),
    Row("slash-sharp",          "accidentalBuyukMucennebSharp",                8, ___,  ___,  ___,  ___),
    Row("slash-flat",           "accidentalBakiyeFlat",                       -4, ___,  -50,  ___,  ___),
    Row("double-slash-flat",    "accidentalBuyukMucennebFlat",                -8, ___,  ___,  ___,  ___),
    Row("sharp-1",              "accidental1CommaSharp",                     ___,   1,  ___,  ___,  ___),
    Row("sharp-2",              "accidental2CommaSharp",                     ___,   2,  ___,  ___,  ___),
    Row("sharp-3",              "accidental3CommaSharp",                     ___,   3,  ___,  ___,  ___),
    Row("sharp-5",              "accidental5CommaSharp",                     ___,   5,  ___,  ___,  ___),
    Row("flat-1",               "accidental1CommaFlat",                      ___,  -1,  ___,  ___,  ___),
    Row("flat-2",               "accidental2CommaFlat",                      ___,  -2,  ___,  ___,  ___),
    Row("flat-3",               "accidental3CommaFlat",                      ___,  -3,  ___,  ___,  ___),
    Row("flat-4",               "accidental4CommaFlat",                      ___,  -4,  ___,  ___,  ___),
    Row("sori",                 "accidentalSori",                            ___, ___,  ___,   50,  ___),
    Row("koron",                "accidentalKoron",                           ___, ___,  ___,  -50,  ___),
    Row("other",                "",                                          ___, ___,  ___,  ___,  ___),
    Row("",                     "accidentalKomaFlat",                         -1, ___,  ___,  ___,  ___),
    Row("",                     "accidentalKucukMucennebFlat",                -5, ___,  ___,  ___,  ___),
    Row("",                     "accidentalKomaSharp",                         1, ___,  ___,  ___,  ___),
    Row("",                     "accidentalBakiyeSharp",                       4, ___,  ___,  ___,  ___),
    Row("",                     "accidentalNarrowReversedFlat",               -1, ___,  -50,  -50,  -50),
    Row("",                     "accidentalNarrowReversedFlatAndFlat",       ___, ___, -150, -150, -150),
    Row("",                     "accidentalDoubleFlatArabic",                ___, ___, -200,  ___,  ___),
    Row("",                     "accidentalThreeQuarterTonesFlatArabic",     ___, ___, -150,  ___,  ___),
    Row("",                     "accidentalFlatArabic",                      ___, ___, -100,  ___,  ___),
    Row("",                     "accidentalQuarterToneFlatArabic",           ___, ___,  -50,  ___,  ___),
    Row("",                     "accidentalNaturalArabic",                   ___, ___,    0,  ___,  ___),
    Row("",                     "accidentalQuarterToneSharpArabic",          ___, ___,   50,  ___,  ___),
    Row("",                     "accidentalSharpArabic",                     ___, ___,  100,  ___,  ___),
    Row("",                     "accidentalThreeQuarterTonesSharpArabic",    ___, ___,  150,  ___,  ___),
    Row("",                     "accidentalDoubleSharpArabic",               ___, ___,  200,  ___,  ___),
)
# fmt: on
