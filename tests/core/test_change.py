from __future__ import annotations

import itertools
from statistics import median

import numpy as np
import pytest

from melodycoach.core.change import (
    NONE,
    ChangeState,
    advance_change,
    change_threshold,
    start_change,
)
from melodycoach.core.model import ScoringModel, build_model
from melodycoach.core.note import Heard, InputKind, hear
from melodycoach.core.parameters import ScoringParameters
from melodycoach.core.scorer import advance, announced, start
from melodycoach.sources.note_text import read_note_text
from melodycoach.sources.pack_file import load_pack

PARAMETERS = ScoringParameters()
EVEN = np.log([1 / 3] * 3)

# Lines of our own that state a makam by the book: where it opens, its half cadence, its close.
BY_THE_BOOK = {
    "rast": "rast dügâh segâh çargâh nevâ:3 , hüseynî nevâ çargâh segâh dügâh rast:4 .",
    "huseyni": "hüseynî:2 eviç gerdâniye eviç hüseynî:3 , nevâ çargâh hüseynî nevâ çargâh segâh dügâh:4 .",
    "hicaz": "dügâh dik-kürdî nim-hicaz nevâ:3 , eviç hüseynî:2 nevâ nim-hicaz dik-kürdî dügâh:4 .",
    "saba": "dügâh segâh çargâh:3 , hicaz çargâh segâh dügâh rast segâh dügâh:4 .",
    "segah": "segâh:2 kürdî segâh çargâh nevâ:3 , çargâh segâh dügâh segâh:4 .",
    "nihavend": "rast dügâh kürdî:2 çargâh nevâ:3 , nim-hisar nevâ çargâh kürdî dügâh rast:4 .",
}


def run(state: ChangeState, notes: list[list[float]], first: int = 1) -> ChangeState:
    for number, nats in enumerate(notes, first):
        state = advance_change(state, np.array(nats), 3, number, PARAMETERS)
    return state


def test_the_first_mode_is_announced_when_it_has_held_for_three_notes() -> None:
    notes = [[3.0, 0, 0]] * 3
    assert run(start_change(EVEN), notes[:2]).announced == NONE
    state = run(start_change(EVEN), notes)
    assert state.announced == 0
    assert (state.changed_at, state.seam_at) == (None, None)  # the first one is no change


def test_a_mode_that_does_not_hold_is_not_announced() -> None:
    state = run(start_change(EVEN), [[3.0, 0, 0], [0, 6.0, 0], [6.0, 0, 0], [0, 6.0, 0]])
    assert state.announced == NONE


def test_a_change_is_announced_when_the_gain_passes_the_threshold() -> None:
    # threshold: 2.3 + ln 2 = 2.99; a gain of 1 a note passes it at the third note
    assert change_threshold(3, PARAMETERS) == pytest.approx(2.3 + np.log(2))
    state = run(start_change(EVEN), [[3.0, 0, 0]] * 3)
    state = run(state, [[0, 1.0, 0]] * 2, first=4)
    assert state.announced == 0
    state = run(state, [[0, 1.0, 0]], first=6)
    assert (state.announced, state.changed_at, state.seam_at) == (1, 6, 4)


def test_a_gain_never_falls_below_nothing() -> None:
    state = run(start_change(EVEN), [[3.0, 0, 0]] * 9)
    assert state.gain.min() == 0
    state = run(state, [[0, 1.0, 0]] * 3, first=10)
    assert (state.announced, state.seam_at) == (1, 10)  # nine notes of the first do not delay it


def test_two_rivals_that_gain_alike_wait_until_one_leads_or_both_are_far_ahead() -> None:
    state = run(start_change(EVEN), [[3.0, 0, 0]] * 3)
    waiting = run(state, [[0, 1.0, 1.0]] * 5, first=4)
    assert waiting.announced == 0
    assert run(waiting, [[0, 1.0, 0]], first=9).announced == 1
    assert run(waiting, [[0, 1.0, 1.0]], first=9).announced in (1, 2)  # 6 is over twice 2.99


def test_another_final_of_the_same_mode_is_no_change_of_mode() -> None:
    # six hypotheses: three modes on two finals
    state = start_change(np.log([1 / 6] * 6))
    for number in range(1, 4):
        state = advance_change(state, np.array([4.0, 0, 0, 0, 0, 0]), 3, number, PARAMETERS)
    assert state.announced == 0
    for number in range(4, 10):
        state = advance_change(state, np.array([0.0, 0, 0, 1.0, 0, 0]), 3, number, PARAMETERS)
    assert state.announced == 3
    assert state.changed_at is None


def test_one_mode_alone_can_only_be_announced() -> None:
    state = start_change(np.zeros(1))
    for number in range(1, 30):
        state = advance_change(state, np.array([-2.0]), 1, number, PARAMETERS)
    assert (state.announced, state.changed_at) == (0, None)


def by_the_book(model: ScoringModel, slug: str, n_notes: int, kind: InputKind) -> list[Heard]:
    """Repeat a line until it has so many notes; the last note is just a note."""
    notes = hear(read_note_text(BY_THE_BOOK[slug], model.pack.names).items)
    cents = [note.pitch_cents if kind is InputKind.TYPED else round(note.pitch_cents, -2) for note in notes]
    line = [
        Heard(pitch, kind, note.length_s, note.rests, note.closes)
        for pitch, note in zip(cents, notes, strict=True)
    ]
    return [line[at % len(line)] for at in range(n_notes)]


@pytest.mark.parametrize("kind", [InputKind.TYPED, InputKind.KEYS])
def test_on_clean_spliced_lines_the_seam_is_found_within_twelve_notes(kind: InputKind) -> None:
    pack = load_pack("makam")
    model = build_model(pack, pack.restrict(tuple(BY_THE_BOOK)))
    delays = []
    for before, after in itertools.permutations(BY_THE_BOOK, 2):
        state = start(model)
        for note in by_the_book(model, before, 24, kind):
            state = advance(model, state, note)
        now = announced(model, state)
        assert now is not None
        assert model.modes[now].slug == before
        delay = 0
        for note in by_the_book(model, after, 24, kind):
            state = advance(model, state, note)
            delay += 1
            if announced(model, state) != now:
                break
        assert state.changed_at == 24 + delay, (before, after)
        assert state.change.seam_at is not None
        assert 18 <= state.change.seam_at <= 24 + delay
        delays.append(delay)
    assert median(delays) <= 8
    assert np.mean(np.array(delays) <= 12) >= 0.9


def test_a_clean_line_in_one_mode_raises_no_false_alarm() -> None:
    pack = load_pack("makam")
    model = build_model(pack, pack.modes)
    for slug in BY_THE_BOOK:
        state = start(model)
        for note in by_the_book(model, slug, 120, InputKind.TYPED):
            state = advance(model, state, note)
        assert state.changed_at is None, slug
