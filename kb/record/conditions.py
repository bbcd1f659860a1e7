"""The conditions of a run or a plan, as recorded.

None = not recorded. The classes that rules ask about are worked out from these by `kb.materials.classes`.
"""

from __future__ import annotations

from dataclasses import dataclass

from kb.errors import InvalidRecord
from kb.quantity import Duration, Temperature
from kb.record.component import Component, SolventPart


@dataclass(frozen=True, slots=True, kw_only=True)
class Conditions:
    """Everything about how a step is carried out.

    Attributes:
        components: reagents, bases, acids, additives, in the order given.
        solvents: with parts by volume.
        temperature, time: text and value.
        conc_molar: substrate concentration [mol/L].
        scale_mmol: substrate amount [mmol].
        atmosphere, vessel, workup: free words ("N2", "sealed tube", "NaHCO3 wash").
    """

    components: tuple[Component, ...] = ()
    solvents: tuple[SolventPart, ...] = ()
    temperature: Temperature | None = None
    time: Duration | None = None
    conc_molar: float | None = None
    scale_mmol: float | None = None
    atmosphere: str | None = None
    vessel: str | None = None
    workup: str | None = None

    def __post_init__(self) -> None:
        for what in ("conc_molar", "scale_mmol"):
            value = getattr(self, what)
            if value is not None and not 0 <= value < float("inf"):
                raise InvalidRecord(f"{what} is {value:g}, which cannot be.", "Give a number of zero or more.", value)
