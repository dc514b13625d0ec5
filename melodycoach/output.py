"""Standard output and error that take whatever is written, and can be told that nobody reads on."""

from __future__ import annotations

import codecs
import io
import os
import sys

PLAIN_LETTERS = "melodycoach.plain-letters"


def accept_every_letter() -> None:
    """Let both streams write plain letters for those that their encoding lacks, instead of stopping."""
    codecs.register_error(PLAIN_LETTERS, _plain_letters)
    for stream in (sys.stdout, sys.stderr):
        if isinstance(stream, io.TextIOWrapper):
            stream.reconfigure(errors=PLAIN_LETTERS)


def _plain_letters(error: UnicodeError) -> tuple[str, int]:
    from melodycoach.screen.text import to_ascii

    if not isinstance(error, UnicodeEncodeError):
        raise error
    return to_ascii(error.object[error.start : error.end]), error.end


def silence_stdout() -> None:
    """Drop what is still to be written, so that the interpreter's own flush at the exit cannot fail."""
    os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
