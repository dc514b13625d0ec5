"""What a part of a line says by itself."""

import numpy as np
import pytest
from sheets import sheet_of

from melodycoach.core.model import build_model
from melodycoach.core.scorer import leading, mode_posterior
from melodycoach.core.session import empty_line, rewrite
from melodycoach.core.sheet import Place
from melodycoach.core.span import bar_bounds, phrase_bounds, span, span_state
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
MODEL = build_model(PACK, PACK.restrict(("rast", "hicaz", "huseyni")))
TEXT = "E5 D5 E5 F#5 G5 F#5 E5:2 , E5 D5 C5 B4-1 A4:2 G4 A4:3 ."
LINE = rewrite(MODEL, empty_line(MODEL), sheet_of(TEXT, PACK.names).items)
N = len(LINE.heard)


def test_the_whole_line_as_a_span_leans_as_the_line_does() -> None:
    assert span(MODEL, LINE.states, 1, N).leaning == leading(MODEL, LINE.states[-1])


@pytest.mark.parametrize("cut", range(1, N))
def test_the_evidence_of_two_parts_adds_up_to_that_of_the_line(cut: int) -> None:
    before, after = span_state(LINE.states, 1, cut), span_state(LINE.states, cut + 1, N)
    assert np.allclose(before.loglik + after.loglik, LINE.states[-1].loglik)
    assert before.weight + after.weight == pytest.approx(LINE.states[-1].weight)
    assert before.n_notes + after.n_notes == N


def test_only_the_phrase_end_that_ends_the_line_says_something_of_the_final() -> None:
    """A rest on the güçlü in mid-line must not make it the final (common practice: half cadences)."""
    items = sheet_of("E5 D5 E5:2 . D5 C5 A4:2 .", PACK.names).items
    line = rewrite(MODEL, empty_line(MODEL), items)
    assert span_state(line.states, 1, 3).latest == ()
    assert span_state(line.states, 4, 6).latest == line.states[-1].latest
    inner = mode_posterior(MODEL, span_state(line.states, 1, 3))
    assert not np.allclose(inner, mode_posterior(MODEL, line.states[3]))


def test_phrases_end_at_breaths_phrase_ends_and_whole_beats_of_rest() -> None:
    assert phrase_bounds(LINE.items) == ((1, 7), (8, N))
    rests = sheet_of("A4 -:1/2 B4 - C5", PACK.names).items
    assert phrase_bounds(rests) == ((1, 2), (3, 3))


def test_a_line_without_notes_has_no_phrases() -> None:
    assert phrase_bounds(sheet_of("- , .", PACK.names).items) == ()


def test_bars_are_told_apart_by_their_printed_names() -> None:
    places = [Place(bar) for bar in ("", "1", "1", "2", "2a", "2a")]
    assert bar_bounds(places) == (("1", 2, 3), ("2", 4, 4), ("2a", 5, 6))
