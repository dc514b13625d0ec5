"""The areas of the screen beside the contour: verdict, leanings, owed steps, reasons, status.

Conventions
-----------
Each function takes the view and its room in columns and rows, and gives at most so many lines;
what has no room is left out, the least needed first. Lines may be short: whoever puts them on the
screen fills them up.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from melodycoach.screen.text import Line, cut, line_width, pad, pad_left, width, wrap, wrap_within

if TYPE_CHECKING:
    from collections.abc import Sequence

    from melodycoach.screen.signs import Signs
    from melodycoach.screen.view import LeaningRow, OwedRow, ViewState

_STEADY = 0.005
"""A change of probability smaller than this is shown as none."""

NEEDS = ("core", "usual", "colour")


def percent(probability: float) -> str:
    """Write a probability for people, in four cells; neither certainty is ever claimed.

    >>> percent(0.724), percent(0.9991), percent(0.002), percent(0)
    (' 72%', '>99%', ' <1%', ' <1%')
    """
    if probability > 0.995:
        return ">99%"
    if probability < 0.005:
        return " <1%"
    return f"{probability * 100:3.0f}%"


def title_line(text: str, columns: int, signs: Signs, right: str = "") -> Line:
    """Write the heading of an area, with a rule to its right edge."""
    shown = cut(text, columns, signs.more)
    room = columns - width(shown) - 1
    tail = f" {right}" if right and width(right) + 3 <= room else ""
    rule = signs.rule * max(room - width(tail), 0)
    return [("class:title", shown), ("class:rule", f" {rule}" if room > 0 else ""), ("class:faint", tail)]


def draw_verdict(view: ViewState, columns: int, signs: Signs) -> Line:
    """Write the answer in one line, with what is taken as known at its right end."""
    sign = signs.decided if view.decided else signs.undecided
    style = "class:verdict" if view.decided else "class:verdict class:verdict.open"
    verdict = view.verdict
    if view.decided and view.leanings and "%" not in view.verdict:
        verdict += f"  {percent(view.leanings[0].probability).strip()}"
    verdict = cut(f"{sign} {verdict}", columns, signs.more)
    count = f"{view.n_notes} note" + ("s" if view.n_notes != 1 else "")
    left = columns - width(verdict) - 2
    for context in ([view.reading, view.restricted, count], [view.restricted, count], [count]):
        right = f" {signs.dot} ".join(part for part in context if part)
        if width(right) <= left:
            return [(style, verdict), ("", " " * (left + 2 - width(right))), ("class:faint", right)]
    return [(style, verdict)]


def draw_now(view: ViewState, columns: int, signs: Signs, theory: bool) -> Line:
    """Write what the last stretch sounds like, else what the keyboard hides, else the theory if wanted."""
    if view.now:
        return [("class:now", cut(f"{signs.next} {view.now}", columns, signs.more))]
    text = view.keyboard_note or (theory_words(view) if theory else "")
    return [("class:faint", cut(f"  {text}", columns, signs.more))]


def theory_words(view: ViewState) -> str:
    """Join whose theory is shown and the caution that goes with it."""
    if view.theory and view.caution:
        return f"{view.theory.rstrip('.')}. {view.caution}"
    return view.theory or view.caution


def draw_leanings(view: ViewState, columns: int, rows: int, signs: Signs) -> list[Line]:
    """Draw the modes with their probabilities; the target is there even when it comes last."""
    shown = list(view.leanings[:rows])
    target = next((row for row in view.leanings if row.target), None)
    if shown and target is not None and target not in shown:
        shown[-1] = target
    names = max((width(row.name) for row in shown), default=0)
    finals = max((width(row.final) for row in shown), default=0)
    names = min(names, max(columns - 14, 4), 22)
    with_final = columns - names - 2 - 4 - 4 - 6 >= finals + 2
    with_size = columns - names - 2 - 4 - 6 - (finals + 2 if with_final else 0) >= 12
    tail = 4 + 2 + (4 if with_size else 0) + (finals + 2 if with_final else 0)
    bar = max(columns - 2 - names - 1 - 1 - tail, 0)
    bar = min(bar, 44)
    return [_leaning(row, place, names, bar, with_size, with_final, signs) for place, row in enumerate(shown)]


def _leaning(
    row: LeaningRow, place: int, names: int, bar: int, with_size: bool, with_final: bool, signs: Signs
) -> Line:
    mark = f"{signs.target} " if row.target else "  "
    name_style = "class:target" if row.target else "class:name.first" if place == 0 else "class:name"
    full = draw_bar(row.probability, bar, signs)
    line = [
        ("class:target", mark),
        (name_style, pad(row.name, names, signs.more) + " "),
        ("class:bar.target" if row.target else "class:bar", pad(full, bar)),
        ("", f" {percent(row.probability)} "),
    ]
    if abs(row.change) < _STEADY:
        line.append(("class:faint", signs.steady))
    else:
        rising = row.change > 0
        line.append(("class:rising", signs.rising) if rising else ("class:falling", signs.falling))
    if with_size:
        points = round(abs(row.change) * 100)
        line.append(("class:faint", f"{points:3d} " if points else "    "))
    if with_final:
        line.append(("class:faint", f" {row.final}"))
    return line


def draw_bar(share: float, cells: int, signs: Signs) -> str:
    """Draw a share of 0 to 1 as a bar of so many cells at most, to an eighth of a cell.

    >>> from melodycoach.screen.signs import ASCII, UNICODE
    >>> draw_bar(0.5, 9, UNICODE), draw_bar(0.5, 8, ASCII)
    ('████▌', '####')
    """
    parts = len(signs.bar)
    filled = round(min(max(share, 0.0), 1.0) * cells * parts)
    if filled == 0:
        return ""
    whole, rest = divmod(filled, parts)
    return signs.bar[-1] * whole + (signs.bar[rest - 1] if rest else "")


def split_owed(view: ViewState) -> tuple[list[OwedRow], list[OwedRow], list[OwedRow]]:
    """Part the characteristic steps into those owed, colour that is welcome, and those heard."""
    owed = [row for row in view.owed if row.is_owed]
    welcome = [row for row in view.owed if row.heard_at is None and row.is_colour]
    heard = [row for row in view.owed if row.heard_at is not None]
    return owed, welcome, heard


def owed_title(view: ViewState, signs: Signs) -> tuple[str, str]:
    """Give heading and right end of the area of owed steps; before the first note there is no mode."""
    if not (view.n_notes or view.is_target):
        return "owed", ""
    counted = [row for row in view.owed if not row.is_colour]
    heard = sum(1 for row in counted if row.heard_at is not None)
    aim = " (your aim)" if view.is_target else ""
    name = f" {signs.dot} {view.in_view}{aim}" if view.in_view else ""
    return f"owed{name}", f"{heard} of {len(counted)} heard" if counted else ""


def draw_owed(view: ViewState, columns: int, rows: int, signs: Signs) -> list[Line]:
    """Draw the best step to play next, then all steps by need: not heard, then heard.

    Colour is never put first: once nothing is owed any more, that is said there. With little room
    the written notes and keys of all but the best go first, then the headings, then steps: colour,
    the last of those owed, and the oldest of those heard.
    """
    if rows <= 0:
        return []
    if not view.owed or not (view.n_notes or view.is_target):
        text = "owed steps will stand here"
        if rows >= 4:
            text = "the steps that mark the leading mode will stand here: which you owe, which are heard"
        return [[("class:faint", row)] for row in wrap(text, columns)][:rows]
    owed, welcome, heard = split_owed(view)
    others = [*owed[1:], *welcome]
    if owed and rows <= 2:
        return _best_in_short(owed[0], columns, rows, signs)
    if owed:
        lines = _best(owed[0], columns, signs)[:rows]
    else:
        said = f"{signs.heard} every step that {view.in_view} needs is heard"
        lines = [[("class:heard", cut(said, columns, signs.more))]]
    for choice in (
        _grouped(others, heard, columns, signs, 2),
        _grouped(others, heard, columns, signs, 1),
    ):
        if len(lines) + len(choice) <= rows:
            return lines + choice
    room = rows - len(lines)
    n_heard = min(len(heard), max(room // 3, room - len(others)))
    lines += [_owed(row, columns, signs, f"{row.need} ") for row in others[: room - n_heard]]
    return lines + [_heard(row, columns, signs) for row in heard[:n_heard]]


def _best(row: OwedRow, columns: int, signs: Signs) -> list[Line]:
    """Draw the best owed step: what it is, its perdes, its written notes, the keys to press."""
    right = f"{row.need} {gain_words(row.gain_nats, signs)}"
    head = f"{signs.next} {'play next' if row.gain_nats > 0 else 'still owed'}: {row.kind}"
    if width(head) + width(right) + 1 > columns:
        head = f"{signs.next} next: {row.kind}"
    lines = [_spread([("class:next", head)], [("class:next", right)], columns, signs)]
    lines += [[("class:next", f"    {text}")] for text in wrap(" ".join(row.perdes), columns - 4)[:2]]
    written, keys = " ".join(row.written), " ".join(row.keys)
    if not keys:
        return [*lines, [("", cut(f"    written {written}", columns, signs.more))]]
    for text in (f"    written {written}   keys {keys}", f"    {written}   keys {keys}"):
        if width(text) <= columns:
            return [*lines, [("", text)]]
    lines.append([("", cut(f"    written {written}", columns, signs.more))])
    lines.append([("", cut(f"    keys {keys}", columns, signs.more))])
    return lines


def _best_in_short(row: OwedRow, columns: int, rows: int, signs: Signs) -> list[Line]:
    """Draw the best owed step in one line or two: its notes come before what it is."""
    perdes, keys = " ".join(row.perdes), " ".join(row.keys or row.written)
    notes = f"{perdes}   {keys}"
    if rows == 2:
        right = f"{row.need} {gain_words(row.gain_nats, signs)}"
        head: Line = [("class:next", f"{signs.next} next: {row.kind}")]
        shown = notes if width(notes) + 4 <= columns else perdes
        return [
            _spread(head, [("class:next", right)], columns, signs),
            [("class:next", cut(f"    {shown}", columns, signs.more))],
        ]
    for text in (f"{row.kind}: {notes}", notes, perdes):
        if width(text) + 2 <= columns:
            break
    return [[("class:next", cut(f"{signs.next} {text}", columns, signs.more))]]


def _grouped(
    owed: Sequence[OwedRow], heard: Sequence[OwedRow], columns: int, signs: Signs, depth: int
) -> list[Line]:
    """Draw steps under a heading for each need, with ``depth`` lines for an owed one."""
    lines: list[Line] = []
    unlisted = sorted({row.need for row in (*owed, *heard)} - set(NEEDS))
    for need in (*NEEDS, *unlisted):
        group = [row for row in owed if row.need == need]
        done = [row for row in heard if row.need == need]
        if not group and not done:
            continue
        lines.append([("class:title", need)])
        for row in group:
            lines.append(_owed(row, columns, signs))
            if depth > 1:
                lines.append(_notes(row, columns, signs))
        lines += [_heard(row, columns, signs) for row in done]
    return lines


_SHORTEST_KIND = 12
"""A kind that would be cut to less than this is left out."""


def _owed(row: OwedRow, columns: int, signs: Signs, need: str = "") -> Line:
    gain = f"{need}{gain_words(row.gain_nats, signs)}"
    sign = signs.welcome if row.is_colour else signs.owed
    return _step(row, f"{sign} ", "class:owed", gain, columns, signs)


def _heard(row: OwedRow, columns: int, signs: Signs) -> Line:
    return _step(row, f"{signs.heard} ", "class:heard", f"note {row.heard_at}", columns, signs)


def _step(row: OwedRow, sign: str, style: str, right: str, columns: int, signs: Signs) -> Line:
    """Draw a step in one line: its notes, then as much of what it is as there is room for."""
    notes = " ".join(row.perdes)
    left: Line = [(style, sign), (style if style == "class:owed" else "", notes)]
    room = columns - width(right) - 1 - width(notes) - 4
    if room >= min(width(row.kind), _SHORTEST_KIND):
        left.append(("class:faint", f"  {row.kind}"))
    return _spread(left, [("class:faint", right)], columns, signs)


def _notes(row: OwedRow, columns: int, signs: Signs) -> Line:
    keys = f"   keys {' '.join(row.keys)}" if row.keys else ""
    return [("class:faint", cut(f"    {' '.join(row.written)}{keys}", columns, signs.more))]


def _spread(left: Line, right: Line, columns: int, signs: Signs) -> Line:
    """Put one part at the left edge and one at the right; the left one is cut."""
    room = columns - line_width(right) - 1
    if room < 12:
        right, room = [], columns
    line: Line = []
    for style, text in left:
        piece = cut(text, room, signs.more)
        line.append((style, piece))
        room -= width(piece)
        if piece != text:
            break
    return [*line, ("", " " * (room + (1 if right else 0))), *right]


def gain_words(nats: float, signs: Signs) -> str:
    """Write what a step or reason adds, in nats, with its sign.

    >>> from melodycoach.screen.signs import UNICODE
    >>> gain_words(1.84, UNICODE), gain_words(-0.3, UNICODE), gain_words(0.01, UNICODE)
    ('+1.8', '−0.3', ' 0.0')
    """
    size = f"{abs(nats):.1f}"
    if size == "0.0":
        return " 0.0"
    return f"+{size}" if nats > 0 else f"{signs.minus}{size}"


def why_title(view: ViewState) -> str:
    """Give the heading of the reasons: which mode, rather than which."""
    if view.in_view and view.rival and view.why:
        return f"why {view.in_view}, not {view.rival}"
    return "why"


def draw_why(view: ViewState, columns: int, rows: int, signs: Signs) -> list[Line]:
    """Draw the reasons, the weightiest first, each with the nats it adds or takes."""
    if not view.why:
        return [[("class:faint", cut("no reasons yet", columns, signs.more))]][:rows]
    lines: list[Line] = []
    for row in view.why:
        style = "class:for" if row.nats >= 0 else "class:against"
        texts = wrap_within(row.text, columns - 6, rows - len(lines), signs.more)
        for place, text in enumerate(texts):
            gain = pad_left(gain_words(row.nats, signs), 5) if place == 0 else "     "
            lines.append([(style, f"{gain} "), ("", text)])
    return lines


def draw_status(view: ViewState, columns: int, rows: int, signs: Signs) -> list[Line]:
    """Write the newest warning, then input and tuning, then where the log goes, then the theory."""
    news = _news(view, columns, rows, signs)
    standing = _standing(view, columns, rows - len(news), signs)
    return [*news, *([("class:status", cut(text, columns, signs.more))] for text in standing)]


def log_left_out(view: ViewState, columns: int, rows: int, signs: Signs) -> str:
    """Say where the log goes, if so many rows of status have no room for it; else nothing."""
    log = view.status.log_line
    standing = _standing(view, columns, rows - len(_news(view, columns, rows, signs)), signs)
    return "" if any(text.endswith(log) for text in standing) else log


def _news(view: ViewState, columns: int, rows: int, signs: Signs) -> list[Line]:
    """Write the warning, or what went well."""
    status = view.status
    if rows <= 0:
        return []
    if status.warning:
        texts = wrap_within(status.warning, columns - 2, rows, signs.more)
        return [
            [("class:warning", f"{signs.warning} " if place == 0 else "  "), ("class:warning", text)]
            for place, text in enumerate(texts)
        ]
    if status.notice:
        return [[("class:heard", cut(f"{signs.heard} {status.notice}", columns, signs.more))]]
    return []


def _standing(view: ViewState, columns: int, rows: int, signs: Signs) -> list[str]:
    """Say what holds all the time, in one text for each row; a single row takes what fits into it."""
    status, gap = view.status, f" {signs.dot} "
    world = gap.join(part for part in (status.input_line, status.tuning_line) if part)
    whole = gap.join(part for part in (world, status.log_line) if part)
    if rows == 1 and width(whole) <= columns:
        world = whole
    return [text for text in (world, status.log_line, theory_words(view)) if text][: max(rows, 0)]


HINTS = (
    ("F1", "help"),
    ("F2", "aim"),
    ("^Z", "undo"),
    ("F5", "fresh"),
    ("^C", "quit"),
    ("F3", "final"),
    ("F4", "modes"),
    ("F8", "save"),
    ("F7", "open"),
    ("F6", "port"),
    ("^Y", "redo"),
)
"""Keys and what they do, the most needed first."""

_HINT_ORDER = ("F1", "F2", "F3", "F4", "F5", "F6", "F7", "F8", "^Z", "^Y", "^C")


def draw_hints(view: ViewState, columns: int) -> Line:
    """Write the keys that fit into one line; undo and redo are there when there is what to undo."""
    shown: list[tuple[str, str]] = []
    room = columns
    for key, what in HINTS:
        if (key == "^Z" and not view.can_undo) or (key == "^Y" and not view.can_redo):
            continue
        need = len(key) + 1 + len(what) + (2 if shown else 0)
        if need <= room:
            shown.append((key, what))
            room -= need
    line: Line = []
    for key, what in sorted(shown, key=lambda hint: _HINT_ORDER.index(hint[0])):
        line += [("", "  " if line else ""), ("class:key", key), ("class:hint", f" {what}")]
    return line
