"""The demo book, built once for the tests that ask something of all its plans."""

from __future__ import annotations

from collections.abc import Iterator

import pytest

from kb.assess.record_view import RecordView
from kb.book import build_demo, open_book
from kb.progress import Silent


@pytest.fixture(scope="session")
def demo_view(tmp_path_factory: pytest.TempPathFactory) -> Iterator[RecordView]:
    """Yield a view of the demo book's invented runs."""
    path, _ = build_demo(str(tmp_path_factory.mktemp("demo") / "demo.sidepath"), Silent())
    with open_book(path, read_only=True) as book:
        yield book.view()
