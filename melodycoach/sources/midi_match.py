"""Which release belongs to which strike of a key, where a MIDI file leaves it open.

A live instrument cannot strike a key that is down, but files hold such things: notes of one key that
overlap, a release and the next strike written at one tick in either order, notes of no length whose
release comes first. `matched` leaves out what would be misunderstood, so that everything behind it may
take the messages as they come.

References
----------
MIDI 1.0: note-on with velocity 0 is a note-off. How repeated keys are paired the standard leaves open.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, TypeAlias

if TYPE_CHECKING:
    from collections.abc import Sequence

    from melodycoach.sources.midi_track import TimedMessage

Key: TypeAlias = tuple[int, int]
"""A channel from 0, and a key."""


def key_of(message: bytes) -> Key | None:
    """Give the key that a message strikes or releases, or None."""
    return (message[0] & 0x0F, message[1]) if message[0] & 0xE0 == 0x80 else None


def is_strike(message: bytes) -> bool:
    """Say whether a message strikes a key.

    >>> [is_strike(bytes.fromhex(text)) for text in ("90 45 40", "90 45 00", "80 45 40", "E0 00 40")]
    [True, False, False, False]
    """
    return message[0] & 0xF0 == 0x90 and message[2] > 0


def matched(messages: Sequence[TimedMessage]) -> list[TimedMessage]:
    """Give the messages with each release where it ends the strike that it belongs to.

    - A key that is struck again while it is down has two releases to come. The first of them is left
      out if the other follows before the next strike, or if it comes at the tick of the strike.
    - A strike that has no release of its own, and comes at the tick at which its key was released
      while it was up, is left out: that is how some programs write a grace note, which takes no time.

    Parameters
    ----------
    messages
        By tick; what strikes and releases nothing is handed on.

    Examples
    --------
    A4 is struck again at tick 5, and only then is its first strike released:

    >>> strike, release = bytes.fromhex("90 45 40"), bytes.fromhex("80 45 40")
    >>> [tick for tick, _ in matched([(0, strike), (5, strike), (5, release), (9, release)])]
    [0, 5, 9]
    """
    before_release, endless = _look_ahead(messages)
    n_down: dict[Key, int] = {}
    struck: dict[Key, int] = {}
    released_up: dict[Key, int] = {}
    kept: list[TimedMessage] = []
    for place, (tick, message) in enumerate(messages):
        kept.append((tick, message))
        key = key_of(message)
        if key is None:
            continue
        if is_strike(message):
            if released_up.get(key) == tick and place in endless:
                kept.pop()
                continue
            n_down[key] = n_down.get(key, 0) + 1
            struck[key] = tick
        elif not n_down.get(key):
            released_up[key] = tick
        elif n_down[key] > 1 and (place in before_release or struck[key] == tick):
            kept.pop()
            n_down[key] -= 1
        else:
            n_down[key] = 0
    return kept


def _look_ahead(messages: Sequence[TimedMessage]) -> tuple[set[int], set[int]]:
    """Give the places of what a release of the same key follows, and of the strikes without a release.

    The release that follows a strike is not its own if it comes at one tick with, and before, another
    strike that has none.
    """
    before_release: set[int] = set()
    endless: set[int] = set()
    following: dict[Key, tuple[bool, int, bool]] = {}  # is it a strike; its tick; does it end nothing
    for place in range(len(messages) - 1, -1, -1):
        tick, message = messages[place]
        key = key_of(message)
        if key is None:
            continue
        strikes, at, ends_nothing = following.get(key, (True, -1, False))
        if not strikes:
            before_release.add(place)
        if is_strike(message):
            if strikes or ends_nothing:
                endless.add(place)
            following[key] = (True, tick, place in endless)
        else:
            following[key] = (False, tick, strikes and at == tick and ends_nothing)
    return before_release, endless
