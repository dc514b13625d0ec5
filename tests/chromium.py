"""A browser without a window: opens pages in Chromium, asks them, presses keys, photographs them.

It speaks the DevTools protocol through a pair of pipes (file descriptors 3 and 4 of the browser, one
JSON message up to each NUL), so that no port is opened and nothing but the standard library is needed.
"""

from __future__ import annotations

import base64
import json
import os
import select
import shutil
import subprocess
import sys
import time
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from pathlib import Path
    from types import TracebackType

DEADLINE_S = 60.0
CHROMIUM = shutil.which("chromium") or shutil.which("chromium-browser")

_QUIET = (
    "--headless",
    "--no-sandbox",
    "--disable-gpu",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
    "--disable-dev-shm-usage",
    "--hide-scrollbars",
    "--remote-debugging-pipe",
)

_AS_3_AND_4 = """
import fcntl, os, sys
pipes = [fcntl.fcntl(int(one), fcntl.F_DUPFD, 10) for one in sys.argv[1:3]]
for pipe, wanted in zip(pipes, (3, 4)):
    os.dup2(pipe, wanted)
os.execv(sys.argv[3], sys.argv[3:])
"""
"""Puts two pipes where the browser looks for them, and becomes the browser."""


class Browser:
    """One page in one browser; ``complaints`` and ``asked_for`` hold what the page should not do."""

    def __init__(self, profile: Path) -> None:
        self.complaints: list[str] = []
        self._requests: dict[str, str] = {}
        self._loaded = False
        self._calls = 0
        self._rest = b""
        from_browser, to_us = os.pipe()
        to_browser, from_us = os.pipe()
        self._inbox, self._outbox = from_browser, from_us
        pipes = (str(to_browser), str(to_us))
        self._process = subprocess.Popen(
            [
                sys.executable,
                "-c",
                _AS_3_AND_4,
                *pipes,
                str(CHROMIUM),
                *_QUIET,
                f"--user-data-dir={profile}",
                "about:blank",
            ],
            pass_fds=(to_browser, to_us),
            stdin=subprocess.DEVNULL,
            stdout=subprocess.DEVNULL,
            stderr=subprocess.DEVNULL,
        )
        os.close(to_browser)
        os.close(to_us)
        self._session: str | None = None
        try:
            self._attach()
        except BaseException:
            self.end()
            raise

    def _attach(self) -> None:
        targets = self.call("Target.getTargets")["targetInfos"]
        page = next(one["targetId"] for one in targets if one["type"] == "page")
        self._session = self.call("Target.attachToTarget", targetId=page, flatten=True)["sessionId"]
        self.call("Emulation.setFocusEmulationEnabled", enabled=True)
        for part in ("Page", "Runtime", "Log", "Network"):
            self.call(f"{part}.enable")

    def __enter__(self) -> Browser:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.end()

    def end(self) -> None:
        """End the browser that was started here."""
        os.close(self._outbox)  # it ends when nobody holds the other end
        try:
            self._process.wait(10)
        except subprocess.TimeoutExpired:
            self._process.kill()
            self._process.wait()
        os.close(self._inbox)

    def call(self, method: str, **parameters: Any) -> dict[str, Any]:
        """Call a method of the protocol and give its result; what the page tells meanwhile is kept."""
        self._calls += 1
        wanted = self._calls
        message = {"id": wanted, "method": method, "params": parameters}
        if self._session:
            message["sessionId"] = self._session
        os.write(self._outbox, json.dumps(message).encode() + b"\0")
        while True:
            answer = self._next()
            if answer.get("id") == wanted:
                assert "error" not in answer, answer
                result: dict[str, Any] = answer["result"]
                return result

    @property
    def asked_for(self) -> list[str]:
        """What the page asked for, but for what its own policy stopped."""
        return list(self._requests.values())

    def open(self, path: Path) -> None:
        """Open a file and wait until it has loaded."""
        self.complaints.clear()
        self._requests.clear()
        self._loaded = False
        self.call("Page.navigate", url=path.as_uri())
        while not self._loaded:
            self._next()

    def ask(self, script: str) -> Any:
        """Give the value of an expression in the page."""
        result = self.call("Runtime.evaluate", expression=script, returnByValue=True, awaitPromise=True)
        assert "exceptionDetails" not in result, result
        return result["result"].get("value")

    def press(self, key: str) -> None:
        """Press a key and let it go."""
        codes = {"Tab": 9, "End": 35, "Home": 36, "ArrowLeft": 37, "ArrowUp": 38}
        codes |= {"ArrowRight": 39, "ArrowDown": 40}
        for kind in ("rawKeyDown", "keyUp"):
            self.call(
                "Input.dispatchKeyEvent",
                type=kind,
                key=key,
                code=key,
                windowsVirtualKeyCode=codes[key],
            )

    def look(self, columns: int, rows: int = 1000, dark: bool = False) -> None:
        """Make the window so many pixels wide, and light or dark."""
        self.call(
            "Emulation.setDeviceMetricsOverride",
            width=columns,
            height=rows,
            deviceScaleFactor=1,
            mobile=False,
        )
        scheme = {"name": "prefers-color-scheme", "value": "dark" if dark else "light"}
        self.call("Emulation.setEmulatedMedia", features=[scheme])

    def photograph(self, whole: bool = True) -> bytes:
        """Give the page as PNG."""
        shot = self.call("Page.captureScreenshot", captureBeyondViewport=whole)
        return base64.b64decode(shot["data"])

    def print_pages(self) -> bytes:
        """Give the page as PDF, on the paper that its style asks for."""
        return base64.b64decode(self.call("Page.printToPDF", preferCSSPageSize=True)["data"])

    def _next(self) -> dict[str, Any]:
        end = time.monotonic() + DEADLINE_S
        while b"\0" not in self._rest:
            ready, _, _ = select.select([self._inbox], [], [], max(end - time.monotonic(), 0))
            assert ready, "the browser says nothing"
            piece = os.read(self._inbox, 1 << 16)
            assert piece, "the browser has ended"
            self._rest += piece
        text, _, self._rest = self._rest.partition(b"\0")
        message: dict[str, Any] = json.loads(text)
        self._note(message.get("method"), message.get("params", {}))
        return message

    def _note(self, method: str | None, parameters: dict[str, Any]) -> None:
        if method == "Page.loadEventFired":
            self._loaded = True
        elif method == "Runtime.exceptionThrown":
            self.complaints.append(parameters["exceptionDetails"]["text"])
        elif method == "Log.entryAdded":
            self.complaints.append(parameters["entry"]["text"])
        elif method == "Runtime.consoleAPICalled":
            self.complaints.append(str(parameters["args"]))
        elif method == "Network.requestWillBeSent":
            self._requests[parameters["requestId"]] = parameters["request"]["url"]
        elif method == "Network.loadingFailed" and parameters.get("blockedReason"):
            del self._requests[parameters["requestId"]]
