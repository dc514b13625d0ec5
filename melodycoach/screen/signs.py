"""The signs that the screen draws with, for terminals with and without Unicode.

Conventions
-----------
Every sign fills one cell, and each meaning has a sign of its own: colour only repeats it.
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Signs:
    """One sign for each meaning.

    ``bar`` holds the parts of a bar from the thinnest to the full cell. ``above`` and ``below``
    stand for a note that sounds over or under the rung on which it is drawn.
    """

    decided: str
    undecided: str
    rule: str
    dot: str
    bar: str
    rising: str
    falling: str
    steady: str
    target: str
    heard: str
    owed: str
    welcome: str
    next: str
    note: str
    above: str
    below: str
    held: str
    off: str
    mend: str
    breath: str
    phrase_end: str
    final_guide: str
    dominant_guide: str
    edge: str
    entry: str
    warning: str
    more: str
    minus: str


UNICODE = Signs(
    decided="◆",
    undecided="◇",
    rule="─",
    dot="·",
    bar="▏▎▍▌▋▊▉█",
    rising="▲",
    falling="▼",
    steady="=",
    target="»",
    heard="✓",
    owed="○",
    welcome="+",
    next="▸",
    note="●",
    above="▴",
    below="▾",
    held="━",
    off="✗",
    mend="◌",
    breath="╎",
    phrase_end="│",
    final_guide="┄",
    dominant_guide="·",
    edge="┤",
    entry="›",
    warning="!",
    more="…",
    minus="−",
)

ASCII = Signs(
    decided="*",
    undecided="?",
    rule="-",
    dot="-",
    bar="#",
    rising="^",
    falling="v",
    steady="=",
    target=">",
    heard="+",
    owed=".",
    welcome="&",
    next=">",
    note="o",
    above="'",
    below=",",
    held="-",
    off="x",
    mend="_",
    breath=":",
    phrase_end="|",
    final_guide=".",
    dominant_guide=".",
    edge="|",
    entry=">",
    warning="!",
    more="~",
    minus="-",
)

STYLES: dict[str, str] = {
    "verdict": "bold",
    "verdict.open": "italic",
    "title": "bold ansicyan",
    "rule": "ansibrightblack",
    "faint": "ansibrightblack",
    "name": "",
    "name.first": "bold",
    "bar": "ansicyan",
    "bar.target": "ansimagenta",
    "target": "bold ansimagenta",
    "rising": "ansigreen",
    "falling": "ansired",
    "heard": "ansigreen",
    "owed": "",
    "next": "bold ansiyellow",
    "note": "bold",
    "note.focus": "reverse",
    "off": "bold ansired",
    "mend": "ansiyellow",
    "final": "bold ansicyan",
    "dominant": "ansicyan",
    "for": "ansigreen",
    "against": "ansired",
    "now": "bold ansiyellow",
    "warning": "bold ansired",
    "status": "",
    "key": "bold",
    "hint": "ansibrightblack",
    "entry": "",
    "entry.pending": "underline",
    "entry.unreadable": "bold underline ansired",
    "question": "bold",
    "choice": "",
    "choice.picked": "reverse",
}
"""What each style class looks like; the terminal reads it. Readable in one colour as well."""
