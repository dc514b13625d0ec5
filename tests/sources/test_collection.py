"""The collection reader: what it takes, what it skips and says, what stops it."""

import gzip
import json
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.core.note import InputKind, Note
from melodycoach.errors import CollectionError
from melodycoach.sources import collection
from melodycoach.sources.collection import Melody, read_collection

GOOD = (
    '{"id": "t1", "group": "g1", "mode": "makam/rast", "final": 6696.2, '
    '"notes": [[0, 0.5, 6696.2], [0.5, 1, 6900]]}'
)
NEXT = '{"id": "t2", "mode": "makam/ussak", "notes": [[0, 0, 6900]]}'


def written(tmp_path: Path, *lines: str | bytes, name: str = "lines.jsonl") -> Path:
    path = tmp_path / name
    path.write_bytes(b"\n".join(line if isinstance(line, bytes) else line.encode() for line in lines) + b"\n")
    return path


def test_a_line_becomes_a_melody(tmp_path: Path) -> None:
    (melody,) = read_collection(written(tmp_path, GOOD))
    assert melody == Melody(
        id="t1",
        group="g1",
        mode_id="makam/rast",
        final_cents=6696.2,
        notes=(Note(6696.2, 0, 0.5, InputKind.RECORDED), Note(6900, 0.5, 1, InputKind.RECORDED)),
    )


def test_group_and_final_may_be_left_out(tmp_path: Path) -> None:
    (melody,) = read_collection(written(tmp_path, NEXT))
    assert (melody.group, melody.final_cents) == ("t2", None)


def test_the_kind_of_input_goes_into_every_note(tmp_path: Path) -> None:
    (melody,) = read_collection(written(tmp_path, GOOD), kind=InputKind.TYPED)
    assert {note.kind for note in melody.notes} == {InputKind.TYPED}


def test_on_plain_keys_each_pitch_is_that_of_its_nearest_key(tmp_path: Path) -> None:
    # 6696.2 is 3.8 cents under key 67
    (melody,) = read_collection(written(tmp_path, GOOD), kind=InputKind.KEYS)
    assert [note.pitch_cents for note in melody.notes] == [6700, 6900]


def test_a_gzipped_file_is_told_by_its_first_bytes(tmp_path: Path) -> None:
    path = tmp_path / "lines.jsonl"  # no .gz in the name
    path.write_bytes(gzip.compress(f"{GOOD}\n{NEXT}".encode()))
    assert [melody.id for melody in read_collection(path)] == ["t1", "t2"]


def test_blank_lines_other_keys_and_a_byte_order_mark_are_left_alone(tmp_path: Path) -> None:
    other = GOOD.replace('"final"', '"remark": [1, {"a": 2}], "final"')
    path = written(tmp_path, b"\xef\xbb\xbf" + other.encode(), "", "   ", NEXT)
    assert [melody.id for melody in read_collection(path, strict=True)] == ["t1", "t2"]


def test_an_empty_file_holds_no_melodies(tmp_path: Path) -> None:
    path = tmp_path / "empty.jsonl"
    path.write_bytes(b"")
    assert list(read_collection(path)) == []


def test_melodies_come_before_the_rest_of_the_file_is_read(tmp_path: Path) -> None:
    reading = read_collection(written(tmp_path, GOOD, "no JSON"))
    assert next(reading).id == "t1"
    with pytest.raises(CollectionError):
        next(reading)


def one_note(triple: str) -> str:
    return f'{{"id": "a", "mode": "m", "notes": [[0, 1, 6900], {triple}]}}'


@pytest.mark.parametrize(
    ("line", "reason"),
    [
        ("{", "column 2: not JSON (expecting property name enclosed in double quotes)"),
        ("[" * 200_000, "not JSON that can be read, expected one melody"),
        ("9" * 5000, "not JSON that can be read, expected one melody"),
        (b'{"id": "\xff"}', "byte 9 is not UTF-8"),
        ("[1, 2]", "found [1, 2], expected an object with 'id', 'mode' and 'notes'"),
        ('{"mode": "m"}', "no 'id', expected it beside ['mode']"),
        ('{"id": 7}', "'id' is 7, expected a word"),
        ('{"id": " "}', "'id' is ' ', expected a word"),
        ('{"id": "a", "group": null}', "'group' is None, expected a word"),
        ('{"id": "a", "tonic": 1}', "no 'mode', expected it beside ['id', 'tonic']"),
        ('{"id": "a", "mode": "m"}', "'notes' is None, expected a list of [onset_s, duration_s, cents]"),
        ('{"id": "a", "mode": "m", "notes": []}', "'notes' is empty, expected at least one note"),
        (
            '{"id": "a", "mode": "m", "final": "A4", "notes": []}',
            "'final' is 'A4', expected 0 to 12700 cents",
        ),
        (one_note("6900"), "note 2 is 6900, expected [onset_s, duration_s, cents]"),
        (one_note("[1, 2]"), "note 2 is [1, 2], expected [onset_s, duration_s, cents]"),
        (one_note("[1, -2, 6900]"), "note 2: the duration is -2, expected 0 to 86400 seconds"),
        (one_note("[1, 1, NaN]"), "note 2: the pitch is nan, expected 0 to 12700 cents"),
        (one_note("[1, 1, 1e300]"), "note 2: the pitch is 1e+300, expected 0 to 12700 cents"),
        (one_note("[Infinity, 1, 6900]"), "note 2: the onset is inf, expected 0 to 86400 seconds"),
        (one_note("[1, true, 6900]"), "note 2: the duration is True, expected 0 to 86400 seconds"),
        (
            one_note("[1, 1, 6900], [0.25, 1, 6900]"),
            "note 3: begins at 0.25 s, before note 2 (1 s)",
        ),
        (json.dumps("x" * 99), "found '" + "x" * 56 + "…, expected an object with 'id', 'mode' and 'notes'"),
    ],
    ids=lambda value: str(value)[:30],
)
def test_a_bad_record_is_skipped_and_said_with_its_line(tmp_path: Path, line: str, reason: str) -> None:
    path = written(tmp_path, GOOD, line, NEXT)
    faults: list[str] = []
    assert [melody.id for melody in read_collection(path, on_fault=faults.append)] == ["t1", "t2"]
    assert faults == [f"{path}: line 2: {reason}; skipped"]


@pytest.mark.parametrize("strict", [True, False])
def test_a_bad_record_stops_a_strict_reading_and_one_that_nobody_listens_to(
    tmp_path: Path, strict: bool
) -> None:
    path = written(tmp_path, GOOD, '{"id": "a"}', NEXT)
    faults: list[str] = []
    with pytest.raises(CollectionError) as caught:
        list(read_collection(path, strict=strict, on_fault=faults.append if strict else None))
    assert str(caught.value) == f"{path}: line 2: no 'mode', expected it beside ['id']"
    assert faults == []


def test_a_line_that_is_too_long_is_skipped_whole(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(collection, "MAX_LINE_BYTES", 200)
    monkeypatch.setattr(collection, "_CHUNK_BYTES", 16)
    faults: list[str] = []
    # the second line is longer than the cap and several chunks more, the last has no line end
    path = written(tmp_path, GOOD, " " * 500 + GOOD, NEXT)
    path.write_bytes(path.read_bytes() + b"x" * 300)
    assert [melody.id for melody in read_collection(path, on_fault=faults.append)] == ["t1", "t2"]
    assert faults == [
        f"{path}: line {n}: longer than 200 bytes, expected one melody; skipped" for n in (2, 4)
    ]


def packed(tmp_path: Path, lines: list[str]) -> tuple[Path, bytes]:
    data = gzip.compress("\n".join(lines).encode(), mtime=0)
    return tmp_path / "lines.jsonl.gz", data


def test_gzip_data_that_break_off_are_said_with_the_place(tmp_path: Path) -> None:
    path, data = packed(tmp_path, [GOOD])
    path.write_bytes(data[:-8])  # the trailer of a gzip member is 8 bytes long: RFC 1952
    with pytest.raises(CollectionError) as caught:
        list(read_collection(path, on_fault=lambda text: None))
    assert str(caught.value) == (
        f"{path}: the gzip data are damaged after line 0 (Compressed file ended before the "
        "end-of-stream marker was reached); make or fetch the file again"
    )


def test_gzip_data_with_a_wrong_sum_are_said(tmp_path: Path) -> None:
    path, data = packed(tmp_path, [GOOD, NEXT])
    path.write_bytes(data[:-8] + b"\0\0\0\0" + data[-4:])
    with pytest.raises(CollectionError, match=r"damaged after line \d \(CRC check failed"):
        list(read_collection(path, on_fault=lambda text: None))


def test_gzip_data_with_a_wrong_byte_are_said(tmp_path: Path) -> None:
    path, data = packed(tmp_path, [GOOD])
    path.write_bytes(data[:10] + b"\xff" + data[11:])  # the first block has a type that does not exist
    with pytest.raises(CollectionError, match=r"damaged after line 0 \(Error -3 while decompressing"):
        list(read_collection(path, on_fault=lambda text: None))


def test_a_missing_file_names_the_nearest(tmp_path: Path) -> None:
    written(tmp_path, GOOD, name="ussak.jsonl")
    with pytest.raises(CollectionError) as caught:
        list(read_collection(tmp_path / "usak.jsonl"))
    assert str(caught.value) == f"{tmp_path}/usak.jsonl: no such file; did you mean 'ussak.jsonl'?"


def test_a_file_in_a_missing_folder_has_no_nearest(tmp_path: Path) -> None:
    with pytest.raises(CollectionError) as caught:
        list(read_collection(tmp_path / "none" / "a.jsonl"))
    assert str(caught.value) == f"{tmp_path}/none/a.jsonl: no such file"


def test_a_folder_is_no_collection(tmp_path: Path) -> None:
    with pytest.raises(CollectionError) as caught:
        list(read_collection(tmp_path))
    assert str(caught.value) == f"{tmp_path}: is a folder, expected a file of JSON lines"


def test_a_file_that_cannot_be_opened_or_read_is_said(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = written(tmp_path, GOOD)
    with pytest.raises(CollectionError) as caught:
        list(read_collection(path / "below"))
    assert str(caught.value) == f"{path}/below: cannot be opened (Not a directory)"

    def broken(file: object) -> None:
        raise OSError(5, "Input/output error")

    monkeypatch.setattr(collection, "_lines", broken)
    with pytest.raises(CollectionError) as caught:
        list(read_collection(path))
    assert str(caught.value) == f"{path}: cannot be read after line 0 (Input/output error)"


cents = st.floats(0, 12_700)
seconds = st.floats(0, 1000)


@given(st.lists(st.tuples(seconds, seconds, cents), min_size=1, max_size=6), st.none() | cents)
def test_what_json_writes_is_read_back(
    tmp_path_factory: pytest.TempPathFactory, notes: list[tuple[float, float, float]], final: float | None
) -> None:
    notes.sort()
    path = tmp_path_factory.mktemp("c") / "c.jsonl"
    record = {"id": "İ", "group": "g", "mode": "m", "final": final, "notes": notes}
    path.write_text(json.dumps(record, ensure_ascii=False), encoding="utf-8")
    (melody,) = read_collection(path)
    assert melody.final_cents == final
    assert [(note.onset_s, note.duration_s, note.pitch_cents) for note in melody.notes] == notes


@given(st.binary(max_size=300))
def test_no_bytes_make_the_reader_fail_without_a_sentence(
    tmp_path_factory: pytest.TempPathFactory, data: bytes
) -> None:
    path = tmp_path_factory.mktemp("b") / "b.jsonl"
    for content in (data, b"\x1f\x8b" + data, gzip.compress(data)[:-3]):
        path.write_bytes(content)
        try:
            assert list(read_collection(path, on_fault=lambda text: None)) == []
        except CollectionError as error:
            assert "gzip data are damaged" in str(error)  # noqa: PT017
