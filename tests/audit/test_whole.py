"""The record as a whole through an open book: processes, kept files, adopting a rule."""

from __future__ import annotations

import datetime as dt
from pathlib import Path

import pytest

from kb.book import Book, open_book
from kb.book.whole import adopt_proposal, find_recurring_failures, measure_book_coverage, replay_book
from kb.errors import InvalidRecord

LATE = dt.date(2025, 6, 1)


class _StopAfter:
    def __init__(self, count: int) -> None:
        self.left = count

    def advance(self, done: int, total: int | None, note: str = "") -> None:
        self.left -= 1

    def cancelled(self) -> bool:
        return self.left <= 0


def test_two_processes_come_to_the_same_as_one(demo: Book) -> None:
    alone = replay_book(demo, since=LATE)
    assert alone.failures > 5
    assert replay_book(demo, since=LATE, processes=2) == alone


def test_a_stopped_replay_is_taken_up_from_its_file(demo: Book, tmp_path: Path) -> None:
    keep = tmp_path / "replay.jsonl"
    stopped = replay_book(demo, since=LATE, keep=keep, progress=_StopAfter(8))
    assert stopped.stopped
    kept = keep.read_text().splitlines()
    keep.write_text("\n".join(kept) + '\n{"run": "R-04')  # the power went
    whole = replay_book(demo, since=LATE, keep=keep)
    assert not whole.stopped
    assert whole == replay_book(demo, since=LATE)
    assert keep.read_text().splitlines()[: len(kept)] == kept


@pytest.mark.parametrize("text", ["hello", '{"sidepath_replay": 1, "state": "other"}\n', "[1]\n"])
def test_a_file_kept_for_another_book_is_refused(demo: Book, tmp_path: Path, text: str) -> None:
    keep = tmp_path / "replay.jsonl"
    keep.write_text(text)
    with pytest.raises(InvalidRecord, match="no replay of this book"):
        replay_book(demo, since=LATE, keep=keep)
    assert keep.read_text() == text


def test_an_adopted_proposal_warns_and_is_then_named(demo: Book, tmp_path: Path) -> None:
    copy = tmp_path / "copy.sidepath"
    demo.backup(copy)
    with open_book(copy) as book:
        cluster = next(c for c in find_recurring_failures(book).clusters if c.name == "group-loss/tertiary-alkyl-ester")
        assert cluster.proposal is not None
        rule = adopt_proposal(book, cluster.proposal, who="MK")
        assert (rule.author, rule.when) == ("MK", cluster.proposal.rule.when)
        again = next(c for c in find_recurring_failures(book).clusters if c.name == cluster.name)
        assert again.covered_by == ((rule.rule_id, len(cluster.runs)),)
        failed = book.get(cluster.runs[0])
        assert f"house:{rule.rule_id}" in {f.rule_id for f in book.check(failed.plan).findings}


def test_coverage_through_the_book(demo: Book) -> None:
    assert measure_book_coverage(demo, experiments=1).runs == demo.count()
