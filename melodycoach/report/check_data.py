"""An answer as data for programs: what ``check --json`` prints, and what the other reports are made from.

Conventions
-----------
docs/check-json.md describes every key. Notes are counted from 1. Everything here is made of ``str``,
``int``, ``float``, ``bool``, ``list``, ``dict`` and None.
"""

from __future__ import annotations

from itertools import pairwise
from typing import TYPE_CHECKING, Any

import numpy as np

from melodycoach.core.check import leaving
from melodycoach.core.function import meant_units
from melodycoach.core.ladder import ladder
from melodycoach.core.note import Note
from melodycoach.core.octave import lie_of, standing_final
from melodycoach.core.offmode import off_mode_words
from melodycoach.core.scorer import log_odds, mode_posterior, posterior
from melodycoach.core.span import before_closing
from melodycoach.core.verdict import competing_words, reading_words, verdict
from melodycoach.report.check_values import (
    change_data,
    course_data,
    mode_data,
    names_alone,
    off_data,
    pitch_data,
    place_data,
    rounded,
    span_data,
    steps_data,
)

if TYPE_CHECKING:
    from collections.abc import Sequence

    from melodycoach.core.arrays import FloatArray
    from melodycoach.core.check import Checked, Leaving, Stretch
    from melodycoach.core.mode import Mode
    from melodycoach.core.pitch import PitchNames
    from melodycoach.core.span import Span
    from melodycoach.errors import MelodycoachError

FORMAT, VERSION = "melodycoach-check", 1

LEANINGS_LISTED = 6
LIKELY_LISTED = 3
CURVES_DRAWN = 5
"""So many modes get a curve of how likely they were after each note."""


def check_json(files: Sequence[dict[str, Any]], program: str) -> dict[str, Any]:
    """Put the answers of several files, and those that failed, into one document."""
    return {"format": FORMAT, "version": VERSION, "program": program, "files": list(files)}


def failed_json(file: str, error: MelodycoachError) -> dict[str, Any]:
    """Say why a file has no answer; where there is a single fault, the error says it."""
    faults = list(error.faults)
    return {"file": file, "error": str(error), "faults": [] if faults == [str(error)] else faults}


def answer_json(checked: Checked, file: str, stay_in: Mode | None = None) -> dict[str, Any]:
    """Give the answer for one file.

    Parameters
    ----------
    checked
        The line, checked.
    file
        What it was read from, for people.
    stay_in
        The mode that it is asked to stay in: the target of ``checked``, one of those that compete.
    """
    model, sheet = checked.model, checked.sheet
    pack = model.pack
    after = [_so_far(checked, number) for number in range(1, checked.n_notes + 1)]
    return {
        "file": file,
        "kind": sheet.kind.value,
        "title": sheet.title,
        "tempo": sheet.tempo,
        "read": list(sheet.says),
        "lost": list(sheet.lost),
        "pack": pack.id,
        "theory": pack.theory,
        "caution": pack.caution,
        "words": dict(pack.names.words),
        "unit": pack.system.unit_name,
        "divisions": pack.system.divisions,
        "reading": reading_words(model),
        "compete": competing_words(model),
        "n_notes": checked.n_notes,
        "whole": _whole(checked),
        "in_view": _in_view(checked),
        "notes": _notes(checked, after),
        "off_notes": [number for number, one in enumerate(checked.off, 1) if one is not None],
        "likelihoods": _likelihoods(checked, after),
        "phrases": [span_data(checked, one) for one in checked.phrases],
        "bars": [{"bar": bar, **span_data(checked, one)} for bar, one in checked.bars],
        "stretches": [_stretch(checked, one) for one in checked.stretches],
        "changes": [change_data(checked, *pair) for pair in pairwise(checked.stretches)],
        "course": course_data(checked, checked.view.mode, checked.course),
        "rival": _rival(checked),
        "keyboard_note": checked.keyboard_note,
        "stay_in": _stay_in(checked, stay_in) if stay_in is not None else None,
    }


# --- the line as a whole -----------------------------------------------------------------------


def _whole(checked: Checked) -> dict[str, Any]:
    model, lean = checked.model, checked.whole
    by_mode = mode_posterior(model, checked.line.states[-1])
    ranked = sorted(range(model.n_modes), key=lambda index: -by_mode[index])
    listed = ranked[:LEANINGS_LISTED]
    listed += [i for i in ranked[LEANINGS_LISTED:] if model.modes[i] is checked.target]
    leanings = [
        {
            **mode_data(model.modes[i]),
            "final": pitch_data(checked, _final(checked, i)),
            "probability": rounded(by_mode[i]),
        }
        for i in listed
    ]
    empty = "no notes: there is nothing to check"
    return {
        "verdict": verdict(model, lean, checked.n_notes) if checked.n_notes else empty,
        "decided": lean.decided and checked.n_notes > 0,
        **leanings[0],
        "among": [model.modes[index].id for index in lean.among],
        "leanings": leanings,
    }


def _final(checked: Checked, index: int) -> int:
    """Give where a mode stands for the line: on the likeliest of its finals."""
    model = checked.model
    by_hypothesis = posterior(model, checked.line.states[-1]).reshape(-1, model.n_modes)
    hypothesis = int(by_hypothesis[:, index].argmax()) * model.n_modes + index
    return standing_final(model, hypothesis, lie_of(checked.line.heard))


def _in_view(checked: Checked) -> dict[str, Any]:
    view = checked.view
    rungs = ladder(view.mode, view.final_units, checked.model.pack.names)
    return {
        **mode_data(view.mode),
        "is_target": checked.target is not None,
        "final": pitch_data(checked, view.final_units),
        "ladder": [
            {**pitch_data(checked, rung.height), "function": rung.function, "role": rung.role}
            for rung in rungs
        ],
        "steps": steps_data(checked, checked.steps),
    }


def _rival(checked: Checked) -> dict[str, Any] | None:
    view, model = checked.view, checked.model
    if not checked.n_notes or view.rival is None or view.hypothesis is None:
        return None
    mode, state = model.mode_of(view.rival), checked.line.states[-1]
    by_mode = mode_posterior(model, state)
    odds = log_odds(model, state, view.hypothesis, view.rival)
    told = [
        (reason, {"says": reason.text, "nats": round(reason.nats, 3), "notes": list(reason.numbers)})
        for reason in checked.reasons
    ]
    return {
        **mode_data(mode),
        "probability": rounded(by_mode[view.rival % model.n_modes]),
        "for_leader": [data for reason, data in told if reason.nats > 0],
        "for_rival": [data for reason, data in told if reason.nats < 0],
        "rest_nats": round(odds - sum(reason.nats for reason, _ in told), 3),
    }


def _likelihoods(checked: Checked, after: Sequence[FloatArray]) -> dict[str, Any]:
    """Follow the modes that matter through the line: those of its stretches, the target, the likeliest."""
    model = checked.model
    if not after:
        return {"modes": [], "after": []}
    last = after[-1]
    wanted = [checked.view.mode.id, *(stretch.mode.id for stretch in checked.stretches)]
    wanted += [model.modes[index].id for index in sorted(range(model.n_modes), key=lambda i: -last[i])]
    index_by_id = {mode.id: index for index, mode in enumerate(model.modes)}
    drawn = [index_by_id[mode_id] for mode_id in dict.fromkeys(wanted) if mode_id in index_by_id]
    drawn = drawn[:CURVES_DRAWN]
    return {
        "modes": [mode_data(model.modes[index]) for index in drawn],
        "after": [[rounded(by_mode[index]) for index in drawn] for by_mode in after],
    }


# --- notes and spans of notes ------------------------------------------------------------------


def _notes(checked: Checked, after: Sequence[FloatArray]) -> list[dict[str, Any]]:
    names = checked.model.pack.names
    items = [item for item in checked.line.items if isinstance(item, Note)]
    phrases = _parts_of_notes(checked.phrases)
    stretches = _parts_of_notes([one.span for one in checked.stretches])
    rows = []
    for number, (item, heard) in enumerate(zip(items, checked.line.heard, strict=True), 1):
        stretch = checked.stretches[stretches[number - 1] - 1]
        mode, final = (stretch.mode, stretch.final_units)
        if checked.target is not None:
            mode, final = checked.view[:2]
        height = meant_units(mode, final, heard.pitch_cents, heard.kind, names.system)
        cents = names.system.units_to_cents(height)
        rows.append(
            {
                "number": number,
                **place_data(checked, number),
                "phrase": phrases[number - 1],
                "stretch": stretches[number - 1],
                "onset_s": round(item.onset_s, 3),
                "length_s": round(item.duration_s, 3),
                "pitch_cents": round(heard.pitch_cents, 2),
                "height": round(height, 2),
                "name": names.name(cents),
                "written": str(names.spell(cents)),
                "rests": heard.rests,
                "closes": heard.closes,
                "likely": _likely(checked, after[number - 1]),
                "off": off_data(checked, checked.off[number - 1]),
            }
        )
    return rows


def _parts_of_notes(parts: Sequence[Span]) -> list[int]:
    """Give for each note which of the parts that cover the line it lies in, counted from 1."""
    return [at for at, part in enumerate(parts, 1) for _ in range(part.n_notes)]


def _so_far(checked: Checked, number: int) -> FloatArray:
    """Give the probability of each mode after a note; what closes counts only at the end of the line."""
    state = checked.line.states[number]
    return mode_posterior(checked.model, state if number == checked.n_notes else before_closing(state))


def _likely(checked: Checked, by_mode: FloatArray) -> list[dict[str, Any]]:
    ranked = np.argsort(-by_mode, kind="stable")[:LIKELY_LISTED]
    return [{"name": checked.model.modes[i].name, "probability": rounded(by_mode[i])} for i in ranked]


def _stretch(checked: Checked, one: Stretch) -> dict[str, Any]:
    lean = one.span.leaning
    return {
        "first": one.span.first,
        "last": one.span.last,
        "place": place_data(checked, one.span.first),
        **mode_data(one.mode),
        "final": pitch_data(checked, one.final_units),
        "probability": rounded(one.probability),
        "decided": names_alone(checked, one),
        "verdict": verdict(checked.model, lean, one.span.n_notes),
        "noticed_at": one.noticed_at,
        "steps": steps_data(checked, one.steps),
        "course": course_data(checked, one.mode, one.course),
    }


# --- the question ------------------------------------------------------------------------------


def _stay_in(checked: Checked, mode: Mode) -> dict[str, Any]:
    first = leaving(checked, mode)
    return {
        **mode_data(mode),
        "stays": first is None,
        "first": None
        if first is None
        else {
            "note": first.number,
            "place": place_data(checked, first.number),
            "says": _leaving_words(first, mode, checked.model.pack.names),
        },
    }


def _leaving_words(first: Leaving, mode: Mode, names: PitchNames) -> str:
    if first.off is not None:
        says, mend = off_mode_words(first.off, mode, names)
        return f"{names.name(first.off.pitch_cents)} is {says}; {mend} would mend it"
    assert first.to is not None
    return f"{'from here on ' if first.number > 1 else ''}it sounds like {first.to.name}"
