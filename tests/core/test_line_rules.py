"""The table of rules, and the page that explains it to players."""

from pathlib import Path

import pytest

from melodycoach.core import line_rules, melody, resting_pitch
from melodycoach.core.line_rules import RULES, Fate, Key, LineRules, Taking
from melodycoach.core.note import InputKind

PAGE = (Path(__file__).parents[2] / "docs" / "playing.md").read_text(encoding="utf-8")


def test_the_page_has_a_row_for_each_rule_in_their_order() -> None:
    rows = [line.split("|")[2].strip() for line in PAGE.splitlines() if line.startswith("| ")][1:]
    says = {
        Fate.LEFT_OUT: "no note",
        Fate.GOES_ON: "the same note",
        Fate.RAISES: "that note's pitch",
        Fate.WAITS: "no note, but see",
    }
    assert [row.partition(" *")[0] for row in rows] == [says[rule.fate] for rule in RULES]


@pytest.mark.parametrize(
    ("value", "words"),
    [
        (line_rules.CHORD_S, "within 30 ms"),
        (line_rules.DOUBLING_S, "within 80 ms"),
        (line_rules.OVERLAP_S, "within 150 ms"),
        (line_rules.OUTLIVE_S, "for 50 ms more"),
        (line_rules.HELD_S, "for less than 4 s"),
        (line_rules.DRONE_S, "held for 2 s"),
        (line_rules.DRONE_NOTES, "three higher notes"),
        (line_rules.MOST_DRONES, "four newest drones"),
        (melody.BREATH_GAP_S, "silence of 1 s"),
        (melody.PHRASE_GAP_S, "one of 2.5 s"),
        (resting_pitch.HEAD_S, "a start of 0.1 s"),
        (resting_pitch.EARLY_S, "within 10 ms"),
        (resting_pitch.NEAR_CENTS, "half a semitone"),
    ],
)
def test_the_page_gives_the_numbers_that_are_in_force(value: float, words: str) -> None:
    spelled = {"three": 3.0, "four": 4.0, "half": 50.0}
    [number] = [word for word in words.split() if word in spelled or word.replace(".", "").isdigit()]
    unit = 1000.0 if " ms" in words else 1.0
    assert value * unit == spelled.get(number) or value * unit == pytest.approx(float(number))
    assert words in " ".join(PAGE.split())


@pytest.mark.parametrize("rule", RULES)
def test_with_nothing_played_no_rule_applies_and_the_key_begins_a_note(rule: line_rules.Rule) -> None:
    key = Key(60, 6000.0, InputKind.KEYS, 1.0)
    assert not rule.applies(Taking(LineRules(split_key=60), drones=(6000.0,)), key)
