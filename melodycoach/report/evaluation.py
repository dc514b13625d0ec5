"""An evaluation on paper: text for people, JSON for programs. The protocol comes with the figures."""

from __future__ import annotations

import math
import textwrap
from typing import TYPE_CHECKING, Any

from melodycoach.core.evaluation import CHECKPOINTS
from melodycoach.core.event import PitchReading
from melodycoach.core.owed_trial import TRIAL_NOTES
from melodycoach.core.seams import SIDE_NOTES
from melodycoach.core.tally import LISTED, N_BINS, confused_pairs

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from melodycoach.core.arrays import IntArray
    from melodycoach.core.evaluation import Evaluation
    from melodycoach.core.owed_trial import OwedFigures
    from melodycoach.core.seams import SeamFigures
    from melodycoach.core.tally import Tally

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
_TIED = "\u00a0"  # a space at which no line is broken


def protocol(evaluation: Evaluation) -> tuple[str, ...]:
    """Say in sentences how the figures came about."""
    ends_sooner = ", ".join(
        f"{n} before note {checkpoint}"
        for n, checkpoint in zip(evaluation.n_shorter, CHECKPOINTS, strict=True)
        if n
    )
    shorter = f"Melodies that end before a checkpoint ({ends_sooner}) count there with their last answer."
    closing = "The answer after all notes counts the end of the melody as the end of a phrase."
    compete = f"{len(evaluation.mode_ids)} modes of pack {evaluation.pack_id!r} compete"
    finals = "A final is found when it is within a good comma of the label, in any octave."
    lines = [
        "Each melody is heard note by note, by the same scorer as a live line; nothing is learned from it.",
        f"Input: {evaluation.kind}. Final: {_READING[evaluation.reading]}.",
        f"{compete}; the answer is the likeliest one, decided or not.",
        shorter if ends_sooner else "",
        closing if evaluation.closing else closing.replace("counts", "does not count"),
        "Macro-F1 is the mean over the modes that occur as labels.",
        f"Calibration error: the expected one, in {N_BINS} bins of equal width by the answer's probability.",
        finals if evaluation.reading is PitchReading.ANY else "",
    ]
    labels = ", ".join(_slug(label) for label in evaluation.left_out)
    for n, why in (
        (evaluation.n_skipped, "could not be read"),
        (sum(evaluation.left_out.values()), f"have labels that do not compete ({labels})"),
        (evaluation.n_without_final, "have no final"),
    ):
        lines.append(f"Left out: {_counted(n)} that {why}." if n else "")
    return tuple(line for line in lines if line)


def _counted(n: int) -> str:
    return f"{n} {'melody' if n == 1 else 'melodies'}"


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
    if evaluation.owed is not None:
        found["owed"] = _owed_json(evaluation.owed)
    found["protocol"] = list(protocol(evaluation))
    return found


def _seams_json(seams: SeamFigures) -> dict[str, Any]:
    return {
        "n": seams.n_seams,
        "seed": seams.seed,
        "noticed": _plain(seams.noticed),
        "noticed_by_chance": _plain(seams.noticed_by_chance),
        "median_delay_notes": _plain(seams.median_delay),
        "right_before": _plain(seams.right_before),
        "named": _plain(seams.named),
        "excerpts": seams.n_excerpts,
        "false_alarms_per_100_notes": _plain(seams.false_alarms_per_100),
    }


def _owed_json(owed: OwedFigures) -> dict[str, Any]:
    return {
        "n": owed.n,
        "seed": owed.seed,
        "nothing_owed": owed.n_nothing_owed,
        "after_notes": TRIAL_NOTES,
        "step_nats": _plain(owed.step_nats),
        "walk_nats": _plain(owed.walk_nats),
        "ratio": _plain(owed.ratio),
        "walks_beaten": _plain(owed.walk_beaten),
    }


def _plain(figure: float) -> float | None:
    return None if math.isnan(figure) else round(figure, 6)


def evaluation_text(evaluation: Evaluation, columns: int = 80) -> str:
    """Lay an evaluation out for a reader; no line is longer than ``columns`` (at least 60)."""
    columns = max(columns, 60)
    parts = [
        f"{_counted(evaluation.n)}, {evaluation.n_notes} notes",
        _protocol_text(evaluation, columns),
        _figures_text(evaluation),
        _reliability_text(evaluation),
        _confusion_text(evaluation, columns),
        _pairs_text(evaluation, columns),
    ]
    if evaluation.seams is not None:
        parts.append(_seams_text(evaluation.seams, columns))
    if evaluation.owed is not None:
        parts.append(_owed_text(evaluation.owed, columns))
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
    lines.append(f"(one standard error of the accuracy after all notes: {error:.3f})")
    return "\n".join(lines)


def _field(figure: float) -> str:
    return f"{'–' if math.isnan(figure) else f'{figure:.3f}':>{_FIELD}}"


def _reliability_text(evaluation: Evaluation) -> str:
    tallies = evaluation.tally_by_checkpoint
    lines = [
        "Reliability: probability said, share right, number of melodies",
        f"{'probability':<11}" + "".join(f"{name + ' notes':>17}" for name in tallies),
        " " * 11 + f"{'said':>6}{'right':>6}{'n':>5}" * len(tallies),
    ]
    for k in range(N_BINS):
        row = f"{k / N_BINS:.1f} to {(k + 1) / N_BINS:.1f} "
        for tally in tallies.values():
            one = tally.reliability[k]
            row += f"{one.probability:>6.2f}{one.accuracy:>6.2f}{one.n:>5}" if one.n else f"{'–':>17}"
        lines.append(row)
    return "\n".join(lines)


def _slug(mode_id: str) -> str:
    return mode_id.rpartition("/")[2]


def _confusion_text(evaluation: Evaluation, columns: int) -> str:
    """Draw the answers after all notes: as a matrix if it fits, else as a list."""
    confusion = evaluation.tally_by_checkpoint["all"].confusion
    labelled = [place for place in range(len(confusion)) if confusion[place].any()]
    occurs = [place for place in range(len(confusion)) if place in labelled or confusion[:, place].any()]
    slugs = [_slug(mode_id) for mode_id in evaluation.mode_ids]
    width = max(3, len(str(int(confusion.max()))) + 1)
    name_width = max(len(slugs[place]) for place in occurs)
    if name_width + 4 + width * len(occurs) > columns:
        return _confusion_list(confusion, labelled, slugs, name_width, columns)
    number_by_place = {place: number for number, place in enumerate(occurs, 1)}
    lines = [
        "Answers after all notes: rows are labels, columns answers",
        " " * (name_width + 4) + "".join(f"{number_by_place[place]:>{width}}" for place in occurs),
    ]
    for place in labelled:
        cells = "".join(_cell(int(confusion[place, other]), width) for other in occurs)
        lines.append(f"{number_by_place[place]:>3} {slugs[place]:<{name_width}}{cells}")
    never = [f"{number_by_place[p]} {slugs[p]}" for p in occurs if p not in labelled]
    if never:
        lines.append(_wrapped(f"Answers that no melody has as its label: {', '.join(never)}", columns))
    return "\n".join(lines)


def _confusion_list(
    confusion: IntArray, labelled: Sequence[int], slugs: Sequence[str], name_width: int, columns: int
) -> str:
    lines = ["Answers after all notes: label, named rightly, named instead"]
    for place in labelled:
        row = confusion[place]
        wrong = sorted((o for o in range(len(row)) if row[o] and o != place), key=lambda o: -int(row[o]))
        head = f"  {slugs[place]:<{name_width}} {row[place]:>5} of {row.sum():<6}"
        instead = ", ".join(f"{slugs[other]}{_TIED}{row[other]}" for other in wrong) or "–"
        text = textwrap.fill(instead, columns, initial_indent=head, subsequent_indent=" " * len(head))
        lines.append(text.replace(_TIED, " "))
    return "\n".join(lines)


def _cell(count: int, width: int) -> str:
    return f"{count or '·':>{width}}"


def _pairs_text(evaluation: Evaluation, columns: int) -> str:
    confusion = evaluation.tally_by_checkpoint["all"].confusion
    pairs = confused_pairs(confusion, _N_PAIRS)
    if not pairs:
        return "No melody is named wrongly after all notes."
    lines = ["Confused most after all notes"]
    for pair in pairs:
        ways = [
            f"{_slug(evaluation.mode_ids[label])} named {_slug(evaluation.mode_ids[answer])} "
            f"{confusion[label, answer]} of {confusion[label].sum()}"
            for label, answer in ((pair.first, pair.second), (pair.second, pair.first))
            if confusion[label, answer]
        ]
        lines.append(textwrap.fill("; ".join(ways), columns, initial_indent="  ", subsequent_indent="    "))
    return "\n".join(lines)


def _rows_text(rows: Sequence[tuple[str, str]]) -> list[str]:
    return [f"{title:<{_LABEL + 8}}{figure:>{_FIELD}}" for title, figure in rows]


def _seams_text(seams: SeamFigures, columns: int) -> str:
    how = (
        f"{seams.n_seams} lines of {SIDE_NOTES} notes of one melody and {SIDE_NOTES} of another, of another "
        f"mode; {seams.n_excerpts} excerpts of {2 * SIDE_NOTES} notes without a seam (seed {seams.seed}). "
        "Melodies may change mode themselves, so the false alarms are an upper bound."
    )
    rows = (
        ("seams noticed", _field(seams.noticed)),
        ("noticed where there is none", _field(seams.noticed_by_chance)),
        ("median delay, notes", "–" if math.isnan(seams.median_delay) else f"{seams.median_delay:g}"),
        ("first mode named at the seam", _field(seams.right_before)),
        ("… and then the second one", _field(seams.named)),
        ("false alarms in 100 notes", _field(seams.false_alarms_per_100)),
    )
    return "\n".join(["Change of mode", _wrapped(how, columns), *_rows_text(rows)])


def _owed_text(owed: OwedFigures, columns: int) -> str:
    how = (
        f"After {TRIAL_NOTES} notes of {_counted(owed.n)} (seed {owed.seed}), with the labelled mode as "
        "the target, the step that is put first is played, and every walk of its length along its degrees. "
        "Gains are in log-odds of the labelled mode against all others, in nats."
    )
    rows = (
        ("mean gain of the step", _field(owed.step_nats)),
        ("mean gain of a walk", _field(owed.walk_nats)),
        ("ratio", _field(owed.ratio)),
        ("walks that add less", _field(owed.walk_beaten)),
    )
    return "\n".join(["Owed steps", _wrapped(how, columns), *_rows_text(rows)])
