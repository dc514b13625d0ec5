"""The screen as a pure function: a view, a size, and out come lines of styled text.

Conventions
-----------
Exactly ``rows`` lines come back, each exactly ``columns`` cells wide, at any size from 1 by 1 up.
Styles are class names; every meaning has a sign or a word of its own besides.
"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from melodycoach.screen.contour import draw_contour, mending, off_words
from melodycoach.screen.entry import Entry, complaint, entry_of, item_at
from melodycoach.screen.entry_lines import (
    Drawn,
    draw_entry,
    draw_question,
    question_rows,
)
from melodycoach.screen.layout import Form, Layout, lay_out
from melodycoach.screen.panels import (
    draw_hints,
    draw_leanings,
    draw_now,
    draw_owed,
    draw_status,
    draw_verdict,
    draw_why,
    log_left_out,
    owed_title,
    theory_words,
    title_line,
    why_title,
)
from melodycoach.screen.plain import plain_line
from melodycoach.screen.signs import ASCII, UNICODE
from melodycoach.screen.text import Line, cut, fit, tidy_lines, wrap, wrap_within

if TYPE_CHECKING:
    from collections.abc import Sequence

    from melodycoach.screen.question import Question
    from melodycoach.screen.signs import Signs
    from melodycoach.screen.view import LineNote, ViewState

_GAP = 2
_FRESH_NOTES = 6
"""For so many notes a note off the mode is spoken of at the top of the screen."""


def draw(
    view: ViewState,
    columns: int,
    rows: int,
    entry: Entry | None = None,
    question: Question | None = None,
    ascii_only: bool = False,
) -> list[Line]:
    """Draw the whole screen.

    Parameters
    ----------
    view
        What is known of the line.
    columns, rows
        Size of the terminal; both at least 1.
    entry
        The text being edited; None: the tokens of the view.
    question
        The question being asked, if any.
    ascii_only
        Draw with plain letters and signs, for terminals that know no others.

    Returns
    -------
    list of lines
        ``rows`` lines of fragments, each line ``columns`` cells wide.
    """
    return picture(view, columns, rows, entry, question, ascii_only).lines


def picture(
    view: ViewState,
    columns: int,
    rows: int,
    entry: Entry | None = None,
    question: Question | None = None,
    ascii_only: bool = False,
) -> Drawn:
    """Draw the whole screen, as `draw` does, and say where the cursor stands on it."""
    columns, rows = max(columns, 1), max(rows, 1)
    signs = ASCII if ascii_only else UNICODE
    shown = entry_of(view.tokens) if entry is None else entry
    wrong = complaint(shown)
    layout = lay_out(columns, rows, question_rows(question), bool(wrong))
    if view.status.warning and view.status.warning in {wrong, question.complaint if question else ""}:
        view = replace(view, status=replace(view.status, warning=""))  # it is said beside its cause
    match layout.form:
        case Form.SENTENCE:
            above = _sentence(view, columns, rows - layout.question - layout.entry)
            below: list[Line] = []
        case Form.STACK:
            above = _stack(view, columns, layout, signs, item_at(shown))
            below = _foot(view, columns, layout, signs)
        case Form.PAIR:
            above = _pair(view, columns, layout, signs, item_at(shown))
            below = _foot(view, columns, layout, signs)
    typed = draw_entry(shown, columns, layout.entry, signs)
    asked = Drawn([], 0, 0) if question is None else draw_question(question, columns, layout.question, signs)
    if asked.lines:
        row, column = len(above) + asked.row, asked.column
    elif typed.lines:
        row, column = len(above) + typed.row, typed.column
    else:
        row, column = len(above) - 1, columns - 1
    entry_lines = _filled(typed.lines, layout.entry)
    if len(typed.lines) < layout.entry and layout.status:  # the entry does not need its last row
        log = log_left_out(view, columns, layout.status, signs)
        entry_lines[-1] = [("class:status", cut(log, columns, signs.more))]
    lines = [*above, *asked.lines, *entry_lines, *below]
    lines = tidy_lines(_filled(lines, rows), ascii_only)
    fitted = [fit(line, columns, signs.more) for line in lines]
    return Drawn(fitted, min(max(row, 0), rows - 1), min(column, columns - 1))


def _filled(lines: Sequence[Line], rows: int) -> list[Line]:
    """Cut or extend to so many lines."""
    return [*lines[:rows], *([] for _ in range(rows - len(lines)))]


def _sentence(view: ViewState, columns: int, rows: int) -> list[Line]:
    """Say it all in one sentence, as far as there is room."""
    if rows <= 0:
        return []
    texts = wrap_within(plain_line(view, None) or view.verdict, columns, rows)
    return _filled([[("class:verdict" if row == 0 else "", text)] for row, text in enumerate(texts)], rows)


def _attention(view: ViewState, columns: int, layout: Layout, signs: Signs) -> Line:
    """Say what wants to be noticed now: a change of mode, a note off the mode, else the standing words."""
    off = _fresh_off(view)
    if view.now or off is None:
        has_its_row = layout.status >= 3 and not (view.status.warning or view.status.notice)
        return draw_now(view, columns, signs, theory=bool(view.line) and not has_its_row)
    return [("class:off", cut(f"{signs.off} {off_words(off)}", columns, signs.more))]


def _fresh_off(view: ViewState) -> LineNote | None:
    """Find the newest note off the mode, if it was played a moment ago."""
    recent = view.line[-_FRESH_NOTES:]
    return next((note for note in reversed(recent) if note.off_mode), None)


def _pair(view: ViewState, columns: int, layout: Layout, signs: Signs, focus: int | None) -> list[Line]:
    """Draw leanings and reasons on the left, owed steps on the right, the line below them."""
    right = columns - layout.left - _GAP
    left_lines = [
        title_line("leanings", layout.left, signs),
        *_filled(draw_leanings(view, layout.left, layout.leanings, signs), layout.leanings),
        title_line(why_title(view), layout.left, signs, "nats"),
        *_filled(draw_why(view, layout.left, layout.why, signs), layout.why),
    ]
    title, count = owed_title(view, signs)
    right_lines = [
        title_line(title, right, signs, count),
        *_filled(draw_owed(view, right, layout.owed, signs), layout.owed),
    ]
    both = [
        [*fit(one, layout.left, signs.more), ("", " " * _GAP), *other]
        for one, other in zip(left_lines, right_lines, strict=True)
    ]
    contour = layout.line - 1 - layout.mending
    return [
        draw_verdict(view, columns, signs),
        _attention(view, columns, layout, signs),
        *both,
        _line_title(view, columns, signs),
        *_filled(_contour(view, columns, contour, signs, focus), contour),
        *_filled(mending(view, columns, layout.mending, signs), layout.mending),
    ]


def _line_title(view: ViewState, columns: int, signs: Signs) -> Line:
    if not view.line:
        return title_line("line", columns, signs)
    last = view.line[-1]
    n_off = sum(1 for note in view.line if note.off_mode)
    off = f"{signs.off} {n_off} off the mode" if n_off else ""
    return title_line(f"line {signs.dot} last: {last.name} {last.written}", columns, signs, off)


def _contour(view: ViewState, columns: int, rows: int, signs: Signs, focus: int | None) -> list[Line]:
    """Draw the contour; before the first note, say how to begin and whose theory it is."""
    if view.line:
        return draw_contour(view, columns, rows, signs, focus)
    names = [rung.name for rung in view.ladder if "final" in {rung.role, rung.function}]
    example = f" or {names[0]}" if names else ""
    texts = [
        f"play, or type below: A4{example}, then a space",
        *([""] if rows >= 6 else []),
        theory_words(view),
    ]
    lines: list[Line] = [
        [("class:faint", f"  {row}")] for text in texts for row in (wrap(text, columns - 2) or [""])
    ]
    return lines[:rows]


def _stack(view: ViewState, columns: int, layout: Layout, signs: Signs, focus: int | None) -> list[Line]:
    """Draw everything in one column, with the names of the areas in the margin if it is wide enough."""
    inner = columns - layout.gutter
    lines = [draw_verdict(view, columns, signs)]
    if layout.attention:
        lines.append(_attention(view, columns, layout, signs))
    why, owed = layout.why, layout.owed
    if not layout.attention and why and (view.now or _fresh_off(view) is not None):
        lines.append(_attention(view, columns, layout, signs))
        why -= 1
    areas = (
        ("", draw_leanings(view, inner, layout.leanings, signs), layout.leanings),
        ("owed", draw_owed(view, inner, owed, signs), owed),
        ("why", draw_why(view, inner, why, signs), why),
    )
    for name, drawn, rows in areas:
        for place, line in enumerate(_filled(drawn, rows)):
            margin = name if place == 0 else ""
            label: Line = [("class:title", margin.ljust(layout.gutter))] if layout.gutter else []
            lines.append([*label, *line])
    contour = _contour(view, columns, layout.line, signs, focus)
    return [*lines, *_filled(contour, layout.line)]


def _foot(view: ViewState, columns: int, layout: Layout, signs: Signs) -> list[Line]:
    """Draw status and keys; where there is one row for both, a warning takes it."""
    lines = _filled(draw_status(view, columns, layout.status, signs), layout.status)
    if layout.hints:
        warned = (view.status.warning or view.status.notice) and not layout.status
        lines.append(draw_status(view, columns, 1, signs)[0] if warned else draw_hints(view, columns))
    return lines


_HELP: tuple[tuple[str, str], ...] = (
    ("Keys", ""),
    ("F1  ?", "this help; Esc or F1 closes it, arrows move it"),
    ("F2  Ctrl-T", "aim at a mode: owed steps are then those of your aim"),
    ("F3  Ctrl-F", "say where the final is: a pitch, written, or any"),
    ("F4  Ctrl-L", "limit the modes that compete"),
    ("F5  Ctrl-N", "fresh start: lay the line aside, begin a new one"),
    ("F6  Ctrl-P", "listen to another MIDI input"),
    ("F7  Ctrl-O", "open a line from a file"),
    ("F8  Ctrl-K", "save the line to a file"),
    ("Ctrl-Z  Esc u", "undo the last change of the line"),
    ("Ctrl-Y  Esc r", "redo it"),
    ("Ctrl-C  Esc q", "quit"),
    ("", ""),
    ("The entry", ""),
    ("A4 B4-1 F#5", "a note: letter, # or b, octave, commas up or down"),
    ("A4:2 A4:1/2", "its length in beats"),
    (", . - |", "a breath, the end of a phrase, a rest, a bar line"),
    ("Space, Enter", "hand over what is typed; underlined words are not yet handed over"),
    ("", "played notes appear where you type; move back and retype to mend one"),
    ("", ""),
    ("The areas", ""),
    ("leanings", "modes, probability, {rising}{falling} since the last note, final; {target} your aim"),
    ("owed", "{next} best step to play next, {owed} owed, {welcome} welcome, {heard} heard, at which note"),
    ("why", "what speaks for the leading mode (+) and against it ({minus}), in nats"),
    ("line", "{note} note, {note}{held} the line rests on it, {above}{below} between rungs"),
    ("", "{off} off the mode, {mend} the pitch that mends it, {breath} breath, {phrase_end} phrase end"),
)


def draw_help(
    columns: int,
    rows: int,
    first: int = 0,
    ascii_only: bool = False,
    standing: Sequence[str] = (),
) -> list[Line]:
    """Draw the help, from its line number ``first`` on; the last row says how to leave it.

    ``standing`` is said at the end: `standing_words`.
    """
    columns, rows = max(columns, 1), max(rows, 1)
    signs = ASCII if ascii_only else UNICODE
    lines = help_lines(columns, signs, standing)
    room = max(rows - 1, 0)
    first = max(0, min(first, len(lines) - room))
    more = signs.more if first + room < len(lines) else ""
    foot: Line = [("class:key", "Esc"), ("class:hint", f" back to the line   arrows move the help {more}")]
    shown = [*_filled(lines[first : first + room], room), foot]
    return [fit(line, columns, signs.more) for line in tidy_lines(shown, ascii_only)]


def standing_words(view: ViewState) -> tuple[str, ...]:
    """Say whose theory the pack shows and to whom it defers, and where the log goes."""
    return tuple(text for text in (theory_words(view), view.status.log_line) if text)


def help_lines(columns: int, signs: Signs, standing: Sequence[str] = ()) -> list[Line]:
    """Lay out the whole help for a width."""
    values = {name: getattr(signs, name) for name in signs.__slots__}
    label = 15 if columns >= 56 else 2
    lines: list[Line] = []
    for key, words in _HELP:
        text = words.format_map(values)
        if not words:
            lines.append([("class:title", key)])
            continue
        rows = wrap(text, columns - label)
        if label == 2 and key:
            lines.append([("class:key", key)])
        for place, row in enumerate(rows):
            head = key if place == 0 and label > 2 else ""
            lines.append([("class:key", head.ljust(label)), ("", row)])
    for text in standing:
        lines += [[], *([("class:faint", row)] for row in wrap(text, columns))]
    return lines
