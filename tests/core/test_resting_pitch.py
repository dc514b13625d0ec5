"""A bent note is where it rests: slides at their goal, vibrato at its middle, and no more than one note."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.core.note import InputKind
from melodycoach.core.resting_pitch import (
    EARLY_S,
    MOST_PLACES,
    NEAR_CENTS,
    PitchPath,
    bend,
    rests_at,
    strike,
)

KEYS, TUNED = InputKind.KEYS, InputKind.TUNED


def bent(*bends: tuple[float, float], struck: float = 6900.0) -> PitchPath:
    """Give the path of a key struck at 0, bent at these times to these pitches."""
    path = strike(struck, KEYS, 0.0)
    for at_s, pitch_cents in bends:
        path = bend(path, pitch_cents, TUNED, at_s)
    return path


def slide(
    start_s: float, stop_s: float, low: float, high: float, step_s: float = 0.005
) -> list[tuple[float, float]]:
    n = round((stop_s - start_s) / step_s)
    return [(start_s + (stop_s - start_s) * k / n, low + (high - low) * k / n) for k in range(1, n + 1)]


def test_a_key_that_is_not_bent_is_where_it_was_struck() -> None:
    assert rests_at(strike(7100.0, KEYS, 3.0), 9.0) == (7100.0, KEYS)


@pytest.mark.parametrize("cents", [22.64, 90.57, 200.0, 1200.0])
@pytest.mark.parametrize("begins_s", [0.02, 0.1, 0.3])
def test_a_slide_is_at_its_goal_once_it_rests_there(cents: float, begins_s: float) -> None:
    path = bent(*slide(begins_s, begins_s + 0.15, 6900.0, 6900.0 + cents))
    assert rests_at(path, begins_s + 0.5)[0] == pytest.approx(6900.0 + cents)


def test_a_wheel_let_go_at_the_end_of_a_note_takes_nothing_away() -> None:
    path = bent((0.05, 6880.0), (0.55, 6900.0))
    assert rests_at(path, 0.65) == (6880.0, TUNED)


def test_a_note_that_goes_back_to_its_key_is_a_plain_key_again() -> None:
    path = bent(*slide(0.1, 0.2, 6900.0, 6850.0))
    path = bend(path, 6900.0, KEYS, 0.25)
    assert rests_at(path, 0.8) == (6900.0, KEYS)


def test_of_two_rests_of_one_length_the_later_one_is_the_note() -> None:
    assert rests_at(bent((0.4, 7000.0)), 0.8)[0] == 7000.0


def test_a_short_last_rest_is_an_ending_and_not_the_note() -> None:
    assert rests_at(bent((1.0, 7000.0)), 1.3)[0] == 6900.0


@pytest.mark.parametrize("depth", [8.0, 20.0, 30.0, 45.0])
@pytest.mark.parametrize("rate_hz", [4.0, 5.5, 7.0])
def test_a_vibrato_is_at_its_middle_and_never_at_another_perde(depth: float, rate_hz: float) -> None:
    comma = 1200 / 53
    path, worst = strike(6900.0, KEYS, 0.0), 0.0
    for n in range(1, 300):  # after a straight fifth of a second, as singers and players begin it
        at_s = 0.2 + 0.005 * n
        grown = min(n / 60, 1.0)
        path = bend(path, 6900.0 + grown * depth * math.sin(math.tau * rate_hz * (at_s - 0.2)), TUNED, at_s)
        worst = max(worst, abs(rests_at(path, at_s)[0] - 6900.0))
    assert worst < comma / 2
    assert rests_at(path, 1.7)[0] == pytest.approx(6900.0, abs=4.0)


def test_a_bend_sent_just_after_the_key_is_how_it_was_struck() -> None:
    path = bent((EARLY_S / 2, 6880.0))
    assert rests_at(path, EARLY_S / 2) == (6880.0, TUNED)
    assert path.places == {}


def test_places_nearer_than_a_vibrato_are_one_place() -> None:
    # 0.3 s on the key, 0.2 s a comma above, 0.25 s an octave above: the two near ones are the note
    path = bent((0.3, 6900.0 + NEAR_CENTS - 5), (0.5, 8100.0))
    assert rests_at(path, 0.6)[0] < 7000.0


@given(st.lists(st.tuples(st.floats(0.0, 0.5), st.floats(0.0, 12700.0)), max_size=30), st.floats(0.0, 9.0))
def test_the_pitch_is_always_one_that_has_sounded(steps: list[tuple[float, float]], wait_s: float) -> None:
    at_s, path, heard = 0.0, strike(6900.0, KEYS, 0.0), {6900.0}
    for step_s, pitch_cents in steps:
        at_s += step_s
        path = bend(path, pitch_cents, TUNED, at_s)
        heard.add(pitch_cents)
        assert rests_at(path, at_s)[0] in heard
    assert rests_at(path, at_s + wait_s)[0] in heard


def test_a_path_stays_small_whatever_is_sent() -> None:
    path = strike(6900.0, KEYS, 0.0)
    for n in range(1, 3000):
        path = bend(path, (n * 7919) % 12800, TUNED, 0.001 * n)
    assert len(path.places) <= MOST_PLACES
    path = bend(path, 6400.0, TUNED, 3.1)
    assert rests_at(path, 9.0)[0] == 6400.0
