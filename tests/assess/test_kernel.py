"""Likeness of two steps. Orders are common practice of physical organic chemistry; no digits are pinned."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from tables_by_hand import facts, table_of

from kb.assess.kernel import PARTS, combine, leaving_similarity, nucleophile_similarity, similarity_parts
from kb.assess.table import one_row
from kb.materials.nucleophile import DONORS, NUCLEOPHILE_ORDER
from kb.vocabulary import CarbonClass, LeavingGroup

CLASSES = st.sampled_from([None, *map(str, CarbonClass)])
GROUPS = st.sampled_from([None, *map(str, LeavingGroup)])
NUMBERS = st.none() | st.floats(-80, 200)


def likeness(plan: dict, run: dict) -> float:
    table = table_of((facts(**run), {}, None, None))
    return float(combine(similarity_parts(one_row(facts(**plan)), table, np.ones(1)))[0])


def test_weights_sum_to_one() -> None:
    assert sum(weight for _, weight in PARTS) == pytest.approx(1)


def test_a_step_is_wholly_like_itself() -> None:
    assert likeness({}, {}) == pytest.approx(1)


@pytest.mark.parametrize(
    ("nearer", "farther", "why"),
    [
        (
            {"leaving_group": "iodide"},
            {"leaving_group": "fluoride"},
            "bromide and iodide leave alike, fluoride hardly",
        ),
        ({"carbon_class": "primary"}, {"carbon_class": "methyl"}, "one step on the ladder against two"),
        ({"temperature_c": 70.0}, {"temperature_c": 120.0}, "ten kelvin against sixty"),
        (
            {"nucleophile_class": "amine"},
            {"nucleophile_class": "thiolate"},
            "nitrogen for nitrogen, not sulfur",
        ),
        ({"acidity": "weak"}, {"acidity": "strong"}, "weak acid against strong"),
        ({"base_pkah": 9.2}, {"base_pkah": 19.0}, "cyanide-like against tert-butoxide-like"),
        ({"protic": None}, {"protic": True}, "not recorded lies between alike and different"),
        ({"flags": "ring"}, {"flags": "neopentyl"}, "a ring matters less than a neopentyl carbon"),
    ],
)
def test_nearer_conditions_count_as_nearer(nearer: dict, farther: dict, why: str) -> None:
    assert 1 > likeness({}, nearer) > likeness({}, farther), why


def test_one_hopeless_part_spoils_the_whole() -> None:
    assert likeness({"carbon_class": "tertiary"}, {"carbon_class": "aryl"}) < 0.5


@given(CLASSES, GROUPS, NUMBERS, CLASSES, GROUPS, NUMBERS)
def test_likeness_is_symmetric_and_bounded(c1, g1, t1, c2, g2, t2) -> None:  # type: ignore[no-untyped-def]
    one = {"carbon_class": c1, "leaving_group": g1, "temperature_c": t1}
    two = {"carbon_class": c2, "leaving_group": g2, "temperature_c": t2}
    assert likeness(one, two) == pytest.approx(likeness(two, one))
    assert 0 < likeness(one, two) <= 1


def test_leaving_groups_keep_the_published_order() -> None:
    # F 1, Cl 200, Br 10,000, I 30,000, OTs 60,000: as tabulated in Solomons, Organic Chemistry (cited second-hand)
    order = ["tosylate", "iodide", "bromide", "chloride", "fluoride"]
    likenesses = [leaving_similarity("tosylate", g) for g in order]
    assert likenesses == sorted(likenesses, reverse=True)


def test_every_class_that_may_be_meant_as_nucleophile_has_its_donor_atom() -> None:
    assert set(NUCLEOPHILE_ORDER) <= set(DONORS)


@pytest.mark.parametrize(
    ("one", "other"),
    [
        ("hydrosulfide", "thiolate"),
        ("active_methylene", "enolate"),
        ("alkyllithium", "grignard"),
        ("phenol", "phenoxide"),
    ],
)
def test_classes_of_one_donor_atom_are_nearer_than_others(one: str, other: str) -> None:
    assert 1 > nucleophile_similarity(one, other) > nucleophile_similarity(one, "phosphine")
