"""The ledger of a route: cumulative yield, what must go in, the weakest step, and what improving it would buy.

It owns the arithmetic, twice. *Closed form*: yields of different steps are independent, so the mean of their product
is the product of their means, and ln of the product has variance sum ln(1 + cv^2); its 80 % interval is that of a
lognormal. *Monte Carlo*: each yield is a Beta with the same mean and standard deviation, drawn from a fixed seed; it
knows that no yield passes 100 %, so it is the one shown. The two means agree within the sampling error (tested).
Independence is an assumption: one bad bottle used in five steps breaks it.

A step whose poor yield the chemist has forgiven is no weakness, and is left out of the yield that counts. What a
better yield saves is reckoned in money where anything has a price, else in the material that counts
(`kb.route.worth`).
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from kb.record.finding import Interval
from kb.route.entries import Entry, Improvement, Ledger, Need
from kb.route.sequence import Z80, Material, Route, Step, StepYield
from kb.route.worth import cost_of, figure, unpriced, worth_of

DRAWS = 20_000
SEED = 20
GOOD_PCT = 80.0
"""The yield that a weak step is imagined to reach; a step that has it is imagined ten points better. A judgement."""


def reckon(route: Route, draws: int = DRAWS, seed: int = SEED) -> Ledger:
    """Reckon a route.

    Args:
        draws: of the Monte Carlo.
        seed: fixed, so that a page shows the same figures twice.
    """
    means = {step.name: step.yield_pct.mean for step in route.steps}
    drawn = {step.name: draw_yields(step.yield_pct, draws, seed + place) for place, step in enumerate(route.steps)}
    target = route.target_mmol or 1.0
    overall = np.prod([drawn[step.name] for step in route.main_line], axis=0)
    inputs, materials = demand(route, means, target)
    sampled = demand(route, drawn, target)[1]
    needed = tuple(_need(route, name, materials[name], sampled[name]) for name in _main_first(route, materials))
    value, unit = worth_of(route, inputs, materials)
    entries = tuple(_entry(route, step, means, inputs, target, (value, unit)) for step in route.steps)
    open_steps = [
        e.improvement for e in entries if e.improvement is not None and e.improvement.saves > 0 and not e.step.forgiven
    ]
    counted = [s.yield_pct.mean for s in route.main_line if not s.forgiven]
    return Ledger(
        route=route,
        entries=entries,
        overall_pct=_interval(overall),
        closed_form_pct=closed_form(route.main_line),
        sampling_error_pct=float(np.std(overall) / math.sqrt(draws) * 100),
        counted_pct=round(100 * math.prod(counted), 4) if len(counted) < len(route.main_line) else None,
        target_mmol=target,
        needed=needed,
        cost=cost_of(route, inputs, materials),
        weakest=max(open_steps, key=lambda i: i.saves, default=None),
        reckoned_in=unit,
        unpriced=unpriced(route),
    )


def draw_yields(step_yield: StepYield, draws: int, seed: int) -> NDArray[np.float64]:
    """Return drawn yields (draws) as fractions: Beta with the step's mean and standard deviation."""
    mean, sd = step_yield.mean, step_yield.sd
    if sd < 1e-9:
        return np.full(draws, mean)
    size = mean * (1 - mean) / sd**2 - 1
    rng = np.random.default_rng(seed)
    return np.maximum(rng.beta(mean * size, (1 - mean) * size, draws), 1e-6)


def closed_form(line: tuple[Step, ...]) -> Interval:
    """Return the overall yield of a line of steps [%] as product of means with a lognormal 80 % interval."""
    mean = math.prod(step.yield_pct.mean for step in line)
    variance = sum(math.log1p((step.yield_pct.sd / step.yield_pct.mean) ** 2) for step in line)
    middle, half = math.log(mean) - variance / 2, Z80 * math.sqrt(variance)
    return Interval(
        mean=_pct(mean),
        low=_pct(min(math.exp(middle - half), mean)),
        high=_pct(min(max(math.exp(middle + half), mean), 1.0)),
    )


def demand(route: Route, yields: Mapping[str, Any], target_mmol: float) -> tuple[dict[str, Any], dict[str, Any]]:
    """Work back from the target.

    Args:
        yields: fraction (or array of draws) per step.

    Returns:
        Main input per step [mmol], and amount per material [mmol].
    """
    wanted: dict[str, Any] = {route.steps[-1].name: target_mmol}
    inputs: dict[str, Any] = {}
    for step in reversed(route.steps):
        inputs[step.name] = wanted[step.name] / yields[step.name]
        for one in step.inputs:
            wanted[one.name] = wanted.get(one.name, 0.0) + inputs[step.name] * one.equiv
    return inputs, {m.name: wanted[m.name] for m in route.materials if m.name in wanted}


def _entry(
    route: Route,
    step: Step,
    means: Mapping[str, float],
    inputs: Mapping[str, float],
    target: float,
    now: tuple[float, str],
) -> Entry:
    mean = means[step.name]
    better = max(GOOD_PCT / 100, min(mean + 0.1, 0.99))
    improvement = None
    if better > mean:
        changed = demand(route, {**means, step.name: better}, target)
        main = _main_first(route, changed[1])[0]
        material = _material(route, main)
        mmol = float(changed[1][main])
        improvement = Improvement(
            step=step.name,
            at_pct=round(100 * better, 1),
            needed_mmol=figure(mmol),
            needed_g=_grams(material, mmol),
            saves=figure(now[0] - worth_of(route, *changed)[0]),
            unit=now[1],
        )
    return Entry(
        step=step,
        input_mmol=figure(inputs[step.name]),
        product_mmol=figure(inputs[step.name] * mean),
        so_far_pct=_pct(_so_far(route, step, means)),
        improvement=improvement,
    )


def _so_far(route: Route, step: Step, means: Mapping[str, float]) -> float:
    by_name = {s.name: s for s in route.steps}
    total, at = 1.0, by_name.get(step.name)
    while at is not None:
        total *= means[at.name]
        at = by_name.get(at.inputs[0].name)
    return total


def _need(route: Route, name: str, mmol: float, sampled: NDArray[np.float64] | float) -> Need:
    material = _material(route, name)
    low, high = (float(q) for q in np.quantile(sampled, [0.1, 0.9]))
    price = material.price_per_mmol
    closed = _closed_need(route, name, mmol)
    return Need(
        material=name,
        mmol=figure(mmol),
        low=figure(min(low, mmol)),
        high=figure(max(high, mmol)),
        grams=_grams(material, mmol),
        cost=figure(mmol * price) if price is not None else None,
        closed_low=figure(closed[0]) if closed else None,
        closed_high=figure(closed[1]) if closed else None,
        grams_high=_grams(material, max(high, mmol)),
    )


def _closed_need(route: Route, name: str, mmol: float) -> tuple[float, float] | None:
    """Return the closed-form bounds of what is needed [mmol]: a product of yields turned upside down is lognormal too.

    None where the material, or what is made of it, goes in at more than one place: then it is no product.
    """
    line = route.line_from(name)
    if line is None:
        return None
    form = closed_form(line)
    mean = 100 * math.prod(step.yield_pct.mean for step in line)
    return mmol * mean / form.high, mmol * mean / max(form.low, 1e-6)


def _main_first(route: Route, materials: Mapping[str, Any]) -> list[str]:
    main = route.main_line[0].inputs[0].name
    return [main, *(name for name in materials if name != main)]


def _material(route: Route, name: str) -> Material:
    return next(m for m in route.materials if m.name == name)


def _grams(material: Material, mmol: float) -> float | None:
    return figure(mmol * material.molar_mass / 1000) if material.molar_mass is not None else None


def _interval(drawn: NDArray[np.float64]) -> Interval:
    low, high = np.quantile(drawn, [0.1, 0.9])
    mean = float(drawn.mean())
    return Interval(mean=_pct(mean), low=_pct(min(float(low), mean)), high=_pct(max(float(high), mean)))


def _pct(share: float) -> float:
    return float(f"{100 * share:.4g}")
