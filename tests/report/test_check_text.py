"""An answer on paper: how it looks, what it says, and that no file can upset the terminal."""

from __future__ import annotations

import re
from pathlib import Path
from typing import TYPE_CHECKING, Any

import pytest
from page_answers import (
    OFF,
    WORDS,
    answer,
    change,
    course,
    family_change,
    note,
    open_change,
    pitch,
    span,
    step,
    stretch,
    where,
)
from sheets import sheet_of

from melodycoach.core.cells import width
from melodycoach.core.check import check_sheet
from melodycoach.core.model import build_model
from melodycoach.report.check_data import answer_json
from melodycoach.report.check_text import check_text, failed_text
from melodycoach.report.text_lines import SGR
from melodycoach.sources.pack_file import load_pack

if TYPE_CHECKING:
    from collections.abc import Callable

GOLDEN = Path(__file__).parent / "golden"
PACK = load_pack("makam")
MODEL = build_model(PACK, PACK.modes)

PLAIN = answer()
VIEW = PLAIN["in_view"]
TURNED = answer(
    in_view=VIEW | {"is_target": True},
    stay_in={
        "mode": "makam/huseyni",
        "name": "Hüseynî",
        "stays": False,
        "first": {"note": OFF, "place": where(OFF), "says": "nim hicaz is not in Hüseynî"},
    },
    stretches=[stretch(1, 8, "Hüseynî"), stretch(9, 16, "Hicaz") | {"decided": False}],
    changes=[open_change(9, "Hüseynî", "Hicaz")],
    lost=["bar 5 has a bad key signature: passed over"],
    tempo=None,
)
EMPTY = answer(
    bars=False,
    title="",
    n_notes=0,
    notes=[],
    off_notes=[],
    phrases=[],
    stretches=[],
    course=None,
    rival=None,
    whole=answer()["whole"] | {"verdict": "no notes: there is nothing to check", "decided": False},
)
PARTED = TURNED | {
    "in_view": VIEW,
    "stay_in": None,
    "changes": [family_change(9, "Hüseynî", "Hicaz", "hicaz family")],
}
SAMPLES = {"plain": PLAIN, "turned": TURNED, "parted": PARTED, "empty": EMPTY, "no-bars": answer(bars=False)}


def squeezed(text: str) -> str:
    return " ".join(text.split())


def said(columns: int = 80, **changes: Any) -> str:
    return squeezed(check_text(PLAIN | changes, columns))


def real(text: str, aim: str = "", stay: bool = False) -> dict[str, Any]:
    mode = PACK.find(aim) if aim else None
    return answer_json(
        check_sheet(MODEL, sheet_of(text, PACK.names), mode), "draft.txt", mode if stay else None
    )


# --- how it looks


@pytest.mark.parametrize("columns", [40, 80])
@pytest.mark.parametrize("name", sorted(SAMPLES))
def test_an_answer_looks_as_designed(
    name: str, columns: int, check_golden: Callable[[Path, str], None]
) -> None:
    check_golden(GOLDEN / f"check-{name}-{columns}.txt", check_text(SAMPLES[name], columns) + "\n")


@pytest.mark.parametrize("columns", [40, 57, 80, 120])
@pytest.mark.parametrize("name", sorted(SAMPLES))
def test_no_line_is_wider_than_asked_for_or_ends_in_a_space(name: str, columns: int) -> None:
    lines = check_text(SAMPLES[name], columns).split("\n")
    assert max(map(width, lines)) <= columns
    assert not [line for line in lines if line != line.rstrip()]


def test_a_width_under_forty_is_taken_for_forty() -> None:
    assert check_text(PLAIN, 3) == check_text(PLAIN, 40)


def test_without_colour_there_is_no_escape_and_with_it_the_words_are_the_same() -> None:
    for sample in SAMPLES.values():
        plain, coloured = check_text(sample), check_text(sample, colour=True)
        assert "\x1b" not in plain
        assert re.sub(r"\x1b\[[0-9]+m", "", coloured) == plain
        assert set(re.findall(r"\x1b\[([0-9]+)m", coloured)) <= {*SGR.values(), "0"}


def test_the_sections_stand_in_the_order_in_which_a_composer_asks() -> None:
    text = check_text(TURNED)
    titles = (
        "Leaves Hüseynî",
        "As a whole leaning to Hüseynî",
        "Where it changes mode",
        "Notes off the mode",
        "Characteristic steps",
        "Course (seyir)",
        "The closest rival",
        "Phrase by phrase",
        "Bar by bar",
        "How it was read",
    )
    places = [text.index(f"\n{title}") for title in titles]
    assert places == sorted(places)


# --- what comes in from files


def test_a_title_cannot_steer_the_terminal() -> None:
    text = check_text(PLAIN | {"title": "Quay\x1b]0;gone\x07\x9b2J\r\n\u202eend", "file": "\x1b[31m.txt"})
    assert text.startswith("Quay?]0;gone??2J end\n")
    assert all(character.isprintable() or character == "\n" for character in text)


def test_nothing_that_a_file_can_bring_steers_the_terminal() -> None:
    evil = "\x1b[31mred\x07\u2028"

    def poisoned(value: Any) -> Any:
        if isinstance(value, dict):
            kept = ("need", "role", "mode")  # what the program itself chooses among
            return {key: one if key in kept else poisoned(one) for key, one in value.items()}
        if isinstance(value, list):
            return [poisoned(one) for one in value]
        return value + evil if isinstance(value, str) else value

    for sample in SAMPLES.values():
        text = check_text(poisoned(sample))
        assert all(character.isprintable() or character == "\n" for character in text)
    text = failed_text(poisoned({"file": "a", "error": "b", "faults": ["c"]}))
    assert all(character.isprintable() or character == "\n" for character in text)


# --- what it says first


def test_a_line_that_stays_in_its_mode_is_told_so_before_all_else() -> None:
    stays = {"mode": "makam/huseyni", "name": "Hüseynî", "stays": True, "first": None}
    assert check_text(PLAIN | {"stay_in": stays}).split("\n")[4] == "Stays in Hüseynî."


def test_a_line_that_leaves_is_told_where_and_why() -> None:
    lines = check_text(TURNED).split("\n")
    assert lines[4] == "Leaves Hüseynî at bar 3, beat 2: nim hicaz is not in Hüseynî."


def test_the_file_stands_for_a_title_that_is_missing() -> None:
    assert check_text(PLAIN | {"title": ""}).startswith("draft.txt\n=========\n")


@pytest.mark.parametrize(
    ("firsts", "says"),
    [
        ((), "Leaning to Rast, 72 %."),
        ((3,), "Rast, then Hicaz."),
        ((3, 6), "Rast, then Hicaz, then Hicaz."),
        ((3, 5, 7, 9, 11), "It changes mode 5 times, between Rast and Hicaz."),
    ],
)
def test_the_modes_that_a_line_goes_through_are_the_answer_and_the_whole_comes_second(
    firsts: tuple[int, ...], says: str
) -> None:
    text = said(
        whole=PLAIN["whole"] | {"mode": "makam/Rast", "name": "Rast", "verdict": "leaning to Rast, 72 %"},
        stretches=[stretch(1, 2, "Rast"), *(stretch(first, first + 1, "Hicaz") for first in firsts)],
        changes=[change(first, "Rast", "Hicaz") for first in firsts],
    )
    second = "Taken as one, the line is leaning to Rast, 72 %. " if firsts else ""
    assert f"84 beats a minute {says} {second}Next likeliest:" in text


def test_a_target_that_leads_that_trails_and_that_does_not_compete_are_told_apart() -> None:
    def aims(mode: str, name: str) -> str:
        return said(in_view=VIEW | {"is_target": True, "mode": mode, "name": name})

    assert "Hüseynî is the mode that it aims at." in aims("makam/huseyni", "Hüseynî")
    assert "It aims at Nevâ, 20 % likely." in aims("Nevâ", "Nevâ")
    assert "It aims at Sabâ, which is not among the modes that it was compared with." in aims("x", "Sabâ")


def test_an_undecided_line_names_the_likeliest_modes_with_the_first() -> None:
    whole = PLAIN["whole"] | {"decided": False, "verdict": "undecided between Hüseynî and Nevâ"}
    text = said(whole=whole)
    assert "Undecided between Hüseynî and Nevâ. The likeliest: Hüseynî 72 %, Nevâ 20 %." in text


def test_a_line_with_one_mode_that_competes_names_no_other() -> None:
    whole = PLAIN["whole"] | {"leanings": PLAIN["whole"]["leanings"][:1]}
    assert "Next likeliest" not in said(whole=whole)


def test_a_line_without_wrong_notes_is_told_so() -> None:
    notes = [note(number, "nevâ") for number in range(1, 17)]
    clean = [one | {"off": None} for one in notes]
    assert "No note lies outside Hüseynî." in said(notes=clean, off_notes=[])
    stretches = [stretch(1, 8, "Hüseynî"), stretch(9, 16, "Hicaz")]
    text = said(notes=clean, off_notes=[], stretches=stretches)
    assert "No note lies outside the mode of its stretch." in text
    assert "Notes off the mode" not in text
    open_ = PLAIN["whole"] | {"decided": False}
    assert "No note lies outside Hüseynî, the likeliest." in said(notes=clean, off_notes=[], whole=open_)
    assert "1 note lies outside Hüseynî." in said()


def test_what_was_lost_is_pointed_at_from_the_top_and_said_at_the_end() -> None:
    text = squeezed(check_text(TURNED))
    assert text.index("Not all of the file could be read") < text.index("lost bar 5 has a bad key signature")
    assert "Not all of the file" not in said()


def turning(*changes: dict[str, Any]) -> str:
    stretches = [
        stretch(1, 2, "Hüseynî"),
        *(stretch(one["note"], one["note"] + 1, one["to"]) for one in changes),
    ]
    return said(stretches=stretches, changes=list(changes))


def test_changes_that_are_not_clear_are_not_told_as_if_they_were() -> None:
    open_ = open_change(5, "Hüseynî", "Rast"), open_change(9, "Rast", "Hicaz")
    assert (
        "As a whole leaning to Hüseynî, 72 %. "
        "It may change mode: Hüseynî, then perhaps Rast, then perhaps Hicaz. Next" in turning(*open_)
    )
    mixed = open_[0], family_change(9, "Rast", "Hicaz", "hicaz family")
    assert "a minute Hüseynî, then perhaps Rast, then the hicaz family. Taken as one" in turning(*mixed)


def test_of_many_changes_those_that_are_not_clear_are_counted_apart() -> None:
    clear = [change(at, "Hüseynî", f"Mode {at}") for at in range(3, 7)]
    open_ = [open_change(at, "Hüseynî", "Rast") for at in range(7, 10)]
    assert "It changes mode 4 times, and perhaps once more. Taken" in turning(*clear, open_[0])
    assert "It changes mode twice, and perhaps 3 times more, between Hüseynî, Mode 3, Mode 4 and Rast." in (
        turning(*clear[:2], *open_)
    )
    assert "It may change mode 6 times, between Hüseynî and Rast." in turning(*open_, *open_)


def test_how_near_a_line_that_turns_comes_to_its_aim_is_said_of_the_whole() -> None:
    parted = {"stretches": TURNED["stretches"], "changes": TURNED["changes"]}
    text = said(in_view=VIEW | {"is_target": True, "mode": "Nevâ", "name": "Nevâ"}, **parted)
    assert "It aims at Nevâ, 20 % likely over the whole line." in text


def test_notes_of_a_line_that_turns_are_off_the_mode_of_their_stretch() -> None:
    parted = {"stretches": TURNED["stretches"], "changes": TURNED["changes"]}
    assert "Notes off the mode of their stretch: 1" in said(**parted)
    assert "Notes off the mode: 1" in said(**parted, in_view=VIEW | {"is_target": True})


def test_how_a_file_was_read_stands_before_the_sections_and_only_there() -> None:
    text = said(read=["accidentals read as AEU", "took track 2"])
    assert "outside Hüseynî. read accidentals read as AEU read took track 2 Notes off the mode" in text
    assert text.count("took track 2") == 1
    assert " read " not in said(read=[]).partition("How it was read")[0]


def test_a_line_that_sounds_like_another_mode_has_no_place_where_it_leaves_its_own() -> None:
    first = {"note": 1, "place": where(1), "says": "it sounds like Rast"}
    asked = TURNED["stay_in"] | {"first": first}
    assert "Does not stay in Hüseynî: it sounds like Rast. Leaning" in said(stay_in=asked)
    off = [PLAIN["notes"][0] | {"off": PLAIN["notes"][OFF - 1]["off"]}, *PLAIN["notes"][1:]]
    asked = TURNED["stay_in"] | {"first": first | {"says": "hüseynî is not in Hüseynî"}}
    assert "Leaves Hüseynî at bar 1, beat 1: hüseynî is not in Hüseynî." in said(stay_in=asked, notes=off)


# --- changes, wrong notes


def test_a_change_is_told_with_the_note_at_which_a_listener_notices_it() -> None:
    text = squeezed(check_text(TURNED))
    assert (
        "bar 3, beat 1 may turn from Hüseynî to Hicaz, 64 % (undecided between Hicaz and Sabâ); "
        "a listener notices it at bar 3, beat 4" in text
    )
    one = change(9, "Hüseynî", "Hicaz") | {"noticed_at": None}
    assert "notices" not in said(stretches=TURNED["stretches"], changes=[one])


def test_of_many_changes_each_is_told_in_short() -> None:
    firsts = range(3, 15, 2)
    text = said(
        stretches=[stretch(1, 2, "Rast"), *(stretch(first, first + 1, "Hicaz") for first in firsts)],
        changes=[change(first, "Rast", "Hicaz") for first in firsts],
    )
    assert "bar 1, beat 3 turns from Rast to Hicaz, 64 % bar 2, beat 1 turns" in text


def test_a_wrong_note_is_told_with_its_place_and_what_mends_it() -> None:
    assert "Notes off the mode: 1" in said()
    says = "is not in Hüseynî, 4 commas above çargâh; çargâh (C5) mends it"
    assert f"bar 3, beat 2 nim hicaz (C#5) {says}" in said()


def test_the_same_wrong_note_again_is_told_once_with_all_its_places() -> None:
    line = [note(number, "nim hicaz") for number in range(1, 17)]
    wrong = [one | {"off": line[OFF - 1]["off"]} for one in line]
    text = said(notes=wrong, off_notes=[1, 2, 6])
    assert text.count("is not in Hüseynî") == 1
    assert "mends it. The same at bar 1, beat 2; bar 2, beat 2" in text


def test_of_very_many_places_the_last_are_counted() -> None:
    line = [note(number, "nim hicaz") for number in range(1, 101)]
    wrong = [one | {"off": line[OFF - 1]["off"]} for one in line]
    text = said(notes=wrong, off_notes=list(range(1, 101)))
    assert "The same at bar 1, beat 2;" in text
    assert "; 59 more places" in text


# --- steps, course, rival


def test_steps_are_heard_owed_or_welcome() -> None:
    text = said()
    heard, owed, welcome = (
        text.index("bar 4, beat 4 final cadence on dügâh"),
        text.index("core half cadence on dügâh; play segâh dügâh (B4-1 A4)"),
        text.index("- leap on dügâh; play"),
    )
    assert text.index(" heard ") < heard < text.index("owed, the best to play next first") < owed
    assert owed < text.index("welcome, not owed") < welcome


def test_with_a_target_steps_and_course_are_those_of_the_target_over_the_whole_line() -> None:
    text = squeezed(check_text(TURNED))
    assert "Hüseynî, over the whole line heard" in text
    assert "Course (seyir) beside that of Hüseynî" in text
    assert "Hicaz, bars" not in text


def test_without_a_target_steps_and_course_are_those_of_each_stretch() -> None:
    text = squeezed(check_text(PARTED))
    assert "heard and owed ------------------------------------ Hüseynî, bars 1–2 heard" in text
    assert "Hicaz, bars 3–4 (the likeliest, not decided) heard" in text
    seyir = text.partition("Course (seyir) of each stretch")[2]
    assert "Hüseynî, bars 1–2 opening: agrees" in seyir
    assert "Hicaz, bars 3–4 (the likeliest, not decided) opening: agrees" in seyir


def test_pitches_without_names_of_their_own_are_written_once() -> None:
    bare = {"name": "A4", "written": "A4", "height": 0}
    owed = step("half cadence", "core", None) | {"notes": [bare, bare]}
    one = stretch(1, 16, "Hüseynî") | {"steps": {"heard": [], "owed": [owed]}}
    assert "half cadence on dügâh; play A4 A4 Course" in said(stretches=[one])


def test_the_steps_of_many_stretches_are_told_in_short() -> None:
    many = [stretch(first, first + 1, "Hicaz") for first in range(1, 13, 2)]
    owed = [step(name, "core", None) for name in ("one", "two", "three", "four")]
    many[0] = many[0] | {"steps": {"heard": [], "owed": owed}}
    many[1] = many[1] | {"steps": {"heard": [], "owed": []}}
    text = said(stretches=many)
    assert "Hicaz, bar 1 0 heard; owed: one on dügâh; two on dügâh; 2 more" in text
    assert "Hicaz, bar 1 0 heard; owed: nothing" in text
    assert "Hicaz, bar 2 1 heard; owed: half cadence on dügâh" in text
    assert "Hicaz, bar 1 opening agrees; register cannot be told; cadence does not agree" in text


def test_the_course_agrees_does_not_or_cannot_be_told() -> None:
    text = said()
    assert "Course (seyir) beside that of Hüseynî" in text
    assert "opening: agrees it opens on hüseynî" in text
    assert "register: cannot be told too short to tell" in text
    assert "cadence: does not agree it does not come to rest on dügâh" in text
    assert "phrases end on hüseynî (güçlü), dügâh" in text


def test_phrase_ends_that_are_alike_are_counted() -> None:
    end = {"note": 8, "place": where(8), "pitch": pitch("hüseynî"), "function": "güçlü"}

    def ending(*ends: dict[str, Any]) -> str:
        one = stretch(1, 16, "Hüseynî") | {"course": course("Hüseynî") | {"phrase_ends": list(ends)}}
        return said(stretches=[one])

    assert "phrases end on hüseynî (güçlü) 3×" in ending(end, end, end)
    assert "phrases end on" not in ending(end)


def test_a_trade_without_a_word_for_course_has_none_beside_it() -> None:
    words = {key: word for key, word in WORDS.items() if key != "course"}
    assert "Course beside that of Hüseynî" in said(words=words)


def test_reasons_stand_under_the_mode_that_they_speak_for_with_their_bars() -> None:
    text = said()
    assert "The closest rival to Hüseynî: Nevâ, 20 %" in text
    assert "The closest rival to Hüseynî, over the whole line: Nevâ, 20 %" in squeezed(check_text(PARTED))
    assert "for Hüseynî +1.3 you rested on hüseynî (bar 2)" in text
    assert "for Nevâ +0.4 you passed through nevâ (bars 1–3)" in text


def test_a_side_for_which_nothing_speaks_is_named_too() -> None:
    assert "for Nevâ: nothing of weight" in said(rival=PLAIN["rival"] | {"for_rival": []})
    repertoire = {"says": "it is met more often", "nats": 1.2, "notes": []}
    assert "+1.2 it is met more often for Nevâ" in said(rival=PLAIN["rival"] | {"for_leader": [repertoire]})


def test_reasons_that_weigh_little_or_are_many_are_left_out_and_the_numbers_explained_once() -> None:
    light = {"says": "a little", "nats": -0.1, "notes": []}
    text = said(rival=PLAIN["rival"] | {"for_rival": [light], "rest_nats": 0.0})
    assert "for Nevâ: nothing of weight A number says how strongly a reason speaks" in text
    assert text.count("0.7 doubles the odds") == 1
    none = PLAIN["rival"] | {"for_leader": [], "for_rival": [light], "rest_nats": 0.2}
    assert "doubles the odds" not in said(rival=none)
    many = [{"says": f"reason {at}", "nats": 1.0, "notes": []} for at in range(9)]
    text = said(rival=PLAIN["rival"] | {"for_leader": many})
    assert "reason 4" in text
    assert "reason 5" not in text


def test_what_is_not_told_is_summed_up_so_that_all_of_it_gives_the_odds() -> None:
    def rest(nats: float, *reasons: float) -> str:
        told = [{"says": "so", "nats": one, "notes": []} for one in reasons]
        sides = {
            "for_leader": [one for one in told if one["nats"] > 0],
            "for_rival": [one for one in told if one["nats"] < 0],
        }
        return said(rival=PLAIN["rival"] | sides | {"rest_nats": nats})

    assert "all the rest together, for Nevâ: 5.2 A number says" in rest(-5.2)
    assert "all the rest together, for Hüseynî: 0.4" in rest(0.39)
    assert "all the rest" not in rest(0.2)
    # of seven reasons for a mode five are told, and one of 0.1 against it is not: 0.6 + 2 x 1.0 - 0.1
    assert "all the rest together, for Hüseynî: 2.5" in rest(0.6, *[1.0] * 7, -0.1)


def test_a_target_that_trails_is_held_against_the_mode_that_leads() -> None:
    rival = PLAIN["rival"] | {"mode": PLAIN["whole"]["mode"], "name": "Hüseynî", "probability": 0.72}
    view = VIEW | {"is_target": True, "name": "Nevâ", "mode": "Nevâ"}
    text = said(in_view=view, rival=rival)
    assert "Nevâ against the likeliest: Hüseynî, 72 %" in text
    assert "for Nevâ +1.3" in text
    assert "for Hüseynî +0.4" in text


# --- phrases and bars


def bars(*kinds: dict[str, Any]) -> list[dict[str, Any]]:
    return [span(1, 4, True, bar=str(at), off_notes=[], fits=True) | kind for at, kind in enumerate(kinds, 1)]


def test_bars_of_which_the_same_is_said_are_joined() -> None:
    open_, other = {"decided": False}, {"name": "Hicaz"}
    rows = bars({}, open_, open_ | {"name": "Nevâ"}, other, other | {"fits": False})
    assert (
        "bars 1–3 fit Hüseynî bar 4 fits Hüseynî; by itself leaning to Hicaz, 61 % "
        "bar 5 does not fit Hüseynî; by itself leaning to Hicaz, 61 %" in said(bars=rows)
    )
    rows = bars(other, other, other | {"fits": False}, other | {"fits": False})
    assert (
        "bars 1–2 fit Hüseynî; by themselves leaning to Hicaz "
        "bars 3–4 do not fit Hüseynî; by themselves leaning to Hicaz " in said(bars=rows)
    )


def test_notes_off_the_mode_are_counted_over_the_joined_bars() -> None:
    off = {"fits": False, "off_notes": [1, 2]}
    assert "bars 1–2 4 notes off the mode" in said(bars=bars(off, off))
    assert "bar 1 2 notes off the mode; by itself leaning to Hicaz, 61 %" in said(
        bars=bars(off | {"name": "Hicaz"})
    )


def test_without_a_target_every_span_is_held_against_the_mode_of_its_stretch() -> None:
    text = said(bars=bars({}, {"stretch_mode": "Hicaz", "name": "Hicaz"}))
    assert "bar 1 fits Hüseynî bar 2 fits Hicaz" in text


def test_with_a_target_spans_are_held_against_the_target() -> None:
    aimed = {"stretch_mode": "Hicaz", "name": "Hicaz", "fits": False}
    text = squeezed(check_text(TURNED | {"bars": bars(aimed)}))
    assert "bar 1 does not fit Hüseynî; by itself leaning to Hicaz, 61 %" in text


def test_phrases_of_which_the_same_is_said_are_counted() -> None:
    phrases = [span(1, 4, True), span(5, 8, True), span(9, 16, True)]
    assert "bars 1–2, 2 phrases fit Hüseynî bars 3–4 1 note off the mode" in said(phrases=phrases)


def test_a_single_phrase_is_not_told_apart_from_the_line() -> None:
    assert "Phrase by phrase" not in said(phrases=[span(1, 16, True)])


def test_whose_theory_it_is_and_to_defer_to_the_teacher_is_said_last() -> None:
    for sample in SAMPLES.values():
        text = squeezed(check_text(sample))
        assert PLAIN["theory"] in text
        assert text.endswith(squeezed(PLAIN["caution"]))


def test_what_plain_keys_hide_is_said_where_there_is_something() -> None:
    assert "plain keys" not in said()
    assert "plain keys segâh and bûselik lie on one key" in said(
        keyboard_note="segâh and bûselik lie on one key"
    )


# --- a file without an answer


def test_a_file_that_failed_says_why_and_lists_its_faults() -> None:
    failed = {"file": "a.txt", "error": "2 tokens cannot be read", "faults": ["line 1, column 4: 'H5'", "b"]}
    assert failed_text(failed) == "a.txt: 2 tokens cannot be read\n  - line 1, column 4: 'H5'\n  - b"


def test_a_file_that_is_named_in_the_error_is_not_named_twice() -> None:
    failed = {"file": "a.mid", "error": "a.mid: no notes", "faults": []}
    assert failed_text(failed, 80) == "a.mid: no notes"


def test_a_single_fault_that_is_the_error_itself_is_said_once() -> None:
    failed = {
        "file": "a.txt",
        "error": "a.txt:1:4: 'H5' is no pitch",
        "faults": ["a.txt:1:4: 'H5' is no pitch"],
    }
    assert failed_text(failed) == "a.txt:1:4: 'H5' is no pitch"


# --- real answers

LINE = (
    "E5 D5 E5 F#5 | G5 F#5 E5:2 , | D5 C5 B4-1 A4:2 . | E5 D5 E5 F#5 | G5 F#5 E5:2 , | D5 C5 B4-1 A4:2 . | "
    "D5 E5 D5 C#5 | Bb4+1 A4:2 , Bb4+1 | C#5 D5:2 C#5 | Bb4+1 A4 G4 A4:2 . | D5 C#5 D5 C#5 | Bb4+1 A4:4 ."
)


@pytest.mark.parametrize("text", [LINE, "A4 B4-1 C5", ""])
@pytest.mark.parametrize(("aim", "stay"), [("", False), ("huseyni", True)])
@pytest.mark.parametrize("columns", [40, 80])
def test_real_answers_can_be_written(text: str, aim: str, stay: bool, columns: int) -> None:
    lines = check_text(real(text, aim, stay), columns).split("\n")
    assert max(map(width, lines)) <= columns


def test_three_wrong_notes_are_the_ones_that_are_reported() -> None:
    # composed for this test: Hüseynî with nim hicaz, kürdî and nim şehnaz put in for çargâh, segâh, gerdâniye
    text = (
        "E5 D5 E5 F#5 | G5 F#5 E5:2 , | E5 F#5 G5 A5 | G5 F#5 E5:2 . | G5 F5 E5 D5 | C#5 B4-1 C5 D5 | E5:4 , "
        "| D5 C5 Bb4 A4 | G4:2 A4:2 . | D5 E5 F#5 G#5 | F#5 E5 D5 E5 | D5 C5 B4-1 A4 | G4:2 A4:2 ."
    )
    shown = check_text(real(text, "huseyni"))
    section = shown.partition("Notes off the mode: 3")[2].partition("Characteristic")[0]
    assert re.findall(r"^  (bar \d+, beat \d)  +(.*) \(", section, re.MULTILINE)[:3] == [
        ("bar 6, beat 1", "nim hicaz"),
        ("bar 8, beat 3", "kürdî"),
        ("bar 10, beat 4", "nim şehnaz"),
    ]


def test_a_line_that_turns_says_where() -> None:
    assert re.search(r"bar 7, beat 1  (turns|may turn) from Hüseynî to", check_text(real(LINE)))
