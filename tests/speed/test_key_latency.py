"""How long a key takes to show while a check runs on a book of 100,000 runs, beside a bare input line.

Both run in a terminal of their own (a pseudo-terminal), as a person would have them: a key is written to it and
the clock stops when what was typed comes back on the screen, so that reading the key, handling and painting are all
in the figure. Keys come one at a time at a person's pace, slow enough that every pause starts a check; the figure is
given for all keys and for those that fell while a check was running. Run by name (`pytest -m speed -n0 -s`);
SIDEPATH_BENCH_RUNS and SIDEPATH_BENCH_KEYS set the sizes, SIDEPATH_BENCH_BOOK names a book. It reports and asserts no
time, since machines differ.
"""

from __future__ import annotations

import fcntl
import os
import pty
import random
import select
import statistics
import struct
import subprocess
import sys
import termios
import time
from collections.abc import Sequence
from pathlib import Path

import pytest

from tests.speed.demo_set import demo_book_of
from tests.speed.structure_set import wanted

pytestmark = pytest.mark.speed

ROOT = Path(__file__).resolve().parents[2]
COLUMNS, ROWS = 100, 30
BOOK = os.environ.get("SIDEPATH_BENCH_BOOK")
"""A book that is there already; read here, since every test starts from an environment without such names."""
TAIL = 4
"""Letters before the cursor that must stand on the screen in a row for a key to count as shown."""

BARE = """
from textual.app import App
from textual.widgets import Input
class Bare(App):
    def compose(self):
        yield Input(id="line", compact=True)
Bare().run()
"""

WHOLE = """
import sys, time
sys.setswitchinterval(0.002)
from tui import application, far_desk, opening
log = open(sys.argv[2], "a", buffering=1)
def timed(cls, name):
    plain = getattr(cls, name)
    def call(*args, **kwargs):
        log.write(f"start {time.monotonic()}\\n")
        try:
            return plain(*args, **kwargs)
        except Exception as error:
            log.write(f"{type(error).__name__} 0\\n")
            raise
        finally:
            log.write(f"end {time.monotonic()}\\n")
    setattr(cls, name, call)
timed(far_desk.FarDesk, "check")
application.SidepathApp(opening.DeskOpener(), place=sys.argv[1], who="JM").run()
"""


class Terminal:
    """A program in a pseudo-terminal."""

    def __init__(self, *command: str, folder: Path) -> None:
        self.master, child = pty.openpty()
        fcntl.ioctl(child, termios.TIOCSWINSZ, struct.pack("HHHH", ROWS, COLUMNS, 0, 0))
        environment = {
            **os.environ, "TERM": "xterm-256color", "COLORTERM": "truecolor", "HOME": str(folder),
            "XDG_DATA_HOME": str(folder), "XDG_CONFIG_HOME": str(folder), "XDG_CACHE_HOME": str(folder),
            "XDG_STATE_HOME": str(folder), "PYTHONPATH": str(ROOT),
        }  # fmt: skip
        self.program = subprocess.Popen(
            command, stdin=child, stdout=child, stderr=child, env=environment
        )
        os.close(child)
        self.seen = ""

    def read(self, until: float) -> str:
        """Return what came, waiting for something until a moment; "" = nothing."""
        ready, _, _ = select.select([self.master], [], [], max(until - time.monotonic(), 0))
        if not ready:
            return ""
        try:
            return os.read(self.master, 65536).decode(errors="replace")
        except OSError:
            return ""

    def wait_for(self, text: str, timeout_s: float) -> float | None:
        """Return the moment when the output since the call holds a text; None when it never does."""
        came, end = "", time.monotonic() + timeout_s
        while time.monotonic() < end:
            came += self.read(end)
            if text in came:
                return time.monotonic()
        return None

    def rest(self, quiet_s: float, timeout_s: float) -> None:
        """Read until nothing comes for a while."""
        end = time.monotonic() + timeout_s
        while time.monotonic() < end and self.read(time.monotonic() + quiet_s):
            pass

    def write(self, keys: str) -> float:
        moment = time.monotonic()
        os.write(self.master, keys.encode())
        return moment

    def close(self) -> None:
        self.write("\x11")
        try:
            self.program.wait(10)
        except subprocess.TimeoutExpired:
            self.program.kill()
            self.program.wait()
        os.close(self.master)


def chain(number: int, chance: random.Random) -> str:
    """Return letters that make a molecule at every length, no TAIL of them twice in a row of them."""
    while True:
        letters, seen = "", set()
        while len(letters) < number:
            options = [c for c in "CCNOSP" if (letters + c)[-TAIL:] not in seen or len(letters) < TAIL - 1]
            if not options:
                break
            letters += chance.choice(options)
            seen.add(letters[-TAIL:])
        else:
            return letters


PACE_S = (0.155, 0.25)
"""Between keys [s]; somewhat longer than the pause after which the form is read, so that each key starts a check."""


def type_slowly(terminal: Terminal, keys: int, pace_s: tuple[float, float] = PACE_S) -> list[tuple[float, float]]:
    """Type chains into the line in focus, a key at a time; return (moment of the key, seconds until it showed)."""
    chance = random.Random(7)
    shown: list[tuple[float, float]] = []
    while len(shown) < keys:
        letters = chain(24, chance)
        terminal.write("\x15")  # empty the line
        terminal.rest(0.5, 5)
        terminal.write("CBr.")
        terminal.rest(0.5, 5)
        for at in range(1, len(letters) + 1):
            tail = ("CBr." + letters[:at])[-TAIL:]
            began = terminal.write(letters[at - 1])
            ended = terminal.wait_for(tail, 5)
            assert ended is not None, f"{tail} never showed"
            if at >= TAIL:
                shown.append((began, ended - began))
            end = time.monotonic() + chance.uniform(*pace_s)
            while time.monotonic() < end:
                terminal.read(end)
    return shown


def told(name: str, times_s: Sequence[float]) -> None:
    ordered = sorted(1000 * t for t in times_s)
    if len(ordered) < 20:
        print(f"  {name}: only {len(ordered)} keys")
        return
    at = statistics.quantiles(ordered, n=100)
    print(
        f"  {name}: {len(ordered)} keys, median {at[49]:.1f} ms, 95 % within {at[94]:.1f} ms, "
        f"99 % within {at[98]:.1f} ms, worst {ordered[-1]:.0f} ms"
    )


@pytest.mark.speed
def test_keys_show_while_a_check_runs(tmp_path: Path, pytestconfig: pytest.Config) -> None:
    assert pytestconfig.cache is not None
    place = BOOK or str(
        demo_book_of(wanted("RUNS", 100_000), pytestconfig.cache.mkdir("sidepath-bench"))
    )
    keys = wanted("KEYS", 300)
    print(f"\nload {os.getloadavg()[0]:.1f}")
    bare = Terminal(sys.executable, "-c", BARE, folder=tmp_path)
    bare.rest(1.0, 20)
    bare_times = [seconds for _, seconds in type_slowly(bare, keys)]
    bare.close()
    checks = tmp_path / "checks"
    whole = Terminal(sys.executable, "-c", WHOLE, place, str(checks), folder=tmp_path)
    whole.rest(3.0, 60)
    whole.write("CBr.C")
    end = time.monotonic() + 120
    while time.monotonic() < end and not (checks.exists() and "end" in checks.read_text()):
        whole.read(time.monotonic() + 0.2)
    shown = type_slowly(whole, keys)
    whole.close()
    moments = [line.split() for line in checks.read_text().splitlines()]
    assert {what for what, _ in moments} <= {"start", "end", "Cancelled"}, "checks failed: is the book of this recipe?"
    starts = [float(t) for what, t in moments if what == "start"]
    ends = [float(t) for what, t in moments if what == "end"]
    spans = list(zip(starts, ends, strict=False))
    during = [s for began, s in shown if any(a - s <= began <= b for a, b in spans)]
    told("a bare line", bare_times)
    told("the planning place, all keys", [s for _, s in shown])
    told("the planning place, keys during a check", during)
    median_ms = 1000 * statistics.median(b - a for a, b in spans) if spans else float("nan")
    print(f"  {len(spans)} checks, median {median_ms:.0f} ms; load {os.getloadavg()[0]:.1f}")
    assert len(spans) > keys / 20


@pytest.mark.speed
def test_keys_show_while_the_book_is_opened_and_while_runs_are_searched(
    tmp_path: Path, pytestconfig: pytest.Config
) -> None:
    assert pytestconfig.cache is not None
    place = BOOK or str(demo_book_of(wanted("RUNS", 100_000), pytestconfig.cache.mkdir("sidepath-bench")))
    keys = wanted("KEYS", 300) // 3
    print(f"\nload {os.getloadavg()[0]:.1f}")
    whole = Terminal(sys.executable, "-c", WHOLE, place, str(tmp_path / "checks"), folder=tmp_path)
    assert whole.wait_for("Scheme", 60)
    told("the planning place, while the book is opened", [s for _, s in type_slowly(whole, keys, (0.06, 0.2))])
    whole.write("\x1bOR")  # F3
    whole.rest(2.0, 30)
    whole.write("/")
    whole.rest(0.5, 5)
    told("the runs place, while the list is narrowed", [s for _, s in type_slowly(whole, keys, (0.21, 0.3))])
    whole.write("\x1bOS")  # F4
    whole.rest(2.0, 30)
    found: list[tuple[float, float]] = []
    while len(found) < keys:
        whole.write("\x15CCO\r")  # a search that every chain of the record answers to; the line keeps the focus
        found += type_slowly(whole, 21, (0.06, 0.2))
    told("the finding place, typing right behind a search", [s for _, s in found])
    whole.close()
