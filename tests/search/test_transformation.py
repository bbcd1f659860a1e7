"""Transformations are matched where the bond broke, not on both sides of the arrow at large."""

from __future__ import annotations

import pytest
from rdkit import Chem

from kb.chem.query import find_match
from kb.errors import QueryError
from kb.search.transformation import parse_transformation, product_holds


def fits(text: str, substrate: str, product: str) -> bool:
    """Return whether a step whose centre carries map 1 in the substrate fits a transformation."""
    mol = Chem.MolFromSmiles(substrate)
    centre = next(a.GetIdx() for a in mol.GetAtoms() if a.GetAtomMapNum() == 1)
    transformation = parse_transformation(text)
    if transformation.left and find_match(transformation.left, mol, root_atom=centre) is None:
        return False
    return product_holds(transformation, mol, centre, Chem.MolFromSmiles(product))


@pytest.mark.parametrize(
    ("text", "substrate", "product", "expected", "why"),
    [
        ("C-Br>>C-N", "CC[CH2:1]Br", "CCCN", True, "displacement"),
        ("C-Br>>C-N", "CC[CH2:1]Br", "CCCO", False, "another nucleophile"),
        ("C-Br>>C-N", "NCC[CH2:1]Br", "NCCCO", False, "the nitrogen was there before"),
        ("C-Br>>C-N", "BrCC[CH2:1]Cl", "BrCCCN", False, "the bromide is not at the centre"),
        ("C-Cl>>C-N", "BrCC[CH2:1]Cl", "BrCCCN", True, "the chloride is"),
        ("[C:1]-Br>>[C:1]-N", "CC[CH2:1]Br", "CCCN", True, "with maps"),
        ("C-Br>>C-N=[N+]=[N-]", "CC[CH:1](C)Br", "CCC(C)N=[N+]=[N-]", True, "azide"),
        ("C-Br>>C=C", "CC[CH:1](C)Br", "CC=CC", True, "elimination to the inner alkene"),
        ("C-Br>>C=C", "CC[CH:1](C)Br", "C=CCC", True, "and to the outer one"),
        ("C-Br>>C=C", "C=CC[CH2:1]Br", "C=CCCO", False, "the alkene was elsewhere"),
        ("C-O>>C-N", "C[CH:1](OS(C)(=O)=O)CC", "CC(CC)N", True, "a sulfonate is lost whole"),
        ("C-O>>C-O", "C[CH:1](OS(C)(=O)=O)CC", "CC(CC)OC(C)=O", True, "one oxygen for another"),
        ("c[CH2]-Br>>c[CH2]-S", "c1ccccc1[CH2:1]Br", "c1ccccc1CSC", True, "context on both sides"),
        ("C-[Cl,Br]>>C-[O,S]", "CC[CH2:1]Br", "CCCSC", True, "lists"),
        ("C-Br>>", "CC[CH2:1]Br", "O", True, "nothing asked of the product"),
        (">>[C:1]-N", "CC[CH2:1]Br", "CCCN", True, "nothing asked of the substrate"),
        (">>[C:1]-N", "CC[CH2:1]Br", "CCCO", False, "but the product counts"),
        ("C-O>>C-N", "C1O[CH2:1]1", "NCCO", True, "an epoxide keeps its oxygen"),
    ],
)
def test_a_transformation_fits_where_it_happened(
    text: str, substrate: str, product: str, expected: bool, why: str
) -> None:
    assert fits(text, substrate, product) is expected, why


@pytest.mark.parametrize(
    ("text", "groups"),
    [
        ("C-Br>>C-N", {"bromide"}),
        ("C-[Cl,I]>>C-N", {"chloride", "iodide"}),
        ("C-[N+]>>C-O", {"ammonium", "diazonium", "nitro", "other"}),
        ("C-Br>>", None),
        ("C-*>>C-N", None),
    ],
)
def test_what_is_lost_names_the_leaving_groups(text: str, groups: set[str] | None) -> None:
    found = parse_transformation(text).leaving_groups
    assert (set(found) if found is not None else None) == groups


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("C-Br", "no transformation"),
        (">>", "no transformation"),
        ("C>>C>>C", "no transformation"),
        ("CCC>>CCC", "cannot be told"),
        ("N-Br>>N-C", "no carbon"),
        ("C-(>>C", "neither SMARTS nor SMILES"),
    ],
)
def test_what_cannot_be_read_is_refused_with_the_reason(text: str, says: str) -> None:
    with pytest.raises(QueryError) as refusal:
        parse_transformation(text)
    assert says in refusal.value.message
    assert refusal.value.hint
