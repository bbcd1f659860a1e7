"""A small book of three runs, made once; a test that writes takes a copy."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest

from kb.book import open_book
from tests.factories import a_run


@pytest.fixture(scope="session")
def small_book(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return a book of three runs; only to be read."""
    place = tmp_path_factory.mktemp("small") / "small.sidepath"
    with open_book(place, create=True) as book:
        for note in ("emulsion at work-up", "clean", "slow"):
            book.add(a_run(note=note), "AB")
    return place


@pytest.fixture
def own_book(small_book: Path, tmp_path: Path) -> Path:
    """Return a copy of the small book that the test may write to."""
    return Path(shutil.copy(small_book, tmp_path / "own.sidepath"))
