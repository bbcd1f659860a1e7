"""Which groups the plan's conditions endanger, and which of the plan and the runs hold them.

It owns that table of who holds what. Only serious liabilities of bystanders count: a run that lost a group which the
plan does not have says little about the plan, and a run without the group that the plan puts at risk says less still.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

from kb.assess.liability import all_rules
from kb.assess.liability_rule import Rule
from kb.assess.record_view import RecordView
from kb.store.derivation import Account
from kb.vocabulary import Severity


@dataclass(frozen=True, slots=True, kw_only=True)
class Endangered:
    """k groups that the conditions endanger.

    Attributes:
        mine: which the plan holds (k) bool.
        runs: which each run holds (k, n) bool.
    """

    mine: NDArray[np.bool_]
    runs: NDArray[np.bool_]

    def differences(self) -> NDArray[np.float64]:
        """Return how many groups stand in only one of plan and run (n)."""
        return np.asarray((self.runs != self.mine[:, None]).sum(axis=0), dtype=np.float64)


def find_endangered(account: Account, view: RecordView) -> Endangered:
    """Return the groups endangered by a plan's conditions that the plan or any run holds."""
    mols = [mol for smiles in account.fragments if (mol := view.mol(smiles)) is not None]
    rules = [rule for rule in _rules() if rule.applies(account.profile) is True]
    return _gathered(rules, [any(rule.find_motif(mol) for mol in mols) for rule in rules], view)


def endangered_in_run(view: RecordView, row: int) -> Endangered:
    """Return the same for a run of the book, by the structures that are indexed for it."""
    rules = [rule for rule in _rules() if view.told(("rule", rule.rule_id), rule.applies, [row])[0] == 1]
    return _gathered(rules, [bool(_holding(view, rule.rule_id, rule.motifs)[row]) for rule in rules], view)


@cache
def _rules() -> tuple[Rule, ...]:
    return tuple(r for r in all_rules() if r.side == "bystander" and r.severity is Severity.SERIOUS)


def _gathered(rules: list[Rule], is_mine: list[bool], view: RecordView) -> Endangered:
    mine: list[bool] = []
    runs: list[NDArray[np.bool_]] = []
    for rule, holds in zip(rules, is_mine, strict=True):
        held = _holding(view, rule.rule_id, rule.motifs)
        if holds or held.any():
            mine.append(holds)
            runs.append(held)
    table = np.array(runs) if runs else np.zeros((0, len(view.table)), dtype=bool)
    return Endangered(mine=np.array(mine, dtype=bool), runs=table)


def _holding(view: RecordView, rule_id: str, motifs: tuple[str, ...]) -> NDArray[np.bool_]:
    key = ("holds", rule_id)
    if key not in view.memory:
        holds = np.zeros(len(view.table), dtype=bool)
        for smarts in motifs:
            holds[view.rows_with_motif(smarts)] = True
        view.memory[key] = holds
    held: NDArray[np.bool_] = view.memory[key]
    return held
