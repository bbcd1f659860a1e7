"""Advice over the demo book's own plans: never into a serious finding, and sure changes before doubtful ones.

The runs are invented; the test asks for what must hold of any book.
"""

from __future__ import annotations

import pytest

from kb.assess import advice as advice_module
from kb.assess.advice import LEAST_IF_UNSURE, is_unsure
from kb.assess.advice_options import Option
from kb.assess.assessment import assess
from kb.assess.record_view import RecordView
from kb.record.assessment import Assessment
from kb.record.plan import Plan
from kb.vocabulary import Severity

EVERY = 21


def serious(assessment: Assessment) -> set[str]:
    """Return the kinds of the serious findings; of resemblances without the run that they are named after."""
    ids = {f.rule_id for f in assessment.findings if f.severity is Severity.SERIOUS}
    return {i.rsplit(":", 1)[0] if i.startswith("resemblance:") else i for i in ids}


def test_no_advice_raises_a_serious_finding_and_none_hides_its_doubt(
    demo_view: RecordView, monkeypatch: pytest.MonkeyPatch
) -> None:
    offered: dict[str, Plan] = {}

    def remember(options: list[Option]) -> list[Option]:
        offered.update({f"{o.word} instead of {o.here}": o.plan for o in options})
        return options

    for name in ("list_options", "leaving_group_options"):
        of = getattr(advice_module, name)
        monkeypatch.setattr(advice_module, name, lambda *given, of=of: remember(of(*given)))
    told = doubtful = 0
    for row in range(0, len(demo_view.table), EVERY):
        offered.clear()
        plan = demo_view.run(row).plan
        before = assess(plan, demo_view, top=0)
        doubts = [is_unsure(one) for one in before.advice]
        assert doubts == sorted(doubts), "sure changes come first"
        for one, after_plan in [(a, offered[a.change]) for a in before.advice]:
            told += 1
            doubtful += is_unsure(one)
            assert ("may not help" in one.why) == is_unsure(one)
            assert one.effect.mean >= LEAST_IF_UNSURE or not is_unsure(one)
            assert after_plan != plan
            assert serious(assess(after_plan, demo_view, top=0)) <= serious(before), one.change
    assert told >= 6
    assert doubtful >= 1
