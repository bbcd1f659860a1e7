"""The façade that front ends open: a book, and what people type turned into values.

Names are looked up when first used, so that importing this package loads neither RDKit nor SQLAlchemy.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from kb.book.demo import build_demo, demo_plan
    from kb.book.facade import Book, open_book
    from kb.book.plan_words import conditions_from_words, plan_from_words
    from kb.book.words import (
        iter_scheme_column,
        outcome_from_words,
        parse_date,
        parse_fate,
        read_scheme,
        scheme_from_argument,
        today,
    )

_HOMES = {
    "Book": "facade",
    "open_book": "facade",
    "build_demo": "demo",
    "demo_plan": "demo",
    "conditions_from_words": "plan_words",
    "plan_from_words": "plan_words",
    "iter_scheme_column": "words",
    "outcome_from_words": "words",
    "parse_date": "words",
    "parse_fate": "words",
    "read_scheme": "words",
    "scheme_from_argument": "words",
    "today": "words",
}
__all__ = [
    "Book",
    "build_demo",
    "conditions_from_words",
    "demo_plan",
    "iter_scheme_column",
    "open_book",
    "outcome_from_words",
    "parse_date",
    "parse_fate",
    "plan_from_words",
    "read_scheme",
    "scheme_from_argument",
    "today",
]


def __getattr__(name: str) -> Any:
    if name not in _HOMES:
        raise AttributeError(name)
    return getattr(import_module(f"kb.book.{_HOMES[name]}"), name)
