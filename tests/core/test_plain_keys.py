"""What a plain keyboard cannot tell apart."""

from itertools import combinations

import numpy as np
import pytest

from melodycoach.core.event import PitchReading
from melodycoach.core.mode import ModePack
from melodycoach.core.model import ScoringModel, build_model
from melodycoach.core.note import InputKind
from melodycoach.core.pitch import SEMITONES_12, PitchNames
from melodycoach.core.plain_keys import CLOSE_NATS, divergence, function_difference, keyboard_note
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
MODEL = build_model(PACK, PACK.modes)
INDEX = {mode.slug: at for at, mode in enumerate(MODEL.modes)}


def note(a: str, b: str) -> str:
    return keyboard_note(MODEL, INDEX[a], INDEX[b])


def test_rast_and_mahur_differ_by_a_comma_that_the_b_key_hides() -> None:
    # segâh and bûselik are a comma apart and one key; Mahur's güçlü is the upper octave: common practice
    assert note("rast", "mahur") == (
        "the B key is both segâh and bûselik, so these keys hide what separates Rast and Mahur;"
        " what is left is the dominant, nevâ or gerdâniye"
    )


def test_huseyni_and_muhayyer_are_twins_on_every_keyboard() -> None:
    # the same notes, another opening: common practice
    assert note("huseyni", "muhayyer") == (
        "Hüseynî and Muhayyer use the same keys, and no retuning would tell them apart;"
        " what is left is the dominant, hüseynî or muhayyer"
    )


def test_modes_that_the_keys_tell_apart_need_no_note() -> None:
    assert note("hicaz", "ussak") == ""
    assert note("nihavend", "rast") == ""


def test_modes_that_a_retuned_key_would_tell_apart_sooner_are_named() -> None:
    assert note("buselik", "huseyni") == (
        "the B key is both bûselik and segâh: a retuned key would tell Bûselik and Hüseynî apart sooner"
    )


def test_a_pair_that_is_not_a_matter_of_tuning_but_a_little_apart_needs_no_note() -> None:
    apart = divergence(MODEL, INDEX["neva"], INDEX["ussak"])
    assert 0.15 <= apart.keys < CLOSE_NATS
    assert note("neva", "ussak") == ""


def test_the_keys_never_separate_more_than_the_commas_do() -> None:
    # merging outcomes never makes two distributions easier to tell apart: the data processing
    # inequality (Cover and Thomas, Elements of information theory, section 2.8; from memory)
    for a, b in combinations(range(0, MODEL.n_modes, 5), 2):
        apart = divergence(MODEL, a, b)
        assert -1e-12 <= apart.keys <= apart.fine + 1e-12


def test_the_divergence_is_the_symmetrised_one_of_the_tables() -> None:
    a, b = INDEX["rast"], INDEX["mahur"]  # both on rast, so no table has to be turned
    p, q = (MODEL.tables(InputKind.KEYS).theory[h] for h in (a, b))
    by_hand = 0.5 * sum(
        float(p[role, u] * np.log(p[role, u] / q[role, u]) + q[role, u] * np.log(q[role, u] / p[role, u]))
        for role in (0, 1)
        for u in range(53)
    )
    assert divergence(MODEL, a, b).fine == pytest.approx(by_hand)
    assert divergence(MODEL, b, a).keys == pytest.approx(divergence(MODEL, a, b).keys)


def test_a_mode_does_not_diverge_from_itself() -> None:
    apart = divergence(MODEL, 0, 0)
    assert (apart.fine, apart.keys) == (0.0, 0.0)


def test_the_same_tuning_of_a_degree_is_named_once() -> None:
    # uşşak's segâh is played lower than that of rast: common practice
    model = MODEL
    apart = divergence(model, INDEX["rast"], INDEX["ussak"])
    if apart.keys < CLOSE_NATS:
        assert note("rast", "ussak").startswith("the B key hides how segâh is tuned")


def with_other(slug: str, **changes: object) -> ScoringModel:
    mode = PACK.find(slug)
    plain = {k: v for k, v in vars(mode).items() if k in mode.__dataclass_fields__}
    return build_model(PACK, (mode, type(mode)(**{**plain, "id": "makam/other", **changes})))


def test_what_is_left_is_looked_for_in_order() -> None:
    huseyni = PACK.find("huseyni")
    assert function_difference(with_other("huseyni"), 0, 1) == ""
    assert function_difference(with_other("huseyni", opening=(0, 31)), 0, 1).startswith("the opening, ")
    assert function_difference(with_other("huseyni", dominants=(22,)), 0, 1) == (
        "the dominant, hüseynî or nevâ"
    )
    assert function_difference(with_other("huseyni", final_units=9), 0, 1) == "the final, dügâh or bûselik"
    assert huseyni.dominants[0] == 31


def test_twins_with_nothing_left_are_told_without_a_tail() -> None:
    assert keyboard_note(with_other("huseyni", name="Other"), 0, 1) == (
        "Hüseynî and Other use the same keys, and no retuning would tell them apart"
    )


def test_any_pitch_compares_hypotheses_on_their_own_finals() -> None:
    model = build_model(PACK, PACK.restrict(("rast", "mahur")), PitchReading.ANY)
    on_rast = [h for h in range(len(model.mode_index)) if model.final_units[h] == 44]
    apart = divergence(model, *on_rast)
    written = divergence(MODEL, INDEX["rast"], INDEX["mahur"])
    assert apart.keys == pytest.approx(written.keys)  # 44 commas over A4 and 9 under it are one pitch class


def test_in_a_system_of_semitones_every_pitch_has_its_key() -> None:
    rast = PACK.find("rast")
    plain = {k: v for k, v in vars(rast).items() if k in rast.__dataclass_fields__}
    twelve = {"rising": (0, 2, 4, 5, 7, 9, 11, 12), "falling": (0, 2, 4, 5, 7, 9, 10, 12), "final_units": -2}
    twelve |= {"below": (), "above": (), "passing": (), "played": {}, "dominants": (7,), "leading": (-1,)}
    twelve |= {"suspended": (), "opening": (0, 7)}
    modes = tuple(type(rast)(**{**plain, **twelve, "id": f"test/{n}"}) for n in "ab")
    pack = ModePack("test", "Test", SEMITONES_12, PitchNames(SEMITONES_12), "", "", modes)
    assert keyboard_note(build_model(pack, modes), 0, 1) == ""
