"""The chemistry that a store is opened with: the callables that read runs and encode structures, and their recipe.

The callables load RDKit only when they are first called.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from kb.store.derivation import current_recipe, derive, dissect
from kb.store.deriving_apart import cores

if TYPE_CHECKING:
    from kb.store.values import Encoded


def store_options() -> dict[str, Any]:
    """Return the keyword arguments for `Store.open` and `Store.create`."""
    return {"derive": derive, "dissect": dissect, "encode": encode, "recipe": current_recipe(), "processes": cores()}


def encode(smiles: str) -> Encoded:
    """Return what the search index keeps of a structure."""
    from kb.chem.screens import encode_structure

    return encode_structure(smiles)
