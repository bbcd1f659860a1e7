"""Integrals to a split: worked by hand, by symmetry, and against a Monte Carlo of the same errors."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from kb.errors import QuantityError
from kb.record.split import Signal, assay_yield, split_from_signals

SIGNALS = st.lists(st.tuples(st.floats(0.01, 100), st.integers(1, 9)), min_size=2, max_size=5)


def test_integrals_are_divided_by_their_protons() -> None:
    # arithmetic: OCH2 integrates 2.00 for 2 H, =CH 0.25 for 1 H, so 1.00 : 0.25 = 80 : 20
    split = split_from_signals(
        {"substitution": Signal(value=2.0, per_molecule=2), "elimination": Signal(value=0.25, per_molecule=1)}
    )
    assert {label: i.mean for label, i in split.shares} == {"substitution": 0.8, "elimination": 0.2}


@given(SIGNALS, st.floats(0.1, 50))
def test_the_scale_of_the_integrals_does_not_matter_and_shares_add_up(rows: list, scale: float) -> None:
    one = split_from_signals({str(i): Signal(value=v, per_molecule=p) for i, (v, p) in enumerate(rows)})
    two = split_from_signals({str(i): Signal(value=v * scale, per_molecule=p) for i, (v, p) in enumerate(rows)})
    for (_, a), (_, b) in zip(one.shares, two.shares, strict=True):
        assert a.mean == pytest.approx(b.mean, abs=2e-4)
        assert a.low <= a.mean <= a.high
    assert sum(i.mean for _, i in one.shares) == pytest.approx(1, abs=1e-3)


def test_the_interval_agrees_with_a_monte_carlo_of_the_same_errors() -> None:
    values, protons = np.array([3.0, 1.0, 0.2]), np.array([3, 1, 2])
    split = split_from_signals(
        {
            str(i): Signal(value=float(v), per_molecule=int(p))
            for i, (v, p) in enumerate(zip(values, protons, strict=True))
        }
    )
    rng = np.random.default_rng(5)
    sd = np.sqrt((0.03 * values) ** 2 + (0.005 * values.max()) ** 2)
    draws = rng.normal(values, sd, (40_000, 3)) / protons
    shares = draws / draws.sum(axis=1, keepdims=True)
    low, high = np.quantile(shares, [0.1, 0.9], axis=0)
    for place, (_, interval) in enumerate(split.shares):
        assert interval.low == pytest.approx(low[place], abs=0.003)
        assert interval.high == pytest.approx(high[place], abs=0.003)


def test_assay_yield_against_a_weighed_standard() -> None:
    # arithmetic: product 2 H integrating 1.6, standard 3 H integrating 3.0, 0.50 mmol standard, 0.50 mmol charged: 80 %
    got = assay_yield(Signal(value=1.6, per_molecule=2), Signal(value=3.0, per_molecule=3), 0.5, 0.5)
    assert got.mean == pytest.approx(80)
    assert got.low < 80 < got.high


@pytest.mark.parametrize(
    "broken",
    [
        lambda: Signal(value=-1.0),
        lambda: Signal(value=float("nan")),
        lambda: Signal(value=1.0, per_molecule=0),
        lambda: split_from_signals({"a": Signal(value=0.0)}),
        lambda: split_from_signals({}),
        lambda: assay_yield(Signal(value=1.0), Signal(value=0.0), 1, 1),
        lambda: assay_yield(Signal(value=1.0), Signal(value=1.0), 0, 1),
    ],
)
def test_nonsense_is_refused_with_what_to_do(broken) -> None:  # type: ignore[no-untyped-def]
    with pytest.raises(QuantityError) as refused:
        broken()
    assert refused.value.hint or "zero" in refused.value.message
