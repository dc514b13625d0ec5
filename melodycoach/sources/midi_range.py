"""How far bends go, where a file does not say so and the usual two semitones make no sense of them.

Instruments with a channel for each note (MPE) bend by 48 semitones. They tell this once, when they are
set up, and a recording that began later has lost it. Its bends are then tiny: a comma takes 39 steps of
8,192, which is less than a cent in the usual range, and nobody bends by so little.

References
----------
MPE (RP-053): members of a zone bend by 48 semitones unless told otherwise.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from melodycoach.core.pitch import KEY_CENTS
from melodycoach.sources.midi_match import is_strike
from melodycoach.sources.midi_tuning import CENTRE
from melodycoach.sources.midi_written import exact_pitches

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from melodycoach.core.pitch import ToneSystem
    from melodycoach.sources.midi_track import TimedMessage

WIDE_RANGE = 48
"""Semitones, up and down."""

TINY_BEND = 204
"""Steps: five cents in the usual range of two semitones."""

_DATA_ENTRY, _SEPTET = (6, 38, 96, 97), 7
_BEND_RANGE = ((101, 0), (100, 0), (6, WIDE_RANGE), (38, 0), (101, 127), (100, 127))


def wide_range(
    messages: Sequence[TimedMessage], channels: Iterable[int], system: ToneSystem
) -> list[TimedMessage]:
    """Give what sets the wide bend range on these channels if it is meant, else nothing.

    It is meant if notes lie on several channels, no parameter is set anywhere, every bend is tiny,
    and in the wide range every pitch is a written one of the tone system.

    Examples
    --------
    A4, and B4 a comma lower, each on a channel of its own:

    >>> from melodycoach.core.pitch import COMMAS_53
    >>> sent = ("E1 00 40", "91 45 40", "81 45 40", "E2 6A 3F", "92 47 40", "82 47 40")
    >>> messages = [(0, bytes.fromhex(text)) for text in sent]
    >>> [message.hex(" ") for _, message in wide_range(messages, [1], COMMAS_53)][:3]
    ['b1 65 00', 'b1 64 00', 'b1 06 30']
    """
    bends: dict[int, int] = {}
    used: set[int] = set()
    pitches: set[float] = set()
    for _, message in messages:
        kind, channel = message[0] & 0xF0, message[0] & 0x0F
        if kind == 0xB0 and message[1] in _DATA_ENTRY:
            return []
        if kind == 0xE0:
            bends[channel] = (message[2] << _SEPTET | message[1]) - CENTRE
            if abs(bends[channel]) > TINY_BEND:
                return []
        elif is_strike(message):
            used.add(channel)
            pitches.add(KEY_CENTS * (message[1] + bends.get(channel, 0) * WIDE_RANGE / CENTRE))
    if len(used) < 2 or not any(bends.values()) or not exact_pitches(pitches, system)[0]:
        return []
    return [(0, bytes((0xB0 | one, *control))) for one in channels for control in _BEND_RANGE]
