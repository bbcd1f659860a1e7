"""Coverage: counts that add up, planted contradictions, and experiments chosen by the drop in variance they state."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from tables_by_hand import facts, table_of, view_of

from kb.assess.record_view import RecordView
from kb.audit.coverage import Coverage, measure_coverage, wanted_share
from kb.audit.teaching import PRIOR_RUNS, _choose
from kb.book import Book, demo_plan
from kb.materials.profile import ConditionProfile


@pytest.fixture(scope="module")
def coverage(demo: Book) -> Coverage:
    return measure_coverage(demo.view())


def test_every_run_stands_in_exactly_one_cell(coverage: Coverage, demo: Book) -> None:
    assert sum(cell.runs for cell in coverage.cells) == coverage.runs == demo.count()
    assert all(cell.measured <= cell.runs for cell in coverage.cells)
    assert coverage.thin == sum(cell.runs <= 2 for cell in coverage.cells)


def test_planted_contradictions_are_found(
    coverage: Coverage, planted: dict[str, Any], references: dict[str, str]
) -> None:
    pairs = [{c.low_run, c.high_run} for c in coverage.contradictions]
    for truth in planted["contradiction"]:
        assert {references[r] for r in truth["runs"]} in pairs


def test_best_split_is_a_run_of_that_cell(coverage: Coverage, demo: Book) -> None:
    view = demo.view()
    share = dict(zip(view.table.codes, wanted_share(view.table), strict=True))
    for cell in coverage.cells:
        if cell.best_run is not None:
            assert share[cell.best_run] == pytest.approx(cell.best, abs=5e-4)


def _by_hand(*shares: float | None) -> RecordView:
    rows = [
        (facts(substrate="CCC(C)Br"), {} if s is None else {"substitution": s, "elimination": 1 - s}, None, "worked")
        for s in shares
    ]
    table = table_of(*rows)
    return view_of(table, [ConditionProfile()] * len(rows), [()] * len(rows), [None] * len(rows))  # type: ignore[list-item]


def test_mean_and_spread_are_those_of_the_measured_runs() -> None:
    cell = measure_coverage(_by_hand(0.9, 0.7, None, 0.8), experiments=0).cells[0]
    assert (cell.runs, cell.measured) == (4, 3)
    assert cell.mean == pytest.approx(0.8)
    assert cell.spread == pytest.approx(0.1)
    assert cell.best == pytest.approx(0.9)


def test_like_flasks_that_agree_are_no_contradiction() -> None:
    assert measure_coverage(_by_hand(0.9, 0.7), experiments=0).contradictions == ()
    assert len(measure_coverage(_by_hand(0.9, 0.3), experiments=0).contradictions) == 1


def test_the_experiments_are_those_of_largest_drop_in_variance() -> None:
    """Against brute force over every experiment, the second after the first was counted in."""
    rng = np.random.default_rng(5)
    n, sigma2 = rng.uniform(0, 4, 7), rng.uniform(0.01, 0.1, 7)
    alike = rng.uniform(0, 1, (7, 7))
    np.fill_diagonal(alike, 1)
    labels = [(f"R-{i}", "C", f"step {i}") for i in range(7)]
    chosen = _choose(labels, n, sigma2, alike, 2)  # type: ignore[arg-type]

    def total(precedents: Any) -> float:
        return float((sigma2 / (precedents + PRIOR_RUNS)).sum())

    first = max(range(7), key=lambda e: total(n) - total(n + alike[e]))
    second = max(
        (e for e in range(7) if e != first), key=lambda e: total(n + alike[first]) - total(n + alike[first] + alike[e])
    )
    assert [e.like for e in chosen] == [f"R-{first}", f"R-{second}"]
    assert chosen[0].gain == pytest.approx(total(n) - total(n + alike[first]), abs=1e-5)


def test_experiments_say_why_and_make_their_own_step_surer(coverage: Coverage) -> None:
    assert len(coverage.experiments) == 3
    gains = [e.gain for e in coverage.experiments]
    assert gains == sorted(gains, reverse=True)
    for experiment in coverage.experiments:
        assert experiment.after < experiment.before
        assert "effective runs" in experiment.why


def test_planned_steps_stand_in_place_of_the_last_year(demo: Book) -> None:
    taught = measure_coverage(demo.view(), [demo_plan()]).experiments
    assert [e.scheme for e in taught] == [demo_plan().scheme]
