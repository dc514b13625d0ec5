"""The nearest token that can be read, for one that cannot.

Every guess is read before it is offered, so that following the advice always works. Written notes
are repaired (a missing octave, a mark in the wrong place, syllables or H for letters); words are
compared with the names of the pack.
"""

from __future__ import annotations

import re
import unicodedata
from difflib import SequenceMatcher, get_close_matches
from typing import TYPE_CHECKING

from melodycoach.core.note import Note
from melodycoach.core.pitch import A4_CENTS, HIGHEST_CENTS, LETTERS, OCTAVE_CENTS, SEMITONES_12, fold_name
from melodycoach.sources.note_token import Misread, complete, name_token, plain_token, read_beats, read_token

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from melodycoach.core.pitch import PitchNames, Spelling

_LONGEST = 40
_LETTER_OF = {"do": "C", "re": "D", "mi": "E", "fa": "F", "sol": "G", "la": "A", "si": "B", "h": "B"}
_LOOSE_NOTE = re.compile(
    r"(?P<letter>do|re|mi|fa|sol|la|si|[a-h])(?P<before>[#b=]*)(?P<octave>\d{1,2})?(?P<after>[#b=]*)"
    r"(?P<units>[+-]\d*(?:[.]\d+)?)?(?P<about>~)?",
    re.ASCII | re.IGNORECASE,
)
_MARK_OF = {
    ";": ",", "،": ",", ",,": ",", "||": "|", "/": "|", "[|": "|", "|]": "|",
    "..": ".", "...": ".", "…": ".", "!": ".", "?": ".",
    "--": "-", "---": "-", "—": "-", "_": "-", "r": "-", "z": "-", "rest": "-",
}  # fmt: skip


def nearest_token(
    token: str, names: PitchNames, near_cents: float = A4_CENTS, key: Sequence[Spelling] = ()
) -> str:
    """Give the readable token or tokens closest to one that cannot be read, or an empty text.

    Parameters
    ----------
    token
        As it stands in the text.
    names
        The names of the pack.
    near_cents
        The pitch before it, near which a missing octave is chosen.
    key
        The key signature that it stands under.

    Examples
    --------
    >>> from melodycoach.core.pitch import COMMAS_53, PitchNames
    >>> names = PitchNames(COMMAS_53)
    >>> [nearest_token(token, names) for token in ("B", "A4#", "la4", "A4:1,5", "D5.", "C44", "x")]
    ['B4', 'A#4', 'A4', 'A4:1.5', 'D5 .', 'C9', '']
    """
    if len(token) > _LONGEST:
        return ""
    spread = plain_token(unicodedata.normalize("NFKC", plain_token(token)))
    text = "".join(c for c in spread if unicodedata.category(c)[0] != "C" and not c.isspace())
    for guess in _guesses(text, names, near_cents):
        if guess != token and _reads(guess, names, key):
            return guess
    return ""


def _reads(guess: str, names: PitchNames, key: Sequence[Spelling]) -> bool:
    words = guess.split()
    return bool(words) and not any(isinstance(read_token(word, names, key), Misread) for word in words)


def _guesses(text: str, names: PitchNames, near_cents: float) -> Iterator[str]:
    yield _MARK_OF.get(text.lower(), text)
    bare = text.strip("()[]{}<>\"'`´“”„«»")
    yield bare
    trimmed = bare.rstrip(",.|;")
    mark = bare[len(trimmed) :][:1].replace(";", ",")
    if trimmed and mark:
        yield f"{trimmed} {mark}"
    yield from _mended(bare, names, near_cents)
    if trimmed and mark:
        yield from (f"{guess} {mark}" for guess in _mended(trimmed, names, near_cents))
    for parting in ",|":  # two tokens that were not parted
        parts = bare.split(parting)
        if 1 < len(parts) <= 4:
            mended = [next(_readable(part, names, near_cents), part) for part in parts if part]
            yield f" {parting} ".join(mended)
    for cut in range(1, 4):
        yield from (bare[:-cut], bare[cut:])


def _readable(text: str, names: PitchNames, near_cents: float) -> Iterator[str]:
    return (guess for guess in _mended(text, names, near_cents) if _reads(guess, names, ()))


def _mended(text: str, names: PitchNames, near_cents: float) -> Iterator[str]:
    """Guess at one token: the pitch as it is or repaired, with its length as it is, repaired, or gone."""
    yield text
    body, length = _split_length(text)
    bodies = [body, *_pitches(body, names, near_cents)]
    for tail in (*_lengths(length), ""):
        yield from (candidate + tail for candidate in bodies)


def _split_length(text: str) -> tuple[str, str]:
    if ":" in text:
        body, _, length = text.partition(":")
        return body, length
    if match := re.fullmatch(r"(-)(\d+(?:[.,]\d+)?)|(.*\d[+-]?~?)[*xX=](\d+(?:[.,]\d+)?)", text, re.ASCII):
        return match[1] or match[3], match[2] or match[4]
    if match := re.fullmatch(r"(.*\d)(/\d+)", text, re.ASCII):
        return match[1], f"1{match[2]}"
    return text, ""


def _lengths(length: str) -> Iterator[str]:
    for guess in (length, length.replace(",", "."), length.split(":")[0], length.lstrip("+-")):
        stripped = guess.strip(".,;|~")
        for form in (guess, stripped, f"0{stripped}"):
            if not isinstance(read_beats(form), Misread):
                yield f":{form}" if float(read_beats(form)) != 1 else ""  # type: ignore[arg-type]


def _pitches(body: str, names: PitchNames, near_cents: float) -> Iterator[str]:
    yield body.replace(",", ".")
    if match := _LOOSE_NOTE.fullmatch(body.replace(",", ".")):
        letter = _LETTER_OF.get(match["letter"].lower(), match["letter"].upper())
        marks = (match["before"] + match["after"]).lower()
        units = match["units"] or ""
        octave = _octave(letter, match["octave"], near_cents)
        yield f"{letter}{marks}{octave}{units}{match['about'] or ''}"
        yield f"{letter}{marks}{octave}{units}"
        yield f"{letter}{marks}{octave}{match['about'] or ''}"
        yield f"{letter}{marks}{octave}"
        yield f"{letter}{octave}"
    if match := re.fullmatch(r"(\d)([A-Ga-g][#b]*)", body, re.ASCII):
        yield match[2] + match[1]
    yield from _names(body, names)


def _octave(letter: str, written: str | None, near_cents: float) -> int:
    natural = 100.0 * SEMITONES_12.natural_units[LETTERS.index(letter)]
    if written is None:
        return max(0, round((near_cents - natural) / OCTAVE_CENTS) - 1)
    highest = int((HIGHEST_CENTS - natural) // OCTAVE_CENTS) - 1
    return min(int(written), highest)


def _names(body: str, names: PitchNames) -> Iterator[str]:
    match = re.fullmatch(r"(.+?)([+-][\d.]+)?~?", body, re.ASCII)
    if match is None or not names.named:
        return
    tokens = {fold_name(named.name): name_token(named.name) for named in names.named}
    wanted = fold_name(match[1])
    if len(wanted) < 3:
        return
    if wanted in tokens and body.endswith("~"):
        found = read_token(tokens[wanted], names)
        if isinstance(found, Note):
            yield f"{SEMITONES_12.spell(round(found.pitch_cents / 100) - 69)}~"
    for close in _closest(wanted, tokens, complete(match[1], names)):
        yield close + (match[2] or "")
        yield close


def _closest(wanted: str, tokens: dict[str, str], completed: Sequence[str]) -> list[str]:
    """Give the names that a word may be: one letter away, then those that begin so, the closest first."""
    like = [tokens[close] for close in get_close_matches(wanted, tokens, n=1, cutoff=0.6)]

    def order(token: str) -> tuple[bool, bool, int, str]:
        apart = _letters_apart(wanted, fold_name(token))
        return apart > 1, token not in completed, apart, token

    return sorted({*completed, *like}, key=order)


def _letters_apart(one: str, other: str) -> int:
    """Tell how many letters are in one of two words and not in the other, in their order.

    >>> _letters_apart("acema", "acem"), _letters_apart("huseyn", "huseyni"), _letters_apart("rast", "ras")
    (1, 1, 1)
    """
    blocks = SequenceMatcher(None, one, other).get_matching_blocks()
    return len(one) + len(other) - 2 * sum(block.size for block in blocks)
