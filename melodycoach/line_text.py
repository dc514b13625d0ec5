"""The live line as note text: what the entry shows of it, and how it is opened and saved.

A played note has seconds and no beats. In the entry it counts one beat, or two where the line rests
on it; in a file it is written at the line's own pace.
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from itertools import chain, count, pairwise, zip_longest
from pathlib import Path
from statistics import median
from typing import TYPE_CHECKING

from melodycoach.core.event import PitchReading
from melodycoach.core.note import Item, Mark, Note
from melodycoach.core.sheet import SheetKind
from melodycoach.errors import NoteTextError, StorageError, UnknownNameError
from melodycoach.reading import read_file
from melodycoach.sources.no_music import no_music
from melodycoach.sources.note_scan import FASTEST_TEMPO, SLOWEST_TEMPO
from melodycoach.sources.note_text import (
    DEFAULT_TEMPO,
    Comment,
    Headers,
    find_faults,
    read_note_text,
    read_tokens,
    write_note_text,
)
from melodycoach.sources.sheet_file import FIRST_BYTES, kind_of, read_sheet, read_text
from melodycoach.storing import write_whole

if TYPE_CHECKING:
    from collections.abc import Sequence
    from datetime import date

    from melodycoach.core.pitch import PitchNames
    from melodycoach.core.session import Line
    from melodycoach.core.sheet import Sheet

SLOWEST_BPM, FASTEST_BPM = 30.0, 300.0
"""Bounds of the tempo that a played line is saved with."""


@dataclass(frozen=True, slots=True)
class Page:
    """What a file holds beside the items of its line.

    ``remarks`` are its comments, each with the note that it stands before, or None at the end: so
    a comment keeps to its note while the line around it is edited. ``kind`` is what kind of file it
    was; ``says`` and ``lost`` are what its reader says of it.
    """

    headers: Headers = field(default_factory=Headers)
    remarks: tuple[tuple[Comment, Note | None], ...] = ()
    kind: SheetKind = SheetKind.NOTE_TEXT
    says: tuple[str, ...] = ()
    lost: tuple[str, ...] = ()

    @property
    def tempo(self) -> float:
        """Beats a minute of what is typed."""
        return float(self.headers.tempo or DEFAULT_TEMPO)


def open_line(path: Path, names: PitchNames) -> tuple[Page, tuple[Item, ...]]:
    """Read the line of a file of any kind, and what else it holds.

    Raises
    ------
    StorageError
        The file cannot be read.
    NoteTextError, MusicFileError
        It does not hold what it should.
    """
    data = read_file(path)
    if kind_of(data) is not SheetKind.NOTE_TEXT:
        sheet = read_sheet(data, path.name, names)
        return _page_of(sheet), sheet.items
    read = read_note_text(read_text(data, str(path)), names, path.name)
    remarks = tuple((comment, _note_from(read.items, comment.before)) for comment in read.comments)
    return Page(read.headers, remarks), read.items


def _page_of(sheet: Sheet) -> Page:
    """Keep of what a file says of itself what note text can say."""
    tempo = sheet.tempo if sheet.tempo and SLOWEST_TEMPO <= sheet.tempo <= FASTEST_TEMPO else None
    title = "".join(letter for letter in sheet.title if letter.isprintable())
    headers = Headers(title, sheet.mode, sheet.final_cents, tempo)
    return Page(headers, kind=sheet.kind, says=sheet.says, lost=sheet.lost)


def played_until(items: Sequence[Item], now_s: float) -> tuple[Item, ...]:
    """Move a line in time so that it ends now at the latest, and what is played next comes after it."""
    notes = [item for item in items if isinstance(item, Note)]
    late_s = max((note.onset_s + note.duration_s for note in notes), default=now_s) - now_s
    if late_s <= 0:
        return tuple(items)
    return tuple(
        replace(item, onset_s=item.onset_s - late_s) if isinstance(item, Note) else item for item in items
    )


def save_line(path: Path, page: Page, line: Line, names: PitchNames) -> None:
    """Write a line to a file: all of it, or nothing.

    Raises
    ------
    StorageError
        The file cannot be written, or there is a MIDI file or a score of that name.
    """
    _refuse_other_kinds(path)
    place_by_note = {id(item): place for place, item in enumerate(line.items)}
    end = len(line.items)
    comments = [replace(comment, before=place_by_note.get(id(note), end)) for comment, note in page.remarks]
    comments.sort(key=lambda comment: comment.before)
    tempo = page.headers.tempo or pace_bpm(line)
    text = write_note_text(page.headers, line.items, names, tempo, comments=comments)
    write_whole(path, [text], "the line is still here, save it elsewhere")


def text_path(path: Path) -> Path:
    """Give the path under which the line of a file is saved: note text has a name of its own.

    >>> from pathlib import Path
    >>> text_path(Path("draft.mid")).name, text_path(Path("draft.txt")).name
    ('draft.txt', 'draft.txt')
    """
    return path.with_suffix(".txt")


def path_to_save(path: Path | None, kind: SheetKind, day: date) -> Path:
    """Propose where a line is saved: in its own file, beside that, or under the day in this folder.

    Parameters
    ----------
    path, kind
        Where the line comes from, and what kind of file that is; no path: from no file.
    day
        Today.

    Examples
    --------
    >>> from datetime import date
    >>> from pathlib import Path
    >>> path_to_save(Path("draft.mid"), SheetKind.MIDI, date(2026, 3, 9)).name
    'draft.txt'
    >>> path_to_save(None, SheetKind.NOTE_TEXT, date(2026, 3, 9)).name
    'line-2026-03-09.txt'
    """
    if path is not None:
        return path if kind is SheetKind.NOTE_TEXT else text_path(path)
    names = chain([f"line-{day:%Y-%m-%d}"], (f"line-{day:%Y-%m-%d}-{n}" for n in count(2)))
    return next(proposed for name in names if not (proposed := Path(f"{name}.txt")).exists())


def _refuse_other_kinds(path: Path) -> None:
    try:
        with path.open("rb") as file:
            begins = file.read(FIRST_BYTES)
    except OSError:
        return  # it is not there yet, or writing it will say what is wrong
    kind = kind_of(begins)
    found = no_music(begins) or ("" if kind is SheetKind.NOTE_TEXT else kind.value)
    if found:
        raise StorageError(
            f"{path}: there is a file of another kind there, {found}, and a line is saved as note text; "
            f"save it as {text_path(path)}"
        )


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
