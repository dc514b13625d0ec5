"""What carried the evidence between two hypotheses, note by note and grouped.

Conventions
-----------
Evidence is for hypothesis ``a`` against ``b``: positive nats speak for ``a``. It is given with the
temper that is in force now, so that the items of `evidence` add up to the log-odds exactly:

    log_odds(a, b) = temper * (sum over notes of (degree + register) + closing) + prior

A note's *degree* part goes to the group of notes that mean the same degree in both modes and move
or rest alike; its *register* part goes to the group of notes that lie alike in the regions where
the two modes open and mostly live. What the first `OPENING_NOTES` notes say is told as one item
when the two modes open in different places and the line has opened in the place that it favours.

A `Balance` holds the sums without the temper. It goes on from an earlier one, so a long line costs
no more than a short one; that memory never changes an answer.
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from enum import StrEnum
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from melodycoach.core.event import PitchReading
from melodycoach.core.function import find_degree
from melodycoach.core.model import register_columns
from melodycoach.core.note import InputKind
from melodycoach.core.octave import NOWHERE, lie_of, placed_final
from melodycoach.core.pitch import key_of
from melodycoach.core.scorer import closing, note_weight, temper

if TYPE_CHECKING:
    from collections.abc import Sequence

    from melodycoach.core.mode import Mode
    from melodycoach.core.model import ScoringModel
    from melodycoach.core.note import Heard
    from melodycoach.core.scorer import ScorerState

OPENING_NOTES = 4
"""The opening of a line: so many notes."""

OPENING_MARGIN_UNITS = 1
"""A note so little outside the region where a mode opens counts as inside."""

NUMBERS_KEPT = 12
"""An item of evidence names at most so many of its notes, the newest."""


class Factor(StrEnum):
    """What kind of evidence an item is."""

    DEGREE = "degree"
    REGISTER = "register"
    OPENING = "opening"
    CLOSING = "closing"
    PRIOR = "prior"


class DegreeKey(NamedTuple):
    """Notes that mean the same in both modes: degrees of a and of b (None: not in it), rest or not.

    ``units`` says where the notes lie, in units from A4: on the degree of a, else on that of b,
    else where they were heard.
    """

    degree_a: int | None
    degree_b: int | None
    units: int
    rests: bool


class RegisterKey(NamedTuple):
    """Notes that lie inside or outside the opening regions of both modes."""

    in_a: bool
    in_b: bool


@dataclass(frozen=True, slots=True)
class Evidence:
    """One reason for or against a mode.

    Parameters
    ----------
    factor
        What kind of evidence it is.
    nats
        What it adds to the log-odds of a against b.
    n_notes
        How many notes it comes from; 0 for the prior.
    numbers
        The notes, counted from 1: all, or the newest `NUMBERS_KEPT`.
    degree, register
        What the notes have in common; None where the factor has no such thing. An opening has the
        key of its first note and a closing that of the latest one.
    """

    factor: Factor
    nats: float
    n_notes: int
    numbers: tuple[int, ...]
    degree: DegreeKey | None = None
    register: RegisterKey | None = None


class _Sum(NamedTuple):
    nats: float
    n_notes: int
    numbers: tuple[int, ...]


_NOTHING = _Sum(0.0, 0, ())
_Key = DegreeKey | RegisterKey


class _First(NamedTuple):
    """One of the notes that open the line."""

    units: float
    degree: DegreeKey
    register: RegisterKey
    degree_nats: float
    register_nats: float


class _Place(NamedTuple):
    """What a heard pitch means between the two hypotheses, whatever its length."""

    moving: DegreeKey
    resting: DegreeKey
    register: RegisterKey
    register_nats: float


@dataclass(frozen=True, eq=False, slots=True)
class Balance:
    """Untempered evidence of the notes so far, for one hypothesis against another.

    ``finals`` says where the two stand, in units from A4: see `placed_final`.
    """

    model: ScoringModel
    a: int
    b: int
    finals: tuple[int, int]
    state: ScorerState
    sums: dict[_Key, _Sum]
    first: tuple[_First, ...]
    before: Balance | None = field(repr=False)
    _places: dict[tuple[int, InputKind], _Place] = field(repr=False)


def balance(
    model: ScoringModel,
    states: Sequence[ScorerState],
    heard: Sequence[Heard],
    a: int,
    b: int,
    earlier: Balance | None = None,
) -> Balance:
    """Add up what the notes of a line say for hypothesis ``a`` against ``b``.

    Parameters
    ----------
    model
        The scoring model.
    states
        ``states[k]`` is the scorer's state after k notes, as `advance` gave it.
    heard
        The notes; one less than there are states.
    a, b
        Two hypotheses.
    earlier
        A balance made before. Where it is of the same two and of a beginning of the same line, or of
        one that differs in its last note alone, only the new notes are looked at.
    """
    known = earlier if earlier is not None and (earlier.a, earlier.b) == (a, b) else None
    if known is not None and known.model is not model:
        known = None
    lie = lie_of(heard) if model.reading is PitchReading.ANY else NOWHERE
    finals = placed_final(model, a, lie), placed_final(model, b, lie)
    while known is not None and not (known.finals == finals and _is_beginning(known, states)):
        known = known.before
    if known is None or not known.state.n_notes:
        known = Balance(model, a, b, finals, states[0], {}, (), None, {})
    if known.state.n_notes == len(heard):
        return known
    if len(heard) - known.state.n_notes > 1:
        known = _extended(known, states, heard, len(heard) - 1)
    return _extended(known, states, heard, len(heard))


def _is_beginning(known: Balance, states: Sequence[ScorerState]) -> bool:
    return known.state.n_notes < len(states) and states[known.state.n_notes] is known.state


def _extended(known: Balance, states: Sequence[ScorerState], heard: Sequence[Heard], until: int) -> Balance:
    model, a, b = known.model, known.a, known.b
    first = list(known.first)
    nats: dict[_Key, float] = {}
    numbers: dict[_Key, list[int]] = {}

    def add(key: _Key, added: float, number: int) -> None:
        if key not in nats:  # go on from the sum so far: the same additions whatever the way here
            nats[key] = known.sums.get(key, _NOTHING).nats
        nats[key] += added
        numbers.setdefault(key, []).append(number)

    for n in range(known.state.n_notes, until):
        note, old, new = heard[n], states[n].loglik, states[n + 1].loglik
        place = _place(known, note)
        total = float(new[a] - new[b] - old[a] + old[b])
        register_nats = note_weight(model, note) * place.register_nats
        degree = place.resting if note.rests else place.moving
        if n < OPENING_NOTES:
            units = model.pack.system.cents_to_units(note.pitch_cents)
            first.append(_First(units, degree, place.register, total - register_nats, register_nats))
            continue
        add(degree, total - register_nats, n + 1)
        if register_nats:
            add(place.register, register_nats, n + 1)
    sums = dict(known.sums)
    for key, total in nats.items():
        so_far, new_numbers = sums.get(key, _NOTHING), numbers[key]
        kept = (*so_far.numbers, *new_numbers)[-NUMBERS_KEPT:]
        sums[key] = _Sum(total, so_far.n_notes + len(new_numbers), kept)
    before = replace(known, before=None)
    return Balance(model, a, b, known.finals, states[until], sums, tuple(first), before, known._places)


def _place(known: Balance, note: Heard) -> _Place:
    """Say what a pitch means for both hypotheses; each place is worked out once."""
    model, system = known.model, known.model.pack.system
    plain = note.kind is InputKind.KEYS
    units_heard = system.cents_to_units(note.pitch_cents) - model.final_shift
    at = (key_of(note.pitch_cents) if plain else round(units_heard), note.kind)
    if at in known._places:
        return known._places[at]
    if not plain:
        units_heard = at[0]
    cents = note.pitch_cents if plain else system.units_to_cents(units_heard)
    degrees: list[int | None] = []
    inside: list[bool] = []
    for hypothesis, final in zip((known.a, known.b), known.finals, strict=True):
        mode = model.mode_of(hypothesis)
        degrees.append(find_degree(mode, final, cents, note.kind, system))
        inside.append(_in_opening(mode, units_heard - final))
    register_nats = 0.0
    tables = model.tables(note.kind)
    if tables.register is not None:
        units, shares = model.shares(note.pitch_cents, note.kind)
        pair = np.array([known.a, known.b])
        columns = register_columns(model, units)[:, pair]
        likely = shares @ tables.register[model.mode_index[pair], columns]
        register_nats = tables.register_power * float(np.log(likely[0] / likely[1]))
    where = [
        final + degree for final, degree in zip(known.finals, degrees, strict=True) if degree is not None
    ]
    units_named = next(iter(where), round(units_heard))
    keys = [DegreeKey(degrees[0], degrees[1], units_named, rests) for rests in (False, True)]
    place = _Place(keys[0], keys[1], RegisterKey(inside[0], inside[1]), register_nats)
    known._places[at] = place
    return place


def evidence(
    model: ScoringModel,
    states: Sequence[ScorerState],
    heard: Sequence[Heard],
    a: int,
    b: int,
    earlier: Balance | None = None,
) -> tuple[Evidence, ...]:
    """Give every reason for hypothesis ``a`` against ``b``, the strongest first.

    Parameters
    ----------
    model, states, heard, a, b, earlier
        As for `balance`.

    Returns
    -------
    tuple of Evidence
        By falling size of ``nats``, for and against together. They add up to
        ``log_odds(model, states[-1], a, b)``.
    """
    return evidence_of_balance(balance(model, states, heard, a, b, earlier), heard)


def evidence_of_balance(weighed: Balance, heard: Sequence[Heard]) -> tuple[Evidence, ...]:
    """Give what `evidence` does, from a balance of the whole line."""
    model, a, b, state = weighed.model, weighed.a, weighed.b, weighed.state
    power = temper(model, state)
    found: list[Evidence] = []
    sums = dict(weighed.sums)
    opening = _opening(weighed)
    if opening is not None:
        found.append(
            Evidence(
                Factor.OPENING,
                power * opening,
                len(weighed.first),
                tuple(range(1, len(weighed.first) + 1)),
                weighed.first[0].degree,
            )
        )
    else:
        for number, note in enumerate(weighed.first, start=1):
            sums[note.degree] = _earlier(sums.get(note.degree), note.degree_nats, number)
            if note.register_nats:
                sums[note.register] = _earlier(sums.get(note.register), note.register_nats, number)
    for key, total in sums.items():
        if isinstance(key, DegreeKey):
            reason = Evidence(Factor.DEGREE, power * total.nats, total.n_notes, total.numbers, degree=key)
        else:
            reason = Evidence(Factor.REGISTER, power * total.nats, total.n_notes, total.numbers, register=key)
        found.append(reason)
    ended = closing(model, state)
    if ended[a] != ended[b]:
        place = _place(weighed, heard[-1])
        nats = power * float(ended[a] - ended[b])
        found.append(Evidence(Factor.CLOSING, nats, 1, (len(heard),), degree=place.resting))
    prior = float(model.log_prior[a] - model.log_prior[b])
    if prior:
        found.append(Evidence(Factor.PRIOR, prior, 0, ()))
    return tuple(sorted(found, key=lambda reason: -abs(reason.nats)))


def _earlier(total: _Sum | None, nats: float, number: int) -> _Sum:
    """Add a note that stands before those already added."""
    if total is None:
        return _Sum(nats, 1, (number,))
    numbers = tuple(sorted((*total.numbers, number)))[-NUMBERS_KEPT:]
    return _Sum(total.nats + nats, total.n_notes + 1, numbers)


def _opening(weighed: Balance) -> float | None:
    """Give what the opening notes say, where that is for the mode that opens where they lie."""
    if not weighed.first or weighed.model.reading is PitchReading.ANY:
        return None
    lean = opening_lean(weighed.model, weighed.a, weighed.b, [note.units for note in weighed.first])
    nats = sum(note.degree_nats + note.register_nats for note in weighed.first)
    return nats if lean * nats > 0 else None


def opening_lean(model: ScoringModel, a: int, b: int, units: Sequence[float]) -> int:
    """Say whose opening region a line has opened in: 1 for a, -1 for b, 0 for neither or both."""
    middle = float(np.median(units))
    sides = []
    for hypothesis in (a, b):
        above_final = middle - float(model.final_units[hypothesis])
        sides.append(_in_opening(model.mode_of(hypothesis), above_final))
    return int(sides[0]) - int(sides[1])


def _in_opening(mode: Mode, above_final: float) -> bool:
    low, high = mode.opening
    return low - OPENING_MARGIN_UNITS <= above_final <= high + OPENING_MARGIN_UNITS
