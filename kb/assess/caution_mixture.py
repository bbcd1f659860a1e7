"""Everything that will be in the flask, as molecules, with where each came from.

It owns the gathering (scheme, products, recorded components and solvents) and the plain facts about the
vessel and the scale that hazard tables ask for. It judges nothing. What cannot be read is passed over.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING

from kb.assess.liability_rule import compile_motif
from kb.materials.catalogue import Reagent, load_catalogue
from kb.materials.profile import ConditionProfile
from kb.record.conditions import Conditions

if TYPE_CHECKING:
    from rdkit import Chem

CLOSED_WORDS = (
    "sealed",
    "closed",
    "autoclave",
    "microwave",
    "pressure",
    "bomb",
    "parr",
    "schlenk bomb",
    "crimp",
    "screw cap",
)
"""Words in a vessel's name that say it is closed (common practice); they win over OPEN_WORDS, since a tube that is
sealed is sealed whatever else stands beside it, and a warning too many costs less than one too few."""

OPEN_WORDS = ("open", "condenser", "reflux", "vented", "bubbler")
"""Words that say it is open."""

WEAKEST_ACID_PKA = 9.5
"""pKa up to which an acid counts as one that frees a toxic gas from its salt: ammonium is the weakest (a judgement)."""

_NEGATED = re.compile(
    r"\b(?:no|not|never|without|nor)\b(?:\s+(?:a|an|the|yet|any|to|be|under|in|reflux))*\s+[\w-]+(?:\s+condenser)?"
    r"|\bun-?(?:sealed|closed|opened|vented)\b"
)
_NOT_THE_VESSEL = re.compile(
    r"\b(?:atmospheric|ambient|normal|reduced) pressure|\bpressure[- ]equali[sz]\w*|\bclosed (?:fume )?hood"
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Ingredient:
    """One molecule of the mixture.

    Attributes:
        mol: parsed.
        smiles: canonical, without atom maps.
        component: left-side fragment it is; None = named only, or a product.
        is_solvent: named as a solvent.
        is_product: on the right side.
    """

    mol: Chem.Mol
    smiles: str
    component: int | None = None
    is_solvent: bool = False
    is_product: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class Mixture:
    """The flask.

    Attributes:
        ingredients: scheme first, then products, components, solvents; each structure once per origin.
        profile: what the conditions are.
        conditions: as recorded.
        is_closed: vessel said to be closed; None = not said.
    """

    ingredients: tuple[Ingredient, ...]
    profile: ConditionProfile
    conditions: Conditions
    is_closed: bool | None

    @property
    def scale_mmol(self) -> float | None:
        """Return the recorded scale [mmol], None = not recorded."""
        return self.conditions.scale_mmol

    def first_with(self, smarts: str) -> tuple[Ingredient, tuple[int, ...]] | None:
        """Return the first ingredient that holds a motif, with the atoms of one match."""
        pattern, _ = compile_motif(smarts)
        for ingredient in self.ingredients:
            if hit := ingredient.mol.GetSubstructMatch(pattern):
                return ingredient, tuple(hit)
        return None

    def first_acid(self) -> str | None:
        """Return the name of the first catalogued acid on the left side or among the components; None = none."""
        known = load_catalogue().reagent_by_smiles
        entries = (known.get(i.smiles) for i in self.ingredients if not i.is_product and not i.is_solvent)
        return next((e.name for e in entries if e is not None and _is_acid(e)), None)


def build_mixture(
    fragments: Sequence[str], products: Sequence[str], conditions: Conditions, profile: ConditionProfile
) -> Mixture:
    """Gather the flask; see the module."""
    entries: list[tuple[str, int | None, bool, bool]] = [(s, i, False, False) for i, s in enumerate(fragments)]
    entries += [(part, None, False, True) for text in products for part in text.split(".")]
    entries += [(c.smiles, None, False, False) for c in conditions.components if c.smiles]
    entries += [(s.smiles, None, True, False) for s in conditions.solvents if s.smiles]
    ingredients = []
    for text, component, is_solvent, is_product in entries:
        read = _read(text)
        if read is not None:
            ingredients.append(
                Ingredient(
                    mol=read[0], smiles=read[1], component=component, is_solvent=is_solvent, is_product=is_product
                )
            )
    return Mixture(
        ingredients=tuple(ingredients),
        profile=profile,
        conditions=conditions,
        is_closed=is_vessel_closed(conditions.vessel),
    )


def is_vessel_closed(vessel: str | None) -> bool | None:
    """Return True for "sealed tube", False for "flask with condenser", None where it is not said.

    A word that is negated ("no condenser", "not sealed") says nothing.

    >>> is_vessel_closed("sealed tube, no reflux condenser"), is_vessel_closed("flask, not sealed")
    (True, None)
    """
    if not vessel:
        return None
    words = _NEGATED.sub(" ", _NOT_THE_VESSEL.sub(" ", vessel.lower()))
    if any(re.search(rf"\b{word}", words) for word in CLOSED_WORDS):
        return True
    return False if any(re.search(rf"\b{word}", words) for word in OPEN_WORDS) else None


def _is_acid(entry: Reagent) -> bool:
    is_strong_enough = entry.pka is None or entry.pka <= WEAKEST_ACID_PKA
    return entry.acidity == "strong" or (entry.acidity == "weak" and is_strong_enough)


@lru_cache(maxsize=512)
def _read(smiles: str) -> tuple[Chem.Mol, str] | None:
    from rdkit import Chem, rdBase

    with rdBase.BlockLogs():
        mol = Chem.MolFromSmiles(smiles)
    if mol is None:
        return None
    plain = Chem.Mol(mol)
    for atom in plain.GetAtoms():
        atom.SetAtomMapNum(0)
    return mol, Chem.MolToSmiles(plain)
