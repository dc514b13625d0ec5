"""XML that is made to do harm, or damaged, or in another encoding: read or refused in a sentence."""

import json
import subprocess
import sys
from pathlib import Path

import pytest
from small_scores import attributes, measures, note, parts, score

from melodycoach.core.pitch import COMMAS_53, PitchNames
from melodycoach.core.sheet import Sheet
from melodycoach.errors import MusicFileError
from melodycoach.sources.music_xml import read_music_xml
from melodycoach.sources.xml_elements import MAX_BARS, MAX_NOTES
from melodycoach.sources.xml_safe import (
    MAX_DEPTH,
    MAX_ELEMENTS,
    MAX_FILE_BYTES,
    MAX_NAMES,
    MAX_TAG_BYTES,
    MAX_TEXT,
    Handlers,
    parse_xml,
)

HEAD, TAIL = b'<score-partwise><part id="P1"><measure number="1">', b"</measure></part></score-partwise>"
A4 = b"<note><pitch><step>A</step><octave>4</octave></pitch><duration>1</duration></note>"


def read(data: bytes) -> Sheet:
    return read_music_xml(data, "draft.xml", PitchNames(COMMAS_53))


def refused(data: bytes) -> str:
    with pytest.raises(MusicFileError) as error:
        read(data)
    return str(error.value)


def filled(unit: bytes, head: bytes = HEAD, tail: bytes = TAIL, size: int = MAX_FILE_BYTES) -> bytes:
    """Fill a file up to the largest size with one thing."""
    return head + unit * ((size - len(head) - len(tail)) // len(unit)) + tail


def nothing(what: object) -> None:
    """Do nothing."""


def test_elements_come_with_their_attributes_and_text() -> None:
    seen: list[object] = []
    data = b"<a x='1'>\n<b> one &amp; t<!-- no -->wo </b><c/><d>no</d></a>"
    handlers = Handlers(
        seen.append, {"a": seen.append, "b": seen.append}, {"b": seen.append, "c": seen.append}
    )
    assert parse_xml(data, "x", handlers) == ()
    assert seen == ["a", {"x": "1"}, {}, "one & two", ""]


def test_a_long_text_is_cut() -> None:
    texts: list[str] = []
    data = b"<a>" + b"x" * (3 * MAX_TEXT) + b"</a>"
    parse_xml(data, "x", Handlers(nothing, {}, {"a": texts.append}))
    assert texts == ["x" * MAX_TEXT]


# --- what is never done ------------------------------------------------------------------------


@pytest.mark.parametrize(
    "declared",
    [
        '<!ENTITY a "x">',
        '<!ENTITY a SYSTEM "file:///etc/hostname">',
        '<!ENTITY a PUBLIC "a" "http://127.0.0.1:9/a">',
        '<!ENTITY % a SYSTEM "http://127.0.0.1:9/a.dtd"> %a;',
        '<!NOTATION n SYSTEM "n"><!ENTITY a SYSTEM "a.png" NDATA n>',
    ],
)
@pytest.mark.parametrize("encoding", ["utf-8", "utf-16"])
def test_an_entity_is_refused_as_soon_as_it_is_declared(declared: str, encoding: str) -> None:
    document = f"<!DOCTYPE score-partwise [{declared}]>\n<score-partwise>&a;</score-partwise>"
    assert refused(document.encode(encoding)) == (
        "draft.xml: line 1: declares the entity 'a', which no score needs and which can do harm; "
        "export the score again"
    )


def test_attributes_that_every_element_would_inherit_are_refused() -> None:
    declared = b'<!DOCTYPE score-partwise [<!ATTLIST note x CDATA "x">]>' + HEAD + A4 + TAIL
    assert refused(declared) == (
        "draft.xml: line 1: declares attributes of 'note', which no score needs and which can do harm; "
        "export the score again"
    )


def test_the_document_type_of_a_score_is_let_pass_and_entities_it_may_declare_are_left_out() -> None:
    data = score(note("A4"), title="Bir &eacute; gün")
    assert b"<!DOCTYPE" in data
    assert read(data).title == "Bir gün"


# --- caps --------------------------------------------------------------------------------------

TOO_MUCH = (
    "draft.xml: line 1: more or deeper XML than a score has; "
    "export the score again, the part with the melody alone"
)


@pytest.mark.parametrize(
    "data",
    [
        b"<score-partwise>" + b"<a>" * (MAX_DEPTH + 1),
        filled(b"<a/>", size=5 * MAX_ELEMENTS),
        b"<score-partwise>" + b"".join(b"<b%d/>" % n for n in range(MAX_NAMES + 20_000)),
        HEAD + b"<!--" + b"x" * (MAX_TAG_BYTES + 100_000),
        HEAD + b"<note " + b"".join(b'a%d="" ' % n for n in range(200_000)),
    ],
    ids=["depth", "elements", "names", "comment", "attributes"],
)
def test_more_than_a_score_has_is_refused(data: bytes) -> None:
    assert refused(data) == TOO_MUCH


def test_as_deep_as_allowed_is_read() -> None:
    inner = MAX_DEPTH - 4  # score, part, measure, note
    deep = b"<note>" + b"<x>" * inner + b"</x>" * inner
    assert len(read(HEAD + A4.replace(b"<note>", deep) + TAIL).places) == 1
    deeper = b"<note>" + b"<x>" * (inner + 1) + b"</x>" * (inner + 1)
    assert refused(HEAD + A4.replace(b"<note>", deeper) + TAIL) == TOO_MUCH


@pytest.mark.parametrize(
    ("data", "what"),
    [
        (HEAD + b"<note><rest/></note>" * (MAX_NOTES + 1), f"{MAX_NOTES} notes"),
        (b'<score-partwise><part id="P1">' + b"<measure/>" * (MAX_BARS + 1), f"{MAX_BARS} bars"),
    ],
    ids=["notes", "bars"],
)
def test_more_notes_or_bars_than_are_read_are_refused(data: bytes, what: str) -> None:
    assert refused(data) == (
        f"draft.xml: more than {what}, which is the most that is read of a score; "
        "export the part with the melody alone"
    )


def test_a_file_that_is_too_long_is_refused_unread() -> None:
    assert refused(b"<" * (MAX_FILE_BYTES + 1)) == (
        "draft.xml: more than 20 MB, which is the most that is read of a score; "
        "export the part with the melody alone"
    )


HOSTILE = {
    "laughs": b'<!DOCTYPE a [<!ENTITY a "ha">'
    + b"".join(b'<!ENTITY a%d "&a%d;&a%d;">' % (n, n - 1, n - 1) for n in range(2, 40))
    + b"]><score-partwise>&a39;</score-partwise>",
    "deep": b"<score-partwise>" + b"<a>" * 3_000_000,
    "deep declaration": b"<!DOCTYPE a [<!ELEMENT a " + b"(" * 3_000_000,
    "one tag": b"<score-partwise " + b"".join(b'a%d="" ' % n for n in range(1_500_000)) + b"/>",
    "text": filled(b"x", HEAD + b"<words>", b"</words>" + TAIL),
    "comments": filled(b"<!-- -->"),
    "tempos": filled(b'<sound tempo="100"/>'),
    "signs": filled(b"<key-step>A</key-step>", HEAD + b"<key>", b"</key>" + TAIL),
    "notes": filled(A4),
    "bars": b'<score-partwise><part id="P1">'
    + b"".join(b'<measure number="%d">%s</measure>' % (n, A4) for n in range(MAX_BARS - 1))
    + b"</part></score-partwise>",
    "odd signs": HEAD
    + b"".join(
        A4.replace(b"</note>", b'<accidental smufl="acc%d">x%d</accidental></note>' % (n, n))
        for n in range(MAX_NOTES - 1)
    )
    + TAIL,
}

MEASURE = """
import json, resource, sys, time
from melodycoach.core.pitch import COMMAS_53, PitchNames
from melodycoach.errors import MelodycoachError
from melodycoach.sources.music_xml import read_music_xml
data = open(sys.argv[1], "rb").read()
began = time.process_time()
try:
    read_music_xml(data, "x", PitchNames(COMMAS_53))
except MelodycoachError:
    pass
megabytes = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
print(json.dumps([time.process_time() - began, megabytes]))
"""


@pytest.mark.slow
@pytest.mark.skipif(sys.platform != "linux", reason="counts memory as Linux does")
@pytest.mark.parametrize("kind", HOSTILE)
def test_no_file_takes_more_than_two_seconds_or_200_megabytes(kind: str, tmp_path: Path) -> None:
    path = tmp_path / "hostile.xml"
    path.write_bytes(HOSTILE[kind])
    # a shell between them, since a child starts with the peak memory of the process it comes from
    command = ["sh", "-c", '"$0" -c "$1" "$2"; true', sys.executable, MEASURE, str(path)]
    out = subprocess.run(command, capture_output=True, check=True, text=True).stdout
    seconds, megabytes = json.loads(out)
    assert seconds < 2
    assert megabytes < 200


# --- damage ------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("data", "text"),
    [
        (b"", "the file is empty, expected a score; export the score again"),
        (b" \n\t ", "the file is empty, expected a score; export the score again"),
        (
            b"<score-partwise>\n <part>\n  </prat>",
            (
                "line 3, column 5: this is no well-formed XML (mismatched tag), expected a score; "
                "export the score again"
            ),
        ),
        (b"<score-partwise>\n<part>", "line 2, column 7: the file breaks off here; export or fetch it again"),
        (b"<score-partwise>\n<par", "line 2, column 1: the file breaks off here; export or fetch it again"),
        (b"<!-- nothing -->", "line 1, column 17: the file breaks off here; export or fetch it again"),
        (
            b"A4 B4-1",
            (
                "line 1, column 1: this is no well-formed XML (syntax error), expected a score; "
                "export the score again"
            ),
        ),
        (
            b"<!doctype html>\n<html><body>Not found</body></html>",
            "this is a web page, expected a score; download the score itself",
        ),
        (
            b"<?xml version='1.0'?><HTML xmlns='http://www.w3.org/1999/xhtml'/>",
            "this is a web page, expected a score; download the score itself",
        ),
        (
            b"<svg/>",
            (
                "this is XML of another kind, with 'svg' as its root, expected a MusicXML score; "
                "export the score as MusicXML"
            ),
        ),
    ],
)
def test_what_is_no_score_is_refused_with_what_it_is_or_where_it_breaks(data: bytes, text: str) -> None:
    assert refused(data) == f"draft.xml: {text}"


def test_white_space_before_the_declaration_does_no_harm() -> None:
    assert read(b"\r\n  " + score(note("A4"))).title == "Deneme"


# --- encodings ---------------------------------------------------------------------------------


def encoded(encoding: str, declared: str | None, title: str = "Şu dağlar") -> bytes:
    """Write a score in one encoding that says it is in another."""
    text = parts({"Ney": measures(attributes() + note("A4"))}, title=title).decode()
    said = f' encoding="{declared}"' if declared else ""
    return text.replace(' encoding="UTF-8"', said).encode(encoding)


@pytest.mark.parametrize(
    ("encoding", "declared"),
    [
        ("utf-8", "UTF-8"),
        ("utf-8", "utf8"),
        ("utf-8", None),
        ("utf-8-sig", "UTF-8"),
        ("utf-16", "UTF-16"),
        ("utf-16-le", "UTF-16"),
        ("utf-16-le", "utf-16le"),
        ("utf-16-be", "UTF-16BE"),
        ("utf-16-be", None),
        ("utf-16", "UTF-16LE" if sys.byteorder == "little" else "UTF-16BE"),
        ("utf-16", None),
        ("windows-1254", "windows-1254"),
        ("iso-8859-9", "ISO-8859-9"),
        ("cp857", "cp857"),
    ],
)
def test_a_score_reads_the_same_in_every_encoding(encoding: str, declared: str | None) -> None:
    sheet = read(encoded(encoding, declared))
    assert (sheet.title, len(sheet.places)) == ("Şu dağlar", 1)
    assert not any("letters" in sentence for sentence in sheet.says)


@pytest.mark.parametrize(
    ("encoding", "declared", "used"),
    [
        ("utf-8", "UTF-16", "UTF-8"),
        ("utf-8", "ISO-8859-9", "UTF-8"),
        ("utf-8", "klingon", "UTF-8"),
        ("windows-1254", "UTF-8", "windows-1254"),
        ("windows-1254", None, "windows-1254"),
        ("windows-1254", "klingon", "windows-1254"),
        ("windows-1254", "utf-7", "windows-1254"),
        ("windows-1254", "shift_jis", "windows-1254"),
        ("utf-16", "UTF-8", "UTF-16"),
        ("utf-16", "klingon", "UTF-16"),
        ("utf-16-be", "UTF-16LE", "UTF-16"),
        ("utf-16-le", "UTF-16BE", "UTF-16"),
    ],
)
def test_a_wrong_declaration_is_put_right_and_said(encoding: str, declared: str | None, used: str) -> None:
    sheet = read(encoded(encoding, declared))
    assert sheet.title == "Şu dağlar"
    assert sheet.says[0] == (
        f"the file says that its letters are in {declared or 'UTF-8'}, which they are not: read as {used}"
    )


@pytest.mark.parametrize("declared", ["klingon", "UTF-16", "cp037"])
def test_a_wrong_declaration_is_said_where_all_letters_are_plain_too(declared: str) -> None:
    sheet = read(encoded("ascii", declared, "Su"))
    assert sheet.title == "Su"
    assert sheet.says[0] == (
        f"the file says that its letters are in {declared}, which they are not: read as UTF-8"
    )


@pytest.mark.parametrize("declared", [None, "UTF-8", "iso-8859-1", "shift_jis", "US-ASCII"])
def test_plain_letters_are_the_same_in_most_encodings_and_nothing_is_said(declared: str | None) -> None:
    assert not any("letters" in sentence for sentence in read(encoded("ascii", declared, "Su")).says)


def test_bytes_that_are_letters_in_no_encoding_are_refused_with_their_place() -> None:
    data = encoded("utf-8", "UTF-8", "@").replace(b"@", b"\x81\xff")
    assert refused(data).startswith("draft.xml: line 3, column ")


def test_a_file_that_ends_within_a_letter_is_refused() -> None:
    assert refused(b"<score-partwise>" + "ş".encode()[:1]) == (
        "draft.xml: line 1, column 18: the file breaks off here; export or fetch it again"
    )
