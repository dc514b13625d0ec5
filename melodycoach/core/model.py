"""A scoring model: which hypotheses compete, and the tables that score a note under each.

Conventions
-----------
A *hypothesis* is a mode on a final. Hypotheses are numbered so that all modes come in the same
order for each final: hypothesis ``h`` is of mode ``h % n_modes``. With `PitchReading.WRITTEN` and
`PitchReading.FINAL` there is one for each mode; with `PitchReading.ANY` each mode stands on every
folded unit, and there is no register. ``final_units`` counts from A4; what is heard is compared
with ``final_units + final_shift``, the shift being the part of a given final that is no whole unit.

A *share* says how much of a heard pitch belongs to a unit. A pitch of known intonation is one
unit; a key of a twelve-key keyboard is all the units that round to it, and one on the border of
two keys belongs to both in proportion.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np

from melodycoach.core.arrays import sealed
from melodycoach.core.event import PitchReading
from melodycoach.core.ngram import Counts, NgramTable, build_table, snap_to_scale
from melodycoach.core.note import InputKind
from melodycoach.core.parameters import ScoringParameters
from melodycoach.core.pitch import KEY_CENTS
from melodycoach.core.theory import (
    FoldedScale,
    circular_blur,
    compass,
    fold_scale,
    folded_distributions,
    register_distribution,
)

if TYPE_CHECKING:
    from collections.abc import Sequence

    from melodycoach.core.arrays import FloatArray, IntArray
    from melodycoach.core.mode import Mode, ModePack
    from melodycoach.core.sounding import Sounding


@dataclass(frozen=True, eq=False, slots=True)
class HearingTables:
    """What one kind of input is scored with.

    Parameters
    ----------
    theory : float64, shape (n_modes, 2, divisions)
        From the definitions: moving and resting.
    grams
        Theory interpolated with counts, or None when there are no counts.
    register : float64, shape (n_modes, units of the compass)
        None with `PitchReading.ANY`.
    register_power
        Power of the register factor.
    closing : float64, shape (n_modes, divisions)
        How likely the last notes of a phrase that ends the melody are.
    bell : float64, shape (odd,)
        How a heard unit is spread over its neighbours, itself in the middle; sums to 1.
    """

    theory: FloatArray
    grams: NgramTable | None
    closing: FloatArray
    register: FloatArray | None
    register_power: float
    bell: FloatArray


@dataclass(frozen=True, eq=False)
class ScoringModel:
    """Hypotheses and tables; nothing in it changes but the memory of what was already worked out.

    Parameters
    ----------
    pack, modes, reading, parameters
        As given to `build_model`.
    order
        Longest n-gram used; 1 without counts.
    mode_index : int64, shape (n_hypotheses,)
    final_units : int64, shape (n_hypotheses,)
        From A4.
    final_shift
        In units; see the module's conventions.
    log_prior : float64, shape (n_hypotheses,), nats
        The same for all finals of a mode.
    soundings
        The memory of `melodycoach.core.sounding`.
    """

    pack: ModePack
    modes: tuple[Mode, ...]
    reading: PitchReading
    parameters: ScoringParameters
    order: int
    mode_index: IntArray
    final_units: IntArray
    final_shift: float
    log_prior: FloatArray
    _scales: tuple[FoldedScale, ...]
    _counts: Counts
    _tables: dict[InputKind, HearingTables] = field(default_factory=dict)
    soundings: dict[tuple[int, InputKind, bool], Sounding] = field(default_factory=dict, repr=False)

    @property
    def n_modes(self) -> int:
        """How many modes compete."""
        return len(self.modes)

    @cached_property
    def home_middle(self) -> FloatArray:
        """The middle of each mode's home, in units above its final, shape (n_modes,).

        Home is the octave over the final, and the opening region.
        """
        size = self.pack.system.divisions
        homes = [(min(0, mode.opening[0]), max(size, mode.opening[1])) for mode in self.modes]
        return sealed(np.array([(low + high) / 2 for low, high in homes]))

    def mode_of(self, hypothesis: int) -> Mode:
        """Give the mode of a hypothesis."""
        return self.modes[int(self.mode_index[hypothesis])]

    def tables(self, kind: InputKind) -> HearingTables:
        """Give the tables for a kind of input; they are built the first time."""
        known = self._tables.get(kind)
        if known is None:
            known = self._tables[kind] = _build_tables(self, kind)
        return known

    def shares(self, pitch_cents: float, kind: InputKind) -> tuple[IntArray, FloatArray]:
        """Give the units (from A4, the shift taken out) that a heard pitch stands for, and how far.

        Returns
        -------
        int64 and float64, shape (n_units,)
            Each share is in (0, 1].
        """
        system = self.pack.system
        units = system.cents_to_units(pitch_cents) - self.final_shift
        if kind is not InputKind.KEYS:
            return np.array([round(units)], dtype=np.int64), np.ones(1)
        half = KEY_CENTS / 2 / system.unit_cents
        near = np.arange(int(np.floor(units - half)), int(np.ceil(units + half)) + 1)
        share = np.clip(half + 0.5 - abs(near - units), 0.0, 1.0)
        return near[share > 0], share[share > 0]


def build_model(
    pack: ModePack,
    modes: Sequence[Mode],
    reading: PitchReading = PitchReading.WRITTEN,
    final_cents: float | None = None,
    parameters: ScoringParameters | None = None,
    counts: Counts | None = None,
    order: int | None = None,
) -> ScoringModel:
    """Build the model that scores a line against some modes of a pack.

    Parameters
    ----------
    pack, modes
        The modes that compete, and the pack that they are from.
    reading, final_cents
        What is known of the final; ``final_cents`` goes with `PitchReading.FINAL` alone.
    parameters
        The constants; None: the defaults.
    counts
        What was counted in melodies; None: theory alone.
    order
        Longest n-gram to use; None: as long as the counts have.

    Raises
    ------
    ValueError
        No modes, a final that does not go with the reading, an order below 1.
    """
    parameters = parameters or ScoringParameters()
    known = {} if counts is None else counts.by_mode
    counts = Counts({mode.id: known[mode.id] for mode in modes if mode.id in known})
    if not modes:
        raise ValueError("no modes, expected at least one")
    if (reading is PitchReading.FINAL) != (final_cents is not None):
        raise ValueError(f"final_cents {final_cents!r} does not go with the reading {str(reading)!r}")
    if order is not None and order < 1:
        raise ValueError(f"order {order!r}, expected 1 or more")
    system = pack.system
    shift = 0.0
    if final_cents is not None:
        exact = system.cents_to_units(final_cents)
        finals = np.full((1, len(modes)), round(exact), dtype=np.int64)
        shift = exact - round(exact)
    elif reading is PitchReading.ANY:
        finals = np.repeat(np.arange(system.divisions, dtype=np.int64)[:, None], len(modes), axis=1)
    else:
        finals = np.array([[mode.final_units for mode in modes]], dtype=np.int64)
    mode_index = np.broadcast_to(np.arange(len(modes)), finals.shape).reshape(-1).copy()
    weight = np.array([parameters.prior_by_repertoire[mode.repertoire] for mode in modes])
    log_prior = np.log(np.broadcast_to(weight / weight.sum() / len(finals), finals.shape)).reshape(-1)
    final_units = finals.reshape(-1)
    return ScoringModel(
        pack,
        tuple(modes),
        reading,
        parameters,
        min(order or counts.order, counts.order),
        sealed(mode_index),
        sealed(final_units),
        shift,
        sealed(log_prior),
        tuple(fold_scale(mode, parameters, system) for mode in modes),
        counts,
    )


def hypothesis_of(model: ScoringModel, mode: Mode, final_units: int) -> int:
    """Give the hypothesis of a mode that competes and stands on a final, in whatever octave.

    Raises
    ------
    ValueError
        There is none.
    """
    divisions = model.pack.system.divisions
    for hypothesis, (index, final) in enumerate(zip(model.mode_index, model.final_units, strict=True)):
        if model.modes[index].id == mode.id and (final - final_units) % divisions == 0:
            return hypothesis
    raise ValueError(f"{mode.id!r} does not compete on {final_units!r}")


def _build_tables(model: ScoringModel, kind: InputKind) -> HearingTables:
    parameters, system = model.parameters, model.pack.system
    hearing = parameters.hearing[kind]
    theory = np.stack([folded_distributions(scale, hearing, system) for scale in model._scales])
    counted = [model._counts.by_mode.get(mode.id) for mode in model.modes]
    grams = None
    if any(counts is not None for counts in counted):
        near = parameters.same_degree_cents / system.unit_cents
        grams = build_table(
            list(theory),
            counted,
            [snap_to_scale(scale, near, system.divisions) for scale in model._scales],
            parameters.prior_mass,
            parameters.counts_blur_cents / system.unit_cents,
            model.order,
        )
    register = None
    if model.reading is not PitchReading.ANY:
        rows = [register_distribution(mode, hearing, parameters, system) for mode in model.modes]
        register = sealed(np.stack(rows))
    sigma = hearing.blur_cents / system.unit_cents
    reach = int(np.ceil(3 * sigma))
    bell = np.exp(-0.5 * (np.arange(-reach, reach + 1) / sigma) ** 2)
    bell /= bell.sum()
    noise = parameters.closing_noise
    near_final = circular_blur(np.zeros(1), sigma, system.divisions)[0]
    near_final = (1 - noise) * near_final + noise / system.divisions
    closing = parameters.closing_final * near_final + (1 - parameters.closing_final) * theory[:, 1]
    return HearingTables(
        sealed(theory), grams, sealed(closing), register, hearing.register_power, sealed(bell)
    )


def register_columns(model: ScoringModel, units: IntArray) -> IntArray:
    """Give the register column of units above each hypothesis's final.

    Parameters
    ----------
    units : int64, shape (n_units,)
        From A4.

    Returns
    -------
    int64, shape (n_units, n_hypotheses)
    """
    lowest, highest = compass(model.pack.system)
    above = units[:, None] - model.final_units[None, :]
    return np.asarray(np.clip(above, lowest, highest) - lowest, dtype=np.int64)
