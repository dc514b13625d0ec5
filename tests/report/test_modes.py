"""Modes on paper: what stands there, how wide it is, and that text and JSON say the same."""

import json
import re
from dataclasses import replace
from pathlib import Path

import pytest

from melodycoach.core.mode import ModePack, Repertoire
from melodycoach.report.modes import mode_json, mode_text, modes_json, modes_text
from melodycoach.sources.pack_file import load_pack, read_pack

HERE = Path(__file__).parent
GOLDEN = HERE / "golden"
LEAST = HERE.parent / "sources" / "packs" / "valid" / "least.toml"
DOC = HERE.parent.parent / "docs" / "pack-format.md"
MAKAM = load_pack("makam")
WIDTHS = (40, 60, 72, 80, 120)


@pytest.fixture(scope="module")
def lantern(tmp_path_factory: pytest.TempPathFactory) -> ModePack:
    (example,) = re.findall(r"```toml\n(.*?)```", DOC.read_text(encoding="utf-8"), re.DOTALL)
    path = tmp_path_factory.mktemp("packs") / "lantern.toml"
    path.write_text(example, encoding="utf-8")
    return read_pack(path)


def squeezed(text: str) -> str:
    return " ".join(text.split())


# --- as it looks; the pack is the example of the manual


@pytest.mark.parametrize("columns", [40, 80])
def test_the_list_of_a_pack_looks_as_designed(lantern: ModePack, columns: int) -> None:
    expected = (GOLDEN / f"modes-lantern-{columns}.txt").read_text(encoding="utf-8")
    assert modes_text(lantern, columns) + "\n" == expected


@pytest.mark.parametrize("columns", [40, 80])
@pytest.mark.parametrize("slug", ["first-lantern", "second-lantern"])
def test_one_mode_looks_as_designed(lantern: ModePack, slug: str, columns: int) -> None:
    expected = (GOLDEN / f"mode-{slug}-{columns}.txt").read_text(encoding="utf-8")
    assert mode_text(lantern, lantern.find(slug), columns) + "\n" == expected


@pytest.mark.parametrize("columns", WIDTHS)
def test_nothing_is_wider_than_asked_for(columns: int) -> None:
    texts = [modes_text(MAKAM, columns), *(mode_text(MAKAM, mode, columns) for mode in MAKAM.modes)]
    lines = [line for text in texts for line in text.splitlines()]
    assert max(map(len, lines)) <= columns
    assert not [line for line in lines if line != line.rstrip()]


def test_a_width_under_forty_is_taken_for_forty() -> None:
    assert modes_text(MAKAM, 3) == modes_text(MAKAM, 40)
    assert mode_text(MAKAM, MAKAM.modes[0], 3) == mode_text(MAKAM, MAKAM.modes[0], 40)


# --- what it says


def test_the_list_names_every_mode_once_under_its_family() -> None:
    text = modes_text(MAKAM, 80)
    for mode in MAKAM.modes:
        assert len(re.findall(rf"^  {mode.name} +{mode.slug} ", text, re.MULTILINE)) == 1
        assert (mode.family[:1].upper() + mode.family[1:]) in text.splitlines()


def test_list_and_mode_say_whose_theory_it_is_and_defer_to_the_teacher() -> None:
    for text in (modes_text(MAKAM, 80), mode_text(MAKAM, MAKAM.find("saba"), 80)):
        assert MAKAM.theory in squeezed(text)
        assert MAKAM.caution in squeezed(text)


def test_a_makam_is_told_in_the_words_of_the_trade() -> None:
    text = mode_text(MAKAM, MAKAM.find("huseyni"), 80)
    for words in ("(karar)", "(seyir)", "(güçlü)", "(yeden)", "(asma karar)", "(inici-çıkıcı)"):
        assert words in text


def test_the_ladder_gives_commas_cents_and_the_usual_intonation() -> None:
    # second degree of the uşşak family: 8 commas = 181.1 cents as written, usually lower
    mode = MAKAM.find("ussak")
    text = mode_text(MAKAM, mode, 80)
    (line,) = [line for line in text.splitlines() if line.startswith("  B4-1 ")]
    assert line.split()[:5] == ["B4-1", "segâh", "8", "181", f"{mode.played[8]:g}"]
    written = [line.split()[0] for line in text.splitlines() if re.match(r"  [A-G]", line)]
    assert written[0][-1] >= written[-1][-1]  # high above low
    assert len(written) == len(mode.degrees)


def test_every_step_neighbour_and_source_of_a_mode_is_there() -> None:
    for mode in MAKAM.modes:
        text = squeezed(mode_text(MAKAM, mode, 80))
        data = mode_json(MAKAM, mode)
        for step in data["steps"]:
            assert step["says"] in text
            assert step["note"] in text
        for neighbour in mode.neighbours:
            assert neighbour.difference in text
        for sources in data["sources"].values():
            for source in sources:
                assert source["title"] in text


def test_each_need_stands_once_and_core_comes_first() -> None:
    text = mode_text(MAKAM, MAKAM.find("rast"), 80)
    assert 0 < text.index("Core: ") < text.index("Usual: ") < text.index("Colour: ")


def test_the_roles_of_a_degree_are_told_the_most_telling_first() -> None:
    data = mode_json(MAKAM, MAKAM.find("mahur"))
    roles = {one["degree"]: one["roles"] for one in data["degrees"]}
    assert roles[0] == ["final"]
    assert roles[53] == ["dominant"]
    assert roles[31] == ["second dominant"]
    assert roles[-4] == ["leading tone"]


def test_a_third_dominant_is_counted() -> None:
    mode = replace(MAKAM.find("mahur"), dominants=(53, 31, 22, 9), suspended=())
    roles = {one["degree"]: one["roles"] for one in mode_json(MAKAM, mode)["degrees"]}
    assert roles[22] == ["third dominant"]
    assert roles[9] == ["4th dominant"]
    assert "third dominant (güçlü)" in mode_text(MAKAM, mode, 80)


@pytest.mark.parametrize(
    ("repertoire", "says"),
    [
        (Repertoire.COMMON, "often heard"),
        (Repertoire.OCCASIONAL, "heard at times"),
        (Repertoire.RARE, "rarely heard"),
    ],
)
def test_how_often_the_repertoire_uses_a_mode_is_said_in_words(repertoire: Repertoire, says: str) -> None:
    mode = replace(MAKAM.find("rast"), repertoire=repertoire)
    pack = replace(MAKAM, modes=(mode,))
    assert f"in the repertoire {says}" in squeezed(mode_text(MAKAM, mode, 80))
    listed = f"{says[:1].upper()}{says[1:]} in the repertoire: Rast." in modes_text(pack, 80)
    assert listed is (repertoire is not Repertoire.COMMON)
    assert mode_json(MAKAM, mode)["repertoire"] == repertoire.value
    assert [one["repertoire"] for one in modes_json(pack)["modes"]] == [repertoire.value]


# --- words


def test_a_pack_of_commas_without_words_is_told_in_english_alone() -> None:
    pack = replace(MAKAM, names=replace(MAKAM.names, words=()))
    for text in (modes_text(pack, 120), mode_text(pack, pack.find("huseyni"), 80)):
        for word in ("karar", "güçlü", "yeden", "seyir", "inici", "çıkıcı"):
            assert word not in text
    assert modes_json(pack)["words"] == mode_json(pack, pack.modes[0])["words"] == {}


def test_json_gives_the_words_of_the_pack_by_their_english_terms() -> None:
    # the words: common practice
    words = modes_json(MAKAM)["words"]
    assert words == mode_json(MAKAM, MAKAM.find("rast"))["words"]
    assert words["dominant"] == "güçlü"
    assert words["leading tone"] == "yeden"


# --- a pack of another tone system, with the fewest keys


def test_a_pack_of_semitones_has_no_turkish_words_and_no_empty_parts() -> None:
    pack = read_pack(LEAST)
    text = mode_text(pack, pack.modes[0], 80)
    assert "semitones" in text
    assert "güçlü" not in text
    assert "Neighbours" not in text
    assert "family" not in text
    assert "key signature                   none" in text
    assert "Other modes" in modes_text(pack, 80)
    assert "ascending" in modes_text(pack, 80)


# --- JSON


def test_json_can_be_written_and_holds_every_mode() -> None:
    listed = json.loads(json.dumps(modes_json(MAKAM), allow_nan=False))
    assert [one["id"] for one in listed["modes"]] == [mode.id for mode in MAKAM.modes]
    assert listed["theory"] == MAKAM.theory
    for mode in MAKAM.modes:
        data = json.loads(json.dumps(mode_json(MAKAM, mode), allow_nan=False))
        assert data["id"] == mode.id
        assert [one["degree"] for one in data["degrees"]] == list(mode.degrees)


def test_json_names_places_by_degree_perde_and_written_pitch() -> None:
    data = mode_json(MAKAM, MAKAM.find("huseyni"))
    assert data["final"] == {"degree": 0, "name": "dügâh", "written": "A4"}
    assert data["dominants"] == [{"degree": 31, "name": "hüseynî", "written": "E5"}]
    assert data["words"][data["course"]] == "inici-çıkıcı"
    second = next(one for one in data["degrees"] if one["degree"] == 8)
    assert (second["cents"], second["written"]) == (181.1, "B4-1")  # 8 * 1200 / 53 = 181.13
    final = next(one for one in data["degrees"] if one["degree"] == 0)
    assert (final["played"], final["played_cents"]) == (None, 0.0)
