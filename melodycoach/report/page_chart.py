"""The chart of a line: its contour over the likelihoods of the modes, on one axis, as inline SVG.

Each piece of the line (see `melodycoach.report.page_layout`) is one drawing. From top to bottom: names
of the bars, seams, the contour, numbers of notes, likelihoods. Nothing is told by colour alone: an
off-mode note has a cross and its number, each mode a dash pattern and its name.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from melodycoach.errors import shorten
from melodycoach.report import page_chances, page_ladder
from melodycoach.report.check_words import is_clear
from melodycoach.report.page_frame import BARS_Y, CONTOUR_Y, SEAMS_Y, Frame
from melodycoach.report.page_html import Html, element, number
from melodycoach.report.page_layout import BOLD_LETTER, gutter_of, pieces_of, scale_of
from melodycoach.report.places import notes_between
from melodycoach.report.words import percent

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping

    from melodycoach.report.page_layout import Piece, Slot

LONGEST_SEAM = 13
"""So much of the name of a mode stands at a seam."""

NUMBERED = 5
"""Every so many notes one has its number."""


def chart(answer: Mapping[str, Any]) -> Html:
    """Draw the line of an answer; nothing for a line without notes.

    Notes carry ``data-note``, and where they are off the mode ``data-off``, ``data-mend`` and
    ``data-mend-height``; seams carry ``data-seam``, ``data-from`` and ``data-to``.
    """
    scale = scale_of(answer) if answer["notes"] else None
    if scale is None:
        return Html("")
    rungs = page_ladder.rungs_of(answer, scale)
    stretches = map(_stretch_label, _stretch_names(answer))
    labels = [*map(page_ladder.label, rungs), *page_chances.mode_labels(answer), *stretches]
    seams_by_note = {change["note"]: change for change in answer["changes"]}
    shared = Frame(answer, scale, gutter_of(labels), seams_by_note, rungs)
    seams = {note: len(_seam_label(change)) * BOLD_LETTER for note, change in shared.seams.items()}
    pieces = pieces_of(answer["notes"], seams, shared.gutter)
    drawn = (_piece(shared, piece, len(pieces) - at) for at, piece in enumerate(pieces))
    return element("div", *drawn, class_="staff", id="staff", style=f"--gutter:{number(shared.gutter)}px")


def _piece(shared: Frame, piece: Piece, above: int) -> Html:
    """Draw one piece; those before it lie above it, and hide its ladder."""
    width = shared.gutter + piece.width
    first, last = shared.notes[piece.first - 1]["bar"], shared.notes[piece.last - 1]["bar"]
    bars = "" if not first else f", bar {first}" if first == last else f", bars {first} to {last}"
    plot = element(
        "g",
        element("rect", width=piece.width, height=shared.height, class_="ground"),
        *page_ladder.lines(shared, piece),
        *_bar_lines(shared, piece),
        page_chances.likelihoods(shared, piece),
        *_seams(shared, piece),
        *_joins(shared, piece),
        *(_note(shared, slot) for slot in piece.slots),
        *page_chances.ends(shared, piece),
        transform=f"translate({number(shared.gutter)} 0)",
    )
    return element(
        "svg",
        _gutter(shared, piece),
        plot,
        class_="piece",
        width=width,
        height=shared.height,
        viewbox=f"0 0 {number(width)} {number(shared.height)}",
        style=f"z-index:{above}",
        role="group",
        aria_label=f"{notes_between(piece.first, piece.last)}{bars}",
    )


def _gutter(shared: Frame, piece: Piece) -> Html:
    """Draw what stands at the left of a row: the stretch, the ladder, the names of the likelihoods."""
    return element(
        "g",
        *_stretch_name(shared, piece),
        *page_ladder.names(shared),
        *page_chances.axis(shared),
        *page_chances.names(shared, piece),
        class_="gutter",
        aria_hidden="true",
    )


def _stretch_name(shared: Frame, piece: Piece) -> Iterator[Html]:
    """Say which mode a row begins in, where there are several and no seam at its beginning says it."""
    names = _stretch_names(shared.answer)
    if not names or piece.first in shared.seams:
        return
    at = max(
        (n for n, one in enumerate(shared.answer["stretches"]) if one["first"] <= piece.first), default=0
    )
    fits = int(shared.gutter / BOLD_LETTER)
    yield element("text", shorten(_stretch_label(names[at]), fits), x=2, y=SEAMS_Y, class_="seam")


def _stretch_names(answer: Mapping[str, Any]) -> list[str]:
    """Name the modes of the stretches, where there are several."""
    if not answer["changes"]:
        return []
    return [answer["stretches"][0]["name"], *map(_seam_name, answer["changes"])]


def _stretch_label(name: str) -> str:
    return f"in {name}"


def _bar_lines(shared: Frame, piece: Piece) -> Iterator[Html]:
    for slot in piece.slots:
        bar = shared.notes[slot.number - 1]["bar"]
        if not bar or (slot.number > 1 and shared.notes[slot.number - 2]["bar"] == bar):
            continue
        if slot.number > 1:
            bottom = shared.bottom
            yield element("line", x1=slot.x + 0.5, x2=slot.x + 0.5, y1=BARS_Y + 4, y2=bottom, class_="bar")
        yield element("text", shorten(bar, 6), x=slot.x + 2, y=BARS_Y, class_="bar", data_bar=bar)


def _seam_label(change: Mapping[str, Any]) -> str:
    """Name what the line turns to."""
    return f"▸ {_seam_name(change)}"


def _seam_says(change: Mapping[str, Any]) -> str:
    """Say what stands behind a name at a seam: the curves below it are of the whole line so far."""
    return f"{change['to']} {percent(change['probability'])}: what the notes from here on say by themselves"


def _seam_name(change: Mapping[str, Any]) -> str:
    """Name a mode or a family in short; a question mark says that it only may be one."""
    name = shorten(change["family"] or change["to"], LONGEST_SEAM)
    return name if is_clear(change) else f"{name}?"


def _seams(shared: Frame, piece: Piece) -> Iterator[Html]:
    bottom = shared.bottom
    for slot in piece.slots:
        change = shared.seams.get(slot.number)
        if change is None:
            continue
        label = _seam_label(change)
        x = max(min(slot.x + 3, piece.width - len(label) * BOLD_LETTER), 0.0)
        yield element(
            "g",
            element("title", _seam_says(change)),
            element("line", x1=slot.x + 1, x2=slot.x + 1, y1=SEAMS_Y + 4, y2=bottom),
            element("text", label, x=x, y=SEAMS_Y),
            class_="seam",
            data_seam=slot.number,
            data_from=change["from"],
            data_to=change["to"],
        )


def _joins(shared: Frame, piece: Piece) -> Iterator[Html]:
    """Join each note to the next; a breath leaves the join dotted, and has a mark of its own."""
    for slot in piece.slots:
        if slot.number == len(shared.notes):
            continue
        note, after = shared.notes[slot.number - 1], shared.notes[slot.number]
        x, y = slot.x + _stroke(slot), shared.pitch_y(note["height"])
        end, to_y = slot.end + 1, shared.pitch_y(after["height"])
        middle = (x + end) / 2
        curve = "M{} {}C{} {} {} {} {} {}".format(*map(number, (x, y, middle, y, middle, to_y, end, to_y)))
        breathes = note["phrase"] != after["phrase"]
        yield element("path", d=curve, class_="join breathes" if breathes else "join")
        if breathes:
            yield _breath(shared, slot, note["closes"])


def _breath(shared: Frame, slot: Slot, closes: bool) -> Html:
    """Draw a breath as one slanted stroke above the contour, the end of a phrase as two."""
    xs = (slot.end - 7, slot.end - 3) if closes else (slot.end - 4,)
    bottom = CONTOUR_Y - 8
    strokes = "".join(f"M{number(x - 2)} {number(bottom)}l4 -10" for x in xs)
    return element("path", d=strokes, class_="breath", data_breath=slot.number, data_closes=closes)


def _stroke(slot: Slot) -> float:
    """Give how far the stroke of a note goes; the rest is left for the way to the next one."""
    return max(min(slot.sounding, slot.width - 6), 5.0)


def _note(shared: Frame, slot: Slot) -> Html:
    """Draw one note, with the room above and below it for the pointer."""
    note = shared.notes[slot.number - 1]
    off, y, x = note["off"], shared.pitch_y(note["height"]), slot.x + _stroke(slot) / 2
    stroke = f"M{number(slot.x + 2)} {number(y)}h{number(_stroke(slot) - 2)}"
    says = f"{slot.number} {note['name']}"
    return element(
        "g",
        element("title", f"{says}, off the mode: {off['mend']} mends it" if off else says),
        element(
            "rect",
            x=slot.x,
            y=SEAMS_Y + 4,
            width=slot.width,
            height=shared.height - SEAMS_Y - 8,
            class_="hit",
        ),
        *(_mend(shared, x, y, off) if off else ()),
        element("path", d=stroke, class_="tone rests" if note["rests"] else "tone"),
        *(_cross(shared, slot.number, x, y) if off else ()),
        None
        if off or (slot.number % NUMBERED and slot.number > 1)
        else element("text", str(slot.number), x=x, y=shared.foot_y, class_="count"),
        class_="note off" if off else "note",
        role="img",
        tabindex="0" if slot.number == 1 else "-1",
        id=f"note-{slot.number}",
        data_note=slot.number,
        data_height=note["height"],
        data_off=off["says"] if off else None,
        data_mend=off["mend"] if off else None,
        data_mend_height=off["mend_height"] if off else None,
    )


def _cross(shared: Frame, note: int, x: float, y: float) -> Iterator[Html]:
    shape = f"M{number(x - 5)} {number(y - 5)}l10 10m0 -10l-10 10"
    yield element("path", d=shape, class_="halo")
    yield element("path", d=shape, class_="cross")
    yield element("text", str(note), x=x, y=shared.foot_y, class_="count off")


def _mend(shared: Frame, x: float, y: float, off: Mapping[str, Any]) -> Iterator[Html]:
    mend_y = shared.pitch_y(off["mend_height"])
    yield element("line", x1=x, x2=x, y1=y, y2=mend_y, class_="way")
    yield element("ellipse", cx=x, cy=mend_y, rx=6, ry=4, class_="mend")
