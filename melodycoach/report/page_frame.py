"""What all pieces of a chart share: its answer, and which part of it stands how high."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from melodycoach.report.page_layout import Scale

BARS_Y, SEAMS_Y, CONTOUR_Y = 11.0, 27.0, 52.0
"""Where the names of bars and seams stand, and where the highest pitch does."""

BELOW_CONTOUR = 40.0
"""Between the lowest pitch and the likelihoods: the numbers of the notes."""

LIKELIHOODS, FOOT = 96.0, 18.0
"""Height of the likelihoods, and the room below them."""

LABEL_GAP = 12.5
"""How far apart lines of small print stand."""


@dataclass(frozen=True, slots=True)
class Frame:
    """What all pieces share: the answer, the scale, the ladder and its width, seams by note."""

    answer: Mapping[str, Any]
    scale: Scale
    gutter: float
    seams: Mapping[int, Mapping[str, Any]]
    rungs: Sequence[Mapping[str, Any]]

    @property
    def notes(self) -> Sequence[Mapping[str, Any]]:
        """The notes of the answer."""
        notes: Sequence[Mapping[str, Any]] = self.answer["notes"]
        return notes

    @property
    def foot_y(self) -> float:
        """Where the numbers of the notes stand."""
        return CONTOUR_Y + self.scale.height + 27

    @property
    def bottom(self) -> float:
        """Where impossibility stands."""
        return self.likelihoods_y + LIKELIHOODS

    @property
    def likelihoods_y(self) -> float:
        """Where certainty stands."""
        return CONTOUR_Y + self.scale.height + BELOW_CONTOUR

    @property
    def height(self) -> float:
        """Height of each piece."""
        return self.likelihoods_y + LIKELIHOODS + FOOT

    def pitch_y(self, height: float) -> float:
        """Tell where a pitch stands, in units from A4."""
        return CONTOUR_Y + self.scale.y(height)

    def chance_y(self, probability: float) -> float:
        """Tell where a probability stands."""
        return self.likelihoods_y + (1 - probability) * LIKELIHOODS
