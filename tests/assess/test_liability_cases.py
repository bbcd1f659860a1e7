"""Every liability fires where it must and stays silent where it must: the tables of tests/data/liability_cases.

Source: textbook chemistry as collected for this project, see the README beside the tables. `fires` rows of the
two collected tables must fire both when the table is all that is in the flask and when the rest is unknown.
"""

from __future__ import annotations

import csv
from collections import Counter
from pathlib import Path

import pytest
from conditions_by_hand import a_profile
from rdkit import Chem

from kb.assess.liability import all_rules, find_liabilities, get_rule
from kb.chem.facts import Reading
from kb.record.finding import Finding
from kb.vocabulary import Confidence

CASES = Path(__file__).parents[1] / "data" / "liability_cases"
NOTHING_READ = Reading(scheme="", ok=True, confidence=Confidence.INFERRED)


def rows(*names: str) -> list[dict[str, str]]:
    found = []
    for name in names:
        with (CASES / f"{name}.csv").open(encoding="utf-8", newline="") as lines:
            found += [row | {"place": f"{name}:{i}"} for i, row in enumerate(csv.DictReader(lines), start=2)]
    return found


COLLECTED = rows("at_the_centre", "bystanders")
ADDED = rows("added")


def name_of(row: dict[str, str]) -> str:
    return f"{row['rule']}-{row['place']}"


def findings_of(row: dict[str, str], *, is_closed: bool) -> list[Finding]:
    fragments = [part for part in (row["smiles"], row["partner"]) if part]
    found = find_liabilities(
        reading=NOTHING_READ, fragments=fragments, profile=a_profile(row["facts"], is_closed=is_closed)
    )
    return [f for f in found if row["rule"] in (f.rule_id, *f.also)]


def parts(smiles: str) -> Counter[str]:
    return Counter(Chem.CanonSmiles(part) for part in smiles.split("."))


@pytest.mark.parametrize("row", [r for r in COLLECTED + ADDED if r["silent_by"] == "fires"], ids=name_of)
def test_a_positive_fires_for_certain_with_its_side_product(row: dict[str, str]) -> None:
    found = findings_of(row, is_closed=True)
    assert found, "silent"
    assert not found[0].is_uncertain
    if row["side_product"]:
        expected = parts(row["side_product"])
        assert any(expected <= parts(s) for s in found[0].side_products), found[0].side_products


@pytest.mark.parametrize("row", [r for r in COLLECTED if r["silent_by"] == "fires"], ids=name_of)
def test_a_positive_fires_whatever_else_is_unknown(row: dict[str, str]) -> None:
    found = findings_of(row, is_closed=False)
    assert found
    assert not found[0].is_uncertain


@pytest.mark.parametrize("row", [r for r in COLLECTED + ADDED if r["silent_by"] == "motif"], ids=name_of)
def test_a_near_miss_does_not_hold_the_motif(row: dict[str, str]) -> None:
    assert get_rule(row["rule"]).find_motif(Chem.MolFromSmiles(row["smiles"])) == ()


@pytest.mark.parametrize("row", [r for r in COLLECTED + ADDED if r["silent_by"] == "conditions"], ids=name_of)
def test_a_condition_miss_stays_silent(row: dict[str, str]) -> None:
    assert findings_of(row, is_closed=True) == []
    rule = get_rule(row["rule"])
    if rule.motifs:
        assert rule.find_motif(Chem.MolFromSmiles(row["smiles"])), "silent for want of the motif, not the conditions"


def test_every_rule_has_a_positive_and_a_miss() -> None:
    fires = {r["rule"] for r in COLLECTED + ADDED if r["silent_by"] == "fires"}
    silent = {r["rule"] for r in COLLECTED + ADDED if r["silent_by"] != "fires"}
    ids = {rule.rule_id for rule in all_rules()}
    assert ids - fires == set()
    assert ids - silent == set()
