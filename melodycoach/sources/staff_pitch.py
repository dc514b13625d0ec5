"""What a printed note sounds like: key signature, accidentals that hold to the bar's end, ties.

A staff is followed note by note. What counts, first to last: the sign printed at the note (its
SMuFL glyph name before its MusicXML value), the sign that stands in the bar at the same letter and
octave, the sign of the key signature, the number beside it in the key, and the note's own ``alter``.
Programs that write scores fill in ``alter`` so differently that it cannot come first: some halve
the commas, some leave it out. It does come first in the literal notation, and in a score that
prints no sign at all.
"""

from __future__ import annotations

from collections import Counter
from math import isfinite
from typing import TYPE_CHECKING, NamedTuple, TypeAlias

from melodycoach.core.note import InputKind
from melodycoach.core.pitch import COMMA_CENTS, KEY_CENTS, LETTERS
from melodycoach.sources.accidental_table import Notation
from melodycoach.sources.accidentals import (
    NOTATION_NAMES,
    Sign,
    grid_sign,
    home_of,
    is_plain,
    natural_cents,
    raised_cents,
)

if TYPE_CHECKING:
    from collections.abc import Iterable

    from melodycoach.core.pitch import ToneSystem

CONFLICT_CENTS = 30.0
"""A sign and an ``alter`` that differ by more do not mean the same."""

SHARPS_IN_ORDER = "FCGDAEB"
"""The letters that a traditional key signature sharpens, in order; flats go backwards."""

MOST_FIFTHS = 21
"""Sharps or flats of a key beyond this, three on each letter, are not counted."""

MOST_CONFLICTS = 20
"""How many kinds of conflict are told one by one."""

IN_BAR, IN_KEY = " earlier in the bar", " in the key signature"
"""How it is said where a sign stands that is not at the note itself."""

KeyEntry: TypeAlias = "tuple[str, float | None, Sign | None, int | None]"
"""One altered letter of a key signature: step, ``key-alter``, ``key-accidental``, ``key-octave``."""


class StaffNote(NamedTuple):
    """What a printed note sounds like: cents on the MIDI scale, and how exact that is."""

    cents: float
    kind: InputKind


class _Raise(NamedTuple):
    """What holds for a letter: cents, whether by a plain sign, and what is to be called its source."""

    cents: float
    plain: bool
    source: str


class _Answer(NamedTuple):
    """A note that was worked out: what its sign leaves in the bar, and what conflicts it shows."""

    note: StaffNote
    printed: _Raise | None
    conflicts: tuple[str, ...]


class StaffPitch:
    """Follows one staff of one part; feed it in the order in which the notes sound.

    Parameters
    ----------
    notation
        What the accidentals mean.
    system
        The tone system of the pack: its naturals.
    signs_printed
        Whether the score prints any sign, at a note or in a key signature by name. Where it prints
        none, ``alter`` comes first.

    Examples
    --------
    Segâh, a comma below B4, under a key with a koma flat, as some program wrote it (alter -0.5):

    >>> from melodycoach.core.pitch import COMMAS_53
    >>> staff = StaffPitch(Notation.AEU, COMMAS_53)
    >>> staff.set_key([("B", -0.5, Sign("quarter-flat"), None)])
    >>> round(COMMAS_53.cents_to_units(staff.pitch("B", 4, None, -0.5).cents))
    8
    """

    def __init__(self, notation: Notation, system: ToneSystem, *, signs_printed: bool = True) -> None:
        self.notation = notation
        self.system = system
        self._alter_first = notation is Notation.LITERAL or not signs_printed
        self._key: dict[str, dict[int | None, _Raise]] = {}
        self._bar: dict[tuple[str, int], _Raise] = {}
        # most notes of a score come again under the same key, so each is worked out once
        self._answers: dict[tuple[str, int, Sign | None, float | None, _Raise | None], _Answer] = {}
        self._conflicts: Counter[str] = Counter()

    @property
    def conflicts(self) -> tuple[str, ...]:
        """Say where sign and ``alter`` disagree, once for each kind, with what was believed."""
        kinds = [f"{said} ({n} times)" if n > 1 else said for said, n in self._conflicts.items()]
        left_out = len(kinds) - MOST_CONFLICTS
        return (*kinds[:MOST_CONFLICTS], *([f"and {left_out} more of this sort"] if left_out > 0 else []))

    def set_key(self, key: int | Iterable[KeyEntry]) -> None:
        """Take a key signature: a count of fifths (flats negative), or the letters it alters.

        ``key-octave`` says where a sign is printed, and it holds in all octaves; where a letter has
        signs in more than one octave, each octave follows its own or the nearest. What the bar
        remembers is forgotten.
        """
        entries = traditional_key(key) if isinstance(key, int) else key
        self._key = {}
        self._bar = {}
        self._answers = {}
        for step, alter, sign, octave in entries:
            _check(step, alter)
            conflicts: list[str] = []
            if (raised := self._from_key(alter, sign, conflicts)) is not None:
                self._key.setdefault(step, {})[octave] = raised
            self._conflicts.update(conflicts)

    def new_bar(self) -> None:
        """Forget the accidentals of the bar."""
        self._bar.clear()

    def pitch(
        self,
        step: str,
        octave: int,
        sign: Sign | None = None,
        alter: float | None = None,
        tied_from: float | None = None,
    ) -> StaffNote:
        """Give what a note sounds like.

        Parameters
        ----------
        step, octave
            Its letter, and its octave as in MusicXML (A4 is 440 Hz).
        sign, alter
            The accidental printed at it; the semitones that the file gives. None where absent.
        tied_from
            The pitch of the note that it is tied to, in cents: it sounds on, even over a bar line,
            unless a sign is printed.

        Raises
        ------
        ValueError
            At a step that is no letter from A to G, and at an ``alter`` that is no finite number.
        """
        if tied_from is not None and sign is None:
            return self._note(tied_from)
        asked = (step, octave, sign, alter, self._bar.get((step, octave)))
        answer = self._answers.get(asked)
        if answer is None:
            answer = self._answers[asked] = self._work_out(*asked)
        if answer.printed is not None:
            self._bar[step, octave] = answer.printed
        if answer.conflicts:
            self._conflicts.update(answer.conflicts)
        return answer.note

    def _work_out(
        self, step: str, octave: int, sign: Sign | None, alter: float | None, in_bar: _Raise | None
    ) -> _Answer:
        """Work out a note by its letter, what is printed at it, and what holds in the bar and the key."""
        _check(step, alter)
        conflicts: list[str] = []
        printed = self._read(sign, alter, conflicts) if sign else None
        if in_bar is not None:
            in_bar = in_bar._replace(source=f"{in_bar.source}{IN_BAR}")
        holds = printed or in_bar or self._of_key(step, octave)
        raised = self._raised(holds, alter, conflicts, printed=printed is not None)
        natural = natural_cents(step, octave, self.notation, self.system)
        return _Answer(self._note(natural + raised), printed, tuple(conflicts))

    def _raised(
        self, holds: _Raise | None, alter: float | None, conflicts: list[str], *, printed: bool
    ) -> float:
        """Give how far a note lies above its letter."""
        if self._alter_first:
            return self._by_alter(holds, alter, conflicts, printed=printed)
        if holds is None:
            return self._meant(alter or 0.0)
        # whoever writes scores leaves out the alter of a natural, never that of a plain sign
        given = 0.0 if alter is None and holds.plain and not printed else alter
        conflicts += self._compare(holds, alter, given)
        return holds.cents

    def _by_alter(
        self, holds: _Raise | None, alter: float | None, conflicts: list[str], *, printed: bool
    ) -> float:
        """Give how far a note lies above its letter where its ``alter`` comes first."""
        if alter is None:
            return holds.cents if holds and (printed or not holds.plain) else 0.0
        if self.notation is Notation.LITERAL:
            if printed and holds:
                conflicts += self._compare(holds, alter, alter)
            return alter * KEY_CENTS
        near = holds is not None and abs(holds.cents - alter * KEY_CENTS) <= CONFLICT_CENTS
        return holds.cents if holds and near and grid_sign(alter) else self._meant(alter)

    def _read(self, sign: Sign, alter: float | None, conflicts: list[str]) -> _Raise | None:
        """Give what a sign says, at home if it is foreign here; None if nothing can be made of it."""
        cents, home = raised_cents(sign, self.notation), home_of(sign)
        literal = self.notation is Notation.LITERAL and alter is not None
        if cents is not None:
            return _Raise(cents, is_plain(sign), str(sign))
        if home is not None and not literal:
            cents = raised_cents(sign, home) or 0.0
            here, there = NOTATION_NAMES[self.notation], NOTATION_NAMES[home]
            conflicts.append(f"{sign} is no {here} sign: read as {there}, {_size(cents)}")
            return _Raise(cents, False, str(sign))
        if home is None:
            taken = "left out" if alter is None else f"read as its alter {alter:g} says"
            conflicts.append(f"{sign} is no accidental that is known: {taken}")
        return None if alter is None else _Raise(self._meant(alter), False, str(sign))

    def _meant(self, alter: float) -> float:
        """Give what an ``alter`` means by itself: its sign in this notation, or plain semitones."""
        sign = grid_sign(alter)
        cents = raised_cents(sign, self.notation) if sign else None
        return alter * KEY_CENTS if cents is None else cents

    def _from_key(self, alter: float | None, sign: Sign | None, conflicts: list[str]) -> _Raise | None:
        """Give what one entry of a key signature says; None if it says nothing."""
        by_alter = None
        if alter is not None:
            name = grid_sign(alter)
            plain = name is not None and is_plain(name)
            by_alter = _Raise(self._meant(alter), plain, f"{name or f'key-alter {alter:g}'}{IN_KEY}")
        if sign is None or (by_alter is not None and self.notation is Notation.LITERAL):
            return by_alter
        read = self._read(sign, alter, conflicts)
        if read is None:
            return by_alter
        holds = read._replace(source=f"{sign}{IN_KEY}")
        conflicts += self._compare(holds, alter, alter)
        return holds

    def _of_key(self, step: str, octave: int) -> _Raise | None:
        """Give what the key says of a letter: at this octave, anywhere, or at the nearest octave."""
        entries = self._key.get(step, {})
        if octave in entries or None in entries or not entries:
            return entries.get(octave, entries.get(None))
        nearest = min((at for at in entries if at is not None), key=lambda at: (abs(at - octave), at))
        return entries[nearest]

    def _compare(self, holds: _Raise, alter: float | None, given: float | None) -> tuple[str, ...]:
        """Give the conflict where a sign and the number beside it do not mean the same."""
        if given is None or abs(holds.cents - given * KEY_CENTS) <= CONFLICT_CENTS:
            return ()
        found = "no alter" if alter is None else f"alter {alter:g}"
        by_sign, by_number = _size(holds.cents), _size(given * KEY_CENTS)
        if self.notation is Notation.LITERAL:
            return (f"{holds.source} with {found}: read as {by_number}, as alter says, not {by_sign}",)
        return (f"{holds.source} with {found}: read as {by_sign}, as the sign says, not {by_number}",)

    def _note(self, cents: float) -> StaffNote:
        if self.notation is Notation.FOLK:  # its signs are rounder than the degrees that they stand for
            return StaffNote(cents, InputKind.TUNED)
        if self.notation is not Notation.LITERAL:
            return StaffNote(cents, InputKind.TYPED)
        key = round(cents / KEY_CENTS) * KEY_CENTS
        if abs(cents - key) < 1e-6:
            return StaffNote(key, InputKind.KEYS)
        return StaffNote(cents, InputKind.TUNED)


def traditional_key(fifths: int) -> tuple[KeyEntry, ...]:
    """Give the letters that a traditional key alters, each with its plain sign.

    >>> [(step, alter) for step, alter, _, _ in traditional_key(-2)]
    [('B', -1), ('E', -1)]
    """
    raised = Counter(SHARPS_IN_ORDER[n % 7] for n in range(min(fifths, MOST_FIFTHS)))
    raised.subtract(SHARPS_IN_ORDER[-1 - n % 7] for n in range(min(-fifths, MOST_FIFTHS)))
    return tuple((step, n, _PLAIN[n], None) for step, n in raised.items() if n)


_PLAIN = {
    1: Sign("sharp"),
    2: Sign("double-sharp"),
    3: Sign("triple-sharp"),
    -1: Sign("flat"),
    -2: Sign("flat-flat"),
    -3: Sign("triple-flat"),
}


def _size(cents: float) -> str:
    """Say how far something is raised: in commas where they are whole, else in cents.

    >>> _size(-4 * COMMA_CENTS), _size(50), _size(0)
    ('4 commas down', '50 cents up', 'natural')
    """
    if not cents:
        return "natural"
    commas = abs(cents) / COMMA_CENTS
    whole = abs(commas - round(commas)) < 1e-6
    count, name = (round(commas), "comma") if whole else (round(abs(cents), 2), "cent")
    return f"{count:g} {name}{'' if count == 1 else 's'} {'up' if cents > 0 else 'down'}"


def _check(step: str, alter: float | None) -> None:
    if len(step) != 1 or step not in LETTERS:
        raise ValueError(f"no step: {step!r}")
    if alter is not None and not isfinite(alter):
        raise ValueError(f"no alter: {alter!r}")
