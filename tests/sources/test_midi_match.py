"""Releases and strikes of one key.

The standard (MIDI 1.0) leaves open how repeated keys are paired. That files hold zero-length notes with
the release first was seen in MIDI that music21 writes for grace notes.
"""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.sources.midi_match import is_strike, matched


def run(events: str) -> str:
    """Match events such as ``0+ 5-``: A4 is struck at tick 0 and released at tick 5."""
    messages = [
        (int(event[:-1]), bytes.fromhex("90 45 40" if event[-1] == "+" else "80 45 40"))
        for event in events.split()
    ]
    return " ".join(f"{tick}{'+' if is_strike(message) else '-'}" for tick, message in matched(messages))


@pytest.mark.parametrize(
    ("events", "meant"),
    [
        ("", ""),
        ("0+ 5- 5+ 9-", "0+ 5- 5+ 9-"),
        ("0+ 5+ 5- 9-", "0+ 5+ 9-"),  # struck again before it is released, at one tick
        ("0+ 5+ 5- 9+ 9- 12-", "0+ 5+ 9+ 12-"),
        ("0+ 5+ 7- 9-", "0+ 5+ 9-"),  # overlapping: the first release is that of the first strike
        ("0+ 3+ 5+ 7- 8- 9-", "0+ 3+ 5+ 9-"),
        ("0+ 5+ 7- 9+ 11-", "0+ 5+ 7- 9+ 11-"),  # the first release is missing
        ("0+ 0-", "0+ 0-"),  # no length
        ("0- 0+", "0-"),  # no length, the release first
        ("0- 0+ 5+ 9-", "0- 5+ 9-"),
        ("0- 0+ 5- 5+", "0- 5-"),  # two of them
        ("0- 0+ 5- 5+ 7- 7+ 8+ 9-", "0- 5- 7- 8+ 9-"),
        ("0- 0+ 5- 5+ 9-", "0- 0+ 5- 5+ 9-"),  # the last has a release, so the first is stray
        ("0+ 5- 5+", "0+ 5- 5+"),  # the file ends before the last release
        ("0+ 5- 5+ 9+ 12-", "0+ 5- 5+ 9+ 12-"),  # the release at 5 ends a strike
        ("0- 0+ 5-", "0- 0+ 5-"),  # a stray release before a whole note
        ("0- 3+", "0- 3+"),
        ("0+ 5- 7- 9+ 11-", "0+ 5- 7- 9+ 11-"),
    ],
)
def test_a_release_ends_the_strike_it_belongs_to(events: str, meant: str) -> None:
    assert run(events) == meant


def test_keys_and_channels_are_matched_by_themselves() -> None:
    messages = [
        (0, bytes.fromhex(text)) for text in ("90 45 40", "91 45 40", "90 46 40", "80 45 40", "B0 07 01")
    ]
    assert matched(messages) == messages


@given(
    st.lists(
        st.tuples(st.integers(0, 1), st.sampled_from([0x80, 0x90, 0x91, 0xB0]), st.sampled_from([60, 62])),
        max_size=30,
    )
)
def test_nothing_is_added_and_nothing_changes_place(events: list[tuple[int, int, int]]) -> None:
    messages, tick = [], 0
    for wait, status, key in events:
        tick += wait
        messages.append((tick, bytes((status, key, 64))))
    left = iter(messages)
    assert all(one in left for one in matched(messages))


@given(st.lists(st.tuples(st.integers(0, 2), st.integers(60, 63)), max_size=40))
def test_keys_that_are_never_struck_while_they_are_down_stay_as_they_are(
    turns: list[tuple[int, int]],
) -> None:
    messages: list[tuple[int, bytes]] = []
    down: set[int] = set()
    tick = 0
    for wait, key in turns:  # each key goes down and up in turn
        tick += wait
        messages.append((tick, bytes((0x80 if key in down else 0x90, key, 64))))
        down ^= {key}
    assert matched(messages) == messages
