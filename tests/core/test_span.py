"""What a part of a line says by itself."""

import numpy as np
import pytest
from sheets import sheet_of

from melodycoach.core.model import build_model
from melodycoach.core.scorer import leading, mode_posterior
from melodycoach.core.session import empty_line, rewrite
from melodycoach.core.sheet import Place
from melodycoach.core.span import (
    LEAST_NOTES,
    bar_bounds,
    growing_spans,
    heard_instead,
    mode_probability,
    phrase_bounds,
    span,
)
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
MODEL = build_model(PACK, PACK.restrict(("rast", "hicaz", "huseyni")))
TEXT = "E5 D5 E5 F#5 G5 F#5 E5:2 , E5 D5 C5 B4-1 A4:2 G4 A4:3 ."
LINE = rewrite(MODEL, empty_line(MODEL), sheet_of(TEXT, PACK.names).items)
N = len(LINE.heard)


def test_the_whole_line_as_a_span_leans_as_the_line_does() -> None:
    assert span(MODEL, LINE.heard, 1, N).leaning == leading(MODEL, LINE.states[-1])
    assert np.allclose(span(MODEL, LINE.heard, 1, N).by_mode, mode_posterior(MODEL, LINE.states[-1]))


def test_a_span_says_the_same_wherever_it_stands_in_a_long_line() -> None:
    """What was heard before is expected again, so within the line the same notes would say less."""
    items = sheet_of(f"{TEXT} " * 12 + "A4", PACK.names).items
    line = rewrite(MODEL, empty_line(MODEL), items)
    first, late = (span(MODEL, line.heard, at, at + N - 1) for at in (N + 1, 10 * N + 1))
    assert np.allclose(first.by_mode, late.by_mode)


def test_growing_spans_are_the_spans_of_each_length() -> None:
    for part in growing_spans(MODEL, LINE.heard, 3, N):
        alone = span(MODEL, LINE.heard, 3, part.last)
        assert (part.first, part.leaning) == (3, alone.leaning)
        assert np.allclose(part.by_mode, alone.by_mode)


def test_only_the_phrase_end_that_ends_the_line_says_something_of_the_final() -> None:
    """A rest on the güçlü in mid-line must not make it the final (common practice: half cadences)."""
    heard = rewrite(MODEL, empty_line(MODEL), sheet_of("E5 D5 E5:2 . D5 C5 A4:2 .", PACK.names).items).heard
    ended = rewrite(MODEL, empty_line(MODEL), sheet_of("E5 D5 E5:2 .", PACK.names).items)
    unended = rewrite(MODEL, empty_line(MODEL), sheet_of("E5 D5 E5:2 ,", PACK.names).items)
    inner = span(MODEL, heard, 1, 3).by_mode
    assert np.allclose(inner, mode_posterior(MODEL, unended.states[-1]))
    assert not np.allclose(inner, mode_posterior(MODEL, ended.states[-1]))


def test_notes_are_heard_in_another_mode_when_that_is_clear_and_they_are_not_too_few() -> None:
    hicaz, rast = PACK.find("hicaz"), PACK.find("rast")
    heard = rewrite(
        MODEL, empty_line(MODEL), sheet_of("A4 Bb4+1 C#5 D5 C#5 Bb4+1 A4", PACK.names).items
    ).heard
    part = span(MODEL, heard, 1, len(heard))
    instead = heard_instead(MODEL, part, rast)
    assert instead is not None
    assert MODEL.mode_of(instead) is hicaz
    assert heard_instead(MODEL, part, hicaz) is None
    few = span(MODEL, heard, 2, LEAST_NOTES)
    assert few.leaning.decided
    assert heard_instead(MODEL, few, rast) is None
    assert mode_probability(MODEL, part, hicaz) == pytest.approx(part.leaning.p_best)
    assert mode_probability(MODEL, part, PACK.find("mahur")) == 0


def test_phrases_end_at_breaths_phrase_ends_and_whole_beats_of_rest() -> None:
    assert phrase_bounds(LINE.items) == ((1, 7), (8, N))
    rests = sheet_of("A4 -:1/2 B4 - C5", PACK.names).items
    assert phrase_bounds(rests) == ((1, 2), (3, 3))


def test_a_line_without_notes_has_no_phrases() -> None:
    assert phrase_bounds(sheet_of("- , .", PACK.names).items) == ()


def test_bars_are_told_apart_by_their_printed_names() -> None:
    places = [Place(bar) for bar in ("", "1", "1", "2", "2a", "2a")]
    assert bar_bounds(places) == (("1", 2, 3), ("2", 4, 4), ("2a", 5, 6))
