"""Speed, as a player feels it. Slow tests: each takes the best of a few tries, since machines are noisy."""

from __future__ import annotations

import random
import statistics
import subprocess
import sys
import time
from typing import TYPE_CHECKING

import numpy as np
import pytest

from melodycoach.core.event import LineEdited, NoteOn, PitchReading
from melodycoach.core.model import build_model
from melodycoach.core.ngram import Counts, Token, count_tokens
from melodycoach.core.note import Heard, InputKind, Note
from melodycoach.core.scorer import advance, start
from melodycoach.core.session import apply, begin
from melodycoach.sources.pack_file import load_pack

if TYPE_CHECKING:
    from collections.abc import Callable

    from pseudo_terminal import PseudoTerminal

    from melodycoach.core.model import ScoringModel

pytestmark = pytest.mark.slow

PACK = load_pack("makam")
TRIES = 4


def best(measure: Callable[[], float], enough: float) -> float:
    """Measure a few times, until it is quick enough; give the quickest, in seconds."""
    times = []
    for _ in range(TRIES):
        times.append(measure())
        if times[-1] <= enough:
            break
    return min(times)


def note_s(model: ScoringModel) -> float:
    """Give the median time of one note, on a line of 400."""
    line = [
        Heard(6900 + 1200 / 53 * units, InputKind.TYPED, 0.35, False, False)
        for units in (31, 22, 31, 39, 44, 39, 31, 22, 13, 8, 0, -9, 0)
    ] * 31
    state, times = start(model), []
    for heard in line:
        began_s = time.perf_counter()
        state = advance(model, state, heard)
        times.append(time.perf_counter() - began_s)
    return statistics.median(times)


def trigrams() -> Counts:
    """Count a made-up collection, so that the model has tables of order 3 for every mode."""
    chance = random.Random(1)
    by_mode = {}
    for mode in PACK.modes:
        tokens = [Token(chance.choice(mode.degrees) % 53, 0.4, False) for _ in range(1000)]
        by_mode[mode.id] = count_tokens([tokens], np.arange(53), 3)
    return Counts(by_mode)


@pytest.mark.parametrize(
    ("reading", "most_s"), [(PitchReading.WRITTEN, 200e-6), (PitchReading.ANY, 2e-3)], ids=str
)
def test_one_note_against_the_whole_pack_at_order_3_is_quick(reading: PitchReading, most_s: float) -> None:
    model = build_model(PACK, PACK.modes, reading, counts=trigrams())
    assert model.order == 3
    assert best(lambda: note_s(model), most_s) <= most_s


def test_a_note_costs_no_more_after_ten_thousand_of_them() -> None:
    note = Note(6900.0, 0.0, 0.8, InputKind.TYPED, beats=1.0)
    session = apply(begin(PACK), LineEdited(0.0, 0, 0, (note,) * 10_000))

    def one_more_s() -> float:
        times = []
        for _ in range(50):
            began_s = time.perf_counter()
            apply(session, NoteOn(1.0, 69, 6900.0, InputKind.KEYS))
            times.append(time.perf_counter() - began_s)
        return statistics.median(times)

    assert best(one_more_s, 2e-3) <= 2e-3


def test_help_comes_at_once() -> None:
    def help_s() -> float:
        began_s = time.perf_counter()
        subprocess.run([sys.executable, "-m", "melodycoach", "--help"], capture_output=True, check=True)
        return time.perf_counter() - began_s

    assert best(help_s, 0.2) <= 0.2


def test_the_first_frame_is_there_within_a_second(open_terminal: Callable[..., PseudoTerminal]) -> None:
    def frame_s() -> float:
        began_s = time.perf_counter()
        open_terminal("listen", "--no-log").wait_for("nothing heard yet")
        return time.perf_counter() - began_s

    assert best(frame_s, 1.0) <= 1.0
