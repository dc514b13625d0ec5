"""How well a model names the modes of labelled melodies: hearing them, and the outcome.

A melody is heard note by note, by the same function as a live line. At each *checkpoint* (after
10, 20 and 40 notes, and after all of them) the model's answer is taken down as a `Guess`; a `Tally`
of them gives the figures.

Conventions
-----------
A melody shorter than a checkpoint counts there with its answer at its end. Probabilities are those
that the screen shows: tempered, and summed over transpositions.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np

from melodycoach.core.event import PitchReading
from melodycoach.core.scorer import advance, leading, mode_posterior, start
from melodycoach.core.tally import Guess, Tally, Verdict

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from melodycoach.core.model import ScoringModel
    from melodycoach.core.note import Heard, InputKind
    from melodycoach.core.owed_trial import OwedFigures
    from melodycoach.core.scorer import ScorerState
    from melodycoach.core.seams import SeamFigures

CHECKPOINTS = (10, 20, 40)
"""Numbers of notes after which an answer is taken; the end of the melody is one more."""

FINAL_TOLERANCE_CENTS = 25.0
"""A final is found when it lies within a good comma (22.6 cents) of the label."""


def judge(
    model: ScoringModel, notes: Sequence[Heard], label: int, final_cents: float | None = None
) -> Verdict:
    """Hear one melody and take the model's answers down.

    Parameters
    ----------
    model
        Any reading; for a known final, the model built for that final.
    notes
        At least one. When the last one ``closes``, the answer at the end counts the closing.
    label
        Place of the labelled mode in ``model.modes``.
    final_cents
        The labelled final, to see whether the any-pitch reading finds it.

    Raises
    ------
    ValueError
        No notes, or a label that is no place in ``model.modes``.
    """
    if not notes or not 0 <= label < len(model.modes):
        raise ValueError(f"{len(notes)} notes with label {label} of {len(model.modes)} modes")
    if model.reading is not PitchReading.ANY:
        final_cents = None
    state = start(model)
    guesses: list[Guess] = []
    for number, note in enumerate(notes, 1):
        state = advance(model, state, note)
        if number in CHECKPOINTS and number < len(notes):
            guesses.append(guess(model, state, label, final_cents))
    at_end = guess(model, state, label, final_cents)
    guesses += [at_end] * (len(CHECKPOINTS) + 1 - len(guesses))
    return Verdict(label, len(notes), tuple(guesses))


def guess(model: ScoringModel, state: ScorerState, label: int, final_cents: float | None = None) -> Guess:
    """Take down what the model says in one state; the parameters are those of `judge`."""
    leaning = leading(model, state)
    found: bool | None = None
    if final_cents is not None:
        system = model.pack.system
        away = float(model.final_units[leaning.best]) - system.cents_to_units(final_cents)
        found = abs(math.remainder(away, system.divisions)) * system.unit_cents <= FINAL_TOLERANCE_CENTS
    probabilities = mode_posterior(model, state)
    return Guess(
        answer=int(model.mode_index[leaning.best]),
        probability=leaning.p_best,
        label_probability=float(probabilities[label]),
        label_rank=int(np.count_nonzero(probabilities > probabilities[label])),
        decided=leaning.decided,
        final_found=found,
    )


@dataclass(frozen=True, eq=False, slots=True)
class Evaluation:
    """What a collection said of a model.

    Parameters
    ----------
    pack_id
        The pack whose modes competed.
    mode_ids
        The candidates, in the order of the confusion matrices.
    reading, kind, closing
        What was taken as known of the final; where the pitches came from; whether the answer
        after all notes counts the closing.
    n, n_notes
        Melodies that were heard, and their notes.
    n_shorter
        For each checkpoint, melodies that were shorter.
    tallies
        One for each of `CHECKPOINTS` and one for the end.
    n_skipped
        Bad records.
    left_out
        Label to number of melodies that were not heard because no candidate has that label.
    n_without_final
        Melodies that were not heard because the reading needs a final and they have none.
    seams, owed
        Figures of the spliced lines and of the owed steps, where they were asked for.
    """

    pack_id: str
    mode_ids: tuple[str, ...]
    reading: PitchReading
    kind: InputKind
    closing: bool
    n: int
    n_notes: int
    n_shorter: tuple[int, ...]
    tallies: tuple[Tally, ...]
    n_skipped: int = 0
    left_out: Mapping[str, int] = field(default_factory=dict)
    n_without_final: int = 0
    seams: SeamFigures | None = None
    owed: OwedFigures | None = None

    @property
    def tally_by_checkpoint(self) -> dict[str, Tally]:
        """The tallies by name: ``"10"``, ``"20"``, ``"40"``, ``"all"``."""
        return dict(zip((*map(str, CHECKPOINTS), "all"), self.tallies, strict=True))
