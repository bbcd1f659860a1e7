"""House rules: liabilities that this group wrote down itself, in the same language as the shipped ones.

It owns a rule's checks before it is accepted, its trial on the whole book, and its findings. Keeping rules is the
store's business. A rule is a motif (SMARTS, optional) and a condition line (`kb.assess.predicate`), with the
group's words. Where the step is the loss of a group and the stated product lacks the motif, its loss is what is wanted
and the rule is silent.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kb.assess.predicate import parse_predicate
from kb.assess.record_view import RecordView
from kb.assess.table import WORDS
from kb.errors import QueryError
from kb.record.finding import Finding
from kb.store.derivation import Account
from kb.store.values import HouseRule
from kb.vocabulary import Fate, FindingKind, Severity, Verdict

Told = Callable[[str, NDArray[np.intp]], NDArray[np.int8]]


def check_rule(rule: HouseRule) -> None:
    """Refuse a rule whose motif or condition line cannot be used.

    Raises:
        QueryError: what is wrong with which part.
    """
    parse_predicate(rule.when)
    if rule.motif:
        _query(rule.motif)


@dataclass(frozen=True, slots=True, kw_only=True)
class RuleTrial:
    """A rule tried on the whole book.

    Attributes:
        hits: codes of failed runs that it warns of.
        false_alarms: codes of runs that worked and that it warns of.
        undecided: codes where the verdict or the conditions do not say.
        failures_in_book: how many runs failed in all.
    """

    hits: tuple[str, ...]
    false_alarms: tuple[str, ...]
    undecided: tuple[str, ...]
    failures_in_book: int


def find_house_rules(rules: Sequence[HouseRule], account: Account, view: RecordView) -> tuple[Finding, ...]:
    """Return the findings of the rules in force that fit a plan."""
    findings = []
    for rule in rules:
        if rule.is_retired:
            continue
        answer = parse_predicate(rule.when).evaluate(account.profile)
        if answer is False:
            continue
        where = _where(rule, account, view)
        if where is None:
            continue
        component, atoms = where
        unsure = " Cannot tell for sure: not everything is recorded." if answer is None else ""
        severity = rule.severity
        if answer is None and severity is Severity.SERIOUS:
            severity = Severity.CAUTION
        findings.append(
            Finding(
                rule_id=f"house:{rule.rule_id}",
                kind=FindingKind.HOUSE_RULE,
                severity=severity,
                title=rule.title,
                why=f"{rule.why or 'A rule of this group.'}{unsure}",
                component=component,
                atoms=atoms,
                source=f"house rule by {rule.author}" + (f"; {rule.source}" if rule.source else ""),
                is_uncertain=answer is None,
            )
        )
    return tuple(findings)


def try_rule(rule: HouseRule, view: RecordView, told: Told | None = None) -> RuleTrial:
    """Try a rule on every standing run of the book.

    Args:
        told: what a condition line says of some rows (see `RecordView.told`), where many lines are asked; None = ask
            the view.
    """
    rows = np.asarray(view.rows_with_motif(rule.motif) if rule.motif else np.arange(len(view.table)), dtype=np.intp)
    if told is not None:
        answer = told(rule.when, rows)
    else:
        answer = view.told(("house", rule.when), parse_predicate(rule.when).evaluate, rows)
    verdict, words = view.table.words["verdict"], WORDS["verdict"]
    failed, partly = (words.index(word) for word in (Verdict.FAILED, Verdict.PARTLY))
    said = verdict[rows]
    is_open = (answer < 0) | ((answer > 0) & (said < 0))
    is_hit = (answer > 0) & ((said == failed) | ((said == partly) & view.has_failure[rows]))
    is_alarm = (answer > 0) & ~is_open & ~is_hit

    def codes(which: NDArray[np.bool_]) -> tuple[str, ...]:
        return tuple(view.table.codes[row] for row in rows[which].tolist())

    return RuleTrial(
        hits=codes(is_hit),
        false_alarms=codes(is_alarm),
        undecided=codes(is_open),
        failures_in_book=int((verdict == failed).sum()),
    )


def _where(rule: HouseRule, account: Account, view: RecordView) -> tuple[int | None, tuple[int, ...]] | None:
    if not rule.motif:
        return None, ()
    query = _query(rule.motif)
    wanted = [mol for smiles in account.products if (mol := view.mol(smiles)) is not None]
    for component, smiles in enumerate(account.fragments):
        mol = view.mol(smiles)
        matches = mol.GetSubstructMatches(query) if mol is not None else ()
        if not matches:
            continue
        is_meant = account.reading.fate is Fate.GROUP_LOSS and sum(_count(query, m) for m in wanted) < len(matches)
        if not (wanted and is_meant):
            return component, tuple(matches[0])
    return None


def _count(query: Any, mol: Any) -> int:
    return len(mol.GetSubstructMatches(query))


def _query(smarts: str) -> Any:
    from rdkit import Chem

    query = Chem.MolFromSmarts(smarts)
    if query is None:
        raise QueryError(f"The motif {smarts!r} is no SMARTS.", "Check brackets and ring closures.", smarts)
    return query
