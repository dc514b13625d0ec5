"""MIDI messages become events: one pitch tracker for live ports and for files.

A tracker follows one stream of whole messages and remembers, for each of the sixteen channels,
the bend and its range, the channel tuning, and which keys sound. It reads no clock and knows no
port: bytes and a time go in, events come out, and whatever it cannot read is counted and skipped.

What a key sounds like, in cents on the MIDI scale::

    100 * (key + coarse tuning) + fine tuning + bend / 8192 * bend range

References
----------
MIDI 1.0 detailed specification: channel voice messages, registered parameters 0 (pitch bend
sensitivity), 1 (channel fine tuning), 2 (channel coarse tuning), channel mode messages.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from melodycoach.core.event import NoteOff, NoteOn, PitchMoved
from melodycoach.core.note import InputKind

if TYPE_CHECKING:
    from collections.abc import Sequence

    from melodycoach.core.event import Event

CHANNELS = 16
KEYS = 128
VOICES_PER_PORT = CHANNELS * KEYS
DRUM_CHANNEL = 9
"""Channel 10 for people: by common practice it carries drums, whose keys are no pitches."""

CENTRE = 8192
"""Middle of a 14-bit value: no bend, no fine tuning."""

COARSE_CENTRE = 64
DEFAULT_RANGE_CENTS = 200
"""What a bend spans until the keyboard says otherwise: two semitones (MIDI 1.0)."""

PLAIN_CENTS = 1.0
"""A key that is off by less than this is a plain key of twelve to the octave."""

_NOTE_OFF, _NOTE_ON, _CONTROL, _BEND = 0x80, 0x90, 0xB0, 0xE0
_LENGTH_BY_STATUS = {0x80: 3, 0x90: 3, 0xA0: 3, 0xB0: 3, 0xC0: 2, 0xD0: 2, 0xE0: 3}
_SYSEX, _SYSTEM_RESET = 0xF0, 0xFF

_DATA_COARSE, _DATA_FINE, _DATA_UP, _DATA_DOWN = 6, 38, 96, 97
_NRPN_FINE, _NRPN_COARSE, _RPN_FINE, _RPN_COARSE = 98, 99, 100, 101
_ALL_SOUND_OFF, _RESET_CONTROLLERS, _ALL_NOTES_OFF = 120, 121, 123
_NO_PARAMETER = (127, 127)
_BEND_RANGE, _FINE_TUNING, _COARSE_TUNING = (0, 0), (0, 1), (0, 2)


@dataclass(frozen=True, slots=True)
class ChannelTuning:
    """What is believed of one channel, for people.

    ``channel`` counts from 1. ``range_sent`` says whether the keyboard sent its bend range or the
    usual two semitones are assumed.
    """

    channel: int
    bend_cents: float
    range_cents: int
    range_sent: bool
    tuning_cents: float


@dataclass(slots=True)
class _Channel:
    """State of one channel; every value stays in the range that its comment gives."""

    bend: int = 0  # -8192 to 8191
    range_cents: int = DEFAULT_RANGE_CENTS  # 0 to 12799
    range_sent: bool = False
    fine: int = CENTRE  # 0 to 16383
    coarse: int = COARSE_CENTRE  # 0 to 127
    parameter: tuple[int, int] = _NO_PARAMETER  # coarse and fine byte of the selected RPN
    cents_by_key: dict[int, float] = field(default_factory=dict)  # the keys that sound
    n_bends: int = 0  # bend messages since the last note-on
    is_tuned: bool = False  # a single bend before a note has shown that bends tune, here

    def bend_cents(self) -> float:
        return self.bend * self.range_cents / CENTRE

    def fine_cents(self) -> float:
        return (self.fine - CENTRE) * 100 / CENTRE

    def offset_cents(self) -> float:
        return self.bend_cents() + self.fine_cents()

    def sound(self, key: int) -> tuple[float, InputKind]:
        """Say where a key sounds and how sure that is."""
        plain = 100.0 * (key + self.coarse - COARSE_CENTRE)
        offset = self.offset_cents()
        if abs(offset) < PLAIN_CENTS and not self.is_tuned:
            return plain, InputKind.KEYS
        return plain + offset, InputKind.TUNED


class PitchTracker:
    """Follows one stream of MIDI messages and says what sounds.

    The rules, beside those of the MIDI standard:

    - A key whose bend and fine tuning come to less than one cent gives a `KEYS` note on a multiple
      of 100 cents: it stands for every pitch near it. Any other gives a `TUNED` note.
    - A single bend message between two note-ons tunes the second one (a wheel that a hand moves sends
      many). From then on every key of that channel is `TUNED`, unbent ones too.
    - A bend or a tuning that changes while keys sound moves them, each with one `PitchMoved`.
    - A key struck again before it was released ends and begins anew.
    - Channel 10 is taken for drums and left out, and so are the notes of any channel in
      ``ignored_channels``; `n_ignored_notes` counts them, so that the player can be told.
    - What is no whole, valid message is skipped and counted in `n_skipped`.

    An instance changes as it reads; it belongs to one thread.

    Parameters
    ----------
    port_number
        Keeps the voices of several inputs apart: voice = port_number * 2048 + channel * 128 + key,
        with channel counted from 0.
    ignored_channels
        Channels counted from 0.

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
        self, port_number: int = 0, ignored_channels: frozenset[int] = frozenset({DRUM_CHANNEL})
    ) -> None:
        self.port_number = port_number
        self.ignored_channels = ignored_channels
        self.n_skipped = 0
        self.n_ignored_notes = 0
        self._channels = [_Channel() for _ in range(CHANNELS)]

    def decode(self, message: Sequence[int], at_s: float) -> tuple[Event, ...]:
        """Read one whole message.

        Parameters
        ----------
        message
            Status byte and data bytes. Anything is accepted; what is damaged is skipped.
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
            return self._moved(number, channel, at_s)
        return ()  # pressure and programs say nothing of pitch

    def silence(self, at_s: float) -> tuple[NoteOff, ...]:
        """End everything that sounds: the port is gone, or the player stops."""
        return tuple(
            off
            for number, channel in enumerate(self._channels)
            for off in self._all_off(number, channel, at_s)
        )

    def start_over(self, at_s: float) -> tuple[NoteOff, ...]:
        """End everything that sounds and forget bends, ranges and tunings: a port was replugged."""
        ended = self.silence(at_s)
        self._channels = [_Channel() for _ in range(CHANNELS)]
        return ended

    @property
    def sounding(self) -> tuple[int, ...]:
        """The voices that sound now, ascending."""
        return tuple(
            self._voice(number, key)
            for number, channel in enumerate(self._channels)
            for key in sorted(channel.cents_by_key)
        )

    def tunings(self) -> tuple[ChannelTuning, ...]:
        """Say what is believed of each channel that is not plain: bent, retuned, or with a sent range."""
        return tuple(
            ChannelTuning(
                channel=number + 1,
                bend_cents=channel.bend_cents(),
                range_cents=channel.range_cents,
                range_sent=channel.range_sent,
                tuning_cents=channel.fine_cents() + 100 * (channel.coarse - COARSE_CENTRE),
            )
            for number, channel in enumerate(self._channels)
            if channel.bend or channel.range_sent or channel.fine != CENTRE or channel.coarse != COARSE_CENTRE
        )

    def _voice(self, number: int, key: int) -> int:
        return self.port_number * VOICES_PER_PORT + number * KEYS + key

    def _note_on(self, number: int, channel: _Channel, key: int, at_s: float) -> tuple[Event, ...]:
        if number in self.ignored_channels:
            self.n_ignored_notes += 1
            return ()
        ended = self._note_off(number, channel, key, at_s)
        tuned_now = channel.n_bends == 1 and abs(channel.offset_cents()) >= PLAIN_CENTS
        channel.is_tuned = channel.is_tuned or tuned_now
        channel.n_bends = 0
        cents, kind = channel.sound(key)
        channel.cents_by_key[key] = cents
        return (*ended, NoteOn(at_s, self._voice(number, key), cents, kind))

    def _note_off(self, number: int, channel: _Channel, key: int, at_s: float) -> tuple[Event, ...]:
        if channel.cents_by_key.pop(key, None) is None:
            return ()
        return (NoteOff(at_s, self._voice(number, key)),)

    def _all_off(self, number: int, channel: _Channel, at_s: float) -> tuple[NoteOff, ...]:
        ended = tuple(NoteOff(at_s, self._voice(number, key)) for key in sorted(channel.cents_by_key))
        channel.cents_by_key.clear()
        return ended

    def _moved(self, number: int, channel: _Channel, at_s: float) -> tuple[Event, ...]:
        moved: list[Event] = []
        for key, before in channel.cents_by_key.items():
            cents, kind = channel.sound(key)
            if cents != before:
                channel.cents_by_key[key] = cents
                moved.append(PitchMoved(at_s, self._voice(number, key), cents, kind))
        return tuple(moved)

    def _control(
        self, number: int, channel: _Channel, control: int, value: int, at_s: float
    ) -> tuple[Event, ...]:
        if control in (_DATA_COARSE, _DATA_FINE, _DATA_UP, _DATA_DOWN):
            _enter_data(channel, control, value)
            return self._moved(number, channel, at_s)
        if control == _RPN_COARSE:
            channel.parameter = (value, channel.parameter[1])
        elif control == _RPN_FINE:
            channel.parameter = (channel.parameter[0], value)
        elif control in (_NRPN_COARSE, _NRPN_FINE):
            channel.parameter = _NO_PARAMETER
        elif control == _RESET_CONTROLLERS:  # the bend range stays
            channel.parameter = _NO_PARAMETER
            channel.bend, channel.is_tuned = 0, False
            return self._moved(number, channel, at_s)
        elif control == _ALL_SOUND_OFF or control >= _ALL_NOTES_OFF:  # 124-127 end notes too
            return self._all_off(number, channel, at_s)
        return ()

    def _system(self, message: Sequence[int], at_s: float) -> tuple[Event, ...]:
        """Read what belongs to no channel. Tuning messages (sysex) will be read here."""
        if message[0] == _SYSTEM_RESET and len(message) == 1:
            return self.start_over(at_s)
        return ()


def _enter_data(channel: _Channel, control: int, value: int) -> None:
    """Set the selected registered parameter; the coarse byte alone is enough and clears the fine one."""
    step = {_DATA_UP: 1, _DATA_DOWN: -1}.get(control, 0)
    if channel.parameter == _BEND_RANGE:
        semitones, cents = divmod(channel.range_cents, 100)
        if control == _DATA_COARSE:
            semitones, cents = value, 0
        elif control == _DATA_FINE:
            cents = min(value, 99)
        channel.range_cents = min(max(semitones * 100 + cents + step, 0), 127 * 100 + 99)
        channel.range_sent = True
    elif channel.parameter == _FINE_TUNING:
        fine = channel.fine
        if control == _DATA_COARSE:
            fine = value << 7
        elif control == _DATA_FINE:
            fine = (fine & ~0x7F) | value
        channel.fine = min(max(fine + step, 0), 2 * CENTRE - 1)
    elif channel.parameter == _COARSE_TUNING and control != _DATA_FINE:
        coarse = value if control == _DATA_COARSE else channel.coarse + step
        channel.coarse = min(max(coarse, 0), 127)
