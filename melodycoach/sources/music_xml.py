"""A score in MusicXML, plain or compressed, read to a sheet: which part, which voice, and what is said of it.

Nothing is chosen in silence: where a score holds more than one line, or something that a line
cannot hold, a sentence says what was done with it.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from melodycoach.core.sheet import Sheet, SheetKind
from melodycoach.errors import MusicFileError, shorten
from melodycoach.sources.accidentals import COMMA_NOTATIONS, NOTATION_NAMES, guess_notation
from melodycoach.sources.note_token import DEFAULT_TEMPO, lay_out
from melodycoach.sources.xml_container import ZIP_START, unpack_score
from melodycoach.sources.xml_line import read_voice, shift_cents
from melodycoach.sources.xml_parts import read_score

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from melodycoach.core.pitch import PitchNames
    from melodycoach.sources.accidental_table import Notation
    from melodycoach.sources.accidentals import Sign
    from melodycoach.sources.xml_line import VoiceLine
    from melodycoach.sources.xml_score import Bar, Part, Score

MOST_NAMED = 6
"""So many parts, voices, bars or conflicts are named one by one."""

BEAT_NAMES = {
    2.0: "half note",
    0.5: "eighth note",
    0.25: "sixteenth note",
    0.125: "32nd note",
    0.0625: "64th note",
}


def read_music_xml(
    data: bytes,
    where: str,
    names: PitchNames,
    part: str = "",
    voice: str = "",
    notation: Notation | None = None,
) -> Sheet:
    """Read the line of a score.

    Parameters
    ----------
    data
        The whole file, plain or compressed.
    where
        How messages call it.
    names
        The names and the tone system of the pack.
    part
        Number from 1, id, or a piece of the name. Empty: the first part that has notes with a pitch
        and is no percussion.
    voice
        As the file numbers it. Empty: the one with the most notes, the first of several.
    notation
        What the accidentals mean. None: as `guess_notation` tells from all signs of the file.

    Returns
    -------
    Sheet
        In sounding pitch. Beats are counted in the note value that is usual in the line, and so is
        the tempo.

    Raises
    ------
    MusicFileError
        It is no score that can be read, or there is no such part or voice, or no note in it.
    """
    packed: tuple[str, ...] = ()
    if data.startswith(ZIP_START):
        data, packed = unpack_score(data, where)
    score = read_score(data, where)
    chosen = _choose_part(score, part, where)
    chosen_voice = _choose_voice(chosen, voice, where)
    seen = set(_signs(score))
    guess = guess_notation(seen, names.system) if notation is None else None
    used = guess.notation if guess else notation
    assert used is not None
    line = read_voice(
        chosen, chosen_voice, used, names.system, signs_printed=any(sign is not None for sign, _ in seen)
    )
    if not line.places:
        raise MusicFileError(f"{where}: no note in it can be played, expected a melody; look into the score")
    tempo = score.tempos[0] / line.beat if score.tempos else None
    says = (
        *packed,
        *score.says,
        *_part_said(score, chosen, part),
        *_voice_said(chosen, chosen_voice, voice),
        guess.reason if guess else f"accidentals are read as {NOTATION_NAMES[used]}, as chosen",
        *_some(tuple(_shift_said(line, used)), "other transpositions"),
        *_line_said(line, score),
        *_bars_said(chosen.bars),
        *_left_out_said(chosen),
        *_some(line.conflicts, "other kinds of conflict"),
    )
    return Sheet(
        SheetKind.MUSIC_XML,
        lay_out(line.items, tempo=tempo or DEFAULT_TEMPO),
        line.places,
        title=score.title,
        tempo=tempo,
        says=says,
        lost=tuple(_damage_said(chosen)),
    )


# --- what to read ------------------------------------------------------------------------------


def _choose_part(score: Score, wanted: str, where: str) -> Part:
    """Find the part that is asked for, or the first that can hold a melody."""
    parts = score.parts
    if wanted:
        found = _parts_called(parts, wanted)
        if len(found) != 1:
            which = "several parts are" if found else "no part is"
            raise MusicFileError(
                f"{where}: {which} called {shorten(wanted)!r}; choose one with --part: {_list_parts(parts)}"
            )
        if not found[0].n_by_voice:
            raise MusicFileError(
                f"{where}: part {shorten(wanted)!r} has no notes with a pitch, expected a melody; "
                f"choose another with --part: {_list_parts(parts)}"
            )
        return found[0]
    pitched = [part for part in parts if part.n_by_voice]
    melodic = [part for part in pitched if not part.is_percussion]
    if not melodic:
        found_instead = (
            "only percussion" if pitched or any(part.n_unpitched for part in parts) else "no notes"
        )
        raise MusicFileError(f"{where}: {found_instead} in it, expected a melody; open a score that has one")
    return melodic[0]


def _parts_called(parts: Sequence[Part], wanted: str) -> list[Part]:
    """Find by number, then by id, then by whole name, then by a piece of the name."""
    folded = wanted.strip().casefold()
    if folded.isascii() and folded.isdigit() and len(folded) < 6 and 1 <= int(folded) <= len(parts):
        return [parts[int(folded) - 1]]
    for calls in (
        lambda part: part.id == wanted.strip(),
        lambda part: part.name.casefold() == folded,
        lambda part: folded in part.name.casefold(),
    ):
        if found := [part for part in parts if calls(part)]:
            return found
    return []


def _choose_voice(part: Part, wanted: str, where: str) -> str:
    if not wanted:
        return max(part.n_by_voice, key=lambda voice: part.n_by_voice[voice])
    if wanted.strip() in part.n_by_voice:
        return wanted.strip()
    known = _some([shorten(voice, 12) for voice in part.n_by_voice], "more")
    raise MusicFileError(
        f"{where}: no voice {shorten(wanted)!r} in the part; choose one with --voice: {', '.join(known)}"
    )


def _signs(score: Score) -> Iterator[tuple[Sign | None, float | None]]:
    """Give each sign of the file with the number beside it."""
    for part in score.parts:
        for bar in part.bars:
            for note in bar.notes:
                yield note.sign, note.alter
            for change in bar.keys:
                if not isinstance(change.key, int):
                    yield from ((sign, alter) for _, alter, sign, _ in change.key)


# --- what is said of it ------------------------------------------------------------------------


def _some(words: Sequence[str], rest: str) -> tuple[str, ...]:
    """Keep the first of a list, and count the rest.

    >>> _some("abcdefghi", "more")
    ('a', 'b', 'c', 'd', 'e', 'f', 'and 3 more')
    """
    if len(words) <= MOST_NAMED + 1:
        return tuple(words)
    return (*words[:MOST_NAMED], f"and {len(words) - MOST_NAMED} {rest}")


def _list_parts(parts: Sequence[Part]) -> str:
    named = [f"{number} {_called(part)}" for number, part in enumerate(parts, 1)]
    return ", ".join(_some(named, "more"))


def _called(part: Part) -> str:
    return repr(shorten(part.name or part.id))


def _part_said(score: Score, part: Part, wanted: str) -> Iterator[str]:
    if len(score.parts) > 1:
        number = next(n for n, other in enumerate(score.parts, 1) if other is part)
        why = "as chosen" if wanted else "the first with a melody; --part chooses another"
        yield f"part {number} of {len(score.parts)}, {_called(part)}, is read: {why}"


def _voice_said(part: Part, voice: str, wanted: str) -> Iterator[str]:
    if len(part.n_by_voice) > 1:
        why = "as chosen" if wanted else "the one with the most notes; --voice chooses another"
        voices = _some(
            [f"{shorten(name, 12)} ({_count(n, 'note')})" for name, n in part.n_by_voice.items()], "more"
        )
        yield f"voice {shorten(voice, 12)} is read: {why}; the part has voices {', '.join(voices)}"


def _count(number: int, word: str) -> str:
    """Count things.

    >>> _count(1, "note"), _count(2, "note")
    ('1 note', '2 notes')
    """
    return f"{number} {word}{'' if number == 1 else 's'}"


def _shift_said(line: VoiceLine, notation: Notation) -> Iterator[str]:
    for shift in line.shifts:
        cents = shift_cents(shift, notation)
        unit_cents, unit = (1200 / 53, "comma") if notation in COMMA_NOTATIONS else (100.0, "semitone")
        size = f"{round(abs(cents) / unit_cents, 2):g}"
        yield (
            f"a transposing part: it is read as it sounds, {size} {unit}{'' if size == '1' else 's'} "
            f"{'lower' if cents < 0 else 'higher'} than it is written"
        )


def _line_said(line: VoiceLine, score: Score) -> Iterator[str]:
    if line.staff:
        yield f"the voice stands on several staves at once: staff {line.staff} is read, with the most notes"
    if line.beat != 1:
        yield f"a beat is {_a_note_value(line.beat)}, as most notes here are about so long"
    if len(score.tempos) > 1:
        yield "the tempo changes on the way: the first is taken for the whole line"
    if line.n_graces:
        yield f"{_count(line.n_graces, 'grace note')} read as short notes that take no time from the others"
    if line.has_chords:
        yield "where notes sound together, the highest is taken"


def _a_note_value(beat: float) -> str:
    name = BEAT_NAMES[beat]
    return f"an {name}" if name.startswith("eighth") else f"a {name}"


def _bars_said(bars: Sequence[Bar]) -> Iterator[str]:
    """Say what a player would play again, or elsewhere."""
    repeated: list[str] = []
    begins = 0
    for number, bar in enumerate(bars):
        begins = number if bar.opens_repeat else begins
        if bar.closes_repeat:
            first, last = bars[begins].label, bar.label
            repeated.append(first if first == last else f"{first}–{last}")
            begins = number + 1
    if repeated:
        one = len(repeated) == 1 and "–" not in repeated[0]
        word, are = ("bar", "is") if one else ("bars", "are")
        yield f"{word} {', '.join(_some(repeated, 'more'))} {are} repeated: read once"
    if any(bar.is_ending for bar in bars):
        yield "first and later endings are read one after the other, as they are written"
    if any(bar.jumps for bar in bars):
        yield "jumps (da capo, dal segno, coda) are not followed: the bars are read once, in their order"


def _left_out_said(part: Part) -> Iterator[str]:
    if part.n_cues:
        yield f"{_count(part.n_cues, 'cue note')} left out"
    if part.n_unpitched:
        yield f"{_count(part.n_unpitched, 'note')} without a pitch left out"
    if part.ornaments:
        signs = ", ".join(sorted(part.ornaments))
        yield f"ornament signs ({signs}) are not played out: the written notes count"


def _damage_said(part: Part) -> Iterator[str]:
    for kind, labels in part.damage.items():
        bars = [label for label in dict.fromkeys(labels) if label]
        place = f"{'bar' if len(bars) == 1 else 'bars'} {', '.join(_some(bars, 'more'))}: " if bars else ""
        yield f"{place}{kind}"
