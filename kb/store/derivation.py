"""A run or a plan, read: the derived facts that similarity, evidence and search rest on.

It owns the recipe: what is worked out, with what, under which name. A change of anything that could change a stored
fact must change `RECIPE`; books then rebuild their facts instead of mixing two recipes. It judges nothing.
"""

from __future__ import annotations

import contextlib
import dataclasses
import json
import re
import sys
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import cache, lru_cache
from typing import TYPE_CHECKING, Any
from uuid import UUID

from kb.chem.facts import Reading
from kb.chem.screens_keys import BLOBS_RECIPE
from kb.materials.profile import ConditionProfile
from kb.record.conditions import Conditions
from kb.record.derived import CENTRE_BITS, DerivedFacts
from kb.record.run import Run
from kb.vocabulary import Confidence, Fate, Role

if TYPE_CHECKING:
    from kb.chem.scheme import Scheme
    from kb.record.plan import Plan

RECIPE = "facts/5"
"""Name of what makes DerivedFacts; the screens' and RDKit's are appended where facts are stored."""

MORGAN_RADIUS = 2
"""Bonds around the centre that its environment fingerprint reaches."""

_PROFILE_FIELDS = frozenset(field.name for field in dataclasses.fields(ConditionProfile))
_NO_RUN = UUID(int=0)
_LONE_CATION = re.compile(r"\[[A-Z][a-z]?\+\d?\]")


@dataclass(frozen=True, slots=True, kw_only=True)
class Account:
    """Everything read from a scheme and its conditions, before any judgement.

    Attributes:
        reading: what the scheme does.
        fragments: SMILES of the left-side fragments as entered, in component order.
        products: SMILES of the right-side fragments as entered.
        profile: what the conditions are.
        facts: the flat values that are stored and compared.
    """

    reading: Reading
    fragments: tuple[str, ...]
    products: tuple[str, ...]
    profile: ConditionProfile
    facts: DerivedFacts


def account_of_plan(plan: Plan) -> Account:
    """Read a plan; a scheme that cannot be read gives `reading.ok` False and facts without a centre."""
    return _account(plan.scheme, plan.conditions, _NO_RUN)


def account_of_run(run: Run) -> Account:
    """Read a run, by its scheme and conditions; the outcome is left out."""
    return _account(run.scheme, run.conditions, run.run_id)


def derive(run: Run) -> DerivedFacts:
    """Return the facts to store beside a run."""
    return dataclasses.replace(_account_to_store(run.scheme, run.conditions).facts, run_id=run.run_id)


@cache
def current_recipe() -> str:
    """Return the recipe's name with those of the screens and of the RDKit that carries it out; loads no RDKit."""
    return f"{RECIPE} {BLOBS_RECIPE} rdkit/{_rdkit_version()}"


def _rdkit_version() -> str:
    """Return the version as the package states it: "2026.9.1".

    Where RDKit is loaded already it is taken from there ("2026.09.1"), quicker than from the package's data.
    """
    loaded = sys.modules.get("rdkit.rdBase")
    numbers = str(getattr(loaded, "rdkitVersion", "")).split(".")
    if all(number.isdecimal() for number in numbers):
        return ".".join(str(int(number)) for number in numbers)
    from importlib.metadata import version

    return version("rdkit")


def dissect(run: Run) -> list[tuple[str, int, str]]:
    """Split a run into searchable structures.

    Returns:
        (role, position, SMILES) of every left-side fragment (substrate or reagent, by component), of every named
        component with a structure, and of every product stated or seen; canonical, without atom maps, so that one
        structure is one however it was drawn. Unreadable text gives fewer rows, no error.
    """
    account = _account_to_store(run.scheme, run.conditions)
    centre = account.reading.centre
    rows: list[tuple[str, int, str]] = []
    for position, smiles in enumerate(account.fragments):
        is_substrate = centre is not None and centre.component == position
        if centre is None and position == 0:
            is_substrate = True
        rows.append((Role.SUBSTRATE if is_substrate else Role.REAGENT, position, _plain_structure(smiles)))
    rows += [
        (Role.REAGENT, position, _plain_structure(component.smiles))
        for position, component in enumerate(run.conditions.components, start=len(account.fragments))
        if component.smiles
    ]
    seen = map(_plain_structure, (*account.products, *(p.smiles for p in run.outcome.products if p.smiles)))
    rows += [(Role.PRODUCT, position, smiles) for position, smiles in enumerate(dict.fromkeys(seen))]
    return rows


@lru_cache(maxsize=8192)
def _plain_structure(smiles: str) -> str:
    """Return the canonical SMILES without maps; text that cannot be read stays as it is."""
    from kb.chem.structure import canonical_smiles
    from kb.errors import StructureError

    try:
        return canonical_smiles(smiles)
    except StructureError:
        return smiles


def profile_to_json(profile: ConditionProfile) -> str:
    """Write a profile as compact JSON, sets sorted, so that equal profiles give equal text."""
    values: dict[str, Any] = {}
    for field in dataclasses.fields(profile):
        value = getattr(profile, field.name)
        if value is None or value == field.default:
            continue
        values[field.name] = sorted(value) if isinstance(value, frozenset) else value
    return json.dumps(values, separators=(",", ":"), sort_keys=True)


def profile_from_json(text: str) -> ConditionProfile:
    """Read back what `profile_to_json` wrote; unknown keys of a later program are ignored."""
    given: dict[str, Any] = json.loads(text)
    known = {k: v for k, v in given.items() if k in _PROFILE_FIELDS}
    values: dict[str, Any] = {k: frozenset(v) if isinstance(v, list) else v for k, v in known.items()}
    return ConditionProfile(**values)


@lru_cache(maxsize=16)
def _account_to_store(scheme: str, conditions: Conditions) -> Account:
    """Return the account that facts and structures are taken from: one for both, without what else could form."""
    return _account(scheme, conditions, _NO_RUN, with_possible=False)


@lru_cache(maxsize=8192)
def _read_to_store(text: str) -> Reading:
    """Read a scheme without listing what else could form; people run one scheme under many conditions."""
    from kb.chem.reading import read_scheme

    return read_scheme(text, with_possible=False)


def _account(scheme: str, conditions: Conditions, run_id: UUID, *, with_possible: bool = True) -> Account:
    from kb.chem.reading import read_scheme
    from kb.chem.scheme import parse_scheme
    from kb.errors import ChemistryError
    from kb.materials.classes import profile_of

    parsed = None
    with contextlib.suppress(ChemistryError):
        parsed = parse_scheme(scheme)
    read = read_scheme if with_possible else _read_to_store
    reading = read(scheme) if parsed is None else _read(parsed, conditions, read)
    reading = dataclasses.replace(reading, scheme=scheme)
    fragments: tuple[str, ...] = ()
    products: tuple[str, ...] = ()
    if parsed is not None and reading.ok:
        fragments = tuple(f.smiles_as_entered for f in parsed.left)
        products = tuple(f.smiles_as_entered for f in parsed.products)
    skip = reading.centre.component if reading.centre else 0
    others = [s for i, s in enumerate(fragments) if i != skip]
    profile = dataclasses.replace(
        profile_of(conditions, others),
        reagents=_reagent_keys(conditions, others),
        solvents=_solvent_names(conditions),
    )
    return Account(
        reading=reading,
        fragments=fragments,
        products=products,
        profile=profile,
        facts=_facts(reading, fragments, profile, run_id),
    )


def _read(parsed: Scheme, conditions: Conditions, read: Callable[[str], Reading]) -> Reading:
    """Read a scheme beside its conditions; protic solvents are offered when nothing else explains the product.

    A solvent is seldom what reacts, so it is asked only where the reading is unresolved or names no nucleophile for
    what bonded. Without a product, what a solvent could do is listed, but it settles no fate.
    """
    first = read(_with_named(parsed, conditions))
    solvents = _protic_solvents(conditions)
    is_open = first.confidence is Confidence.UNRESOLVED or (
        first.nucleophile is None and first.fate in (Fate.SUBSTITUTION, Fate.ADDITION, Fate.REARRANGED)
    )
    if not solvents or not first.ok:
        return first
    if parsed.products:
        if not is_open:
            return first
        second = read(_with_named(parsed, conditions, solvents))
        return second if second.nucleophile is not None and second.ok else first
    if first.possible and any(p.fate is Fate.SUBSTITUTION for p in first.possible):
        return first
    second = read(_with_named(parsed, conditions, solvents))
    same = second.centres == first.centres and second.confidence is first.confidence
    return dataclasses.replace(first, possible=second.possible) if same else first


def _protic_solvents(conditions: Conditions) -> list[str]:
    """Return the solvents that hold O-H (water, alcohols, carboxylic acids), as SMILES."""
    from kb.chem.structure import parse_molecule
    from kb.errors import StructureError

    found = []
    for solvent in conditions.solvents:
        if not solvent.smiles or "." in solvent.smiles:
            continue
        with contextlib.suppress(StructureError):
            atoms = parse_molecule(solvent.smiles).GetAtoms()
            if any(a.GetAtomicNum() == 8 and a.GetTotalNumHs() for a in atoms):
                found.append(solvent.smiles)
    return found


def _with_named(parsed: Scheme, conditions: Conditions, solvents: Sequence[str] = ()) -> str:
    """Write the scheme with the named components that it leaves out, as agents behind everything that was drawn.

    Solvents that are offered too come last. People draw "substrate >> product" and name the azide; without it the
    reading could not know what bonds. Agents are counted behind the reactants, so component numbers of what was drawn
    stay as they are.
    """
    drawn = {f.smiles for f in parsed.left}
    offered = [*(c.smiles for c in conditions.components if c.smiles), *solvents]
    named = [part for smiles in offered for part in smiles.split(".") if part not in drawn]
    sides = ([f.smiles_as_entered for f in parsed.reactants], [f.smiles_as_entered for f in parsed.agents] + named)
    products = ".".join(f.smiles_as_entered for f in parsed.products)
    return f"{'.'.join(sides[0])}>{'.'.join(sides[1])}>{products}"


def _reagent_keys(conditions: Conditions, drawn: list[str]) -> frozenset[str]:
    """Return what stands in the flask beside substrate and solvents; see `ConditionProfile.reagents`."""
    keys = {key for smiles in drawn for key in _parts_of(smiles)}
    for component in conditions.components:
        keys |= _parts_of(component.smiles) if component.smiles else {component.name.strip().lower()}
    return frozenset(keys)


def _solvent_names(conditions: Conditions) -> frozenset[str]:
    """Return what the solvents are called; see `ConditionProfile.solvents`."""
    from kb.materials.names import by_smiles

    names = set()
    for solvent in conditions.solvents:
        entry = by_smiles(solvent.smiles, "solvent") if solvent.smiles else None
        names.add(entry.name if entry is not None else solvent.name.strip())
    return frozenset(names)


@lru_cache(maxsize=4096)
def _parts_of(smiles: str) -> frozenset[str]:
    """Return the canonical SMILES of each part of a salt without maps; lone metal cations left out."""
    from kb.chem.structure import canonical_smiles
    from kb.errors import StructureError

    try:
        parts = canonical_smiles(smiles)
    except StructureError:
        return frozenset({smiles})
    return frozenset(p for p in parts.split(".") if not _LONE_CATION.fullmatch(p))


def _facts(reading: Reading, fragments: tuple[str, ...], profile: ConditionProfile, run_id: UUID) -> DerivedFacts:
    centre = reading.centre
    substrate: str | None = None
    centre_atom: int | None = None
    bits: bytes | None = None
    position = centre.component if centre else 0
    if position < len(fragments):
        substrate, centre_atom, bits = _rooted(fragments[position], centre.atom if centre else None)
    nucleophile = reading.nucleophile.nucleophile_class if reading.nucleophile else profile.nucleophile_class
    protic: bool | None = None
    if not profile.has_unknown_solvent or profile.solvent_classes:
        protic = "protic" in profile.solvent_classes
    return DerivedFacts(
        run_id=run_id,
        recipe=current_recipe(),
        confidence=str(reading.confidence),
        fate=str(reading.fate) if reading.fate else None,
        carbon_class=str(centre.carbon_class) if centre else None,
        leaving_group=str(centre.leaving_group) if centre and centre.leaving_group else None,
        nucleophile_class=nucleophile,
        flags=",".join(sorted(centre.flags)) if centre else "",
        beta_hydrogens=centre.beta_hydrogens if centre else None,
        is_stereocentre=centre.is_stereocentre if centre else False,
        substrate=substrate,
        centre_atom=centre_atom,
        centre_bits=bits,
        base_pkah=profile.base_pkah,
        base_bulk=profile.base_bulk,
        swain_scott_n=profile.swain_scott_n,
        acidity=profile.acidity,
        lewis_acid=profile.lewis_acid,
        halophile=profile.halophile,
        protic=protic,
        permittivity=profile.permittivity,
        et30_kcal_mol=profile.et30_kcal_mol,
        winstein_y=profile.winstein_y,
        temperature_c=profile.temperature_c,
        time_h=profile.time_h,
        profile_json=profile_to_json(profile),
    )


@lru_cache(maxsize=4096)
def _rooted(smiles: str, atom: int | None) -> tuple[str | None, int | None, bytes | None]:
    """Return canonical SMILES without maps, the atom's place in it, and its environment bits."""
    from rdkit import Chem, DataStructs
    from rdkit.Chem import rdFingerprintGenerator

    from kb.chem.structure import parse_molecule
    from kb.errors import StructureError

    try:
        mol = parse_molecule(smiles)
    except StructureError:
        return None, None, None
    for a in mol.GetAtoms():
        a.SetAtomMapNum(0)
    canonical = Chem.MolToSmiles(mol)
    if atom is None or atom >= mol.GetNumAtoms():
        return canonical, None, None
    order = list(mol.GetPropsAsDict(includePrivate=True, includeComputed=True)["_smilesAtomOutputOrder"])
    generator = rdFingerprintGenerator.GetMorganGenerator(radius=MORGAN_RADIUS, fpSize=CENTRE_BITS)
    fingerprint = generator.GetFingerprint(mol, fromAtoms=[atom])
    return canonical, order.index(atom), DataStructs.BitVectToBinaryText(fingerprint)
