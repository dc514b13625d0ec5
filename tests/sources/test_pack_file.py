"""Reading mode packs: the gates, every fault at once; and finding them."""

import json
import re
import tomllib
from collections.abc import Mapping
from dataclasses import FrozenInstanceError, fields, is_dataclass
from enum import Enum
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from melodycoach.core.mode import Course, Repertoire
from melodycoach.core.pitch import COMMAS_53, SEMITONES_12
from melodycoach.errors import MelodycoachError, PackError, StorageError, UnknownNameError
from melodycoach.sources import pack_rules
from melodycoach.sources.pack_checks import DEGREE_LISTS, shown
from melodycoach.sources.pack_file import (
    SHIPPED,
    find_packs,
    list_packs,
    load_pack,
    read_pack,
    shadowed_packs,
)
from melodycoach.sources.pack_rules import RULES, Gate, faults_in

HERE = Path(__file__).parent
VALID = sorted((HERE / "packs" / "valid").glob("*.toml"))
INVALID = sorted((HERE / "packs" / "invalid").glob("*.toml"))
DOC = HERE.parent.parent / "docs" / "pack-format.md"
LEAST = (HERE / "packs" / "valid" / "least.toml").read_text(encoding="utf-8")


def plain(value: object) -> Any:
    """Turn frozen values into what JSON can hold."""
    if isinstance(value, Enum):
        return value.value
    if is_dataclass(value):
        return {one.name: plain(getattr(value, one.name)) for one in fields(value)}
    if isinstance(value, Mapping):
        return {str(key): plain(one) for key, one in value.items()}
    return [plain(one) for one in value] if isinstance(value, tuple) else value


def write(path: Path, text: str = LEAST) -> Path:
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_text(text, encoding="utf-8")
    return path


def faults_of(path: Path) -> tuple[str, ...]:
    with pytest.raises(PackError) as caught:
        read_pack(path)
    return caught.value.faults


# --- golden files


def test_the_golden_packs_are_there() -> None:
    assert len(VALID) >= 2
    assert len(INVALID) >= 5


@pytest.mark.parametrize("path", VALID, ids=lambda path: path.stem)
def test_a_sound_pack_gives_the_values_it_states(path: Path) -> None:
    expected = json.loads(path.with_suffix(".json").read_text(encoding="utf-8"))
    assert plain(read_pack(path)) == expected


@pytest.mark.parametrize("path", INVALID, ids=lambda path: path.stem)
def test_a_damaged_pack_is_refused_with_every_fault_in_its_exact_words(path: Path) -> None:
    expected = path.with_suffix(".txt").read_text(encoding="utf-8").splitlines()
    assert list(faults_of(path)) == expected


# --- the gates


def test_the_error_names_the_file_and_counts_its_faults(tmp_path: Path) -> None:
    path = write(
        tmp_path / "one.toml",
        LEAST.replace("rising = [0, 2, 3, 5, 7, 10, 12]", "rising = [0, 2, 3, 5, 7, 11]"),
    )
    with pytest.raises(PackError) as caught:
        read_pack(path)
    assert str(caught.value) == f"{path}: 1 fault in this mode pack, expected none; mend what follows"
    assert caught.value.faults == ('one.toml: mode[0] "one": rising ends at 11, expected 12 (one octave)',)
    assert caught.value.exit_code == 2


def test_the_fault_of_the_makam_pack_is_named_by_its_mode(tmp_path: Path) -> None:
    text = (SHIPPED / "makam.toml").read_text(encoding="utf-8")
    at = text.index('[[mode]]\nid = "huseyni"')
    broken = text[:at] + text[at:].replace("44, 53]", "44, 52]", 1)
    number = text[:at].count("[[mode]]\n")
    fault = f'makam.toml: mode[{number}] "huseyni": rising ends at 52, expected 53 (one octave)'
    assert fault in faults_of(write(tmp_path / "makam.toml", broken))


def test_bytes_that_are_not_utf8_are_placed(tmp_path: Path) -> None:
    path = tmp_path / "latin.toml"
    path.write_bytes('name = "Hüseynî"'.encode("latin-1"))
    assert faults_of(path) == ("latin.toml: byte 9 is not UTF-8 text; save the file as UTF-8",)


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("a = " + "[" * 5000, "nested too deeply"),
        ("a = " + "9" * 5000, "limit"),
        ("a = 1\na = 2\n", "overwrite"),
    ],
)
def test_toml_that_cannot_be_read_at_all_is_still_one_sentence(tmp_path: Path, text: str, words: str) -> None:
    (fault,) = faults_of(write(tmp_path / "odd.toml", text))
    assert words in fault
    assert "\n" not in fault


def test_played_may_not_be_no_number_or_no_sensible_one(tmp_path: Path) -> None:
    bad = LEAST + "\n"
    for played, words in [
        ("nan", "nan cents off"),
        ("true", "expected degree = number"),
        ("inf", "inf cents off"),
    ]:
        text = bad.replace("dominants = [7]", f"dominants = [7]\nplayed = {{ 3 = {played} }}")
        (fault,) = faults_of(write(tmp_path / "played.toml", text))
        assert words in fault


def test_a_missing_list_is_no_reason_to_doubt_the_steps(tmp_path: Path) -> None:
    # without `rising` nobody can say which degrees the mode has: one fault, not three
    text = LEAST.replace("rising = [0, 2, 3, 5, 7, 10, 12]\n", "")
    assert faults_of(write(tmp_path / "gap.toml", text)) == (
        'gap.toml: mode[0] "one": rising is missing, expected a list of whole numbers',
    )


def test_lists_that_are_empty_are_faults_and_no_crash(tmp_path: Path) -> None:
    text = LEAST.replace("[0, 2, 3, 5, 7, 10, 12]", "[]").replace("[0, 7]", "[]")
    text += '\n[[mode]]\nid = "two"\nname = ""\nsignature = [""]\nrising = []\nabove = [5]\nfinal = ""\n'
    faults = faults_of(write(tmp_path / "empty.toml", text))
    assert 'empty.toml: mode[0] "one": rising has 0 degrees, expected at least 5' in faults
    assert "empty.toml: mode[1] \"two\": signature has '', expected a sign such as 'B-1'" in faults


def test_a_mode_without_steps_is_refused(tmp_path: Path) -> None:
    text = LEAST[: LEAST.index("[[mode.step]]")].replace('name = "One"', 'name = "One"\nstep = []')
    assert faults_of(write(tmp_path / "bare.toml", text)) == (
        'bare.toml: mode[0] "one": no step, expected at least one characteristic step',
    )


@pytest.mark.parametrize("table", sorted(RULES))
def test_the_rules_of_a_table_stand_in_the_order_of_the_gates_for_each_key(table: str) -> None:
    for key in {rule.key for rule in RULES[table]}:
        gates = [rule.gate for rule in RULES[table] if rule.key == key]
        assert gates == sorted(gates)
        assert gates[0] in (Gate.SHAPE, Gate.RANGE)


def test_what_a_rule_needs_is_a_key_of_its_table_or_of_the_one_around_it() -> None:
    for table, rules in RULES.items():
        own = {rule.key for rule in rules}
        around = {f".{rule.key}" for rule in RULES["mode"]}
        for rule in rules:
            assert set(rule.needs) <= own | around, (table, rule.key)
    assert set(DEGREE_LISTS) <= {rule.key for rule in RULES["mode"]}


# any value at all in the place of any key: faults or a pack, never another exception

ODD = st.recursive(
    st.none() | st.booleans() | st.integers() | st.floats() | st.text(max_size=5),
    lambda inside: st.lists(inside, max_size=3) | st.dictionaries(st.text(max_size=4), inside, max_size=3),
    max_leaves=6,
)


@given(odd=ODD, data=st.data())
def test_any_value_in_any_place_gives_faults_and_no_crash(odd: object, data: st.DataObject) -> None:
    pack = tomllib.loads((HERE / "packs" / "valid" / "closing.toml").read_text(encoding="utf-8"))
    place: Any = pack
    while True:
        keys = sorted(place) if isinstance(place, dict) else range(len(place))
        key = data.draw(st.sampled_from(list(keys)))
        if not isinstance(place[key], dict | list) or not place[key] or data.draw(st.booleans()):
            place[key] = odd
            break
        place = place[key]
    if odd is not None:  # TOML has no null
        for fault in faults_in(pack, "odd.toml"):
            assert fault.startswith("odd.toml: ")
            assert fault.isprintable()


def test_a_name_with_control_characters_is_not_let_loose_on_the_terminal(tmp_path: Path) -> None:
    text = LEAST.replace('id = "one"', 'id = "one\\u001b[2J"').replace(
        "opening = [0, 7]", 'played = { "\\u0007" = 3 }'
    )
    faults = faults_of(write(tmp_path / "loud.toml", text))
    assert len(faults) == 3
    assert all(fault.isprintable() for fault in faults)
    assert "loud.toml: mode[0]: played has '\\x07' = 3, expected degree = number" in faults


def test_a_long_value_is_cut_short() -> None:
    assert len(shown("x" * 1000)) == 48
    assert shown([1, 2]) == "[1, 2]"


# --- the values


def test_the_values_are_frozen() -> None:
    mode = load_pack("makam").find("ussak")
    with pytest.raises(FrozenInstanceError):
        mode.name = "other"  # type: ignore[misc]
    with pytest.raises(TypeError):
        mode.played[8] = 0.0  # type: ignore[index]
    with pytest.raises(TypeError):
        mode.sources["rising"] = ()  # type: ignore[index]


def test_the_tone_system_is_the_one_the_pack_names(tmp_path: Path) -> None:
    assert read_pack(write(tmp_path / "least.toml")).system is SEMITONES_12
    assert load_pack("makam").system is COMMAS_53


def test_a_step_is_numbered_within_its_mode() -> None:
    mode = load_pack("makam").find("rast")
    assert [step.id for step in mode.steps] == [f"rast-{n}" for n in range(1, len(mode.steps) + 1)]


def test_the_example_of_the_manual_is_a_sound_pack(tmp_path: Path) -> None:
    (example,) = re.findall(r"```toml\n(.*?)```", DOC.read_text(encoding="utf-8"), re.DOTALL)
    pack = read_pack(write(tmp_path / "lantern.toml", example))
    assert [mode.id for mode in pack.modes] == ["lantern/first-lantern", "lantern/second-lantern"]
    assert pack.find("Evening Lantern").played_units(8) == 7.5


def test_the_manual_explains_every_key_and_shows_the_real_words() -> None:
    text = DOC.read_text(encoding="utf-8")
    for table, rules in RULES.items():
        for rule in rules:
            assert f"`{rule.key}`" in text or f"[{rule.key}]" in text or f"[mode.{rule.key}]" in text, (
                table,
                rule.key,
            )
    (example,) = re.findall(r"```toml\n(.*?)```", text, re.DOTALL)
    broken = example.replace("rising = ", "risng = ", 1)
    data = tomllib.loads(broken)
    shown = re.findall(r"^    (my-pack\.toml: .*)$", text, re.MULTILINE)
    assert shown[0] in faults_in(data, "my-pack.toml")
    broken = example.replace("39, 44, 53]", "39, 44, 52]", 1).replace(
        "degrees = [31, 22]", "degrees = [31, 33]"
    )
    assert set(shown[1:]) <= set(faults_in(tomllib.loads(broken), "my-pack.toml"))


def test_the_words_of_the_rules_name_all_facts_that_sources_may_be_given_for() -> None:
    assert {rule.key for rule in RULES["sources"]} == set(pack_rules.FACTS)


def test_the_words_that_a_pack_may_give_are_those_for_functions_and_courses() -> None:
    terms = {"final", "dominant", "leading tone", "suspended cadence", "course", *Course}
    assert {rule.key for rule in RULES["words"]} == set(pack_rules.WORDS) == terms


def test_a_pack_without_words_or_repertoire_is_english_and_common(tmp_path: Path) -> None:
    pack = read_pack(write(tmp_path / "least.toml"))
    assert pack.names.words == ()
    assert pack.modes[0].repertoire is Repertoire.COMMON


# --- finding


def test_the_makam_pack_is_found_by_name_in_any_spelling() -> None:
    assert find_packs()["makam"] == SHIPPED / "makam.toml"
    assert load_pack("makam").id == load_pack("MAKAM").id == "makam"


def test_a_pack_of_the_players_own_is_found_beside_the_shipped_ones(tmp_path: Path) -> None:
    path = write(tmp_path / "mine.toml")
    write(tmp_path / "notes.txt")
    (tmp_path / "folder.toml").mkdir()
    assert set(find_packs(tmp_path)) - set(find_packs()) == {"mine"}
    assert load_pack("mine", tmp_path) == read_pack(path)
    assert shadowed_packs(tmp_path) == {}


def test_a_pack_of_the_players_own_stands_in_for_a_shipped_one_and_that_shows(tmp_path: Path) -> None:
    path = write(tmp_path / "makam.toml")
    assert load_pack("makam", tmp_path).id == "least"
    assert shadowed_packs(tmp_path) == {"makam": path}
    (entry,) = [one for one in list_packs(tmp_path) if one.name == "makam"]
    assert entry.shadows
    assert entry.path == path


def test_a_folder_that_is_not_there_holds_no_packs(tmp_path: Path) -> None:
    assert find_packs(tmp_path / "none") == find_packs()
    assert shadowed_packs() == {}


def test_a_folder_that_cannot_be_read_is_said(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(self: Path) -> None:
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(Path, "iterdir", refuse)
    with pytest.raises(StorageError) as caught:
        find_packs(tmp_path)
    assert "cannot be read (permission denied)" in str(caught.value)


def test_a_damaged_pack_is_silent_until_it_is_listed_or_asked_for(tmp_path: Path) -> None:
    write(tmp_path / "bad.toml", "[pack]\n")
    assert load_pack("makam", tmp_path).id == "makam"
    (entry,) = [one for one in list_packs(tmp_path) if one.name == "bad"]
    assert entry.pack is None
    assert entry.faults[0] == "bad.toml: mode is missing, expected a list of tables"
    with pytest.raises(PackError):
        load_pack("bad", tmp_path)


def test_a_pack_that_vanishes_while_packs_are_listed_is_said(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    write(tmp_path / "gone.toml")

    def refuse(path: Path) -> None:
        raise StorageError(f"{path}: no such file; look again")

    monkeypatch.setattr("melodycoach.sources.pack_file.read_pack", refuse)
    (entry,) = [one for one in list_packs(tmp_path) if one.name == "gone"]
    assert entry.faults == (f"{tmp_path / 'gone.toml'}: no such file; look again",)


def test_an_unknown_pack_names_the_nearest(tmp_path: Path) -> None:
    with pytest.raises(UnknownNameError) as caught:
        load_pack("makm")
    assert str(caught.value) == "no mode pack 'makm'; did you mean 'makam'?"
    with pytest.raises(UnknownNameError) as caught:
        load_pack("makm", tmp_path)
    assert str(caught.value) == f"no mode pack 'makm'; did you mean 'makam'? (looked in {tmp_path} too)"


def test_a_path_is_read_as_a_file(tmp_path: Path) -> None:
    path = write(tmp_path / "sub" / "mine.toml")
    assert load_pack(path) == load_pack(str(path))


def test_a_missing_file_names_the_nearest_in_its_folder(tmp_path: Path) -> None:
    write(tmp_path / "lantern.toml")
    with pytest.raises(StorageError) as caught:
        load_pack(str(tmp_path / "lantren.toml"))
    assert str(caught.value) == f"{tmp_path / 'lantren.toml'}: no such file; did you mean 'lantern.toml'?"
    with pytest.raises(StorageError) as caught:
        load_pack(tmp_path / "none" / "x.toml")
    assert str(caught.value).endswith(f"there is no folder {str(tmp_path / 'none')!r} either")
    (tmp_path / "bare").mkdir()
    with pytest.raises(StorageError) as caught:
        load_pack(tmp_path / "bare" / "x.toml")
    assert str(caught.value).endswith(f"no mode packs in {str(tmp_path / 'bare')!r}")


def test_a_file_that_cannot_be_opened_is_said(tmp_path: Path) -> None:
    with pytest.raises(StorageError) as caught:
        read_pack(tmp_path)
    assert str(caught.value) == f"{tmp_path}: cannot be read (is a directory); choose another file"
    assert isinstance(caught.value, MelodycoachError)
