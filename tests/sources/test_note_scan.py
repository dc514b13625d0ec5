"""Headers, lines and remarks of note text, and every place that cannot be read."""

import pytest

from melodycoach.core.note import Note
from melodycoach.core.pitch import COMMAS_53, NamedPitch, PitchNames, Spelling
from melodycoach.sources.note_scan import MAX_TEXT_CHARS, Comment, Headers, Scan
from melodycoach.sources.pack_file import load_pack

NAMES = load_pack("makam").names
WANTED = "a note such as 'B4-1', a pitch name, or one of - , . |"


def faults_of(text: str, *, with_headers: bool = True) -> list[str]:
    return [str(fault) for fault in Scan.of(text, NAMES, with_headers=with_headers).faults]


def cents_of(text: str) -> list[float]:
    scan = Scan.of(text, NAMES)
    assert scan.faults == []
    return [round(item.pitch_cents, 1) for item in scan.items if isinstance(item, Note)]


# --- headers -----------------------------------------------------------------------------------


def test_headers_are_read_in_any_order_and_letter_case():
    scan = Scan.of("Key: B-1 F#\nTEMPO:84.5\n\nfinal : segah\n  mode:  Hicaz   Zirgüle \ntitle: a\nB4", NAMES)
    assert scan.faults == []
    assert scan.headers == Headers(
        title="a",
        mode="Hicaz Zirgüle",
        final_cents=COMMAS_53.units_to_cents(8),
        tempo=84.5,
        key=(Spelling("B", 0, -1, 0), Spelling("F", 1, 0, 0)),
    )


def test_a_text_may_have_headers_alone_or_nothing_at_all():
    assert Scan.of("tempo: 60", NAMES).headers == Headers(tempo=60.0)
    assert Scan.of("", NAMES).headers == Headers()


def test_the_title_takes_its_whole_line_and_other_headers_stop_at_a_remark():
    scan = Scan.of(
        "title: Sketch #3 in A: slow # very\ntempo: 60 # or 66\nkey: F# # one sharp\nmode: x#y\n", NAMES
    )
    assert scan.faults == []
    assert scan.headers == Headers(
        "Sketch #3 in A: slow # very", "x#y", None, 60.0, (Spelling("F", 1, 0, 0),)
    )
    assert scan.comments == [Comment(0, "or 66"), Comment(0, "one sharp")]


def test_the_final_stands_under_the_key_signature_wherever_that_is_written():
    assert Scan.of("final: B4\nkey: B-1", NAMES).headers.final_cents == COMMAS_53.units_to_cents(8)
    assert Scan.of("final: tiz segah", NAMES).headers.final_cents == COMMAS_53.units_to_cents(61)


HEADERS = "title, mode, final, tempo or key"
NEITHER = f"is neither a note nor a pitch name, expected {WANTED};"
MISPLACED = "is a header, expected one before the first note only; put it at the top of the file"
NO_TEMPO = "is no tempo, expected beats a minute, from 10 to 500; mend it or delete it"
NO_PITCH = "is no pitch alone, expected one without length, such as 'A4';"
SAYS_NOTHING = "says nothing, expected a value after the colon; mend it or delete it"
NO_MARK = "is no mark of a key signature, expected letters with what alters them, such as B-1 F#;"


@pytest.mark.parametrize(
    ("text", "fault"),
    [
        ("tempoo: 60", f"1:1: 'tempoo' is no header, expected {HEADERS}; did you mean 'tempo'?"),
        (" zzz:", f"1:2: 'zzz' is no header, expected {HEADERS}; known: final, key, mode, tempo, title"),
        ("mode: a\nmode: b", "2:1: 'mode' is a second header of that name, expected one; delete one of them"),
        ("title:", f"1:1: 'title:' {SAYS_NOTHING}"),
        ("tempo: # 60", f"1:1: 'tempo:' {SAYS_NOTHING}"),
        ("tempo: fast", f"1:8: 'fast' {NO_TEMPO}"),
        ("tempo: 9.9", f"1:8: '9.9' {NO_TEMPO}"),
        ("tempo: 501", f"1:8: '501' {NO_TEMPO}"),
        ("tempo: nan", f"1:8: 'nan' {NO_TEMPO}"),
        (
            "title: a\x00b",
            "1:8: 'a\\x00b' holds a control character, expected plain text; mend it or delete it",
        ),
        ("final: dugah", None),
        (
            "final: segh",
            f"1:8: 'segh' is neither a note nor a pitch name, expected {WANTED}; did you mean 'segâh'?",
        ),
        ("final: A4:2", f"1:8: 'A4:2' {NO_PITCH} did you mean 'A4'?"),
        ("final: A4~", f"1:8: 'A4~' {NO_PITCH} did you mean 'A4'?"),
        ("final: .", f"1:8: '.' {NO_PITCH} mend it or delete it"),
        ("key:  Q", f"1:7: 'Q' {NO_MARK} mend it or delete it"),
        (
            "key: B-1 b+2",
            "1:10: 'b+2' marks a letter for the second time, expected each letter once; mend it or delete it",
        ),
        (
            "A4\n tempo: 6",
            f"2:2: 'tempo: 6' {MISPLACED}",
        ),
    ],
)
def test_a_header_that_cannot_be_read_says_what_was_expected(text: str, fault: str | None):
    assert faults_of(text) == ([fault] if fault else [])


def test_a_header_in_a_run_of_tokens_is_out_of_place():
    assert faults_of("tempo: 60", with_headers=False) == [
        "1:1: 'tempo: 60' is a header, expected only tokens here; put it at the top of the file"
    ]


def test_a_pitch_name_with_a_length_is_no_header():
    assert cents_of("segah:2") == cents_of("B4-1")
    assert cents_of("final: A4\nsegah:2") == cents_of("B4-1")
    names = PitchNames(COMMAS_53, (NamedPitch("low", 0, Spelling("A", 0, 0, 4)),))
    assert str(Scan.of("low: 2", names).faults[0]).startswith("1:1: 'low:' has the length ''")


# --- lines -------------------------------------------------------------------------------------


@pytest.mark.parametrize("newline", ["\n", "\r\n", "\r", "\u2028", "\x85", " ", "\t", "\u00a0", "\x0b"])
def test_line_ends_of_any_system_and_any_white_space_part_tokens(newline: str):
    assert cents_of(newline.join(["A4", "C5:2", "D5"])) == cents_of("A4 C5 D5")


def test_a_byte_order_mark_is_passed_over():
    assert cents_of("\ufeffA4") == [6900]
    assert Scan.of("\ufefftempo: 60", NAMES).headers.tempo == 60


def test_columns_count_characters_as_an_editor_shows_them():
    # the u of dügâh and the a are each followed by a combining sign here
    assert faults_of("du\u0308ga\u0302h xx")[0].startswith("1:7: 'xx'")
    assert faults_of("A4\r\n\r\n\tA4  xx")[0].startswith("3:6: 'xx'")


def test_a_key_signature_changes_bare_letters_of_the_whole_text():
    assert cents_of("key: B-1\nB4 B=4 Bb4 B4-2\nb4") == cents_of("B4-1 B4 Bb4 B4-2 B4-1")


def test_remarks_keep_their_place_and_empty_ones_are_dropped():
    scan = Scan.of("# before\n#\nA4 B4 #  two   words\n# own\nC5 #!\n # last", NAMES)
    assert scan.faults == []
    assert scan.comments == [
        Comment(0, "before", True),
        Comment(2, "two words", False),
        Comment(2, "own", True),
        Comment(3, "!", False),
        Comment(3, "last", True),
    ]


def test_a_sharp_inside_a_word_begins_no_remark():
    assert faults_of("F#5 D5#2")[0].startswith("1:5: 'D5#2'")


def test_every_bad_token_is_reported_in_order_and_good_ones_are_not():
    faults = Scan.of("A4 B segh\nC5 x\n\ntempo: 3 4\n; H4", NAMES).faults
    assert [(fault.line, fault.column, fault.token, fault.nearest) for fault in faults] == [
        (1, 4, "B", "B4"),
        (1, 6, "segh", "segâh"),
        (2, 4, "x", ""),
        (4, 1, "tempo: 3 4", ""),
        (5, 1, ";", ","),
        (5, 3, "H4", "B4"),
    ]


def test_a_missing_octave_is_chosen_near_the_note_before():
    faults = Scan.of("A5 B A3 B", NAMES).faults
    assert [fault.nearest for fault in faults] == ["B5", "B3"]


@pytest.mark.parametrize(
    ("text", "fault"),
    [
        ("A4 \x00B4", "1:4: '\\x00B4' holds a control character, expected plain text; did you mean 'B4'?"),
        ("A4 # \x07", "1:4: '\\x07' holds a control character, expected plain text; mend it or delete it"),
        ("\ud800", "1:1: '\\ud800' holds a control character, expected plain text; mend it or delete it"),
    ],
)
def test_control_characters_are_shown_not_printed(text: str, fault: str):
    assert faults_of(text) == [fault]


def test_a_text_too_long_is_refused_before_it_is_read():
    expected = (
        "1:1: 'A4 A4 A4 A4 A4 A4 A4' begins a text of 1000002 characters, expected at most 1000000; split it"
    )
    assert faults_of("A4 " * (MAX_TEXT_CHARS // 3 + 1)) == [expected.replace("A4 A4 A4 A4'", "A4 A4 A4 A4'")]


def test_of_very_many_bad_tokens_every_one_is_listed_but_only_the_first_have_a_nearest():
    faults = Scan.of(" ".join(f"A4:0{n}x" for n in range(400)), NAMES).faults
    assert len(faults) == 400
    assert [bool(fault.nearest) for fault in faults] == [True] * 300 + [False] * 100


def test_a_bad_token_that_comes_again_keeps_its_nearest():
    faults = Scan.of("segh " * 1000, NAMES).faults
    assert {fault.nearest for fault in faults} == {"segâh"}
