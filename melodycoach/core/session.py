"""A session: what the events so far have made of the line, and how it is scored.

`apply` is the only way in which a session changes: session and event in, session out. One melody
line is taken out of what is played by the rules of `melodycoach.core.melody`, which also say what
the mere passing of time makes of it (the sounding note has grown, a silence has become a breath).
A session does not depend on how often the clock was read: the recorded events alone give it again.

Conventions
-----------
A bend that leaves the newest note where it is does not touch the line: the note's growth is written
down with the next event of another kind, or when the clock is looked at.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from itertools import islice
from typing import TYPE_CHECKING

from melodycoach.core.event import (
    Event,
    FreshStart,
    LineEdited,
    ModesRestricted,
    NoteOff,
    NoteOn,
    PitchMoved,
    PitchReading,
    ReadingChosen,
    Redone,
    TargetChosen,
    TimePassed,
    Undone,
)
from melodycoach.core.line_rules import LineRules, Taking
from melodycoach.core.melody import Step, let_go, take
from melodycoach.core.model import build_model
from melodycoach.core.note import PACE_NOTES, Heard, Item, Mark, Note, hear, shared_start
from melodycoach.core.scorer import ScorerState, advance, start

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from melodycoach.core.mode import Mode, ModePack
    from melodycoach.core.model import ScoringModel
    from melodycoach.core.parameters import ScoringParameters

LONGEST_LINE, KEPT_OF_LINE = 4000, 1000
"""A line that begins with a played note and grows beyond so many notes, silences and marks begins anew
with the newest of them; what is let go is in the log, and undo brings it back."""

SHORTEST_LIMIT = 600
"""However many hypotheses there are, a line may grow so long; with many of them each note takes more
memory, and `LONGEST_LINE` holds for one hypothesis of each mode."""

UNDO_LIMIT = 200
"""How many changes of the line can be taken back."""


NOTHING_PLAYED = Taking()


@dataclass(frozen=True, eq=False, slots=True)
class Line:
    """The line since the last fresh start, scored.

    Parameters
    ----------
    items
        Notes, silences and marks, in order.
    heard
        The notes as the scorer hears them, one for each note.
    states
        ``states[k]`` is the scorer's state after k notes; one more than there are notes. With none
        at all the line is not scored.
    last_note_at
        Index in ``items`` of the last note, -1 when there is none.
    """

    items: tuple[Item, ...]
    heard: tuple[Heard, ...]
    states: tuple[ScorerState, ...]
    last_note_at: int

    @property
    def last_note(self) -> Note | None:
        """The newest note, or None."""
        item = self.items[self.last_note_at] if self.last_note_at >= 0 else None
        return item if isinstance(item, Note) else None


def empty_line(model: ScoringModel) -> Line:
    """Give the line before its first note."""
    return Line((), (), (start(model),), -1)


def _unscored(items: Sequence[Item]) -> Line:
    """Give a line that is not scored, and stays so whatever becomes of it: it has no states."""
    return Line(tuple(items), (), (), _last_note_at(items))


def rewrite(model: ScoringModel, line: Line, items: Sequence[Item]) -> Line:
    """Give the line with other items; what stays the same from the start is not scored again."""
    if not line.states:
        return _unscored(items)
    items = tuple(items)
    n_same = shared_start(line.items, items)
    done = max(sum(isinstance(item, Note) for item in items[:n_same]) - 1, 0)  # the last hears what follows
    first, n_known = _from_pace(items, _place_of_note(items, done))
    return _scored(model, line, items, hear(items[first:], n_known), done, _last_note_at(items))


def extend(model: ScoringModel, line: Line, *items: Item) -> Line:
    """Give the line with more items at its end, whatever its length at the same small cost."""
    return _with_tail(model, line, line.items + items)


def _with_tail(model: ScoringModel, line: Line, items: tuple[Item, ...]) -> Line:
    """Hear again from the last note of ``line`` on; all items before it are unchanged."""
    if not line.states:
        return _unscored(items)
    first, n_known = _from_pace(items, max(line.last_note_at, 0))
    done = max(len(line.heard) - 1, 0)
    return _scored(
        model, line, items, hear(items[first:], n_known), done, first + _last_note_at(items[first:])
    )


def _from_pace(items: Sequence[Item], at: int) -> tuple[int, int]:
    """Go back from a place to where the notes begin that set its pace; and say how many they are."""
    n_known = 0
    while at > 0 and n_known < PACE_NOTES:
        at -= 1
        n_known += isinstance(items[at], Note)
    return at, n_known


def _place_of_note(items: Sequence[Item], number: int) -> int:
    """Give where the note of this number, from 0, stands; the end where there is none."""
    places = (at for at, item in enumerate(items) if isinstance(item, Note))
    return next(islice(places, number, None), len(items))


def _scored(
    model: ScoringModel, line: Line, items: tuple[Item, ...], tail: tuple[Heard, ...], done: int, last: int
) -> Line:
    """Score the notes after the first ``done``, from the first one on that is heard differently."""
    kept = done + shared_start(line.heard[done:], tail)
    states = list(line.states[done : kept + 1])
    for note in tail[kept - done :]:
        states.append(advance(model, states[-1], note))
    return Line(items, line.heard[:done] + tail, line.states[:done] + tuple(states), last)


def _last_note_at(items: Sequence[Item]) -> int:
    return next((i for i in range(len(items) - 1, -1, -1) if isinstance(items[i], Note)), -1)


@dataclass(frozen=True, eq=False, slots=True)
class SessionState:
    """Everything that the events so far have made.

    Parameters
    ----------
    pack, model
        The modes, and how those that compete are scored; the model knows how the final is read.
    only
        Ids of the modes that compete; empty: all of the pack.
    final_cents
        The final that the player has given, or None.
    target
        The mode that the player aims at, or None.
    line
        Since the last fresh start.
    taking
        What is remembered of the playing, and the rules by which a line is taken out of it.
    past, future
        Items of the lines that undo and redo go to, nearest last.
    """

    pack: ModePack
    model: ScoringModel
    line: Line
    only: tuple[str, ...] = ()
    final_cents: float | None = None
    target: Mode | None = None
    taking: Taking = NOTHING_PLAYED
    past: tuple[tuple[Item, ...], ...] = ()
    future: tuple[tuple[Item, ...], ...] = ()

    @property
    def reading(self) -> PitchReading:
        """What is known of the final."""
        return self.model.reading

    @property
    def now_s(self) -> float:
        """Time of the last event."""
        return self.taking.now_s

    @property
    def sounding(self) -> int | None:
        """Voice of the newest note while its key is down, or None."""
        return self.taking.sounding

    @property
    def played_last(self) -> bool:
        """Whether the newest change of the line was a played note.

        Only then is the silence after it written down, so that a mark which the player takes out
        stays out.
        """
        return self.taking.note is not None


def begin(
    pack: ModePack,
    only: tuple[str, ...] = (),
    reading: PitchReading = PitchReading.WRITTEN,
    final_cents: float | None = None,
    target: str | None = None,
    parameters: ScoringParameters | None = None,
    rules: LineRules | None = None,
) -> SessionState:
    """Begin a session with an empty line; ``rules`` is what the player has chosen of those of the line.

    Raises
    ------
    UnknownModeError
        ``only`` or ``target`` names a mode that the pack does not have.
    """
    model = build_model(pack, pack.restrict(only), reading, final_cents, parameters)
    return SessionState(
        pack,
        model,
        empty_line(model),
        only,
        final_cents,
        pack.find(target) if target else None,
        NOTHING_PLAYED if rules is None else Taking(rules),
    )


def apply(session: SessionState, event: Event) -> SessionState:
    """Give the session after one more event.

    An event that says nothing new (the note-off of an old note, undo with nothing to undo, an edit
    outside the line) changes nothing but the time.

    Raises
    ------
    UnknownModeError
        The event names a mode that the pack does not have.
    """
    session = _played(session, event)
    match event:
        case LineEdited():
            return _edited(session, event)
        case Undone():
            return _undone(session)
        case Redone():
            return _redone(session)
        case FreshStart():
            emptied = rewrite(session.model, session.line, ())
            return _changed(session, emptied) if session.line.items else session
        case TargetChosen():
            target = session.pack.find(event.mode_id) if event.mode_id else None
            return replace(session, target=target)
        case ReadingChosen():
            return _rebuilt(session, session.only, event.reading, event.final_cents)
        case ModesRestricted():
            return _rebuilt(session, event.mode_ids, session.reading, session.final_cents)
        case NoteOn() | NoteOff() | PitchMoved() | TimePassed():
            return session


def replay(session: SessionState, events: Iterable[Event]) -> SessionState:
    """Give the session after many events, as `apply` does one by one; only the last line is scored.

    Raises
    ------
    UnknownModeError
        As for `apply`.
    """
    session = replace(session, line=_unscored(session.line.items))
    for event in events:
        session = apply(session, event)
    line = rewrite(session.model, empty_line(session.model), session.line.items)
    return replace(session, line=line)


def _played(session: SessionState, event: Event) -> SessionState:
    """Let the rules of the line say what playing, and time alone, make of its tail."""
    taking, changes = take(session.taking, event)
    session = replace(session, taking=taking)
    for step, item in changes:
        if step is Step.BEGUN:
            line = extend(session.model, _not_too_long(session.model, session.line), item)
            session = replace(session, line=line, past=_with_present(session), future=())
        elif isinstance(item, Note):
            session = replace(session, line=_last_replaced(session.model, session.line, item))
        elif isinstance(item, Mark):
            session = replace(session, line=_silence_marked(session.model, session.line, item))
    return session


def _not_too_long(model: ScoringModel, line: Line) -> Line:
    """Let go of the beginning of a line that has grown too long; it then begins with a note."""
    finals = len(model.mode_index) // model.n_modes
    longest = max(LONGEST_LINE // finals, SHORTEST_LIMIT)
    if len(line.items) < longest or not _is_played(line.items[0]):
        return line
    first = len(line.items) - min(KEPT_OF_LINE, longest // 2)
    first = next((at for at in range(first, len(line.items)) if isinstance(line.items[at], Note)), first)
    return rewrite(model, empty_line(model) if line.states else line, line.items[first:])


def _is_played(item: Item) -> bool:
    return isinstance(item, Note) and item.beats is None


def _last_replaced(model: ScoringModel, line: Line, note: Note) -> Line:
    at = line.last_note_at
    return _with_tail(model, line, (*line.items[:at], note, *line.items[at + 1 :]))


def _silence_marked(model: ScoringModel, line: Line, mark: Mark) -> Line:
    """Write down what a played silence has become."""
    after = line.items[line.last_note_at + 1 :]
    if after == (mark,) or after not in ((), (Mark.BREATH,)):
        return line  # written already, or the player has written something else
    return _with_tail(model, line, (*line.items[: line.last_note_at + 1], mark))


def _edited(session: SessionState, event: LineEdited) -> SessionState:
    items = session.line.items
    if not 0 <= event.start <= event.stop <= len(items) or items[event.start : event.stop] == event.items:
        return session
    edited = (*items[: event.start], *event.items, *items[event.stop :])
    line = rewrite(session.model, session.line, edited)
    edited_session = _changed(session, line)
    if session.sounding is not None and line.last_note is session.line.last_note:
        return replace(edited_session, taking=session.taking)  # it plays on
    return edited_session


def _changed(session: SessionState, line: Line) -> SessionState:
    """Take the line as a change that undo can take back; any sounding note is left to itself."""
    return replace(session, line=line, past=_with_present(session), future=(), taking=let_go(session.taking))


def _with_present(session: SessionState) -> tuple[tuple[Item, ...], ...]:
    """Give the lines that undo goes to, with the present one as the nearest."""
    return (*session.past[-(UNDO_LIMIT - 1) :], session.line.items)


def _undone(session: SessionState) -> SessionState:
    if not session.past:
        return session
    back = replace(_went_to(session, session.past[-1]), past=session.past[:-1])
    return replace(back, future=(*session.future, session.line.items))


def _redone(session: SessionState) -> SessionState:
    if not session.future:
        return session
    forth = replace(_went_to(session, session.future[-1]), future=session.future[:-1])
    return replace(forth, past=(*session.past, session.line.items))


def _went_to(session: SessionState, items: tuple[Item, ...]) -> SessionState:
    line = rewrite(session.model, session.line, items)
    return replace(session, line=line, taking=let_go(session.taking))


def _rebuilt(
    session: SessionState, only: tuple[str, ...], reading: PitchReading, final_cents: float | None
) -> SessionState:
    """Score the line again with other hypotheses."""
    modes = session.pack.restrict(only)
    model = build_model(session.pack, modes, reading, final_cents, session.model.parameters)
    line = rewrite(model, empty_line(model), session.line.items) if session.line.states else session.line
    return replace(session, model=model, only=only, final_cents=final_cents, line=line)
