"""A MIDI file as a sheet: the melody of the file, and where its notes stand.

Which notes are the melody is told in `melodycoach.sources.midi_choice`. They go through the same
pitch tracker and the same rules for one line as a live session, with the messages that set up their
channels, wherever in the file these stand. A pedal does not prolong a note.
"""

from __future__ import annotations

from math import floor
from typing import TYPE_CHECKING

from melodycoach.core.melody import take_melody_indexed
from melodycoach.core.note import InputKind, Mark, Note
from melodycoach.core.pitch import COMMAS_53, KEY_CENTS, KEY_NAMES, fold_name
from melodycoach.core.sheet import Place, Sheet, SheetKind, beat_words
from melodycoach.errors import UsageError
from melodycoach.sources.midi_choice import Choice, choose_part, count_drum_notes, n_of
from melodycoach.sources.midi_file import read_midi_file
from melodycoach.sources.midi_match import is_strike, matched
from melodycoach.sources.midi_pitch import CHANNELS, DEFAULT_RANGE_CENTS, DRUM_CHANNEL, PitchTracker
from melodycoach.sources.midi_range import WIDE_RANGE, wide_range
from melodycoach.sources.midi_time import MICROSECONDS, BarMap
from melodycoach.sources.midi_tuning import KEYS, PLAIN_CENTS
from melodycoach.sources.midi_written import in_beats, is_written

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping, Sequence

    from melodycoach.core.event import Event
    from melodycoach.core.note import Item
    from melodycoach.core.pitch import ToneSystem
    from melodycoach.sources.midi_choice import Part
    from melodycoach.sources.midi_file import MidiFile
    from melodycoach.sources.midi_pitch import ChannelTuning
    from melodycoach.sources.midi_time import TempoMap
    from melodycoach.sources.midi_track import TimedMessage
    from melodycoach.sources.midi_written import Span, Written

_WORDS = (
    "piano grand acoustic electric bright guitar bass strings string ensemble section violin viola cello "
    "contrabass harp organ flute recorder oboe clarinet bassoon trumpet trombone horn tuba sax saxophone "
    "alto tenor soprano baritone voice voices vocal choir lead melody solo pad synth drum drums percussion "
    "keman kemence ney nay ud oud kanun qanun tanbur tambur klarnet baglama saz ses melodi flut piyano gitar "
    "track staff channel instrument part midi untitled new control conductor tempo sequence right left hand "
    "sag sol el kanal iz"
)
INSTRUMENT_NAMES = frozenset(_WORDS.split())
"""Words, as `fold_name` gives them, that name an instrument or nothing, but no piece."""

_WIDE_RANGE_MEANT = (
    "the file sends no bend range: in the usual ±2 semitones nobody would hear its bends, "
    f"in ±{WIDE_RANGE} all its pitches are written ones"
)

_SECONDS_A_MINUTE = 60
_SYSEX = 0xF0
_NOTE_KINDS, _TUNING_KINDS = (0x80, 0x90), (0xB0, 0xE0)


def read_midi(
    data: bytes, where: str, system: ToneSystem = COMMAS_53, track: str = "", channel: int | None = None
) -> Sheet:
    """Read the melody of a Standard MIDI File.

    Parameters
    ----------
    data
        The whole file.
    where
        What the file is called in messages.
    system
        The tone system of the pack: bent notes that all lie on its units are written pitches.
    track
        The track to take: its number from 1, or a part of its name in any spelling. Empty: the
        track that holds the melody, by the rule of `melodycoach.sources.midi_choice`.
    channel
        The channel to take, from 1 to 16. None: the channel, or the channels, that the melody has.

    Raises
    ------
    MusicFileError
        It is no MIDI file, or holds no melody, or not the track or channel that is asked for.
    UsageError
        There is no such channel.
    """
    if channel is not None and not 1 <= channel <= CHANNELS:
        raise UsageError(f"--channel: {channel} was found, expected a channel from 1 to {CHANNELS}")
    midi = read_midi_file(data, where)
    choice = choose_part(midi, where, track, channel)
    part = choice.part
    tracker = PitchTracker(ignored_channels=frozenset({DRUM_CHANNEL}) - part.channels)
    messages = _messages(midi, part)
    n_without_length = _n_strikes(messages)
    messages = matched(messages)
    n_without_length -= _n_strikes(messages)
    ranges = wide_range(messages, part.channels, system)
    messages = [*ranges, *messages]
    times = midi.tempo_map(part.track)
    events, ticks = _play(part, messages, tracker, times)
    line, events_of_notes = take_melody_indexed(events)
    spans = [(ticks[first], ticks[last]) for first, last in events_of_notes]
    signatures = midi.signatures(part.track)
    bars = None if midi.division.is_seconds else BarMap(int(midi.division.ticks), signatures)
    places = tuple(_place(bars, start, times.seconds(start)) for start, _ in spans)
    written = _written(line, spans, midi, system)
    tempo = _tempo(midi, part, spans[0][0]) if bars else None
    if written:
        line, tempo = written.items, None if tempo is None else tempo / written.beat
    return Sheet(
        kind=SheetKind.MIDI,
        items=_with_marks(line, places if signatures else ()),
        places=places,
        title=_title(midi, part),
        tempo=None if tempo is None else round(tempo, 3),
        says=(
            _says_choice(midi, choice),
            *_says_tuning(tracker, line, part),
            *((_WIDE_RANGE_MEANT,) if ranges else ()),
            *_says_lengths(bars, written),
            *_says_left_out(midi, choice, n_without_length),
            *_says_bars(bars, has_signature=bool(signatures)),
        ),
        lost=(*midi.losses, *_lost_messages(tracker)),
    )


def _play(
    part: Part, messages: Sequence[TimedMessage], tracker: PitchTracker, times: TempoMap
) -> tuple[list[Event], list[int]]:
    """Send the messages of a part through the tracker; give the events, and the tick of each."""
    events: list[Event] = []
    ticks: list[int] = []
    for tick, message in messages:
        happened = tracker.decode(message, times.seconds(tick))
        if happened:
            events += happened
            ticks += [tick] * len(happened)
    end = part.track.end_tick
    ended = tracker.silence(times.seconds(end))
    return [*events, *ended], [*ticks, *([end] * len(ended))]


def _written(
    line: Sequence[Item], spans: Sequence[Span], midi: MidiFile, system: ToneSystem
) -> Written | None:
    """Give the line in beats, if it was written."""
    ticks = int(midi.division.ticks)
    if midi.division.is_seconds or not is_written([start for start, _ in spans], ticks):
        return None
    return in_beats(line, spans, ticks, system)


def _tempo(midi: MidiFile, part: Part, tick: int) -> float | None:
    """Give the quarters a minute when the first note sounds, or None where the file does not say."""
    in_force = [tempo for at, tempo in midi.tempos(part.track) if at <= tick]
    return _SECONDS_A_MINUTE * MICROSECONDS / in_force[-1] if in_force else None


def _messages(midi: MidiFile, part: Part) -> list[TimedMessage]:
    """Give what concerns a part, by tick and then in the order of the file.

    From its own track: its notes, controls and bends, and every system exclusive message. From
    other tracks: system exclusive messages, and the controls and bends of channels on which that
    track has no notes of its own.
    """
    found: list[TimedMessage] = []
    for track in (part.track,) if midi.tracks_apart else midi.tracks:
        if track is part.track:
            notes, controls = part.channels, part.zone
        else:
            played = {message[0] & 0x0F for _, message in track.events if message[0] & 0xF0 == 0x90}
            notes, controls = frozenset(), part.zone - played
        wanted = {_SYSEX, *_statuses(_NOTE_KINDS, notes), *_statuses(_TUNING_KINDS, controls)}
        found += [event for event in track.events if event[1][0] in wanted]
    found.sort(key=lambda event: event[0])
    return found


def _n_strikes(messages: Iterable[TimedMessage]) -> int:
    return sum(is_strike(message) for _, message in messages)


def _statuses(kinds: Iterable[int], channels: Iterable[int]) -> set[int]:
    return {kind | channel for kind in kinds for channel in channels}


def _place(bars: BarMap | None, tick: int, at_s: float) -> Place:
    """Say where a note stands."""
    minutes, tenths = divmod(floor(at_s * 10 + 0.5), 10 * _SECONDS_A_MINUTE)
    at = f"{minutes}:{tenths // 10:02d}.{tenths % 10}"
    if bars is None:
        return Place(at=at)
    bar, beat = bars.place(tick)
    return Place(str(bar), beat, at)


def _with_marks(line: Sequence[Item], places: Sequence[Place]) -> tuple[Item, ...]:
    """Put bar lines before the notes that begin in another bar, if places are given, and end the line."""
    items: list[Item] = []
    n_notes, bar = 0, ""
    for item in line:
        if isinstance(item, Note) and places:
            if bar and places[n_notes].bar != bar:
                items.append(Mark.BAR)
            bar = places[n_notes].bar
            n_notes += 1
        items.append(item)
    while isinstance(items[-1], Mark):
        items.pop()
    return (*items, Mark.PHRASE_END)


def _title(midi: MidiFile, part: Part) -> str:
    """Give the name of the piece: that of the first track, if it is more than an instrument's."""
    first = part.track if midi.tracks_apart else midi.tracks[0]
    words = {fold_name(word).rstrip("0123456789") for word in first.name.replace("-", " ").split()}
    is_piece = not words - {""} <= INSTRUMENT_NAMES and first.name != first.instrument
    return first.name if is_piece else ""


def _says_choice(midi: MidiFile, choice: Choice) -> str:
    n_tracks = len(midi.tracks)
    taken = f"took {choice.part.label()} of {n_of(n_tracks, 'track')}: {choice.reason}"
    if not choice.others:
        return taken
    return f"{taken}; --track and --channel choose another, such as {choice.others[0].label()}"


def _says_tuning(tracker: PitchTracker, line: Sequence[Item], part: Part) -> tuple[str, ...]:
    """Say which tuning was believed."""
    concert = f"{tracker.concert_cents:+.0f} cents off A4 = 440 Hz"
    concerts = (f"the file asks for a concert pitch {concert}; the notes are read as they stand",)
    says = concerts if abs(tracker.concert_cents) >= PLAIN_CENTS else ()
    if all(note.kind is InputKind.KEYS for note in line if isinstance(note, Note)):
        plain = "plain keys: no bend or tuning moves a note, so each key stands for every pitch near it"
        return (plain, *says)
    tunings = [one for one in tracker.tunings() if one.channel - 1 in part.channels]
    says = (*(_says_keys(one.key_cents) for one in tunings[:1] if any(one.key_cents.values())), *says)
    fine = sorted({round(one.tuning_cents, 1) for one in tunings if one.tuning_cents})
    if fine:
        told = " and ".join(f"{cents:+g}" for cents in fine)
        says = (f"the channel is tuned by {told} cents as a whole", *says)
    return (_says_bends(tunings), *says)


def _says_keys(key_cents: Mapping[int, float]) -> str:
    """Say which keys a tuning message has moved."""
    moved = {key: round(cents, 1) for key, cents in key_cents.items() if abs(cents) >= PLAIN_CENTS}
    octave = {key % len(KEY_NAMES): cents for key, cents in sorted(moved.items())}
    if all(octave.get(key % len(KEY_NAMES)) == moved.get(key) for key in range(KEYS)):
        told = ", ".join(f"{KEY_NAMES[place]} {octave[place]:+g}" for place in sorted(octave))
        return f"tuning messages were read: {told} cents, in every octave"
    return f"tuning messages were read: they move {n_of(len(moved), 'key')} of {KEYS}"


def _says_bends(tunings: Sequence[ChannelTuning]) -> str:
    """Say how far a bend is taken to go."""
    ranges = {(one.range_cents, one.range_sent) for one in tunings} or {(DEFAULT_RANGE_CENTS, False)}
    told = [
        f"±{cents / KEY_CENTS:g} semitones" + ("" if sent else " (none was sent: MIDI's usual range)")
        for cents, sent in sorted(ranges)
    ]
    return f"pitch bends are read with a range of {' and '.join(told)}"


def _lost_messages(tracker: PitchTracker) -> tuple[str, ...]:
    """Say how many messages of the part make no sense."""
    if not tracker.n_skipped:
        return ()
    return (f"{n_of(tracker.n_skipped, 'damaged message')} among those that tune were passed over",)


def _says_lengths(bars: BarMap | None, written: Written | None) -> tuple[str, ...]:
    """Say how the lengths of the notes were taken, and their pitches with them."""
    if written:
        return (*written.says, f"its notes lie on the beats, as written: {beat_words(written.beat)}")
    return ("its notes lie off the beats, as played: lengths are taken in seconds",) if bars else ()


def _says_left_out(midi: MidiFile, choice: Choice, n_without_length: int) -> tuple[str, ...]:
    """Say which notes are not in the line."""
    says: list[str] = []
    if n_without_length:
        says.append(f"{n_of(n_without_length, 'note')} without length, as grace notes are, left out")
    n_drums = count_drum_notes(midi, choice.part)
    if n_drums:
        says.append(f"{n_of(n_drums, 'drum note')} on channel 10 left out")
    n_others = sum(part.n_notes for part in choice.others)
    if n_others:
        says.append(f"{n_of(n_others, 'note')} of {n_of(len(choice.others), 'other part')} left out")
    return tuple(says)


def _says_bars(bars: BarMap | None, *, has_signature: bool) -> tuple[str, ...]:
    if bars is None:
        return ("the file counts in film frames and not in beats, so its notes are placed by time alone",)
    if has_signature:
        return ()
    return ("the file gives no time signature; bars are counted in 4/4",)
