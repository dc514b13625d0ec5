"""The answer in one sentence, and the frame it was found in."""

from dataclasses import replace

from melodycoach.core.event import PitchReading
from melodycoach.core.model import build_model
from melodycoach.core.scorer import leading, start
from melodycoach.core.verdict import competing_words, reading_words, verdict
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
MODEL = build_model(PACK, PACK.restrict(("rast", "hicaz", "humayun")))
EVEN = leading(MODEL, start(MODEL))


def test_a_decided_leaning_is_named_with_its_probability() -> None:
    lean = replace(EVEN, decided=True, among=(0,), p_best=0.83)
    assert verdict(MODEL, lean, 9) == f"leaning to {MODEL.modes[0].name}, 83 %"


def test_an_open_one_names_the_modes_and_the_family_that_they_share() -> None:
    names = [mode.name for mode in MODEL.modes]
    lean = replace(EVEN, decided=False, among=(0, 1), family="hicaz")
    assert verdict(MODEL, lean, 9) == f"undecided between {names[0]} and {names[1]}, both of the hicaz"
    lean = replace(EVEN, decided=False, among=(0, 1, 2), family="")
    assert verdict(MODEL, lean, 9) == f"undecided between {names[0]}, {names[1]} and {names[2]}"
    assert verdict(MODEL, replace(EVEN, decided=False, among=(2,)), 9) == f"undecided; {names[2]} is nearest"


def test_nothing_is_said_of_no_notes_and_of_one_mode_alone() -> None:
    assert verdict(MODEL, EVEN, 0) == "nothing heard yet: play or type a note"
    alone = build_model(PACK, PACK.restrict(("rast",)))
    says = verdict(alone, leading(alone, start(alone)), 3)
    assert says == "Rast alone competes: choose more modes to compare it with"


def test_it_says_what_is_known_of_the_final() -> None:
    modes = PACK.restrict(("rast",))
    assert reading_words(build_model(PACK, modes)) == "written pitch: each mode on its own final"
    given = build_model(PACK, modes, PitchReading.FINAL, PACK.system.units_to_cents(22))
    assert reading_words(given) == "final given: nevâ"
    assert reading_words(build_model(PACK, modes, PitchReading.ANY)) == "any pitch: each mode on every final"


def test_it_says_which_modes_compete() -> None:
    assert competing_words(build_model(PACK, PACK.modes)) == f"all {len(PACK.modes)} modes of {PACK.name}"
    assert competing_words(build_model(PACK, PACK.restrict(("rast", "segah")))) == "only Rast, Segâh"
