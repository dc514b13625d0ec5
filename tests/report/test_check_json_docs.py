"""docs/check-json.md against real answers: every key, its type, and nothing that does not occur."""

from __future__ import annotations

import contextlib
import io
import json
import re
from functools import cache
from pathlib import Path
from typing import TYPE_CHECKING, Any

import pytest
from page_answers import answer as made_by_hand
from page_answers import change
from sheets import sheet_of

from melodycoach import __version__
from melodycoach.core.check import check_sheet
from melodycoach.core.mode import Need, StepKind
from melodycoach.core.model import build_model
from melodycoach.core.sheet import SheetKind
from melodycoach.errors import NoteTextError
from melodycoach.report.check_data import FORMAT, VERSION, answer_json, check_json, failed_json
from melodycoach.sources.pack_file import load_pack
from melodycoach.sources.sheet_file import read_sheet

if TYPE_CHECKING:
    from collections.abc import Iterator

DOC = (Path(__file__).parents[2] / "docs" / "check-json.md").read_text(encoding="utf-8")
PACK = load_pack("makam")
MODEL = build_model(PACK, PACK.modes)
KEYS = build_model(PACK, (PACK.find("huseyni"),))

TURNING = (
    "title: The turn\ntempo: 84\n"
    "E5 D5 E5 F#5 | G5 F#5 E5:2 , | D5 C5 B4-1 A4:2 . | E5 D5 E5 F#5 | G5 F#5 E5:2 , | D5 C5 B4-1 A4:2 . | "
    "D5 E5 D5 C#5 | Bb4+1 A4:2 , Bb4+1 | C#5 D5:2 C#5 | Bb4+1 A4 G4 A4:2 . | D5 C#5 D5 C#5 | Bb4+1 A4:4 ."
)

KINDS = {"str": str, "int": int, "float": (int, float), "bool": bool}

Tables = dict[str, dict[str, str]]


@cache
def tables() -> Tables:
    """Give the type of each key, by object."""
    found: Tables = {}
    for name, body in re.findall(r"^## ([A-Z_]+)\n(.*?)(?=^## |\Z)", DOC, re.MULTILINE | re.DOTALL):
        rows = re.findall(r"^\| `(\w+)` \| ([^|]+?) \| (.+?) \|$", body, re.MULTILINE)
        assert rows, f"no table for {name}"
        assert len({key for key, _, _ in rows}) == len(rows), f"a key stands twice in {name}"
        found[name] = {key: kind for key, kind, _ in rows}
    assert len(found) > 20
    return found


class Walk:
    """Walks values by what the tables say of them, and keeps what it met and what was wrong."""

    def __init__(self) -> None:
        self.met: set[tuple[str, str]] = set()
        self.wrong: list[str] = []

    def value(self, value: Any, kind: str, path: str) -> None:
        if kind.endswith(" or null") and not kind.startswith("list of "):
            if value is not None:
                self.value(value, kind.removesuffix(" or null"), path)
        elif kind.startswith(("list of ", "map of ")):
            holder, _, inner = kind.partition(" of ")
            if not isinstance(value, {"list": list, "map": dict}[holder]):
                self.wrong.append(f"{path}: {value!r} is no {holder}")
                return
            for one in value.values() if isinstance(value, dict) else value:
                self.value(one, inner, f"{path}[]")
        elif kind == "ANSWER or FAILED":
            self.object(value, "FAILED" if "error" in value else "ANSWER", path)
        elif kind in KINDS:
            if not isinstance(value, KINDS[kind]) or (isinstance(value, bool) and kind != "bool"):
                self.wrong.append(f"{path}: {value!r} is no {kind}")
        else:
            self.object(value, kind, path)

    def object(self, value: Any, kind: str, path: str) -> None:
        documented = tables()[kind]
        if not isinstance(value, dict):
            self.wrong.append(f"{path}: {value!r} is no {kind}")
            return
        self.wrong += [f"{path}.{key}: not documented" for key in value.keys() - documented.keys()]
        self.wrong += [f"{path}.{key}: missing" for key in documented.keys() - value.keys()]
        for key in documented.keys() & value.keys():
            self.met.add((kind, key))
            self.value(value[key], documented[key], f"{path}.{key}")


def answer(text: str, aim: str = "", stay: bool = False) -> dict[str, Any]:
    mode = PACK.find(aim) if aim else None
    checked = check_sheet(MODEL, sheet_of(text, PACK.names), mode)
    return answer_json(checked, "draft.txt", mode if stay else None)


@cache
def document() -> dict[str, Any]:
    """Give real answers in which everything occurs."""
    keys = check_sheet(KEYS, sheet_of("A4~ B4~ C5~ B4~ A4~:2 .", PACK.names), PACK.find("rast"))
    answers = [
        answer(TURNING),
        answer(TURNING, "huseyni", stay=True),
        answer("A4 B4-1 C5", "rast"),
        answer(""),
        answer_json(keys, "keys.txt"),
        failed_json("bad.txt", NoteTextError("bad.txt: 1 token cannot be read", ["line 1, column 1: 'H5'"])),
    ]
    return json.loads(json.dumps(check_json(answers, __version__)))


def walked() -> Walk:
    walk = Walk()
    walk.object(document(), "DOCUMENT", "document")
    return walk


# --- the tables


def test_every_key_of_a_real_answer_is_documented_with_its_type_and_none_is_missing() -> None:
    assert walked().wrong == []


def test_every_documented_key_occurs_in_a_real_answer() -> None:
    documented = {(name, key) for name, table in tables().items() for key in table}
    assert documented - walked().met == set()


def test_every_type_is_a_plain_one_or_has_a_table() -> None:
    def names(kind: str) -> Iterator[str]:
        yield from re.sub(r"\b(list of|map of|or null|or)\b", " ", kind).split()

    used = {word for table in tables().values() for kind in table.values() for word in names(kind)}
    assert used - KINDS.keys() - tables().keys() == set()
    assert tables().keys() - used == {"DOCUMENT"}


def test_a_key_too_many_one_too_few_and_a_wrong_type_are_noticed() -> None:
    walk = Walk()
    walk.object({"name": "dügâh", "height": "0", "colour": 1}, "PITCH", "p")
    assert sorted(walk.wrong) == [
        "p.colour: not documented",
        "p.height: '0' is no int",
        "p.written: missing",
    ]
    walk = Walk()
    walk.value([True, None], "list of int", "p")
    walk.value({}, "list of int", "q")
    walk.value([], "PITCH", "r")
    assert walk.wrong == [
        "p[]: True is no int",
        "p[]: None is no int",
        "q: {} is no list",
        "r: [] is no PITCH",
    ]


def test_a_bar_is_a_span_and_its_name() -> None:
    assert tables()["BAR"] == {"bar": "str", **tables()["SPAN"]}


def test_a_note_begins_with_a_place_and_a_rung_with_a_pitch() -> None:
    assert tables()["PLACE"].items() <= tables()["NOTE"].items()
    assert tables()["PITCH"].items() <= tables()["RUNG"].items()


# --- what stands beside them


def test_the_page_names_the_format_and_version_that_the_program_writes() -> None:
    assert DOC.startswith(f"# The answer as data, version {VERSION}\n")
    assert f"| `version` | int | {VERSION} |" in DOC
    assert f"`{FORMAT}`" in DOC
    assert (document()["format"], document()["version"]) == (FORMAT, VERSION)


@pytest.mark.parametrize(
    ("name", "key", "values"),
    [
        ("ANSWER", "kind", [kind.value for kind in SheetKind]),
        ("STEP", "kind", [kind.value for kind in StepKind]),
        ("STEP", "need", [need.value for need in Need]),
        ("RUNG", "role", ["final", "dominant", "degree"]),
    ],
)
def test_a_key_with_few_values_lists_them_all(name: str, key: str, values: list[str]) -> None:
    body = DOC.partition(f"\n## {name}\n")[2]
    [says] = re.findall(rf"^\| `{key}` \| \w+ \| (.+) \|$", body.partition("\n## ")[0], re.MULTILINE)
    assert set(re.findall(r"`([^`]+)`", says)) == set(values)


def test_roles_are_those_that_are_listed() -> None:
    found = {
        rung["role"] for one in document()["files"] if "error" not in one for rung in one["in_view"]["ladder"]
    }
    assert found == {"final", "dominant", "degree"}


def test_notes_are_found_by_their_number() -> None:
    for one in document()["files"][:-1]:
        assert [note["number"] for note in one["notes"]] == list(range(1, one["n_notes"] + 1))


def test_reasons_speak_up_for_the_mode_in_view_and_down_for_the_rival() -> None:
    for one in document()["files"][:2]:
        assert all(reason["nats"] > 0 for reason in one["rival"]["for_leader"])
        assert all(reason["nats"] < 0 for reason in one["rival"]["for_rival"])


def test_the_program_of_the_page_lists_the_notes_to_mend() -> None:
    [program] = re.findall(r"```python\n(.*?)```", DOC, re.DOTALL)
    printed = io.StringIO()
    with contextlib.redirect_stdout(printed):
        exec(compile(program, "check-json.md", "exec"), {"document": document()})
    lines = printed.getvalue().splitlines()
    assert lines[0] == "draft.txt 7 4.0 nim hicaz -> çargâh"
    assert lines[-1] == "bad.txt could not be read: bad.txt: 1 token cannot be read"


# --- the example


def holds(whole: Any, part: Any, path: str = "") -> list[str]:
    """Say where a part is not in a whole: objects may leave keys out, lists their end."""
    if isinstance(part, dict) and isinstance(whole, dict):
        return [one for key, value in part.items() for one in holds(whole.get(key), value, f"{path}.{key}")]
    if isinstance(part, list) and isinstance(whole, list) and part:
        pairs = zip(whole, part, strict=False)
        short = [f"{path}: too long"] if len(part) > len(whole) else []
        return short + [one for value, wanted in pairs for one in holds(value, wanted, f"{path}[]")]
    return [] if whole == part else [f"{path}: {whole!r}, but the page says {part!r}"]


def test_the_example_is_what_the_program_says_of_its_draft() -> None:
    [draft] = re.findall(r"```text\n(.*?)```", DOC, re.DOTALL)
    excerpt, note = (json.loads(text) for text in re.findall(r"```json\n(.*?)```", DOC, re.DOTALL))
    mode = PACK.find("huseyni")
    sheet = read_sheet(draft.encode(), "draft.txt", PACK.names)
    real = check_json([answer_json(check_sheet(MODEL, sheet, mode), "draft.txt", mode)], __version__)
    assert holds(real, excerpt) == []
    assert holds(real["files"][0]["notes"][note["number"] - 1], note) == []


def test_an_example_that_says_something_else_is_noticed() -> None:
    assert holds({"a": [1, 2]}, {"a": [1]}) == []
    assert holds({"a": [1]}, {"a": [1, 2]}) == [".a: too long"]
    assert holds({"a": [1]}, {"a": []}) == [".a: [1], but the page says []"]
    assert holds({"a": 1}, {"b": 1}) == [".b: None, but the page says 1"]


def test_the_answer_made_by_hand_for_other_tests_has_the_same_shape() -> None:
    walk = Walk()
    walk.object(made_by_hand(changes=[change(9, "Hüseynî", "Hicaz")]), "ANSWER", "answer")
    assert walk.wrong == []
