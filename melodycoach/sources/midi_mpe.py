"""MPE zones: which channels carry one note each, and which one moves them all.

A zone has a manager channel (1 or 16) and members next to it. Each member carries one note with a
bend of its own; a bend on the manager moves every note of the zone.

Conventions
-----------
Channels count from 0.

References
----------
MIDI Polyphonic Expression (RP-053): the configuration message, registered parameter 6.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

CHANNELS = 16
LOWER_MANAGER, UPPER_MANAGER = 0, 15
MANAGERS = (LOWER_MANAGER, UPPER_MANAGER)
MOST_MEMBERS = CHANNELS - 1
MEMBER_RANGE_CENTS = 4800
"""What a bend of a member spans when a zone is set up; the manager has the usual two semitones."""

RANGES = range(12800)
"""The bend ranges that MIDI can say, in cents."""


@dataclass(frozen=True, slots=True)
class MpeZone:
    """One zone.

    Parameters
    ----------
    manager
        0 for the lower zone, whose members go up from it, or 15 for the upper one.
    n_members
        1 to 15.
    member_range_cents
        What a full bend of a member comes to.
    is_sent
        The keyboard has set it up; otherwise the player has said so.

    Raises
    ------
    ValueError
        No such zone.

    Examples
    --------
    >>> MpeZone(15, 3).members
    (14, 13, 12)
    """

    manager: int = LOWER_MANAGER
    n_members: int = MOST_MEMBERS
    member_range_cents: int = MEMBER_RANGE_CENTS
    is_sent: bool = False

    def __post_init__(self) -> None:
        """Refuse what no message can set up."""
        if self.manager not in MANAGERS or not 1 <= self.n_members <= MOST_MEMBERS:
            raise ValueError(f"zone of {self.n_members!r} members on channel {self.manager!r} from 0")
        if self.member_range_cents not in RANGES:
            raise ValueError(f"bend range of {self.member_range_cents!r} cents, expected 0 to {RANGES[-1]}")

    @property
    def members(self) -> tuple[int, ...]:
        """The channels that carry a note each, nearest to the manager first."""
        step = 1 if self.manager == LOWER_MANAGER else -1
        return tuple(self.manager + step * number for number in range(1, self.n_members + 1))

    @property
    def channels(self) -> tuple[int, ...]:
        """The manager and its members."""
        return (self.manager, *self.members)


def set_up_zone(zones: tuple[MpeZone, ...], manager: int, n_members: int) -> tuple[MpeZone, ...]:
    """Give the zones after a configuration message; the latest one takes what it needs from the other.

    ``n_members`` 0 switches the zone of this manager off.

    >>> [zone.n_members for zone in set_up_zone((MpeZone(0, 10),), 15, 6)]
    [8, 6]
    """
    others = tuple(zone for zone in zones if zone.manager != manager)
    if not n_members:
        return others
    room = MOST_MEMBERS - 1 - n_members  # the other manager needs a channel too
    kept = tuple(replace(zone, n_members=min(zone.n_members, room)) for zone in others if room > 0)
    return tuple(sorted((*kept, MpeZone(manager, n_members, is_sent=True)), key=lambda zone: zone.manager))


class ZoneMap:
    """The zones in force, and what follows from them for each of the sixteen channels; never changes.

    ``reach`` holds the channels that a bend or a mode message of a channel reaches, ``alike`` those
    that share its bend range: the members of its zone. Outside zones both are the channel itself.

    Examples
    --------
    >>> zones = ZoneMap((MpeZone(0, 3),))
    >>> zones.reach[0], zones.reach[2], zones.alike[2]
    ((0, 1, 2, 3), (2,), (1, 2, 3))
    """

    def __init__(self, zones: tuple[MpeZone, ...] = ()) -> None:
        self.zones = zones
        self.zone_by_member = {member: zone for zone in zones for member in zone.members}
        self.manager_by_channel = {channel: zone.manager for zone in zones for channel in zone.channels}
        self.reach: list[tuple[int, ...]] = [(number,) for number in range(CHANNELS)]
        self.alike = list(self.reach)
        for zone in zones:
            self.reach[zone.manager] = zone.channels
        for member, zone in self.zone_by_member.items():
            self.alike[member] = zone.members
        self.sent = frozenset(channel for zone in zones if zone.is_sent for channel in zone.channels)

    def begin_anew(self, before: ZoneMap, manager: int) -> tuple[int, ...]:
        """Name the channels that begin anew after a message to this manager.

        They are all channels of its zone, and those that have another role than before.
        """
        then, now = before.manager_by_channel, self.manager_by_channel
        return tuple(n for n in range(CHANNELS) if now.get(n) != then.get(n) or now.get(n) == manager)
