"""A retuned keyboard on paper: its twelve keys, and what two degrees want of one key.

The functions are pure: a retuning and a width in, text out. Programs take `retuning_json`, which holds
the same facts.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from melodycoach.core.cells import width
from melodycoach.core.pitch import KEY_NAMES
from melodycoach.core.retuning import Intonation, conflict_sentences, manner_words
from melodycoach.report.mode_data import place, roles
from melodycoach.report.text_lines import BLANK, MIN_COLUMNS, Line, heading, painted, wrapped
from melodycoach.report.words import MINUS, listed, pitch

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping, Sequence

    from melodycoach.core.mode import ModePack
    from melodycoach.core.retuning import RetunedKey, Retuning, Wish

_FORMAT = "melodycoach-retuning"
_NO_DEGREE = "in its place: no degree lies on it"
_GAP = "  "


def retuning_json(pack: ModePack, retuning: Retuning) -> dict[str, Any]:
    """Give everything about twelve keys on the degrees of a mode.

    ``keys``: twelve, C to B, each with ``cents`` and ``units`` off its place, the ``degree`` that it
    serves (None: none), and ``unserved``, the degrees that wanted it too. ``conflicts`` has a sentence
    for each of these.
    """
    cents = retuning.final_cents
    return {
        "format": _FORMAT,
        "version": 1,
        "mode": retuning.mode.id,
        "name": retuning.mode.name,
        "final": {"name": pack.names.name(cents), "written": str(pack.names.spell(cents))},
        "intonation": retuning.intonation.value,
        "unit": pack.system.unit_name,
        "keys": [_key(pack, retuning, key) for key in retuning.keys],
        "conflicts": list(conflict_sentences(retuning, pack.names)),
    }


def plain_json() -> dict[str, Any]:
    """Give the same for a keyboard all of whose keys are put back in their places."""
    keys: list[dict[str, Any]] = [
        {"key": name, "cents": 0.0, "units": 0.0, "degree": None, "unserved": []} for name in KEY_NAMES
    ]
    return {
        "format": _FORMAT,
        "version": 1,
        "mode": None,
        "name": None,
        "final": None,
        "intonation": None,
        "unit": "cent",
        "keys": keys,
        "conflicts": [],
    }


def _key(pack: ModePack, retuning: Retuning, key: RetunedKey) -> dict[str, Any]:
    return {
        "key": key.name,
        "cents": round(key.offset_cents, 2),
        "units": round(key.offset_cents / pack.system.unit_cents, 3),
        "degree": None if key.served is None else _degree(pack, retuning, key.served),
        "unserved": [_degree(pack, retuning, lost) for lost in key.unserved],
    }


def _degree(pack: ModePack, retuning: Retuning, wish: Wish) -> dict[str, Any]:
    mode = retuning.mode
    return {
        **place(pack, mode, wish.degree),
        "name": pack.names.name(wish.written_cents),
        "written": str(pack.names.spell(wish.written_cents)),
        "cents": round(wish.offset_cents, 2),
        "roles": roles(mode, wish.degree),
    }


def retuning_text(data: Mapping[str, Any], columns: int = 80, done: Sequence[str] = ()) -> str:
    """Write the twelve keys for people.

    Parameters
    ----------
    data
        What `retuning_json` or `plain_json` gives.
    columns
        Width to fill; taken for 40 where it is less. A narrow table leaves out its last column.
    done
        Sentences about what was sent and saved.
    """
    size = max(columns, MIN_COLUMNS)
    lines: list[Line] = []
    if data["mode"] is None:
        lines += wrapped("All twelve keys are back in their places, equal steps of 100 cents.", size)
    else:
        title = f"{data['name']} on {pitch(data['final'])}, {manner_words(Intonation(data['intonation']))}"
        lines += [*heading(title, size), *_table(data, size), BLANK, *wrapped(_key_to_table(data), size)]
    if data["conflicts"]:
        lines += [BLANK, *heading("Keys that two degrees want", size)]
        lines += [line for text in data["conflicts"] for line in wrapped(text, size, "  - ", "    ")]
    if done:
        lines.append(BLANK)
        lines += [line for text in done for line in wrapped(text, size)]
    return painted(lines, colour=False)


def _key_to_table(data: Mapping[str, Any]) -> str:
    many = f" and {data['unit']}s" if data["unit"] != "semitone" else ""
    return f"Cents{many} count from twelve equal keys, with A4 on 440 Hz; every octave has the same."


def _table(data: Mapping[str, Any], columns: int) -> list[Line]:
    with_units = data["unit"] != "semitone"
    head = ("key", "cents", *((f"{data['unit']}s",) if with_units else ()), "pitch", "in the mode")
    rows = [
        (
            key["key"],
            signed(key["cents"], 1),
            *((signed(key["units"], 2),) if with_units else ()),
            "" if key["degree"] is None else pitch(key["degree"]),
            _NO_DEGREE if key["degree"] is None else listed(key["degree"]["roles"]) or "degree",
        )
        for key in data["keys"]
    ]
    sizes = [max(map(width, column)) for column in zip(head, *rows, strict=True)]
    return [Line(_row(row, sizes, columns)) for row in (head, *rows)]


def _row(cells: Sequence[str], sizes: Iterable[int], columns: int) -> str:
    line = ""
    for number, (text, size) in enumerate(zip(cells, sizes, strict=True)):
        room = " " * (size - width(text))
        is_number = 0 < number < len(cells) - 2
        cell = f"{_GAP}{room}{text}" if is_number else f"{_GAP}{text}{room}"
        if width(line) + width(cell.rstrip()) > columns:
            break
        line += cell
    return line.rstrip()


def signed(value: float, decimals: int) -> str:
    """Write a number with its sign.

    >>> signed(-22.64, 1), signed(3.84, 1), signed(-0.001, 2)
    ('−22.6', '+3.8', '0')
    """
    size = f"{abs(value):.{decimals}f}"
    if float(size) == 0:
        return "0"
    return f"{MINUS if value < 0 else '+'}{size}"


def sent_sentences(sent: Mapping[str, Any]) -> list[str]:
    """Say what was sent where, and what follows from it.

    ``sent`` has ``port``, ``message`` (``1-byte``, ``2-byte`` or ``channel``), ``channels``, counted from
    1, and ``bytes``, the messages in hex.
    """
    port, channels = sent["port"], sent["channels"]
    if sent["message"] == "channel":
        served = [f"{key} on {channel}" for key, channel in zip(KEY_NAMES, channels, strict=True)]
        return [
            f"Sent to {port}: the fine tuning of twelve channels, one for each key: {', '.join(served)}.",
            _A_CHANNEL_A_KEY,
            _LISTEN,
        ]
    size = len(bytes.fromhex(sent["bytes"][0]))
    exact = "to the nearest cent" if sent["message"] == "1-byte" else "to a hundredth of a cent"
    where = "every channel" if len(channels) == _CHANNELS else _channel_words(channels)
    return [
        f"Sent to {port}: one scale/octave tuning message of {size} bytes, {exact}, for {where}.",
        _LISTEN,
    ]


_CHANNELS = 16
_A_CHANNEL_A_KEY = (
    "It serves an instrument that gets each key on the channel that is its own; on one channel alone only "
    "one key is right."
)
_LISTEN = (
    "No instrument answers such a message: play and listen, at the level that you have set. If nothing has "
    "changed, it does not read this one; try another --message."
)


def _channel_words(channels: Sequence[int]) -> str:
    return f"channel{'' if len(channels) == 1 else 's'} {listed([str(channel) for channel in channels])}"


def saved_sentence(name: str, path: str, is_new: bool) -> str:
    """Say where a keyboard profile was saved, and how it is used."""
    kept = "" if is_new else ", with everything else in it as it was"
    use = f"melodycoach listen --keys {name} hears it so"
    return f"Saved as your keyboard profile {name!r} ({path}){kept}; {use}."
