"""Evidence in a musician's words."""

import pytest

from melodycoach.core.event import PitchReading
from melodycoach.core.evidence import DegreeKey, Evidence, Factor, RegisterKey, balance
from melodycoach.core.model import build_model
from melodycoach.core.note import Heard, InputKind
from melodycoach.core.octave import NOWHERE, lie_of, placed_final
from melodycoach.core.scorer import ScorerState, advance, start
from melodycoach.core.why import LEAST_NATS, Reason, _Words, opening_place, reasons, reasons_of_balance
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
MODEL = build_model(PACK, PACK.modes)
INDEX = {mode.slug: at for at, mode in enumerate(MODEL.modes)}


def sung(text: str) -> list[Heard]:
    """Perde names; ``!`` behind a note: the line rests on it; ``.``: a phrase ends there too."""
    notes = []
    for word in text.split():
        pitch = PACK.names.find(word.rstrip("!."))
        assert pitch is not None, word
        cents = PACK.system.units_to_cents(pitch.units)
        notes.append(
            Heard(
                cents, InputKind.TYPED, 0.7 if word[-1] in "!." else 0.35, word[-1] in "!.", word[-1] == "."
            )
        )
    return notes


def scored(heard: list[Heard]) -> list[ScorerState]:
    states = [start(MODEL)]
    for note in heard:
        states.append(advance(MODEL, states[-1], note))
    return states


def told(text: str, a: str, b: str, count: int = 8) -> tuple[Reason, ...]:
    heard = sung(text)
    return reasons(MODEL, scored(heard), heard, INDEX[a], INDEX[b], count)


LINE = "nevâ hüseynî! eviç gerdâniye eviç hüseynî! acem hüseynî nevâ hüseynî! çargâh segâh dügâh."


def test_a_rest_on_the_dominant_of_one_mode_is_told_with_what_it_is_in_the_other() -> None:
    # hüseynî is the güçlü of Hüseynî, nevâ that of Uşşak: common practice
    texts = {one.text: one for one in told(LINE, "huseyni", "ussak")}
    rest = texts["you rested 2× on hüseynî: the güçlü of Hüseynî, a plain degree of Uşşak"]
    assert rest.nats > 0
    assert rest.numbers == (6, 10)


def test_an_opening_is_told_with_where_the_other_mode_opens() -> None:
    # Muhayyer opens an octave above its final: common practice
    first = [
        one.text for one in told("nevâ nevâ çargâh nevâ! " + LINE, "huseyni", "muhayyer") if 1 in one.numbers
    ]
    assert first == [
        "you opened on nevâ, where Hüseynî opens; Muhayyer opens round muhayyer, an octave above its final"
    ]


def test_reasons_for_come_first_and_both_sides_fall_in_size() -> None:
    nats = [one.nats for one in told(LINE, "huseyni", "muhayyer")]
    split = sum(n > 0 for n in nats)
    assert 0 < split < len(nats)
    assert nats[:split] == sorted(nats[:split], reverse=True)
    assert nats[split:] == sorted(nats[split:])
    assert min(abs(n) for n in nats) >= LEAST_NATS


def test_reasons_against_keep_a_quarter_of_the_places() -> None:
    nats = [one.nats for one in told(LINE, "huseyni", "muhayyer", count=4)]
    assert [n > 0 for n in nats] == [True, True, True, False]


def test_reasons_of_one_side_are_those_of_the_other_turned_round() -> None:
    heard = sung(LINE)
    states = scored(heard)
    there = reasons(MODEL, states, heard, INDEX["huseyni"], INDEX["ussak"], 30)
    back = reasons(MODEL, states, heard, INDEX["ussak"], INDEX["huseyni"], 30)
    assert {one.text for one in there} == {one.text for one in back}
    assert sorted(round(one.nats, 9) for one in there) == sorted(round(-one.nats, 9) for one in back)


def test_a_tally_gives_the_same_reasons() -> None:
    heard = sung(LINE)
    states = scored(heard)
    weighed = balance(MODEL, states, heard, INDEX["huseyni"], INDEX["ussak"])
    assert reasons_of_balance(weighed, heard) == told(LINE, "huseyni", "ussak")


def test_before_the_first_note_there_is_no_reason() -> None:
    assert reasons(MODEL, [start(MODEL)], [], 0, 1) == ()


def say(one: Evidence, a: str, b: str) -> str:
    finals = placed_final(MODEL, INDEX[a], NOWHERE), placed_final(MODEL, INDEX[b], NOWHERE)
    return _Words(MODEL, INDEX[a], INDEX[b], finals).say(one)


def degree(
    in_a: int | None, in_b: int | None, units: int, nats: float, rests: bool = False, n_notes: int = 1
) -> Evidence:
    key = DegreeKey(in_a, in_b, units, rests)
    return Evidence(Factor.DEGREE, nats, n_notes, (1,), degree=key)


# functions of the degrees: common practice, as the pack has them
@pytest.mark.parametrize(
    ("one", "a", "b", "text"),
    [
        (
            degree(0, 0, 0, -1, rests=True),
            "huseyni",
            "ussak",
            "you rested on dügâh: the karar of both, but Uşşak leans on it more",
        ),
        (
            degree(35, 35, 35, -1),
            "huseyni",
            "ussak",
            "you passed through acem: a plain degree of Uşşak, in Hüseynî only going down",
        ),
        (
            degree(39, 39, 39, 1, n_notes=3),
            "huseyni",
            "ussak",
            "you passed 3× through eviç: a degree of Hüseynî where it opens, a passing colour in Uşşak",
        ),
        (
            degree(17, None, 17, 1),
            "hicaz",
            "ussak",
            "you passed through nim hicaz: a degree of Hicaz where it opens, not in Uşşak",
        ),
        (degree(None, None, 3, 1), "hicaz", "rast", "in neither mode, but Hicaz leans on it more"),
        (
            degree(31, 31, 31, -1),
            "huseyni",
            "ussak",
            "a plain degree of Uşşak, the güçlü of Hüseynî, yet Uşşak leans on it more",
        ),
        (
            degree(31, 31, 31, 1),
            "huseyni",
            "muhayyer",
            "you passed through hüseynî: the güçlü of Hüseynî, the second güçlü of Muhayyer",
        ),
        (
            degree(53, 53, 53, 1),
            "muhayyer",
            "ussak",
            "the güçlü of Muhayyer, the octave of the karar of Uşşak",
        ),
        (
            degree(13, 22, 13, 1),
            "huseyni",
            "rast",
            "a place of asma karar in Hüseynî, a degree of Rast where it opens",
        ),
        (degree(0, -9, -9, 1, rests=True), "rast", "ussak", "the karar of Rast, the yeden of Uşşak"),
    ],
)
def test_a_degree_is_told_by_what_it_does_in_both_modes(one: Evidence, a: str, b: str, text: str) -> None:
    assert say(one, a, b).endswith(text)


YET_TEXT = (
    "3 notes lie where Muhayyer lives; Hüseynî lives round hüseynî, yet at a height that suits Hüseynî more"
)


def register(in_a: bool, in_b: bool, nats: float, n_notes: int = 3) -> Evidence:
    return Evidence(Factor.REGISTER, nats, n_notes, (1,), register=RegisterKey(in_a, in_b))


@pytest.mark.parametrize(
    ("one", "text"),
    [
        (
            register(True, False, 1),
            "3 notes lie where Hüseynî lives; Muhayyer lives round muhayyer, an octave above its final",
        ),
        (register(False, True, -1, 1), "1 note lies where Muhayyer lives; Hüseynî lives round hüseynî"),
        (
            register(False, True, 1),
            YET_TEXT,
        ),
        (register(True, True, 1), "3 notes lie where both live, at a height that suits Hüseynî more"),
        (
            register(False, False, -1),
            "3 notes lie outside the regions of both, at a height that suits Muhayyer more",
        ),
    ],
)
def test_the_register_is_told_by_where_the_modes_live(one: Evidence, text: str) -> None:
    assert say(one, "huseyni", "muhayyer") == text


def test_the_end_of_a_phrase_is_told_by_its_last_note_or_by_the_way_to_it() -> None:
    on_rast = Evidence(Factor.CLOSING, 2.0, 1, (9,), degree=DegreeKey(0, -9, -9, True))
    assert say(on_rast, "rast", "ussak") == "the phrase ended on rast: the karar of Rast, the yeden of Uşşak"
    on_dugah = Evidence(Factor.CLOSING, -2.0, 1, (9,), degree=DegreeKey(0, 0, 0, True))
    assert say(on_dugah, "huseyni", "ussak") == (
        "the phrase ended on dügâh, the karar of both; the way it got there suits Uşşak more"
    )


def test_a_prior_is_told() -> None:
    assert say(Evidence(Factor.PRIOR, -1.0, 0, ()), "rast", "ussak") == (
        "Uşşak is met more often in the repertoire"
    )


def test_where_a_mode_opens() -> None:
    ussak, muhayyer = PACK.find("ussak"), PACK.find("muhayyer")
    assert opening_place(muhayyer, 0, MODEL) == "round muhayyer, an octave above its final"
    assert opening_place(ussak, 0, MODEL) == "between rast and nevâ"


def test_any_pitch_is_told_in_the_octave_of_the_line() -> None:
    model = build_model(PACK, PACK.restrict(("rast", "ussak")), PitchReading.ANY)
    heard = sung("rast dügâh segâh! çargâh segâh dügâh rast!")
    states = [start(model)]
    for note in heard:
        states.append(advance(model, states[-1], note))
    # hypotheses: two modes on each of 53 finals; G4 is 9 under A4, so 44 over the A4 below
    rast, ussak = (
        next(h for h in range(106) if model.final_units[h] == f and h % 2 == m) for m, f in ((0, 44), (1, 0))
    )
    assert placed_final(model, rast, lie_of(heard)) == -9
    texts = [one.text for one in reasons(model, states, heard, rast, ussak)]
    assert "you rested on rast: the karar of Rast, the yeden of Uşşak" in texts
    assert not any("opened" in text for text in texts)
