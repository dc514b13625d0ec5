"""An evaluation on paper: text for people, JSON for programs. The protocol comes with the figures."""

from __future__ import annotations

import math
import textwrap
from typing import TYPE_CHECKING, Any

from melodycoach.core.evaluation import CHECKPOINTS
from melodycoach.core.event import PitchReading
from melodycoach.core.seams import SIDE_NOTES
from melodycoach.core.tally import LISTED, N_BINS, confused_pairs

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from melodycoach.core.evaluation import Evaluation
    from melodycoach.core.seams import SeamFigures
    from melodycoach.core.tally import IntArray, Tally

_READING = {
    PitchReading.WRITTEN: "each mode stands on its own written final",
    PitchReading.FINAL: "the labelled final of each melody is given",
    PitchReading.ANY: "every mode may stand on every pitch",
}

_ROWS: tuple[tuple[str, str, Callable[[Tally], float]], ...] = (
    ("accuracy", "accuracy", lambda t: t.accuracy),
    ("macro_f1", "macro-F1", lambda t: t.macro_f1),
    (f"top{LISTED}", f"label among the first {LISTED}", lambda t: t.listed),
    ("undecided", "share undecided", lambda t: t.undecided),
    ("decided_accuracy", "accuracy when decided", lambda t: t.decided_accuracy),
    ("ece", "calibration error", lambda t: t.calibration_error),
    ("log_loss", "log loss, nats", lambda t: t.log_loss),
)
_FINAL_ROWS: tuple[tuple[str, str, Callable[[Tally], float]], ...] = (
    ("final_found", "final found", lambda t: t.final_found),
    ("mode_and_final", "mode and final right", lambda t: t.both_found),
)

_N_PAIRS = 10


def protocol(evaluation: Evaluation) -> tuple[str, ...]:
    """Say in sentences how the figures came about."""
    short = ", ".join(
        f"{n} before {checkpoint}" for n, checkpoint in zip(evaluation.n_shorter, CHECKPOINTS, strict=True) if n
    )
    lines = [
        "Every melody is heard note by note, by the same scorer as a live line; nothing is learned from it.",
        f"Input: {evaluation.kind}. Final: {_READING[evaluation.reading]}.",
        f"{len(evaluation.mode_ids)} modes of pack '{evaluation.pack_id}' compete, all as likely at the start.",
        "The answer is the likeliest mode, decided or not. "
        + (
            f"A melody that ends sooner counts with its answer at its end ({short})."
            if short
            else f"No melody is shorter than {CHECKPOINTS[-1]} notes."
        ),
        "'All notes' "
        + (
            "counts the end of the melody as the end of a phrase."
            if evaluation.closing
            else "does not count the end of the melody as the end of a phrase."
        ),
        "Macro-F1 is the mean over the modes that occur as labels. Calibration error: "
        f"{N_BINS} bins of equal width, by the probability of the answer.",
    ]
    if evaluation.reading is PitchReading.ANY:
        lines.append("A final is found when it is within a good comma of the label, in any octave.")
    left_out = sum(evaluation.left_out.values())
    for n, why in (
        (evaluation.n_skipped, "could not be read"),
        (left_out, "have labels that do not compete: " + ", ".join(_slug(m) for m in evaluation.left_out)),
        (evaluation.n_without_final, "have no final"),
    ):
        if n:
            lines.append(f"Left out: {n} melodies that {why}.")
    return tuple(lines)


def evaluation_json(evaluation: Evaluation) -> dict[str, Any]:
    """Give an evaluation as JSON values; a figure of nothing is null."""
    by_checkpoint = evaluation.tally_by_checkpoint
    rows = _ROWS + (_FINAL_ROWS if evaluation.reading is PitchReading.ANY else ())
    found: dict[str, Any] = {
        "n": evaluation.n,
        "as": str(evaluation.reading),
        "notes": evaluation.n_notes,
        "input": str(evaluation.kind),
        "pack": evaluation.pack_id,
        "modes": list(evaluation.mode_ids),
        "closing": evaluation.closing,
    }
    for key, _, figure in rows:
        found[key] = {name: _plain(figure(tally)) for name, tally in by_checkpoint.items()}
    found["reliability"] = {
        name: [
            {
                "from": one.low,
                "to": one.high,
                "n": one.n,
                "probability": _plain(one.probability),
                "accuracy": _plain(one.accuracy),
            }
            for one in tally.reliability
        ]
        for name, tally in by_checkpoint.items()
    }
    found["confusion"] = {name: tally.confusion.tolist() for name, tally in by_checkpoint.items()}
    found["confused"] = [
        {
            "modes": [evaluation.mode_ids[pair.first], evaluation.mode_ids[pair.second]],
            "first_as_second": pair.first_as_second,
            "second_as_first": pair.second_as_first,
        }
        for pair in confused_pairs(by_checkpoint["all"].confusion, _N_PAIRS)
    ]
    found["shorter"] = dict(zip(map(str, CHECKPOINTS), evaluation.n_shorter, strict=True))
    found["skipped"] = evaluation.n_skipped
    found["left_out"] = dict(evaluation.left_out)
    found["without_final"] = evaluation.n_without_final
    if evaluation.seams is not None:
        found["seams"] = _seams_json(evaluation.seams)
    found["protocol"] = list(protocol(evaluation))
    return found


def _seams_json(seams: SeamFigures) -> dict[str, Any]:
    return {
        "n": seams.n_seams,
        "seed": seams.seed,
        "noticed": _plain(seams.noticed),
        "median_delay_notes": _plain(seams.median_delay),
        "right_before": _plain(seams.right_before),
        "named": _plain(seams.named),
        "excerpts": seams.n_excerpts,
        "false_alarms_per_100_notes": _plain(seams.false_alarms_per_100),
    }


def _plain(figure: float) -> float | None:
    return None if math.isnan(figure) else round(figure, 6)


def evaluation_text(evaluation: Evaluation, columns: int = 80) -> str:
    """Lay an evaluation out for a reader; no line is longer than ``columns`` (at least 60)."""
    columns = max(columns, 60)
    parts = [
        f"{evaluation.n} melodies, {evaluation.n_notes} notes",
        _protocol_text(evaluation, columns),
        _figures_text(evaluation),
        _reliability_text(evaluation),
        _confusion_text(evaluation, columns),
        _pairs_text(evaluation),
    ]
    if evaluation.seams is not None:
        parts.append(_seams_text(evaluation.seams, columns))
    return "\n\n".join(parts) + "\n"


def _wrapped(text: str, columns: int) -> str:
    return textwrap.fill(text, columns - 2, initial_indent="  ", subsequent_indent="  ")


def _protocol_text(evaluation: Evaluation, columns: int) -> str:
    return "How it was measured\n" + "\n".join(_wrapped(line, columns) for line in protocol(evaluation))


_LABEL = 24
_FIELD = 8


def _figures_text(evaluation: Evaluation) -> str:
    tallies = evaluation.tally_by_checkpoint
    lines = [f"{'after':<{_LABEL}}" + "".join(f"{name:>{_FIELD}}" for name in tallies) + "  notes"]
    rows = _ROWS + (_FINAL_ROWS if evaluation.reading is PitchReading.ANY else ())
    for _, title, figure in rows:
        lines.append(f"{title:<{_LABEL}}" + "".join(_field(figure(tally)) for tally in tallies.values()))
    error = tallies["all"].accuracy_error
    lines.append(f"One standard error of the last accuracy is {error:.3f}: smaller differences are chance.")
    return "\n".join(lines)


def _field(figure: float) -> str:
    return f"{'–' if math.isnan(figure) else f'{figure:.3f}':>{_FIELD}}"


def _reliability_text(evaluation: Evaluation) -> str:
    tallies = evaluation.tally_by_checkpoint
    lines = [
        "Reliability: what was said of the answer, how often it was right, in how many melodies",
        f"{'probability':<11}" + "".join(f"{name + ' notes':>17}" for name in tallies),
        " " * 11 + "    said right   n" * len(tallies),
    ]
    for k in range(N_BINS):
        row = f"{k / N_BINS:.1f} to {(k + 1) / N_BINS:.1f} "
        for tally in tallies.values():
            one = tally.reliability[k]
            row += f"    {one.probability:.2f}  {one.accuracy:.2f}{one.n:>4}" if one.n else f"{'–':>17}"
        lines.append(row)
    return "\n".join(lines)


def _slug(mode_id: str) -> str:
    return mode_id.rpartition("/")[2]


def _confusion_text(evaluation: Evaluation, columns: int) -> str:
    """Draw the confusion after all notes: the modes that occur, named by number in the head."""
    confusion = evaluation.tally_by_checkpoint["all"].confusion
    labelled = [place for place in range(len(confusion)) if confusion[place].any()]
    answered = [place for place in range(len(confusion)) if confusion[:, place].any() or place in labelled]
    number_by_place = {place: number for number, place in enumerate(answered, 1)}
    width = max(3, len(str(int(confusion.max()))) + 1)
    name_width = max(len(_slug(evaluation.mode_ids[place])) for place in answered)
    room = (columns - name_width - 5) // width
    shown, others = _columns_that_fit(confusion, labelled, answered, room)
    head = [f"{number_by_place[place]:>{width}}" for place in shown] + ([f"{'…':>{width}}"] if others else [])
    lines = ["Answers after all notes: rows are labels, columns answers", " " * (name_width + 4) + "".join(head)]
    for place in labelled:
        cells = [_cell(int(confusion[place, other]), width) for other in shown]
        if others:
            cells.append(_cell(int(confusion[place, others].sum()), width))
        name = _slug(evaluation.mode_ids[place])
        lines.append(f"{number_by_place[place]:>3} {name:<{name_width}}" + "".join(cells))
    if others:
        lines.append(f"  … {len(others)} more answers")
    unlabelled = [place for place in shown if place not in labelled]
    if unlabelled:
        names = ", ".join(f"{number_by_place[p]} {_slug(evaluation.mode_ids[p])}" for p in unlabelled)
        lines.append(_wrapped(f"Answers that no melody has as its label: {names}", columns))
    return "\n".join(lines)


def _columns_that_fit(
    confusion: IntArray, labelled: Sequence[int], answered: Sequence[int], room: int
) -> tuple[list[int], list[int]]:
    """Choose the answers with a column of their own: labels first, then the most frequent ones."""
    if len(answered) <= room:
        return list(answered), []
    ranked = sorted(answered, key=lambda p: (p not in labelled, -int(confusion[:, p].sum()), p))
    kept = set(ranked[: room - 1])
    return [p for p in answered if p in kept], [p for p in answered if p not in kept]


def _cell(count: int, width: int) -> str:
    return f"{count or '·':>{width}}"


def _pairs_text(evaluation: Evaluation) -> str:
    confusion = evaluation.tally_by_checkpoint["all"].confusion
    pairs = confused_pairs(confusion, _N_PAIRS)
    if not pairs:
        return "No melody is named wrongly after all notes."
    lines = ["Confused most after all notes: first named second, second named first, of how many"]
    for pair in pairs:
        names = f"{_slug(evaluation.mode_ids[pair.first])} – {_slug(evaluation.mode_ids[pair.second])}"
        n_first, n_second = int(confusion[pair.first].sum()), int(confusion[pair.second].sum())
        lines.append(
            f"  {names:<36}{pair.first_as_second:>6} of {n_first:<6}{pair.second_as_first:>6} of {n_second}"
        )
    return "\n".join(lines)


def _seams_text(seams: SeamFigures, columns: int) -> str:
    how = (
        f"{seams.n_seams} lines of {SIDE_NOTES} notes of one melody and {SIDE_NOTES} of another, of another "
        f"mode; {seams.n_excerpts} excerpts of {2 * SIDE_NOTES} notes without a seam (seed {seams.seed}). "
        "Melodies may change mode themselves, so the false alarms are an upper bound."
    )
    delay = "–" if math.isnan(seams.median_delay) else f"{seams.median_delay:g}"
    return "\n".join(
        [
            "Change of mode",
            _wrapped(how, columns),
            f"{'seams noticed':<{_LABEL + 8}}{_field(seams.noticed)}",
            f"{'median delay, notes':<{_LABEL + 8}}{delay:>{_FIELD}}",
            f"{'first mode named at the seam':<{_LABEL + 8}}{_field(seams.right_before)}",
            f"{'… and then the second one':<{_LABEL + 8}}{_field(seams.named)}",
            f"{'false alarms in 100 notes':<{_LABEL + 8}}{_field(seams.false_alarms_per_100)}",
        ]
    )
