"""MIDI messages become events: one pitch tracker for live ports and for files.

A tracker follows one stream of whole messages and remembers, for each of the sixteen channels,
the bend and its range, the tuning, and which keys sound. It reads no clock and knows no port:
bytes and a time go in, events come out, and whatever it cannot read is counted and skipped.

What a channel makes of a key is in `midi_channel`, what tuning messages say in `midi_tuning`, and
which channels form an MPE zone in `midi_mpe`.

References
----------
MIDI 1.0 detailed specification: channel voice messages, registered parameters, channel mode messages.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from melodycoach.core.event import NoteOff, NoteOn, PitchMoved
from melodycoach.sources.midi_channel import (
    BEND_RANGE,
    DATA_COARSE,
    DATA_DOWN,
    DATA_FINE,
    DATA_UP,
    DEFAULT_RANGE_CENTS,
    FORMS,
    MPE_ZONE,
    NO_PARAMETER,
    TUNING_BANK,
    TUNING_PROGRAM,
    Channel,
    Master,
    Sounding,
)
from melodycoach.sources.midi_mpe import CHANNELS, MANAGERS, MOST_MEMBERS, MpeZone, ZoneMap, set_up_zone
from melodycoach.sources.midi_tuning import (
    ALL_CHANNELS,
    CENTRE,
    KEYS,
    NOTHING_STATED,
    MasterCoarse,
    MasterFine,
    Other,
    StatedTuning,
    TunedKeys,
    TunedOctave,
    TuningTables,
    read_tuning,
)

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping, Sequence

    from melodycoach.core.event import Event

__all__ = [
    "CHANNELS",
    "DEFAULT_RANGE_CENTS",
    "DRUM_CHANNEL",
    "VOICES_PER_PORT",
    "ChannelTuning",
    "MpeZone",
    "PitchTracker",
]

VOICES_PER_PORT = CHANNELS * KEYS
DRUM_CHANNEL = 9
"""Channel 10 for people: by common practice it carries drums, whose keys are no pitches."""

_NOTE_OFF, _NOTE_ON, _CONTROL, _BEND = 0x80, 0x90, 0xB0, 0xE0
_LENGTH_BY_STATUS = {0x80: 3, 0x90: 3, 0xA0: 3, 0xB0: 3, 0xC0: 2, 0xD0: 2, 0xE0: 3}
_SYSEX, _SYSTEM_RESET = 0xF0, 0xFF

_DATA_ENTRY = frozenset({DATA_COARSE, DATA_FINE, DATA_UP, DATA_DOWN})
_NRPN_FINE, _NRPN_COARSE, _RPN_FINE, _RPN_COARSE = 98, 99, 100, 101
_RESET_CONTROLLERS = 121
_END_NOTES = frozenset({120, 123, 124, 125, 126, 127})  # the last four change the mode, and end notes too


@dataclass(frozen=True, slots=True)
class ChannelTuning:
    """What is believed of one channel, for people.

    ``channel`` counts from 1. ``range_sent`` says whether the keyboard sent its bend range or the
    usual two semitones are assumed. ``tuning_cents`` is fine and coarse tuning. ``key_cents`` says
    how far the keys are off their places, by a tuning message or by the player; empty: by neither.
    """

    channel: int
    bend_cents: float
    range_cents: int
    range_sent: bool
    tuning_cents: float
    key_cents: Mapping[int, float] = field(default_factory=dict)


class PitchTracker:
    """Follows one stream of MIDI messages and says what sounds.

    The rules, beside those of the MIDI standard:

    - A key whose bend and fine tuning come to less than one cent gives a `KEYS` note on a multiple
      of 100 cents: it stands for every pitch near it. Any other gives a `TUNED` note.
    - A single bend message between two note-ons tunes the second one (a wheel that a hand moves sends
      many); in an MPE zone any bend at a note-on does. From then on every key of that channel, or of
      that zone, is `TUNED`, unbent ones too.
    - A tuning message that takes any key of a channel off its place makes every key of the channel
      `TUNED`; one that puts them all back makes them plain again. Coarse tuning leaves plain keys plain.
    - A master tuning that keeps A4 between 435 and 445 Hz is a concert pitch: it moves no note.
    - A bend or a tuning that changes while keys sound moves them, each with one `PitchMoved`;
      tuning messages of the non-real-time kind wait for the next note.
    - A key struck again before it was released ends and begins anew.
    - Channel 10 is taken for drums and left out unless it belongs to a zone, and so are the notes of
      any channel in ``ignored_channels``; `n_ignored_notes` counts them, so that the player can be told.
    - What is no whole, valid message is skipped and counted in `n_skipped`.

    An instance changes as it reads; it belongs to one thread.

    Parameters
    ----------
    port_number
        Keeps the voices of several inputs apart: voice = port_number * 2048 + channel * 128 + key,
        with channel counted from 0.
    ignored_channels
        Channels counted from 0.
    zones
        MPE zones of a surface that does not announce them itself; what it does announce goes first.
    stated
        What the player says of the keys. Every channel begins with it, after a reset too; a tuning
        message on a key goes first.

    Raises
    ------
    ValueError
        Two zones share a channel.

    Examples
    --------
    >>> tracker = PitchTracker()
    >>> tracker.decode(bytes.fromhex("E0 61 38"), 0.0)
    ()
    >>> [note] = tracker.decode(bytes.fromhex("90 40 40"), 0.5)
    >>> round(note.pitch_cents, 3), str(note.kind)
    (6377.368, 'tuned')
    >>> tracker.decode(bytes.fromhex("90 40 00"), 0.75)
    (NoteOff(at_s=0.75, voice=64),)
    """

    def __init__(
        self,
        port_number: int = 0,
        ignored_channels: frozenset[int] = frozenset({DRUM_CHANNEL}),
        zones: tuple[MpeZone, ...] = (),
        stated: StatedTuning = NOTHING_STATED,
    ) -> None:
        taken = [channel for zone in zones for channel in zone.channels]
        if len(taken) != len(set(taken)):
            raise ValueError(f"zones {zones!r} share a channel")
        self.port_number = port_number
        self.ignored_channels = ignored_channels
        self.n_skipped = 0
        self.n_ignored_notes = 0
        self._stated, self._stated_table = stated, stated.table()
        self._first_zones = self._zones = ZoneMap(zones)
        self._begin([{} for _ in ALL_CHANNELS])

    def decode(self, message: Sequence[int], at_s: float) -> tuple[Event, ...]:
        """Read one whole message.

        Parameters
        ----------
        message
            Status byte and data bytes; a system exclusive message from F0 to F7. Anything is
            accepted; what is damaged is skipped.
        at_s
            When it arrived, in seconds from the start of the session.
        """
        if not message:
            self.n_skipped += 1
            return ()
        status = message[0]
        if status >= _SYSEX:
            return self._system(message, at_s)
        kind, number = status & 0xF0, status & 0x0F
        if len(message) != _LENGTH_BY_STATUS.get(kind, 0) or any(not 0 <= b < 128 for b in message[1:]):
            self.n_skipped += 1
            return ()
        channel = self._channels[number]
        if kind == _NOTE_ON and message[2] > 0:
            return self._note_on(number, channel, message[1], at_s)
        if kind in (_NOTE_ON, _NOTE_OFF):
            return self._note_off(number, channel, message[1], at_s)
        if kind == _CONTROL:
            return self._control(number, channel, message[1], message[2], at_s)
        if kind == _BEND:
            channel.bend = message[1] + 128 * message[2] - CENTRE
            channel.n_bends += 1
            return self._moved(self._zones.reach[number], at_s)
        return ()  # pressure and programs say nothing of pitch

    def silence(self, at_s: float) -> tuple[NoteOff, ...]:
        """End everything that sounds: the port is gone, or the player stops."""
        return self._all_off(ALL_CHANNELS, at_s)

    def start_over(self, at_s: float) -> tuple[NoteOff, ...]:
        """End everything that sounds and forget bends, ranges and tunings: a port was replugged."""
        ended = self.silence(at_s)
        self._zones = self._first_zones
        self._begin([{} for _ in ALL_CHANNELS])
        return ended

    @property
    def sounding(self) -> tuple[int, ...]:
        """The voices that sound now, ascending."""
        return tuple(
            self._voice(number, key)
            for number, channel in enumerate(self._channels)
            for key in sorted(channel.sounding)
        )

    @property
    def zones(self) -> tuple[MpeZone, ...]:
        """The MPE zones now in force."""
        return self._zones.zones

    @property
    def stated_cents(self) -> Mapping[int, float]:
        """How far the player says that keys are off their places; empty: every key is in its place."""
        return self._stated_table

    @property
    def concert_cents(self) -> float:
        """How far the concert pitch that was sent is from A4 = 440 Hz, in cents; no note is moved by it."""
        return self._master.concert_cents

    def tunings(self) -> tuple[ChannelTuning, ...]:
        """Say what is believed of each channel that is not plain: bent, retuned, or with a sent range."""
        return tuple(
            ChannelTuning(
                channel=number + 1,
                bend_cents=channel.bend_cents(),
                range_cents=channel.values[BEND_RANGE],
                range_sent=channel.range_sent,
                tuning_cents=channel.tuning_cents(),
                key_cents=self._tables.table(number),
            )
            for number, channel in enumerate(self._channels)
            if channel.bend or channel.range_sent or channel.tuning_cents() or self._tables.table(number)
        )

    def _begin(self, sounding: Sequence[dict[int, Sounding]]) -> None:
        """Forget every bend, range and tuning; the zones stay."""
        self._master = Master(stated_semitones=self._stated.semitones)
        self._tables = TuningTables(self._stated_table)
        self._channels = [Channel(self._master, keys) for keys in sounding]
        self._take_roles(ALL_CHANNELS)

    def _voice(self, number: int, key: int) -> int:
        return self.port_number * VOICES_PER_PORT + number * KEYS + key

    def _note_on(self, number: int, channel: Channel, key: int, at_s: float) -> tuple[Event, ...]:
        if number in self._left_out:
            self.n_ignored_notes += 1
            return ()
        ended = self._note_off(number, channel, key, at_s)
        if not channel.is_tuned and channel.shows_tuning():
            for alike in self._zones.alike[number]:
                self._channels[alike].is_tuned = True
        channel.n_bends = 0
        key_cents = self._tables.key_cents(number, key)
        cents, kind = channel.sound(key, key_cents)
        channel.sounding[key] = Sounding(key_cents, cents)
        return (*ended, NoteOn(at_s, self._voice(number, key), cents, kind))

    def _note_off(self, number: int, channel: Channel, key: int, at_s: float) -> tuple[Event, ...]:
        if channel.sounding.pop(key, None) is None:
            return ()
        return (NoteOff(at_s, self._voice(number, key)),)

    def _all_off(self, numbers: Iterable[int], at_s: float) -> tuple[NoteOff, ...]:
        ended: list[NoteOff] = []
        for number in numbers:
            keys = self._channels[number].sounding
            ended += (NoteOff(at_s, self._voice(number, key)) for key in sorted(keys))
            keys.clear()
        return tuple(ended)

    def _moved(self, numbers: Iterable[int], at_s: float) -> tuple[Event, ...]:
        """Say which of the keys that sound are no longer where they were."""
        moved: list[Event] = []
        for number in numbers:
            channel = self._channels[number]
            for key, note in channel.sounding.items():
                cents, kind = channel.sound(key, note.key_cents)
                if cents != note.pitch_cents:
                    note.pitch_cents = cents
                    moved.append(PitchMoved(at_s, self._voice(number, key), cents, kind))
        return tuple(moved)

    def _retuned(self, numbers: Iterable[int], at_s: float) -> tuple[Event, ...]:
        """Take what sounds to where the tables say now."""
        for number in numbers:
            for key, note in self._channels[number].sounding.items():
                note.key_cents = self._tables.key_cents(number, key)
        return self._moved(numbers, at_s)

    def _control(
        self, number: int, channel: Channel, control: int, value: int, at_s: float
    ) -> tuple[Event, ...]:
        if control in _DATA_ENTRY:
            return self._enter_data(number, channel, control, value, at_s)
        if control == _RPN_COARSE:
            channel.parameter = (value, channel.parameter[1])
        elif control == _RPN_FINE:
            channel.parameter = (channel.parameter[0], value)
        elif control in (_NRPN_COARSE, _NRPN_FINE):
            channel.parameter = NO_PARAMETER
        elif control == _RESET_CONTROLLERS:  # the bend range stays
            for reached in self._zones.reach[number]:
                self._channels[reached].parameter = NO_PARAMETER
                self._channels[reached].recentre()
            return self._moved(self._zones.reach[number], at_s)
        elif control in _END_NOTES:
            return self._all_off(self._zones.reach[number], at_s)
        return ()

    def _enter_data(
        self, number: int, channel: Channel, control: int, value: int, at_s: float
    ) -> tuple[Event, ...]:
        """Set the selected registered parameter; a bend range is that of all members of a zone."""
        page, name = channel.parameter
        if page == 0 and name == MPE_ZONE and control == DATA_COARSE:
            return self._set_up_zone(number, value, at_s)
        if page != 0 or name not in FORMS:
            return ()
        entered = FORMS[name].entered(channel.values[name], control, value)
        if name == BEND_RANGE:
            for alike in self._zones.alike[number]:
                self._channels[alike].values[BEND_RANGE] = entered
                self._channels[alike].range_sent = True
            return self._moved(self._zones.alike[number], at_s)
        channel.values[name] = entered
        if name == TUNING_PROGRAM:  # a bank that was chosen waits for it
            self._tables.choose(number, channel.values[TUNING_BANK], entered)
            return self._retuned((number,), at_s)
        return self._moved((number,), at_s)

    def _set_up_zone(self, number: int, n_members: int, at_s: float) -> tuple[Event, ...]:
        """Follow an MPE configuration message: its zone, and channels that change hands, begin anew."""
        if number not in MANAGERS:
            return ()  # by the standard it says nothing there
        if n_members > MOST_MEMBERS:
            self.n_skipped += 1
            return ()
        before = self._zones
        self._zones = ZoneMap(set_up_zone(before.zones, number, n_members))
        anew = self._zones.begin_anew(before, number)
        ended = self._all_off(anew, at_s)
        self._take_roles(anew)
        return ended

    def _take_roles(self, numbers: Iterable[int]) -> None:
        """Give channels the bend and the range that they begin with in their zone, or in none."""
        zone_by_member = self._zones.zone_by_member
        for number in numbers:
            channel, zone = self._channels[number], zone_by_member.get(number)
            channel.recentre()
            channel.range_sent = number in self._zones.sent
            channel.manager = None if zone is None else self._channels[zone.manager]
            channel.values[BEND_RANGE] = DEFAULT_RANGE_CENTS if zone is None else zone.member_range_cents
        self._left_out = self.ignored_channels - ({DRUM_CHANNEL} & zone_by_member.keys())

    def _system(self, message: Sequence[int], at_s: float) -> tuple[Event, ...]:
        """Read what belongs to no channel: tuning messages, and resets."""
        if message[0] == _SYSTEM_RESET and len(message) == 1:
            return self.start_over(at_s)
        if message[0] != _SYSEX:
            return ()
        match read_tuning(message):
            case TunedKeys() as told:
                channels = self._tables.tune_keys(told)
                return self._retuned(channels, at_s) if told.at_once else ()
            case TunedOctave() as told:
                channels = self._tables.tune_octave(told)
                return self._retuned(channels, at_s) if told.at_once else ()
            case MasterFine(cents):
                self._master.fine_cents = cents
                return self._moved(ALL_CHANNELS, at_s)
            case MasterCoarse(semitones):
                self._master.semitones = semitones
                return self._moved(ALL_CHANNELS, at_s)
            case Other.RESET:
                self._begin([channel.sounding for channel in self._channels])
                return self._retuned(ALL_CHANNELS, at_s)
            case told:
                self.n_skipped += told is Other.DAMAGED
                return ()
