"""Words and numbers as all reports write them: shares, lengths, signs, pitches, lists."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from melodycoach.core import verdict

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

MINUS = "\N{MINUS SIGN}"

_LEAST_SHARE = 1e-9  # a probability is rounded in an answer: none of them is told as impossible


def percent(probability: float) -> str:
    """Write a probability in a sentence; what is not certain is not called so.

    >>> percent(0.724), percent(0.998), percent(0.002), percent(0.0)
    ('72 %', 'over 99 %', 'under 1 %', 'under 1 %')
    """
    return verdict.percent(max(probability, _LEAST_SHARE))


def short_percent(probability: float) -> str:
    """Write a probability where there is little room.

    >>> short_percent(0.724), short_percent(0.998), short_percent(0.0)
    ('72 %', '>99 %', '<1 %')
    """
    return percent(probability).replace("over ", ">").replace("under ", "<")


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


def times(count: int) -> str:
    """Write how often something is.

    >>> times(1), times(2), times(5)
    ('once', 'twice', '5 times')
    """
    return {1: "once", 2: "twice"}.get(count, f"{count} times")


def pitch(of: Mapping[str, Any]) -> str:
    """Name a pitch, and how it is written where that is another word.

    >>> pitch({"name": "dügâh", "written": "A4"}), pitch({"name": "A4", "written": "A4"})
    ('dügâh (A4)', 'A4')
    """
    return of["name"] if of["name"] == of["written"] else f"{of['name']} ({of['written']})"


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
