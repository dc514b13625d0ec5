"""The guided demo: a line of our own, played as real MIDI bytes into the live path.

The line was composed for this program and is nobody's repertoire. It opens in Hüseynî, comes down
to its final, sounds one note that the makam does not have, and turns to the hicaz family.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from melodycoach import DEFAULT_PACK
from melodycoach.core.note import Mark, Note
from melodycoach.core.pitch import KEY_CENTS, key_of
from melodycoach.sources.note_text import read_tokens

if TYPE_CHECKING:
    from collections.abc import Sequence

    from melodycoach.core.pitch import PitchNames

PACK = DEFAULT_PACK
TEMPO_BPM = 104
BREATH_S = 1.1
PHRASE_END_S = 2.7
LEAD_IN_S = 1.5

_BEND_RANGE_CENTS = 200.0  # what RPN 0 is set to below: two semitones
_VELOCITY = 72
_SET_BEND_RANGE = (
    bytes((0xB0, 101, 0)),
    bytes((0xB0, 100, 0)),
    bytes((0xB0, 6, 2)),
    bytes((0xB0, 38, 0)),
    bytes((0xB0, 101, 127)),
    bytes((0xB0, 100, 127)),
)


@dataclass(frozen=True, slots=True)
class Stage:
    """A stretch of the demo: what to look at, and what is played meanwhile."""

    says: str
    line: str


STAGES = (
    Stage(
        "the line circles hüseynî: watch a leaning form, note by note",
        "E5 D5 E5 F#5 E5:2 D5 E5 F#5 G5 F#5 E5:3 ,",
    ),
    Stage(
        "up to muhayyer, then down to dügâh: steps move from owed to heard",
        "E5 F#5 G5 A5:2 G5 F#5 E5 D5 E5:2 , E5 D5 C5 B4-1 A4:2 G4 A4:3 .",
    ),
    Stage(
        "one note that Hüseynî does not have: see its mark and the perde that mends it",
        "E5 D5 C5 Bb4 C5 D5 E5:2 D5 E5 F#5 E5:2 ,",
    ),
    Stage(
        "the line turns to the hicaz family on the same karar: watch it being noticed",
        "D5 C#5 Bb4+1 A4 Bb4+1 C#5 D5:3 , D5 E5 F#5 G5 F5 E5 D5:3 , "
        "D5 C#5 Bb4+1 C#5 D5:2 C#5 Bb4+1 A4:2 G4 A4:3 .",
    ),
)
HAND_OVER = "the demo is over and the line is yours: play, type, undo, or make a fresh start"


class DemoPlayer:
    """A keyboard that plays the demo: the bytes due so far, and what to look at meanwhile.

    Parameters
    ----------
    names
        The pitch names of the pack, to read the line with.
    """

    def __init__(self, names: PitchNames) -> None:
        self._messages: list[tuple[bytes, float]] = [(message, 0.0) for message in _SET_BEND_RANGE]
        self._says: list[tuple[float, str]] = []
        at_s = LEAD_IN_S
        for stage in STAGES:
            self._says.append((at_s, stage.says))
            at_s = self._write(stage, names, at_s)
        self.ends_s = at_s
        self._says.append((at_s, HAND_OVER))
        self._next = 0

    def _write(self, stage: Stage, names: PitchNames, at_s: float) -> float:
        for item in read_tokens(stage.line, names, 0.0, TEMPO_BPM):
            match item:
                case Note():
                    self._messages += note_messages(item.pitch_cents, at_s, 0.95 * item.duration_s)
                    at_s += item.duration_s
                case Mark.BREATH:
                    at_s += BREATH_S
                case Mark.PHRASE_END:
                    at_s += PHRASE_END_S
                case _:
                    raise ValueError(f"the demo line has only notes and breaths, found {item!r}")
        return at_s

    def poll(self, now_s: float) -> Sequence[tuple[bytes, float]]:
        """Give the messages due by ``now_s`` and not given before, each with its time."""
        first = self._next
        while self._next < len(self._messages) and self._messages[self._next][1] <= now_s:
            self._next += 1
        return self._messages[first : self._next]

    def says(self, now_s: float) -> str:
        """Say what to look at now."""
        current = "a line of our own is about to play; no keyboard is needed"
        for at_s, text in self._says:
            if at_s <= now_s:
                current = text
        return current

    def is_over(self, now_s: float) -> bool:
        """Whether everything has been played and the last silence has passed."""
        return now_s >= self.ends_s and self._next == len(self._messages)


def note_messages(pitch_cents: float, at_s: float, length_s: float) -> list[tuple[bytes, float]]:
    """Play one pitch on channel 1: bend, note-on, note-off, as a keyboard would send them.

    The bend is set before the note-on, in steps of 200/8192 cents.

    >>> [message.hex(" ") for message, _ in note_messages(7150.0, 0.0, 1.0)]
    ['e0 00 30', '90 48 48', '80 48 00']
    """
    key = key_of(pitch_cents)
    bend = round((pitch_cents - KEY_CENTS * key) / _BEND_RANGE_CENTS * 8192) + 8192
    return [
        (bytes((0xE0, bend & 0x7F, bend >> 7)), at_s),
        (bytes((0x90, key, _VELOCITY)), at_s),
        (bytes((0x80, key, 0)), at_s + length_s),
    ]
