"""What the newest stretch of a line sounds like, once the change filter has found a seam.

Too short a stretch is no ground for a name, and a wrong one is worse than none. So a mode is named
alone only when the stretch is clear; else two modes, or a family; else nothing.

Conventions
-----------
The stretch begins at the seam. Its evidence is the change filter's, which has no memory, to the power
``stretch_power``; what comes out is good for choosing words, not for showing as a percentage. Modes
are given by their places in the model.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from melodycoach.core.arrays import FloatArray
    from melodycoach.core.model import ScoringModel
    from melodycoach.core.scorer import ScorerState


@dataclass(frozen=True, slots=True)
class Stretch:
    """Words for the newest stretch.

    Parameters
    ----------
    since
        Its first note.
    among
        Modes that it may be in, likeliest first: one when that is clear, two, or a whole family.
    family
        The family that they share, or an empty string.
    """

    since: int
    among: tuple[int, ...]
    family: str


def stretch_of(model: ScoringModel, state: ScorerState, leader: int) -> Stretch | None:
    """Say what the newest stretch sounds like, or None where there is nothing to say.

    There is nothing to say while no change has been noticed, while the stretch may well be in the
    leading mode, or while it may be in modes of several families.

    Parameters
    ----------
    leader
        The hypothesis that leads the line as a whole.
    """
    change, parameters = state.change, model.parameters
    if change.seam_at is None:
        return None
    powered = model.log_prior + parameters.stretch_power * (change.total - change.base)
    chance = np.exp(powered - powered.max()).reshape(-1, model.n_modes).sum(axis=0)
    chance /= chance.sum()
    among = _among(model, chance, change.announced % model.n_modes)
    if (
        not among
        or leader % model.n_modes in among
        or chance[leader % model.n_modes] > parameters.stretch_other
    ):
        return None
    families = {model.modes[index].family for index in among}
    return Stretch(change.seam_at, among, families.pop() if len(families) == 1 else "")


def _among(model: ScoringModel, chance: FloatArray, announced: int) -> tuple[int, ...]:
    """Give the modes that a stretch may be in, the announced one among them, or none for too many."""
    if chance[announced] >= model.parameters.stretch_at:
        return (announced,)
    family = model.modes[announced].family
    ranked = [int(at) for at in np.argsort(-chance, kind="stable") if model.modes[at].family == family]
    for among in (ranked[:2], ranked):
        if announced in among and chance[among].sum() >= model.parameters.among_share:
            return tuple(among)
    return ()
