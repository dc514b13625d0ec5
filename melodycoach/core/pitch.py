"""Pitch: cents on the MIDI scale, tone systems, written names, and the names that a pack gives.

Conventions
-----------
A pitch is a float in *cents on the MIDI scale*: 6900 is A4, 440 Hz unless the player tunes
otherwise. A *unit* is the smallest division of a tone system: one Holdrian comma (1200/53 cents)
in the 53 system, one semitone in the 12 system. Unit counts are taken from A4: in the 53 system
G4 is -9, C5 is 13.

References
----------
The comma sizes of naturals and accidentals are those of Arel-Ezgi-Uzdilek theory: the naturals
stand in Pythagorean order (whole tone 9 commas, half tone 4), the plain sharp raises by a bakiye
(4 commas), the plain flat lowers by a küçük mücenneb (5 commas). A4 = key 69 = 440 Hz: MIDI
Tuning Standard.
"""

from __future__ import annotations

import unicodedata
from dataclasses import dataclass
from functools import cached_property
from math import floor

A4_CENTS = 6900.0
OCTAVE_CENTS = 1200.0
COMMA_CENTS = OCTAVE_CENTS / 53
KEY_CENTS = 100.0  # from one key of a plain keyboard to the next
LOWEST_CENTS, HIGHEST_CENTS = 0.0, 12700.0  # keys 0 and 127 of MIDI
LETTERS = "CDEFGAB"
KEY_NAMES = ("C", "C#", "D", "Eb", "E", "F", "F#", "G", "G#", "A", "Bb", "B")

_DOTLESS = str.maketrans({"ı": "i", "İ": "i", "ğ": "g", "Ğ": "g", "ş": "s", "Ş": "s"})


def fold_name(text: str) -> str:
    """Reduce a name to plain ASCII letters and digits, so that any spelling finds it.

    Examples
    --------
    >>> fold_name("Hüseynîaşîran"), fold_name("tiz-segâh"), fold_name("KARCIĞAR")
    ('huseyniasiran', 'tizsegah', 'karcigar')
    """
    spread = unicodedata.normalize("NFKD", text.translate(_DOTLESS))
    return "".join(c for c in spread.lower() if c.isascii() and c.isalnum())


def key_of(cents: float) -> int:
    """Give the number of the key of a plain keyboard that is nearest to a pitch.

    >>> key_of(6900), key_of(6949.9), key_of(6950)
    (69, 69, 70)
    """
    return floor(cents / KEY_CENTS + 0.5)


def key_name(cents: float) -> str:
    """Name the key of a plain keyboard nearest to a pitch.

    >>> key_name(7104.0), key_name(7400.0)
    ('B4', 'D5')
    """
    octave, place = divmod(key_of(cents), len(KEY_NAMES))
    return f"{KEY_NAMES[place]}{octave - 1}"


@dataclass(frozen=True, slots=True)
class Spelling:
    """A written pitch: letter, sharps or flats, a remainder in units, octave.

    ``Spelling("B", 0, -1, 4)`` is B4 one comma flat; ``accidentals`` counts sharps (flats are
    negative); ``units`` is what the letter and its accidentals leave over, and may be fractional.
    """

    letter: str
    accidentals: int
    units: float
    octave: int

    def __str__(self) -> str:
        """Write it as note text does: ``B4-1``, ``F#5``, ``Bb4+1``; octaves below 0 as ``C(-1)``.

        Examples
        --------
        >>> str(Spelling("B", -1, 1, 4)), str(Spelling("A", 0, 0, 4)), str(Spelling("E", 0, -0.25, 5))
        ('Bb4+1', 'A4', 'E5-0.25')
        """
        octave = str(self.octave) if self.octave >= 0 else f"({self.octave})"
        return f"{self.letter}{self._mark}{octave}{self._rest}"

    @property
    def sign(self) -> str:
        """Write it without its octave, as at the clef.

        >>> Spelling("B", 0, -1, 4).sign, Spelling("F", 1, 0, 5).sign
        ('B-1', 'F#')
        """
        return f"{self.letter}{self._mark}{self._rest}"

    @property
    def _mark(self) -> str:
        return ("#" if self.accidentals > 0 else "b") * abs(self.accidentals)

    @property
    def _rest(self) -> str:
        return f"{self.units:+.2f}".rstrip("0").rstrip(".") if round(self.units, 2) else ""


@dataclass(frozen=True)
class ToneSystem:
    """How a pack divides the octave and what its written letters and accidentals measure.

    Parameters
    ----------
    divisions
        Units in the octave: 53 or 12.
    natural_units
        Units of C D E F G A B above C.
    sharp_units, flat_units
        What a plain ``#`` raises and a plain ``b`` lowers, in units.
    unit_name
        The word for one unit, for people: ``comma`` or ``semitone``.
    """

    divisions: int
    natural_units: tuple[int, ...]
    sharp_units: int
    flat_units: int
    unit_name: str

    @property
    def unit_cents(self) -> float:
        """Size of one unit in cents."""
        return OCTAVE_CENTS / self.divisions

    def cents_to_units(self, cents: float) -> float:
        """Count the units from A4 to a pitch.

        >>> round(COMMAS_53.cents_to_units(6900 - 9 * 1200 / 53), 9)
        -9.0
        """
        return (cents - A4_CENTS) / self.unit_cents

    def units_to_cents(self, units: float) -> float:
        """Give the pitch that lies so many units above A4.

        >>> SEMITONES_12.units_to_cents(3)
        7200.0
        """
        return A4_CENTS + units * self.unit_cents

    def spelling_units(self, spelling: Spelling) -> float:
        """Count the units from A4 to a written pitch.

        >>> COMMAS_53.spelling_units(Spelling("B", 0, -1, 4))
        8
        """
        natural = self.natural_units[LETTERS.index(spelling.letter)]
        size = self.sharp_units if spelling.accidentals > 0 else self.flat_units
        above_c4 = natural + spelling.accidentals * size + (spelling.octave - 4) * self.divisions
        return above_c4 - self.natural_units[5] + spelling.units

    def spelling_cents(self, spelling: Spelling) -> float:
        """Give the pitch of a written name."""
        return self.units_to_cents(self.spelling_units(spelling))

    def spell(self, units: float) -> Spelling:
        """Write the pitch that lies so many units above A4, with the smallest remainder.

        Letters without accidental win a tie, then C#, Eb, F#, G# and Bb.

        >>> str(COMMAS_53.spell(8)), str(COMMAS_53.spell(4)), str(COMMAS_53.spell(39))
        ('B4-1', 'Bb4', 'F#5')
        """
        above_c4 = units + self.natural_units[5]
        best: tuple[tuple[float, int], Spelling] | None = None
        for letter, accidentals, rank in _SPELLING_ORDER:
            size = self.sharp_units if accidentals > 0 else self.flat_units
            base = self.natural_units[LETTERS.index(letter)] + accidentals * size
            octave = round((above_c4 - base) / self.divisions)
            left = above_c4 - base - octave * self.divisions
            key = (round(abs(left), 6), rank)
            if best is None or key < best[0]:
                best = (key, Spelling(letter, accidentals, round(left, 6), octave + 4))
        assert best is not None
        return best[1]


_SPELLING_ORDER = tuple(
    [(letter, 0, 0) for letter in LETTERS]
    + [("C", 1, 1), ("E", -1, 1), ("F", 1, 1), ("G", 1, 1), ("B", -1, 1)]
)

COMMAS_53 = ToneSystem(53, (0, 9, 18, 22, 31, 40, 49), sharp_units=4, flat_units=5, unit_name="comma")
SEMITONES_12 = ToneSystem(12, (0, 2, 4, 5, 7, 9, 11), sharp_units=1, flat_units=1, unit_name="semitone")
TONE_SYSTEMS = {system.divisions: system for system in (COMMAS_53, SEMITONES_12)}


@dataclass(frozen=True, slots=True)
class NamedPitch:
    """A pitch with a name of its own, such as a perde: ``units`` count from A4."""

    name: str
    units: int
    spelling: Spelling


@dataclass(frozen=True)
class PitchNames:
    """The names and words that a pack gives: names of pitches, and the trade's own words.

    Both stand beside what the program says by itself: the written names of the tone system, and
    English terms such as ``dominant``.

    Parameters
    ----------
    system
        The tone system that the units count in.
    named
        Pitches with a name; any order, at most one name for each pitch.
    words
        English terms, each with the trade's word for it; any order, each term at most once.
    """

    system: ToneSystem
    named: tuple[NamedPitch, ...] = ()
    words: tuple[tuple[str, str], ...] = ()

    @cached_property
    def _by_units(self) -> dict[int, NamedPitch]:
        return {pitch.units: pitch for pitch in self.named}

    @cached_property
    def _by_folded(self) -> dict[str, NamedPitch]:
        return {fold_name(pitch.name): pitch for pitch in self.named}

    @cached_property
    def _word_by_term(self) -> dict[str, str]:
        return dict(self.words)

    def word(self, english: str) -> str:
        """Give the trade's word for an English term, or the term itself where the pack has none.

        >>> names = PitchNames(COMMAS_53, words=(("dominant", "güçlü"),))
        >>> names.word("dominant"), names.word("final")
        ('güçlü', 'final')
        """
        return self._word_by_term.get(english, english)

    def beside(self, english: str) -> str:
        """Give the trade's word in brackets, to stand behind the English one, or nothing.

        >>> names = PitchNames(COMMAS_53, words=(("dominant", "güçlü"),))
        >>> names.beside("dominant"), names.beside("final")
        (' (güçlü)', '')
        """
        word = self._word_by_term.get(english)
        return f" ({word})" if word else ""

    def find(self, text: str) -> NamedPitch | None:
        """Look a name up in any spelling, with or without diacritics; None if unknown."""
        return self._by_folded.get(fold_name(text))

    def at(self, units: int) -> NamedPitch | None:
        """Look up the named pitch that lies so many units above A4; None if there is none."""
        return self._by_units.get(units)

    def spell(self, cents: float) -> Spelling:
        """Write a pitch, to a hundredth of a unit, the way the named pitches are written."""
        units = round(self.system.cents_to_units(cents), 2)
        named = self._by_units.get(round(units))
        if named is None:
            return self.system.spell(units)
        base = named.spelling
        left = round(base.units + units - named.units, 2)
        return Spelling(base.letter, base.accidentals, left, base.octave)

    def name(self, cents: float) -> str:
        """Name a pitch for people: its nearest perde, or its nearest written name."""
        return self.name_at(round(self.system.cents_to_units(cents)))

    def name_at(self, units: int) -> str:
        """Name the pitch that lies so many units above A4, as `name` does."""
        named = self._by_units.get(units)
        return named.name if named else str(self.system.spell(units))
