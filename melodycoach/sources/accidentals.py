"""Accidentals of a score: what each printed sign raises or lowers, by the notation it stands in.

The same sign says different things in different notations: a plain flat lowers by 5 commas in makam
scores and by a semitone elsewhere; a slashed flat is 4 commas in makam scores and a quarter tone in
Arabic ones. So a score is read in one `Notation`, which the user sets or `guess_notation` tells from
the signs it prints.

Conventions
-----------
What a sign raises is in cents, negative when it lowers. ``alter`` is MusicXML's number of semitones,
which programs that write scores fill in so differently that it counts last.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, NamedTuple, TypeAlias

from melodycoach.core.pitch import COMMA_CENTS, COMMAS_53, KEY_CENTS, SEMITONES_12, Spelling
from melodycoach.errors import shorten
from melodycoach.sources.accidental_table import TABLE, Notation, Row

if TYPE_CHECKING:
    from collections.abc import Iterable

    from melodycoach.core.pitch import ToneSystem

MOST_NAMED = 3
"""How many signs a reason names."""

COMMA_NOTATIONS = frozenset({Notation.AEU, Notation.FOLK})
"""The notations that count in commas, from naturals in Pythagorean order."""

NOTATION_NAMES = {
    Notation.AEU: "AEU (Turkish makam)",
    Notation.FOLK: "Turkish folk",
    Notation.ARABIC: "Arabic",
    Notation.PERSIAN: "Persian",
    Notation.LITERAL: "literal (piano keys)",
}

HOMES = (Notation.AEU, Notation.FOLK, Notation.LITERAL, Notation.ARABIC, Notation.PERSIAN)
"""Where a sign that means nothing in the notation of its score is looked up, in this order."""

_BY_VALUE = {row.value: row for row in TABLE if row.value}
_BY_GLYPH = {row.glyph: row for row in TABLE if row.glyph}
_UNKNOWN = _BY_VALUE["other"]

_GRID = {2: "double-sharp", 1.5: "three-quarters-sharp", 1: "sharp", 0.5: "quarter-sharp", 0: "natural"}
_GRID |= {-2: "flat-flat", -1.5: "three-quarters-flat", -1: "flat", -0.5: "quarter-flat"}


class Sign(NamedTuple):
    """A printed accidental: its MusicXML value, its SMuFL glyph name, or both; the other is empty."""

    token: str
    smufl: str = ""

    def __str__(self) -> str:
        """Name it for people: its value or glyph in the table, or what was found, in quotes.

        >>> str(Sign("slash-flat")), str(Sign("other", "accidentalKomaFlat")), str(Sign("?"))
        ('slash-flat', 'accidentalKomaFlat', "'?'")
        """
        row = _row(self)
        if row is _UNKNOWN:
            return repr(shorten(self.smufl or self.token))
        return row.value or row.glyph


Pairs: TypeAlias = frozenset[tuple[Sign | None, float | None]]


def read_sign(text: str | None, smufl: str | None = None) -> Sign | None:
    """Take the content of an ``accidental`` element; None if it prints nothing.

    >>> read_sign(" flat "), read_sign(""), read_sign(None), read_sign("other", "accidentalKoron")
    (Sign(token='flat', smufl=''), None, None, Sign(token='other', smufl='accidentalKoron'))
    """
    sign = Sign((text or "").strip(), (smufl or "").strip())
    return sign if sign.token or sign.smufl else None


def grid_sign(alter: float) -> Sign | None:
    """Give the sign that is meant by an ``alter`` where none is printed; None off the quarter tones.

    >>> str(grid_sign(-1)), str(grid_sign(0.5)), grid_sign(-0.22)
    ('flat', 'quarter-sharp', None)
    """
    token = _GRID.get(alter)
    return Sign(token) if token else None


def raised_cents(sign: Sign, notation: Notation) -> float | None:
    """Give what a sign raises in a notation, in cents; None if it has no meaning there.

    A glyph name that is understood counts before the value beside it.

    >>> raised_cents(Sign("flat"), Notation.LITERAL), raised_cents(Sign("flat-2"), Notation.AEU)
    (-100.0, None)
    >>> round(raised_cents(Sign("quarter-flat"), Notation.AEU), 2)
    -22.64
    """
    size = getattr(_row(sign), notation.value)
    if size is None:
        return None
    return float(size) * (COMMA_CENTS if notation in COMMA_NOTATIONS else 1.0)


def home_of(sign: Sign) -> Notation | None:
    """Give the notation that a sign belongs to first; None if the sign is not known.

    >>> home_of(Sign("flat-2")).value, home_of(Sign("koron")).value, home_of(Sign("?"))
    ('folk', 'persian', None)
    """
    return next((notation for notation in HOMES if raised_cents(sign, notation) is not None), None)


def is_plain(sign: Sign) -> bool:
    """Tell whether a sign is one of plain notation: natural, sharps and flats that whole keys have.

    >>> is_plain(Sign("flat")), is_plain(Sign("slash-flat"))
    (True, False)
    """
    literal = _row(sign).literal
    return literal is not None and literal % KEY_CENTS == 0


def natural_cents(step: str, octave: int, notation: Notation, system: ToneSystem) -> float:
    """Give the pitch of a letter without accidental.

    Comma notations have the naturals of the pack's tone system if it counts 53 commas, and those
    of AEU theory if not; the others have the white keys of a piano.

    >>> natural_cents("C", 5, Notation.LITERAL, COMMAS_53)
    7200.0
    >>> round(natural_cents("C", 5, Notation.AEU, COMMAS_53), 2)  # 13 commas above A4
    7194.34
    """
    of_commas = system if system.divisions == COMMAS_53.divisions else COMMAS_53
    spaced = of_commas if notation in COMMA_NOTATIONS else SEMITONES_12
    return spaced.spelling_cents(Spelling(step, 0, 0, octave))


def _row(sign: Sign) -> Row:
    return _BY_GLYPH.get(sign.smufl) or _BY_VALUE.get(sign.token) or _UNKNOWN


@dataclass(frozen=True, slots=True)
class Guess:
    """The notation that a score seems to be in, and why, as a sentence for a musician."""

    notation: Notation
    reason: str


def guess_notation(seen: Iterable[tuple[Sign | None, float | None]], system: ToneSystem) -> Guess:
    """Tell from the signs of a score which notation it is in.

    Parameters
    ----------
    seen
        Each pair of printed sign (or None) and ``alter`` (or None) of the score, those of its key
        signatures included; any order.
    system
        The tone system of the pack: plain signs mean commas only where it counts 53.

    Examples
    --------
    >>> guess_notation({(Sign("flat-2"), None), (Sign("sharp"), 1.0)}, COMMAS_53).notation.value
    'folk'
    """
    pairs = frozenset(seen)
    signs = frozenset(sign for sign, _ in pairs if sign is not None)
    for notation in (Notation.FOLK, Notation.AEU, Notation.PERSIAN, Notation.ARABIC):
        if telling := {str(sign) for sign in signs if _row(sign).only_in() is notation}:
            return _guess(notation, f"the score prints {_listed(telling)}")
    return _guess_by_slashed_flats(pairs, signs) or _guess_by_quarters(pairs, signs, system)


def _guess_by_slashed_flats(pairs: Pairs, signs: frozenset[Sign]) -> Guess | None:
    """Tell 4 commas from a quarter tone; None where no slashed flat is printed."""
    alters = {alter for sign, alter in pairs if sign and _row(sign) is _BY_VALUE["slash-flat"]}
    if not alters:
        return None
    if -0.5 in alters and not any(_row(sign) is _BY_VALUE["quarter-flat"] for sign in signs):
        return _guess(
            Notation.ARABIC, "its slash-flat is given as a quarter tone, and no other sign is of AEU"
        )
    return _guess(Notation.AEU, "the score prints slash-flat")


def _guess_by_quarters(pairs: Pairs, signs: frozenset[Sign], system: ToneSystem) -> Guess:
    """Decide between AEU and the piano's keys, where no sign is of one notation alone."""
    if telling := {str(sign) for sign in signs if _between_keys(_row(sign))}:
        return _guess(
            Notation.LITERAL, f"the score prints {_listed(telling)}, signs of piano-based quarter tones"
        )
    if not signs and any(alter is not None and alter % 1 for _, alter in pairs):
        return _guess(
            Notation.LITERAL, "the score prints no sign at all, and its notes lie between the piano's keys"
        )
    if system.divisions != COMMAS_53.divisions:
        return _guess(Notation.LITERAL, f"this pack counts {system.divisions} divisions of the octave")
    if telling := {str(sign) for sign in signs if not is_plain(sign) and home_of(sign) is Notation.AEU}:
        return _guess(Notation.AEU, f"the score prints {_listed(telling)}")
    return Guess(
        Notation.AEU,
        "only plain sharps and flats: read as AEU, where a sharp is 4 commas and a flat 5; if they are meant "
        "as piano keys: --accidentals literal",
    )


def _between_keys(row: Row) -> bool:
    """Tell whether a sign is one of piano-based quarter tones, which no comma notation has."""
    return row.aeu is None and row.folk is None and row.literal is not None


def _guess(notation: Notation, why: str) -> Guess:
    others = [other.value for other in Notation if other is not notation]
    return Guess(
        notation,
        f"accidentals read as {NOTATION_NAMES[notation]}, because {why}; if they mean something else: "
        f"--accidentals {', '.join(others[:-1])} or {others[-1]}",
    )


def _listed(names: Iterable[str]) -> str:
    """Name the first few of some signs.

    >>> _listed({"flat-2", "flat-1"}), _listed("abcd")
    ('flat-1 and flat-2', 'a, b and others')
    """
    ordered = sorted(names)
    shown = ordered if len(ordered) <= MOST_NAMED else [*ordered[: MOST_NAMED - 1], "others"]
    return " and ".join([", ".join(shown[:-1]), shown[-1]]) if len(shown) > 1 else shown[0]
