"""The demo book, built once for all contract tests; a test that writes takes a copy."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest

from kb.book import build_demo
from kb.progress import Silent
from tests.engines import Books


@pytest.fixture(scope="session")
def demo_book(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return the demo book; only to be read."""
    place, built = build_demo(str(tmp_path_factory.mktemp("demo") / "demo.sidepath"), Silent())
    assert built
    return place


@pytest.fixture
def own_demo_book(demo_book: Path, tmp_path: Path) -> Path:
    """Return a copy of the demo book that the test may write to."""
    return Path(shutil.copy(demo_book, tmp_path / "own.sidepath"))


@pytest.fixture
def empty_book(books: Books) -> Path | str:
    """Return a new book without runs, on each engine in turn."""
    from tests.asking import ask

    place = books / "empty.sidepath"
    assert ask("new", book=place).status == 0
    return place
