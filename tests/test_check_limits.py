"""The limits that docs/check.md promises are those that the program has."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from melodycoach.checking import MOST_NOTES
from melodycoach.reading import MAX_FILE_BYTES
from melodycoach.sources import midi_file, midi_track, note_scan, xml_container, xml_elements, xml_safe

PAGE = Path(__file__).resolve().parent.parent / "docs" / "check.md"
MB = 2**20
LIMITS = {
    "a file of any kind": f"{MAX_FILE_BYTES / MB:g} MB",
    "notes of a line that is checked": f"{MOST_NOTES:,}",
    "characters of note text": f"{note_scan.MAX_TEXT_CHARS:,}",
    "a MIDI file": f"{midi_file.MAX_FILE_BYTES / MB:g} MB",
    "events of a MIDI file, all tracks together": f"{midi_track.MAX_EVENTS:,}",
    "tracks of a MIDI file": f"{midi_file.MAX_CHUNKS:,}",
    "a score, unpacked": f"{xml_safe.MAX_FILE_BYTES / MB:g} MB",
    "files packed in an `.mxl`": f"{xml_container.MAX_ZIP_ENTRIES:,}",
    "parts of a score": f"{xml_elements.MAX_PARTS:,}",
    "notes and rests of a score, all parts together": f"{xml_elements.MAX_NOTES:,}",
    "bars of a score, all parts together": f"{xml_elements.MAX_BARS:,}",
    "XML elements of a score": f"{xml_safe.MAX_ELEMENTS:,}",
    "XML elements inside each other": f"{xml_safe.MAX_DEPTH:,}",
}


def written() -> dict[str, str]:
    """Read the table of the page."""
    section = PAGE.read_text(encoding="utf-8").split("## Limits\n")[1].split("\n## ")[0]
    return dict(re.findall(r"^\| (.+?) \| ([\d,]+(?: MB)?) \|$", section, re.MULTILINE))


def test_the_page_lists_every_limit_and_no_other() -> None:
    assert list(written()) == list(LIMITS)


@pytest.mark.parametrize("what", LIMITS)
def test_a_limit_of_the_page_is_that_of_the_program(what: str) -> None:
    assert written()[what] == LIMITS[what]
