"""Compressed scores: the score is found, and a zip made to do harm is refused."""

import struct
import zipfile
from collections.abc import Callable

import pytest
from hypothesis import given
from hypothesis import strategies as st
from small_scores import container, mxl, note, score, zipped

from melodycoach.errors import MusicFileError
from melodycoach.sources.xml_container import CONTAINER, MAX_ZIP_ENTRIES, unpack_score
from melodycoach.sources.xml_safe import MAX_FILE_BYTES

PLAIN = score(note("A4"))
OTHER = score(note("B4"))


def refused(data: bytes) -> str:
    with pytest.raises(MusicFileError) as error:
        unpack_score(data, "draft.mxl")
    return str(error.value)


def test_the_score_is_the_first_root_file_whatever_else_is_packed() -> None:
    data = zipped(
        [
            ("mimetype", "application/vnd.recordare.musicxml"),
            ("a.xml", OTHER),
            (
                CONTAINER,
                (
                    '<container><rootfiles><rootfile full-path="b/score.xml"/>'
                    '<rootfile full-path="a.xml"/></rootfiles></container>'
                ),
            ),
            ("b/score.xml", PLAIN),
            ("picture.png", b"\x89PNG"),
        ]
    )
    assert unpack_score(data, "draft.mxl") == (PLAIN, ())


def test_a_stored_score_is_read_as_a_deflated_one() -> None:
    entries = [(CONTAINER, container("s.xml")), ("s.xml", PLAIN)]
    assert unpack_score(zipped(entries, zipfile.ZIP_STORED), "x") == unpack_score(zipped(entries), "x")


@pytest.mark.parametrize(
    "container_says",
    [[], [(CONTAINER, "<container/>")]],
    ids=["no container", "names none"],
)
def test_without_a_word_on_which_is_the_score_the_only_one_is_taken_and_it_is_said(
    container_says: list[tuple[str, str]],
) -> None:
    data = zipped([*container_says, ("cover.png", b"x"), ("__MACOSX/s.xml", b"x"), ("my/s.MusicXML", PLAIN)])
    assert unpack_score(data, "draft.mxl") == (
        PLAIN,
        ("the compressed file does not say which file is the score: 'my/s.MusicXML' is the only one",),
    )


def test_a_container_that_names_a_missing_file_is_said_and_the_only_score_taken() -> None:
    named = (CONTAINER, container("lost.xml"))
    assert unpack_score(zipped([named, ("cover.png", b"x"), ("s.xml", PLAIN)]), "draft.mxl") == (
        PLAIN,
        ("the compressed file names 'lost.xml' as the score, which is not in it: 's.xml' is the only one",),
    )
    start = "draft.mxl: the compressed file names 'lost.xml' as the score, which is not in it, and "
    assert refused(zipped([named, ("a.xml", PLAIN), ("b.xml", OTHER)])) == (
        f"{start}2 look like one, 'a.xml' and 'b.xml' among them; unpack it and open the score itself"
    )
    assert refused(zipped([named])) == (
        f"{start}none in it looks like one; unpack it and open the score itself"
    )


def test_without_a_word_several_scores_or_none_are_refused() -> None:
    start = "draft.mxl: the compressed file does not say which file is the score, and "
    assert refused(zipped([("a.xml", PLAIN), ("b.xml", OTHER), ("c.xml", OTHER)])) == (
        f"{start}3 look like one, 'a.xml' and 'b.xml' among them; unpack it and open the score itself"
    )
    assert refused(zipped([("a.png", b"x")])) == (
        f"{start}none in it looks like one; unpack it and open the score itself"
    )


def test_a_container_that_is_no_xml_is_refused_under_its_name() -> None:
    assert refused(zipped([(CONTAINER, "<a>"), ("a.xml", PLAIN)])) == (
        f"draft.mxl: {CONTAINER}: line 1, column 4: the file breaks off here; export or fetch it again"
    )


def test_what_would_unpack_to_more_than_a_score_is_refused() -> None:
    bomb = mxl(b"<a>" + bytes(15 * MAX_FILE_BYTES))
    assert len(bomb) < MAX_FILE_BYTES / 40
    assert refused(bomb) == (
        "draft.mxl: 'score.musicxml': more than 20 MB, which is the most that is read of a score; "
        "export the part with the melody alone"
    )
    assert refused(bytes(MAX_FILE_BYTES + 1)).startswith("draft.mxl: more than 20 MB")


def test_a_score_of_exactly_the_greatest_size_is_unpacked() -> None:
    assert len(unpack_score(mxl(bytes(MAX_FILE_BYTES)), "x")[0]) == MAX_FILE_BYTES


def test_more_packed_files_than_a_score_has_are_refused() -> None:
    assert refused(zipped([(str(n), b"") for n in range(MAX_ZIP_ENTRIES + 1)])) == (
        f"draft.mxl: more than {MAX_ZIP_ENTRIES} files packed together, expected one score; unpack it"
    )


def in_directory(data: bytes, place: int, form: str, value: int) -> bytes:
    """Change a field of the last entry in the table of contents, which is the score's."""
    changed = bytearray(data)
    struct.pack_into(form, changed, data.rfind(b"PK\x01\x02") + place, value)
    return bytes(changed)


# the places of the fields: the ZIP format's specification (APPNOTE 6.3), section 4.3.12


def test_an_encrypted_score_is_refused() -> None:
    assert refused(in_directory(mxl(PLAIN), 8, "<H", 1)) == (
        "draft.mxl: 'score.musicxml' is encrypted, expected a plain file; unpack it with its password"
    )


@pytest.mark.parametrize("method", [zipfile.ZIP_BZIP2, zipfile.ZIP_LZMA, 9, 99])
def test_only_deflate_is_unpacked(method: int) -> None:
    assert refused(in_directory(mxl(PLAIN), 10, "<H", method)) == (
        "draft.mxl: 'score.musicxml' is packed as scores never are, expected deflate; "
        "unpack it and open the score itself"
    )


@pytest.mark.parametrize(
    "damage",
    [
        lambda data: in_directory(data, 24, "<I", 10),  # says that it unpacks to 10 bytes
        lambda data: in_directory(data, 20, "<I", 10),  # says that it is packed in 10 bytes
        lambda data: in_directory(data, 16, "<I", 10),  # a wrong check sum
        lambda data: in_directory(data, 42, "<I", 10),  # stands elsewhere
        lambda data: data[:-10],
        lambda data: data[:40],
        lambda data: b"PK\x03\x04",
    ],
    ids=["size", "packed size", "check sum", "place", "short", "shorter", "shortest"],
)
def test_a_zip_that_lies_or_breaks_off_is_damaged(damage: Callable[[bytes], bytes]) -> None:
    said = refused(damage(mxl(PLAIN)))
    assert said.startswith("draft.mxl: the compressed file is damaged (")
    assert said.endswith("); export or fetch it again")


@given(st.data())
def test_no_damage_raises_anything_but_our_own_error(data: st.DataObject) -> None:
    packed = bytearray(mxl(PLAIN))
    for _ in range(data.draw(st.integers(1, 4))):
        packed[data.draw(st.integers(4, len(packed) - 1))] = data.draw(st.integers(0, 255))
    try:
        unpacked, _ = unpack_score(bytes(packed), "x")
    except MusicFileError:
        return
    assert len(unpacked) <= MAX_FILE_BYTES
