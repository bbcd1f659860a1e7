"""The local fit of yields: what it must do whatever its constants. Values are invented; orders are common sense."""

from __future__ import annotations

import numpy as np
import pytest
from tables_by_hand import facts, table_of, view_of

from kb.assess.low_yield import find_low_yield
from kb.assess.record_view import RecordView
from kb.assess.table import one_row
from kb.assess.yields import NEAREST, YieldFit, expected_share_of, fit_yield, likenesses
from kb.materials.profile import ConditionProfile
from kb.record.run import Run
from kb.vocabulary import FindingKind, Severity

OTHER = bytes([170] * 32)


def view(*runs: tuple[dict, float | None, dict[str, float]]) -> RecordView:
    rows = [(facts(**own), shares, yield_pct, None) for own, yield_pct, shares in runs]
    return view_of(table_of(*rows), [ConditionProfile()] * len(rows), [()] * len(rows), [Run(scheme="CBr")] * len(rows))


def fit(record: RecordView, share: float | None = 0.9, similarity: float = 1.0, **plan: object) -> YieldFit:
    found = fit_yield(one_row(facts(**plan)), record, np.full(len(record.table), similarity), share)
    assert found is not None
    return found


def test_runs_that_agree_carry_the_figure_and_narrow_it() -> None:
    one = fit(view(({}, 30.0, {"substitution": 0.9})))
    many = fit(view(*[({}, 30.0, {"substitution": 0.9})] * 12))
    assert abs(many.yield_pct.mean - 30) < abs(one.yield_pct.mean - 30)
    assert many.yield_pct.high - many.yield_pct.low < one.yield_pct.high - one.yield_pct.low


def test_before_any_run_a_plan_that_goes_the_wanted_way_starts_higher() -> None:
    record = view(({"centre_bits": OTHER}, 50.0, {}))
    starts = [fit(record, share).starting_pct for share in (0.1, 0.5, 0.95)]
    assert starts == sorted(starts)
    assert starts[0] < 10 < 60 < starts[2]


def test_a_run_that_did_worse_than_its_split_lets_expect_worse() -> None:
    lost_on_isolation = fit(view(({}, 20.0, {"substitution": 0.95})))
    as_expected = fit(view(({}, 66.0, {"substitution": 0.95})))
    assert lost_on_isolation.yield_pct.mean + 10 < as_expected.yield_pct.mean


def test_twenty_runs_of_another_kind_of_centre_count_as_one_substrate_not_as_twenty_opinions() -> None:
    # Same conditions: what the conditions do is learned once, however often it was measured on that substrate.
    few = fit(view(*[({"centre_bits": OTHER}, 10.0, {"substitution": 0.9})] * 4))
    lots = fit(view(*[({"centre_bits": OTHER}, 10.0, {"substitution": 0.9})] * 20))
    alike = fit(view(*[({}, 10.0, {"substitution": 0.9})] * 4))
    assert alike.yield_pct.mean < lots.yield_pct.mean
    assert abs(lots.yield_pct.mean - few.yield_pct.mean) < 4


def test_what_conditions_did_to_another_substrate_is_carried_over() -> None:
    good, bad = {"base_pkah": 4.7, "centre_bits": OTHER}, {"base_pkah": 19.0, "centre_bits": OTHER}
    record = view(*[(good, 90.0, {"substitution": 0.9})] * 3, *[(bad, 15.0, {"substitution": 0.9})] * 3)
    assert fit(record, base_pkah=4.7).yield_pct.mean > fit(record, base_pkah=19.0).yield_pct.mean + 8


def test_no_run_close_enough_gives_no_yield() -> None:
    record = view(({}, 80.0, {"substitution": 0.9}))
    assert fit_yield(one_row(facts()), record, np.full(1, 0.4), 0.9) is None
    assert fit_yield(one_row(facts()), view(({}, None, {"substitution": 0.9})), np.ones(1), 0.9) is None


def test_a_wet_product_counts_as_a_hundred() -> None:
    found = fit(view(*[({}, 118.0, {"substitution": 1.0})] * 5), 1.0)
    assert found.yield_pct.mean <= found.yield_pct.high <= 100


def test_only_the_nearest_runs_are_asked() -> None:
    record = view(*[({}, 90.0, {"substitution": 0.9})] * NEAREST, *[({}, 0.0, {"substitution": 0.9})] * 50)
    similarity = np.array([1.0] * NEAREST + [0.9] * 50)
    found = fit_yield(one_row(facts()), record, similarity, 0.9)
    assert found is not None
    assert max(found.rows) < NEAREST


def test_the_measured_split_of_a_run_goes_before_the_published_one() -> None:
    record = view(
        ({}, 50.0, {"substitution": 0.3, "elimination": 0.7}),
        ({}, 50.0, {"substitution": 0.2, "elimination": 0.2}),
        ({"fate": None}, 50.0, {"substitution": 0.9}),
    )
    assert expected_share_of(record, 0) == pytest.approx(0.3)
    assert expected_share_of(record, 1) == pytest.approx(0.5)  # scaled, since it does not add up
    assert np.isnan(expected_share_of(record, 2))


def test_likeness_of_a_plan_to_itself_is_whole_and_symmetric() -> None:
    alike, medium = likenesses(one_row(facts()), view(({}, 1.0, {}), ({"base_pkah": 15.0}, 1.0, {})).table)
    assert np.allclose(alike, alike.T)
    assert np.allclose(medium, medium.T)
    assert medium[0, 1] == pytest.approx(1)
    assert medium[0, 2] < 1
    assert np.allclose(np.diag(medium), 1)


def test_an_endangered_group_in_only_one_of_two_takes_their_likeness_away() -> None:
    record = view(*[({}, 5.0, {"substitution": 0.9})] * 4)
    same = (np.array([True]), np.ones((1, 4), dtype=bool))
    apart = (np.array([False]), np.ones((1, 4), dtype=bool))
    row = one_row(facts())
    held, free = (fit_yield(row, record, np.ones(4), 0.9, who) for who in (same, apart))
    assert held is not None
    assert free is not None
    assert held.yield_pct.mean < free.yield_pct.mean


def failures(record: RecordView, share: float = 0.1) -> tuple:
    found = fit(record, share)
    return find_low_yield(found, record, np.ones(len(record.table)), 0, 3)


def test_next_to_nothing_is_warned_of_with_the_runs() -> None:
    record = view(*[({}, 1.0, {"substitution": 0.1})] * 6, ({}, 40.0, {"substitution": 0.1}))
    (finding,) = failures(record)
    assert finding.kind is FindingKind.RESEMBLANCE
    assert finding.severity is Severity.SERIOUS
    assert (finding.component, finding.atoms) == (0, (3,))
    assert finding.evidence is not None
    assert (finding.evidence.lost, finding.evidence.survived) == (6, 1)
    assert finding.evidence.runs[-1] == "R-7"


@pytest.mark.parametrize(
    ("yields", "why"),
    [
        ((60.0, 70.0, 65.0, 80.0), "nobody failed"),
        ((60.0, 70.0, 1.0, 80.0, 75.0), "one failed, most did well"),
        ((6.0, 7.0, 6.0, 8.0, 9.0), "poor, but something every time"),
    ],
)
def test_otherwise_nothing_is_said(yields: tuple[float, ...], why: str) -> None:
    record = view(*[({}, y, {"substitution": y / 100}) for y in yields])
    assert failures(record, sorted(yields)[len(yields) // 2] / 100) == (), why


def test_no_fit_gives_no_warning() -> None:
    assert find_low_yield(None, view(({}, 1.0, {})), np.ones(1), None, None) == ()
