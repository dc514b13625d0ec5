"""The tuning of written notes against the AEU scale of the Scala archive, read by music21.

``turkish_aeu.scl`` gives the 24 tones of Arel-Ezgi-Uzdilek theory as ratios of pure fifths, counted from
kaba çargâh, the written C4. We count in 53 equal commas. A fifth of 31 commas is 0.068 cents narrower than
3/2, and the tone farthest from kaba çargâh lies 12 fifths away on one side and 11 on the other, so no tone
may lie farther from its ratio than 12 x 0.068 = 0.82 cents.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import pytest
from music21.scale import scala
from written_out import in_score

from melodycoach.core.note import Note
from melodycoach.sources.accidentals import Notation
from melodycoach.sources.pack_file import load_pack
from melodycoach.sources.sheet_file import ReadOptions, read_sheet

if TYPE_CHECKING:
    from collections.abc import Sequence

NAMES = load_pack("makam").names
FIFTH_IS_NARROWER_CENTS = 701.955 - 31 * 1200 / 53
TOLERANCE_CENTS = 12 * FIFTH_IS_NARROWER_CENTS + 0.001

# each tone: as note text writes it, and its letter, octave and sign in a score with AEU accidentals
TONES = [
    ("C4", "C4", ""),
    ("C#4", "C4", "sharp"),
    ("C#4+1", "C4", "slash-quarter-sharp"),
    ("D4-1", "D4", "quarter-flat"),
    ("D4", "D4", ""),
    ("Eb4", "E4", "flat"),
    ("Eb4+1", "E4", "slash-flat"),
    ("E4-1", "E4", "quarter-flat"),
    ("E4", "E4", ""),
    ("F4", "F4", ""),
    ("F4+1", "F4", "quarter-sharp"),
    ("F#4", "F4", "sharp"),
    ("F#4+1", "F4", "slash-quarter-sharp"),
    ("G4-1", "G4", "quarter-flat"),
    ("G4", "G4", ""),
    ("Ab4", "A4", "flat"),
    ("Ab4+1", "A4", "slash-flat"),
    ("A4-1", "A4", "quarter-flat"),
    ("A4", "A4", ""),
    ("Bb4", "B4", "flat"),
    ("Bb4+1", "B4", "slash-flat"),
    ("B4-1", "B4", "quarter-flat"),
    ("B4", "B4", ""),
    ("C5-1", "C5", "quarter-flat"),
    ("C5", "C5", ""),
]
# the same tones with the two signs of a whole tone less a comma
MUCENNEB = {3: ("C4", "slash-sharp"), 13: ("F4", "slash-sharp"), 10: ("G4", "double-slash-flat")}


def ratios_in_cents() -> list[float]:
    return [0.0, *scala.parse("turkish_aeu.scl").getCentsAboveTonic()]


def as_text(notes: Sequence[tuple[str, str, str]]) -> bytes:
    return " ".join(text for text, _, _ in notes).encode()


def as_score(notes: Sequence[tuple[str, str, str]]) -> bytes:
    """One bar for each note, so that no sign holds for the next."""
    head = "<attributes><divisions>1</divisions></attributes>"
    bars = [
        f'<measure number="{number}">{head if number == 1 else ""}'
        f"<note><pitch><step>{name[0]}</step><octave>{name[1]}</octave></pitch><duration>1</duration>"
        f"<accidental>{sign}</accidental></note></measure>"
        for number, (_, name, sign) in enumerate(notes, start=1)
    ]
    return in_score(bars).encode()


def cents_above_first(data: bytes, options: ReadOptions | None = None) -> list[float]:
    notes = [item for item in read_sheet(data, "tones", NAMES, options).items if isinstance(item, Note)]
    return [note.pitch_cents - notes[0].pitch_cents for note in notes]


def test_no_tone_can_lie_farther_off_than_the_fifths_allow() -> None:
    assert ratios_in_cents()[1] == pytest.approx(90.225, abs=1e-3)  # 256/243, the bakiye
    assert 0.8 < TOLERANCE_CENTS < 0.83


def test_each_tone_of_the_scale_is_met_by_a_note_of_note_text() -> None:
    assert cents_above_first(as_text(TONES)) == pytest.approx(ratios_in_cents(), abs=TOLERANCE_CENTS)


def test_each_tone_of_the_scale_is_met_by_a_note_of_a_score_in_aeu() -> None:
    read = cents_above_first(as_score(TONES))
    assert read == pytest.approx(ratios_in_cents(), abs=TOLERANCE_CENTS)


def test_each_tone_of_the_scale_has_a_perde() -> None:
    cents = [NAMES.system.units_to_cents(-40) + above for above in ratios_in_cents()]
    found = [NAMES.at(round(NAMES.system.cents_to_units(one))) for one in cents]
    assert len({perde.name for perde in found if perde}) == 25
    by_name = " ".join(perde.name.replace(" ", "-") for perde in found if perde).encode()
    assert cents_above_first(by_name) == pytest.approx(ratios_in_cents(), abs=TOLERANCE_CENTS)


@pytest.mark.parametrize(("tone", "written"), MUCENNEB.items(), ids=map(str, MUCENNEB))
def test_the_great_mucenneb_meets_its_tone_from_the_other_side(tone: int, written: tuple[str, str]) -> None:
    score = as_score([TONES[0], ("", *written)])
    assert cents_above_first(score)[1] == pytest.approx(ratios_in_cents()[tone], abs=TOLERANCE_CENTS)


def test_read_from_piano_keys_the_same_score_misses_the_scale() -> None:
    # so the tests above can fail: in 12 equal steps the signs would be up to 45 cents off
    read = cents_above_first(as_score(TONES), ReadOptions(notation=Notation.LITERAL))
    off = [abs(one - tone) for one, tone in zip(read, ratios_in_cents(), strict=True)]
    assert max(off) > 20
