"""In a real terminal.

Whatever goes wrong, the terminal is left as it was, in plain words and without a traceback.
"""

from __future__ import annotations

import fcntl
import os
import pty
import select
import signal
import struct
import sys
import termios
import time
from collections.abc import Callable

import pytest

pytestmark = pytest.mark.skipif(sys.platform == "win32", reason="needs a pseudo-terminal")

HEAD = """
import sys
from tests.tui.fake_book import FakeBook, FakeOpener, MESYLATE
from tui.application import SidepathApp
from tui.screens.planning import PlanningScreen
book = FakeBook()
app = SidepathApp(FakeOpener(book), who="JM")
"""
WORKER = HEAD + "book.broken['check'] = SystemExit(3)\napp.run()\nsys.exit(app.return_code)\n"
SCREEN = (
    HEAD
    + "def bad(self): raise RuntimeError('planted')\n"
    + "PlanningScreen.action_numbers = bad\napp.run()\nsys.exit(app.return_code)\n"
)
LEAVES_ALTERNATE_SCREEN = b"\x1b[?1049l"
SHOWS_CURSOR = b"\x1b[?25h"


class Terminal:
    """A program in a pseudo-terminal."""

    def __init__(self, script: str) -> None:
        self.seen = b""
        self.status: int | None = None
        self.pid, self.fd = pty.fork()
        if self.pid == 0:
            os.environ.update(TERM="xterm-256color", COLORTERM="truecolor")
            os.execv(sys.executable, [sys.executable, "-c", script])
        fcntl.ioctl(self.fd, termios.TIOCSWINSZ, struct.pack("HHHH", 30, 100, 0, 0))

    def read_until(self, found: Callable[[bytes], bool], limit_s: float = 30.0) -> bool:
        """Read until `found` holds of everything seen, the program ends, or the limit is over."""
        deadline = time.monotonic() + limit_s
        while time.monotonic() < deadline:
            if found(self.seen):
                return True
            if select.select([self.fd], [], [], 0.05)[0]:
                try:
                    self.seen += os.read(self.fd, 65536)
                except OSError:
                    return found(self.seen)
        return False

    def ended(self) -> int:
        """Wait for the end and return the exit status."""
        self.read_until(lambda _: False, limit_s=0.5)
        deadline = time.monotonic() + 30
        while time.monotonic() < deadline:
            pid, status = os.waitpid(self.pid, os.WNOHANG)
            if pid:
                return os.waitstatus_to_exitcode(status)
            self.read_until(lambda _: False, limit_s=0.1)
        os.kill(self.pid, signal.SIGKILL)
        raise AssertionError("the program did not end")


def test_a_worker_that_dies_leaves_the_interface_running() -> None:
    terminal = Terminal(WORKER)
    assert terminal.read_until(lambda seen: b"12 runs" in seen)
    os.write(terminal.fd, b"CCBr")
    assert terminal.read_until(lambda seen: b"Something went wrong" in seen)
    os.write(terminal.fd, b"\x11")  # Ctrl+Q
    assert terminal.ended() == 0
    assert LEAVES_ALTERNATE_SCREEN in terminal.seen
    assert b"Traceback" not in terminal.seen


def test_a_screen_that_raises_ends_in_words_with_the_terminal_restored() -> None:
    terminal = Terminal(SCREEN)
    assert terminal.read_until(lambda seen: b"12 runs" in seen)
    os.write(terminal.fd, b"\x0c")  # Ctrl+L
    assert terminal.ended() == 1
    assert LEAVES_ALTERNATE_SCREEN in terminal.seen
    assert SHOWS_CURSOR in terminal.seen.split(LEAVES_ALTERNATE_SCREEN)[-1] + terminal.seen
    assert b"Traceback" not in terminal.seen
    assert b"stopped on a fault" in terminal.seen


def test_being_told_to_end_restores_the_terminal() -> None:
    terminal = Terminal(HEAD + "app.run()\nsys.exit(app.return_code)\n")
    assert terminal.read_until(lambda seen: b"12 runs" in seen)
    os.kill(terminal.pid, signal.SIGTERM)
    assert terminal.ended() == 0
    assert LEAVES_ALTERNATE_SCREEN in terminal.seen
