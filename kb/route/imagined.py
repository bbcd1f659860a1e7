"""What if: a route with one thing changed, the file untouched.

It owns single changes, each a new value: another yield, another step in the place of one (its conditions changed), a
flag that a poor yield does not matter, another amount wanted. Reckoning is `kb.route.ledger`.
"""

from __future__ import annotations

import dataclasses

from kb.errors import InvalidRecord
from kb.quantity import parse_amount
from kb.record.finding import Interval
from kb.route.sequence import Route, Step, StepYield


def with_yield(route: Route, step: str, pct: float | Interval) -> Route:
    """Return the route with one step's yield taken as `pct` [%]; a number is taken as exact.

    Raises:
        RecordNotFound: no step has that name.
    """
    if not isinstance(pct, Interval):
        pct = Interval(mean=pct, low=pct, high=pct)
    imagined = StepYield(pct=pct, basis="given", note="what if")
    return with_step(route, dataclasses.replace(route.step(step), yield_pct=imagined))


def with_step(route: Route, step: Step) -> Route:
    """Return the route with a step in the place of the one of the same name.

    Raises:
        RecordNotFound: no step has that name.
    """
    route.step(step.name)
    return dataclasses.replace(route, steps=tuple(step if s.name == step.name else s for s in route.steps))


def with_forgiven(route: Route, step: str, forgiven: tuple[str, ...]) -> Route:
    """Return the route with the reasons why a poor yield does not matter in a step; none = it matters.

    Raises:
        RecordNotFound: no step has that name.
    """
    return with_step(route, dataclasses.replace(route.step(step), forgiven=forgiven))


def with_target(route: Route, text: str) -> Route:
    """Return the route with another amount wanted, "2 g" or "5 mmol"; "" = not said, then 1 mmol is reckoned with.

    Raises:
        QuantityError: no amount can be read.
        InvalidRecord: it is not above zero, or a mass while the molar mass is not known.
    """
    return dataclasses.replace(route, target_mmol=parse_target(text, route.target_molar_mass))


def parse_target(text: str, molar_mass: float | None) -> float | None:
    """Return an amount wanted [mmol]; None for "".

    Args:
        molar_mass: of the product [g/mol]; None = not known, then grams are refused.

    Raises:
        QuantityError: no amount can be read.
        InvalidRecord: no unit, or a mass while the molar mass is not known.
    """
    if not text.strip():
        return None
    amount = parse_amount(text)
    if amount.amount_mmol is not None:
        return amount.amount_mmol
    if amount.mass_mg is None:
        raise InvalidRecord(f"The target is {text!r}.", 'Write it with its unit: "2 g" or "5 mmol".', text)
    if molar_mass is None:
        raise InvalidRecord(
            f"The target is {text!r}, but its molar mass is not known.",
            "Give `product` as SMILES, or the target in mmol.",
        )
    return amount.mass_mg / molar_mass
