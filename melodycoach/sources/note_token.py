"""One token of note text: a note, a rest or a mark, read and written.

A token names a pitch in one of three ways: as a written note (``B4-1``), as a pitch that the pack
names (``segah``), or as a plain key of a twelve-key keyboard (``Bb4~``). ``docs/note-text.md`` has
the whole grammar. Written pitches lie on a grid of a hundredth of a unit, so that what is written
reads back as the very same number.
"""

from __future__ import annotations

import math
import re
import unicodedata
from dataclasses import dataclass, replace
from fractions import Fraction
from typing import TYPE_CHECKING

from melodycoach.core.note import InputKind, Mark, Note, Silence
from melodycoach.core.pitch import (
    HIGHEST_CENTS,
    LOWEST_CENTS,
    SEMITONES_12,
    NamedPitch,
    PitchNames,
    Spelling,
    fold_name,
)
from melodycoach.errors import shorten

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from melodycoach.core.note import Item

DEFAULT_TEMPO = 72.0
"""Beats a minute where nothing says otherwise."""

SHORTEST_BEATS, LONGEST_BEATS = 0.01, 10_000.0
"""The written lengths that make sense."""

ENTRY_STEP_BEATS = 0.5
"""Played lengths in the live entry are rounded to so many beats, to stay readable."""

SAVED_STEP_BEATS = 0.01
"""Played lengths in a saved line are rounded to so many beats."""

_SIGNED = r"[+-](?:\d{1,3}(?:\.\d{1,9})?|\.\d{1,9})"
_NOTE = re.compile(
    r"(?P<letter>[A-Ga-g])(?P<marks>#{1,4}|b{1,4}|=)?(?P<octave>\d{1,2}|\(-\d\))"
    rf"(?P<units>{_SIGNED})?(?P<about>~)?",
    re.ASCII,
)
_NAME_AND_UNITS = re.compile(rf"(?P<name>.+?)(?P<units>{_SIGNED})", re.ASCII)
_KEY_MARK = re.compile(rf"(?P<letter>[A-Ga-g])(?P<marks>#{{1,4}}|b{{1,4}})?(?P<units>{_SIGNED})?", re.ASCII)
_BEATS = re.compile(r"(?P<over>\d{1,6})/(?P<under>\d{1,6})|\d{1,6}(?:\.\d{1,30})?|\.\d{1,30}", re.ASCII)
_LOOKALIKES = str.maketrans({"♯": "#", "♭": "b", "−": "-", "–": "-", "‐": "-", "‑": "-", "⁄": "/"})
_JOINERS = "-'’_"

WANTED_BEATS = f"beats such as 2, 1/2 or 0.75, from {SHORTEST_BEATS:g} to {LONGEST_BEATS:g}"
WANTED_TOKEN = "a note such as 'B4-1', a pitch name, or one of - , . |"


@dataclass(frozen=True, slots=True)
class Misread:
    """Why a token cannot be read: what is wrong with it, and what was expected."""

    problem: str
    expected: str


def plain_token(text: str) -> str:
    """Take out of a token what only looks different: ♭ for b, other dashes, invisible characters.

    >>> plain_token("B♭4−1")
    'Bb4-1'
    """
    if text.isascii():
        return text
    visible = "".join(c for c in text if unicodedata.category(c) != "Cf")
    return unicodedata.normalize("NFC", visible).translate(_LOOKALIKES)


def find_pitch_name(text: str, names: PitchNames) -> NamedPitch | None:
    """Look a pitch name up that is written as a token; None if it is unknown.

    Any spelling finds it, but every character must be a letter of it: `segah?` is not `segah`.
    """
    if not fold_name(text[:1]) or text[-1] in _JOINERS:
        return None
    spread = unicodedata.normalize("NFKD", text)
    spelled = all(c in _JOINERS or unicodedata.combining(c) or fold_name(c) for c in spread)
    return names.find(text) if spelled else None


def read_beats(text: str) -> float | Misread:
    """Give the written length that stands after a colon, in beats.

    >>> read_beats("3/2"), read_beats("0.25")
    (1.5, 0.25)
    """
    wrong = Misread(f"has the length {shorten(text)!r}", WANTED_BEATS)
    match = _BEATS.fullmatch(text)
    if match is None or (match["under"] is not None and not int(match["under"])):
        return wrong
    beats = int(match["over"]) / int(match["under"]) if match["over"] else float(text)
    return beats if SHORTEST_BEATS <= beats <= LONGEST_BEATS else wrong


def read_token(token: str, names: PitchNames, key: Sequence[Spelling] = ()) -> Item | Misread:
    """Read one token; times of a note are left at 0, for `lay_out` to fill in.

    Parameters
    ----------
    token
        Text without white space.
    names
        The names and the tone system of the pack.
    key
        The key signature: letters without a mark of their own take theirs from it.

    Returns
    -------
    Item or Misread
        The second where the token says nothing that can be played.

    Examples
    --------
    >>> from melodycoach.core.pitch import COMMAS_53
    >>> read_token("A4:1/2", PitchNames(COMMAS_53))
    Note(pitch_cents=6900.0, onset_s=0.0, duration_s=0.0, kind=<InputKind.TYPED: 'typed'>, beats=0.5)
    """
    text = plain_token(token)
    if text in {",", ".", "|"}:
        return Mark(text)
    body, colon, length = text.partition(":")
    pitch = None if body == "-" else _read_pitch(body, names, key)
    if isinstance(pitch, Misread):
        return pitch
    beats = read_beats(length) if colon else 1.0
    if isinstance(beats, Misread):
        return beats
    if pitch is None:
        return Silence(0.0, beats)
    cents, kind = pitch
    return Note(cents, 0.0, 0.0, kind, beats)


def _read_pitch(body: str, names: PitchNames, key: Sequence[Spelling]) -> tuple[float, InputKind] | Misread:
    if match := _NOTE.fullmatch(body):
        return _read_written(match, names, key)
    named, units = find_pitch_name(body, names), 0.0
    if named is None and (match := _NAME_AND_UNITS.fullmatch(body)):
        named, units = find_pitch_name(match["name"], names), float(match["units"])
    if named is not None:
        return _on_grid(named.units + units, names)
    if body.endswith("~") and find_pitch_name(body[:-1], names):
        return Misread("is a pitch name with '~'", "'~' after a note, such as 'A4~', for a plain key")
    if _KEY_MARK.fullmatch(body.removesuffix("~")):
        return Misread("has no octave", "one, such as the 4 of 'A4'")
    return Misread("is neither a note nor a pitch name", WANTED_TOKEN)


def _read_written(
    match: re.Match[str], names: PitchNames, key: Sequence[Spelling]
) -> tuple[float, InputKind] | Misread:
    marks, letter = match["marks"] or "", match["letter"].upper()
    accidentals, units = marks.count("#") - marks.count("b"), float(match["units"] or 0)
    octave = int(match["octave"].strip("()"))
    if match["about"]:
        if match["units"]:
            return Misread("is a plain key with units", "'~' or units, but not both")
        number = 69 + int(SEMITONES_12.spelling_units(Spelling(letter, accidentals, 0, octave)))
        in_range = LOWEST_CENTS <= 100 * number <= HIGHEST_CENTS
        return (100.0 * number, InputKind.KEYS) if in_range else _OUT_OF_RANGE
    if not marks and not match["units"]:
        for sign in key:
            if sign.letter == letter:
                accidentals, units = sign.accidentals, sign.units
    return _on_grid(names.system.spelling_units(Spelling(letter, accidentals, units, octave)), names)


_OUT_OF_RANGE = Misread("is out of range", "a pitch from C(-1)~ to G9~, the range of MIDI")


def _on_grid(units: float, names: PitchNames) -> tuple[float, InputKind] | Misread:
    units = round(units, 2)
    lowest = round(names.system.cents_to_units(LOWEST_CENTS), 2)
    highest = round(names.system.cents_to_units(HIGHEST_CENTS), 2)
    if not lowest <= units <= highest:
        return _OUT_OF_RANGE
    return names.system.units_to_cents(units), InputKind.TYPED


def read_key_mark(token: str, names: PitchNames) -> Spelling | Misread:
    """Read one mark of a key signature, such as ``B-1``, ``F#`` or the pitch name ``segah``.

    The octave of the spelling is 0 and means nothing.
    """
    text = plain_token(token)
    if match := _KEY_MARK.fullmatch(text):
        marks, units = match["marks"] or "", round(float(match["units"] or 0), 2)
        spelling = Spelling(match["letter"].upper(), marks.count("#") - marks.count("b"), units, 0)
    elif named := find_pitch_name(text, names):
        spelling = replace(named.spelling, octave=0)
    else:
        return Misread("is no mark of a key signature", "letters with what alters them, such as B-1 F#")
    if not spelling.accidentals and not spelling.units:
        return Misread("alters nothing", "a letter with what alters it, such as B-1")
    if abs(spelling.units) >= names.system.divisions:
        return Misread("alters by an octave or more", f"less than {names.system.divisions} units")
    return spelling


def lay_out(items: Iterable[Item], start_s: float = 0.0, tempo: float = DEFAULT_TEMPO) -> tuple[Item, ...]:
    """Give written items their times: one after another from `start_s`, at `tempo` beats a minute.

    Every note and silence needs its ``beats``.

    >>> line = lay_out([Silence(0.0, 1.0), Note(6900.0, 0.0, 0.0, beats=2.0)], tempo=60)
    >>> line[1].onset_s, line[1].duration_s
    (1.0, 2.0)
    """
    beat_s = 60.0 / tempo
    gone = 0.0
    placed: list[Item] = []
    for item in items:
        if isinstance(item, Mark):
            placed.append(item)
            continue
        if item.beats is None:
            raise ValueError(f"an item without beats cannot be laid out: {item!r}")
        if isinstance(item, Silence):
            placed.append(Silence(item.beats * beat_s, item.beats))
        else:
            at_s = start_s + gone * beat_s
            placed.append(Note(item.pitch_cents, at_s, item.beats * beat_s, item.kind, item.beats))
        gone += item.beats
    return tuple(placed)


def item_token(
    item: Item,
    names: PitchNames,
    tempo: float = DEFAULT_TEMPO,
    *,
    step_beats: float = ENTRY_STEP_BEATS,
    key: Sequence[Spelling] = (),
    as_names: bool = False,
) -> str:
    """Write one item of a line.

    Parameters
    ----------
    item
        What is typed is written exactly; what is played (without beats) gets its length in beats,
        rounded to `step_beats`, never less than one step.
    names
        The names and the tone system of the pack.
    tempo
        Beats a minute, for played lengths.
    key
        A key signature that the token will be read under; the live entry has none.
    as_names
        Write pitches by their name, where they have one.

    Raises
    ------
    ValueError
        A pitch or length is not a finite number, or the tempo not positive.

    Examples
    --------
    >>> from melodycoach.core.pitch import COMMAS_53
    >>> item_token(Note(7100.0, 0.0, 1.3, InputKind.KEYS), PitchNames(COMMAS_53), 60)
    'B4~:1.5'
    """
    if isinstance(item, Mark):
        return item.value
    beats = item.beats
    if beats is None:
        played = item.duration_s * tempo / 60.0 if tempo > 0 else math.nan
        if not math.isfinite(played):
            raise ValueError(f"{item!r} has no finite length at {tempo!r} beats a minute")
        beats = round(max(1, round(played / step_beats)) * step_beats, 2)
    length = write_beats(beats)
    return ("-" if isinstance(item, Silence) else write_pitch(item, names, key, as_names)) + length


def write_beats(beats: float) -> str:
    """Write a length as it follows the pitch: nothing for one beat, else a colon and the number.

    >>> write_beats(1.0), write_beats(0.25), write_beats(1 / 3), write_beats(2.0)
    ('', ':0.25', ':1/3', ':2')
    """
    if not math.isfinite(beats):
        raise ValueError(f"no finite length: {beats!r}")
    beats = min(max(float(beats), SHORTEST_BEATS), LONGEST_BEATS)
    if beats == 1:
        return ""
    if round(beats, 2) == beats:
        return f":{beats:.2f}".rstrip("0").rstrip(".")
    fraction = Fraction(beats).limit_denominator(64)
    return f":{fraction}" if float(fraction) == beats else f":{beats!r}"


def write_pitch(note: Note, names: PitchNames, key: Sequence[Spelling] = (), as_names: bool = False) -> str:
    """Write the pitch of a note, without its length; what MIDI cannot reach is moved to its edge.

    >>> from melodycoach.core.pitch import COMMAS_53
    >>> flat = (Spelling("B", 0, -1, 0),)
    >>> [write_pitch(Note(cents, 0, 0), PitchNames(COMMAS_53), flat) for cents in (7081.1, 7103.8)]
    ['B4', 'B=4']
    """
    if not math.isfinite(note.pitch_cents):
        raise ValueError(f"no finite pitch: {note!r}")
    cents = min(max(note.pitch_cents, LOWEST_CENTS), HIGHEST_CENTS)
    if note.kind is InputKind.KEYS:
        return f"{SEMITONES_12.spell(round(cents / 100) - 69)}~"
    if as_names and (token := _as_name(cents, names)):
        return token
    system = names.system
    units = round(system.cents_to_units(cents), 2)
    for sign in key:
        octaves = (units - system.spelling_units(replace(sign, octave=4))) / system.divisions
        if abs(octaves - round(octaves)) * system.divisions < 0.005:
            return str(Spelling(sign.letter, 0, 0, 4 + round(octaves)))
    spelling = names.spell(cents)
    altered = spelling.accidentals or spelling.units
    if not altered and any(sign.letter == spelling.letter for sign in key):
        return str(spelling).replace(spelling.letter, spelling.letter + "=", 1)
    return str(spelling)


def name_token(name: str) -> str:
    """Join the words of a pitch name, so that it is one token.

    >>> name_token("Tiz Segâh")
    'Tiz-Segâh'
    """
    return "-".join(name.split())


def _as_name(cents: float, names: PitchNames) -> str:
    units = round(names.system.cents_to_units(cents), 2)
    named = names.at(round(units))
    if named is None:
        return ""
    left = f"{units - named.units:+.2f}".rstrip("0").rstrip(".")
    token = name_token(named.name) + (left if round(units - named.units, 2) else "")
    back = read_token(token, names)  # a name may look like something else
    return token if isinstance(back, Note) and abs(back.pitch_cents - cents) < 0.2 else ""


def complete(prefix: str, names: PitchNames) -> tuple[str, ...]:
    """Give the pitch names that a half-typed token may become, as tokens.

    Names that start so come first, then those with a later word that does, each from low to high.
    Nothing typed, or something that is a note already, completes to nothing.
    """
    typed = fold_name(prefix)
    if not typed or ":" in prefix or _NOTE.match(prefix):
        return ()
    starts: list[str] = []
    inside: list[str] = []
    for named in sorted(names.named, key=lambda named: named.units):
        words = named.name.replace("-", " ").split()
        if fold_name(named.name).startswith(typed):
            starts.append(name_token(named.name))
        elif any(fold_name(word).startswith(typed) for word in words[1:]):
            inside.append(name_token(named.name))
    return (*starts, *inside)
