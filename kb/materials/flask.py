"""What is in the flask: the recorded components and the fragments of the scheme, each known or said to be unknown.

It owns the bookkeeping: nothing is counted twice, salts that came apart in a scheme are read ion by ion, and what
the catalogue does not hold is judged by its structure. What the contents amount to together is for
`acid_base.py`, `in_situ.py` and `classes.py`.

A fragment that is only a solvent is a solvent; one that also acts (acetic acid, pyridine, methanol, water) counts
as a reagent too. Water and solvents in a scheme may belong to the work-up, which a scheme does not tell.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field, replace

from kb.errors import NameUnknown
from kb.materials.catalogue import Reagent, Solvent, load_catalogue
from kb.materials.medium import Medium, medium_of
from kb.materials.names import ParsedMaterial, parse_material
from kb.materials.structural import canonical_smiles, classify_structure
from kb.record.component import Component, SolventPart
from kb.record.conditions import Conditions
from kb.vocabulary import Role


@dataclass(frozen=True, slots=True, kw_only=True)
class Ingredient:
    """One thing that acts.

    Attributes:
        facts: what it does.
        role: as recorded; None for a fragment of the scheme or a solvent.
        equiv: equivalents to the substrate; None = not recorded.
        is_medium: it is (also) the solvent, so there is plenty of it.
        is_named: recorded by the chemist, not read off the scheme.
        is_structural: judged by its structure, not in the catalogue.
    """

    facts: Reagent
    role: Role | None = None
    equiv: float | None = None
    is_medium: bool = False
    is_named: bool = False
    is_structural: bool = False

    @property
    def name(self) -> str:
        """Return the name to show."""
        return self.facts.name

    def has(self, *words: str) -> bool:
        """Return True where it is of any of the classes."""
        return not self.facts.classes.isdisjoint(words)


@dataclass(frozen=True, slots=True, kw_only=True)
class Flask:
    """Everything in one flask but the substrate.

    Attributes:
        ingredients: what acts, recorded ones first.
        medium: the solvents.
        beside: solvents that came with a reagent ("1 M TBAF in THF") or as an additive, beside the recorded medium.
        has_unknown_reagent: something could not be classified.
        is_recorded: anything at all is recorded.
        has_water: water by label, solvent or reagent.
    """

    ingredients: tuple[Ingredient, ...] = ()
    medium: Medium = field(default_factory=Medium)
    beside: tuple[Solvent, ...] = ()
    has_unknown_reagent: bool = False
    is_recorded: bool = False
    has_water: bool = False

    @property
    def solvent_classes(self) -> frozenset[str]:
        """Return the classes of the medium, and the finer ones of the solvents beside it."""
        finer = {w for s in self.beside for w in s.classes} - _COARSE
        return self.medium.classes | finer

    def having(self, *words: str) -> tuple[Ingredient, ...]:
        """Return the ingredients of any of the classes."""
        return tuple(i for i in self.ingredients if i.has(*words))

    def has(self, *words: str) -> bool:
        """Return True where any ingredient is of any of the classes."""
        return bool(self.having(*words))


_COARSE = {"protic", "polar-aprotic", "weakly-polar", "nonpolar"}


@dataclass(slots=True)
class _Gathering:
    ingredients: list[Ingredient] = field(default_factory=list)
    implied: list[Solvent] = field(default_factory=list)
    in_scheme: list[Solvent] = field(default_factory=list)
    covered: set[str] = field(default_factory=set)
    has_unknown: bool = False
    has_water: bool = False


def fill(conditions: Conditions, scheme_fragments: Sequence[str] = ()) -> Flask:
    """Return what is in the flask.

    Args:
        conditions: as recorded; components with role substrate or product are passed over.
        scheme_fragments: SMILES of the left-side fragments of the scheme but the substrate.
    """
    got = _Gathering()
    named = [c for c in conditions.components if c.role not in (Role.SUBSTRATE, Role.PRODUCT, Role.SOLVENT)]
    for component in named:
        _add_component(got, component)
    extra = [c for c in conditions.components if c.role is Role.SOLVENT]
    medium_names = [*conditions.solvents, *(_as_part(c) for c in extra)]
    for part in medium_names:
        got.covered |= _fragments_of(part.smiles or canonical_smiles(part.name))
    medium = medium_of(medium_names, got.implied, ())
    got.covered |= {s.smiles for s in medium.solvents}
    _add_fragments(got, scheme_fragments)
    if not medium_names and not got.implied:
        medium = medium_of((), (), got.in_scheme)
    _add_medium(got, medium)
    return Flask(
        ingredients=tuple(got.ingredients),
        medium=medium,
        beside=tuple(s for s in dict.fromkeys(got.implied) if s not in medium.solvents),
        has_unknown_reagent=got.has_unknown,
        is_recorded=bool(named or medium_names or got.ingredients or got.in_scheme or got.has_unknown),
        has_water=got.has_water
        or any("water" in s.classes for s in (*medium.solvents, *got.implied))
        or any(i.has("water") for i in got.ingredients),
    )


def _as_part(component: Component) -> SolventPart:
    return SolventPart(name=component.name, smiles=component.smiles)


def _fragments_of(smiles: str | None) -> set[str]:
    return set(smiles.split(".")) if smiles else set()


def _add_component(got: _Gathering, component: Component) -> None:
    """Add one recorded component: by name, else by its SMILES."""
    parsed = _parse(component.name)
    if parsed is not None:
        facts = parsed.entry
        got.has_water |= parsed.is_aqueous
        if parsed.solvent is not None:
            got.implied.append(parsed.solvent)
        got.covered |= _fragments_of(facts.smiles) | _fragments_of(component.smiles)
        if isinstance(facts, Solvent):
            got.implied.append(facts)
            return
        got.ingredients.append(_named(facts, component))
        if parsed.label.is_hydrochloride:
            got.ingredients.append(replace(_named(load_catalogue().reagent_by_smiles["Cl"], component), role=None))
            got.covered.add("Cl")
        return
    smiles = component.smiles or component.name
    canonical = canonical_smiles(smiles)
    if canonical is None:
        got.has_unknown = True
        return
    got.covered |= _fragments_of(canonical)
    whole = load_catalogue().reagent_by_smiles.get(canonical)
    if whole is not None:
        got.ingredients.append(_named(whole, component))
        return
    for fragment in dict.fromkeys(canonical.split(".")):
        _add_fragment(got, fragment, component)


def _parse(name: str) -> ParsedMaterial | None:
    try:
        return parse_material(name)
    except NameUnknown:
        return None


def _named(facts: Reagent, component: Component) -> Ingredient:
    equiv = component.equiv
    if equiv is None and component.loading_mol_pct is not None:
        equiv = component.loading_mol_pct / 100
    return Ingredient(facts=facts, role=component.role, equiv=equiv, is_named=True)


def _add_fragments(got: _Gathering, fragments: Iterable[str]) -> None:
    """Add the fragments of a scheme, those already recorded left out, each once."""
    catalogue = load_catalogue()
    known = (catalogue.ions, catalogue.reagent_by_smiles, catalogue.solvent_by_smiles)
    canonical: list[str] = []
    for text in fragments:
        smiles = text if any(text in names for names in known) else canonical_smiles(text)
        if smiles is None:
            got.has_unknown = True
        else:
            canonical += smiles.split(".")
    distinct = [f for f in dict.fromkeys(canonical) if f not in got.covered]
    if "[H-]" in distinct and "[Al+3]" in distinct:  # LiAlH4 come apart into its ions
        distinct = [f for f in distinct if f not in ("[H-]", "[Al+3]")] + ["[AlH4-]"]
    for fragment in distinct:
        _add_fragment(got, fragment, None)


def _add_fragment(got: _Gathering, fragment: str, component: Component | None) -> None:
    """Add one canonical fragment: an ion, an entry, a solvent, or judged by its structure."""
    catalogue = load_catalogue()
    solvent = catalogue.solvent_by_smiles.get(fragment)
    facts = catalogue.ions.get(fragment) or catalogue.reagent_by_smiles.get(fragment)
    if solvent is not None:
        (got.in_scheme if component is None else got.implied).append(solvent)
        if facts is None:
            return
    is_structural = facts is None
    if facts is None:
        facts = classify_structure(fragment)
    if facts is None:
        got.has_unknown = True
        return
    ingredient = Ingredient(facts=facts, is_structural=is_structural)
    if component is not None:
        ingredient = replace(_named(facts, component), is_structural=is_structural)
    got.ingredients.append(ingredient)


def _add_medium(got: _Gathering, medium: Medium) -> None:
    """Mark or add what the solvents themselves do: acids, bases and nucleophiles among them.

    Of a scheme, only a single solvent is sure to be the medium: beside dichloromethane, TFA or triethylamine is a
    reagent.
    """
    catalogue = load_catalogue()
    for solvent in medium.solvents:
        facts = catalogue.reagent_by_smiles.get(solvent.smiles)
        if facts is None:
            continue
        place = next((n for n, i in enumerate(got.ingredients) if i.facts.smiles == solvent.smiles), None)
        if place is None:
            got.ingredients.append(Ingredient(facts=facts, is_medium=True))
        elif not medium.is_from_scheme or len(medium.parts) == 1:
            got.ingredients[place] = replace(got.ingredients[place], is_medium=True)
