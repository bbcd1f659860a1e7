"""Cells joined with what the program knows: names to structures, products to fates, schemes checked.

It owns those lookups for files. A name that the catalogue does not hold is kept without a structure and counted, never
refused and never replaced by one that looks alike: whoever imports is told and may mend it.
"""

from __future__ import annotations

import dataclasses
from collections import Counter
from collections.abc import Sequence
from functools import lru_cache

from kb.errors import InvalidRecord, NameUnknown, QuantityError
from kb.exchange.cells import ProductText, shown
from kb.exchange.material_cells import MaterialText, read_materials, read_solvents
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
    return tuple(_component(item, role, unknown_names) for item in read_materials(text))


def solvents_in(text: str, unknown_names: Counter[str] | None = None) -> tuple[SolventPart, ...]:
    """Return the solvents of one cell, structures looked up by name.

    The cell is first tried as one label ("80% EtOH", "aq. acetone"), then as a list or a mixture.

    Raises:
        QuantityError, InvalidRecord: as `read_solvents`, or a structure in braces that is none.
    """
    whole = _as_label(text)
    if whole is not None:
        return whole
    found: list[SolventPart] = []
    for name, smiles, parts in read_solvents(text):
        if smiles is not None:
            found.append(SolventPart(name=name, smiles=checked_structure(smiles), parts=parts))
            continue
        label = _as_label(name)
        if label is None:
            _count(unknown_names, name)
            found.append(SolventPart(name=name, parts=parts))
        elif len(label) == 1:
            found.append(dataclasses.replace(label[0], parts=parts if parts is not None else label[0].parts))
        else:
            found += label
    return tuple(found)


def checked_structure(smiles: str) -> str:
    """Return the canonical SMILES.

    Raises:
        InvalidRecord: no structure.
    """
    from kb.materials.resolving import canonical_smiles

    canonical = canonical_smiles(smiles)
    if canonical is None:
        raise InvalidRecord(f"{shown(smiles)} is no structure.", "Give a SMILES.", smiles)
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
    split: Sequence[tuple[Fate, float]],
    products: Sequence[ProductText],
    method: Method | None,
    scheme: str = "",
) -> tuple[ProductSeen, ...]:
    """Join a split by fate with products by structure: the structures come first, each fate's rest follows.

    A product without a fate gets the one that reading substrate and product together gives, else `other`.
    """
    seen: list[ProductSeen] = []
    by_structure: dict[Fate, float] = {}
    for product in products:
        fate = product.fate or _fate_of(scheme, product.smiles)
        if product.share is not None:
            by_structure[fate] = by_structure.get(fate, 0.0) + product.share
        seen.append(
            ProductSeen(
                fate=fate,
                smiles=checked_structure(product.smiles),
                share=product.share,
                method=method if product.share is not None else None,
            )
        )
    for fate, share in split:
        rest = round(share - by_structure.get(fate, 0.0), 9)
        if fate not in by_structure or rest > 0.005:
            seen.append(ProductSeen(fate=fate, share=max(rest, 0.0), method=method))
    return tuple(seen)


def check_scheme(text: str) -> None:
    """Refuse a scheme whose structures cannot be understood.

    Raises:
        StructureError: with the fragment and the reason.
    """
    from kb.chem.scheme import parse_scheme

    parse_scheme(text)


def _component(item: MaterialText, role: Role, unknown_names: Counter[str] | None) -> Component:
    if item.smiles is not None:
        return Component(role=role, name=item.name, smiles=checked_structure(item.smiles), **item.amounts)
    meaning = _meaning(item.name)
    if meaning is None:
        _count(unknown_names, item.name)
        return Component(role=role, name=item.name, **item.amounts)
    smiles, conc_molar = meaning
    amounts = {"conc_molar": conc_molar, **item.amounts} if conc_molar is not None else item.amounts
    return Component(role=role, name=item.name, smiles=smiles, **amounts)


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


def _count(unknown_names: Counter[str] | None, name: str) -> None:
    """Count an unknown name."""
    if unknown_names is not None:
        unknown_names[
            name if name in unknown_names or len(unknown_names) < MOST_UNKNOWN_NAMES else "(other names)"
        ] += 1


def _fate_of(scheme: str, product: str) -> Fate:
    from kb.chem.reading import read_scheme

    left = scheme.split(">")[0]
    return read_scheme(f"{left}>>{product}").fate or Fate.OTHER
