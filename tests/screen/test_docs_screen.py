"""docs/screen.md says what the screen does: keys, signs and the plain line are held against the code."""

from __future__ import annotations

from pathlib import Path

import pytest

from melodycoach.screen.draw import draw_help
from melodycoach.screen.signs import UNICODE
from melodycoach.screen.text import plain_text

PAGE = (Path(__file__).parents[2] / "docs" / "screen.md").read_text(encoding="utf-8")


SIGNS = (
    "decided undecided rising falling steady target heard owed next note above below held off mend breath "
    "phrase_end final_guide dominant_guide entry"
)


@pytest.mark.parametrize("name", SIGNS.split())
def test_every_sign_is_explained(name: str) -> None:
    assert getattr(UNICODE, name) in PAGE


def test_every_key_of_the_help_is_in_the_table() -> None:
    table = PAGE[PAGE.index("## Keys") :]
    keys = [plain_text(line)[:15].split("  ") for line in draw_help(80, 40)[1:12]]
    for key in [word.strip() for row in keys for word in row if word.strip()]:
        assert key in table
