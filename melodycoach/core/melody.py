"""One melody line out of what is played: the one machine that follows the rules.

The newest note wins, and a note ends when its own key comes up; what else a key can be is said by
the table of `melodycoach.core.line_rules`. A bent note is where it rests
(`melodycoach.core.resting_pitch`), and a long silence is written down.

`take` is the only place where a line grows by playing. A live session calls it event by event
(`melodycoach.core.session`), `take_melody` with all events at once. What it gives depends on the
events and their times alone, so looking at the clock in between changes nothing.
"""

from __future__ import annotations

from dataclasses import replace
from enum import Enum
from typing import TYPE_CHECKING

from melodycoach.core.event import FreshStart, NoteOff, NoteOn, PitchMoved, TimePassed
from melodycoach.core.line_rules import (
    DRONE_NOTES,
    DRONE_S,
    MOST_DRONES,
    MOST_KEYS,
    OUTLIVE_S,
    OVERLAP_S,
    RULES,
    SAME_KEY_CENTS,
    Fate,
    Key,
    LineRules,
    Taking,
    is_drone,
)
from melodycoach.core.note import Mark, Note
from melodycoach.core.resting_pitch import bend, rests_at, strike

if TYPE_CHECKING:
    from collections.abc import Iterable

    from melodycoach.core.event import Event
    from melodycoach.core.note import Item

BREATH_GAP_S = 1.0
"""A silence of at least so long between played notes is a breath."""

PHRASE_GAP_S = 2.5
"""A silence of at least so long after a played note ends the phrase."""


class Step(Enum):
    """What becomes of the tail of a line."""

    BEGUN = "a note is put behind it"
    CHANGED = "its newest note is now this"
    SILENT = "this mark follows its newest note, in place of a shorter one"


Change = tuple[Step, "Item"]


def mark_of_silence(silence_s: float) -> Mark | None:
    """Give what a silence of this length is written as, or None for one that is too short.

    >>> mark_of_silence(0.4), str(mark_of_silence(1.0)), str(mark_of_silence(2.5))
    (None, ',', '.')
    """
    if silence_s >= PHRASE_GAP_S:
        return Mark.PHRASE_END
    return Mark.BREATH if silence_s >= BREATH_GAP_S else None


def take(taking: Taking, event: Event) -> tuple[Taking, tuple[Change, ...]]:
    """Take one more event.

    Returns
    -------
    taking
        What has to be known for the next one.
    changes
        What becomes of the tail of the line, in order. That a note has only grown is not said at a
        bend: there may be a thousand in a second.
    """
    before = taking.note
    taking, changes = _let_pass(taking, max(event.at_s, taking.now_s))
    match event:
        case NoteOn():
            taking, more = _key_down(taking, event)
            return taking, (*changes, *more)
        case NoteOff():
            return _key_up(taking, event.voice), changes
        case PitchMoved():
            taking = _bent(taking, event)
            return taking, _news(taking, before, changes)
        case FreshStart():
            return replace(taking, drones=()), changes
        case _:
            return taking, changes


def let_go(taking: Taking) -> Taking:
    """Leave the newest note as it is: the player has changed the line. What is down is still known."""
    return replace(taking, note=None, struck=None, ended_s=None, path=None)


def _let_pass(taking: Taking, now_s: float) -> tuple[Taking, tuple[Change, ...]]:
    """Let time pass: the sounding note grows, a key that waited is heard, or a silence grows."""
    note, ended_s = taking.note, taking.ended_s
    taking = replace(taking, now_s=now_s)
    if note is None:
        return taking, ()
    if ended_s is None:
        taking = _grown(taking)
        return taking, _changed(taking)
    waiting = [key for key in taking.keys if key.waits and key.at_s >= ended_s - OVERLAP_S]
    if waiting and now_s >= ended_s + OUTLIVE_S:
        heard = max(waiting, key=lambda key: key.pitch_cents)
        taking = _grown(_begin(taking, replace(heard, at_s=ended_s)))
        return taking, _changed(taking, Step.BEGUN)
    mark = mark_of_silence(now_s - ended_s)
    return taking, ((Step.SILENT, mark),) if mark else ()


def _changed(taking: Taking, step: Step = Step.CHANGED) -> tuple[Change, ...]:
    assert taking.note is not None
    return ((step, taking.note),)


def _grown(taking: Taking) -> Taking:
    """Give the sounding note its length and its pitch as of now."""
    assert taking.note is not None
    assert taking.path is not None
    onset_s = taking.note.onset_s
    pitch_cents, kind = rests_at(taking.path, taking.now_s)
    return replace(taking, note=Note(pitch_cents, onset_s, taking.now_s - onset_s, kind))


def _begin(taking: Taking, key: Key) -> Taking:
    """Make a key the newest note of the line; whoever waited waits no more."""
    keys = tuple(
        replace(
            held,
            n_above=held.n_above + (held.pitch_cents < key.pitch_cents - SAME_KEY_CENTS),
            waits=False,
        )
        for held in taking.keys
    )
    found = [
        held.pitch_cents
        for held in keys
        if held.n_above >= DRONE_NOTES
        and key.at_s - held.at_s >= DRONE_S
        and not is_drone(taking, held.pitch_cents)
    ]
    return replace(
        _sound(taking, key),
        note=Note(key.pitch_cents, key.at_s, 0.0, key.kind),
        keys=keys,
        drones=(*taking.drones, *found)[-MOST_DRONES:],
    )


def _sound(taking: Taking, key: Key) -> Taking:
    """Let the newest note be played by this key from now on."""
    path = strike(key.pitch_cents, key.kind, key.at_s)
    return replace(taking, struck=key.voice, ended_s=None, path=path)


def _key_down(taking: Taking, event: NoteOn) -> tuple[Taking, tuple[Change, ...]]:
    key = Key(event.voice, event.pitch_cents, event.kind, taking.now_s)
    fate = next((rule.fate for rule in RULES if rule.applies(taking, key)), Fate.BEGINS)
    others = tuple(held for held in taking.keys if held.voice != key.voice)[1 - MOST_KEYS :]
    down = replace(taking, keys=(*others, replace(key, waits=fate is Fate.WAITS)))
    match fate:
        case Fate.BEGINS:
            begun = _begin(down, key)
            return begun, _changed(begun, Step.BEGUN)
        case Fate.RAISES:
            lower = tuple(
                replace(held, waits=held.waits or held.voice == taking.struck) for held in down.keys
            )
            raised = _grown(_sound(replace(down, keys=lower), key))
            return raised, _changed(raised)
        case Fate.GOES_ON:
            going = _grown(replace(down, ended_s=None))
            return going, _changed(going)
        case Fate.WAITS | Fate.LEFT_OUT:
            return down, ()


def _key_up(taking: Taking, voice: int) -> Taking:
    ended_s = taking.now_s if voice == taking.sounding else taking.ended_s
    keys = tuple(held for held in taking.keys if held.voice != voice)
    return replace(taking, keys=keys, ended_s=ended_s)


def _bent(taking: Taking, event: PitchMoved) -> Taking:
    keys = tuple(
        replace(held, pitch_cents=event.pitch_cents, kind=event.kind) if held.voice == event.voice else held
        for held in taking.keys
    )
    taking = replace(taking, keys=keys)
    if taking.path is None or event.voice != taking.sounding:
        return taking
    return _grown(replace(taking, path=bend(taking.path, event.pitch_cents, event.kind, taking.now_s)))


def _news(taking: Taking, before: Note | None, changes: tuple[Change, ...]) -> tuple[Change, ...]:
    """Leave out of what has happened at a bend that the newest note has grown."""
    told = tuple(change for change in changes if change[0] is not Step.CHANGED)
    begun = [item for step, item in told if step is Step.BEGUN]
    known, note = begun[-1] if begun else before, taking.note
    assert known is None or isinstance(known, Note)
    if note is None or known is None or (note.pitch_cents, note.kind) == (known.pitch_cents, known.kind):
        return told
    return (*told, (Step.CHANGED, note))


# --- a whole recording -------------------------------------------------------------------------


def take_melody(
    events: Iterable[Event], end_s: float | None = None, rules: LineRules | None = None
) -> tuple[Item, ...]:
    """Give the line that a session would have after these events.

    Parameters
    ----------
    events
        What was played, by time; events that are no notes are passed over.
    end_s
        When the recording ends; None: with its last event.
    rules
        What the player has chosen; None: nothing.

    Examples
    --------
    >>> from melodycoach.core.note import InputKind
    >>> keys = InputKind.KEYS
    >>> take_melody([NoteOn(0, 60, 6000, keys), NoteOff(0.5, 60), NoteOn(2, 62, 6200, keys)], 2.25)[1:]
    (<Mark.BREATH: ','>, Note(pitch_cents=6200, onset_s=2, duration_s=0.25, kind=<InputKind.KEYS: 'keys'>, \
beats=None))
    """
    return take_melody_indexed(events, end_s, rules)[0]


def take_melody_indexed(
    events: Iterable[Event], end_s: float | None = None, rules: LineRules | None = None
) -> tuple[tuple[Item, ...], tuple[tuple[int, int], ...]]:
    """Give the line, and for each of its notes the places of the events at which it began and ended.

    A note that still sounds at the end ends with the last event.
    """
    events = tuple(events)
    taking = Taking(rules or LineRules())
    items: list[Item] = []
    spans: list[tuple[int, int]] = []
    for number, event in enumerate((*events, TimePassed(end_s or 0.0))):
        place = min(number, len(events) - 1)
        if taking.sounding is not None:
            spans[-1] = (spans[-1][0], place)
        taking, changes = take(taking, event)
        for step, item in changes:
            if isinstance(item, Note) and step is Step.BEGUN:
                waited = item.onset_s < taking.now_s  # it began when the key above it came up
                spans.append((spans[-1][1] if waited else place, place))
            _put(items, step, item)
    return tuple(items), tuple(spans)


def _put(items: list[Item], step: Step, item: Item) -> None:
    """Change the tail of a line that nobody else changes."""
    if step is Step.CHANGED or (step is Step.SILENT and isinstance(items[-1], Mark)):
        items[-1] = item
    else:
        items.append(item)
