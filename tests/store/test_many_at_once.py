"""Many processes on one book, and processes killed at any moment: nothing acknowledged is lost, nothing is half there.

The default sizes keep the suite quick; `pytest -m soak tests/store/test_many_at_once.py` runs those of the project's
own measure (16 processes by 200 runs with 8 readers; 300 kills across record, import, merge, backup and migrate).
"""

from __future__ import annotations

import itertools
import os
import random
import signal
import subprocess
import sys
import time
from collections import Counter
from pathlib import Path
from uuid import UUID

import pytest

from kb.store import schema
from kb.store.checking import verify
from kb.store.copying import copy_book
from kb.store.safekeeping import backups_in
from kb.store.store import BULK, Store
from tests.engines import Books, Schemas
from tests.factories import CHEMISTRY, a_book
from tests.store.workers import numbered_run

ROOT = Path(__file__).resolve().parents[2]
BULK_RUNS, OTHER = 1100, 100
DEEDS = ("record", "take_in", "merge_in", "back_up", "migrate")


def start(*arguments: object, program: str = "tests.store.workers") -> subprocess.Popen[str]:
    return subprocess.Popen(
        [sys.executable, "-m", program, *map(str, arguments)],
        cwd=ROOT,
        env={**os.environ, "PYTHONPATH": str(ROOT), "PYTHONDONTWRITEBYTECODE": "1"},
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    )


def assert_sound(book: Path | str) -> None:
    with Store.open(book, **CHEMISTRY) as store:
        assert [c for c in verify(store) if not c.ok] == []


def write_and_read(books: Books, writers: int, runs: int, readers: int) -> None:
    book = books / "book.sidepath"
    a_book(books, **CHEMISTRY).close()
    processes = [start("record", book, f"W{w}", runs) for w in range(writers)]
    processes += [start("read", book, 3) for _ in range(readers)]
    said = [process.communicate(timeout=1500) for process in processes]
    for process, (out, err) in zip(processes, said, strict=True):
        assert process.returncode == 0, err
        assert "half a run" not in out and "know more" not in out
        assert err == ""
    with Store.open(book, **CHEMISTRY) as store:
        expected = {numbered_run(f"W{w}", n).run_id for w in range(writers) for n in range(runs)}
        assert {run.run_id for run in store.iter_runs()} == expected
        assert len({run.code for run in store.iter_runs()}) == writers * runs
        assert len(store.derived_columns()["code"]) == writers * runs
    assert_sound(book)


def test_four_processes_write_while_two_read(books: Books) -> None:
    write_and_read(books, writers=4, runs=25, readers=2)


@pytest.mark.soak
def test_sixteen_processes_write_200_runs_each_while_eight_read(books: Books) -> None:
    write_and_read(books, writers=16, runs=200, readers=8)


def test_killed_writers_leave_a_server_with_all_that_was_acknowledged(schemas: Schemas) -> None:
    """Killed while they hold the book, recording or importing; the server undoes what was half done."""
    a_book(schemas, **CHEMISTRY).close()
    book, moments, landed = schemas / "book.sidepath", random.Random(5), 0
    kept: set[UUID] = set()
    for attempt in range(24):
        deed = (("record", book, "W", 200 + attempt), ("take_in", book, f"bulk{attempt}", BULK_RUNS))[attempt % 2]
        process = start(*deed)
        first = process.stdout.readline() if deed[0] == "record" and process.stdout else ""
        while process.poll() is None and not is_written_to(schemas):
            time.sleep(0.001)
        time.sleep(moments.uniform(0, 0.05))
        landed += process.poll() is None
        process.kill()
        out, err = process.communicate(timeout=60)
        assert "Traceback" not in err, err
        said = first + out[: out.rfind("\n") + 1]
        kept |= {UUID(line.split()[1]) for line in said.splitlines() if line.startswith("kept ")}
        if landed >= 4:
            break
    assert landed >= 4 and kept
    with Store.open(book, **CHEMISTRY) as store:
        assert kept <= {run.run_id for run in store.iter_runs()}
        imported = Counter(run.note.split()[1] for run in store.iter_runs() if run.note.startswith("worker bulk"))
        assert set(imported.values()) <= {BULK, BULK_RUNS}  # whole transactions of an import, or nothing
    assert_sound(book)


def is_written_to(schemas: Schemas) -> bool:
    """Return whether a writer holds a book of the server at this moment."""
    held = "SELECT count(*) FROM pg_locks WHERE locktype = 'advisory' AND granted"
    return bool(schemas.server.admin.execute(held).fetchone()[0])


class Killer:
    """Starts deeds on one book, kills them at random moments, and checks after each that nothing is lost."""

    def __init__(self, folder: Path, seed: int) -> None:
        self.folder = folder
        self.book = folder / "book.sidepath"
        self.random = random.Random(seed)
        self.kept: set[UUID] = set()
        self.landed = 0
        self.longest_s: dict[str, float] = {}
        (folder / "backups").mkdir()
        a_book(folder, **CHEMISTRY).close()
        with a_book(folder, "other.sidepath", **CHEMISTRY) as other:
            other.add_many([numbered_run("other", n) for n in range(OTHER)], "TB")
        self.rounds = 0

    def kill_once(self, deed: str) -> None:
        """Start a deed, kill it at a random moment, and check the book."""
        self.rounds += 1
        if deed == "migrate":
            self.kill_a_migration()
            return
        arguments: dict[str, tuple[object, ...]] = {
            "record": (self.book, f"K{self.rounds}", 500),
            "take_in": (self.book, "bulk", BULK_RUNS),
            "merge_in": (self.book, self.folder / "other.sidepath"),
            "back_up": (self.book, self.folder / "backups"),
        }
        out = self._killed(deed, *arguments[deed])
        self.kept |= {UUID(line.split()[1]) for line in out.splitlines() if line.startswith("kept ")}
        self.check(with_backups=deed == "back_up")

    def _killed(self, deed: str, *arguments: object, program: str = "tests.store.workers") -> str:
        """Return what a process had said when it was killed; half of a last line is dropped.

        A deed that was over before its moment came (a fast machine) is given shorter ones from then on.
        """
        longest_s = self.longest_s.setdefault(deed, 1.3)
        process = start(deed, *arguments, program=program)
        time.sleep(self.random.uniform(longest_s / 4, longest_s))
        if process.poll() is None:
            self.landed += 1
            process.send_signal(signal.SIGKILL)
        else:
            self.longest_s[deed] = max(0.05, longest_s * 0.7)
        out, err = process.communicate(timeout=60)
        assert "Traceback" not in err, err
        return out[: out.rfind("\n") + 1]

    def kill_until(self, landed: int) -> None:
        """Go round the deeds until so many kills met a process that was still at work."""
        for deed in itertools.islice(itertools.cycle(DEEDS), 3 * landed + 10 * len(DEEDS)):
            if self.landed < landed:
                self.kill_once(deed)
        assert self.landed == landed

    def check(self, with_backups: bool) -> None:
        """Everything acknowledged is there, whole; backups are whole."""
        with Store.open(self.book, **CHEMISTRY) as store:
            there = {run.run_id for run in store.iter_runs()}
            assert self.kept <= there
            assert len(store.derived_columns()["code"]) == len(there)
        assert_sound(self.book)
        for copy in backups_in(self.folder / "backups", self.book) if with_backups else ():
            with Store.open(copy, read_only=True) as saved:
                assert all(c.ok for c in verify(saved))

    def kill_a_migration(self) -> None:
        """Kill the making of a book out of nothing by the revisions, as a migration of a real book would run."""
        book = self.folder / f"old{self.rounds}.sidepath"
        copy_book(self.book, book)
        before = len(list(self._runs(book)))
        self._killed("migrate", book, program="tests.store.later_program")
        with pytest.MonkeyPatch.context() as later:
            later.setattr(schema, "SCHEMA_REVISIONS", ("0001", "0002"))
            revision = schema.current(schema.Address(text=str(book), path=book))
            later.setattr(schema, "SCHEMA_HEAD", revision)
            assert len(list(self._runs(book))) == before

    def _runs(self, book: Path) -> list[object]:
        with Store.open(book, read_only=True) as store:
            return list(store.iter_runs())

    def finish(self) -> None:
        """Let every interrupted job run to its end: the same content as if nothing had happened."""
        for deed, arguments in (("take_in", ("bulk", BULK_RUNS)), ("merge_in", (self.folder / "other.sidepath",))):
            process = start(deed, self.book, *arguments)
            _, err = process.communicate(timeout=300)
            assert process.returncode == 0, err
        with Store.open(self.book, **CHEMISTRY) as store:
            there = {run.run_id for run in store.iter_runs()}
        assert {numbered_run("bulk", n).run_id for n in range(BULK_RUNS)} <= there
        assert {numbered_run("other", n).run_id for n in range(OTHER)} <= there
        assert_sound(self.book)


def test_killed_ten_times_nothing_acknowledged_is_lost(tmp_path: Path) -> None:
    killer = Killer(tmp_path, seed=11)
    killer.kill_until(landed=10)
    killer.finish()


@pytest.mark.soak
def test_killed_300_times_nothing_acknowledged_is_lost(tmp_path: Path) -> None:
    killer = Killer(tmp_path, seed=12)
    killer.kill_until(landed=300)
    killer.finish()
