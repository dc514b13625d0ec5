"""The sections of a page below its chart: tables and lists, each from the data of one answer."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from melodycoach.report.page_html import Html, bullets, element, joined, table
from melodycoach.report.page_words import (
    beside,
    capital,
    listed,
    notes_between,
    percent,
    pitch,
    place,
    plain,
    runs,
    signed,
    whole,
)

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping, Sequence

    from melodycoach.report.page_html import Content


_NATS = (
    "The numbers are nats: how strongly something speaks. "
    "0.7 doubles the odds, 2.3 makes them ten times as high."
)
_NEEDS = {"core": "core", "usual": "usual", "colour": "colour, welcome but not owed"}
_COURSE = {"opening": "opening", "register": "register", "cadence": "cadence"}
_AGREES = {True: ("✓", "agrees"), False: ("✗", "does not agree"), None: ("–", "says nothing")}


LONG = 24
"""A list with more items than this is folded at first."""

MANY_STRETCHES = 3
"""Where there are more stretches than this, their steps are folded at first."""


def _section(title: str, *content: Content, id_: str) -> Html:
    return element("section", element("h2", capital(title)), *content, id=id_)


def _folded(title: str, n_items: int, *content: Content, id_: str | None = None, level: str = "h2") -> Html:
    """Build a part that can be folded, and is where it is long; on paper it is always unfolded."""
    head = element("summary", element(level, capital(title)))
    return element("details", head, *content, id=id_, class_="folded", open=n_items <= LONG)


def _note_link(note: int) -> Html:
    return element("a", str(note), href=f"#note-{note}")


def where(at: Mapping[str, Any] | None, note: int) -> Html:
    """Say where a note stands, and lead to it in the chart."""
    found = place(at)
    return joined(["note ", _note_link(note), f", {found}" if found else None])


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
                    percent(one["probability"]),
                ]
            ),
        )
        for one in line["leanings"]
    ]
    return table(
        ("mode", "stands on", "how likely"), rows, "The likeliest modes of the whole line", class_="short"
    )


def reading(answer: Mapping[str, Any]) -> Html:
    """Say what the reader did with the file, and what was lost."""
    lost = (element("h3", "Lost"), bullets(answer["lost"], "lost")) if answer["lost"] else ()
    done = bullets(answer["read"]) if answer["read"] else element("p", "As it stands, from beginning to end.")
    return _section("What was read", done, *lost, id_="read")


def changes(answer: Mapping[str, Any]) -> Html:
    """List the places where the mode changes."""
    rows = [
        (
            _note_link(one["note"]),
            place(one["place"]),
            f"{one['from']} → {one['to']}",
            percent(one["probability"]),
            capital(one["says"]),
        )
        for one in answer["changes"]
    ]
    if not rows:
        return _section("Changes of mode", element("p", "None was heard."), id_="changes")
    return _section(
        "Changes of mode",
        table(("note", "where", "from and to", "how sure", ""), rows, "Where another mode begins"),
        id_="changes",
    )


def off_notes(answer: Mapping[str, Any]) -> Html:
    """List the notes that break the mode, and what would mend them."""
    off = [answer["notes"][number - 1] for number in answer["off_notes"]]
    rows = [
        (
            _note_link(note["number"]),
            place(note),
            _unbroken(pitch(note)),
            capital(note["off"]["says"]),
            element("span", _unbroken(_mend(note["off"])), class_="mend"),
        )
        for note in off
    ]
    if not rows:
        return _section("Notes off the mode", element("p", "None."), id_="off-notes")
    return _section(
        "Notes off the mode",
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


def steps(answer: Mapping[str, Any]) -> Html:
    """Say for each stretch which characteristic steps were heard, and which the line still owes."""
    stretches = answer["stretches"]
    return _section(
        "Characteristic steps",
        *(_steps_of(stretch, len(stretches)) for stretch in stretches),
        element("p", _NATS, class_="quiet"),
        id_="steps",
    )


def _steps_of(stretch: Mapping[str, Any], n_stretches: int) -> Html:
    title = f"{stretch['name']} on {pitch(stretch['final'])}"
    lists = _heard_and_owed(stretch["steps"])
    if n_stretches == 1:
        return joined([element("h3", title), lists])
    counts = f"{len(stretch['steps']['heard'])} heard, {len(stretch['steps']['owed'])} open"
    return element(
        "details",
        element(
            "summary",
            element("h3", f"{capital(notes_between(stretch['first'], stretch['last']))}: {title}; {counts}"),
        ),
        element("p", capital(stretch["verdict"]), class_="quiet"),
        lists,
        class_="folded",
        open=n_stretches <= MANY_STRETCHES,
    )


def _heard_and_owed(of: Mapping[str, Any]) -> Html:
    heard = [_step("✓", one, where(one["place"], one["heard_at"])) for one in of["heard"]]
    owed = [
        _step("○" if one["need"] != "colour" else "+", one, f"{signed(one['gain_nats'])} nats")
        for one in of["owed"]
    ]
    return element(
        "div",
        _side("Heard", heard, "none yet", "step heard"),
        _side("Owed, the best to play next first", owed, "nothing", "step owed"),
        class_="two",
    )


def _side(title: str, items: Sequence[Html], nothing: str, class_: str) -> Html:
    shown = bullets(items, class_) if items else element("p", capital(nothing), ".")
    return element("div", element("p", element("strong", title)), shown)


def _step(sign: str, step: Mapping[str, Any], tail: Content) -> Html:
    names, written = (" ".join(one[key] for one in step["notes"]) for key in ("name", "written"))
    played = names if names == written else f"{names} ({written})"
    return joined(
        [
            element("span", sign, class_="sign", aria_hidden="true"),
            capital(step["says"]),
            element("br"),
            played,
            element("br"),
            element("span", f"{_NEEDS.get(step['need'], step['need'])} · ", tail, class_="quiet"),
        ]
    )


def course(answer: Mapping[str, Any]) -> Html:
    """Say how opening, register and cadence agree with the mode."""
    of, words = answer["course"], answer["words"]
    pairs: list[Content] = []
    for key, name in _COURSE.items():
        sign, says = _AGREES[of[key]["agrees"]]
        pairs += [
            element("dt", name, ": ", element("span", f"{sign} ", aria_hidden="true"), says),
            element("dd", capital(of[key]["says"])),
        ]
    ends = [
        joined([pitch(one["pitch"]), _function(one), ", ", where(one["place"], one["note"])])
        for one in of["phrase_ends"]
    ]
    tail = (_folded("Where phrases end", len(ends), bullets(ends), level="h3"),) if ends else ()
    return _section(f"{beside('course', words)} of {of['name']}", element("dl", *pairs), *tail, id_="course")


def _function(end: Mapping[str, Any]) -> str | None:
    return f", {end['function']}" if end["function"] else None


def rival(answer: Mapping[str, Any]) -> Html:
    """Name the closest rival, and what speaks for each."""
    other, leader = answer["rival"], answer["whole"]["name"]
    if other is None:
        return _section("The closest rival", element("p", "No other mode comes near."), id_="rival")
    return _section(
        f"The closest rival: {other['name']}, {percent(other['probability'])}",
        *_reasons(f"What speaks for {leader}", other["for_leader"]),
        *_reasons(f"What speaks for {other['name']}", other["for_rival"]),
        element("p", _NATS, class_="quiet"),
        id_="rival",
    )


def _reasons(title: str, reasons: Sequence[Mapping[str, Any]]) -> tuple[Html, Html]:
    """List what speaks for one of two modes; it is said under its name, so all of it counts upwards."""
    items = [
        joined([f"{signed(abs(one['nats']))} {capital(one['says'])}", *_at_notes(one["notes"])])
        for one in reasons
    ]
    return element("h3", title), bullets(items) if items else element("p", "Nothing of weight.")


def _at_notes(notes: Sequence[int]) -> Iterator[Content]:
    """Lead to the notes that a reason speaks of; a run of them stands as its first and last."""
    if notes:
        links = (
            _note_link(first) if first == last else joined([_note_link(first), "–", _note_link(last)])
            for first, last in runs(notes)
        )
        yield joined([" (", "note " if len(notes) == 1 else "notes ", joined(links, ", "), ")"])


def phrases(answer: Mapping[str, Any]) -> Html:
    """Show what each phrase says by itself."""
    return _spans(
        answer["phrases"],
        "Phrase by phrase",
        "phrase",
        "phrases",
        "What the notes of each phrase say, heard in their place",
    )


def bars(answer: Mapping[str, Any]) -> Html | None:
    """Show what each bar says by itself; nothing where there are no bars."""
    if not answer["bars"]:
        return None
    return _spans(
        answer["bars"], "Bar by bar", "bar", "bars", "What the notes of each bar say, heard in their place"
    )


def _spans(spans: Sequence[Mapping[str, Any]], title: str, one: str, id_: str, caption: str) -> Html:
    rows = [
        (
            span.get("bar") or str(at),
            f"{span['first']}–{span['last']}" if span["first"] != span["last"] else str(span["first"]),
            place(span["place"]),
            capital(span["verdict"]),
            span["stretch_mode"],
            "✓ yes" if span["fits"] else "✗ no",
            joined(map(_note_link, span["off_notes"]), " "),
        )
        for at, span in enumerate(spans, 1)
    ]
    heads = (one, "notes", "where", "what it says", "it stands in", "fits", "off the mode")
    return _folded(title, len(rows), table(heads, rows, caption), id_=id_)


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
    return _section(
        f"The ladder of {view['name']}",
        table(heads, rows, f"On {pitch(view['final'])}, high above low"),
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
    return _section("How it was read", element("dl", *content), id_="how")


NOTE_HEADS = (
    "note",
    "where",
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
        place(note),
        note["name"],
        note["written"],
        f"{plain(note['length_s'])} s",
        listed([f"{one['name']} {percent(one['probability'])}" for one in note["likely"]]),
        capital(off["says"]) if off else "",
        _mend(off) if off else "",
    )
