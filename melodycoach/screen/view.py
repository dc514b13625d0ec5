"""What the screen shows, as plain words and numbers.

Conventions
-----------
A `ViewState` is frozen and made of str, int, float, bool and tuple only: no arrays, no core
objects. All rounding, sorting and labelling is done when it is built; drawing only lays it out.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from melodycoach.core.ladder import Rung


@dataclass(frozen=True, slots=True)
class LeaningRow:
    """One mode in the list of leanings.

    ``change`` is the probability minus that before the last note. ``final`` is where the mode
    stands, as a perde name. ``target`` marks the mode that the player aims at.
    """

    mode_id: str
    name: str
    final: str
    probability: float
    change: float
    target: bool = False


@dataclass(frozen=True, slots=True)
class OwedRow:
    """One characteristic step of the mode in view.

    ``perdes``, ``written`` and ``keys`` are the same notes thrice: names, written notes, and keys
    of a plain keyboard. ``need`` is ``core``, ``usual`` or ``colour``; colour is welcome, never
    owed. ``heard_at`` is the number (from 1) of the note that completed it, None while it is not
    heard. ``gain_nats`` says how far it would move the mode away from its rival if it were played
    next. A step stands where it would be played, or where it was heard; ``kind`` names its pitches
    there too.
    """

    kind: str
    need: str
    perdes: tuple[str, ...]
    written: tuple[str, ...]
    keys: tuple[str, ...]
    heard_at: int | None = None
    gain_nats: float = 0.0

    @property
    def is_colour(self) -> bool:
        """Whether it is only welcome: it is not counted among the steps that a line owes."""
        return self.need == "colour"

    @property
    def is_owed(self) -> bool:
        """Whether the line owes it still."""
        return self.heard_at is None and not self.is_colour


@dataclass(frozen=True, slots=True)
class LineNote:
    """One note of the line.

    ``height`` is in units from A4, for the contour. ``off_mode`` is empty, or says in a few words
    what is wrong; ``mend`` is the perde that would mend it and ``mend_height`` its height in units
    from A4. ``mark`` is the breath, phrase end or bar line that follows, or empty. ``item`` is the
    place of the note in `ViewState.tokens`, -1 where that is not known.
    """

    number: int
    height: float
    name: str
    written: str
    length_s: float
    rests: bool
    off_mode: str = ""
    mend: str = ""
    mark: str = ""
    item: int = -1
    mend_height: float | None = None


@dataclass(frozen=True, slots=True)
class WhyRow:
    """One reason: a sentence, and the nats it adds for the leading mode (negative: against)."""

    text: str
    nats: float


@dataclass(frozen=True, slots=True)
class Status:
    """The world around the session, in finished sentences.

    ``input_line`` says which port is open or lost, or that notes are typed. ``tuning_line`` says
    which tuning is believed and why. ``log_line`` says where the log goes. ``warning`` is the
    newest thing that needs the player's attention, or empty; ``notice`` is the newest thing that
    went well and is worth a word. ``asks_input``: there are several inputs, and the player has to
    say which one.
    """

    input_line: str = ""
    tuning_line: str = ""
    log_line: str = ""
    warning: str = ""
    notice: str = ""
    asks_input: bool = False


@dataclass(frozen=True, slots=True)
class Refusal:
    """A command that could not be carried out.

    ``number`` is that of the command, ``sentence`` says what was wrong and what to do. ``words``
    are the words of a `ReplaceText` that cannot be read; empty: any of them.
    """

    number: int
    sentence: str
    words: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class ViewState:
    """Everything that one screen shows.

    ``verdict`` is the answer in one sentence ("leaning to Hüseynî", "undecided between A and B").
    ``now`` is what the last stretch sounds like where that differs from the whole, or empty. ``in_view``
    names the mode that owed steps and ladder speak of (the target, else the leading one) and ``rival``
    the closest one behind it. ``owed`` holds the steps owed, the best to play next first, then colour
    that is welcome, then the steps heard, the newest first. ``keyboard_note`` says which rivals a plain
    keyboard cannot separate, or is empty. ``tokens`` is the line as note text, one token an item, which
    the entry shows. ``theory`` says whose theory it is, ``caution`` to whom it defers. ``handled`` is
    the number of the newest command carried out or refused, and ``refusals`` are the newest few
    refusals, oldest first: with them the entry knows what became of its edits.
    """

    verdict: str
    now: str
    decided: bool
    leanings: tuple[LeaningRow, ...]
    in_view: str
    rival: str
    is_target: bool
    owed: tuple[OwedRow, ...]
    line: tuple[LineNote, ...]
    ladder: tuple[Rung, ...]
    why: tuple[WhyRow, ...]
    keyboard_note: str
    tokens: tuple[str, ...]
    n_notes: int
    reading: str
    restricted: str
    theory: str
    caution: str
    can_undo: bool
    can_redo: bool
    status: Status
    handled: int = 0
    refusals: tuple[Refusal, ...] = ()
