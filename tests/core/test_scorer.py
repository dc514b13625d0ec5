from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from melodycoach.core.event import PitchReading
from melodycoach.core.model import ScoringModel, build_model
from melodycoach.core.ngram import Counts, Token, count_tokens, snap_to_scale
from melodycoach.core.note import Heard, InputKind, hear
from melodycoach.core.parameters import ScoringParameters
from melodycoach.core.pitch import COMMAS_53
from melodycoach.core.scorer import (
    ScorerState,
    advance,
    announced,
    closing,
    closing_if_ended,
    evidence_of,
    increments,
    leading,
    log_odds,
    log_posterior,
    mode_posterior,
    note_weight,
    posterior,
    start,
    temper,
)
from melodycoach.core.theory import fold_scale
from melodycoach.errors import ImpossibleEvidenceError
from melodycoach.sources.note_text import read_note_text
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
SOME = PACK.restrict(("rast", "mahur", "ussak", "beyati", "huseyni", "hicaz", "segah", "saba"))

# Lines of our own, 9 to 12 notes, that state a makam by the book: where it opens, its half cadence,
# its close. Uşşak, beyâtî, nevâ, hüseynî and muhayyer share notes; the opening and the course tell.
BY_THE_BOOK = {
    "rast": "rast dügâh segâh çargâh nevâ:3 , hüseynî nevâ çargâh segâh dügâh rast:4 .",
    "mahur": (
        "gerdâniye:2 mahur gerdâniye muhayyer gerdâniye:2 , hüseynî nevâ:2 çargâh bûselik dügâh rast:4 ."
    ),
    "ussak": "dügâh segâh:2 çargâh nevâ:2 , çargâh segâh dügâh rast dügâh segâh dügâh:4 .",
    "beyati": "nevâ:2 hüseynî acem hüseynî nevâ:2 çargâh:3 , nevâ çargâh segâh dügâh:4 .",
    "huseyni": "hüseynî:2 eviç gerdâniye eviç hüseynî:3 , nevâ çargâh hüseynî nevâ çargâh segâh dügâh:4 .",
    "muhayyer": (
        "muhayyer:2 tiz-segâh muhayyer gerdâniye eviç muhayyer:2 , hüseynî:2 nevâ çargâh segâh dügâh:4 ."
    ),
    "neva": "nevâ:2 hüseynî eviç gerdâniye eviç nevâ:3 , hüseynî nevâ:2 çargâh segâh dügâh:4 .",
    "hicaz": "dügâh dik-kürdî nim-hicaz nevâ:3 , eviç hüseynî:2 nevâ nim-hicaz dik-kürdî dügâh:4 .",
    "karcigar": "nevâ:2 hisar nevâ çargâh nevâ:2 , gerdâniye hisar nevâ:2 çargâh segâh dügâh:4 .",
    "saba": "dügâh segâh çargâh:3 , hicaz çargâh segâh dügâh rast segâh dügâh:4 .",
    "segah": "segâh:2 kürdî segâh çargâh nevâ:3 , çargâh segâh dügâh segâh:4 .",
    "huzzam": "nevâ:2 hisar nevâ:2 , gerdâniye eviç hisar nevâ:2 çargâh segâh:4 .",
    "nihavend": "rast dügâh kürdî:2 çargâh nevâ:3 , nim-hisar nevâ çargâh kürdî dügâh rast:4 .",
    "kurdilihicazkar": (
        "gerdâniye:2 acem nim-hisar nevâ:2 , gerdâniye acem nim-hisar nevâ:2 "
        "çargâh kürdî nim-zirgüle rast:4 ."
    ),
    "suzinak": "rast segâh çargâh nevâ:3 , eviç gerdâniye hisar nevâ:2 , çargâh segâh dügâh rast:4 .",
    "acemkurdi": "acem:3 gerdâniye acem hüseynî nevâ:2 , çargâh nevâ çargâh kürdî dügâh:4 .",
}


def line(text: str) -> tuple[Heard, ...]:
    return hear(read_note_text(text, PACK.names).items)


def on_keys(notes: tuple[Heard, ...]) -> tuple[Heard, ...]:
    return tuple(replace(n, kind=InputKind.KEYS, pitch_cents=round(n.pitch_cents, -2)) for n in notes)


def score(model: ScoringModel, notes: tuple[Heard, ...]) -> ScorerState:
    state = start(model)
    for note in notes:
        state = advance(model, state, note)
    return state


def leader(model: ScoringModel, notes: tuple[Heard, ...]) -> str:
    return model.modes[int(mode_posterior(model, score(model, notes)).argmax())].slug


def some_counts(order: int = 3) -> Counts:
    parameters = ScoringParameters()
    rng = np.random.default_rng(7)
    by_mode = {}
    for mode in SOME:
        scale = fold_scale(mode, parameters, COMMAS_53)
        walk = rng.choice(len(scale.book), size=300, p=scale.weight[0])
        melody = [Token(int(scale.book[at]), 0.4, bool(rng.random() < 0.2)) for at in walk]
        by_mode[mode.id] = count_tokens([melody], snap_to_scale(scale, 1.6, 53), order)
    return Counts(by_mode)


MODELS = {
    "written": build_model(PACK, SOME),
    "final": build_model(PACK, SOME, PitchReading.FINAL, final_cents=6950.0),
    "any": build_model(PACK, SOME, PitchReading.ANY),
    "with single counts": build_model(PACK, SOME, counts=some_counts(1)),
    "with counts": build_model(PACK, SOME, counts=some_counts()),
    "with counts, any": build_model(PACK, SOME, PitchReading.ANY, counts=some_counts()),
}

notes_of_all_kinds = st.lists(
    st.builds(
        Heard,
        pitch_cents=st.one_of(st.floats(0, 12700), st.integers(60, 84).map(lambda key: key * 100.0)),
        kind=st.sampled_from(InputKind),
        length_s=st.floats(0, 3),
        rests=st.booleans(),
        closes=st.booleans(),
    ),
    max_size=14,
).map(tuple)


@pytest.mark.parametrize("name", MODELS)
@settings(derandomize=True, max_examples=25, deadline=None)
@given(notes=notes_of_all_kinds)
def test_the_posterior_is_a_distribution(name: str, notes: tuple[Heard, ...]) -> None:
    model = MODELS[name]
    state = score(model, notes)
    assert posterior(model, state).sum() == pytest.approx(1)
    assert posterior(model, state).min() >= 0
    assert mode_posterior(model, state).shape == (len(SOME),)
    assert mode_posterior(model, state).sum() == pytest.approx(1)


@pytest.mark.parametrize("name", MODELS)
@settings(derandomize=True, max_examples=25, deadline=None)
@given(notes=notes_of_all_kinds)
def test_the_evidence_of_the_notes_adds_up_to_the_log_odds(name: str, notes: tuple[Heard, ...]) -> None:
    model = MODELS[name]
    state, total, parts = start(model), np.zeros(len(model.mode_index)), np.zeros(len(model.mode_index))
    for note in notes:
        total += increments(model, state, note)
        evidence = evidence_of(model, state, note)
        parts += evidence.degree + evidence.register
        state = advance(model, state, note)
    added = model.log_prior + temper(model, state) * (total + closing(model, state))
    a, b = 0, len(added) - 1
    assert log_odds(model, state, a, b) == pytest.approx(added[a] - added[b], abs=1e-9)
    by_posterior = log_posterior(model, state)
    assert by_posterior[a] - by_posterior[b] == pytest.approx(added[a] - added[b], abs=1e-9)
    assert parts == pytest.approx(total)


@pytest.mark.parametrize("name", MODELS)
def test_a_stream_is_its_batch_at_every_cut(name: str) -> None:
    model = MODELS[name]
    notes = line(BY_THE_BOOK["saba"]) + on_keys(line(BY_THE_BOOK["rast"]))
    whole = score(model, notes)
    for cut in range(len(notes) + 1):
        state = score(model, notes[:cut])
        before = (state.loglik.copy(), state.memory.copy(), state.context.copy(), state.change.gain.copy())
        for note in notes[cut:]:
            state = advance(model, state, note)
        assert (state.loglik == whole.loglik).all()
        assert (state.context == whole.context).all()
        assert (posterior(model, state) == posterior(model, whole)).all()
        assert (announced(model, state), state.changed_at) == (announced(model, whole), whole.changed_at)
        again = score(model, notes[:cut])
        for old, new in zip(
            before, (again.loglik, again.memory, again.context, again.change.gain), strict=True
        ):
            assert (old == new).all()


def test_a_state_cannot_be_changed() -> None:
    state = score(MODELS["with counts"], line(BY_THE_BOOK["rast"]))
    for array in (state.loglik, state.memory, state.context, state.change.gain, state.change.log_belief):
        with pytest.raises(ValueError, match="read-only"):
            array[0] = 1


def test_a_constant_added_to_every_loglik_changes_nothing() -> None:
    model = MODELS["written"]
    state = score(model, line(BY_THE_BOOK["rast"]))
    raised = replace(state, loglik=state.loglik + 1000.0)
    assert posterior(model, raised) == pytest.approx(posterior(model, state))


def test_transposing_a_line_moves_the_final_and_nothing_else() -> None:
    model = MODELS["any"]
    notes = line(BY_THE_BOOK["hicaz"])
    up = tuple(replace(n, pitch_cents=n.pitch_cents + 9 * COMMAS_53.unit_cents) for n in notes)
    here, there = score(model, notes), score(model, up)
    assert mode_posterior(model, there) == pytest.approx(mode_posterior(model, here))
    best, moved = leading(model, here).best, leading(model, there).best
    assert (model.final_units[moved] - model.final_units[best]) % 53 == 9
    assert model.final_units[best] == 0  # dügâh


def test_a_given_final_moves_with_the_line() -> None:
    notes = line(BY_THE_BOOK["hicaz"])
    up = tuple(replace(n, pitch_cents=n.pitch_cents + 50.0) for n in notes)
    at_a4 = build_model(PACK, SOME, PitchReading.FINAL, final_cents=6900.0)
    assert posterior(MODELS["final"], score(MODELS["final"], up)) == pytest.approx(
        posterior(at_a4, score(at_a4, notes))
    )


def test_a_note_of_no_length_says_nothing() -> None:
    model = MODELS["written"]
    state = score(model, (Heard(6900.0, InputKind.KEYS, 0.0, rests=False, closes=False),))
    assert posterior(model, state) == pytest.approx(np.exp(model.log_prior))
    assert (state.n_notes, state.weight) == (1, 0.0)


def test_a_long_note_weighs_more_than_a_short_one_up_to_a_limit() -> None:
    model = MODELS["written"]
    weights = [
        note_weight(model, Heard(6900.0, InputKind.KEYS, s, rests=False, closes=False)) for s in (0.35, 1, 9)
    ]
    assert weights == pytest.approx([0.35**0.75, 1.0, 1.0])


def test_a_pitch_heard_often_says_less_each_time() -> None:
    model = MODELS["written"]
    note = Heard(6900.0 + 8 * COMMAS_53.unit_cents, InputKind.TYPED, 1.0, rests=False, closes=False)
    rast, hicaz = (model.modes.index(PACK.find(slug)) for slug in ("rast", "hicaz"))
    state, said = start(model), []
    for _ in range(4):
        by_degree = evidence_of(model, state, note).degree
        said.append(float(by_degree[rast] - by_degree[hicaz]))
        state = advance(model, state, note)
    assert said == sorted(said, reverse=True)
    assert said[-1] > 0


def test_without_a_memory_a_pitch_says_the_same_each_time() -> None:
    model = build_model(PACK, SOME, parameters=ScoringParameters(memory_mass=float("inf")))
    note = Heard(6900.0, InputKind.TYPED, 1.0, rests=False, closes=False)
    first = increments(model, start(model), note)
    assert increments(model, score(model, (note, note)), note) == pytest.approx(first)


def test_evidence_weighs_less_the_more_of_it_there_is() -> None:
    model = MODELS["written"]
    notes = line(BY_THE_BOOK["rast"])
    tempers = [temper(model, score(model, notes[:n])) for n in range(len(notes))]
    assert tempers == sorted(tempers, reverse=True)
    assert tempers[0] == model.parameters.temper


def test_the_end_of_a_short_phrase_weighs_no_more_than_that_of_a_whole_melody() -> None:
    """Five notes that end on hüseynî may be a half cadence (common practice): no ground to be sure."""
    model = build_model(PACK, PACK.modes)
    state = start(model)
    for note in hear(read_note_text("A4 B4-1 C5 D5 E5:2 .", PACK.names).items):
        state = advance(model, state, note)
    parameters = model.parameters
    assert temper(model, state) > parameters.closing_temper
    untamed = replace(model, parameters=replace(parameters, closing_temper=float("inf")))
    share = closing(model, state) / closing(untamed, state)
    assert share == pytest.approx(parameters.closing_temper / temper(model, state))
    assert mode_posterior(model, state).max() < mode_posterior(untamed, state).max()


def ended(text: str) -> tuple[ScoringModel, ScorerState]:
    model = build_model(PACK, PACK.restrict(("huseyni", "huseyniasiran")))
    state = start(model)
    for note in hear(read_note_text(text, PACK.names).items):
        state = advance(model, state, note)
    return model, state


def test_a_rest_on_the_octave_of_a_final_is_no_close_where_the_octave_is_known() -> None:
    """Hüseynîaşîran closes on the low E, the octave below the güçlü of Hüseynî (common practice)."""
    model, state = ended("A4 B4-1 C5 D5 E5 D5 C5 D5 E5:2 .")
    hearing = model.parameters.hearing
    typed = replace(hearing[InputKind.TYPED], knows_octave=False)
    blind = replace(model, parameters=replace(model.parameters, hearing={**hearing, InputKind.TYPED: typed}))
    huseyni, asiran = 0, 1
    assert [mode.slug for mode in model.modes] == ["huseyni", "huseyniasiran"]
    known, unknown = closing(model, state), closing(blind, state)
    assert known[asiran] - known[huseyni] < 0.8 * (unknown[asiran] - unknown[huseyni])
    low = ended("A4 G4 F#4 E4 F#4 G4 A4 G4 F#4 E4:2 .")[1]
    assert closing(model, low)[asiran] == closing(blind, low)[asiran]


def test_a_note_of_no_length_may_end_a_phrase() -> None:
    model = build_model(PACK, SOME)
    state = advance(model, start(model), Heard(6900.0, InputKind.KEYS, 0.0, rests=True, closes=True))
    assert mode_posterior(model, state).sum() == pytest.approx(1.0)


def test_a_whole_line_an_octave_away_closes_on_the_final_there() -> None:
    written, lower = ended("E5 D5 C5 B4-1 A4:2 ."), ended("E4 D4 C4 B3-1 A3:2 .")
    assert closing(*written) == pytest.approx(closing(*lower))


def test_closing_speaks_only_where_a_phrase_ends_and_is_never_kept() -> None:
    model = MODELS["written"]
    notes = line(BY_THE_BOOK["segah"])
    ended = score(model, notes)
    open_end = score(model, (*notes[:-1], replace(notes[-1], closes=False)))
    assert (closing(model, open_end) == 0).all()
    assert (closing(model, ended) == closing_if_ended(model, open_end)).all()
    assert (ended.loglik == open_end.loglik).all()
    segah = model.modes.index(PACK.find("segah"))
    assert closing(model, ended).argmax() == segah  # it alone closes on segâh
    assert posterior(model, ended)[segah] > posterior(model, open_end)[segah]
    more = Heard(6900.0, InputKind.TYPED, 0.35, rests=False, closes=False)
    assert (closing(model, advance(model, ended, more)) == 0).all()
    assert (closing(model, start(model)) == 0).all()


def test_counts_of_a_mode_change_its_score_and_no_others() -> None:
    plain = MODELS["written"]
    rast = plain.modes.index(PACK.find("rast"))
    counts = Counts({"makam/rast": some_counts().by_mode["makam/rast"]})
    counted = build_model(PACK, SOME, counts=counts)
    notes = line(BY_THE_BOOK["rast"])
    difference = score(counted, notes).loglik - score(plain, notes).loglik
    assert abs(difference[rast]) > 1e-6
    assert np.delete(difference, rast) == pytest.approx(0)


def test_the_context_of_a_key_is_what_each_mode_means_by_it() -> None:
    model = MODELS["with counts"]
    table = model.tables(InputKind.KEYS).grams
    assert table is not None
    key_b = Heard(7100.0, InputKind.KEYS, 0.35, rests=False, closes=False)
    state = score(model, (key_b,))
    rast, mahur = (model.modes.index(PACK.find(slug)) for slug in ("rast", "mahur"))
    assert state.context[rast] == table.row(rast, (17,))  # segâh
    assert state.context[mahur] == table.row(mahur, (18,))  # bûselik


def test_a_clear_leaning_is_decided_and_an_open_one_names_its_candidates() -> None:
    model = MODELS["written"]
    clear = leading(model, score(model, line(BY_THE_BOOK["segah"])))
    assert (model.modes[model.mode_index[clear.best]].slug, clear.decided) == ("segah", True)
    assert clear.among == (model.mode_index[clear.best],)
    assert clear.p_best > clear.p_rival
    nothing = leading(model, start(model))
    assert not nothing.decided
    assert len(nothing.among) == model.parameters.among_most
    assert nothing.p_best == pytest.approx(1 / len(SOME))


def test_modes_of_one_family_are_named_by_it() -> None:
    pair = PACK.restrict(("ussak", "beyati"))
    assert pair[0].family == pair[1].family != ""
    model = build_model(PACK, pair)
    assert leading(model, start(model)).family == pair[0].family
    strangers = build_model(PACK, PACK.restrict(("rast", "hicaz")))
    assert leading(strangers, start(strangers)).family == ""


def test_a_mode_alone_has_no_rival() -> None:
    model = build_model(PACK, SOME[:1])
    alone = leading(model, start(model))
    assert (alone.best, alone.rival, alone.p_best, alone.decided) == (0, None, 1.0, True)


def test_with_any_pitch_the_rival_is_another_mode_and_not_another_final() -> None:
    model = MODELS["any"]
    lean = leading(model, score(model, line(BY_THE_BOOK["rast"])))
    assert lean.rival is not None
    assert model.mode_index[lean.best] != model.mode_index[lean.rival]
    assert lean.p_best >= posterior(model, score(model, line(BY_THE_BOOK["rast"])))[lean.best]


def test_evidence_that_rules_everything_out_is_an_error() -> None:
    model = MODELS["written"]
    ruled_out = replace(start(model), loglik=np.full(len(SOME), -np.inf))
    with pytest.raises(ImpossibleEvidenceError) as caught:
        posterior(model, ruled_out)
    assert str(caught.value) == "no mode is left: every hypothesis is ruled out by the notes so far"


@pytest.mark.parametrize("slug", BY_THE_BOOK)
def test_a_clean_phrase_by_the_book_is_named_among_all_makams(slug: str) -> None:
    model = build_model(PACK, PACK.modes)
    notes = line(BY_THE_BOOK[slug])
    assert 8 <= len(notes) <= 12
    assert leader(model, notes) == slug
    assert leader(model, on_keys(notes)) == slug


def test_the_same_notes_are_ussak_from_below_and_beyati_from_the_dominant() -> None:
    # common practice: uşşak rises from its final, beyâtî begins around nevâ
    model = build_model(PACK, PACK.restrict(("ussak", "beyati")))
    assert (
        leader(model, line("dügâh rast dügâh segâh:2 çargâh segâh dügâh nevâ çargâh segâh dügâh:4"))
        == "ussak"
    )
    assert leader(model, line("nevâ:2 çargâh nevâ acem hüseynî nevâ:2 çargâh:2 segâh dügâh")) == "beyati"


def test_the_nearest_rival_of_a_clean_ussak_or_beyati_line_is_the_other() -> None:
    # common practice: uşşak and beyâtî are the hardest pair
    model = build_model(
        PACK, PACK.restrict(("rast", "ussak", "beyati", "hicaz", "segah", "saba", "nihavend"))
    )
    for slug, other in (("ussak", "beyati"), ("beyati", "ussak")):
        rival = leading(model, score(model, line(BY_THE_BOOK[slug]))).rival
        assert rival is not None
        assert model.modes[model.mode_index[rival]].slug == other
