"""Modes on paper: the list of a pack, and one mode with all that makes it.

The functions are pure: a pack and a width in, text out. Programs take `modes_json` and `mode_json`,
which hold the same facts.
"""

from __future__ import annotations

import textwrap
from typing import TYPE_CHECKING, Any

from melodycoach.core.mode import Confidence, Need, Repertoire
from melodycoach.report.mode_data import mode_json, modes_json
from melodycoach.report.words import capital

if TYPE_CHECKING:
    from collections.abc import Iterable, Iterator, Sequence

    from melodycoach.core.mode import Mode, ModePack

__all__ = ["mode_json", "mode_text", "modes_json", "modes_text"]

MIN_COLUMNS = 40
_LABEL_COLUMNS = 32
_WIDE = 72
"""From here on labels stand beside what they label; below, above it."""

_NEEDS = {
    Need.CORE.value: "Core: without these a phrase does not show the mode",
    Need.USUAL.value: "Usual: a listener expects them",
    Need.COLOUR.value: "Colour: welcome, not owed",
}

_CONFIDENCE = {
    Confidence.HIGH.value: "high: the sources agree on what matters",
    Confidence.MEDIUM.value: "medium: the sources differ in places, or say little",
    Confidence.LOW.value: "low: little was found to check this against",
}

_HEARD = {
    Repertoire.COMMON.value: "often heard",
    Repertoire.OCCASIONAL.value: "heard at times",
    Repertoire.RARE.value: "rarely heard",
}

_FACT_NAMES = {
    "rising": "scale",
    "dominants": "dominant",
    "leading": "leading tone",
    "suspended": "suspended cadences",
    "signature": "key signature",
    "opening": "opening region",
    "steps": "characteristic steps",
    "played": "usual intonation",
    "falling": "falling form",
}


def modes_text(pack: ModePack, columns: int = 80) -> str:
    """List the modes of a pack by family.

    Parameters
    ----------
    pack
        The pack.
    columns
        Width to fill; taken for 40 where it is less. A narrow list leaves out the last columns.
    """
    width = max(columns, MIN_COLUMNS)
    data = modes_json(pack)
    lines = [f"{pack.name}: {len(pack.modes)} modes", ""]
    lines += _wrapped(f"Theory: {pack.theory}. {pack.caution}", width)
    word = pack.names.word
    heads = ("name", "id", "final", word("course"), word("dominant"))
    rows = {mode["id"]: _cells(mode, data["words"]) for mode in data["modes"]}
    sizes = [max(map(len, column)) for column in zip(heads, *rows.values(), strict=True)]
    lines += ["", _row(heads, sizes, width)]
    for family, modes in _by_family(data["modes"]):
        lines += [
            "",
            capital(family) or "Other modes",
            *(_row(rows[mode["id"]], sizes, width) for mode in modes),
        ]
    lines += _seldom_heard(data["modes"], width)
    lines += ["", *_wrapped("One mode in full: melodycoach modes NAME, in any spelling.", width)]
    return "\n".join(lines)


def mode_text(pack: ModePack, mode: Mode, columns: int = 80) -> str:
    """Say what one mode is made of.

    Parameters
    ----------
    pack, mode
        The pack, and the mode of it.
    columns
        Width to fill; taken for 40 where it is less.
    """
    width = max(columns, MIN_COLUMNS)
    data = mode_json(pack, mode)
    sections = [
        _head(data, width),
        [*_title("Tuning", width), *_tuning(data, width)],
        [*_title("Characteristic steps", width), *_steps(data, width)],
    ]
    if data["neighbours"]:
        sections.append([*_title("Neighbours, and what tells them apart", width), *_neighbours(data, width)])
    sections.append([*_title("Where this comes from", width), *_sources(data, width)])
    return "\n".join("\n".join(section) + "\n" for section in sections).rstrip("\n")


# --- the list


def _by_family(modes: Sequence[dict[str, Any]]) -> Iterator[tuple[str, list[dict[str, Any]]]]:
    families = list(dict.fromkeys(mode["family"] for mode in modes))
    for family in sorted(families, key=lambda name: name == ""):
        yield family, [mode for mode in modes if mode["family"] == family]


def _seldom_heard(modes: Sequence[dict[str, Any]], width: int) -> list[str]:
    """Name the modes that a listener does not expect; those that are not named are often heard."""
    lines: list[str] = []
    for repertoire in (Repertoire.OCCASIONAL.value, Repertoire.RARE.value):
        names = [mode["name"] for mode in modes if mode["repertoire"] == repertoire]
        if names:
            text = f"{capital(_HEARD[repertoire])} in the repertoire: {', '.join(names)}."
            lines += ["", *_wrapped(text, width)]
    return lines


def _cells(mode: dict[str, Any], words: dict[str, str]) -> tuple[str, ...]:
    return (
        mode["name"],
        mode["id"].partition("/")[2],
        f"on {mode['final']['name']}",
        words.get(mode["course"], mode["course"]),
        mode["dominants"][0]["name"],
    )


def _row(cells: Sequence[str], sizes: Sequence[int], width: int) -> str:
    line = " "
    for text, size in zip(cells, sizes, strict=True):
        if len(line) + 1 + size > width:
            break
        line = f"{line} {text:<{size}}"
    return line.rstrip()


# --- one mode


def _head(data: dict[str, Any], width: int) -> list[str]:
    words = data["words"]
    final, (low, high) = data["final"], data["opening"]
    home = (
        final["name"] if final["name"] == final["written"] else f"{final['name']}, written {final['written']}"
    )

    def gloss(term: str) -> str:
        return _beside(term, words)

    rows = [
        ("family", data["family"]),
        ("in the repertoire", _HEARD[data["repertoire"]]),
        (f"final{gloss('final')}", home),
        ("key signature", " ".join(data["signature"]) or "none"),
        (f"course{gloss('course')}", f"{data['course']}{gloss(data['course'])}"),
        ("opens and lives between", f"{low['name']} and {high['name']}"),
        (f"dominant{gloss('dominant')}", _names(data["dominants"], ", then ")),
        (f"leading tone{gloss('leading tone')}", _names(data["leading"]) or "none of its own"),
        (f"suspended cadences{gloss('suspended cadence')}", _names(data["suspended"]) or "none of note"),
        ("genera", "; ".join(_genus(genus) for genus in data["genera"])),
    ]
    name = data["name"] + (f" ({', '.join(data['also'])})" if data["also"] else "")
    lines = [*_wrapped(name, width), "=" * min(len(name), width)]
    for label, text in rows:
        if text:
            lines += _labelled(label, text, width)
    return lines


def _genus(genus: dict[str, Any]) -> str:
    when = f", {genus['when']}" if genus["when"] else ""
    return f"{genus['name']} on {genus['on']['name']}{when}"


def _tuning(data: dict[str, Any], width: int) -> list[str]:
    """Draw the degrees as a ladder, high above low."""
    unit = f"{data['unit']}s"
    played_head = "played" if any(one["played"] is not None for one in data["degrees"]) else ""
    name_size = max(len(one["name"]) for one in data["degrees"])
    wide = width >= _WIDE
    left, written, count, cents = (2, 8, 8, 8) if wide else (0, 6, 7, 6)
    head = f"{'':{left}}{'written' if wide else '':<{written}}{'name':<{name_size}}"
    lines = [f"{head}{unit:>{count}}{'cents':>{cents}} {played_head}".rstrip()]
    for one in reversed(data["degrees"]):
        played = "" if one["played"] is None else f"{one['played']:g}"
        name = one["name"] if one["name"] != one["written"] else ""
        pitch = f"{'':{left}}{one['written']:<{written}}{name:<{name_size}}"
        line = f"{pitch}{one['degree']:>{count}}{one['cents']:>{cents}.0f} {played:<{len(played_head) + 2}}"
        does = ", ".join(_with_word(role, data["words"]) for role in one["roles"])
        lines += _hung(line, does, width)
    says = f"{unit.capitalize()} and cents count from the final; the octave has {data['divisions']} {unit}."
    if played_head:
        says += " 'Played' stands where usual intonation leaves the written pitch."
    return [*lines, "", *_wrapped(says, width)]


def _with_word(role: str, words: dict[str, str]) -> str:
    term = "dominant" if role.endswith(" dominant") else role
    return f"{role}{_beside(term, words)}"


def _steps(data: dict[str, Any], width: int) -> list[str]:
    lines: list[str] = []
    for need, says in _NEEDS.items():
        steps = [step for step in data["steps"] if step["need"] == need]
        if not steps:
            continue
        lines += ["", *_wrapped(says, width)] if lines else _wrapped(says, width)
        for step in steps:
            names = _names(step["notes"], " ")
            written = " ".join(one["written"] for one in step["notes"])
            lines += _wrapped(step["says"], width, "  - ", "    ")
            lines += _wrapped(names if names == written else f"{names}   {written}", width, "      ")
            if step["note"]:
                lines += _wrapped(step["note"], width, "      ")
    return lines


def _neighbours(data: dict[str, Any], width: int) -> list[str]:
    lines = []
    for one in data["neighbours"]:
        lines += _wrapped(f"{one['name']}: {one['difference']}", width, "  - ", "    ")
    return lines


def _sources(data: dict[str, Any], width: int) -> list[str]:
    facts_by_title: dict[str, list[str]] = {}
    for fact, sources in data["sources"].items():
        for source in sources:
            facts_by_title.setdefault(source["title"], []).append(_FACT_NAMES.get(fact, fact))
    lines = _labelled("theory", data["theory"], width)
    if facts_by_title:
        lines += _labelled("confidence", _CONFIDENCE[data["confidence"]], width)
    for title, facts in facts_by_title.items():
        lines += _wrapped(f"{title} [{', '.join(facts)}]", width, "  - ", "    ")
    return [*lines, "", *_wrapped(data["caution"], width)]


# --- lines


def _title(text: str, width: int) -> list[str]:
    return [*_wrapped(text, width), "-" * min(len(text), width)]


def _labelled(label: str, text: str, width: int) -> list[str]:
    if width < _WIDE:
        return [*_wrapped(label, width, "  "), *_wrapped(text, width, "    ")]
    return _wrapped(text, width, f"  {label:<{_LABEL_COLUMNS}}", " " * (_LABEL_COLUMNS + 2))


def _hung(line: str, text: str, width: int) -> list[str]:
    """Put a text behind a line where there is room for it, else under it."""
    if not text:
        return [line.rstrip()]
    if len(line) + 20 <= width:
        return _wrapped(text, width, line, " " * len(line))
    return [line.rstrip(), *_wrapped(text, width, " " * 8)]


def _wrapped(text: str, width: int, first: str = "", rest: str | None = None) -> list[str]:
    indent = first if rest is None else rest
    return textwrap.wrap(
        text,
        width,
        initial_indent=first,
        subsequent_indent=indent,
        break_long_words=False,
        break_on_hyphens=False,
    )


def _names(places: Iterable[dict[str, Any]], between: str = ", ") -> str:
    return between.join(one["name"] for one in places)


def _beside(term: str, words: dict[str, str]) -> str:
    return f" ({words[term]})" if term in words else ""
