"""`melodycoach retune`: a table, a message, a profile, a scale.

Outside sources: the MIDI Tuning Standard for the bytes that are sent; mido and music21 read what is written.
The `jack` test compares bytes that have gone through a real JACK server.
"""

from __future__ import annotations

import json
import time
import tomllib
from typing import TYPE_CHECKING, Any

import mido
import pytest
from music21.scale.scala import ScalaData

from melodycoach.cli import main
from melodycoach.commands.exit_codes import BAD_INPUT, DONE
from melodycoach.core.retuning import retune
from melodycoach.errors import PortError
from melodycoach.folders import user_keyboard_dir
from melodycoach.sources.keyboard_profile import read_keyboard
from melodycoach.sources.midi_tuning import TunedOctave, read_tuning
from melodycoach.sources.pack_file import load_pack

if TYPE_CHECKING:
    from collections.abc import Iterable
    from pathlib import Path

PACK = load_pack("makam")
DEADLINE_S = 10.0


@pytest.fixture
def sent(monkeypatch: pytest.MonkeyPatch) -> list[tuple[str, list[bytes]]]:
    """Give what is sent to where; a port that is called nowhere is not there."""
    kept: list[tuple[str, list[bytes]]] = []

    def send_to(wanted: str, messages: Iterable[bytes]) -> str:
        if wanted == "nowhere":
            raise PortError("no MIDI output 'nowhere'")
        kept.append((wanted, list(messages)))
        return "Synth 24:0"

    monkeypatch.setattr("melodycoach.sending.send_to", send_to)
    return kept


def run(capsys: pytest.CaptureFixture[str], *words: str, code: int = DONE) -> str:
    assert main(["retune", *words]) == code
    printed = capsys.readouterr()
    return printed.out if code == DONE else printed.err


def run_json(capsys: pytest.CaptureFixture[str], *words: str) -> dict[str, Any]:
    values: dict[str, Any] = json.loads(run(capsys, *words, "--json"))
    return values


def cents(name: str) -> list[float]:
    return [round(one, 2) for one in retune(PACK.find(name), PACK.system).offsets]


def test_a_table_is_printed_and_nothing_is_kept(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    assert run(capsys, "HÜSEYNÎ").startswith("Hüseynî on dügâh (A4), as usually played\n")
    assert list(tmp_path.iterdir()) == []


def test_json_has_the_twelve_keys_and_what_was_done(capsys: pytest.CaptureFixture[str]) -> None:
    values = run_json(capsys, "huseyni")
    assert [key["cents"] for key in values["keys"]] == cents("huseyni")
    assert (values["sent"], values["saved"], values["scl"]) == (None, None, None)


def test_the_book_and_another_final_can_be_asked_for(capsys: pytest.CaptureFixture[str]) -> None:
    written = run_json(capsys, "ussak", "--as", "written")
    assert written["keys"][11]["cents"] == -18.87  # 8 commas over A4, less 200 cents
    on_d = run_json(capsys, "ussak", "--final", "nevâ", "--as", "written")
    assert on_d["keys"][2]["degree"]["degree"] == 0
    assert run_json(capsys, "ussak", "--final", "written")["final"]["name"] == "dügâh"


@pytest.mark.parametrize(
    ("words", "said"),
    [
        ([], "no MODE; name one, or put every key back with --plain"),
        (["rast", "--plain"], "--plain and MODE: back in their places or on a mode; leave one out"),
        (["--plain", "--scl", "a.scl"], "--plain and --scl: the scale of a mode is written; name a MODE"),
        (["--plain", "--final", "A4"], "--plain and --final: without a MODE there is no final"),
        (["rast", "--final", "any"], "--final any: keys are tuned for one final"),
        (["rast", "--channels", "1"], "--channels goes with --send"),
        (["rast", "--message", "1-byte"], "--message goes with --send"),
        (
            ["rast", "--send", "s", "--message", "channel", "--channels", "1,2"],
            "--message channel needs a channel for each of twelve keys: name more of them",
        ),
        (["rsat"], "no mode 'rsat' in pack 'makam'; did you mean 'rast'?"),
        (["rast", "--save", " "], "--save ' ': not a name for a keyboard profile"),
        (["rast", "--send", "nowhere", "--save", "home"], "no MIDI output 'nowhere'"),
    ],
)
def test_what_does_not_go_together_is_refused(
    words: list[str], said: str, capsys: pytest.CaptureFixture[str], sent: object, tmp_path: Path
) -> None:
    assert said in run(capsys, *words, code=BAD_INPUT)
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize("channels", ["0", "1,17", "a", "1,,2", ""])
def test_channels_that_do_not_exist_are_refused(channels: str, capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit):
        main(["retune", "rast", "--send", "x", "--channels", channels])
    assert "are not channels from 1 to 16" in capsys.readouterr().err


# to an instrument


@pytest.mark.parametrize(("form", "size"), [("2-byte", 33), ("1-byte", 21)])
def test_one_message_tunes_the_octave(
    capsys: pytest.CaptureFixture[str], sent: list[tuple[str, list[bytes]]], form: str, size: int
) -> None:
    said = run(capsys, "segah", "--send", "synth", "--message", form)
    [(wanted, [message])] = sent
    told = read_tuning(message)
    assert wanted == "synth"
    assert len(message) == size
    assert mido.Message.from_bytes(message).type == "sysex"
    assert isinstance(told, TunedOctave)
    assert len(told.channels) == 16
    assert list(told.cents_by_class.values()) == pytest.approx(cents("segah"), abs=0.51)
    assert "Sent to Synth 24:0: one scale/octave tuning message" in said


def test_only_the_channels_that_were_named_are_tuned(
    capsys: pytest.CaptureFixture[str], sent: list[tuple[str, list[bytes]]]
) -> None:
    values = run_json(capsys, "segah", "--send", "synth", "--channels", "2,1")
    told = read_tuning(sent[0][1][0])
    assert isinstance(told, TunedOctave)
    assert told.channels == (0, 1)
    assert values["sent"]["channels"] == [1, 2]
    assert [bytes.fromhex(one) for one in values["sent"]["bytes"]] == sent[0][1]


def test_a_channel_for_each_key_is_sent_and_said(
    capsys: pytest.CaptureFixture[str], sent: list[tuple[str, list[bytes]]]
) -> None:
    values = run_json(capsys, "segah", "--send", "synth", "--message", "channel")
    assert values["sent"]["channels"] == [1, 2, 3, 4, 5, 6, 7, 8, 9, 11, 12, 13]
    assert len(sent[0][1]) == 12 * 7


def test_every_key_can_be_put_back(
    capsys: pytest.CaptureFixture[str], sent: list[tuple[str, list[bytes]]]
) -> None:
    said = run(capsys, "--plain", "--send", "synth", "--save", "home")
    assert said.startswith("All twelve keys are back in their places")
    assert sent[0][1][0][8:-1] == b"\x40\x00" * 12
    assert not read_keyboard(user_keyboard_dir() / "home.toml").is_tuned


# to keep


def test_a_profile_is_saved_under_its_name(capsys: pytest.CaptureFixture[str]) -> None:
    values = run_json(capsys, "huseyni", "--save", "home")
    profile = read_keyboard(user_keyboard_dir() / "home.toml")
    assert values["saved"] == str(user_keyboard_dir() / "home.toml")
    assert profile.name == "home"
    assert profile.tuning == "Hüseynî, as usually played"
    assert list(profile.cents_by_class) == cents("huseyni")


def test_a_profile_that_is_there_keeps_everything_but_its_tuning(capsys: pytest.CaptureFixture[str]) -> None:
    path = user_keyboard_dir() / "home.toml"
    path.parent.mkdir(parents=True)
    path.write_text(
        '[keyboard]\nname = "my old one"\nchannel = 4\nnote = "left pedal broken"', encoding="utf-8"
    )
    assert "with everything else in it as it was" in run(capsys, "huseyni", "--save", "home").replace(
        "\n", " "
    )
    kept = tomllib.loads(path.read_text(encoding="utf-8"))["keyboard"]
    assert (kept["name"], kept["channel"], kept["note"]) == ("my old one", 4, "left pedal broken")
    assert kept["cents"] == cents("huseyni")


def test_a_damaged_profile_is_not_written_over(
    capsys: pytest.CaptureFixture[str], sent: list[tuple[str, list[bytes]]]
) -> None:
    path = user_keyboard_dir() / "home.toml"
    path.parent.mkdir(parents=True)
    path.write_text("[keyboard]", encoding="utf-8")
    said = run(capsys, "rast", "--save", "home", "--send", "synth", code=BAD_INPUT)
    assert "name is missing" in said
    assert path.read_text(encoding="utf-8") == "[keyboard]"
    assert sent == []


def test_a_scale_is_written_for_softsynths(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    path = tmp_path / "scales" / "hicaz.scl"
    assert f"The scale is in {path}." in run(capsys, "hicaz", "--scl", str(path), "--as", "written").replace(
        "\n", " "
    )
    read = ScalaData(path.read_text(encoding="latin-1"))
    read.parse()
    assert read.description == "Hicaz on dugah, as written"
    # 5 17 22 31 35 39 44 commas over dügâh, and the octave
    expected = [units * 1200 / 53 for units in (5, 17, 22, 31, 35, 39, 44, 53)]
    assert read.getCentsAboveTonic() == pytest.approx(expected, abs=1e-5)
    run(capsys, "rast", "--scl", str(path))  # a scale may be written over
    assert "Rast on rast, as usually played" in path.read_text(encoding="latin-1")


def test_another_file_is_not_written_over_by_a_scale(
    capsys: pytest.CaptureFixture[str], tmp_path: Path, sent: list[tuple[str, list[bytes]]]
) -> None:
    path = tmp_path / "draft.txt"
    path.write_text("A4 B4", encoding="utf-8")
    said = run(capsys, "rast", "--scl", str(path), "--send", "synth", code=BAD_INPUT)
    assert said == (
        f"melodycoach: {path}: there is a file there that is no Scala scale; choose another name\n"
    )
    assert path.read_text(encoding="utf-8") == "A4 B4"
    assert sent == []


# through a real server


@pytest.mark.jack
def test_what_is_sent_arrives_byte_by_byte(jack_server: object, capsys: pytest.CaptureFixture[str]) -> None:
    import rtmidi

    synth = rtmidi.MidiIn(rtmidi.API_UNIX_JACK, name="synth")
    synth.ignore_types(sysex=False)
    synth.open_virtual_port("in")
    try:
        for form, n_messages in (("2-byte", 1), ("1-byte", 1), ("channel", 84)):
            values = run_json(capsys, "segah", "--send", "synth", "--message", form)
            assert values["sent"]["port"] == "synth:in"
            received: list[str] = []
            deadline_s = time.monotonic() + DEADLINE_S
            while len(received) < n_messages:
                assert time.monotonic() < deadline_s, "it did not arrive"
                found = synth.get_message()
                if found is None:
                    time.sleep(0.002)
                else:
                    received.append(bytes(found[0]).hex(" ").upper())
            assert received == values["sent"]["bytes"]
    finally:
        synth.close_port()
        synth.delete()
