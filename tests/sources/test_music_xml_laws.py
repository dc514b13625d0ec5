"""Laws of the reader of scores: what always holds, for every score and for what is none."""

import math
import re

import music21
import pytest
from hypothesis import given
from hypothesis import strategies as st
from music21.musicxml.m21ToXml import GeneralObjectExporter
from small_scores import attributes, grace, measures, mxl, note, notes, parts, score

from melodycoach.core.note import Mark, Note
from melodycoach.core.pitch import COMMAS_53, HIGHEST_CENTS, LOWEST_CENTS, SEMITONES_12, PitchNames
from melodycoach.core.sheet import Sheet
from melodycoach.errors import MelodycoachError
from melodycoach.sources.accidental_table import Notation
from melodycoach.sources.music_xml import read_music_xml
from melodycoach.sources.note_token import LONGEST_BEATS, SHORTEST_BEATS

NAMES = PitchNames(COMMAS_53)
NOTATIONS = st.sampled_from([None, *Notation])
RICH = parts(
    {
        "Ney": measures(
            attributes("<key><key-step>B</key-step><key-alter>-0.5</key-alter></key>")
            + '<sound tempo="90"/>'
            + notes("A4 B4", inside="<accidental>quarter-flat</accidental>")
            + grace("C5")
            + note("D5", 8, '<tie type="start"/><notations><tied type="start"/><fermata/></notations>'),
            note("D5", 8, '<tie type="stop"/>')
            + note("F5", 8, chord=True)
            + "<backup><duration>8</duration></backup>"
            + notes("G4 A4", voice="2"),
            '<barline location="left"><repeat direction="forward"/></barline>'
            + note("A4", 16)
            + '<barline><bar-style>light-heavy</bar-style><repeat direction="backward"/></barline>',
        ),
        "Ud": measures(
            attributes("<transpose><chromatic>-12</chromatic></transpose>", time="3/4") + notes("A3 B3 C4")
        ),
    }
)


def sound(sheet: Sheet) -> None:
    """Hold a sheet against what every sheet of a score keeps."""
    heard = [item for item in sheet.items if isinstance(item, Note)]
    assert heard
    assert len(heard) == len(sheet.places)
    assert sheet.items[-1] is Mark.PHRASE_END
    assert all(LOWEST_CENTS <= item.pitch_cents <= HIGHEST_CENTS for item in heard)
    assert all(SHORTEST_BEATS <= (item.beats or 0) <= LONGEST_BEATS for item in heard)
    assert all(math.isfinite(item.onset_s + item.duration_s) for item in heard)
    assert [item.onset_s for item in heard] == sorted(item.onset_s for item in heard)
    assert all(place.bar and place.beat >= 1 for place in sheet.places)
    assert all(sentence.isprintable() for sentence in (*sheet.says, *sheet.lost, sheet.title))


def read_or_refused(data: bytes, notation: Notation | None = None) -> None:
    """Read what can be read; whatever it is, no error but our own comes out, in one line."""
    for names in (NAMES, PitchNames(SEMITONES_12)):
        try:
            sheet = read_music_xml(data, "x", names, notation=notation)
        except MelodycoachError as error:
            said = str(error)
        else:
            sound(sheet)
            continue
        assert said.isprintable()


@given(st.binary(max_size=300), NOTATIONS)
def test_any_bytes_are_read_or_refused(data: bytes, notation: Notation | None) -> None:
    read_or_refused(data, notation)
    read_or_refused(b"<score-partwise>" + data, notation)
    read_or_refused(b"PK\x03\x04" + data, notation)


@given(st.data(), NOTATIONS)
def test_a_score_with_bytes_changed_or_lost_is_read_or_refused(
    data: st.DataObject, notation: Notation | None
) -> None:
    changed = bytearray(data.draw(st.sampled_from([RICH, mxl(RICH)])))
    for _ in range(data.draw(st.integers(1, 6))):
        place = data.draw(st.integers(0, len(changed) - 1))
        changed[place : place + data.draw(st.integers(0, 3))] = data.draw(st.binary(max_size=3))
    read_or_refused(bytes(changed[: data.draw(st.integers(0, len(changed)))]), notation)
    read_or_refused(bytes(changed), notation)


def words(text: str) -> st.SearchStrategy[str]:
    return st.sampled_from(re.findall(r"\S+", text))


NAMES_OF_ELEMENTS = words(
    """
    score-partwise score-timewise part-list score-part part-name midi-channel part measure attributes
    divisions key fifths key-step key-alter key-accidental key-octave time beats beat-type transpose
    diatonic chromatic octave-change clef sign note grace chord cue rest unpitched pitch step alter octave
    duration voice staff type dot accidental tie tied time-modification actual-notes normal-notes notations
    fermata breath-mark caesura trill-mark backup forward barline bar-style repeat ending direction sound
    metronome beat-unit beat-unit-dot per-minute work work-title
    """
)
TEXTS = st.just("") | words(
    """
    A B H 0 1 2 4 -1 -0.5 1e308 1e-308 99999999999999 nan x 3+2 flat koron quarter-flat slash-flat sharp-2
    quarter half percussion light-light
    """
)
ATTRIBUTES = st.dictionaries(
    st.sampled_from(
        ["id", "number", "type", "tempo", "location", "direction", "smufl", "implicit", "dacapo"]
    ),
    st.sampled_from(
        ["1", "P1", "start", "stop", "left", "middle", "backward", "forward", "yes", "120", "nan"]
    ),
    max_size=2,
)
TREES = st.recursive(
    st.tuples(NAMES_OF_ELEMENTS, ATTRIBUTES, TEXTS),
    lambda inner: st.tuples(NAMES_OF_ELEMENTS, ATTRIBUTES, st.lists(inner, max_size=6)),
    max_leaves=40,
)


def written(tree: tuple[str, dict[str, str], object]) -> str:
    name, attributes_, inside = tree
    said = "".join(f' {key}="{value}"' for key, value in attributes_.items())
    body = inside if isinstance(inside, str) else "".join(map(written, inside))  # type: ignore[call-overload]
    return f"<{name}{said}>{body}</{name}>"


@given(st.lists(TREES, max_size=6), NOTATIONS)
def test_any_elements_of_scores_in_any_order_are_read_or_refused(
    trees: list[tuple[str, dict[str, str], object]], notation: Notation | None
) -> None:
    inside = "".join(map(written, trees))
    for bar in (inside, attributes() + inside + note("A4")):
        read_or_refused(score(bar), notation)
        read_or_refused(
            f"<score-timewise>{measures(f'<part>{bar}</part>')}</score-timewise>".encode(), notation
        )
    read_or_refused(f"<score-partwise>{inside}</score-partwise>".encode(), notation)


LEAVES = st.tuples(
    st.sampled_from(["A4", "B4", "C5", "-"]),
    st.sampled_from(["4", "2", "0", "", "x", "1e308", "-3", "5.5", "40000"]),
    st.sampled_from(["1", "2", ""]),
    st.booleans(),
)


@given(st.lists(st.lists(LEAVES, max_size=5), min_size=1, max_size=4))
def test_bars_of_any_lengths_keep_the_order_of_time(bars: list[list[tuple[str, str, str, bool]]]) -> None:
    written_bars = [
        "".join(note(pitch, length, voice=voice, chord=chord) for pitch, length, voice, chord in bar)
        for bar in bars
    ]
    read_or_refused(score(*written_bars))


# --- against a general library -----------------------------------------------------------------

LENGTHS = st.sampled_from([0.25, 0.5, 0.75, 1.0, 1.5, 2.0, 3.0, 4.0, 1 / 3])


@given(st.lists(st.tuples(st.integers(40, 90) | st.none(), LENGTHS), min_size=1, max_size=25))
def test_what_music21_writes_reads_with_its_pitches_and_lengths(line: list[tuple[int | None, float]]) -> None:
    """Outside source: the library music21, which puts in bars, ties and rests of its own."""
    if all(pitch is None for pitch, _ in line):
        return
    stream = music21.stream.Part()
    for pitch, length in line:
        stream.append(music21.note.Note(pitch) if pitch else music21.note.Rest())
        stream[-1].quarterLength = length
    data = GeneralObjectExporter(stream).parse()
    sheet = read_music_xml(data, "x", NAMES, notation=Notation.LITERAL)
    sounding = [item for item in sheet.items if isinstance(item, Note)]
    assert [item.pitch_cents for item in sounding] == [100 * pitch for pitch, _ in line if pitch]
    beats = [item.beats for item in sounding]
    quarters = [length for pitch, length in line if pitch]
    assert [value / beats[0] for value in beats] == pytest.approx(
        [q / quarters[0] for q in quarters], rel=1e-4
    )  # type: ignore[operator]
