"""The page in a browser: its marks read off the DOM, its keys pressed, its width and colours measured."""

from __future__ import annotations

import os
from itertools import pairwise
from typing import TYPE_CHECKING, Any

import pytest
from chromium import CHROMIUM, Browser
from page_answers import LINE, OFF, answer, change, long_answer, stretch

from melodycoach.report.check_page import check_page
from melodycoach.report.page_index import index_entry, index_page

if TYPE_CHECKING:
    from collections.abc import Iterator
    from pathlib import Path

pytestmark = pytest.mark.slow

REQUIRED = os.environ.get("MELODYCOACH_REQUIRE_CHROMIUM") == "1"

MARKS = "[...document.querySelectorAll('.note')].map(one => ({...one.dataset}))"
SEAMS = """[...document.querySelectorAll('[data-seam]')].map(
    one => [one.dataset.seam, one.querySelector('text').textContent])"""
FOCUSED = "document.activeElement.dataset.note || document.activeElement.tagName"
SHOWN = """Object.fromEntries([...document.querySelectorAll('#shown dl > div')].map(
    one => [one.children[0].textContent, one.children[1].textContent]))"""
TAB_STOPS = (
    "[...document.querySelectorAll('.note')].filter(one => one.tabIndex === 0).map(one => one.dataset.note)"
)

LEAST_CONTRAST = """(() => {
  const parts = colour => colour.match(/[\\d.]+/g).map(Number);
  const light = colour => {
    const linear = parts(colour).slice(0, 3).map(one => one / 255).map(
      one => one <= 0.04045 ? one / 12.92 : ((one + 0.055) / 1.055) ** 2.4);
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2];
  };
  const contrast = (one, other) => {
    const [low, high] = [light(one), light(other)].sort((a, b) => a - b);
    return (high + 0.05) / (low + 0.05);
  };
  const ground = one => {
    for (let at = one; at; at = at.parentElement) {
      const colour = getComputedStyle(at).backgroundColor;
      if (parts(colour)[3] !== 0) return colour;
    }
    return 'rgb(255, 255, 255)';
  };
  let least = [99, ''];
  for (const one of document.querySelectorAll('body *')) {
    const own = [...one.childNodes].some(node => node.nodeType === 3 && node.textContent.trim());
    if (!own || one.closest('script') || one.localName === 'title') continue;
    const style = getComputedStyle(one);
    const found = contrast(one.closest('svg') ? style.fill : style.color, ground(one));
    if (found < least[0]) least = [found, one.outerHTML.slice(0, 80)];
  }
  return least;
})()"""


@pytest.fixture(scope="module")
def browser(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Browser]:
    if CHROMIUM is None:
        if REQUIRED:
            pytest.fail("chromium is required here and is not installed")
        pytest.skip("chromium is not installed")
    with Browser(tmp_path_factory.mktemp("chromium")) as one:
        yield one


def changed() -> dict[str, Any]:
    """Give the answer of a line that turns into another mode with its ninth note."""
    return answer(
        changes=[change(9, "Hüseynî", "Karcığar")],
        stretches=[stretch(1, 8, "Hüseynî"), stretch(9, 16, "Karcığar")],
        stay_in={
            "mode": "m",
            "name": "Hüseynî",
            "stays": False,
            "first": {
                "note": OFF,
                "place": {"bar": "3", "beat": 2.0, "at": ""},
                "says": "nim hicaz is not in it",
            },
        },
    )


def opened(browser: Browser, folder: Path, page: str, columns: int = 1280, dark: bool = False) -> Browser:
    path = folder / "page.html"
    path.write_text(page, encoding="utf-8")
    browser.look(columns, dark=dark)
    browser.open(path)
    return browser


def test_the_marks_are_in_the_dom(browser: Browser, tmp_path: Path) -> None:
    page = opened(browser, tmp_path, check_page(changed()))
    marks = page.ask(MARKS)
    assert [one["note"] for one in marks] == [str(number) for number in range(1, len(LINE) + 1)]
    off = [(one["note"], one["off"], one["mend"], one["mendHeight"]) for one in marks if "off" in one]
    assert off == [(str(OFF), "not in Hüseynî, 4 commas above çargâh", "çargâh", "13")]
    assert page.ask(SEAMS) == [["9", "▸ Karcığar"]]


def test_the_page_asks_for_nothing_and_complains_of_nothing(browser: Browser, tmp_path: Path) -> None:
    page = opened(browser, tmp_path, check_page(changed()))
    page.press("Tab")
    page.ask("document.getElementById('note-3').focus()")
    page.ask("new Promise(done => setTimeout(done, 100))")
    assert page.complaints == []
    assert page.asked_for == [(tmp_path / "page.html").as_uri()]


def test_a_hostile_title_runs_nothing(browser: Browser, tmp_path: Path) -> None:
    title = "</title></style></script><script>window.ran = 1</script><img src=x onerror='window.ran = 2'>"
    page = opened(browser, tmp_path, check_page(answer(title=title, file=title)))
    assert page.ask("window.ran === undefined && document.querySelector('h1').textContent") == title
    page.ask("document.body.insertAdjacentHTML('beforeend', '<img src=https://example.org/x.png>')")
    page.ask("new Promise(done => setTimeout(done, 100))")
    assert page.asked_for == [(tmp_path / "page.html").as_uri()]
    assert any("Content Security Policy" in one for one in page.complaints)


def test_arrow_keys_go_from_note_to_note_and_the_numbers_are_shown(browser: Browser, tmp_path: Path) -> None:
    page = opened(browser, tmp_path, check_page(changed()))
    assert page.ask("document.getElementById('keys').hidden") is False
    page.ask("document.querySelector('#line a').focus()")
    page.press("Tab")
    assert page.ask(FOCUSED) == "1"
    for key, note in (
        ("ArrowRight", "2"),
        ("ArrowDown", str(OFF)),
        ("ArrowDown", str(OFF)),
        ("ArrowLeft", "9"),
        ("End", "16"),
        ("ArrowRight", "16"),
        ("ArrowUp", str(OFF)),
        ("Home", "1"),
        ("ArrowLeft", "1"),
    ):
        page.press(key)
        assert (key, page.ask(FOCUSED)) == (key, note)
        assert page.ask(TAB_STOPS) == [note]
        assert page.ask(SHOWN)["note"] == note
    page.press("ArrowDown")
    assert page.ask(SHOWN) == {
        "note": str(OFF),
        "where": "bar 3, beat 2",
        "in the file": "line 5, column 4",
        "name": "nim hicaz",
        "written": "C#5",
        "length": "0.7 s",
        "likely after it": "Hüseynî 72 % and Nevâ 20 %",
        "what is wrong": "Not in Hüseynî, 4 commas above çargâh",
        "what mends it": "çargâh (C5)",
    }
    page.press("Tab")
    assert page.ask("document.activeElement.closest('#staff')") is None, "one tab stop, and then on"


def test_pointing_at_a_note_shows_its_numbers_too(browser: Browser, tmp_path: Path) -> None:
    page = opened(browser, tmp_path, check_page(changed()))
    where = """(() => { const one = document.querySelector('#note-7 .hit');
        one.scrollIntoView({block: 'center'}); const box = one.getBoundingClientRect();
        return [box.x + box.width / 2, box.y + box.height / 2]; })()"""
    x, y = page.ask(where)
    page.call("Input.dispatchMouseEvent", type="mouseMoved", x=x, y=y)
    assert page.ask(SHOWN)["note"] == "7"


def test_a_link_to_a_note_goes_to_it(browser: Browser, tmp_path: Path) -> None:
    page = opened(browser, tmp_path, check_page(changed()))
    page.ask(f"document.querySelector('.leaves a[href=\"#note-{OFF}\"]').click()")
    assert page.ask(FOCUSED) == str(OFF)


@pytest.mark.parametrize("columns", [400, 700, 1280])
def test_the_page_is_never_wider_than_the_window(browser: Browser, tmp_path: Path, columns: int) -> None:
    name = "a-very-long-name-of-a-file" * 12
    for text in (
        check_page(changed() | {"title": name, "file": name}),
        check_page(long_answer(60)),
        index_page([index_entry(changed() | {"file": name, "title": name}, "a.html")] * 3),
    ):
        page = opened(browser, tmp_path, text, columns)
        assert page.ask("document.documentElement.scrollWidth") <= columns
        page.ask("document.querySelectorAll('details').forEach(one => { one.open = true; })")
        assert page.ask("document.documentElement.scrollWidth") <= columns


@pytest.mark.parametrize("columns", [400, 1280])
def test_the_ladder_is_seen_at_the_beginning_of_each_row_only(
    browser: Browser, tmp_path: Path, columns: int
) -> None:
    page = opened(browser, tmp_path, check_page(long_answer(60)), columns)
    rows = page.ask("""(() => {
        const rows = new Map();
        for (const piece of document.querySelectorAll('.piece')) {
          const box = piece.getBoundingClientRect();
          const ground = piece.querySelector('.ground').getBoundingClientRect();
          const row = rows.get(box.top) || [];
          row.push([box.left, ground.left, ground.right, Number(getComputedStyle(piece).zIndex)]);
          rows.set(box.top, row);
        }
        return [...rows.values()];
    })()""")
    assert len(rows) > 1
    left = rows[0][0][0]
    for row in rows:
        assert row[0][0] == pytest.approx(left, abs=0.5)
        for before, after in pairwise(row):
            assert after[1] == pytest.approx(before[2], abs=0.5), "a piece begins where the one before ends"
            assert before[1] <= after[0] + 0.5, "and its ladder lies under that one"
            assert before[3] > after[3]


@pytest.mark.parametrize("dark", [False, True], ids=["light", "dark"])
def test_every_letter_can_be_read(browser: Browser, tmp_path: Path, dark: bool) -> None:
    """4.5 to 1 is what WCAG 2.1 asks of small letters (AA)."""
    page = opened(browser, tmp_path, check_page(changed()), dark=dark)
    page.ask("document.querySelectorAll('details').forEach(one => { one.open = true; })")
    page.ask(f"document.getElementById('note-{OFF}').focus()")
    lightness = page.ask("getComputedStyle(document.body).backgroundColor")
    assert lightness == ("rgb(23, 25, 27)" if dark else "rgb(252, 251, 248)")
    least, where = page.ask(LEAST_CONTRAST)
    assert 4.5 <= least < 21, where


def test_paper_shows_the_folded_parts_and_no_inspector(browser: Browser, tmp_path: Path) -> None:
    spans = answer()["phrases"] * 20
    page = opened(browser, tmp_path, check_page(changed() | {"phrases": spans}), 718, dark=True)
    folded = "getComputedStyle(document.getElementById('phrases'), '::details-content').contentVisibility"
    assert page.ask(folded) == "hidden"
    page.call("Emulation.setEmulatedMedia", media="print")
    assert page.ask(folded) == "visible"
    assert page.ask("getComputedStyle(document.getElementById('shown')).display") == "none"
    assert page.ask("getComputedStyle(document.querySelector('.ground')).fill") == "rgb(255, 255, 255)"
    assert page.ask(
        "[...document.querySelectorAll('.piece')].every(one => one.getBoundingClientRect().right <= 718)"
    )
    # of A4 (297 mm) without the margins of the style a page shows 269 mm: 1016 pixels at 96 to the inch
    assert page.ask("document.querySelector('.piece').getBoundingClientRect().bottom") < 1016
    tables = "[...document.querySelectorAll('#changes table, #off-notes table')]"
    assert page.ask(f"{tables}.map(one => getComputedStyle(one).breakInside)") == ["avoid", "avoid"]
    assert page.ask("getComputedStyle(document.querySelector('#phrases table')).breakInside") == "auto"
    page.call("Emulation.setEmulatedMedia", media="")
    printed = page.print_pages()
    assert printed.startswith(b"%PDF-")
    assert printed.count(b"/Type /Page\n") >= 2
