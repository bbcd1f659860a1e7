"""House rules: refused when they cannot be used, tried on the whole book, silent where the loss is wanted."""

from __future__ import annotations

import datetime as dt

import pytest
from tables_by_hand import facts, table_of, view_of

from kb.assess.house_rules import check_rule, find_house_rules, try_rule
from kb.assess.record_view import RecordView
from kb.book.plan_words import plan_from_words
from kb.errors import QueryError
from kb.materials.profile import ConditionProfile
from kb.record.finding import Finding
from kb.record.run import Run
from kb.store.derivation import account_of_plan
from kb.store.values import HouseRule
from kb.vocabulary import FindingKind, Severity

ETHER = "[CX4]OC(C)(C)C"


def rule(**changes: object) -> HouseRule:
    values = {
        "title": "No acid on our ethers",
        "motif": ETHER,
        "when": "acidity >= strong",
        "severity": Severity.SERIOUS,
        "why": "Lost three batches.",
        "author": "MK",
        "source": "R-0001",
        "rule_id": "H-1",
    }
    return HouseRule(**(values | changes))  # type: ignore[arg-type]


EMPTY = view_of(table_of(), [], [], [])


def findings(scheme: str, given: HouseRule, **words: str) -> tuple[Finding, ...]:
    return find_house_rules([given], account_of_plan(plan_from_words({"scheme": scheme, **words})), EMPTY)


def test_a_rule_fires_on_its_motif_under_its_conditions() -> None:
    (finding,) = findings("CCCOC(C)(C)C", rule(), acids="HCl", solvents="dioxane")
    assert finding.kind is FindingKind.HOUSE_RULE
    assert finding.severity is Severity.SERIOUS
    assert finding.component == 0
    assert set(finding.atoms) == {2, 3, 4, 5, 6, 7}
    assert "house rule by MK" in finding.source
    assert "R-0001" in finding.source
    assert finding.rule_id == "house:H-1"


@pytest.mark.parametrize(
    ("scheme", "words", "why"),
    [
        ("CCCOCC", {"acids": "HCl", "solvents": "dioxane"}, "no such motif"),
        ("CCCOC(C)(C)C", {"bases": "K2CO3", "solvents": "DMF"}, "no acid"),
    ],
)
def test_otherwise_it_is_silent(scheme: str, words: dict[str, str], why: str) -> None:
    assert findings(scheme, rule(), **words) == (), why


def test_a_retired_rule_is_silent() -> None:
    retired = rule(retired_at=dt.datetime(2024, 1, 1, tzinfo=dt.UTC), retired_by="MK", retired_why="superseded")
    assert findings("CCCOC(C)(C)C", retired, acids="HCl", solvents="dioxane") == ()


def test_what_the_conditions_leave_open_is_at_most_a_caution() -> None:
    (finding,) = findings("CCCOC(C)(C)C", rule(when="temperature_c >= 40"), acids="HCl", solvents="dioxane")
    assert finding.is_uncertain
    assert finding.severity is Severity.CAUTION
    assert "Cannot tell" in finding.why


def test_a_rule_without_a_motif_speaks_of_the_mixture() -> None:
    (finding,) = findings("CCCBr", rule(motif=""), acids="HCl", solvents="dioxane")
    assert finding.component is None
    assert finding.atoms == ()


def test_a_loss_that_is_wanted_is_not_warned_of() -> None:
    boc = rule(motif="NC(=O)OC(C)(C)C")
    wanted, kept = "CC(C)(C)OC(=O)NCCBr>>NCCBr", "CC(C)(C)OC(=O)NCCBr>>CC(C)(C)OC(=O)NCCI"
    assert findings(wanted, boc, acids="HCl", solvents="dioxane") == ()
    assert findings(kept, boc, acids="HCl", solvents="dioxane")


@pytest.mark.parametrize(
    ("changes", "part"),
    [({"motif": "[not smarts"}, "no SMARTS"), ({"when": "acidity >> strong"}, ""), ({"when": "import os"}, "")],
)
def test_a_rule_that_cannot_be_used_is_refused_in_a_sentence(changes: dict[str, str], part: str) -> None:
    with pytest.raises(QueryError) as refusal:
        check_rule(rule(**changes))
    assert part in str(refusal.value)


def record() -> RecordView:
    acid, plain = ConditionProfile(acidity="strong"), ConditionProfile(acidity="none")
    rows = [
        ("CCCOC(C)(C)C", acid, "failed", ()),
        ("CCOC(C)(C)C", acid, "worked", ()),
        ("CCCCOC(C)(C)C", acid, "partly", (("group-loss", None),)),
        ("CCCCOC(C)(C)C", acid, "partly", ()),
        ("CCCCOC(C)(C)C", acid, None, ()),
        ("CCCCOC(C)(C)C", ConditionProfile(), "failed", ()),
        ("CCCCOC(C)(C)C", plain, "failed", ()),
        ("CCCCBr", acid, "failed", ()),
    ]
    table = table_of(*((facts(substrate=s), {}, None, v) for s, _, v, _ in rows))
    return view_of(table, [p for _, p, _, _ in rows], [f for *_, f in rows], [Run(scheme=s) for s, *_ in rows])


def test_a_trial_counts_hits_false_alarms_and_what_cannot_be_told() -> None:
    trial = try_rule(rule(), record())
    assert trial.hits == ("R-1", "R-3")
    assert trial.false_alarms == ("R-2", "R-4")
    assert trial.undecided == ("R-5", "R-6")  # no verdict; acidity not known
    assert trial.failures_in_book == 4


def test_a_trial_without_a_motif_asks_every_run() -> None:
    trial = try_rule(rule(motif=""), record())
    assert trial.hits == ("R-1", "R-3", "R-8")
