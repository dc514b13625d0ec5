"""What a plain keyboard cannot tell apart.

A key stands for every pitch near it, so two modes that differ by a comma may sound the same keys.
For each pair the divergence of their tables is compared, once over the units of the octave and
once over the twelve keys that these fall on.

Conventions
-----------
The divergence is the symmetrised one of Kullback and Leibler, the sum of (p - q) ln(p / q), in
nats a note, averaged over moving and resting notes.

References
----------
S. Kullback and R. Leibler, "On information and sufficiency" (1951), for the divergence.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from melodycoach.core.function import find_degree
from melodycoach.core.note import InputKind
from melodycoach.core.pitch import A4_CENTS, KEY_CENTS, KEY_NAMES

if TYPE_CHECKING:
    from melodycoach.core.arrays import FloatArray
    from melodycoach.core.model import ScoringModel

KEYS = len(KEY_NAMES)

TUNING_SHARE = 0.7
"""When the keys keep less than this share of the divergence, the difference is mainly tuning."""

TWINS_NATS = 0.15
"""Two modes that are closer over the keys are told apart by what their degrees do, if at all."""

CLOSE_NATS = 0.3
"""Two modes that are further apart over the keys need no tuning to be told apart."""


@dataclass(frozen=True, slots=True)
class Divergence:
    """How far apart two hypotheses are, in nats a note.

    Parameters
    ----------
    fine
        Over the units of the tone system.
    keys
        Over the twelve keys.
    key
        The key (0 is C) that hides most of the difference.
    """

    fine: float
    keys: float
    key: int


def divergence(model: ScoringModel, a: int, b: int) -> Divergence:
    """Measure how far apart two hypotheses are with all units and with twelve keys."""
    system = model.pack.system
    size = system.divisions
    theory = model.tables(InputKind.KEYS).theory
    units = np.arange(size)
    fine = [theory[model.mode_index[h]][:, (units - model.final_units[h]) % size] for h in (a, b)]
    shares = np.zeros((KEYS, size))
    for key in range(KEYS):
        near, share = model.shares(A4_CENTS + KEY_CENTS * (key - 9), InputKind.KEYS)
        np.add.at(shares[key], near % size, share)
    shares /= shares.sum(axis=0)
    coarse = [table @ shares.T for table in fine]
    by_unit = _terms(fine[0], fine[1])
    by_key = _terms(coarse[0], coarse[1])
    key = int((shares @ by_unit - by_key).argmax())
    return Divergence(float(by_unit.sum()), float(by_key.sum()), key)


def _terms(p: FloatArray, q: FloatArray) -> FloatArray:
    """Give what each column adds to the divergence of two pairs of rows."""
    return np.asarray(((p - q) * np.log(p / q)).mean(axis=0), dtype=np.float64)


def keyboard_note(model: ScoringModel, a: int, b: int) -> str:
    """Say what a plain keyboard cannot tell apart between two hypotheses.

    Returns
    -------
    str
        One sentence, or nothing when the keys tell them apart about as well as any tuning would.
    """
    apart = divergence(model, a, b)
    if apart.keys >= CLOSE_NATS or model.pack.system.divisions <= KEYS:
        return ""
    names = [model.mode_of(h).name for h in (a, b)]
    pair = " and ".join(names)
    is_tuning = apart.keys < TUNING_SHARE * apart.fine
    if apart.keys >= TWINS_NATS:
        hidden = _hidden(model, apart.key, a, b)
        return f"{hidden}: a retuned key would tell {pair} apart sooner" if is_tuning else ""
    left = function_difference(model, a, b)
    tail = f"; what is left is {left}" if left else ""
    if is_tuning:
        return f"{_hidden(model, apart.key, a, b)}, so these keys hide what separates {pair}{tail}"
    return f"{pair} use the same keys, and no retuning would tell them apart{tail}"


def _hidden(model: ScoringModel, key: int, a: int, b: int) -> str:
    """Say which pitches of two hypotheses share a key."""
    system, names = model.pack.system, model.pack.names
    cents = A4_CENTS + KEY_CENTS * ((key - 7) % KEYS - 2)  # in the octave over G4
    named: list[str] = []
    for hypothesis in (a, b):
        mode, final = model.mode_of(hypothesis), int(model.final_units[hypothesis])
        degree = find_degree(mode, final, cents, InputKind.KEYS, system)
        named.append(names.name(cents) if degree is None else names.name_at(final + degree))
    name = KEY_NAMES[key]
    if named[0] == named[1]:
        return f"the {name} key hides how {named[0]} is tuned"
    return f"the {name} key is both {named[0]} and {named[1]}"


def function_difference(model: ScoringModel, a: int, b: int) -> str:
    """Name the first thing that separates two modes beside their tuning, or nothing.

    Looked for in this order: the final, the first dominant, the opening region.
    """
    name = model.pack.names.name_at
    modes = [model.mode_of(h) for h in (a, b)]
    finals = [int(model.final_units[h]) for h in (a, b)]

    if finals[0] != finals[1]:
        return f"the final, {name(finals[0])} or {name(finals[1])}"
    dominants = [mode.dominants[0] for mode in modes if mode.dominants]
    if len(dominants) == 2 and dominants[0] != dominants[1]:
        return f"the dominant, {name(finals[0] + dominants[0])} or {name(finals[1] + dominants[1])}"
    if modes[0].opening != modes[1].opening:
        spans = [
            f"{name(final + mode.opening[0])}–{name(final + mode.opening[1])}"
            for mode, final in zip(modes, finals, strict=True)
        ]
        return f"the opening, {spans[0]} or {spans[1]}"
    return ""
