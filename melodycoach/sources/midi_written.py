"""Whether the line of a MIDI file was written or played, and a written line in beats.

A file that was written (exported from a score, or put in step by step) has its notes on the grid of
its beats. Then a note is as long as it is written, whatever the tempo, and it may sound shorter: a gap
is a rest only if the notes beside it do not usually leave one. What was played freely keeps its
seconds.

Conventions
-----------
A *span* is from the start of a note to the start of the next one, in ticks. Spans and not starts are
held against the grid, since the pause of a breath or of a phrase end may have any length. A *gate* is
the share of its span for which a note sounds.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from itertools import pairwise
from math import log
from statistics import median
from types import MappingProxyType
from typing import TYPE_CHECKING

from melodycoach.core.note import InputKind, Note, Silence
from melodycoach.core.pitch import KEY_CENTS, KEY_NAMES, Spelling, key_of
from melodycoach.core.sheet import usual_beat
from melodycoach.sources.note_token import LONGEST_BEATS, SHORTEST_BEATS

if TYPE_CHECKING:
    from collections.abc import Callable, Collection, Sequence

    from melodycoach.core.note import Item
    from melodycoach.core.pitch import ToneSystem

GRIDS = (4, 12, 48)
"""Parts of a quarter note: 16ths; triplets of them too; down to 64ths and triplets of 32nds."""

ON_GRID = 0.9
"""So many spans of a written line are on its grid; the others hold a pause."""

SAME_GATE, SAME_GATE_SHARE, FEW_GATES = 0.1, 2 / 3, 4
"""Gates so near to their median are the same; so many must be; with fewer, short ones tell nothing."""

REST_BEATS, ODD_REST_BEATS = 0.2, 0.5
"""A gap of more than so many beats is a rest; the second, more than the usual gap, if no gate is usual."""

LENGTH_PARTS = 12
"""A length that follows from a gate is rounded to such a part of a beat, or of a quarter if that is less."""

EXACT_CENTS, EXACT_BEND_CENTS = 1.5, 0.5
"""Pitches that all lie so near a unit of the tone system, or a bend so near a number of them, are written."""

Span = tuple[int, int]
"""The ticks at which a note starts and ends."""


@dataclass(frozen=True, slots=True)
class Written:
    """A written line.

    Parameters
    ----------
    items
        The line with ``beats``; rests are silences. Onsets and durations are left as they sound.
    beat
        What one beat is, in quarter notes: see `usual_beat`.
    says
        How its pitches were taken, if they are written ones.
    """

    items: tuple[Item, ...]
    beat: float
    says: tuple[str, ...] = ()


def is_written(starts: Sequence[int], ticks_a_quarter: int) -> bool:
    """Say whether notes that start at these ticks were more likely written than played.

    Written spans are on one of the `GRIDS` `ON_GRID` of the time, and most of them in any case; played
    ones are so by chance. So a file that counts in few ticks must keep to a wide grid, or to a narrow one
    for long. Where a part of a quarter is no whole number of ticks, less than a tick off is on the grid.

    Examples
    --------
    >>> is_written([0, 480, 720, 880], 480), is_written([0, 483, 727, 893], 480)
    (True, False)
    """
    spans = [after - before for before, after in pairwise((0, *starts))]
    return any(_written_nats(spans, ticks_a_quarter, parts) > 0 for parts in GRIDS)


def _written_nats(spans: Sequence[int], ticks_a_quarter: int, parts: int) -> float:
    """Give what speaks for spans that were written on this grid against played ones, in nats."""
    is_whole = ticks_a_quarter % parts == 0
    near = 0 if is_whole else parts - 1  # less than a tick, in ticks / parts
    chance = parts * (1 if is_whole else 2) / ticks_a_quarter
    rests = [span * parts % ticks_a_quarter for span in spans]
    n_on = sum(rest <= near or ticks_a_quarter - rest <= near for rest in rests)
    if chance >= ON_GRID or 2 * n_on <= len(spans):
        return 0.0
    return n_on * log(ON_GRID / chance) + (len(spans) - n_on) * log((1 - ON_GRID) / (1 - chance))


def in_beats(
    line: Sequence[Item], spans: Sequence[Span], ticks_a_quarter: int, system: ToneSystem
) -> Written:
    """Give a line with the lengths that were written.

    Parameters
    ----------
    line
        As it was taken from the file, in seconds.
    spans
        Start and end of each note of it.
    ticks_a_quarter
        How the file counts.
    system
        The tone system of the pack.
    """
    lengths, rests = _lengths(spans, ticks_a_quarter)
    beat = usual_beat([length / ticks_a_quarter for length in lengths])
    notes, says = _written_pitches([item for item in line if isinstance(item, Note)], system)
    ends_s = [note.onset_s for note in notes[1:]] + [0.0]
    timed = zip(notes, lengths, rests, ends_s, strict=True)
    items: list[Item] = []
    rest = 0.0
    for item in line:
        if isinstance(item, Note):
            note, length, rest, end_s = next(timed)
            beats = min(max(length / ticks_a_quarter / beat, SHORTEST_BEATS), LONGEST_BEATS)
            items.append(replace(note, beats=beats))
            if rest:
                items.append(Silence(end_s - note.onset_s - note.duration_s, rest / ticks_a_quarter / beat))
        elif rest:  # a breath or the end of a phrase, by its seconds
            items.append(item)
    return Written(tuple(items), beat, says)


def _lengths(spans: Sequence[Span], ticks_a_quarter: int) -> tuple[list[float], list[float]]:
    """Give how long the notes are as written, and the rest after each, in ticks; 0 for none."""
    sounding = [end - start for start, end in spans]
    apart = [after[0] - before[0] for before, after in pairwise(spans)]
    gate = _usual_gate([length / span for length, span in zip(sounding, apart, strict=False) if span])
    beat = usual_beat([span / ticks_a_quarter for span in (*apart, sounding[-1])]) * ticks_a_quarter
    gaps = [span - length for length, span in zip(sounding, apart, strict=False)]
    usual_gap = median(gaps) if len(gaps) >= FEW_GATES else 0
    least = beat * REST_BEATS if gate else beat * ODD_REST_BEATS + usual_gap
    lengths, rests = [], []
    for length, span in zip(sounding, (*apart, 0), strict=True):
        written = _through_gate(length, gate or 1.0, min(beat, ticks_a_quarter) / LENGTH_PARTS)
        is_rest = span - written > least
        lengths.append(written if is_rest or not span else float(span))
        rests.append(span - written if is_rest else 0.0)
    return lengths, rests


def _usual_gate(gates: Sequence[float]) -> float | None:
    """Give the gate of most notes, or None if they have none in common.

    A few notes with gaps are as likely to be notes with rests.
    """
    if not gates:
        return None
    usual = median(gates)
    n_same = sum(abs(gate - usual) <= SAME_GATE for gate in gates)
    is_plain = usual >= 1 - SAME_GATE or len(gates) >= FEW_GATES
    return usual if usual and is_plain and n_same >= SAME_GATE_SHARE * len(gates) else None


def _through_gate(length: int, gate: float, part: float) -> float:
    """Give the length that is written where a note sounds so long."""
    return float(length) if gate == 1 else round(length / gate / part) * part


def _written_pitches(notes: list[Note], system: ToneSystem) -> tuple[list[Note], tuple[str, ...]]:
    """Give the notes with the pitches that are written, and what is to be said of it.

    Plain keys stay what they are. Once one note is bent, all are meant as they sound.
    """
    if all(note.kind is InputKind.KEYS for note in notes):
        return notes, ()
    exact, said = exact_pitches({note.pitch_cents for note in notes}, system)
    if not exact:
        return [replace(note, kind=InputKind.TUNED) for note in notes], ()
    kind = InputKind.TYPED
    return [replace(note, pitch_cents=exact[note.pitch_cents], kind=kind) for note in notes], (said,)


def exact_pitches(pitches: Collection[float], system: ToneSystem) -> tuple[dict[float, float], str]:
    """Give the written pitch of each pitch, and what is to be said of it; nothing if one is not written.

    Written pitches all lie on units of the tone system, or all of them do but for plain keys.

    >>> from melodycoach.core.pitch import COMMAS_53
    >>> exact_pitches([6900, 7100 - 22.6], COMMAS_53)[0]
    {6900: 6900.0, 7077.4: 7081.132075471698}
    """
    for unit_of, said in _READINGS:
        units = {cents: unit_of(cents, system) for cents in pitches}
        exact = {cents: system.units_to_cents(unit) for cents, unit in units.items() if unit is not None}
        if len(exact) == len(units):
            return exact, said.format(unit=system.unit_name)
    return {}, ""


def _near_unit(cents: float, system: ToneSystem) -> int | None:
    """Give the unit that a pitch lies on, or None."""
    unit = round(system.cents_to_units(cents))
    return unit if abs(system.units_to_cents(unit) - cents) <= EXACT_CENTS else None


def _unit_beside_plain_keys(cents: float, system: ToneSystem) -> int | None:
    """Give the unit that is meant where naturals, and sharps too, are plain keys; None if none is.

    A plain black key is written with a plain sharp or flat; any other pitch is a natural with an
    accidental of whole units.

    >>> from melodycoach.core.pitch import COMMAS_53
    >>> [_unit_beside_plain_keys(cents, COMMAS_53) for cents in (7200, 7100 - 22.6, 6600, 6650)]
    [13, 8, -14, None]
    """
    tone = system.natural_units[1]  # no accidental moves a natural further
    key = key_of(cents)
    for one in (key, key - 1, key + 1, key - 2, key + 2):
        name = KEY_NAMES[one % len(KEY_NAMES)]
        accidentals = _ACCIDENTALS[name[1:]]
        n_units = round((cents - KEY_CENTS * one) / system.unit_cents)
        off = abs(KEY_CENTS * one + n_units * system.unit_cents - cents)
        if off <= EXACT_BEND_CENTS and abs(n_units) <= (0 if accidentals else tone):
            spelled = Spelling(name[0], accidentals, n_units, one // len(KEY_NAMES) - 1)
            return round(system.spelling_units(spelled))
    return None


_ACCIDENTALS = MappingProxyType({"": 0, "#": 1, "b": -1})

_ON_UNITS = "its pitches lie on whole {unit}s, as written"
_BESIDE_KEYS = (
    "its bent notes lie whole {unit}s off plain keys: all are read as the pitches that are written so"
)
_READINGS: tuple[tuple[Callable[[float, ToneSystem], int | None], str], ...] = (
    (_near_unit, _ON_UNITS),
    (_unit_beside_plain_keys, _BESIDE_KEYS),
)
