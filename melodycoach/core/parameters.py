"""Every global constant of the scorer, in one place.

Conventions
-----------
The constants belong to the method, never to a mode: a mode is what its definition says. Weights of
functions are multipliers of a plain degree's weight 1. Sizes in pitch are in cents, so that they
mean the same in every tone system.

References
----------
The defaults were chosen on automatically transcribed recordings of ensemble performances, an open
research collection that is not part of this package; docs/mathematics.md says what each is worth.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from types import MappingProxyType
from typing import TYPE_CHECKING

from melodycoach.core.mode import Repertoire
from melodycoach.core.note import InputKind
from melodycoach.core.pitch import COMMA_CENTS

if TYPE_CHECKING:
    from collections.abc import Mapping


@dataclass(frozen=True, slots=True)
class FunctionWeights:
    """How much likelier a degree is for what it does in its mode.

    Parameters
    ----------
    main, falling, passing, below
        Base weight of a degree of the rising form, of one that only the falling form has, of an
        occasional one, and of one that is used only under the final.
    final, dominant, second_dominant, suspended
        Multipliers for the functions.
    opening
        Multiplier for a degree inside the region where the mode opens and mostly lives.
    upper_final
        Multiplier for the final when its octave is the first dominant.
    """

    main: float
    falling: float
    passing: float
    below: float
    final: float
    dominant: float
    second_dominant: float
    suspended: float
    opening: float
    upper_final: float


@dataclass(frozen=True, slots=True)
class Hearing:
    """What is known of the precision and the noise of one kind of input.

    Parameters
    ----------
    blur_cents
        Standard deviation of a heard pitch around the degree that is meant.
    noise
        Share of notes that say nothing of the mode: ornaments, slips, errors.
    book_share
        How far the written degree is expected, and not the one usually played: 1 means the book.
    register_power
        Power of the register factor beside the octave-folded one.
    change_power
        Power on a note's evidence in the change filter.
    knows_octave
        Its octave can be relied on: a phrase that ends on the octave of a final has not come to rest
        on it. A recording is often an octave off.
    """

    blur_cents: float
    noise: float
    book_share: float
    register_power: float
    change_power: float
    knows_octave: bool = True


_HEARING = MappingProxyType(
    {
        InputKind.TYPED: Hearing(0.45 * COMMA_CENTS, 0.12, 0.8, 0.15, 2.5),
        InputKind.KEYS: Hearing(0.45 * COMMA_CENTS, 0.12, 0.5, 0.15, 2.5),
        InputKind.TUNED: Hearing(0.60 * COMMA_CENTS, 0.12, 0.5, 0.15, 2.5),
        InputKind.RECORDED: Hearing(1.10 * COMMA_CENTS, 0.25, 0.0, 0.10, 1.5, knows_octave=False),
    }
)

_PRIOR_BY_REPERTOIRE = MappingProxyType(
    {Repertoire.COMMON: 1.0, Repertoire.OCCASIONAL: 0.3, Repertoire.RARE: 0.1}
)


@dataclass(frozen=True)
class ScoringParameters:
    """The constants of the scorer; see docs/mathematics.md for the formulas they stand in.

    Parameters
    ----------
    moving, resting
        Function weights on notes that move on and on notes that the line rests on.
    hearing
        Blur and noise of each kind of input.
    prior_by_repertoire
        Prior weight of a mode by how often the repertoire uses it: a listener expects a common mode
        before a rare one. It weighs little against a phrase, but decides between near-twins.
    same_degree_cents
        Degrees closer than this are one degree.
    opening_margin_cents
        How far outside the opening region a degree still counts as inside.
    below_limit_cents
        Degrees further under the final than this add nothing to the folded scale.
    length_power, longest_s
        A note weighs ``min(length_s, longest_s) ** length_power``.
    memory_mass
        A pitch heard before in this line is expected again, whatever the mode: what the line has
        heard counts beside a mode's own expectation, which has this much weight. Infinite: the
        line has no memory.
    temper, temper_weight, temper_fall
        The posterior uses the log-likelihood times
        ``temper * (1 + W / temper_weight) ** -temper_fall``, W being the summed weight of the notes.
    register_main, register_final, register_dominant, register_opening, register_decay,
    register_noise
        Register: multipliers for a degree of the rising form, for the final, the first dominant
        and the opening region; factor for each degree beyond the octave or under the one below the
        final; share spread over the whole compass.
    closing_notes, closing_power, closing_temper, closing_final, closing_noise
        A phrase end adds ``closing_power`` times the log-likelihood of the last ``closing_notes``
        notes under a distribution with ``closing_final`` of its mass near the final (of which
        ``closing_noise`` is spread evenly) and the rest as resting notes are. It is tempered by no
        more than ``closing_temper``: it was measured at the end of whole melodies.
    change_rate
        Change filter: probability of a change of mode at a note.
    announce_at, announce_notes
        It first announces a mode that held at least this belief for so many notes.
    change_nats, change_notes, change_window
        It announces a change when the gains, weighed by the prior, come to ``change_nats`` together;
        only those count that have risen for ``change_notes`` notes. A seam is looked for among the
        last ``change_window`` notes.
    same_final_nats
        A line that moves to another mode keeps its final more often than not: so much is added to
        the prior of the modes on the same final.
    announce_lead_nats
        The announced mode follows the one that explains the stretch best when that leads by so much.
    stretch_power, stretch_at, stretch_other
        Words for the stretch: its evidence in the change filter is raised to ``stretch_power``; a
        mode is then named alone from a probability of ``stretch_at`` on, and nothing is said while
        the mode that leads the whole line has more than ``stretch_other``.
    decided_at, decided_half, decided_ratio
        A leaning is decided at a probability of ``decided_at``, or from ``decided_half`` on when
        it is ``decided_ratio`` times the rival's.
    among_share, among_most
        Undecided: modes are named until their sum reaches this share, at most so many.
    prior_mass
        Pseudo-weight of theory for the single degrees, then of each order for the next, when
        counts are there.
    counts_power
        Weight of the counts' log-likelihood beside theory's 1; the two are averaged.
    counts_blur_cents
        Standard deviation by which counted pitches are spread.
    """

    moving: FunctionWeights = FunctionWeights(1.0, 0.3, 0.25, 0.33, 1.5, 1.8, 1.5, 1.5, 1.4, 1.25)
    resting: FunctionWeights = FunctionWeights(1.0, 0.3, 0.5, 0.33, 3.0, 3.0, 1.3, 1.5, 1.3, 1.25)
    hearing: Mapping[InputKind, Hearing] = field(default_factory=lambda: _HEARING)
    prior_by_repertoire: Mapping[Repertoire, float] = field(default_factory=lambda: _PRIOR_BY_REPERTOIRE)
    same_degree_cents: float = 1.6 * COMMA_CENTS
    opening_margin_cents: float = 1.0 * COMMA_CENTS
    below_limit_cents: float = 25.0 * COMMA_CENTS
    length_power: float = 0.75
    longest_s: float = 1.0
    memory_mass: float = 50.0
    temper: float = 3.8
    temper_weight: float = 1.0
    temper_fall: float = 0.35
    register_main: float = 2.7
    register_final: float = 1.8
    register_dominant: float = 3.0
    register_opening: float = 3.0
    register_decay: float = 0.9
    register_noise: float = 0.01
    closing_notes: int = 3
    closing_power: float = 2.0
    closing_temper: float = 0.7
    closing_final: float = 0.9
    closing_noise: float = 0.1
    change_rate: float = 0.003
    announce_at: float = 0.6
    announce_notes: int = 3
    change_nats: float = 2.7
    change_notes: int = 4
    change_window: int = 64
    same_final_nats: float = 1.1
    announce_lead_nats: float = 3.0
    stretch_power: float = 0.6
    stretch_at: float = 0.7
    stretch_other: float = 0.1
    decided_at: float = 0.6
    decided_half: float = 0.5
    decided_ratio: float = 2.0
    among_share: float = 0.8
    among_most: int = 4
    prior_mass: tuple[float, ...] = (1000.0, 40.0, 40.0)
    counts_power: float = 1.4
    counts_blur_cents: float = 0.9 * COMMA_CENTS
