"""Modes as data for programs: what ``modes --json`` prints.

Conventions
-----------
A *place* is a degree with its names: ``degree`` in units above the final, ``name`` (a perde, where
the pack has one), ``written``. ``words`` holds English terms, each with the trade's word for it,
where the pack has one. Everything here is made of ``str``, ``int``, ``float``, ``list``, ``dict``
and None.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from melodycoach.core.step_words import step_label

if TYPE_CHECKING:
    from collections.abc import Iterable

    from melodycoach.core.mode import CharacteristicStep, Mode, ModePack


def place(pack: ModePack, mode: Mode, degree: int) -> dict[str, Any]:
    """Name a degree of a mode where the mode's written final puts it."""
    cents = pack.system.units_to_cents(mode.final_units + degree)
    return {"degree": degree, "name": pack.names.name(cents), "written": str(pack.names.spell(cents))}


def roles(mode: Mode, degree: int) -> list[str]:
    """Say what a degree does in a mode, the most telling thing first; empty for a plain degree."""
    found = []
    if degree == 0:
        found.append("final")
    if degree in mode.dominants:
        order = mode.dominants.index(degree)
        found.append("dominant" if order == 0 else f"{_ordinal(order + 1)} dominant")
    if degree in mode.leading:
        found.append("leading tone")
    if degree in mode.suspended:
        found.append("suspended cadence")
    if mode.rising != mode.falling:
        if degree in mode.rising and degree not in mode.falling:
            found.append("rising")
        if degree in mode.falling and degree not in mode.rising:
            found.append("falling")
    if degree in mode.passing:
        found.append("passing")
    if degree in mode.above:
        return found or ["above the octave"]
    if degree in mode.below:
        return found or ["below the final"]
    return found


def _ordinal(number: int) -> str:
    return {2: "second", 3: "third"}.get(number, f"{number}th")


def modes_json(pack: ModePack) -> dict[str, Any]:
    """List the modes of a pack, each with what tells it apart at a glance."""
    return {
        "pack": pack.id,
        "name": pack.name,
        "divisions": pack.system.divisions,
        "theory": pack.theory,
        "caution": pack.caution,
        "words": dict(pack.names.words),
        "modes": [
            {
                "id": mode.id,
                "name": mode.name,
                "also": list(mode.also),
                "family": mode.family,
                "final": place(pack, mode, 0),
                "course": mode.course.value,
                "dominants": _places(pack, mode, mode.dominants),
                "confidence": mode.confidence.value,
                "repertoire": mode.repertoire.value,
            }
            for mode in pack.modes
        ],
    }


def mode_json(pack: ModePack, mode: Mode) -> dict[str, Any]:
    """Give everything that a pack says of one mode."""
    title_by_id = {source.id: source.title for source in pack.sources}
    name_by_id = {one.id: one.name for one in pack.modes}
    return {
        "id": mode.id,
        "name": mode.name,
        "also": list(mode.also),
        "family": mode.family,
        "theory": pack.theory,
        "caution": pack.caution,
        "confidence": mode.confidence.value,
        "repertoire": mode.repertoire.value,
        "words": dict(pack.names.words),
        "divisions": pack.system.divisions,
        "unit": pack.system.unit_name,
        "final": place(pack, mode, 0),
        "signature": [sign.sign for sign in mode.signature],
        "course": mode.course.value,
        "opening": _places(pack, mode, mode.opening),
        "rising": list(mode.rising),
        "falling": list(mode.falling),
        "degrees": [_degree(pack, mode, degree) for degree in mode.degrees],
        "genera": [
            {"name": genus.name, "on": place(pack, mode, genus.at), "when": genus.when}
            for genus in mode.genera
        ],
        "dominants": _places(pack, mode, mode.dominants),
        "leading": _places(pack, mode, mode.leading),
        "suspended": _places(pack, mode, mode.suspended),
        "steps": [_step(pack, mode, step) for step in mode.steps],
        "neighbours": [
            {"id": one.mode_id, "name": name_by_id[one.mode_id], "difference": one.difference}
            for one in mode.neighbours
        ],
        "sources": {
            fact: [{"id": one, "title": title_by_id[one]} for one in ids]
            for fact, ids in mode.sources.items()
        },
    }


def _degree(pack: ModePack, mode: Mode, degree: int) -> dict[str, Any]:
    unit = pack.system.unit_cents
    played = mode.played_units(degree)
    return {
        **place(pack, mode, degree),
        "cents": round(degree * unit, 1),
        "played": played if played != degree else None,
        "played_cents": round(played * unit, 1),
        "roles": roles(mode, degree),
    }


def _step(pack: ModePack, mode: Mode, step: CharacteristicStep) -> dict[str, Any]:
    return {
        "id": step.id,
        "kind": step.kind.value,
        "need": step.need.value,
        "says": step_label(step, mode, pack.names),
        "notes": _places(pack, mode, step.degrees),
        "note": step.note,
    }


def _places(pack: ModePack, mode: Mode, degrees: Iterable[int]) -> list[dict[str, Any]]:
    return [place(pack, mode, degree) for degree in degrees]
