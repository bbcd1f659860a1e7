"""Finding the place of each recorded failure: from a stated motif, from what was found, or from the centre read.

It owns that order of trust. A motif that the chemist wrote down is the first witness. Without one, what the found
product lacks beside the *wanted* product was lost without being meant to be. Failing both, the place is the groups
that the substrate shares with failures of the same mode whose place is known, where there is only one such.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from functools import cache, lru_cache
from typing import Any

from kb.assess.motif import lost_atoms
from kb.assess.record_view import RecordView
from kb.assess.table import flag_words
from kb.audit.places import (
    Aspect,
    Place,
    aspect_of,
    centre_from_structure,
    centre_place,
    group_place,
    groups_in,
)
from kb.vocabulary import Fate

_ATTACKERS = ("thiol", "phenol", "hydroxyl", "amine", "carboxylic acid", "amide", "ester", "alkene")
"""Groups that attack from within, the likelier one first; for failures by participation."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Sited:
    """One failure of one run: its row, mode and place (None = the record does not show it)."""

    row: int
    mode: str
    place: Place | None


def site_failures(view: RecordView, rows: list[int]) -> list[Sited]:
    """Find the place of every failure of some rows, in their order."""
    view.fetch(row for row in rows if any(_needs_products(*failure) for failure in view.failures[row]))
    substrate = view.table.substrate
    found = {  # substrate by substrate, so that each is read once and let go of
        (row, number): _place(view, row, mode, motif)
        for row in sorted(rows, key=lambda row: substrate[row])
        for number, (mode, motif) in enumerate(view.failures[row])
    }
    sited = [
        Sited(row=row, mode=mode, place=found[row, number])
        for row in rows
        for number, (mode, _) in enumerate(view.failures[row])
    ]
    return _with_the_usual_place(view, sited)


def _needs_products(mode: str, motif: str | None) -> bool:
    return motif is None and aspect_of(mode) is Aspect.GROUP


@lru_cache(maxsize=256)
def _mol(smiles: str) -> Any:
    """Return the molecule of a SMILES, None where it cannot be read; few are kept, since a record has too many."""
    from rdkit import Chem

    return Chem.MolFromSmiles(smiles) if smiles else None


@cache
def _query(smarts: str) -> Any:
    from rdkit import Chem

    return Chem.MolFromSmarts(smarts)


def _place(view: RecordView, row: int, mode: str, motif: str | None) -> Place | None:
    aspect = aspect_of(mode)
    table = view.table
    if aspect is Aspect.HAND:
        return Place(aspect=aspect, key=("hand",), words="the work-up or the bottle, not the molecule")
    if aspect is Aspect.PARTNER:
        word = table.nucleophile_word(row)
        return Place(aspect=aspect, key=("partner", word), words=word.replace("_", " ")) if word else None
    if aspect is Aspect.MEDIUM:
        return _medium(view, row)
    if aspect is Aspect.CENTRE:
        flags = flag_words(int(table.flags[row]))
        place = centre_place(mode, table.word("carbon_class", row), flags, table.word("leaving_group", row))
        return place or _unread_centre(view, row, mode, motif)
    return _stated_group(view, row, mode, motif) or _group_from_products(view, row, mode)


def _medium(view: RecordView, row: int) -> Place | None:
    coarse = {"protic", "polar-aprotic", "weakly-polar", "nonpolar"}
    classes = sorted(view.profile(row).solvent_classes - coarse) or sorted(view.profile(row).solvent_classes)
    if not classes:
        return None
    return Place(aspect=Aspect.MEDIUM, key=("medium", classes[0]), words=f"{classes[0].replace('_', ' ')} as solvent")


def _matched(view: RecordView, row: int, motif: str | None) -> tuple[Any, frozenset[int]]:
    mol = _mol(view.table.substrate[row])
    query = _query(motif) if motif else None
    if mol is None or query is None:
        return mol, frozenset()
    return mol, frozenset(mol.GetSubstructMatch(query))


def _unread_centre(view: RecordView, row: int, mode: str, motif: str | None) -> Place | None:
    mol, atoms = _matched(view, row, motif)
    if mol is None:
        return None
    return centre_from_structure(mode, mol, atoms or frozenset(range(mol.GetNumAtoms())))


def _stated_group(view: RecordView, row: int, mode: str, motif: str | None) -> Place | None:
    mol, atoms = _matched(view, row, motif)
    if not atoms:
        return None
    words = [word for word, _ in groups_in(mol, atoms)]
    if mode == "neighbour-attack":
        words = sorted((w for w in words if w in _ATTACKERS), key=_ATTACKERS.index)
    if words:
        return group_place(words[0])
    return Place(aspect=Aspect.GROUP, key=("motif", motif or ""), words="the stated motif", smarts=motif or "")


def _group_from_products(view: RecordView, row: int, mode: str) -> Place | None:
    """Compare what was found with what was wanted; without a wanted product, with the substrate."""
    run = view.run(row)
    fates = {Fate.GROUP_LOSS, Fate.OTHER}
    wanted = [s for s in run.scheme.split(">")[-1].split(".") if s] if run.scheme.count(">") == 2 else []
    before = [m for s in wanted or [view.table.substrate[row]] if (m := _mol(s)) is not None]
    canonical = {_key(m) for m in before}
    for product in run.outcome.products:
        found = _mol(product.smiles) if product.smiles and product.fate in fates else None
        if found is None or _key(found) in canonical:
            continue
        for mol in before:
            lost = lost_atoms(mol, found)
            around = lost | {n.GetIdx() for a in lost for n in mol.GetAtomWithIdx(a).GetNeighbors()}
            words = [word for word, _ in groups_in(mol, frozenset(around))]
            if words:
                return group_place(words[0])
    return None


def _key(mol: Any) -> str:
    from rdkit import Chem

    return str(Chem.MolToSmiles(mol, isomericSmiles=False))


def _with_the_usual_place(view: RecordView, sited: list[Sited]) -> list[Sited]:
    """Give a failure without a place the place usual for its mode, where its substrate offers exactly one of them."""
    usual: dict[str, Counter[str]] = {}
    for one in sited:
        if one.place is not None and one.place.key[0] == "group":
            usual.setdefault(one.mode, Counter())[one.place.key[1]] += 1
    offered: dict[str, frozenset[str]] = {}
    filled = []
    for one in sited:
        if one.place is None and aspect_of(one.mode) is Aspect.GROUP and one.mode in usual:
            smiles = view.table.substrate[one.row]
            if smiles not in offered:
                mol = _mol(smiles)
                offered[smiles] = frozenset(word for word, _ in groups_in(mol)) if mol is not None else frozenset()
            candidates = offered[smiles] & set(usual[one.mode])
            if len(candidates) == 1:
                one = Sited(row=one.row, mode=one.mode, place=group_place(*candidates))
        filled.append(one)
    return filled
