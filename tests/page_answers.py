"""Answers made by hand, as `melodycoach.report.check_data` gives them, for the tests of the pages.

The line is ours: sixteen notes in four bars, the tenth of them off the mode. Numbers are made up,
so that a test knows them; heights are those of Arel-Ezgi-Uzdilek theory (common practice).
"""

from __future__ import annotations

from typing import Any

HEIGHTS = {  # name: (written, commas from A4)
    "rast": ("G4", -9),
    "dügâh": ("A4", 0),
    "segâh": ("B4-1", 8),
    "çargâh": ("C5", 13),
    "nim hicaz": ("C#5", 17),
    "nevâ": ("D5", 22),
    "hüseynî": ("E5", 31),
    "eviç": ("F#5", 39),
    "gerdâniye": ("G5", 44),
}
LINE = (
    *("hüseynî", "eviç", "gerdâniye", "hüseynî"),
    *("nevâ", "hüseynî", "eviç", "hüseynî"),
    *("nevâ", "nim hicaz", "nevâ", "çargâh"),
    *("segâh", "dügâh", "rast", "dügâh"),
)
OFF = 10
WORDS = {"final": "karar", "dominant": "güçlü", "course": "seyir"}


def pitch(name: str) -> dict[str, Any]:
    written, height = HEIGHTS[name]
    return {"name": name, "written": written, "height": height}


def where(number: int, bars: bool = True) -> dict[str, Any]:
    bar, beat = divmod(number - 1, 4)
    return {
        "bar": str(bar + 1) if bars else "",
        "beat": beat + 1.0 if bars else 0.0,
        "at": f"line {bar + 3}, column {3 * beat + 1}",
    }


def note(number: int, name: str, bars: bool = True) -> dict[str, Any]:
    off = {
        "says": "not in Hüseynî, 4 commas above çargâh",
        "mode": "makam/huseyni",
        "mend": "çargâh",
        "mend_written": "C5",
        "mend_height": 13,
    }
    return {
        "number": number,
        **where(number, bars),
        "phrase": (number - 1) // 8 + 1,
        "stretch": 1,
        "onset_s": round(0.7 * (number - 1), 3),
        "length_s": 0.7,
        "pitch_cents": 6900.0,
        **pitch(name),
        "rests": number in (8, 16),
        "closes": number == 16,
        "likely": [{"name": "Hüseynî", "probability": 0.72}, {"name": "Nevâ", "probability": 0.2}],
        "off": off if number == OFF else None,
    }


def step(name: str, need: str, heard_at: int | None) -> dict[str, Any]:
    return {
        "id": name,
        "kind": name,
        "need": need,
        "says": f"{name} on dügâh",
        "notes": [pitch("segâh"), pitch("dügâh")],
        "heard_at": heard_at,
        "place": where(heard_at) if heard_at else None,
        "gain_nats": 0.0 if heard_at else 0.8,
    }


def span(first: int, last: int, bars: bool, **more: Any) -> dict[str, Any]:
    off = [OFF] if first <= OFF <= last else []
    return {
        "first": first,
        "last": last,
        "place": where(first, bars),
        "verdict": "leaning to Hüseynî, 61 %",
        "decided": True,
        "mode": "makam/huseyni",
        "name": "Hüseynî",
        "probability": 0.61,
        "stretch_mode": "Hüseynî",
        "fits": not off,
        "off_notes": off,
        **more,
    }


def stretch(first: int, last: int, name: str) -> dict[str, Any]:
    return {
        "first": first,
        "last": last,
        "place": where(first),
        "mode": "makam/huseyni" if name == "Hüseynî" else f"makam/{name}",
        "name": name,
        "final": pitch("dügâh"),
        "probability": 0.6,
        "decided": True,
        "verdict": f"leaning to {name}, 60 %",
        "noticed_at": None,
        "steps": steps(),
        "course": course(name),
    }


def steps() -> dict[str, Any]:
    return {
        "heard": [step("final cadence", "core", 16)],
        "owed": [step("half cadence", "core", None), step("leap", "colour", None)],
    }


def course(name: str) -> dict[str, Any]:
    return {
        "mode": f"makam/{name}",
        "name": name,
        "opening": {"agrees": True, "says": "it opens on hüseynî"},
        "register": {"agrees": None, "says": "too short to tell"},
        "cadence": {"agrees": False, "says": "it does not come to rest on dügâh"},
        "phrase_ends": [
            {"note": 8, "place": where(8), "pitch": pitch("hüseynî"), "function": "güçlü"},
            {"note": 16, "place": where(16), "pitch": pitch("dügâh"), "function": ""},
        ],
    }


def change(note: int, before: str, after: str) -> dict[str, Any]:
    """Give a clear change; `open_change` and `family_change` make others of it."""
    return {
        "note": note,
        "place": where(note),
        "from": before,
        "to": after,
        "probability": 0.64,
        "decided": True,
        "family": "",
        "among": [f"makam/{after}"],
        "noticed_at": note + 3,
        "says": f"turns from {before} to {after}, 64 %",
    }


def open_change(note: int, before: str, after: str) -> dict[str, Any]:
    says = f"may turn from {before} to {after}, 64 % (undecided between {after} and Sabâ)"
    return change(note, before, after) | {"decided": False, "among": [after, "Sabâ"], "says": says}


def family_change(note: int, before: str, after: str, family: str) -> dict[str, Any]:
    says = f"turns from {before} to the {family}: undecided between {after} and Sabâ"
    return open_change(note, before, after) | {"family": family, "says": says}


def answer(bars: bool = True, **changes: Any) -> dict[str, Any]:
    """Give an answer in which some of the top keys are replaced."""
    ladder = [
        pitch(name)
        | {"function": {"dügâh": "karar", "hüseynî": "güçlü"}.get(name, "")}
        | {"role": {"dügâh": "final", "hüseynî": "dominant"}.get(name, "degree")}
        for name in HEIGHTS
        if name != "nim hicaz"
    ]
    leanings = [("Hüseynî", 0.72), ("Nevâ", 0.2), ("Gerdâniye", 0.002)]
    return {
        "file": "draft.txt",
        "kind": "note text",
        "title": "Night ferry",
        "tempo": 84.0,
        "read": ["read as note text"],
        "lost": [],
        "pack": "makam",
        "theory": "Arel-Ezgi-Uzdilek (AEU), as commonly taught",
        "caution": "Schools and regions differ: where yours does, follow your teacher.",
        "words": WORDS,
        "unit": "comma",
        "divisions": 53,
        "reading": "written pitch: each mode on its own final",
        "compete": "all 62 modes of Turkish makam",
        "n_notes": len(LINE),
        "whole": {
            "verdict": "leaning to Hüseynî, 72 %",
            "decided": True,
            "mode": "makam/huseyni",
            "name": "Hüseynî",
            "final": pitch("dügâh"),
            "probability": 0.72,
            "among": ["makam/huseyni"],
            "leanings": [
                {"mode": name, "name": name, "final": pitch("dügâh"), "probability": probability}
                for name, probability in leanings
            ],
        },
        "in_view": {
            "mode": "makam/huseyni",
            "name": "Hüseynî",
            "is_target": False,
            "final": pitch("dügâh"),
            "ladder": sorted(ladder, key=lambda rung: rung["height"]),
            "steps": steps(),
        },
        "notes": [note(number, name, bars) for number, name in enumerate(LINE, 1)],
        "off_notes": [OFF],
        "likelihoods": {
            "modes": [{"mode": name, "name": name} for name, _ in leanings],
            "after": [[0.04 * number, 0.2, 0.002] for number in range(1, len(LINE) + 1)],
        },
        "phrases": [span(1, 8, bars), span(9, 16, bars)],
        "bars": [span(at, at + 3, bars, bar=str(at // 4 + 1)) for at in (1, 5, 9, 13)] if bars else [],
        "stretches": [stretch(1, 16, "Hüseynî")],
        "changes": [],
        "course": course("Hüseynî"),
        "rival": {
            "mode": "makam/neva",
            "name": "Nevâ",
            "probability": 0.2,
            "for_leader": [{"says": "you rested on hüseynî", "nats": 1.31, "notes": [8]}],
            "for_rival": [{"says": "you passed through nevâ", "nats": -0.42, "notes": [4, 5, 6, 9]}],
            "rest_nats": 0.39,
        },
        "keyboard_note": "",
        "stay_in": None,
        **changes,
    }


def long_answer(n_notes: int) -> dict[str, Any]:
    """Give an answer of many notes: the same line, again and again."""
    one = answer()
    notes = [note(number, LINE[(number - 1) % len(LINE)]) for number in range(1, n_notes + 1)]
    after = [[0.5, 0.3, 0.1] for _ in notes]
    likelihoods = {"modes": one["likelihoods"]["modes"], "after": after}
    return one | {"notes": notes, "n_notes": n_notes, "likelihoods": likelihoods}
