"""Draw the picture of the README from the real screen: ``python docs/make_picture.py``.

The demo is played through the live path up to a moment of its third part, and the screen of that
moment is written as SVG, cell by cell.
"""

import re
from html import escape
from pathlib import Path

from melodycoach.coach import Coach
from melodycoach.core.session import begin
from melodycoach.demo import PACK
from melodycoach.players import DemoKeyboard, Keyboard
from melodycoach.screen.draw import draw
from melodycoach.screen.signs import STYLES
from melodycoach.sources.pack_file import load_pack

PICTURE = Path(__file__).with_name("screen.svg")
COLUMNS, ROWS = 120, 40
MOMENT_S = 34.0
CELL_WIDTH, CELL_HEIGHT = 8.4, 18
PAPER, INK = "#16181d", "#d8dbe2"
COLOURS = {
    "ansicyan": "#6cc3d5",
    "ansimagenta": "#d58fd9",
    "ansigreen": "#8fc07a",
    "ansired": "#ee7b70",
    "ansiyellow": "#e3c26d",
    "ansibrightblack": "#858b99",
}


def main() -> None:
    """Play, draw and write."""
    pack = load_pack(PACK)
    clock = Moment()
    coach = Coach(begin(pack), DemoKeyboard(pack.names, Keyboard(clock)), clock)
    while clock.now_s < MOMENT_S:
        clock.now_s += 0.05
        coach.turn()
    rows = [svg_row(line, row) for row, line in enumerate(draw(coach.view, COLUMNS, ROWS))]
    width, height = COLUMNS * CELL_WIDTH + 24, ROWS * CELL_HEIGHT + 24
    PICTURE.write_text(
        f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {width:.0f} {height}" role="img" '
        f'aria-label="The screen of melodycoach in the third part of its demo">\n'
        f'<rect width="100%" height="100%" rx="8" fill="{PAPER}"/>\n'
        f'<g font-family="DejaVu Sans Mono, Menlo, Consolas, monospace" font-size="14" fill="{INK}" '
        ">\n" + "\n".join(rows) + "\n</g>\n</svg>\n",
        encoding="utf-8",
    )


class Moment:
    """A clock that stands where it is put."""

    now_s = 0.0

    def __call__(self) -> float:
        """Read the clock."""
        return self.now_s


def svg_row(line: list[tuple[str, str]], row: int) -> str:
    """Write one line; each word keeps to its cells, whatever the font measures."""
    words, column = [], 0
    for style, text in line:
        for word in re.finditer(r"\S+", text):
            x, y = 12 + (column + word.start()) * CELL_WIDTH, 26 + row * CELL_HEIGHT
            length = len(word[0]) * CELL_WIDTH
            words.append(
                f'<text x="{x:.1f}" y="{y}" textLength="{length:.1f}"{paint(style)}>{escape(word[0])}</text>'
            )
        column += len(text)
    return "".join(words)


def paint(style: str) -> str:
    """Turn the style classes of the screen into SVG attributes."""
    words = " ".join(STYLES.get(name, "") for name in style.replace("class:", "").split()).split()
    attributes = [f' fill="{COLOURS[word]}"' for word in words if word in COLOURS][-1:]
    attributes += [' font-weight="bold"'] if "bold" in words else []
    attributes += [' font-style="italic"'] if "italic" in words else []
    attributes += [' text-decoration="underline"'] if "underline" in words else []
    return "".join(attributes)


if __name__ == "__main__":
    main()
