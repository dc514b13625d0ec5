"""The desk: what lies before the player, beside what the session shows, and what keys do to it.

Conventions
-----------
`Desk` is the one thing in `screen` that changes: it holds the latest view, the entry, a question
and the help, each of them a value, and lives in the thread that draws. It knows no terminal; each
key calls one of its methods, and commands go out through ``send``.
"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from melodycoach.screen import entry as typing
from melodycoach.screen import entry_edit, entry_merge
from melodycoach.screen import question as asking
from melodycoach.screen.command import Fresh, Redo, ReplaceText, Undo
from melodycoach.screen.draw import draw_help, help_lines, picture, standing_words
from melodycoach.screen.entry_lines import Drawn, moved_up_or_down
from melodycoach.screen.question import QuestionKind
from melodycoach.screen.signs import ASCII, UNICODE

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from melodycoach.screen.command import Command
    from melodycoach.screen.entry import Entry
    from melodycoach.screen.question import Question
    from melodycoach.screen.view import ViewState


class Desk:
    """What the player sees and types.

    Parameters
    ----------
    latest_view
        Gives the newest view.
    send
        Takes the commands.
    choices
        Gives the names to offer for a kind of question; for that of where to save, first the path that
        is proposed.
    ascii_only
        Draw with plain letters only.
    """

    def __init__(
        self,
        latest_view: Callable[[], ViewState],
        send: Callable[[Command], None],
        choices: Callable[[QuestionKind], Sequence[str]],
        ascii_only: bool = False,
    ) -> None:
        self._latest_view = latest_view
        self._send = send
        self._choices = choices
        self._ascii = ascii_only
        self._number = 0
        self._columns, self._rows = 80, 24
        self._help_from: int | None = None
        self.question: Question | None = None
        self._asked_unbidden: Question | None = None
        self.view = latest_view()
        self.entry: Entry = typing.entry_of(self.view.tokens)

    @property
    def helping(self) -> bool:
        """The help covers the screen."""
        return self._help_from is not None

    @property
    def asking(self) -> bool:
        """A question is being answered."""
        return self.question is not None and not self.helping

    @property
    def editing(self) -> bool:
        """Keys go to the entry."""
        return self.question is None and not self.helping

    def next_number(self) -> int:
        """Give the next command its number."""
        self._number += 1
        return self._number

    # ------------------------------------------------------------------------------- frames

    def take_view(self) -> None:
        """Take in the newest view for a frame: hand over what waited for it, ask what it wants asked."""
        self._take_in()
        self._ask_for_input()

    def _take_in(self) -> None:
        view = self.view = self._latest_view()
        if self.question is not None:
            self.question = asking.answer_arrived(self.question, view.handled, view.refusals)
        self.entry = entry_merge.arrived(self.entry, view.tokens, view.handled, view.refusals)
        self._hand_over()

    def drawn(self, columns: int, rows: int) -> Drawn:
        """Draw everything for a terminal of this size."""
        self._columns, self._rows = columns, rows
        if self._help_from is not None:
            standing = standing_words(self.view)
            return Drawn(draw_help(columns, rows, self._help_from, self._ascii, standing), 0, 0)
        return picture(self.view, columns, rows, self.entry, self.question, self._ascii)

    def _hand_over(self) -> None:
        """Send the next finished words of the entry, if there are any."""
        edit = typing.due(self.entry)
        if edit is not None:
            number = self.next_number()
            self.entry = typing.handed_over(self.entry, edit, number)
            self._send(ReplaceText(edit.start, edit.stop, " ".join(edit.words), number))

    # --------------------------------------------------------------------------------- help

    def open_help(self) -> None:
        """Cover the screen with the help."""
        self._help_from = 0

    def close_help(self) -> None:
        """Go back to the line."""
        self._help_from = None

    def scroll_help(self, step: int) -> None:
        """Move the help by so many lines, as far as it goes."""
        signs = ASCII if self._ascii else UNICODE
        last = len(help_lines(self._columns, signs, standing_words(self.view))) - self._rows + 1
        self._help_from = max(0, min((self._help_from or 0) + step, last))

    # ---------------------------------------------------------------------------- questions

    def ask(self, kind: QuestionKind) -> None:
        """Ask the player for something, in a line above the entry."""
        self.question = asking.ask(kind, self._choices(kind))

    def _ask_for_input(self) -> None:
        """Ask once which of several inputs to listen to, but not amid a word that is being typed.

        The question goes by itself when there is only one left, unless something is typed in it.
        """
        unbidden, wanted = self._asked_unbidden, self.view.status.asks_input
        if wanted and unbidden is None and self.editing and not typing.has_pending(self.entry):
            self.ask(QuestionKind.PORT)
            self._asked_unbidden = self.question
        elif not wanted and unbidden is not None and self.question is unbidden:
            self.question = self._asked_unbidden = None

    def drop_question(self) -> None:
        """Go back to the entry without an answer."""
        self.question = None

    def answer(self) -> None:
        """Send the answer; the question stays until it is carried out."""
        if self.question is None or self.question.awaited:
            return
        number = self._number + 1
        command = asking.answer(self.question, number)
        if command is None:
            self.question = asking.unanswered(self.question)
            return
        self._number = number
        self.question = replace(self.question, awaited=number)
        self._send(command)

    def change_question(self, change: Callable[[Question], Question]) -> None:
        """Put a changed question in place of the one that is asked."""
        if self.question is not None:
            self.question = change(self.question)

    # -------------------------------------------------------------------------------- entry

    def type_text(self, text: str) -> None:
        """Type or paste text at the cursor of the entry."""
        self.change_entry(lambda entry: entry_edit.inserted(entry, text))

    def change_entry(self, change: Callable[[Entry], Entry]) -> None:
        """Put a changed entry in place of this one, and hand over what is finished in it.

        The newest view is taken in first, so that an answer need not wait for the next frame.
        """
        self._take_in()
        self.entry = change(self.entry)
        self._hand_over()

    def move_row(self, step: int) -> None:
        """Move the cursor one row of the entry up (-1) or down (1)."""
        cursor = moved_up_or_down(self.entry.text, self.entry.cursor, self._columns, step)
        self.change_entry(lambda entry: entry_edit.moved_to(entry, cursor))

    def undo(self) -> None:
        """Take back what is typed but not handed over; else the last change of the line."""
        if typing.has_pending(self.entry) and not self.entry.awaited:
            self.entry = typing.taken_back(self.entry)
        else:
            self._send_change(Undo)

    def redo(self) -> None:
        """Give back what was taken back last."""
        again = typing.brought_again(self.entry)
        if again is None:
            self._send_change(Redo)
        else:
            self.entry = again

    def fresh(self) -> None:
        """Lay the line aside and begin a new one."""
        self._send_change(Fresh)

    def _send_change(self, command: type[Undo | Redo | Fresh]) -> None:
        """Send a command that changes the line; nothing is handed over until it is answered."""
        number = self.next_number()
        self.entry = typing.awaiting(self.entry, number)
        self._send(command(number))
