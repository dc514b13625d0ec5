"""A written line, checked: mode, changes, wrong notes, steps, and whether it stays in its mode.

The lines are ours; that they are in the makams named is common practice (scale, güçlü, karar, seyir).
"""

from itertools import pairwise, product

import pytest
from book_lines import BY_THE_BOOK
from sheets import sheet_of

from melodycoach.core.check import Checked, check_sheet, leaving
from melodycoach.core.event import PitchReading
from melodycoach.core.mode import Need, StepKind
from melodycoach.core.model import build_model
from melodycoach.core.note import InputKind
from melodycoach.core.ranking import CORE_NATS, step_note
from melodycoach.core.scorer import advance_unwatched, leading, log_odds
from melodycoach.core.session import empty_line, rewrite
from melodycoach.core.span import before_closing
from melodycoach.errors import UnknownModeError
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
MODEL = build_model(PACK, PACK.modes)

HUSEYNI = (
    "E5 D5 E5 F#5 G5 F#5 E5:2 , E5 F#5 G5 A5 G5 F#5 E5:3 . "
    "G5 F5 E5 D5 C5 B4-1 C5 D5 E5:2 , D5 C5 B4-1 A4:2 G4 A4:4 ."
)
HICAZ = (
    "D5 E5 D5 C#5 Bb4+1 A4:2 , Bb4+1 C#5 D5:2 C#5 Bb4+1 A4 G4 A4:2 . "
    "D5 E5 F5 E5 D5:2 , E5 D5 C#5 D5 C#5 Bb4+1 A4:4 ."
)


def checked(text: str, target: str = "") -> Checked:
    return check_sheet(MODEL, sheet_of(text, PACK.names), PACK.find(target) if target else None)


def wrong(found: Checked) -> list[int]:
    return [number for number, one in enumerate(found.off, 1) if one is not None]


def test_a_file_is_scored_as_the_same_line_is_in_a_session() -> None:
    found = checked(HUSEYNI)
    line = rewrite(MODEL, empty_line(MODEL), sheet_of(HUSEYNI, PACK.names).items)
    assert found.whole == leading(MODEL, line.states[-1])
    assert [state.n_notes for state in found.line.states] == list(range(found.n_notes + 1))


def test_a_line_that_stays_is_one_stretch_with_no_wrong_note() -> None:
    found = checked(HUSEYNI)
    assert [(one.mode.slug, one.span.first, one.span.last) for one in found.stretches] == [("huseyni", 1, 29)]
    assert found.whole.decided
    assert wrong(found) == []
    assert found.stretches[0].noticed_at is None


def test_three_wrong_notes_are_exactly_the_ones_reported_with_what_mends_them() -> None:
    words = HUSEYNI.split()
    slips = {3: "F5+2", 9: "G#5", 19: "B4-3"}  # place among the words: a note off its perde
    assert [words[at] for at in slips] == ["F#5", "F#5", "D5"]
    found = checked(" ".join(slips.get(at, word) for at, word in enumerate(words)), "huseyni")
    assert wrong(found) == [sum(word not in ",." for word in words[: at + 1]) for at in slips]
    mends = [PACK.names.name(one[1].mend_cents) for one in found.off if one is not None]
    assert mends == ["eviç", "gerdâniye", "segâh"]


@pytest.mark.parametrize(("before", "after"), [(HUSEYNI, HICAZ), (HICAZ, HUSEYNI)])
def test_two_modes_in_one_line_are_told_apart_where_they_meet(before: str, after: str) -> None:
    seam = checked(before).n_notes + 1
    found = checked(f"{before} {after}")
    firsts = [one.span.first for one in found.stretches[1:]]
    assert len(firsts) == 1
    assert abs(firsts[0] - seam) <= 12
    assert found.stretches[1].noticed_at is not None
    assert found.stretches[1].noticed_at >= firsts[0]
    assert wrong(found) == []  # what was right in its own mode is right


@pytest.mark.slow
def test_every_pair_of_lines_by_the_book_is_parted_within_twelve_notes() -> None:
    pairs = [(a, b) for a, b in product(BY_THE_BOOK, BY_THE_BOOK) if a != b]
    missed = []
    for a, b in pairs:
        text = f"{BY_THE_BOOK[a]} {BY_THE_BOOK[a]} {BY_THE_BOOK[b]} {BY_THE_BOOK[b]}"
        seam = checked(f"{BY_THE_BOOK[a]} {BY_THE_BOOK[a]}").n_notes + 1
        firsts = [one.span.first for one in checked(text).stretches[1:]]
        if not any(abs(first - seam) <= 12 for first in firsts):
            missed.append((a, b, seam, firsts))
    assert missed == []


def test_stretches_cover_the_line_and_neighbours_differ() -> None:
    found = checked(f"{HUSEYNI} {HICAZ} {HUSEYNI}")
    spans = [(one.span.first, one.span.last) for one in found.stretches]
    assert spans[0][0] == 1
    assert spans[-1][1] == found.n_notes
    assert all(one[1] + 1 == other[0] for one, other in pairwise(spans))
    assert all(
        (one.mode, one.final_units) != (other.mode, other.final_units)
        for one, other in pairwise(found.stretches)
    )
    assert all(
        found.stretch_at(n).span.first <= n <= found.stretch_at(n).span.last
        for n in range(1, found.n_notes + 1)
    )


def test_a_stretch_is_named_after_what_its_own_notes_say() -> None:
    """The live answer announces Dügâh here; with the whole stretch in hand it is clearly Sabâ."""
    found = checked(
        f"{BY_THE_BOOK['hicaz']} {BY_THE_BOOK['hicaz']} {BY_THE_BOOK['saba']} {BY_THE_BOOK['saba']}"
    )
    assert [one.mode.slug for one in found.stretches] == ["hicaz", "saba"]
    assert all(MODEL.mode_of(one.span.leaning.best) is one.mode for one in found.stretches)


def test_steps_of_a_stretch_are_counted_from_its_own_first_note() -> None:
    found = checked(f"{HUSEYNI} {HICAZ}")
    later = found.stretches[1].steps
    assert (later.track.mode.slug, later.first) == ("hicaz", found.stretches[1].span.first)
    assert later.track.n_notes == found.n_notes - later.first + 1
    alone = checked(HICAZ, "hicaz").steps.track
    assert later.first == checked(HUSEYNI).n_notes + 1
    assert later.track.heard == alone.heard


def test_owed_steps_stand_in_the_order_of_what_they_would_do_with_colour_last() -> None:
    """What a gain is worth is tried out in test_ranking; here all steps of the line are there, in order."""
    found = checked(HUSEYNI[: HUSEYNI.index(" G5 F5 E5 D5")], "huseyni")
    steps = found.steps
    assert sorted(one.step.id for one in steps.owed) == sorted(step.id for step in steps.track.owed)
    assert len(steps.owed) >= 4
    colours = [one.step.need is Need.COLOUR for one in steps.owed]
    assert colours == sorted(colours)
    assert any(colours)
    for colour in (False, True):  # once a phrase has ended, an opening comes too late
        worths = [
            one.gain_nats + (CORE_NATS if one.step.need is Need.CORE else 0.0)
            for one in steps.owed
            if (one.step.need is Need.COLOUR) is colour and one.step.kind is not StepKind.OPENING
        ]
        assert worths == sorted(worths, reverse=True)
    assert len({round(one.gain_nats, 6) for one in steps.owed}) > 2


def test_the_first_owed_step_gains_as_much_when_it_is_really_played() -> None:
    found = checked(HUSEYNI[: HUSEYNI.index(" G5 F5 E5 D5")], "huseyni")
    best, view, state = found.steps.owed[0], found.view, found.line.states[-1]
    assert view.hypothesis is not None
    assert view.rival is not None
    pair = view.hypothesis, view.rival
    before = log_odds(MODEL, before_closing(state), *pair)
    for number, cents in enumerate(best.pitches_cents, 1):
        state = advance_unwatched(
            MODEL, state, step_note(cents, InputKind.TYPED, is_last=number == len(best.pitches_cents))
        )
    assert log_odds(MODEL, before_closing(state), *pair) - before == pytest.approx(best.gain_nats, abs=1e-6)


def test_each_stretch_is_held_against_the_course_of_its_own_mode_from_its_own_first_note() -> None:
    found = checked(f"{HUSEYNI} {HICAZ}")
    ends = [[end.number for end in one.course.phrase_ends] for one in found.stretches]
    first, last = len(ends[0]), found.n_notes
    assert [number for part in ends for number in part] == [one.last for one in found.phrases]
    assert ends[1][0] > found.stretches[1].span.first
    assert (first, ends[1][-1]) == (2, last)
    assert [one.course.cadence.agrees for one in found.stretches] == [True, True]
    assert [one.course.opening.agrees for one in found.stretches] == [True, True]
    assert "nevâ" in found.stretches[1].course.opening.says  # hicaz opens around its güçlü: common practice


def test_the_stretch_of_a_note_is_found_from_either_end() -> None:
    found = checked(f"{HUSEYNI} {HICAZ} {HUSEYNI}")
    assert len(found.stretches) > 1
    assert [found.stretch_at(n) for n in range(1, found.n_notes + 1)] == [
        one for one in found.stretches for _ in range(one.span.n_notes)
    ]


def test_with_a_target_every_note_is_judged_by_it() -> None:
    found = checked(f"{HUSEYNI} {HICAZ}", "huseyni")
    names = {
        PACK.names.name(note.pitch_cents) for n, note in enumerate(found.line.heard, 1) if n in wrong(found)
    }
    assert names == {"dik kürdî", "nim hicaz"}  # the two perdes of hicaz that hüseynî has not
    assert found.view.mode is PACK.find("huseyni")


@pytest.mark.parametrize("slug", ["huseyni", "hicaz", "rast", "saba", "nihavend"])
def test_a_line_by_the_book_stays_in_its_mode(slug: str) -> None:
    found = checked(f"{BY_THE_BOOK[slug]} {BY_THE_BOOK[slug]}", slug)
    assert leaving(found, PACK.find(slug)) is None


def test_a_line_leaves_its_mode_at_its_first_wrong_note() -> None:
    found = checked(HUSEYNI.replace("C5 B4-1 C5", "C5 Bb4+1 C5"), "huseyni")
    first = leaving(found, PACK.find("huseyni"))
    assert first is not None
    assert first.off is not None
    assert (first.number, PACK.names.name(first.off.pitch_cents)) == (20, "dik kürdî")


def test_a_line_with_every_note_in_its_mode_leaves_it_when_it_is_clearly_heard_in_another() -> None:
    """Rast and Segâh share their notes; a line that opens, rests and closes on segâh is no Rast."""
    line = f"{BY_THE_BOOK['segah']} {BY_THE_BOOK['segah']}"
    found = checked(line.replace("kürdî", "dügâh"), "rast")
    first = leaving(found, PACK.find("rast"))
    assert wrong(found) == []
    assert first is not None
    assert first.to is not None
    assert first.off is None
    assert first.to.id != "makam/rast"


def test_a_turn_that_wrong_notes_explain_is_told_by_the_first_of_them() -> None:
    """Hicaz begins three notes before the first perde that Hüseynî has not."""
    found = checked(f"{HUSEYNI} {HICAZ}", "huseyni")
    first = leaving(found, PACK.find("huseyni"))
    assert first is not None
    assert first.off is not None
    assert first.number == wrong(found)[0] > found.stretches[1].span.first


def test_a_turn_without_a_wrong_note_is_placed_at_its_seam() -> None:
    rast, segah = BY_THE_BOOK["rast"], BY_THE_BOOK["segah"].replace("kürdî", "dügâh")
    found = checked(f"{rast} {rast} {segah} {segah} {segah}", "rast")
    first = leaving(found, PACK.find("rast"))
    assert wrong(found) == []
    assert first is not None
    assert first.to is not None
    assert first.number == found.stretches[1].span.first


def test_the_question_is_asked_of_the_mode_that_the_line_was_checked_for() -> None:
    with pytest.raises(ValueError, match="checked for"):
        leaving(checked(HUSEYNI), PACK.find("huseyni"))


def test_an_undecided_fragment_stays() -> None:
    found = checked("E5 D5", "muhayyer")
    assert not found.whole.decided
    assert leaving(found, PACK.find("muhayyer")) is None


def test_a_line_without_notes_has_nothing_to_say() -> None:
    found = checked("- ,")
    assert (found.stretches, found.off, found.phrases, found.bars) == ((), (), (), ())
    assert (found.course, found.reasons, found.keyboard_note, found.n_notes) == (None, (), "", 0)
    assert checked("", "rast").steps.track.heard == {}


def test_a_target_that_does_not_compete_judges_all_the_same() -> None:
    only = build_model(PACK, PACK.restrict(("rast", "hicaz")))
    found = check_sheet(only, sheet_of(HUSEYNI, PACK.names), PACK.find("huseyni"))
    assert wrong(found) == []
    assert found.steps.owed == ()
    assert found.steps.track.heard
    assert found.reasons == ()


def test_one_mode_alone_has_no_rival() -> None:
    only = build_model(PACK, PACK.restrict(("huseyni",)))
    found = check_sheet(only, sheet_of(HUSEYNI, PACK.names))
    assert found.view.rival is None
    assert found.reasons == ()
    assert (
        leaving(check_sheet(only, sheet_of(HUSEYNI, PACK.names), PACK.find("huseyni")), PACK.find("huseyni"))
        is None
    )


def test_a_line_at_any_pitch_is_checked_on_the_final_that_it_has() -> None:
    """The same line a fifth lower, as an instrument of another ahenk would play it."""
    anywhere = build_model(PACK, PACK.restrict(("huseyni", "hicaz", "rast")), PitchReading.ANY)
    lower = "A4 G4 A4 B4-1 C5 B4-1 A4:2 , A4 G4 F4 E4-1 D4:2 C4 D4:3 ."
    found = check_sheet(anywhere, sheet_of(lower, PACK.names))
    assert [(one.mode.slug, one.final_units) for one in found.stretches] == [("huseyni", -31)]
    assert wrong(found) == []


def test_plain_keys_are_told_what_they_cannot_tell_apart() -> None:
    assert checked("A4~ B4~ C5~ D5~ E5~ D5~ C5~ B4~ A4~:3 .").keyboard_note
    assert checked(HUSEYNI).keyboard_note == ""


def test_an_unknown_target_is_refused_before_anything_is_checked() -> None:
    with pytest.raises(UnknownModeError):
        checked(HUSEYNI, "nosuchmode")
