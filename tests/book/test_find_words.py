"""Search criteria as people type them, those inside others included."""

from __future__ import annotations

import datetime as dt

import pytest

from kb.book import criteria_from_words
from kb.errors import QueryError, SidepathError
from kb.search.criteria import Criteria
from kb.vocabulary import Role, Verdict


def test_criteria_inside_others_read_like_the_options() -> None:
    found = criteria_from_words(
        substructure="CBr",
        any_of=["solvent=DMF", "solvent = DMSO and temp-to=40 C and role=product and exact=CCO"],
        none_of=["words=wet and smelly", "at-centre=[C:1]=[#6] and since=2024-02-01 and verdict=failed"],
    )
    assert found == Criteria(
        substructure="CBr",
        any_of=(
            Criteria(solvent="DMF"),
            Criteria(solvent="DMSO", temp_to_c=40, role=Role.PRODUCT, exact="CCO"),
        ),
        none_of=(
            Criteria(words="wet and smelly"),
            Criteria(at_centre="[C:1]=[#6]", since=dt.date(2024, 2, 1), verdict=Verdict.FAILED),
        ),
    )


def test_numbers_and_yes_inside_others_are_values() -> None:
    (inner,) = criteria_from_words(any_of=["similar=CCO and at-least=0.7 and ignore-stereo=yes"]).any_of
    assert (inner.at_least, inner.ignore_stereo) == (0.7, True)


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("DMF", "names no field"),
        ("and solvent=DMF", "names no field"),
        ("=DMF", "names no field"),
        ("colour=red", "no field 'colour'"),
        ("solvent=", "has no value"),
        ("solvent= and base=NaH", "has no value"),
        ("solvent=DMF and solvent=THF", "stands twice"),
        ("limit=3", "does not go inside"),
        ("any-of=solvent=DMF", "does not go inside"),
        ("at-least=much", "'much'"),
        ("ignore-stereo=perhaps", "'perhaps'"),
        ("verdict=splendid", "'splendid' is no word for verdict"),
        ("failed=badly", "badly"),
        ("temp-from=warmish", "warmish"),
        ("since=yesterday-ish", "yesterday-ish"),
        ("role=onlooker", "onlooker"),
    ],
)
def test_what_cannot_be_meant_is_refused_in_words(text: str, said: str) -> None:
    with pytest.raises(SidepathError) as refusal:
        criteria_from_words(none_of=[text])
    assert said in refusal.value.message
    assert refusal.value.hint


def test_a_field_is_only_taken_where_it_stands_first_or_behind_and() -> None:
    (inner,) = criteria_from_words(any_of=["words=ratio a=b held"]).any_of
    assert inner == Criteria(words="ratio a=b held")
    with pytest.raises(QueryError):
        criteria_from_words(any_of=["words=this and a=b"])
