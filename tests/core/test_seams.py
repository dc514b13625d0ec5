"""Changes of mode: what counts as noticed, as named, as a false alarm."""

import math
import random

import pytest

from melodycoach.core import seams
from melodycoach.core.model import build_model
from melodycoach.core.note import Heard, InputKind
from melodycoach.core.seams import Crossing, Excerpt, cross, hear_excerpt, seam_figures
from melodycoach.sources.pack_file import load_pack

PACK = load_pack("makam")
MODEL = build_model(PACK, PACK.restrict(("rast", "hicaz", "saba")))
NOTE = Heard(6900, InputKind.TYPED, 0.35, False, False)


class Scripted(int):
    """A state that stands for so many notes heard."""

    changed_at: int | None = None


def script(monkeypatch: pytest.MonkeyPatch, announced: list[int | None], changes: set[int]) -> None:
    """Let the filter announce what is written down, after 0, 1, 2, … notes, and these changes."""

    def advanced(model: object, state: Scripted, note: object) -> Scripted:
        after = Scripted(state + 1)
        after.changed_at = after if after in changes else state.changed_at
        return after

    monkeypatch.setattr(seams, "start", lambda model: Scripted(0))
    monkeypatch.setattr(seams, "advance", advanced)
    monkeypatch.setattr(seams, "announced", lambda model, state: announced[state])


@pytest.mark.parametrize(
    ("announced", "changes", "crossing"),
    [
        # two notes before the seam, four after it; the mode after the seam is 2
        ([None, 0, 1, 1, 1, 2, 2], {5}, Crossing(1, 3, 3)),
        ([None, 0, 1, 1, 0, 0, 2], {4}, Crossing(1, 2, 4)),  # left for a wrong mode, then named rightly
        ([None, 0, 1, 1, 1, 1, 1], set(), Crossing(1, None, None)),
        ([None, 0, 1, 0, 0, 0, 0], {3, 6}, Crossing(1, 1, None)),  # the first change counts
        ([None, None, None, None, 2, 2, 2], set(), Crossing(None, None, 2)),  # nothing announced at the seam
        ([None, 0, 1, 1, 1, 1, 1], {2}, Crossing(1, None, None)),  # a change before the seam
        ([None, 2, 2, 2, 2, 2, 2], set(), Crossing(2, None, 1)),  # wrong before, so never left
        ([None, 1, 1, 2, 2, 2, 2], set(), Crossing(1, None, 1)),  # another name is no change
    ],
)
def test_a_delay_counts_the_notes_after_the_seam(
    monkeypatch: pytest.MonkeyPatch, announced: list[int | None], changes: set[int], crossing: Crossing
) -> None:
    script(monkeypatch, announced, changes)
    assert cross(MODEL, [NOTE] * 2, [NOTE] * 4, 2) == crossing


@pytest.mark.parametrize(
    ("changes", "count", "late"),
    [
        # a seam would stand after two notes of the four
        (set(), 0, False),
        ({2, 4}, 2, True),
        ({2}, 1, False),
        ({3}, 1, True),
    ],
)
def test_every_change_announced_without_a_seam_is_a_false_alarm(
    monkeypatch: pytest.MonkeyPatch, changes: set[int], count: int, late: bool
) -> None:
    script(monkeypatch, [0] * 5, changes)
    monkeypatch.setattr(seams, "SIDE_NOTES", 2)
    assert hear_excerpt(MODEL, [NOTE] * 4) == Excerpt(4, count, late)


def test_the_figures_of_some_lines() -> None:
    # delays 10, 20, 40 and one line not noticed: median 20, noticed 3/4
    # the first mode (0) was announced at the seam in the first three, the second named in two of those
    lines = [(0, Crossing(0, 10, 12)), (0, Crossing(0, 40, 50)), (0, Crossing(0, None, None))]
    lines.append((0, Crossing(1, 20, 30)))
    # 3 changes in 120 + 180 notes: 1 in 100
    found = seam_figures(iter(lines), iter([Excerpt(120, 2, False), Excerpt(180, 1, True)]), seed=7)
    assert (found.n_seams, found.noticed, found.median_delay) == (4, 3 / 4, 20)
    assert (found.right_before, found.named) == (3 / 4, 2 / 3)
    assert (found.n_excerpts, found.false_alarms_per_100, found.noticed_by_chance) == (2, 1.0, 0.5)
    assert found.seed == 7


def test_no_lines_give_figures_that_are_no_numbers() -> None:
    found = seam_figures([], [])
    for figure in (found.noticed, found.median_delay, found.right_before, found.named):
        assert math.isnan(figure)
    assert math.isnan(found.false_alarms_per_100)
    assert math.isnan(found.noticed_by_chance)


def wander(mode: str, length: int, seed: int) -> list[Heard]:
    chooser = random.Random(seed)
    found = PACK.find(mode)
    return [
        Heard(
            PACK.system.units_to_cents(found.final_units + chooser.choice(found.rising)),
            InputKind.TYPED,
            0.35,
            False,
            False,
        )
        for _ in range(length)
    ]


def test_on_the_real_filter_two_scales_that_differ_are_told_apart() -> None:
    # rast on G4 and saba on A4 share few degrees: common practice
    before, after = wander("rast", 60, 1), wander("saba", 60, 2)
    places = {mode.slug: i for i, mode in enumerate(MODEL.modes)}
    found = cross(MODEL, before, after, places["saba"])
    assert found.announced == places["rast"]
    assert found.named_after is not None
    assert found.named_after <= 20
    assert hear_excerpt(MODEL, before) == Excerpt(60, 0, False)
    assert hear_excerpt(MODEL, before + after) == Excerpt(120, 1, True)
