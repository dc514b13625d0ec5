"""One line in three kinds of file is answered alike: note text, MusicXML with AEU signs, MIDI with bends.

The files are written by music21, by mido, and as plain text after the MusicXML 4.0 tables (`written_out`), so
what holds here is not only that our readers agree with each other. A line is tried as its composer would:
checked as it is, with three wrong notes put in, and with a second mode set behind it.
"""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import pytest
from book_lines import BY_THE_BOOK
from written_out import as_midi, as_music21, as_music21_midi, as_music_xml

from melodycoach.checking import Question, answer_task
from melodycoach.core.note import Note
from melodycoach.sources.note_text import read_note_text
from melodycoach.sources.pack_file import load_pack
from melodycoach.sources.sheet_file import read_sheet

if TYPE_CHECKING:
    from collections.abc import Callable

PACK = load_pack("makam")
EXAMPLES = Path(__file__).resolve().parents[2] / "examples"
ASK = Question(PACK, PACK.modes)  # all modes compete, and each on its written final

WRITERS: dict[str, Callable[[Any], bytes]] = {
    "plain text": as_music_xml,
    "music21": as_music21,
    "mido": as_midi,
}
KINDS = {"plain text": "MusicXML", "music21": "MusicXML", "mido": "MIDI file"}
NEARLY = 0.04  # of a probability: a bent key is not so exact as a written note
BY_WRITER = pytest.mark.parametrize("writer", WRITERS)
BY_ANY_WRITER = pytest.mark.parametrize("writer", ["note text", *WRITERS])

LINES = {
    **{f"by the book: {name}": text for name, text in BY_THE_BOOK.items()},
    **{path.stem: path.read_text(encoding="utf-8") for path in sorted(EXAMPLES.glob("*.txt"))},
}


def without_mode(text: str) -> str:
    """Take the header away that says what the line aims at: the other kinds of file have none."""
    return "\n".join(line for line in text.splitlines() if not line.startswith("mode:")) + "\n"


def answered(data: bytes, question: Question = ASK) -> dict[str, Any]:
    answer = answer_task(question, ("line", data))
    assert "error" not in answer, answer["error"]
    return answer


def both(text: str, writer: str, question: Question = ASK) -> tuple[dict[str, Any], dict[str, Any]]:
    """Give the answer to a text, and to the same line in another kind of file."""
    text = without_mode(text)
    other = answered(WRITERS[writer](read_note_text(text, PACK.names)), question)
    assert other["kind"] == KINDS[writer]
    assert other["lost"] == []
    return answered(text.encode(), question), other


def notes_of(answer: dict[str, Any]) -> list[tuple[Any, ...]]:
    return [
        (note["height"] // 1, note["name"], note["written"], note["closes"], note["phrase"], note["stretch"])
        for note in answer["notes"]
    ]


def told(answer: dict[str, Any]) -> dict[str, Any]:
    """Keep what a composer is told, without where it stands in the file."""
    return {
        "leads": (answer["whole"]["mode"], answer["whole"]["decided"], answer["whole"]["among"]),
        "in view": (answer["in_view"]["mode"], answer["in_view"]["ladder"]),
        "off": [(note["number"], note["off"]) for note in answer["notes"] if note["off"]],
        "off notes": answer["off_notes"],
        "changes": [(one["note"], one["from"], one["to"], one["noticed_at"]) for one in answer["changes"]],
        "phrases": [(one["first"], one["last"], one["decided"] and one["mode"]) for one in answer["phrases"]],
        "heard": [
            [(step["id"], step["heard_at"]) for step in one["steps"]["heard"]] for one in answer["stretches"]
        ],
        "owed": [{step["id"] for step in one["steps"]["owed"]} for one in answer["stretches"]],
        "stretches": [(one["first"], one["last"], one["mode"]) for one in answer["stretches"]],
    }


@BY_WRITER
@pytest.mark.parametrize("name", LINES)
def test_a_line_is_answered_alike_whatever_the_file(name: str, writer: str) -> None:
    text, other = both(LINES[name], writer)
    assert notes_of(other) == notes_of(text)
    assert told(other) == told(text)
    assert other["whole"]["probability"] == pytest.approx(text["whole"]["probability"], abs=NEARLY)


@BY_WRITER
@pytest.mark.parametrize("name", LINES)
def test_the_pitches_are_the_same_to_a_twentieth_of_a_cent(name: str, writer: str) -> None:
    # a bend step of range 2 is 0.024 cents
    text, other = both(LINES[name], writer)
    heard = [note["pitch_cents"] for note in other["notes"]]
    assert heard == pytest.approx([note["pitch_cents"] for note in text["notes"]], abs=0.05)


@pytest.mark.parametrize("name", LINES)
def test_the_bends_that_music21_writes_are_read_to_its_cent(name: str) -> None:
    read = read_note_text(without_mode(LINES[name]), PACK.names)
    sheet = read_sheet(as_music21_midi(read), "line", PACK.names)
    heard = [item.pitch_cents for item in sheet.items if isinstance(item, Note)]
    written = [item.pitch_cents for item in read.items if isinstance(item, Note)]
    assert heard[1:] == pytest.approx(written[1:], abs=1.0)  # before the first, music21 takes its bend back
    assert heard[0] == pytest.approx(round(written[0], -2), abs=1.0) or heard[0] == pytest.approx(written[0])


# --- three wrong notes -------------------------------------------------------------------------

# a line, and the wrong notes in place of its own, by their number from 1
WRONG = {
    "Hüseynî": (2 * (BY_THE_BOOK["huseyni"] + "\n"), {4: "Eb5", 10: "C#5", 17: "Bb4"}, "huseyni"),
    "Rast": (2 * (BY_THE_BOOK["rast"] + "\n"), {3: "Bb4", 8: "C#5", 16: "Ab4"}, "rast"),
    "Hicaz": (2 * (BY_THE_BOOK["hicaz"] + "\n"), {3: "C5", 8: "B4-1", 15: "Eb5"}, "hicaz"),
    "Evening": (LINES["evening-huseyni"], {6: "Ab5", 18: "C#5", 24: "Bb4"}, "huseyni"),
    "Ferry": (LINES["ferry-rast"], {4: "C#5", 15: "Eb5", 27: "Ab4"}, "rast"),
}
# in a dozen notes that are played twice, three wrong ones may well say another mode; not in these
EXAMPLES_WRONG = ["Hicaz", "Evening", "Ferry"]


def with_wrong_notes(text: str, wrong: dict[int, str]) -> str:
    """Put other notes in the place of some, each as long as the one that it replaces."""
    read = read_note_text(without_mode(text), PACK.names)
    places = [
        place for place, item in zip(read.places, read.items, strict=True) if hasattr(item, "pitch_cents")
    ]
    lines = without_mode(text).splitlines()
    for number in sorted(wrong, reverse=True):
        row, column = places[number - 1]
        line = lines[row - 1]
        token = line[column - 1 :].split()[0]
        length = token[token.index(":") :] if ":" in token else ""
        lines[row - 1] = line[: column - 1] + wrong[number] + length + line[column - 1 + len(token) :]
    return "\n".join(lines)


def in_file(text: str, writer: str) -> bytes:
    """Put a line into a kind of file."""
    text = without_mode(text)
    return text.encode() if writer == "note text" else WRITERS[writer](read_note_text(text, PACK.names))


@BY_ANY_WRITER
@pytest.mark.parametrize("name", WRONG)
def test_three_wrong_notes_are_exactly_the_ones_reported_when_the_mode_is_named(
    name: str, writer: str
) -> None:
    line, wrong, mode = WRONG[name]
    question = Question(PACK, PACK.modes, stay_in=PACK.find(mode))
    clean = answered(in_file(line, writer), question)
    assert (clean["off_notes"], clean["stay_in"]["stays"]) == ([], True)
    answer = answered(in_file(with_wrong_notes(line, wrong), writer), question)
    assert answer["off_notes"] == sorted(wrong)
    assert [note["number"] for note in answer["notes"] if note["off"]] == sorted(wrong)
    assert not answer["stay_in"]["stays"]
    assert answer["stay_in"]["first"]["note"] == min(wrong)


@BY_ANY_WRITER
@pytest.mark.parametrize("name", EXAMPLES_WRONG)
def test_three_wrong_notes_are_exactly_the_ones_reported_though_no_mode_is_named(
    name: str, writer: str
) -> None:
    line, wrong, mode = WRONG[name]
    answer = answered(in_file(with_wrong_notes(line, wrong), writer))
    assert answer["whole"]["mode"] == PACK.find(mode).id
    assert answer["off_notes"] == sorted(wrong)


# --- two modes, one behind the other -----------------------------------------------------------

SPLICED = [
    ("huseyni", "hicaz"),
    ("rast", "nihavend"),
    ("hicaz", "saba"),
    ("segah", "huseyni"),
    ("nihavend", "rast"),
]
NEAR = 12  # notes


@BY_ANY_WRITER
@pytest.mark.parametrize(("first", "second"), SPLICED)
def test_the_seam_of_two_modes_is_found_within_twelve_notes(first: str, second: str, writer: str) -> None:
    text = f"{BY_THE_BOOK[first]}\n{BY_THE_BOOK[first]}\n{BY_THE_BOOK[second]}\n{BY_THE_BOOK[second]}\n"
    n_first = 2 * sum(token not in (",", ".") for token in BY_THE_BOOK[first].split())
    (change,) = answered(in_file(text, writer))["changes"]
    assert abs(change["note"] - (n_first + 1)) <= NEAR
    assert change["noticed_at"] - n_first <= NEAR
    assert change["from"] == PACK.find(first).name
