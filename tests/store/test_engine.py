"""How a book is reached: settings of every connection, threads on one store, and what is not loaded to do so."""

from __future__ import annotations

import re
import subprocess
import sys
import threading
from pathlib import Path

import pytest

from kb.errors import StoreError
from kb.store.store import Store
from tests.engines import Books
from tests.factories import CHEMISTRY, a_book, a_run


def test_every_connection_keeps_keys_and_syncs_fully(tmp_path: Path) -> None:
    with a_book(tmp_path) as store:
        for transaction in (store.book.reading, store.book.writing):
            with transaction() as connection:
                read = {
                    name: connection.exec_driver_sql(f"PRAGMA {name}").scalar()
                    for name in ("journal_mode", "foreign_keys", "synchronous", "busy_timeout")
                }
            # synchronous 2 = FULL, https://www.sqlite.org/pragma.html#pragma_synchronous
            assert read == {"journal_mode": "wal", "foreign_keys": 1, "synchronous": 2, "busy_timeout": 5000}


def test_a_row_that_points_nowhere_is_refused(books: Books) -> None:
    refused = pytest.raises(StoreError, match=re.compile("foreign key", re.IGNORECASE))
    with a_book(books) as store, refused, store.book.writing() as connection:
        connection.exec_driver_sql("INSERT INTO solvent VALUES (99, 0, 'water', NULL, NULL)")


def test_a_reader_sees_one_moment_and_the_writer_does_not_wait(books: Books) -> None:
    with a_book(books) as store:
        store.add(a_run(), "MK")
        stream = store.iter_runs()
        next(stream)
        for _ in range(3):
            store.add(a_run(), "MK")
        assert list(stream) == []
        assert store.count() == 4


def test_eight_threads_share_one_store(books: Books) -> None:
    troubles: list[BaseException] = []

    def work(number: int) -> None:
        try:
            for n in range(6):
                run = store.add(a_run(note=f"thread {number} run {n}"), f"T{number}")
                store.amend(run.run_id, {"project": "p"}, f"T{number}", "x")
                assert store.get(run.run_id).project == "p"
                store.derived_columns()
        except BaseException as error:  # noqa: BLE001  (told to the test's own thread)
            troubles.append(error)

    with a_book(books, **CHEMISTRY) as store:
        threads = [threading.Thread(target=work, args=(number,)) for number in range(8)]
        for thread in threads:
            thread.start()
        for thread in threads:
            thread.join()
        assert troubles == []
        assert store.count() == 48
        assert [run.code for run in store.iter_runs()] == [f"R-{n:04d}" for n in range(1, 49)]


def test_using_a_book_loads_neither_rdkit_nor_alembic_nor_numpy(tmp_path: Path) -> None:
    code = f"""
import sys
from kb.store.store import Store
with Store.create({str(tmp_path / "book.sidepath")!r}) as store:
    store.count()
print([name for name in ("rdkit", "alembic", "numpy", "textual") if name in sys.modules])
"""
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


def test_a_closed_store_leaves_one_file(tmp_path: Path) -> None:
    with a_book(tmp_path) as store:
        store.add(a_run(), "MK")
    assert [path.name for path in tmp_path.iterdir()] == ["book.sidepath"]
    with Store.open(tmp_path / "book.sidepath", read_only=True) as store:
        assert store.count() == 1  # SQLite leaves an empty log behind a reader, who may not remove it
    with Store.open(tmp_path / "book.sidepath") as store:
        assert store.count() == 1
    assert [path.name for path in tmp_path.iterdir()] == ["book.sidepath"]
