"""Keyboard profiles: read, refused with every fault, written, and what the tracker makes of them.

Outside sources: TOML 1.0, by Python's tomllib; MPE (RP-053) for what a zone can be.
"""

from __future__ import annotations

import contextlib
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.core.note import InputKind
from melodycoach.core.pitch import COMMA_CENTS
from melodycoach.errors import MelodycoachError, ProfileError, StorageError, UnknownNameError
from melodycoach.sources.keyboard_profile import (
    KeyboardProfile,
    find_keyboards,
    keyboard_path,
    list_keyboards,
    load_keyboard,
    read_keyboard,
    write_keyboard,
)
from melodycoach.sources.keyboard_rules import key_number
from melodycoach.sources.midi_mpe import MpeZone

E_AND_B = "[0, 0, 0, 0, -23, 0, 0, 0, 0, 0, 0, -41.5]"
TWELVE = "for the keys C, C#, D and so on to B"
CENTS_EXPECTED = f"expected twelve numbers from -100 to 100, {TWELVE}"
ZONES_EXPECTED = "expected one or two tables [[keyboard.mpe]] with manager, members and range"
TUNED = (0.0, 0.0, 0.0, 0.0, -23.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, -41.5)


def written(folder: Path, text: str, name: str = "home") -> Path:
    folder.mkdir(exist_ok=True)
    path = folder / f"{name}.toml"
    path.write_text(text, encoding="utf-8")
    return path


def faults(folder: Path, text: str) -> list[str]:
    path = written(folder, text)
    with pytest.raises(ProfileError) as error:
        read_keyboard(path)
    n_faults = len(error.value.faults)
    count = "1 fault" if n_faults == 1 else f"{n_faults} faults"
    assert str(error.value) == f"{path}: {count} in this keyboard profile, expected none; mend what follows"
    assert all(fault.startswith("home.toml: ") for fault in error.value.faults)
    return [fault.removeprefix("home.toml: ") for fault in error.value.faults]


# reading


def test_a_profile_says_what_the_keyboard_does_not(tmp_path: Path) -> None:
    path = written(
        tmp_path,
        f"""
        [keyboard]
        name = "the old one"
        note = "third button of the scale panel"
        tuning = "segâh and hüzzam"
        cents = {E_AND_B}
        channel = 3
        transposition = -2
        split = "C4"
        """,
    )
    assert read_keyboard(path) == KeyboardProfile(
        "the old one",
        TUNED,
        channel=2,
        semitones=-2,
        split_key=60,
        tuning="segâh and hüzzam",
        note="third button of the scale panel",
    )


def test_a_name_is_enough(tmp_path: Path) -> None:
    profile = read_keyboard(written(tmp_path, '[keyboard]\nname = "plain"'))
    assert profile == KeyboardProfile("plain")
    assert not profile.is_tuned
    assert profile.ignored_channels == {9}
    assert profile.split_sounds is None


def test_offsets_may_be_in_commas(tmp_path: Path) -> None:
    commas = "[0, 0, 0, 0, -1, 0, 0, 0, 0, 0, 0, 0.5]"
    profile = read_keyboard(written(tmp_path, f'[keyboard]\nname = "k"\ncommas = {commas}'))
    assert profile.cents_by_class[4] == pytest.approx(-COMMA_CENTS)
    assert profile.cents_by_class[11] == pytest.approx(COMMA_CENTS / 2)
    assert profile.is_tuned


def test_zones_may_leave_out_what_is_usual(tmp_path: Path) -> None:
    # RP-053: fifteen members at most, 48 semitones to begin with
    usual = read_keyboard(written(tmp_path, '[keyboard]\nname = "k"\n[[keyboard.mpe]]'))
    assert usual.zones == (MpeZone(0, 15, 4800),)
    two = """
    [keyboard]
    name = "k"
    mpe = [{manager = 1, members = 7, range = 24}, {manager = 16, members = 7, range = 12.5}]
    """
    assert read_keyboard(written(tmp_path, two)).zones == (MpeZone(0, 7, 2400), MpeZone(15, 7, 1250))


@pytest.mark.parametrize(
    ("text", "number"),
    [("C-1", 0), ("G9", 127), ("A4", 69), ("F#3", 54), ("Gb3", 54), ("Cb4", 59), ("G#9", None),
     ("Cb-1", None), ("H4", None), ("", None), ("A", None), ("a4", None)],
)  # fmt: skip
def test_keys_are_named_as_scientific_pitch_does(text: str, number: int | None) -> None:
    # A4 is key 69, C-1 key 0: the numbering of the MIDI Tuning Standard
    assert key_number(text) == number


def test_the_profile_of_the_docs_can_be_used(tmp_path: Path) -> None:
    page = Path(__file__).resolve().parents[2] / "docs" / "midi.md"
    blocks = [block.removeprefix("toml\n") for block in page.read_text(encoding="utf-8").split("```")[1::2]]
    plain, zone = (block for block in blocks if "[keyboard" in block)
    profile = read_keyboard(written(tmp_path, plain))
    assert (profile.cents_by_class[4], profile.cents_by_class[11], profile.split_key) == (-50.0, -50.0, 60)
    assert read_keyboard(written(tmp_path, f"{plain}\n{zone}")).zones == (MpeZone(0, 15, 4800),)


# refusing


def test_every_fault_is_said_at_once(tmp_path: Path) -> None:
    said = faults(
        tmp_path,
        """
        [keyboard]
        nmae = "slip"
        note = ""
        cents = [0, 0, 0, 0, -123, 0, 0, 0, 0, 0, 0, 0]
        commas = [0, 0]
        channel = 17
        transposition = 1.5
        split = "H4"
        [[keyboard.mpe]]
        manager = 2
        members = 0
        range = 97
        memebrs = 3
        [keyboards]
        """,
    )
    assert said == [
        "unknown key 'keyboards'; did you mean 'keyboard'?",
        "keyboard: name is missing, expected text that is not blank",
        "keyboard: unknown key 'nmae'; did you mean 'name'?",
        "keyboard: note is '', expected text that is not blank and has no control characters",
        f"keyboard: cents is [0, 0, 0, 0, -123, 0, 0, 0, 0, 0, 0, 0], {CENTS_EXPECTED}",
        f"keyboard: commas is [0, 0], expected twelve numbers from -4.4 to 4.4, {TWELVE}",
        "keyboard: channel is 17, expected a channel from 1 to 16",
        "keyboard: transposition is 1.5, expected whole semitones from -48 to 48",
        "keyboard: split is 'H4', expected a key such as 'C4' or 'F#3' (A4 is 440 Hz)",
        "keyboard: mpe[0]: manager is 2, expected channel 1 or 16",
        "keyboard: mpe[0]: members is 0, expected a number of channels from 1 to 15",
        "keyboard: mpe[0]: range is 97, expected semitones from 0 to 96",
        "keyboard: mpe[0]: unknown key 'memebrs'; did you mean 'members'?",
        "keyboard: both cents and commas are given, expected one of them",
        "keyboard: both channel and mpe are given; MPE uses many channels: leave one of them out",
    ]


@pytest.mark.parametrize(
    ("text", "fault"),
    [
        ("", "keyboard is missing, expected a table [keyboard]"),
        ("keyboard = 5", "keyboard is 5, expected a table [keyboard]"),
        (
            '[keyboard]\nname = "k"\nmpe = [{manager = 1, members = 9}, {manager = 16, members = 9}]',
            "keyboard: the two mpe zones share a channel; give them other managers or fewer members",
        ),
        (
            '[keyboard]\nname = "k"\nmpe = 48',
            f"keyboard: mpe is 48, {ZONES_EXPECTED}",
        ),
        (
            '[keyboard]\nname = "k"\nchannel = true',
            "keyboard: channel is True, expected a channel from 1 to 16",
        ),
        (
            '[keyboard]\nname = "k"\ncents = [nan, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0]',
            f"keyboard: cents is [nan, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0], {CENTS_EXPECTED}",
        ),
        (
            '[keyboard]\nname = "a\\u001b[2Jb"',
            "keyboard: name is 'a\\x1b[2Jb', expected text that is not blank and has no control characters",
        ),
    ],
)
def test_a_fault_says_what_was_found_and_what_was_expected(tmp_path: Path, text: str, fault: str) -> None:
    assert faults(tmp_path, text) == [fault]


@pytest.mark.parametrize(
    ("data", "fault"),
    [
        (b"\xff\xfe", "home.toml: byte 0 is not UTF-8 text; save the file as UTF-8"),
        (b"[keyboard", "home.toml: expected ']' at the end of a table declaration"),
        (b"a = " + b"[" * 20_000, "home.toml: nested too deeply"),
    ],
)
def test_what_is_no_toml_is_refused(tmp_path: Path, data: bytes, fault: str) -> None:
    path = tmp_path / "home.toml"
    path.write_bytes(data)
    with pytest.raises(ProfileError) as error:
        read_keyboard(path)
    assert str(error.value) == f"{path}: not a keyboard profile, expected a TOML file"
    assert error.value.faults[0].startswith(fault)


@given(st.binary(max_size=60))
def test_no_bytes_make_the_reader_fail_in_another_way(
    tmp_path_factory: pytest.TempPathFactory, data: bytes
) -> None:
    path = tmp_path_factory.getbasetemp() / "random.toml"
    for text in (data, b"[keyboard]\nname = 'k'\ncents = " + data):
        path.write_bytes(text)
        with contextlib.suppress(MelodycoachError):
            read_keyboard(path)


# finding


def test_a_profile_is_found_by_its_name_in_any_letter_case_or_by_its_path(tmp_path: Path) -> None:
    path = written(tmp_path / "keyboards", '[keyboard]\nname = "k"', "Home")
    folder = path.parent
    for name in ("Home", "home", str(path)):
        assert load_keyboard(name, folder).name == "k"
    assert load_keyboard(str(path), tmp_path / "other").name == "k"


def test_a_name_that_is_not_there_is_refused_with_those_that_are(tmp_path: Path) -> None:
    with pytest.raises(UnknownNameError) as error:
        load_keyboard("home", tmp_path / "none")
    assert str(error.value) == (
        f"no keyboard profile 'home' in {tmp_path / 'none'}; there is none yet; docs/midi.md shows one"
    )
    written(tmp_path, "", "home")
    with pytest.raises(UnknownNameError) as error:
        load_keyboard("hom", tmp_path)
    assert str(error.value) == f"no keyboard profile 'hom' in {tmp_path}; did you mean 'home'?"


def test_a_path_that_is_not_there_is_said(tmp_path: Path) -> None:
    with pytest.raises(StorageError) as error:
        load_keyboard(str(tmp_path / "x" / "a.toml"), tmp_path)
    assert str(error.value).endswith("cannot be read (no such file or directory); choose another file")


def test_a_name_with_a_slash_or_the_ending_is_a_path(tmp_path: Path) -> None:
    assert keyboard_path("home", tmp_path) == tmp_path / "home.toml"
    assert str(keyboard_path("home.toml", tmp_path)) == "home.toml"
    assert keyboard_path("./home", tmp_path).name == "home"


def test_a_folder_that_is_none_is_said(tmp_path: Path) -> None:
    (tmp_path / "keyboards").write_text("", encoding="utf-8")
    with pytest.raises(StorageError, match="keyboard profiles cannot be read"):
        find_keyboards(tmp_path / "keyboards")


def test_a_damaged_profile_is_listed_with_why(tmp_path: Path) -> None:
    written(tmp_path, '[keyboard]\nname = "k"', "a")
    path = written(tmp_path, "", "b")
    (tmp_path / "readme.txt").write_text("", encoding="utf-8")
    fault = f"{path}: 1 fault in this keyboard profile, expected none; mend what follows"
    assert list_keyboards(tmp_path) == (("a", tmp_path / "a.toml", ""), ("b", path, fault))


# writing

OFFSETS = st.tuples(*[st.integers(-10_000, 10_000).map(lambda number: number / 100)] * 12)
TEXTS = st.text(st.characters(exclude_categories=("C", "Z")), min_size=1, max_size=20)
ONE_ZONE = st.builds(MpeZone, st.sampled_from([0, 15]), st.integers(1, 15), st.integers(0, 9600))
ZONES = st.one_of(st.just(()), st.tuples(ONE_ZONE), st.just((MpeZone(0, 7, 2400), MpeZone(15, 7, 1250))))


@given(
    st.builds(
        KeyboardProfile,
        TEXTS,
        OFFSETS,
        st.one_of(st.none(), st.integers(0, 15)),
        st.integers(-48, 48),
        st.one_of(st.none(), st.integers(0, 127)),
        ZONES,
        st.one_of(st.just(""), TEXTS),
        st.one_of(st.just(""), TEXTS),
    )
)
def test_what_is_written_is_read_back(
    tmp_path_factory: pytest.TempPathFactory, profile: KeyboardProfile
) -> None:
    path = tmp_path_factory.getbasetemp() / "back.toml"
    path.write_text(write_keyboard(profile), encoding="utf-8")
    if profile.channel is not None and profile.zones:
        with pytest.raises(ProfileError):
            read_keyboard(path)
        return
    assert read_keyboard(path) == profile


def test_a_written_profile_shows_the_keys_over_their_offsets() -> None:
    lines = write_keyboard(KeyboardProfile("home", TUNED, zones=(MpeZone(15, 4, 2450),))).splitlines()
    assert lines == [
        "# A keyboard profile of melodycoach; docs/midi.md says what may stand in it.",
        "[keyboard]",
        'name = "home"',
        "#        C  C#  D  Eb    E  F  F#  G  G#  A  Bb      B",
        "cents = [0,  0, 0,  0, -23, 0,  0, 0,  0, 0,  0, -41.5]",
        "",
        "[[keyboard.mpe]]",
        "manager = 16",
        "members = 4",
        "range = 24.5",
    ]


# what the tracker makes of it


def test_keys_with_an_offset_sound_where_the_profile_says() -> None:
    tracker = KeyboardProfile("k", TUNED).tracker()
    [note] = tracker.decode(bytes.fromhex("90 40 40"), 0.0)
    assert (note.pitch_cents, note.kind) == (6377.0, InputKind.TUNED)
    [note] = tracker.decode(bytes.fromhex("90 3C 40"), 0.0)
    assert (note.pitch_cents, note.kind) == (6000.0, InputKind.TUNED)


def test_transposition_alone_leaves_keys_plain_and_adds_to_the_keyboard_s_own() -> None:
    tracker = KeyboardProfile("k", semitones=3).tracker()
    [note] = tracker.decode(bytes.fromhex("90 40 40"), 0.0)
    assert (note.pitch_cents, note.kind) == (6700.0, InputKind.KEYS)
    tracker.decode(bytes.fromhex("F0 7F 7F 04 04 00 3F F7"), 0.0)  # master coarse tuning, a semitone down
    [note] = tracker.decode(bytes.fromhex("90 41 40"), 0.0)
    assert note.pitch_cents == 6700.0


def test_an_offset_belongs_to_the_key_that_is_pressed_and_not_to_what_it_is_moved_to() -> None:
    tracker = KeyboardProfile("k", TUNED, semitones=2).tracker()
    [note] = tracker.decode(bytes.fromhex("90 40 40"), 0.0)  # E4
    assert note.pitch_cents == 6577.0


def test_only_the_channel_of_the_profile_is_heard() -> None:
    tracker = KeyboardProfile("k", channel=9).tracker()
    assert tracker.decode(bytes.fromhex("90 40 40"), 0.0) == ()
    assert len(tracker.decode(bytes.fromhex("99 40 40"), 0.0)) == 1
    assert tracker.n_ignored_notes == 1


def test_zones_of_the_profile_are_in_force_from_the_beginning() -> None:
    tracker = KeyboardProfile("k", zones=(MpeZone(0, 15, 4800),)).tracker()
    tracker.decode(
        bytes.fromhex("E1 59 3F"), 0.0
    )  # -39 of 8192, 48 semitones: -22.85 c (worked in RP-053's terms)
    [note] = tracker.decode(bytes.fromhex("91 40 40"), 0.0)
    assert note.pitch_cents == pytest.approx(6400 - 39 * 4800 / 8192)


def test_the_split_is_where_its_key_sounds() -> None:
    assert KeyboardProfile("k", semitones=-12, split_key=60).split_sounds == 48
