"""Tuning messages: what a system exclusive message says of tuning, and the tables that follow them.

`read_tuning` turns the bytes of one message into a value; `TuningTables` keeps what the messages
have said, for every key of the sixteen channels. Both are pure.

Conventions
-----------
Channels count from 0, keys from 0 to 127. A key's own place is 100 cents times its number; what a
table holds is how far a key is off its place, in cents. A pitch class counts from 0, C.

References
----------
MIDI Tuning Standard with its extensions (universal system exclusive, sub-ID 08: bulk dumps,
single-note changes, scale/octave tuning), MIDI 1.0 device control (04 03, 04 04), General MIDI
system messages, and the two makers' scale messages in common use: Roland GS (40 1x 40 to 4B) and
Yamaha XG (08 pp 41 to 4C).
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum, auto
from types import MappingProxyType
from typing import TYPE_CHECKING, TypeAlias

from melodycoach.sources.midi_mpe import CHANNELS

if TYPE_CHECKING:
    from collections.abc import Callable, Iterable, Mapping, Sequence

KEYS = 128
CLASSES = 12
CENTRE = 8192
"""Middle of a 14-bit value: neither up nor down."""

PLAIN_CENTS = 1.0
"""A key that is off by less than this is a plain key of twelve to the octave."""

ALL_CHANNELS = tuple(range(CHANNELS))

_SYSEX, _SYSEX_END = 0xF0, 0xF7
_LATER, _AT_ONCE = 0x7E, 0x7F  # universal messages: non-real-time and real-time
_ROLAND, _YAMAHA = b"\x41", b"\x43"
_COARSE_CENTRE = 64
_NAME = 16  # letters that name a tuning in a dump


@dataclass(frozen=True, slots=True)
class TunedKeys:
    """Keys of a stored tuning, each with its pitch in cents on the MIDI scale.

    The tuning is in force on the channels that have chosen its bank and program. ``at_once``: keys
    that sound move too.
    """

    bank: int
    program: int
    cents_by_key: Mapping[int, float]
    at_once: bool


@dataclass(frozen=True, slots=True)
class TunedOctave:
    """Pitch classes, in every octave of some channels: cents off their plain places."""

    channels: tuple[int, ...]
    cents_by_class: Mapping[int, float]
    at_once: bool


@dataclass(frozen=True, slots=True)
class MasterFine:
    """Every key of the instrument is off by so many cents."""

    cents: float


@dataclass(frozen=True, slots=True)
class MasterCoarse:
    """Every key of the instrument is moved by so many semitones."""

    semitones: int


@dataclass(frozen=True, slots=True)
class StatedTuning:
    """What the player says of a keyboard: no message does.

    Parameters
    ----------
    cents_by_class
        How far each key is off its place, C to B, in every octave of every channel.
    semitones
        What every key sounds above its number.
    """

    cents_by_class: tuple[float, ...] = (0.0,) * CLASSES
    semitones: int = 0

    def table(self) -> Mapping[int, float]:
        """Give cents off for each of the 128 keys; empty where every key is in its place."""
        return _unless_plain({key: self.cents_by_class[key % CLASSES] for key in range(KEYS)})


NOTHING_STATED = StatedTuning()


class Other(Enum):
    """A message that tunes no keys."""

    RESET = auto()
    """The instrument is put back to how it starts, its tuning too."""

    SILENT = auto()
    """It says nothing of tuning, or only asks."""

    DAMAGED = auto()
    """It is cut off, or is a tuning message of no known form."""


TuningMessage: TypeAlias = TunedKeys | TunedOctave | MasterFine | MasterCoarse | Other


def read_tuning(message: Sequence[int]) -> TuningMessage:
    """Say what a system exclusive message, from F0 to F7, tunes; any bytes are accepted.

    Device numbers are not looked at, nor the checksum of a dump (senders differ in what it covers).
    The checksum of a GS message must fit.

    Examples
    --------
    The scale/octave form in single bytes, with every E 23 cents down:

    >>> told = read_tuning(bytes.fromhex("F07E7F0808037F7F404040402940404040404040F7"))
    >>> told.cents_by_class[4], told.cents_by_class[5], len(told.channels), told.at_once
    (-23.0, 0.0, 16, False)
    """
    body = message[1:-1]
    if len(message) < 2 or message[0] != _SYSEX or message[-1] != _SYSEX_END:
        return Other.DAMAGED
    if not (min(body, default=0) >= 0 and max(body, default=0) < 128):
        return Other.DAMAGED
    data = bytes(body)
    if data[:1] in (b"\x7e", b"\x7f"):
        return _read_universal(data)
    if data[:1] == _ROLAND and data[2:4] == b"\x42\x12":  # a GS instrument, data set
        return _read_gs(data[4:])
    if data[:1] == _YAMAHA and data[2:3] == b"\x4c" and data[1] >> 4 == 1:  # an XG parameter
        return _read_xg(data[3:])
    return Other.SILENT


def word_cents(word: bytes) -> float:
    """Give the pitch of a key and a 14-bit fraction of a semitone above it, in cents.

    >>> word_cents(bytes.fromhex("454000"))
    6950.0
    """
    key, coarse, fine = word
    return 100 * (key + (coarse << 7 | fine) / (1 << 14))


def _read_universal(data: bytes) -> TuningMessage:
    kind = (data[0], *data[2:4])
    if kind in _UNIVERSAL:
        return _UNIVERSAL[kind](data[4:], data[0] == _AT_ONCE)
    return Other.DAMAGED if data[2:3] == b"\x08" else Other.SILENT


def _keys(words: bytes, keys: Iterable[int], bank: int, program: int, at_once: bool) -> TunedKeys:
    """Take a frequency word of three bytes for each key; 7F 7F 7F leaves the key as it is."""
    pairs = zip(keys, (words[at : at + 3] for at in range(0, len(words), 3)), strict=True)
    cents = {key: word_cents(word) for key, word in pairs if word != b"\x7f\x7f\x7f"}
    return TunedKeys(bank, program, MappingProxyType(cents), at_once)


def _read_dump(data: bytes, at_once: bool) -> TuningMessage:
    return _read_bank_dump(b"\0" + data, at_once)


def _read_bank_dump(data: bytes, at_once: bool) -> TuningMessage:
    """Read bank, program, name, a word for each key, checksum."""
    if len(data) != 2 + _NAME + 3 * KEYS + 1:
        return Other.DAMAGED
    return _keys(data[2 + _NAME : -1], range(KEYS), data[0], data[1], at_once)


def _read_change(data: bytes, at_once: bool) -> TuningMessage:
    return _read_bank_change(b"\0" + data, at_once)


def _read_bank_change(data: bytes, at_once: bool) -> TuningMessage:
    """Read bank, program, how many, and for each a key and its word."""
    if len(data) < 3 or len(data) != 3 + 4 * data[2]:
        return Other.DAMAGED
    changes = [data[at : at + 4] for at in range(3, len(data), 4)]
    words = b"".join(change[1:] for change in changes)
    return _keys(words, [change[0] for change in changes], data[0], data[1], at_once)


def _single(data: bytes) -> tuple[float, ...] | None:
    """Twelve offsets of a byte each: a cent a step, none at 40."""
    return tuple(float(byte - 64) for byte in data) if len(data) == CLASSES else None


def _double(data: bytes) -> tuple[float, ...] | None:
    """Twelve offsets of two bytes each: up to a semitone either way, none at 40 00."""
    if len(data) != 2 * CLASSES:
        return None
    return tuple(_fine_cents(data[at], data[at + 1]) for at in range(0, len(data), 2))


def _fine_cents(coarse: int, fine: int) -> float:
    return ((coarse << 7 | fine) - CENTRE) * 100 / CENTRE


def _octave_dump(
    offsets: Callable[[bytes], tuple[float, ...] | None],
) -> Callable[[bytes, bool], TuningMessage]:
    """Make the reader of bank, program, name, twelve offsets, checksum: a whole stored tuning."""

    def read(data: bytes, at_once: bool) -> TuningMessage:
        cents = offsets(data[2 + _NAME : -1])
        if cents is None:
            return Other.DAMAGED
        by_key = {key: 100.0 * key + cents[key % CLASSES] for key in range(KEYS)}
        return TunedKeys(data[0], data[1], MappingProxyType(by_key), at_once)

    return read


def _octave(offsets: Callable[[bytes], tuple[float, ...] | None]) -> Callable[[bytes, bool], TuningMessage]:
    """Make the reader of three bytes that name channels, and twelve offsets."""

    def read(data: bytes, at_once: bool) -> TuningMessage:
        cents = offsets(data[3:])
        if cents is None:
            return Other.DAMAGED
        mask = (data[0] & 3) << 14 | data[1] << 7 | data[2]
        channels = tuple(channel for channel in ALL_CHANNELS if mask >> channel & 1)
        return TunedOctave(channels, MappingProxyType(dict(enumerate(cents))), at_once)

    return read


def _read_master_fine(data: bytes, at_once: bool) -> TuningMessage:
    return MasterFine(_fine_cents(data[1], data[0])) if len(data) == 2 else Other.DAMAGED


def _read_master_coarse(data: bytes, at_once: bool) -> TuningMessage:
    return MasterCoarse(data[1] - _COARSE_CENTRE) if len(data) == 2 else Other.DAMAGED


def _read_reset(data: bytes, at_once: bool) -> TuningMessage:
    return Other.DAMAGED if data else Other.RESET


def _read_request(data: bytes, at_once: bool) -> TuningMessage:
    return Other.SILENT


_UNIVERSAL: Mapping[tuple[int, ...], Callable[[bytes, bool], TuningMessage]] = MappingProxyType(
    {
        (_LATER, 0x08, 0x00): _read_request,
        (_LATER, 0x08, 0x01): _read_dump,
        (_AT_ONCE, 0x08, 0x02): _read_change,
        (_LATER, 0x08, 0x03): _read_request,
        (_LATER, 0x08, 0x04): _read_bank_dump,
        (_LATER, 0x08, 0x05): _octave_dump(_single),
        (_LATER, 0x08, 0x06): _octave_dump(_double),
        (_LATER, 0x08, 0x07): _read_bank_change,
        (_AT_ONCE, 0x08, 0x07): _read_bank_change,
        (_LATER, 0x08, 0x08): _octave(_single),
        (_AT_ONCE, 0x08, 0x08): _octave(_single),
        (_LATER, 0x08, 0x09): _octave(_double),
        (_AT_ONCE, 0x08, 0x09): _octave(_double),
        (_AT_ONCE, 0x04, 0x03): _read_master_fine,
        (_AT_ONCE, 0x04, 0x04): _read_master_coarse,
        (_LATER, 0x09, 0x01): _read_reset,
        (_LATER, 0x09, 0x02): _read_reset,
        (_LATER, 0x09, 0x03): _read_reset,
    }
)
"""Kind of universal message, sub-IDs 1 and 2, and what reads the bytes after them."""

_GS_CHANNEL_BY_BLOCK = (9, *range(9), *range(10, CHANNELS))  # part 10 comes first
_GS_RESET, _XG_RESET = b"\x40\x00\x7f", b"\x00\x00\x7e"
_GS_FIRST, _XG_FIRST = 0x40, 0x41  # where C is


def _read_gs(data: bytes) -> TuningMessage:
    """Read an address of three bytes, what is set there, and the checksum over both."""
    if len(data) < 5 or sum(data) % 128:
        return Other.DAMAGED
    address, values = data[:3], data[3:-1]
    if address == _GS_RESET:
        return Other.RESET
    if address[0] != 0x40 or address[1] >> 4 != 1:
        return Other.SILENT
    return _maker_octave(_GS_CHANNEL_BY_BLOCK[address[1] & 0x0F], address[2] - _GS_FIRST, values)


def _read_xg(data: bytes) -> TuningMessage:
    """Read an address of three bytes and what is set there."""
    if len(data) < 4:
        return Other.DAMAGED
    address, values = data[:3], data[3:]
    if address == _XG_RESET:
        return Other.RESET
    if address[0] != 0x08 or address[1] >= CHANNELS:
        return Other.SILENT
    return _maker_octave(address[1], address[2] - _XG_FIRST, values)


def _maker_octave(channel: int, first: int, values: bytes) -> TuningMessage:
    """Take offsets of one part, of a byte each, from a pitch class on; what follows B is no pitch."""
    if not 0 <= first < CLASSES:
        return Other.SILENT
    offsets = {first + at: float(value - 64) for at, value in enumerate(values[: CLASSES - first])}
    return TunedOctave((channel,), MappingProxyType(offsets), at_once=True)


class TuningTables:
    """How far each key of each channel is off its plain place, by the messages so far.

    The latest message on a key counts, whether it came for a stored tuning or for an octave. Every
    channel begins with bank 0, program 0, and with what the player has stated (cents off by key). A
    channel all of whose keys are back within a cent of their places is plain again.

    An instance changes as it is told; it belongs to its tracker.
    """

    def __init__(self, stated: Mapping[int, float] = MappingProxyType({})) -> None:
        self._stated = stated
        self._stored: dict[tuple[int, int], dict[int, float]] = {}
        self._chosen = [(0, 0)] * CHANNELS
        self._tables = [stated] * CHANNELS  # never changed in place: shared

    def key_cents(self, channel: int, key: int) -> float | None:
        """Say how far a key is off its place; None when its channel is plain."""
        table = self._tables[channel]
        return table.get(key, 0.0) if table else None

    def table(self, channel: int) -> Mapping[int, float]:
        """Give cents off by key; channels that were tuned alike may share one table."""
        return self._tables[channel]

    def tune_keys(self, told: TunedKeys) -> tuple[int, ...]:
        """Store a tuning or a part of it; give the channels on which it is in force."""
        place = (told.bank, told.program)
        offsets = {key: cents - 100 * key for key, cents in told.cents_by_key.items()}
        self._stored[place] = {**self._stored.get(place, {}), **offsets}
        channels = tuple(channel for channel in ALL_CHANNELS if self._chosen[channel] == place)
        self._update(channels, offsets)
        return channels

    def tune_octave(self, told: TunedOctave) -> tuple[int, ...]:
        """Tune pitch classes; give the channels that were meant."""
        offsets = {
            key: told.cents_by_class[key % CLASSES]
            for key in range(KEYS)
            if key % CLASSES in told.cents_by_class
        }
        self._update(told.channels, offsets)
        return told.channels

    def choose(self, channel: int, bank: int, program: int) -> None:
        """Put a stored tuning in force on a channel; keys of which none was sent are as they began."""
        self._chosen[channel] = (bank, program)
        self._tables[channel] = _unless_plain({**self._stated, **self._stored.get((bank, program), {})})

    def _update(self, channels: Iterable[int], offsets: Mapping[int, float]) -> None:
        before = {channel: self._tables[channel] for channel in channels}
        distinct = {id(table): table for table in before.values()}  # shared ones stay shared
        updated = {key: _unless_plain({**table, **offsets}) for key, table in distinct.items()}
        for channel, table in before.items():
            self._tables[channel] = updated[id(table)]


def _unless_plain(table: Mapping[int, float]) -> Mapping[int, float]:
    return table if any(abs(cents) >= PLAIN_CENTS for cents in table.values()) else {}
