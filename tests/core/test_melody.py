"""One line out of what is played: the same from all events at once as from a live session.

The rules are those of docs/playing.md; each row of its table has its tests here.
"""

import random
from itertools import pairwise, permutations

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from melodycoach.core.event import Event, FreshStart, NoteOff, NoteOn, PitchMoved, TimePassed
from melodycoach.core.line_rules import (
    CHORD_S,
    DOUBLING_S,
    DRONE_NOTES,
    HELD_S,
    MOST_DRONES,
    MOST_KEYS,
    OUTLIVE_S,
    OVERLAP_S,
    LineRules,
    Taking,
)
from melodycoach.core.melody import Step, let_go, take, take_melody, take_melody_indexed
from melodycoach.core.note import InputKind, Mark, Note
from melodycoach.core.parameters import ScoringParameters
from melodycoach.core.session import apply, begin
from melodycoach.sources.midi_pitch import PitchTracker
from melodycoach.sources.pack_file import load_pack

KEYS, TUNED = InputKind.KEYS, InputKind.TUNED
PACK = load_pack("makam")
TWO = ("makam/rast", "makam/hicaz")
EMPTY = begin(PACK, TWO)
SPLIT = LineRules(split_key=60)


def keys(*played: tuple[int, float, float]) -> list[Event]:
    """Give the events of keys that are down from one time to another, by time; ups before downs."""
    ups: list[Event] = [NoteOff(up_s, key) for key, _, up_s in played]
    downs: list[Event] = [NoteOn(down_s, key, 100.0 * key, KEYS) for key, down_s, _ in played]
    return sorted([*ups, *downs], key=lambda event: event.at_s)


def line_of(
    *played: tuple[int, float, float], rules: LineRules | None = None
) -> list[tuple[int, float, float]]:
    """Give the notes of the line as keys, each with its start and its end."""
    items = take_melody(keys(*played), rules=rules)
    return [
        (round(note.pitch_cents / 100), round(note.onset_s, 6), round(note.onset_s + note.duration_s, 6))
        for note in items
        if isinstance(note, Note)
    ]


def pitches(*played: tuple[int, float, float], rules: LineRules | None = None) -> list[int]:
    return [key for key, _, _ in line_of(*played, rules=rules)]


# --- laws --------------------------------------------------------------------------------------

STEPS = st.sampled_from(
    [0.0, CHORD_S / 2, 0.02, OUTLIVE_S, OVERLAP_S / 2, 0.25, 0.9, 1.5, DOUBLING_S, 3.0, HELD_S]
)
VOICES = st.sampled_from([48, 57, 60, 61, 62, 69, 72])


@st.composite
def performances(draw: st.DrawFn) -> list[Event]:
    """Keys up and down, bends and waits, in any order a player or a file may send them."""
    at_s, events = 0.0, []
    for _ in range(draw(st.integers(0, 20))):
        at_s += draw(STEPS)
        voice = draw(VOICES)
        kind = draw(st.sampled_from(["on", "on", "on", "off", "off", "moved", "wait"]))
        made: dict[str, Event] = {
            "on": NoteOn(at_s, voice, 100.0 * voice, KEYS),
            "off": NoteOff(at_s, voice),
            "moved": PitchMoved(at_s, voice, 100.0 * voice - draw(st.sampled_from([0, 23, 90])), TUNED),
            "wait": TimePassed(at_s),
        }
        events.append(made[kind])
    return events


RULES = st.sampled_from([LineRules(), SPLIT])


@given(performances(), RULES)
@settings(max_examples=200)
def test_a_recording_gives_the_line_that_a_session_has_after_the_same_events(
    events: list[Event], rules: LineRules
) -> None:
    session = begin(PACK, TWO, rules=rules)
    for event in events:
        session = apply(session, event)
    session = apply(session, TimePassed(session.now_s))  # a note may have grown at a bend
    assert take_melody(events, rules=rules) == session.line.items


@given(performances(), st.lists(st.floats(0.0, 40.0), max_size=12), RULES)
@settings(max_examples=200)
def test_looking_at_the_clock_in_between_changes_no_note(
    events: list[Event], looks: list[float], rules: LineRules
) -> None:
    end_s = max([event.at_s for event in events] + looks, default=0.0)
    looked = sorted([*events, *(TimePassed(at_s) for at_s in looks)], key=lambda event: event.at_s)
    assert take_melody(events, end_s, rules) == take_melody(looked, end_s, rules)


@given(performances(), RULES)
@settings(max_examples=200)
def test_notes_follow_each_other_and_none_sounds_into_the_next(events: list[Event], rules: LineRules) -> None:
    items, spans = take_melody_indexed(events, rules=rules)
    notes = [item for item in items if isinstance(item, Note)]
    assert len(spans) == len(notes)
    for note, (first, last) in zip(notes, spans, strict=True):
        assert events[first].at_s == pytest.approx(note.onset_s, abs=1e-9)
        assert events[last].at_s == pytest.approx(note.onset_s + note.duration_s, abs=1e-9)
    for note, following in pairwise(notes):
        assert note.onset_s + note.duration_s <= following.onset_s + 1e-9


@given(performances())
@settings(max_examples=100)
def test_what_is_remembered_of_the_playing_stays_small(events: list[Event]) -> None:
    taking = Taking()
    for number, event in enumerate([*events, *(NoteOn(99.0 + n, n, 100.0 * n, KEYS) for n in range(128))]):
        taking, _ = take(taking, event)
        assert len(taking.keys) <= min(MOST_KEYS, number + 1)
        assert len(taking.drones) <= MOST_DRONES


# --- newest note wins --------------------------------------------------------------------------


def test_the_newest_note_wins_and_ends_the_one_before() -> None:
    assert line_of((69, 0.0, 1.0), (71, 0.5, 1.5)) == [(69, 0.0, 0.5), (71, 0.5, 1.5)]


def test_a_key_that_is_still_held_does_not_come_back() -> None:
    assert pitches((69, 0.0, 5.0), (71, 0.5, 1.0)) == [69, 71]


def test_the_same_key_again_is_a_note_again() -> None:
    assert line_of((69, 0.0, 0.2), (69, 0.2, 0.5)) == [(69, 0.0, 0.2), (69, 0.2, 0.5)]


def test_a_key_struck_again_without_having_come_up_is_a_note_again() -> None:
    events = [NoteOn(0.0, 69, 6900.0, KEYS), NoteOn(0.5, 69, 6900.0, KEYS), NoteOff(0.9, 69)]
    assert [note.duration_s for note in take_melody(events) if isinstance(note, Note)] == [0.5, 0.4]


def test_a_key_that_bounces_is_one_note() -> None:
    assert line_of((69, 0.0, 0.01), (69, 0.02, 0.5)) == [(69, 0.0, 0.5)]


def test_a_short_note_is_a_note_and_weighs_little() -> None:
    assert line_of((69, 0.0, 0.02), (71, 0.02, 0.42)) == [(69, 0.0, 0.02), (71, 0.02, 0.42)]
    power = ScoringParameters().length_power
    assert (0.02 / 0.4) ** power == pytest.approx(0.1, abs=0.01)  # a tenth of a note twenty times as long


# --- chords and grace notes --------------------------------------------------------------------


@pytest.mark.parametrize("order", list(permutations((60, 64, 67))))
@pytest.mark.parametrize("spread_s", [0.0, CHORD_S / 2 - 0.001])
def test_of_keys_struck_together_the_top_one_is_the_melody(order: tuple[int, ...], spread_s: float) -> None:
    struck = [(key, 1.0 + n * spread_s, 2.0) for n, key in enumerate(order)]
    assert line_of(*struck) == [(67, 1.0, 2.0)]


@pytest.mark.parametrize("order", list(permutations((60, 64, 67))))
def test_a_short_chord_let_go_unevenly_is_one_note(order: tuple[int, ...]) -> None:
    ups = (0.1, 0.12, 0.14)
    struck = [(key, 0.01 * n, ups[(n + key) % 3]) for n, key in enumerate(order)]
    assert pitches(*struck) == [67]


def test_a_key_struck_a_little_later_is_a_note_of_its_own() -> None:
    assert pitches((67, 1.0, 2.0), (64, 1.0 + CHORD_S + 0.01, 2.0)) == [67, 64]


def test_a_note_released_before_the_next_is_struck_with_none() -> None:
    assert pitches((67, 1.0, 1.005), (64, 1.01, 2.0)) == [67, 64]


def test_a_grace_note_above_that_is_still_down_does_not_hide_its_main_note() -> None:
    assert line_of((71, 0.0, 0.06), (69, 0.02, 0.8)) == [(71, 0.0, 0.06), (69, 0.06, 0.8)]


def test_a_grace_note_below_that_is_still_down_gives_way_to_its_main_note() -> None:
    assert line_of((69, 0.0, 0.06), (71, 0.02, 0.8)) == [(71, 0.0, 0.8)]


def test_a_chord_under_a_note_that_was_held_does_not_come_back() -> None:
    struck = (60, 0.0, 3.0), (64, 0.0, 3.0), (72, 0.0, OVERLAP_S + 0.05)
    assert pitches(*struck) == [72]


def test_a_key_that_waits_is_forgotten_when_the_line_goes_on() -> None:
    # 72 is let go early; 74 follows within the time in which the chord below would be heard
    assert pitches((60, 0.0, 3.0), (72, 0.0, 0.1), (74, 0.12, 0.5)) == [72, 74]


def test_what_waited_is_heard_with_the_bend_that_it_has() -> None:
    events = [
        *keys((71, 0.0, 0.06), (69, 0.02, 0.8))[:-1],
        PitchMoved(0.07, 69, 6880.0, TUNED),
        PitchMoved(0.2, 69, 6881.0, TUNED),
        NoteOff(0.8, 69),
    ]
    second = take_melody(sorted(events, key=lambda event: event.at_s))[1]
    assert isinstance(second, Note)
    assert (second.pitch_cents, second.onset_s) == (6881.0, 0.06)


# --- doubled octaves ---------------------------------------------------------------------------


@pytest.mark.parametrize("octaves", [1, 2])
@pytest.mark.parametrize("late_s", [0.0, CHORD_S + 0.01, DOUBLING_S - 0.01])
@pytest.mark.parametrize("leads", ["upper", "lower"])
def test_a_line_doubled_in_octaves_is_one_line(octaves: int, late_s: float, leads: str) -> None:
    upper, lower = (0.0, late_s) if leads == "upper" else (late_s, 0.0)
    played = []
    for n, key in enumerate((69, 71, 72, 71, 69)):
        played += [
            (key, 0.3 * n + upper, 0.3 * n + upper + 0.28),
            (key - 12 * octaves, 0.3 * n + lower, 0.3 * n + lower + 0.28),
        ]
    assert pitches(*played) == [69, 71, 72, 71, 69]


def test_an_octave_struck_after_its_note_is_a_leap() -> None:
    assert pitches((69, 0.0, 1.0), (81, DOUBLING_S + 0.02, 1.0)) == [69, 81]


def test_a_seventh_struck_in_that_time_is_a_note() -> None:
    assert pitches((69, 0.0, 1.0), (79, DOUBLING_S - 0.01, 1.0)) == [69, 79]


# --- two hands ---------------------------------------------------------------------------------


def test_what_sounds_below_the_split_is_left_out() -> None:
    played = (69, 0.0, 1.0), (52, 0.2, 0.9), (58, 0.4, 0.9), (60, 0.5, 1.0), (59, 0.8, 2.0)
    assert pitches(*played) == [69, 58, 60, 59]
    assert pitches(*played, rules=SPLIT) == [69, 60]


def test_a_key_below_the_split_ends_nothing() -> None:
    assert line_of((69, 0.0, 1.0), (59, 0.5, 2.0), rules=SPLIT) == [(69, 0.0, 1.0)]


def test_the_split_goes_by_the_key_and_not_by_its_tuning() -> None:
    events = [NoteOn(0.0, 60, 5977.0, TUNED), NoteOff(0.5, 60), NoteOn(1.0, 59, 5923.0, TUNED)]
    assert [note.pitch_cents for note in take_melody(events, rules=SPLIT) if isinstance(note, Note)] == [
        5977.0
    ]


def test_keys_an_octave_or_more_below_a_held_note_accompany_it() -> None:
    assert line_of((69, 0.0, 2.0), (57, 0.5, 1.0), (52, 1.0, 1.5)) == [(69, 0.0, 2.0)]


def test_a_leap_down_played_legato_is_heard() -> None:
    assert line_of((81, 0.0, 0.6), (69, 0.5, 1.5)) == [(81, 0.0, 0.6), (69, 0.6, 1.5)]


def test_a_key_that_is_stuck_hides_nothing_for_long() -> None:
    late_s = HELD_S + 0.1
    assert pitches((96, 0.0, 99.0), (69, late_s, late_s + 1), (71, late_s + 1, late_s + 2)) == [96, 69, 71]


def drone_and_line(*more: tuple[int, float, float], drone: int = 57) -> list[int]:
    """A drone that is held under four notes, released with the last of them, and then more."""
    line = [(key, 0.6 * n + 0.6, 0.6 * n + 1.1) for n, key in enumerate((69, 71, 72, 74))]
    assert len(line) > DRONE_NOTES
    return pitches((drone, 0.0, 2.9), *line, *more)


def test_a_held_drone_is_no_note_again_when_the_line_ends() -> None:
    assert drone_and_line() == [57, 69, 71, 72, 74]


def test_a_drone_struck_again_an_octave_below_the_line_is_no_note_even_between_its_notes() -> None:
    assert drone_and_line((57, 3.0, 6.0), (72, 3.2, 3.8), (57, 3.9, 6.0)) == [57, 69, 71, 72, 74, 72]


def test_a_drone_near_the_line_is_no_note_while_a_higher_one_sounds() -> None:
    more = (72, 3.2, 4.2), (67, 3.6, 5.0), (71, 4.3, 4.8)
    assert drone_and_line(*more, drone=67) == [67, 69, 71, 72, 74, 72, 71]


def test_the_line_may_come_down_to_its_drone() -> None:
    more = (71, 3.2, 3.9), (67, 3.8, 5.0)
    assert drone_and_line(*more, drone=67)[-2:] == [71, 67]
    apart = (71, 3.2, 3.7), (67, 3.8, 5.0)
    assert drone_and_line(*apart, drone=67)[-2:] == [71, 67]


def test_a_short_held_key_is_no_drone() -> None:
    quick = [(key, 0.2 * n + 0.2, 0.2 * n + 0.3) for n, key in enumerate((69, 71, 72, 74))]
    assert pitches((67, 0.0, 1.0), *quick, (72, 1.2, 2.2), (67, 1.6, 3.0))[-2:] == [72, 67]


def test_a_fresh_start_forgets_the_drones() -> None:
    taking = Taking(drones=(5700.0,))
    taking, changes = take(taking, FreshStart(1.0))
    assert (taking.drones, changes) == ((), ())


def test_the_sustain_pedal_prolongs_no_note() -> None:
    tracker = PitchTracker()
    sent = [("B0 40 7F", 0.0), ("90 45 50", 0.0), ("80 45 00", 0.5), ("B0 40 00", 3.0)]
    events = [event for data, at_s in sent for event in tracker.decode(bytes.fromhex(data), at_s)]
    [note, mark] = take_melody(events, end_s=3.0)
    assert (note, mark) == (Note(6900.0, 0.0, 0.5, KEYS), Mark.PHRASE_END)


def test_no_note_off_is_needed_to_end_a_line() -> None:
    held = [NoteOn(0.0, 60, 6000.0, KEYS)]
    assert take_melody(held, end_s=1.5) == (Note(6000.0, 0.0, 1.5, KEYS),)
    assert take_melody([NoteOff(1.0, 60)]) == ()
    assert take_melody([]) == ()


# --- bends -------------------------------------------------------------------------------------


def test_a_slide_is_one_note_at_its_goal() -> None:
    slide: list[Event] = [NoteOn(0.0, 69, 6900.0, KEYS)]
    slide += [PitchMoved(0.1 + 0.01 * n, 69, 6900.0 + 10.0 * n, TUNED) for n in range(1, 21)]
    assert take_melody([*slide, NoteOff(0.6, 69)]) == (Note(7100.0, 0.0, 0.6, TUNED),)


def test_a_bend_of_a_key_that_is_not_the_melody_changes_no_note() -> None:
    events = [*keys((69, 0.0, 1.0), (71, 0.2, 1.0))[:2], PitchMoved(0.4, 69, 6850.0, TUNED)]
    assert [note.pitch_cents for note in take_melody(events) if isinstance(note, Note)] == [6900.0, 7100.0]


def test_a_flood_of_bends_that_change_nothing_touches_the_line_rarely() -> None:
    random.seed(1)
    taking, _ = take(Taking(), NoteOn(0.0, 69, 6900.0, KEYS))
    said = 0
    for n in range(3000):
        taking, changes = take(taking, PitchMoved(0.001 * (n + 1), 69, 6900.0 + random.gauss(0, 1), TUNED))
        said += len(changes)
    assert said < 50
    taking, changes = take(taking, TimePassed(3.5))
    [(step, note)] = changes
    assert isinstance(note, Note)
    assert (step, note.duration_s) == (Step.CHANGED, 3.5)
    assert note.pitch_cents == pytest.approx(6900.0, abs=2.5)


def test_a_bend_may_be_what_lets_a_waiting_key_be_heard() -> None:
    taking = Taking()
    for event in keys((71, 0.0, 0.06), (69, 0.02, 9.0))[:-1]:
        taking, _ = take(taking, event)
    taking, changes = take(taking, PitchMoved(0.2, 69, 6877.0, TUNED))
    assert [step for step, _ in changes] == [Step.BEGUN]
    taking, changes = take(taking, PitchMoved(1.2, 69, 6870.0, TUNED))
    assert [step for step, _ in changes] == [Step.CHANGED]


def test_a_bend_after_a_note_has_ended_changes_nothing_but_the_silence() -> None:
    taking, _ = take(Taking(), NoteOn(0.0, 69, 6900.0, KEYS))
    taking, _ = take(taking, NoteOff(0.5, 69))
    assert take(taking, PitchMoved(2.0, 69, 6850.0, TUNED))[1] == ((Step.SILENT, Mark.BREATH),)


def test_a_note_that_was_let_go_changes_no_more_but_its_key_is_known() -> None:
    taking, _ = take(Taking(), NoteOn(0.0, 69, 6900.0, KEYS))
    taking = let_go(taking)
    assert (taking.sounding, [key.voice for key in taking.keys]) == (None, [69])
    assert take(taking, PitchMoved(2.0, 69, 6850.0, TUNED))[1] == ()
    assert take(taking, TimePassed(9.0))[1] == ()


# --- where notes come from ---------------------------------------------------------------------


def test_each_note_knows_the_events_at_which_it_began_and_ended() -> None:
    events = [
        NoteOn(0.0, 60, 6000.0, KEYS),
        NoteOff(0.5, 60),
        NoteOn(0.5, 64, 6400.0, KEYS),
        NoteOn(0.5, 67, 6700.0, KEYS),
        NoteOff(1.0, 67),
    ]
    items, spans = take_melody_indexed(events)
    assert (len(items), spans) == (2, ((0, 1), (2, 4)))


def test_a_note_that_waited_began_when_the_one_above_it_came_up() -> None:
    events = keys((71, 0.0, 0.06), (69, 0.02, 0.8))
    assert take_melody_indexed(events)[1] == ((0, 2), (2, 3))
    assert take_melody_indexed(events[:-1], end_s=1.0)[1] == ((0, 2), (2, 2))
