"""A terminal that is not there: runs the program on a pseudo-terminal and reads its screen with pyte."""

from __future__ import annotations

import fcntl
import os
import pty
import select
import signal
import struct
import subprocess
import sys
import termios
import time
from typing import TYPE_CHECKING

import pyte

if TYPE_CHECKING:
    from collections.abc import Mapping
    from pathlib import Path

DEADLINE_S = 20.0
LEAVES_FULL_SCREEN = b"\x1b[?1049l"


class PseudoTerminal:
    """Runs ``melodycoach ARGUMENTS`` on a screen of so many columns and rows."""

    def __init__(
        self, *arguments: str, columns: int = 120, rows: int = 40, home: Path, env: Mapping[str, str] = {}
    ) -> None:
        self.screen = pyte.Screen(columns, rows)
        self._stream = pyte.ByteStream(self.screen)
        self.written = bytearray()
        self._end, inner = pty.openpty()
        self.resize(columns, rows)
        self.process = subprocess.Popen(
            [sys.executable, "-m", "melodycoach", *arguments],
            stdin=inner,
            stdout=inner,
            stderr=inner,
            start_new_session=True,
            env={
                **os.environ,
                "TERM": "xterm-256color",
                "LANG": "C.UTF-8",
                "HOME": str(home),
                "XDG_DATA_HOME": str(home / "data"),
                "XDG_CONFIG_HOME": str(home / "config"),
                **env,
            },
        )
        os.close(inner)

    def resize(self, columns: int, rows: int) -> None:
        """Change the size, as a window manager does."""
        fcntl.ioctl(self._end, termios.TIOCSWINSZ, struct.pack("HHHH", rows, columns, 0, 0))
        self.screen.resize(rows, columns)

    def type(self, text: str) -> None:
        """Type keys."""
        os.write(self._end, text.encode())

    def send_signal(self, number: signal.Signals) -> None:
        """Send the program a signal."""
        self.process.send_signal(number)

    def text(self) -> str:
        """Give what the screen shows now."""
        return "\n".join(line.rstrip() for line in self.screen.display)

    def read(self, for_s: float = 0.05) -> None:
        """Take in what the program writes."""
        until_s = time.monotonic() + for_s
        while (left_s := until_s - time.monotonic()) > 0:
            if not select.select([self._end], [], [], left_s)[0]:
                return
            try:
                written = os.read(self._end, 65536)
            except OSError:  # the program has closed its side
                return
            if not written:
                return
            self.written += written
            self._stream.feed(written)

    def wait_for(self, *texts: str, gone: str = "", deadline_s: float = DEADLINE_S) -> str:
        """Read until the screen shows every text (and no more what has to go); give the screen."""
        until_s = time.monotonic() + deadline_s
        while True:
            self.read()
            shown = self.text()
            if all(text in shown for text in texts) and not (gone and gone in shown):
                return shown
            assert time.monotonic() < until_s, f"no {texts!r} (or still {gone!r}) on this screen:\n{shown}"

    def ends(self, deadline_s: float = DEADLINE_S) -> int:
        """Wait for the program to end; give its exit code."""
        until_s = time.monotonic() + deadline_s
        while self.process.poll() is None:
            self.read()
            assert time.monotonic() < until_s, f"it did not end; the screen:\n{self.text()}"
        self.read()
        return self.process.returncode

    def close(self) -> None:
        """End the program, whatever it does."""
        if self.process.poll() is None:
            self.process.kill()
            self.process.wait()
        os.close(self._end)
