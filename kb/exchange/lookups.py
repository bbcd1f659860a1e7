"""Cells joined with what the program knows: names to structures, products to fates, schemes checked.

It owns those lookups for files. A name that the catalogue does not hold is kept without a structure and counted, never
refused and never replaced by one that looks alike: whoever imports is told and may mend it.
"""

from __future__ import annotations

import dataclasses
from collections import Counter
from collections.abc import Sequence
from functools import lru_cache
from typing import Any

from kb.errors import ChemistryError, InvalidRecord, NameUnknown, QuantityError
from kb.exchange.cells import ProductText
from kb.exchange.material_cells import read_materials, read_solvents
from kb.plain import quoted
from kb.record.component import Component, SolventPart
from kb.record.outcome import ProductSeen
from kb.vocabulary import Fate, Method, Role

MOST_UNKNOWN_NAMES = 10_000
"""Past so many different unknown names the rest are counted together, so that memory stays bounded."""


def materials_in(text: str, role: Role, unknown_names: Counter[str] | None = None) -> tuple[Component, ...]:
    """Return the components of one cell, structures looked up by name.

    Raises:
        QuantityError, InvalidRecord: as `read_materials`, or a structure in braces that is none.
    """
    components, unknown = _materials_of(text, role)
    _count(unknown_names, unknown)
    return components


def solvents_in(text: str, unknown_names: Counter[str] | None = None) -> tuple[SolventPart, ...]:
    """Return the solvents of one cell, structures looked up by name.

    The cell is first tried as one label ("80% EtOH", "aq. acetone"), then as a list or a mixture; "10% MeOH in DCM" is
    a mixture here, though it would be a solution on a bottle.

    Raises:
        QuantityError, InvalidRecord: as `read_solvents`, or a structure in braces that is none.
    """
    solvents, unknown = _solvents_of(text)
    _count(unknown_names, unknown)
    return solvents


def checked_structure(smiles: str) -> str:
    """Return the canonical SMILES.

    Raises:
        InvalidRecord: no structure.
    """
    from kb.materials.resolving import canonical_smiles

    canonical = canonical_smiles(smiles)
    if canonical is None:
        raise InvalidRecord(f"{quoted(smiles)} is no structure.", "Give a SMILES.", smiles)
    return canonical


def checked_motif(smarts: str) -> str:
    """Return the motif as written.

    Raises:
        QueryError: no usable SMARTS.
    """
    from kb.chem.query import parse_query

    parse_query(smarts)
    return smarts


def products_seen(
    split: Sequence[tuple[Fate, float | None]],
    products: Sequence[ProductText],
    method: Method | None,
    scheme: str = "",
) -> tuple[ProductSeen, ...]:
    """Join a split by fate with products by structure: the structures come first, each fate's rest follows.

    A product without a fate gets the one that reading substrate and product together gives, else `other`. The only
    product of its fate, given without a share, takes the share that the split gives to that fate.
    """
    seen: list[ProductSeen] = []
    by_structure: dict[Fate, float] = {}
    shares = dict(split)
    products = [p if p.fate else dataclasses.replace(p, fate=_fate_of(scheme, p.smiles)) for p in products]
    of_fate = Counter(p.fate for p in products)
    for product in products:
        fate = product.fate or Fate.OTHER
        share = product.share
        if share is None and of_fate[fate] == 1:
            share = shares.get(fate)
        if share is not None:
            by_structure[fate] = by_structure.get(fate, 0.0) + share
        seen.append(
            ProductSeen(
                fate=fate,
                smiles=checked_structure(product.smiles),
                share=share,
                method=method if share is not None else None,
            )
        )
    for fate, total in split:
        if total is None:
            if not of_fate[fate]:
                seen.append(ProductSeen(fate=fate))
            continue
        rest = round(total - by_structure.get(fate, 0.0), 9)
        if fate not in by_structure or rest > 0:
            seen.append(ProductSeen(fate=fate, share=max(rest, 0.0), method=method))
    return tuple(seen)


def check_scheme(text: str) -> None:
    """Refuse a scheme whose structures cannot be understood.

    Raises:
        StructureError: with the fragment and the reason.
    """
    from kb.chem.scheme import parse_scheme

    sides = text.split(">")
    if len(sides) == 3 and sides[0] and all(is_structure(f) for side in sides for f in side.split(".") if side):
        return
    parse_scheme(text)


@lru_cache(maxsize=4096)
def is_structure(fragment: str) -> bool:
    """Return whether the text is a structure by itself; far quicker than reading the whole scheme."""
    from kb.chem.structure import parse_molecule

    try:
        parse_molecule(fragment)
    except ChemistryError:
        return False
    return True


@lru_cache(maxsize=4096)
def _materials_of(text: str, role: Role) -> tuple[tuple[Component, ...], tuple[str, ...]]:
    """Return the components of a cell and those of their names that are not known."""
    found: list[Component] = []
    unknown: list[str] = []
    for item in read_materials(text):
        amounts: dict[str, Any] = dict(item.amounts)
        smiles = checked_structure(item.smiles) if item.smiles is not None else None
        meaning = (smiles, None) if smiles else _meaning(item.name)
        if meaning is None:
            unknown.append(item.name)
        known_smiles, conc_molar = meaning or (None, None)
        fields = {"conc_molar": conc_molar, **amounts}
        found.append(Component(role=role, name=item.name, smiles=known_smiles, **fields))
    return tuple(found), tuple(unknown)


@lru_cache(maxsize=4096)
def _solvents_of(text: str) -> tuple[tuple[SolventPart, ...], tuple[str, ...]]:
    """Return the solvents of a cell and those of their names that are not known."""
    whole = _as_label(text) if " in " not in text else None
    if whole is not None:
        return whole, ()
    found: list[SolventPart] = []
    unknown: list[str] = []
    for name, smiles, parts in read_solvents(text):
        label = _as_label(name) if smiles is None else None
        if smiles is not None:
            found.append(SolventPart(name=name, smiles=checked_structure(smiles), parts=parts))
        elif label is None:
            unknown.append(name)
            found.append(SolventPart(name=name, parts=parts))
        elif len(label) == 1:
            found.append(dataclasses.replace(label[0], parts=parts if parts is not None else label[0].parts))
        else:
            found += label
    return tuple(found), tuple(unknown)


@lru_cache(maxsize=4096)
def _meaning(name: str) -> tuple[str | None, float | None] | None:
    """Return (canonical SMILES, concentration that the label states [mol/L]); None for a name that is not known."""
    from kb.materials.resolving import resolve_component

    try:
        component = resolve_component(name, Role.REAGENT)
    except (NameUnknown, QuantityError, InvalidRecord):
        return None
    return component.smiles, component.conc_molar


@lru_cache(maxsize=4096)
def _as_label(text: str) -> tuple[SolventPart, ...] | None:
    """Return the solvents that a label means by itself, None where the catalogue does not know it."""
    from kb.materials.resolving import resolve_solvents

    try:
        return resolve_solvents(text)
    except (NameUnknown, QuantityError, InvalidRecord):
        return None


def _count(unknown_names: Counter[str] | None, names: Sequence[str]) -> None:
    """Count unknown names."""
    if unknown_names is None:
        return
    for name in names:
        is_countable = name in unknown_names or len(unknown_names) < MOST_UNKNOWN_NAMES
        unknown_names[name if is_countable else "(other names)"] += 1


def _fate_of(scheme: str, product: str) -> Fate:
    from kb.chem.reading import read_scheme

    left = scheme.split(">")[0]
    return read_scheme(f"{left}>>{product}").fate or Fate.OTHER
