"""Characteristic steps in words."""

import pytest

from melodycoach.core.mode import CharacteristicStep, Mode, Need, StepKind
from melodycoach.core.pitch import COMMAS_53, SEMITONES_12, NamedPitch, PitchNames
from melodycoach.core.step_words import step_label
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
KIND = StepKind


def label(mode: str | Mode, kind: StepKind, *degrees: int) -> str:
    found = PACK.find(mode) if isinstance(mode, str) else mode
    return step_label(CharacteristicStep("s", kind, Need.CORE, degrees), found, PACK.names)


# names of perdes and the Turkish words for the functions: common practice
@pytest.mark.parametrize(
    ("mode", "kind", "degrees", "words"),
    [
        ("ussak", KIND.HALF_CADENCE, (13, 22), "half cadence on nevâ (güçlü)"),
        ("ussak", KIND.HALF_CADENCE, (22, 31), "half cadence on hüseynî"),
        ("rast", KIND.SUSPENDED_CADENCE, (22, 17), "suspended cadence on segâh (asma karar)"),
        ("huseyni", KIND.SUSPENDED_CADENCE, (31, 22), "suspended cadence on nevâ (asma karar)"),
        ("tahir", KIND.SUSPENDED_CADENCE, (31, 22), "half cadence on nevâ (second güçlü)"),
        ("tahir", KIND.HALF_CADENCE, (61, 53), "half cadence on muhayyer (güçlü)"),
        ("muhayyer", KIND.HALF_CADENCE, (22, 31), "half cadence on hüseynî (second güçlü)"),
        ("rast", KIND.FINAL_CADENCE, (22, 17, 9, 0), "final cadence on rast (karar)"),
        ("ussak", KIND.LEADING_TONE, (8, 0, -9, 0), "leading tone (yeden): rast before dügâh"),
        ("neva", KIND.LEADING_TONE, (22, 17, 22), "leading tone (yeden): nim hicaz before nevâ"),
        ("huseyni", KIND.ALTERATION, (44, 35, 31), "eviç gives way to acem going down"),
        ("ussak", KIND.ALTERATION, (31, 39, 44), "acem gives way to eviç going up"),
        ("huseyni", KIND.ALTERATION, (31, 39, 44), "eviç going up"),
        ("hicaz", KIND.ALTERATION, (5, 11, 17), "C5-2 going up"),
        ("huseyni", KIND.OPENING, (22, 31), "opening (seyir): nevâ up to hüseynî"),
        ("gulizar", KIND.OPENING, (53, 44, 39, 31), "opening (seyir): muhayyer down to hüseynî"),
        ("huseyni", KIND.OPENING, (31, 39, 31), "opening (seyir): round hüseynî"),
        ("rast", KIND.REGISTER, (0, -5, -13, -22), "below the karar: down to yegâh"),
        ("nihavend", KIND.REGISTER, (53, 62, 66), "above the octave: up to sünbüle"),
        ("huseyni", KIND.REGISTER, (31, 39, 44), "the upper region: hüseynî to gerdâniye"),
        ("huseyni", KIND.REGISTER, (0, 8, 13), "register: dügâh to çargâh"),
        ("hicaz", KIND.COLOUR_INTERVAL, (5, 17), "augmented second dik kürdî–nim hicaz"),
        ("hicaz", KIND.COLOUR_INTERVAL, (17, 5, 0), "augmented second dik kürdî–nim hicaz"),
        ("huseyni", KIND.COLOUR_INTERVAL, (0, 31), "leap of a fifth dügâh–hüseynî"),
        ("rast", KIND.COLOUR_INTERVAL, (0, 9, 17), "third rast–segâh, by step"),
        ("mustear", KIND.COLOUR_INTERVAL, (14, 22), "second nevâ–dik hisar"),
        ("saba", KIND.COLOUR_INTERVAL, (13, 18, 13), "hicaz as the neighbour of çargâh"),
        ("rast", KIND.COLOUR_INTERVAL, (0, 26), "leap rast–nim hicaz"),
        ("rast", KIND.COLOUR_INTERVAL, (0, 26, 22), "run rast–nim hicaz, by step"),
        ("sevkefza", KIND.FINAL_CADENCE, (14, 9, 0), "final cadence on acemaşîran (karar), from zirgüle"),
    ],
)
def test_a_step_is_named_from_its_kind_and_degrees(
    mode: str, kind: StepKind, degrees: tuple[int, ...], words: str
) -> None:
    assert label(mode, kind, *degrees) == words


def test_a_mode_on_another_final_gets_the_names_of_that_place() -> None:
    ussak = PACK.find("ussak")
    half = CharacteristicStep("s", KIND.HALF_CADENCE, Need.CORE, (13, 22))
    # 22 commas over rast (9 under A4) are 13 over A4: çargâh
    assert step_label(half, ussak, PACK.names, final_units=-9) == "half cadence on çargâh (güçlü)"


@pytest.mark.parametrize(
    ("kind", "degrees", "words"),
    [
        (KIND.HALF_CADENCE, (13, 22), "half cadence on tower (beacon)"),
        (KIND.FINAL_CADENCE, (8, 0), "final cadence on A4"),
        (KIND.REGISTER, (0, -9), "below the final: down to G4"),
    ],
)
def test_the_words_are_those_of_the_pack_not_of_its_tone_system(
    kind: StepKind, degrees: tuple[int, ...], words: str
) -> None:
    tower = NamedPitch("tower", 22, COMMAS_53.spell(22))
    names = PitchNames(COMMAS_53, (tower,), (("dominant", "beacon"),))
    step = CharacteristicStep("s", kind, Need.CORE, degrees)
    assert step_label(step, PACK.find("ussak"), names) == words


def test_semitones_are_named_in_plain_english() -> None:
    names = PitchNames(SEMITONES_12)
    mode = Mode(**{**vars(PACK.find("ussak")), "rising": (0, 2, 3, 5, 7, 8, 11, 12), "dominants": (7,)})

    def words(kind: StepKind, *degrees: int) -> str:
        return step_label(CharacteristicStep("s", kind, Need.CORE, degrees), mode, names, 0)

    assert words(KIND.HALF_CADENCE, 5, 7) == "half cadence on E5"
    assert words(KIND.LEADING_TONE, 0, -1, 0) == "leading tone: G#4 before A4"
    assert words(KIND.COLOUR_INTERVAL, 8, 11) == "augmented second F5–G#5"
    assert words(KIND.REGISTER, 0, -5) == "below the final: down to E4"


def test_every_step_of_the_pack_has_a_label_that_differs_from_the_others_of_its_mode_and_need() -> None:
    clashes = []
    for mode in PACK.modes:
        labels = [(step_label(step, mode, PACK.names), step.degrees[-2:]) for step in mode.steps]
        clashes += [f"{mode.id}: {text}" for text, _ in labels if sum(text == t for t, _ in labels) > 1]
        assert all(text.strip() == text and "  " not in text for text, _ in labels)
    assert clashes == []
