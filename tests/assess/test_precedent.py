"""The closest runs and plain words for what differs."""

from __future__ import annotations

import numpy as np
import pytest
from tables_by_hand import facts, table_of

from kb.assess.precedent import compare, differences, rank_precedents, word_precedents
from kb.assess.table import one_row
from kb.vocabulary import Verdict


def words(plan: dict, run: dict) -> list[str]:
    table = table_of((facts(**run), {}, None, None))
    row = one_row(facts(**plan))
    return differences(row, table, 0, compare(row, table)[0])


@pytest.mark.parametrize(
    ("plan", "run", "expected"),
    [
        ({}, {"leaving_group": "tosylate"}, "tosylate, not bromide"),
        ({}, {"carbon_class": "primary"}, "primary, not secondary"),
        ({}, {"flags": "benzylic"}, "also benzylic"),
        ({"flags": "ring"}, {}, "not ring"),
        ({}, {"nucleophile_class": None}, "no nucleophile"),
        ({}, {"temperature_c": 25.0}, "25 °C"),
        ({}, {"temperature_c": None}, "temperature not recorded"),
        ({}, {"base_pkah": 11.0}, "stronger base (pKaH 11.0)"),
        ({}, {"base_pkah": None}, "no base"),
        ({}, {"base_bulk": "hindered"}, "hindered base"),
        ({}, {"protic": True}, "protic solvent"),
        ({}, {"protic": None}, "solvent not recorded"),
        ({}, {"permittivity": 2.4, "et30_kcal_mol": 33.9}, "less polar solvent"),
        ({}, {"acidity": "strong"}, "strong acid"),
        ({}, {"halophile": "silver"}, "silver"),
        ({}, {"substrate": "CCCC(C)Br"}, "another molecule"),
        (
            {"profile_json": '{"reagents":["C1CCC2=NCCCN2CC1"]}'},
            {"profile_json": '{"reagents":["CN1CCCN2CCCN=C12"]}'},
            "MTBD, not DBU",
        ),
    ],
)
def test_what_differs_is_said_in_the_trade_s_words(plan: dict, run: dict, expected: str) -> None:
    assert expected in words(plan, run)


def test_nothing_differs_between_twins() -> None:
    assert words({}, {}) == []


def test_a_few_kelvin_are_no_difference() -> None:
    assert words({}, {"temperature_c": 63.0}) == []


def test_the_least_alike_part_comes_first() -> None:
    assert words({}, {"carbon_class": "aryl", "temperature_c": 50.0})[0] == "aryl, not secondary"


def test_runs_too_far_away_are_not_listed_and_ties_keep_the_record_s_order() -> None:
    similarity = np.array([0.9, 0.3, 0.9, 0.95])
    assert rank_precedents(similarity, 9).tolist() == [3, 0, 2]
    assert rank_precedents(similarity, 1).tolist() == [3]
    assert rank_precedents(similarity, 0).tolist() == []


def test_a_precedent_tells_how_it_went_and_how_alike_it_is() -> None:
    table = table_of((facts(), {"substitution": 0.9, "elimination": 0.1}, 71.0, "worked"))
    row = one_row(facts())
    parts, similarity = compare(row, table)
    (precedent,) = word_precedents(row, table, np.array([0]), parts, similarity)
    assert precedent.run == "R-1"
    assert precedent.yield_pct == 71.0
    assert precedent.verdict is Verdict.WORKED
    assert precedent.split[0][1] == pytest.approx(0.9)
    assert dict(precedent.parts)["centre"] == pytest.approx(1)


def test_an_outcome_plays_no_part_in_the_rank() -> None:
    good = table_of((facts(), {"substitution": 1.0}, 95.0, "worked"))
    bad = table_of((facts(), {"elimination": 1.0}, 0.0, "failed"))
    row = one_row(facts())
    assert compare(row, good)[1][0] == compare(row, bad)[1][0]
