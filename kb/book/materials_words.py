"""Looking a material up for a front end: the entry as plain values, and near names offered, never taken."""

from __future__ import annotations

import dataclasses
from typing import Any


def lookup_material(text: str, kind: str | None = None) -> dict[str, Any]:
    """Return what a name may mean.

    Args:
        text: name, synonym, label or SMILES.
        kind: "solvent" or "reagent"; None = both.

    Returns:
        `query`, `match` (the entry's fields with its kind, or None) and `offers` (name, kind, likeness 0..100).
    """
    from kb.errors import InvalidRecord
    from kb.materials.names import by_smiles, find_material

    if kind not in (None, "solvent", "reagent"):
        raise InvalidRecord(f"{kind!r} is no kind of material.", "Use solvent or reagent.", kind)
    found = find_material(text, kind)
    entry = found.exact
    if entry is None:
        entry = _by_structure(text, kind, by_smiles)
    offers = [
        {"name": o.entry.name, "kind": _kind(o.entry), "score": round(o.score, 1)}
        for o in found.offers
        if o.entry is not entry
    ]
    match = None
    if entry is not None:
        match = {"name": entry.name, "kind": _kind(entry)} | {
            k: sorted(v) if isinstance(v, frozenset) else v for k, v in dataclasses.asdict(entry).items() if k != "name"
        }
    return {"query": text, "match": match, "offers": offers}


def _by_structure(text: str, kind: str | None, by_smiles: Any) -> Any:
    from kb.chem.structure import canonical_smiles
    from kb.errors import ChemistryError

    try:
        return by_smiles(canonical_smiles(text), kind)
    except ChemistryError:
        return None


def _kind(entry: Any) -> str:
    return type(entry).__name__.lower()
