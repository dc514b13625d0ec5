from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from melodycoach.core.mode import Course, Mode
from melodycoach.core.note import InputKind
from melodycoach.core.parameters import ScoringParameters
from melodycoach.core.pitch import COMMAS_53, SEMITONES_12
from melodycoach.core.theory import (
    MOVING,
    RESTING,
    circular_blur,
    compass,
    fold_scale,
    folded_distributions,
    register_distribution,
)
from melodycoach.sources.pack_file import load_pack

PARAMETERS = ScoringParameters()
PLAIN = Mode(
    id="test/plain",
    name="Plain",
    final_units=0,
    rising=(0, 9, 18, 22, 31, 40, 49, 53),
    falling=(0, 9, 18, 22, 31, 40, 44, 53),
    below=(-22, -13),
    above=(62,),
    passing=(26,),
    played={18: 17.0},
    genera=(),
    dominants=(31, 22),
    leading=(-4,),
    suspended=(18, 31),
    course=Course.ASCENDING,
    opening=(0, 22),
    steps=(),
    neighbours=(),
)


def weights(mode: Mode, role: int) -> dict[int, float]:
    """Degree to weight, a degree with no function at all being 1."""
    scale = fold_scale(mode, PARAMETERS, COMMAS_53)
    by_degree = dict(zip(scale.book.astype(int).tolist(), scale.weight[role].tolist(), strict=True))
    unit = by_degree[40]  # the sixth degree has no function
    return {degree: weight / unit for degree, weight in by_degree.items()}


def test_each_degree_weighs_the_product_of_what_it_does() -> None:
    moving, resting = weights(PLAIN, MOVING), weights(PLAIN, RESTING)
    assert moving[0] == pytest.approx(1.5 * 1.4)  # final, and inside the opening region
    assert resting[0] == pytest.approx(3.0 * 1.3)
    assert moving[31] == pytest.approx(1.8)  # first dominant, outside the opening region
    assert moving[22] == pytest.approx(1.5 * 1.4)  # second dominant, inside
    assert moving[18] == pytest.approx(1.5 * 1.4)  # suspended cadence, inside
    assert moving[44] == pytest.approx(0.3)  # only in the falling form
    assert moving[26] == pytest.approx(0.25)  # occasional
    assert resting[26] == pytest.approx(0.5)


def test_a_degree_close_to_one_that_is_there_is_that_one() -> None:
    # the leading tone -4 folds to 49, which the rising form has; -22 folds to 31; -13 folds to 40
    assert sorted(weights(PLAIN, MOVING)) == [0, 9, 18, 22, 26, 31, 40, 44, 49]


def test_a_degree_far_below_the_final_is_not_folded_in() -> None:
    low = replace(PLAIN, below=(-48, -17))
    degrees = weights(low, MOVING)
    assert 53 - 48 not in degrees  # 48 commas are more than the limit of 25
    assert degrees[53 - 17] == pytest.approx(0.33)


def test_a_dominant_on_the_octave_raises_the_final_and_lets_the_next_lead() -> None:
    high = replace(PLAIN, dominants=(53, 31), opening=(31, 62))
    moving = weights(high, MOVING)
    assert moving[0] / moving[40] == pytest.approx(1.5 * 1.25)  # both inside the opening region
    assert moving[31] / moving[40] == pytest.approx(1.8)


def test_the_opening_region_counts_in_any_octave() -> None:
    high = weights(replace(PLAIN, opening=(53, 75)), MOVING)
    low = weights(PLAIN, MOVING)
    assert high[9] == pytest.approx(low[9])  # 62 is 9 an octave up


@pytest.mark.parametrize("kind", InputKind)
def test_distributions_sum_to_one_and_leave_nothing_impossible(kind: InputKind) -> None:
    hearing = PARAMETERS.hearing[kind]
    folded = folded_distributions(fold_scale(PLAIN, PARAMETERS, COMMAS_53), hearing, COMMAS_53)
    register = register_distribution(PLAIN, hearing, PARAMETERS, COMMAS_53)
    assert folded.sum(axis=1) == pytest.approx([1, 1])
    assert register.sum() == pytest.approx(1)
    assert folded.min() >= hearing.noise / 53
    assert register.min() > 0


def test_a_typed_degree_is_expected_where_it_is_written_and_a_recorded_one_where_it_is_played() -> None:
    scale = fold_scale(PLAIN, PARAMETERS, COMMAS_53)
    typed = folded_distributions(scale, PARAMETERS.hearing[InputKind.TYPED], COMMAS_53)[MOVING]
    recorded = folded_distributions(scale, PARAMETERS.hearing[InputKind.RECORDED], COMMAS_53)[MOVING]
    assert typed[18] > typed[17]
    assert recorded[17] > recorded[18]


def test_the_blur_wraps_around_the_octave() -> None:
    # a bell on 0 in an octave of 5: places 1 and 4 are one step away, 2 and 3 two steps
    bell = circular_blur(np.array([0.0]), 1.0, 5)[0]
    total = 1 + 2 * np.exp(-0.5) + 2 * np.exp(-2)
    assert bell.tolist() == pytest.approx(
        [x / total for x in (1, np.exp(-0.5), np.exp(-2), np.exp(-2), np.exp(-0.5))]
    )


def test_the_register_is_highest_where_the_mode_lives() -> None:
    lowest, highest = compass(COMMAS_53)
    assert (lowest, highest) == (-53, 106)
    register = register_distribution(PLAIN, PARAMETERS.hearing[InputKind.TYPED], PARAMETERS, COMMAS_53)
    assert register[9 - lowest] > register[40 - lowest]  # the opening region is 0 to 22
    assert register[40 - lowest] > register[62 - lowest] > register[70 - lowest]


def test_the_same_functions_serve_a_system_of_twelve() -> None:
    minor = replace(
        PLAIN,
        rising=(0, 2, 3, 5, 7, 8, 10, 12),
        falling=(0, 2, 3, 5, 7, 8, 10, 12),
        below=(-2,),
        above=(),
        passing=(),
        played={},
        dominants=(7,),
        leading=(-2,),
        suspended=(),
        opening=(0, 7),
    )
    folded = folded_distributions(
        fold_scale(minor, PARAMETERS, SEMITONES_12), PARAMETERS.hearing[InputKind.KEYS], SEMITONES_12
    )
    assert folded.shape == (2, 12)
    assert folded[RESTING].argmax() in (0, 7)
    assert folded[MOVING][[0, 2, 3, 5, 7, 8, 10]].min() > folded[MOVING][[1, 4, 6, 9, 11]].max()


def test_mahur_is_expected_higher_than_rast_on_the_same_final() -> None:
    # common practice: rast and mahur both close on rast (G4), and mahur opens higher
    pack = load_pack("makam")
    rast, mahur = pack.find("rast"), pack.find("mahur")
    assert rast.final_units == mahur.final_units == -9
    units = np.arange(compass(COMMAS_53)[0], compass(COMMAS_53)[1] + 1)
    hearing = PARAMETERS.hearing[InputKind.TYPED]
    mean = [
        float(units @ register_distribution(mode, hearing, PARAMETERS, COMMAS_53)) for mode in (rast, mahur)
    ]
    assert mean[1] > mean[0] + 9  # at least a whole tone


def test_huseyni_and_muhayyer_share_their_notes_and_differ_in_where_they_open() -> None:
    # common practice
    pack = load_pack("makam")
    huseyni, muhayyer = pack.find("huseyni"), pack.find("muhayyer")
    assert (huseyni.rising, huseyni.falling) == (muhayyer.rising, muhayyer.falling)
    assert huseyni.opening[1] < muhayyer.opening[1]
