"""What changed from one answer to the next: what ``check --watch`` says after a save.

Two answers, as `melodycoach.report.check_data` makes them, in; sentences out.
"""

from __future__ import annotations

from difflib import SequenceMatcher
from typing import TYPE_CHECKING, Any

from melodycoach.report.check_words import headline, is_clear, parts_of, sounds_elsewhere, turned_to
from melodycoach.report.places import numbered_place
from melodycoach.report.words import pitch

if TYPE_CHECKING:
    from collections.abc import Iterable, Iterator, Mapping, Sequence

    Answer = Mapping[str, Any]

LISTED = 5
"""So many sentences of one sort are given; the others are counted."""

TOLD_POINTS = 5
"""A probability that moves by so many points in a hundred is told."""

_LARGEST_MATCH = 1_000_000  # pairs of notes that are compared; a larger edit is taken as all new

NOTHING = "nothing changed"
NOTES_ONLY = "the notes changed; the answer did not"
READABLE_AGAIN = "it can be read again"


def what_changed(before: Answer, after: Answer) -> list[str]:
    """Say what is new in the answer for a file.

    Parameters
    ----------
    before, after
        Two answers for one file, as data; each may be the reason why there is none.

    Returns
    -------
    list of str
        At least one sentence.
    """
    if "error" in after:
        return [after["error"], *after["faults"]]
    if "error" in before:
        return [READABLE_AGAIN]
    now_by_then = _moved(before["notes"], after["notes"])
    said = [
        *_whole(before, after),
        *_stay_in(before, after, now_by_then),
        *_off_notes(before, after, now_by_then),
        *_changes(before["changes"], after["changes"], now_by_then),
        *_steps(before, after),
        *_reading(before, after),
    ]
    if said:
        return said
    same = len(now_by_then) == before["n_notes"] == after["n_notes"]
    return [NOTHING if same else NOTES_ONLY]


def _moved(before: Sequence[Answer], after: Sequence[Answer]) -> dict[int, int]:
    """Say which note each of the notes before is now, both by number; notes that are gone are left out.

    Most edits touch one place: what is the same before and behind it is not compared note by note.
    """
    old, new = [_sound(note) for note in before], [_sound(note) for note in after]
    shorter = min(len(old), len(new))
    start = next((n for n in range(shorter) if old[n] != new[n]), shorter)
    end = next((n for n in range(shorter - start) if old[-1 - n] != new[-1 - n]), shorter - start)
    moved = {n: n for n in range(1, start + 1)}
    moved |= {len(old) - n: len(new) - n for n in range(end)}
    middle_old, middle_new = old[start : len(old) - end], new[start : len(new) - end]
    if len(middle_old) * len(middle_new) <= _LARGEST_MATCH:
        matcher = SequenceMatcher(None, middle_old, middle_new, autojunk=False)
        for block in matcher.get_matching_blocks():
            for n in range(start + 1, start + 1 + block.size):
                moved[block.a + n] = block.b + n
    return moved


def _sound(note: Answer) -> tuple[object, ...]:
    return note["pitch_cents"], note["length_s"]


# --- the line as a whole -----------------------------------------------------------------------


def _whole(before: Answer, after: Answer) -> Iterator[str]:
    more = after["n_notes"] - before["n_notes"]
    if more:
        yield f"{after['n_notes']} notes, {abs(more)} {'more' if more > 0 else 'fewer'} than before"
    then, now = before["whole"], after["whole"]
    if any(is_clear(change) for one in (before, after) for change in one["changes"]):
        if headline(before) != headline(after):
            yield f"the verdict is now: {headline(after)}; it was: {headline(before)}"
    elif (then["mode"], then["decided"]) != (now["mode"], now["decided"]):
        yield f"the verdict is now: {now['verdict']}; it was: {then['verdict']}"
    elif abs(points := _points(now) - _points(then)) >= TOLD_POINTS:
        likelier = "likelier" if points > 0 else "less likely"
        yield f"{now['name']} is {likelier} now: {_points(now)} %, before {_points(then)} %"
    old, new = before["in_view"], after["in_view"]
    if old["mode"] != new["mode"] and (old["is_target"] or new["is_target"]):
        yield f"notes are held against {new['name']} now, before against {old['name']}"


def _points(whole: Answer) -> int:
    return round(100 * float(whole["probability"]))


def _stay_in(before: Answer, after: Answer, now_by_then: Mapping[int, int]) -> Iterator[str]:
    then, now = before["stay_in"], after["stay_in"]
    if then is None or now is None:
        return
    if now["stays"]:
        if not then["stays"]:
            yield f"it stays in {now['name']} now"
    elif then["stays"]:
        yield f"it no longer stays in {now['name']}: {_leaving(after)}"
    elif now_by_then.get(then["first"]["note"]) != now["first"]["note"]:
        yield f"it first leaves {now['name']} elsewhere now: {_leaving(after)}"


def _leaving(answer: Answer) -> str:
    first = answer["stay_in"]["first"]
    where = "" if sounds_elsewhere(answer) else f"{numbered_place(first['place'], first['note'])}: "
    return f"{where}{first['says']}"


def _reading(before: Answer, after: Answer) -> Iterator[str]:
    for key in ("lost", "read"):
        yield from _listed(sentence for sentence in after[key] if sentence not in before[key])


# --- notes, changes of mode, steps -------------------------------------------------------------


def _off_notes(before: Answer, after: Answer, now_by_then: Mapping[int, int]) -> Iterator[str]:
    then = {note["number"]: note for note in before["notes"] if note["off"]}
    now = {note["number"]: note for note in after["notes"] if note["off"]}
    known = {now_by_then.get(number) for number in then}
    yield from _listed(
        f"off the mode: {_note(note)}: {note['off']['says']}; {_mend(note['off'])} mends it"
        for number, note in now.items()
        if number not in known
    )
    yield from _listed(
        f"off no more: {_note(note)}" for number, note in then.items() if now_by_then.get(number) not in now
    )
    left = len(now)
    if set(now) != known and then:
        yield (
            "no note is off the mode now"
            if not left
            else f"{_count(left, 'note is', 'notes are')} off the mode now"
        )


def _note(note: Answer) -> str:
    return f"{numbered_place(note, note['number'])}, {note['name'] or note['written']}"


def _mend(off: Answer) -> str:
    return pitch({"name": off["mend"], "written": off["mend_written"]})


def _changes(
    before: Sequence[Answer], after: Sequence[Answer], now_by_then: Mapping[int, int]
) -> Iterator[str]:
    """Pair the changes of mode that go from and to the same, the nearest to each other first."""
    pairs = sorted(
        (abs(now["note"] - now_by_then.get(then["note"], then["note"])), old, new)
        for old, then in enumerate(before)
        for new, now in enumerate(after)
        if (then["from"], then["to"]) == (now["from"], now["to"])
    )
    gone, fresh = dict(enumerate(before)), dict(enumerate(after))
    moved = []
    for distance, old, new in pairs:
        if old in gone and new in fresh:
            then, now = gone.pop(old), fresh.pop(new)
            if distance:
                moved.append(f"{_turn(now)} is now at {_at(now)}; it was at {_at(then)}")
    yield from _listed(f"no longer there: {_turn(one)} at {_at(one)}" for one in gone.values())
    yield from _listed(f"new: {_turn(one)} at {_at(one)}" for one in fresh.values())
    yield from _listed(moved)


def _turn(change: Answer) -> str:
    sort = "the" if is_clear(change) else "a possible"
    return f"{sort} change from {change['from']} to {turned_to(change)}"


def _at(change: Answer) -> str:
    return numbered_place(change["place"], change["note"])


def _steps(before: Answer, after: Answer) -> Iterator[str]:
    """Say which steps are newly heard, and which are newly owed."""
    heard_then, owed_then = _steps_of(before, "heard"), _steps_of(before, "owed")
    heard_now, owed_now = _steps_of(after, "heard"), _steps_of(after, "owed")
    modes_then = {mode for mode, _ in (*heard_then, *owed_then)}
    yield from _listed(
        f"heard now, of {mode}: {step['says']}"
        for (mode, name), step in heard_now.items()
        if (mode, name) not in heard_then
    )
    yield from _listed(
        f"owed again, of {mode}: {step['says']}"
        for (mode, name), step in owed_now.items()
        if (mode, name) in heard_then and step["need"] != "colour"
    )
    yield from _listed(
        f"owed now, of {mode}: {step['says']}"
        for (mode, name), step in owed_now.items()
        if mode not in modes_then and step["need"] != "colour"  # which is welcome, not owed
    )


def _steps_of(answer: Answer, which: str) -> dict[tuple[str, str], Answer]:
    """Give the steps of every mode that the line is said to be in: by the mode's name and their own."""
    parts = (part.of for part in parts_of(answer))
    return {(of["name"], step["id"]): step for of in parts for step in of["steps"][which]}


def _listed(sentences: Iterable[str]) -> Iterator[str]:
    said = list(sentences)
    yield from said[:LISTED]
    if len(said) > LISTED:
        yield f"and {len(said) - LISTED} more like this"


def _count(n: int, one: str, many: str) -> str:
    return f"{n} {one if n == 1 else many}"
