"""Wanted and unwanted loss under one word: the share of the product drawn. Runs are invented."""

from __future__ import annotations

import numpy as np
from tables_by_hand import facts, table_of, view_of

from kb.assess.record_view import RecordView
from kb.assess.wanted_product import shares_of, word_wanted_product
from kb.materials.profile import ConditionProfile
from kb.record.outcome import Outcome, ProductSeen
from kb.record.run import Run
from kb.vocabulary import Fate

SCHEME = "CC(C)(C)OC(=O)N1CCC(OC(C)(C)C)CC1>>CC(C)(C)OC1CCNCC1"
DRAWN, ASIDE = "CC(C)(C)OC1CCNCC1", "OC1CCNCC1"


def run(drawn: float, aside: float, *, with_structures: bool = True) -> Run:
    seen = [
        ProductSeen(fate=Fate.GROUP_LOSS, smiles=smiles if with_structures else None, share=share)
        for smiles, share in ((DRAWN, drawn), (ASIDE, aside))
        if share
    ]
    left = ProductSeen(fate=Fate.UNREACTED, share=round(1 - drawn - aside, 6))
    return Run(scheme=SCHEME, outcome=Outcome(products=(*seen, left)))


def view(*runs: Run) -> RecordView:
    rows = [(facts(), {"group-loss": 0.97, "unreacted": 0.03}, None, None) for _ in runs]
    stored = [Run(scheme=r.scheme, outcome=r.outcome, code=f"R-{i + 1}") for i, r in enumerate(runs)]
    return view_of(table_of(*rows), [ConditionProfile()] * len(runs), [()] * len(runs), stored)


def test_a_run_tells_the_product_drawn_from_another_that_lost_more() -> None:
    assert shares_of(run(0.15, 0.83), Fate.GROUP_LOSS) == (0.15, 0.83)
    assert shares_of(run(0.97, 0.0), Fate.GROUP_LOSS) == (0.97, 0.0)


def test_a_run_without_structures_does_not_say() -> None:
    assert shares_of(run(0.15, 0.83, with_structures=False), Fate.GROUP_LOSS) is None
    silent = view(run(0.15, 0.83, with_structures=False))
    assert word_wanted_product(silent, np.ones(1), Fate.GROUP_LOSS) == ""


def test_the_share_of_the_product_drawn_is_said_with_an_interval_and_its_runs() -> None:
    said = word_wanted_product(view(run(0.15, 0.83), run(0.25, 0.72)), np.ones(2), Fate.GROUP_LOSS)
    assert "that alone 20 %" in said
    assert "(R-1, R-2)" in said
    assert "lost another group as well" in said


def test_nothing_is_said_where_the_split_says_it_all() -> None:
    assert word_wanted_product(view(run(0.97, 0.0), run(0.95, 0.02)), np.ones(2), Fate.GROUP_LOSS) == ""


def test_nothing_is_said_of_another_fate_or_of_runs_far_from_the_plan() -> None:
    both = view(run(0.15, 0.83), run(0.25, 0.72))
    assert word_wanted_product(both, np.ones(2), Fate.SUBSTITUTION) == ""
    assert word_wanted_product(both, np.full(2, 0.46), Fate.GROUP_LOSS) == ""
    assert word_wanted_product(both, np.ones(2), None) == ""


def test_runs_that_disagree_give_a_wide_interval() -> None:
    import re

    def width(*runs: Run) -> int:
        said = word_wanted_product(view(*runs), np.ones(len(runs)), Fate.GROUP_LOSS)
        low, high = re.findall(r"\((\d+) to (\d+)\)", said)[0]
        return int(high) - int(low)

    agreeing = [run(0.48, 0.5), run(0.5, 0.48), run(0.52, 0.46)]
    torn = [run(0.08, 0.9), run(0.5, 0.48), run(0.92, 0.06)]
    assert width(*torn) > 1.5 * width(*agreeing)
