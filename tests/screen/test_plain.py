"""One line of text a note."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from melodycoach.screen.plain import plain_line
from melodycoach.screen.view import OwedRow, ViewState

if TYPE_CHECKING:
    from collections.abc import Mapping


def shortened(view: ViewState, n_notes: int) -> ViewState:
    """Give the view after the first notes of its line."""
    owed = tuple(
        replace(row, heard_at=row.heard_at if row.heard_at and row.heard_at <= n_notes else None)
        for row in view.owed
    )
    return replace(view, line=view.line[:n_notes], n_notes=n_notes, owed=owed)


def test_the_first_line_says_what_there_is(views: Mapping[str, ViewState]) -> None:
    assert plain_line(views["nothing"], None) == "nothing heard yet: play or type a note"


def test_a_note_gets_a_line_with_verdict_step_heard_and_next_step(views: Mapping[str, ViewState]) -> None:
    view = views["decided"]
    assert plain_line(shortened(view, 5), shortened(view, 4)) == (
        "5 hüseynî E5; leaning to Hüseynî, 72 %; heard half cadence on hüseynî (güçlü), eviç hüseynî; "
        "next: final cadence on dügâh (karar), çargâh segâh dügâh rast dügâh"
    )


def test_an_undecided_verdict_names_both_probabilities(views: Mapping[str, ViewState]) -> None:
    view = views["undecided"]
    assert plain_line(view, shortened(view, 3)).startswith(
        "4 çargâh C5; undecided between Uşşak and Beyâtî (both of the uşşak family) "
        "(Uşşak 34 %, Beyâtî 31 %); "
    )


def test_a_verdict_without_a_number_gets_one(views: Mapping[str, ViewState]) -> None:
    leanings = tuple(
        replace(row, probability=p) for row, p in zip(views["decided"].leanings, (0.999, 0.001), strict=False)
    )
    view = replace(views["decided"], verdict="leaning to Hüseynî", leanings=leanings)
    assert "; leaning to Hüseynî (Hüseynî over 99 %); " in plain_line(view, None)
    view = replace(view, decided=False, verdict="undecided")
    assert "(Hüseynî over 99 %, Muhayyer under 1 %)" in plain_line(view, None)


def test_a_note_off_the_mode_is_named_with_what_mends_it(views: Mapping[str, ViewState]) -> None:
    line = plain_line(shortened(views["off"], 15), shortened(views["off"], 14))
    assert "; off the mode: hisar, not in Hüseynî, 2 commas below hüseynî, hüseynî mends it; " in line
    assert "off the mode" not in plain_line(views["off"], shortened(views["off"], 15))


def test_a_change_of_mode_is_said_once(views: Mapping[str, ViewState]) -> None:
    view = views["change"]
    before = replace(shortened(view, 21), now="")
    assert plain_line(view, before).endswith("; right now it sounds like Karcığar, since note 14")
    assert "right now" not in plain_line(view, shortened(view, 21))


def test_several_notes_at_once_share_a_line(views: Mapping[str, ViewState]) -> None:
    view = views["decided"]
    assert plain_line(view, shortened(view, 11)).startswith("12 to 13 nevâ D5, hüseynî E5; ")


def test_a_note_whose_name_is_its_written_note_is_named_once(views: Mapping[str, ViewState]) -> None:
    view = shortened(views["decided"], 1)
    view = replace(view, line=(replace(view.line[0], name="E5"),))
    assert plain_line(view, None).startswith("1 E5; ")


def test_undo_and_edits_say_how_long_the_line_is_now(views: Mapping[str, ViewState]) -> None:
    view = views["decided"]
    assert plain_line(shortened(view, 1), view).startswith("the line now has 1 note; ")
    edited = replace(view, line=(*view.line[:3], replace(view.line[3], name="acem"), *view.line[4:]))
    assert plain_line(edited, view).startswith("the line now has 13 notes")
    assert plain_line(shortened(view, 0), view).startswith("the line now has 0 notes; ")


def test_nothing_new_gives_no_line(views: Mapping[str, ViewState]) -> None:
    for view in views.values():
        assert plain_line(view, view) == ""


def test_settings_input_and_warnings_are_said_when_they_change(views: Mapping[str, ViewState]) -> None:
    view = views["decided"]
    changed = replace(
        view,
        reading="final given: nevâ",
        restricted="",
        leanings=(replace(view.leanings[0], target=True), *view.leanings[1:]),
        status=replace(
            view.status, input_line="input lost: USB Keys 61 MIDI 1", warning="disk\nfull", tuning_line="t"
        ),
    )
    assert plain_line(changed, view) == (
        "final given: nevâ; all modes compete; aim: Hüseynî; input lost: USB Keys 61 MIDI 1; t; "
        "warning: disk full"
    )


def test_a_line_stays_without_next_step_once_all_are_heard(views: Mapping[str, ViewState]) -> None:
    owed = (OwedRow("half cadence", "core", ("eviç",), ("F#5",), ("F#5",), heard_at=2),)
    assert "next:" not in plain_line(replace(views["decided"], owed=owed), None)


def test_the_next_step_is_the_first_one_owed_and_colour_is_only_welcome(
    views: Mapping[str, ViewState],
) -> None:
    view = views["decided"]
    loud = tuple(replace(row, gain_nats=7.8) if row.is_colour else row for row in view.owed)
    assert "; next: final cadence on dügâh (karar)," in plain_line(replace(view, owed=loud), None)
    done = tuple(row if row.is_colour else replace(row, heard_at=1) for row in view.owed)
    assert "; welcome: register: up to muhayyer, gerdâniye muhayyer" in plain_line(
        replace(view, owed=done), None
    )
