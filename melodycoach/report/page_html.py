"""HTML and SVG elements that cannot be broken by what stands in them.

Everything that is not `Html` is escaped when it is put into an element, so a title or a file name
may hold anything.
"""

from __future__ import annotations

import re
from functools import cache, lru_cache
from html import escape
from typing import TYPE_CHECKING, TypeAlias

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

_CONTROLS = "\x00-\x08\x0b\x0c\x0e-\x1f\x7f-\x9f\ud800-\udfff\ufffe\uffff"
_UNSAYABLE = re.compile(f"[{_CONTROLS}]")
"""Characters that a page may not hold: controls, halves of pairs (from odd file names), no characters."""

_SPECIAL = re.compile(f"[&<>\"'{_CONTROLS}]")
"""Text without any of these stands in a page as it is."""

_VOID = frozenset({"br", "meta"})
_CAMEL = {"viewbox": "viewBox"}


FEW = 10
"""A table of so many rows is not torn apart where a page of paper ends."""


class Html(str):
    """Text that is markup already, and is not escaped again."""

    __slots__ = ()


Content: TypeAlias = "str | Html | None"
Attribute: TypeAlias = "str | float | bool | None"


def escaped(text: str) -> Html:
    """Make plain text fit to stand in a page.

    >>> escaped("<b> & " + chr(7)) == "&lt;b&gt; &amp; " + chr(0xFFFD)
    True
    """
    if isinstance(text, Html):
        return text
    return Html(escape(_UNSAYABLE.sub("\ufffd", text)) if _SPECIAL.search(text) else text)


@lru_cache(maxsize=4096)
def number(value: float) -> str:
    """Write a number with at most one decimal, as drawings need it.

    >>> number(2.0), number(2.449), number(-0.01)
    ('2', '2.4', '0')
    """
    text = f"{value:.1f}".removesuffix(".0")
    return "0" if text == "-0" else text


def joined(parts: Iterable[Content], between: str = "") -> Html:
    """Put pieces one behind the other; what is None is left out.

    >>> joined(["a & b", Html("<br>"), None])
    'a &amp; b<br>'
    """
    return Html(escaped(between).join(escaped(part) for part in parts if part is not None))


def element(tag: str, *content: Content, **attributes: Attribute) -> Html:
    """Build one element.

    Parameters
    ----------
    tag
        Its name.
    content
        What stands in it: `Html` as it is, other text escaped, None left out.
    attributes
        ``class_`` gives ``class``, ``data_note`` gives ``data-note``. False and None are left out,
        True stands without a value.

    Examples
    --------
    >>> element("p", "1 < 2", class_="small", data_note=3, hidden=False)
    '<p class="small" data-note="3">1 &lt; 2</p>'
    >>> element("meta", charset="utf-8")
    '<meta charset="utf-8">'
    """
    opening = f"<{tag}{''.join(map(_attribute, attributes, attributes.values()))}>"
    return Html(opening if tag in _VOID else f"{opening}{joined(content)}</{tag}>")


def _attribute(key: str, value: Attribute) -> str:
    if value is None or value is False:
        return ""
    if value is True:
        return f" {_attribute_name(key)}"
    return f' {_attribute_name(key)}="{escaped(value) if isinstance(value, str) else number(value)}"'


@cache
def _attribute_name(key: str) -> str:
    return _CAMEL.get(key) or key.rstrip("_").replace("_", "-")


def bullets(items: Iterable[Content], class_: str | None = None) -> Html:
    """Build a list without order."""
    return element("ul", *(element("li", item) for item in items), class_=class_)


def table(
    heads: Sequence[str],
    rows: Sequence[Sequence[Content]],
    caption: str,
    row_ids: Sequence[str] = (),
    class_: str = "rows",
) -> Html:
    """Build a table whose first column names its rows.

    Parameters
    ----------
    heads
        The name of each column. Each cell has it too, for a narrow page, where cells stand one
        below the other.
    rows
        As many cells as there are heads, for each row. A column without content is left out.
    caption
        What the table shows.
    row_ids
        An id for each row, or nothing.
    class_
        ``rows`` may fall into blocks on a narrow page; ``wide`` is scrolled there.
    """
    used = [at for at in range(1, len(heads)) if any(cells[at] for cells in rows)]
    head = element("tr", *(element("th", heads[at], scope="col") for at in (0, *used)))
    body = []
    for at, cells in enumerate(rows):
        first = element("th", cells[0], scope="row", data_head=heads[0])
        rest = (element("td", cells[column], data_head=heads[column]) for column in used)
        body.append(element("tr", first, *rest, id=row_ids[at] if row_ids else None))
    return element(
        "table",
        element("caption", caption),
        element("thead", head),
        element("tbody", *body),
        class_=f"{class_} few" if len(rows) <= FEW else class_,
    )
