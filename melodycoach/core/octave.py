"""In which octave a mode stands for a line: where it is written, or moved with a line that lies elsewhere.

A low instrument or a high voice may play a whole line an octave away from where it is written. Then
the mode stands there too, with all its steps, and a rest on that final is the final cadence. A line
that merely goes high or low leaves the mode where it is: a rest on the octave of the final is no
final cadence.

The answer depends on the line alone, not on the way there, and is one for the whole line.
"""

from __future__ import annotations

from statistics import median
from typing import TYPE_CHECKING

from melodycoach.core.event import PitchReading

if TYPE_CHECKING:
    from collections.abc import Sequence

    from melodycoach.core.mode import Mode
    from melodycoach.core.model import ScoringModel
    from melodycoach.core.note import Heard
    from melodycoach.core.pitch import ToneSystem

ELSEWHERE_OCTAVES = 1 / 3
"""A line lies in another octave when that brings its notes nearer to home by more than this, on
average."""

MIDDLE_SHARE = 1 / 4
"""With any pitch as the final: the weight of the line's middle beside that of where it rests."""

_OCTAVES = (-1, 1, -2, 2, -3, 3)


def standing_final(model: ScoringModel, hypothesis: int, heard: Sequence[Heard]) -> int:
    """Give where a hypothesis stands for a line, in units from A4, its octave included.

    With any pitch as the final that is `placed_final`; else the final as written or given, moved as
    `moved_final` says.
    """
    if model.reading is PitchReading.ANY:
        return placed_final(model, hypothesis, heard)
    final = int(model.final_units[hypothesis])
    return moved_final(model.mode_of(hypothesis), final, heard, model.pack.system)


def moved_final(mode: Mode, final_units: int, heard: Sequence[Heard], system: ToneSystem) -> int:
    """Move a final by octaves if the line as a whole lies in another octave.

    Parameters
    ----------
    mode, final_units
        The mode and where it is written, in units from A4.
    heard
        The whole line.
    system
        The tone system of the pack.

    Returns
    -------
    int
        ``final_units``, unless the notes lie outside the mode's home, and by more than
        `ELSEWHERE_OCTAVES` less in another octave, on average; then the final in the octave in which
        they lie outside least. Home is the octave over the final, and the opening region.
    """
    if not heard:
        return final_units
    size = system.divisions
    low, high = min(0, mode.opening[0]), max(size, mode.opening[1])
    above = [system.cents_to_units(note.pitch_cents) - final_units for note in heard]

    def away(octaves: int) -> float:
        return _outside(above, low + octaves * size, high + octaves * size) / len(above)

    here = away(0)
    if here <= ELSEWHERE_OCTAVES * size:
        return final_units
    best = min(_OCTAVES, key=away)  # the first of several: the nearest
    return final_units + (best * size if here - away(best) > ELSEWHERE_OCTAVES * size else 0)


def placed_final(model: ScoringModel, hypothesis: int, heard: Sequence[Heard]) -> int:
    """Give where a hypothesis stands, in units from A4, in the octave that a line is in.

    A hypothesis of `PitchReading.ANY` has a final but no octave. It is put where two distances are
    smallest together: how far the pitches on which the line rests (all of them, until it rests) lie
    outside its home, on average; and `MIDDLE_SHARE` of how far the middle note of the line lies from
    the middle of the opening region. Home holds the final, the opening region, and what is between
    them. Any other hypothesis stays where it is written.
    """
    final = int(model.final_units[hypothesis])
    if model.reading is not PitchReading.ANY or not heard:
        return final
    mode, size = model.mode_of(hypothesis), model.pack.system.divisions
    above = [model.pack.system.cents_to_units(note.pitch_cents) - final for note in heard]
    rests = [units for units, note in zip(above, heard, strict=True) if note.rests] or above
    low, high = min(0, mode.opening[0]), max(0, mode.opening[1])
    middle = median(above) - sum(mode.opening) / 2

    def away(octaves: int) -> float:
        outside = _outside(rests, low + octaves * size, high + octaves * size) / len(rests)
        return outside + MIDDLE_SHARE * abs(middle - octaves * size)

    first, last = (round(edge / size) for edge in (min(above), max(above)))
    return final + size * min(range(first - 2, last + 2), key=away)


def _outside(places: Sequence[float], low: float, high: float) -> float:
    """Add up how far places lie outside a region."""
    return sum(max(low - place, place - high, 0.0) for place in places)
