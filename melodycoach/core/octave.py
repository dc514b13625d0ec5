"""In which octave a mode stands for a line: where it is written, or moved with a line that lies elsewhere.

A low instrument or a high voice may play a whole line an octave away from where it is written. Then
the mode stands there too, with all its steps, and a rest on that final is the final cadence. A line
that merely goes high or low leaves the mode where it is: a rest on the octave of the final is no
final cadence.

The answer depends on the line alone, not on the way there, and is one for the whole line.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from itertools import chain, repeat
from statistics import median
from typing import TYPE_CHECKING, TypeAlias

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

_Counted: TypeAlias = list[tuple[float, int]]

_OCTAVES = (-1, 1, -2, 2, -3, 3)


@dataclass(frozen=True, slots=True)
class Lie:
    """Where a line lies: each pitch that it has, in cents, with how often it sounds and is rested on."""

    notes: tuple[tuple[float, int], ...]
    rests: tuple[tuple[float, int], ...]


def lie_of(heard: Sequence[Heard]) -> Lie:
    """Count the pitches of a line once, for all the modes that are asked where they stand."""
    notes = Counter(note.pitch_cents for note in heard)
    rests = Counter(note.pitch_cents for note in heard if note.rests)
    return Lie(tuple(notes.items()), tuple(rests.items()))


NOWHERE = Lie((), ())
"""Where a line without notes lies."""


def standing_final(model: ScoringModel, hypothesis: int, lie: Lie) -> int:
    """Give where a hypothesis stands for a line, in units from A4, its octave included.

    With any pitch as the final that is `placed_final`; else the final as written or given, moved as
    `moved_final` says.
    """
    if model.reading is PitchReading.ANY:
        return placed_final(model, hypothesis, lie)
    final = int(model.final_units[hypothesis])
    return moved_final(model.mode_of(hypothesis), final, lie, model.pack.system)


def moved_final(mode: Mode, final_units: int, lie: Lie, system: ToneSystem) -> int:
    """Move a final by octaves if the line as a whole lies in another octave.

    Parameters
    ----------
    mode, final_units
        The mode and where it is written, in units from A4.
    lie
        Where the whole line lies.
    system
        The tone system of the pack.

    Returns
    -------
    int
        ``final_units``, unless the notes lie outside the mode's home, and by more than
        `ELSEWHERE_OCTAVES` less in another octave, on average; then the final in the octave in which
        they lie outside least. Home is the octave over the final, and the opening region.
    """
    if not lie.notes:
        return final_units
    size = system.divisions
    low, high = min(0, mode.opening[0]), max(size, mode.opening[1])
    above = _above(lie.notes, final_units, system)

    def away(octaves: int) -> float:
        return _outside(above, low + octaves * size, high + octaves * size)

    here = away(0)
    if here <= ELSEWHERE_OCTAVES * size:
        return final_units
    best = min(_OCTAVES, key=away)  # the first of several: the nearest
    return final_units + (best * size if here - away(best) > ELSEWHERE_OCTAVES * size else 0)


def placed_final(model: ScoringModel, hypothesis: int, lie: Lie) -> int:
    """Give where a hypothesis stands, in units from A4, in the octave that a line is in.

    A hypothesis of `PitchReading.ANY` has a final but no octave. It is put where two distances are
    smallest together: how far the pitches on which the line rests (all of them, until it rests) lie
    outside its home, on average; and `MIDDLE_SHARE` of how far the middle note of the line lies from
    the middle of the opening region. Home holds the final, the opening region, and what is between
    them. Any other hypothesis stays where it is written.
    """
    final = int(model.final_units[hypothesis])
    if model.reading is not PitchReading.ANY or not lie.notes:
        return final
    mode, system = model.mode_of(hypothesis), model.pack.system
    size = system.divisions
    above = _above(lie.notes, final, system)
    rests = _above(lie.rests, final, system) or above
    low, high = min(0, mode.opening[0]), max(0, mode.opening[1])
    middle = _median(above) - sum(mode.opening) / 2

    def away(octaves: int) -> float:
        outside = _outside(rests, low + octaves * size, high + octaves * size)
        return outside + MIDDLE_SHARE * abs(middle - octaves * size)

    first, last = (round(edge / size) for edge in (min(above)[0], max(above)[0]))
    return final + size * min(range(first - 2, last + 2), key=away)


def _above(pitches: Sequence[tuple[float, int]], final_units: int, system: ToneSystem) -> _Counted:
    """Give how far above a final each pitch lies, in units, and how often it comes."""
    return [(system.cents_to_units(cents) - final_units, count) for cents, count in pitches]


def _outside(places: _Counted, low: float, high: float) -> float:
    """Give how far places lie outside a region, on average."""
    total = sum(count * max(low - at, at - high, 0.0) for at, count in places)
    return total / sum(count for _, count in places)


def _median(places: _Counted) -> float:
    """Give the middle of places that come so often.

    >>> _median([(3.0, 1), (1.0, 2), (2.0, 1)]), _median([(5.0, 1), (1.0, 2)])
    (1.5, 1.0)
    """
    return median(list(chain.from_iterable(repeat(at, count) for at, count in places)))
