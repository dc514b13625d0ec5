"""From the elements of MusicXML to a `Score`: one pass, no tree, a small value for each note.

Both forms of a score are read: by parts with bars in them, and by bars with parts in them.

References
----------
W3C MusicXML 4.0: the elements and what stands in which. Channel 10 is percussion: General MIDI.
"""

from __future__ import annotations

import re
from functools import partial
from typing import TYPE_CHECKING, NoReturn

from melodycoach.errors import MusicFileError, shorten
from melodycoach.sources.xml_part import QUARTERS_BY_TYPE, PartWriter, read_number, read_whole
from melodycoach.sources.xml_safe import Handlers, parse_xml, plain_text
from melodycoach.sources.xml_score import Part, Score

if TYPE_CHECKING:
    from collections.abc import Callable, Mapping

MAX_NOTES = 40_000
"""Notes, rests, keys, tempos and special lines of one score, all parts together."""

MAX_BARS = 40_000
"""Bars of one score, all parts together."""

MAX_PARTS = 1_000
"""Parts of one score."""

TEMPO_LIMITS = (5.0, 1_000.0)
"""Quarter notes a minute that make sense."""

_ROOTS = ("score-partwise", "score-timewise")
_LEAVES = frozenset(
    (
        *("step", "octave", "alter", "accidental", "duration", "type", "actual-notes", "normal-notes"),
        *("voice", "staff", "grace", "chord", "cue", "rest", "unpitched"),
        *("fifths", "chromatic", "diatonic", "octave-change", "sign", "bar-style"),
        *("beat-unit", "per-minute", "part-name", "instrument-name", "midi-channel"),
    )
)
_ROW_LEAVES = frozenset({"key-step", "key-alter", "key-accidental", "beats", "beat-type"})
_FIRST_OF_ROW = frozenset({"key-step", "beats"})
_MAX_ROWS = 64  # of one signature
_ORNAMENTS: Mapping[str, str] = {
    "trill-mark": "trill",
    "turn": "turn",
    "delayed-turn": "turn",
    "inverted-turn": "turn",
    "delayed-inverted-turn": "turn",
    "vertical-turn": "turn",
    "inverted-vertical-turn": "turn",
    "haydn": "turn",
    "shake": "shake",
    "mordent": "mordent",
    "inverted-mordent": "mordent",
    "schleifer": "slide",
    "slide": "slide",
    "glissando": "slide",
    "tremolo": "tremolo",
}
_JUMPS = ("dacapo", "dalsegno", "tocoda")
_NUMBER = re.compile(r"\d{1,6}(?:\.\d{1,9})?", re.ASCII)
_PERCUSSION_CHANNEL = "10"


def read_score(data: bytes, where: str) -> Score:
    """Read a score.

    Parameters
    ----------
    data
        MusicXML, not compressed.
    where
        How error texts name it.

    Raises
    ------
    MusicFileError
        It is no MusicXML score, or more than the caps allow.
    """
    reader = _Reader(where)
    says = parse_xml(data, where, reader.handlers())
    return reader.score(says)


class _Reader:
    """The handlers of one document, and where in it they are.

    A record, such as a note or a key, is an element whose leaves are taken together as it closes.
    """

    def __init__(self, where: str) -> None:
        self._where = where
        self._title = {"work-title": "", "movement-title": ""}
        self._writer_by_id: dict[str, PartWriter] = {}
        self._header: Part | None = None
        self._part_id: str | None = None
        self._measure: dict[str, str] | None = None
        self._nowhere = PartWriter(Part(""))  # for what stands in no bar
        self._writer = self._nowhere  # of the bar that is open
        self._left = {"notes": MAX_NOTES, "bars": MAX_BARS, "parts": MAX_PARTS}
        self._tempos: dict[str, list[float]] = {"sound": [], "metronome": []}
        self._texts: dict[str, str] = {}  # of the leaves of the record that is open
        self._rows: list[dict[str, str]] = []

    def handlers(self) -> Handlers:
        """Give what is done at the elements."""
        return Handlers(self._root, self._starts(), self._ends(), _LEAVES, self._texts)

    def _root(self, name: str) -> None:
        """Refuse what is no score by the name of its outermost element."""
        if name == "opus":
            raise MusicFileError(
                f"{self._where}: this is a list of scores (an opus), expected a score; open one of its scores"
            )
        if name not in _ROOTS:
            raise MusicFileError(
                f"{self._where}: this is XML of another kind, with {shorten(name)!r} as its root, "
                "expected a MusicXML score; export the score as MusicXML"
            )

    def _starts(self) -> dict[str, Callable[[dict[str, str]], None]]:
        """Give what is done as elements open."""
        handlers: dict[str, Callable[[dict[str, str]], None]] = {}
        handlers |= dict.fromkeys(("note", "backup", "forward", "metronome"), self._open_record)
        handlers |= dict.fromkeys(("key", "time", "transpose", "clef"), self._open_signature)
        handlers |= {name: partial(self._ornament, word) for name, word in _ORNAMENTS.items()}
        handlers |= {name: partial(self._mark, name) for name in ("fermata", "breath-mark", "caesura")}
        return handlers | {
            "tie": self._tie,
            "tied": self._tie,
            "dot": self._dot,
            "beat-unit-dot": self._dot,
            "accidental": self._accidental,
            "key-accidental": self._key_accidental,
            "key-octave": self._open_key_octave,
            "sound": self._sound,
            "barline": self._open_barline,
            "repeat": self._repeat,
            "ending": self._ending,
            "measure": self._open_measure,
            "part": self._open_part,
            "score-part": self._open_header,
        }

    def _ends(self) -> dict[str, Callable[[str], None]]:
        """Give what is done as elements close; the texts of leaves are kept until their record ends."""
        handlers: dict[str, Callable[[str], None]] = {name: partial(self._row, name) for name in _ROW_LEAVES}
        handlers |= {name: partial(self._titled, name) for name in self._title}
        return handlers | {
            "note": self._note,
            "backup": self._backup,
            "forward": self._forward,
            "divisions": self._divisions,
            "key": self._key,
            "key-octave": self._key_octave,
            "time": self._time,
            "transpose": self._transpose,
            "clef": self._clef,
            "barline": self._barline,
            "metronome": self._metronome,
            "measure": self._close_measure,
            "part": self._close_part,
            "score-part": self._close_header,
        }

    def score(self, says: tuple[str, ...]) -> Score:
        """Give what was read."""
        parts = tuple(writer.part for writer in self._writer_by_id.values() if writer.part.bars)
        title = self._title["work-title"] or self._title["movement-title"]
        tempos = self._tempos["sound"] or self._tempos["metronome"]
        return Score(title, parts, tuple(tempos), says)

    # --- the document, its parts and bars ------------------------------------------------------

    def _writer_of(self, part_id: str) -> PartWriter:
        writer = self._writer_by_id.get(part_id)
        if writer is None:
            self._count("parts")
            writer = self._writer_by_id[part_id] = PartWriter(Part(part_id))
        return writer

    def _open_header(self, attributes: dict[str, str]) -> None:
        self._open_record(attributes)
        self._header = self._writer_of(attributes.get("id", "")).part

    def _close_header(self, text: str) -> None:
        if self._header is not None:
            name = self._texts.get("part-name") or self._texts.get("instrument-name", "")
            self._header.name = plain_text(name)
            self._header.is_percussion = self._texts.get("midi-channel") == _PERCUSSION_CHANNEL
        self._header = None

    def _titled(self, name: str, text: str) -> None:
        self._title[name] = self._title[name] or plain_text(text)

    def _open_measure(self, attributes: dict[str, str]) -> None:
        self._measure = attributes
        self._open_bar()

    def _open_part(self, attributes: dict[str, str]) -> None:
        self._part_id = attributes.get("id", "")
        self._open_bar()

    def _open_bar(self) -> None:
        """Begin a bar as soon as both its part and its number are known, whichever stands outside."""
        if self._part_id is None or self._measure is None:
            return
        self._count("bars")
        self._close_bar()
        self._writer = self._writer_of(self._part_id)
        label = plain_text(self._measure.get("number", ""), 12)
        self._writer.open_bar(label, implicit=self._measure.get("implicit") == "yes")

    def _close_measure(self, text: str) -> None:
        self._close_bar()
        self._measure = None

    def _close_part(self, text: str) -> None:
        self._close_bar()
        self._part_id = None

    def _close_bar(self) -> None:
        self._writer.close_bar()
        self._writer = self._nowhere

    def _count(self, kind: str) -> None:
        self._left[kind] -= 1
        if self._left[kind] < 0:
            self._too_many(kind)

    def _too_many(self, kind: str) -> NoReturn:
        most = {"notes": MAX_NOTES, "bars": MAX_BARS, "parts": MAX_PARTS}[kind]
        raise MusicFileError(
            f"{self._where}: more than {most} {kind}, which is the most that is read of a score; "
            "export the part with the melody alone"
        )

    # --- what stands in a bar ------------------------------------------------------------------

    def _open_record(self, attributes: dict[str, str]) -> None:
        self._texts.clear()

    def _open_signature(self, attributes: dict[str, str]) -> None:
        self._open_record(attributes)
        self._rows = []
        self._texts["number"] = attributes.get("number", "")

    def _open_barline(self, attributes: dict[str, str]) -> None:
        self._open_record(attributes)
        self._texts["location"] = attributes.get("location", "right")

    def _tie(self, attributes: dict[str, str]) -> None:
        self._texts["ties"] = self._texts.get("ties", "")[:40] + " " + attributes.get("type", "")

    def _dot(self, attributes: dict[str, str]) -> None:
        self._texts["dots"] = self._texts.get("dots", "")[:4] + "."

    def _accidental(self, attributes: dict[str, str]) -> None:
        if "smufl" in attributes:
            self._texts["smufl"] = attributes["smufl"]

    def _mark(self, name: str, attributes: dict[str, str]) -> None:
        if self._texts.get("mark") != "caesura":
            self._texts["mark"] = name

    def _ornament(self, word: str, attributes: dict[str, str]) -> None:
        self._writer.ornament(word)

    def _repeat(self, attributes: dict[str, str]) -> None:
        self._texts["direction"] = attributes.get("direction", "")

    def _ending(self, attributes: dict[str, str]) -> None:
        self._texts["ending"] = ""

    def _row(self, name: str, text: str) -> None:
        """Keep a leaf of a signature that may stand there several times."""
        if name in _FIRST_OF_ROW and len(self._rows) < _MAX_ROWS:
            self._rows.append({})
        if self._rows:
            self._rows[-1][name] = text

    def _key_accidental(self, attributes: dict[str, str]) -> None:
        if self._rows and "smufl" in attributes:
            self._rows[-1]["smufl"] = attributes["smufl"]

    def _open_key_octave(self, attributes: dict[str, str]) -> None:
        self._texts["of sign"] = attributes.get("number", "")

    def _key_octave(self, text: str) -> None:
        """Keep the octave of one sign of a key; the signs are counted from 1."""
        number = read_whole(self._texts.get("of sign"), 1, len(self._rows))
        if number is not None:
            self._rows[number - 1]["key-octave"] = text

    def _note(self, text: str) -> None:
        self._count("notes")
        self._writer.note(self._texts)

    def _backup(self, text: str) -> None:
        self._writer.move(self._texts, -1)

    def _forward(self, text: str) -> None:
        self._writer.move(self._texts, +1)

    def _divisions(self, text: str) -> None:
        self._writer.divisions(text)

    def _key(self, text: str) -> None:
        self._count("notes")
        self._writer.key(self._texts, self._rows)

    def _time(self, text: str) -> None:
        self._writer.meter(self._rows)

    def _transpose(self, text: str) -> None:
        self._writer.transpose(self._texts)

    def _clef(self, text: str) -> None:
        self._writer.clef(self._texts)

    def _barline(self, text: str) -> None:
        self._count("notes")
        self._writer.barline(self._texts)

    # --- tempo and jumps -----------------------------------------------------------------------

    def _sound(self, attributes: dict[str, str]) -> None:
        self._count("notes")
        if "tempo" in attributes:
            self._tempo("sound", read_number(attributes["tempo"]))
        if any(jump in attributes for jump in _JUMPS):
            self._writer.jump()

    def _metronome(self, text: str) -> None:
        number = _NUMBER.search(self._texts.get("per-minute", ""))
        quarters = QUARTERS_BY_TYPE.get(self._texts.get("beat-unit", ""))
        if number and quarters:
            dotted = 2 - 0.5 ** len(self._texts.get("dots", ""))
            self._tempo("metronome", float(number[0]) * quarters * dotted)

    def _tempo(self, kind: str, quarters: float | None) -> None:
        """Keep the first tempo, and the first that differs from it."""
        known = self._tempos[kind]
        if quarters is None or not TEMPO_LIMITS[0] <= quarters <= TEMPO_LIMITS[1]:
            return
        if not known or (len(known) < 2 and abs(quarters - known[0]) > 0.01 * known[0]):
            known.append(quarters)
