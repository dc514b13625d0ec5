"""MIDI files for tests, put together from hex: chunks with right lengths around events as written."""

from __future__ import annotations

END = "00 FF 2F 00"


def chunk(kind: bytes, data: bytes) -> bytes:
    """One chunk: four letters, its length, its data."""
    return kind + len(data).to_bytes(4) + data


def header(n_tracks: int, midi_format: int = 1, division: int = 480) -> bytes:
    """The first chunk of a file."""
    return chunk(b"MThd", b"".join(word.to_bytes(2) for word in (midi_format, n_tracks, division)))


def track(*events: str) -> bytes:
    """A track of these events in hex; it is given an end-of-track event."""
    return chunk(b"MTrk", bytes.fromhex(" ".join((*events, END))))


def midi(*tracks: bytes, midi_format: int = 1, division: int = 480) -> bytes:
    """A whole file."""
    return header(len(tracks), midi_format, division) + b"".join(tracks)


def quantity(value: int) -> str:
    """A number of variable length, as the standard writes it."""
    septets = [value & 0x7F]
    while value := value >> 7:
        septets.append(value & 0x7F | 0x80)
    return bytes(reversed(septets)).hex()


def note(key: int, ticks: int = 480, channel: int = 1, wait: int = 0) -> str:
    """A note on a channel counted from 1, after so many ticks."""
    number = channel - 1
    return f"{quantity(wait)} 9{number:X} {key:02X} 40 {quantity(ticks)} 8{number:X} {key:02X} 40"


def notes(*keys: int, ticks: int = 480, channel: int = 1) -> str:
    """Notes one after the other."""
    return " ".join(note(key, ticks, channel) for key in keys)


def chord(*keys: int, ticks: int = 480, channel: int = 1) -> str:
    """Notes struck and released together."""
    number = channel - 1
    ons = " ".join(f"00 9{number:X} {key:02X} 40" for key in keys)
    offs = [f"00 8{number:X} {key:02X} 40" for key in keys[1:]]
    return " ".join((ons, f"{quantity(ticks)} 8{number:X} {keys[0]:02X} 40", *offs))


def name(text: str, encoding: str = "utf-8") -> str:
    """A track name."""
    data = text.encode(encoding)
    return f"00 FF 03 {quantity(len(data))} {data.hex()}"


def tempo(microseconds: int) -> str:
    """A tempo at once."""
    return f"00 FF 51 03 {microseconds:06X}"
