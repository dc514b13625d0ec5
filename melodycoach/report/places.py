"""Where something stands in a line, in words: a note, a run of notes, several notes.

Where a file has bars, a musician looks for bar and beat; where it has none, for the note and for its
place in the file.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from melodycoach.report.page_words import bar_and_beat, notes_between, runs

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence


def place_words(place: Mapping[str, Any], number: int) -> str:
    """Say where a note stands.

    Parameters
    ----------
    place
        ``bar``, ``beat`` and ``at``, as an answer has them.
    number
        The note, counted from 1.

    Examples
    --------
    >>> place_words({"bar": "3", "beat": 2.0, "at": "line 4, column 7"}, 12)
    'bar 3, beat 2'
    >>> place_words({"bar": "", "beat": 0.0, "at": "line 3, column 7"}, 12)
    'note 12, line 3, column 7'
    >>> place_words({"bar": "", "beat": 0.0, "at": ""}, 12)
    'note 12'
    """
    in_bar = bar_and_beat(place["bar"], place["beat"])
    return in_bar or ", ".join(part for part in (f"note {number}", place["at"]) if part)


def stretch_words(notes: Sequence[Mapping[str, Any]], first: int, last: int) -> str:
    """Say where some notes in a row stand: their bars, or else their numbers.

    Parameters
    ----------
    notes
        All notes of an answer.
    first, last
        Numbers of the notes, from 1.

    Examples
    --------
    >>> stretch_words([{"bar": "1"}, {"bar": "1"}, {"bar": "2"}], 1, 2)
    'bar 1'
    >>> stretch_words([{"bar": "1"}, {"bar": "1"}, {"bar": "2"}], 2, 3)
    'bars 1–2'
    >>> stretch_words([{"bar": ""}, {"bar": ""}], 1, 2)
    'notes 1 to 2'
    """
    begins, ends = notes[first - 1]["bar"], notes[last - 1]["bar"]
    if not begins or not ends:
        return notes_between(first, last)
    return f"bar {begins}" if begins == ends else f"bars {begins}–{ends}"


def bars_words(names: Sequence[str]) -> str:
    """Name a run of bars by the first and the last of them.

    >>> bars_words(["8"]), bars_words(["8", "9", "10"])
    ('bar 8', 'bars 8–10')
    """
    return f"bar {names[0]}" if len(names) == 1 else f"bars {names[0]}–{names[-1]}"


def scattered_words(notes: Sequence[Mapping[str, Any]], numbers: Sequence[int]) -> str:
    """Say where several notes stand: in which bars, or else which notes they are.

    >>> notes = [{"bar": bar} for bar in ("1", "1", "2", "3", "4", "5")]
    >>> scattered_words(notes, [1]), scattered_words(notes, [1, 2, 3, 6])
    ('bar 1', 'bars 1–2, 5')
    >>> scattered_words([{"bar": ""}] * 4, [1, 2, 4]), scattered_words([{"bar": ""}] * 4, [2])
    ('notes 1–2, 4', 'note 2')
    >>> scattered_words(notes, [])
    ''
    """
    if not numbers:
        return ""
    if not all(notes[number - 1]["bar"] for number in numbers):
        return _counted_off("note", [str(number) for number in range(1, len(notes) + 1)], numbers)
    names = list(dict.fromkeys(note["bar"] for note in notes))
    return _counted_off("bar", names, [names.index(notes[number - 1]["bar"]) + 1 for number in numbers])


def _counted_off(word: str, names: Sequence[str], numbers: Sequence[int]) -> str:
    """Name things by their numbers from 1; those that follow each other stand as first and last."""
    wanted = sorted(set(numbers))
    found = [
        names[first - 1] if first == last else f"{names[first - 1]}–{names[last - 1]}"
        for first, last in runs(wanted)
    ]
    return f"{word}{'s' if len(wanted) > 1 else ''} {', '.join(found)}"
