"""Bends that are meant in the wide range of MPE, in a file that does not say so.

Outside source: MPE (RP-053), members of a zone bend by 48 semitones. A comma takes 1200 / 53 / 4800 * 8192 =
38.6 steps of that range: 39 down are 8153, bytes 59 3F.
"""

from __future__ import annotations

import pytest
from midi_bytes import midi, note, track

from melodycoach.core.note import InputKind, Note
from melodycoach.core.sheet import Sheet
from melodycoach.sources.midi_sheet import read_midi

COMMA = 1200 / 53
PLAIN, A_COMMA_DOWN = "00 40", "59 3F"
RANGE_2 = "00 B1 65 00 00 B1 64 00 00 B1 06 02"


def read(*bends: str, setup: str = "", channels: tuple[int, ...] = (2, 3, 4)) -> Sheet:
    """Read A4, B4, C5 with these bends, each on the next of the channels."""
    keys = zip((69, 71, 72), bends, (3 * channels)[:3], strict=True)
    turns = [f"00 E{channel - 1:X} {bend} {note(key, channel=channel)}" for key, bend, channel in keys]
    return read_midi(midi(track(setup, *turns)), "a.mid")


def pitches(sheet: Sheet) -> list[tuple[float, InputKind]]:
    return [(item.pitch_cents, item.kind) for item in sheet.items if isinstance(item, Note)]


def test_tiny_bends_that_are_commas_in_the_wide_range_are_meant_there() -> None:
    sheet = read(PLAIN, A_COMMA_DOWN, PLAIN)
    wanted = [6900, 6900 + 8 * COMMA, 6900 + 13 * COMMA]
    assert pitches(sheet) == [(pytest.approx(cents), InputKind.TYPED) for cents in wanted]
    assert sheet.says[1] == "pitch bends are read with a range of ±48 semitones"
    assert sheet.says[2] == (
        "the file sends no bend range: in the usual ±2 semitones nobody would hear its bends, "
        "in ±48 all its pitches are written ones"
    )


@pytest.mark.parametrize(
    ("bends", "setup", "channels"),
    [
        ((PLAIN, A_COMMA_DOWN, PLAIN), RANGE_2, (2, 3, 4)),  # a range is sent
        ((PLAIN, A_COMMA_DOWN, PLAIN), "", (2,)),  # one channel for all
        ((PLAIN, PLAIN, PLAIN), "", (2, 3, 4)),  # no bend
        ((PLAIN, "4C 3F", PLAIN), "", (2, 3, 4)),  # 52 steps down: 30 cents are no commas
    ],
)
def test_else_the_range_stays_what_it_is(
    bends: tuple[str, ...], setup: str, channels: tuple[int, ...]
) -> None:
    sheet = read(*bends, setup=setup, channels=channels)
    assert [cents for cents, _ in pitches(sheet)] == pytest.approx([6900, 7100, 7200], abs=1.5)
    assert not any("no bend range" in said for said in sheet.says)


def test_a_bend_that_can_be_heard_is_meant_as_it_is() -> None:
    # 927 steps of two semitones are a comma
    sheet = read(PLAIN, A_COMMA_DOWN, "61 38")
    assert pitches(sheet)[2][0] == pytest.approx(6900 + 12 * COMMA)
    assert "range of ±2 semitones" in sheet.says[1]
