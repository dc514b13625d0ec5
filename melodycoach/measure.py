"""Measure a pack on a labelled collection: read it, hear every melody, add the answers up.

The figures do not depend on the number of processes that the melodies are spread over.
"""

from __future__ import annotations

import random
from collections import Counter
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, TypeVar

from melodycoach.core.evaluation import CHECKPOINTS, Evaluation, judge
from melodycoach.core.event import PitchReading
from melodycoach.core.model import build_model
from melodycoach.core.note import InputKind, Mark, hear
from melodycoach.core.owed_trial import TRIAL_NOTES, OwedFigures, OwedTrial, owed_figures, try_owed
from melodycoach.core.parameters import ScoringParameters
from melodycoach.core.seams import (
    SIDE_NOTES,
    Crossing,
    Excerpt,
    SeamFigures,
    cross,
    hear_excerpt,
    seam_figures,
)
from melodycoach.core.tally import tally
from melodycoach.errors import CollectionError, UnknownModeError, UsageError
from melodycoach.parallel import n_cores, spread
from melodycoach.sources.collection import Melody, read_collection

if TYPE_CHECKING:
    from collections.abc import Callable, Iterable, Iterator
    from pathlib import Path

    from melodycoach.core.mode import Mode, ModePack
    from melodycoach.core.model import ScoringModel
    from melodycoach.core.note import Heard
    from melodycoach.core.tally import Verdict

Task = TypeVar("Task")


@dataclass(frozen=True)
class Bench:
    """What melodies are measured against; every process has its own copy.

    Parameters
    ----------
    pack, modes
        The pack, and the modes of it that compete.
    reading, parameters
        As for `build_model`.
    closing
        The end of a melody counts as the end of its last phrase.
    """

    pack: ModePack
    modes: tuple[Mode, ...]
    reading: PitchReading
    parameters: ScoringParameters
    closing: bool
    _models: dict[float | None, ScoringModel] = field(default_factory=dict, repr=False, compare=False)

    def model(self, final_cents: float | None = None) -> ScoringModel:
        """Give the model; ``final_cents`` matters where the final is taken as known."""
        known = final_cents if self.reading is PitchReading.FINAL else None
        if known not in self._models:
            if len(self._models) >= _MODELS_KEPT:
                self._models.clear()
            self._models[known] = build_model(self.pack, self.modes, self.reading, known, self.parameters)
        return self._models[known]

    def hear(self, melody: Melody) -> tuple[Heard, ...]:
        """Give the notes of a melody as the scorer hears them."""
        return hear((*melody.notes, Mark.PHRASE_END) if self.closing else melody.notes)


_LEAST_POOL = 100  # melodies to splice from, so that a few lines still come from more than one mode
_MODELS_KEPT = 64  # finals that differ by cents would otherwise fill the memory


def evaluate_collection(
    path: Path,
    pack: ModePack,
    only: tuple[str, ...] = (),
    reading: PitchReading = PitchReading.WRITTEN,
    kind: InputKind = InputKind.RECORDED,
    *,
    parameters: ScoringParameters | None = None,
    closing: bool = True,
    strict: bool = False,
    on_fault: Callable[[str], None] | None = None,
    workers: int | None = None,
    progress: Callable[[int], None] | None = None,
    seams: int = 0,
    owed: int = 0,
    seed: int = 0,
) -> Evaluation:
    """Measure how well a pack names the modes of a collection.

    Parameters
    ----------
    path
        A collection in JSON lines.
    pack, only
        The pack, and names of the modes that compete; empty: all of the pack.
    reading
        What is taken as known of the final; with ``FINAL`` each melody's own labelled one.
    kind
        Where the pitches came from.
    closing
        Count the end of each melody as the end of a phrase.
    strict
        Stop at the first bad record or unknown label.
    on_fault
        Called with a sentence for every bad record that is skipped, and once for every label that
        the pack does not know. Either way they are counted in the outcome.
    workers
        Processes; None: as many as there are cores. One: all is done in this process.
    progress
        Called with the number of melodies done so far.
    seams
        Number of spliced lines, and of unspliced excerpts, to be heard as well.
    owed
        Number of melodies on which the top owed step is tried.
    seed
        Of the choice of those.

    Raises
    ------
    CollectionError
        The collection cannot be read, or nothing in it can be measured.
    UnknownModeError
        ``only`` names a mode that the pack does not have.
    UsageError
        Spliced lines are asked for with the final given: each half has its own. Owed steps are
        asked for at any pitch, or with one mode alone.
    """
    if seams and reading is PitchReading.FINAL:
        raise UsageError("spliced lines have two finals: measure them as written or at any pitch")
    if owed and reading is PitchReading.ANY:
        raise UsageError("owed steps stand on a known final: measure them as written or with the final given")
    bench = Bench(pack, pack.restrict(only), reading, parameters or ScoringParameters(), closing)
    if owed and len(bench.modes) < 2:
        raise UsageError("owed steps are measured against other modes: let at least two compete")
    workers = workers or n_cores()
    intake = _Intake(path, bench, kind, strict, on_fault or _unheard)
    shorter = [0] * len(CHECKPOINTS)
    n = n_notes = 0

    def counted() -> Iterator[Verdict]:
        nonlocal n, n_notes
        for verdict in spread(bench, _judge, intake.melodies(), workers):
            n += 1
            n_notes += verdict.n_notes
            for place, checkpoint in enumerate(CHECKPOINTS):
                shorter[place] += verdict.n_notes < checkpoint
            if progress is not None:
                progress(n)
            yield verdict

    tallies = tally(counted(), len(bench.modes), len(CHECKPOINTS) + 1)
    if not n:
        raise CollectionError(intake.nothing())
    return Evaluation(
        pack_id=pack.id,
        mode_ids=tuple(mode.id for mode in bench.modes),
        reading=reading,
        kind=kind,
        closing=closing,
        n=n,
        n_notes=n_notes,
        n_shorter=tuple(shorter),
        tallies=tallies,
        n_skipped=intake.n_skipped,
        left_out=dict(sorted(intake.left_out.items())),
        n_without_final=intake.n_without_final,
        seams=_measure_seams(path, bench, kind, workers, seams, seed) if seams else None,
        owed=_measure_owed(path, bench, kind, workers, owed, seed) if owed else None,
    )


class _Intake:
    """The melodies of a file that can be measured, with their labels, and what became of the others."""

    def __init__(
        self,
        path: Path,
        bench: Bench,
        kind: InputKind,
        strict: bool,
        on_fault: Callable[[str], None],
    ) -> None:
        self.path, self.bench, self.kind, self.strict = path, bench, kind, strict
        self.on_fault = on_fault
        self.n_skipped = 0
        self.n_without_final = 0
        self.left_out: Counter[str] = Counter()
        self._place_by_id = {mode.id: place for place, mode in enumerate(bench.modes)}
        self._place_by_label: dict[str, int | None] = {}

    def melodies(self) -> Iterator[tuple[int, Melody]]:
        """Give each melody that can be measured with the place of its mode."""
        reading = read_collection(self.path, kind=self.kind, strict=self.strict, on_fault=self._skipped)
        for melody in reading:
            place = self._place(melody)
            if place is None:
                self.left_out[melody.mode_id] += 1
            elif self.bench.reading is PitchReading.FINAL and melody.final_cents is None:
                self.n_without_final += 1
            else:
                yield place, melody

    def nothing(self) -> str:
        """Say why nothing could be measured."""
        found = ", ".join(repr(label) for label in sorted(self.left_out)[:8])
        if found:
            return (
                f"{self.path}: no melody has the label of a mode that competes; found {found}; "
                "choose another pack or other modes"
            )
        if self.n_without_final:
            return f"{self.path}: no melody has a 'final', which this reading needs"
        return f"{self.path}: no melodies in it, expected JSON lines"

    def _skipped(self, fault: str) -> None:
        self.n_skipped += 1
        self.on_fault(fault)

    def _place(self, melody: Melody) -> int | None:
        label = melody.mode_id
        if label not in self._place_by_label:
            try:
                self._place_by_label[label] = self._place_by_id.get(self.bench.pack.find(label).id)
            except UnknownModeError as error:
                fault = f"{self.path}: melody {melody.id!r}: {error}"
                if self.strict:
                    raise CollectionError(fault) from None
                self.on_fault(f"{fault}; every melody with this label is left out")
                self._place_by_label[label] = None
        return self._place_by_label[label]


def _judge(bench: Bench, task: tuple[int, Melody]) -> Verdict:
    label, melody = task
    return judge(bench.model(melody.final_cents), bench.hear(melody), label, melody.final_cents)


def _measure_seams(
    path: Path, bench: Bench, kind: InputKind, workers: int, count: int, seed: int
) -> SeamFigures:
    """Splice ``count`` lines and cut ``count`` excerpts, at random but the same for one seed."""
    chooser = random.Random(seed)
    intake = _Intake(path, bench, kind, False, _unheard)
    long = ((label, melody) for label, melody in intake.melodies() if len(melody.notes) >= 2 * SIDE_NOTES)
    pool = _sample(long, max(count, _LEAST_POOL), chooser)
    if len({label for label, _ in pool}) < 2:
        raise CollectionError(
            f"{path}: spliced lines need melodies of {2 * SIDE_NOTES} notes or more in two modes, "
            f"found {len(pool)} in {len({label for label, _ in pool})}"
        )

    def part(melody: Melody, length: int) -> tuple[Heard, ...]:
        heard = hear(melody.notes)  # a part does not close
        start = chooser.randrange(len(heard) - length + 1)
        return heard[start : start + length]

    def splices() -> Iterator[tuple[int, tuple[Heard, ...], int, tuple[Heard, ...]]]:
        for _ in range(count):
            first, before = chooser.choice(pool)
            second, after = chooser.choice([entry for entry in pool if entry[0] != first])
            yield first, part(before, SIDE_NOTES), second, part(after, SIDE_NOTES)

    lines = tuple(splices())
    excerpts = tuple(part(chooser.choice(pool)[1], 2 * SIDE_NOTES) for _ in range(count))
    return seam_figures(
        spread(bench, _cross, lines, workers), spread(bench, _excerpt, excerpts, workers), seed
    )


def _cross(bench: Bench, task: tuple[int, tuple[Heard, ...], int, tuple[Heard, ...]]) -> tuple[int, Crossing]:
    first, before, second, after = task
    return first, cross(bench.model(), before, after, second)


def _excerpt(bench: Bench, task: tuple[Heard, ...]) -> Excerpt:
    return hear_excerpt(bench.model(), task)


def _measure_owed(
    path: Path, bench: Bench, kind: InputKind, workers: int, count: int, seed: int
) -> OwedFigures:
    """Try the top owed step on ``count`` melodies, chosen at random but the same for one seed."""
    intake = _Intake(path, bench, kind, False, _unheard)
    long = ((label, melody) for label, melody in intake.melodies() if len(melody.notes) >= TRIAL_NOTES)
    pool = _sample(long, count, random.Random(seed))
    if not pool:
        raise CollectionError(f"{path}: owed steps need melodies of {TRIAL_NOTES} notes or more, found none")
    return owed_figures(spread(bench, _try_owed, pool, workers), seed)


def _try_owed(bench: Bench, task: tuple[int, Melody]) -> OwedTrial | None:
    label, melody = task
    # with a known final there is one hypothesis for each mode, at the mode's place
    return try_owed(bench.model(melody.final_cents), hear(melody.notes)[:TRIAL_NOTES], label)


def _unheard(fault: str) -> None:
    """Pass over a fault that the first reading of the file has told."""


def _sample(items: Iterable[Task], count: int, chooser: random.Random) -> list[Task]:
    """Choose at most ``count`` of a stream, each with the same chance, holding no more than those."""
    kept: list[Task] = []
    for seen, item in enumerate(items):
        if len(kept) < count:
            kept.append(item)
        elif (place := chooser.randrange(seen + 1)) < count:
            kept[place] = item
    return kept
