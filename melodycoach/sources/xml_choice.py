"""Which part, which voice and which staff of a score hold the melody.

The part is the first that has notes with a pitch and is no percussion. Its voice is the highest, on
average, of those that have many notes: at least `FULL_SHARE` times as many as the fullest. A chord
counts as one note, by its highest, so that an accompaniment in chords does not count for more than
the melody over it. Of voices that are equally high the first in the file is taken. How high a note
is, is told by its letter and octave alone.

A voice that goes from staff to staff is read on all of them, and so is a chord over two. Where it
stands on several at once, as some programs write piano music, one staff is chosen as a voice is.
"""

from __future__ import annotations

from dataclasses import dataclass
from operator import attrgetter
from statistics import fmean
from typing import TYPE_CHECKING

from melodycoach.core.pitch import LETTERS
from melodycoach.errors import MusicFileError, shorten
from melodycoach.sources.xml_part import NO_PITCH
from melodycoach.sources.xml_score import NEAR

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from melodycoach.sources.xml_score import Bar, Part, Score, WrittenNote

FULL_SHARE = 0.5
"""A voice with so much of the notes of the fullest one has many notes."""

MOST_NAMED = 6
"""So many parts, voices, bars or conflicts are named one by one."""


@dataclass(frozen=True, slots=True)
class Choice:
    """What is read, and why, in sentences: none where there is nothing else; `staff`: empty for all."""

    part: Part
    voice: str
    staff: str
    says: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class _Strand:
    """A voice, or what a voice has on one staff: how many notes, and how high they are on average."""

    name: str
    n_notes: int
    height: float


def choose(score: Score, part: str, voice: str, where: str) -> Choice:
    """Choose the melody of a score, as the module describes it.

    Parameters
    ----------
    score
        What the file holds.
    part, voice
        As `read_music_xml` takes them.
    where
        How error texts name the file.

    Raises
    ------
    MusicFileError
        There is no such part or voice, or no melody in any.
    """
    chosen = _called_part(score.parts, part, where) if part else _first_melody(score.parts, where)
    says = []
    if len(score.parts) > 1:
        number = next(n for n, other in enumerate(score.parts, 1) if other is chosen)
        why = "as chosen" if part else "the first with a melody; --part chooses another"
        says.append(f"part {number} of {len(score.parts)}, {_called(chosen)}, is read: {why}")
    name, voice_says = _choose_voice(chosen, voice, where)
    staff, staff_says = _choose_staff(chosen, name)
    return Choice(chosen, name, staff, (*says, *voice_says, *staff_says))


# --- parts -------------------------------------------------------------------------------------


def _first_melody(parts: Sequence[Part], where: str) -> Part:
    """Find the first part that can hold a melody."""
    pitched = [part for part in parts if part.has_notes]
    for part in pitched:
        if not part.is_percussion:
            return part
    if any(NO_PITCH in part.damage for part in parts):
        raise MusicFileError(
            f"{where}: its notes have no pitch that can be read, as in tablature, expected a melody; "
            "export it again as notes on a staff"
        )
    found = "only percussion" if pitched or any(part.n_unpitched for part in parts) else "no notes"
    raise MusicFileError(f"{where}: {found} in it, expected a melody; open a score that has one")


def _called_part(parts: Sequence[Part], wanted: str, where: str) -> Part:
    """Find the part that is asked for."""
    found = _parts_called(parts, wanted)
    if len(found) != 1:
        which = "several parts are" if found else "no part is"
        raise MusicFileError(
            f"{where}: {which} called {shorten(wanted)!r}; choose one with --part: {_list(parts)}"
        )
    if not found[0].has_notes:
        raise MusicFileError(
            f"{where}: part {shorten(wanted)!r} has no notes with a pitch, expected a melody; "
            f"choose another with --part: {_list(parts)}"
        )
    return found[0]


def _parts_called(parts: Sequence[Part], wanted: str) -> list[Part]:
    """Find by number, then by id, then by whole name, then by a piece of the name."""
    folded = wanted.strip().casefold()
    if folded.isascii() and folded.isdigit() and len(folded) < 6 and 1 <= int(folded) <= len(parts):
        return [parts[int(folded) - 1]]
    for calls in (
        lambda part: part.id == wanted.strip(),
        lambda part: part.name.casefold() == folded,
        lambda part: folded in part.name.casefold(),
    ):
        if found := [part for part in parts if calls(part)]:
            return found
    return []


def _list(parts: Sequence[Part]) -> str:
    named = [f"{number} {_called(part)}" for number, part in enumerate(parts, 1)]
    return ", ".join(some(named, "more"))


def _called(part: Part) -> str:
    return repr(shorten(part.name or part.id))


# --- voices and staves -------------------------------------------------------------------------


def _choose_voice(part: Part, wanted: str, where: str) -> tuple[str, tuple[str, ...]]:
    """Give the voice that is asked for, or the melody, and what is to be said of it."""
    names = list(dict.fromkeys(note.voice for bar in part.bars for note in bar.notes))
    if wanted and wanted.strip() not in names:
        known = ", ".join(some([shorten(name, 12) for name in names], "more"))
        raise MusicFileError(
            f"{where}: no voice {shorten(wanted)!r} in the part; choose one with --voice: {known}"
        )
    if len(names) == 1:
        return names[0], ()
    voices = _strands(part, attrgetter("voice"))
    name, why = (wanted.strip(), "as chosen") if wanted else _highest(voices)
    option = "" if wanted else "; --voice chooses another"
    counts = some([f"{shorten(one.name, 12)} ({count(one.n_notes, 'note')})" for one in voices], "more")
    says = (
        f"voice {shorten(name, 12)} is read: {why}{option}; the part has voices {', '.join(counts)}, "
        "a chord counted as one note"
    )
    return name, (says,)


def _choose_staff(part: Part, voice: str) -> tuple[str, tuple[str, ...]]:
    """Give the staff to read of a voice that stands on several at once, and what is to be said of it."""
    if not any(_on_several_staves(bar, voice) for bar in part.bars):
        return "", ()
    staves = _strands(part, lambda note: note.staff if note.voice == voice else None)
    name, why = _highest(staves)
    return name, (f"the voice stands on several staves at once: staff {name} is read, {why}",)


def _on_several_staves(bar: Bar, voice: str) -> bool:
    """Tell whether a note of a voice begins on one staff while one of another staff still sounds."""
    if len({note.staff for note in bar.notes}) < 2:
        return False
    ends: dict[str, float] = {}
    of_voice = [note for note in bar.notes if note.voice == voice and not note.grace and not note.chord]
    for note in sorted(of_voice, key=attrgetter("at")):
        if any(end > note.at + NEAR for staff, end in ends.items() if staff != note.staff):
            return True
        ends[note.staff] = note.at + note.length
    return False


def _strands(part: Part, strand_of: Callable[[WrittenNote], str | None]) -> list[_Strand]:
    """Give the strands of a part, in the order of the file; a note may be of none."""
    heights: dict[str, list[int]] = {}
    for bar in part.bars:
        tops: dict[tuple[str, float], int] = {}  # strand and time: the highest note
        for note in bar.notes:
            if (name := strand_of(note)) is not None:
                height = 7 * note.pitch.octave + LETTERS.index(note.pitch.step)
                tops[name, note.at] = max(height, tops.get((name, note.at), height))
        for (name, _), height in tops.items():
            heights.setdefault(name, []).append(height)
    return [_Strand(name, len(of_strand), fmean(of_strand)) for name, of_strand in heights.items()]


def _highest(strands: Sequence[_Strand]) -> tuple[str, str]:
    """Give the highest of those with many notes, and why it is taken."""
    many = FULL_SHARE * max(strand.n_notes for strand in strands)
    full = [strand for strand in strands if strand.n_notes >= many]
    why = "the highest of those with many notes" if len(full) > 1 else "the only one with many notes"
    return max(full, key=lambda strand: strand.height).name, why


# --- words -------------------------------------------------------------------------------------


def some(words: Sequence[str], rest: str) -> tuple[str, ...]:
    """Keep the first of a list, and count the rest.

    >>> some("abcdefghi", "more")
    ('a', 'b', 'c', 'd', 'e', 'f', 'and 3 more')
    """
    if len(words) <= MOST_NAMED + 1:
        return tuple(words)
    return (*words[:MOST_NAMED], f"and {len(words) - MOST_NAMED} {rest}")


def count(number: int, word: str) -> str:
    """Count things.

    >>> count(1, "note"), count(2, "note")
    ('1 note', '2 notes')
    """
    return f"{number} {word}{'' if number == 1 else 's'}"
