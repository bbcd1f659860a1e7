"""A run expected without itself: the same answer as from a book that never had it."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest

from kb.assess.left_out import expect_left_out
from kb.book import Book, open_book
from kb.book.plan_words import conditions_from_words
from kb.record.outcome import Outcome, ProductSeen
from kb.record.run import Run
from kb.vocabulary import Fate


def runs() -> list[Run]:
    made = []
    for chain, temperature, share in ((1, 60, 0.9), (1, 80, 0.8), (2, 60, 0.85), (3, 100, 0.6), (4, 25, 0.97)):
        tail = "C" * chain
        seen = (
            ProductSeen(fate=Fate.SUBSTITUTION, share=share),
            ProductSeen(fate=Fate.ELIMINATION, share=1 - share),
        )
        words = {"reagents": "NaN3", "solvents": "DMF", "temperature": f"{temperature} °C", "time": "6 h"}
        made.append(
            Run(
                scheme=f"CC(OS(C)(=O)=O)C{tail}>>CC(N=[N+]=[N-])C{tail}",
                conditions=conditions_from_words(words),
                outcome=Outcome(products=seen, isolated_yield_pct=75 * share),
            )
        )
    return made


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Book]:
    with open_book(tmp_path_factory.mktemp("left-out") / "book.sidepath", create=True) as new:
        new.store.add_many(runs(), who="T")
        yield new


@pytest.mark.parametrize("left_out", range(5))
def test_it_is_what_a_check_says_in_a_book_without_the_run(book: Book, left_out: int, tmp_path: Path) -> None:
    view = book.view()
    rest = book.finder().tanimoto_of_runs(view.table.substrate[left_out], view.table.codes)
    expected = expect_left_out(view, left_out, rest)
    with open_book(tmp_path / "without.sidepath", create=True) as other:
        other.store.add_many([r for place, r in enumerate(runs()) if place != left_out], who="T")
        checked = other.check(runs()[left_out].plan).estimate
    assert [f for f, _ in expected.expected.fates] == [f for f, _ in checked.fates]
    for (_, ours), (_, theirs) in zip(expected.expected.fates, checked.fates, strict=True):
        assert ours.mean == pytest.approx(theirs.mean, abs=0.01)
    assert expected.fit is not None
    assert checked.yield_pct is not None
    assert expected.fit.yield_pct.mean == pytest.approx(checked.yield_pct.mean, abs=1.0)


def test_with_its_substrate_every_run_of_it_is_left_out(book: Book) -> None:
    view = book.view()
    alone, together = expect_left_out(view, 0), expect_left_out(view, 0, with_substrate=True)
    assert together.expected.effective_precedents < alone.expected.effective_precedents
    assert together.fit is not None
    assert 1 not in together.fit.rows
