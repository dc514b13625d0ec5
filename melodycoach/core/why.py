"""Why the line leans as it does, in a musician's words: the note first, the number after.

`reasons` words what `melodycoach.core.evidence` has worked out: what each note does in the two
modes that are compared ("the güçlü of one, not in the other"), where the line opened and lies, and
what it ended on.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from melodycoach.core.evidence import (
    Balance,
    DegreeKey,
    Evidence,
    Factor,
    balance,
    evidence_of_balance,
)
from melodycoach.core.function import Function, function_of

if TYPE_CHECKING:
    from collections.abc import Sequence

    from melodycoach.core.mode import Mode
    from melodycoach.core.model import ScoringModel
    from melodycoach.core.note import Heard
    from melodycoach.core.scorer import ScorerState

LEAST_NATS = 0.1
"""Reasons that weigh less are not told."""

_RANK = {
    Function.FINAL: 5,
    Function.DOMINANT: 5,
    Function.SUSPENDED: 4,
    Function.OPENING: 3,
    Function.LEADING: 2,
    Function.DEGREE: 2,
    Function.FALLING: 1,
    Function.PASSING: 1,
    Function.OUTSIDE: 0,
}
"""How much a mode may be expected to use a degree, for what it does."""


@dataclass(frozen=True, slots=True)
class Reason:
    """One reason in words.

    Parameters
    ----------
    text
        Such as ``you rested 3× on hüseynî: the güçlü of Hüseynî, a plain degree of Uşşak``.
    nats
        What it adds to the log-odds of the leading mode against its rival.
    numbers
        The notes that it comes from, counted from 1; at most the newest few.
    """

    text: str
    nats: float
    numbers: tuple[int, ...]


def reasons(
    model: ScoringModel,
    states: Sequence[ScorerState],
    heard: Sequence[Heard],
    a: int,
    b: int,
    count: int = 8,
    earlier: Balance | None = None,
) -> tuple[Reason, ...]:
    """Say what speaks most for hypothesis ``a`` against ``b``, and what most against it.

    Parameters
    ----------
    model, states, heard, a, b, earlier
        As for `melodycoach.core.evidence.balance`.
    count
        At most so many reasons in all. At least a quarter of them is kept for those against, if
        there are any.

    Returns
    -------
    tuple of Reason
        Those for ``a``, the strongest first, then those for ``b``, the strongest first.
    """
    return reasons_of_balance(balance(model, states, heard, a, b, earlier), heard, count)


def reasons_of_balance(weighed: Balance, heard: Sequence[Heard], count: int = 8) -> tuple[Reason, ...]:
    """Give what `reasons` does, from a balance of the whole line."""
    told = [one for one in evidence_of_balance(weighed, heard) if abs(one.nats) >= LEAST_NATS]
    pro = [one for one in told if one.nats > 0]
    contra = [one for one in told if one.nats < 0]
    kept = min(len(contra), max(count // 4, count - len(pro)))
    shown = [*pro[: count - kept], *contra[:kept]]
    words = _Words(weighed.model, weighed.a, weighed.b, weighed.finals)
    return tuple(Reason(words.say(one), one.nats, one.numbers) for one in shown)


def opening_place(mode: Mode, final_units: int, model: ScoringModel) -> str:
    """Say where a mode opens: round its first dominant, if that lies there, or between two pitches.

    Returns
    -------
    str
        Such as ``round muhayyer, an octave above its final`` or ``between rast and nevâ``.
    """
    names, system = model.pack.names, model.pack.system

    def name(degree: int) -> str:
        return names.name_at(final_units + degree)

    low, high = mode.opening
    inner = mode.dominants[0] if mode.dominants else None
    if inner is None or not low < inner < high:
        return f"between {name(low)} and {name(high)}"
    octave = ", an octave above its final" if inner == system.divisions else ""
    return f"round {name(inner)}{octave}"


class _Words:
    """Words for the evidence between two hypotheses."""

    def __init__(self, model: ScoringModel, a: int, b: int, finals: tuple[int, int]) -> None:
        self.model = model
        self.a, self.b = (model.mode_of(h) for h in (a, b))
        self.final_a, self.final_b = finals
        self.size = model.pack.system.divisions
        self.trade_word = model.pack.names.word

    def say(self, one: Evidence) -> str:
        """Give the sentence for one item, without its number."""
        match one.factor:
            case Factor.DEGREE:
                assert one.degree is not None
                name = self._name(one.degree.units)
                times = f" {one.n_notes}×" if one.n_notes > 1 else ""
                if one.degree.rests:
                    return f"you rested{times} on {name}: {self._functions(one.degree, one.nats)}"
                return f"you passed{times} through {name}: {self._functions(one.degree, one.nats)}"
            case Factor.REGISTER:
                return self._register(one)
            case Factor.OPENING:
                assert one.degree is not None
                name = self._name(one.degree.units)
                (at_home, _), (away, final) = self._favoured_first(one.nats)
                place = opening_place(away, final, self.model)
                return f"you opened on {name}, where {at_home.name} opens; {away.name} opens {place}"
            case Factor.CLOSING:
                assert one.degree is not None
                return self._closing(one.degree, one.nats)
            case Factor.PRIOR:
                return f"{self._favoured_first(one.nats)[0][0].name} is met more often in the repertoire"

    def _name(self, units: int) -> str:
        return self.model.pack.names.name_at(units)

    def _favoured_first(self, nats: float) -> tuple[tuple[Mode, int], tuple[Mode, int]]:
        pair = (self.a, self.final_a), (self.b, self.final_b)
        return pair if nats > 0 else (pair[1], pair[0])

    def _functions(self, key: DegreeKey, nats: float) -> str:
        """Say what a pitch does in both modes, in the favoured one first."""
        first = self.a, key.degree_a
        second = self.b, key.degree_b
        if nats < 0:
            first, second = second, first
        functions = [function_of(mode, degree, self.size) for mode, degree in (first, second)]
        favoured = first[0].name
        if self._same(functions, first, second):
            shared = self._phrase(functions[0], first[1], first[0], "both")
            return f"{shared}, but {favoured} leans on it more"
        phrases = [
            self._phrase(function, degree, mode, mode.name)
            for function, (mode, degree) in zip(functions, (first, second), strict=True)
        ]
        expected = _RANK[functions[0]] >= _RANK[functions[1]]
        return ", ".join(phrases) + ("" if expected else f", yet {favoured} leans on it more")

    def _closing(self, key: DegreeKey, nats: float) -> str:
        """Say what the end of a phrase says: its last note, or the few that lead to it."""
        name = self._name(key.units)
        pair = (self.a, key.degree_a), (self.b, key.degree_b)
        functions = [function_of(mode, degree, self.size) for mode, degree in pair]
        if not self._same(functions, *pair):
            return f"the phrase ended on {name}: {self._functions(key, nats)}"
        shared = self._phrase(functions[0], key.degree_a, self.a, "both")
        favoured = self._favoured_first(nats)[0][0].name
        return f"the phrase ended on {name}, {shared}; the way it got there suits {favoured} more"

    def _same(
        self, functions: list[Function], first: tuple[Mode, int | None], second: tuple[Mode, int | None]
    ) -> bool:
        if functions[0] is not functions[1]:
            return False
        ranks = [_dominant_rank(mode, degree, self.size) for mode, degree in (first, second)]
        return functions[0] is not Function.DOMINANT or ranks[0] == ranks[1]

    def _phrase(self, function: Function, degree: int | None, mode: Mode, name: str) -> str:
        match function:
            case Function.FINAL if degree:
                return f"the octave of the {self.trade_word(function.value)} of {name}"
            case Function.FINAL | Function.LEADING:
                return f"the {self.trade_word(function.value)} of {name}"
            case Function.DOMINANT:
                rank = _dominant_rank(mode, degree, self.size)
                return f"the {'second ' if rank else ''}{self.trade_word(function.value)} of {name}"
            case Function.SUSPENDED:
                return f"a place of {self.trade_word(function.value)} in {name}"
            case Function.FALLING:
                return f"in {name} only going down"
            case Function.PASSING:
                return f"a passing colour in {name}"
            case Function.OPENING:
                return f"a degree of {name} where it opens" if name != "both" else "a degree of both"
            case Function.DEGREE:
                return f"a {'plain ' if name != 'both' else ''}degree of {name}"
            case Function.OUTSIDE:
                return f"not in {name}" if name != "both" else "in neither mode"

    def _register(self, one: Evidence) -> str:
        assert one.register is not None
        notes = "1 note lies" if one.n_notes == 1 else f"{one.n_notes} notes lie"
        if one.register.in_a is one.register.in_b:
            where = "where both live" if one.register.in_a else "outside the regions of both"
            return f"{notes} {where}, at a height that suits {self._favoured_first(one.nats)[0][0].name} more"
        inner, outer = (self.a, self.b) if one.register.in_a else (self.b, self.a)
        final_outer = self.final_b if outer is self.b else self.final_a
        place = opening_place(outer, final_outer, self.model)
        yet = "" if (one.nats > 0) is (inner is self.a) else f", yet at a height that suits {outer.name} more"
        return f"{notes} where {inner.name} lives; {outer.name} lives {place}{yet}"


def _dominant_rank(mode: Mode, degree: int | None, size: int) -> int:
    """Give 0 for the first dominant (in any octave), 1 for any other degree."""
    return int(degree is None or not mode.dominants or (degree - mode.dominants[0]) % size != 0)
