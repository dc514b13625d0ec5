"""One part of a score as it is written down: bars, and where in them each note stands.

What is wrong in a file is mended where it can be, and kept as damage of the part with the bar.

References
----------
W3C MusicXML 4.0: `divisions`, `duration`, `backup`, `forward` and `chord` say where a note stands. What a
wrong duration is read as is our own choice: as the note is printed, else as a quarter note.
"""

from __future__ import annotations

import math
from functools import lru_cache
from typing import TYPE_CHECKING

from melodycoach.core.note import Mark
from melodycoach.core.pitch import LETTERS
from melodycoach.sources.accidentals import read_sign
from melodycoach.sources.xml_score import (
    NEAR,
    NO_METER,
    Bar,
    KeyChange,
    Meter,
    Part,
    PrintedPitch,
    Shift,
    WrittenNote,
)

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    Texts = Mapping[str, str]

SHORTEST_QUARTERS, LONGEST_QUARTERS = 1 / 4096, 1_000.0
"""The lengths of a note that make sense; the shortest that can be printed is 1/256."""

MAX_BAR_QUARTERS = 10_000.0
"""A bar is no longer; music without bars is often written as one."""

NO_DURATION = "a note or rest without a usable duration, read as long as it is printed"
NO_PITCH = "a note without a readable pitch, left out"
NO_ALTER = "an alter that is no number, left out"
NO_DIVISIONS = "divisions that are no number above 0, left out"
NO_STEP = "a step on or back without a usable duration, left out"
TOO_FAR_BACK = "a step back to before the bar, read from its start"

QUARTERS_BY_TYPE: Mapping[str, float] = {
    "1024th": 1 / 256,
    "512th": 1 / 128,
    "256th": 1 / 64,
    "128th": 1 / 32,
    "64th": 1 / 16,
    "32nd": 1 / 8,
    "16th": 1 / 4,
    "eighth": 1 / 2,
    "quarter": 1.0,
    "half": 2.0,
    "whole": 4.0,
    "breve": 8.0,
    "long": 16.0,
    "maxima": 32.0,
}
"""The printed note values."""

_MARK_BY_SIGN: Mapping[str, Mark] = {
    "breath-mark": Mark.BREATH,
    "fermata": Mark.BREATH,
    "caesura": Mark.PHRASE_END,
}
_PHRASE_LINES = frozenset({"light-light", "light-heavy", "heavy-light", "heavy-heavy"})
_STEPS = frozenset(LETTERS)
_MOST_STAVES = 16

LARGEST_NUMBER = 1e9
"""A larger number in a score means nothing, and would overflow when it is reckoned with."""


@lru_cache(maxsize=1024)
def read_number(text: str | None) -> float | None:
    """Give a number that a score can mean, or None.

    >>> read_number(" 1.5 "), read_number("1e308"), read_number("nan"), read_number("x"), read_number(None)
    (1.5, None, None, None, None)
    """
    try:
        number = float(text or "")
    except ValueError:
        return None
    return number if abs(number) <= LARGEST_NUMBER else None


@lru_cache(maxsize=1024)
def read_whole(text: str | None, lowest: int, highest: int) -> int | None:
    """Give a whole number within limits, or None.

    >>> read_whole("4", 0, 9), read_whole("4.0", 0, 9), read_whole("12", 0, 9), read_whole("4.5", 0, 9)
    (4, 4, None, None)
    """
    number = read_number(text)
    return int(number) if number is not None and lowest <= number <= highest and number % 1 == 0 else None


@lru_cache(maxsize=1024)
def _read_pitch(
    step: str, octave: str, accidental: str | None, smufl: str | None, alter: str | None
) -> PrintedPitch | None:
    """Read a pitch as printed, or give None; most pitches of a score come again and again."""
    number = read_whole(octave, 0, 9)
    if step not in _STEPS or number is None:
        return None
    return PrintedPitch(step, number, read_sign(accidental, smufl), read_number(alter))


class PartWriter:
    """The bars of a part while they are read: what holds on from note to note.

    Each method takes the texts of one element's children by their names. An empty child such as
    ``chord`` has an empty text; what attributes say stands under names of our own: ``smufl``,
    ``mark``, ``dots``, ``ties``, ``number``, ``location``, ``direction``.
    """

    def __init__(self, part: Part) -> None:
        self.part = part
        self._bar = Bar("", NO_METER)  # until one is opened, in no part
        self._divisions = 1.0
        self._at = self._last_at = self._furthest = 0.0  # in divisions
        self._meter = NO_METER
        self._shifts: dict[str, Shift] = {}
        self._has_clef = False
        self._length_by_text: dict[str | None, float] = {}  # what is right under these divisions

    def open_bar(self, label: str, *, implicit: bool) -> None:
        """Begin a bar; a part without number is counted."""
        self._bar = Bar(label or str(len(self.part.bars) + 1), self._meter, implicit)
        self.part.bars.append(self._bar)
        self._at = self._last_at = self._furthest = 0.0

    def close_bar(self) -> None:
        """End the bar that is open."""
        self._bar.length = self._furthest / self._divisions

    def note(self, texts: Texts) -> None:
        """Take a note or rest."""
        grace, chord = "grace" in texts, "chord" in texts
        length = 0.0 if grace else self._length_by_text.get(texts.get("duration")) or self._length(texts)
        if not chord:
            self._last_at = self._at
            self._move_to(self._at + length)
        if "rest" in texts:
            return
        if "cue" in texts:
            self.part.n_cues += 1
        elif "unpitched" in texts:
            self.part.n_unpitched += 1
        elif (pitch := self._pitch(texts)) is not None:
            ties = texts.get("ties", "")
            staff = str(read_whole(texts["staff"], 1, _MOST_STAVES) or 1) if "staff" in texts else "1"
            self._bar.notes.append(
                WrittenNote(
                    self._last_at / self._divisions,
                    length / self._divisions,
                    texts.get("voice") or "1",
                    staff,
                    pitch,
                    (self._shifts.get(staff) or self._shifts.get("")) if self._shifts else None,
                    grace,
                    chord,
                    "start" in ties or "continue" in ties,
                    _MARK_BY_SIGN[texts["mark"]] if "mark" in texts else None,
                )
            )

    def _pitch(self, texts: Texts) -> PrintedPitch | None:
        """Give the pitch as printed; None, and kept as damage, where it cannot be read."""
        get = texts.get
        alter = get("alter")
        pitch = _read_pitch(get("step", ""), get("octave", ""), get("accidental"), get("smufl"), alter)
        if pitch is None:
            self.part.damaged(NO_PITCH, self._bar.label)
        elif alter and pitch.alter is None:
            self.part.damaged(NO_ALTER, self._bar.label)
        return pitch

    def _length(self, texts: Texts) -> float:
        """Give the length of a note or rest, in divisions."""
        text = texts.get("duration")
        given = read_number(text)
        if given is not None and SHORTEST_QUARTERS <= given / self._divisions <= LONGEST_QUARTERS:
            self._length_by_text[text] = given
            return given
        self.part.damaged(NO_DURATION, self._bar.label)
        printed = QUARTERS_BY_TYPE.get(texts.get("type", ""))
        if printed is None:
            bar = self._bar.meter.quarters
            printed = bar if "rest" in texts and bar else 1.0
        dots = min(len(texts.get("dots", "")), 4)
        actual, normal = read_number(texts.get("actual-notes")), read_number(texts.get("normal-notes"))
        tuplet = normal / actual if actual and normal and 1 / 16 <= normal / actual <= 16 else 1.0
        return printed * (2 - 0.5**dots) * tuplet * self._divisions

    def move(self, texts: Texts, sign: int) -> None:
        """Go on (+1) or back (-1) within the bar."""
        duration = read_number(texts.get("duration"))
        if duration is None or duration < 0:
            self.part.damaged(NO_STEP, self._bar.label)
            return
        to = self._at + sign * duration
        if to < -NEAR * self._divisions:
            self.part.damaged(TOO_FAR_BACK, self._bar.label)
        self._move_to(max(to, 0.0))
        self._last_at = self._at

    def _move_to(self, at: float) -> None:
        if at > self._furthest:
            at = self._furthest = min(at, MAX_BAR_QUARTERS * self._divisions)
        self._at = at

    def divisions(self, text: str) -> None:
        """Take how many divisions a quarter note has from here on."""
        number = read_number(text)
        if number is None or not 0 < number <= 1e9:
            self.part.damaged(NO_DIVISIONS, self._bar.label)
            return
        scale = number / self._divisions
        self._at *= scale
        self._last_at *= scale
        self._furthest *= scale
        self._divisions = number
        self._length_by_text.clear()

    def key(self, texts: Texts, rows: Sequence[Texts]) -> None:
        """Take a key signature; `rows` are the signs of a non-traditional one."""
        entries = tuple(
            (
                row["key-step"],
                read_number(row.get("key-alter")),
                read_sign(row.get("key-accidental"), row.get("smufl")),
                read_whole(row.get("key-octave"), 0, 9),
            )
            for row in rows
            if row.get("key-step") in _STEPS
        )
        fifths = read_whole(texts.get("fifths"), -99, 99)
        at = self._at / self._divisions
        key = fifths if fifths is not None and not rows else entries
        self._bar.keys.append(KeyChange(at, texts.get("number", ""), key))

    def meter(self, rows: Sequence[Texts]) -> None:
        """Take a time signature; `rows` are its pairs of beats and beat type."""
        quarters, first_beat = 0.0, 0.0
        for row in rows:
            beat_type = read_whole(row.get("beat-type"), 1, 256)
            beats = [read_whole(text, 1, 256) for text in row.get("beats", "").split("+")]
            if beat_type is None or None in beats:
                continue
            first_beat = first_beat or 4 / beat_type
            quarters += sum(count for count in beats if count) * 4 / beat_type
        self._meter = Meter(first_beat, quarters) if first_beat else NO_METER
        if self._at == 0:
            self._bar.meter = self._meter

    def transpose(self, texts: Texts) -> None:
        """Take what the part sounds higher than it is written, for one staff or all."""
        staff = texts.get("number", "")
        shift = Shift(
            _within(read_number(texts.get("chromatic")) or 0.0, 48.0),
            read_whole(texts.get("diatonic"), -28, 28),
            read_whole(texts.get("octave-change"), -4, 4) or 0,
        )
        if not staff:
            self._shifts.clear()
        if staff or shift != (0.0, shift.steps, 0):
            self._shifts[staff] = shift

    def clef(self, texts: Texts) -> None:
        """Take a clef: the first tells percussion."""
        if not self._has_clef:
            self._has_clef = True
            self.part.is_percussion |= texts.get("sign") == "percussion"

    def barline(self, texts: Texts) -> None:
        """Take a line that is more than a plain bar line, and what stands on it."""
        bar = self._bar
        direction = texts.get("direction")
        bar.opens_repeat |= direction == "forward"
        bar.closes_repeat |= direction == "backward"
        bar.is_ending |= "ending" in texts
        mark = _MARK_BY_SIGN.get(texts.get("mark", ""))
        if texts.get("bar-style") in _PHRASE_LINES or direction in ("forward", "backward"):
            mark = Mark.PHRASE_END
        if mark is not None:
            place = {"left": 0.0, "middle": self._at / self._divisions}
            bar.marks.append((place.get(texts.get("location", ""), math.inf), mark))

    def jump(self) -> None:
        """Keep that a player would go on elsewhere from here."""
        self._bar.jumps = True

    def ornament(self, word: str) -> None:
        """Keep that a sign stands for notes that are not written."""
        self.part.ornaments.add(word)


def _within(number: float, limit: float) -> float:
    return min(max(number, -limit), limit)
