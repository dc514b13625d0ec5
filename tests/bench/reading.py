"""How fast files are read and checked, in one run: against music21, and from the start of the program.

``python tests/bench/reading.py`` prints every figure; ``test_reading.py`` holds them against their bounds.
Each figure is taken a few times, since machines are noisy; what is printed says how.
"""

from __future__ import annotations

import statistics
import subprocess
import sys
import tempfile
import time
import warnings
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

sys.path.insert(0, str(Path(__file__).resolve().parent.parent))  # when it runs as a script

from book_lines import BY_THE_BOOK
from written_out import as_midi, as_music_xml, in_score

from melodycoach.sources.note_text import read_note_text
from melodycoach.sources.pack_file import load_pack
from melodycoach.sources.sheet_file import read_sheet

if TYPE_CHECKING:
    from collections.abc import Callable

NAMES = load_pack("makam").names
SCORE_NOTES = 10_000
MIDI_EVENTS = 100_000
LINE_NOTES = 1_000

# the peak of this process alone: ru_maxrss would count the one that started it
READ_ALONE = """
import re, sys
from melodycoach.sources.pack_file import load_pack
from melodycoach.sources.sheet_file import read_sheet
names = load_pack("makam").names
with open(sys.argv[1], "rb") as file:
    sheet = read_sheet(file.read(), "line", names)
with open("/proc/self/status") as status:
    peak = re.search(r"VmHWM:\\s+(\\d+)", status.read())[1]
sys.stdout.write(f"{len(sheet.places)} {int(peak) / 1024}")
"""


@dataclass(frozen=True)
class Figures:
    """What was measured: seconds, megabytes, and how many notes came out."""

    seconds: float
    notes: int = 0
    megabytes: float = 0.0


# --- the files ---------------------------------------------------------------------------------


STEPS = (("A", "4", "", ""), ("B", "4", "-0.5", "quarter-flat"), ("C", "5", "", ""), ("F", "5", "1", "sharp"))
"""Letter, octave, alter and sign of the notes of a long score: signs that music21 can read."""


def song(n_notes: int) -> bytes:
    """Write a slow song as programs write it: four quarters a bar, words, slurs, dynamics."""
    notes = [
        _note(at, "quarter", 8, f'{_SLURS[at % 2]}<lyric number="1">{_WORDS[at % 2]}</lyric>')
        for at in range(4)
    ]
    loud = "<direction><direction-type><dynamics><mf/></dynamics></direction-type></direction>"
    return _score([("" if number % 4 else loud) + "".join(notes) for number in range(n_notes // 4)])


def bare_notes(n_notes: int) -> bytes:
    """Write a score of eighth notes, eight in a bar, and nothing else."""
    bar = "".join(_note(at, "eighth", 4, "") for at in range(8))
    return _score([bar] * (n_notes // 8))


_SLURS = [f'<notations><slur type="{kind}" number="1"/></notations>' for kind in ("start", "stop")]
_WORDS = ["<syllabic>begin</syllabic><text>ak</text>", "<syllabic>end</syllabic><text>şam</text>"]


def _note(at: int, kind: str, duration: int, rest: str) -> str:
    step, octave, alter, sign = STEPS[at % 4]
    return (
        f'<note default-x="{13 + 20 * at}"><pitch><step>{step}</step>'
        f"{f'<alter>{alter}</alter>' if alter else ''}<octave>{octave}</octave></pitch>"
        f"<duration>{duration}</duration><voice>1</voice><type>{kind}</type>"
        f"{f'<accidental>{sign}</accidental>' if sign else ''}<stem>up</stem>{rest}</note>"
    )


def _score(bars: list[str]) -> bytes:
    first = (
        "<attributes><divisions>8</divisions><key><fifths>0</fifths></key>"
        "<time><beats>4</beats><beat-type>4</beat-type></time></attributes>"
    )
    measures = [
        f'<measure number="{number}" width="300">{first if number == 1 else ""}{bar}</measure>'
        for number, bar in enumerate(bars, start=1)
    ]
    return in_score(measures, "A long line").encode()


LONG_SCORES = {"a song": song, "bare notes": bare_notes}
"""What is read by music21 and by us; music21's time grows with the square of the bars, and ours does not."""


def long_midi(n_events: int) -> bytes:
    """Write a MIDI file of so many events: a bend, a key down, a key up, and so on."""
    track = bytearray(b"\x00\xb0\x65\x00\x00\xb0\x64\x00\x00\xb0\x06\x02\x00\xb0\x26\x00")
    for number in range((n_events - 5) // 3):
        key = 60 + number % 12
        bend = 8192 - 927 * (number % 2)  # now and then a comma down
        track += bytes((0, 0xE0, bend & 127, bend >> 7, 0, 0x90, key, 80, 96, 0x80, key, 0))
    track += b"\x00\xb0\x07\x64" * ((n_events - 5) % 3) + b"\x00\xff\x2f\x00"
    head = b"MThd" + (6).to_bytes(4, "big") + bytes((0, 0, 0, 1, 0, 96))
    return head + b"MTrk" + len(track).to_bytes(4, "big") + bytes(track)


def long_text(n_notes: int) -> str:
    """Write a line of so many notes: makams by the book, each for about a hundred notes."""
    words: list[str] = []
    left = n_notes
    while left:
        for line in BY_THE_BOOK.values():
            tokens = line.split() * (100 // len(line.split()) + 1)
            for token in tokens:
                if token not in ",." and not left:
                    break
                left -= token not in ",."
                words.append(token)
    return "title: A long line\ntempo: 90\n\n" + " ".join(words) + "\n"


def long_lines(n_notes: int) -> dict[str, bytes]:
    """Give one and the same line in each kind of file, by the ending of its name."""
    text = long_text(n_notes)
    read = read_note_text(text, NAMES)
    return {".txt": text.encode(), ".musicxml": as_music_xml(read), ".mid": as_midi(read)}


# --- the stopwatch -----------------------------------------------------------------------------


def took_s(work: Callable[[], object]) -> float:
    """Do it once."""
    began_s = time.perf_counter()
    work()
    return time.perf_counter() - began_s


def read_by_music21(path: Path) -> Figures:
    """Read a score with music21, once, without its cache; give how many notes it found."""
    from music21 import converter

    found: list[int] = []
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        seconds = took_s(
            lambda: found.append(
                len(converter.parse(path, forceSource=True).recurse().getElementsByClass("Note"))
            )
        )
    return Figures(seconds, found[0])


def read_by_us(data: bytes, tries: int = 3) -> Figures:
    """Read it a few times; give the best."""
    seconds = min(took_s(lambda: read_sheet(data, "line", NAMES)) for _ in range(tries))
    return Figures(seconds, len(read_sheet(data, "line", NAMES).places))


def compared(path: Path, name: str, data: bytes) -> tuple[float, str]:
    """Read a score with music21 and with our reader; give how many times as fast we are, and say it."""
    path.write_bytes(data)
    theirs, ours = read_by_music21(path), read_by_us(data)
    assert ours.notes == theirs.notes
    times = theirs.seconds / ours.seconds
    return times, (
        f"MusicXML, {ours.notes:,} notes, {name}: ours {ours.seconds:.3f} s, music21 {theirs.seconds:.2f} s, "
        f"{times:.0f} times as fast\n"
    )


def read_alone(path: Path) -> Figures:
    """Read a file in a process of its own; give the time of the whole process and its peak of memory."""
    began_s = time.perf_counter()
    done = subprocess.run(
        [sys.executable, "-c", READ_ALONE, str(path)], capture_output=True, check=True, text=True
    )
    notes, megabytes = done.stdout.split()
    return Figures(time.perf_counter() - began_s, int(notes), float(megabytes))


def check_s(path: Path, *options: str, tries: int = 5) -> float:
    """Run ``melodycoach check`` on a file; give the median, in seconds, from the start of the process."""
    command = [sys.executable, "-m", "melodycoach", "check", str(path), *options]

    def run() -> None:
        done = subprocess.run(command, capture_output=True, check=False, text=True)
        assert done.returncode == 0, done.stderr

    return statistics.median(took_s(run) for _ in range(tries))


# --- all of it ---------------------------------------------------------------------------------


def main() -> None:
    """Measure everything and print it."""
    say = sys.stdout.write
    with tempfile.TemporaryDirectory() as folder:
        for name, write in LONG_SCORES.items():
            say(compared(Path(folder) / "long.musicxml", name, write(SCORE_NOTES))[1])
        midi = Path(folder) / "long.mid"
        midi.write_bytes(long_midi(MIDI_EVENTS))
        alone = read_alone(midi)
        say(
            f"MIDI of {MIDI_EVENTS:,} events ({alone.notes:,} notes): {alone.seconds:.2f} s and "
            f"{alone.megabytes:.0f} MB, the whole process\n"
        )
        for ending, data in long_lines(LINE_NOTES).items():
            line = Path(folder) / f"line{ending}"
            line.write_bytes(data)
            for options in ((), ("--json",), ("--html", str(Path(folder) / "line.html"))):
                seconds = check_s(line, *options)
                say(f"check of {LINE_NOTES:,} notes, {ending} {' '.join(options[:1])}: {seconds:.2f} s\n")


if __name__ == "__main__":
    main()
