"""The ladder beside a contour: the degrees of a mode, with what the leading ones do."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from melodycoach.core.function import Function, function_of

if TYPE_CHECKING:
    from melodycoach.core.mode import Mode
    from melodycoach.core.pitch import PitchNames

_FUNCTIONS_NAMED = {Function.FINAL, Function.DOMINANT, Function.LEADING, Function.SUSPENDED}


@dataclass(frozen=True, slots=True)
class Rung:
    """One step of the ladder beside the contour.

    ``height`` is in units from A4. ``function`` is what it does in the mode in view, in the words of
    the trade, or empty. ``role`` is the same for the drawing: ``final``, ``dominant`` or any other
    word; where it is not given, the function is taken for it.
    """

    height: int
    name: str
    function: str = ""
    role: str = ""


def ladder(mode: Mode, final_units: int, names: PitchNames) -> tuple[Rung, ...]:
    """Give the degrees of a mode as rungs, lowest first; passing colours are left out."""
    rungs = []
    for degree in mode.degrees:
        if degree in mode.passing:
            continue
        # what a degree is itself comes before what it is as the octave of another: yegâh in Rast
        own = degree in mode.suspended and degree not in (*mode.dominants, *mode.leading)
        function = Function.SUSPENDED if own else function_of(mode, degree, names.system.divisions)
        leads = degree == 0 or degree in mode.dominants  # their octaves get no guide line
        at_home = leads or degree in (*mode.leading, *mode.suspended)  # nor is their octave the karar
        height = final_units + degree
        rungs.append(
            Rung(
                height=height,
                name=names.name_at(height),
                function=names.word(function.value) if at_home and function in _FUNCTIONS_NAMED else "",
                role=function.value if leads else "degree",
            )
        )
    return tuple(rungs)
