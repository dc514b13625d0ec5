"""One track of a Standard MIDI File: the bytes of a chunk in, what it holds out.

Only what bears on pitch and time is kept: channel messages, system exclusive messages, tempos, time
signatures and names. Key signatures are checked and passed over: the pitches stand in the keys. What
is damaged costs itself, if its end is known, and else what comes after it in the track.

References
----------
Standard MIDI Files 1.0 (RP-001).
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING, TypeAlias

from melodycoach.sources.midi_time import TimeSignature

if TYPE_CHECKING:
    from collections.abc import Callable

    from melodycoach.sources.midi_time import TempoChange

MAX_EVENTS = 1_000_000
"""Events of all tracks together, meta events too; what comes after them is left out and told."""

MAX_TICKS = 1_000_000_000
"""A track that counts further is damaged: these are days of music at any usual division."""

FASTEST_TEMPO = 10_000
"""Microseconds a quarter: 6,000 a minute. A tempo beyond that is damaged; with 0, time stands still."""

MAX_QUANTITY_BYTES = 4
"""Bytes that a delta time or a length may take (RP-001)."""

MAX_NAME_BYTES = 200
"""A name is cut after so many bytes."""

_LENGTH_BY_KIND = {0x8: 3, 0x9: 3, 0xA: 3, 0xB: 3, 0xC: 2, 0xD: 2, 0xE: 3}
_NOTE_KINDS = (0x8, 0x9)
_SYSEX, _SYSEX_END, _META = 0xF0, 0xF7, 0xFF
_PLAIN_SYSTEM_DATA = {0xF1: 1, 0xF2: 2, 0xF3: 1, 0xF6: 0, 0xF8: 0, 0xFA: 0, 0xFB: 0, 0xFC: 0, 0xFE: 0}
_NAME, _INSTRUMENT, _END, _TEMPO, _TIME, _KEY = 0x03, 0x04, 0x2F, 0x51, 0x58, 0x59
_SHARPS, _MAX_UNIT_POWER = range(-7, 8), 7

TimedMessage: TypeAlias = tuple[int, bytes]
"""A tick, and a whole message with its status byte; system exclusive from F0 to F7."""


@dataclass(frozen=True, slots=True)
class Track:
    """What one track holds.

    Parameters
    ----------
    number
        Its place in the file, from 1.
    name, instrument
        Its first name and first instrument name; empty where it has none.
    events
        In the order of the file.
    end_tick
        Where the track ends, or where it stopped.
    tempos, signatures
        Those that stand in this track; see `MidiFile.tempo_map` for those that hold for it.
    """

    number: int
    name: str = ""
    instrument: str = ""
    events: tuple[TimedMessage, ...] = ()
    end_tick: int = 0
    tempos: tuple[TempoChange, ...] = ()
    signatures: tuple[TimeSignature, ...] = ()


class StoppedError(Exception):
    """A track cannot be read on: the byte, and the reason."""

    def __init__(self, at: int, reason: str) -> None:
        super().__init__(reason)
        self.at, self.reason = at, reason


@dataclass(slots=True)
class TrackReading:
    """One track while it is read."""

    data: bytes
    number: int
    end: int
    budget: int
    tick: int = 0
    has_ended: bool = False
    events: list[TimedMessage] = field(default_factory=list)
    names: dict[int, str] = field(default_factory=dict)
    tempos: list[TempoChange] = field(default_factory=list)
    signatures: list[TimeSignature] = field(default_factory=list)
    faults: dict[str, tuple[int, int]] = field(default_factory=dict)  # first byte and count, by what
    unfinished: bytearray = field(default_factory=bytearray)  # system exclusive that goes on

    def track(self) -> Track:
        """Give what was read."""
        self._finish_sysex()
        name, instrument = self.names.get(_NAME, ""), self.names.get(_INSTRUMENT, "")
        held = (tuple(self.events), self.tick, tuple(self.tempos), tuple(self.signatures))
        return Track(self.number, name, instrument, *held)

    def losses(self) -> tuple[str, ...]:
        """Say which of its meta events are damaged."""
        return tuple(
            f"track {self.number}: the {name} at byte {at} of the file is damaged and was passed over"
            + (f", and so were {count - 1} more" if count > 1 else "")
            for name, (at, count) in self.faults.items()
        )

    def read(self, at: int) -> int:
        """Read events from here to an end-of-track event or to the end; give where that was.

        Raises
        ------
        StoppedError
            The track cannot be read on. What was read so far is kept.
        """
        data, end, events = self.data, self.end, self.events
        running, self.has_ended = 0, False
        while at < end:
            start = at
            delta, at = (data[at], at + 1) if data[at] < 0x80 else self._quantity(at)
            self._count(start, delta)
            if at >= end:
                raise StoppedError(at, "it ends after a time, where a message was expected")
            status = data[at]
            if status >= _SYSEX:
                at = self._system(status, at)
                running = running if status == _META else 0
                if self.has_ended:
                    return at
                continue
            if status < 0x80:
                if not running:
                    raise StoppedError(at, f"{status:02X} was found, where a message was expected")
                status = running
            else:
                running = status
                at += 1
            length = _LENGTH_BY_KIND[status >> 4]
            values = data[at : at + length - 1]
            at += length - 1
            if at > end:
                raise StoppedError(end, "it ends inside a message")
            if not values.isascii():
                values = _clipped(status, values, at)
            if self.unfinished:
                self._finish_sysex()
            events.append((self.tick, bytes((status, *values))))
        return at

    def _count(self, at: int, delta: int) -> None:
        """Count one event more, so much later than the one before."""
        if self.budget == 0:
            raise StoppedError(at, f"only the first {MAX_EVENTS} events of a file are read")
        if self.tick + delta > MAX_TICKS:
            raise StoppedError(at, f"it counts further than {MAX_TICKS} ticks")
        self.budget -= 1
        self.tick += delta

    def _quantity(self, at: int) -> tuple[int, int]:
        """Read a number of variable length; give it and where it ends."""
        data, value = self.data, 0
        for place in range(at, min(at + MAX_QUANTITY_BYTES, self.end)):
            value = value << 7 | data[place] & 0x7F
            if data[place] < 0x80:
                return value, place + 1
        if at + MAX_QUANTITY_BYTES > self.end:
            raise StoppedError(self.end, "it ends inside a number")
        raise StoppedError(at, f"a time or a length takes more than {MAX_QUANTITY_BYTES} bytes")

    def _payload(self, at: int) -> tuple[bytes, int]:
        """Read a length and so many bytes; give them and where they end."""
        length, start = self._quantity(at)
        if start + length > self.end:
            raise StoppedError(at, f"{length} bytes are announced, and {self.end - start} are left")
        return self.data[start : start + length], start + length

    def _system(self, status: int, at: int) -> int:
        """Read what belongs to no channel; give where it ends."""
        if status == _META:
            if at + 1 >= self.end:
                raise StoppedError(self.end, "it ends inside a message")
            payload, after = self._payload(at + 2)
            self._meta(self.data[at + 1], payload, at)
            return after
        if status in (_SYSEX, _SYSEX_END):
            payload, after = self._payload(at + 1)
            self._packet(status, payload)
            return after
        if status in _PLAIN_SYSTEM_DATA:  # has no place in a file and says nothing of pitch
            return at + 1 + _PLAIN_SYSTEM_DATA[status]
        raise StoppedError(at, f"{status:02X} was found, which MIDI does not define")

    def _packet(self, status: int, payload: bytes) -> None:
        """Join the packets of system exclusive messages; take a message out of an escape."""
        if status == _SYSEX:
            self._finish_sysex()
            self.unfinished += bytes((_SYSEX,)) + payload
        elif self.unfinished:
            self.unfinished += payload
        elif _is_whole_message(payload):
            self.events.append((self.tick, payload))
        if self.unfinished and self.unfinished[-1] == _SYSEX_END:
            self._finish_sysex()

    def _finish_sysex(self) -> None:
        """Let a system exclusive message end here, if one is under way."""
        if self.unfinished:
            closing = b"" if self.unfinished[-1] == _SYSEX_END else bytes((_SYSEX_END,))
            self.events.append((self.tick, bytes(self.unfinished) + closing))
            self.unfinished.clear()

    def _meta(self, kind: int, payload: bytes, at: int) -> None:
        """Take what a meta event says; a damaged one loses only itself."""
        if kind in (_NAME, _INSTRUMENT):
            self.names.setdefault(kind, decode_text(payload))
        elif kind == _END:
            self.has_ended = True
        elif kind in _METAS:
            name, is_sound = _METAS[kind]
            if not is_sound(payload):
                first, count = self.faults.get(name, (at, 0))
                self.faults[name] = (first, count + 1)
            elif kind == _TEMPO:
                self.tempos.append((self.tick, int.from_bytes(payload)))
            elif kind == _TIME:
                self.signatures.append(TimeSignature(self.tick, payload[0], 1 << payload[1]))


_METAS: dict[int, tuple[str, Callable[[bytes], bool]]] = {
    _TEMPO: ("tempo", lambda payload: len(payload) == 3 and int.from_bytes(payload) >= FASTEST_TEMPO),
    _TIME: (
        "time signature",
        lambda payload: len(payload) >= 2 and payload[0] > 0 and payload[1] <= _MAX_UNIT_POWER,
    ),
    _KEY: (
        "key signature",
        lambda payload: len(payload) == 2 and _signed(payload[0]) in _SHARPS and payload[1] in (0, 1),
    ),
}
"""The meta events that are checked: what each is called, and whether its bytes can be believed."""


def _signed(byte: int) -> int:
    return byte - 256 if byte >= 0x80 else byte


def _clipped(status: int, values: bytes, after: int) -> bytes:
    """Read a velocity above 127 as 127: it says nothing of pitch. Nothing else can be guessed."""
    if status >> 4 in _NOTE_KINDS and values[0] < 0x80:
        return bytes((values[0], 0x7F))
    raise StoppedError(after - len(values), f"the values {values.hex(' ').upper()} are above 7F")


def _is_whole_message(message: bytes) -> bool:
    """Say whether an escape holds just one message that can bear on pitch."""
    if not message or not message[0] & 0x80:
        return False
    if message[0] == _SYSEX:
        return message[-1] == _SYSEX_END
    return len(message) == _LENGTH_BY_KIND.get(message[0] >> 4) and message[1:].isascii()


def decode_text(text: bytes) -> str:
    """Read a name: as UTF-8, else in the Turkish code page, else in Latin-1, which takes every byte.

    Examples
    --------
    >>> decode_text("Uşşak".encode("utf-8")), decode_text("Uşşak".encode("cp1254"))
    ('Uşşak', 'Uşşak')
    """
    if len(text) > MAX_NAME_BYTES:
        cut = MAX_NAME_BYTES
        while cut and text[cut] & 0xC0 == 0x80:  # not inside a sign of UTF-8
            cut -= 1
        text = text[:cut]
    for encoding in ("utf-8-sig", "cp1254"):
        try:
            return _printable(text.decode(encoding))
        except UnicodeDecodeError:
            continue
    return _printable(text.decode("latin-1"))


def _printable(text: str) -> str:
    """Turn controls into spaces, and many spaces into one."""
    return " ".join("".join(sign if sign.isprintable() else " " for sign in text).split())
