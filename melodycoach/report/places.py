"""Where something stands in a line, in words: a note, a run of notes, several notes.

Where a file has bars, a musician looks for bar and beat; where it has none, for the note and for its
place in the file.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from melodycoach.report.words import plain

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence


def bar_and_beat(bar: str, beat: float) -> str:
    """Say where a note stands in its bar, or nothing where there are no bars.

    >>> bar_and_beat("3", 2.5), bar_and_beat("3", 0.0), bar_and_beat("", 1.0)
    ('bar 3, beat 2.5', 'bar 3', '')
    """
    if not bar:
        return ""
    return f"bar {bar}, beat {plain(beat)}" if beat else f"bar {bar}"


def place(where: Mapping[str, Any] | None) -> str:
    """Say where something stands: bar and beat, or else its place in the file; empty if neither is known.

    >>> place({"bar": "3", "beat": 2.0, "at": "line 4, column 7"}), place(None)
    ('bar 3, beat 2', '')
    >>> place({"bar": "", "beat": 0, "at": "0:12.4"})
    '0:12.4'
    """
    return "" if where is None else bar_and_beat(where["bar"], where["beat"]) or where["at"]


def place_words(where: Mapping[str, Any], number: int) -> str:
    """Say where a note stands; one that stands in no bar is named by its number, too.

    Parameters
    ----------
    where
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
    return place(where) if where["bar"] else numbered_place(where, number)


def numbered_place(where: Mapping[str, Any], number: int) -> str:
    """Say which note it is, and where it stands.

    >>> numbered_place({"bar": "3", "beat": 2.0, "at": "line 4, column 7"}, 12)
    'note 12, bar 3, beat 2'
    """
    return ", ".join(part for part in (f"note {number}", place(where)) if part)


def notes_between(first: int, last: int) -> str:
    """Name a run of notes.

    >>> notes_between(3, 3), notes_between(3, 8)
    ('note 3', 'notes 3 to 8')
    """
    return f"note {first}" if first == last else f"notes {first} to {last}"


def runs(numbers: Sequence[int]) -> list[tuple[int, int]]:
    """Give the first and the last of each run of numbers that follow each other.

    >>> runs([3, 4, 5, 9])
    [(3, 5), (9, 9)]
    """
    found: list[tuple[int, int]] = []
    for number in numbers:
        joins = bool(found) and found[-1][1] == number - 1
        found[-1:] = [(found[-1][0], number)] if joins else [*found[-1:], (number, number)]
    return found


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
