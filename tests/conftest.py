"""What tests share: a private JACK server, and keyboards that play on it."""

from __future__ import annotations

import os
import shutil
import signal
import subprocess
import sys
import time
from pathlib import Path
from typing import TYPE_CHECKING

import pytest
from hypothesis import settings

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator

    from pseudo_terminal import PseudoTerminal

# A shell that runs the tests in the background has them ignore Ctrl-C, and what they start inherits that.
if signal.getsignal(signal.SIGINT) is signal.SIG_IGN:
    signal.signal(signal.SIGINT, signal.default_int_handler)

KEYBOARD = Path(__file__).with_name("keyboard.py")
DEADLINE_S = 10.0

# A slow machine is no fault; in CI the same examples every time, so that a failure is about the change.
settings.register_profile("melodycoach", deadline=None, derandomize=bool(os.environ.get("CI")))
settings.load_profile("melodycoach")


class JackServer:
    """A JACK server of our own, on no sound card, under a name that no other has."""

    _count = 0

    def __init__(self) -> None:
        JackServer._count += 1
        self.name = f"melodycoach-test-{os.getpid()}-{JackServer._count}"
        self._process: subprocess.Popen[bytes] | None = None

    @property
    def environment(self) -> dict[str, str]:
        """What a process needs in its environment to meet this server."""
        return {**os.environ, "JACK_DEFAULT_SERVER": self.name, "JACK_NO_START_SERVER": "1"}

    def start(self) -> None:
        """Start it and wait until a client can be made."""
        command = ["jackd", "-n", self.name, "-r", "-d", "dummy", "-r", "48000", "-p", "256"]
        self._process = subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
        deadline_s = time.monotonic() + DEADLINE_S
        client = "import rtmidi; rtmidi.MidiIn(rtmidi.API_UNIX_JACK).delete()"
        while subprocess.run(
            [sys.executable, "-c", client], env=self.environment, capture_output=True, check=False
        ).returncode:
            assert self._process.poll() is None, "jackd ended as soon as it was started"
            assert time.monotonic() < deadline_s, "jackd did not get ready in time"

    def stop(self, *, kill: bool = False) -> None:
        """End it, by its id; a second call does nothing."""
        process, self._process = self._process, None
        if process is None:
            return
        if kill:
            process.kill()
        else:
            process.terminate()
        try:
            process.wait(DEADLINE_S)
        except subprocess.TimeoutExpired:
            process.kill()
            process.wait()


class Keyboard:
    """A keyboard in a process of its own; see keyboard.py."""

    def __init__(self, server: JackServer, name: str) -> None:
        self._process = subprocess.Popen(
            [sys.executable, str(KEYBOARD), name],
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            stderr=subprocess.DEVNULL,
            env=server.environment,
            text=True,
            bufsize=1,
        )
        self._expect("ready")

    def send(self, *lines: str) -> None:
        """Send messages in hex, with ``wait SECONDS`` between them; return before they are sent."""
        assert self._process.stdin is not None
        self._process.stdin.write("".join(f"{line}\n" for line in lines))
        self._process.stdin.flush()

    def play(self, *lines: str) -> None:
        """Send messages and return when they have been sent."""
        self.send(*lines, "sync")
        self._expect("done")

    def unplug(self) -> None:
        """Take the port away; a second call does nothing."""
        assert self._process.stdin is not None
        assert self._process.stdout is not None
        self._process.stdin.close()
        try:
            self._process.wait(DEADLINE_S)
        except subprocess.TimeoutExpired:
            self._process.kill()
            self._process.wait()
        self._process.stdout.close()

    def _expect(self, word: str) -> None:
        assert self._process.stdout is not None
        line = self._process.stdout.readline().strip()
        assert line == word, f"the keyboard said {line!r}, expected {word!r}"


def _need_jack() -> None:
    missing = "" if shutil.which("jackd") else "jackd is not installed"
    if not missing:
        try:
            import rtmidi  # noqa: F401
        except ImportError as error:
            missing = f"python-rtmidi does not load: {error}"
    if missing and os.environ.get("MELODYCOACH_REQUIRE_JACK") == "1":
        pytest.fail(missing)
    if missing:
        pytest.skip(missing)


@pytest.fixture
def jack_server(monkeypatch: pytest.MonkeyPatch) -> Iterator[JackServer]:
    """Give a running server; this process and those it starts meet it by the environment."""
    _need_jack()
    server = JackServer()
    server.start()
    monkeypatch.setenv("JACK_DEFAULT_SERVER", server.name)
    monkeypatch.setenv("JACK_NO_START_SERVER", "1")
    yield server
    server.stop()
    for left in Path("/dev/shm").glob(f"jack*_{server.name}_*"):  # what a killed server leaves
        left.unlink(missing_ok=True)


@pytest.fixture
def plug_in(jack_server: JackServer) -> Iterator[Callable[[str], Keyboard]]:
    """Give a function that plugs a keyboard in, by its name."""
    plugged: list[Keyboard] = []

    def plug(name: str) -> Keyboard:
        plugged.append(Keyboard(jack_server, name))
        return plugged[-1]

    yield plug
    for keyboard in plugged:
        keyboard.unplug()


@pytest.fixture
def open_terminal(tmp_path: Path) -> Iterator[Callable[..., PseudoTerminal]]:
    """Give a function that runs the program on a pseudo-terminal, at home in a folder of its own."""
    pytest.importorskip("pty", reason="pseudo-terminals need a Unix system")
    from pseudo_terminal import PseudoTerminal

    opened: list[PseudoTerminal] = []

    def open_one(*arguments: str, **options: object) -> PseudoTerminal:
        opened.append(PseudoTerminal(*arguments, home=tmp_path, **options))  # type: ignore[arg-type]
        return opened[-1]

    yield open_one
    for terminal in opened:
        terminal.close()


def pytest_addoption(parser: pytest.Parser) -> None:
    """Add the option that rewrites golden files instead of comparing with them."""
    parser.addoption("--update-golden", action="store_true", help="rewrite the golden files; read the diff")


@pytest.fixture
def check_golden(request: pytest.FixtureRequest) -> Callable[[Path, str], None]:
    """Give a function that compares a text with a golden file, or rewrites the file when asked to."""

    def check(path: Path, text: str) -> None:
        if request.config.getoption("--update-golden"):
            path.parent.mkdir(exist_ok=True)
            path.write_text(text, encoding="utf-8")
        assert path.exists(), f"no golden file {path.name}; pytest --update-golden writes it"
        assert text == path.read_text(encoding="utf-8")

    return check
