"""What carried the evidence between two hypotheses."""

from dataclasses import replace

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from melodycoach.core.event import PitchReading
from melodycoach.core.evidence import (
    NUMBERS_KEPT,
    Balance,
    DegreeKey,
    Factor,
    RegisterKey,
    balance,
    evidence,
    evidence_of_balance,
    opening_lean,
)
from melodycoach.core.model import ScoringModel, build_model
from melodycoach.core.note import Heard, InputKind
from melodycoach.core.scorer import ScorerState, advance, log_odds, start
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
SLUGS = ("ussak", "huseyni", "muhayyer", "neva", "rast", "hicaz")
MODES = PACK.restrict(SLUGS)
WRITTEN = build_model(PACK, MODES)
ANY = build_model(PACK, MODES, PitchReading.ANY)
GIVEN = build_model(PACK, MODES, PitchReading.FINAL, 6905.0)


def index(slug: str) -> int:
    return [mode.slug for mode in MODES].index(slug)


HUSEYNI, USSAK, MUHAYYER, RAST = (index(slug) for slug in ("huseyni", "ussak", "muhayyer", "rast"))


def note(units: float, kind: InputKind, mark: str, length_s: float = 0.35) -> Heard:
    cents = PACK.system.units_to_cents(units)
    if kind is InputKind.KEYS:
        cents = 100.0 * round(cents / 100)
    return Heard(cents, kind, length_s, mark in ("!", "."), mark == ".")


def sung(text: str, kind: InputKind = InputKind.TYPED) -> list[Heard]:
    """Commas from A4; ``!`` behind a note: the line rests on it; ``.``: a phrase ends there too."""
    return [note(float(word.rstrip("!.")), kind, word[-1]) for word in text.split()]


def scored(model: ScoringModel, heard: list[Heard]) -> list[ScorerState]:
    states = [start(model)]
    for one in heard:
        states.append(advance(model, states[-1], one))
    return states


NOTES = st.lists(
    st.builds(
        note,
        st.sampled_from([-14, -9, 0, 7.3, 8, 13, 17, 22, 31, 35, 39, 44, 53, 61, 4]),
        st.sampled_from(list(InputKind)),
        st.sampled_from(["", "", "!", "."]),
        st.sampled_from([0.05, 0.35, 2.0]),
    ),
    max_size=20,
)


@pytest.mark.parametrize("model", [WRITTEN, ANY, GIVEN], ids=["written", "any", "given"])
@settings(deadline=None)
@given(heard=NOTES, pair=st.tuples(st.integers(0, 5), st.integers(0, 5)))
def test_the_items_add_up_to_the_log_odds(
    model: ScoringModel, heard: list[Heard], pair: tuple[int, int]
) -> None:
    states = scored(model, heard)
    found = evidence(model, states, heard, *pair)
    assert sum(one.nats for one in found) == pytest.approx(log_odds(model, states[-1], *pair), abs=1e-9)


@settings(deadline=None)
@given(heard=NOTES)
def test_evidence_for_one_is_evidence_against_the_other(heard: list[Heard]) -> None:
    states = scored(WRITTEN, heard)
    there = sum(one.nats for one in evidence(WRITTEN, states, heard, HUSEYNI, RAST))
    back = sum(one.nats for one in evidence(WRITTEN, states, heard, RAST, HUSEYNI))
    assert there == pytest.approx(-back, abs=1e-9)


@settings(deadline=None)
@given(heard=NOTES, cut=st.integers(0, 20))
def test_a_tally_that_goes_on_is_the_tally_of_the_whole(heard: list[Heard], cut: int) -> None:
    states = scored(WRITTEN, heard)
    cut = min(cut, len(heard))
    earlier = balance(WRITTEN, states[: cut + 1], heard[:cut], HUSEYNI, USSAK)
    at_once = evidence(WRITTEN, states, heard, HUSEYNI, USSAK)
    assert evidence(WRITTEN, states, heard, HUSEYNI, USSAK, earlier) == at_once


def steps_back(weighed: Balance, whole: Balance) -> bool:
    """Whether the sums of ``weighed`` were carried on in ``whole`` rather than made again."""
    return whole._places is weighed._places


def test_a_tally_is_taken_up_again_only_where_it_fits() -> None:
    heard = sung("22 31! 22 13 8 0!")
    states = scored(WRITTEN, heard)
    early = balance(WRITTEN, states[:4], heard[:3], HUSEYNI, USSAK)
    assert steps_back(early, balance(WRITTEN, states, heard, HUSEYNI, USSAK, early))
    assert not steps_back(early, balance(WRITTEN, states, heard, HUSEYNI, RAST, early))
    assert not steps_back(early, balance(GIVEN, scored(GIVEN, heard), heard, HUSEYNI, USSAK, early))
    assert not steps_back(early, balance(WRITTEN, scored(WRITTEN, heard), heard, HUSEYNI, USSAK, early))
    assert balance(WRITTEN, states[:4], heard[:3], HUSEYNI, USSAK, early) is early


def test_a_changed_last_note_costs_one_note_alone() -> None:
    heard = sung("22 31! 22 13 8 0 0")
    states = scored(WRITTEN, heard)
    whole = balance(WRITTEN, states, heard, HUSEYNI, USSAK)
    grown = [*heard[:-1], *sung("0!")]
    new_states = [*states[:-1], advance(WRITTEN, states[-2], grown[-1])]
    again = balance(WRITTEN, new_states, grown, HUSEYNI, USSAK, whole)
    assert steps_back(whole, again)
    assert evidence_of_balance(again, grown) == evidence(WRITTEN, new_states, grown, HUSEYNI, USSAK)


def test_notes_of_one_meaning_are_one_item() -> None:
    heard = sung("0 13 0 13 31! 31! 31 31!")
    states = scored(WRITTEN, heard)
    found = evidence(WRITTEN, states, heard, HUSEYNI, USSAK)
    items = {one.degree: one for one in found if one.factor is Factor.DEGREE}
    rests = items[DegreeKey(31, 31, 31, True)]
    assert (rests.n_notes, rests.numbers) == (3, (5, 6, 8))
    assert rests.nats > 0  # the güçlü of Hüseynî is 31 over its final, that of Uşşak 22: common practice
    assert items[DegreeKey(31, 31, 31, False)].numbers == (7,)


def test_a_pitch_outside_one_mode_is_named_by_the_degree_of_the_other() -> None:
    heard = sung("0 0 0 0 17 -9")
    states = scored(WRITTEN, heard)
    keys = [one.degree for one in evidence(WRITTEN, states, heard, index("hicaz"), USSAK)]
    assert DegreeKey(17, None, 17, False) in keys
    assert DegreeKey(-9, -9, -9, False) in keys


def test_the_strongest_item_comes_first_and_no_more_numbers_are_kept_than_shown() -> None:
    heard = sung("22 31! " + "31! " * 30 + "0 8 13 22")
    states = scored(WRITTEN, heard)
    found = evidence(WRITTEN, states, heard, HUSEYNI, USSAK)
    sizes = [abs(one.nats) for one in found]
    assert sizes == sorted(sizes, reverse=True)
    most = max(found, key=lambda one: one.n_notes)
    assert most.n_notes > NUMBERS_KEPT == len(most.numbers)


def test_the_register_is_told_apart_from_the_degree() -> None:
    # muhayyer opens an octave above the final: common practice
    heard = sung("0 0 0 0 53 61 66 53")
    states = scored(WRITTEN, heard)
    found = evidence(WRITTEN, states, heard, MUHAYYER, USSAK)
    register = {one.register: one for one in found if one.factor is Factor.REGISTER}
    high = register[RegisterKey(in_a=True, in_b=False)]
    assert high.nats > 0
    assert high.numbers == (5, 6, 7, 8)


def test_no_register_where_any_pitch_may_be_the_final() -> None:
    heard = sung("0 8 13 22 31 22")
    found = evidence(ANY, scored(ANY, heard), heard, HUSEYNI, USSAK)
    assert {one.factor for one in found} == {Factor.DEGREE}


def test_the_opening_is_one_item_where_the_modes_open_in_different_places() -> None:
    heard = sung("53 61 66 53! 44 39 31")
    states = scored(WRITTEN, heard)
    found = evidence(WRITTEN, states, heard, MUHAYYER, USSAK)
    opening = [one for one in found if one.factor is Factor.OPENING]
    assert [(one.numbers, one.nats > 0) for one in opening] == [((1, 2, 3, 4), True)]
    assert min(min(one.numbers) for one in found if one.factor is not Factor.OPENING) == 5


def test_whose_region_the_line_has_opened_in() -> None:
    def lean(*units: float) -> int:
        return opening_lean(WRITTEN, MUHAYYER, USSAK, units)

    assert lean(53, 61, 66) == 1
    assert lean(0, 8, 13) == -1
    assert lean(-30) == 0


def test_an_opening_that_speaks_against_its_own_region_is_told_note_by_note() -> None:
    # the line opens where Rast does, on pitches that Rast has not
    heard = sung("4 4 4 4")
    states = scored(WRITTEN, heard)
    assert opening_lean(WRITTEN, RAST, MUHAYYER, [4.0] * 4) == 1
    found = evidence(WRITTEN, states, heard, RAST, MUHAYYER)
    assert sum(one.nats for one in found if one.factor is Factor.DEGREE) < 0
    assert Factor.OPENING not in {one.factor for one in found}


def test_the_end_of_a_phrase_is_an_item_of_its_own() -> None:
    open_end, ended = sung("-9 0 8 0 -9 -9!"), sung("-9 0 8 0 -9 -9.")
    factors = []
    for heard in (open_end, ended):
        found = evidence(WRITTEN, scored(WRITTEN, heard), heard, RAST, USSAK)
        factors.append({one.factor: one for one in found})
    assert Factor.CLOSING not in factors[0]
    closing = factors[1][Factor.CLOSING]
    assert closing.nats > 0
    assert (closing.numbers, closing.degree) == ((6,), DegreeKey(0, -9, -9, True))


def test_an_uneven_prior_is_an_item() -> None:
    prior = WRITTEN.log_prior.copy()
    prior[HUSEYNI] += 0.5
    uneven = replace(WRITTEN, log_prior=prior)
    found = evidence(uneven, [start(uneven)], [], HUSEYNI, USSAK)
    assert [(one.factor, round(one.nats, 9), one.n_notes) for one in found] == [(Factor.PRIOR, 0.5, 0)]


def test_before_the_first_note_there_is_no_evidence() -> None:
    assert evidence(WRITTEN, [start(WRITTEN)], [], HUSEYNI, USSAK) == ()
