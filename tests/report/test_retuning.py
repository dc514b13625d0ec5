"""A retuned keyboard on paper."""

from __future__ import annotations

import json

import pytest

from melodycoach.core.cells import width
from melodycoach.core.pitch import KEY_NAMES
from melodycoach.core.retuning import Intonation, retune
from melodycoach.report.retuning import (
    plain_json,
    retuning_json,
    retuning_text,
    saved_sentence,
    sent_sentences,
)
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
DUGAH = PACK.find("dugah")


def data(
    name: str, intonation: Intonation = Intonation.PLAYED, final: float | None = None
) -> dict[str, object]:
    return retuning_json(PACK, retune(PACK.find(name), PACK.system, intonation, final))


def test_the_table_has_a_line_for_each_of_the_twelve_keys() -> None:
    lines = retuning_text(data("acembuselik"), 80).splitlines()
    assert lines[0] == "Acembûselik on dügâh (A4), as usually played"
    assert lines[2].split() == ["key", "cents", "commas", "pitch", "in", "the", "mode"]
    assert [line.split()[0] for line in lines[3:15]] == list(KEY_NAMES)
    # 9 commas are 203.8 c; the key of B stands 200 c above A
    assert lines[14].split()[:4] == ["B", "+3.8", "+0.17", "bûselik"]
    assert lines[4].split(maxsplit=3) == ["C#", "0", "0", "in its place: no degree lies on it"]


def test_what_two_degrees_want_is_told_under_the_table() -> None:
    text = retuning_text(data("acembuselik"), 80)
    below = text.partition("Keys that two degrees want")[2]
    assert " ".join(below.split()[1:]).startswith(
        "- B: bûselik keeps the key (the rising scale comes before the passing colours); segâh sounds 23 c "
        "(1 comma) too high on it"
    )
    assert "Keys that two degrees want" not in retuning_text(data("rast"), 80)


@pytest.mark.parametrize("mode", PACK.modes, ids=lambda mode: mode.slug)
def test_no_line_is_wider_than_asked_for_and_json_holds_it(mode: object) -> None:
    for intonation in Intonation:
        values = retuning_json(PACK, retune(mode, PACK.system, intonation))  # type: ignore[arg-type]
        assert json.loads(json.dumps(values)) == values
        for columns in (40, 80, 120):
            lines = retuning_text(values, columns, ["A sentence about what was done."]).splitlines()
            assert max(map(width, lines)) <= columns


def test_a_narrow_table_keeps_keys_and_offsets() -> None:
    lines = retuning_text(data("rast"), 40).splitlines()
    assert lines[2].split() == ["key", "cents", "commas", "pitch"]


def test_values_say_what_each_key_serves_and_who_else_wanted_it() -> None:
    values = data("acembuselik", Intonation.WRITTEN)
    assert (values["mode"], values["intonation"], values["unit"]) == ("makam/acembuselik", "written", "comma")
    key = values["keys"][11]  # type: ignore[index]
    assert (key["key"], key["cents"], key["units"]) == ("B", 3.77, 0.167)
    assert (key["degree"]["name"], key["degree"]["written"]) == ("bûselik", "B4")
    assert [(one["name"], one["cents"], one["roles"]) for one in key["unserved"]] == [
        ("segâh", -18.87, ["passing"])
    ]


def test_degrees_are_named_where_the_final_puts_them() -> None:
    on_d = data("rast", final=PACK.system.units_to_cents(22))
    assert on_d["final"] == {"name": "nevâ", "written": "D5"}
    assert on_d["keys"][2]["degree"]["name"] == "nevâ"  # type: ignore[index]


def test_keys_that_are_put_back_are_said_to_be_back() -> None:
    assert retuning_text(plain_json()) == (
        "All twelve keys are back in their places, equal steps of 100 cents."
    )
    assert [key["cents"] for key in plain_json()["keys"]] == [0.0] * 12


def test_what_was_sent_is_said_with_where_and_how_exactly() -> None:
    octave = {"port": "Synth", "message": "2-byte", "channels": list(range(1, 17)), "bytes": ["00 " * 33]}
    assert sent_sentences(octave)[0] == (
        "Sent to Synth: one scale/octave tuning message of 33 bytes, to a hundredth of a cent, "
        "for every channel."
    )
    assert "play and listen, at the level that you have set" in sent_sentences(octave)[1]
    single = {"port": "Synth", "message": "1-byte", "channels": [1, 2], "bytes": ["00 " * 21]}
    assert sent_sentences(single)[0].endswith("to the nearest cent, for channels 1 and 2.")
    assert sent_sentences({**single, "channels": [4]})[0].endswith("for channel 4.")


def test_a_channel_for_each_key_is_said_key_by_key() -> None:
    sent = {
        "port": "S",
        "message": "channel",
        "channels": [1, 2, 3, 4, 5, 6, 7, 8, 9, 11, 12, 13],
        "bytes": [],
    }
    first, second, _ = sent_sentences(sent)
    assert "one for each key: C on 1, C# on 2, D on 3" in first
    assert first.endswith("A on 11, Bb on 12, B on 13.")
    assert "only one key is right" in second


def test_a_saved_profile_is_said_with_how_it_is_used() -> None:
    assert saved_sentence("home", "home.toml", True) == (
        "Saved as your keyboard profile 'home' (home.toml); melodycoach listen --keys home hears it so."
    )
    assert "with everything else in it as it was" in saved_sentence("home", "home.toml", False)
