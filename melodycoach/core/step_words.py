"""Characteristic steps in a musician's words, made from their kind and their degrees.

The words of the trade stand beside the English ones: "half cadence on nevâ (güçlü)". Degrees are
named where they sound, so a mode that stands on another final gets the names of that place.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from melodycoach.core.mode import StepKind

if TYPE_CHECKING:
    from collections.abc import Callable
    from typing import TypeAlias

    from melodycoach.core.mode import CharacteristicStep, Mode
    from melodycoach.core.pitch import PitchNames

    _Namer: TypeAlias = Callable[[int], str]

_INTERVALS = (
    (1.0, 2.5, "second"),
    (2.5, 4.5, "third"),
    (4.5, 5.5, "fourth"),
    (6.5, 7.5, "fifth"),
    (7.5, 9.5, "sixth"),
    (9.5, 11.5, "seventh"),
    (11.5, 12.5, "octave"),
)
"""Semitones from, up to and without, and the word for an interval of that size."""

_AUGMENTED_SECOND = (2.3, 3.2)
"""Semitones of a second that is wider than a whole tone: 11 to 14 commas."""

_ALTERED_BY_AT_MOST_CENTS = 120
"""An altered degree lies at most so far from the one that it stands for: 5 commas, a half tone."""


def step_label(
    step: CharacteristicStep, mode: Mode, names: PitchNames, final_units: int | None = None
) -> str:
    """Say what a characteristic step is.

    Parameters
    ----------
    step, mode
        The step, and the mode that it marks.
    names
        Names of the pitches, and the tone system they count in.
    final_units
        Where the mode stands, in units from A4; None: on its written final.

    Returns
    -------
    str
        Such as ``half cadence on nevâ (güçlü)`` or ``leading tone (yeden): ırak before rast``.
    """
    final = mode.final_units if final_units is None else final_units

    def name(degree: int) -> str:
        return names.name_at(final + degree)

    first, last = step.degrees[0], step.degrees[-1]
    match step.kind:
        case StepKind.OPENING:
            return f"opening{names.beside('course')}: {_travel(step, name(first), name(last))}"
        case StepKind.HALF_CADENCE | StepKind.SUSPENDED_CADENCE:
            if _halves(step, mode):
                word, gloss = "half cadence", _dominant_beside(last, mode, names)
            else:
                word, gloss = "suspended cadence", names.beside("suspended cadence")
            return f"{word} on {name(last)}{gloss}{_way(step, mode, name)}"
        case StepKind.LEADING_TONE:
            tone, target = _leading_pair(step)
            return f"leading tone{names.beside('leading tone')}: {name(tone)} before {name(target)}"
        case StepKind.ALTERATION:
            return _alteration(step, mode, names.system.unit_cents, name)
        case StepKind.REGISTER:
            return _register(step, mode, names, name)
        case StepKind.COLOUR_INTERVAL:
            return _interval(step, mode, names.system.unit_cents, name)
        case StepKind.FINAL_CADENCE:
            return f"final cadence on {name(last)}{names.beside('final')}{_way(step, mode, name)}"


def _way(step: CharacteristicStep, mode: Mode, name: _Namer) -> str:
    """Tell a cadence from another one of the mode on the same degree by where it comes from."""
    twins = [s for s in mode.steps if _cadence(s, mode) == _cadence(step, mode)]
    return f", from {name(step.degrees[0])}" if len(twins) > 1 else ""


def _cadence(step: CharacteristicStep, mode: Mode) -> tuple[StepKind, int]:
    kind = StepKind.HALF_CADENCE if _halves(step, mode) else step.kind
    return kind, step.degrees[-1]


def _halves(step: CharacteristicStep, mode: Mode) -> bool:
    """Say whether a step is a half cadence: so is a rest on any dominant, whatever the pack calls it."""
    if step.kind is StepKind.SUSPENDED_CADENCE:
        return step.degrees[-1] in mode.dominants
    return step.kind is StepKind.HALF_CADENCE


def _dominant_beside(degree: int, mode: Mode, names: PitchNames) -> str:
    """Give the trade's word for a dominant, in any octave, and say if it is not the first one."""
    folded = [dominant % names.system.divisions for dominant in mode.dominants]
    at = degree % names.system.divisions
    if at not in folded:
        return ""
    return names.beside("dominant") if at == folded[0] else f" (second {names.word('dominant')})"


def _travel(step: CharacteristicStep, first: str, last: str) -> str:
    if first == last:
        return f"round {last}"
    return f"{first} {'up' if step.degrees[0] < step.degrees[-1] else 'down'} to {last}"


def _leading_pair(step: CharacteristicStep) -> tuple[int, int]:
    """Give the lowest degree that another one follows, and the one that follows it."""
    at = min(range(len(step.degrees) - 1), key=lambda i: step.degrees[i])
    return step.degrees[at], step.degrees[at + 1]


def _alteration(step: CharacteristicStep, mode: Mode, unit_cents: float, name: _Namer) -> str:
    """Name the degree that is altered, and the degree of the rising form that it stands for."""
    way = "going up" if step.degrees[0] < step.degrees[-1] else "going down"
    inner = (*step.degrees[1:-1], step.degrees[0], step.degrees[-1])
    altered = next((d for d in inner if d not in mode.rising), None)
    if altered is None:
        return f"{name(inner[0])} {way}"
    reach = _ALTERED_BY_AT_MOST_CENTS / unit_cents
    close = [d for d in mode.rising if abs(d - altered) <= reach and d not in step.degrees]
    if not close:
        return f"{name(altered)} {way}"
    usual = min(close, key=lambda d: abs(d - altered))
    return f"{name(usual)} gives way to {name(altered)} {way}"


def _register(step: CharacteristicStep, mode: Mode, names: PitchNames, name: _Namer) -> str:
    divisions = names.system.divisions
    low, high = min(step.degrees), max(step.degrees)
    if low < 0 and abs(low) >= high - divisions:
        return f"below the {names.word('final')}: down to {name(low)}"
    if high > divisions:
        return f"above the octave: up to {name(high)}"
    if low >= mode.dominants[0] if mode.dominants else low > divisions // 2:
        return f"the upper region: {name(low)} to {name(high)}"
    return f"register: {name(low)} to {name(high)}"


def _interval(step: CharacteristicStep, mode: Mode, unit_cents: float, name: _Namer) -> str:
    """Name a colour interval: an augmented second, a leap, or a run within an interval."""
    pairs = list(zip(step.degrees, step.degrees[1:], strict=False))
    for low, high in (sorted(pair) for pair in pairs):
        between = [d for d in mode.rising if low < d < high]
        if not between and _AUGMENTED_SECOND[0] <= (high - low) * unit_cents / 100 <= _AUGMENTED_SECOND[1]:
            return f"augmented second {name(low)}–{name(high)}"
    first, last = step.degrees[0], step.degrees[-1]
    if first == last and len(set(step.degrees)) == 2:
        return f"{name(step.degrees[1])} as the neighbour of {name(first)}"
    if len(step.degrees) == 2:
        size = _interval_word(abs(last - first) * unit_cents / 100)
        leaps = any(min(first, last) < d < max(first, last) for d in mode.rising)
        kind = " of a ".join(filter(None, ("leap", size))) if leaps else size or "step"
        return f"{kind} {name(first)}–{name(last)}"
    low, high = min(step.degrees), max(step.degrees)
    size = _interval_word((high - low) * unit_cents / 100)
    return f"{size or 'run'} {name(low)}–{name(high)}, by step"


def _interval_word(semitones: float) -> str:
    for low, high, word in _INTERVALS:
        if low <= semitones < high:
            return word
    return ""
