"""Every figure of a check rests on runs that it names or on a source, over the demo book's own plans.

The runs are invented; the test asks for what must hold of any book: nothing is said on nothing.
"""

from __future__ import annotations

import re

import pytest

from kb.assess.assessment import assess
from kb.assess.record_view import RecordView
from kb.cli.render_assessment import render_assessment
from kb.record.assessment import Assessment, Estimate
from kb.record.finding import Finding
from kb.vocabulary import Basis

EVERY = 13
CODE = re.compile(r"R-\d+")


@pytest.fixture(scope="module")
def assessments(demo_view: RecordView) -> list[Assessment]:
    return [assess(demo_view.run(row).plan, demo_view) for row in range(0, len(demo_view.table), EVERY)]


def named(estimate: Estimate) -> set[str]:
    return {code for code, _ in estimate.runs} | set(estimate.yield_runs)


def test_a_finding_names_a_source_or_every_run_that_it_counts(assessments: list[Assessment]) -> None:
    findings: list[Finding] = [f for a in assessments for f in a.findings]
    assert len(findings) > 40
    for finding in findings:
        assert finding.source or (finding.evidence is not None and finding.evidence.runs), finding.rule_id
        if finding.evidence is not None:
            assert len(finding.evidence.runs) == finding.evidence.lost + finding.evidence.survived, finding.rule_id


def test_shares_and_yields_name_the_runs_or_the_published_sources_that_carry_them(
    assessments: list[Assessment],
) -> None:
    for a in assessments:
        estimate = a.estimate
        if estimate.basis in (Basis.RECORD, Basis.BOTH):
            assert sum(weight for _, weight in estimate.runs) >= 0.9 * estimate.effective_precedents
        if estimate.basis in (Basis.PUBLISHED, Basis.BOTH):
            assert any(sentence.startswith("Sources: ") for sentence in estimate.published), a.plan.scheme
        assert estimate.basis is not Basis.NONE or not estimate.fates
        assert estimate.yield_pct is None or estimate.yield_runs
        assert estimate.half_life_h is None or estimate.published or estimate.runs
        assert bool(estimate.fates) == (estimate.basis is not Basis.NONE)


def test_advice_names_every_pair_or_a_source(assessments: list[Assessment]) -> None:
    advice = [one for a in assessments for one in a.advice]
    assert {one.basis for one in advice} == {Basis.RECORD, Basis.PUBLISHED}
    for one in advice:
        assert len(one.runs) == one.pairs
        assert (one.basis is Basis.RECORD) == bool(one.runs)
        if one.basis is Basis.PUBLISHED:
            assert one.why.startswith("Published relative rates")
            assert re.search(r"\d{4}|&|judged|common practice|CRC|textbook|compilations", one.why), one.why


def test_verbose_text_prints_what_the_figures_rest_on(assessments: list[Assessment], demo_view: RecordView) -> None:
    known = set(demo_view.table.codes)
    for a in assessments:
        text = render_assessment(a, verbose=True)
        printed = set(CODE.findall(text))
        assert printed <= known
        assert named(a.estimate) <= printed
        assert {code for f in a.findings if f.evidence for code in f.evidence.runs} <= printed
        assert {code for one in a.advice for pair in one.runs for code in pair} <= printed
        flat = " ".join(text.split())
        for finding in a.findings:
            assert finding.source == "" or "Source: " + finding.source.split()[0] in flat
