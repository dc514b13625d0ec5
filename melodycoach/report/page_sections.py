"""The sections of a page below its chart: tables and lists, each from the data of one answer."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from melodycoach.report.check_words import off_title, span_words
from melodycoach.report.page_blocks import folded, note_link, section
from melodycoach.report.page_html import Html, bullets, element, joined, table
from melodycoach.report.places import bar_and_beat, place
from melodycoach.report.words import capital, listed, pitch, plain, short_percent, whole

if TYPE_CHECKING:
    from collections.abc import Mapping

    from melodycoach.report.page_html import Content


def leanings(line: Mapping[str, Any]) -> Html:
    """List the likeliest modes of the whole line."""
    rows = [
        (
            one["name"],
            f"on {pitch(one['final'])}",
            joined(
                [
                    element(
                        "span",
                        element("i", style=f"width:{one['probability'] * 100:.0f}%"),
                        class_="share",
                        aria_hidden="true",
                    ),
                    short_percent(one["probability"]),
                ]
            ),
        )
        for one in line["leanings"]
    ]
    return table(
        ("mode", "stands on", "how likely"), rows, "The likeliest modes of the whole line", class_="short"
    )


def reading(answer: Mapping[str, Any]) -> Html | None:
    """Say what the reader did with the file, and what was lost; nothing where there is nothing to say."""
    if not answer["read"] and not answer["lost"]:
        return None
    lost = (element("h3", "Lost"), bullets(answer["lost"], "lost")) if answer["lost"] else ()
    return element(
        "div", bullets(map(capital, answer["read"]), "quiet") if answer["read"] else None, *lost, id="read"
    )


TURNS = "Where another mode begins; how likely it is says what the notes of its stretch say by themselves"


def changes(answer: Mapping[str, Any]) -> Html:
    """List the places where the mode changes."""
    rows = [
        (
            note_link(one["note"]),
            place(one["place"]),
            capital(one["says"]),
            None if one["noticed_at"] is None else note_link(one["noticed_at"]),
        )
        for one in answer["changes"]
    ]
    if not rows:
        return section("Changes of mode", element("p", "None was heard."), id_="changes")
    return section(
        "Changes of mode",
        table(("note", "where", "the line", "noticed at note"), rows, TURNS),
        id_="changes",
    )


def off_notes(answer: Mapping[str, Any]) -> Html:
    """List the notes that break the mode, and what would mend them."""
    title, off = off_title(answer), [answer["notes"][number - 1] for number in answer["off_notes"]]
    rows = [
        (
            note_link(note["number"]),
            place(note),
            _unbroken(pitch(note)),
            capital(note["off"]["says"]),
            element("span", _unbroken(_mend(note["off"])), class_="mend"),
        )
        for note in off
    ]
    if not rows:
        return section(title, element("p", "None."), id_="off-notes")
    return section(
        title,
        table(
            ("note", "where", "stands there", "what is wrong", "what mends it"),
            rows,
            "Notes that the mode does not have",
        ),
        id_="off-notes",
    )


def _unbroken(name: str) -> Html:
    """Keep the written name of a pitch on one line: its last word may hold a hyphen."""
    before, space, last = name.rpartition(" ")
    return joined([before, space, element("span", last, class_="unbroken")])


def _mend(off: Mapping[str, Any]) -> str:
    return pitch({"name": off["mend"], "written": off["mend_written"]})


def phrases(answer: Mapping[str, Any]) -> Html | None:
    """Show which phrases fit, and what the others say by themselves; nothing where there is only one."""
    return _spans(answer, "phrases", "Phrase by phrase", "phrase") if len(answer["phrases"]) > 1 else None


def bars(answer: Mapping[str, Any]) -> Html | None:
    """Show which bars fit, and what the others say by themselves; nothing where there are no bars."""
    return _spans(answer, "bars", "Bar by bar", "bar") if answer["bars"] else None


def _spans(answer: Mapping[str, Any], key: str, title: str, one: str) -> Html:
    rows = [
        (
            span.get("bar") or str(at),
            f"{span['first']}–{span['last']}" if span["first"] != span["last"] else str(span["first"]),
            place(span["place"]),
            joined([f"{'✓' if span['fits'] else '✗'} ", capital(span_words([span], answer))]),
            joined(map(note_link, span["off_notes"]), " "),
        )
        for at, span in enumerate(answer[key], 1)
    ]
    heads = (one, "notes", "begins at", "what it says", "off the mode")
    caption = f"Whether each {one} fits, and what it says where it is heard by itself in another mode"
    return folded(title, len(rows), table(heads, rows, caption), id_=key)


def ladder(answer: Mapping[str, Any]) -> Html:
    """List the perdes of the mode in view, high above low."""
    view = answer["in_view"]
    home = view["final"]["height"]
    rows = [
        (
            rung["name"],
            rung["written"] if rung["written"] != rung["name"] else "",
            whole(rung["height"] - home),
            rung["function"],
        )
        for rung in reversed(view["ladder"])
    ]
    unit, final = answer["unit"], answer["words"].get("final", "final")
    heads = ("name", "written", f"{unit}s from the {final}", "what it does")
    return section(
        f"The ladder of {view['name']}",
        table(heads, rows, f"On {pitch(view['final'])}, high above low", class_="short"),
        id_="ladder",
    )


def how(answer: Mapping[str, Any]) -> Html:
    """Say by what the line was measured."""
    pairs = [
        ("pack", answer["pack"]),
        ("theory", answer["theory"]),
        ("caution", answer["caution"]),
        ("read as", answer["reading"]),
        ("compared with", answer["compete"]),
        ("plain keys", answer["keyboard_note"]),
    ]
    content = (joined([element("dt", name), element("dd", capital(says))]) for name, says in pairs if says)
    return section("How it was read", element("dl", *content), id_="how")


NOTE_HEADS = (
    "note",
    "where",
    "in the file",
    "name",
    "written",
    "length",
    "likely after it",
    "what is wrong",
    "what mends it",
)


def notes(answer: Mapping[str, Any]) -> Html:
    """Give all notes as a table; the chart shows the row of the note that is pointed at."""
    rows = [_note_cells(note) for note in answer["notes"]]
    ids = [f"row-{note['number']}" for note in answer["notes"]]
    caption = "Each note with its place, its length in seconds, and the likeliest modes of the line up to it"
    shown = table(NOTE_HEADS, rows, caption, ids, "wide")
    return element(
        "details",
        element("summary", element("h2", "All notes")),
        element("p", "Open this list before you print, if you want it on paper.", class_="quiet hint"),
        element("div", shown, class_="scrolled", tabindex="0", role="region", aria_label="all notes"),
        id="notes",
    )


def _note_cells(note: Mapping[str, Any]) -> tuple[Content, ...]:
    off = note["off"]
    return (
        str(note["number"]),
        bar_and_beat(note["bar"], note["beat"]),
        note["at"],
        note["name"],
        note["written"],
        f"{plain(note['length_s'])} s",
        listed([f"{one['name']} {short_percent(one['probability'])}" for one in note["likely"]]),
        capital(off["says"]) if off else "",
        _mend(off) if off else "",
    )
