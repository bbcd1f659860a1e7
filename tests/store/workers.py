"""What the processes of the concurrency and kill tests do: `python -m tests.store.workers DEED BOOK ...`.

Every deed prints one line per thing that was acknowledged, flushed, so that whoever kills the process knows what must
be there afterwards. Identities are made from the arguments, so that a deed that is started again does the same.
"""

from __future__ import annotations

import sys
from pathlib import Path
from uuid import UUID, uuid5

from kb.record.run import Run
from kb.store import schema
from kb.store.engine import parse_address
from kb.store.merging import merge
from kb.store.safekeeping import backup
from kb.store.store import Store
from tests.factories import CHEMISTRY, a_run

NAMES = UUID("6f0c6b1e-3f1c-4f6e-9d0e-5a3c2b1a0f99")


def numbered_run(worker: str, n: int) -> Run:
    """Return the n-th run of a worker: the same one each time it is asked for."""
    scheme = f"{'C' * (n % 17 + 1)}Br>>{'C' * (n % 17 + 1)}O"
    return a_run(run_id=uuid5(NAMES, f"{worker}/{n}"), note=f"worker {worker} run {n}", scheme=scheme)


def say(*what: object) -> None:
    """Print a line at once."""
    print(*what, flush=True)


def record(book: str, worker: str, count: str) -> None:
    """Record runs one by one, those that are there already left out; amend every fifth."""
    with Store.open(book, **CHEMISTRY) as store:
        known = {run.run_id for run in store.iter_runs()}
        for n in range(int(count)):
            run = numbered_run(worker, n)
            if run.run_id not in known:
                store.add(run, worker)
            say("kept", run.run_id)
            if n % 5 == 0:
                store.amend(run.run_id, {"project": f"{worker}-{n}-{uuid5(NAMES, str(sys.argv)).hex[:4]}"}, worker, "x")
                say("amended", run.run_id)


def take_in(book: str, worker: str, count: str) -> None:
    """Import many runs in bulk."""
    with Store.open(book, **CHEMISTRY) as store:
        report = store.add_many((numbered_run(worker, n) for n in range(int(count))), worker)
        say("imported", report.stored, report.duplicate)


def merge_in(book: str, other: str) -> None:
    """Merge another book into this one."""
    with Store.open(book, **CHEMISTRY) as store:
        say("merged", merge(store, other, who="MK").added)


def back_up(book: str, folder: str) -> None:
    """Make backups until somebody stops it."""
    with Store.open(book, read_only=True) as store:
        while True:
            say("saved", backup(store, folder, keep=3))


def migrate(book: str) -> None:
    """Bring a book up to date; where it is already, nothing happens."""
    say("migrated", schema.upgrade(parse_address(book)))


def read(book: str, rounds: str) -> None:
    """Read and search while others write; complain of half a run."""
    with Store.open(book, read_only=True) as store:
        for _ in range(int(rounds)):
            for run in store.iter_runs():
                whole = len(run.conditions.components) == 2 and len(run.outcome.products) == 2 and run.code
                history = store.history(run.run_id)
                if not whole or history[0].action != "add" or len(history) < run.revision:
                    say("half a run", run.run_id)
            found = {hit.run_id for hit in store.words("worker", limit=50)}
            if not found <= {run.run_id for run in store.iter_runs()}:
                say("words know more than the record")
            columns = store.derived_columns() if store.book.deriving.derive else {}
            say("read", store.count(), len(columns))


DEEDS = {f.__name__: f for f in (record, take_in, merge_in, back_up, migrate, read)}

if __name__ == "__main__":
    assert Path(sys.argv[2])
    DEEDS[sys.argv[1]](*sys.argv[2:])
