"""`melodycoach check --watch`: the answer again at every save, and what changed."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from melodycoach.commands.check_answers import text_of, write_page
from melodycoach.commands.exit_codes import DONE
from melodycoach.commands.printing import columns, say

if TYPE_CHECKING:
    import argparse
    from collections.abc import Sequence

    from melodycoach.checking import Question


def watch(options: argparse.Namespace, question: Question, files: tuple[str, ...]) -> int:
    """Answer, and answer again at every save, until interrupted."""
    import time

    from melodycoach.checking import answer
    from melodycoach.reading import read_bytes
    from melodycoach.watching import POLL_S, Watch

    for name in files:
        read_bytes(name)  # what is not there at all is not waited for
    files_seen = Watch(files, lambda: time.sleep(POLL_S))
    last = {name: answer(question, name) for name in files}
    read = {name: one for name, one in last.items() if "error" not in one}  # the last that could be read
    for one in last.values():
        _show_whole(options, one)
    say(f"watching {', '.join(files)}; Ctrl-C ends")
    for name, is_there in files_seen.sights():
        if not is_there:
            say(f"{time.strftime('%H:%M:%S')} {name} is gone; waiting for it to come back")
            continue
        now = answer(question, name)
        say(f"{time.strftime('%H:%M:%S')} {name} saved")
        if "error" in now or name not in read:
            _show_whole(options, now)
        else:
            _show_change(options, [last[name], read[name]], now)
        last[name] = now
        if "error" not in now:
            read[name] = now
    return DONE


def _show_change(options: argparse.Namespace, before: Sequence[dict[str, Any]], now: dict[str, Any]) -> None:
    """Say what changed since the last answer; where that was none, since the last that was one, too."""
    from melodycoach.report.check_change import what_changed

    for one in before if "error" in before[0] else before[:1]:
        for sentence in what_changed(one, now):
            say(sentence, indent="  ")
    if options.html is not None:
        write_page(options.html, now)


def _show_whole(options: argparse.Namespace, answer: dict[str, Any]) -> None:
    from melodycoach.report.check_text import failed_text

    if "error" in answer:
        print(failed_text(answer, columns()), flush=True)
        return
    print(text_of(options, answer))
    print(flush=True)
    if options.html is not None:
        write_page(options.html, answer)
