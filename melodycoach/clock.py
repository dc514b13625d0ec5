"""The clock of a session: seconds from its start."""

from __future__ import annotations

import time


class Clock:
    """Seconds from the start of the session, real or hurried."""

    def __init__(self, speed: float = 1.0) -> None:
        self._began_s = time.monotonic()
        self._speed = speed
        self._offset_s = 0.0

    def __call__(self) -> float:
        """Read the clock."""
        return self._offset_s + (time.monotonic() - self._began_s) * self._speed

    def go_on_from(self, at_s: float) -> None:
        """Show this time now: a session goes on that was there before."""
        self._began_s, self._offset_s = time.monotonic(), at_s

    def slow_down(self) -> None:
        """Go on in real time from now; in real time already, do nothing."""
        if self._speed == 1.0:
            return
        self._offset_s = self()
        self._began_s, self._speed = time.monotonic(), 1.0
