"""The parts that an answer is made of, as data: modes, pitches, places, steps, spans of notes."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from melodycoach.core.offmode import off_mode_words
from melodycoach.core.ranking import step_pitches
from melodycoach.core.span import heard_instead
from melodycoach.core.step_words import step_label
from melodycoach.core.verdict import verdict
from melodycoach.report.words import listed, percent

if TYPE_CHECKING:
    from melodycoach.core.check import Checked, Steps, Stretch
    from melodycoach.core.course import Course, Trait
    from melodycoach.core.mode import Mode
    from melodycoach.core.offmode import OffMode
    from melodycoach.core.span import Span


def mode_data(mode: Mode) -> dict[str, Any]:
    """Name a mode."""
    return {"mode": mode.id, "name": mode.name}


def pitch_data(checked: Checked, height: int) -> dict[str, Any]:
    """Name the pitch that lies so many units above A4."""
    names = checked.model.pack.names
    written = str(names.spell(names.system.units_to_cents(height)))
    return {"name": names.name_at(height), "written": written, "height": int(height)}


def place_data(checked: Checked, number: int) -> dict[str, Any]:
    """Say where a note stands."""
    place = checked.sheet.places[number - 1]
    return {"bar": place.bar, "beat": round(place.beat, 3), "at": place.at}


def rounded(probability: float) -> float:
    """Give a probability to four places."""
    return round(float(probability), 4)


def off_data(checked: Checked, judged: tuple[Mode, OffMode] | None) -> dict[str, Any] | None:
    """Say what is wrong with a note and what would mend it; None where nothing is wrong."""
    if judged is None:
        return None
    mode, off = judged
    names = checked.model.pack.names
    says, mend = off_mode_words(off, mode, names)
    return {
        "says": says,
        "mode": mode.id,
        "mend": mend,
        "mend_written": str(names.spell(off.mend_cents)),
        "mend_height": round(names.system.cents_to_units(off.mend_cents)),
    }


def span_data(checked: Checked, one: Span) -> dict[str, Any]:
    """Say what some notes say by themselves, and whether that fits the mode they should be in."""
    model, lean = checked.model, one.leaning
    best = model.mode_of(lean.best)
    stretch = checked.stretch_at(one.first)
    judge = checked.view.mode if checked.target is not None else stretch.mode
    off = [number for number in range(one.first, one.last + 1) if checked.off[number - 1] is not None]
    return {
        "first": one.first,
        "last": one.last,
        "place": place_data(checked, one.first),
        "verdict": verdict(model, lean, one.n_notes),
        "decided": lean.decided,
        **mode_data(best),
        "probability": rounded(lean.p_best),
        "stretch_mode": stretch.mode.name,
        "fits": not off and heard_instead(model, one, judge) is None,
        "off_notes": off,
    }


def steps_data(checked: Checked, steps: Steps) -> dict[str, Any]:
    """List the steps that were heard, in the order of the line, and those owed, the best first."""
    track, mode = steps.track, steps.track.mode
    index_by_id = {step.id: index for index, step in enumerate(mode.steps)}
    gains = {owed.step.id: owed.gain_nats for owed in steps.owed}
    owed = [one.step.id for one in steps.owed] or [step.id for step in track.owed]
    heard = sorted((at, step_id) for step_id, at in track.heard.items())
    rows = {
        step_id: _step(checked, steps, index, gains.get(step_id, 0.0))
        for step_id, index in index_by_id.items()
    }
    return {"heard": [rows[step_id] for _, step_id in heard], "owed": [rows[step_id] for step_id in owed]}


def _step(checked: Checked, steps: Steps, index: int, gain_nats: float) -> dict[str, Any]:
    track, names = steps.track, checked.model.pack.names
    step, octaves, at = track.mode.steps[index], track.heard_octave[index], track.heard_at[index]
    number = None if at is None else at + steps.first - 1
    pitches = step_pitches(step, track.final_units, names.system, octaves)
    final_units = track.final_units + octaves * names.system.divisions
    return {
        "id": step.id,
        "kind": step.kind.value,
        "need": step.need.value,
        "says": step_label(step, track.mode, names, final_units),
        "notes": [pitch_data(checked, round(names.system.cents_to_units(cents))) for cents in pitches],
        "heard_at": number,
        "place": None if number is None else place_data(checked, number),
        "gain_nats": round(gain_nats, 3),
    }


def course_data(checked: Checked, mode: Mode, course: Course | None) -> dict[str, Any] | None:
    """Say how a course agrees with that of a mode; None where there are no notes."""
    if course is None:
        return None
    return {
        **mode_data(mode),
        "opening": _trait(course.opening),
        "register": _trait(course.register),
        "cadence": _trait(course.cadence),
        "phrase_ends": [
            {
                "note": end.number,
                "place": place_data(checked, end.number),
                "pitch": pitch_data(checked, end.height),
                "function": end.function,
            }
            for end in course.phrase_ends
        ],
    }


def _trait(trait: Trait) -> dict[str, Any]:
    return {"agrees": trait.agrees, "says": trait.says}


def change_data(checked: Checked, before: Stretch, after: Stretch) -> dict[str, Any]:
    """Say how the mode changes between two stretches.

    The change is clear where the notes after it name their mode alone, and where they leave open only
    which member of another family it is.
    """
    model, lean = checked.model, after.span.leaning
    decided = names_alone(checked, after)
    among = [model.modes[index] for index in lean.among]
    other = len(among) > 1 and lean.family == after.mode.family != before.mode.family
    family = lean.family if other and not decided else ""
    probability = rounded(after.probability)
    if decided:
        says = f"turns from {before.mode.name} to {after.mode.name}, {percent(probability)}"
    elif family:
        open_between = listed([mode.name for mode in among])
        says = f"turns from {before.mode.name} to the {family}: undecided between {open_between}"
    else:
        told = verdict(model, lean, after.span.n_notes)
        says = f"may turn from {before.mode.name} to {after.mode.name}, {percent(probability)} ({told})"
    return {
        "note": after.span.first,
        "place": place_data(checked, after.span.first),
        "from": before.mode.name,
        "to": after.mode.name,
        "probability": probability,
        "decided": decided,
        "family": family,
        "among": [mode.id for mode in among],
        "noticed_at": after.noticed_at,
        "says": says,
    }


def names_alone(checked: Checked, one: Stretch) -> bool:
    """Tell whether the notes of a stretch name its mode alone."""
    lean = one.span.leaning
    return lean.decided and checked.model.mode_of(lean.best).id == one.mode.id
