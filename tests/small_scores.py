"""Small scores in MusicXML, written by hand for the tests of the readers."""

from __future__ import annotations

import zipfile
from io import BytesIO
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Iterable

DOCTYPE = (
    '<!DOCTYPE score-partwise PUBLIC "-//Recordare//DTD MusicXML 4.0 Partwise//EN" '
    '"http://www.musicxml.org/dtds/partwise.dtd">'
)


def note(pitch: str, duration: object = 4, inside: str = "", voice: str = "1", *, chord: bool = False) -> str:
    """Write a note such as ``A4``, or a rest ``-``; four divisions are a quarter note."""
    what = (
        "<rest/>" if pitch == "-" else f"<pitch><step>{pitch[0]}</step><octave>{pitch[1:]}</octave></pitch>"
    )
    first = "<chord/>" if chord else ""
    return f"<note>{first}{what}<duration>{duration}</duration><voice>{voice}</voice>{inside}</note>"


def notes(pitches: str, **options: object) -> str:
    """Write notes of one length, as `note` takes them."""
    return "".join(note(pitch, **options) for pitch in pitches.split())  # type: ignore[arg-type]


def grace(pitch: str, inside: str = "") -> str:
    """Write a grace note."""
    what = f"<pitch><step>{pitch[0]}</step><octave>{pitch[1:]}</octave></pitch>"
    return f"<note><grace/>{what}<voice>1</voice>{inside}</note>"


def attributes(inside: str = "", divisions: int = 4, time: str = "4/4") -> str:
    """Write what stands at the start of a part."""
    beats, beat_type = time.split("/")
    signature = f"<time><beats>{beats}</beats><beat-type>{beat_type}</beat-type></time>"
    return f"<attributes><divisions>{divisions}</divisions>{signature}{inside}</attributes>"


def measures(*bars: str) -> str:
    """Write bars, numbered from 1."""
    return "".join(f'<measure number="{number}">{bar}</measure>' for number, bar in enumerate(bars, 1))


def part(inside: str, id: str = "P1") -> str:
    """Write a part."""
    return f'<part id="{id}">{inside}</part>'


def score(*bars: str, title: str = "Deneme", head: str = "", first: str = attributes()) -> bytes:
    """Write a score of one part; `first` opens its first bar."""
    return parts({"Ney": measures(first + bars[0], *bars[1:])}, title=title, head=head)


def parts(inside_by_name: dict[str, str], title: str = "Deneme", head: str = "") -> bytes:
    """Write a score of several parts, P1, P2 and so on."""
    listed = "".join(
        f'<score-part id="P{number}"><part-name>{name}</part-name></score-part>'
        for number, name in enumerate(inside_by_name, 1)
    )
    written = "".join(part(inside, f"P{number}") for number, inside in enumerate(inside_by_name.values(), 1))
    return (
        f'<?xml version="1.0" encoding="UTF-8"?>\n{DOCTYPE}\n<score-partwise version="4.0">'
        f"<work><work-title>{title}</work-title></work>{head}<part-list>{listed}</part-list>{written}"
        "</score-partwise>"
    ).encode()


def zipped(entries: Iterable[tuple[str, bytes | str]], compression: int = zipfile.ZIP_DEFLATED) -> bytes:
    """Pack files together."""
    packed = BytesIO()
    with zipfile.ZipFile(packed, "w", compression) as file:
        for name, data in entries:
            file.writestr(name, data)
    return packed.getvalue()


def container(name: str) -> str:
    """Write the file that says which packed file is the score."""
    return (
        f'<?xml version="1.0"?><container><rootfiles><rootfile full-path="{name}"/></rootfiles></container>'
    )


def mxl(data: bytes, name: str = "score.musicxml") -> bytes:
    """Pack a score as MusicXML says."""
    return zipped([("META-INF/container.xml", container(name)), (name, data)])
