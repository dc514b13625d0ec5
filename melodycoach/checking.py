"""Written lines and what is asked of them: one file or many, each to its answer.

An answer is the dictionary that `melodycoach.report.check_data` makes; every report is made from it.
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING, Any

from melodycoach.core.check import check_sheet
from melodycoach.core.event import PitchReading
from melodycoach.core.model import build_model
from melodycoach.core.note import Note
from melodycoach.core.sheet import SheetKind
from melodycoach.errors import MelodycoachError, MusicFileError, NoteTextError, UnknownModeError, UsageError
from melodycoach.parallel import n_cores, spread
from melodycoach.reading import STDIN, called, mode_named, read_bytes
from melodycoach.report.check_data import answer_json, failed_json
from melodycoach.sources.sheet_file import ReadOptions, read_sheet

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from melodycoach.core.mode import Mode, ModePack
    from melodycoach.core.model import ScoringModel
    from melodycoach.core.sheet import Sheet

MOST_NOTES = 20_000
"""A line of more notes is not checked: a song has hundreds, and each takes time and memory."""

_MODELS_KEPT = 16  # files with finals of their own would otherwise fill the memory


@dataclass(frozen=True)
class Question:
    """What is asked of every file; a helper process has its own copy.

    Parameters
    ----------
    pack, modes
        The pack, and the modes of it that compete.
    reading, final_cents
        What is known of the final; None for the reading: what the file itself says.
    target
        The mode that is aimed at; None: what the file itself says.
    stay_in
        The mode that a line is asked to stay in; it is then the target, too.
    options
        Which line of a file, where it holds more than one.
    strict
        Refuse options that say nothing of a file; else pass over them.
    debug
        Raise what is wrong with a file in place of answering with it.

    Raises
    ------
    UsageError
        The target does not compete, or is another mode than that of ``stay_in``.
    """

    pack: ModePack
    modes: tuple[Mode, ...]
    reading: PitchReading | None = None
    final_cents: float | None = None
    target: Mode | None = None
    stay_in: Mode | None = None
    options: ReadOptions = field(default_factory=ReadOptions)
    strict: bool = True
    debug: bool = False
    _models: dict[tuple[PitchReading, float | None], ScoringModel] = field(
        default_factory=dict, repr=False, compare=False
    )

    def __post_init__(self) -> None:
        """Refuse what cannot be asked."""
        if self.target is not None and self.stay_in is not None and self.target.id != self.stay_in.id:
            raise UsageError(
                f"a line that is to stay in {self.stay_in.name} aims at it, and not at {self.target.name}; "
                "name one mode"
            )
        aim = self.stay_in or self.target
        if aim is not None and not self.competes(aim):
            raise UsageError(f"{aim.name} is not among the modes that compete; name it with the others")

    def competes(self, mode: Mode) -> bool:
        """Tell whether a mode is among those that compete."""
        return any(one.id == mode.id for one in self.modes)

    def model_for(self, sheet: Sheet) -> ScoringModel:
        """Give the scoring model: for the final that is known, or that the file names."""
        reading, final_cents = self.reading, self.final_cents
        if reading is None:
            final_cents = sheet.final_cents
            reading = PitchReading.WRITTEN if final_cents is None else PitchReading.FINAL
        key = (reading, final_cents)
        if key not in self._models:
            if len(self._models) >= _MODELS_KEPT:
                self._models.clear()
            self._models[key] = build_model(self.pack, self.modes, reading, final_cents)
        return self._models[key]


def answers(question: Question, files: Sequence[str], workers: int | None = None) -> Iterator[dict[str, Any]]:
    """Answer for each file in turn; one that cannot be read has the reason in place of an answer.

    Parameters
    ----------
    question
        What is asked.
    files
        Paths, or `STDIN` for what is piped in.
    workers
        Processes at most; None: as many as there are cores.

    Raises
    ------
    MelodycoachError
        A helper process ended before its time.
    """
    piped = {STDIN: _taken(STDIN)} if STDIN in files else {}  # a helper process is not the one piped into
    tasks = ((name, piped.get(name)) for name in files)
    return spread(question, answer_task, tasks, workers or n_cores())


def answer(question: Question, name: str) -> dict[str, Any]:
    """Answer for one file."""
    return answer_task(question, (name, None))


def answer_task(question: Question, task: tuple[str, bytes | MelodycoachError | None]) -> dict[str, Any]:
    """Answer for one file, or for its bytes where they are there already."""
    name, data = task
    where = called(name)
    try:
        if isinstance(data, MelodycoachError):
            raise data
        sheet = read_sheet(
            read_bytes(name) if data is None else data,
            where,
            question.pack.names,
            question.options,
            strict=question.strict,
        )
        sheet, target = aim_of(question, sheet, where)
        checked = check_sheet(question.model_for(sheet), sheet, target)
        return answer_json(checked, where, question.stay_in)
    except MelodycoachError as error:
        if question.debug:
            raise
        return failed_json(where, error)


def _taken(name: str) -> bytes | MelodycoachError:
    try:
        return read_bytes(name)
    except MelodycoachError as error:
        return error


def aim_of(question: Question, sheet: Sheet, where: str) -> tuple[Sheet, Mode | None]:
    """Give the mode that a line aims at: what is asked wins over what the file says of itself.

    Returns
    -------
    Sheet, Mode or None
        The sheet says more than before where its own mode is passed over.

    Raises
    ------
    NoteTextError, MusicFileError
        There are no notes in it, or more than `MOST_NOTES`.
    UnknownModeError
        Note text names a mode that the pack does not have.
    """
    n_notes = sum(isinstance(item, Note) for item in sheet.items)
    wrong = NoteTextError if sheet.kind is SheetKind.NOTE_TEXT else MusicFileError
    if not n_notes:
        raise wrong(f"{where}: no notes in it, expected at least one")
    if n_notes > MOST_NOTES:
        raise wrong(
            f"{where}: a line of {n_notes:,} notes, expected at most {MOST_NOTES:,}; "
            "cut it into parts and check each of them"
        )
    asked = question.stay_in or question.target
    if asked is not None or not sheet.mode:
        return sheet, asked
    try:
        mode, sentence = mode_named(question.pack, sheet.kind, sheet.mode)
    except UnknownModeError as error:
        raise UnknownModeError(f"{where}: header 'mode': {error}") from error
    if mode is not None and question.competes(mode):
        return sheet, mode
    sentence = sentence or f"its mode, {sheet.mode}, is not among those that compete: it is passed over"
    return replace(sheet, says=(*sheet.says, sentence)), None
