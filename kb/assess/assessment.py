"""The whole check of one plan: read, compare, estimate, warn, advise; in one place so that the order is plain.

It owns the order and the handing-over; each judgement is made in its own file. Findings come out most severe first.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from kb.assess.advice import advise, temperature_band
from kb.assess.caution import find_cautions
from kb.assess.data_findings import find_data_findings
from kb.assess.estimate import estimate
from kb.assess.evidence import count_evidence, weighed_severity, word_evidence
from kb.assess.house_rules import HouseRule, find_house_rules
from kb.assess.liability import all_rules, find_liabilities, get_rule
from kb.assess.precedent import compare, rank_precedents, word_precedents
from kb.assess.published import published_estimate
from kb.assess.record_view import RecordView
from kb.assess.resemblance import find_resemblances
from kb.assess.table import FactTable, one_row
from kb.record.assessment import Advice, Assessment, Estimate
from kb.record.finding import Finding
from kb.record.plan import Plan
from kb.store.derivation import Account, account_of_plan
from kb.vocabulary import Fate, FindingKind, Role, Severity


def assess(
    plan: Plan,
    view: RecordView,
    house_rules: Sequence[HouseRule] = (),
    rest: NDArray[np.float64] | None = None,
    top: int = 5,
    account: Account | None = None,
) -> Assessment:
    """Check a plan.

    Args:
        plan: to check.
        view: the runs that may speak.
        house_rules: of the group, those in force.
        rest: whole-molecule Tanimoto of each run's substrate to the plan's (n); None = not computed.
        top: how many precedents.
        account: the plan already read; None = read here.

    Returns:
        The assessment. A scheme that cannot be read still gets the findings about its mixture.
    """
    account = account or account_of_plan(plan)
    row = one_row(account.facts)
    parts, similarity = compare(row, view.table, rest, risk_differences(account, view))
    if account.reading.centre is None:
        similarity = np.zeros(len(view.table))
    findings = _findings(account, plan, view, parts, house_rules)
    return Assessment(
        plan=plan,
        reading=account.reading,
        findings=findings,
        estimate=_estimate(account, plan, view, similarity),
        precedents=word_precedents(row, view.table, rank_precedents(similarity, top), parts, similarity),
        advice=_advice(account, row, view, parts),
    )


def risk_differences(account: Account, view: RecordView) -> NDArray[np.float64]:
    """Count, for each run, the groups endangered by the plan's conditions that stand in only one of the two (n).

    Only serious liabilities of bystanders count: a run that lost a group which the plan does not have says little about
    the plan, and a run without the group that the plan puts at risk says less still.
    """
    differences = np.zeros(len(view.table))
    mols = [mol for smiles in account.fragments if (mol := view.mol(smiles)) is not None]
    for rule in all_rules():
        if rule.side != "bystander" or rule.severity is not Severity.SERIOUS:
            continue
        if rule.applies(account.profile) is not True:
            continue
        holds = np.zeros(len(view.table), dtype=bool)
        for smarts in rule.motifs:
            holds[view.rows_with_motif(smarts)] = True
        differences += holds != any(rule.find_motif(mol) for mol in mols)
    return differences


def _estimate(account: Account, plan: Plan, view: RecordView, similarity: NDArray[np.float64]) -> Estimate:
    base = next((c.smiles for c in plan.conditions.components if c.role is Role.BASE and c.smiles), None)
    published = published_estimate(account.reading, account.facts.substrate or "", account.profile, base)
    prior = {fate: interval.mean for fate, interval in published.fates}
    scatter = None
    if published.fates:
        main = published.fates[0][1]
        scatter = max((main.high - main.low) / 2.56, 0.02)  # 80 % interval of a normal is 2.56 sd wide
    return estimate(similarity, view.table, prior, scatter, published.note if not published.fates else "")


def _findings(
    account: Account,
    plan: Plan,
    view: RecordView,
    parts: dict[str, NDArray[np.float64]],
    house_rules: Sequence[HouseRule],
) -> tuple[Finding, ...]:
    others = [part.smiles for part in (*plan.conditions.components, *plan.conditions.solvents) if part.smiles]
    liabilities = [
        _with_evidence(f, account, view)
        for f in find_liabilities(
            reading=account.reading,
            fragments=account.fragments,
            profile=account.profile,
            product=".".join(account.products) or None,
            others=others,
        )
    ]
    covered = [frozenset(f.atoms) for f in liabilities if f.evidence and f.evidence.lost]
    centre = account.reading.centre
    resemblances = find_resemblances(
        view,
        parts,
        account.profile,
        account.fragments,
        (centre.component, centre.atom) if centre else None,
        covered,
        account.products,
    )
    cautions = find_cautions(
        reading=account.reading,
        fragments=account.fragments,
        profile=account.profile,
        conditions=plan.conditions,
        products=account.products,
    )
    own = find_house_rules(house_rules, account, view)
    data = find_data_findings(plan, account)
    return sort_findings([*liabilities, *resemblances, *own, *cautions, *data])


def sort_findings(findings: Sequence[Finding]) -> tuple[Finding, ...]:
    """Sort most severe first; of one severity those with recorded losses first, then by kind."""
    kinds = (
        FindingKind.LIABILITY,
        FindingKind.RESEMBLANCE,
        FindingKind.HOUSE_RULE,
        FindingKind.CAUTION,
        FindingKind.DATA,
    )

    def key(finding: Finding) -> tuple[int, int, int, int]:
        lost = finding.evidence.lost if finding.evidence else 0
        return (-finding.severity.rank, -lost, kinds.index(finding.kind), int(finding.is_uncertain))

    return tuple(sorted(findings, key=key))


def _with_evidence(finding: Finding, account: Account, view: RecordView) -> Finding:
    """Put the book's evidence beside a liability of a motif, and let it speak for the severity."""
    import dataclasses

    rule = get_rule(finding.rule_id)
    if rule.side != "bystander" or not len(view.table):
        return finding
    holding = sorted({int(r) for smarts in rule.motifs for r in view.rows_with_motif(smarts)})
    rows = [r for r in holding if rule.applies(view.profile(r)) is True]
    lost, survived = count_evidence(view, rows, rule.find_motif)
    evidence = word_evidence(view, lost, survived, account.profile.temperature_c)
    severity = weighed_severity(finding.severity, evidence) if not finding.is_uncertain else finding.severity
    return dataclasses.replace(finding, evidence=evidence, severity=severity)


def _advice(
    account: Account, row: FactTable, view: RecordView, parts: dict[str, NDArray[np.float64]]
) -> tuple[Advice, ...]:
    wanted = account.reading.fate
    if wanted is None and account.profile.nucleophile_class is not None:
        wanted = Fate.SUBSTITUTION  # no product stated, but a nucleophile was brought
    if wanted is None or wanted in (Fate.UNREACTED, Fate.OTHER) or not len(view.table):
        return ()

    def temperature(r: int) -> str | None:
        return temperature_band(row.number("temperature_c", 0) if r < 0 else view.table.number("temperature_c", r))

    def solvent(r: int) -> str | None:
        profile = account.profile if r < 0 else view.profile(r)
        classes = sorted(profile.solvent_classes)
        return "/".join(classes).replace("_", " ") or None

    def base(r: int) -> str | None:
        profile = account.profile if r < 0 else view.profile(r)
        if profile.has_unknown_reagent and profile.base_name is None:
            return None
        return profile.base_name or "no base"

    return advise(row, view.table, parts, wanted, {"temperature": temperature, "base": base, "solvent": solvent})
