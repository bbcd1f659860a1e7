"""The façade that front ends open: a book, and what people type turned into values.

Names are looked up when first used, so that importing this package loads neither RDKit nor SQLAlchemy.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from kb.book.beside import ask_beside
    from kb.book.demo import build_demo, demo_plan
    from kb.book.facade import Book, open_book
    from kb.book.find_words import criteria_from_words
    from kb.book.keeping import create_book, migrate_book, restore_book
    from kb.book.materials_words import complete_material, lookup_material
    from kb.book.pages import markdown_of, page_of, plan_from_file, save_page, thing_named
    from kb.book.plan_words import conditions_from_words, plan_from_words
    from kb.book.routes import reckon_route, route_lead
    from kb.book.run_words import runs_from_json
    from kb.book.settle_words import choices_from_words
    from kb.book.split_words import SplitAnswer, split_from_words
    from kb.book.unrecorded import check_unrecorded
    from kb.book.whole import (
        adopt_proposal,
        calibrate_book,
        find_recurring_failures,
        measure_book_coverage,
        processes_for,
        replay_book,
        tally_book,
    )
    from kb.book.words import (
        check_scheme,
        house_rule,
        iter_scheme_column,
        outcome_from_words,
        parse_date,
        parse_run_date,
        read_scheme,
        scheme_from_argument,
        today,
    )

_HOMES = {
    "adopt_proposal": "whole",
    "calibrate_book": "whole",
    "find_recurring_failures": "whole",
    "measure_book_coverage": "whole",
    "ask_beside": "beside",
    "replay_book": "whole",
    "processes_for": "whole",
    "tally_book": "whole",
    "reckon_route": "routes",
    "route_lead": "routes",
    "markdown_of": "pages",
    "page_of": "pages",
    "plan_from_file": "pages",
    "save_page": "pages",
    "thing_named": "pages",
    "Book": "facade",
    "SplitAnswer": "split_words",
    "open_book": "facade",
    "build_demo": "demo",
    "check_scheme": "words",
    "choices_from_words": "settle_words",
    "check_unrecorded": "unrecorded",
    "demo_plan": "demo",
    "conditions_from_words": "plan_words",
    "create_book": "keeping",
    "criteria_from_words": "find_words",
    "complete_material": "materials_words",
    "lookup_material": "materials_words",
    "migrate_book": "keeping",
    "restore_book": "keeping",
    "runs_from_json": "run_words",
    "split_from_words": "split_words",
    "house_rule": "words",
    "plan_from_words": "plan_words",
    "iter_scheme_column": "words",
    "outcome_from_words": "words",
    "parse_date": "words",
    "parse_run_date": "words",
    "read_scheme": "words",
    "scheme_from_argument": "words",
    "today": "words",
}
__all__ = [
    "Book",
    "SplitAnswer",
    "adopt_proposal",
    "ask_beside",
    "build_demo",
    "calibrate_book",
    "check_scheme",
    "check_unrecorded",
    "choices_from_words",
    "complete_material",
    "conditions_from_words",
    "create_book",
    "criteria_from_words",
    "demo_plan",
    "find_recurring_failures",
    "house_rule",
    "iter_scheme_column",
    "lookup_material",
    "markdown_of",
    "measure_book_coverage",
    "migrate_book",
    "open_book",
    "outcome_from_words",
    "page_of",
    "parse_date",
    "parse_run_date",
    "plan_from_file",
    "plan_from_words",
    "read_scheme",
    "reckon_route",
    "processes_for",
    "replay_book",
    "restore_book",
    "route_lead",
    "runs_from_json",
    "save_page",
    "scheme_from_argument",
    "split_from_words",
    "tally_book",
    "thing_named",
    "today",
]


def __getattr__(name: str) -> Any:
    if name not in _HOMES:
        raise AttributeError(name)
    return getattr(import_module(f"kb.book.{_HOMES[name]}"), name)
