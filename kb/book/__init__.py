"""The façade that front ends open: a book, and what people type turned into values.

Names are looked up when first used, so that importing this package loads neither RDKit nor SQLAlchemy.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from kb.book.demo import build_demo, demo_plan
    from kb.book.facade import Book, open_book
    from kb.book.find_words import criteria_from_words
    from kb.book.keeping import create_book, migrate_book, restore_book
    from kb.book.materials_words import lookup_material
    from kb.book.plan_words import conditions_from_words, plan_from_words
    from kb.book.words import (
        house_rule,
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
    "create_book": "keeping",
    "criteria_from_words": "find_words",
    "lookup_material": "materials_words",
    "migrate_book": "keeping",
    "restore_book": "keeping",
    "house_rule": "words",
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
    "create_book",
    "criteria_from_words",
    "demo_plan",
    "house_rule",
    "iter_scheme_column",
    "lookup_material",
    "migrate_book",
    "open_book",
    "outcome_from_words",
    "parse_date",
    "parse_fate",
    "plan_from_words",
    "read_scheme",
    "restore_book",
    "scheme_from_argument",
    "today",
]


def __getattr__(name: str) -> Any:
    if name not in _HOMES:
        raise AttributeError(name)
    return getattr(import_module(f"kb.book.{_HOMES[name]}"), name)
