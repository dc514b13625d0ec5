"""A score in MusicXML, plain or compressed, read to a sheet: which part, which voice, and what is said of it.

Nothing is chosen in silence: where a score holds more than one line, or something that a line
cannot hold, a sentence says what was done with it.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from melodycoach.core.sheet import Sheet, SheetKind, beat_words
from melodycoach.errors import MusicFileError
from melodycoach.sources.accidentals import COMMA_NOTATIONS, NOTATION_NAMES, guess_notation
from melodycoach.sources.xml_choice import choose, count, some
from melodycoach.sources.xml_container import ZIP_START, unpack_score
from melodycoach.sources.xml_elements import read_score
from melodycoach.sources.xml_line import read_voice
from melodycoach.sources.xml_sounding import shift_cents

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from melodycoach.core.pitch import PitchNames
    from melodycoach.sources.accidental_table import Notation
    from melodycoach.sources.accidentals import Sign
    from melodycoach.sources.xml_line import VoiceLine
    from melodycoach.sources.xml_score import Bar, Part, Score


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
        As the file numbers it. Empty: the highest of those with many notes, as `xml_choice` says.
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
    choice = choose(score, part, voice, where)
    seen = _signs(score)
    guess = guess_notation(seen, names.system) if notation is None else None
    used = guess.notation if guess else notation
    assert used is not None
    line = read_voice(
        choice.part,
        choice.voice,
        choice.staff,
        used,
        names.system,
        signs_printed=any(sign is not None for sign, _ in seen),
        quarters_a_minute=score.tempos[0] if score.tempos else None,
    )
    if not line.places:
        raise MusicFileError(f"{where}: no note in it can be played, expected a melody; look into the score")
    says = (
        *packed,
        *score.says,
        *choice.says,
        guess.reason if guess else f"accidentals are read as {NOTATION_NAMES[used]}, as chosen",
        *some(tuple(_shift_said(line, used)), "other transpositions"),
        *_line_said(line, score),
        *_bars_said(choice.part.bars),
        *_left_out_said(choice.part),
        *some(line.conflicts, "other kinds of conflict"),
    )
    return Sheet(
        SheetKind.MUSIC_XML,
        line.items,
        line.places,
        title=score.title,
        tempo=line.tempo,
        says=says,
        lost=tuple(_damage_said(choice.part)),
    )


def _signs(score: Score) -> frozenset[tuple[Sign | None, float | None]]:
    """Give each sign of the file with the number beside it."""
    bars = [bar for part in score.parts for bar in part.bars]
    pitches = {note.pitch for bar in bars for note in bar.notes}
    keys = [change.key for bar in bars for change in bar.keys if not isinstance(change.key, int)]
    return frozenset(
        [(pitch.sign, pitch.alter) for pitch in pitches]
        + [(sign, alter) for key in keys for _, alter, sign, _ in key]
    )


# --- what is said of it ------------------------------------------------------------------------


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
    if line.beat != 1:
        yield beat_words(line.beat)
    if len(score.tempos) > 1:
        yield "the tempo changes on the way: the first is taken for the whole line"
    if line.n_graces:
        yield f"{count(line.n_graces, 'grace note')} read as short notes that take no time from the others"
    if line.has_chords:
        yield "where notes sound together, the highest is taken"


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
        yield f"{word} {', '.join(some(repeated, 'more'))} {are} repeated: read once"
    if any(bar.is_ending for bar in bars):
        yield "first and later endings are read one after the other, as they are written"
    if any(bar.jumps for bar in bars):
        yield "jumps (da capo, dal segno, coda) are not followed: the bars are read once, in their order"


def _left_out_said(part: Part) -> Iterator[str]:
    if part.n_cues:
        yield f"{count(part.n_cues, 'cue note')} left out"
    if part.n_unpitched:
        yield f"{count(part.n_unpitched, 'note')} without a pitch left out"
    if part.ornaments:
        signs = ", ".join(sorted(part.ornaments))
        yield f"ornament signs ({signs}) are not played out: the written notes count"


def _damage_said(part: Part) -> Iterator[str]:
    for kind, labels in part.damage.items():
        bars = [label for label in dict.fromkeys(labels) if label]
        place = f"{'bar' if len(bars) == 1 else 'bars'} {', '.join(some(bars, 'more'))}: " if bars else ""
        yield f"{place}{kind}"
