"""What is kept of a flask for comparing it with another: its reagents, whoever wrote or drew them."""

from __future__ import annotations

import pytest

from kb.book.plan_words import plan_from_words
from kb.store.derivation import account_of_plan, profile_from_json, profile_to_json


def reagents(scheme: str, **words: object) -> frozenset[str]:
    return account_of_plan(plan_from_words({"scheme": scheme, **words})).profile.reagents


@pytest.mark.parametrize(
    ("scheme", "words", "expected", "why"),
    [
        ("CCCBr", {"reagents": ["NaN3"]}, {"[N-]=[N+]=[N-]"}, "a lone metal cation says nothing"),
        ("CCCBr.[N-]=[N+]=[N-].[K+]", {}, {"[N-]=[N+]=[N-]"}, "drawn or named, sodium or potassium: the same"),
        ("CCCBr.[SH:3][CH3:4]", {}, {"CS"}, "atom maps are left out"),
        ("CCCBr", {"reagents": ["NaN3"], "solvents": ["DMF"]}, {"[N-]=[N+]=[N-]"}, "solvents are no reagents"),
    ],
)
def test_the_flask_is_kept_as_plain_structures(
    scheme: str, words: dict[str, object], expected: set[str], why: str
) -> None:
    assert reagents(scheme, **words) == expected, why


def test_reagents_survive_the_store_s_text() -> None:
    profile = account_of_plan(plan_from_words({"scheme": "CCCBr", "reagents": ["NaN3"]})).profile
    assert profile_from_json(profile_to_json(profile)) == profile
