"""Hand-made views, such as a session would give: short phrases of our own in hüseynî."""

from __future__ import annotations

from dataclasses import replace

import pytest

from melodycoach.core.ladder import Rung
from melodycoach.screen.view import (
    LeaningRow,
    LineNote,
    OwedRow,
    Refusal,
    Status,
    ViewState,
    WhyRow,
)

# name, written note, key, units from A4, function, role: the ladder of hüseynî in the 53 system,
# with acem, which hüseynî has only in falling
RUNGS = (
    ("muhayyer", "A5", "A5", 53, "", ""),
    ("gerdâniye", "G5", "G5", 44, "", ""),
    ("eviç", "F#5", "F#5", 39, "", ""),
    ("acem", "F5", "F5", 35, "", ""),
    ("hüseynî", "E5", "E5", 31, "güçlü", "dominant"),
    ("nevâ", "D5", "D5", 22, "asma karar", "suspended cadence"),
    ("çargâh", "C5", "C5", 13, "asma karar", "suspended cadence"),
    ("segâh", "B4-1", "B4", 8, "", ""),
    ("dügâh", "A4", "A4", 0, "karar", "final"),
    ("rast", "G4", "G4", -9, "yeden", "leading tone"),
)
LADDER = tuple(Rung(units, name, function, role) for name, _, _, units, function, role in RUNGS)
BY_NAME = {name: (written, key, units) for name, written, key, units, _, _ in RUNGS}
BY_NAME["hisar"] = ("Eb5+3", "Eb5", 29)

PHRASE = "hüseynî hüseynî gerdâniye eviç hüseynî: , nevâ çargâh segâh dügâh: . rast dügâh nevâ hüseynî: ,"


def notes_of(text: str) -> tuple[LineNote, ...]:
    """Read ``name`` tokens: a colon for a note that rests, ``!`` for one off the mode, then marks."""
    notes: list[LineNote] = []
    item = -1
    for word in text.split():
        item += 1
        if word in {",", ".", "|"}:
            notes[-1] = replace(notes[-1], mark=word)
            continue
        name = word.rstrip(":!")
        written, _, units = BY_NAME[name]
        off = "not in Hüseynî, 2 commas below hüseynî" if "!" in word else ""
        mend = "hüseynî" if off else ""
        height = 31 if off else None
        rests = ":" in word
        length_s = 0.7 if rests else 0.3
        notes.append(
            LineNote(len(notes) + 1, units, name, written, length_s, rests, off, mend, "", item, height)
        )
    return tuple(notes)


def tokens_of(text: str) -> tuple[str, ...]:
    """Write the same text as note text."""
    written = []
    for word in text.split():
        name = word.rstrip(":!")
        written.append(word if name not in BY_NAME else BY_NAME[name][0] + (":2" if ":" in word else ""))
    return tuple(written)


def step(kind: str, need: str, names: str, heard_at: int | None = None, gain: float = 0.0) -> OwedRow:
    """Give a characteristic step from the names of its notes."""
    perdes = tuple(names.split())
    written = tuple(BY_NAME[name][0] for name in perdes)
    keys = tuple(BY_NAME[name][1] for name in perdes)
    return OwedRow(kind, need, perdes, written, keys, heard_at, gain)


OWED = (
    step("final cadence on dügâh (karar)", "core", "çargâh segâh dügâh rast dügâh", gain=1.84),
    step("alteration: acem for eviç in descent", "core", "gerdâniye acem hüseynî", gain=1.1),
    step("suspended cadence on çargâh (asma karar)", "usual", "hüseynî nevâ çargâh", gain=0.62),
    step("leading tone (yeden): rast before dügâh", "usual", "segâh dügâh rast dügâh", gain=0.3),
    step("register: up to muhayyer", "colour", "gerdâniye muhayyer", gain=-0.21),
    step("half cadence on hüseynî (güçlü)", "core", "eviç hüseynî", heard_at=5),
    step("opening (seyir): from hüseynî up to gerdâniye", "core", "hüseynî gerdâniye", heard_at=3),
    step("eviç in ascent", "usual", "hüseynî eviç gerdâniye", heard_at=4),
)

LEANINGS = (
    LeaningRow("makam/huseyni", "Hüseynî", "dügâh", 0.724, 0.12),
    LeaningRow("makam/muhayyer", "Muhayyer", "dügâh", 0.143, -0.05),
    LeaningRow("makam/beyati", "Beyâtî", "dügâh", 0.061, -0.04),
    LeaningRow("makam/neva", "Nevâ", "dügâh", 0.031, -0.021),
    LeaningRow("makam/ussak", "Uşşak", "dügâh", 0.02, 0.001),
    LeaningRow("makam/tahir", "Tâhir", "dügâh", 0.009, -0.002),
    LeaningRow("makam/karcigar", "Karcığar", "dügâh", 0.004, -0.001),
    LeaningRow("makam/gulizar", "Gülizâr", "dügâh", 0.003, 0.0),
    LeaningRow("makam/sultaniyegah", "Sultânîyegâh", "yegâh", 0.002, 0.0),
)

WHY = (
    WhyRow("you opened on hüseynî; Muhayyer opens an octave above the final", 1.31),
    WhyRow("you came to rest on hüseynî (note 5), the half cadence of Hüseynî", 0.84),
    WhyRow("gerdâniye eviç hüseynî (notes 3 to 5)", 0.42),
    WhyRow("nevâ çargâh segâh dügâh (notes 6 to 9) is as usual in Muhayyer", -0.23),
)

WORLD = Status(
    input_line="listening to USB Keys 61:USB Keys 61 MIDI 1 20:0",
    tuning_line="plain keys: each stands for every perde near it",
    log_line="log: ~/.local/share/melodycoach/sessions/2031-05-04-101502.events.jsonl",
)


def base_view(phrase: str = PHRASE) -> ViewState:
    """Give a decided view of a phrase."""
    line = notes_of(phrase)
    return ViewState(
        verdict="leaning to Hüseynî, 72 %",
        now="",
        decided=True,
        leanings=LEANINGS,
        in_view="Hüseynî",
        rival="Muhayyer",
        is_target=False,
        owed=OWED,
        line=line,
        ladder=LADDER,
        why=WHY,
        keyboard_note="",
        tokens=tokens_of(phrase),
        n_notes=len(line),
        reading="written pitch: each mode on its own final",
        restricted="all 48 modes of Makam",
        theory="Arel-Ezgi-Uzdilek theory, as commonly taught.",
        caution="Schools and regions differ: where yours does, follow your teacher.",
        can_undo=True,
        can_redo=False,
        status=WORLD,
    )


def hand_made_views() -> dict[str, ViewState]:
    """Give one view for each thing that the screen has to show."""
    decided = base_view()
    nothing = replace(
        base_view(""),
        verdict="nothing heard yet: play or type a note",
        decided=False,
        leanings=tuple(replace(row, probability=0.021, change=0.0) for row in LEANINGS),
        owed=tuple(replace(row, heard_at=None) for row in OWED),
        why=(),
        can_undo=False,
        status=replace(WORLD, input_line="no keyboard found; type notes, or plug one in at any time"),
    )
    undecided = replace(
        base_view("nevâ hüseynî nevâ çargâh: ,"),
        verdict="undecided between Uşşak and Beyâtî (both of the uşşak family)",
        decided=False,
        leanings=(
            LeaningRow("makam/ussak", "Uşşak", "dügâh", 0.34, 0.02),
            LeaningRow("makam/beyati", "Beyâtî", "dügâh", 0.31, -0.03),
            *(
                replace(row, probability=row.probability / 4)
                for row in LEANINGS
                if row.name not in {"Uşşak", "Beyâtî"}
            ),
        ),
        in_view="Uşşak",
        rival="Beyâtî",
        owed=tuple(replace(row, heard_at=None) for row in OWED),
        why=(WhyRow("you opened on nevâ; both do, Beyâtî more often", -0.12),),
        keyboard_note="plain keys cannot tell segâh from bûselik: both are the B key",
    )
    target = replace(
        decided,
        is_target=True,
        in_view="Sultânîyegâh",
        leanings=(*LEANINGS[:-1], replace(LEANINGS[-1], target=True)),
    )
    off = replace(decided, **_phrase(f"{PHRASE} nevâ hisar! nevâ"), can_redo=True)
    change = replace(
        off,
        now="right now it sounds like Karcığar, since note 14",
        **_phrase(f"{PHRASE} nevâ hisar! nevâ çargâh hisar! nevâ çargâh segâh dügâh: ."),
    )
    long = replace(
        decided, **_phrase(" ".join([PHRASE] * 7) + " gerdâniye muhayyer gerdâniye acem hüseynî: ,")
    )
    error = replace(
        decided,
        status=replace(
            WORLD,
            input_line="USB Keys 61:USB Keys 61 MIDI 1 has gone; plug it in again and it goes on by itself",
            log_line="no log: see the warning",
            warning="the log cannot be written: no space left on device; playing goes on without it",
        ),
        refusals=(Refusal(1, "entry: column 1: 'H5' is no note; did you mean 'A5'?", ("H5",)),),
    )
    return {
        "nothing": nothing,
        "undecided": undecided,
        "decided": decided,
        "target": target,
        "off": off,
        "change": change,
        "long": long,
        "error": error,
    }


def _phrase(text: str) -> dict[str, object]:
    line = notes_of(text)
    return {"line": line, "tokens": tokens_of(text), "n_notes": len(line)}


@pytest.fixture(scope="session")
def views() -> dict[str, ViewState]:
    """Give the hand-made views by name."""
    return hand_made_views()
