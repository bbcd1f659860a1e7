"""Route arithmetic: published examples, the two ways of reckoning against each other, branches, cost, weakest step."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from kb.errors import InvalidRecord, QuantityError, RecordNotFound
from kb.record.finding import Interval
from kb.route.imagined import with_forgiven, with_target, with_yield
from kb.route.ledger import closed_form, draw_yields, reckon
from kb.route.sequence import Input, Material, Route, Step, StepYield, molar_mass_of


def a_yield(mean: float, low: float | None = None, high: float | None = None) -> StepYield:
    return StepYield(
        pct=Interval(mean=mean, low=mean if low is None else low, high=mean if high is None else high), basis="given"
    )


def linear(*yields: StepYield, target_mmol: float | None = None, **material: float) -> Route:
    steps = []
    before = "start"
    for number, one in enumerate(yields, 1):
        steps.append(Step(name=f"step {number}", yield_pct=one, inputs=(Input(name=before),)))
        before = f"step {number}"
    return Route(
        title="linear", steps=tuple(steps), materials=(Material(name="start", **material),), target_mmol=target_mmol
    )


@pytest.mark.parametrize(
    ("yields_pct", "overall_pct"),
    [
        ([50] * 3, 12.5),  # Wikipedia, "Convergent synthesis": A -> B -> C -> D at 50 % each is 12.5 %
        ([90] * 5, 59.049),  # arithmetic, y^n: check_values.csv AR13 ...
        ([90] * 10, 34.868),  # ... AR14
        ([80] * 10, 10.737),  # ... AR16
        ([95] * 20, 35.849),  # ... AR19
        ([99] * 100, 36.603),  # ... AR20
        ([50] * 12, 0.02441),  # twelve steps at one half each: common practice, 0.5^12 = 0.024 %
    ],
)
def test_overall_yield_is_the_product(yields_pct: list[float], overall_pct: float) -> None:
    ledger = reckon(linear(*(a_yield(y) for y in yields_pct)), draws=100)
    assert ledger.overall_pct.mean == pytest.approx(overall_pct, rel=2e-3)
    assert ledger.closed_form_pct.mean == pytest.approx(overall_pct, rel=2e-3)


def test_a_convergent_route_counts_its_longest_line() -> None:
    """Wikipedia, "Convergent synthesis": A -> B (50 %), C -> D (50 %), B + D -> E (50 %): overall 25 %."""
    steps = (
        Step(name="B", yield_pct=a_yield(50), inputs=(Input(name="A"),)),
        Step(name="D", yield_pct=a_yield(50), inputs=(Input(name="C"),)),
        Step(name="E", yield_pct=a_yield(50), inputs=(Input(name="B"), Input(name="D", equiv=1.2))),
    )
    route = Route(title="", steps=steps, materials=(Material(name="A"), Material(name="C")), target_mmol=1.0)
    ledger = reckon(route)
    assert ledger.overall_pct.mean == pytest.approx(25)
    assert {n.material: n.mmol for n in ledger.needed} == pytest.approx({"A": 4.0, "C": 4.8})


@given(st.lists(st.tuples(st.floats(20, 95), st.floats(0.5, 12)), min_size=1, max_size=9))
def test_monte_carlo_agrees_with_the_closed_form_within_its_error(steps: list[tuple[float, float]]) -> None:
    yields = [a_yield(m, max(m - w, 0), min(m + w, 100)) for m, w in steps]
    route = linear(*yields)
    drawn = np.prod([draw_yields(y, 40_000, 7 + i) for i, y in enumerate(yields)], axis=0)
    mean = math.prod(y.mean for y in yields)
    assert abs(drawn.mean() - mean) < 5 * drawn.std() / math.sqrt(len(drawn)) + 1e-9
    variance = math.prod(y.mean**2 + y.sd**2 for y in yields) - mean**2
    assert drawn.var() == pytest.approx(variance, rel=0.08, abs=1e-9)
    form = closed_form(route.main_line)
    low, high = np.quantile(drawn, [0.1, 0.9])
    assert form.low / 100 == pytest.approx(low, abs=0.03)  # a lognormal is no product of Betas: bounds only roughly
    assert form.high / 100 == pytest.approx(high, abs=0.03)


def test_drawn_yields_have_the_interval_that_was_stated() -> None:
    """Against scipy's Beta quantiles at the same mean and standard deviation."""
    from scipy import stats

    one = a_yield(70, 55, 85)
    drawn = draw_yields(one, 200_000, 1)
    size = one.mean * (1 - one.mean) / one.sd**2 - 1
    exact = stats.beta(one.mean * size, (1 - one.mean) * size)
    assert np.quantile(drawn, [0.1, 0.9]) == pytest.approx(exact.ppf([0.1, 0.9]), abs=0.003)
    assert exact.ppf(0.9) - exact.ppf(0.1) == pytest.approx(0.30, abs=0.02)


def test_the_needed_amount_follows_from_target_and_yields() -> None:
    ledger = reckon(linear(a_yield(80, 70, 90), a_yield(50, 35, 65), target_mmol=10, molar_mass=200.0))
    need = ledger.needed[0]
    assert need.mmol == pytest.approx(25)
    assert need.grams == pytest.approx(5)
    assert need.low < 25 < need.high
    assert [e.so_far_pct for e in ledger.entries] == pytest.approx([80, 40])
    assert ledger.as_dict()["needed_mmol"] == pytest.approx(25)


def test_the_weakest_step_is_the_one_whose_betterment_saves_most() -> None:
    route = linear(a_yield(75), a_yield(30), a_yield(60), target_mmol=1, molar_mass=100.0)
    weakest = reckon(route).weakest
    assert weakest is not None and weakest.step == "step 2"
    again = reckon(with_yield(route, "step 2", weakest.at_pct))
    assert again.needed[0].mmol == pytest.approx(weakest.needed_mmol, rel=1e-3)
    assert reckon(route).needed[0].grams - again.needed[0].grams == pytest.approx(weakest.saves, rel=1e-3)  # type: ignore[operator]


def test_a_forgiven_step_is_no_weakness_and_leaves_the_yield_that_counts() -> None:
    steps = (
        Step(name="crude", yield_pct=a_yield(8), inputs=(Input(name="start"),), forgiven=("cheap input",)),
        Step(name="fine", yield_pct=a_yield(70), inputs=(Input(name="crude"),)),
    )
    ledger = reckon(Route(title="", steps=steps, materials=(Material(name="start"),)))
    assert ledger.weakest is not None and ledger.weakest.step == "fine"
    assert ledger.overall_pct.mean == pytest.approx(5.6)
    assert ledger.counted_pct == pytest.approx(70)


def test_with_prices_the_route_is_reckoned_in_money() -> None:
    """The poor step wastes what costs nothing; the dear reagent of the good step is what a better yield saves."""
    steps = (
        Step(name="crude", yield_pct=a_yield(8), inputs=(Input(name="free"),)),
        Step(name="join", yield_pct=a_yield(60), inputs=(Input(name="crude"), Input(name="dear", equiv=2.0))),
    )
    materials = (Material(name="free", price_per_g=0), Material(name="dear", molar_mass=500.0, price_per_g=100))
    ledger = reckon(Route(title="", steps=steps, materials=materials, target_mmol=6, money="EUR"))
    assert ledger.cost == pytest.approx(6 / 0.6 * 2 * 0.5 * 100)
    assert ledger.reckoned_in == "EUR"
    assert ledger.weakest is not None and ledger.weakest.step == "join"
    assert ledger.weakest.saves == pytest.approx(1000 - 6 / 0.8 * 2 * 0.5 * 100)


def test_what_a_cheap_step_takes_costs_nothing_unless_it_has_a_price() -> None:
    """Without prices: the grams that a better step saves leave out what only a cheap-input step takes."""
    steps = (
        Step(name="crude", yield_pct=a_yield(10), inputs=(Input(name="bulk"),), forgiven=("cheap input",)),
        Step(name="join", yield_pct=a_yield(60), inputs=(Input(name="fine"), Input(name="crude"))),
    )
    masses = (Material(name="bulk", molar_mass=100.0), Material(name="fine", molar_mass=200.0))
    route = Route(title="", steps=steps, materials=masses, target_mmol=6)
    ledger = reckon(route)
    assert [n.material for n in ledger.needed] == ["fine", "bulk"]
    assert ledger.needed[1].grams == pytest.approx(10.0)  # 6 / 0.6 / 0.1 mmol: shown, though it does not count
    assert ledger.reckoned_in == "g" and ledger.unpriced == ()
    assert ledger.weakest is not None
    assert ledger.weakest.saves == pytest.approx((6 / 0.6 - 6 / 0.8) * 0.2)
    matters = reckon(with_forgiven(route, "crude", ()))
    assert matters.weakest is not None and matters.weakest.step == "crude"
    assert matters.weakest.saves == pytest.approx(10.0 - 10.0 * 0.1 / 0.8)


def test_what_has_no_price_is_named_where_others_have_one() -> None:
    steps = (
        Step(name="one", yield_pct=a_yield(50), inputs=(Input(name="a"), Input(name="b"), Input(name="c"))),
        Step(name="two", yield_pct=a_yield(50), inputs=(Input(name="one"),)),
    )
    priced = Material(name="a", molar_mass=100.0, price_per_g=1)
    materials = (priced, Material(name="b", price_per_g=3), Material(name="c"))
    ledger = reckon(Route(title="", steps=steps, materials=materials, target_mmol=1))
    assert ledger.unpriced == ("b", "c")
    assert ledger.cost == pytest.approx(0.4)


@given(st.lists(st.tuples(st.floats(30, 90), st.floats(0.02, 0.2)), min_size=1, max_size=6))
def test_the_needed_amount_agrees_in_both_ways_of_reckoning(steps: list[tuple[float, float]]) -> None:
    spans = [(m, min(m * w, 100 - m)) for m, w in steps]  # wider ones are no lognormal any more
    route = linear(*(a_yield(m, m - w, m + w) for m, w in spans), target_mmol=10)
    need = reckon(route, draws=20_000).needed[0]
    assert need.closed_low is not None and need.closed_high is not None
    assert need.closed_low <= need.mmol * (1 + 1e-4) and need.closed_high >= need.mmol * (1 - 1e-4)
    assert need.low == pytest.approx(need.closed_low, rel=0.05)  # a lognormal is no product of Betas
    assert need.high == pytest.approx(need.closed_high, rel=0.05)


def test_the_closed_form_of_a_branch_follows_its_own_line() -> None:
    steps = (
        Step(name="B", yield_pct=a_yield(50, 44, 56), inputs=(Input(name="A"),)),
        Step(name="D", yield_pct=a_yield(40), inputs=(Input(name="C"), Input(name="A"))),
        Step(name="E", yield_pct=a_yield(80), inputs=(Input(name="B"), Input(name="D", equiv=2.0))),
    )
    route = Route(title="", steps=steps, materials=(Material(name="A"), Material(name="C")), target_mmol=8.0)
    needed = {n.material: n for n in reckon(route).needed}
    assert needed["A"].closed_low is None  # it goes in at two places
    assert needed["C"].closed_low == needed["C"].closed_high == pytest.approx(8 / 0.8 * 2 / 0.4)
    assert route.joins("D") == ("E", 2.0) and route.joins("E") is None


def test_another_amount_wanted_scales_everything() -> None:
    route = linear(a_yield(50), target_mmol=1)
    assert reckon(with_target(route, "10 mmol")).needed[0].mmol == pytest.approx(20)
    assert reckon(with_target(route, "")).target_mmol == 1.0
    for wrong in ("2 g", "10", "0 mmol", "3 mL", "lots"):
        with pytest.raises((InvalidRecord, QuantityError)):
            with_target(route, wrong)


def test_cost_of_work_counts_by_input() -> None:
    steps = (Step(name="a", yield_pct=a_yield(50), inputs=(Input(name="s"),), cost_per_mmol=3.0),)
    ledger = reckon(Route(title="", steps=steps, materials=(Material(name="s"),), target_mmol=5))
    assert ledger.cost == pytest.approx(30)


@pytest.mark.parametrize(
    ("steps", "sentence"),
    [
        ((), "no steps"),
        ((("a", "x"),), "no material and no earlier step"),
        ((("a", "start"), ("b", "start")), "2 ends: a, b"),
        ((("a", "start"), ("a", "a")), "Two things are called"),
        ((("a", "b"), ("b", "a")), "'b', which is made only after it"),
        ((("a", "a"),), "'a', which is made only in it"),
    ],
)
def test_a_route_that_cannot_be_is_refused(steps: tuple[tuple[str, str], ...], sentence: str) -> None:
    built = tuple(Step(name=n, yield_pct=a_yield(50), inputs=(Input(name=f),)) for n, f in steps)
    with pytest.raises(InvalidRecord, match=sentence):
        Route(title="", steps=built, materials=(Material(name="start"),))


@pytest.mark.parametrize("bounds", [(0, 0, 0), (101, 90, 110), (50, 60, 70), (50, 20, 40)])
def test_an_impossible_yield_is_refused(bounds: tuple[float, float, float]) -> None:
    with pytest.raises(InvalidRecord):
        a_yield(*bounds)


def test_what_if_names_its_steps() -> None:
    with pytest.raises(RecordNotFound, match="no step 'step 9'"):
        with_yield(linear(a_yield(50)), "step 9", 80)


def test_molar_mass_of_ethanol() -> None:
    """46.07 g/mol: CRC Handbook of Chemistry and Physics (memory)."""
    assert molar_mass_of("CCO") == pytest.approx(46.07, abs=0.01)
    assert molar_mass_of("C1CC") is None
