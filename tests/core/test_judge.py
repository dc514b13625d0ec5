"""Which mode is in view, and by which mode each note of a line is judged."""

from sheets import sheet_of

from melodycoach.core.judge import Judge, in_view, judges
from melodycoach.core.model import ScoringModel, build_model
from melodycoach.core.octave import lie_of
from melodycoach.core.scorer import leading
from melodycoach.core.session import Line, empty_line, rewrite
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
HUSEYNI, HICAZ = PACK.find("huseyni"), PACK.find("hicaz")
TWO = build_model(PACK, (HICAZ, HUSEYNI))
TURNING = (
    "E5 D5 E5 F#5 G5 F#5 E5:2 , D5 C5 B4-1 A4:2 . E5 D5 E5 F#5 G5 F#5 E5:2 , D5 C5 B4-1 A4:2 . "
    "D5 E5 D5 C#5 Bb4+1 A4:2 , Bb4+1 C#5 D5:2 C#5 Bb4+1 A4 G4 A4:2 . D5 C#5 D5 C#5 Bb4+1 A4:4 ."
)


def line_of(text: str, model: ScoringModel = TWO) -> Line:
    return rewrite(model, empty_line(model), sheet_of(text, PACK.names).items)


def test_while_no_change_is_noticed_the_mode_in_view_judges_every_note() -> None:
    line = line_of("D5 C#5 Bb4+1 A4 B4-1")
    assert line.states[-1].change.changed_at is None
    assert judges(TWO, line.states, lie_of(line.heard), (HICAZ, 0), 0) == (Judge(1, HICAZ, 0),)


def test_the_newest_stretch_is_judged_by_the_mode_in_view_until_another_is_named_for_it() -> None:
    line = line_of(TURNING)
    seam = line.states[-1].change.seam_at
    assert seam is not None
    for leader, mode in enumerate((HICAZ, HUSEYNI)):
        found = judges(TWO, line.states, lie_of(line.heard), (mode, 0), leader)
        assert found == (Judge(seam, HICAZ, 0), Judge(1, HUSEYNI, 0))


def test_with_a_target_there_is_one_judge() -> None:
    line = line_of(TURNING)
    assert judges(TWO, line.states, lie_of(line.heard), (HUSEYNI, 0), None) == (Judge(1, HUSEYNI, 0),)


def test_the_leading_mode_is_in_view_and_its_rival_beside_it() -> None:
    line = line_of(TURNING)
    lean = leading(TWO, line.states[-1])
    view = in_view(TWO, line.states[-1], lie_of(line.heard), None, lean)
    assert (view.mode, view.hypothesis, view.rival) == (TWO.mode_of(lean.best), lean.best, lean.rival)


def test_a_target_is_in_view_against_whatever_leads() -> None:
    line = line_of(TURNING)
    lean = leading(TWO, line.states[-1])
    behind = HUSEYNI if TWO.mode_of(lean.best) is HICAZ else HICAZ
    view = in_view(TWO, line.states[-1], lie_of(line.heard), behind, lean)
    assert (view.mode, view.rival) == (behind, lean.best)


def test_a_target_that_does_not_compete_is_in_view_with_nothing_beside_it() -> None:
    line = line_of(TURNING)
    rast = PACK.find("rast")
    view = in_view(TWO, line.states[-1], lie_of(line.heard), rast, leading(TWO, line.states[-1]))
    assert (view.mode, view.hypothesis, view.rival) == (rast, None, None)
    assert view.final_units == rast.final_units
