"""Characteristic steps: which of a mode are heard in a line, and which it still owes.

The tracker follows one mode on one final through a line: state in, state out, one call a note. So
the last note of a live line may be provisional: follow it again from the state before it.

A step is *heard* when its degrees sound in order, with these liberties:

- a degree may be repeated, and up to `FOREIGN_AT_MOST` other notes may stand between two degrees
  (or between the last degree and its return), as long as the line does not rest on any of them;
- an earlier degree may return: what follows it counts again from there;
- no degree but the last may end a phrase: a phrase end breaks every step that is under way;
- the whole step may stand in any octave, the same one for all its degrees; but an opening, a
  register step, a final cadence and a leading tone count only over the final on which the track
  stands, since their place is what they say, and so does a cadence on the octave of the final
  (`melodycoach.core.octave` puts the final where a line lies);
- half, suspended and final cadences are heard only when the line rests on their last degree;
- a pitch stands for a degree as `melodycoach.core.function` says: within a tolerance of the
  degree as written or as played, by the kind of input. Of a pitch that was written or tuned, the
  nearest degree of the mode is meant: segâh does not count for bûselik in a mode that has both.

A step that was heard stays heard.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from melodycoach.core.function import tolerance_units
from melodycoach.core.mode import StepKind
from melodycoach.core.note import InputKind
from melodycoach.core.pitch import key_of

if TYPE_CHECKING:
    from melodycoach.core.mode import CharacteristicStep, Mode
    from melodycoach.core.note import Heard
    from melodycoach.core.pitch import ToneSystem

FOREIGN_AT_MOST = 2
"""So many notes that are no part of a step may stand between two of its degrees."""

AS_WRITTEN = frozenset({StepKind.OPENING, StepKind.REGISTER, StepKind.FINAL_CADENCE, StepKind.LEADING_TONE})
"""Kinds of step that count only in the octave in which they are written, over the final."""

RESTING = frozenset({StepKind.HALF_CADENCE, StepKind.SUSPENDED_CADENCE, StepKind.FINAL_CADENCE})
"""Kinds of step that are heard only when the line rests on their last degree."""

_SAME_UNITS = 0.25
"""Degrees that lie equally far from a pitch, within so much, are meant equally."""

_LOWEST_OCTAVE = -16
_EXACT = frozenset({InputKind.TYPED, InputKind.TUNED})


@dataclass(frozen=True, slots=True)
class _Target:
    """A degree that occurs in steps: where it is written and played, and where it occurs.

    ``anywhere`` and ``fixed`` are places in the list of all degrees of all steps: those that count
    in any octave, and those that count only as written.
    """

    written: float
    played: float
    keys: frozenset[int]
    anywhere: tuple[int, ...]
    fixed: tuple[int, ...]


@dataclass(frozen=True, eq=False, slots=True)
class _Plan:
    """What the tracker needs to know of one mode on one final, worked out once.

    Nothing in it changes but ``known``, the memory of the places that a pitch stands for.
    """

    final_units: int
    system: ToneSystem
    targets: tuple[_Target, ...]
    n_places: int
    step_at: tuple[int, ...]
    opens_at: tuple[bool, ...]
    ends_at: tuple[bool, ...]
    folded: tuple[tuple[float, float], ...]
    known: dict[tuple[float, InputKind], tuple[int, ...]]


@dataclass(frozen=True, eq=False, slots=True)
class StepTrack:
    """Which characteristic steps of one mode a line has heard so far.

    Parameters
    ----------
    mode, final_units
        The mode, and where it stands, in units from A4.
    heard_at
        For each step of the mode the number (from 1) of the note that completed it first, or None
        while the step is owed.
    heard_octave
        For each step of the mode, how many octaves over its written place it was heard first; 0
        while it is owed.
    n_notes
        How many notes were followed.
    has_closed
        A phrase has ended: the line can no longer open.
    """

    mode: Mode
    final_units: int
    heard_at: tuple[int | None, ...]
    heard_octave: tuple[int, ...]
    n_notes: int
    _plan: _Plan = field(repr=False)
    _under_way: tuple[tuple[int, int], ...] = field(default=(), repr=False)
    has_closed: bool = False

    @property
    def owed(self) -> tuple[CharacteristicStep, ...]:
        """The steps not heard yet, in the order of the mode."""
        pairs = zip(self.mode.steps, self.heard_at, strict=True)
        return tuple(step for step, at in pairs if at is None)

    @property
    def heard(self) -> dict[str, int]:
        """Step id to the number of the note that completed it."""
        pairs = zip(self.mode.steps, self.heard_at, strict=True)
        return {step.id: at for step, at in pairs if at is not None}


def start_track(mode: Mode, final_units: int, system: ToneSystem) -> StepTrack:
    """Begin to follow a mode that stands on a final, before the first note.

    Parameters
    ----------
    mode
        Its characteristic steps are followed.
    final_units
        Where it stands, in units from A4.
    system
        The tone system that the degrees count in.
    """
    step_at: list[int] = []
    opens_at: list[bool] = []
    ends_at: list[bool] = []
    anywhere: dict[int, list[int]] = {}
    fixed: dict[int, list[int]] = {}
    for number, step in enumerate(mode.steps):
        by_degree = fixed if _stays(step, system.divisions) else anywhere
        for place, degree in enumerate(step.degrees):
            by_degree.setdefault(degree, []).append(len(step_at))
            step_at.append(number)
            opens_at.append(place == 0)
            ends_at.append(place == len(step.degrees) - 1)

    def key(degree: float) -> int:
        return key_of(system.units_to_cents(final_units + degree))

    targets = tuple(
        _Target(
            degree,
            mode.played_units(degree),
            frozenset({key(degree), key(mode.played_units(degree))}),
            tuple(anywhere.get(degree, ())),
            tuple(fixed.get(degree, ())),
        )
        for degree in sorted({*anywhere, *fixed})
    )
    folded = tuple(
        {
            (degree % system.divisions, mode.played_units(degree) - degree + degree % system.divisions)
            for degree in mode.degrees
        }
    )
    plan = _Plan(
        final_units,
        system,
        targets,
        len(step_at),
        tuple(step_at),
        tuple(opens_at),
        tuple(ends_at),
        folded,
        {},
    )
    n_steps = len(mode.steps)
    return StepTrack(mode, final_units, (None,) * n_steps, (0,) * n_steps, 0, plan)


def _stays(step: CharacteristicStep, divisions: int) -> bool:
    """Say whether a step counts only where it is written.

    So does a cadence on the octave of the final: an octave lower it would be the final cadence.
    """
    return step.kind in AS_WRITTEN or (step.kind in RESTING and step.degrees[-1] % divisions == 0)


def follow(track: StepTrack, heard: Heard) -> StepTrack:
    """Give the track after one more note; the module says when a step counts as heard.

    The cost depends on the number of steps, not on the length of the line.
    """
    plan = track._plan
    pitch = heard.pitch_cents, heard.kind
    sounding = plan.known.get(pitch)
    if sounding is None:
        sounding = _places(plan, heard)
        if heard.kind is not InputKind.RECORDED:  # those seldom come twice
            plan.known[pitch] = sounding
    before = dict(track._under_way)
    number = track.n_notes + 1
    heard_at, heard_octave = track.heard_at, track.heard_octave
    after: dict[int, int] = {}
    if not heard.rests:
        for code, foreign in track._under_way:
            if foreign < FOREIGN_AT_MOST:
                after[code] = foreign + 1
    for code in sounding:
        place = code % plan.n_places
        step = plan.step_at[place]
        if heard_at[step] is not None:
            continue
        if code in before or plan.opens_at[place] or code - 1 in before:
            after[code] = 0
            if plan.ends_at[place] and (heard.rests or track.mode.steps[step].kind not in RESTING):
                octave = code // plan.n_places + _LOWEST_OCTAVE
                heard_at = (*heard_at[:step], number, *heard_at[step + 1 :])
                heard_octave = (*heard_octave[:step], octave, *heard_octave[step + 1 :])
    if heard_at is not track.heard_at:
        after = {c: n for c, n in after.items() if heard_at[plan.step_at[c % plan.n_places]] is None}
    under_way = () if heard.closes else tuple(after.items())
    has_closed = track.has_closed or heard.closes
    return StepTrack(
        track.mode, track.final_units, heard_at, heard_octave, number, plan, under_way, has_closed
    )


def _places(plan: _Plan, heard: Heard) -> tuple[int, ...]:
    """Give the places in steps that a note can stand for, each with its octave, as one number."""
    system, n_places = plan.system, plan.n_places
    divisions = system.divisions
    codes: list[int] = []
    if heard.kind is InputKind.KEYS:
        note_key = key_of(heard.pitch_cents)
        for target in plan.targets:
            for key in target.keys:
                octave, left = divmod(note_key - key, 12)
                if left == 0:
                    _add_codes(codes, target, octave, n_places)
        return tuple(codes)
    units = system.cents_to_units(heard.pitch_cents) - plan.final_units
    tolerance = tolerance_units(heard.kind, system)
    if heard.kind in _EXACT:
        tolerance = min(tolerance, _nearest_fold(plan, units) + _SAME_UNITS)
    for target in plan.targets:
        octave = round((units - target.written) / divisions)
        at = units - octave * divisions
        if abs(at - target.written) <= tolerance or abs(at - target.played) <= tolerance:
            _add_codes(codes, target, octave, n_places)
    return tuple(codes)


def _add_codes(codes: list[int], target: _Target, octave: int, n_places: int) -> None:
    base = (octave - _LOWEST_OCTAVE) * n_places
    codes += [base + place for place in target.anywhere]
    if octave == 0:
        codes += [base + place for place in target.fixed]


def _nearest_fold(plan: _Plan, units: float) -> float:
    """Give the distance to the nearest degree of the mode, whatever the octave."""
    divisions = plan.system.divisions
    at = units % divisions
    nearest = float(divisions)
    for pair in plan.folded:
        for degree in pair:
            away = abs(at - degree)
            nearest = min(nearest, away, divisions - away)
    return nearest
