"""A session is the outcome of its events: whatever the clock did in between, and whatever came back."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

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
from melodycoach.core.line_rules import LineRules
from melodycoach.core.melody import BREATH_GAP_S, PHRASE_GAP_S
from melodycoach.core.note import InputKind, Item, Mark, Note, Silence, hear
from melodycoach.core.scorer import advance, mode_posterior, start
from melodycoach.core.session import UNDO_LIMIT, SessionState, apply, begin, empty_line, replay, rewrite
from melodycoach.errors import UnknownModeError
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
ONLY = ("makam/huseyni", "makam/rast", "makam/hicaz")
EMPTY = begin(PACK, ONLY)
KEYS = InputKind.KEYS


def played(*events: Event, session: SessionState = EMPTY) -> SessionState:
    for event in events:
        session = apply(session, event)
    return session


def typed(pitch_cents: float) -> Note:
    return Note(pitch_cents, 0.0, 0.8, InputKind.TYPED, beats=1.0)


def test_a_note_lasts_from_its_key_down_to_its_key_up() -> None:
    session = played(NoteOn(1.0, 60, 6000.0, KEYS), NoteOff(1.5, 60), TimePassed(1.7))
    assert session.line.items == (Note(6000.0, 1.0, 0.5, KEYS),)


def test_the_newest_note_wins_and_ends_the_one_before() -> None:
    session = played(NoteOn(1.0, 60, 6000.0, KEYS), NoteOn(1.25, 64, 6400.0, KEYS), NoteOff(2.0, 60))
    assert [(note.pitch_cents, note.duration_s) for note in session.line.items] == [
        (6000.0, 0.25),
        (6400.0, 0.75),
    ]
    assert session.sounding == 64


def test_a_held_drone_does_not_come_back_when_the_newer_note_ends() -> None:
    session = played(
        NoteOn(0.0, 48, 4800.0, KEYS), NoteOn(1.0, 69, 6900.0, KEYS), NoteOff(2.0, 69), TimePassed(2.5)
    )
    assert len(session.line.heard) == 2
    assert session.sounding is None


def test_a_key_that_waited_is_heard_as_time_passes_and_can_be_taken_back() -> None:
    grace = NoteOn(0.0, 71, 7100.0, KEYS), NoteOn(0.02, 69, 6900.0, KEYS), NoteOff(0.06, 71)
    session = played(*grace)
    assert (len(session.line.heard), session.sounding) == (1, None)
    session = played(TimePassed(0.2), session=session)
    assert [note.pitch_cents for note in session.line.items] == [7100.0, 6900.0]
    assert session.sounding == 69
    assert len(played(Undone(0.3), session=session).line.items) == 1


def test_a_note_changed_by_hand_while_a_key_waits_keeps_the_line_as_it_was_written() -> None:
    session = played(NoteOn(0.0, 71, 7100.0, KEYS), NoteOn(0.02, 69, 6900.0, KEYS), NoteOff(0.06, 71))
    session = played(LineEdited(0.07, 0, 1, (typed(7200.0),)), TimePassed(5.0), session=session)
    assert session.line.items == (typed(7200.0),)


def test_a_session_can_have_a_split_key() -> None:
    session = begin(PACK, ONLY, rules=LineRules(split_key=60))
    session = played(NoteOn(0.0, 69, 6900.0, KEYS), NoteOn(0.5, 59, 5900.0, KEYS), session=session)
    assert (len(session.line.items), session.sounding) == (1, 69)


def test_an_edit_elsewhere_lets_the_sounding_note_play_on() -> None:
    before = LineEdited(0.0, 0, 0, (typed(6900.0), typed(7100.0)))
    session = played(before, NoteOn(1.0, 72, 7200.0, KEYS), LineEdited(1.5, 0, 1, ()), TimePassed(2.0))
    assert session.sounding == 72
    assert session.line.items == (typed(7100.0), Note(7200.0, 1.0, 1.0, KEYS))


def test_a_bend_that_changes_nothing_costs_no_scoring() -> None:
    session = played(NoteOn(0.0, 71, 7100.0, KEYS), TimePassed(0.5))
    bent = played(PitchMoved(0.6, 71, 7101.0, InputKind.TUNED), session=session)
    assert bent.line is session.line
    assert played(TimePassed(0.7), session=bent).line.items == (Note(7100.0, 0.0, 0.7, KEYS),)


def test_a_bend_that_moves_changes_the_sounding_note_and_makes_no_new_one() -> None:
    session = played(
        NoteOn(0.0, 71, 7100.0, KEYS), PitchMoved(0.2, 71, 7077.0, InputKind.TUNED), NoteOff(0.5, 71)
    )
    assert session.line.items == (Note(7077.0, 0.0, 0.5, InputKind.TUNED),)


@pytest.mark.parametrize(
    ("silence_s", "marks"),
    [
        (BREATH_GAP_S - 0.01, []),
        (BREATH_GAP_S + 0.01, [Mark.BREATH]),
        (PHRASE_GAP_S + 0.01, [Mark.PHRASE_END]),
    ],
)
def test_a_silence_is_written_down_as_long_as_it_was(silence_s: float, marks: list[Mark]) -> None:
    before = played(NoteOn(0.0, 60, 6000.0, KEYS), NoteOff(0.5, 60))
    waited = played(TimePassed(0.5 + silence_s), session=before)
    went_on = played(NoteOn(0.5 + silence_s, 62, 6200.0, KEYS), session=before)
    assert list(waited.line.items[1:]) == marks
    assert list(went_on.line.items[1:-1]) == marks


def test_a_mark_that_the_player_takes_out_stays_out() -> None:
    session = played(
        NoteOn(0.0, 60, 6000.0, KEYS),
        NoteOff(0.5, 60),
        TimePassed(4.0),
        LineEdited(4.0, 1, 2, ()),
        TimePassed(9.0),
    )
    assert [type(item) for item in session.line.items] == [Note]


def test_the_resting_of_a_note_is_known_when_the_next_one_comes() -> None:
    near = played(NoteOn(0.0, 60, 6000.0, KEYS), NoteOff(0.2, 60), NoteOn(0.3, 62, 6200.0, KEYS))
    far = played(NoteOn(0.0, 60, 6000.0, KEYS), NoteOff(0.2, 60), NoteOn(0.6, 62, 6200.0, KEYS))
    assert (near.line.heard[0].rests, far.line.heard[0].rests) == (False, True)


def test_undo_and_redo_go_back_and_forth_over_every_change() -> None:
    one = played(LineEdited(0.0, 0, 0, (typed(6900.0),)))
    two = played(LineEdited(1.0, 1, 1, (typed(7100.0),)), session=one)
    back = played(Undone(2.0), session=two)
    forth = played(Redone(3.0), session=back)
    assert back.line.items == one.line.items
    assert forth.line.items == two.line.items
    assert played(Undone(4.0), Undone(5.0), Undone(6.0), session=forth).line.items == ()


def test_a_fresh_start_can_be_taken_back() -> None:
    session = played(LineEdited(0.0, 0, 0, (typed(6900.0),)), FreshStart(1.0))
    assert session.line.items == ()
    assert played(Undone(2.0), session=session).line.items == (typed(6900.0),)


def test_undo_remembers_no_more_than_its_limit() -> None:
    session = EMPTY
    for number in range(UNDO_LIMIT + 30):
        session = apply(
            session, LineEdited(float(number), 0, len(session.line.items), (typed(6900.0 + number),))
        )
    assert len(session.past) == UNDO_LIMIT


@pytest.mark.parametrize(
    "event", [LineEdited(1.0, 3, 4, ()), LineEdited(1.0, -1, 0, ()), Undone(1.0), Redone(1.0)]
)
def test_an_event_that_cannot_be_done_changes_nothing(event: Event) -> None:
    assert apply(EMPTY, event).line is EMPTY.line


def test_reading_and_modes_can_change_in_the_middle_of_a_line() -> None:
    line = tuple(typed(cents) for cents in (7600.0, 7400.0, 7200.0, 6900.0))
    session = played(LineEdited(0.0, 0, 0, line), ReadingChosen(1.0, PitchReading.FINAL, 6200.0))
    assert set(session.model.final_units.tolist()) == {-31}
    session = played(
        ReadingChosen(1.5, PitchReading.ANY), ModesRestricted(2.0, ("makam/rast",)), session=session
    )
    assert [mode.slug for mode in session.model.modes] == ["rast"]
    assert len(session.model.final_units) == 53
    assert session.line.items == line


def test_a_target_is_chosen_and_given_up() -> None:
    session = played(TargetChosen(0.0, "makam/saba"))
    assert session.target is not None
    assert session.target.slug == "saba"
    assert played(TargetChosen(1.0, None), session=session).target is None


def test_an_unknown_mode_is_refused_with_the_nearest_names() -> None:
    with pytest.raises(UnknownModeError, match="did you mean 'huseyni'"):
        apply(EMPTY, TargetChosen(0.0, "husseyni"))


# --- laws --------------------------------------------------------------------------------------

PITCHES = st.sampled_from([6700.0, 6900.0, 7081.0, 7200.0, 7400.0, 7600.0])


@st.composite
def performances(draw: st.DrawFn) -> list[Event]:
    """Draw notes, edits and undos in a row, at rising times."""
    events: list[Event] = []
    at_s = 0.0
    for _ in range(draw(st.integers(1, 12))):
        at_s += draw(st.sampled_from([0.01, 0.2, 0.3, 0.9, 1.2, 3.0]))
        voice = draw(st.integers(60, 62))
        place = draw(st.integers(0, 6))
        events.append(
            draw(
                st.one_of(
                    st.builds(NoteOn, st.just(at_s), st.just(voice), PITCHES, st.just(KEYS)),
                    st.just(NoteOff(at_s, voice)),
                    st.builds(PitchMoved, st.just(at_s), st.just(voice), PITCHES, st.just(InputKind.TUNED)),
                    st.just(Undone(at_s)),
                    st.just(Redone(at_s)),
                    st.builds(LineEdited, st.just(at_s), st.just(place), st.just(place + 1), st.just(())),
                    st.builds(
                        LineEdited,
                        st.just(at_s),
                        st.just(place),
                        st.just(place),
                        st.tuples(st.builds(typed, PITCHES)),
                    ),
                )
            )
        )
    return events


def same(a: SessionState, b: SessionState) -> bool:
    equal = a.line.items == b.line.items and a.line.heard == b.line.heard and a.past == b.past
    return equal and all(
        np.allclose(x.loglik, y.loglik, atol=1e-9) for x, y in zip(a.line.states, b.line.states, strict=True)
    )


@settings(max_examples=60, deadline=None)
@given(performances(), st.lists(st.floats(0.0, 40.0), max_size=12))
def test_looking_at_the_clock_in_between_changes_nothing(events: list[Event], looks: list[float]) -> None:
    end = max([event.at_s for event in events] + looks)
    looked = sorted([*events, *(TimePassed(at_s) for at_s in looks)], key=lambda event: event.at_s)
    assert same(played(*events, TimePassed(end)), played(*looked, TimePassed(end)))


@settings(max_examples=60, deadline=None)
@given(performances())
def test_the_line_is_scored_as_if_it_had_been_heard_at_once(events: list[Event]) -> None:
    session = played(*events)
    state = start(session.model)
    for heard in hear(session.line.items):
        state = advance(session.model, state, heard)
    assert session.line.heard == hear(session.line.items)
    assert len(session.line.states) == len(session.line.heard) + 1
    assert np.allclose(
        mode_posterior(session.model, session.line.states[-1]), mode_posterior(session.model, state)
    )


@settings(max_examples=60, deadline=None)
@given(performances(), st.integers(0, 12), st.integers(0, 12))
def test_a_replay_is_the_session_that_was_played(events: list[Event], cut: int, fresh: int) -> None:
    at_s = events[min(fresh, len(events) - 1)].at_s
    chosen = FreshStart(at_s), ReadingChosen(at_s, PitchReading.ANY), ModesRestricted(at_s, ONLY[:2])
    whole = [*events[:fresh], *chosen, *events[fresh:]]
    replayed = replay(played(*whole[:cut]), whole[cut:])
    assert same(replayed, played(*whole))
    assert (replayed.model.reading, replayed.taking) == (PitchReading.ANY, played(*whole).taking)


@settings(max_examples=60, deadline=None)
@given(performances())
def test_undoing_everything_gives_the_empty_line(events: list[Event]) -> None:
    session = played(*events)
    for _ in range(len(events) + 1):
        session = apply(session, Undone(session.now_s))
    assert session.line.items == ()


@settings(max_examples=40, deadline=None)
@given(performances())
def test_apply_leaves_the_session_it_was_given_alone(events: list[Event]) -> None:
    session = played(*events[:-1])
    before = replace(session)
    items, logliks = session.line.items, [state.loglik.copy() for state in session.line.states]
    apply(session, events[-1])
    assert session.line.items is items
    assert session.line is before.line
    assert all(np.array_equal(a, b.loglik) for a, b in zip(logliks, session.line.states, strict=True))


def played_notes(n_notes: int, session: SessionState = EMPTY) -> SessionState:
    for number in range(n_notes):
        key = (69, 71, 72, 74)[number % 4]
        session = apply(session, NoteOn(number * 0.5, key, 100.0 * key, KEYS))
        session = apply(session, NoteOff(number * 0.5 + 0.4, key))
    return session


def test_a_line_that_has_grown_too_long_begins_anew_with_its_newest_notes(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.setattr("melodycoach.core.session.LONGEST_LINE", 30)
    monkeypatch.setattr("melodycoach.core.session.SHORTEST_LIMIT", 20)
    monkeypatch.setattr("melodycoach.core.session.KEPT_OF_LINE", 10)
    full = played_notes(30)
    assert len(full.line.items) == 30
    one_more = played_notes(31)
    assert one_more.line.items == (*full.line.items[20:], one_more.line.last_note)
    assert one_more.line.heard == hear(one_more.line.items)
    assert apply(one_more, Undone(99.0)).line.items == full.line.items
    written = apply(EMPTY, LineEdited(0.0, 0, 0, (typed(6900.0),) * 40))
    assert len(played_notes(1, written).line.items) == 41
    anywhere = begin(PACK, ONLY, PitchReading.ANY)  # 53 finals of each mode
    assert len(played_notes(21, anywhere).line.items) == 11


def test_a_line_with_a_long_past_is_replayed_as_it_was_played(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("melodycoach.core.session.LONGEST_LINE", 30)
    monkeypatch.setattr("melodycoach.core.session.SHORTEST_LIMIT", 20)
    monkeypatch.setattr("melodycoach.core.session.KEPT_OF_LINE", 10)
    events: list[Event] = []
    for number in range(75):
        events += [
            NoteOn(number * 0.5, 60 + number % 5, 6000.0 + 100 * (number % 5), KEYS),
            NoteOff(number * 0.5 + 0.4, 60 + number % 5),
        ]
    assert replay(EMPTY, events).line.items == played(*events).line.items


TYPED_ITEMS = st.lists(
    st.one_of(
        st.sampled_from([Mark.BREATH, Mark.PHRASE_END, Mark.BAR, Silence(0.8, 1.0)]),
        st.builds(
            lambda key, beats: Note(100.0 * key, 0.0, 0.8 * beats, InputKind.TYPED, beats=beats),
            st.sampled_from([69, 71, 72, 74]),
            st.sampled_from([0.5, 1.0, 2.0]),
        ),
    ),
    max_size=24,
).map(tuple)


@given(TYPED_ITEMS, TYPED_ITEMS, st.integers(0, 24), st.integers(0, 24))
@settings(max_examples=150)
def test_a_line_that_is_edited_is_the_line_written_afresh(
    before: tuple[Item, ...], put: tuple[Item, ...], start_at: int, stop_at: int
) -> None:
    old = rewrite(EMPTY.model, empty_line(EMPTY.model), before)
    edited = (*before[:start_at], *put, *before[max(start_at, stop_at) :])
    found, fresh = (rewrite(EMPTY.model, line, edited) for line in (old, empty_line(EMPTY.model)))
    assert (found.items, found.heard, found.last_note_at) == (fresh.items, fresh.heard, fresh.last_note_at)
    assert len(found.states) == len(fresh.states)
    assert np.allclose(found.states[-1].loglik, fresh.states[-1].loglik)
