"""The answer in one sentence, and in which frame it was found: shared by the screen and the reports."""

from __future__ import annotations

from typing import TYPE_CHECKING

from melodycoach.core.event import PitchReading

if TYPE_CHECKING:
    from melodycoach.core.model import ScoringModel
    from melodycoach.core.scorer import Leaning


def verdict(model: ScoringModel, lean: Leaning, n_notes: int) -> str:
    """Say where a stretch of so many notes leans, or between which modes that is open."""
    if n_notes == 0:
        return "nothing heard yet: play or type a note"
    names = [model.modes[index].name for index in lean.among]
    if model.n_modes == 1:
        return f"{names[0]} alone competes: choose more modes to compare it with"
    if lean.decided:
        return f"leaning to {names[0]}, {percent(lean.p_best)}"
    if len(names) == 1:
        return f"undecided; {names[0]} is nearest"
    count = "both" if len(names) == 2 else "all"
    family = f", {count} of the {lean.family}" if lean.family else ""
    return f"undecided between {', '.join(names[:-1])} and {names[-1]}{family}"


def reading_words(model: ScoringModel) -> str:
    """Say what is taken as known of the final."""
    match model.reading:
        case PitchReading.WRITTEN:
            return "written pitch: each mode on its own final"
        case PitchReading.FINAL:
            return f"final given: {model.pack.names.name_at(int(model.final_units[0]))}"
        case PitchReading.ANY:
            return "any pitch: each mode on every final"


def competing_words(model: ScoringModel) -> str:
    """Say which modes compete."""
    if model.n_modes == len(model.pack.modes):
        return f"all {model.n_modes} modes of {model.pack.name}"
    return "only " + ", ".join(mode.name for mode in model.modes)


def percent(probability: float) -> str:
    """Write a probability without promising certainty.

    >>> percent(0.732), percent(0.9999), percent(0.001)
    ('73 %', 'over 99 %', 'under 1 %')
    """
    if probability > 0.99:
        return "over 99 %"
    return "under 1 %" if 0 < probability < 0.01 else f"{100 * probability:.0f} %"
