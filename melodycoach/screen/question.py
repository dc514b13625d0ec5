"""Questions: one line to type an answer in, with names offered as it is typed.

Conventions
-----------
A question that is asked is a value; every key gives a new one. The answer is handed over as a
command, and the question stays until that is carried out: a refusal is shown in it.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from enum import StrEnum
from typing import TYPE_CHECKING

from melodycoach.core.pitch import fold_name
from melodycoach.screen.command import Command, Open, Save, SetFinal, SetOnly, SetPort, SetTarget

if TYPE_CHECKING:
    from collections.abc import Sequence

    from melodycoach.screen.view import Refusal


class QuestionKind(StrEnum):
    """What is asked for."""

    TARGET = "target"
    FINAL = "final"
    ONLY = "only"
    PORT = "port"
    SAVE = "save"
    OPEN = "open"


LABELS = {
    QuestionKind.TARGET: "aim at which mode?",
    QuestionKind.FINAL: "where is the final?",
    QuestionKind.ONLY: "which modes compete?",
    QuestionKind.PORT: "listen to which input?",
    QuestionKind.SAVE: "save as which file?",
    QuestionKind.OPEN: "open which file?",
}

ADVICE = {
    QuestionKind.TARGET: "Enter with nothing typed: no aim",
    QuestionKind.FINAL: "a pitch; written: each mode's own final; any: unknown",
    QuestionKind.ONLY: "names with commas between; nothing: all modes",
    QuestionKind.PORT: "part of its name will do; Esc goes back",
    QuestionKind.SAVE: "a path; the line is written as note text; Ctrl-U empties, Esc goes back",
    QuestionKind.OPEN: "a path: note text, a MIDI file or MusicXML; Esc goes back",
}

UNANSWERED = {
    QuestionKind.SAVE: "nothing typed, expected a path such as line.txt; Esc goes back and saves nothing",
    QuestionKind.OPEN: "nothing typed, expected the path of a file; Esc goes back and opens nothing",
}
"""What is said where Enter is pressed with nothing typed; other questions then just close."""


@dataclass(frozen=True, slots=True)
class Question:
    """A question being answered.

    ``choices`` are the names on offer; ``picked`` counts among those that fit what is typed.
    ``awaited`` is the number of the command that carries the answer, 0 while it is typed.
    """

    kind: QuestionKind
    choices: tuple[str, ...] = ()
    text: str = ""
    cursor: int = 0
    picked: int | None = None
    complaint: str = ""
    awaited: int = 0

    @property
    def label(self) -> str:
        """The question itself."""
        return LABELS[self.kind]

    @property
    def advice(self) -> str:
        """What to type."""
        return ADVICE[self.kind]


def ask(kind: QuestionKind, choices: Sequence[str]) -> Question:
    """Begin a question; in that of where to save, the first choice is typed already.

    >>> ask(QuestionKind.SAVE, ("sketch.txt",)).text
    'sketch.txt'
    """
    typed_already = choices[0] if kind is QuestionKind.SAVE and choices else ""
    offered_too = choices[1:] if typed_already else choices
    return Question(kind, tuple(offered_too), typed_already, len(typed_already))


def offered(question: Question) -> tuple[str, ...]:
    """Give the choices that fit what is typed: those that begin so, then those that contain it.

    >>> offered(ask(QuestionKind.TARGET, ("Beyâtî", "Hüseynî", "Hüzzam")))
    ('Beyâtî', 'Hüseynî', 'Hüzzam')
    >>> offered(typed(ask(QuestionKind.TARGET, ("Beyâtî", "Hüseynî", "Hüzzam")), "huz"))
    ('Hüzzam',)
    """
    _, part = _parts(question)
    if question.kind in {QuestionKind.SAVE, QuestionKind.OPEN}:
        return tuple(choice for choice in question.choices if choice.startswith(part))
    wanted = fold_name(part)
    starting = [choice for choice in question.choices if fold_name(choice).startswith(wanted)]
    within = [c for c in question.choices if wanted in fold_name(c) and c not in starting]
    return (*starting, *within)


def _parts(question: Question) -> tuple[str, str]:
    """Split what is typed into what stands and what is being completed."""
    if question.kind is not QuestionKind.ONLY:
        return "", question.text
    before, comma, part = question.text.rpartition(",")
    space = part[: len(part) - len(part.lstrip())]
    return before + comma + space, part.strip()


def typed(question: Question, new: str) -> Question:
    """Type or paste text at the cursor."""
    return _edited(question, question.cursor, question.cursor, new)


def erased_before(question: Question) -> Question:
    """Take away the character before the cursor."""
    return _edited(question, max(question.cursor - 1, 0), question.cursor, "")


def erased_after(question: Question) -> Question:
    """Take away the character after the cursor."""
    return _edited(question, question.cursor, question.cursor + 1, "")


def cleared(question: Question) -> Question:
    """Take everything typed away."""
    return _edited(question, 0, len(question.text), "")


def _edited(question: Question, lo: int, hi: int, new: str) -> Question:
    if question.awaited:
        return question
    new = "".join(character for character in new if character.isprintable())
    text = question.text[:lo] + new + question.text[hi:]
    return replace(question, text=text, cursor=lo + len(new), picked=None, complaint="")


def moved(question: Question, step: int) -> Question:
    """Move the cursor by so many characters, as far as it goes."""
    return replace(question, cursor=min(max(question.cursor + step, 0), len(question.text)))


def moved_to_start(question: Question) -> Question:
    """Move the cursor before what is typed."""
    return replace(question, cursor=0)


def moved_to_end(question: Question) -> Question:
    """Move the cursor behind what is typed."""
    return replace(question, cursor=len(question.text))


def picked_next(question: Question, step: int) -> Question:
    """Pick the next choice (``step`` 1) or the one before (-1), round and round."""
    choices = offered(question)
    if not choices or question.awaited:
        return question
    start = -1 if step > 0 else 0
    here = start if question.picked is None else question.picked
    return replace(question, picked=(here + step) % len(choices), complaint="")


def completed(question: Question) -> Question:
    """Take the picked choice into the text; with none picked, the single one that fits."""
    choices = offered(question)
    if question.awaited or not choices:
        return question
    if question.picked is None and len(choices) > 1:
        return picked_next(question, 1)
    standing, _ = _parts(question)
    text = standing + choices[question.picked or 0]
    return replace(question, text=text, cursor=len(text), picked=None, complaint="")


def answer(question: Question, number: int) -> Command | None:
    """Turn what is typed into a command with this number; None if nothing is asked for."""
    text = question.text
    if question.picked is not None or _means_one(question):
        text = completed(question).text
    text = text.strip()
    match question.kind:
        case QuestionKind.TARGET:
            return SetTarget(text or None, number)
        case QuestionKind.FINAL:
            return SetFinal(text, number) if text else None
        case QuestionKind.ONLY:
            return SetOnly(text, number)
        case QuestionKind.PORT:
            return SetPort(text, number) if text else None
        case QuestionKind.SAVE:
            return Save(text, number) if text else None
        case QuestionKind.OPEN:
            return Open(text, number) if text else None


def unanswered(question: Question) -> Question | None:
    """Give what a question becomes where Enter is pressed and nothing is asked for: None, it closes."""
    complaint = UNANSWERED.get(question.kind)
    return replace(question, complaint=complaint) if complaint else None


def _means_one(question: Question) -> bool:
    """Whether a beginning, or a part, of a name stands for the only choice that it fits."""
    named = question.kind in {QuestionKind.TARGET, QuestionKind.ONLY, QuestionKind.PORT}
    part = fold_name(_parts(question)[1])
    fitting = offered(question)
    return named and bool(part) and len(fitting) == 1 and fold_name(fitting[0]) != part


def answer_arrived(question: Question, handled: int, refusals: Sequence[Refusal]) -> Question | None:
    """Take in what became of the answer: None when it was carried out, a complaint when not."""
    if not question.awaited or handled < question.awaited:
        return question
    for refusal in refusals:
        if refusal.number == question.awaited:
            return replace(question, awaited=0, complaint=refusal.sentence)
    return None
