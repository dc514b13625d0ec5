"""Where the marks of a chart stand: positions read off the drawing and held against the answer.

In a browser the marks are looked at too: a style that hides one is as wrong as a drawing without it.
"""

from __future__ import annotations

import os
import re
from itertools import pairwise
from typing import TYPE_CHECKING, Any
from xml.etree import ElementTree

import pytest
from chromium import CHROMIUM, Browser
from page_answers import LINE, OFF, answer, change, stretch

from melodycoach.report.check_page import check_page

if TYPE_CHECKING:
    from collections.abc import Iterator
    from pathlib import Path
    from xml.etree.ElementTree import Element

REQUIRED = os.environ.get("MELODYCOACH_REQUIRE_CHROMIUM") == "1"
NEAR = 0.11  # pixels: positions are written to a tenth


def uneven() -> dict[str, Any]:
    """Give an answer whose curves go up and down: no two points of one are alike by design."""
    after = [[(7 * n % 16) / 20, (5 * n % 16) / 40, (3 * n % 16) / 80] for n in range(1, len(LINE) + 1)]
    one = answer()
    return one | {"likelihoods": one["likelihoods"] | {"after": after}}


def pieces(one: dict[str, Any]) -> list[Element]:
    """Read the drawings of a page."""
    drawn = re.findall(r'<svg class="piece".*?</svg>', check_page(one), re.DOTALL)
    return [ElementTree.fromstring(svg) for svg in drawn]


def marks(inside: Element, tag: str, name: str) -> list[Element]:
    """Find the elements of a class."""
    return [one for one in inside.iter(tag) if name in one.get("class", "").split()]


def numbers(one: Element, key: str) -> list[float]:
    return [float(found) for found in re.findall(r"-?\d+(?:\.\d+)?", one.get(key, ""))]


def drawn_notes(one: dict[str, Any]) -> list[tuple[Element, dict[str, Any]]]:
    """Give each note that is drawn, with what the answer says of it."""
    drawn = [mark for piece in pieces(one) for mark in marks(piece, "g", "note")]
    assert [mark.get("data-note") for mark in drawn] == [str(note["number"]) for note in one["notes"]]
    return list(zip(drawn, one["notes"], strict=True))


def stroke(mark: Element) -> tuple[float, float, float]:
    """Give where the stroke of a note begins, how high it stands, and how long it is."""
    (tone,) = marks(mark, "path", "tone")
    x, y, length = numbers(tone, "d")
    return x, y, length


def pitch_axis(one: dict[str, Any]) -> tuple[float, float]:
    """Give where height 0 stands and the pixels of a unit, by the lowest and the highest note."""
    placed = [(note["height"], stroke(mark)[1]) for mark, note in drawn_notes(one)]
    (low, low_y), (high, high_y) = min(placed), max(placed)
    unit = (low_y - high_y) / (high - low)
    return low_y + low * unit, unit


# --- heights -----------------------------------------------------------------------------------


def test_notes_stand_as_high_as_they_are() -> None:
    one = answer()
    zero, unit = pitch_axis(one)
    assert unit > 1  # higher is up, and a comma can be seen
    for mark, note in drawn_notes(one):
        assert stroke(mark)[1] == pytest.approx(zero - note["height"] * unit, abs=NEAR), note["name"]
    assert len({stroke(mark)[1] for mark, _ in drawn_notes(one)}) == len(set(LINE))


def test_the_steps_of_the_ladder_stand_on_the_same_axis() -> None:
    one = answer()
    zero, unit = pitch_axis(one)
    heights = sorted((rung["height"] for rung in one["in_view"]["ladder"]), reverse=True)
    for piece in pieces(one):
        ys = [float(rung.get("y1", "")) for rung in marks(piece, "line", "rung")]
        assert ys == pytest.approx([zero - height * unit for height in heights], abs=NEAR)
        assert all(rung.get("y1") == rung.get("y2") for rung in marks(piece, "line", "rung"))


def test_the_cross_stands_on_its_note_and_the_mend_on_its_own_height() -> None:
    one = answer()
    zero, unit = pitch_axis(one)
    mark, note = drawn_notes(one)[OFF - 1]
    x, y, length = stroke(mark)
    (cross,), (mend,), (way,) = (
        marks(mark, "path", "cross"),
        marks(mark, "ellipse", "mend"),
        marks(mark, "line", "way"),
    )
    left, top, wide, high = numbers(cross, "d")[:4]
    middle = x - 1 + length / 2 + 0.5
    assert (left + wide / 2, top + high / 2) == pytest.approx((middle, y), abs=1)
    mend_y = zero - note["off"]["mend_height"] * unit
    assert float(mend.get("cy", "")) == pytest.approx(mend_y, abs=NEAR)
    assert (float(way.get("y1", "")), float(way.get("y2", ""))) == pytest.approx((y, mend_y), abs=NEAR)
    assert not any(marks(other, "path", "cross") for other, found in drawn_notes(one) if found["off"] is None)


def test_each_note_is_joined_to_the_next_from_height_to_height() -> None:
    one = answer()
    joins = [join for piece in pieces(one) for join in marks(piece, "path", "join")]
    ys = [stroke(mark)[1] for mark, _ in drawn_notes(one)]
    assert [(numbers(join, "d")[1], numbers(join, "d")[-1]) for join in joins] == list(pairwise(ys))


def test_notes_stand_one_after_the_other_each_in_its_own_room() -> None:
    for piece in pieces(answer()):
        end = 0.0
        for mark in marks(piece, "g", "note"):
            (hit,) = marks(mark, "rect", "hit")
            begin, width = float(hit.get("x", "")), float(hit.get("width", ""))
            assert begin == pytest.approx(end, abs=NEAR)
            end = begin + width
            x, _, length = stroke(mark)
            assert begin < x < x + length < end


# --- likelihoods -------------------------------------------------------------------------------


def test_the_points_of_the_curves_stand_as_high_as_the_modes_are_likely() -> None:
    one = uneven()
    after, n_modes = one["likelihoods"]["after"], len(one["likelihoods"]["modes"])
    for piece in pieces(one):
        never, half, always = (float(line.get("y1", "")) for line in marks(piece, "line", "grid"))
        assert never - always > 50
        assert half == pytest.approx((never + always) / 2, abs=NEAR)
        (chances,) = marks(piece, "g", "chances")
        curves = list(chances.iter("polyline"))
        assert [curve.get("class") for curve in curves] == [f"mode-{n + 1}" for n in range(n_modes)]
        held = [int(mark.get("data-note", "")) for mark in marks(piece, "g", "note")]
        if held[0] > 1:
            held.insert(0, held[0] - 1)  # it goes on from the piece before
        for at, curve in enumerate(curves):
            ys = numbers(curve, "points")[1::2]
            wanted = [never + (always - never) * after[number - 1][at] for number in held]
            assert ys == pytest.approx(wanted, abs=NEAR)
            assert max(ys) - min(ys) > 1


def test_the_names_beside_the_curves_stand_in_the_order_of_the_curves() -> None:
    one = uneven()
    names = [mode["name"] for mode in one["likelihoods"]["modes"]]
    last = dict(zip(names, one["likelihoods"]["after"][-1], strict=True))
    labels = sorted(marks(pieces(one)[-1], "text", "last"), key=lambda label: float(label.get("y", "")))
    order = ["".join(label.itertext()).rsplit(" ", 2)[0] for label in labels]
    assert order == sorted(names, key=lambda name: -last[name])


# --- in a browser ------------------------------------------------------------------------------

SEEN = """(one => {
  if (!one) return 'not there';
  const box = one.getBoundingClientRect(), style = getComputedStyle(one);
  if (box.width < 5 && box.height < 5) return 'has no room';
  for (let at = one; at; at = at.parentElement) {
    const own = getComputedStyle(at);
    if (own.display === 'none' || own.visibility !== 'visible' || Number(own.opacity) < 0.5) return 'hidden';
  }
  if (style.stroke === 'none' || Number(style.strokeOpacity) < 0.5) return 'has no stroke';
  if (/, 0\\)$/.test(style.stroke)) return 'is transparent';
  if (!(parseFloat(style.strokeWidth) >= 0.5)) return 'has a stroke too thin to see';
  const ground = getComputedStyle(document.querySelector('.ground')).fill;
  return style.stroke === ground ? 'has the colour of the ground' : 'seen';
})(document.querySelector(%r))"""
MARKS = {
    "cross": f"#note-{OFF} .cross",
    "mend": f"#note-{OFF} ellipse.mend",
    "tone": "#note-1 .tone",
    "tone of an off note": f"#note-{OFF} .tone",
    "tone that rests": "#note-8 .tone",
    "join": ".join",
    "breath": ".breath",
    "rung": ".rung.degree",
    "final": ".rung.final",
    "dominant": ".rung.dominant",
    "curve": ".chances polyline",
    "second curve": ".chances polyline.mode-2",
    "seam": "[data-seam] line",
}


@pytest.fixture(scope="module")
def browser(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Browser]:
    if CHROMIUM is None:
        if REQUIRED:
            pytest.fail("chromium is required here and is not installed")
        pytest.skip("chromium is not installed")
    with Browser(tmp_path_factory.mktemp("chromium")) as one:
        yield one


@pytest.fixture(params=["light", "dark", "print"])
def page(browser: Browser, tmp_path: Path, request: pytest.FixtureRequest) -> Iterator[Browser]:
    """Open a page with every mark in it, as it looks in the light, in the dark, and on paper."""
    one = uneven() | {
        "changes": [change(9, "Hüseynî", "Karcığar")],
        "stretches": [stretch(1, 8, "Hüseynî"), stretch(9, 16, "Karcığar")],
    }
    path = tmp_path / "page.html"
    path.write_text(check_page(one), encoding="utf-8")
    browser.look(718, dark=request.param == "dark")
    browser.open(path)
    if request.param == "print":
        browser.call("Emulation.setEmulatedMedia", media="print")
    yield browser
    browser.call("Emulation.setEmulatedMedia", media="")


@pytest.mark.slow
def test_every_mark_has_room_and_a_stroke_that_is_seen(page: Browser) -> None:
    assert {name: page.ask(SEEN % which) for name, which in MARKS.items()} == dict.fromkeys(MARKS, "seen")


@pytest.mark.slow
@pytest.mark.parametrize("name", ["cross", "mend", "tone", "curve", "seam"])
def test_the_picture_changes_when_a_mark_is_taken_away(page: Browser, name: str) -> None:
    """Nothing lies over the mark, and nothing cuts it off: it is part of what one sees."""
    page.ask("document.getElementById('line').scrollIntoView()")
    before = page.photograph()
    assert page.photograph() == before, "the same page gives the same picture"
    page.ask(f"document.querySelectorAll({MARKS[name]!r}).forEach(one => one.remove())")
    assert page.photograph() != before
