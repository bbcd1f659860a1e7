"""Criteria are checked before any book is asked."""

from __future__ import annotations

import datetime as dt
from typing import Any

import pytest

from kb.errors import QueryError
from kb.search.criteria import MAX_NESTING, Criteria


@pytest.mark.parametrize(
    ("given", "says"),
    [
        ({"at_least": 0.0}, "similarity"),
        ({"at_least": 1.2}, "similarity"),
        ({"limit": 0}, "page"),
        ({"limit": 10**6}, "page"),
        ({"page": 0}, "page"),
        ({"temp_from_c": 80.0, "temp_to_c": 20.0}, "temperatures"),
        ({"since": dt.date(2025, 2, 1), "until": dt.date(2025, 1, 1)}, "dates"),
    ],
)
def test_what_makes_no_sense_is_refused(given: dict[str, Any], says: str) -> None:
    with pytest.raises(QueryError) as refusal:
        Criteria(**given)
    assert says in refusal.value.message
    assert refusal.value.hint


def test_endless_nesting_is_refused() -> None:
    inner = Criteria(words="a")
    with pytest.raises(QueryError):
        for _ in range(MAX_NESTING):
            inner = Criteria(any_of=(inner,))


def test_criteria_know_whether_they_need_structures() -> None:
    assert not Criteria(words="x", solvent="DMF").asks_for_structure
    assert Criteria(at_centre="CBr").asks_for_structure
    assert Criteria(none_of=(Criteria(any_of=(Criteria(exact="C"),)),)).asks_for_structure


def test_criteria_are_values() -> None:
    assert Criteria(words="a") == Criteria(words="a")
    assert len({Criteria(words="a"), Criteria(words="a")}) == 1
