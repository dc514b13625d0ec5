from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from melodycoach.core.event import PitchReading
from melodycoach.core.mode import Course, Mode, ModePack, Repertoire
from melodycoach.core.model import build_model, register_columns
from melodycoach.core.ngram import Counts, Token, count_tokens
from melodycoach.core.note import InputKind
from melodycoach.core.pitch import COMMAS_53, SEMITONES_12, PitchNames
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
THREE = PACK.restrict(("rast", "ussak", "segah"))


def test_with_written_pitch_each_mode_stands_on_its_own_final() -> None:
    model = build_model(PACK, THREE)
    assert model.final_units.tolist() == [mode.final_units for mode in model.modes]
    assert model.mode_index.tolist() == [0, 1, 2]
    assert np.exp(model.log_prior).tolist() == pytest.approx([1 / 3] * 3)
    assert model.order == 1


def test_a_given_final_serves_every_mode_and_keeps_its_cents() -> None:
    model = build_model(PACK, THREE, PitchReading.FINAL, final_cents=6300.0)
    # E flat below A4 is 600 cents: 26.5 commas
    assert (model.final_units + model.final_shift).tolist() == pytest.approx([-26.5] * 3)


def test_with_any_pitch_every_mode_stands_on_every_comma_of_the_octave() -> None:
    model = build_model(PACK, THREE, PitchReading.ANY)
    pairs = set(zip(model.mode_index.tolist(), model.final_units.tolist(), strict=True))
    assert pairs == {(mode, final) for mode in range(3) for final in range(53)}
    assert (model.mode_index == np.arange(3 * 53) % 3).all()
    assert model.tables(InputKind.TYPED).register is None


def test_a_rare_mode_has_the_smaller_prior() -> None:
    rare = replace(THREE[0], id="makam/rare", repertoire=Repertoire.RARE)
    model = build_model(PACK, (*THREE, rare), PitchReading.ANY)
    by_mode = np.exp(model.log_prior).reshape(-1, 4).sum(axis=0)
    assert by_mode.tolist() == pytest.approx([1 / 3.1, 1 / 3.1, 1 / 3.1, 0.1 / 3.1])


def test_what_does_not_go_together_is_refused() -> None:
    with pytest.raises(ValueError, match="no modes, expected at least one"):
        build_model(PACK, ())
    with pytest.raises(ValueError, match="final_cents None does not go with the reading 'final'"):
        build_model(PACK, THREE, PitchReading.FINAL)
    with pytest.raises(ValueError, match="final_cents 6900 does not go with the reading 'any'"):
        build_model(PACK, THREE, PitchReading.ANY, final_cents=6900)
    with pytest.raises(ValueError, match="order 0, expected 1 or more"):
        build_model(PACK, THREE, order=0)


def test_a_typed_pitch_is_the_nearest_comma() -> None:
    units, shares = build_model(PACK, THREE).shares(COMMAS_53.units_to_cents(7.6), InputKind.TYPED)
    assert (units.tolist(), shares.tolist()) == ([8], [1.0])


def test_a_key_is_every_comma_that_rounds_to_it() -> None:
    units, shares = build_model(PACK, THREE).shares(7100.0, InputKind.KEYS)
    # the key B4 is 200 cents = 8.83 commas above A4 and reaches 2.21 commas either way: 6.63 to 11.04;
    # the comma 11 (10.5 to 11.5) lies .54 inside, 7 (6.5 to 7.5) lies .87 inside
    assert units.tolist() == [7, 8, 9, 10, 11]
    assert shares.tolist() == pytest.approx([0.875, 1, 1, 1, 0.542], abs=0.001)


def test_the_keys_of_an_octave_share_every_comma_out_exactly_once() -> None:
    model = build_model(PACK, THREE)
    total = np.zeros(53)
    for key in range(60, 72):
        units, shares = model.shares(key * 100.0, InputKind.KEYS)
        np.add.at(total, units % 53, shares)
    assert total.tolist() == pytest.approx([1.0] * 53)


def test_the_register_beyond_the_compass_counts_as_its_end() -> None:
    model = build_model(PACK, THREE)
    columns = register_columns(model, np.array([-500, 500]))
    assert columns.tolist() == [[0, 0, 0], [159, 159, 159]]


def test_tables_are_built_once_for_each_kind_of_input() -> None:
    model = build_model(PACK, THREE)
    assert model.tables(InputKind.KEYS) is model.tables(InputKind.KEYS)
    with pytest.raises(ValueError, match="read-only"):
        model.tables(InputKind.KEYS).theory[0, 0, 0] = 1


def test_counts_of_other_modes_change_nothing() -> None:
    melody = [Token(0, 1.0, rests=False), Token(9, 1.0, rests=True), Token(0, 1.0, rests=False)]
    counted = count_tokens([melody], np.arange(53), order=3)
    assert build_model(PACK, THREE, counts=Counts({"makam/hicaz": counted})).order == 1
    model = build_model(PACK, THREE, counts=Counts({"makam/rast": counted}), order=2)
    assert model.order == 2
    assert model.tables(InputKind.TYPED).grams is not None


def test_a_pack_of_twelve_needs_no_other_code() -> None:
    dorian = Mode(
        id="test/dorian",
        name="Dorian",
        final_units=-7,
        rising=(0, 2, 3, 5, 7, 9, 10, 12),
        falling=(0, 2, 3, 5, 7, 9, 10, 12),
        below=(-2,),
        above=(14,),
        passing=(8,),
        played={},
        genera=(),
        dominants=(7,),
        leading=(-2,),
        suspended=(3,),
        course=Course.ASCENDING_DESCENDING,
        opening=(0, 7),
        steps=(),
        neighbours=(),
    )
    pack = ModePack("test", "Test", SEMITONES_12, PitchNames(SEMITONES_12), "", "", (dorian,))
    model = build_model(pack, pack.modes, PitchReading.ANY)
    assert len(model.mode_index) == 12
    units, shares = model.shares(6200.0, InputKind.KEYS)
    assert (units.tolist(), shares.tolist()) == ([-7], [1.0])
    assert model.tables(InputKind.KEYS).theory.shape == (1, 2, 12)
