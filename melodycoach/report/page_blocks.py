"""What the sections of a page are built with: headings, folded parts, ways to a note of the chart."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from melodycoach.report.page_html import Html, element, joined
from melodycoach.report.places import place
from melodycoach.report.words import capital

if TYPE_CHECKING:
    from collections.abc import Mapping

    from melodycoach.report.page_html import Content

LONG = 24
"""A list with more items than this is folded at first."""


def section(title: str, *content: Content, id_: str) -> Html:
    """Build a section of the page."""
    return element("section", element("h2", capital(title)), *content, id=id_)


def folded(title: str, n_items: int, *content: Content, id_: str | None = None, level: str = "h2") -> Html:
    """Build a part that can be folded, and is where it is long; on paper it is always unfolded."""
    head = element("summary", element(level, capital(title)))
    return element("details", head, *content, id=id_, class_="folded", open=n_items <= LONG)


def note_link(note: int) -> Html:
    """Lead to a note in the chart."""
    return element("a", str(note), href=f"#note-{note}")


def where(at: Mapping[str, Any] | None, note: int) -> Html:
    """Say where a note stands, and lead to it in the chart."""
    found = place(at)
    return joined(["note ", note_link(note), f", {found}" if found else None])
