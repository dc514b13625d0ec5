"""A session: what the events so far have made of the line, and how it is scored.

`apply` is the only way in which a session changes: session and event in, session out. It first
settles what the time of the event says by itself (the sounding note has grown, a silence has
become a breath), so a session does not depend on how often the clock was read: the recorded
events alone give it again.

Conventions
-----------
One melody line is taken out of what is played by the rules of `melodycoach.core.melody`.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
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
from melodycoach.core.melody import is_struck_with, mark_of_silence
from melodycoach.core.model import build_model
from melodycoach.core.note import PACE_NOTES, Heard, Item, Mark, Note, hear, shared_start
from melodycoach.core.scorer import ScorerState, advance, start

if TYPE_CHECKING:
    from collections.abc import Sequence

    from melodycoach.core.mode import Mode, ModePack
    from melodycoach.core.model import ScoringModel
    from melodycoach.core.parameters import ScoringParameters

UNDO_LIMIT = 200
"""How many changes of the line can be taken back."""


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
        ``states[k]`` is the scorer's state after k notes; one more than there are notes.
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


def rewrite(model: ScoringModel, line: Line, items: Sequence[Item]) -> Line:
    """Give the line with other items; what stays the same from the start is not scored again."""
    return _scored(model, line, tuple(items), hear(items), 0, _last_note_at(items))


def extend(model: ScoringModel, line: Line, *items: Item) -> Line:
    """Give the line with more items at its end, whatever its length at the same small cost."""
    return _with_tail(model, line, line.items + items)


def _with_tail(model: ScoringModel, line: Line, items: tuple[Item, ...]) -> Line:
    """Hear again from the last note of ``line`` on; all items before it are unchanged."""
    first, n_known = max(line.last_note_at, 0), 0
    while first > 0 and n_known < PACE_NOTES:
        first -= 1
        n_known += isinstance(items[first], Note)
    done = max(len(line.heard) - 1, 0)
    return _scored(
        model, line, items, hear(items[first:], n_known), done, first + _last_note_at(items[first:])
    )


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
    sounding
        Voice of the newest note while its key is down, or None.
    played_last
        The newest change of the line was a played note: only then is the silence after it written
        down, so that a mark which the player takes out stays out.
    now_s
        Time of the last event.
    past, future
        Items of the lines that undo and redo go to, nearest last.
    """

    pack: ModePack
    model: ScoringModel
    line: Line
    only: tuple[str, ...] = ()
    final_cents: float | None = None
    target: Mode | None = None
    sounding: int | None = None
    played_last: bool = False
    now_s: float = 0.0
    past: tuple[tuple[Item, ...], ...] = ()
    future: tuple[tuple[Item, ...], ...] = ()

    @property
    def reading(self) -> PitchReading:
        """What is known of the final."""
        return self.model.reading


def begin(
    pack: ModePack,
    only: tuple[str, ...] = (),
    reading: PitchReading = PitchReading.WRITTEN,
    final_cents: float | None = None,
    target: str | None = None,
    parameters: ScoringParameters | None = None,
) -> SessionState:
    """Begin a session with an empty line.

    Raises
    ------
    UnknownModeError
        ``only`` or ``target`` names a mode that the pack does not have.
    """
    model = build_model(pack, pack.restrict(only), reading, final_cents, parameters)
    return SessionState(
        pack, model, empty_line(model), only, final_cents, pack.find(target) if target else None
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
    session = _settle(session, event.at_s)
    match event:
        case NoteOn():
            return _note_on(session, event)
        case NoteOff():
            return replace(session, sounding=None) if event.voice == session.sounding else session
        case PitchMoved():
            return _pitch_moved(session, event)
        case LineEdited():
            return _edited(session, event)
        case Undone():
            return _undone(session)
        case Redone():
            return _redone(session)
        case FreshStart():
            return _changed(session, empty_line(session.model)) if session.line.items else session
        case TargetChosen():
            target = session.pack.find(event.mode_id) if event.mode_id else None
            return replace(session, target=target)
        case ReadingChosen():
            return _rebuilt(session, session.only, event.reading, event.final_cents)
        case ModesRestricted():
            return _rebuilt(session, event.mode_ids, session.reading, session.final_cents)
        case TimePassed():
            return session


def _settle(session: SessionState, at_s: float) -> SessionState:
    """Let time pass: grow the sounding note, or write a long silence down."""
    at_s = max(at_s, session.now_s)
    line, note = session.line, session.line.last_note
    if note is not None and note.beats is None:
        if session.sounding is not None:
            line = _last_replaced(session.model, line, replace(note, duration_s=at_s - note.onset_s))
        elif session.played_last:
            line = _silence_marked(session.model, line, at_s - note.onset_s - note.duration_s)
    return replace(session, line=line, now_s=at_s)


def _last_replaced(model: ScoringModel, line: Line, note: Note) -> Line:
    at = line.last_note_at
    return _with_tail(model, line, (*line.items[:at], note, *line.items[at + 1 :]))


def _silence_marked(model: ScoringModel, line: Line, silence_s: float) -> Line:
    """Write a played silence down as a breath or a phrase end, once it is long enough."""
    mark = mark_of_silence(silence_s)
    after = line.items[line.last_note_at + 1 :]
    if mark is None or after == (mark,) or after not in ((), (Mark.BREATH,)):
        return line  # too short, written already, or the player has written something else
    return _with_tail(model, line, (*line.items[: line.last_note_at + 1], mark))


def _note_on(session: SessionState, event: NoteOn) -> SessionState:
    note, last = Note(event.pitch_cents, session.now_s, 0.0, event.kind), session.line.last_note
    if session.sounding is not None and last is not None and is_struck_with(last, session.now_s):
        if note.pitch_cents <= last.pitch_cents:
            return session
        top = replace(last, pitch_cents=note.pitch_cents, kind=note.kind)
        line = _last_replaced(session.model, session.line, top)
        return replace(session, line=line, sounding=event.voice)
    line = extend(session.model, session.line, note)
    return replace(_changed(session, line), sounding=event.voice, played_last=True)


def _pitch_moved(session: SessionState, event: PitchMoved) -> SessionState:
    note = session.line.last_note
    if event.voice != session.sounding or note is None:
        return session
    moved = replace(note, pitch_cents=event.pitch_cents, kind=event.kind)
    return replace(session, line=_last_replaced(session.model, session.line, moved))


def _edited(session: SessionState, event: LineEdited) -> SessionState:
    items = session.line.items
    if not 0 <= event.start <= event.stop <= len(items) or items[event.start : event.stop] == event.items:
        return session
    edited = (*items[: event.start], *event.items, *items[event.stop :])
    line = rewrite(session.model, session.line, edited)
    sounding = session.sounding if line.last_note is session.line.last_note else None
    return replace(_changed(session, line), sounding=sounding, played_last=sounding is not None)


def _changed(session: SessionState, line: Line) -> SessionState:
    """Take the line as a change that undo can take back; any sounding note is left to itself."""
    past = (*session.past[-(UNDO_LIMIT - 1) :], session.line.items)
    return replace(session, line=line, past=past, future=(), sounding=None, played_last=False)


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
    return replace(session, line=line, sounding=None, played_last=False)


def _rebuilt(
    session: SessionState, only: tuple[str, ...], reading: PitchReading, final_cents: float | None
) -> SessionState:
    """Score the line again with other hypotheses."""
    modes = session.pack.restrict(only)
    model = build_model(session.pack, modes, reading, final_cents, session.model.parameters)
    line = rewrite(model, empty_line(model), session.line.items)
    return replace(session, model=model, only=only, final_cents=final_cents, line=line)
