"""One line of text a note: for pipes, screen readers and very small terminals.

Conventions
-----------
A line can be read aloud: words instead of signs, no colour, nothing that depends on its place.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from melodycoach.core.verdict import percent
from melodycoach.screen.text import tidy

if TYPE_CHECKING:
    from melodycoach.screen.view import LineNote, ViewState


def plain_line(view: ViewState, previous: ViewState | None) -> str:
    """Say what is new since the view before, in one line; empty if nothing is.

    Parameters
    ----------
    view
        The view now.
    previous
        The view for which the last line was given; None: there was none.

    Returns
    -------
    str
        The new notes, the verdict with probabilities, what was just heard, the best owed step, a
        note off the mode and what mends it, a change of mode, a warning; parts joined by ``; ``.
    """
    parts = [_notes(view, previous)]
    if previous is None or (view.verdict, view.n_notes) != (previous.verdict, previous.n_notes):
        parts.append(_verdict(view))
        parts += _heard(view, previous)
        parts += _off(view, previous)
        parts.append(_next(view))
    if view.now and (previous is None or view.now != previous.now):
        parts.append(view.now)
    parts.append(_settings(view, previous))
    if view.status.warning and (previous is None or view.status.warning != previous.status.warning):
        parts.append(f"warning: {view.status.warning}")
    return tidy("; ".join(part for part in parts if part))


def _notes(view: ViewState, previous: ViewState | None) -> str:
    """Name the notes that came since, or say how many there are if the line was changed."""
    before = previous.n_notes if previous is not None else max(view.n_notes - 1, 0)
    if previous is not None and view.line[:before] != previous.line[:before] and view.n_notes <= before:
        return f"the line now has {view.n_notes} note{'' if view.n_notes == 1 else 's'}"
    new = view.line[before:]
    if not new:
        shorter = previous is not None and view.n_notes < previous.n_notes
        return f"the line now has {view.n_notes} notes" if shorter else ""
    names = ", ".join(_name(note) for note in new)
    numbers = str(new[0].number) if len(new) == 1 else f"{new[0].number} to {new[-1].number}"
    return f"{numbers} {names}"


def _name(note: LineNote) -> str:
    return note.name if note.name == note.written else f"{note.name} {note.written}"


def _verdict(view: ViewState) -> str:
    """Give the verdict with the probabilities that carry it, the second one where it is close."""
    if not view.leanings or not view.n_notes:
        return view.verdict
    shown = view.leanings[:1] if view.decided else view.leanings[:2]
    if view.decided and "%" in view.verdict:
        return view.verdict
    numbers = ", ".join(f"{row.name} {percent(row.probability)}" for row in shown)
    return f"{view.verdict} ({numbers})"


def _heard(view: ViewState, previous: ViewState | None) -> list[str]:
    """Name the characteristic steps that the new notes completed."""
    before = previous.n_notes if previous is not None else view.n_notes - 1
    return [
        f"heard {row.kind}, {' '.join(row.perdes)}"
        for row in view.owed
        if row.heard_at is not None and before < row.heard_at <= view.n_notes
    ]


def _off(view: ViewState, previous: ViewState | None) -> list[str]:
    """Name the new notes that are off the mode, and what mends them."""
    before = previous.n_notes if previous is not None else view.n_notes - 1
    return [
        f"off the mode: {note.name}, {note.off_mode}" + (f", {note.mend} mends it" if note.mend else "")
        for note in view.line
        if note.off_mode and note.number > before
    ]


def _next(view: ViewState) -> str:
    """Name the best step to play next; where nothing is owed any more, the best colour."""
    best = next((row for row in view.owed if row.heard_at is None), None)
    if best is None or not view.n_notes:
        return ""
    return f"{'next' if best.is_owed else 'welcome'}: {best.kind}, {' '.join(best.perdes)}"


def _settings(view: ViewState, previous: ViewState | None) -> str:
    """Say which settings changed: the reading, the modes that compete, the aim, the input."""
    if previous is None:
        return ""
    aim = next((row.name for row in view.leanings if row.target), "")
    aim_before = next((row.name for row in previous.leanings if row.target), "")
    changes = [
        new
        for new, old in (
            (view.reading, previous.reading),
            (view.restricted or "all modes compete", previous.restricted or "all modes compete"),
            (f"aim: {aim or 'none'}", f"aim: {aim_before or 'none'}"),
            (view.status.input_line, previous.status.input_line),
            (view.status.tuning_line, previous.status.tuning_line),
        )
        if new and new != old
    ]
    return "; ".join(changes)
