"""What goes into the flask: one component, one solvent part.

None = not recorded, 0 = measured zero. Amounts are what the chemist gave; nothing is worked out here.
"""

from __future__ import annotations

from dataclasses import dataclass

from kb.errors import InvalidRecord
from kb.vocabulary import Role


def _refuse_negative(what: str, name: str, value: float | None) -> None:
    if value is not None and not 0 <= value < float("inf"):
        raise InvalidRecord(f"{name}: {what} is {value:g}, which cannot be.", "Give a number of zero or more.", value)


@dataclass(frozen=True, slots=True, kw_only=True)
class Component:
    """One reagent, base, acid or additive.

    Attributes:
        role: what it does.
        name: as the chemist wrote it ("NaN3"); never empty.
        smiles: canonical SMILES, from the catalogue or the entry; None = not known.
        equiv: equivalents to the substrate.
        amount_mmol, mass_mg, volume_ml, conc_molar, loading_mol_pct: as given.
    """

    role: Role
    name: str
    smiles: str | None = None
    equiv: float | None = None
    amount_mmol: float | None = None
    mass_mg: float | None = None
    volume_ml: float | None = None
    conc_molar: float | None = None
    loading_mol_pct: float | None = None

    def __post_init__(self) -> None:
        if not self.name.strip():
            raise InvalidRecord("A component has no name.", "Give its name or SMILES.")
        for what in ("equiv", "amount_mmol", "mass_mg", "volume_ml", "conc_molar", "loading_mol_pct"):
            _refuse_negative(what, self.name, getattr(self, what))


@dataclass(frozen=True, slots=True, kw_only=True)
class SolventPart:
    """One solvent and its share by volume (parts, any scale; None = not recorded)."""

    name: str
    smiles: str | None = None
    parts: float | None = None

    def __post_init__(self) -> None:
        if not self.name.strip():
            raise InvalidRecord("A solvent has no name.", "Give its name or SMILES.")
        _refuse_negative("parts", self.name, self.parts)
