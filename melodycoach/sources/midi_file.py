"""Standard MIDI Files: bytes in, what they hold out, and nothing is lost that could be read.

Chunks, delta times and messages are read here and not by mido: its reader gives all of a file or
nothing, so one bad key signature or one missing byte at the end loses every note. Here each damage
costs what it damages: a bad meta event itself, a broken track what comes after the break. What is
lost is told with the track and the byte, counted from 0 as editors of bytes count. This module reads
the chunks, `melodycoach.sources.midi_track` what stands in a track.

References
----------
Standard MIDI Files 1.0 (RP-001).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from melodycoach.errors import MusicFileError
from melodycoach.sources.midi_time import USUAL_DIVISION, Division, TempoMap
from melodycoach.sources.midi_track import MAX_EVENTS, StoppedError, TrackReading

if TYPE_CHECKING:
    from melodycoach.sources.midi_time import TempoChange, TimeSignature
    from melodycoach.sources.midi_track import Track

MAX_FILE_BYTES = 16 * 1024 * 1024
"""A larger file is refused: a melody of an hour takes less than one of these sixteen megabytes."""

MAX_CHUNKS = 1_000
"""Tracks and other chunks together; what comes after them is left out and told."""

SEARCHED_BYTES = 64 * 1024
"""The file header may stand behind a wrapper or rubbish of so many bytes."""

TOLD_LOSSES = 20
"""So many losses are told one by one, the others as a number."""

_HEADER, _TRACK = b"MThd", b"MTrk"
_FORMAT_APART = 2


@dataclass(frozen=True, slots=True)
class MidiFile:
    """What a file holds.

    Parameters
    ----------
    division
        How it counts time.
    tracks
        All of them, empty ones too.
    tracks_apart
        Each track is a piece of its own, with a time of its own (format 2).
    losses
        What could not be read, and where, in sentences.
    """

    division: Division
    tracks: tuple[Track, ...]
    tracks_apart: bool = False
    losses: tuple[str, ...] = ()

    def tempos(self, track: Track) -> tuple[TempoChange, ...]:
        """Give the tempos that hold for a track: those of the whole file, unless tracks are apart."""
        changes = [change for one in self._sharing(track) for change in one.tempos]
        return tuple(sorted(changes, key=lambda change: change[0]))

    def tempo_map(self, track: Track) -> TempoMap:
        """Give what turns the ticks of a track into seconds."""
        return TempoMap(self.division, self.tempos(track))

    def signatures(self, track: Track) -> tuple[TimeSignature, ...]:
        """Give the time signatures that hold for a track, by tick."""
        found = [signature for one in self._sharing(track) for signature in one.signatures]
        return tuple(sorted(found, key=lambda signature: signature.tick))

    def _sharing(self, track: Track) -> tuple[Track, ...]:
        return (track,) if self.tracks_apart else self.tracks


def read_midi_file(data: bytes, where: str = "MIDI file") -> MidiFile:
    """Read a Standard MIDI File, damaged or not.

    Parameters
    ----------
    data
        The whole file, at most `MAX_FILE_BYTES`.
    where
        What the file is called in messages.

    Raises
    ------
    MusicFileError
        The file is too large, or nothing in it says that it is a MIDI file.

    Examples
    --------
    One track with one A4 of a quarter note:

    >>> notes = bytes.fromhex("00 90 45 40  60 80 45 40  00 FF 2F 00")
    >>> header = bytes.fromhex("4D 54 68 64 00 00 00 06 00 00 00 01 00 60 4D 54 72 6B 00 00 00 0C")
    >>> read = read_midi_file(header + notes)
    >>> [(tick, message.hex(" ")) for tick, message in read.tracks[0].events]
    [(0, '90 45 40'), (96, '80 45 40')]
    """
    if len(data) > MAX_FILE_BYTES:
        raise MusicFileError(
            f"{where}: {len(data)} bytes found, at most {MAX_FILE_BYTES} can be read; "
            "save the melody alone as a MIDI file"
        )
    return _Reader(data).read(where)


class _Reader:
    """Walks over the chunks of a file."""

    def __init__(self, data: bytes) -> None:
        self._data = data
        self._losses: list[str] = []
        self._tracks: list[Track] = []
        self._budget = MAX_EVENTS

    def read(self, where: str) -> MidiFile:
        start, file_format, n_said, division = self._header(where)
        self._chunks(start)
        if len(self._tracks) < n_said:
            said = "1 track" if n_said == 1 else f"{n_said} tracks"
            self._losses.append(f"the file says that it holds {said}, and {len(self._tracks)} were found")
        return MidiFile(
            division,
            tuple(self._tracks),
            tracks_apart=file_format == _FORMAT_APART,
            losses=_told(self._losses),
        )

    def _header(self, where: str) -> tuple[int, int, int, Division]:
        """Give where the chunks begin, the format, how many tracks are announced, and the division."""
        data = self._data
        at = data.find(_HEADER, 0, SEARCHED_BYTES)
        if at < 0:
            track = data.find(_TRACK, 0, SEARCHED_BYTES)
            if track < 0:
                raise MusicFileError(
                    f"{where}: no MIDI file header found; expected a Standard MIDI File (.mid); "
                    "save it anew as one"
                )
            self._losses.append("the file header is missing")
            return track, 1, 0, self._division(0)
        fields = data[at + 8 : at + 14]
        if len(fields) < 6:
            self._losses.append(f"the file ends in its header, at byte {len(data)}")
        file_format, n_said, word = (int.from_bytes(fields[place : place + 2]) for place in (0, 2, 4))
        if file_format > _FORMAT_APART:
            self._losses.append(
                f"the file is of format {file_format}, which MIDI does not define; it was read as format 1"
            )
        start = at + 8 + max(int.from_bytes(data[at + 4 : at + 8]), 6)
        if not self._is_chunk(start):
            start = at + 14
        return start, file_format, n_said, self._division(word)

    def _division(self, word: int) -> Division:
        division = Division.of_word(word)
        if division is None:
            self._losses.append(
                f"the file does not say how it counts time (division {word:04X}); "
                f"{USUAL_DIVISION} ticks a quarter note were assumed"
            )
            division = Division.of_word(USUAL_DIVISION)
        assert division is not None
        return division

    def _chunks(self, at: int) -> None:
        """Read every track from here on; pass over other chunks, and over what is no chunk."""
        data = self._data
        for _ in range(MAX_CHUNKS):
            if data.startswith(_TRACK, at):
                at = self._track(at + 8)
                continue
            end = at + 8 + int.from_bytes(data[at + 4 : at + 8])
            if self._is_chunk(at) and end <= len(data):  # some other kind of chunk
                at = end
                continue
            track = data.find(_TRACK, at)
            if track < 0:
                return
            self._losses.append(f"{track - at} bytes from byte {at} of the file on belong to no track")
            at = track
        if at < len(data):
            self._losses.append(f"what comes after the first {MAX_CHUNKS} tracks was left out")

    def _is_chunk(self, at: int) -> bool:
        """Say whether a chunk may begin here: its kind is four letters."""
        kind = self._data[at : at + 4]
        return len(kind) == 4 and all(32 <= sign < 127 for sign in kind)

    def _track(self, start: int) -> int:
        """Read the track whose data begin here; give where the next chunk may begin.

        A length that leads to no other chunk is not believed: the track then ends with its
        end-of-track event, or where the next track begins.
        """
        data = self._data
        end = start + int.from_bytes(data[start - 4 : start])
        believed = end == len(data) or (end < len(data) and self._is_chunk(end))
        if not believed:
            following = data.find(_TRACK, start)
            end = following if following >= 0 else len(data)
        number = len(self._tracks) + 1
        reading = TrackReading(data, number, end, self._budget)
        at = start
        try:
            at = reading.read(at)
            while believed and at < end and not data.startswith(_TRACK, at) and any(data[at:end]):
                at = reading.read(at)  # music after the end-of-track event
            if believed and not data.startswith(_TRACK, at):
                at = end
            if not reading.has_ended and not believed:
                raise StoppedError(at, "its end is missing")  # noqa: TRY301 - told like any other stop
        except StoppedError as stop:
            self._losses.append(f"track {number} stopped at byte {stop.at} of the file: {stop.reason}")
            at = end
        self._budget = reading.budget
        self._losses += reading.losses()
        self._tracks.append(reading.track())
        return at


def _told(losses: list[str]) -> tuple[str, ...]:
    """Give the first losses, and how many more there are."""
    if len(losses) <= TOLD_LOSSES:
        return tuple(losses)
    return (*losses[:TOLD_LOSSES], f"and {len(losses) - TOLD_LOSSES} more of this kind")
