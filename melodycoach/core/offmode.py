"""Notes that break the mode, and the pitch that would mend them.

A note is off the mode when it stands for no degree of it: not the rising and not the falling form,
neither the extensions nor the passing colours; and when the line rests on a passing colour, which is
no longer passing then. Going up on a degree of the falling form is no fault;
`melodycoach.core.function.function_of` tells these apart.

What mends a note is the nearest degree, or one with the letter that is written, where there is one
not much further away: a B that is too low is meant to be a B.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from melodycoach.core.function import degrees_near, find_degree, is_passing
from melodycoach.core.note import InputKind

if TYPE_CHECKING:
    from melodycoach.core.mode import Mode
    from melodycoach.core.note import Heard
    from melodycoach.core.pitch import PitchNames


@dataclass(frozen=True, slots=True)
class OffMode:
    """A note outside the mode.

    Parameters
    ----------
    pitch_cents
        The note, in cents on the MIDI scale.
    mend_degree
        The nearest degree of the mode, in units above the final.
    mend_cents
        Where that degree is written, in cents on the MIDI scale.
    off_units
        How far the note lies above the degree (negative: below), in units.
    rests_on_colour
        It is a passing colour of the mode, and the line rests on it.
    """

    pitch_cents: float
    mend_degree: int
    mend_cents: float
    off_units: float
    rests_on_colour: bool = False


LETTER_REACH_CENTS = 140.0
"""A degree with the letter that is written mends a note that lies within so much of it: six commas."""


def off_mode(mode: Mode, final_units: int, heard: Heard, names: PitchNames) -> OffMode | None:
    """Tell whether a note is off the mode, and which degree would mend it.

    Parameters
    ----------
    mode, final_units
        The mode and where it stands, in units from A4.
    heard
        The note. A key of a plain keyboard is off only if no degree of the mode lies on that key.
    names
        Pitch names and tone system of the pack.

    Returns
    -------
    OffMode or None
        None when the note belongs to the mode.
    """
    system = names.system
    degree = find_degree(mode, final_units, heard.pitch_cents, heard.kind, system)
    rests_on_colour = degree is not None and heard.rests and is_passing(mode, degree, system.divisions)
    if degree is not None and not rests_on_colour:
        return None
    units = system.cents_to_units(heard.pitch_cents) - final_units
    mend = _mend(mode, final_units, heard, names)
    mend_cents = system.units_to_cents(final_units + mend)
    return OffMode(heard.pitch_cents, mend, mend_cents, units - mend, rests_on_colour)


def _mend(mode: Mode, final_units: int, heard: Heard, names: PitchNames) -> int:
    system = names.system
    units = system.cents_to_units(heard.pitch_cents) - final_units
    reach = LETTER_REACH_CENTS / system.unit_cents
    near = degrees_near(mode, units, system.divisions, max(reach, system.divisions))
    near = tuple(degree for degree in near if not is_passing(mode, degree, system.divisions))
    if heard.kind is InputKind.KEYS:
        return near[0]  # a key has no letter
    letter = names.spell(heard.pitch_cents).letter
    return next(
        (
            degree
            for degree in near
            if abs(degree - units) <= reach
            and names.spell(system.units_to_cents(final_units + degree)).letter == letter
        ),
        near[0],
    )


def off_mode_words(off: OffMode, mode: Mode, names: PitchNames) -> tuple[str, str]:
    """Say in a few words what is wrong with a note, and name the pitch that would mend it.

    Returns
    -------
    tuple of two str
        Such as ``("not in Hüseynî, 4 commas above hüseynî", "hüseynî")``.
    """
    mend = names.name(off.mend_cents)
    if off.rests_on_colour:
        return f"only a passing colour in {mode.name}, and the line rests on it", mend
    size = f"{abs(off.off_units):.1f}".removesuffix(".0")
    unit = names.system.unit_name + ("" if size == "1" else "s")
    side = "above" if off.off_units > 0 else "below"
    return f"not in {mode.name}, {size} {unit} {side} {mend}", mend
