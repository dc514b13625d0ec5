"""Tuning messages written: twelve offsets as messages that a keyboard or a synthesiser can read.

`melodycoach.sources.midi_tuning` reads what is written here. mido builds every message, and refuses
one whose bytes no port could carry.

Conventions
-----------
Offsets are twelve, in cents from twelve equal keys, C to B. Channels count from 0.

References
----------
MIDI Tuning Standard, scale/octave tuning of one byte (08 08) and of two bytes (08 09), in its
real-time form: keys that sound move too. MIDI 1.0, registered parameter 1 (channel fine tuning), for
instruments that have no such message.
"""

from __future__ import annotations

from enum import StrEnum
from typing import TYPE_CHECKING

import mido

from melodycoach.sources.midi_channel import (
    DATA_COARSE,
    DATA_FINE,
    FINE_TUNING,
    NO_PARAMETER,
)
from melodycoach.sources.midi_mpe import CHANNELS
from melodycoach.sources.midi_tuning import CENTRE, CLASSES

if TYPE_CHECKING:
    from collections.abc import Sequence

EVERY_DEVICE = 0x7F
MELODIC_CHANNELS = tuple(channel for channel in range(CHANNELS) if channel != 9)
"""All channels but the tenth, which carries drums by common practice."""

_AT_ONCE, _TUNING, _ONE_BYTE, _TWO_BYTES = 0x7F, 0x08, 0x08, 0x09
_RPN_COARSE, _RPN_FINE = 101, 100
_SINGLE_CENTRE = 64


class TuningForm(StrEnum):
    """How twelve offsets are sent."""

    TWO_BYTES = "2-byte"
    ONE_BYTE = "1-byte"
    CHANNELS = "channel"


def tuning_messages(
    offsets: Sequence[float], form: TuningForm, channels: Sequence[int] | None = None
) -> tuple[bytes, ...]:
    """Write twelve offsets as whole MIDI messages, in the order in which they are to be sent.

    Parameters
    ----------
    offsets
        Cents, C to B. What a form cannot hold is brought to the nearest that it can.
    form
        ``TWO_BYTES``: one message, to 0.012 c. ``ONE_BYTE``: one message, to a whole cent.
        ``CHANNELS``: a channel for each key (`channel_of_key`), each finely tuned by itself.
    channels
        Which channels to tune; None: all of them, with ``CHANNELS`` those that carry no drums.

    Raises
    ------
    ValueError
        Not twelve offsets, a channel that does not exist, or fewer than twelve for ``CHANNELS``.

    Examples
    --------
    >>> [message] = tuning_messages([0.0] * 4 + [-22.64] + [0.0] * 7, TuningForm.TWO_BYTES)
    >>> message.hex(" ")[:54]
    'f0 7f 7f 08 09 03 7f 7f 40 00 40 00 40 00 40 00 31 41 '
    """
    if len(offsets) != CLASSES:
        raise ValueError(f"{len(offsets)} offsets, expected {CLASSES}")
    if channels is not None and not set(channels) <= set(range(CHANNELS)):
        raise ValueError(f"channels {tuple(channels)!r}, expected 0 to {CHANNELS - 1}")
    if form is TuningForm.CHANNELS:
        return _tune_channels(offsets, channel_of_key(channels))
    chosen = tuple(range(CHANNELS)) if channels is None else channels
    return (_octave_message(offsets, form, chosen),)


def channel_of_key(channels: Sequence[int] | None = None) -> tuple[int, ...]:
    """Give the channel that serves each of the twelve keys where every key has one of its own.

    >>> channel_of_key()
    (0, 1, 2, 3, 4, 5, 6, 7, 8, 10, 11, 12)
    """
    chosen = MELODIC_CHANNELS if channels is None else tuple(dict.fromkeys(channels))
    if len(chosen) < CLASSES:
        raise ValueError(f"{len(chosen)} channels, expected {CLASSES} or more: one for each key")
    return tuple(chosen[:CLASSES])


def _octave_message(offsets: Sequence[float], form: TuningForm, channels: Sequence[int]) -> bytes:
    mask = sum(1 << channel for channel in set(channels))
    names = (mask >> 14 & 3, mask >> 7 & 0x7F, mask & 0x7F)
    if form is TuningForm.ONE_BYTE:
        kind, values = _ONE_BYTE, [_clamped(_SINGLE_CENTRE + cents, 0x7F) for cents in offsets]
    else:
        kind, values = _TWO_BYTES, [byte for cents in offsets for byte in _fine(cents)]
    data = (_AT_ONCE, EVERY_DEVICE, _TUNING, kind, *names, *values)
    return bytes(mido.Message("sysex", data=data).bytes())


def _tune_channels(offsets: Sequence[float], channels: Sequence[int]) -> tuple[bytes, ...]:
    return tuple(
        bytes(mido.Message("control_change", channel=channel, control=control, value=value).bytes())
        for channel, cents in zip(channels, offsets, strict=True)
        for control, value in _fine_tuning(cents)
    )


def _fine_tuning(cents: float) -> tuple[tuple[int, int], ...]:
    """Select fine tuning, enter it, and leave the parameter, so that later data entries miss it.

    The fine byte goes before the coarse one and after it: there are instruments that act on the coarse
    byte with the fine one that they have, and others for which the coarse byte clears it.
    """
    coarse, fine = _fine(cents)
    return (
        (_RPN_COARSE, 0),
        (_RPN_FINE, FINE_TUNING),
        (DATA_FINE, fine),
        (DATA_COARSE, coarse),
        (DATA_FINE, fine),
        (_RPN_COARSE, NO_PARAMETER[0]),
        (_RPN_FINE, NO_PARAMETER[1]),
    )


def _fine(cents: float) -> tuple[int, int]:
    """Write cents as two bytes of seven bits: a semitone is 8192, and the middle 40 00."""
    value = _clamped(CENTRE + cents * CENTRE / 100, 2 * CENTRE - 1)
    return value >> 7, value & 0x7F


def _clamped(value: float, top: int) -> int:
    return min(max(round(value), 0), top)
