"""What a pitch says for each hypothesis before anything is known of the line: worked out once a pitch.

Conventions
-----------
A line's *memory* has a place for each unit of twelve octaves, A4 after the sixth; pitches beyond it
count as its ends.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from melodycoach.core.arrays import sealed
from melodycoach.core.model import register_columns
from melodycoach.core.note import InputKind
from melodycoach.core.pitch import key_of
from melodycoach.core.theory import MOVING, RESTING

if TYPE_CHECKING:
    from melodycoach.core.arrays import FloatArray, IntArray
    from melodycoach.core.model import ScoringModel
    from melodycoach.core.note import Heard

MEMORY_OCTAVES, MEMORY_OCTAVES_BELOW = 12, 6
"""Compass of a line's memory: more than MIDI has."""

KNOWN_AT_MOST = 256
"""So many pitches are kept; a line that has more is a recording, whose pitches seldom come twice."""


@dataclass(frozen=True, eq=False, slots=True)
class Sounding:
    """A pitch, moving or resting, before the scoring model.

    Parameters
    ----------
    shares : float64, shape (n_units,)
        How far the pitch stands for each unit near it, each in (0, 1].
    places : list of int, length n_units
        Where these units stand in a line's memory.
    columns : int64, shape (n_units, n_hypotheses)
        Their degrees over the final of each hypothesis, folded to one octave.
    by_theory, log_theory : float64, shape (n_hypotheses,)
        How likely the folded pitch is, and the logarithm.
    by_octave, log_octave : float64, shape (n_hypotheses,), or None
        The same for the pitch in its octave; None where the octave says nothing.
    """

    shares: FloatArray
    places: list[int]
    columns: IntArray
    by_theory: FloatArray
    log_theory: FloatArray
    by_octave: FloatArray | None
    log_octave: FloatArray | None


def sounding_of(model: ScoringModel, heard: Heard) -> Sounding:
    """Give what a note's pitch says; the model remembers it for the next note of that pitch."""
    if heard.kind is InputKind.KEYS:
        at = key_of(heard.pitch_cents)
    else:
        at = round(model.pack.system.cents_to_units(heard.pitch_cents) - model.final_shift)
    place = (at, heard.kind, heard.rests)
    known = model.soundings.get(place)
    if known is None:
        if len(model.soundings) >= KNOWN_AT_MOST:
            model.soundings.clear()
        known = model.soundings[place] = _worked_out(model, heard)
    return known


def _worked_out(model: ScoringModel, heard: Heard) -> Sounding:
    tables, size = model.tables(heard.kind), model.pack.system.divisions
    units, shares = model.shares(heard.pitch_cents, heard.kind)
    columns = (units[:, None] - model.final_units) % size
    role = RESTING if heard.rests else MOVING
    by_theory = shares @ tables.theory[model.mode_index, role, columns]
    by_octave = None
    if tables.register is not None:
        by_octave = shares @ tables.register[model.mode_index, register_columns(model, units)]
    lowest, highest = 0, MEMORY_OCTAVES * size - 1
    return Sounding(
        shares=sealed(shares),
        places=[min(max(int(unit) + MEMORY_OCTAVES_BELOW * size, lowest), highest) for unit in units],
        columns=sealed(columns),
        by_theory=sealed(by_theory),
        log_theory=sealed(np.log(by_theory)),
        by_octave=None if by_octave is None else sealed(by_octave),
        log_octave=None if by_octave is None else sealed(np.log(by_octave)),
    )
