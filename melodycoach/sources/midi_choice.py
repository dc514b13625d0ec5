"""Which notes of a MIDI file are the melody.

The notes of a file fall into parts, and one part is the melody. A part is a track, or one channel of
a track that uses several, as files of a single track do. Channels belong together where the file
says so (MPE: every note has a channel of its own, so that it can be bent alone), or where they hand
one line to each other: hardly ever does one sound together with another, or each note goes to
another channel with a bend of its own. Channel 10 is no part: it carries drums.

The melody is the part with the most of four points, each from 0 to 1:

- *many notes*: 1 from half as many notes as the fullest part has;
- *alone*: the share of its time in which it sounds just one note;
- *high*: where its middle note stands among the parts, 0 for the lowest;
- *name*: 1 if the track is called melody, voice, ney or the like.

References
----------
MPE (RP-053): the configuration message, registered parameter 6 on channel 1 or 16.
"""

from __future__ import annotations

from bisect import bisect_left, bisect_right
from collections import Counter
from dataclasses import dataclass
from itertools import pairwise
from statistics import median
from typing import TYPE_CHECKING, TypeAlias

from melodycoach.core.pitch import fold_name
from melodycoach.errors import MusicFileError, shorten
from melodycoach.sources.midi_match import is_strike, key_of, matched
from melodycoach.sources.midi_pitch import DRUM_CHANNEL, PitchTracker

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from melodycoach.sources.midi_file import MidiFile
    from melodycoach.sources.midi_track import Track

MELODY_NAMES = (
    *("melody", "melodi", "ezgi", "voice", "vocal", "vokal", "vox", "lead", "solo", "singer", "ses"),
    *("ney", "nay", "violin", "keman", "kemence", "klarnet", "clarinet", "flute", "tanbur", "tambur", "ud"),
)
"""Words, as `fold_name` gives them, that a track of a melody is likely to be called by."""

FULL_SHARE = 0.5
"""A part with so much of the notes of the fullest one has all the points for many notes."""

SHARED_TIME = 0.25
"""Channels of one line sound together with another for no more than so much of their time."""

OWN_CHANNEL_SHARE = 0.9
"""Of the notes of a line that has a channel for each note, so many leave the channel of the last."""

TOLD_TRACKS = 12
"""So many tracks are listed in a message."""

_MANAGER_CONTROLS, _ZONE_CONTROLS = (0xB0, 0xBF), (6, 98, 99, 100, 101)

Strike: TypeAlias = tuple[int, int, int, bool]
"""A tick, a channel from 0, a key, and whether it goes down."""


@dataclass(frozen=True, slots=True)
class Part:
    """A melody that might be meant.

    Parameters
    ----------
    track
        Where it stands.
    channels
        The channels of its notes, from 0.
    zone
        The channels that bear on it: its own, and those of its MPE zone.
    n_notes, alone, middle
        How many notes it has; the share of its time in which one key is down; its middle key.
    """

    track: Track
    channels: frozenset[int]
    zone: frozenset[int]
    n_notes: int
    alone: float
    middle: float

    @property
    def is_called_melody(self) -> bool:
        """Say whether the name of its track speaks of a melody."""
        words = f"{self.track.name} {self.track.instrument}".replace("_", " ").replace("-", " ").split()
        return any(fold_name(word).rstrip("0123456789") in MELODY_NAMES for word in words)

    def label(self) -> str:
        """Name it, for people."""
        return f"{track_label(self.track)} ({channels_label(self.channels)}, {n_of(self.n_notes, 'note')})"


@dataclass(frozen=True, slots=True)
class Choice:
    """The part that was taken, why, and the parts that were not."""

    part: Part
    reason: str
    others: tuple[Part, ...]


def choose_part(midi: MidiFile, where: str, track: str = "", channel: int | None = None) -> Choice:
    """Choose the melody, among the tracks and channels that are asked for.

    Parameters
    ----------
    midi
        The file.
    where
        What it is called in messages.
    track
        A number from 1, or a part of a name in any spelling; empty: any track.
    channel
        From 1 to 16, or None: any but drums.

    Raises
    ------
    MusicFileError
        The file holds no notes or only drums, or the track or channel asked for does.
    """
    counts = {one.number: _note_counts(one) for one in midi.tracks}
    zones = _zones(midi)
    if not any(counts.values()):
        raise MusicFileError(f"{where}: no notes found in {n_of(len(midi.tracks), 'track')}" + _lost(midi))
    tracks = _asked_tracks(midi, where, track, counts)
    parts = [part for one in tracks for part in _parts(one, zones, channel)]
    if not parts:
        raise MusicFileError(f"{where}: {_nothing(tracks, channel, counts)}; {_listing(midi, counts)}")
    known = parts if len(tracks) == len(midi.tracks) and channel is None else _all_parts(midi, zones)
    best = max(parts, key=lambda part: sum(_points(part, parts)))
    others = tuple(
        part for part in known if part.track is not best.track or not part.channels & best.channels
    )
    asked = bool(track) or channel is not None
    return Choice(best, _reason(best, parts, asked=asked), others)


def count_drum_notes(midi: MidiFile, part: Part) -> int:
    """Count the notes of the drum channel that are left out."""
    if DRUM_CHANNEL in part.zone:
        return 0
    return sum(_note_counts(one)[DRUM_CHANNEL] for one in midi.tracks)


def n_of(count: int, noun: str) -> str:
    """Give a number of things: ``1 note``, ``2 notes``."""
    return f"{count} {noun}" if count == 1 else f"{count} {noun}s"


def track_label(track: Track) -> str:
    """Name a track by its number and its name."""
    name = track.name or track.instrument
    return f"track {track.number} {shorten(name)!r}" if name else f"track {track.number}"


def channels_label(channels: Iterable[int]) -> str:
    """Name channels as people count them, from 1."""
    numbers = sorted(channel + 1 for channel in channels)
    if len(numbers) == 1:
        return f"channel {numbers[0]}"
    return f"channels {', '.join(map(str, numbers[:-1]))} and {numbers[-1]}"


def _all_parts(midi: MidiFile, zones: Sequence[frozenset[int]]) -> list[Part]:
    return [part for one in midi.tracks for part in _parts(one, zones, None)]


def _note_counts(track: Track) -> Counter[int]:
    """Count the notes of each channel, from 0."""
    return Counter(message[0] & 0x0F for _, message in track.events if is_strike(message))


def _asked_tracks(
    midi: MidiFile, where: str, track: str, counts: dict[int, Counter[int]]
) -> tuple[Track, ...]:
    """Give the tracks that the player asks for, by number or by name."""
    if not track:
        return midi.tracks
    if track.strip().isdecimal():
        found = tuple(one for one in midi.tracks if one.number == int(track.strip()[:9]))
    else:
        wanted = fold_name(track) or track
        found = tuple(one for one in midi.tracks if wanted in fold_name(f"{one.name} {one.instrument}"))
    if not found:
        raise MusicFileError(
            f"{where}: no track {shorten(track)!r} found; choose another: {_listing(midi, counts)}"
        )
    return found


def _nothing(tracks: tuple[Track, ...], channel: int | None, counts: dict[int, Counter[int]]) -> str:
    """Say why there is nothing to take."""
    place = track_label(tracks[0]) if len(tracks) == 1 else n_of(len(tracks), "track")
    if channel is not None:
        return f"no notes on channel {channel} found in {place}"
    n_drums = sum(counts[one.number][DRUM_CHANNEL] for one in tracks)
    if n_drums:
        drums = n_of(n_drums, "drum note")
        return f"only {drums} (channel 10) found in {place}; --channel 10 takes them for pitches"
    return f"no notes found in {place}"


def _listing(midi: MidiFile, counts: dict[int, Counter[int]]) -> str:
    """List the tracks with what they hold."""
    holding = []
    for one in midi.tracks[:TOLD_TRACKS]:
        count = counts[one.number]
        on = f" on {channels_label(count)}" if count else ""
        holding.append(f"{track_label(one)}: {n_of(count.total(), 'note')}{on}")
    more = "; …" if len(midi.tracks) > TOLD_TRACKS else ""
    return f"the file holds {'; '.join(holding)}{more}"


def _lost(midi: MidiFile) -> str:
    """Say what is damaged, where nothing could be read."""
    if midi.losses:
        return f"; {midi.losses[0]}; save it anew as a MIDI file"
    return ", expected a melody; save it anew with its notes"


def _parts(track: Track, zones: Sequence[frozenset[int]], channel: int | None) -> list[Part]:
    """Give the parts of a track; with a channel, the notes on that one."""
    strikes = [
        (tick, message[0] & 0x0F, message[1], is_strike(message))
        for tick, message in matched(track.events)
        if key_of(message) is not None
    ]
    used = {strike[1] for strike in strikes if strike[3]}
    if channel is not None:
        groups = [used & {channel - 1}]
    else:
        in_zones = [used & zone for zone in zones]
        left = used.difference(*in_zones, {DRUM_CHANNEL})
        groups = [*in_zones, *_groups(left, strikes, track)]
    return [_part(track, frozenset(group), zones, strikes) for group in groups if group]


def _part(
    track: Track, channels: frozenset[int], zones: Sequence[frozenset[int]], strikes: Sequence[Strike]
) -> Part:
    own = [strike for strike in strikes if strike[1] in channels]
    keys = [key for _, _, key, is_on in own if is_on]
    zone = channels.union(*(zone for zone in zones if zone & channels))
    return Part(track, channels, zone, len(keys), _alone(own), median(keys))


def _groups(channels: set[int], strikes: Sequence[Strike], track: Track) -> list[set[int]]:
    """Keep the channels together if they share one line, else take them one by one."""
    own = [strike for strike in strikes if strike[1] in channels]
    together = len(channels) > 1 and (_hand_over(own) or _has_own_channels(own, track))
    return [channels] if together else [{channel} for channel in sorted(channels)]


def _alone(strikes: Sequence[Strike]) -> float:
    """Give the share of the sounding time in which one key is down; 1 if none sounds for any time."""
    held: set[tuple[int, int]] = set()
    sounding = single = before = 0
    for tick, channel, key, is_on in strikes:
        if held:
            sounding += tick - before
            single += tick - before if len(held) == 1 else 0
        before = tick
        (held.add if is_on else held.discard)((channel, key))
    return single / sounding if sounding else 1.0


def _hand_over(strikes: Sequence[Strike]) -> bool:
    """Say whether hardly any channel sounds together with another."""
    held: set[tuple[int, int]] = set()
    sounding, shared = Counter[int](), Counter[int]()
    before = 0
    for tick, channel, key, is_on in strikes:
        busy = {one for one, _ in held} if tick > before else ()
        for one in busy:
            sounding[one] += tick - before
            shared[one] += tick - before if len(busy) > 1 else 0
        before = tick
        (held.add if is_on else held.discard)((channel, key))
    return all(shared[one] <= SHARED_TIME * sounding[one] for one in sounding)


def _has_own_channels(strikes: Sequence[Strike], track: Track) -> bool:
    """Say whether each note goes to another channel than the last, one after the other, all bent."""
    ons = [(tick, channel) for tick, channel, _, is_on in strikes if is_on]
    bent = {message[0] & 0x0F for _, message in track.events if message[0] & 0xF0 == 0xE0}
    leaving = sum(one[0] != other[0] and one[1] != other[1] for one, other in pairwise(ons))
    return {channel for _, channel in ons} <= bent and leaving >= OWN_CHANNEL_SHARE * (len(ons) - 1)


def _zones(midi: MidiFile) -> tuple[frozenset[int], ...]:
    """Give the last MPE zones that the file sets up, each with the channel that manages it."""
    tracker = PitchTracker()
    zones = tracker.zones
    for track in midi.tracks:
        for _, message in track.events:
            if message[0] in _MANAGER_CONTROLS and message[1] in _ZONE_CONTROLS:
                tracker.decode(message, 0.0)
                zones = tracker.zones or zones
    return tuple(frozenset(zone.channels) for zone in zones)


def _points(part: Part, parts: Sequence[Part]) -> tuple[float, float, float, float]:
    """Give the four points that the module describes."""
    fullest = max(one.n_notes for one in parts)
    middles = sorted(one.middle for one in parts)
    below, upto = bisect_left(middles, part.middle), bisect_right(middles, part.middle)
    rank = (below + upto - 1) / 2
    return (
        min(part.n_notes / (FULL_SHARE * fullest), 1.0),
        part.alone,
        rank / (len(parts) - 1) if len(parts) > 1 else 1.0,
        float(part.is_called_melody),
    )


def _reason(best: Part, parts: Sequence[Part], *, asked: bool) -> str:
    """Say in words what spoke for the part that was taken."""
    if len(parts) == 1:
        return "as you asked" if asked else "the only one with notes that are no drums"
    many, alone, high, name = _points(best, parts)
    always = "it always" if alone == 1 else f"{alone:.0%} of its time it"
    reasons = [f"{always} sounds one note at a time"]
    if high >= 1:
        reasons.append("it is the highest")
    elif high > 0:
        reasons.append("it is not the lowest")
    if many >= 1:
        reasons.append("it has many notes")
    if name:
        reasons.append("its name speaks of a melody")
    return ", ".join(reasons)
