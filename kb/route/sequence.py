"""A sequence of steps as values: what goes in where, with which yield, from what, and towards how much of the product.

It owns the shape of a route and its checks: every input is a material or an earlier step, exactly one step ends the
route. The first input of a step is its main line; further ones are branches that meet it. It reckons nothing
(`ledger.py`) and reads no file (`routefile.py`). Yields are percent, amounts mmol, molar masses g/mol, prices in
whatever money the file speaks.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

from kb.errors import InvalidRecord, RecordNotFound
from kb.record.assessment import Assessment
from kb.record.finding import Interval
from kb.record.plan import Plan

Z80 = 1.2815515655446004
"""90th centile of the normal distribution: an 80 % interval is 2 x Z80 standard deviations wide."""
_EDGE = 0.002


@dataclass(frozen=True, slots=True, kw_only=True)
class StepYield:
    """What a step is taken to give.

    Attributes:
        pct: mean with its 80 % interval [%]; three equal values = taken as exact.
        basis: "given", "recorded", "estimated" or "unknown".
        runs: codes behind a recorded yield, or precedents behind an estimate.
        note: plain words for what it rests on.
    """

    pct: Interval
    basis: str
    runs: tuple[str, ...] = ()
    note: str = ""

    def __post_init__(self) -> None:
        pct = self.pct
        if not (0 <= pct.low <= pct.mean <= pct.high <= 100 and pct.mean > 0):
            raise InvalidRecord(
                f"A yield of {pct.mean:g} % ({pct.low:g} to {pct.high:g}) cannot be.",
                "Give a mean above 0 and up to 100 with bounds on either side of it.",
                pct.mean,
            )

    @property
    def mean(self) -> float:
        """Return the mean as a fraction, kept off the ends."""
        return min(max(self.pct.mean / 100, _EDGE), 1.0)

    @property
    def sd(self) -> float:
        """Return the standard deviation as a fraction that a Beta distribution can have."""
        sd = (self.pct.high - self.pct.low) / 100 / (2 * Z80)
        return min(sd, math.sqrt(0.95 * self.mean * (1 - self.mean)))


@dataclass(frozen=True, slots=True, kw_only=True)
class Input:
    """What a step takes: the name of a material or of an earlier step, in equivalents of the main line."""

    name: str
    equiv: float = 1.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Material:
    """Something bought or at hand.

    Attributes:
        molar_mass: g/mol; None = not known, then no grams are told.
        price_per_g: None = not given, then it has no part in a cost.
    """

    name: str
    smiles: str | None = None
    molar_mass: float | None = None
    price_per_g: float | None = None

    @property
    def price_per_mmol(self) -> float | None:
        """Return the price of 1 mmol; None where price or molar mass is missing; 0 where it costs nothing."""
        if self.price_per_g == 0:
            return 0.0
        if self.price_per_g is None or self.molar_mass is None:
            return None
        return self.price_per_g * self.molar_mass / 1000


@dataclass(frozen=True, slots=True, kw_only=True)
class Step:
    """One step.

    Attributes:
        inputs: main line first.
        cost_per_mmol: reagents, solvent and work per mmol of main input; None = not given.
        forgiven: why a poor yield does not matter here, as flagged by the chemist ("cheap input"); empty = it does.
        product: SMILES of what it gives; None = not stated.
        findings: (severity, title) of the check of its scheme, most severe first, notes left out.
        plan: scheme and conditions, as planned or as run; None = the file gives a yield and no scheme.
        assessment: what a check of the plan said; None = not checked.
    """

    name: str
    yield_pct: StepYield
    inputs: tuple[Input, ...]
    cost_per_mmol: float | None = None
    forgiven: tuple[str, ...] = ()
    product: str | None = None
    findings: tuple[tuple[str, str], ...] = ()
    plan: Plan | None = None
    assessment: Assessment | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Route:
    """A whole sequence; steps in an order in which they can be run.

    Attributes:
        target_mmol: wanted of the last product; None = 1 mmol is reckoned with.
        target_molar_mass: g/mol; None = not known.
        money: word for prices ("EUR"); "" = not said.
    """

    title: str
    steps: tuple[Step, ...]
    materials: tuple[Material, ...]
    target_mmol: float | None = None
    target_molar_mass: float | None = None
    money: str = ""

    def __post_init__(self) -> None:
        if not self.steps:
            raise InvalidRecord("The route has no steps.", "Give at least one [[step]].")
        known = [m.name for m in self.materials]
        names = [step.name for step in self.steps]
        for place, step in enumerate(self.steps):
            if step.name in known:
                raise InvalidRecord(
                    f"Two things are called {step.name!r}.", "Name each step and material once.", step.name
                )
            if not step.inputs:
                raise InvalidRecord(f"Step {step.name!r} takes nothing.", "Say what it is made from.", step.name)
            for one in step.inputs:
                if one.name in names[place:] and one.name not in known:
                    raise InvalidRecord(
                        f"Step {step.name!r} takes {one.name!r}, which is made only "
                        f"{'in it' if one.name == step.name else 'after it'}.",
                        "Write the steps in the order in which they are run; a route cannot go in a circle.",
                        one.name,
                    )
                if one.name not in known:
                    raise InvalidRecord(
                        f"Step {step.name!r} takes {one.name!r}, which is no material and no earlier step.",
                        f"Known by then: {', '.join(known) or 'nothing'}.",
                        one.name,
                    )
                if not (math.isfinite(one.equiv) and one.equiv > 0):
                    raise InvalidRecord(
                        f"Step {step.name!r} takes {one.equiv:g} equiv of {one.name!r}.",
                        "Give more than zero.",
                        one.equiv,
                    )
            known.append(step.name)
        used = {one.name for step in self.steps for one in step.inputs}
        ends = [step.name for step in self.steps if step.name not in used]
        if len(ends) != 1 or ends[0] != self.steps[-1].name:
            raise InvalidRecord(
                f"The route has {len(ends)} ends: {', '.join(ends)}.",
                "Every step but the last must go into a later one; a branch names its join with `from`.",
                ends,
            )
        if self.target_mmol is not None and not (math.isfinite(self.target_mmol) and self.target_mmol > 0):
            raise InvalidRecord(
                "The target amount is not above zero.", 'Write it as "2 g" or "5 mmol".', self.target_mmol
            )

    @property
    def main_line(self) -> tuple[Step, ...]:
        """Return the steps from the main starting material to the end, following first inputs."""
        by_name = {step.name: step for step in self.steps}
        line = [self.steps[-1]]
        while (before := by_name.get(line[0].inputs[0].name)) is not None:
            line.insert(0, before)
        return tuple(line)

    def step(self, name: str) -> Step:
        """Return a step by name.

        Raises:
            RecordNotFound: no step has that name.
        """
        found = next((step for step in self.steps if step.name == name), None)
        if found is None:
            raise RecordNotFound(
                f"The route has no step {name!r}.", f"Its steps: {', '.join(s.name for s in self.steps)}.", name
            )
        return found

    def line_from(self, name: str) -> tuple[Step, ...] | None:
        """Return the steps that a material or a step's product passes to the end.

        None where it, or something made of it, is taken at more than one place.
        """
        line: list[Step] = []
        while True:
            takers = [s for s in self.steps for one in s.inputs if one.name == name]
            if not takers:
                return tuple(line)
            if len(takers) > 1:
                return None
            line.append(takers[0])
            name = takers[0].name

    def joins(self, name: str) -> tuple[str, float] | None:
        """Return the step that takes `name`, with the equivalents; None for the last step."""
        for step in self.steps:
            for one in step.inputs:
                if one.name == name:
                    return step.name, one.equiv
        return None


def molar_mass_of(smiles: str) -> float | None:
    """Return the molar mass of a SMILES [g/mol]; None where it cannot be read."""
    from rdkit import Chem, rdBase
    from rdkit.Chem import Descriptors

    blocked = rdBase.BlockLogs()
    try:
        mol: Any = Chem.MolFromSmiles(smiles)
    finally:
        del blocked
    return round(float(Descriptors.MolWt(mol)), 3) if mol is not None else None  # type: ignore[attr-defined]
