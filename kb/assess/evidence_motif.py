"""Did a motif come through a run?

It owns that question. A motif counts as lost when a failure of the run names it, or when products that lack it make up
LOST_SHARE or more; as survived when the main product still holds it. A run that says neither gives no answer.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from functools import lru_cache
from typing import Any

from kb.record.failure_modes import modes_that_lose_a_group
from kb.record.run import Run
from kb.vocabulary import Fate, Verdict

LOST_SHARE = 0.10
"""Share of products without the motif from which it counts as lost; judgement."""


FindMotif = Callable[[Any], Sequence[tuple[int, ...]]]
"""From an RDKit molecule to the atom numbers of each instance of the motif."""


def motif_came_through(run: Run, find: FindMotif, mols: Callable[[str], Any]) -> bool | None:
    """Say whether a motif survived a run.

    Args:
        run: as recorded.
        find: finds the motif in a molecule.
        mols: from SMILES to RDKit molecule or None.

    Returns:
        True = survived, False = lost, None = the record does not say.
    """
    left = [m for s in _left(run) if (m := mols(s)) is not None]
    before = sum(len(find(m)) for m in left)
    if not before:
        return None
    for failure in run.outcome.failures:
        if failure.mode in modes_that_lose_a_group() and failure.motif and _overlaps(failure.motif, find, left):
            return False
    lacking, holding = 0.0, 0.0
    for smiles, share in _products(run):
        mol = mols(smiles)
        if mol is None:
            continue
        if len(find(mol)) < before:
            lacking += share
        else:
            holding += share
    unseen_loss = sum(p.share or 0.0 for p in run.outcome.products if p.fate is Fate.GROUP_LOSS and p.smiles is None)
    if lacking >= LOST_SHARE:
        return False
    if holding > 0 and unseen_loss < LOST_SHARE and holding >= lacking:
        return True
    return None


def _left(run: Run) -> list[str]:
    side = run.scheme.split(">")
    return [s for part in side[:2] for s in part.split(".") if s] if len(side) == 3 else run.scheme.split(".")


def _products(run: Run) -> list[tuple[str, float]]:
    """Return products with structure and share: measured one by one, else those stated, as the verdict says."""
    measured = [(p.smiles, p.share) for p in run.outcome.products if p.smiles and p.share]
    if measured:
        return [(s, float(share)) for s, share in measured if s and share]
    side = run.scheme.split(">")
    stated = side[2] if len(side) == 3 else ""
    share = {Verdict.WORKED: 1.0, Verdict.PARTLY: 0.5}.get(run.verdict, 0.0) if run.verdict else 0.0
    yield_pct = run.outcome.yield_pct
    if yield_pct is not None:
        share = max(share, min(yield_pct / 100, 1.0))
    return [(stated, share)] if share and stated else []


@lru_cache(maxsize=4096)
def finder_of(smarts: str) -> FindMotif:
    """Return a finder for one SMARTS; a SMARTS that cannot be read is found nowhere."""
    from rdkit import Chem

    query = Chem.MolFromSmarts(smarts)

    def find(mol: Any) -> Sequence[tuple[int, ...]]:
        return () if query is None else mol.GetSubstructMatches(query, uniquify=True, maxMatches=64)

    return find


def _overlaps(smarts: str, find: FindMotif, mols: list[Any]) -> bool:
    """Return True when a failure's motif and the rule's share an atom somewhere."""
    named = finder_of(smarts)
    for mol in mols:
        hit = {a for match in named(mol) for a in match}
        if any(hit & set(match) for match in find(mol)):
            return True
    return False
