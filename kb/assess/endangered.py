"""Which groups the plan's conditions endanger, and which of the plan and the runs hold them.

It owns that table of who holds what. Only serious liabilities of bystanders count: a run that lost a group which the
plan does not have says little about the plan, and a run without the group that the plan puts at risk says less still.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from kb.assess.liability import all_rules
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
    mine: list[bool] = []
    runs: list[NDArray[np.bool_]] = []
    for rule in all_rules():
        if rule.side != "bystander" or rule.severity is not Severity.SERIOUS:
            continue
        if rule.applies(account.profile) is not True:
            continue
        held = _holding(view, rule.rule_id, rule.motifs)
        is_mine = any(rule.find_motif(mol) for mol in mols)
        if is_mine or held.any():
            mine.append(is_mine)
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
