"""Runs go in and come out equal, by code, UUID, page or stream."""

from __future__ import annotations

import datetime as dt
from dataclasses import replace
from uuid import uuid4

import pytest
from hypothesis import given
from hypothesis import settings as hypothesis_settings

from kb.errors import InvalidRecord, RecordConflict, RecordNotFound, StoreRefused
from kb.record.outcome import Failure, Outcome
from kb.record.run import Run
from kb.store.runs import Material, RunFilter, Sort
from kb.store.store import Store
from kb.vocabulary import Verdict
from tests.engines import Books
from tests.factories import CHEMISTRY, START, a_book, a_run, runs


def test_a_run_comes_back_equal_with_code_and_moment(books: Books) -> None:
    run = a_run()
    with a_book(books) as store:
        stored = store.add(run, "MK")
    assert stored == replace(run, code="R-0001", recorded_at=START)
    with Store.open(books / "book.sidepath") as store:
        assert store.get("R-0001") == stored
        assert store.get(run.run_id) == stored


@given(run=runs())
@hypothesis_settings(max_examples=25)
def test_any_run_is_kept_to_the_letter(run: Run, books: Books) -> None:
    with a_book(books.mktemp("book")) as store:
        stored = store.add(run, "MK")
        assert store.get(run.run_id) == stored
        assert list(store.iter_runs(RunFilter(with_withdrawn=True))) == [stored]
    assert replace(stored, code=run.code, recorded_at=run.recorded_at) == run
    assert stored.code == (run.code or "R-0001")
    assert stored.recorded_at == (run.recorded_at or START)


@pytest.mark.parametrize("said", ["R-0002", "r-0002", "R2", "r 2", "2", "0002", " R-2 ", "R-00002"])
def test_a_code_is_understood_as_people_say_it(books: Books, said: str) -> None:
    with a_book(books) as store:
        for _ in range(3):
            store.add(a_run(), "MK")
        assert store.get(said).code == "R-0002"


@pytest.mark.parametrize("said", ["", "R-", "aspirin", "R-9", "R-0001x", "٢", "1; DROP TABLE run", "R-" + "9" * 40])
def test_an_unknown_code_is_refused(books: Books, said: str) -> None:
    with a_book(books) as store:
        store.add(a_run(), "MK")
        with pytest.raises(RecordNotFound):
            store.get(said)
        with pytest.raises(RecordNotFound):
            store.get(uuid4())


def test_the_same_run_twice_is_a_conflict_and_changes_nothing(books: Books) -> None:
    run = a_run()
    with a_book(books) as store:
        stored = store.add(run, "MK")
        with pytest.raises(RecordConflict):
            store.add(replace(run, note="other"), "MK")
        assert store.get("1") == stored
        assert len(store.history("1")) == 1


def test_a_code_brought_along_is_kept_while_nobody_has_it(books: Books) -> None:
    with a_book(books) as store:
        assert store.add(a_run(code="r-41"), "MK").code == "R-0041"
        assert store.add(a_run(code="R-0041"), "MK").code == "R-0042"
        assert store.add(a_run(code="no code"), "MK").code == "R-0043"


def test_nobody_and_nul_characters_are_refused(books: Books) -> None:
    with a_book(books) as store:
        with pytest.raises(InvalidRecord):
            store.add(a_run(), "  ")
        with pytest.raises(InvalidRecord):
            store.add(a_run(note="a\x00b"), "MK")
        with pytest.raises(InvalidRecord):
            store.add(a_run(scheme="\ud800"), "MK")
        assert store.count() == 0
        assert store.tip() == 0


def test_many_runs_are_stored_once_however_often_they_come(books: Books) -> None:
    many = [a_run(note=str(n)) for n in range(2500)]
    with a_book(books) as store:
        report = store.add_many(iter([*many, many[0]]), "MK")
        assert (report.stored, report.duplicate, report.stopped) == (2500, 1, False)
        again = store.add_many(many, "MK")
        assert (again.stored, again.duplicate) == (0, 2500)
        assert [run.note for run in store.iter_runs()] == [str(n) for n in range(2500)]
        assert [run.code for run in store.iter_runs()] == [f"R-{n:04d}" for n in range(1, 2501)]


class StopAfter:
    """Progress that asks to stop once something was reported."""

    def __init__(self) -> None:
        self.done = 0

    def advance(self, done: int, total: int | None, note: str = "") -> None:
        self.done = done

    def cancelled(self) -> bool:
        return self.done > 0


def test_a_stopped_job_keeps_what_it_stored_and_goes_on_later(books: Books) -> None:
    many = [a_run() for _ in range(1500)]
    with a_book(books) as store:
        report = store.add_many(many, "MK", StopAfter())
        assert (report.stored, report.stopped) == (1000, True)
        report = store.add_many(many, "MK")
        assert (report.stored, report.duplicate, report.stopped) == (500, 1000, False)


def test_pages_are_sorted_and_say_how_many_there_are(books: Books) -> None:
    with a_book(books) as store:
        for n in range(25):
            day = dt.date(2024, 1, 1 + (n * 7) % 25) if n else None
            store.add(a_run(date=day, outcome=Outcome(isolated_yield_pct=float(n * 3))), "MK")
        page = store.page(sort=Sort.DATE, descending=True, page=2, size=10)
        assert page.total == 25
        dates = [run.date for run in store.iter_runs(sort=Sort.DATE, descending=True)]
        assert dates[-1] is None
        assert [d for d in dates if d] == sorted((d for d in dates if d), reverse=True)
        assert [run.date for run in page.items] == dates[10:20]
        assert store.page(page=9, size=10).items == ()
        by_yield = [run.outcome.isolated_yield_pct for run in store.page(sort=Sort.YIELD, size=5).items]
        assert by_yield == [0.0, 3.0, 6.0, 9.0, 12.0]


def test_filters_hold_together(books: Books) -> None:
    with a_book(books, **CHEMISTRY) as store:
        azide = store.add(a_run(), "MK")
        failed = store.add(
            a_run(
                verdict=Verdict.FAILED,
                date=dt.date(2024, 6, 1),
                outcome=Outcome(failures=(Failure(mode="elimination"),)),
                project="Thiols",
            ),
            "MK",
        )
        both = {azide.run_id, failed.run_id}

        def found(**parts: object) -> set[object]:
            wanted = RunFilter(**parts)  # type: ignore[arg-type]
            ids = set(store.matching_ids(wanted))
            assert store.count(wanted) == len(ids) == store.page(wanted).total
            return ids

        assert found() == both
        assert found(verdict="failed") == {failed.run_id}
        assert found(failed="elimination") == {failed.run_id}
        assert found(failed="elimination", verdict="worked") == set()
        assert found(project="thiols") == {failed.run_id}
        assert found(since=dt.date(2024, 6, 1)) == {failed.run_id}
        assert found(until=dt.date(2024, 5, 31)) == {azide.run_id}
        assert found(temp_from_c=60, temp_to_c=60) == both
        assert found(temp_from_c=61) == set()
        assert found(carbon_class="primary", leaving_group="bromide") == both
        assert found(carbon_class="tertiary") == set()
        assert found(solvents=(Material(names=("dmf",)),)) == both
        assert found(solvents=(Material(smiles="CN(C)C=O"),)) == both
        assert found(components=(Material(names=("k2co3",), role="base"),)) == both
        assert found(components=(Material(names=("K2CO3",), role="acid"),)) == set()
        assert found(run_ids=frozenset({failed.run_id, uuid4()})) == {failed.run_id}
        assert found(by="mk") == both


def test_many_at_once_come_in_the_order_asked(books: Books) -> None:
    with a_book(books) as store:
        kept = [store.add(a_run(), "MK") for _ in range(3)]
        asked = [kept[2].run_id, uuid4(), kept[0].run_id]
        assert store.get_many(asked) == (kept[2], kept[0])


def test_a_book_opened_for_reading_refuses_to_write(books: Books) -> None:
    with a_book(books) as store:
        store.add(a_run(), "MK")
    with Store.open(books / "book.sidepath", read_only=True) as store:
        assert store.count() == 1
        with pytest.raises(StoreRefused):
            store.add(a_run(), "MK")


def test_every_change_moves_the_version(books: Books) -> None:
    with a_book(books) as store, Store.open(books / "book.sidepath") as other:
        before = other.data_version()
        store.add(a_run(), "MK")
        between = other.data_version()
        store.amend("1", {"note": "again"}, "MK", "typo")
        assert before < between < other.data_version()
