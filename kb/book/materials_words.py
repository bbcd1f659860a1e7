"""Looking a material up for a front end: the entry as plain values, and near names offered, never taken."""

from __future__ import annotations

import dataclasses
from typing import Any

KINDS = ("solvent", "reagent")
"""The two tables of the catalogue; a name may be in both."""


def lookup_material(text: str, kind: str | None = None) -> dict[str, Any]:
    """Return what a name may mean.

    Args:
        text: name, synonym, label or SMILES.
        kind: "solvent" or "reagent"; None = both.

    Returns:
        `query`, `match` (the entry's fields with its kind, or None), `also` (the other kind, where the same name is in
        that table too, with the name it has there) and `offers` (name, kind, likeness 0..100).

    Raises:
        InvalidRecord: another kind.
    """
    from kb.errors import InvalidRecord

    if kind is not None and kind not in KINDS:
        raise InvalidRecord(f"{kind!r} is no kind of material.", "Use solvent or reagent.", kind)
    entry, offers = _found(text, kind)
    others = [_found(text, other)[0] for other in KINDS if other != (kind or (entry and _kind(entry)))]
    also = [{"name": o.name, "kind": _kind(o)} for o in others if o is not None and o is not entry]
    match = None
    if entry is not None:
        match = {"name": entry.name, "kind": _kind(entry)} | {
            k: sorted(v) if isinstance(v, frozenset) else v for k, v in dataclasses.asdict(entry).items() if k != "name"
        }
    return {"query": text, "match": match, "also": also, "offers": offers}


def complete_material(text: str, kind: str | None = None, limit: int = 8) -> list[dict[str, str]]:
    """Return names that begin with what was typed so far, shown names before synonyms, short ones first.

    Args:
        text: the beginning of a name, in any case.
        kind: "solvent" or "reagent"; None = both.
        limit: how many at most.

    Returns:
        `name` (as it would be written on) and `entry` (the name shown for it) of each, one per entry.
    """
    from kb.materials.catalogue import load_catalogue

    start = text.strip().casefold()
    found: list[tuple[bool, int, str, str]] = []
    for entry in load_catalogue() if start else ():
        if kind is not None and kind != _kind(entry):
            continue
        begin = [name for name in (entry.name, *entry.synonyms) if name.casefold().startswith(start)]
        if begin:
            best = entry.name if entry.name in begin else min(begin, key=len)
            found.append((best != entry.name, len(best), best, entry.name))
    return [{"name": name, "entry": shown} for _, _, name, shown in sorted(found)[:limit]]


def _found(text: str, kind: str | None) -> tuple[Any, list[dict[str, Any]]]:
    """Return the entry that a text means, or None, and the near names."""
    from kb.materials.names import by_smiles, find_material

    found = find_material(text, kind)
    entry = found.exact if found.exact is not None else _by_structure(text, kind, by_smiles)
    offers = [
        {"name": o.entry.name, "kind": _kind(o.entry), "score": round(o.score, 1)}
        for o in found.offers
        if o.entry is not entry
    ]
    return entry, offers


def _by_structure(text: str, kind: str | None, by_smiles: Any) -> Any:
    from kb.errors import ChemistryError
    from kb.logs import tame_rdkit

    if len(text) > _LONGEST_STRUCTURE:
        return None
    tame_rdkit()
    from kb.chem.structure import canonical_smiles

    try:
        return by_smiles(canonical_smiles(text), kind)
    except ChemistryError:
        return None


def _kind(entry: Any) -> str:
    return type(entry).__name__.lower()


_LONGEST_STRUCTURE = 500
"""No material of the catalogue is written in more characters."""
