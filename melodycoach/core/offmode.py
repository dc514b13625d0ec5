"""Notes that break the mode, and the pitch that would mend them.

A note is off the mode when it stands for no degree of it: not the rising and not the falling form,
neither the extensions nor the passing colours. Going up on a degree of the falling form is no
fault, and neither is a colour; `melodycoach.core.function.function_of` tells them apart.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from melodycoach.core.function import find_degree, nearest_degree

if TYPE_CHECKING:
    from melodycoach.core.mode import Mode
    from melodycoach.core.note import Heard
    from melodycoach.core.pitch import PitchNames, ToneSystem


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
    """

    pitch_cents: float
    mend_degree: int
    mend_cents: float
    off_units: float


def off_mode(mode: Mode, final_units: int, heard: Heard, system: ToneSystem) -> OffMode | None:
    """Tell whether a note is off the mode, and which degree would mend it.

    Parameters
    ----------
    mode, final_units
        The mode and where it stands, in units from A4.
    heard
        The note. A key of a plain keyboard is off only if no degree of the mode lies on that key.
    system
        The tone system of the pack.

    Returns
    -------
    OffMode or None
        None when the note belongs to the mode.
    """
    if find_degree(mode, final_units, heard.pitch_cents, heard.kind, system) is not None:
        return None
    units = system.cents_to_units(heard.pitch_cents) - final_units
    mend = nearest_degree(mode, units, system.divisions)
    return OffMode(heard.pitch_cents, mend, system.units_to_cents(final_units + mend), units - mend)


def off_mode_words(off: OffMode, mode: Mode, names: PitchNames) -> tuple[str, str]:
    """Say in a few words what is wrong with a note, and name the pitch that would mend it.

    Returns
    -------
    tuple of two str
        Such as ``("not in Hüseynî, 4 commas above hüseynî", "hüseynî")``.
    """
    mend = names.name(off.mend_cents)
    size = f"{abs(off.off_units):.1f}".removesuffix(".0")
    unit = names.system.unit_name + ("" if size == "1" else "s")
    side = "above" if off.off_units > 0 else "below"
    return f"not in {mode.name}, {size} {unit} {side} {mend}", mend
