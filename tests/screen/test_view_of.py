"""From a session to what is shown: wording, order and rounding, and a memory that changes nothing."""

from __future__ import annotations

from dataclasses import replace
from functools import lru_cache

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from melodycoach.core.event import (
    Event,
    FreshStart,
    LineEdited,
    ModesRestricted,
    NoteOff,
    NoteOn,
    PitchMoved,
    PitchReading,
    ReadingChosen,
    Redone,
    TargetChosen,
    TimePassed,
    Undone,
)
from melodycoach.core.note import InputKind
from melodycoach.core.parameters import ScoringParameters
from melodycoach.core.scorer import announced, leading, log_odds, mode_posterior
from melodycoach.core.session import SessionState, apply, begin
from melodycoach.core.stretch import Stretch
from melodycoach.core.verdict import percent
from melodycoach.screen.line_of import NOTES_SHOWN
from melodycoach.screen.view import Status, ViewState
from melodycoach.screen.view_of import LEANINGS_SHOWN, REASONS_SHOWN, ViewMaker
from melodycoach.sources.note_text import read_tokens
from melodycoach.sources.pack_file import load_pack

MAKAM = load_pack("makam")
HICAZ_PHRASE = "D5 C#5 Bb4+1 A4 Bb4+1 C#5 D5 C#5 Bb4+1 A4:2 ."
HUSEYNI_PHRASE = "E5 D5 E5 F#5 G5 F#5 E5 D5 C5 B4-1 A4:2 ."


def session_of(
    text: str, *only: str, target: str | None = None, parameters: ScoringParameters | None = None
) -> SessionState:
    """Give a session into which a line was typed; modes by slug."""
    ids = tuple(mode.id for mode in MAKAM.restrict(only)) if only else ()
    session = begin(MAKAM, ids, target=target, parameters=parameters)
    return apply(session, LineEdited(0.0, 0, 0, read_tokens(text, MAKAM.names, 0.0, 60)))


def view_of(session: SessionState) -> ViewState:
    return ViewMaker().view_of(session, Status())


def typed(text: str, *only: str, target: str | None = None) -> ViewState:
    return view_of(session_of(text, *only, target=target))


# the verdict


def test_before_the_first_note_there_is_no_verdict() -> None:
    view = typed("")
    assert view.verdict == "nothing heard yet: play or type a note"
    assert (view.decided, view.why, view.line, view.n_notes) == (False, (), (), 0)


def test_a_clear_leaning_is_named_alone_with_its_probability() -> None:
    view = typed(HICAZ_PHRASE, "hicaz", "huseyni", "rast")
    assert view.decided
    assert view.verdict == "leaning to Hicaz, over 99 %"
    assert (view.in_view, view.is_target) == ("Hicaz", False)
    assert view.rival in {"Hüseynî", "Rast"}


def test_an_open_line_names_the_modes_that_it_is_open_between() -> None:
    view = typed("A4")
    named = [row.name for row in view.leanings[:4]]
    assert not view.decided
    assert view.verdict == f"undecided between {', '.join(named[:3])} and {named[3]}"


def test_modes_of_one_family_are_said_to_be() -> None:
    view = typed("E5~ D5~ C5~ B4~ A4~ .", "huseyni", "muhayyer")
    assert not view.decided
    assert view.verdict.endswith("and Muhayyer, both of the hüseynî family")


def test_where_one_mode_alone_may_be_named_it_is_the_nearest() -> None:
    parameters = ScoringParameters(among_most=1, decided_at=2.0, decided_half=2.0)
    session = session_of("D5 C5", "hicaz", "huseyni", parameters=parameters)
    view = view_of(session)
    assert view.verdict == f"undecided; {view.leanings[0].name} is nearest"


@pytest.mark.parametrize(
    ("probability", "said"),
    [
        (0.0, "0 %"),
        (0.004, "under 1 %"),
        (0.01, "1 %"),
        (0.125, "12 %"),
        (0.99, "99 %"),
        (0.9901, "over 99 %"),
        (1.0, "over 99 %"),
    ],
)
def test_no_probability_promises_certainty(probability: float, said: str) -> None:
    assert percent(probability) == said


# what it sounds like now


def turned() -> SessionState:
    """Give a line in Hüseynî, followed until the first note at which Hicaz is announced."""
    text = f"{HUSEYNI_PHRASE} {HUSEYNI_PHRASE} {HUSEYNI_PHRASE}"
    session = session_of(text, "huseyni", "hicaz")
    for word in [*HICAZ_PHRASE.replace(":2 .", "").split(), "D5", "C#5", "Bb4+1"]:
        n_items = len(session.line.items)
        session = apply(session, LineEdited(0.0, n_items, n_items, read_tokens(word, MAKAM.names, 0.0, 60)))
        state = session.line.states[-1]
        now = announced(session.model, state)
        if now is not None and session.model.modes[now].slug == "hicaz":
            return session
    raise AssertionError("the turn to Hicaz was never noticed")


def test_a_turn_is_said_with_its_note_while_the_whole_line_still_leans_elsewhere() -> None:
    session = turned()
    view = view_of(session)
    assert view.leanings[0].name == "Hüseynî"
    seam = session.line.states[-1].change.seam_at
    assert view.now == f"right now it sounds like Hicaz, since note {seam}"
    # the phrases in Hüseynî have 33 notes; the last of them are in Hicaz as well
    assert seam is not None
    assert 30 <= seam <= 34


def test_nothing_is_said_of_now_while_it_agrees_with_the_whole_line() -> None:
    session = session_of(HICAZ_PHRASE, "hicaz", "huseyni")
    assert announced(session.model, session.line.states[-1]) is not None
    assert view_of(session).now == ""


def test_before_a_change_is_noticed_nothing_is_said_of_now() -> None:
    # on plain keys the filter, which does not know what ends a phrase, hears Hüseynî; the cadence
    # on dügâh speaks for Uşşak
    session = session_of("E5~ D5~ C5~ B4~ A4~ .", "huseyni", "ussak")
    view = view_of(session)
    now = announced(session.model, session.line.states[-1])
    assert now is not None
    assert session.model.modes[now].name == "Hüseynî"
    assert view.leanings[0].name == "Uşşak"
    assert view.now == ""


@pytest.mark.parametrize(
    ("n_modes", "said"),
    [
        (1, "right now it sounds like {0}, since note 14"),
        (2, "right now it sounds like {0} or {1}, since note 14"),
        (3, "right now it sounds like one of the hicaz family, since note 14"),
    ],
)
def test_a_stretch_is_called_by_one_name_by_two_or_by_its_family(
    monkeypatch: pytest.MonkeyPatch, n_modes: int, said: str
) -> None:
    session = session_of("A4 B4-1 C5")
    places = tuple(i for i, mode in enumerate(session.model.modes) if mode.family == "hicaz family")[:n_modes]
    stretch = Stretch(14, places, "hicaz family")
    monkeypatch.setattr("melodycoach.screen.view_of.stretch_of", lambda model, state, leader: stretch)
    names = [session.model.modes[place].name for place in places]
    assert view_of(session).now == said.format(*names)


# the leanings


def test_leanings_are_sorted_and_are_the_likeliest() -> None:
    session = session_of(HICAZ_PHRASE)
    rows = view_of(session).leanings
    chances = [row.probability for row in rows]
    assert len(rows) == LEANINGS_SHOWN
    assert (
        chances == sorted(mode_posterior(session.model, session.line.states[-1]))[: -LEANINGS_SHOWN - 1 : -1]
    )
    assert not any(row.target for row in rows)


def test_a_target_far_behind_is_listed_last() -> None:
    rows = typed(HICAZ_PHRASE, target="acemasiran").leanings
    assert len(rows) == LEANINGS_SHOWN + 1
    assert [row.name for row in rows if row.target] == [rows[-1].name] == ["Acemaşîran"]


def test_a_target_among_the_likeliest_is_listed_once() -> None:
    rows = typed(HICAZ_PHRASE, target="hicaz").leanings
    assert len(rows) == LEANINGS_SHOWN
    assert [row.name for row in rows if row.target] == ["Hicaz"]


def test_each_change_is_since_the_note_before() -> None:
    earlier = {row.name: row.probability for row in typed("D5 C#5", "hicaz", "huseyni", "rast").leanings}
    rows = typed("D5 C#5 Bb4+1", "hicaz", "huseyni", "rast").leanings
    for row in rows:
        assert row.change == pytest.approx(row.probability - earlier[row.name])
    assert sum(row.change for row in rows) == pytest.approx(0.0)
    assert all(row.change == 0.0 for row in typed("", "hicaz", "rast").leanings)


def test_each_mode_is_listed_with_its_final() -> None:
    finals = {row.name: row.final for row in typed("A4", "hicaz", "rast").leanings}
    assert finals == {"Hicaz": "dügâh", "Rast": "rast"}  # common practice


# characteristic steps


def test_owed_steps_come_first_the_most_telling_one_on_top() -> None:
    rows = typed(HUSEYNI_PHRASE, "huseyni", "hicaz").owed
    owed = [row for row in rows if row.heard_at is None]
    assert rows[: len(owed)] == tuple(owed)
    assert owed
    # colour is welcome, not owed: it comes last, whatever it gains
    needs = [row.is_colour for row in owed]
    assert needs == sorted(needs)
    assert owed[0].gain_nats == max(row.gain_nats for row in owed if row.is_owed)


def test_heard_steps_follow_the_newest_first_with_the_note_that_completed_them() -> None:
    rows = typed(HICAZ_PHRASE, "huseyni", "hicaz").owed
    heard = [row for row in rows if row.heard_at is not None]
    numbers = [row.heard_at for row in heard]
    assert numbers == sorted(numbers, reverse=True)  # type: ignore[type-var]
    [second] = [row for row in heard if row.kind.startswith("augmented second")]
    # dik kürdî to nim hicaz are notes 5 and 6 of the phrase
    assert second.heard_at == 6
    assert second.perdes == ("dik kürdî", "nim hicaz")
    assert (second.written, second.keys) == (("Bb4+1", "C#5"), ("Bb4", "C#5"))


def test_a_target_that_does_not_compete_is_followed_without_figures() -> None:
    view = typed("E5 F#5 E5:2 ,", "rast", "ussak", target="huseyni")
    assert (view.in_view, view.rival, view.is_target) == ("Hüseynî", "", True)
    assert not any(row.target for row in view.leanings)
    assert {row.gain_nats for row in view.owed} == {0.0}
    assert len(view.owed) == len(MAKAM.find("huseyni").steps)
    assert any(row.heard_at == 3 for row in view.owed)  # eviç hüseynî: the half cadence
    assert view.why == ()


def test_a_target_that_leads_is_weighed_against_the_one_behind_and_else_against_the_leader() -> None:
    ahead = typed(HICAZ_PHRASE, "hicaz", "huseyni", "rast", target="hicaz")
    assert ahead.in_view == "Hicaz" != ahead.rival == ahead.leanings[1].name
    behind = typed(HICAZ_PHRASE, "hicaz", "huseyni", "rast", target="rast")
    assert (behind.in_view, behind.rival) == ("Rast", "Hicaz")


# the line


def test_a_note_off_the_mode_is_marked_with_the_perde_that_mends_it() -> None:
    view = typed("E5 D5 C#5 D5", "huseyni", "rast", target="huseyni")
    assert [note.number for note in view.line if note.off_mode] == [3]
    off = view.line[2]
    assert (off.name, off.mend, off.mend_height) == ("nim hicaz", "çargâh", 13.0)
    assert {note.mend_height for note in view.line if not note.off_mode} == {None}
    # C#5 is 17 commas above A4, çargâh 13: Arel-Ezgi-Uzdilek, nine commas to a whole tone
    assert off.off_mode == "not in Hüseynî, 4 commas above çargâh"


def test_each_note_has_its_place_its_height_and_the_mark_after_it() -> None:
    line = typed("A4:2 | , B4-1 - C5 .", "huseyni", "rast").line
    assert [(note.number, note.item, note.mark) for note in line] == [(1, 0, ","), (2, 3, ""), (3, 5, ".")]
    assert [note.height for note in line] == [0.0, 8.0, 13.0]
    assert [(note.name, note.written) for note in line] == [
        ("dügâh", "A4"),
        ("segâh", "B4-1"),
        ("çargâh", "C5"),
    ]
    assert [note.rests for note in line] == [True, True, True]


def test_of_a_long_line_the_newest_notes_are_given_with_their_own_numbers() -> None:
    view = typed("A4 " * (NOTES_SHOWN + 5), "huseyni", "rast")
    assert (view.n_notes, len(view.line)) == (NOTES_SHOWN + 5, NOTES_SHOWN)
    assert (view.line[0].number, view.line[-1].number) == (6, NOTES_SHOWN + 5)
    assert view.line[0].item == 5


# the ladder


def test_rungs_rise_and_carry_the_words_of_the_trade() -> None:
    ladder = typed("", "huseyni", "hicaz", target="huseyni").ladder
    heights = [rung.height for rung in ladder]
    assert heights == sorted(heights)
    by_height = {rung.height: (rung.name, rung.function, rung.role) for rung in ladder}
    # common practice: karar dügâh, güçlü hüseynî, yeden rast
    assert by_height[0] == ("dügâh", "karar", "final")
    assert by_height[31] == ("hüseynî", "güçlü", "dominant")
    assert by_height[-9] == ("rast", "yeden", "degree")
    assert by_height[39][1:] == ("", "degree")


def test_octaves_of_final_and_dominant_get_no_guide_line() -> None:
    ladder = typed("", "huseyni", target="huseyni").ladder
    assert [rung.height for rung in ladder if rung.role == "final"] == [0]
    assert [rung.height for rung in ladder if rung.role == "dominant"] == [31]
    assert [rung.function for rung in ladder if rung.height == 53] == [""]


def test_a_degree_that_is_an_asma_karar_itself_is_not_called_by_what_its_octave_is() -> None:
    # the pack: in Rast yegâh is a place of asma karar, nevâ the dominant; in Sûzinâk gerdâniye is one
    rast = {rung.name: rung.function for rung in typed("", "rast", target="rast").ladder}
    assert (rast["yegâh"], rast["nevâ"], rast["rast"]) == ("asma karar", "güçlü", "karar")
    suzinak = {rung.name: rung.function for rung in typed("", "suzinak", target="suzinak").ladder}
    assert (suzinak["gerdâniye"], suzinak["rast"]) == ("asma karar", "karar")


def test_passing_colours_are_no_rungs() -> None:
    mode = next(mode for mode in MAKAM.modes if mode.passing)
    shown = {rung.height - mode.final_units for rung in typed("", target=mode.slug).ladder}
    assert shown == set(mode.degrees) - set(mode.passing)


# why


def test_reasons_add_up_to_the_evidence_where_none_is_left_out() -> None:
    session = session_of("D5 C#5 Bb4+1", "hicaz", "huseyni")
    view = view_of(session)
    lean = leading(session.model, session.line.states[-1])
    assert lean.rival is not None
    whole = log_odds(session.model, session.line.states[-1], lean.best, lean.rival)
    assert 0 < len(view.why) < REASONS_SHOWN
    assert sum(row.nats for row in view.why) == pytest.approx(whole)


def test_no_more_reasons_are_given_than_one_can_read() -> None:
    assert len(typed(f"{HUSEYNI_PHRASE} {HICAZ_PHRASE}", "hicaz", "huseyni").why) == REASONS_SHOWN


def test_without_a_rival_there_are_no_reasons() -> None:
    view = typed(HICAZ_PHRASE, "hicaz")
    assert (view.rival, view.why) == ("", ())


# settings


def test_what_keys_hide_is_said_only_when_they_were_played() -> None:
    on_keys = typed("E5~ D5~ C5~ B4~ A4~ .", "huseyni", "muhayyer")
    assert on_keys.keyboard_note.startswith("Hüseynî and Muhayyer use the same keys")
    assert typed("E5 D5 C5 B4-1 A4 .", "huseyni", "muhayyer").keyboard_note == ""


def test_keys_played_long_ago_are_no_longer_spoken_of() -> None:
    assert typed("E5~ " + "E5 " * 20, "huseyni", "muhayyer").keyboard_note == ""


def test_keys_with_no_rival_hide_nothing() -> None:
    assert typed("E5~ D5~", "huseyni").keyboard_note == ""


def test_the_reading_of_the_final_is_said() -> None:
    session = session_of("A4", "huseyni", "rast")
    assert view_of(session).reading == "written pitch: each mode on its own final"
    given_final = apply(session, ReadingChosen(0.0, PitchReading.FINAL, 7100.0 - 1200 / 53))
    assert view_of(given_final).reading == "final given: segâh"
    assert view_of(apply(session, ReadingChosen(0.0, PitchReading.ANY))).reading == (
        "any pitch: each mode on every final"
    )


def test_the_modes_that_compete_are_said() -> None:
    assert typed("").restricted == f"all {len(MAKAM.modes)} modes of {MAKAM.name}"
    assert typed("", "hicaz", "rast").restricted == "only Rast, Hicaz"


def test_undo_and_redo_are_offered_when_there_is_something_to_go_to() -> None:
    session = session_of("A4", "rast", "hicaz")
    assert (view_of(session).can_undo, view_of(session).can_redo) == (True, False)
    back = apply(session, Undone(0.0))
    assert (view_of(back).can_undo, view_of(back).can_redo) == (False, True)


def test_tokens_status_and_the_pack_s_own_words_go_through() -> None:
    status = Status("input", "tuning", "log", "warning")
    view = ViewMaker().view_of(session_of("A4", "rast"), status, ("A4",))
    assert (view.status, view.tokens) == (status, ("A4",))
    assert (view.theory, view.caution) == (MAKAM.theory, MAKAM.caution)


# a maker's memory

WORDS = ("A4", "B4-1", "C5", "D5", "E5", "F#5", "C#5", "Bb4+1", "G4~", "B4~", "A4:2", ",", ".", "|", "-")
SMALL = tuple(mode.id for mode in MAKAM.restrict(("huseyni", "hicaz", "rast")))
SMALLER = SMALL[1:]


@lru_cache
def items_of(words: tuple[str, ...]) -> tuple[object, ...]:
    return read_tokens(" ".join(words), MAKAM.names, 0.0, 60)


edits = st.builds(
    lambda start, size, words: LineEdited(0.0, start, start + size, items_of(tuple(words))),  # type: ignore[arg-type]
    st.integers(0, 12),
    st.integers(0, 3),
    st.lists(st.sampled_from(WORDS), max_size=5),
)
keys = st.sampled_from((69, 71, 72, 74, 76))
events = st.one_of(
    edits,
    edits,
    keys.map(lambda key: NoteOn(0.0, key, 100.0 * key, InputKind.KEYS)),
    keys.map(lambda key: NoteOff(0.0, key)),
    keys.map(lambda key: PitchMoved(0.0, key, 100.0 * key + 30, InputKind.TUNED)),
    st.sampled_from(
        (
            Undone(0.0),
            Redone(0.0),
            FreshStart(0.0),
            TimePassed(0.0),
            TargetChosen(0.0, SMALL[0]),
            TargetChosen(0.0, SMALL[1]),
            TargetChosen(0.0, "makam/saba"),
            TargetChosen(0.0, None),
            ReadingChosen(0.0, PitchReading.ANY),
            ReadingChosen(0.0, PitchReading.WRITTEN),
            ReadingChosen(0.0, PitchReading.FINAL, 6900.0),
            ModesRestricted(0.0, SMALL),
            ModesRestricted(0.0, SMALLER),
        )
    ),
)


@settings(max_examples=40)
@given(st.lists(st.tuples(events, st.sampled_from((0.1, 0.4, 1.2, 3.0)), st.booleans()), max_size=12))
def test_a_maker_that_has_seen_the_way_here_gives_the_view_of_a_fresh_one(
    steps: list[tuple[Event, float, bool]],
) -> None:
    maker = ViewMaker()
    session = begin(MAKAM, SMALL)
    now_s = 0.0
    for event, wait_s, looks in steps:
        now_s += wait_s
        session = apply(session, replace(event, at_s=now_s))
        if looks:
            assert maker.view_of(session, Status()) == view_of(session)
    assert maker.view_of(session, Status()) == view_of(session)


@pytest.mark.parametrize("reading", [PitchReading.WRITTEN, PitchReading.ANY])
def test_a_line_typed_and_taken_back_note_by_note_is_seen_as_a_fresh_one_is(reading: PitchReading) -> None:
    maker = ViewMaker()
    session = apply(begin(MAKAM, SMALL), ReadingChosen(0.0, reading))
    for place, word in enumerate(HICAZ_PHRASE.split()):
        session = apply(session, LineEdited(0.0, place, place, items_of((word,))))  # type: ignore[arg-type]
        assert maker.view_of(session, Status()) == view_of(session)
    for event in (*[Undone(0.0)] * 4, Redone(0.0), TargetChosen(0.0, SMALL[2]), Undone(0.0)):
        session = apply(session, event)
        assert maker.view_of(session, Status()) == view_of(session)


# where steps are written and heard


def names_in(text: str) -> set[str]:
    """Give the names of pitches in a label, such as nevâ in ``half cadence on nevâ (güçlü)``."""
    found = {named.name for named in MAKAM.names.named if f" {named.name} " in f" {text} "}
    return {name for name in found if not any(other.endswith(f" {name}") for other in found)}


@pytest.mark.parametrize(
    "line", ["A4 B4-1 C5 D5:2 ,", "G4 F#4-1 E4:2 ,", "A5 B5-1 C6 D6:2 ,", "A3 B3-1 C4 D4:2 ,"]
)
@pytest.mark.parametrize("target", ["huseyni", "ussak", "muhayyer", "rast", "segah"])
def test_what_a_step_is_called_and_its_notes_are_always_the_same_pitches(line: str, target: str) -> None:
    for row in typed(line, target=target).owed:
        if "cadence" in row.kind or row.kind.startswith("leading tone"):
            assert names_in(row.kind)
            assert names_in(row.kind) <= set(row.perdes)


def test_a_rest_on_the_octave_of_the_final_is_no_final_cadence() -> None:
    rows = typed("A5 B5-1 C6 D6:2 , D6 C6 B5-1 A5:3 .", target="muhayyer").owed
    [cadence] = [row for row in rows if row.kind.startswith("final cadence")]
    assert (cadence.kind, cadence.heard_at) == ("final cadence on dügâh (karar)", None)


def test_a_whole_line_an_octave_lower_has_its_final_cadence_there() -> None:
    view = typed("E4 F#4-1 G4 F#4-1 E4:2 , D4 C4 B3-1 A3:3 .", target="huseyni")
    [cadence] = [row for row in view.owed if row.kind.startswith("final cadence")]
    assert (cadence.kind, cadence.heard_at) == ("final cadence on kaba dügâh (karar)", 9)
    assert [rung.name for rung in view.ladder if rung.role == "final"] == ["kaba dügâh"]


def test_a_step_heard_in_another_octave_is_named_where_it_was_heard() -> None:
    rows = typed("E5 D5 C5 B4-1 A4:2 , G4 F#4 E4:2 ,", "huseyni", "ussak", target="huseyni").owed
    heard = {row.kind: row.perdes for row in rows if row.heard_at == 8}
    # eviç hüseynî, an octave lower: common practice
    assert heard == {"half cadence on hüseynîaşîran (güçlü)": ("ırak", "hüseynîaşîran")}


def test_with_any_pitch_an_aimed_mode_stands_where_the_line_rests() -> None:
    session = session_of("A4 G4 F#4-1 G4 A4:2 , B4-1 A4:3 .", "huseyni", "ussak", target="huseyni")
    view = view_of(apply(session, ReadingChosen(0.0, PitchReading.ANY)))
    assert [rung.name for rung in view.ladder if rung.role == "final"] == ["dügâh"]


# notes off the mode after a change


def changed_to_hicaz() -> SessionState:
    """Give a line in Hüseynî and then for long in Hicaz, with a slip of three commas in each part."""
    text = f"{HUSEYNI_PHRASE} E5 D5+3 {HUSEYNI_PHRASE} {HUSEYNI_PHRASE}"
    return session_of(
        f"{text} {HICAZ_PHRASE} D5 E5 D5+3 D5 {HICAZ_PHRASE} {HICAZ_PHRASE}", "huseyni", "hicaz"
    )


def off_notes(view: ViewState) -> dict[int, str]:
    return {note.number: note.off_mode.split(",")[0] for note in view.line if note.off_mode}


def test_notes_are_judged_by_the_mode_that_their_own_stretch_was_in() -> None:
    n_before = len(session_of(f"{HUSEYNI_PHRASE} E5 D5 {HUSEYNI_PHRASE} {HUSEYNI_PHRASE}").line.heard)
    session = changed_to_hicaz()
    assert session.line.states[-1].change.changed_at is not None
    slips = {13: "not in Hüseynî", n_before + 13: "not in Hicaz"}
    # the slips alone, but for notes of either stretch near the seam, which may be found a little late
    found = off_notes(view_of(session))
    assert slips.items() <= found.items()
    assert set(found) - set(slips) <= set(range(n_before - 1, n_before + 4))


def test_a_target_judges_every_note() -> None:
    view = view_of(apply(changed_to_hicaz(), TargetChosen(0.0, "makam/hicaz")))
    assert set(off_notes(view).values()) == {"not in Hicaz"}
    assert min(off_notes(view)) < 13
