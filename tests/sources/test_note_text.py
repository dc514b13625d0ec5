"""Whole texts: read, written, read again; and the examples of the page for musicians."""

import re
import unicodedata
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from melodycoach.core.note import InputKind, Mark, Note, Silence
from melodycoach.core.pitch import COMMAS_53, SEMITONES_12, PitchNames, Spelling
from melodycoach.errors import MelodycoachError, NoteTextError
from melodycoach.sources.note_text import (
    LINE_WIDTH,
    Comment,
    Headers,
    NoteText,
    find_faults,
    lay_out,
    read_note_text,
    read_tokens,
    write_note_text,
)
from melodycoach.sources.note_token import Misread, read_token
from melodycoach.sources.pack_file import load_pack

NAMES = load_pack("makam").names
TWELVE = PitchNames(SEMITONES_12)
PAGE = Path(__file__).parents[2] / "docs" / "note-text.md"


def written(text: NoteText, names: PitchNames = NAMES, *, as_names: bool = False) -> str:
    return write_note_text(text.headers, text.items, names, comments=text.comments, as_names=as_names)


# --- laws --------------------------------------------------------------------------------------

WORDS = st.lists(st.text(st.characters(categories=("L", "N", "P", "S")), min_size=1, max_size=8), max_size=4)
PHRASES = WORDS.map(lambda words: unicodedata.normalize("NFC", " ".join(words)))
BEATS = (
    st.floats(0.01, 10_000)
    | st.sampled_from([1.0, 2.0, 0.5, 0.25, 1.5, 1 / 3])
    | st.integers(1, 99).map(float)
)
KEYS = st.lists(
    st.builds(
        Spelling,
        st.sampled_from("CDEFGAB"),
        st.integers(-2, 2),
        st.integers(-900, 900).map(lambda hundredths: hundredths / 100),
        st.just(0),
    ).filter(lambda mark: mark.accidentals or mark.units),
    max_size=4,
    unique_by=lambda mark: mark.letter,
).map(tuple)


def headers(names: PitchNames) -> st.SearchStrategy[Headers]:
    return st.builds(
        Headers,
        title=PHRASES,
        mode=PHRASES.filter(lambda text: "#" not in text),
        final_cents=st.none() | pitches(names),
        tempo=st.none() | st.floats(10, 500),
        key=KEYS,
    )


def pitches(names: PitchNames) -> st.SearchStrategy[float]:
    lowest, highest = names.system.cents_to_units(0), names.system.cents_to_units(12700)
    hundredths = st.integers(int(lowest * 100), int(highest * 100))
    return (hundredths.map(lambda n: n / 100) | st.integers(-58, 58)).map(names.system.units_to_cents)


def texts(names: PitchNames) -> st.SearchStrategy[NoteText]:
    """Every text that reading can give."""
    item = st.one_of(
        st.builds(lambda cents, beats: Note(cents, 0.0, 0.0, beats=beats), pitches(names), BEATS),
        st.builds(
            lambda key, beats: Note(100.0 * key, 0.0, 0.0, InputKind.KEYS, beats), st.integers(0, 127), BEATS
        ),
        st.builds(lambda beats: Silence(0.0, beats), BEATS),
        st.sampled_from(Mark),
    )

    @st.composite
    def build(draw: st.DrawFn) -> NoteText:
        top = draw(headers(names))
        items = lay_out(draw(st.lists(item, max_size=30)), 0.0, top.tempo or 72)
        remarks = draw(
            st.lists(st.tuples(st.integers(0, len(items)), PHRASES.filter(bool), st.booleans()), max_size=4)
        )
        comments, taken = [], {0}
        for before, text, own_line in sorted(remarks, key=lambda remark: remark[0]):
            comments.append(Comment(before, text, own_line or before in taken))
            taken.add(before)
        return NoteText(top, items, tuple(comments))

    return build()


@pytest.mark.parametrize("names", [NAMES, PitchNames(COMMAS_53), TWELVE], ids=["makam", "53", "12"])
@pytest.mark.parametrize("as_names", [False, True])
@given(data=st.data())
def test_what_is_written_reads_back_as_the_same_value(names: PitchNames, as_names: bool, data: st.DataObject):
    text = data.draw(texts(names))
    assert read_note_text(written(text, names, as_names=as_names), names) == text


@given(texts(NAMES))
def test_what_was_written_once_is_written_the_same_again(text: NoteText):
    once = written(text)
    assert written(read_note_text(once, NAMES)) == once


# fmt: off
TOKENS = st.sampled_from([
    "A4", "b4-1", "segah", "TİZ-SEGÂH", "F#5~", "Gb5:1/2", "-", "-:3", ",", ".", "|", "#", "#x", "B=4",
    "mode:x", "key:", "tempo:", "66", "B", "segh", "C44", "A4:0", "\n", "\r\n", "\ufeff", "\x00", "\x85",
    "key: B-1 F#\n", "tempo: 66\n", "title: a # b\n", "du\u0308gah", "final: B4\n",
])
# fmt: on


def refusal_of(raw: str) -> NoteTextError | None:
    try:
        read_note_text(raw, NAMES)
    except NoteTextError as error:
        return error
    return None


@settings(max_examples=300)
@given(st.text() | st.lists(TOKENS).map(" ".join) | st.lists(TOKENS | st.text(max_size=3)).map("".join))
def test_any_text_at_all_is_read_or_refused_with_a_line_for_each_fault(raw: str):
    faults, error = find_faults(raw, NAMES), refusal_of(raw)
    if error is None:
        assert faults == ()
        text = read_note_text(raw, NAMES)
        once = written(text)
        assert read_note_text(once, NAMES) == text
        assert written(read_note_text(once, NAMES)) == once
    else:
        assert faults
        assert error.faults == tuple(f"line:{fault}" for fault in faults)
        assert str(error).startswith("line:")
        assert "\n" not in str(error)


@given(st.text() | st.lists(TOKENS).map(" ".join))
def test_any_run_of_tokens_is_read_or_refused(raw: str):
    if find_faults(raw, NAMES, with_headers=False):
        with pytest.raises(NoteTextError, match=r"^entry:"):
            read_tokens(raw, NAMES, 5.0, 90)
    else:
        items = read_tokens(raw, NAMES, 5.0, 90)
        assert all(item.onset_s >= 5.0 for item in items if isinstance(item, Note))


@given(st.lists(st.sampled_from(["A4", "B4-1:2", "-", ",", ".", "|", "segah:0.5", "F#5~"])), st.data())
def test_a_line_read_in_two_runs_is_the_line_read_at_once(tokens: list[str], data: st.DataObject):
    cut = data.draw(st.integers(0, len(tokens)))
    tempo = 60.0  # a beat is a second, so that sums of halves are exact
    first = read_tokens(" ".join(tokens[:cut]), NAMES, 0.0, tempo)
    gone_s = sum(item.duration_s for item in first if not isinstance(item, Mark))
    second = read_tokens(" ".join(tokens[cut:]), NAMES, gone_s, tempo)
    assert first + second == read_tokens(" ".join(tokens), NAMES, 0.0, tempo)


# --- worked cases ------------------------------------------------------------------------------


def test_times_follow_from_beats_and_tempo():
    # 72 beats a minute: a beat is 60 / 72 = 0.8333 s; A4 1 beat, rest 2 beats, B4 half a beat
    first, rest, second = read_note_text("A4 -:2 B4:1/2", NAMES).items
    assert isinstance(first, Note)
    assert isinstance(rest, Silence)
    assert isinstance(second, Note)
    assert (first.onset_s, first.duration_s, first.beats) == (0, pytest.approx(60 / 72), 1)
    assert (rest.duration_s, rest.beats) == (pytest.approx(120 / 72), 2)
    assert (second.onset_s, second.duration_s) == (pytest.approx(180 / 72), pytest.approx(30 / 72))


def test_a_run_of_tokens_starts_where_it_is_told():
    items = read_tokens("A4 , B4", NAMES, 7.5, 120)
    assert items == (Note(6900.0, 7.5, 0.5, beats=1.0), Mark.BREATH, read_tokens("B4", NAMES, 8.0, 120)[0])
    assert read_tokens("  # nothing", NAMES, 0.0, 72) == ()


def test_a_text_is_tidied_once_and_for_all():
    raw = "key: segah\n\n\n# first\na4   B4 b=4 . # end\n  Gb5 muhayyer:4/2 ,"
    tidy = "key: B-1\n\n# first\nA4 B4 B=4 . # end\nF#5 A5:2 ,\n"
    assert written(read_note_text(raw, NAMES)) == tidy


def test_a_text_can_be_written_in_names():
    text = read_note_text("mode: huseyni\nE5 F#5~ F#5 B4-1.4 A4+1 .", NAMES)
    assert written(text, as_names=True) == "mode: huseyni\n\nhüseynî F#5~ eviç segâh-0.4 A4+1 .\n"


def test_nothing_is_written_as_nothing():
    assert written(NoteText()) == ""
    assert read_note_text("", NAMES) == NoteText()


def test_a_long_phrase_is_broken_at_the_width_of_a_line():
    text = written(read_note_text("B4-1:0.5 " * 100, NAMES))
    lines = text.splitlines()
    assert len(lines) == 10
    assert max(map(len, lines)) <= LINE_WIDTH
    # eleven tokens of eight signs and the spaces between: 11 * 8 + 10 = 98; another would make 107
    assert len(lines[0]) == 98


KEYBOARD = InputKind.KEYS


def test_a_played_line_is_saved_in_beats_with_its_pauses_as_rests():
    # at 60 beats a minute: 0.333 s is 0.33 beats; from 0.333 to 0.4 is no pause, from 1.0 to 1.5 is one
    line = [
        Note(6900.0, 0.0, 0.333, KEYBOARD),
        Note(7100.0, 0.4, 0.6, KEYBOARD),
        Mark.BREATH,
        Note(7200.0, 1.5, 0.001, KEYBOARD),
        Mark.PHRASE_END,
        Note(7000.0, 1.501, 2.0, InputKind.TUNED),
    ]
    assert write_note_text(Headers(), line, NAMES, 60) == (
        "tempo: 60\n\nA4~:0.33 B4~:0.6 , -:0.5 C5~:0.01 .\nBb4+0.42:2\n"
    )


def test_a_rest_that_is_written_is_not_written_twice():
    line = [Note(6900.0, 0.0, 1.0, KEYBOARD), Silence(2.0), Note(6900.0, 3.0, 1.0, KEYBOARD)]
    assert write_note_text(Headers(tempo=60.0), line, NAMES) == "tempo: 60\n\nA4~ -:2 A4~\n"


def test_what_stands_before_the_first_note_played_is_not_a_rest():
    assert (
        write_note_text(Headers(), [Silence(1.0, 1.0), Note(6900.0, 9.0, 60 / 72, KEYBOARD)], NAMES)
        == "- A4~\n"
    )


@pytest.mark.parametrize(
    ("tempo", "header"),
    [(None, "tempo: 90\n\n"), (90.0, "tempo: 90\n\n"), (60.5, "tempo: 60.5\n\n"), (72, "tempo: 72\n\n")],
)
def test_the_tempo_that_lengths_were_counted_at_is_written(tempo: float | None, header: str):
    note = Note(6900.0, 0.0, 60.0 / (tempo or 90), KEYBOARD)
    assert write_note_text(Headers(tempo=90.0), [note], NAMES, tempo) == header + "A4~\n"


def test_the_usual_tempo_needs_no_header():
    note = Note(6900.0, 0.0, 60 / 72, KEYBOARD)
    assert (
        write_note_text(Headers(), [note], NAMES, 72.0)
        == write_note_text(Headers(), [note], NAMES)
        == "A4~\n"
    )


def test_words_from_elsewhere_are_kept_on_their_line():
    assert write_note_text(Headers(title="a\n b", mode="c\td"), [], NAMES) == "title: a b\nmode: c d\n"
    assert write_note_text(Headers(), [], NAMES, comments=[Comment(0, "a\nb", own_line=False)]) == "# a b\n"


def test_values_cannot_be_changed():
    text = read_note_text("A4", NAMES)
    with pytest.raises(AttributeError):
        text.items = ()  # type: ignore[misc]


# --- errors ------------------------------------------------------------------------------------


def test_one_bad_token_is_one_sentence():
    with pytest.raises(NoteTextError) as caught:
        read_note_text("A4 B C5", NAMES, "sketch.txt")
    expected = "sketch.txt:1:4: 'B' has no octave, expected one, such as the 4 of 'A4'; did you mean 'B4'?"
    assert str(caught.value) == expected
    assert caught.value.faults == (expected,)
    assert isinstance(caught.value, MelodycoachError)
    assert isinstance(caught.value, ValueError)


def test_many_bad_tokens_are_summed_up_and_all_listed():
    with pytest.raises(NoteTextError) as caught:
        read_note_text("A4 B xx\nsegh H4 .", NAMES)
    assert str(caught.value) == (
        "line: 4 places that cannot be read: 1:4 'B', did you mean 'B4'?; 1:6 'xx', mend it or delete it; "
        "2:1 'segh', did you mean 'segâh'?; and 1 more"
    )
    assert [fault.split(" ")[0] for fault in caught.value.faults] == [
        "line:1:4:",
        "line:1:6:",
        "line:2:1:",
        "line:2:6:",
    ]


def test_the_entry_tells_of_its_own_faults():
    with pytest.raises(NoteTextError) as caught:
        read_tokens("tempo: 60\nsegh", NAMES, 0.0, 72)
    assert str(caught.value) == (
        "entry: 2 places that cannot be read: 1:1 'tempo: 60', put it at the top of the file; "
        "2:1 'segh', did you mean 'segâh'?"
    )


def test_faults_can_be_had_without_an_error():
    assert [fault.nearest for fault in find_faults("A4 B", NAMES)] == ["B4"]
    assert find_faults("tempo: 60", NAMES) == ()
    assert len(find_faults("tempo: 60", NAMES, with_headers=False)) == 1


@pytest.mark.slow
def test_a_million_characters_of_rubbish_are_listed_in_full():
    assert len(find_faults("qx:-,#z " * 125_000, NAMES)) == 125_000


# --- the page for musicians --------------------------------------------------------------------

BLOCKS = re.findall(r"^```(\w+)\n(.*?)^```$", PAGE.read_text("utf-8"), re.DOTALL | re.MULTILINE)
ROWS = re.findall(r"^\| `([^`]+)` \| (-?[\d.]+) \| (.+?) \|$", PAGE.read_text("utf-8"), re.MULTILINE)


def test_the_page_has_examples_of_every_sort():
    assert {kind for kind, _ in BLOCKS} == {"notes", "written", "wrong", "says"}
    assert len(ROWS) >= 15


@pytest.mark.parametrize("block", [body for kind, body in BLOCKS if kind in {"notes", "written"}])
def test_every_line_of_the_page_can_be_read(block: str):
    assert read_note_text(block, NAMES).items


def test_the_line_in_letters_and_the_line_in_names_are_one():
    (_, letters), (_, named) = BLOCKS[:2]
    assert read_note_text(letters, NAMES) == read_note_text(named, NAMES)
    assert written(read_note_text(named, NAMES)) == letters
    assert written(read_note_text(letters, NAMES), as_names=True) == named


def test_the_tidied_sketch_of_the_page_is_what_is_written():
    sketches = [body for kind, body in BLOCKS if kind == "notes" and "title:" in body]
    tidied = [body for kind, body in BLOCKS if kind == "written"]
    assert [written(read_note_text(sketch, NAMES)) for sketch in sketches] == tidied


def test_the_faults_of_the_page_are_what_is_said():
    (wrong,), (says,) = ([body for kind, body in BLOCKS if kind == wanted] for wanted in ("wrong", "says"))
    with pytest.raises(NoteTextError) as caught:
        read_note_text(wrong, NAMES, "sketch.txt")
    assert list(caught.value.faults) == says.splitlines()


@pytest.mark.parametrize(("token", "commas", "meaning"), ROWS)
def test_every_token_of_the_page_is_the_pitch_it_says(token: str, commas: str, meaning: str):
    note = read_token(token, NAMES)
    assert not isinstance(note, Misread)
    assert isinstance(note, Note)
    assert note.pitch_cents == COMMAS_53.units_to_cents(float(commas))
    perde = NAMES.find(meaning.split(",")[0])
    assert perde is None or abs(perde.units - float(commas)) < 2


def test_every_item_has_its_line_and_column_in_the_text() -> None:
    text = "title: Sketch\n\n  A4  B4-1 , # a remark\n|\tsegâh:2 .\n"
    read = read_note_text(text, NAMES)
    assert read.places == ((3, 3), (3, 7), (3, 12), (4, 1), (4, 3), (4, 11))
    assert len(read.places) == len(read.items)
