"""Any file of music, from its bytes to a sheet: what kind it is, and which reader reads it.

The kind is told by the content, so a file may be called anything. The readers of MIDI files and of
MusicXML are loaded when such a file comes.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from types import MappingProxyType
from typing import TYPE_CHECKING

from melodycoach.core.note import Mark, Note
from melodycoach.core.sheet import Place, Sheet, SheetKind
from melodycoach.errors import MusicFileError, NoteTextError, UsageError
from melodycoach.sources.no_music import no_music
from melodycoach.sources.note_text import read_note_text

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping, Sequence

    from melodycoach.core.note import Item
    from melodycoach.core.pitch import PitchNames
    from melodycoach.sources.accidental_table import Notation

FIRST_BYTES = 200
"""So much of a file is enough to tell its kind."""

SEARCHED_BYTES = 64 * 1024
"""A MIDI file may have rubbish of so many bytes before it: see `melodycoach.sources.midi_file`."""

_MIDI_CHUNKS = (b"MThd\0", b"MTrk\0")  # with the first byte of their length, which no text has
UTF_8_BOM = b"\xef\xbb\xbf"
_UTF_16 = MappingProxyType({b"\xff\xfe": "utf-16-le", b"\xfe\xff": "utf-16-be"})


@dataclass(frozen=True, slots=True)
class ReadOptions:
    """What the player says of a file that holds more than one line.

    Parameters
    ----------
    track, channel
        Of a MIDI file: the track by its number from 1 or a part of its name, and the channel from
        1 to 16. Empty and None: the reader chooses.
    part, voice, notation
        Of a score: the part, the voice, and how its accidentals are meant. Empty and None: the
        reader chooses.
    """

    track: str = ""
    channel: int | None = None
    part: str = ""
    voice: str = ""
    notation: Notation | None = None

    def fitting(self, kind: SheetKind) -> ReadOptions:
        """Keep what says something of this kind of file."""
        return replace(self, **{name: _UNSAID[name] for name in self.unfit(kind)})

    def unfit(self, kind: SheetKind) -> tuple[str, ...]:
        """Name what is said and says nothing of this kind of file."""
        said = (name for name, unsaid in _UNSAID.items() if getattr(self, name) != unsaid)
        return tuple(name for name in said if OPTION_KINDS[name] is not kind)


OPTION_KINDS: Mapping[str, SheetKind] = MappingProxyType(
    {
        "track": SheetKind.MIDI,
        "channel": SheetKind.MIDI,
        "part": SheetKind.MUSIC_XML,
        "voice": SheetKind.MUSIC_XML,
        "notation": SheetKind.MUSIC_XML,
    }
)
"""The kind of file that each of `ReadOptions` is said of."""

_UNSAID = MappingProxyType({name: getattr(ReadOptions(), name) for name in OPTION_KINDS})


def kind_of(data: bytes) -> SheetKind:
    r"""Tell what kind of file it is from how it begins; what is nothing else is note text.

    Examples
    --------
    >>> [kind_of(data).value for data in (b"A4 B4-1", b"MThd...", b"PK\x03\x04", b"<?xml")]
    ['note text', 'MIDI file', 'MusicXML', 'MusicXML']
    """
    if data[:4] == b"MThd" or (data[:4] == b"RIFF" and data[8:12] == b"RMID"):
        return SheetKind.MIDI
    if data[:4] == b"PK\x03\x04" or _begins_like_xml(data):
        return SheetKind.MUSIC_XML
    if any(chunk in data[:SEARCHED_BYTES] for chunk in _MIDI_CHUNKS):
        return SheetKind.MIDI
    return SheetKind.NOTE_TEXT


def _begins_like_xml(data: bytes) -> bool:
    begins = data[:FIRST_BYTES]
    if begins[:2] in _UTF_16:
        text = begins[2:].decode(_UTF_16[begins[:2]], errors="replace")
        return text.lstrip().startswith("<")
    # without a mark at its start, a text in UTF-16 has a zero in each of its plain letters
    return begins.removeprefix(UTF_8_BOM).replace(b"\0", b"").lstrip().startswith(b"<")


def read_sheet(
    data: bytes, where: str, names: PitchNames, options: ReadOptions | None = None, *, strict: bool = True
) -> Sheet:
    """Read the line of a file of any kind.

    Parameters
    ----------
    data
        The whole file.
    where
        What the file is called in messages.
    names
        The names and the tone system of the pack.
    options
        Which line of the file, where it holds more than one.
    strict
        Refuse options that say nothing of this kind of file; else pass over them, as is right where
        they are said of many files at once.

    Raises
    ------
    UsageError
        An option says nothing of this kind of file.
    NoteTextError
        The file is note text that cannot be read; `faults` names every place.
    MusicFileError
        It is a MIDI file or a score that cannot be read, or that holds no melody; or it is a picture,
        a recording, a document.
    """
    refuse_no_music(data, where)
    options, kind = options or ReadOptions(), kind_of(data)
    unfit = options.unfit(kind)
    if unfit and strict:
        wanted = OPTION_KINDS[unfit[0]]
        a_file = f"a {wanted}" if wanted is SheetKind.MIDI else wanted.value
        raise UsageError(f"{where}: the {unfit[0]} is chosen in {a_file}, found {kind}; leave it out")
    options = options.fitting(kind)
    match kind:
        case SheetKind.MIDI:
            from melodycoach.sources.midi_sheet import read_midi

            return read_midi(data, where, names.system, options.track, options.channel)
        case SheetKind.MUSIC_XML:
            from melodycoach.sources.music_xml import read_music_xml

            return read_music_xml(data, where, names, options.part, options.voice, options.notation)
        case SheetKind.NOTE_TEXT:
            return read_note_sheet(read_text(data, where), names, where)


def refuse_no_music(data: bytes, where: str) -> None:
    """Refuse what no reader can read.

    Raises
    ------
    MusicFileError
        It is a picture, a recording or a document.
    """
    found = no_music(data)
    if found:
        raise MusicFileError(f"{where}: is {found}, not a line of notes; export MusicXML or MIDI")


def read_text(data: bytes, where: str) -> str:
    """Give the text of a note-text file: UTF-8, or UTF-16 with a mark at its start.

    Raises
    ------
    NoteTextError
        It is neither.
    MusicFileError
        It is a picture, a recording or a document.
    """
    refuse_no_music(data, where)
    encoding, name = _UTF_16.get(data[:2], "utf-8"), "UTF-16" if data[:2] in _UTF_16 else "UTF-8"
    try:
        return data.decode(encoding).removeprefix("\ufeff")
    except UnicodeDecodeError as error:
        raise NoteTextError(
            f"{where}: byte {error.start} is not {name} text; save the file as UTF-8"
        ) from error


def read_note_sheet(text: str, names: PitchNames, where: str = "line") -> Sheet:
    """Read note text to a sheet.

    Bars are counted from 1 by the bar lines of the text, if it has any between its notes, and beats
    from 1 within the bar.

    Raises
    ------
    NoteTextError
        Something cannot be read; `faults` names every place.

    Examples
    --------
    >>> from melodycoach.core.pitch import COMMAS_53, PitchNames
    >>> sheet = read_note_sheet("A4 B4-1 | C5", PitchNames(COMMAS_53))
    >>> sheet.places[2]
    Place(bar='2', beat=1.0, at='line 1, column 11')
    """
    read = read_note_text(text, names, where)
    return Sheet(
        kind=SheetKind.NOTE_TEXT,
        items=read.items,
        places=tuple(_places(read.items, read.places)),
        title=read.headers.title,
        mode=read.headers.mode,
        final_cents=read.headers.final_cents,
        tempo=read.headers.tempo,
    )


def _places(items: Sequence[Item], at: Sequence[tuple[int, int]]) -> Iterator[Place]:
    """Give the place of each note."""
    has_bars = Mark.BAR in items
    bar, gone = 1, 0.0
    for item, (line, column) in zip(items, at, strict=True):
        if isinstance(item, Note):
            where = f"line {line}, column {column}"
            yield Place(str(bar), round(1 + gone, 9), where) if has_bars else Place(at=where)
        if item is Mark.BAR and gone:  # a bar line that nothing stands before ends no bar
            bar, gone = bar + 1, 0.0
        elif not isinstance(item, Mark):
            gone += item.beats or 0.0
