"""The book: one object that keeps runs, their history and what is derived from them.

Everything goes in and out as frozen values. A run, its children, its history entry, its words, facts and
structures are written in one transaction or not at all. Nothing is deleted: runs are amended (old value, who,
when, why) or withdrawn. Chemistry is worked out by the callables it was opened with, before the write lock is
taken, so that nobody waits for it.

A store may be used from several threads; each call takes its own connection. It refuses to open a book of a
later program (SchemaTooNew), one that needs migrating (SchemaBehind), and anything that is no book
(StoreDamaged).
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Mapping
from dataclasses import replace
from itertools import islice
from pathlib import Path
from typing import Any, Self
from uuid import UUID

from kb.errors import RecordConflict, StoreError
from kb.progress import Progress, Silent
from kb.record.run import Run
from kb.store import amending, facts, lineage, schema, words
from kb.store import engine as engines
from kb.store.answering import Answers
from kb.store.curation import Acknowledgements, Attachments, Drafts, HouseRules
from kb.store.deriving import Derive, Deriving, Dissect, Encode
from kb.store.entering import enter, enter_many
from kb.store.session import Clock, OpenBook, utc_now
from kb.store.values import AddReport

BULK = 1000
"""Runs per transaction in bulk work."""


class Store(Answers):
    """One open book. Use `Store.create` or `Store.open`, as a context manager.

    Attributes:
        book: for this floor only.
        house_rules, acknowledgements, drafts, attachments: what is kept beside the runs (`curation.py`).
    """

    def __init__(self, book: OpenBook) -> None:
        super().__init__(book)
        self.house_rules = HouseRules(book)
        self.acknowledgements = Acknowledgements(book)
        self.drafts = Drafts(book)
        self.attachments = Attachments(book)

    # Opening and closing

    @classmethod
    def create(cls, address: str | Path, **options: Any) -> Store:
        """Make a new, empty book and open it.

        Args:
            address: path or SQLAlchemy URL.
            options: those of `open`.

        Raises:
            StoreExists: something is there already.
            StoreMissing, StoreRefused: no such folder, no permission, or a network file system.
        """
        schema.create(engines.parse_address(address))
        return cls.open(address, **options)

    @classmethod
    def open(
        cls,
        address: str | Path,
        *,
        read_only: bool = False,
        derive: Derive | None = None,
        dissect: Dissect | None = None,
        encode: Encode | None = None,
        recipe: str = "",
        processes: int = 1,
        wait_s: float = engines.WAIT_S,
        on_wait: engines.Waiting | None = None,
        clock: Clock = utc_now,
    ) -> Store:
        """Open a book that is there.

        Args:
            address: path or SQLAlchemy URL.
            read_only: never change the book.
            derive, dissect, encode: what makes facts, places and blobs (see `deriving.py`); None = not made.
            recipe: name of those three; `DerivedFacts.recipe` must equal it.
            processes: how many processes may derive at once where many runs come in; see `deriving_apart.py`.
            wait_s: how long to wait for another writer [s].
            on_wait: told while waiting, from the first second on.
            clock: gives moments; tests fix it.

        Raises:
            StoreMissing, StoreDamaged, StoreRefused, StoreBusy, SchemaTooNew, SchemaBehind: as their names
                say.
        """
        where = engines.parse_address(address)
        engine = schema.open_engine(where, read_only=read_only, wait_s=wait_s, on_wait=on_wait)
        deriving = Deriving(recipe=recipe, derive=derive, dissect=dissect, encode=encode, processes=processes)
        return cls(
            OpenBook(address=where, engine=engine, deriving=deriving, read_only=read_only, clock=clock)
        )

    def close(self) -> None:
        """Let go of the book; the log is folded into it if nobody else has it open."""
        self.book.engine.dispose()

    def __enter__(self) -> Self:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    # Runs in

    def add(self, run: Run, who: str) -> Run:
        """Keep a new run; return it with its code and moment.

        A code that the run brings along is kept while nobody has it, and so is its moment of entry.

        Raises:
            RecordConflict: a run with that UUID is there already.
            InvalidRecord: a value that no book can keep, or no initials.
        """
        stored = enter(self.book, [run], who)
        if not stored:
            raise RecordConflict(
                f"A run with the UUID {run.run_id} is in the book already.",
                "Amend it instead.",
                str(run.run_id),
            )
        return stored[0]

    def add_many(self, many: Iterable[Run], who: str, progress: Progress | None = None) -> AddReport:
        """Keep many runs, BULK per transaction; runs that are there already (by UUID) are left alone.

        Args:
            many: read as a stream.
            progress: asked before each transaction; what was stored stays.
        """
        progress = progress or Silent()
        stored = duplicate = 0
        for given, kept in enter_many(self.book, _chunks(many, progress), who, progress.cancelled):
            stored += kept
            duplicate += given - kept
            progress.advance(stored + duplicate, None, "runs stored")
        return AddReport(stored=stored, duplicate=duplicate, stopped=progress.cancelled())

    # Runs changed

    def amend(
        self,
        name: str | UUID,
        changes: Mapping[str, Any],
        who: str,
        why: str,
        expected_revision: int | None = None,
    ) -> Run:
        """Change fields of a run; return it as it stands then.

        Args:
            name: code or UUID.
            changes: field to new value; fields of `Run`, or one level down with a dot
                ("outcome.isolated_yield_pct"); values as the dataclasses hold them, None = not recorded.
            expected_revision: the revision that the person saw; None = whatever stands.

        Raises:
            RecordConflict: somebody changed the run since that revision.
            InvalidRecord: unknown field, impossible value, nothing changed, or no reason given.
        """
        return self._change(
            name, lineage.AMEND, lambda run: amending.with_changes(run, changes), who, why, expected_revision
        )

    def replace(self, run: Run, who: str, why: str) -> Run:
        """Make a run say what `run` says, its `revision` being the one that the person saw; see `amend`."""
        return self._change(run.run_id, lineage.AMEND, lambda _: run, who, why, run.revision)

    def withdraw(self, name: str | UUID, why: str, who: str, expected_revision: int | None = None) -> Run:
        """Take a run out of every answer; it stays in the book with its history."""
        return self._change(
            name, lineage.WITHDRAW, lambda run: replace(run, withdrawn_why=why), who, why, expected_revision
        )

    def reinstate(self, name: str | UUID, why: str, who: str, expected_revision: int | None = None) -> Run:
        """Take a withdrawal back."""
        return self._change(
            name, lineage.REINSTATE, lambda run: replace(run, withdrawn_why=None), who, why, expected_revision
        )

    def settle(self, name: str | UUID, choices: Mapping[str, Any], who: str, why: str) -> Run:
        """Settle what two merged books said differently.

        Args:
            name: code or UUID.
            choices: disputed field to the value that shall stand, as portable JSON values (those of
                `Claim.value`); disputed fields left out stand as they do.
        """
        return self._change(
            name, lineage.SETTLE, lambda run: amending.with_choices(run, choices), who, why, None
        )

    def _change(
        self,
        name: str | UUID,
        action: str,
        to: Callable[[Run], Run],
        who: str,
        why: str,
        expected: int | None,
    ) -> Run:
        return amending.change(self.book, name, action, to, who=who, why=why, expected_revision=expected)

    # What was derived

    def rebuild(self, progress: Progress | None = None, batch: int = 200) -> int:
        """Make anew what another recipe made, and a word index that lags; return how many runs were read again."""
        if self.book.deriving.derive is None:
            raise StoreError(
                "The book was opened without anything to derive facts with.", "Open it with `derive`."
            )
        with self.book.writing() as connection:
            words.mend(connection)
        return facts.rebuild(self.book.writing, self.book.deriving, progress or Silent(), batch)


def _chunks(many: Iterable[Run], progress: Progress) -> Iterator[list[Run]]:
    """Yield BULK runs at a time until there are no more or the user asked to stop."""
    stream = iter(many)
    while not progress.cancelled() and (chunk := list(islice(stream, BULK))):
        yield chunk
