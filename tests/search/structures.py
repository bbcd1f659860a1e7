"""The structures that search tests look through, read once, and an index over them."""

from __future__ import annotations

from functools import cache
from pathlib import Path

from rdkit import Chem

from kb.search.index import StructureIndex

HOME = Path(__file__).resolve().parents[1] / "data" / "search" / "structures.smi"


@cache
def smiles() -> tuple[str, ...]:
    """Return the SMILES of tests/data/search/structures.smi; where they come from is said beside it."""
    return tuple(line for line in HOME.read_text(encoding="utf-8").splitlines() if line)


@cache
def molecules() -> tuple[Chem.Mol, ...]:
    """Return the molecules of `smiles()`."""
    return tuple(Chem.MolFromSmiles(text) for text in smiles())


@cache
def an_index() -> StructureIndex:
    """Return an index of `smiles()`, ids from 100; read only."""
    index = StructureIndex(threads=1)
    index.append_smiles(range(100, 100 + len(smiles())), smiles())
    return index
