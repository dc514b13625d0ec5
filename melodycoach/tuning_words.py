"""Which tuning a keyboard is believed to have, and why: one sentence for the player."""

from __future__ import annotations

from functools import lru_cache
from typing import TYPE_CHECKING

from melodycoach.core.pitch import KEY_NAMES
from melodycoach.sources.midi_mpe import CHANNELS
from melodycoach.sources.midi_tuning import CLASSES, KEYS

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from melodycoach.sources.keyboard_profile import KeyboardProfile
    from melodycoach.sources.midi_mpe import MpeZone
    from melodycoach.sources.midi_pitch import ChannelTuning, PitchTracker

_SENT = "(sent by the keyboard)"
_MOST_KEYS = 12
"""At most so many keys that a message tuned are named."""

_MOST_CHANNELS = 4
"""At most so many channels are named; more are counted."""


def tuning_sentence(tracker: PitchTracker, profile: KeyboardProfile | None = None) -> str:
    """Say which tuning a keyboard is believed to have, and why.

    Parameters
    ----------
    tracker
        What reads the keyboard.
    profile
        What the player has said of it; the tracker was made with it.

    Examples
    --------
    >>> from melodycoach.sources.midi_pitch import PitchTracker
    >>> tuning_sentence(PitchTracker())
    'plain keys: each stands for every perde near it'
    >>> tracker = PitchTracker()
    >>> tracker.decode(bytes.fromhex("F0 7F 7F 08 02 00 01 40 3F 63 02 F7"), 0.0)
    ()
    >>> tuning_sentence(tracker)
    'tuned by a message from the keyboard: E4 -23 c'
    """
    tunings, zones = tracker.tunings(), tracker.zones
    retuned = _retuned_words(tunings, _profile_words(profile), tracker.stated_cents)
    tuned = [_zone_words(zones, tunings), retuned, _bend_words(zones, tunings)]
    if not any(tuned) and all(tuning.tuning_cents % 100 == 0 for tuning in tunings):
        tuned = [f"plain keys{_put_back_words(profile)}: each stands for every perde near it"]
    moved = [_stated_shift_words(profile), _shift_words(tunings), _concert_words(tracker.concert_cents)]
    return "; ".join(words for words in (*tuned, *moved) if words)


def _zone_words(zones: Sequence[MpeZone], tunings: Sequence[ChannelTuning]) -> str:
    """Speak of the MPE zones, and of the range of the first one's members."""
    if not zones:
        return ""
    sizes = " and ".join(str(zone.n_members) for zone in zones)
    plural = "" if sizes == "1" else "s"
    range_by_channel = {tuning.channel - 1: tuning.range_cents for tuning in tunings if tuning.range_sent}
    member = zones[0].members[0]
    cents = range_by_channel.get(member, zones[0].member_range_cents)
    reason = _SENT if member in range_by_channel else "(as you have set it)"
    return f"MPE, {sizes} channel{plural}, range ±{cents / 100:g} semitones {reason}"


def _retuned_words(tunings: Sequence[ChannelTuning], profile: str, stated: Mapping[int, float]) -> str:
    """Name the keys that a message or the player tuned; channels that are tuned alike are spoken of once.

    What a message has changed is spoken of before what is still as the player has stated.
    """
    channels_by_words: dict[tuple[bool, str], list[int]] = {}
    for tuning in tunings:
        if tuning.key_cents:
            told = (tuning.key_cents != stated, _key_words(tuple(tuning.key_cents.items())))
            channels_by_words.setdefault(told, []).append(tuning.channel)
    if not channels_by_words:
        return ""
    told, channels = max(channels_by_words.items(), key=lambda item: (item[0][0], len(item[1])))
    is_sent, words = told
    where = "" if len(channels) == CHANNELS else f" on {_channel_words(channels)}"
    others = ", other channels differently" if len(channels_by_words) > 1 else ""
    over = f" over {profile}" if stated else ""
    reason = f"a message from the keyboard{over}" if is_sent else profile
    return f"tuned by {reason}{where}: {words}{others}"


def _channel_words(channels: Sequence[int]) -> str:
    """Name a few channels, or count many.

    >>> _channel_words([4]), _channel_words([1, 4, 7]), _channel_words(range(1, 9))
    ('channel 4', 'channels 1, 4 and 7', '8 channels')
    """
    *firsts, last = map(str, channels)
    if len(channels) > _MOST_CHANNELS:
        return f"{len(channels)} channels"
    return f"channels {', '.join(firsts)} and {last}" if firsts else f"channel {last}"


@lru_cache(maxsize=CHANNELS)
def _key_words(key_cents: tuple[tuple[int, float], ...]) -> str:
    """Say which keys are off their places: by letter where every octave has the same.

    >>> _key_words(tuple((key, -23.0) for key in range(4, 128, 12)))
    'E -23 c'
    """
    cents_by_key = dict(key_cents)
    every_key = {key: round(cents_by_key.get(key, 0.0)) for key in range(KEYS)}
    names: dict[str, int] = {}
    for key, cents in every_key.items():
        letter = KEY_NAMES[key % CLASSES]
        is_everywhere = len({every_key[octave] for octave in range(key % CLASSES, KEYS, CLASSES)}) == 1
        if cents:
            names[letter if is_everywhere else f"{letter}{key // CLASSES - 1}"] = cents
    said = [f"{name} {cents:+} c" for name, cents in names.items()]
    more = [f"and {len(said) - _MOST_KEYS} more"] if len(said) > _MOST_KEYS else []
    return ", ".join([*said[:_MOST_KEYS], *more])


def _bend_words(zones: Sequence[MpeZone], tunings: Sequence[ChannelTuning]) -> str:
    """Speak of the channel outside zones that is bent most."""
    in_zones = {channel + 1 for zone in zones for channel in zone.channels}
    bent = [
        tuning
        for tuning in tunings
        if tuning.channel not in in_zones and (tuning.bend_cents or tuning.range_sent)
    ]
    if not bent:
        return ""
    most = max(bent, key=lambda tuning: abs(tuning.bend_cents))
    reason = _SENT if most.range_sent else "(none was sent: MIDI's default)"
    return f"bends read on channel {most.channel}, range ±{most.range_cents / 100:g} semitones {reason}"


def _put_back_words(profile: KeyboardProfile | None) -> str:
    """Say why keys are plain though the player has stated a tuning."""
    if profile is None or not profile.is_tuned:
        return ""
    return f", put back by a message from the keyboard over {_profile_words(profile)}"


def _profile_words(profile: KeyboardProfile | None) -> str:
    """Name the profile, and what it is tuned to."""
    if profile is None:
        return ""
    return f"your profile {profile.name!r}" + (f" ({profile.tuning})" if profile.tuning else "")


def _stated_shift_words(profile: KeyboardProfile | None) -> str:
    """Speak of the transposition that the player has stated."""
    if profile is None or not profile.semitones:
        return ""
    plural = "" if abs(profile.semitones) == 1 else "s"
    return f"every key moved by {profile.semitones:+} semitone{plural} (by your profile {profile.name!r})"


def _shift_words(tunings: Sequence[ChannelTuning]) -> str:
    """Speak of fine and coarse tuning: of the channel that is moved most, or of the whole keyboard."""
    moved = [tuning for tuning in tunings if tuning.tuning_cents]
    if not moved:
        return ""
    most = max(moved, key=lambda tuning: abs(tuning.tuning_cents))
    together = [tuning for tuning in moved if tuning.tuning_cents == most.tuning_cents]
    what = "every key" if len(together) == CHANNELS else f"keys of channel {most.channel}"
    amount = f"{most.tuning_cents:+.0f} c"
    if most.tuning_cents % 100 == 0:
        amount = f"{most.tuning_cents / 100:+.0f} semitone{'' if abs(most.tuning_cents) == 100 else 's'}"
    return f"{what} moved by {amount} {_SENT}"


def _concert_words(cents: float) -> str:
    """Say a concert pitch other than A = 440 Hz.

    >>> _concert_words(7.85)
    'concert pitch A = 442 Hz (sent by the keyboard)'
    """
    return f"concert pitch A = {440 * 2 ** (cents / 1200):.0f} Hz {_SENT}" if cents else ""
