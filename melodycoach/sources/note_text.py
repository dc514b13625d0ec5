"""Note text: a line of music as plain text, one token a note, read and written.

``docs/note-text.md`` tells a musician how to write it. Three laws hold and are tested: what is
written reads back as the same value, a text that has been written once is written the same way
again, and a text that cannot be read raises `NoteTextError` with every bad place in `faults`.
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING

from melodycoach.core.note import RESTING_GAP_S, Mark, Note, Silence
from melodycoach.errors import NoteTextError, shorten
from melodycoach.sources.note_scan import MAX_TEXT_CHARS, Comment, Fault, Headers, Scan
from melodycoach.sources.note_token import (
    DEFAULT_TEMPO,
    SAVED_STEP_BEATS,
    complete,
    item_token,
    lay_out,
    write_pitch,
)

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from melodycoach.core.note import Item
    from melodycoach.core.pitch import PitchNames

__all__ = [
    "DEFAULT_TEMPO",
    "LINE_WIDTH",
    "MAX_TEXT_CHARS",
    "Comment",
    "Fault",
    "Headers",
    "NoteText",
    "complete",
    "find_faults",
    "item_token",
    "lay_out",
    "read_note_text",
    "read_tokens",
    "write_note_text",
]

LINE_WIDTH = 100
"""A written line of text is broken after so many characters, if no phrase ends before."""

_SHOWN_FAULTS = 3


@dataclass(frozen=True, slots=True)
class NoteText:
    """A text that was read: headers, items with their times, and remarks by place.

    ``places`` says where each item stands in the text: its line and its column, from 1, the column
    in characters as an editor shows them. Two texts that say the same are equal, wherever their
    items stand.
    """

    headers: Headers = field(default_factory=Headers)
    items: tuple[Item, ...] = ()
    comments: tuple[Comment, ...] = ()
    places: tuple[tuple[int, int], ...] = field(default=(), compare=False)


def read_note_text(text: str, names: PitchNames, where: str = "line") -> NoteText:
    r"""Read a whole text with its headers.

    Parameters
    ----------
    text
        At most `MAX_TEXT_CHARS` characters.
    names
        The names and the tone system of the pack.
    where
        What the text is called in messages, such as the name of its file.

    Raises
    ------
    NoteTextError
        Something cannot be read; `faults` names every place.

    Examples
    --------
    >>> from melodycoach.core.pitch import COMMAS_53, PitchNames
    >>> read = read_note_text("tempo: 60\nA4 C5:2 .", PitchNames(COMMAS_53))
    >>> read.headers.tempo, read.items[1].onset_s, read.items[1].duration_s
    (60.0, 1.0, 2.0)
    """
    scan = Scan.of(text, names)
    _refuse(scan.faults, where)
    items = lay_out(scan.items, 0.0, scan.headers.tempo or DEFAULT_TEMPO)
    return NoteText(scan.headers, items, tuple(scan.comments), tuple(scan.places))


def read_tokens(
    text: str, names: PitchNames, start_s: float, tempo: float, where: str = "entry"
) -> tuple[Item, ...]:
    """Read a run of tokens, as a player types them into a line.

    Headers and key signature have no place here; a comment is passed over.

    Parameters
    ----------
    text
        Tokens between white space; may be empty.
    names
        The names and the tone system of the pack.
    start_s
        When the first of them begins, in seconds from the start of the session.
    tempo
        Beats a minute, more than 0.
    where
        What the text is called in messages.

    Raises
    ------
    NoteTextError
        Something cannot be read; `faults` names every place.
    """
    scan = Scan.of(text, names, with_headers=False)
    _refuse(scan.faults, where)
    return lay_out(scan.items, start_s, tempo)


def find_faults(text: str, names: PitchNames, *, with_headers: bool = True) -> tuple[Fault, ...]:
    """Give every place of a text that cannot be read, in order; nothing is raised."""
    return tuple(Scan.of(text, names, with_headers=with_headers).faults)


def _refuse(faults: Sequence[Fault], where: str) -> None:
    if not faults:
        return
    lines = [f"{where}:{fault}" for fault in faults]
    if len(faults) == 1:
        raise NoteTextError(lines[0], lines)
    shown = "; ".join(
        f"{fault.line}:{fault.column} {shorten(fault.token)!r}, {fault.advice}"
        for fault in faults[:_SHOWN_FAULTS]
    )
    more = f"; and {len(faults) - _SHOWN_FAULTS} more" if len(faults) > _SHOWN_FAULTS else ""
    raise NoteTextError(f"{where}: {len(faults)} places that cannot be read: {shown}{more}", lines)


def write_note_text(
    headers: Headers,
    items: Sequence[Item],
    names: PitchNames,
    tempo: float | None = None,
    *,
    comments: Sequence[Comment] = (),
    as_names: bool = False,
) -> str:
    r"""Write a line, typed or played, in the one canonical form.

    Parameters
    ----------
    headers
        Written first, each on a line of its own, and a blank line after them.
    items
        Typed items are written exactly. Played ones get their length in beats to a hundredth, and
        a pause of `RESTING_GAP_S` or more before a played note becomes a rest.
    names
        The names and the tone system of the pack.
    tempo
        Beats a minute for played lengths; None: that of the headers. It is written in the headers
        if they have none and it is not the usual one.
    comments
        Remarks by place, in order.
    as_names
        Write pitches by their names, where they have one.

    Returns
    -------
    str
        Lines that end after each phrase end, after each remark, and at `LINE_WIDTH` characters.

    Examples
    --------
    >>> from melodycoach.core.note import InputKind
    >>> from melodycoach.core.pitch import COMMAS_53, PitchNames
    >>> keys = InputKind.KEYS
    >>> played = [Note(7100.0, 0.0, 0.5, keys), Note(6900.0, 1.0, 1.0, keys), Mark.BREATH]
    >>> write_note_text(Headers(title="Sketch"), played, PitchNames(COMMAS_53), 60)
    'title: Sketch\ntempo: 60\n\nB4~:0.5 -:0.5 A4~ ,\n'
    """
    if tempo is None:
        tempo = headers.tempo or DEFAULT_TEMPO
    elif headers.tempo != tempo and (headers.tempo is not None or tempo != DEFAULT_TEMPO):
        headers = replace(headers, tempo=tempo)
    top = list(_header_lines(headers, names))
    body = _Page()
    waiting = list(comments)
    end_s: float | None = None
    for index, item in enumerate(items):
        while waiting and waiting[0].before <= index:
            body.remark(waiting.pop(0))
        if isinstance(item, Note):
            gap_s = 0.0 if end_s is None else item.onset_s - end_s
            if item.beats is None and gap_s >= RESTING_GAP_S:
                body.put(item_token(Silence(gap_s), names, tempo, step_beats=SAVED_STEP_BEATS))
            end_s = item.onset_s + item.duration_s
        elif isinstance(item, Silence) and end_s is not None:
            end_s += item.duration_s
        step, key = SAVED_STEP_BEATS, headers.key
        body.put(item_token(item, names, tempo, step_beats=step, key=key, as_names=as_names))
        if item is Mark.PHRASE_END:
            body.ends_phrase = True
    for comment in waiting:
        body.remark(comment)
    parts = ["\n".join(lines) for lines in (top, body.lines) if lines]
    return "\n\n".join(parts) + "\n" if parts else ""


def _header_lines(headers: Headers, names: PitchNames) -> Iterator[str]:
    if headers.title:
        yield f"title: {' '.join(headers.title.split())}"
    if headers.mode:
        yield f"mode: {' '.join(headers.mode.split())}"
    if headers.final_cents is not None:
        yield f"final: {write_pitch(Note(headers.final_cents, 0.0, 0.0), names, headers.key)}"
    if headers.tempo is not None:
        yield f"tempo: {headers.tempo!r}".removesuffix(".0")
    if headers.key:
        yield f"key: {' '.join(mark.sign for mark in headers.key)}"


class _Page:
    """Lines under way: the last one is open until something has ended it."""

    def __init__(self) -> None:
        self.lines: list[str] = []
        self.ends_phrase = False
        self._closed = True

    def put(self, token: str) -> None:
        fits = not self._closed and len(self.lines[-1]) + 1 + len(token) <= LINE_WIDTH
        if fits and not self.ends_phrase:
            self.lines[-1] += f" {token}"
        else:
            self.lines.append(token)
        self._closed = self.ends_phrase = False

    def remark(self, comment: Comment) -> None:
        text = f"# {' '.join(comment.text.split())}"
        if comment.own_line or self._closed:
            self.lines.append(text)
        else:
            self.lines[-1] += f" {text}"
        self._closed, self.ends_phrase = True, False
