"""The line and its ladder as the screen shows them: what each note is called, and which are off.

A note is judged by the mode of its own stretch, so a change of mode leaves what was right before it.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, NamedTuple

from melodycoach.core.change import NONE
from melodycoach.core.function import Function, function_of, meant_units
from melodycoach.core.mode import Mode
from melodycoach.core.note import InputKind, Mark, Note
from melodycoach.core.octave import standing_final
from melodycoach.core.offmode import off_mode, off_mode_words
from melodycoach.core.stretch import stretch_of
from melodycoach.screen.view import LineNote, Rung

if TYPE_CHECKING:
    from collections.abc import Sequence

    from melodycoach.core.change import ChangeState
    from melodycoach.core.model import ScoringModel
    from melodycoach.core.note import Heard
    from melodycoach.core.pitch import PitchNames
    from melodycoach.core.scorer import ScorerState
    from melodycoach.core.session import SessionState

NOTES_SHOWN = 300
"""So many of the newest notes are handed to the screen."""

_FUNCTIONS_ON_LADDER = {Function.FINAL, Function.DOMINANT, Function.LEADING, Function.SUSPENDED}

SHORTEST_STRETCH = 8
"""Notes that a change of mode has to last before it counts as one when another follows."""


class Judge(NamedTuple):
    """The mode that notes are judged by: from a note on, counted from 1, until the next judge's."""

    since: int
    mode: Mode
    final_units: int


def judges(
    model: ScoringModel,
    states: Sequence[ScorerState],
    heard: Sequence[Heard],
    in_view: tuple[Mode, int],
    leader: int | None,
) -> tuple[Judge, ...]:
    """Say by which mode each note of a line is off or not, the newest notes first.

    With a target, or while no change of mode was noticed, that is the mode in view for the whole
    line. After a change each stretch is judged by the mode that was announced for it, so what was
    right before the change stays right after it; a stretch of less than `SHORTEST_STRETCH` notes is
    no change but an excursion, judged by the mode before it. The newest stretch is judged by the
    mode in view as long as nothing else is said of it.

    Parameters
    ----------
    model, states, heard
        The scoring model, the state after each number of notes, and the notes.
    in_view
        The mode in view and where it stands, in units from A4.
    leader
        The hypothesis that leads the line as a whole; None where the player aims at a mode.
    """
    change = states[-1].change
    if leader is None or change.seam_at is None:
        return (Judge(1, *in_view),)
    found: list[Judge] = []
    if stretch_of(model, states[-1], leader) is None:
        found.append(Judge(change.seam_at, *in_view))
        change = _before(states, change)
    while change.announced != NONE:
        since = change.seam_at or 1
        is_excursion = since > 1 and bool(found) and found[-1].since - since < SHORTEST_STRETCH
        if not is_excursion:
            final_units = standing_final(model, change.announced, heard)
            found.append(Judge(since, model.mode_of(change.announced), final_units))
        if change.seam_at is None:
            break
        change = _before(states, change)
    return tuple(found)


def _before(states: Sequence[ScorerState], change: ChangeState) -> ChangeState:
    """Give what the change filter held just before the change that it noticed last."""
    assert change.changed_at is not None
    return states[change.changed_at - 1].change


def line_notes(session: SessionState, mode: Mode, final_units: int, leader: int) -> tuple[LineNote, ...]:
    """Give the newest notes, each with the mark after it and with what is wrong with it."""
    names = session.pack.names
    items, heard = session.line.items, session.line.heard
    places = [i for i, item in enumerate(items) if isinstance(item, Note)]
    first = max(len(places) - NOTES_SHOWN, 0)
    led_by = leader if session.target is None else None
    judged_by = judges(session.model, session.line.states, heard, (mode, final_units), led_by)
    known: dict[tuple[float, InputKind, int], _Judgement] = {}
    rows = []
    for number in range(first, len(places)):
        at, note = places[number], heard[number]
        judge = next(one for one in judged_by if one.since <= number + 1)
        until = places[number + 1] if number + 1 < len(places) else len(items)
        marks = [item for item in items[at + 1 : until] if isinstance(item, Mark)]
        key = (note.pitch_cents, note.kind, judge.since)
        if key not in known:
            known[key] = _judged(note, judge, names)
        same = known[key]
        rows.append(
            LineNote(
                number=number + 1,
                height=same.height,
                name=same.name,
                written=same.written,
                length_s=note.length_s,
                rests=note.rests,
                off_mode=same.off_mode,
                mend=same.mend,
                mark=marks[-1].value if marks else "",
                item=at,
                mend_height=same.mend_height,
            )
        )
    return tuple(rows)


class _Judgement(NamedTuple):
    """What notes of one pitch have in common; the words are those of `LineNote`."""

    height: float
    name: str
    written: str
    off_mode: str
    mend: str
    mend_height: float | None


def _judged(note: Heard, judge: Judge, names: PitchNames) -> _Judgement:
    """Give height, name and written name of a note, what is wrong with it, and what mends it."""
    mode, final_units = judge.mode, judge.final_units
    off = off_mode(mode, final_units, note, names.system)
    wrong, mend = off_mode_words(off, mode, names) if off is not None else ("", "")
    height = meant_units(mode, final_units, note.pitch_cents, note.kind, names.system)
    cents = names.system.units_to_cents(height)
    mend_height = float(final_units + off.mend_degree) if off is not None else None
    return _Judgement(round(height, 2), names.name(cents), str(names.spell(cents)), wrong, mend, mend_height)


def ladder(mode: Mode, final_units: int, names: PitchNames) -> tuple[Rung, ...]:
    """Give the degrees of the mode in view as rungs, lowest first."""
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
                function=names.word(function.value) if at_home and function in _FUNCTIONS_ON_LADDER else "",
                role=function.value if leads else "degree",
            )
        )
    return tuple(rungs)
