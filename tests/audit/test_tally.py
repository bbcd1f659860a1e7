"""Failures counted one way after another: sums that agree with each other and with the rest of the audits."""

from __future__ import annotations

import pytest

from kb.audit.coverage import measure_coverage
from kb.audit.failing import failed_rows
from kb.audit.tally import BY_CLASS, BY_MODE, BY_QUARTER, MOST_WORDS, Tallied, Tally
from kb.book import Book, find_recurring_failures, tally_book


@pytest.fixture(scope="module")
def tally(demo: Book) -> Tally:
    return tally_book(demo)


def test_every_dated_run_stands_in_one_quarter_and_in_one_class_of_each_kind(tally: Tally, demo: Book) -> None:
    ways = dict(tally.ways)
    dated = int((demo.view().table.date > 0).sum())
    assert sum(t.runs for t in ways[BY_QUARTER]) == dated < tally.runs
    for way in BY_CLASS:
        assert sum(t.runs for t in ways[way]) == tally.runs == demo.count()
        assert sum(len(t.failed) for t in ways[way]) == tally.failed


def test_quarters_are_in_order_and_classes_by_failures(tally: Tally) -> None:
    ways = dict(tally.ways)
    quarters = [t.word for t in ways[BY_QUARTER]]
    assert quarters == sorted(quarters) and len(quarters) > 4
    for way in (BY_MODE, *BY_CLASS):
        counts = [len(t.failed) for t in ways[way] if "others" not in t.word]
        assert counts == sorted(counts, reverse=True)
        assert len(ways[way]) <= MOST_WORDS


def test_failures_are_those_of_the_other_audits(tally: Tally, demo: Book) -> None:
    view = demo.view()
    failed = {code for code, lost in zip(view.table.codes, failed_rows(view), strict=True) if lost}
    for _, words in tally.ways[1:]:
        assert {code for t in words for code in t.failed} == failed
    assert tally.failed == find_recurring_failures(demo).failures


def test_classes_are_those_of_coverage(tally: Tally, demo: Book) -> None:
    cells = measure_coverage(demo.view(), experiments=0).cells
    for t in dict(tally.ways)["carbon class"]:
        assert t.runs == sum(c.runs for c in cells if c.carbon_class == t.word)
    assert sorted(code for c in cells for code in c.codes) == sorted(demo.view().table.codes)


def test_a_share_is_of_the_runs_that_say_how_they_went() -> None:
    assert Tallied(word="x", runs=9, failed=("R-1",), fine=("R-2", "R-3", "R-4")).share == 0.25
    assert Tallied(word="x", runs=9, failed=(), fine=()).share is None
