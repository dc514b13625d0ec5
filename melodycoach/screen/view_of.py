"""From a session to what the screen shows: all sorting, rounding and wording happens here.

`ViewMaker` remembers how far it has followed a mode through the line; that memory only saves work
and never changes an answer.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from melodycoach.core.evidence import Balance, balance
from melodycoach.core.judge import in_view, judges
from melodycoach.core.ladder import ladder
from melodycoach.core.mode import Mode, Need
from melodycoach.core.note import InputKind, shared_start
from melodycoach.core.octave import NOWHERE, Lie, lie_of, standing_final
from melodycoach.core.owed import StepTrack, follow, start_track
from melodycoach.core.pitch import key_name
from melodycoach.core.plain_keys import keyboard_note
from melodycoach.core.ranking import rank_owed, step_pitches
from melodycoach.core.scorer import leading, mode_posterior, posterior
from melodycoach.core.step_words import step_label
from melodycoach.core.stretch import stretch_of
from melodycoach.core.verdict import competing_words, reading_words, verdict
from melodycoach.core.why import reasons_of_balance
from melodycoach.screen.line_of import LineMaker
from melodycoach.screen.view import LeaningRow, OwedRow, Status, ViewState, WhyRow

if TYPE_CHECKING:
    from melodycoach.core.model import ScoringModel
    from melodycoach.core.scorer import Leaning, ScorerState
    from melodycoach.core.session import Line, SessionState

LEANINGS_SHOWN = 12
LEAST_LIKELY = 0.01
"""A mode below this is listed with its final as written, in whatever octave the line lies."""

REASONS_SHOWN = 8


class ViewMaker:
    """Makes views of one session, one after the other."""

    def __init__(self) -> None:
        self._tracks: list[StepTrack] = []
        self._followed: tuple[object, ...] = ()
        self._balance: Balance | None = None
        self._line = LineMaker()

    def view_of(self, session: SessionState, status: Status, tokens: tuple[str, ...] = ()) -> ViewState:
        """Give what the screen shows of a session.

        Parameters
        ----------
        session
            The session as it is now.
        status
            The world around it.
        tokens
            The line as note text, one token for each of its items.
        """
        model, line, names = session.model, session.line, session.pack.names
        state = line.states[-1]
        lean = leading(model, state)
        lie = lie_of(line.heard)
        shown = in_view(model, state, lie, session.target, lean)
        mode, final_units, hypothesis, rival = shown
        track = self._track(session, mode, final_units)
        heard_anything = bool(line.heard)
        led_by = lean.best if session.target is None else None
        judged_by = judges(model, line.states, lie, (mode, final_units), led_by)
        return ViewState(
            verdict=verdict(model, lean, state.n_notes),
            now=_now(model, line, lean),
            decided=heard_anything and lean.decided,
            leanings=_leaning_rows(session, state, lie),
            in_view=mode.name,
            rival=model.mode_of(rival).name if rival is not None else "",
            is_target=session.target is not None,
            owed=_owed_rows(session, hypothesis, rival, track),
            line=self._line.line_notes(session, judged_by),
            ladder=ladder(mode, final_units, names),
            why=self._why_rows(session, hypothesis, rival) if heard_anything else (),
            keyboard_note=_keyboard_note(session, hypothesis, rival),
            tokens=tokens,
            n_notes=len(line.heard),
            reading=reading_words(model),
            restricted=competing_words(model),
            theory=session.pack.theory,
            caution=session.pack.caution,
            can_undo=bool(session.past),
            can_redo=bool(session.future),
            status=status,
        )

    def _track(self, session: SessionState, mode: Mode, final_units: int) -> StepTrack:
        """Follow the mode to the end of the line, going on from where the last view stopped."""
        heard = session.line.heard
        same = self._followed[:3] == (mode.id, final_units, session.pack.id)
        if not same:
            self._tracks = [start_track(mode, final_units, session.pack.system)]
        else:
            del self._tracks[shared_start(self._followed[3:], heard) + 1 :]
        for note in heard[len(self._tracks) - 1 :]:
            self._tracks.append(follow(self._tracks[-1], note))
        self._followed = (mode.id, final_units, session.pack.id, *heard)
        return self._tracks[-1]

    def _why_rows(
        self, session: SessionState, hypothesis: int | None, rival: int | None
    ) -> tuple[WhyRow, ...]:
        """Say what speaks for the mode in view against its rival, going on from the last view."""
        if hypothesis is None or rival is None:
            return ()
        line = session.line
        self._balance = balance(session.model, line.states, line.heard, hypothesis, rival, self._balance)
        found = reasons_of_balance(self._balance, line.heard, REASONS_SHOWN)
        return tuple(WhyRow(text=reason.text, nats=reason.nats) for reason in found)


def _now(model: ScoringModel, line: Line, lean: Leaning) -> str:
    """Say what the newest stretch sounds like where that differs from the whole line."""
    stretch = stretch_of(model, line.states[-1], lean.best)
    if stretch is None:
        return ""
    names = " or ".join(model.modes[index].name for index in stretch.among)
    if len(stretch.among) > 2:
        names = f"one of the {stretch.family}"
    return f"right now it sounds like {names}, since note {stretch.since}"


def _leaning_rows(session: SessionState, state: ScorerState, lie: Lie) -> tuple[LeaningRow, ...]:
    model = session.model
    by_hypothesis = posterior(model, state).reshape(-1, model.n_modes)
    by_mode = by_hypothesis.sum(axis=0)
    states = session.line.states
    before = mode_posterior(model, states[-2]) if len(states) > 1 else by_mode
    ranked = sorted(range(model.n_modes), key=lambda index: -by_mode[index])
    shown = ranked[:LEANINGS_SHOWN]
    target = session.target
    shown += [i for i in ranked[LEANINGS_SHOWN:] if target is not None and model.modes[i].id == target.id]
    rows = []
    for index in shown:
        mode = model.modes[index]
        hypothesis = int(by_hypothesis[:, index].argmax()) * model.n_modes + index
        is_likely = by_mode[index] >= LEAST_LIKELY  # where the others stand is not worth the work
        final = standing_final(model, hypothesis, lie if is_likely else NOWHERE)
        rows.append(
            LeaningRow(
                mode_id=mode.id,
                name=mode.name,
                final=session.pack.names.name_at(final),
                probability=float(by_mode[index]),
                change=float(by_mode[index] - before[index]),
                target=target is not None and mode.id == target.id,
            )
        )
    return tuple(rows)


def _owed_rows(
    session: SessionState, hypothesis: int | None, rival: int | None, track: StepTrack
) -> tuple[OwedRow, ...]:
    """List the steps: those to play next in their order; then those heard, the newest first."""
    line, mode = session.line, track.mode
    index_by_id = {step.id: index for index, step in enumerate(mode.steps)}
    if hypothesis is not None:
        kind = line.heard[-1].kind if line.heard else InputKind.TYPED
        ranked = rank_owed(session.model, line.states[-1], hypothesis, track, rival, kind)
        to_play = [(index_by_id[one.step.id], one.gain_nats) for one in ranked]
    else:
        to_play = [(i, 0.0) for i, at in enumerate(track.heard_at) if at is None]
        to_play.sort(key=lambda one: mode.steps[one[0]].need is Need.COLOUR)
    heard = sorted(((at, i) for i, at in enumerate(track.heard_at) if at is not None), reverse=True)
    rows = [_owed_row(session, track, index, gain) for index, gain in to_play]
    return (*rows, *(_owed_row(session, track, index, 0.0) for _, index in heard))


def _owed_row(session: SessionState, track: StepTrack, index: int, gain_nats: float) -> OwedRow:
    """Write a step where it was heard, or over the final where it is not: its label and its notes."""
    system, names = session.pack.system, session.pack.names
    step, octaves = track.mode.steps[index], track.heard_octave[index]
    pitches = step_pitches(step, track.final_units, system, octaves)
    return OwedRow(
        kind=step_label(step, track.mode, names, track.final_units + octaves * system.divisions),
        need=step.need.value,
        perdes=tuple(names.name(cents) for cents in pitches),
        written=tuple(str(names.spell(cents)) for cents in pitches),
        keys=tuple(key_name(cents) for cents in pitches),
        heard_at=track.heard_at[index],
        gain_nats=gain_nats,
    )


def _keyboard_note(session: SessionState, hypothesis: int | None, rival: int | None) -> str:
    """Say what plain keys cannot tell apart; nothing when the line was not played on them."""
    plain = any(note.kind is InputKind.KEYS for note in session.line.heard[-20:])
    if not plain or hypothesis is None or rival is None:
        return ""
    return keyboard_note(session.model, hypothesis, rival)
