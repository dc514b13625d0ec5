"""A line in MIDI as different programs export it is answered like the line in note text.

How exports differ is common practice: notes that sound for a part of their length or end some ticks early,
naturals as a plain keyboard has them with only the altered notes bent, a channel for each note with bends of
48 semitones (MPE, RP-053), with the range sent or not. mido, a general MIDI library, writes the files.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from io import BytesIO
from typing import TYPE_CHECKING

import mido
import pytest
from outside.test_three_files import EXAMPLES, NEARLY, PACK, answered, notes_of, told, without_mode
from written_out import NATURALS, PAUSE_S, TICKS, spelled

from melodycoach.core.note import Mark, Note
from melodycoach.core.pitch import COMMA_CENTS, LETTERS
from melodycoach.sources.note_text import DEFAULT_TEMPO, read_note_text

if TYPE_CHECKING:
    from pathlib import Path

    from melodycoach.sources.note_text import NoteText

PLAIN_NATURALS = dict(zip(LETTERS, (0, 200, 400, 500, 700, 900, 1100), strict=True))


@dataclass(frozen=True)
class Export:
    """How a program writes: see the head of this file."""

    gate: float = 1.0
    early_ticks: int = 0
    plain_naturals: bool = False
    bend_range: int = 2
    n_channels: int = 1
    sends_range: bool = True

    def cents(self, written: float) -> float:
        letter, octave, commas = spelled(written)
        assert written == pytest.approx(
            6900 + (53 * (octave - 4) + NATURALS[letter] + commas - 40) * COMMA_CENTS
        )
        plain = 1200 * (octave + 1) + PLAIN_NATURALS[letter] + commas * COMMA_CENTS
        return plain if self.plain_naturals else written


EXPORTS = {
    "gate 0.9": Export(gate=0.9),
    "gate 0.5": Export(gate=0.5),
    "a tick early": Export(early_ticks=1),
    "a 96th early": Export(early_ticks=20),
    "plain naturals": Export(plain_naturals=True),
    "MPE": Export(bend_range=48, n_channels=7),
    "MPE, range not sent": Export(bend_range=48, n_channels=7, sends_range=False),
}
EXPORTS["all at once"] = replace(EXPORTS["MPE, range not sent"], gate=0.8, plain_naturals=True)


def as_midi(read: NoteText, export: Export) -> bytes:
    """Write the line, note after note, each on the next channel."""
    tempo = read.headers.tempo or DEFAULT_TEMPO
    track = mido.MidiTrack([mido.MetaMessage("set_tempo", tempo=mido.bpm2tempo(tempo))])
    if export.sends_range:
        for channel in range(export.n_channels):
            for control, value in ((101, 0), (100, 0), (6, export.bend_range), (38, 0)):
                track.append(mido.Message("control_change", channel=channel, control=control, value=value))
    wait = number = 0
    for item in read.items:
        if isinstance(item, Mark):
            wait += round(PAUSE_S.get(item, 0) * tempo / 60 * TICKS)
            continue
        ticks = round((item.beats or 0) * TICKS)
        if not isinstance(item, Note):
            wait += ticks
            continue
        cents = export.cents(item.pitch_cents)
        key = round(cents / 100)
        bend = round((cents - 100 * key) / (100 * export.bend_range) * 8192)
        channel, number = number % export.n_channels, number + 1
        sounding = round(ticks * export.gate) - export.early_ticks
        track.append(mido.Message("pitchwheel", channel=channel, pitch=bend, time=wait))
        track.append(mido.Message("note_on", channel=channel, note=key))
        track.append(mido.Message("note_off", channel=channel, note=key, time=sounding))
        wait = ticks - sounding
    file = BytesIO()
    mido.MidiFile(type=0, ticks_per_beat=TICKS, tracks=[track]).save(file=file)
    return file.getvalue()


@pytest.mark.parametrize("export", EXPORTS)
@pytest.mark.parametrize("path", sorted(EXAMPLES.glob("*.txt")), ids=lambda path: path.stem)
def test_an_export_is_answered_like_the_note_text(path: Path, export: str) -> None:
    text = without_mode(path.read_text(encoding="utf-8"))
    ours = answered(text.encode())
    other = answered(as_midi(read_note_text(text, PACK.names), EXPORTS[export]))
    assert notes_of(other) == notes_of(ours)
    assert told(other) == told(ours)
    assert other["whole"]["probability"] == pytest.approx(ours["whole"]["probability"], abs=NEARLY)
