"""Every exception that melodycoach raises on purpose.

A user's problem is a `MelodycoachError` that also inherits the nearest builtin and carries the
exit code of the program. A caller's mistake in the code is a plain ``ValueError`` or ``TypeError``.

The text follows one pattern: *where: what was found, what was expected; what to do*.
"""

from __future__ import annotations

from difflib import get_close_matches
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence


class MelodycoachError(Exception):
    """Something the user can mend; the text says how.

    A check that finds more than one fault keeps each as a line of `faults`.
    """

    exit_code = 2

    def __init__(self, text: str, faults: Sequence[str] = ()) -> None:
        super().__init__(text)
        self.faults: tuple[str, ...] = tuple(faults)


class UsageError(MelodycoachError, ValueError):
    """Options or arguments that do not fit together."""


class NoteTextError(MelodycoachError, ValueError):
    """Note text with tokens that cannot be read; `faults` has one line for each."""


class MusicFileError(MelodycoachError, ValueError):
    """A MIDI file or a score that cannot be read, or that holds no melody."""


class PackError(MelodycoachError, ValueError):
    """A mode pack that cannot be used; `faults` has one line for each fault."""


class ProfileError(MelodycoachError, ValueError):
    """A keyboard profile that cannot be used; `faults` has one line for each fault."""


class UnknownModeError(MelodycoachError, LookupError):
    """A mode that no loaded pack defines."""


class UnknownNameError(MelodycoachError, LookupError):
    """A pack, perde or setting that does not exist."""


class PortError(MelodycoachError, OSError):
    """A MIDI port that is missing, or that cannot be opened."""


class CollectionError(MelodycoachError, ValueError):
    """A labelled collection that cannot be read."""


class EventLogError(MelodycoachError, ValueError):
    """An event log that cannot be read."""


class StorageError(MelodycoachError, OSError):
    """A file that cannot be read or written."""


class ImpossibleEvidenceError(MelodycoachError, ArithmeticError):
    """Every hypothesis is ruled out, so there are no probabilities to give."""


def nearest_names(wanted: str, known: Iterable[str], count: int = 3) -> str:
    """Name the known words closest to a wrong one, as the tail of an error text.

    Examples
    --------
    >>> nearest_names("husseyni", ["huseyni", "rast", "huzzam"])
    "did you mean 'huseyni'?"
    >>> nearest_names("zzz", ["rast", "mahur"])
    'known: mahur, rast'
    """
    names = sorted(set(known))
    shown = ", ".join(names[:12])
    return did_you_mean(wanted, names, count) or f"known: {shown}" + (", …" if len(names) > 12 else "")


def did_you_mean(wanted: str, names: Sequence[str], count: int = 3, cutoff: float = 0.6) -> str:
    """Name the words closest to a wrong one, or give an empty text if none is close.

    >>> did_you_mean("husseyni", ["huseyni", "rast"]), did_you_mean("zzz", ["rast"])
    ("did you mean 'huseyni'?", '')
    """
    close = get_close_matches(wanted, names, n=count, cutoff=cutoff)
    return f"did you mean {' or '.join(repr(name) for name in close)}?" if close else ""


def system_reason(error: OSError) -> str:
    """Give what the system says of a failure, to stand inside a sentence."""
    return (error.strerror or str(error)).lower()


def shorten(text: str, longest: int = 40) -> str:
    """Cut a text that was found, so that it leaves room for the sentence about it.

    >>> shorten("a mistyped word", 10)
    'a mistype…'
    """
    return text if len(text) <= longest else text[: longest - 1] + "…"
