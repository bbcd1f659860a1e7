"""Questions in a process of their own: the same answers, progress, a wish to stop, errors, kept replays."""

from __future__ import annotations

from pathlib import Path

import pytest

from kb.book import Book, ask_beside, measure_book_coverage, replay_book, tally_book
from kb.errors import Cancelled, SidepathError, StoreMissing
from kb.progress import Silent
from tests.audit.cutting import early_part


class _Counting:
    def __init__(self, stop_after: int | None = None) -> None:
        self.reports: list[tuple[int, int | None, str]] = []
        self._stop_after = stop_after

    def advance(self, done: int, total: int | None, note: str = "") -> None:
        self.reports.append((done, total, note))

    def cancelled(self) -> bool:
        return self._stop_after is not None and len(self.reports) >= self._stop_after


def test_the_answers_are_those_of_this_process(demo: Book) -> None:
    progress = _Counting()
    assert ask_beside(demo.path, "tally", progress) == tally_book(demo)
    assert ask_beside(demo.path, "coverage", progress) == measure_book_coverage(demo)
    assert progress.reports


def test_a_wish_to_stop_ends_it(demo: Book) -> None:
    with pytest.raises(Cancelled):
        ask_beside(demo.path, "recurring", _Counting(stop_after=0))


def test_an_error_comes_back_as_itself(tmp_path: Path) -> None:
    with pytest.raises(StoreMissing, match="no book"):
        ask_beside(str(tmp_path / "none.sidepath"), "tally", Silent())


def test_a_process_that_dies_is_told_in_words(demo: Book) -> None:
    with pytest.raises(SidepathError, match="without an answer"):
        ask_beside(demo.path, "no such question", Silent())


def test_a_replay_is_kept_taken_up_and_thrown_away_with_its_book(demo: Book, tmp_path: Path) -> None:
    small = early_part(demo, tmp_path / "small.sidepath", runs=25)
    kept = tmp_path / "replays"
    stopped = ask_beside(small, "replay", _Counting(stop_after=1), kept)
    (file,) = kept.iterdir()
    before = file.read_text()
    whole = ask_beside(small, "replay", Silent(), kept)
    assert file.read_text().startswith(before) and not whole.stopped
    assert len(stopped.runs) <= len(whole.runs) == 25
    file.write_text('{"sidepath_replay": 1, "state": "of another book"}\n')
    assert ask_beside(small, "replay", Silent(), kept) == whole
    from kb.book import open_book

    with open_book(small, read_only=True) as book:
        assert replay_book(book) == whole
