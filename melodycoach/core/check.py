"""A written line, checked: in which mode it is, where it turns into another, and what breaks it.

The line is scored once, note by note, as a live one is; everything here is read off that. With a
*target* (the mode that the writer aims at) its notes are judged by the target; without, each by the
mode of its own stretch.

Conventions
-----------
Notes are counted from 1. A *stretch* is what lies between two changes of mode.
"""

from __future__ import annotations

from bisect import bisect_right
from dataclasses import dataclass
from typing import TYPE_CHECKING

from melodycoach.core.course import Course, course_of
from melodycoach.core.judge import InView, in_view, stretch_judges
from melodycoach.core.model import hypothesis_of
from melodycoach.core.note import InputKind
from melodycoach.core.octave import lie_of
from melodycoach.core.offmode import OffMode, off_mode
from melodycoach.core.owed import follow, start_track
from melodycoach.core.plain_keys import keyboard_note
from melodycoach.core.ranking import OwedStep, rank_owed
from melodycoach.core.scorer import leading
from melodycoach.core.session import Line, empty_line, rewrite
from melodycoach.core.span import (
    LEAST_NOTES,
    Span,
    bar_bounds,
    growing_spans,
    heard_instead,
    mode_probability,
    phrase_bounds,
    span,
)
from melodycoach.core.why import Reason, reasons

if TYPE_CHECKING:
    from collections.abc import Sequence

    from melodycoach.core.judge import Judge
    from melodycoach.core.mode import Mode
    from melodycoach.core.model import ScoringModel
    from melodycoach.core.owed import StepTrack
    from melodycoach.core.scorer import Leaning
    from melodycoach.core.sheet import Sheet

REASONS_GIVEN = 10


@dataclass(frozen=True, eq=False, slots=True)
class Steps:
    """The characteristic steps of one mode in a part of the line.

    ``track`` has followed the mode from note ``first`` on; ``owed`` are the steps it owes, the best
    to play next first, colour that is only welcome last.
    """

    track: StepTrack
    first: int
    owed: tuple[OwedStep, ...]


@dataclass(frozen=True, eq=False, slots=True)
class Stretch:
    """Notes in a row that are heard in one mode.

    Parameters
    ----------
    span
        The notes, and where they lean by themselves.
    mode, final_units
        The mode, and where it stands, in units from A4.
    noticed_at
        The note at which a listener notices the change, or None for the first stretch.
    probability
        Of the mode, by what the notes of the stretch say.
    steps
        The characteristic steps of the mode, from the first note of the stretch on.
    course
        The course of the stretch beside that of the mode.
    """

    span: Span
    mode: Mode
    final_units: int
    noticed_at: int | None
    probability: float
    steps: Steps
    course: Course


@dataclass(frozen=True, slots=True)
class Leaving:
    """The first place where a line leaves its mode: a note off it, or a turn to another mode.

    ``off`` is the note that lies outside the mode, or None; ``to`` the mode that it turns to, or None.
    """

    number: int
    off: OffMode | None = None
    to: Mode | None = None


@dataclass(frozen=True, eq=False, slots=True)
class Checked:
    """Everything that was found out about one line.

    Parameters
    ----------
    model
        How it was scored.
    sheet
        What was read.
    target
        The mode that it aims at, or None.
    line
        The line with its scores; the lists below are empty where it has no note.
    whole
        Where the line as a whole leans.
    view
        The mode in view: the target, else the leading one, or that of the longest stretch where no
        stretch is in the leading one.
    stretches
        They cover the line.
    off
        For each note the mode that judges it and what is wrong; None where it belongs.
    phrases, bars
        Where each leans by itself; bars with the name that is printed.
    steps, course, reasons
        Those of the mode in view, over the whole line.
    keyboard_note
        What plain keys cannot tell apart, or empty.
    """

    model: ScoringModel
    sheet: Sheet
    target: Mode | None
    line: Line
    whole: Leaning
    view: InView
    stretches: tuple[Stretch, ...]
    off: tuple[tuple[Mode, OffMode] | None, ...]
    phrases: tuple[Span, ...]
    bars: tuple[tuple[str, Span], ...]
    steps: Steps
    course: Course | None
    reasons: tuple[Reason, ...]
    keyboard_note: str

    @property
    def n_notes(self) -> int:
        """How many notes the line has."""
        return len(self.line.heard)

    def stretch_at(self, number: int) -> Stretch:
        """Give the stretch that a note lies in."""
        return self.stretches[bisect_right(self.stretches, number, key=lambda one: one.span.first) - 1]


def check_sheet(model: ScoringModel, sheet: Sheet, target: Mode | None = None) -> Checked:
    """Check the line of a sheet.

    Parameters
    ----------
    model
        The modes that compete, and what is known of the final.
    sheet
        The line, as it was read.
    target
        The mode that it aims at; it need not compete.
    """
    line = rewrite(model, empty_line(model), sheet.items)
    states, heard = line.states, line.heard
    whole = leading(model, states[-1])
    bounds = phrase_bounds(line.items)
    found = _stretches(model, line, whole, bounds)
    shown = target or _mode_of_stretches(model, whole, found)
    view = in_view(model, states[-1], lie_of(heard), shown, whole)
    return Checked(
        model=model,
        sheet=sheet,
        target=target,
        line=line,
        whole=whole,
        view=view,
        stretches=found,
        off=_off(model, line, view if target is not None else None, found),
        phrases=tuple(span(model, heard, first, last) for first, last in bounds),
        bars=tuple((bar, span(model, heard, first, last)) for bar, first, last in bar_bounds(sheet.places)),
        steps=_steps(model, line, view, 1, len(heard)),
        course=course_of(model, heard, view.mode, view.final_units, bounds) if heard else None,
        reasons=_reasons(model, line, view),
        keyboard_note=_keyboard_note(model, line, view),
    )


def leaving(checked: Checked, target: Mode) -> Leaving | None:
    """Say where a line first leaves a mode, or None when it stays.

    It leaves at the first note that lies outside the mode, and where a stretch that has no such note is
    clearly heard in another mode all the same. A line that is undecided, or that is too short to tell,
    stays.

    Parameters
    ----------
    checked
        The line, checked with ``target`` as its target.
    target
        One of the modes that compete.
    """
    if checked.target is not target:
        raise ValueError(f"the line was checked for {checked.target}, not for {target.id!r}")
    found = [Leaving(number, off=one[1]) for number, one in enumerate(checked.off, 1) if one is not None]
    for stretch in checked.stretches:
        is_clean = not any(checked.off[stretch.span.first - 1 : stretch.span.last])
        to = heard_instead(checked.model, stretch.span, target)
        if to is not None and is_clean:
            turned = _turns_at(checked, stretch, target)
            found.append(Leaving(turned, to=checked.model.mode_of(to)))
    return min(found, key=lambda one: one.number, default=None)


def _turns_at(checked: Checked, stretch: Stretch, target: Mode) -> int:
    """Give the note where a stretch turns, or 1 if it never was in the target.

    That is its first note; in the first stretch the one from which on the target never leads again.
    """
    first, last = stretch.span.first, stretch.span.last
    if first > 1:
        return first
    model, turned = checked.model, last
    for part in reversed(growing_spans(model, checked.line.heard, first, last)):
        if model.mode_of(part.leaning.best).id == target.id:
            break
        turned = part.last
    return turned if turned > LEAST_NOTES else 1


def _stretches(
    model: ScoringModel, line: Line, whole: Leaning, bounds: Sequence[tuple[int, int]]
) -> tuple[Stretch, ...]:
    """Cut the line where its mode changes."""
    if not line.heard:
        return ()
    return tuple(
        _stretch(model, line, judge, part, bounds)
        for judge, part in stretch_judges(model, line.states, line.heard, whole)
    )


def _stretch(
    model: ScoringModel, line: Line, judge: Judge, part: Span, bounds: Sequence[tuple[int, int]]
) -> Stretch:
    mode, final_units, first, last = judge.mode, judge.final_units, part.first, part.last
    rival = part.leaning.rival if model.mode_of(part.leaning.best) is mode else part.leaning.best
    view = InView(mode, final_units, hypothesis_of(model, mode, final_units), rival)
    return Stretch(
        span=part,
        mode=mode,
        final_units=final_units,
        noticed_at=_noticed_at(line, first),
        probability=mode_probability(model, part, mode),
        steps=_steps(model, line, view, first, last),
        course=course_of(model, line.heard[first - 1 : last], mode, final_units, bounds, first),
    )


def _mode_of_stretches(model: ScoringModel, whole: Leaning, found: Sequence[Stretch]) -> Mode | None:
    """Give the mode of the longest stretch where the line as one leans to a mode that no stretch has."""
    modes = {stretch.mode.id for stretch in found}
    if not found or model.mode_of(whole.best).id in modes:
        return None
    return max(found, key=lambda stretch: stretch.span.n_notes).mode


def _noticed_at(line: Line, first: int) -> int | None:
    """Give the note at which the change to a stretch was noticed, or None if it is the first one."""
    changes = (state.change for state in line.states[first:])
    return next((change.changed_at for change in changes if first > 1 and change.seam_at == first), None)


def _steps(model: ScoringModel, line: Line, view: InView, first: int, last: int) -> Steps:
    track = start_track(view.mode, view.final_units, model.pack.system)
    for note in line.heard[first - 1 : last]:
        track = follow(track, note)
    if view.hypothesis is None:
        return Steps(track, first, ())
    kind = line.heard[last - 1].kind if last else InputKind.TYPED
    return Steps(track, first, rank_owed(model, line.states[last], view.hypothesis, track, view.rival, kind))


def _off(
    model: ScoringModel, line: Line, view: InView | None, stretches: Sequence[Stretch]
) -> tuple[tuple[Mode, OffMode] | None, ...]:
    """Judge every note, by the target where there is one, else by the mode of its stretch."""
    found: list[tuple[Mode, OffMode] | None] = []
    for stretch in stretches:
        mode, final_units = (stretch.mode, stretch.final_units) if view is None else view[:2]
        for note in line.heard[stretch.span.first - 1 : stretch.span.last]:
            off = off_mode(mode, final_units, note, model.pack.names)
            found.append(None if off is None else (mode, off))
    return tuple(found)


def _reasons(model: ScoringModel, line: Line, view: InView) -> tuple[Reason, ...]:
    if not line.heard or view.hypothesis is None or view.rival is None:
        return ()
    return reasons(model, line.states, line.heard, view.hypothesis, view.rival, REASONS_GIVEN)


def _keyboard_note(model: ScoringModel, line: Line, view: InView) -> str:
    plain = any(note.kind is InputKind.KEYS for note in line.heard)
    if not plain or view.hypothesis is None or view.rival is None:
        return ""
    return keyboard_note(model, view.hypothesis, view.rival)
