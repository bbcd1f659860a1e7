"""The whole check of one plan: read, compare, estimate, warn, advise; in one place so that the order is plain.

It owns the order and the handing-over; each judgement is made in its own file. Findings come out most severe first.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from kb.assess.advice import advise, is_barred
from kb.assess.caution import drop_told, find_cautions
from kb.assess.data_findings import ABOVE_BOILING, find_data_findings
from kb.assess.disagreement import word_disagreement
from kb.assess.endangered import Endangered, find_endangered
from kb.assess.estimate import NAMED, estimate
from kb.assess.evidence import with_evidence
from kb.assess.house_rules import HouseRule, find_house_rules
from kb.assess.liability import find_liabilities
from kb.assess.low_yield import find_low_yield
from kb.assess.pace import expect_half_life
from kb.assess.precedent import compare, rank_precedents, word_precedents
from kb.assess.published import PublishedEstimate, published_estimate
from kb.assess.ranking import best_rows
from kb.assess.record_view import RecordView
from kb.assess.resemblance import find_resemblances
from kb.assess.stereo_findings import find_stereo_findings
from kb.assess.table import FactTable, one_row
from kb.assess.wanted_product import word_wanted_product
from kb.assess.yields import YieldFit, fit_yield
from kb.record.assessment import Assessment, Estimate
from kb.record.finding import Finding
from kb.record.plan import Plan
from kb.store.derivation import Account, account_of_plan
from kb.vocabulary import Fate, FindingKind, Role

NEAREST = 1500
"""Runs against which the findings of a changed plan are made anew."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Comparison:
    """A plan beside every run of a view.

    Attributes:
        row: the plan's facts, a table of one row.
        parts: likeness per part (n each).
        similarity: of each run (n); zeros where no centre was read.
        endangered: who holds which endangered group.
    """

    row: FactTable
    parts: dict[str, NDArray[np.float64]]
    similarity: NDArray[np.float64]
    endangered: Endangered


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
    compared = compare_with_record(account, view, rest)
    published = _published(account, plan)
    expected, fit = estimate_plan(account, view, compared, published)
    findings = find_findings(plan, account, view, compared, house_rules, published, fit)
    row, parts, similarity = compared.row, compared.parts, compared.similarity
    near = _Near(view, compared, house_rules)
    return Assessment(
        plan=plan,
        reading=account.reading,
        findings=findings,
        estimate=expected,
        precedents=word_precedents(row, view.table, rank_precedents(similarity, top), parts, similarity),
        advice=advise(
            plan, account, view, parts, similarity, wanted_fate(account), published.step, findings, near.serious_of
        ),
    )


class _Near:
    """The runs nearest to a plan, against which changed plans are checked anew."""

    def __init__(self, view: RecordView, compared: Comparison, house_rules: Sequence[HouseRule]) -> None:
        self._view = view
        self._compared = compared
        self._house_rules = house_rules

    @cached_property
    def view(self) -> RecordView:
        """Return the NEAREST runs; all of them in a small book."""
        if len(self._view.table) <= NEAREST:
            return self._view
        keep = np.zeros(len(self._view.table), dtype=bool)
        keep[best_rows(self._compared.similarity, NEAREST)] = True
        return self._view.only(keep)

    def serious_of(self, plan: Plan) -> frozenset[str]:
        """Return the ids of the findings of a plan that no advice may raise."""
        account = account_of_plan(plan)
        compared = compare_with_record(account, self.view)
        nothing_published = PublishedEstimate()  # it makes no serious finding
        findings = find_findings(plan, account, self.view, compared, self._house_rules, nothing_published, None)
        return frozenset(f.rule_id for f in findings if is_barred(f))


def compare_with_record(account: Account, view: RecordView, rest: NDArray[np.float64] | None = None) -> Comparison:
    """Compare what was read of a plan with every run."""
    row = one_row(account.facts)
    endangered = find_endangered(account, view)
    parts, similarity = compare(row, view.table, rest, endangered.differences())
    if account.reading.centre is None:
        similarity = np.zeros(len(view.table))
    return Comparison(row=row, parts=parts, similarity=similarity, endangered=endangered)


def wanted_fate(account: Account) -> Fate | None:
    """Return the fate that a plan is after; None where it does not say."""
    wanted = account.reading.fate
    if wanted is None and account.profile.nucleophile_class is not None:
        wanted = Fate.SUBSTITUTION  # no product stated, but a nucleophile was brought
    return wanted


def estimate_plan(
    account: Account, view: RecordView, compared: Comparison, published: PublishedEstimate
) -> tuple[Estimate, YieldFit | None]:
    """Return what to expect, and the fit behind its yield."""
    similarity = compared.similarity
    no_number = "" if published.fates else published.note
    expected = estimate(similarity, view.table, dict(published.fates), no_number, dict(published.of_what_reacts))
    wanted = wanted_fate(account)
    share = next((interval.mean for fate, interval in expected.fates if fate is wanted), None)
    if share is None and expected.fates and wanted is not None:
        share = 0.0
    held = (compared.endangered.mine, compared.endangered.runs)
    fit = fit_yield(compared.row, view, similarity, share, held)
    words = word_disagreement(view, similarity, expected.fates[0][0]) if expected.fates else ""
    return (
        dataclasses.replace(
            expected,
            yield_pct=fit.yield_pct if fit else None,
            yield_runs=tuple(view.table.codes[row] for row in fit.rows[:NAMED]) if fit else (),
            published=published.as_lines() if published.fates else (),
            alkenes=published.among_alkenes() if published.fates else (),
            note=" ".join(filter(None, (expected.note, word_wanted_product(view, similarity, wanted), words))),
            half_life_h=expect_half_life(published.half_life_h, view, similarity),
        ),
        fit,
    )


def _published(account: Account, plan: Plan) -> PublishedEstimate:
    base = next((c.smiles for c in plan.conditions.components if c.role is Role.BASE and c.smiles), None)
    return published_estimate(account.reading, account.facts.substrate or "", account.profile, base)


def find_findings(
    plan: Plan,
    account: Account,
    view: RecordView,
    compared: Comparison,
    house_rules: Sequence[HouseRule],
    published: PublishedEstimate,
    fit: YieldFit | None,
) -> tuple[Finding, ...]:
    """Return everything that a check reports of a plan, most severe first."""
    conditions = plan.conditions
    others = [c.smiles for c in conditions.components if c.smiles] + [s.smiles for s in conditions.solvents if s.smiles]
    liabilities = [
        with_evidence(f, compared.row, view)
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
        compared.row,
        compared.parts,
        compared.similarity,
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
    told_by_pressure = any(c.rule_id == "hazard-pressure" for c in cautions)
    return sort_findings(
        [
            *drop_told(liabilities, cautions),
            *resemblances,
            *find_low_yield(
                fit, view, compared.similarity, centre.component if centre else None, centre.atom if centre else None
            ),
            *find_house_rules(house_rules, account, view),
            *cautions,
            *find_stereo_findings(account, published, {f.rule_id for f in liabilities}),
            *(f for f in find_data_findings(plan, account) if f.rule_id != ABOVE_BOILING or not told_by_pressure),
        ]
    )


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
