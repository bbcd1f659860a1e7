"""The ledger of a route as values: what goes in, what each step passes on, what a better step would buy.

Only values live here, and loading them loads no numerics; they are reckoned by `kb.route.ledger` and shown by the front
ends. Yields are percent, amounts mmol, masses g, money in whatever the file speaks.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from kb.record.finding import Interval
from kb.route.sequence import Route, Step
from kb.showing import ShowsItself


@dataclass(frozen=True, slots=True, kw_only=True)
class Need:
    """How much of one material goes in.

    Attributes:
        mmol: at the mean yields. low, high: 80 % interval of what it takes, by Monte Carlo [mmol].
        grams: at the mean yields; None = molar mass not known. cost: None = no price.
        closed_low, closed_high: the interval in closed form [mmol]; None = it goes in at more than one place.
        grams_high: at `high`, which suffices nine times in ten [g]; None = molar mass not known.
    """

    material: str
    mmol: float
    low: float
    high: float
    grams: float | None
    cost: float | None
    closed_low: float | None = None
    closed_high: float | None = None
    grams_high: float | None = None

    def as_dict(self) -> dict[str, Any]:
        """Return plain JSON values."""
        return {name: getattr(self, name) for name in self.__slots__}


@dataclass(frozen=True, slots=True, kw_only=True)
class Improvement:
    """What a better yield in one step would buy.

    Attributes:
        at_pct: the yield imagined.
        needed_mmol, needed_g: of the main starting material then.
        saves: of `unit` over the whole route.
        unit: "mmol", "g" of all starting materials, or money.
    """

    step: str
    at_pct: float
    needed_mmol: float
    needed_g: float | None
    saves: float
    unit: str

    def as_dict(self) -> dict[str, Any]:
        """Return plain JSON values."""
        return {name: getattr(self, name) for name in self.__slots__}


@dataclass(frozen=True, slots=True, kw_only=True)
class Entry:
    """One step in the ledger.

    Attributes:
        input_mmol, product_mmol: of the main line, at the mean yields.
        so_far_pct: cumulative yield along its own line [%], at the mean yields.
        improvement: None = the yield cannot be bettered.
    """

    step: Step
    input_mmol: float
    product_mmol: float
    so_far_pct: float
    improvement: Improvement | None

    def as_dict(self) -> dict[str, Any]:
        """Return plain JSON values."""
        step = self.step
        return {
            "name": step.name,
            "from": [{"name": i.name, "equiv": i.equiv} for i in step.inputs],
            "yield_pct": step.yield_pct.pct.as_dict(),
            "basis": step.yield_pct.basis,
            "runs": list(step.yield_pct.runs),
            "note": step.yield_pct.note,
            "forgiven": list(step.forgiven),
            "findings": [{"severity": s, "title": t} for s, t in step.findings],
            "input_mmol": self.input_mmol,
            "product_mmol": self.product_mmol,
            "so_far_pct": self.so_far_pct,
            "if_better": self.improvement.as_dict() if self.improvement else None,
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class Ledger(ShowsItself):
    """A route, reckoned.

    Attributes:
        entries: in the order of the steps.
        overall_pct: along the main line, by Monte Carlo [%].
        closed_form_pct: the same in closed form [%].
        sampling_error_pct: standard error of the Monte Carlo mean [%].
        counted_pct: mean over the main line with forgiven steps left out [%]; None = none is forgiven.
        target_mmol: wanted of the product; 1 where none was said.
        needed: main starting material first.
        cost: of all priced materials and steps, at the mean yields; None = nothing has a price.
        weakest: the improvement that would buy most; None = every step is forgiven or perfect.
        reckoned_in: "mmol", "g", or the word for money ("cost units" where none was given).
        unpriced: materials that the cost leaves out because their price or molar mass is missing.
    """

    route: Route
    entries: tuple[Entry, ...]
    overall_pct: Interval
    closed_form_pct: Interval
    sampling_error_pct: float
    counted_pct: float | None
    target_mmol: float
    needed: tuple[Need, ...]
    cost: float | None
    weakest: Improvement | None
    reckoned_in: str
    unpriced: tuple[str, ...] = ()

    def as_dict(self) -> dict[str, Any]:
        """Return the contract's JSON object."""
        first = self.needed[0]
        return {
            "title": self.route.title,
            "steps": [e.as_dict() for e in self.entries],
            "overall_yield_pct": self.overall_pct.as_dict(),
            "closed_form_yield_pct": self.closed_form_pct.as_dict(),
            "sampling_error_pct": self.sampling_error_pct,
            "counted_yield_pct": self.counted_pct,
            "level": 0.8,
            "target_mmol": self.target_mmol,
            "needed_mmol": first.mmol,
            "needed": [n.as_dict() for n in self.needed],
            "cost": self.cost,
            "money": self.route.money,
            "reckoned_in": self.reckoned_in,
            "unpriced": list(self.unpriced),
            "weakest": self.weakest.as_dict() if self.weakest else None,
        }
