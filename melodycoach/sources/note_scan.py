"""One pass over note text: headers, tokens and remarks, and every place that cannot be read."""

from __future__ import annotations

import re
import unicodedata
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from melodycoach.core.note import InputKind, Note
from melodycoach.core.pitch import A4_CENTS, fold_name
from melodycoach.errors import nearest_names, shorten
from melodycoach.sources.note_repair import nearest_token
from melodycoach.sources.note_token import Misread, read_key_mark, read_token

if TYPE_CHECKING:
    from collections.abc import Iterator

    from melodycoach.core.note import Item
    from melodycoach.core.pitch import PitchNames, Spelling

MAX_TEXT_CHARS = 1_000_000
"""A longer text is no melody."""

SLOWEST_TEMPO, FASTEST_TEMPO = 10.0, 500.0
"""Beats a minute that make sense."""

HEADER_KEYS = ("title", "mode", "final", "tempo", "key")

_MAX_NEAREST = 300  # looking for the nearest token is slow; a text with more bad ones is no note text
_NEWLINE = re.compile(r"\r\n|[\n\r\x85\u2028\u2029]")
_WORD = re.compile(r"\S+")
_HEADER = re.compile(r"(?P<key>[^\W\d_]{1,40})(?P<gap>\s*):(?P<value>.*)", re.DOTALL)
_NUMBER = re.compile(r"\d{1,4}(?:\.\d{1,30})?", re.ASCII)


@dataclass(frozen=True, slots=True)
class Headers:
    """What a text says of itself before the first note.

    Parameters
    ----------
    title
        Free words, or empty.
    mode
        The mode that the line is meant to be in, as typed; which modes exist is not known here.
    final_cents
        The final that it is meant to close on.
    tempo
        Beats a minute; None stands for the usual tempo.
    key
        The key signature: each letter at most once, octave 0. Notes without a mark of their own
        take theirs from it.
    """

    title: str = ""
    mode: str = ""
    final_cents: float | None = None
    tempo: float | None = None
    key: tuple[Spelling, ...] = ()


@dataclass(frozen=True, slots=True)
class Comment:
    """A remark: the number of items before it, its text, and whether it has a line to itself."""

    before: int
    text: str
    own_line: bool = True


@dataclass(frozen=True, slots=True)
class Fault:
    """A place in a text that cannot be read.

    ``line`` and ``column`` count from 1, the column in characters as an editor shows them.
    ``nearest`` is the readable text that comes closest, or empty; ``advice`` says so in words.
    """

    line: int
    column: int
    token: str
    problem: str
    expected: str
    nearest: str = ""
    hint: str = ""

    @property
    def advice(self) -> str:
        """What to do about it."""
        if self.nearest:
            return f"did you mean {self.nearest!r}?"
        return self.hint or "mend it or delete it"

    @property
    def sentence(self) -> str:
        """What was found, what was expected, and what to do."""
        return f"{shorten(self.token)!r} {self.problem}, expected {self.expected}; {self.advice}"

    def __str__(self) -> str:
        """Say the same with its place in front."""
        return f"{self.line}:{self.column}: {self.sentence}"


@dataclass
class Scan:
    """What one pass over a text has found; items have no times yet."""

    names: PitchNames
    with_headers: bool = True
    headers: Headers = Headers()
    items: list[Item] = field(default_factory=list)
    places: list[tuple[int, int]] = field(default_factory=list)  # line and column of each item
    comments: list[Comment] = field(default_factory=list)
    faults: list[Fault] = field(default_factory=list)
    _values: dict[str, tuple[int, int, str]] = field(default_factory=dict)
    _near_cents: float = A4_CENTS
    _nearest: dict[tuple[str, int], str] = field(default_factory=dict)

    @classmethod
    def of(cls, text: str, names: PitchNames, *, with_headers: bool = True) -> Scan:
        """Read a whole text; nothing is raised, faults are kept in order."""
        scan = cls(names, with_headers)
        if len(text) > MAX_TEXT_CHARS:
            problem = f"begins a text of {len(text)} characters"
            expected = f"at most {MAX_TEXT_CHARS}"
            scan.faults.append(Fault(1, 1, text[:20], problem, expected, hint="split it"))
            return scan
        at_top = with_headers
        for number, raw in enumerate(_NEWLINE.split(text.removeprefix("\ufeff")), 1):
            line = unicodedata.normalize("NFC", raw)
            if not line.strip() or scan._take_header(number, line, at_top=at_top):
                continue
            if at_top and not line.lstrip().startswith("#"):
                at_top = False
                scan._finish_headers()
            scan._read_line(number, line)
        if at_top:
            scan._finish_headers()
        scan.faults.sort(key=lambda fault: (fault.line, fault.column))
        return scan

    def _fault(
        self, line: int, column: int, token: str, misread: Misread, nearest: str = "", hint: str = ""
    ) -> None:
        self.faults.append(Fault(line, column, token, misread.problem, misread.expected, nearest, hint))

    # --- lines of tokens -----------------------------------------------------------------------

    def _read_line(self, line: int, text: str) -> None:
        n_before = len(self.items)
        for word, column, rest in _words(text):
            if word.startswith("#"):
                self._remark(line, column, rest, own_line=len(self.items) == n_before)
                return
            item = self._read_word(line, column, word)
            if item is not None:
                self.items.append(item)
                self.places.append((line, column))

    def _read_word(self, line: int, column: int, word: str) -> Item | None:
        item = read_token(word, self.names, self.headers.key)
        if not isinstance(item, Misread):
            if isinstance(item, Note):
                self._near_cents = item.pitch_cents
            return item
        if _unprintable(word):
            item = _UNPRINTABLE
        self._fault(line, column, word, item, self._nearest_to(word))
        return None

    def _nearest_to(self, word: str) -> str:
        place = (word, round(self._near_cents / 300))
        if place not in self._nearest:
            if len(self._nearest) >= _MAX_NEAREST:
                return ""
            self._nearest[place] = nearest_token(word, self.names, self._near_cents, self.headers.key)
        return self._nearest[place]

    def _remark(self, line: int, column: int, rest: str, *, own_line: bool) -> None:
        text = _one_line(rest[1:])
        if _unprintable(text):
            self._fault(line, column, text, _UNPRINTABLE)
        elif text:
            self.comments.append(Comment(len(self.items), text, own_line))

    # --- headers -------------------------------------------------------------------------------

    def _take_header(self, line: int, text: str, *, at_top: bool) -> bool:
        match = _HEADER.fullmatch(text.strip())
        if match is None:
            return False
        word, key = match["key"], fold_name(match["key"])
        column = text.index(word) + 1
        if key not in HEADER_KEYS:
            spaced = not match["gap"] and (not match["value"] or match["value"][0].isspace())
            if not at_top or not spaced or self.names.find(word):
                return False
            hint = nearest_names(key, HEADER_KEYS)
            self._fault(line, column, word, Misread("is no header", _WANTED_HEADER), hint=hint)
            return True
        if not at_top:
            place = "one before the first note only" if self.with_headers else "only tokens here"
            self._fault(line, column, text.strip(), Misread("is a header", place), hint=_MOVE_UP)
            return True
        value_column = text.index(":", column - 1) + 2
        value = match["value"]
        if key != "title":
            value = self._cut_remark(line, value_column, value)
        value_column += len(value) - len(value.lstrip())
        value = _one_line(value)
        if key in self._values:
            misread = Misread("is a second header of that name", "one")
            self._fault(line, column, word, misread, hint="delete one of them")
        elif not value:
            self._fault(line, column, f"{word}:", Misread("says nothing", "a value after the colon"))
        elif _unprintable(value):
            self._fault(line, value_column, value, _UNPRINTABLE)
        else:
            self._values[key] = (line, value_column, value)
        return True

    def _cut_remark(self, line: int, column: int, value: str) -> str:
        for word, at, rest in _words(value):
            if word.startswith("#"):
                self._remark(line, column + at - 1, rest, own_line=True)
                return value[: at - 1]
        return value

    def _finish_headers(self) -> None:
        key = self._key()
        self.headers = Headers(key=key)  # what final stands under
        self.headers = Headers(
            title=self._values.get("title", (0, 0, ""))[2],
            mode=self._values.get("mode", (0, 0, ""))[2],
            final_cents=self._final(),
            tempo=self._tempo(),
            key=key,
        )

    def _key(self) -> tuple[Spelling, ...]:
        line, start, value = self._values.get("key", (0, 0, ""))
        marks: dict[str, Spelling] = {}
        for word, column, _ in _words(value):
            mark = read_key_mark(word, self.names)
            if not isinstance(mark, Misread) and mark.letter in marks:
                mark = Misread("marks a letter for the second time", "each letter once")
            if isinstance(mark, Misread):
                self._fault(line, start + column - 1, word, mark)
            else:
                marks[mark.letter] = mark
        return tuple(marks.values())

    def _final(self) -> float | None:
        if "final" not in self._values:
            return None
        line, column, value = self._values["final"]
        word = value.replace(" ", "-")
        item = self._pitch(word)
        if isinstance(item, Note):
            return item.pitch_cents
        nearest = nearest_token(word, self.names, A4_CENTS, self.headers.key).partition(":")[0]
        if not isinstance(self._pitch(nearest), Note):
            nearest = ""
        self._fault(line, column, value, item, nearest)
        return None

    def _pitch(self, word: str) -> Note | Misread:
        item = read_token(word, self.names, self.headers.key)
        if isinstance(item, Misread):
            return item
        if isinstance(item, Note) and item.kind is InputKind.TYPED and ":" not in word:
            return item
        return Misread("is no pitch alone", "one without length, such as 'A4'")

    def _tempo(self) -> float | None:
        if "tempo" not in self._values:
            return None
        line, column, value = self._values["tempo"]
        if _NUMBER.fullmatch(value) and SLOWEST_TEMPO <= float(value) <= FASTEST_TEMPO:
            return float(value)
        expected = f"beats a minute, from {SLOWEST_TEMPO:g} to {FASTEST_TEMPO:g}"
        self._fault(line, column, value, Misread("is no tempo", expected))
        return None


_WANTED_HEADER = f"{', '.join(HEADER_KEYS[:-1])} or {HEADER_KEYS[-1]}"
_MOVE_UP = "put it at the top of the file"
_UNPRINTABLE = Misread("holds a control character", "plain text")


def _words(text: str) -> Iterator[tuple[str, int, str]]:
    """Give each word, its column from 1, and the line from there on."""
    for match in _WORD.finditer(text):
        yield match[0], match.start() + 1, text[match.start() :]


def _one_line(text: str) -> str:
    return " ".join(text.split())


def _unprintable(text: str) -> bool:
    return any(unicodedata.category(c) in {"Cc", "Cs"} for c in text)
