"""Liabilities on real reactions: quiet where a sensitive group survived, loud where acid took it.

Source: `tests/data/patent_reactions.csv`, extracted from US patents by D. M. Lowe (CC0); what happened follows from
its atom maps. The 380 `other` rows are steps in which a sensitive group survived; `acid_deprotection` rows of high
confidence lost theirs to a named acid. The limits are those of issue 2 of this project.
"""

from __future__ import annotations

import csv
from functools import lru_cache
from pathlib import Path

import pytest

from kb.assess.liability import find_liabilities, get_rule
from kb.record.finding import Finding
from kb.record.plan import Plan
from kb.store.derivation import Account, account_of_plan
from kb.vocabulary import Severity

REACTIONS = Path(__file__).parents[1] / "data" / "patent_reactions.csv"
needs_reactions = pytest.mark.skipif(not REACTIONS.exists(), reason="patent_reactions.csv is not in tests/data")


@lru_cache(maxsize=1)
def rows() -> tuple[dict[str, str], ...]:
    with REACTIONS.open(encoding="utf-8", newline="") as lines:
        return tuple(csv.DictReader(line for line in lines if not line.startswith("#")))


@lru_cache(maxsize=1024)
def account_of(scheme: str) -> Account:
    return account_of_plan(Plan(scheme=scheme))


def serious_losses(account: Account, *, ignore_intention: bool) -> list[Finding]:
    found = find_liabilities(
        reading=account.reading,
        fragments=account.fragments,
        profile=account.profile,
        product=".".join(account.products) or None,
        ignore_intention=ignore_intention,
    )
    return [
        f for f in found if f.severity is Severity.SERIOUS and get_rule(f.rule_id).side in ("bystander", "anywhere")
    ]


@needs_reactions
def test_where_a_sensitive_group_survived_a_serious_warning_is_rare() -> None:
    accounts = [account_of(r["rxn_smiles_unmapped"]) for r in rows() if r["kind"] == "other"]
    known = [a for a in accounts if not a.profile.has_unknown_reagent]
    alarms = [a for a in known if serious_losses(a, ignore_intention=False)]
    assert len(accounts) == 380
    assert len(known) >= 300
    assert len(alarms) / len(known) <= 0.03, f"{len(alarms)} of {len(known)}"


@needs_reactions
def test_where_a_named_acid_took_a_group_off_it_is_warned_of() -> None:
    lost = [r for r in rows() if r["kind"] == "acid_deprotection" and r["confidence"] == "high" and r["acid"]]
    accounts = [account_of(r["rxn_smiles_unmapped"]) for r in lost]
    warned = [a for a in accounts if serious_losses(a, ignore_intention=True)]
    assert len(lost) >= 100
    assert len(warned) / len(lost) >= 0.97, f"{len(warned)} of {len(lost)}"


@needs_reactions
def test_the_group_that_is_meant_to_go_is_no_worry() -> None:
    lost = [r for r in rows() if r["kind"] == "acid_deprotection" and r["confidence"] == "high" and r["acid"]]
    accounts = [account_of(r["rxn_smiles_unmapped"]) for r in lost]
    worried = [a for a in accounts if serious_losses(a, ignore_intention=False)]
    assert len(worried) / len(lost) <= 0.06, f"{len(worried)} of {len(lost)}"
