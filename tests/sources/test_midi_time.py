"""Ticks, seconds, bars and beats.

Outside sources: Standard MIDI Files 1.0 (RP-001) for the division word, the tempo of 120 and the 4/4
until the file says otherwise; mido's ``tick2second`` as an independent reckoning of one tempo.
"""

from __future__ import annotations

from fractions import Fraction

import mido
import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.sources.midi_time import BarMap, Division, TempoMap, TimeSignature

QUARTERS = Division(Fraction(480))


@pytest.mark.parametrize(
    ("word", "ticks_a_second"),
    [
        (0xE850, 24 * 80),  # -24 frames, 80 ticks each
        (0xE728, 25 * 40),  # a tick is a millisecond, the example of RP-001
        (0xE204, 30 * 4),
        (0xE350, Fraction(30_000, 1001) * 80),  # -29 stands for 29.97 frames
    ],
)
def test_a_division_in_film_frames_counts_seconds(word: int, ticks_a_second: Fraction) -> None:
    assert Division.of_word(word) == Division(Fraction(ticks_a_second), is_seconds=True)


@pytest.mark.parametrize("word", [0, 0xE700, 0xFF28, 0x8000])
def test_a_division_that_means_nothing_is_none(word: int) -> None:
    # no ticks; no parts of a frame; one frame a second; -128 frames a second
    assert Division.of_word(word) is None


def test_without_a_tempo_a_quarter_takes_half_a_second() -> None:
    assert TempoMap(QUARTERS).seconds(480) == 0.5


def test_a_tempo_holds_from_its_tick_on() -> None:
    # 960 ticks at 120 = 1 s, 480 at 60 = 1 s, 240 at 240 = 0.125 s
    times = TempoMap(QUARTERS, ((960, 1_000_000), (1440, 250_000)))
    assert [times.seconds(tick) for tick in (0, 959, 960, 1440, 1680)] == [0, 959 / 960, 1.0, 2.0, 2.125]


def test_of_two_tempos_at_one_tick_the_last_holds() -> None:
    assert TempoMap(QUARTERS, ((0, 1), (0, 1_000_000))).seconds(480) == 1.0


def test_film_frames_take_no_notice_of_tempos() -> None:
    division = Division.of_word(0xE728)
    assert division is not None
    assert TempoMap(division, ((0, 1), (10, 9_000_000))).seconds(1234) == 1.234


@given(st.integers(1, 0x7FFF), st.integers(1, 0xFFFFFF), st.integers(0, 10**9))
def test_one_tempo_agrees_with_mido(division: int, tempo: int, tick: int) -> None:
    times = TempoMap(Division(Fraction(division)), ((0, tempo),))
    assert times.seconds(tick) == pytest.approx(mido.tick2second(tick, division, tempo), rel=1e-12)


@given(st.lists(st.tuples(st.integers(0, 2000), st.integers(1, 0xFFFFFF))), st.integers(0, 3000))
def test_time_never_runs_backwards(tempos: list[tuple[int, int]], tick: int) -> None:
    times = TempoMap(QUARTERS, tuple(sorted(tempos, key=lambda change: change[0])))
    assert times.seconds(tick) < times.seconds(tick + 1)


def test_bars_are_counted_in_common_time_until_the_file_says_otherwise() -> None:
    bars = BarMap(480)
    assert [bars.place(tick) for tick in (0, 480, 1919, 1920, 2160)] == [
        (1, 1.0),
        (1, 2.0),
        (2, 1.0),  # one tick early, less than half a hundredth of a beat: it stands on the bar line
        (2, 1.0),
        (2, 1.5),
    ]


def test_beats_are_counted_in_the_unit_of_the_signature() -> None:
    # 9/8 at 480 a quarter: an eighth is 240 ticks, a bar 2160
    bars = BarMap(480, [TimeSignature(0, 9, 8)])
    assert [bars.place(tick) for tick in (240, 2040, 2160)] == [(1, 2.0), (1, 9.5), (2, 1.0)]


def test_a_signature_inside_a_bar_begins_a_new_one() -> None:
    # 1.5 bars of 4/4, so the second bar is cut short and 10/8 begins with bar 3
    bars = BarMap(480, [TimeSignature(2880, 10, 8)])
    assert bars.place(2879) == (2, 3.0)
    assert [bars.place(tick) for tick in (2880, 2880 + 2400)] == [(3, 1.0), (4, 1.0)]


def test_of_two_signatures_at_one_tick_the_last_holds() -> None:
    assert BarMap(480, [TimeSignature(0, 2, 4), TimeSignature(0, 3, 4)]).place(1440) == (2, 1.0)


@given(
    st.lists(
        st.builds(
            TimeSignature, st.integers(0, 9000), st.integers(1, 255), st.sampled_from([1, 2, 4, 8, 16, 128])
        )
    ),
    st.lists(st.integers(0, 20_000), min_size=2),
)
def test_bars_and_beats_never_run_backwards(signatures: list[TimeSignature], ticks: list[int]) -> None:
    bars = BarMap(480, sorted(signatures, key=lambda signature: signature.tick))
    places = [bars.place(tick) for tick in sorted(ticks)]
    assert places == sorted(places)
    assert all(bar >= 1 and beat >= 1 for bar, beat in places)
