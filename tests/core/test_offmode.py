"""Notes that break the mode, and what mends them."""

import pytest

from melodycoach.core.note import Heard, InputKind, Note
from melodycoach.core.offmode import OffMode, off_mode, off_mode_words
from melodycoach.sources.note_text import read_tokens
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
KIND = InputKind


def off(mode: str, perde: str, kind: InputKind = KIND.TYPED) -> OffMode | None:
    pitch = PACK.names.find(perde)
    assert pitch is not None, perde
    cents = PACK.system.units_to_cents(pitch.units)
    if kind is KIND.KEYS:
        cents = 100.0 * round(cents / 100)
    found = PACK.find(mode)
    return off_mode(found, found.final_units, Heard(cents, kind, 0.35, False, False), PACK.names)


@pytest.mark.parametrize(
    ("mode", "perde"),
    [
        ("huseyni", "eviç"),
        ("huseyni", "acem"),  # the falling form, whatever the direction: common practice
        ("huseyni", "rast"),
        ("rast", "ırak"),
        ("hicaz", "nim hicaz"),
    ],
)
def test_the_notes_of_a_mode_are_not_off(mode: str, perde: str) -> None:
    assert off(mode, perde) is None


def test_hisar_in_huseyni_is_off_and_huseyni_mends_it() -> None:
    # hisar is 27 commas over dügâh, hüseynî 31: common practice (AEU)
    found = off("huseyni", "hisar")
    assert found is not None
    assert (found.mend_degree, found.off_units) == (31, pytest.approx(-4))
    assert off_mode_words(found, PACK.find("huseyni"), PACK.names) == (
        "not in Hüseynî, 4 commas below hüseynî",
        "hüseynî",
    )


def test_one_comma_is_written_in_the_singular() -> None:
    one = OffMode(6900 + 32 * 1200 / 53, 31, 6900 + 31 * 1200 / 53, 1.0)
    assert off_mode_words(one, PACK.find("huseyni"), PACK.names)[0] == "not in Hüseynî, 1 comma above hüseynî"


def test_a_distance_that_is_no_whole_comma_is_rounded_to_a_tenth() -> None:
    one = OffMode(6900 + 33.56 * 1200 / 53, 31, 6900 + 31 * 1200 / 53, 2.56)
    assert off_mode_words(one, PACK.find("huseyni"), PACK.names)[0] == (
        "not in Hüseynî, 2.6 commas above hüseynî"
    )


def test_a_key_is_off_only_when_no_degree_lies_on_it() -> None:
    # segâh and bûselik are the same key: Rast has segâh
    assert off("rast", "bûselik", KIND.KEYS) is None
    assert off("rast", "kürdî", KIND.KEYS) is not None
    assert off("kurdi", "kürdî", KIND.KEYS) is None


def test_a_given_final_moves_the_mode() -> None:
    rast = PACK.find("rast")
    note = Heard(PACK.system.units_to_cents(17), KIND.TYPED, 0.35, False, False)
    assert off_mode(rast, 0, note, PACK.names) is None  # 17 over A4
    assert off_mode(rast, rast.final_units, note, PACK.names) is not None  # 26 over G4


def written(mode: str, note: str, *, rests: bool = False) -> OffMode | None:
    found = PACK.find(mode)
    [item] = read_tokens(note, PACK.names, 0.0, 60)
    assert isinstance(item, Note)
    heard = Heard(item.pitch_cents, KIND.TYPED, 0.35, rests, False)
    return off_mode(found, found.final_units, heard, PACK.names)


@pytest.mark.parametrize(
    ("mode", "note", "mend"),
    [
        ("rast", "Bb4", "segâh"),  # as far from dügâh, but it is a B
        ("rast", "Eb5", "hüseynî"),  # nearer to nevâ, but it is an E
        ("huseyni", "C#5", "çargâh"),
    ],
)
def test_a_note_is_mended_by_the_degree_of_its_letter_if_that_is_not_far(
    mode: str, note: str, mend: str
) -> None:
    found = written(mode, note)
    assert found is not None
    assert PACK.names.name(found.mend_cents) == mend


def test_a_key_has_no_letter_so_the_nearest_degree_mends_it() -> None:
    found = off("rast", "kürdî", KIND.KEYS)
    assert found is not None
    assert PACK.names.name(found.mend_cents) in ("segâh", "dügâh")


def test_a_passing_colour_passes_and_is_off_when_the_line_rests_on_it() -> None:
    colours = [(mode, degree) for mode in PACK.modes for degree in mode.passing if 0 < degree < 53]
    assert colours
    for mode, degree in colours:
        cents = PACK.system.units_to_cents(mode.final_units + degree)
        passes, rests = (
            off_mode(mode, mode.final_units, Heard(cents, KIND.TYPED, 0.35, resting, False), PACK.names)
            for resting in (False, True)
        )
        assert passes is None
        if rests is not None:
            assert off_mode_words(rests, mode, PACK.names)[0] == (
                f"only a passing colour in {mode.name}, and the line rests on it"
            )
            assert rests.mend_degree != degree
    beyati = PACK.find("beyati")
    cents = PACK.system.units_to_cents(beyati.final_units + beyati.passing[0])
    assert off_mode(beyati, 0, Heard(cents, KIND.TYPED, 0.35, True, False), PACK.names) is not None
