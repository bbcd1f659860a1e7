"""Sidepath's knowledge base: the record of runs and the judgement drawn from it, without any front end.

    from kb import Plan, open_book, read_scheme

    with open_book("group.sidepath") as book:
        assessment = book.check(Plan(scheme="CCC(C)Br.[Na+].[N-]=[N+]=[N-]>>CCC(C)N=[N+]=[N-]"))

Names are looked up when first used, so that importing `kb` loads nothing heavy.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from kb.book import open_book, read_scheme
    from kb.record.plan import Plan
    from kb.record.run import Run
    from kb.search.criteria import Criteria

_HOMES = {
    "Criteria": "kb.search.criteria",
    "Plan": "kb.record.plan",
    "Run": "kb.record.run",
    "open_book": "kb.book",
    "read_scheme": "kb.book",
}
__all__ = [
    "Criteria",
    "Plan",
    "Run",
    "open_book",
    "read_scheme",
]


def __getattr__(name: str) -> Any:
    if name not in _HOMES:
        raise AttributeError(f"module 'kb' has no attribute {name!r}")
    return getattr(import_module(_HOMES[name]), name)
