"""What a route takes, as one figure to weigh steps by: money where anything has a price, else material.

It owns which material counts. A material that goes only into steps flagged as "cheap input", and has no price, costs
nothing by the chemist's own word: it is left out, so that a step which wastes only such material is no weakness.
Where nothing else would be left, all materials count. Prices are per mmol, amounts mmol at the mean yields.
"""

from __future__ import annotations

import math
from collections.abc import Mapping

from kb.route.sequence import Material, Route

CHEAP_INPUT = "cheap input"
"""The word by which a step says that what goes into it costs nothing worth reckoning."""


def worth_of(route: Route, inputs: Mapping[str, float], materials: Mapping[str, float]) -> tuple[float, str]:
    """Return what a route takes and the unit: money, grams where every molar mass is known, else mmol.

    Args:
        inputs: main input per step [mmol].
        materials: amount per material [mmol].
    """
    cost = cost_of(route, inputs, materials)
    if cost is not None:
        return cost, route.money or "cost units"
    counted = {m.name: m for m in counting_materials(route) if m.name in materials}
    masses = {name: m.molar_mass for name, m in counted.items()}
    if all(mass is not None for mass in masses.values()):
        return sum(materials[name] * (mass or 0) / 1000 for name, mass in masses.items()), "g"
    return sum(materials[name] for name in counted), "mmol"


def cost_of(route: Route, inputs: Mapping[str, float], materials: Mapping[str, float]) -> float | None:
    """Return what all priced materials and steps cost; None where nothing has a price."""
    by_name = {m.name: m for m in route.materials}
    prices = {name: by_name[name].price_per_mmol for name in materials}
    parts = [mmol * price for name, mmol in materials.items() if (price := prices[name]) is not None]
    parts += [inputs[s.name] * s.cost_per_mmol for s in route.steps if s.cost_per_mmol is not None]
    return figure(sum(parts)) if parts else None


def unpriced(route: Route) -> tuple[str, ...]:
    """Return the materials without a price that a cost leaves out, though nobody called them cheap."""
    if not any(m.price_per_mmol is not None for m in route.materials):
        return ()
    return tuple(m.name for m in counting_materials(route) if m.price_per_mmol is None)


def counting_materials(route: Route) -> tuple[Material, ...]:
    """Return the materials whose amount matters: all but the cheap ones, all where there are no others."""
    counted = tuple(m for m in route.materials if not is_cheap(route, m))
    return counted or route.materials


def is_cheap(route: Route, material: Material) -> bool:
    """Return True where a material costs nothing: by its price, or by the flag of every step that takes it."""
    if material.price_per_g is not None:
        return material.price_per_g == 0
    takers = [s for s in route.steps if material.name in {one.name for one in s.inputs}]
    return bool(takers) and all(CHEAP_INPUT in s.forgiven for s in takers)


def figure(value: float) -> float:
    """Return a number with five significant figures, so that JSON and pages do not pretend to more."""
    return float(f"{float(value):.5g}")


def figure_words(value: float, digits: int = 3) -> str:
    """Return a number with `digits` significant figures, without an exponent, thousands parted.

    >>> figure_words(7148.2), figure_words(0.16271), figure_words(16.9), figure_words(1e-9)
    ('7,150', '0.163', '16.9', '0.000000001')
    """
    if value == 0:
        return "0"
    places = digits - 1 - math.floor(math.log10(abs(value)))
    text = f"{round(value, places):,.{min(max(places, 0), 12)}f}"
    return text.rstrip("0").rstrip(".") if "." in text else text
