"""The page of one file, and the list of many, read as a browser would: by their elements."""

from __future__ import annotations

import base64
import hashlib
import re
from html.parser import HTMLParser
from itertools import pairwise
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from page_answers import (
    LINE,
    OFF,
    answer,
    change,
    course,
    family_change,
    long_answer,
    note,
    open_change,
    stretch,
)

from melodycoach.report.check_page import check_page
from melodycoach.report.page_html import element, escaped
from melodycoach.report.page_index import IndexEntry, index_entry, index_page
from melodycoach.report.page_layout import BOLD_LETTER, GUTTERS, WIDEST_PIECE, pieces_of, scale_of, spread
from melodycoach.report.page_style import COLOURS, STYLE

VOID = {"meta", "br"}
NARROWEST_ROW = 400 - 2 * 12
"""Pixels of a telephone of 400, less the margins of the style at 16 pixels a rem."""


class Element:
    def __init__(self, tag: str, attributes: dict[str, str]) -> None:
        self.tag, self.attributes = tag, attributes
        self.inside: list[Element | str] = []

    def __getitem__(self, key: str) -> str:
        return self.attributes[key]

    def get(self, key: str) -> str:
        return self.attributes.get(key, "")

    @property
    def text(self) -> str:
        return "".join(one if isinstance(one, str) else one.text for one in self.inside)

    def all(self, tag: str = "", **attributes: str) -> list[Element]:
        """Find elements by their tag and by attributes; a class is one of several."""
        found = []
        for one in self.inside:
            if isinstance(one, Element):
                wanted = all(
                    value in one.get("class").split()
                    if key == "class_"
                    else one.get(key.replace("_", "-")) == value
                    for key, value in attributes.items()
                )
                found += [one] if tag in ("", one.tag) and wanted else []
                found += one.all(tag, **attributes)
        return found

    def one(self, tag: str = "", **attributes: str) -> Element:
        (found,) = self.all(tag, **attributes)
        return found


class Reader(HTMLParser):
    """Reads a page to elements, and insists that each one is closed in its turn."""

    def __init__(self) -> None:
        super().__init__()
        self.open = [Element("", {})]

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        one = Element(tag, {key: value or "" for key, value in attrs})
        self.open[-1].inside.append(one)
        if tag not in VOID:
            self.open.append(one)

    def handle_endtag(self, tag: str) -> None:
        assert self.open.pop().tag == tag

    def handle_data(self, data: str) -> None:
        self.open[-1].inside.append(data)


def read(page: str) -> Element:
    reader = Reader()
    reader.feed(page)
    reader.close()
    (root,) = reader.open
    return root


def numbers(text: str) -> list[float]:
    return [float(one) for one in re.findall(r"-?\d+(?:\.\d+)?", text)]


# --- the document


def test_the_page_is_a_whole_document_in_english() -> None:
    page = check_page(answer())
    assert page.startswith("<!DOCTYPE html>\n<html ")
    root = read(page)
    assert root.one("html")["lang"] == "en"
    assert root.one("head").one("title").text == "Night ferry: leaning to Hüseynî, 72 %"
    assert root.one("h1").text == "Night ferry"


def test_a_line_without_a_title_is_called_by_its_file() -> None:
    assert read(check_page(answer(title=""))).one("h1").text == "draft.txt"


def test_the_page_asks_for_nothing_from_anywhere() -> None:
    page = check_page(answer())
    root = read(page)
    assert not [one for one in root.all() if one.get("src") or one.tag in {"link", "img", "iframe", "object"}]
    assert not re.search(r"https?:|@import|url\(", page)
    assert all(link["href"].startswith("#") for link in root.all("a"))


def test_the_policy_allows_the_very_script_of_the_page_and_no_other() -> None:
    root = read(check_page(answer()))
    policy = root.one("meta", http_equiv="Content-Security-Policy")["content"]
    digest = base64.b64encode(hashlib.sha256(root.one("script").text.encode()).digest()).decode()
    assert policy.startswith("default-src 'none'; ")
    assert f"script-src 'sha256-{digest}';" in policy
    assert "http" not in policy


def test_a_page_of_many_links_back_to_their_list() -> None:
    links = read(check_page(answer(), index="index.html")).all("a", href="index.html")
    assert [link.text for link in links] == ["all files"]


def test_every_id_is_there_once_and_every_link_within_the_page_leads_somewhere() -> None:
    root = read(check_page(answer(changes=[change(9, "Hüseynî", "Nevâ")])))
    ids = [one["id"] for one in root.all() if one.get("id")]
    assert len(ids) == len(set(ids))
    assert {link["href"][1:] for link in root.all("a")} <= set(ids)


def test_headings_leave_out_no_level() -> None:
    root = read(check_page(answer()))
    levels = [int(one.tag[1]) for one in root.all() if re.fullmatch("h[1-6]", one.tag)]
    assert levels[0] == 1
    assert levels.count(1) == 1
    assert all(later <= earlier + 1 for earlier, later in pairwise(levels))


def test_every_table_says_what_it_shows_and_names_its_rows_and_columns() -> None:
    for one in read(check_page(answer())).all("table"):
        assert one.one("caption").text
        assert {head["scope"] for head in one.one("thead").all("th")} == {"col"}
        assert all(row.one("th")["scope"] == "row" for row in one.one("tbody").all("tr"))


# --- what the file says is never markup


HOSTILE = "</title><script>alert(1)</script><b title=\"x\" 'y'>&amp;\x00\ud800"
CLEANED = "</title><script>alert(1)</script><b title=\"x\" 'y'>&amp;\ufffd\ufffd"


def shape(root: Element) -> list[str]:
    return [one.tag for one in root.all()]


def test_a_hostile_title_is_text() -> None:
    root = read(check_page(answer(title=HOSTILE, file=HOSTILE)))
    assert root.one("h1").text == CLEANED
    assert shape(root) == shape(read(check_page(answer())))
    check_page(answer(title=HOSTILE)).encode()  # half a pair would not be UTF-8


def put_everywhere(value: Any, text: str) -> Any:
    """Replace every text of an answer, but for the keys and what the page looks up."""
    if isinstance(value, dict):
        kept = {"role", "need"}
        return {key: one if key in kept else put_everywhere(one, text) for key, one in value.items()}
    if isinstance(value, list):
        return [put_everywhere(one, text) for one in value]
    return text if isinstance(value, str) and value else value


@settings(max_examples=25, deadline=None)
@given(st.text(min_size=1, max_size=30))
def test_no_text_of_an_answer_can_add_an_element(text: str) -> None:
    one = answer(changes=[change(9, "a", "b")], lost=["x"], keyboard_note="x", words={})
    assert shape(read(check_page(put_everywhere(one, text)))) == shape(
        read(check_page(put_everywhere(one, "q")))
    )


def test_attributes_are_escaped_too() -> None:
    assert element("i", title='"><b>', hidden=True, id=None) == '<i title="&quot;&gt;&lt;b&gt;" hidden></i>'


def test_controls_and_halves_of_pairs_are_replaced() -> None:
    assert escaped("a\x00\x1b\udcff\tb") == "a\ufffd\ufffd\ufffd\tb"


# --- the answer on top


def test_the_verdict_is_a_sentence_of_its_own() -> None:
    assert read(check_page(answer())).one(class_="verdict").text == "Leaning to Hüseynî, 72 %"


def test_off_notes_and_changes_are_counted_under_the_verdict() -> None:
    assert (
        read(check_page(answer())).one(class_="glance").text
        == "1 note lies outside Hüseynî · no change of mode"
    )
    stretches = [stretch(1, 8, "a"), stretch(9, 11, "b"), stretch(12, 16, "c")]
    changes = [change(9, "a", "b"), change(12, "b", "c")]
    root = read(check_page(answer(off_notes=[], changes=changes, stretches=stretches)))
    glance = root.one(class_="glance")
    assert glance.text == "No note lies outside the mode of its stretch · 2 changes of mode"
    assert [link["href"] for link in glance.all("a")] == ["#changes"]
    assert root.one(id="off-notes").one("h2").text == "Notes off the mode of their stretch"
    for unclear, says in ((1, "1 change of mode, 1 more possible"), (2, "2 possible changes of mode")):
        some = [*(one | {"decided": False} for one in changes[:unclear]), *changes[unclear:]]
        assert says in read(check_page(answer(changes=some, stretches=stretches))).one(class_="glance").text


def test_the_modes_that_a_line_goes_through_are_the_answer_and_the_whole_comes_second() -> None:
    stretches = [stretch(1, 8, "Rast"), stretch(9, 16, "Hicaz")]
    one = answer(stretches=stretches, changes=[change(9, "Rast", "Hicaz")])
    root = read(check_page(one))
    assert root.one("head").one("title").text == "Night ferry: Rast, then Hicaz"
    assert root.one(class_="verdict").text == "Rast, then Hicaz"
    assert "Taken as one, the line is leaning to Hüseynî, 72 %." in root.one(id="answer").text
    assert "Rast, then Hicaz" in read(index_page([index_entry(one, "a.html")])).one(id="answers").text


def test_the_mode_that_it_aims_at_is_named_with_how_near_it_comes() -> None:
    view = answer()["in_view"] | {"is_target": True}
    said = read(check_page(answer(in_view=view))).one(id="answer").text
    assert "Hüseynî is the mode that it aims at." in said
    assert "aims at" not in read(check_page(answer())).one(id="answer").text


@pytest.mark.parametrize(
    ("asked", "yes", "says"),
    [
        ({"mode": "m", "name": "Rast", "stays": True, "first": None}, "yes", "It stays in Rast."),
        (
            {
                "mode": "m",
                "name": "Rast",
                "stays": False,
                "first": {
                    "note": 1,
                    "place": {"bar": "1", "beat": 1.0, "at": ""},
                    "says": "it sounds like Sabâ",
                },
            },
            "no",
            "It does not stay in Rast: it sounds like Sabâ.",
        ),
        (
            {
                "mode": "m",
                "name": "Rast",
                "stays": False,
                "first": {
                    "note": 10,
                    "place": {"bar": "3", "beat": 2.0, "at": ""},
                    "says": "it has left Rast",
                },
            },
            "no",
            "It does not stay in Rast. It leaves first with note 10, bar 3, beat 2: it has left Rast.",
        ),
    ],
)
def test_whether_it_stays_is_answered_with_the_first_place_it_leaves(asked: Any, yes: str, says: str) -> None:
    said = read(check_page(answer(stay_in=asked))).one(data_stays=yes)
    assert said.text == says


def test_what_was_read_and_lost_comes_before_the_chart() -> None:
    root = read(check_page(answer(lost=["track 2, byte 17: cut off"])))
    assert [one["id"] for one in root.all("section")][:2] == ["answer", "line"]
    was_read = root.one("section", id="answer").one(id="read")
    assert [one.text for one in was_read.all("li")] == ["Read as note text", "track 2, byte 17: cut off"]
    assert was_read.one("ul", class_="lost").text == "track 2, byte 17: cut off"
    assert not read(check_page(answer(read=[]))).all(id="read")


def test_the_length_of_the_line_is_told_in_notes_and_bars() -> None:
    assert "16 notes in 4 bars · 84 beats a minute" in read(check_page(answer())).one("header").text
    assert "16 notes · 84 beats" in read(check_page(answer(bars=False))).one("header").text


# --- the chart


def test_every_note_is_drawn_once_in_its_order() -> None:
    marks = read(check_page(answer())).all("g", class_="note")
    assert [one["data-note"] for one in marks] == [str(n) for n in range(1, len(LINE) + 1)]


def test_an_off_note_carries_what_is_wrong_and_what_mends_it() -> None:
    off = [one for one in read(check_page(answer())).all("g", class_="note") if one.get("data-off")]
    assert [one["data-note"] for one in off] == [str(OFF)]
    assert off[0]["data-off"] == "not in Hüseynî, 4 commas above çargâh"
    assert (off[0]["data-mend"], off[0]["data-mend-height"]) == ("çargâh", "13")
    assert off[0].one("title").text == "10 nim hicaz, off the mode: çargâh mends it"
    assert off[0].all("path", class_="cross"), "colour alone does not mark it"


def test_what_mends_a_note_is_drawn_hollow_on_its_own_rung() -> None:
    root = read(check_page(answer()))
    off = root.one("g", data_note=str(OFF))
    ladder = answer()["in_view"]["ladder"]
    at = [rung["name"] for rung in reversed(ladder)].index("çargâh")
    piece = next(one for one in root.all("svg", class_="piece") if one.all("g", data_note=str(OFF)))
    rungs = piece.all("line", class_="rung")
    assert off.one("ellipse", class_="mend")["cy"] == rungs[at]["y1"]


def test_a_note_of_the_ladder_lies_on_its_rung_and_higher_notes_lie_higher() -> None:
    one = answer()
    scale = scale_of(one)
    heights = sorted({float(note["height"]) for note in one["notes"]})
    ys = [scale.y(height) for height in heights]
    assert ys == sorted(ys, reverse=True)
    assert max(ys) <= scale.height


def test_final_and_dominant_are_named_and_drawn_in_lines_of_their_own() -> None:
    piece = read(check_page(answer())).all("svg", class_="piece")[0]
    perdes = {
        one.get("class"): one.text
        for one in piece.all("text", class_="perde")
        if "degree" not in one["class"]
    }
    assert perdes == {"perde final": "karar dügâh", "perde dominant": "güçlü hüseynî"}
    assert len(piece.all("line", class_="final")) == len(piece.all("line", class_="dominant")) == 1
    assert ".rung.dominant{stroke:var(--text-quiet);stroke-dasharray:" in STYLE


def test_perdes_of_another_stretch_are_guests_on_the_ladder() -> None:
    clean = [one | {"off": None} for one in answer()["notes"]]
    for one, names in ((answer(), []), (answer(notes=clean, off_notes=[]), ["nim hicaz"])):
        root = read(check_page(one))
        piece = root.all("svg", class_="piece")[0]
        assert [perde.text for perde in piece.all("text", class_="guest")] == names
        assert len(piece.all("line", class_="guest")) == len(names)
        assert ("A dotted line" in root.one(id="line").text) == bool(names)


def test_bars_have_names_and_lines_between_them() -> None:
    root = read(check_page(answer()))
    assert [one.text for one in root.all("text", class_="bar")] == ["1", "2", "3", "4"]
    assert len(root.all("line", class_="bar")) == 3


def test_a_line_without_bars_has_no_bar_lines_and_no_table_of_bars() -> None:
    root = read(check_page(answer(bars=False)))
    assert not root.all(class_="bar")
    assert "bars" not in [one.get("id") for one in root.all()]


def test_breaths_and_ends_of_phrases_are_marked() -> None:
    notes = answer()["notes"]
    notes[7]["closes"] = True
    closed, open_ = (read(check_page(answer(notes=one))) for one in (notes, answer()["notes"]))
    for root, strokes in ((open_, 1), (closed, 2)):
        (breath,) = root.all("path", data_breath="8")
        assert breath["d"].count("M") == strokes
        assert len(root.all("path", class_="breathes")) == 1


def test_a_change_of_mode_is_a_line_with_the_name_of_the_mode_and_the_rows_say_theirs() -> None:
    one = answer(
        changes=[change(9, "Hüseynî", "Karcığar")],
        stretches=[stretch(1, 8, "Hüseynî"), stretch(9, 16, "Karcığar")],
    )
    root = read(check_page(one))
    seam = root.one("g", data_seam="9")
    assert (seam["data-from"], seam["data-to"]) == ("Hüseynî", "Karcığar")
    assert seam.one("text").text == "▸ Karcığar"
    # the curves below it are of the whole line so far
    assert seam.one("title").text == "Karcığar 64 %: what the notes from here on say by themselves"
    assert "the notes behind it say by themselves" in root.one("ul", class_="key").text
    named = {
        piece.all("g", class_="note")[0]["data-note"]: [
            text.text for text in piece.one("g", class_="gutter").all("text", class_="seam")
        ]
        for piece in root.all("svg", class_="piece")
    }
    assert named["1"] == ["in Hüseynî"]
    assert named.get("9", []) == []  # the seam itself stands there
    assert [says for at, says in named.items() if int(at) > 9] in ([], [["in Karcığar"]])


@pytest.mark.parametrize(
    ("one", "label", "row"),
    [
        (open_change(9, "Hüseynî", "Hicaz"), "▸ Hicaz?", "in Hicaz?"),
        (family_change(9, "Hüseynî", "Hicaz", "hicaz family"), "▸ hicaz family", "in hicaz family"),
    ],
)
def test_a_change_that_is_not_to_one_mode_for_sure_is_marked_so(one: Any, label: str, row: str) -> None:
    stretches = [stretch(1, 8, "Hüseynî"), stretch(9, 16, "Hicaz")]
    root = read(check_page(answer(changes=[one], stretches=stretches)))
    assert root.one("g", data_seam="9").one("text").text == label
    gutter = root.all("svg", class_="piece")[-1].one("g", class_="gutter")
    assert gutter.one("text", class_="seam").text == row


def test_a_column_without_content_is_left_out() -> None:
    clean = [one | {"off": None, "at": ""} for one in answer()["notes"]]
    heads = read(check_page(answer(notes=clean, off_notes=[]))).one(id="notes").one("thead").all("th")
    assert [one.text for one in heads] == ["note", "where", "name", "written", "length", "likely after it"]


def test_the_name_at_a_seam_does_not_leave_its_piece() -> None:
    for at in range(2, len(LINE) + 1):
        root = read(check_page(answer(changes=[change(at, "a", "Sultânîyegâh")])))
        for piece in root.all("svg", class_="piece"):
            for seam in piece.all("g", class_="seam"):
                label = seam.one("text")
                end = float(label["x"]) + len(label.text) * BOLD_LETTER
                plot = float(piece.one("rect", class_="ground")["width"])
                assert float(label["x"]) >= 0
                assert end <= plot + 0.1


def test_likelihoods_stand_under_the_notes_on_the_same_axis() -> None:
    one = answer()
    for piece in read(check_page(one)).all("svg", class_="piece"):
        ends = [float(hit["x"]) + float(hit["width"]) for hit in piece.all("rect", class_="hit")]
        for line in piece.all("polyline"):
            xs = numbers(line["points"])[::2]
            assert xs[-len(ends) :] == pytest.approx(ends, abs=0.11)


def test_likelier_stands_higher_and_the_modes_differ_by_their_dashes() -> None:
    root = read(check_page(answer()))
    lines = root.all("svg", class_="piece")[-1].all("polyline")
    last = [numbers(line["points"])[-1] for line in lines]
    assert last == sorted(last)  # 0.64, 0.2, 0.002: y counts downwards
    assert len({line["stroke-dasharray"] for line in lines}) == len(lines)


def test_the_modes_are_named_beside_their_lines_at_each_row_and_at_the_end() -> None:
    pieces = read(check_page(answer())).all("svg", class_="piece")
    for piece in pieces:
        names = {one.text for one in piece.all("text", class_="chance")}
        assert names == {"Hüseynî", "Nevâ", "Gerdâniye", "100 %", "0 %"}
    assert [one.text for one in pieces[-1].all("text", class_="last")] == [
        "Hüseynî 64 %",
        "Nevâ 20 %",
        "Gerdâniye <1 %",
    ]


def test_the_likelihoods_of_a_piece_are_told_in_words() -> None:
    piece = read(check_page(answer())).all("svg", class_="piece")[0]
    said = piece.one("g", class_="chances")
    assert said["role"] == "img"
    assert said["aria-label"].startswith("likelihoods, notes 1 to ")
    assert "Hüseynî from 4 % to " in said["aria-label"]
    assert re.fullmatch(r"notes 1 to \d+, bars? 1( to 2)?", piece["aria-label"])


def test_one_note_is_a_tab_stop_and_the_others_are_reached_by_arrows() -> None:
    marks = read(check_page(answer())).all("g", class_="note")
    assert [one["tabindex"] for one in marks] == ["0", *["-1"] * (len(LINE) - 1)]


def test_marks_that_do_not_occur_are_not_explained() -> None:
    clean = [one | {"off": None} for one in answer()["notes"]]
    assert "off the mode" in read(check_page(answer())).one("ul", class_="key").text
    assert (
        "off the mode" not in read(check_page(answer(notes=clean, off_notes=[]))).one("ul", class_="key").text
    )


def test_a_line_without_notes_has_a_page_without_a_drawing() -> None:
    empty = answer(
        notes=[], off_notes=[], n_notes=0, phrases=[], bars=[], likelihoods={"modes": [], "after": []}
    )
    root = read(check_page(empty))
    assert not root.all("svg", class_="piece")
    assert "no notes" in root.one("header").text
    assert [one["id"] for one in root.all("section")] == ["answer", "how"]


# --- where things stand


@settings(max_examples=60, deadline=None)
@given(
    st.lists(st.tuples(st.floats(0, 30), st.floats(0, 30), st.integers(1, 4)), min_size=1, max_size=40),
    st.floats(*GUTTERS),
    st.booleans(),
    st.dictionaries(st.integers(1, 40), st.floats(0, 20 * BOLD_LETTER), max_size=3),
)
def test_pieces_hold_each_note_once_cover_the_ladder_and_fit_a_telephone(
    shapes: list[tuple[float, float, int]], gutter: float, bars: bool, seams: dict[int, float]
) -> None:
    notes, onset = [], 0.0
    for number, (gap, length, _) in enumerate(shapes, 1):
        notes.append(note(number, "dügâh", bars) | {"onset_s": onset, "length_s": length})
        onset += gap
    pieces = pieces_of(notes, seams, gutter)
    assert [slot.number for piece in pieces for slot in piece.slots] == list(range(1, len(notes) + 1))
    assert all(piece.width >= gutter for piece in pieces[:-1])
    assert all(piece.width + gutter <= NARROWEST_ROW for piece in pieces)
    for piece in pieces:
        assert piece.slots[0].x == 0
        for before, after in zip(piece.slots, piece.slots[1:], strict=False):
            assert after.x == pytest.approx(before.end)
        assert all(0 < slot.sounding <= slot.width for slot in piece.slots)


def test_pieces_break_at_bar_lines_where_they_can() -> None:
    pieces = pieces_of(answer()["notes"], {}, 80)
    assert [piece.first for piece in pieces] == [1, 5, 9, 13]


def test_pieces_break_at_phrases_where_there_are_no_bars() -> None:
    notes = [one | {"phrase": (one["number"] + 4) // 5} for one in answer(bars=False)["notes"]]
    assert [piece.first for piece in pieces_of(notes, {}, 80)] == [1, 6, 11, 16]


def test_a_long_phrase_without_bars_is_cut_between_its_notes() -> None:
    notes = [one | {"phrase": 1} for one in long_answer(40)["notes"]]
    notes = [one | {"bar": ""} for one in notes]
    widths = [piece.width for piece in pieces_of(notes, {}, 80)]
    assert len(widths) > 4
    assert max(widths[:-1]) <= WIDEST_PIECE


def test_a_very_wide_line_is_drawn_flatter_and_a_flat_one_is_given_air() -> None:
    wide = answer()
    wide["notes"][0]["height"] = 400.0
    flat = answer(notes=[note(1, "dügâh")], off_notes=[], likelihoods={"modes": [], "after": [[]]})
    assert scale_of(wide).height == pytest.approx(430)
    assert scale_of(flat).height == pytest.approx(90)
    assert len(read(check_page(wide)).all("g", class_="note")) == len(LINE)


def test_a_crowded_ladder_keeps_the_names_that_matter() -> None:
    crowded = answer()
    home = crowded["in_view"]["ladder"][1]
    rungs = [home | {"height": at, "name": f"p{at}", "role": "degree", "function": ""} for at in range(1, 40)]
    crowded["in_view"]["ladder"] = [home, *rungs]
    piece = read(check_page(crowded)).all("svg", class_="piece")[0]
    assert [one.text for one in piece.all("text", class_="perde")] == ["karar dügâh"]


@given(st.lists(st.floats(0, 90), max_size=7).map(sorted))
def test_labels_that_are_spread_keep_their_order_their_distance_and_the_bounds(wanted: list[float]) -> None:
    placed = spread(wanted, 12.5, 0, 90)
    assert len(placed) == len(wanted)
    assert all(-1e-9 <= y <= 90 + 1e-9 for y in placed)
    assert all(after - before >= 12.5 - 1e-9 for before, after in pairwise(placed))


# --- the sections


def test_off_notes_are_listed_with_what_mends_them() -> None:
    row = read(check_page(answer())).one(id="off-notes").one("tbody").one("tr")
    assert [cell.text for cell in row.inside if isinstance(cell, Element)] == [
        "10",
        "bar 3, beat 2",
        "nim hicaz (C#5)",
        "Not in Hüseynî, 4 commas above çargâh",
        "çargâh (C5)",
    ]
    clean = [one | {"off": None} for one in answer()["notes"]]
    assert (
        read(check_page(answer(notes=clean, off_notes=[]))).one(id="off-notes").text
        == "Notes off the modeNone."
    )


def test_changes_are_listed_with_where_how_sure_and_where_noticed() -> None:
    row = (
        read(check_page(answer(changes=[change(9, "Hüseynî", "Nevâ")])))
        .one(id="changes")
        .one("tbody")
        .one("tr")
    )
    cells = [cell.text for cell in row.inside if isinstance(cell, Element)]
    assert cells == [
        "9",
        "bar 3, beat 1",
        "Turns from Hüseynî to Nevâ, 64 %",
        "12",
    ]
    sudden = change(9, "Hüseynî", "Nevâ") | {"noticed_at": None}
    heads = read(check_page(answer(changes=[sudden]))).one(id="changes").one("thead").all("th")
    assert [one.text for one in heads] == ["note", "where", "the line"]
    assert read(check_page(answer())).one(id="changes").text == "Changes of modeNone was heard."


def test_steps_heard_and_owed_have_signs_and_places() -> None:
    section = read(check_page(answer())).one(id="steps")
    heard, owed = section.one("ul", class_="heard"), section.one("ul", class_="owed")
    assert heard.text == "✓Final cadence on dügâhsegâh dügâh (B4-1 A4)core · note 16, bar 4, beat 4"
    assert [one.text[0] for one in owed.all("li")] == ["○", "+"]
    assert [one.text for one in owed.all("span", class_="quiet")] == ["core", "welcome, not owed"]


def test_a_stretch_without_steps_says_so() -> None:
    bare = stretch(1, 16, "Hüseynî") | {"steps": {"heard": [], "owed": []}}
    text = read(check_page(answer(stretches=[bare]))).one(id="steps").text
    assert "HeardNone yet." in text
    assert "Owed, the best to play next firstNothing." in text


def two_modes() -> dict[str, Any]:
    """Give the answer of a line that turns, with no target."""
    return answer(
        stretches=[stretch(1, 8, "Hüseynî"), stretch(9, 16, "Hicaz") | {"decided": False}],
        changes=[family_change(9, "Hüseynî", "Hicaz", "hicaz family")],
    )


def test_without_a_target_steps_and_course_are_those_of_each_stretch() -> None:
    root = read(check_page(two_modes()))
    for section in ("steps", "course"):
        assert [one.text for one in root.one(id=section).all("summary") if one.all("h3")] == [
            "Hüseynî on dügâh (A4), bars 1–2",
            "Hicaz on dügâh (A4), bars 3–4 (the likeliest, not decided)",
        ]


def test_with_a_target_steps_and_course_are_those_of_the_target_over_the_whole_line() -> None:
    one = two_modes()
    one["in_view"] = one["in_view"] | {"is_target": True, "name": "Nevâ"}
    one["course"] = course("Nevâ") | {"opening": {"agrees": False, "says": "not as Nevâ"}}
    root = read(check_page(one))
    for section in ("steps", "course"):
        assert root.one(id=section).one("h3").text == "Nevâ on dügâh (A4), over the whole line"
    assert "Not as Nevâ" in root.one(id="course").text


def test_the_steps_and_courses_of_many_stretches_are_folded_and_told_in_short() -> None:
    for count, is_open in ((2, True), (4, False)):
        stretches = [stretch(4 * at + 1, 4 * at + 4, "Hüseynî") for at in range(count)]
        changes = [change(one["first"], "Hüseynî", "Hüseynî") for one in stretches[1:]]
        root = read(check_page(answer(stretches=stretches, changes=changes)))
        for section, short in (
            ("steps", "1 heard, 1 owed"),
            ("course", "opening agrees, register cannot be told, cadence does not agree"),
        ):
            parts = [one for one in root.one(id=section).all("details") if one.all("h3")]
            assert len(parts) == count
            assert {"open" in part.attributes for part in parts} == {is_open}
            first = parts[0].all("summary")[0].text
            assert first == "Hüseynî on dügâh (A4), bar 1" + ("" if is_open else f": {short}")


def test_the_course_says_what_agrees_in_the_words_of_the_trade() -> None:
    section = read(check_page(answer())).one(id="course")
    assert section.one("h2").text == "Course (seyir)"
    assert section.one("h3").text == "Hüseynî on dügâh (A4), over the whole line"
    assert [one.text for one in section.all("dt")] == [
        "opening: ✓ agrees",
        "register: – cannot be told",
        "cadence: ✗ does not agree",
    ]
    assert [one.text for one in section.all("li")] == [
        "hüseynî (E5), güçlü, note 8, bar 2, beat 4",
        "dügâh (A4), note 16, bar 4, beat 4",
    ]
    bare = stretch(1, 16, "Hüseynî") | {"course": course("Hüseynî") | {"phrase_ends": []}}
    assert not read(check_page(answer(stretches=[bare]))).one(id="course").all("li")


def test_what_speaks_for_each_mode_is_counted_upwards_under_its_name() -> None:
    section = read(check_page(answer())).one(id="rival")
    assert [one.text for one in section.all("li")] == [
        "+1.3 You rested on hüseynî (note 8)",
        "+0.4 You passed through nevâ (notes 4–6, 9)",
    ]
    assert section.one("h2").text == "The closest rival to Hüseynî: Nevâ, 20 %"
    assert section.text.count("doubles the odds") == 1
    assert "doubles the odds" not in read(check_page(answer())).one(id="steps").text
    assert "No other mode comes near." in read(check_page(answer(rival=None))).one(id="rival").text
    bare = answer()["rival"] | {
        "for_rival": [],
        "for_leader": [{"says": "it is met more often", "nats": 1, "notes": []}],
    }
    text = read(check_page(answer(rival=bare))).one(id="rival").text
    assert "Nothing of weight." in text
    assert "+1.0 It is met more oftenWhat" in text
    assert "All the rest together, for Hüseynî: 0.4." in section.text
    light = answer()["rival"] | {"for_rival": [], "for_leader": [], "rest_nats": 0.0}
    assert "doubles the odds" not in read(check_page(answer(rival=light))).one(id="rival").text


def test_a_target_that_trails_is_the_one_for_which_reasons_speak() -> None:
    one = answer(rival=answer()["rival"] | {"mode": "makam/huseyni", "name": "Hüseynî", "probability": 0.72})
    one["in_view"] = one["in_view"] | {"is_target": True, "mode": "makam/neva", "name": "Nevâ"}
    section = read(check_page(one)).one(id="rival")
    assert section.one("h2").text == "Nevâ against the likeliest: Hüseynî, 72 %"
    assert [head.text for head in section.all("h3")] == ["What speaks for Nevâ", "What speaks for Hüseynî"]
    assert section.all("ul")[0].text == "+1.3 You rested on hüseynî (note 8)"


def test_phrases_and_bars_tell_what_fits() -> None:
    root = read(check_page(answer()))
    rows = root.one(id="phrases").one("tbody").all("tr")
    assert [[cell.text for cell in row.all("td")][-2:] for row in rows] == [
        ["✓ Fits Hüseynî", ""],
        ["✗ 1 note off the mode", "10"],
    ]
    assert [row.one("th").text for row in root.one(id="bars").one("tbody").all("tr")] == ["1", "2", "3", "4"]
    assert [row.all("td")[0].text for row in rows] == ["1–8", "9–16"]


def test_a_long_list_of_phrases_is_folded() -> None:
    spans = answer()["phrases"] * 20
    assert "open" not in read(check_page(answer(phrases=spans))).one(id="phrases").attributes
    assert "open" in read(check_page(answer())).one(id="phrases").attributes
    one = answer()["phrases"][0] | {"first": 3, "last": 3}
    rows = read(check_page(answer(phrases=[one, one]))).one(id="phrases").one("tbody")
    assert rows.all("td")[0].text == "3"
    assert not read(check_page(answer(phrases=[one]))).all(id="phrases"), "one phrase is the line itself"


def test_the_ladder_is_a_table_too_high_above_low() -> None:
    rows = read(check_page(answer())).one(id="ladder").one("tbody").all("tr")
    assert rows[0].one("th").text == "gerdâniye"
    assert [[cell.text for cell in row.all("td")] for row in rows][-2:] == [
        ["A4", "0", "karar"],
        ["G4", "−9", ""],
    ]


def test_how_it_was_read_defers_to_the_teacher() -> None:
    root = read(check_page(answer(keyboard_note="plain keys cannot tell Rast from Mahur")))
    assert "follow your teacher" in root.one(id="how").text
    assert "Plain keys cannot tell Rast from Mahur" in root.one(id="how").text
    assert "plain keys" not in read(check_page(answer())).one(id="how").text


def test_all_notes_are_a_table_with_what_the_chart_shows() -> None:
    root = read(check_page(answer()))
    rows = root.one(id="notes").one("tbody").all("tr")
    assert [row["id"] for row in rows] == [f"row-{n}" for n in range(1, len(LINE) + 1)]
    assert [cell.text for cell in rows[OFF - 1].all("td")] == [
        "bar 3, beat 2",
        "line 5, column 4",
        "nim hicaz",
        "C#5",
        "0.7 s",
        "Hüseynî 72 % and Nevâ 20 %",
        "Not in Hüseynî, 4 commas above çargâh",
        "çargâh (C5)",
    ]


def test_a_line_of_a_thousand_notes_has_all_of_them() -> None:
    page = check_page(long_answer(1000))
    assert page.count('class="note') == 1000
    assert len(page) < 2_000_000


# --- colours


def luminance(colour: str) -> float:
    """Relative luminance, as WCAG 2.1 defines it (from memory)."""
    channels = [int(colour[at : at + 2], 16) / 255 for at in (1, 3, 5)]
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in channels]
    return sum(weight * c for weight, c in zip((0.2126, 0.7152, 0.0722), linear, strict=True))


def contrast(one: str, other: str) -> float:
    """The contrast ratio of WCAG 2.1 (from memory): 1 for the same colour, 21 for black on white."""
    low, high = sorted(map(luminance, (one, other)))
    return (high + 0.05) / (low + 0.05)


def test_the_contrast_of_black_on_white_is_21() -> None:
    assert contrast("#000000", "#ffffff") == pytest.approx(21)
    assert contrast("#777777", "#ffffff") == pytest.approx(4.48, abs=0.005)  # from memory: just too little


def schemes() -> dict[str, dict[str, str]]:
    """Read the colours from the style sheet as it is written."""
    light, dark = re.findall(r":root\{([^}]*)\}", STYLE)
    assert STYLE.index(dark) > STYLE.index("prefers-color-scheme:dark")
    return {
        name: dict(re.findall(r"--([\w-]+):(#[0-9a-f]{6});", text))
        for name, text in (("light", light), ("dark", dark))
    }


@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_all_letters_can_be_read_on_both_grounds(scheme: str) -> None:
    colours = schemes()[scheme]
    assert set(colours) == set(COLOURS)
    letters = [name for name in colours if name.startswith(("text", "mode-"))]
    assert len(letters) > 10
    for name in letters:
        for ground in ("paper", "panel"):
            assert contrast(colours[name], colours[ground]) >= 4.5, (scheme, name, ground)


def test_letters_are_set_in_no_other_colours() -> None:
    used = set(re.findall(r"(?<![-\w])color:([^;}]+)", STYLE)) | set(
        re.findall(r"(?<=text)[^{}]*\{[^}]*?fill:([^;}]+)", STYLE)
    )
    assert used <= {"inherit"} | {f"var(--{name})" for name in COLOURS if name.startswith(("text", "mode-"))}


# --- the list of many files


def failed() -> dict[str, Any]:
    return {"file": "bad<.mid", "error": "bad<.mid: no notes", "faults": ["track 1: empty"]}


def test_the_list_leads_to_each_page_and_counts_what_was_found() -> None:
    root = read(
        index_page([index_entry(answer(changes=[change(9, "a", "b")]), "draft.html"), index_entry(failed())])
    )
    row = root.one(id="answers").one("tbody").one("tr")
    cells = [cell.text for cell in row.inside if isinstance(cell, Element)]
    assert cells == ["draft.txt", "Night ferry", "A, then b", "1", "1"]
    assert row.one("a")["href"] == "draft.html"
    assert root.one("header").text == "Lines checked2 files, 1 could not be read"


def test_the_list_gives_the_error_of_a_file_with_all_its_faults() -> None:
    section = read(index_page([index_entry(failed())])).one(id="failed")
    assert section.one("ul", class_="lost").text == "bad<.mid: no notestrack 1: empty"
    assert not read(index_page([index_entry(failed())])).all(id="answers")
    without = index_page([IndexEntry("a.mid", error="no notes")])
    assert [one.text for one in read(without).all("li")] == ["a.mid: no notes"]


@pytest.mark.parametrize(
    ("asked", "cell"),
    [
        ({"mode": "m", "name": "Rast", "stays": True, "first": None}, "✓ stays in Rast"),
        (
            {
                "mode": "m",
                "name": "Rast",
                "stays": False,
                "first": {
                    "note": 1,
                    "place": {"bar": "1", "beat": 1.0, "at": ""},
                    "says": "it sounds like Sabâ",
                },
            },
            "✗ does not stay in Rast",
        ),
        (
            {
                "mode": "m",
                "name": "Rast",
                "stays": False,
                "first": {"note": 3, "place": {"bar": "1", "beat": 3.0, "at": ""}},
            },
            "✗ leaves Rast at bar 1, beat 3",
        ),
    ],
)
def test_the_list_says_which_files_stay(asked: Any, cell: str) -> None:
    root = read(
        index_page([index_entry(answer(stay_in=asked), "a.html"), IndexEntry("b.txt", verdict="undecided")])
    )
    first, second = root.one(id="answers").one("tbody").all("tr")
    assert first.all("td")[-1].text == cell
    assert second.all("td")[-1].text == ""
    assert (
        root.one("header").all("p")[0].text
        == f"2 files, {int(asked['stays'])} of 1 stay in the mode asked for"
    )
