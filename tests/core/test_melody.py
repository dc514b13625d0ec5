"""One line out of what is played: the same from all events at once as from a live session."""

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from melodycoach.core.event import Event, NoteOff, NoteOn, PitchMoved, TimePassed
from melodycoach.core.melody import CHORD_S, take_melody, take_melody_indexed
from melodycoach.core.note import InputKind, Note
from melodycoach.core.session import apply, begin
from melodycoach.sources.pack_file import load_pack

KEYS = InputKind.KEYS
EMPTY = begin(load_pack("makam"), ("makam/rast", "makam/hicaz"))

STEPS = st.sampled_from([0.0, CHORD_S / 2, 0.02, 0.25, 0.9, 1.5, 3.0])
VOICES = st.integers(60, 63)


@st.composite
def performances(draw: st.DrawFn) -> list[Event]:
    """Keys up and down, bends and waits, in any order a player or a file may send them."""
    at_s, events = 0.0, []
    for _ in range(draw(st.integers(0, 14))):
        at_s += draw(STEPS)
        voice = draw(VOICES)
        kind = draw(st.sampled_from(["on", "on", "on", "off", "off", "moved", "wait"]))
        made: dict[str, Event] = {
            "on": NoteOn(at_s, voice, 100.0 * voice, KEYS),
            "off": NoteOff(at_s, voice),
            "moved": PitchMoved(at_s, voice, 100.0 * voice - 23, InputKind.TUNED),
            "wait": TimePassed(at_s),
        }
        events.append(made[kind])
    return events


@given(performances())
@settings(max_examples=150)
def test_a_recording_gives_the_line_that_a_session_has_after_the_same_events(events: list[Event]) -> None:
    session = EMPTY
    for event in events:
        session = apply(session, event)
    assert take_melody(events) == session.line.items


@pytest.mark.parametrize("order", [(60, 64, 67), (67, 64, 60), (64, 67, 60)])
def test_of_keys_struck_at_once_the_top_one_is_the_melody(order: tuple[int, ...]) -> None:
    downs = [NoteOn(1.0 + n * CHORD_S / 3, key, 100.0 * key, KEYS) for n, key in enumerate(order)]
    ups = [NoteOff(2.0, key) for key in order]
    assert take_melody([*downs, *ups]) == (Note(6700.0, 1.0, 1.0, KEYS),)


def test_a_key_struck_a_little_later_is_a_note_of_its_own() -> None:
    events = [NoteOn(1.0, 67, 6700.0, KEYS), NoteOn(1.1, 60, 6000.0, KEYS), NoteOff(2.0, 60)]
    assert [item.pitch_cents for item in take_melody(events) if isinstance(item, Note)] == [6700.0, 6000.0]


def test_a_note_released_before_the_next_is_struck_with_none() -> None:
    half = CHORD_S / 2
    events = [NoteOn(1.0, 67, 6700.0, KEYS), NoteOff(1.0, 67), NoteOn(1.0 + half, 60, 6000.0, KEYS)]
    assert len(take_melody(events)) == 2


def test_each_note_knows_the_event_that_it_came_from() -> None:
    events = [
        NoteOn(0.0, 60, 6000.0, KEYS),
        NoteOff(0.5, 60),
        NoteOn(0.5, 64, 6400.0, KEYS),
        NoteOn(0.5, 67, 6700.0, KEYS),
        NoteOff(1.0, 67),
    ]
    items, places = take_melody_indexed(events)
    assert (len(items), places) == (2, (0, 3))


def test_the_recording_may_end_after_its_last_event() -> None:
    held = [NoteOn(0.0, 60, 6000.0, KEYS)]
    assert take_melody(held, end_s=1.5) == (Note(6000.0, 0.0, 1.5, KEYS),)
    assert take_melody([]) == ()
