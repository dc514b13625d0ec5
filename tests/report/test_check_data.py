"""An answer as data: what programs read, and what the other reports are made from."""

import json
import math
from dataclasses import replace
from itertools import pairwise
from typing import Any

import pytest
from sheets import sheet_of

from melodycoach.core.check import check_sheet
from melodycoach.core.model import build_model
from melodycoach.errors import NoteTextError
from melodycoach.report.check_data import CURVES_DRAWN, VERSION, answer_json, check_json, failed_json
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
MODEL = build_model(PACK, PACK.modes)
TURNING = (
    "E5 D5 E5 F#5 | G5 F#5 E5:2 , | D5 C5 B4-1 A4:2 . | E5 D5 E5 F#5 | G5 F#5 E5:2 , | D5 C5 B4-1 A4:2 . | "
    "D5 E5 D5 C#5 | Bb4+1 A4:2 , Bb4+1 | C#5 D5:2 C#5 | Bb4+1 A4 G4 A4:2 . | D5 C#5 D5 C#5 | Bb4+1 A4:4 ."
)


def answer(text: str, target: str = "", stay: bool = False) -> dict[str, Any]:
    mode = PACK.find(target) if target else None
    checked = check_sheet(MODEL, sheet_of(text, PACK.names), mode)
    return answer_json(checked, "draft.txt", mode if stay else None)


TURNED = answer(TURNING)


def test_an_answer_is_plain_json_and_comes_back_the_same() -> None:
    document = check_json([TURNED], "0.0")
    assert json.loads(json.dumps(document)) == document
    assert (document["format"], document["version"], len(document["files"])) == (
        "melodycoach-check",
        VERSION,
        1,
    )


def test_every_note_says_where_it_stands_and_in_which_phrase_and_stretch() -> None:
    notes = TURNED["notes"]
    assert [note["number"] for note in notes] == list(range(1, TURNED["n_notes"] + 1))
    assert [note["onset_s"] for note in notes] == sorted(note["onset_s"] for note in notes)
    assert notes[4]["bar"] == "2"
    assert notes[4]["beat"] == 1.0
    for key in ("phrase", "stretch"):
        assert all(0 <= b[key] - a[key] <= 1 for a, b in pairwise(notes))
        assert notes[-1][key] == len(TURNED["phrases" if key == "phrase" else "stretches"])


def test_the_curves_follow_the_modes_of_the_stretches_note_by_note() -> None:
    curves = TURNED["likelihoods"]
    names = [mode["name"] for mode in curves["modes"]]
    assert {stretch["name"] for stretch in TURNED["stretches"]} <= set(names)
    assert len(names) == len(set(names)) <= CURVES_DRAWN
    assert len(curves["after"]) == TURNED["n_notes"]
    assert all(0 <= sum(row) <= 1.001 and len(row) == len(names) for row in curves["after"])
    by_name = dict(zip(names, curves["after"][-1], strict=True))
    assert by_name[TURNED["whole"]["name"]] == TURNED["whole"]["probability"]


def test_the_likeliest_modes_after_the_last_note_are_those_of_the_whole() -> None:
    last = TURNED["notes"][-1]["likely"]
    listed = [{"name": one["name"], "probability": one["probability"]} for one in TURNED["whole"]["leanings"]]
    assert last == listed[: len(last)]


def test_a_change_stands_between_two_stretches() -> None:
    [change] = TURNED["changes"]
    before, after = TURNED["stretches"]
    assert (change["from"], change["to"]) == (before["name"], after["name"]) == ("Hüseynî", "Hicaz")
    assert change["note"] == after["first"] == before["last"] + 1
    assert change["place"] == {"bar": "7", "beat": 1.0, "at": ""}
    assert change["decided"] == after["decided"]
    assert "turn" in change["says"]
    assert "from Hüseynî to " in change["says"]


def test_each_stretch_is_held_against_the_course_of_its_own_mode() -> None:
    before, after = (stretch["course"] for stretch in TURNED["stretches"])
    assert (before["name"], after["name"]) == ("Hüseynî", "Hicaz")
    assert [end["note"] for end in (*before["phrase_ends"], *after["phrase_ends"])] == [
        phrase["last"] for phrase in TURNED["phrases"]
    ]


def test_bars_and_phrases_cover_the_line_and_say_whether_they_fit() -> None:
    for spans in (TURNED["bars"], TURNED["phrases"]):
        assert spans[0]["first"] == 1
        assert spans[-1]["last"] == TURNED["n_notes"]
        assert all(a["last"] + 1 == b["first"] for a, b in pairwise(spans))
    assert [one["bar"] for one in TURNED["bars"]] == [str(n) for n in range(1, 13)]
    spoilt = answer(TURNING.replace("| G5 F#5 E5:2 , | D5 C5", "| G#5 F#5 E5:2 , | D5 C5", 1))
    [bad] = spoilt["off_notes"]
    assert [one["bar"] for one in spoilt["bars"] if not one["fits"]] == ["2"]
    assert spoilt["notes"][bad - 1]["off"]["mend"] == "gerdâniye"
    assert spoilt["notes"][bad - 1]["off"]["mend_written"] == "G5"
    assert all(note["off"] is None for note in spoilt["notes"] if note["number"] != bad)


def test_steps_heard_say_where_and_steps_owed_say_what_they_would_do() -> None:
    for steps in (TURNED["in_view"]["steps"], *(one["steps"] for one in TURNED["stretches"])):
        assert all(step["place"]["bar"] and step["heard_at"] for step in steps["heard"])
        assert [step["heard_at"] for step in steps["heard"]] == sorted(s["heard_at"] for s in steps["heard"])
        assert all(step["place"] is None and step["heard_at"] is None for step in steps["owed"])
        assert len({step["id"] for step in (*steps["heard"], *steps["owed"])}) == len(
            (*steps["heard"], *steps["owed"])
        )


def test_owed_steps_say_what_each_would_do_in_the_order_of_the_scorer() -> None:
    half = sheet_of(TURNING[: TURNING.index("| D5 E5 D5 C#5")], PACK.names)
    checked = check_sheet(MODEL, half, PACK.find("huseyni"))
    steps = answer_json(checked, "draft.txt")["in_view"]["steps"]
    ranked = {one.step.id: one for one in checked.steps.owed}
    assert [step["id"] for step in steps["owed"]] == list(ranked)
    assert len(ranked) >= 2
    for step in steps["owed"]:
        assert step["gain_nats"] == round(ranked[step["id"]].gain_nats, 3) != 0
        assert [pitch["height"] for pitch in step["notes"]] == [
            round(PACK.system.cents_to_units(cents)) for cents in ranked[step["id"]].pitches_cents
        ]
    assert all(step["gain_nats"] == 0 for step in steps["heard"])


def test_what_was_read_and_what_was_lost_is_told_as_the_reader_says_it() -> None:
    sheet = sheet_of(TURNING, PACK.names)
    assert (TURNED["read"], TURNED["lost"]) == ([], [])
    says, lost = ("took track 2 of 3", "one beat is an eighth"), ("track 1, byte 90: broke off",)
    told = answer_json(check_sheet(MODEL, replace(sheet, says=says, lost=lost)), "draft.mid")
    assert (told["read"], told["lost"]) == (list(says), list(lost))


def test_every_note_lies_in_the_phrase_and_the_stretch_that_hold_it() -> None:
    for key, parts in (("phrase", TURNED["phrases"]), ("stretch", TURNED["stretches"])):
        assert len(parts) > 1
        for note in TURNED["notes"]:
            part = parts[note[key] - 1]
            assert part["first"] <= note["number"] <= part["last"]


def test_the_rival_gets_its_reasons_too() -> None:
    rival = TURNED["rival"]
    assert rival["name"] != TURNED["whole"]["name"]
    assert all(reason["nats"] > 0 for reason in rival["for_leader"])
    assert all(reason["nats"] < 0 for reason in rival["for_rival"])
    nats = [reason["nats"] for reason in (*rival["for_leader"], *rival["for_rival"])]
    leanings = {one["name"]: one["probability"] for one in TURNED["whole"]["leanings"]}
    odds = leanings[TURNED["in_view"]["name"]] / leanings[rival["name"]]
    assert sum(nats) + rival["rest_nats"] == pytest.approx(math.log(odds), abs=0.05)
    assert rival["probability"] == leanings[rival["name"]]


def test_a_target_is_listed_and_in_view_however_unlikely() -> None:
    aimed = answer(TURNING, "mahur")
    assert aimed["in_view"]["name"] == "Mahur"
    assert aimed["in_view"]["is_target"]
    assert "Mahur" in [one["name"] for one in aimed["whole"]["leanings"]]
    assert aimed["likelihoods"]["modes"][0]["name"] == "Mahur"


def test_the_question_is_answered_with_the_first_place_where_the_line_leaves() -> None:
    assert TURNED["stay_in"] is None
    left = answer(TURNING, "huseyni", stay=True)["stay_in"]
    assert not left["stays"]
    assert left["first"] == {
        "note": 26,
        "place": {"bar": "7", "beat": 4.0, "at": ""},
        "says": "nim hicaz is not in Hüseynî, 4 commas above çargâh; çargâh would mend it",
    }
    kept = answer(TURNING[: TURNING.index("| D5 E5 D5 C#5")], "huseyni", stay=True)["stay_in"]
    assert (kept["stays"], kept["first"]) == (True, None)


def test_a_line_that_turns_without_a_wrong_note_says_what_it_sounds_like() -> None:
    segah = "B4-1:2 Bb4+4 B4-1 C5 D5:3 , C5 B4-1 A4 B4-1:4 . B4-1:2 C5 D5:3 , C5 B4-1 A4 B4-1:4 ."
    first = answer(segah.replace("Bb4+4", "A4"), "rast", stay=True)["stay_in"]["first"]
    assert "it sounds like " in first["says"]


def test_a_line_without_notes_is_an_answer_too() -> None:
    empty = answer("- .")
    assert empty["whole"]["verdict"] == "no notes: there is nothing to check"
    assert not empty["whole"]["decided"]
    assert (empty["notes"], empty["course"], empty["rival"]) == ([], None, None)
    assert empty["likelihoods"] == {"modes": [], "after": []}


def test_a_file_that_failed_says_why() -> None:
    failed = failed_json("a.txt", NoteTextError("a.txt: 2 places", ["a.txt:1:1: one", "a.txt:2:1: two"]))
    assert failed == {
        "file": "a.txt",
        "error": "a.txt: 2 places",
        "faults": ["a.txt:1:1: one", "a.txt:2:1: two"],
    }


@pytest.mark.parametrize("target", ["", "huseyni"])
def test_numbers_are_rounded_so_that_the_text_stays_readable(target: str) -> None:
    def numbers(value: object) -> list[float]:
        if isinstance(value, dict):
            return [n for one in value.values() for n in numbers(one)]
        if isinstance(value, list):
            return [n for one in value for n in numbers(one)]
        return [value] if isinstance(value, float) else []

    assert all(round(number, 4) == number for number in numbers(answer(TURNING, target)))
