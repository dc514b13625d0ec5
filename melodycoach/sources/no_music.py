"""Files that are no line of notes, known by their first bytes: pictures, recordings, documents.

Composers have them beside their drafts, and a name is soon mistaken. The marks are those that each
format defines for itself (from memory; the tests let other programs write some of them).
"""

from __future__ import annotations

from typing import NamedTuple

PICTURE, RECORDING, VIDEO, DOCUMENT = "a picture", "a recording", "a recording or a film", "a document"


class Beginning(NamedTuple):
    """What files of one format begin with: ``first``, and ``then`` at the byte ``at``."""

    first: bytes
    kind: str
    then: bytes = b""
    at: int = 0


BEGINNINGS = (
    Beginning(b"\x89PNG\r\n\x1a\n", PICTURE),
    Beginning(b"\xff\xd8\xff", PICTURE),  # JPEG
    Beginning(b"GIF8", PICTURE, b"a", 5),
    Beginning(b"II*\0", PICTURE),  # TIFF, either byte order
    Beginning(b"MM\0*", PICTURE),
    Beginning(b"RIFF", PICTURE, b"WEBP", 8),
    Beginning(b"RIFF", RECORDING, b"WAVE", 8),
    Beginning(b"FORM", RECORDING, b"AIF", 8),
    Beginning(b"OggS", RECORDING),
    Beginning(b"fLaC", RECORDING),
    Beginning(b"ID3", RECORDING, b"\0", 4),  # MP3 with a title: the lower part of its version is 0
    *(
        Beginning(bytes((0xFF, second)), RECORDING) for second in (0xFB, 0xFA, 0xF3, 0xF2, 0xF1, 0xF9)
    ),  # MP3, AAC
    Beginning(b"", VIDEO, b"ftyp", 4),  # MPEG-4
    Beginning(b"%PDF-", DOCUMENT),
    Beginning(b"%!PS", DOCUMENT),
    Beginning(b"{\\rtf", DOCUMENT),
    Beginning(b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1", DOCUMENT),  # of an older word processor
    Beginning(b"PK\3\4", DOCUMENT, b"[Content_Types].xml", 30),  # the first name in a zip file
    Beginning(b"PK\3\4", DOCUMENT, b"mimetypeapplication/vnd.oasis.opendocument", 30),
)


def no_music(data: bytes) -> str:
    """Name what a file is, if it is none of those that can be read; else give an empty text.

    >>> no_music(b"%PDF-1.7"), no_music(b"A4 B4-1")
    ('a document', '')
    """
    found = (
        one.kind for one in BEGINNINGS if data.startswith(one.first) and data.startswith(one.then, one.at)
    )
    return next(found, "")
