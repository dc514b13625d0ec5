"""MPE zones: which channels they have, and which one gives way.

Outside source: MIDI Polyphonic Expression (RP-053).
"""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.sources.midi_mpe import MpeZone, set_up_zone


def test_members_stand_next_to_their_manager() -> None:
    # RP-053: the lower zone goes up from channel 1, the upper one down from channel 16
    assert MpeZone(0, 3).channels == (0, 1, 2, 3)
    assert MpeZone(15, 3).channels == (15, 14, 13, 12)
    assert sorted(MpeZone(0, 15).channels) == sorted(MpeZone(15, 15).channels) == list(range(16))


@pytest.mark.parametrize(("manager", "n_members"), [(1, 4), (0, 0), (0, 16), (-1, 3)])
def test_a_zone_that_cannot_be_is_refused(manager: int, n_members: int) -> None:
    with pytest.raises(ValueError, match="zone of"):
        MpeZone(manager, n_members)


@pytest.mark.parametrize("range_cents", [-1, 12800])
def test_a_range_that_cannot_be_sent_is_refused(range_cents: int) -> None:
    with pytest.raises(ValueError, match="expected 0 to 12799"):
        MpeZone(0, 15, range_cents)


@given(st.lists(st.tuples(st.sampled_from([0, 15]), st.integers(0, 15)), max_size=8))
def test_zones_never_share_a_channel_and_the_latest_has_all_its_members(
    messages: list[tuple[int, int]],
) -> None:
    zones: tuple[MpeZone, ...] = ()
    for manager, n_members in messages:
        zones = set_up_zone(zones, manager, n_members)
        channels = [channel for zone in zones for channel in zone.channels]
        assert len(channels) == len(set(channels))
        assert [zone.n_members for zone in zones if zone.manager == manager] == [n_members] * (n_members > 0)
        assert list(zones) == sorted(zones, key=lambda zone: zone.manager)
