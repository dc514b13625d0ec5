"""The coach: the one owner of the keyboard, the session and its log.

One thread calls `turn` again and again. Each turn takes what has been played, what the screen has
asked for and what time has passed, makes events of it, applies and logs them, and publishes one
new `ViewState` by swapping a reference. Other threads only `send` commands and read `view`.
"""

from __future__ import annotations

import os
from collections import deque
from dataclasses import replace
from datetime import date
from pathlib import Path
from queue import Empty, SimpleQueue
from typing import TYPE_CHECKING

from melodycoach.core.event import (
    Event,
    FreshStart,
    LineEdited,
    ModesRestricted,
    NoteOff,
    NoteOn,
    PitchReading,
    ReadingChosen,
    Redone,
    TargetChosen,
    TimePassed,
    Undone,
)
from melodycoach.core.mode import names_in
from melodycoach.core.note import Item, Mark, shared_start
from melodycoach.core.session import SessionState, apply
from melodycoach.core.sheet import SheetKind
from melodycoach.errors import MelodycoachError, StorageError
from melodycoach.line_text import (
    Page,
    entry_items,
    notes_with_marks,
    open_line,
    path_to_save,
    played_until,
    read_final,
    save_line,
    text_path,
)
from melodycoach.reading import mode_named
from melodycoach.screen.command import (
    Command,
    Fresh,
    Open,
    Quit,
    Redo,
    ReplaceText,
    Save,
    SetFinal,
    SetOnly,
    SetPort,
    SetTarget,
    Undo,
)
from melodycoach.screen.view import Refusal, Status, ViewState
from melodycoach.screen.view_of import ViewMaker
from melodycoach.sources.note_text import find_faults, item_token, read_tokens

if TYPE_CHECKING:
    from collections.abc import Callable

    from melodycoach.core.pitch import PitchNames
    from melodycoach.players import Player
    from melodycoach.sources.event_log import EventLog

TICK_S = 0.1
"""How often a sounding note or a silence is looked at again."""

TURN_S = 0.001
"""How long the owner sleeps between two turns."""

LET_GO = "the line had grown long: its first {} notes and marks are in the log now, and undo brings them back"

REFUSALS_KEPT = 8

COMMENT_REFUSED = (
    "{!r} begins a comment, which the live line does not keep; a sharp stands behind its letter: F#5"
)


def _from_home(path: Path) -> str:
    """Write a path as short as the player knows it: ``~`` is the player's own folder."""
    home, whole = os.path.expanduser("~") + os.sep, str(path)  # noqa: PTH111 (does not fail without a home)
    return f"~{os.sep}{whole[len(home) :]}" if whole.startswith(home) else whole


class Coach:
    """Owns a session and everything that changes it.

    Parameters
    ----------
    session
        Where to begin.
    player
        What plays into it.
    clock
        Seconds from the start of the session.
    log
        Where events are written, or None.
    on_note
        Called with a view after each note that has ended; for output line by line.
    notice
        What the player is told at the start.
    """

    def __init__(
        self,
        session: SessionState,
        player: Player,
        clock: Callable[[], float],
        log: EventLog | None = None,
        on_note: Callable[[ViewState], None] | None = None,
        notice: str = "",
    ) -> None:
        self.session = session
        self._player = player
        self._clock = clock
        self._log = log
        self._on_note = on_note
        self._commands: SimpleQueue[Command] = SimpleQueue()
        self._view_maker = ViewMaker()
        self._page = Page()
        self._own_files: set[Path] = set()
        self._path: Path | None = None  # where the line comes from, or was saved last
        self._warning = log.fault or "" if log else ""
        self._notice = notice
        self._handled = 0
        self._refusals: deque[Refusal] = deque(maxlen=REFUSALS_KEPT)
        self._ticked_s = 0.0
        self._written: tuple[tuple[Item, ...], tuple[str, ...]] = ((), ())
        self._shown: tuple[object, ...] = ()
        self.wants_to_quit = False
        self.view = self._make_view()

    @property
    def names(self) -> PitchNames:
        """The pitch names of the pack in use."""
        return self.session.pack.names

    def inputs(self) -> tuple[str, ...]:
        """Name the inputs that can be listened to; any thread may ask."""
        return self._player.inputs()

    def send(self, command: Command) -> None:
        """Ask for something; any thread may. It is done at the next turn."""
        self._commands.put(command)

    def turn(self) -> bool:
        """Take everything that has happened since the last turn; tell whether the view changed."""
        now_s = self._clock()  # read once: what is due after it waits for the next turn
        for event in self._player.poll(now_s):
            self.take(event)
        while True:
            try:
                command = self._commands.get_nowait()
            except Empty:
                break
            self._carry_out(command)
        self._tick(now_s)
        return self._publish(now_s)

    def take(self, event: Event) -> None:
        """Apply one event and log it."""
        before = self.session
        if isinstance(event, NoteOn | NoteOff):
            before = apply(before, TimePassed(event.at_s))
        after = apply(before, event)
        if self._log is not None and (fault := self._log.append(event)):
            self._warning = fault
        begins = after.past is not before.past
        if isinstance(event, NoteOn) and begins and before.sounding is not None:
            self.session = before
            self._tell(event)  # the note that this one ends, before the new one is heard
        if isinstance(event, NoteOn) and len(after.line.items) < len(before.line.items):
            self._notice = LET_GO.format(len(before.line.items) - len(after.line.items) + 1)
        self.session = after
        ends_a_note = isinstance(event, NoteOff) and event.voice == before.sounding
        if ends_a_note or isinstance(event, LineEdited):
            self._tell(event)  # last: whoever is told may end the program

    def _tell(self, event: Event) -> None:
        if self._on_note is not None:
            self._on_note(self._make_view(event.at_s))

    def close(self) -> None:
        """Close the keyboard and the log."""
        self._player.close()
        if self._log is not None:
            self._log.append(TimePassed(self._clock()))
            self._log.close()

    def _tick(self, now_s: float) -> None:
        """Let the clock be seen while a note sounds or a silence may still become something."""
        session = self.session
        may_end = session.played_last and session.line.items[-1] is not Mark.PHRASE_END
        if now_s - self._ticked_s >= TICK_S and (session.sounding is not None or may_end):
            self._ticked_s = now_s
            self.session = apply(session, TimePassed(now_s))

    # --- commands ---------------------------------------------------------------------------

    def _carry_out(self, command: Command) -> None:
        self._handled = max(self._handled, command.number)
        self._warning = self._notice = ""
        try:
            self._obey(command)
        except MelodycoachError as error:
            self._refuse(command.number, str(error))

    def _refuse(self, number: int, sentence: str, words: tuple[str, ...] = ()) -> None:
        self._warning = sentence
        self._refusals.append(Refusal(number, sentence, words))

    def _obey(self, command: Command) -> None:
        now_s = self._clock()
        match command:
            case ReplaceText():
                self._replace_text(command, now_s)
            case Undo():
                self.take(Undone(now_s))
            case Redo():
                self.take(Redone(now_s))
            case Fresh():
                self.take(FreshStart(now_s))
                self._path = None  # the file keeps its line
            case SetTarget():
                mode = self.session.pack.find(command.text) if command.text else None
                self.take(TargetChosen(now_s, mode.id if mode else None))
            case SetFinal():
                reading, final_cents = read_final(command.text, self.names)
                self.take(ReadingChosen(now_s, reading, final_cents))
            case SetOnly():
                wanted = names_in(command.text)
                ids = tuple(mode.id for mode in self.session.pack.restrict(wanted)) if wanted else ()
                self.take(ModesRestricted(now_s, ids))
            case SetPort():
                self._player.choose(command.text)
            case Save():
                self._save(Path(command.path).expanduser())
            case Open():
                self.open_text(Path(command.path).expanduser())
            case Quit():
                self.wants_to_quit = True

    def _replace_text(self, command: ReplaceText, now_s: float) -> None:
        n_items = len(self.session.line.items)
        start, stop = min(command.start, n_items), min(command.stop, n_items)
        comments = tuple(word for word in command.text.split() if word.startswith("#"))
        faults = find_faults(command.text, self.names, with_headers=False)
        if comments:
            self._refuse(command.number, COMMENT_REFUSED.format(comments[0]), comments)
        elif faults:
            more = f" (and {len(faults) - 1} more)" if len(faults) > 1 else ""
            words = tuple(fault.token for fault in faults)
            self._refuse(command.number, f"{faults[0].sentence}{more}", words)
        else:
            items = read_tokens(command.text, self.names, now_s, self._page.tempo)
            self.take(LineEdited(now_s, start, max(start, stop), items))

    def append_text(self, text: str) -> None:
        """Put typed text behind the line, note by note; each note goes to ``on_note``.

        A word that cannot be read is warned of and left out.
        """
        faults = find_faults(text, self.names, with_headers=False)
        self._warning = "; ".join(fault.sentence for fault in faults)
        bad = {fault.token for fault in faults}
        good = " ".join(word for word in text.split() if word not in bad) if bad else text
        items = read_tokens(good, self.names, self._clock(), self._page.tempo)
        for group in notes_with_marks(items):
            n_items = len(self.session.line.items)
            self.take(LineEdited(self._clock(), n_items, n_items, group))

    def _save(self, path: Path) -> None:
        """Write the line; a file that is not this line's own is replaced when asked for twice."""
        if path.exists() and path not in self._own_files:
            self._own_files.add(path)
            raise StorageError(f"{path} is there already; save again to replace it, or choose another name")
        session, headers = self.session, self._page.headers
        mode = session.target.slug if session.target is not None else headers.mode
        headers = replace(headers, mode=mode, final_cents=session.final_cents)
        self._page = replace(self._page, headers=headers)
        save_line(path, self._page, self.session.line, self.names)
        self._own_files.add(path)
        self._path, self._page = path, replace(self._page, kind=SheetKind.NOTE_TEXT)
        self._notice = f"saved as {path}"

    def save_path(self) -> Path:
        """Propose where the line is saved; any thread may ask."""
        return path_to_save(self._path, self._page.kind, date.today())

    def open_text(self, path: Path) -> None:
        """Put the line of a file, whatever kind of file it is, in place of this one.

        Raises
        ------
        StorageError
            The file cannot be read.
        NoteTextError, MusicFileError
            It does not hold what it should.
        UnknownModeError
            Note text names a mode that the pack does not have.
        """
        page, items = open_line(path, self.names)
        target, passed_over = mode_named(self.session.pack, page.kind, page.headers.mode)
        now_s = self._clock()
        if target is not None:
            self.take(TargetChosen(now_s, target.id))
        if page.headers.final_cents is not None:
            self.take(ReadingChosen(now_s, PitchReading.FINAL, page.headers.final_cents))
        if page.kind is SheetKind.NOTE_TEXT:
            self._own_files.add(path)
        else:
            items = played_until(items, now_s)
            self._notice = "; ".join((*page.says, f"save the line as {text_path(path).name}"))
            self._warning = "; ".join((*page.lost, passed_over) if passed_over else page.lost)
        if passed_over:
            page = replace(page, headers=replace(page.headers, mode=""))
        self._page, self._path = page, path
        self.take(LineEdited(now_s, 0, len(self.session.line.items), items))

    # --- the view ---------------------------------------------------------------------------

    def _publish(self, now_s: float) -> bool:
        shown = (
            self.session.line,
            self.session.model,
            self.session.target,
            self._warning,
            self._notice,
            self._handled,
            len(self._refusals),
            self._player.input_line(now_s),
            self._player.tuning_line(),
            self._player.asks_input(),
        )
        if shown == self._shown:
            return False
        self._shown = shown
        self.view = self._make_view(now_s)
        return True

    def _make_view(self, at_s: float | None = None) -> ViewState:
        """Make the view of now, or of the moment of an event that is being taken."""
        at_s = self._clock() if at_s is None else at_s
        log_line = ""
        if self._log is not None:
            log_line = "no log: see the warning" if self._log.fault else f"log: {_from_home(self._log.path)}"
        status = Status(
            input_line=self._player.input_line(at_s),
            tuning_line=self._player.tuning_line(),
            log_line=log_line,
            warning=self._warning,
            notice=self._notice,
            asks_input=self._player.asks_input(),
        )
        view = self._view_maker.view_of(self.session, status, self._tokens())
        return replace(view, handled=self._handled, refusals=tuple(self._refusals))

    def _tokens(self) -> tuple[str, ...]:
        """Write the line as note text; what was written for the last view is kept.

        A token depends on its item and on the one after it, and the newest note is still growing.
        """
        line, (known, tokens) = self.session.line, self._written
        kept = max(min(shared_start(known, line.items) - 1, line.last_note_at), 0)
        fresh = (item_token(item, self.names, self._page.tempo) for item in entry_items(line, kept))
        self._written = (line.items, (*tokens[:kept], *fresh))
        return self._written[1]
