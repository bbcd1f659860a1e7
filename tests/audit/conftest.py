"""One demo book for all audit tests, read only; built once, since building reads 400 schemes."""

from __future__ import annotations

import tomllib
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from kb import paths
from kb.book import Book, build_demo, open_book
from kb.progress import Silent


@pytest.fixture(scope="session")
def demo_path(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return the place of a demo book."""
    path, _ = build_demo(str(tmp_path_factory.mktemp("demo") / "demo.sidepath"), Silent())
    return path


@pytest.fixture(scope="session")
def demo(demo_path: Path) -> Iterator[Book]:
    """Return the demo book, opened for reading."""
    with open_book(demo_path, read_only=True) as book:
        yield book


@pytest.fixture(scope="session")
def planted() -> dict[str, Any]:
    """Return what was planted in the demo book: the truth that an audit is held against."""
    return tomllib.loads((paths.shipped("seed_demo") / "planted.toml").read_text(encoding="utf-8"))


@pytest.fixture(scope="session")
def references(demo: Book) -> dict[str, str]:
    """Return notebook reference to code."""
    return {run.reference: str(run.code) for run in demo.store.iter_runs() if run.reference}
