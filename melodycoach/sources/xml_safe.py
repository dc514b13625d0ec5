"""XML from a stranger, read safely: every cap has a name, nothing is declared, nothing is fetched.

A file can be made to do harm while it is small: entities that grow a thousandfold, attributes that
every element inherits, elements nested a million deep, names that are all different. Declarations
of entities and attributes are refused, whatever else they say; the document type that scores name
is let pass and never looked up. What is left is read in pieces and counted, so that each file is
read or refused within two seconds and 200 MB.

References
----------
The parser is expat, through the standard library's ``xml.parsers.expat``. Encodings: XML 1.0,
appendix F (detection by the first bytes). The reading of single-byte encodings through Python's
own codecs was tried out, not promised by expat.
"""

from __future__ import annotations

import codecs
import re
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import TYPE_CHECKING, NoReturn
from xml.parsers import expat

from melodycoach.errors import MusicFileError, shorten

if TYPE_CHECKING:
    from collections.abc import Callable, Mapping, MutableMapping, Sequence

MAX_FILE_BYTES = 20 * 1024 * 1024
"""A longer file is no score of one melody; the same holds for what comes out of a zip."""

MAX_DEPTH = 100
"""Elements inside each other; a score needs about twelve."""

MAX_ELEMENTS = 800_000
"""Elements of a file; one note has ten to fifteen."""

MAX_NAMES = 20_000
"""Different names of elements and attributes; scores know about 600."""

MAX_TAG_BYTES = 1024 * 1024
"""One tag or comment; expat holds it whole."""

MAX_TEXT = 1_000
"""So many characters of the text of one element are kept."""

PIECE_BYTES = 64 * 1024
"""The parser gets so much at a time, so that a file refused early costs little."""

OTHER_ENCODING = "windows-1254"
"""What a file is read as that is no UTF-8 and says nothing usable: the Turkish code page."""

_DECLARED = re.compile(rb"""<\?xml[^>]{0,200}?\bencoding\s*=\s*["']([A-Za-z][\w.-]{0,40})["']""")
_WEB_PAGE = re.compile(rb"<(?:!doctype\s+)?html\b", re.IGNORECASE)
_FIRST_BYTES = 1024  # enough to see what it is
_UTF_16_STARTS = MappingProxyType(
    {codecs.BOM_UTF16_LE: "UTF-16", codecs.BOM_UTF16_BE: "UTF-16", b"<\0": "UTF-16LE", b"\0<": "UTF-16BE"}
)
_BREAKS_OFF = frozenset(
    {
        expat.errors.XML_ERROR_NO_ELEMENTS,
        expat.errors.XML_ERROR_UNCLOSED_TOKEN,
        expat.errors.XML_ERROR_UNCLOSED_CDATA_SECTION,
        expat.errors.XML_ERROR_PARTIAL_CHAR,
    }
)


@dataclass(frozen=True)
class Handlers:
    """What is done at the elements of a document, by their names; others are passed over.

    The text of an element is what stands behind the last tag in it, without white space around it, cut
    at `MAX_TEXT`.

    Parameters
    ----------
    root
        Called with the name of the outermost element, before all others.
    starts
        Called with the attributes of an element, as it opens.
    ends
        Called with the text of an element, as it closes.
    kept, texts
        The text of an element that is one of `kept` is only put into `texts`, under its name.
    """

    root: Callable[[str], None]
    starts: Mapping[str, Callable[[dict[str, str]], None]] = field(default_factory=dict)
    ends: Mapping[str, Callable[[str], None]] = field(default_factory=dict)
    kept: frozenset[str] = frozenset()
    texts: MutableMapping[str, str] = field(default_factory=dict)


def parse_xml(data: bytes, where: str, handlers: Handlers) -> tuple[str, ...]:
    """Walk the elements of a document.

    Parameters
    ----------
    data
        The whole file.
    where
        How error texts name it.
    handlers
        What is done at the elements.

    Returns
    -------
    tuple of str
        Sentences on what was not as the file says: its encoding.

    Raises
    ------
    MusicFileError
        The document is too large, too deep, declares what could do harm, is not well-formed, or
        is in an encoding that is not read. What `handlers` raise passes through.
    """
    check_size(len(data), where)
    if data[:1].isspace():  # nothing may stand before the declaration, and some put a line there
        data = data.lstrip()
    if not data:
        raise MusicFileError(f"{where}: the file is empty, expected a score; export the score again")
    encoding, says = _encoding_of(data)
    if _WEB_PAGE.search(data[:_FIRST_BYTES]):
        raise MusicFileError(f"{where}: this is a web page, expected a score; download the score itself")
    _Walk(where, encoding, handlers).run(data)
    return says


def check_size(size: int, where: str) -> None:
    """Refuse what is longer than `MAX_FILE_BYTES`."""
    if size > MAX_FILE_BYTES:
        raise MusicFileError(
            f"{where}: more than {MAX_FILE_BYTES // 2**20} MB, which is the most that is read of a score; "
            "export the part with the melody alone"
        )


def plain_text(text: str, longest: int = 120) -> str:
    r"""Make one line of a text out of a file, without characters that act on a terminal.

    >>> plain_text("Sabah" + chr(0x9B) + "\n  şarkısı")
    'Sabah şarkısı'
    """
    text = text[: 4 * longest]
    if not text.isprintable():
        text = "".join(c if c.isprintable() else " " for c in text)
    return shorten(" ".join(text.split()), longest)


class _Walk:
    """One document on its way through the parser."""

    def __init__(self, where: str, encoding: str, handlers: Handlers) -> None:
        self._where = where
        self._parser = parser = expat.ParserCreate(encoding)
        parser.buffer_text = True
        parser.EntityDeclHandler = self._refuse_entity
        parser.AttlistDeclHandler = self._refuse_attributes
        self._follow(handlers)

    def run(self, data: bytes) -> None:
        """Parse it all, piece by piece."""
        try:
            for first in range(0, len(data), PIECE_BYTES):
                piece = data[first : first + PIECE_BYTES]
                self._parser.Parse(piece, False)
                self._check(first + len(piece))
            self._parser.Parse(b"", True)
        except expat.ExpatError as error:
            self._not_well_formed(error)

    def _follow(self, handlers: Handlers) -> None:
        """Have the parser call the handlers.

        Two calls for each element are most of the time that reading takes, so what they need are
        plain variables of this function.
        """
        starts, ends, kept, texts = handlers.starts, handlers.ends, handlers.kept, handlers.texts
        pieces: list[str] = []  # of text, since the last tag
        depth = n_elements = 0

        def start(name: str, attributes: dict[str, str]) -> None:
            nonlocal depth, n_elements
            depth += 1
            n_elements += 1
            if n_elements == 1:
                handlers.root(name)
            elif depth > MAX_DEPTH or n_elements > MAX_ELEMENTS:
                self._too_much()
            pieces.clear()
            if name in starts:
                starts[name](attributes)

        def end(name: str) -> None:
            nonlocal depth
            depth -= 1
            if name in kept:
                texts[name] = "".join(pieces).strip()[:MAX_TEXT]
            elif name in ends:
                ends[name]("".join(pieces).strip()[:MAX_TEXT])
            pieces.clear()

        self._parser.StartElementHandler = start
        self._parser.EndElementHandler = end
        self._parser.CharacterDataHandler = pieces.append

    def _check(self, n_bytes: int) -> None:
        """Hold what has been read so far against the caps that need no look at every element."""
        held = n_bytes - self._parser.CurrentByteIndex
        if held > MAX_TAG_BYTES or len(self._parser.intern) > MAX_NAMES:
            self._too_much()

    def _too_much(self) -> NoReturn:
        raise MusicFileError(
            f"{self._where}: line {self._parser.CurrentLineNumber}: more or deeper XML than a score has; "
            "export the score again, the part with the melody alone"
        )

    def _refuse_entity(self, name: str, *_: object) -> NoReturn:
        raise MusicFileError(
            f"{self._where}: line {self._parser.CurrentLineNumber}: declares the entity "
            f"{shorten(name)!r}, which no score needs and which can do harm; export the score again"
        )

    def _refuse_attributes(self, name: str, *_: object) -> NoReturn:
        raise MusicFileError(
            f"{self._where}: line {self._parser.CurrentLineNumber}: declares attributes of "
            f"{shorten(name)!r}, which no score needs and which can do harm; export the score again"
        )

    def _not_well_formed(self, error: expat.ExpatError) -> NoReturn:
        reason = expat.ErrorString(error.code) or "unknown reason"
        place = f"{self._where}: line {error.lineno}, column {error.offset + 1}"
        if reason in _BREAKS_OFF:
            raise MusicFileError(f"{place}: the file breaks off here; export or fetch it again") from None
        raise MusicFileError(
            f"{place}: this is no well-formed XML ({reason}), expected a score; export the score again"
        ) from None


def _encoding_of(data: bytes) -> tuple[str, tuple[str, ...]]:
    """Tell by the bytes how a file is encoded, and say so where its declaration is wrong.

    What can be read as UTF-8 is UTF-8: text in another encoding hardly ever can.
    """
    start = data[:_FIRST_BYTES]
    for sign, encoding in _UTF_16_STARTS.items():
        if data.startswith(sign):
            declared = _declared(start.replace(b"\0", b""), "UTF-16")
            order = "LE" if sign[0] > sign[1] else "BE"  # of a sign in front or of the first letter
            return encoding, _told(declared, "UTF-16", ("UTF-16", f"UTF-16{order}"))
    declared = _declared(start, "UTF-8")
    if data.isascii():
        return "UTF-8", _told(declared, "UTF-8", (declared if _keeps_plain_letters(declared) else "",))
    if _is_utf_8(data):
        return "UTF-8", _told(declared, "UTF-8", ("UTF-8", "utf8"))
    if _has_one_byte_a_letter(declared):
        return declared, ()
    return OTHER_ENCODING, _told(declared, OTHER_ENCODING, ())


def _declared(start: bytes, otherwise: str) -> str:
    """Give the encoding that a document declares."""
    found = _DECLARED.search(start)
    return found[1].decode("ascii") if found else otherwise


def _told(declared: str, used: str, right: Sequence[str]) -> tuple[str, ...]:
    """Say that the declaration is wrong, unless it is one of those that are right."""
    if declared.lower() in (one.lower() for one in right):
        return ()
    return (f"the file says that its letters are in {declared}, which they are not: read as {used}",)


def _is_utf_8(data: bytes) -> bool:
    """Tell if it is, without a copy of it all as text."""
    decoder = codecs.getincrementaldecoder("utf-8")()
    try:
        for first in range(0, len(data), PIECE_BYTES):
            decoder.decode(data[first : first + PIECE_BYTES])
        decoder.decode(b"", True)
    except UnicodeDecodeError:
        return False
    return True


def _has_one_byte_a_letter(encoding: str) -> bool:
    """Tell if Python knows this encoding and its letters have one byte each, as expat needs it.

    >>> [_has_one_byte_a_letter(name) for name in ("iso-8859-9", "utf-8", "shift_jis", "klingon", "cp037")]
    [True, False, False, False, False]
    """
    try:
        letters = bytes(range(256)).decode(encoding, "replace")
    except (LookupError, ValueError):
        return False
    # some code pages leave a few bytes open; in UTF-8 no byte above 127 is a letter by itself
    return _keeps_plain_letters(encoding) and len(letters) == 256 and len(set(letters)) > 200


def _keeps_plain_letters(encoding: str) -> bool:
    """Tell if plain letters, without accents, are written in an encoding as in UTF-8.

    >>> [_keeps_plain_letters(name) for name in ("iso-8859-9", "UTF-8", "cp037", "UTF-16", "klingon")]
    [True, True, False, False, False]
    """
    plain = bytes(range(32, 127))
    try:
        return plain.decode(encoding) == plain.decode("ascii")
    except (LookupError, ValueError):
        return False
