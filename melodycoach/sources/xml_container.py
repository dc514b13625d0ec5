"""Scores packed in a zip, as ``.mxl`` files are: the one score is found and taken out in memory.

References
----------
MusicXML 4.0, "Compressed .mxl files": ``META-INF/container.xml`` names the score as its first
``rootfile``. Entries are stored or deflated.
"""

from __future__ import annotations

import struct
import zipfile
import zlib
from io import BytesIO
from typing import TYPE_CHECKING

from melodycoach.errors import MusicFileError, shorten
from melodycoach.sources.xml_safe import Handlers, check_size, parse_xml, plain_text

if TYPE_CHECKING:
    from collections.abc import Sequence

ZIP_START = b"PK\x03\x04"

MAX_ZIP_ENTRIES = 1_000
"""A score is packed with a few pictures and sounds at most."""

CONTAINER = "META-INF/container.xml"

_ENTRY_SIGN = b"PK\x01\x02"  # stands before each entry of the table of contents
_ENCRYPTED = 0x1
_PIECE_BYTES = 64 * 1024
_SCORE_ENDINGS = (".musicxml", ".xml")
_NO_SCORE = ("META-INF/", "__MACOSX/")
# what the standard library raises at damaged zip data, as tried out with damaged files
_DAMAGE = (
    zipfile.BadZipFile,
    zlib.error,
    struct.error,
    EOFError,
    OSError,
    ValueError,
    KeyError,
    IndexError,
    NotImplementedError,
    RuntimeError,
    OverflowError,
)


def unpack_score(data: bytes, where: str) -> tuple[bytes, tuple[str, ...]]:
    """Take the score out of a zip.

    Parameters
    ----------
    data
        The zip file.
    where
        How error texts name it.

    Returns
    -------
    tuple of bytes and tuple of str
        The score, at most `MAX_FILE_BYTES` long; and sentences on how it was found, where the
        container does not name it.

    Raises
    ------
    MusicFileError
        The zip is damaged, encrypted or too large, or holds no score, or several.
    """
    check_size(len(data), where)
    if data.count(_ENTRY_SIGN) > MAX_ZIP_ENTRIES:
        raise MusicFileError(
            f"{where}: more than {MAX_ZIP_ENTRIES} files packed together, expected one score; unpack it"
        )
    try:
        with zipfile.ZipFile(BytesIO(data)) as packed:
            entries = {entry.filename: entry for entry in packed.infolist()}
            name, says = _named_score(packed, entries, where)
            return _read_entry(packed, entries[name], where), says
    except MusicFileError:
        raise
    except _DAMAGE as damage:
        raise MusicFileError(
            f"{where}: the compressed file is damaged ({shorten(str(damage), 80)}); export or fetch it again"
        ) from None


def _named_score(
    packed: zipfile.ZipFile, entries: dict[str, zipfile.ZipInfo], where: str
) -> tuple[str, tuple[str, ...]]:
    """Find the score: what the container names, else the only one that there is."""
    named = ""
    if CONTAINER in entries:
        container = _read_entry(packed, entries[CONTAINER], where)
        named = _root_file(container, f"{where}: {CONTAINER}")
        if named in entries:
            return named, ()
    scores = [name for name in entries if _looks_like_a_score(name)]
    if len(scores) == 1:
        return scores[0], (f"{_missing(named)}: {plain_text(scores[0], 40)!r} is the only one",)
    raise MusicFileError(
        f"{where}: {_missing(named)}, and {_found(scores)}; unpack it and open the score itself"
    )


def _missing(named: str) -> str:
    """Say why the score is not where it should be."""
    if named:
        return f"the compressed file names {plain_text(named, 40)!r} as the score, which is not in it"
    return "the compressed file does not say which file is the score"


def _looks_like_a_score(name: str) -> bool:
    return name.lower().endswith(_SCORE_ENDINGS) and not name.startswith(_NO_SCORE)


def _found(scores: Sequence[str]) -> str:
    if not scores:
        return "none in it looks like one"
    return f"{len(scores)} look like one, {shorten(scores[0])!r} and {shorten(scores[1])!r} among them"


def _root_file(container: bytes, where: str) -> str:
    """Give the name of the first root file, or an empty text."""
    names: list[str] = []

    def root_file(attributes: dict[str, str]) -> None:
        names.append(attributes.get("full-path", ""))

    parse_xml(container, where, Handlers(lambda name: None, {"rootfile": root_file}))
    return names[0] if names else ""


def _read_entry(packed: zipfile.ZipFile, entry: zipfile.ZipInfo, where: str) -> bytes:
    """Read one packed file, and no more of it than may be read."""
    if entry.flag_bits & _ENCRYPTED:
        raise MusicFileError(
            f"{where}: {shorten(entry.filename)!r} is encrypted, expected a plain file; "
            "unpack it with its password"
        )
    if entry.compress_type not in (zipfile.ZIP_STORED, zipfile.ZIP_DEFLATED):
        raise MusicFileError(
            f"{where}: {shorten(entry.filename)!r} is packed as scores never are, expected deflate; "
            "unpack it and open the score itself"
        )
    pieces: list[bytes] = []
    size = 0
    with packed.open(entry) as file:
        while piece := file.read(_PIECE_BYTES):
            pieces.append(piece)
            size += len(piece)
            check_size(size, f"{where}: {shorten(entry.filename)!r}")
    return b"".join(pieces)
