"""Words and numbers as the pages write them: places, shares, lengths, lists of notes."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

MINUS = "\N{MINUS SIGN}"


def percent(probability: float) -> str:
    """Write a probability for people; what is not certain is not called so.

    >>> percent(0.724), percent(0.998), percent(0.002), percent(0.0)
    ('72 %', '>99 %', '<1 %', '<1 %')
    """
    if probability >= 0.995:
        return ">99 %"
    return "<1 %" if probability < 0.005 else f"{probability * 100:.0f} %"


def plain(value: float) -> str:
    """Write a number with at most two decimals.

    >>> plain(2.0), plain(1.5), plain(1.3333)
    ('2', '1.5', '1.33')
    """
    return f"{value:.2f}".rstrip("0").rstrip(".")


def signed(nats: float) -> str:
    """Write what a reason adds.

    >>> signed(1.27), signed(-0.44), signed(-0.01)
    ('+1.3', '−0.4', '0.0')
    """
    size = f"{abs(nats):.1f}"
    return size if float(size) == 0 else f"{MINUS if nats < 0 else '+'}{size}"


def whole(value: int) -> str:
    """Write a whole number with its sign.

    >>> whole(4), whole(-9), whole(0)
    ('+4', '−9', '0')
    """
    return f"{MINUS if value < 0 else '+'}{abs(value)}" if value else "0"


def capital(text: str) -> str:
    """Begin a sentence."""
    return text[:1].upper() + text[1:]


def counted(count: int, one: str, many: str = "") -> str:
    """Write how many there are.

    >>> counted(1, "note"), counted(0, "note"), counted(2, "off", "off")
    ('1 note', 'no notes', '2 off')
    """
    return f"{count or 'no'} {one if count == 1 else many or one + 's'}"


def bar_and_beat(bar: str, beat: float) -> str:
    """Say where a note stands in its bar, or nothing where there are no bars.

    >>> bar_and_beat("3", 2.5), bar_and_beat("3", 0.0), bar_and_beat("", 1.0)
    ('bar 3, beat 2.5', 'bar 3', '')
    """
    if not bar:
        return ""
    return f"bar {bar}, beat {plain(beat)}" if beat else f"bar {bar}"


def place(where: Mapping[str, Any] | None) -> str:
    """Say where to look: bar and beat, the place in the file, or both.

    >>> place({"bar": "3", "beat": 2.0, "at": "line 4, column 7"})
    'bar 3, beat 2 (line 4, column 7)'
    >>> place({"bar": "", "beat": 0, "at": "0:12.4"})
    '0:12.4'
    >>> place(None)
    ''
    """
    if where is None:
        return ""
    in_bar, at = bar_and_beat(where["bar"], where["beat"]), where["at"]
    return f"{in_bar} ({at})" if in_bar and at else in_bar or at


def pitch(of: Mapping[str, Any]) -> str:
    """Name a pitch, and how it is written where that is another word.

    >>> pitch({"name": "dügâh", "written": "A4"}), pitch({"name": "A4", "written": "A4"})
    ('dügâh (A4)', 'A4')
    """
    return of["name"] if of["name"] == of["written"] else f"{of['name']} ({of['written']})"


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


def listed(words: Sequence[str], between: str = "and") -> str:
    """Write a list as a sentence has it.

    >>> listed(["a"]), listed(["a", "b"], "or"), listed(["a", "b", "c"])
    ('a', 'a or b', 'a, b and c')
    """
    if len(words) < 2:
        return "".join(words)
    return f"{', '.join(words[:-1])} {between} {words[-1]}"


def beside(term: str, words: Mapping[str, str]) -> str:
    """Give a term with the word that the trade has for it.

    >>> beside("course", {"course": "seyir"}), beside("course", {})
    ('course (seyir)', 'course')
    """
    return f"{term} ({words[term]})" if term in words else term
