"""Many runs derived in other processes: the same book as by one process, whatever becomes of the processes."""

from __future__ import annotations

import dataclasses
import os
import signal
import subprocess
import sys
import time
from collections.abc import Iterator
from pathlib import Path
from typing import Any
from uuid import UUID

import pytest

from kb.errors import InvalidRecord
from kb.record.run import Run
from kb.store import checking, deriving_apart, entering
from kb.store import store as bulk
from kb.store.store import Store
from tests.factories import CHEMISTRY, START, a_book, a_run, ticking_clock

BULK = 100
"""Runs of a transaction here; the processes start behind the first."""

APART = {**CHEMISTRY, "processes": 2}


@pytest.fixture(autouse=True)
def small_batches(monkeypatch: pytest.MonkeyPatch) -> None:
    """Let few runs be many."""
    monkeypatch.setattr(bulk, "BULK", BULK)
    monkeypatch.setattr(deriving_apart, "PIECE", 30)


def many(count: int) -> list[Run]:
    """Return runs of `count` different schemes, with a repeated structure in each."""
    return [
        a_run(scheme=f"{'C' * (n % 70 + 1)}Br.[Na]>>{'C' * (n % 70 + 1)}O", run_id=UUID(int=n + 1), note=str(n))
        for n in range(count)
    ]


def rows_of(store: Store) -> dict[str, list[tuple[Any, ...]]]:
    """Return every row of every table that an import writes, the book's own UUID left out."""
    found: dict[str, list[tuple[Any, ...]]] = {}
    names = ("run", "component", "product_seen", "facts", "structure", "run_structure", "recipe", "history")
    with store.book.reading() as connection:
        for name in names:
            result = connection.exec_driver_sql(f"SELECT * FROM {name}")
            hidden = {"entry_id", "chain", "book_id"}
            columns = [n for n, column in enumerate(result.keys()) if column not in hidden]
            found[name] = sorted((tuple(row[n] for n in columns) for row in result.all()), key=repr)
    return found


def started(monkeypatch: pytest.MonkeyPatch) -> list[subprocess.Popen[bytes]]:
    """Return the list to which every process that is started is added."""
    found: list[subprocess.Popen[bytes]] = []
    real = subprocess.Popen

    def noted(*given: Any, **options: Any) -> subprocess.Popen[bytes]:
        found.append(real(*given, **options))
        return found[-1]

    monkeypatch.setattr(deriving_apart.subprocess, "Popen", noted)
    return found


def test_the_book_is_the_same_as_by_one_process_and_verifies(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    processes = started(monkeypatch)
    given = many(430)
    fixed = {"clock": lambda: START}
    with (
        a_book(tmp_path, "one.sidepath", **CHEMISTRY, **fixed) as one,
        a_book(tmp_path, "two.sidepath", **APART, **fixed) as two,
    ):
        assert not processes
        reports = [store.add_many(iter(given), "MK") for store in (one, two)]
        assert reports[0] == reports[1] and reports[0].stored == 430
        assert len(processes) == 2 and all(p.returncode is not None for p in processes)
        assert rows_of(one) == rows_of(two)
        assert [(r.code, r.run_id) for r in one.iter_runs()] == [(r.code, r.run_id) for r in two.iter_runs()]
        assert all(check.ok for check in checking.verify(two))


def test_few_runs_start_no_process(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    processes = started(monkeypatch)
    with a_book(tmp_path, **APART) as store:
        assert store.add_many(many(100), "MK").stored == 100
    assert not processes


def test_a_process_that_dies_is_done_without(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    processes = started(monkeypatch)

    def runs() -> Iterator[Run]:
        for n, run in enumerate(many(500)):
            if n == 300:
                while not processes:
                    time.sleep(0.01)
                os.kill(processes[0].pid, signal.SIGKILL)
            yield run

    with a_book(tmp_path, **APART) as store:
        assert store.add_many(runs(), "MK").stored == 500
        assert all(check.ok for check in checking.verify(store))


def test_where_no_process_can_be_started_all_is_derived_here(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def refused(*_: Any, **__: Any) -> None:
        raise OSError("no more processes")

    monkeypatch.setattr(deriving_apart.subprocess, "Popen", refused)
    with a_book(tmp_path, **APART) as store:
        assert store.add_many(many(220), "MK").stored == 220
        assert all(check.ok for check in checking.verify(store))


def test_callables_that_have_no_name_are_used_here(tmp_path: Path) -> None:
    nameless = {**APART, "derive": lambda run: CHEMISTRY["derive"](run)}
    with a_book(tmp_path, **nameless) as store:
        assert store.add_many(many(220), "MK").stored == 220


def test_a_run_that_no_book_keeps_stops_the_import_behind_what_came_before(tmp_path: Path) -> None:
    given = many(400)
    given[350] = dataclasses.replace(given[350], note="\ud800")
    with a_book(tmp_path, **APART) as store:
        with pytest.raises(InvalidRecord):
            store.add_many(given, "MK")
        assert store.count() == 300
        assert all(check.ok for check in checking.verify(store))


def test_an_import_that_is_broken_off_leaves_whole_batches_and_no_process(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    processes = started(monkeypatch)

    def runs() -> Iterator[Run]:
        yield from many(450)
        raise KeyboardInterrupt

    with a_book(tmp_path, **APART) as store:
        with pytest.raises(KeyboardInterrupt):
            store.add_many(runs(), "MK")
        assert store.count() % 100 == 0 and store.count() >= 100
        assert all(p.poll() is not None for p in processes)
        left = 450 - store.count()
        assert store.add_many(many(450), "MK").stored == left
        assert all(check.ok for check in checking.verify(store))


def test_reading_again_what_is_there_derives_nothing(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    with a_book(tmp_path, **APART) as store:
        store.add_many(many(250), "MK")
        asked: list[int] = []
        derive = deriving_apart.Apart.derive
        monkeypatch.setattr(entering.Apart, "derive", lambda self, runs: asked.append(len(runs)) or derive(self, runs))
        report = store.add_many(many(250), "MK")
        assert (report.stored, report.duplicate) == (0, 250)
        assert sum(asked) == 0


def test_the_clock_gives_one_moment_to_a_batch(tmp_path: Path) -> None:
    with a_book(tmp_path, clock=ticking_clock(), **APART) as store:
        store.add_many(many(300), "MK")
        moments = {run.recorded_at for run in store.iter_runs()}
    assert len(moments) == 3


def test_who_stops_does_not_wait_for_what_is_under_way(tmp_path: Path) -> None:
    class StopAtFirst:
        done = 0

        def advance(self, done: int, total: int | None, note: str = "") -> None:
            self.done = done

        def cancelled(self) -> bool:
            return self.done > 0 and self.asked()

        def asked(self) -> bool:
            return len(read) > 2 * BULK  # the second batch is being derived by then

    read: list[int] = []

    def runs() -> Iterator[Run]:
        for n, run in enumerate(many(1_000)):
            read.append(n)
            yield run

    with a_book(tmp_path, **{**APART, "derive": slow_derive}) as store:
        report = store.add_many(runs(), "MK", StopAtFirst())
        assert report.stopped and report.stored == store.count() == BULK
        assert all(check.ok for check in checking.verify(store))


def slow_derive(run: Run) -> Any:
    """Derive in a process of its own as if that took long; here, at once."""
    if sys.argv[0] == "-c":  # as such a process is started
        time.sleep(0.02)
    return CHEMISTRY["derive"](run)
