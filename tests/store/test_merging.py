"""Merging two books: nothing doubled, nothing lost, the same whichever way round, conflicts shown and settled."""

from __future__ import annotations

import datetime as dt
import itertools
from contextlib import ExitStack
from dataclasses import replace
from typing import Any

import pytest
from hypothesis import given
from hypothesis import settings as hypothesis_settings
from hypothesis import strategies as st

from kb.errors import InvalidRecord, RecordConflict, StoreDamaged, StoreMissing
from kb.store.checking import verify
from kb.store.merging import merge
from kb.store.moving import copy_all
from kb.store.runs import RunFilter
from kb.store.store import Store
from kb.store.values import HouseRule
from kb.vocabulary import Severity
from tests.engines import Books, Files
from tests.factories import CHEMISTRY, START, a_book, a_run, ticking_clock

ALL = RunFilter(with_withdrawn=True)


def address_of(store: Store) -> str:
    return store.book.address.for_opening


def two_copies(books: Books, runs: int = 3) -> tuple[Store, Store]:
    """Return the group's book, on either engine, and a copy in a laptop's file, whose clock goes an hour late."""
    group = a_book(books, "group.sidepath", **CHEMISTRY)
    for n in range(runs):
        group.add(a_run(note=f"run {n}"), "MK")
    laptop = books.folder / "laptop.sidepath"
    copy_all(group, laptop)
    late = ticking_clock(START + dt.timedelta(hours=1))
    return group, Store.open(laptop, **CHEMISTRY, clock=late)


def content(store: Store) -> tuple[Any, ...]:
    """Return everything that must be the same in merged books: runs, history, conflicts, what is kept beside."""
    runs = list(store.iter_runs(ALL))
    history = {run.run_id: {e.entry_id for e in store.history(run.run_id)} for run in runs}
    return runs, history, store.conflicts(), store.house_rules.list(with_retired=True), store.acknowledgements.list()


def assert_sound(*stores: Store) -> None:
    for store in stores:
        assert [c for c in verify(store, sample=None) if not c.ok] == []


def test_runs_of_both_are_in_the_merged_book_once(books: Books) -> None:
    group, laptop = two_copies(books)
    with group, laptop:
        away = laptop.add(a_run(note="away"), "TB")
        laptop.amend("1", {"note": "run 0, weighed again"}, "TB", "balance")
        report = merge(group, address_of(laptop), who="MK")
        assert (report.added, report.updated, report.same) == (1, 1, 2)
        assert report.conflicts == () and report.renamed == ()
        assert group.get(away.run_id) == away
        assert [e.who for e in group.history("1")] == ["MK", "TB"]
        made, merged = group.events()
        assert (made.action, merged.action, merged.who) == ("made", "merged", "MK")
        assert "1 runs added, 1 changed" in merged.detail
        again = merge(group, address_of(laptop), who="MK")
        assert len(group.events()) == 2
        assert (again.added, again.updated, again.same) == (0, 0, 4)
        assert [hit.code for hit in group.words("weighed")] == ["R-0001"]
        assert len(group.derived_columns()["code"]) == 4
        assert_sound(group, laptop)


def test_a_merge_with_nothing_new_changes_nothing(books: Books) -> None:
    group, laptop = two_copies(books)
    with group, laptop:
        version = group.data_version()
        merge(group, address_of(laptop), who="MK")
        assert group.data_version() == version


def test_different_fields_changed_on_both_sides_both_stand(books: Books) -> None:
    group, laptop = two_copies(books)
    with group, laptop:
        group.amend("1", {"outcome.isolated_yield_pct": 80.0}, "MK", "dried")
        laptop.amend("1", {"project": "thiols"}, "TB", "belongs there")
        assert merge(group, address_of(laptop), who="MK").conflicts == ()
        run = group.get("1")
        assert (run.outcome.isolated_yield_pct, run.project, run.revision) == (80.0, "thiols", 3)


def test_the_same_field_changed_on_both_sides_is_a_conflict_until_it_is_settled(books: Books) -> None:
    group, laptop = two_copies(books)
    with group, laptop:
        group.amend("1", {"outcome.isolated_yield_pct": 80.0}, "MK", "dried")
        laptop.amend("1", {"outcome.isolated_yield_pct": 64.0}, "TB", "weighed again")
        (conflict,) = merge(group, address_of(laptop), who="MK").conflicts
        assert (conflict.code, conflict.field) == ("R-0001", "outcome.isolated_yield_pct")
        assert [(c.value, c.who) for c in conflict.claims] == [(64.0, "TB"), (80.0, "MK")]
        assert group.get("1").outcome.isolated_yield_pct == 64.0  # the later change stands
        assert merge(laptop, address_of(group), who="TB").conflicts == (conflict,)
        group.amend("1", {"note": "other field"}, "MK", "typo")
        assert group.conflicts() == (conflict,)
        settled = group.settle("1", {"outcome.isolated_yield_pct": 80.0}, "AB", "the wet weight was read first")
        assert settled.outcome.isolated_yield_pct == 80.0
        assert group.conflicts() == ()
        assert merge(laptop, address_of(group), who="TB").conflicts == ()
        assert laptop.get("1") == group.get("1")
        assert len(group.history("1")) == 5
        assert_sound(group, laptop)


def test_a_conflict_can_be_settled_as_it_stands(books: Books) -> None:
    group, laptop = two_copies(books)
    with group, laptop:
        group.amend("1", {"note": "a"}, "MK", "x")
        laptop.amend("1", {"note": "b"}, "TB", "x")
        merge(group, address_of(laptop), who="MK")
        assert group.settle("1", {}, "AB", "the later one is right").note == "b"
        assert group.conflicts() == ()
        with pytest.raises(InvalidRecord):
            group.settle("1", {}, "AB", "again")


def test_the_same_change_on_both_sides_is_no_conflict(books: Books) -> None:
    group, laptop = two_copies(books)
    with group, laptop:
        group.amend("1", {"note": "the same"}, "MK", "x")
        laptop.amend("1", {"note": "the same"}, "TB", "y")
        assert merge(group, address_of(laptop), who="MK").conflicts == ()
        assert group.get("1").note == "the same"


def test_a_withdrawal_meets_an_amendment(books: Books) -> None:
    group, laptop = two_copies(books)
    with group, laptop:
        group.withdraw("1", "wrong flask", "MK")
        laptop.amend("1", {"note": "b"}, "TB", "x")
        merge(group, address_of(laptop), who="MK")
        run = group.get("1")
        assert (run.withdrawn_why, run.note) == ("wrong flask", "b")
        assert group.count() == 2


def test_runs_that_got_the_same_number_are_told_apart_for_good(books: Books) -> None:
    group, laptop = two_copies(books)
    with group, laptop:
        here, there = group.add(a_run(note="here"), "MK"), laptop.add(a_run(note="there"), "TB")
        assert here.code == there.code == "R-0004"
        report = merge(group, address_of(laptop), who="MK")
        merge(laptop, address_of(group), who="TB")
        codes = {group.get(here.run_id).code, group.get(there.run_id).code}
        assert len(codes) == 2 and all(code is not None and len(code) >= 8 for code in codes)
        assert {new for _, new in report.renamed} == codes
        assert {old for old, _ in report.renamed} == {"R-0004"}
        assert [r.code for r in group.iter_runs(ALL)] == [r.code for r in laptop.iter_runs(ALL)]
        with pytest.raises(RecordConflict, match="means 2 runs"):
            group.get("R-0004")
        for code in codes:
            assert group.get(str(code).upper()).code == code
        assert group.add(a_run(), "MK").code == "R-0005"
        assert_sound(group, laptop)


def test_books_that_never_met_can_be_merged(books: Books) -> None:
    shared = a_run(note="imported into both")
    with a_book(books, "a.sidepath") as a, a_book(books, "b.sidepath") as b:
        a.add(shared, "MK")
        b.add(a_run(), "TB")
        b.add(shared, "TB")
        merge(a, address_of(b), who="MK")
        merge(b, address_of(a), who="MK")
        assert content(a) == content(b)
        assert a.count() == 2 and a.conflicts() == ()
        assert len(a.history(shared.run_id)) == 2
        assert_sound(a, b)


def test_rules_acknowledgements_and_files_come_along_and_drafts_do_not(books: Books) -> None:
    group, laptop = two_copies(books)
    rule = HouseRule(
        title="No warm acid",
        motif="C(C)(C)(C)O",
        when="acidity >= strong",
        severity=Severity.CAUTION,
        why="R-1",
        author="TB",
    )
    with group, laptop:
        kept = laptop.house_rules.add(rule)
        twice = group.house_rules.add(replace(rule, title="Twice"))
        laptop.house_rules.add(replace(rule, title="Twice"))
        laptop.house_rules.retire(twice.rule_id, "TB", "too broad")
        laptop.acknowledgements.add("n-boc-strong-acid", str(laptop.get("1").run_id), "TB", "cold and short")
        laptop.attachments.attach("1", "nmr.pdf", b"%PDF-1", "TB", "spectrum")
        laptop.drafts.save("form", {"scheme": "C"})
        report = merge(group, address_of(laptop), who="MK")
        assert (report.house_rules, report.acknowledgements, report.attachments) == (1, 1, 1)
        assert group.attachments.get(group.get("1").attachments[0].sha256) == b"%PDF-1"
        assert [r.rule_id for r in group.house_rules.list()] == [kept.rule_id]
        assert group.house_rules.get(twice.rule_id).retired_why == "too broad"
        assert group.drafts.list() == ()
        merge(laptop, address_of(group), who="MK")
        assert content(group) == content(laptop)
        assert merge(group, address_of(laptop), who="MK").house_rules == 0


def test_an_edited_history_is_not_taken_in(books: Books) -> None:
    group, laptop = two_copies(books)
    with group, laptop:
        laptop.add(a_run(), "TB")
        laptop.close()
        assert Files(books.folder).execute("laptop.sidepath", "UPDATE history SET who = 'XX' WHERE seq = 4") == 1
        before = content(group)
        with pytest.raises(StoreDamaged, match="edited"):
            merge(group, address_of(laptop), who="MK")
        assert content(group) == before


def test_a_book_is_not_merged_with_itself_nor_with_none(books: Books) -> None:
    with a_book(books) as store:
        with pytest.raises(RecordConflict):
            merge(store, address_of(store), who="MK")
        with pytest.raises(StoreMissing):
            merge(store, books / "nowhere.sidepath", who="MK")
        with pytest.raises(InvalidRecord):
            merge(store, books / "nowhere.sidepath", who="")


which = st.integers(0, 2)
deeds = st.one_of(
    st.tuples(st.just("add"), which, st.text("abc", max_size=3)),
    st.tuples(
        st.just("amend"),
        which,
        st.integers(0, 9),
        st.sampled_from(["note", "project", "series"]),
        st.sampled_from("pqr"),
    ),
    st.tuples(st.just("withdraw"), which, st.integers(0, 9)),
    st.tuples(st.just("reinstate"), which, st.integers(0, 9)),
    st.tuples(st.just("settle"), which, st.integers(0, 9)),
    st.tuples(st.just("merge"), which, which),
)


any_doings = {
    "doings": st.lists(deeds, max_size=14),
    "steps": st.lists(st.integers(-3, 3), min_size=3, max_size=3),
    "order": st.permutations(list(itertools.permutations(range(3), 2))),
}


@given(**any_doings)
@hypothesis_settings(max_examples=12)
def test_any_edits_on_three_books_merged_in_any_order_come_to_the_same(
    doings: list[tuple[Any, ...]],
    steps: list[int],
    order: list[tuple[int, int]],
    books: Books,
) -> None:
    """Clocks differ, stand still or run backwards; two books start as copies, the third on its own."""
    come_to_the_same(doings, steps, order, books.mktemp("merge"))


@pytest.mark.soak
@given(**any_doings)
@hypothesis_settings(max_examples=500)
def test_very_many_edits_come_to_the_same(
    doings: list[tuple[Any, ...]],
    steps: list[int],
    order: list[tuple[int, int]],
    books: Books,
) -> None:
    come_to_the_same(doings, steps, order, books.mktemp("merge"))


def come_to_the_same(
    doings: list[tuple[Any, ...]], steps: list[int], order: list[tuple[int, int]], books: Books
) -> None:
    """Do things to three books, merge them pair by pair until all have met, and compare.

    The first is on either engine, the others are files.
    """
    folder = books.folder
    with ExitStack() as open_books:
        first = open_books.enter_context(a_book(books, "0.sidepath", clock=ticking_clock(START, steps[0])))
        first.add(a_run(note="base"), "MK")
        copy_all(first, folder / "1.sidepath")
        second = open_books.enter_context(Store.open(folder / "1.sidepath", clock=ticking_clock(START, steps[1])))
        third = open_books.enter_context(a_book(folder, "2.sidepath", clock=ticking_clock(START, steps[2])))
        stores = [first, second, third]
        ever: set[str] = set()
        for doing in doings:
            _do(stores, doing)
            ever |= content_ids(stores[doing[1]])
        for into, source in [*order, *order]:  # twice round, so that everything has reached everybody
            merge(stores[into], address_of(stores[source]), who="MK")
        assert content(first) == content(second) == content(third)
        assert content_ids(first) >= ever
        for into, source in order:
            report = merge(stores[into], address_of(stores[source]), who="MK")
            assert (report.added, report.updated, report.renamed) == (0, 0, ())
        assert_sound(*stores)


def content_ids(store: Store) -> set[str]:
    return {e.entry_id for run in store.iter_runs(ALL) for e in store.history(run.run_id)}


def _do(stores: list[Store], doing: tuple[Any, ...]) -> None:
    kind, number, *rest = doing
    store = stores[number]
    if kind == "add":
        store.add(a_run(note=rest[0]), "MK")
        return
    if kind == "merge":
        if rest[0] != number:
            merge(store, address_of(stores[rest[0]]), who="MK")
        return
    runs = list(store.iter_runs(ALL))
    if not runs:
        return
    run = runs[rest[0] % len(runs)]
    try:
        if kind == "amend":
            store.amend(run.run_id, {rest[1]: rest[2]}, "MK", "x")
        elif kind == "withdraw":
            store.withdraw(run.run_id, "x", "MK")
        elif kind == "reinstate":
            store.reinstate(run.run_id, "x", "MK")
        else:
            store.settle(run.run_id, {}, "MK", "x")
    except InvalidRecord:
        pass  # nothing would change
