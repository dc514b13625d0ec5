"""The live line as note text: what the entry shows of it, and how it is opened and saved.

A played note has seconds and no beats. In the entry it counts one beat, or two where the line rests
on it; in a file it is written at the line's own pace.
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from itertools import pairwise, zip_longest
from statistics import median
from typing import TYPE_CHECKING

from melodycoach.core.event import PitchReading
from melodycoach.core.note import Item, Mark, Note
from melodycoach.errors import NoteTextError, StorageError, UnknownNameError, system_reason
from melodycoach.sources.near_files import near_files
from melodycoach.sources.note_text import (
    DEFAULT_TEMPO,
    Comment,
    Headers,
    find_faults,
    read_note_text,
    read_tokens,
    write_note_text,
)

if TYPE_CHECKING:
    from collections.abc import Sequence
    from pathlib import Path

    from melodycoach.core.pitch import PitchNames
    from melodycoach.core.session import Line

SLOWEST_BPM, FASTEST_BPM = 30.0, 300.0
"""Bounds of the tempo that a played line is saved with."""


@dataclass(frozen=True, slots=True)
class Page:
    """What a file holds beside the items of its line.

    ``remarks`` are its comments, each with the note that it stands before, or None at the end: so
    a comment keeps to its note while the line around it is edited.
    """

    headers: Headers = field(default_factory=Headers)
    remarks: tuple[tuple[Comment, Note | None], ...] = ()

    @property
    def tempo(self) -> float:
        """Beats a minute of what is typed."""
        return float(self.headers.tempo or DEFAULT_TEMPO)


def open_line(path: Path, names: PitchNames) -> tuple[Page, tuple[Item, ...]]:
    """Read the line of a note-text file, and what else it holds.

    Raises
    ------
    StorageError
        The file cannot be read.
    NoteTextError
        It holds something that is no note text.
    """
    try:
        text = path.read_text(encoding="utf-8-sig")
    except OSError as error:
        advice = near_files(path) or "name a file of note text"
        raise StorageError(f"{path}: {system_reason(error)}; {advice}") from error
    except UnicodeDecodeError as error:
        raise StorageError(f"{path}: byte {error.start} is not UTF-8 text; save the file as UTF-8") from error
    read = read_note_text(text, names, path.name)
    remarks = tuple((comment, _note_from(read.items, comment.before)) for comment in read.comments)
    return Page(read.headers, remarks), read.items


def save_line(path: Path, page: Page, line: Line, names: PitchNames) -> None:
    """Write a line to a file: all of it, or nothing.

    Raises
    ------
    StorageError
        The file cannot be written.
    """
    place_by_note = {id(item): place for place, item in enumerate(line.items)}
    end = len(line.items)
    comments = [replace(comment, before=place_by_note.get(id(note), end)) for comment, note in page.remarks]
    comments.sort(key=lambda comment: comment.before)
    tempo = page.headers.tempo or pace_bpm(line)
    text = write_note_text(page.headers, line.items, names, tempo, comments=comments)
    unfinished = path.with_name(f"{path.name}.unfinished")
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        unfinished.write_text(text, encoding="utf-8")
        unfinished.replace(path)
    except OSError as error:
        raise StorageError(
            f"{path}: {system_reason(error)}; the line is still here, save it elsewhere"
        ) from error


def _note_from(items: Sequence[Item], place: int) -> Note | None:
    return next((item for item in items[place:] if isinstance(item, Note)), None)


def entry_items(line: Line, first: int = 0) -> tuple[Item, ...]:
    """Give the line from an item on as the entry shows it: a played note counts one beat, or two.

    It counts two where the line rests on it and no breath or phrase end says so already. So the
    entry stays readable, and a token that is edited keeps what the scorer heard in it.
    """
    shown: list[Item] = []
    n_before = sum(isinstance(item, Note) for item in line.items[:first])
    heard = iter(line.heard[n_before:])
    for item, after in zip_longest(line.items[first:], line.items[first + 1 :]):
        if isinstance(item, Note):
            marked = isinstance(after, Mark)
            beats = 2.0 if next(heard).rests and not marked else 1.0
            shown.append(item if item.beats is not None else replace(item, beats=beats))
        else:
            shown.append(item)
    return tuple(shown)


def pace_bpm(line: Line) -> float | None:
    """Give the tempo at which the usual played note takes one beat, or None where none was played."""
    notes = [item for item in line.items if isinstance(item, Note)]
    onsets = [note.onset_s for note in notes if note.beats is None]
    spans = [b - a for a, b in pairwise(onsets) if b > a]
    if not onsets:
        return None
    return float(round(min(max(60 / median(spans), SLOWEST_BPM), FASTEST_BPM))) if spans else DEFAULT_TEMPO


def notes_with_marks(items: Sequence[Item]) -> list[tuple[Item, ...]]:
    """Cut a run of items before each note, so that every note has what follows it beside it."""
    groups: list[tuple[Item, ...]] = []
    for item in items:
        if isinstance(item, Note) or not groups:
            groups.append((item,))
        else:
            groups[-1] = (*groups[-1], item)
    return groups


def read_final(text: str, names: PitchNames) -> tuple[PitchReading, float | None]:
    """Read what the player says of the final: a pitch or a perde, ``written`` or ``any``.

    Raises
    ------
    UnknownNameError
        It is none of these.
    """
    word = text.strip()
    if word.lower() in (PitchReading.WRITTEN, PitchReading.ANY):
        return PitchReading(word.lower()), None
    try:
        items = read_tokens(word, names, 0.0, DEFAULT_TEMPO)
    except NoteTextError:
        items = ()
    if len(items) != 1 or not isinstance(items[0], Note):
        faults = find_faults(word, names, with_headers=False)
        advice = f"; {faults[0].advice}" if len(faults) == 1 and faults[0].nearest else ""
        raise UnknownNameError(
            f"final: found {text!r}, expected one pitch such as A4 or dügâh, or 'written' or 'any'{advice}"
        )
    return PitchReading.FINAL, items[0].pitch_cents
