"""What may stand in a keyboard profile: for each key what fits, and the sentence that another value gets.

All faults are collected. `melodycoach.sources.keyboard_profile` reads the files.
"""

from __future__ import annotations

import re
from typing import TYPE_CHECKING, Any, TypeAlias

from melodycoach.core.pitch import COMMA_CENTS
from melodycoach.errors import nearest_names, shorten
from melodycoach.sources.midi_mpe import CHANNELS, MANAGERS, MOST_MEMBERS, MpeZone
from melodycoach.sources.midi_tuning import CLASSES, KEYS

if TYPE_CHECKING:
    from collections.abc import Callable, Iterable, Iterator, Mapping

    Fits: TypeAlias = Callable[[object], bool]
    Rules: TypeAlias = Mapping[str, tuple[Fits, str]]

MOST_OFFSET_CENTS = 100.0
MOST_SEMITONES = 48
WIDEST_BEND = 96  # semitones, the most that MPE allows
USUAL_BEND = 48

_WIDEST_SHOWN = 60
_KEY = re.compile(r"([A-G])(#|b)?(-1|\d)")
_NATURALS = dict(zip("CDEFGAB", (0, 2, 4, 5, 7, 9, 11), strict=True))


def _between(low: float, high: float) -> Fits:
    return lambda value: _is_number(value) and low <= value <= high  # type: ignore[operator]


def _whole(low: int, high: int) -> Fits:
    return lambda value: isinstance(value, int) and not isinstance(value, bool) and low <= value <= high


def _twelve(most: float) -> Fits:
    fits = _between(-most, most)
    return lambda value: isinstance(value, list) and len(value) == CLASSES and all(map(fits, value))


def _is_number(value: object) -> bool:
    return isinstance(value, int | float) and not isinstance(value, bool)


def _is_shown(value: object) -> bool:
    return isinstance(value, str) and bool(value.strip()) and value.isprintable()


def _is_key(value: object) -> bool:
    return isinstance(value, str) and key_number(value) is not None


def _are_zones(value: object) -> bool:
    return isinstance(value, list) and 1 <= len(value) <= 2 and all(isinstance(one, dict) for one in value)


_TWELVE = "for the keys C, C#, D and so on to B"
_KEYBOARD: Rules = {
    "name": (_is_shown, "text that is not blank and has no control characters"),
    "tuning": (_is_shown, "text that is not blank and has no control characters"),
    "note": (_is_shown, "text that is not blank and has no control characters"),
    "cents": (_twelve(MOST_OFFSET_CENTS), f"twelve numbers from -100 to 100, {_TWELVE}"),
    "commas": (_twelve(MOST_OFFSET_CENTS / COMMA_CENTS), f"twelve numbers from -4.4 to 4.4, {_TWELVE}"),
    "channel": (_whole(1, CHANNELS), f"a channel from 1 to {CHANNELS}"),
    "transposition": (
        _whole(-MOST_SEMITONES, MOST_SEMITONES),
        f"whole semitones from -{MOST_SEMITONES} to {MOST_SEMITONES}",
    ),
    "split": (_is_key, "a key such as 'C4' or 'F#3' (A4 is 440 Hz)"),
    "mpe": (_are_zones, "one or two tables [[keyboard.mpe]] with manager, members and range"),
}
_ZONE: Rules = {
    "manager": (lambda value: value in (1, CHANNELS) and _is_number(value), f"channel 1 or {CHANNELS}"),
    "members": (_whole(1, MOST_MEMBERS), f"a number of channels from 1 to {MOST_MEMBERS}"),
    "range": (_between(0, WIDEST_BEND), f"semitones from 0 to {WIDEST_BEND}"),
}


def faults_in(data: Mapping[str, Any]) -> Iterator[str]:
    """Give every fault of a parsed profile, in the order of the file."""
    yield from (_unknown(key, ["keyboard"]) for key in data if key != "keyboard")
    table = data.get("keyboard")
    if not isinstance(table, dict):
        found = f"is {_shown(table)}" if "keyboard" in data else "is missing"
        yield f"keyboard {found}, expected a table [keyboard]"
        return
    if "name" not in table:
        yield "keyboard: name is missing, expected text that is not blank"
    yield from _faults("keyboard", table, _KEYBOARD)
    zones = table.get("mpe", [])
    if _are_zones(zones):
        in_zones = [f for n, zone in enumerate(zones) for f in _faults(f"keyboard: mpe[{n}]", zone, _ZONE)]
        yield from in_zones or _sense_of_zones(zones)
    if "cents" in table and "commas" in table:
        yield "keyboard: both cents and commas are given, expected one of them"
    if "channel" in table and "mpe" in table:
        yield "keyboard: both channel and mpe are given; MPE uses many channels: leave one of them out"


def _faults(where: str, table: Mapping[str, Any], rules: Rules) -> Iterator[str]:
    for key, value in table.items():
        if key not in rules:
            yield f"{where}: {_unknown(key, rules)}"
        elif not rules[key][0](value):
            yield f"{where}: {key} is {_shown(value)}, expected {rules[key][1]}"


def _sense_of_zones(zones: list[dict[str, Any]]) -> Iterator[str]:
    read = [zone_of(zone) for zone in zones]
    taken = [channel for zone in read for channel in zone.channels]
    if len(taken) > len(set(taken)):
        yield "keyboard: the two mpe zones share a channel; give them other managers or fewer members"


def _unknown(key: str, known: Iterable[str]) -> str:
    return f"unknown key {shorten(key)!r}; {nearest_names(key, known)}"


def _shown(value: object) -> str:
    return shorten(repr(value), _WIDEST_SHOWN)


def key_number(text: str) -> int | None:
    """Give the MIDI number of a key by its name, or None if it is none.

    >>> key_number("A4"), key_number("C-1"), key_number("Bb3"), key_number("H4")
    (69, 0, 58, None)
    """
    found = _KEY.fullmatch(text)
    if found is None:
        return None
    sign = {"#": 1, "b": -1}.get(found[2] or "", 0)
    number = _NATURALS[found[1]] + sign + CLASSES * (int(found[3]) + 1)
    return number if 0 <= number < KEYS else None


def zone_of(table: Mapping[str, Any]) -> MpeZone:
    """Give the zone that a table describes; what it leaves out is as MPE has it at first."""
    manager = table.get("manager", MANAGERS[0] + 1) - 1
    range_cents = round(100 * table.get("range", USUAL_BEND))
    return MpeZone(int(manager), table.get("members", MOST_MEMBERS), range_cents)
