"""What is missing, impossible or at odds with itself; every branch, with the case beside it that must stay silent."""

from __future__ import annotations

import dataclasses

import pytest

from kb.assess.data_findings import find_data_findings, find_outcome_findings
from kb.book.plan_words import plan_from_words
from kb.record.component import Component
from kb.record.finding import Finding
from kb.record.outcome import Outcome, ProductSeen
from kb.store.derivation import account_of_plan
from kb.vocabulary import Fate, FindingKind, Role, Severity

GOOD = {"scheme": "CCCBr", "reagents": "NaN3", "solvents": "DMF", "temperature": "60 °C"}


def found(**words: object) -> dict[str, Finding]:
    plan = plan_from_words(GOOD | words)
    return {f.rule_id: f for f in find_data_findings(plan, account_of_plan(plan))}


def test_a_complete_plan_has_nothing_to_say() -> None:
    assert found() == {}


@pytest.mark.parametrize(
    ("words", "rule", "part", "why"),
    [
        ({"temperature": None}, "data:no-temperature", "No temperature", "rules cannot be told"),
        ({"solvents": None}, "data:no-solvent", "Solvent", "the medium decides much"),
        ({"scheme": "no structure at all"}, "data:not-read", "not read", "nothing could be compared"),
        ({"scheme": "CCCCCC"}, "data:not-read", "not read", "no centre"),
    ],
)
def test_what_is_missing_is_said(words: dict[str, object], rule: str, part: str, why: str) -> None:
    findings = found(**words)
    assert rule in findings, why
    assert part in findings[rule].title
    assert findings[rule].kind is FindingKind.DATA


def test_a_reagent_that_nobody_knows_is_said() -> None:
    plan = plan_from_words(GOOD)
    powder = Component(role=Role.ADDITIVE, name="white powder from drawer 3")
    conditions = dataclasses.replace(plan.conditions, components=(*plan.conditions.components, powder))
    plan = dataclasses.replace(plan, conditions=conditions)
    findings = {f.rule_id for f in find_data_findings(plan, account_of_plan(plan))}
    assert findings == {"data:unknown-reagent"}


@pytest.mark.parametrize(
    ("words", "is_said", "why"),
    [
        # tetrahydrofuran boils at 66 degC and DMSO freezes at 18.5 degC (CRC Handbook; the solvent table is tested)
        ({"solvents": "THF", "temperature": "90 °C"}, True, "24 K above it, vessel not said"),
        ({"solvents": "THF", "temperature": "90 °C", "vessel": "flask with condenser"}, True, "open vessel"),
        ({"solvents": "THF", "temperature": "90 °C", "vessel": "sealed tube"}, False, "that is what the tube is for"),
        ({"solvents": "THF", "temperature": "60 °C"}, False, "below it"),
        ({"solvents": "THF", "temperature": "reflux"}, False, "reflux is the boiling point"),
    ],
)
def test_above_the_boiling_point_in_an_open_vessel(words: dict[str, object], is_said: bool, why: str) -> None:
    findings = found(**words)
    assert ("data:above-boiling-point" in findings) is is_said, why
    if is_said:
        assert findings["data:above-boiling-point"].severity is Severity.CAUTION
        assert "66 °C" in findings["data:above-boiling-point"].why


def test_an_open_vessel_and_one_not_said_are_told_apart() -> None:
    hot = {"solvents": "THF", "temperature": "90 °C"}
    assert "In an open vessel" in found(**hot, vessel="open flask")["data:above-boiling-point"].why
    assert "Unless the vessel is closed" in found(**hot)["data:above-boiling-point"].why


@pytest.mark.parametrize(
    ("words", "is_said", "why"),
    [
        ({"solvents": "DMSO", "temperature": "0 °C"}, True, "frozen"),
        ({"solvents": "DMSO", "temperature": "0 °C to rt"}, True, "frozen when it starts"),
        ({"solvents": "DMSO", "temperature": "25 °C"}, False, "liquid"),
        (
            {"solvents": ["DMSO", "THF"], "temperature": "0 °C"},
            False,
            "a mixture freezes lower, and nobody knows where",
        ),
    ],
)
def test_below_the_melting_point(words: dict[str, object], is_said: bool, why: str) -> None:
    assert ("data:below-melting-point" in found(**words)) is is_said, why


@pytest.mark.parametrize(
    ("words", "is_said", "left"),
    [
        ({"acids": "TFA", "bases": "K2CO3"}, True, "trifluoroacetic acid and potassium carbonate"),
        ({"acids": "HCl", "bases": "Et3N"}, True, "triethylamine"),
        ({"acids": "HCl"}, False, ""),
        ({"bases": "Et3N"}, False, ""),
    ],
)
def test_acid_and_base_in_one_flask(words: dict[str, object], is_said: bool, left: str) -> None:
    findings = found(reagents=None, **words)
    assert ("data:acid-and-base" in findings) is is_said
    if is_said:
        assert left in findings["data:acid-and-base"].why


def outcome(**shares: float) -> Outcome:
    return Outcome(products=tuple(ProductSeen(fate=Fate(f), share=x) for f, x in shares.items()))


@pytest.mark.parametrize(
    ("shares", "is_said", "why"),
    [
        ({"substitution": 0.9, "elimination": 0.3}, True, "120 %"),
        ({"substitution": 0.5}, True, "half is missing"),
        ({"substitution": 0.9, "elimination": 0.09}, False, "within what an integral is worth"),
        ({}, False, "nothing measured"),
    ],
)
def test_a_split_that_does_not_add_up(shares: dict[str, float], is_said: bool, why: str) -> None:
    findings = [f.rule_id for f in find_outcome_findings(outcome(**shares))]
    assert ("data:split-sum" in findings) is is_said, why


@pytest.mark.parametrize(("yield_pct", "is_said"), [(120.0, True), (100.0, False), (None, False)])
def test_a_yield_over_a_hundred_is_kept_and_said(yield_pct: float | None, is_said: bool) -> None:
    findings = [f.rule_id for f in find_outcome_findings(Outcome(isolated_yield_pct=yield_pct))]
    assert ("data:yield-over-100" in findings) is is_said


def test_every_finding_about_data_names_its_source() -> None:
    said = [*found(temperature=None, solvents=None).values(), *find_outcome_findings(outcome(substitution=0.5))]
    assert said
    assert all(f.source for f in said)
