"""Which lines of MIDI files count as written, and what lengths, rests and pitches were written in them.

Outside sources: MIDI 1.0 for bends (8,192 steps are the range of registered parameter 0); MPE (RP-053) for
the range of 48 semitones. mido, a general MIDI library, writes the files. That exporters let notes sound for
50 to 99 % of their length is common practice.
"""

from __future__ import annotations

import io
import random
from fractions import Fraction
from itertools import accumulate
from typing import TYPE_CHECKING

import mido
import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.core.note import InputKind, Mark, Note, Silence
from melodycoach.core.pitch import COMMA_CENTS, COMMAS_53, SEMITONES_12
from melodycoach.core.sheet import usual_beat
from melodycoach.sources.midi_sheet import read_midi
from melodycoach.sources.midi_written import exact_pitches, in_beats, is_written

if TYPE_CHECKING:
    from collections.abc import Sequence

    from melodycoach.core.note import Item


def starts(*spans: int, first: int = 0) -> list[int]:
    return list(accumulate(spans, initial=first))


# --- written or played -------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("ticks", "division"),
    [
        ([0], 480),
        (starts(480, 240, 240, 720, 120), 480),
        (starts(160, 160, 160, 480, 80, 80, 320), 480),  # triplets of eighths and of 16ths
        (starts(30, 450, 480, 60, 420), 480),  # graces of a 64th and of a 32nd
        (starts(480, 240, first=240), 480),  # an upbeat
        (starts(480, 240, 240, 480, first=37), 480),  # nothing but the start is off
        (starts(480, 240, 240, 691, 480, 480, 240, 691, 480), 480),  # a breath of 1.2 s at 72 a minute
        (starts(6, 6, 12, 24, 18, 6), 24),  # 16ths where a quarter is 24 ticks
        (starts(24, 8, 8, 8, 12, 12, 6, 6, 24), 24),  # and triplets beside them
        (starts(33, 34, 33, 100, 50, 25, 25), 100),  # triplets that are no whole ticks
    ],
)
def test_a_line_on_the_grid_is_written(ticks: list[int], division: int) -> None:
    assert is_written(ticks, division)


@pytest.mark.parametrize(
    ("ticks", "division"),
    [
        ([7], 480),
        (starts(477, 246, 239, 484), 480),
        (starts(480, 247, first=7), 480),
        (starts(23, 13, 11, 25, 24, 12), 24),  # half of it by chance
        (starts(1, 1, 2, 1), 4),  # there is no other place
    ],
)
def test_a_line_off_the_grid_is_played(ticks: list[int], division: int) -> None:
    assert not is_written(ticks, division)


@pytest.mark.parametrize("division", [24, 48, 96, 120, 480, 960])
def test_hardly_any_played_line_is_taken_for_written(division: int) -> None:
    # quarters and eighths, each off by a fiftieth of a quarter and more: 10 ms at 120 a minute
    chance = random.Random(division)
    n_written = 0
    for _ in range(200):
        exact = [chance.choice((0.5, 1.0)) for _ in range(16)]
        ticks = starts(*(max(1, round(division * (one + chance.gauss(0, 0.06)))) for one in exact))
        n_written += is_written(ticks, division)
    assert n_written <= 10


# --- lengths and rests -------------------------------------------------------------------------


def in_quarters(spans: Sequence[tuple[float, float]], division: int = 480) -> list[tuple[float, float]]:
    """Read notes that sound so long and begin so far apart, in ticks; give lengths and rests in quarters."""
    at, line, ticks = 0, [], []
    for sounding, apart in spans:
        line.append(Note(6900, at / division, sounding / division, InputKind.KEYS))
        ticks.append((at, at + int(sounding)))
        at += int(apart)
    written = in_beats(line, ticks, division, COMMAS_53)
    told: list[tuple[float, float]] = []
    for item in written.items:
        if isinstance(item, Note):
            told.append(((item.beats or 0) * written.beat, 0.0))
        elif isinstance(item, Silence):
            told[-1] = (told[-1][0], (item.beats or 0) * written.beat)
    return [(round(length, 3), round(rest, 3)) for length, rest in told]


QUARTERS = (1, 1, 0.5, 0.5, 2, 0.5, 0.5, 1, 1.5, 0.5, 3)


@pytest.mark.parametrize("gate", [1, 0.95, 0.9, 0.8, 0.6, 0.5])
def test_a_gate_changes_no_length(gate: float) -> None:
    spans = [(480 * quarters * gate, 480 * quarters) for quarters in QUARTERS]
    assert in_quarters(spans) == [(quarters, 0) for quarters in QUARTERS]


@pytest.mark.parametrize("short", [1, 5, 20, 40])
def test_notes_that_end_some_ticks_early_are_whole(short: int) -> None:
    spans = [(480 * quarters - short, 480 * quarters) for quarters in QUARTERS]
    told = in_quarters(spans)
    assert told[:-1] == [(quarters, 0) for quarters in QUARTERS[:-1]]
    assert told[-1][0] == pytest.approx(QUARTERS[-1], abs=0.35)  # nothing comes after the last


@pytest.mark.parametrize("gate", [1, 0.9, 0.5])
def test_a_rest_is_found_through_a_gate(gate: float) -> None:
    # a quarter and a quarter rest, an eighth and an eighth rest, among quarters
    lengths = [1, 1, 1, 0.5, 1, 1, 1, 1, 1]
    spans = [(480 * length * gate, 480 * length) for length in lengths]
    spans[2], spans[3] = (480 * gate, 960), (240 * gate, 480)
    assert in_quarters(spans)[:5] == [(1, 0), (1, 0), (1, 1), (0.5, 0.5), (1, 0)]


def test_a_sixteenth_rest_counts_where_notes_touch() -> None:
    spans = [(480, 480), (360, 480), (480, 480), (480, 480), (480, 480)]
    assert in_quarters(spans)[1] == (0.75, 0.25)


def test_where_gates_are_mixed_a_gap_up_to_half_a_beat_is_how_a_note_is_played() -> None:
    gates = (0.5, 0.95, 0.6, 0.8, 0.55, 0.9, 0.7)
    spans = [(480 * gate, 480) for gate in gates] + [(480, 960), (480, 480)]
    assert in_quarters(spans) == [(1, 0)] * 7 + [(1, 1), (1, 0)]


def test_triggers_that_are_all_alike_are_no_notes_with_rests() -> None:
    # a 16th each, whatever follows; the file test08 of music21 is so
    apart = (240, 360, 240, 480, 360, 240, 480, 480, 240)
    assert [rest for _, rest in in_quarters([(120, one) for one in apart])] == [0] * 9


def test_two_notes_with_a_rest_between_are_no_short_ones() -> None:
    assert in_quarters([(480, 960), (480, 480)]) == [(1, 1), (1, 0)]


def test_rests_do_not_make_the_beat_longer() -> None:
    # half of the notes are eighths with an eighth rest; the note value, not the distance, is the beat
    line = [Note(6900, at, 0.5, InputKind.KEYS) for at in range(3)]
    written = in_beats(line, [(0, 240), (480, 720), (1440, 1680)], 480, COMMAS_53)
    assert written.beat == 0.5


def test_marks_stay_where_a_rest_is_and_seconds_as_they_sound() -> None:
    # a gate of one half: 2.5 s pass after a long note that is written without a rest
    line: list[Item] = [Note(6900, at, 0.5, InputKind.KEYS) for at in range(5)]
    line += [Note(6900, 5, 3, InputKind.KEYS), Mark.PHRASE_END, Note(6900, 11, 0.5, InputKind.KEYS)]
    line += [Mark.PHRASE_END, Note(6900, 16, 0.5, InputKind.KEYS)]
    ticks = [*((480 * at, 480 * at + 240) for at in range(5)), (2400, 3840), (5280, 5520), (7680, 7920)]
    items = in_beats(line, ticks, 480, COMMAS_53).items
    assert items[5:] == (
        Note(6900, 5, 3, InputKind.KEYS, beats=6),
        Note(6900, 11, 0.5, InputKind.KEYS, beats=1),
        Silence(4.5, beats=4),
        Mark.PHRASE_END,
        Note(6900, 16, 0.5, InputKind.KEYS, beats=1),
    )


def test_a_note_without_length_has_the_shortest_one() -> None:
    # note text can write no length of 0
    assert in_beats([Note(6900, 0, 0)], [(0, 0)], 480, COMMAS_53).items == (Note(6900, 0, 0, beats=0.01),)


# --- pitches -----------------------------------------------------------------------------------

# C4 D4 E4-1 F4 G4 A4 B4-1 in commas from A4: of the natural tones a whole one is 9, a half one 4
RAST = (-40, -31, -23, -18, -9, 0, 8)
PLAIN_RAST = (6000, 6200, 6400 - COMMA_CENTS, 6500, 6700, 6900, 7100 - COMMA_CENTS)


def test_pitches_on_the_commas_are_written() -> None:
    sounding = [
        6900 + units * COMMA_CENTS + error for units, error in zip(RAST, (0.3, -0.3) * 4, strict=False)
    ]
    exact, said = exact_pitches(sounding, COMMAS_53)
    assert list(exact.values()) == pytest.approx([6900 + units * COMMA_CENTS for units in RAST])
    assert said == "its pitches lie on whole commas, as written"


def test_altered_notes_beside_plain_naturals_are_written() -> None:
    # the naturals as a plain keyboard has them, and a comma less where the sign says so
    exact, said = exact_pitches(PLAIN_RAST, COMMAS_53)
    assert list(exact.values()) == pytest.approx([6900 + units * COMMA_CENTS for units in RAST])
    assert said == (
        "its bent notes lie whole commas off plain keys: all are read as the pitches that are written so"
    )


@pytest.mark.parametrize(
    ("cents", "units"),
    [
        (7000, 4),  # Bb4 as a plain key: 5 commas under B4, which is 9 above A4
        (6600, -14),  # F#4: 4 commas above F4
        (7100 - 5 * COMMA_CENTS, 4),  # Bb4, bent: the same pitch
        (6500 + 4 * COMMA_CENTS, -14),
        (7600 - 4 * COMMA_CENTS, 27),  # E5 is 31
        (7100 - 8 * COMMA_CENTS, 1),
    ],
)
def test_sharps_and_flats_beside_plain_naturals_are_written(cents: float, units: int) -> None:
    exact, _ = exact_pitches([*PLAIN_RAST, cents], COMMAS_53)
    assert exact[cents] == pytest.approx(6900 + units * COMMA_CENTS)


@pytest.mark.parametrize("cents", [7050, 7085, 7100 - 1.5 * COMMA_CENTS, 7000 + COMMA_CENTS])
def test_one_pitch_between_the_commas_says_that_none_is_written(cents: float) -> None:
    assert exact_pitches([*PLAIN_RAST, cents], COMMAS_53) == ({}, "")


def test_in_semitones_the_keys_are_the_units() -> None:
    assert exact_pitches([6900, 7101.2], SEMITONES_12) == (
        {6900: 6900, 7101.2: 7100},
        "its pitches lie on whole semitones, as written",
    )


def kinds_and_says(*pitches: float) -> tuple[set[InputKind], tuple[str, ...]]:
    kinds = [InputKind.KEYS if cents % 100 == 0 else InputKind.TUNED for cents in pitches]
    line = [Note(cents, at, 1, kind) for at, (cents, kind) in enumerate(zip(pitches, kinds, strict=True))]
    ticks = [(480 * at, 480 * at + 480) for at in range(len(line))]
    written = in_beats(line, ticks, 480, COMMAS_53)
    return {item.kind for item in written.items if isinstance(item, Note)}, written.says


def test_a_line_has_one_kind_of_pitch() -> None:
    assert kinds_and_says(6900, 7100, 7200) == ({InputKind.KEYS}, ())
    assert kinds_and_says(*PLAIN_RAST)[0] == {InputKind.TYPED}
    assert kinds_and_says(6900, 7050, 7200) == ({InputKind.TUNED}, ())  # quarter tones are as they sound


# --- the law: what is written is read ----------------------------------------------------------

LENGTHS = [Fraction(text) for text in ("1/4", "1/3", "1/2", "2/3", "1", "3/2", "2", "3", "4")]
RESTS = [Fraction(text) for text in ("1/2", "1", "2", "4")]
lines = st.lists(st.tuples(st.integers(-40, 40), st.sampled_from(LENGTHS)), min_size=1, max_size=24)


def as_midi(
    notes: Sequence[tuple[int, Fraction]],
    rests: dict[int, Fraction],
    division: int,
    bend_range: int,
    gate: Fraction,
    tempos: Sequence[int],
) -> bytes:
    """Write units and quarters with mido; rests, by the number of a note, come after it."""
    meta = mido.MidiTrack(
        mido.MetaMessage("set_tempo", tempo=one, time=division * place) for place, one in enumerate(tempos)
    )
    one = mido.MidiTrack()
    for control, value in ((101, 0), (100, 0), (6, bend_range), (38, 0)):
        one.append(mido.Message("control_change", control=control, value=value))
    wait = 0
    for number, (units, quarters) in enumerate(notes):
        key = round((6900 + units * COMMA_CENTS) / 100)
        bend = round((6900 + units * COMMA_CENTS - 100 * key) / (100 * bend_range) * 8192)
        sounding = round(quarters * gate * division)
        one.append(mido.Message("pitchwheel", pitch=bend, time=wait))
        one.append(mido.Message("note_on", note=key))
        one.append(mido.Message("note_off", note=key, time=sounding))
        wait = int((quarters + rests.get(number, 0)) * division) - sounding
    file = io.BytesIO()
    mido.MidiFile(type=1, ticks_per_beat=division, tracks=[meta, one]).save(file=file)
    return file.getvalue()


@given(
    lines,
    st.data(),
    st.sampled_from([24, 48, 96, 120, 192, 480, 960]),
    st.sampled_from([2, 12, 48]),
    st.lists(st.integers(200_000, 2_000_000), min_size=1, max_size=3),
)
def test_a_written_line_gives_back_its_beats_rests_and_pitches(
    notes: list[tuple[int, Fraction]], data: st.DataObject, division: int, bend_range: int, tempos: list[int]
) -> None:
    after = st.integers(0, max(len(notes) - 2, 0))
    n_rests = (len(notes) - 1) // 3  # so most notes touch the next one
    rests = data.draw(st.dictionaries(after, st.sampled_from(RESTS), max_size=n_rests))
    sheet = read_midi(as_midi(notes, rests, division, bend_range, Fraction(1), tempos), "a.mid")
    beat = usual_beat([float(quarters) for _, quarters in notes])
    written: list[tuple[float, float]] = []
    for item in sheet.items:
        if isinstance(item, Note):
            assert item.beats is not None
            written.append((item.beats, 0.0))
        elif isinstance(item, Silence):
            written[-1] = (written[-1][0], item.beats or 0)
    wanted = [
        (float(quarters) / beat, float(rests.get(number, 0)) / beat)
        for number, (_, quarters) in enumerate(notes)
    ]
    assert [length for length, _ in written] == pytest.approx([length for length, _ in wanted])
    assert [rest for _, rest in written] == pytest.approx([rest for _, rest in wanted])
    heard = [item.pitch_cents for item in sheet.items if isinstance(item, Note)]
    assert heard == pytest.approx([6900 + units * COMMA_CENTS for units, _ in notes], abs=1e-6)
    assert sheet.tempo == pytest.approx(60e6 / tempos[0] / beat, abs=1e-3)


@given(lines.filter(lambda notes: len(notes) > 4), st.sampled_from(["1/2", "3/5", "4/5", "9/10", "19/20"]))
def test_a_written_line_gives_back_its_beats_through_any_gate(
    notes: list[tuple[int, Fraction]], gate: str
) -> None:
    sheet = read_midi(as_midi(notes, {}, 960, 2, Fraction(gate), [500_000]), "a.mid")
    beat = usual_beat([float(quarters) for _, quarters in notes])
    heard = [item.beats for item in sheet.items if isinstance(item, Note)]
    assert heard == pytest.approx([float(quarters) / beat for _, quarters in notes])
    assert not any(isinstance(item, Silence) for item in sheet.items)
