"""The makam pack against sources outside this project, against itself, and against common practice."""

import importlib.util
import os
import re
import tomllib
from fractions import Fraction
from itertools import pairwise
from math import log2
from pathlib import Path

import pytest

from melodycoach.core.mode import Course, Mode, ModePack, Need, Repertoire, StepKind
from melodycoach.core.pitch import LETTERS, fold_name
from melodycoach.sources.pack_file import SHIPPED, read_pack

FILE = SHIPPED / "makam.toml"
PACK = read_pack(FILE)
SLUGS = [mode.slug for mode in PACK.modes]

LABELS = {
    "acemasiran", "acemkurdi", "bestenigar", "beyati", "hicaz", "hicazkar", "huseyni", "huzzam", "karcigar",
    "kurdilihicazkar", "mahur", "muhayyer", "neva", "nihavend", "rast", "saba", "segah", "sultaniyegah",
    "suzinak", "ussak",
}  # fmt: skip
"""The modes that melodies with a known makam are measured with."""


def mode(slug: str) -> Mode:
    return PACK.find(slug)


def name(one: Mode, degree: int) -> str:
    return PACK.names.name(PACK.system.units_to_cents(one.final_units + degree))


def octave(one: Mode) -> set[int]:
    """The degrees of one octave that a line uses going up or coming down."""
    return {degree % 53 for degree in (*one.rising, *one.falling)}


def pitches(one: Mode) -> set[int]:
    return {(one.final_units + degree) % 53 for degree in octave(one)}


# --- key signatures, against LilyPond's table (turkish-makam.ly in Debian's package lilypond-data);
#     the file is read where it lies, nothing of it is copied

LILYPOND_NAMES = {
    "zirguleli-hicaz": "hicazzirgule",
    "humayun": "hicazhumayun",
    "suzinak": "suznak",
    "zirguleli-suzinak": "zirgulelisuznak",
    "nevaeser": "neveser",
}
"""Where the table's name is not simply the slug without its dashes."""

DISAGREEMENTS = {
    "nikriz": "The table signs the falling form, with a plain F (acem); the pack signs the rising one, F# "
    "(eviç), as the theory pages named in its sources do. The degrees of both forms are in the pack.",
}

COMMAS_BY_ALTERATION = {0: 0, 1: 1, 4: 3, 5: 4, 6: 5, 10: 8, 11: 9}
"""The table writes alterations in twelfths of a whole tone, as named in its head: koma, eksik bakiye,
bakiye, küçük mücenneb, büyük mücenneb, tanini; these are their commas."""

WORDS = {
    "NATURAL": 0,
    "KOMA": 1,
    "EKSIK-BAKIYE": 4,
    "BAKIYE": 5,
    "KUCUK": 6,
    "BUYUKMUCENNEB": 10,
    "TANINI": 11,
}
NATURALS = (0, 12, 24, 30, 42, 54, 66)
"""C D E F G A B above C in twelfths of a whole tone, as LilyPond spaces them."""


def lilypond_table() -> Path:
    found = sorted(Path("/usr/share/lilypond").glob("*/ly/turkish-makam.ly"))
    if not found:
        if os.environ.get("MELODYCOACH_REQUIRE_LILYPOND") == "1":
            pytest.fail("MELODYCOACH_REQUIRE_LILYPOND=1, but lilypond-data has no turkish-makam.ly here")
        pytest.skip("lilypond-data is not installed")
    return found[-1]


def lilypond_keys(text: str) -> dict[str, dict[int, int]]:
    """Read the table: for each makam the alteration of each scale step, in twelfths of a whole tone."""
    keys: dict[str, dict[int, int]] = {}
    for line in text.splitlines():
        if found := re.match(r"(\w+) = #`\((.*)\)", line):
            steps = re.findall(r"\((\d) \. ,(?:\(- ([A-Z-]+)\)|([A-Z-]+))\)", found[2])
            keys[found[1]] = {int(step): -WORDS[low] if low else WORDS[high] for step, low, high in steps}
        elif found := re.match(r"(\w+)=\\(\w+)", line):
            keys[found[1]] = keys[found[2]]
    return keys


def on_final(key: dict[int, int], one: Mode) -> dict[str, int]:
    """Move a key of the table from C to a final: the commas by which each letter is altered there."""
    final = PACK.system.spell(one.final_units)
    at = LETTERS.index(final.letter)
    commas = final.accidentals * (4 if final.accidentals > 0 else 5) + final.units
    raised = next(twelfths for twelfths, size in COMMAS_BY_ALTERATION.items() if size == abs(commas))
    tonic = NATURALS[at] + (raised if commas > 0 else -raised)
    signs = {}
    for step, altered in key.items():
        letter = (at + step) % 7
        twelfths = (tonic + NATURALS[step] + altered - NATURALS[letter] + 36) % 72 - 36
        if twelfths:
            sign = 1 if twelfths > 0 else -1
            signs[LETTERS[letter]] = sign * COMMAS_BY_ALTERATION[abs(twelfths)]
    return signs


def signature(one: Mode) -> dict[str, float]:
    sizes = {1: 4, -1: -5, 0: 0}
    return {sign.letter: sizes[sign.accidentals] + sign.units for sign in one.signature}


def test_key_signatures_agree_with_lilypond_but_for_those_explained() -> None:
    keys = lilypond_keys(lilypond_table().read_text(encoding="utf-8"))
    assert len(keys) > 150
    differ = {}
    for one in PACK.modes:
        theirs = on_final(keys[LILYPOND_NAMES.get(one.slug, one.slug.replace("-", ""))], one)
        if theirs != signature(one):
            differ[one.slug] = (theirs, signature(one))
    assert set(differ) == set(DISAGREEMENTS), differ


def test_each_disagreement_with_lilypond_is_explained_and_still_one() -> None:
    keys = lilypond_keys(lilypond_table().read_text(encoding="utf-8"))
    for slug, why in DISAGREEMENTS.items():
        assert on_final(keys[slug], mode(slug)) != signature(mode(slug))
        assert len(why) > 40


def test_the_table_of_lilypond_is_missed_only_where_that_is_allowed(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    monkeypatch.setattr(Path, "glob", lambda self, pattern: iter(()))
    monkeypatch.setenv("MELODYCOACH_REQUIRE_LILYPOND", "1")
    with pytest.raises(pytest.fail.Exception, match="lilypond-data"):
        lilypond_table()
    monkeypatch.delenv("MELODYCOACH_REQUIRE_LILYPOND")
    with pytest.raises(pytest.skip.Exception):
        lilypond_table()


# --- tuning, against the Scala archive's files as music21 ships them


def scala(file: str) -> list[float]:
    """Read a scale file of the Scala archive: cents above its first tone, the octave last."""
    spec = importlib.util.find_spec("music21")
    assert spec is not None
    assert spec.origin is not None
    path = Path(spec.origin).parent / "scale" / "scala" / "scl" / file
    lines = [line.strip() for line in path.read_text(encoding="latin-1").splitlines()]
    tones = [line for line in lines if re.fullmatch(r"\d+/\d+", line)]
    return [1200 * log2(Fraction(tone)) for tone in tones]


def perdes_from(start: str) -> list[float]:
    """The perdes of the octave over one of them, in cents above it, the octave last."""
    first = PACK.names.find(start)
    assert first is not None
    units = sorted(one.units - first.units for one in PACK.names.named)
    return [step * PACK.system.unit_cents for step in units if 0 < step <= 53]


def test_the_perdes_lie_within_a_cent_of_the_ratios_of_arel_ezgi_uzdilek() -> None:
    # turkish_aeu.scl: 24 ratios, from (kaba) çargâh
    ratios = scala("turkish_aeu.scl")
    ours = perdes_from("kaba çargâh")
    assert len(ratios) == len(ours) == 24
    assert max(abs(a - b) for a, b in zip(ratios, ours, strict=True)) < 1.0


def test_the_perdes_lie_within_two_cents_of_the_ratios_of_rauf_yekta() -> None:
    # turkish_24.scl: 24 ratios, from yegâh
    ratios = scala("turkish_24.scl")
    ours = perdes_from("yegâh")
    assert len(ratios) == len(ours) == 24
    assert max(abs(a - b) for a, b in zip(ratios, ours, strict=True)) < 2.0


def test_dugah_is_the_a_that_440_hz_tunes() -> None:
    # common practice in AEU writing: dügâh is the written A4, and rast the written G4
    assert PACK.names.name(6900.0) == "dügâh"
    assert str(PACK.names.spell(6900.0)) == "A4"
    rast = PACK.names.find("rast")
    assert rast is not None
    assert str(rast.spelling) == "G4"


# --- common practice: what every teacher of the trade would grant


def test_rast_and_mahur_both_close_on_rast_and_mahur_opens_higher() -> None:
    # common practice
    rast, mahur = mode("rast"), mode("mahur")
    assert name(rast, 0) == name(mahur, 0) == "rast"
    assert mahur.opening[0] > rast.opening[0]
    assert mahur.opening[1] > rast.opening[1]
    assert (rast.course, mahur.course) == (Course.ASCENDING, Course.DESCENDING)
    assert name(rast, rast.rising[2]) == "segâh"
    assert name(mahur, mahur.rising[2]) == "bûselik"


def test_huseyni_and_muhayyer_share_their_notes_and_differ_in_the_opening() -> None:
    # common practice
    huseyni, muhayyer = mode("huseyni"), mode("muhayyer")
    assert pitches(huseyni) == pitches(muhayyer)
    assert huseyni.final_units == muhayyer.final_units
    assert name(huseyni, huseyni.dominants[0]) == "hüseynî"
    assert name(muhayyer, muhayyer.dominants[0]) == "muhayyer"
    assert muhayyer.opening[0] > huseyni.opening[0]


def test_ussak_and_beyati_share_scale_final_and_dominant_and_differ_in_the_opening() -> None:
    # common practice: the hardest pair
    ussak, beyati = mode("ussak"), mode("beyati")
    assert ussak.rising == beyati.rising
    assert ussak.dominants == beyati.dominants
    assert ussak.opening[0] < 0 <= beyati.opening[0]
    assert "makam/beyati" in {one.mode_id for one in ussak.neighbours}
    assert "makam/ussak" in {one.mode_id for one in beyati.neighbours}


def test_the_four_hicaz_of_the_family_share_the_lower_steps_and_part_above() -> None:
    # common practice: Hicaz, Hümâyun, Uzzal, Zirgüleli Hicaz
    four = [mode(slug) for slug in ("hicaz", "humayun", "uzzal", "zirguleli-hicaz")]
    assert len({one.rising[:5] for one in four}) == 1
    apart = {(one.rising[5:], one.dominants[0]) for one in four}
    assert len(apart) == 4
    assert [name(one, one.dominants[0]) for one in four] == ["nevâ", "nevâ", "hüseynî", "hüseynî"]


def test_the_kurdi_modes_end_alike_and_open_elsewhere() -> None:
    # common practice
    kurdi = [mode(slug) for slug in ("kurdi", "acemkurdi", "muhayyerkurdi")]
    endings = [next(step for step in one.steps if step.kind is StepKind.FINAL_CADENCE) for one in kurdi]
    assert len({step.degrees for step in endings}) == 1
    assert [name(one, one.dominants[0]) for one in kurdi] == ["nevâ", "acem", "muhayyer"]
    assert sorted(one.opening[0] for one in kurdi) == [one.opening[0] for one in kurdi]


@pytest.mark.parametrize(
    ("slugs", "finals"),
    [
        ("cargah mahur acemasiran", "çargâh rast acemaşîran"),
        ("buselik nihavend", "dügâh rast"),
        ("kurdi kurdilihicazkar", "dügâh rast"),
        ("zirguleli-hicaz hicazkar sedaraban", "dügâh rast yegâh"),
    ],
)
def test_a_transposed_mode_has_the_steps_of_its_model(slugs: str, finals: str) -> None:
    # common practice: şed makamlar
    modes = [mode(slug) for slug in slugs.split()]
    assert len({one.rising for one in modes}) == 1
    assert [name(one, 0) for one in modes] == finals.split()


def test_saba_has_hicaz_for_neva_and_sehnaz_for_muhayyer() -> None:
    # common practice
    saba = mode("saba")
    names = [name(saba, degree) for degree in saba.rising]
    assert names == ["dügâh", "segâh", "çargâh", "hicaz", "hüseynî", "acem", "gerdâniye", "şehnaz"]
    assert name(saba, saba.dominants[0]) == "çargâh"


def test_segah_huzzam_and_mustear_lead_into_segah_from_kurdi() -> None:
    # common practice
    for slug in ("segah", "huzzam", "mustear"):
        assert name(mode(slug), 0) == "segâh"
        assert name(mode(slug), mode(slug).leading[0]) == "kürdî"


def test_the_makams_that_everybody_learns_are_common_and_the_pack_knows_rare_ones() -> None:
    # from memory: no count of the repertoire was at hand
    for slug in ("rast", "ussak", "hicaz", "huseyni", "segah", "nihavend", "saba", "kurdilihicazkar"):
        assert mode(slug).repertoire is Repertoire.COMMON
    for slug in ("arazbar", "nisabur", "sazkar"):
        assert mode(slug).repertoire is Repertoire.RARE
    assert mode("evcara").repertoire is Repertoire.OCCASIONAL


# --- the pack against itself


def test_each_mode_says_how_common_it_is_and_that_this_is_from_memory() -> None:
    for table in tomllib.loads(FILE.read_text(encoding="utf-8"))["mode"]:
        assert table["repertoire"] == mode(table["id"]).repertoire
        assert table["sources"]["repertoire"] == ["memory"]


def test_the_pack_has_all_the_modes_that_are_measured_and_many_more() -> None:
    assert set(SLUGS) >= LABELS
    assert len(SLUGS) >= 45


def test_the_pack_says_whose_theory_it_shows_and_defers_to_the_teacher() -> None:
    assert "Arel-Ezgi-Uzdilek" in PACK.theory
    assert "teacher" in PACK.caution


@pytest.mark.parametrize("slug", SLUGS)
def test_a_mode_has_steps_enough_and_closes_on_its_final(slug: str) -> None:
    one = mode(slug)
    core = [step for step in one.steps if step.need is Need.CORE]
    cadences = [step for step in one.steps if step.kind is StepKind.FINAL_CADENCE]
    assert len(one.steps) >= 4
    assert len(core) >= 2
    assert cadences
    assert all(step.degrees[-1] == 0 for step in cadences)
    halves = [step.degrees[-1] for step in one.steps if step.kind is StepKind.HALF_CADENCE]
    assert halves
    assert halves[0] == one.dominants[0]


@pytest.mark.parametrize("slug", SLUGS)
def test_every_degree_of_a_mode_has_a_perde(slug: str) -> None:
    one = mode(slug)
    for degree in one.degrees:
        assert PACK.names.at(one.final_units + degree) is not None


@pytest.mark.parametrize("slug", SLUGS)
def test_a_mode_opens_where_its_course_says(slug: str) -> None:
    one = mode(slug)
    middle = sum(one.opening) / 2
    if one.course is Course.ASCENDING:
        assert middle <= 22
    elif one.course is Course.DESCENDING:
        assert middle >= 35


@pytest.mark.parametrize("slug", SLUGS)
def test_the_genera_of_a_mode_are_made_of_its_degrees(slug: str) -> None:
    # steps of the genera: AEU theory, from memory; a comma is allowed, as writing allows it
    steps = {
        "rast": (9, 8, 5), "uşşak": (8, 5, 9), "hüseynî": (8, 5, 9, 9), "bûselik": (9, 4, 9),
        "kürdî": (4, 9, 9), "çargâh": (9, 9, 4), "hicaz": (5, 12, 5), "nikriz": (9, 5, 12, 5),
        "segâh": (5, 9, 8), "sabâ": (8, 5, 5), "hüzzam": (5, 9, 5), "müstear": (9, 5, 8),
        "ferahnâk": (5, 9, 9), "nişâbur": (8, 5, 9), "pençgâh": (9, 9, 8),
    }  # fmt: skip
    one = mode(slug)
    degrees = {degree % 53 for degree in one.degrees}
    for genus in one.genera:
        at = genus.at
        for step in (0, *steps.get(genus.name, ())):
            at += step
            assert any((at + off) % 53 in degrees for off in (-1, 0, 1)), (genus, at)


def test_the_words_between_neighbours_name_both_modes_and_only_perdes_that_they_have() -> None:
    by_name = {one.name: one.units for one in PACK.names.named}
    words = "|".join(re.escape(text) for text in sorted(by_name, key=len, reverse=True))
    pattern = re.compile(rf"(?<![\w-])({words})(?![\w-])")
    seen = set()
    n_named = 0
    for one in PACK.modes:
        assert len(one.neighbours) >= 2
        for neighbour in one.neighbours:
            other = PACK.find(neighbour.mode_id)
            text = neighbour.difference
            assert text.endswith(".")
            assert text not in seen
            seen.add(text)
            named = {x.final_units + d for x in (one, other) for d in x.degrees}
            for perde in pattern.findall(text):
                assert by_name[perde] in named, (one.slug, other.slug, perde)
                n_named += 1
            assert one.name in text or other.name in text or "same" in text
    assert n_named > 500


def test_the_comments_in_the_file_name_the_perdes_of_the_degrees() -> None:
    text = FILE.read_text(encoding="utf-8")
    n_checked = 0
    for block in text.split("[[mode]]\n")[1:]:
        one = mode(tomllib.loads("[[mode]]\n" + block)["mode"][0]["id"])
        pattern = r"^(?:rising|falling|dominants|leading|suspended|degrees) = \[([^]]*)\]  # (.*)$"
        for degrees, comment in re.findall(pattern, block, re.MULTILINE):
            names = [name(one, int(degree)).replace(" ", "-") for degree in degrees.split(",")]
            assert comment.split() == names, one.slug
            n_checked += 1
    assert n_checked > 500


def test_no_perde_is_nearer_to_another_than_a_comma() -> None:
    units = sorted(one.units for one in PACK.names.named)
    assert all(high - low >= 1 for low, high in pairwise(units))
    assert len(units) == 78


def test_a_mode_is_found_by_any_of_its_names_in_any_spelling() -> None:
    pack: ModePack = PACK
    for one in pack.modes:
        for text in (one.id, one.slug, one.name, one.name.upper(), fold_name(one.name), *one.also):
            assert pack.find(text) is one


def test_every_source_and_family_in_the_pack_is_used() -> None:
    cited = {source for one in PACK.modes for sources in one.sources.values() for source in sources}
    assert {source.id for source in PACK.sources} == cited
    assert all(one.family for one in PACK.modes)
