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

ELSEWHERE = 1 / 3
"""A line lies in another octave when that brings more than this share of its notes into the compass
of the mode."""

EDGE_OCTAVES = 1 / 24
"""A note so little outside the compass counts as inside: a quarter tone."""

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
        ``final_units``, unless another octave brings more than `ELSEWHERE` of the notes into the
        compass of the mode; then the final in the octave that brings in most, the nearest such one.
    """
    if not heard:
        return final_units
    size = system.divisions
    low, high = mode.degrees[0] - EDGE_OCTAVES * size, mode.degrees[-1] + EDGE_OCTAVES * size
    above = [system.cents_to_units(note.pitch_cents) - final_units for note in heard]

    def inside(octaves: int) -> int:
        bottom, top = low + octaves * size, high + octaves * size
        return sum(bottom <= units <= top for units in above)

    here = inside(0)
    if here >= (1 - ELSEWHERE) * len(above):
        return final_units
    best = max(_OCTAVES, key=inside)  # the first of several: the nearest
    return final_units + best * size if inside(best) - here > ELSEWHERE * len(above) else final_units


def placed_final(model: ScoringModel, hypothesis: int, heard: Sequence[Heard]) -> int:
    """Give where a hypothesis stands, in units from A4, in the octave that a line is in.

    A hypothesis of `PitchReading.ANY` has a final but no octave. It is put where the pitches on
    which the line rests (all of them, until it rests) lie nearest to its home, which holds the
    final and the opening region and what is between them. Where octaves are alike in that, the
    middle of the opening region comes nearest to the middle note of the line. Any other hypothesis
    stays where it is written.
    """
    final = int(model.final_units[hypothesis])
    if model.reading is not PitchReading.ANY or not heard:
        return final
    mode, size = model.mode_of(hypothesis), model.pack.system.divisions
    above = [model.pack.system.cents_to_units(note.pitch_cents) - final for note in heard]
    rests = [units for units, note in zip(above, heard, strict=True) if note.rests] or above
    low, high = min(0, mode.opening[0]), max(0, mode.opening[1])
    middle = median(above) - sum(mode.opening) / 2

    def away(octaves: int) -> tuple[float, float]:
        bottom, top = low + octaves * size, high + octaves * size
        outside = sum(max(bottom - units, units - top, 0.0) for units in rests)
        return round(outside, 6), abs(middle - octaves * size)

    first, last = (round(edge / size) for edge in (min(above), max(above)))
    return final + size * min(range(first - 2, last + 2), key=away)
