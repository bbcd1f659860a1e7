"""RXN files and molfiles, both versions, say the same as the scheme that was drawn."""

from __future__ import annotations

from pathlib import Path

import pytest
from rdkit import Chem
from rdkit.Chem import AllChem, rdDepictor

from kb.chem.reading import read_scheme
from kb.chem.scheme import parse_scheme
from kb.chem.schemefile import read_scheme_file, scheme_of_block
from kb.errors import StructureError

DRAWN = "C[C@H](Br)CC.[N-]=[N+]=[N-]>CS(C)=O>C[C@@H](N=[N+]=[N-])CC"


def rxn_block(scheme: str, *, v3000: bool) -> str:
    """Return a scheme drawn by RDKit with wedges."""
    reaction = AllChem.ReactionFromSmarts(scheme, useSmiles=True)
    for mol in (*reaction.GetReactants(), *reaction.GetAgents(), *reaction.GetProducts()):
        mol.UpdatePropertyCache()
        Chem.AssignStereochemistry(mol)
        rdDepictor.Compute2DCoords(mol)
        Chem.WedgeMolBonds(mol, mol.GetConformer())
    return str(AllChem.ReactionToRxnBlock(reaction, forceV3000=v3000, separateAgents=True))


@pytest.mark.parametrize("v3000", [False, True])
@pytest.mark.parametrize("line_end", ["\n", "\r\n"])
def test_an_rxn_block_gives_the_scheme_with_its_stereo(v3000: bool, line_end: str) -> None:
    block = rxn_block(DRAWN, v3000=v3000).replace("\n", line_end)
    scheme = parse_scheme(scheme_of_block(block))
    assert scheme.smiles == parse_scheme(DRAWN).smiles
    assert [f.side for f in scheme.left] == ["reactant", "reactant", "agent"]


@pytest.mark.parametrize("v3000", [False, True])
def test_maps_in_an_rxn_block_are_kept(v3000: bool) -> None:
    text = scheme_of_block(rxn_block("[CH3:1][Br:2].[OH:3]C>>[CH3:1][O:3]C", v3000=v3000))
    centre = read_scheme(text).centre
    assert centre is not None and (centre.atom_map, centre.leaving_atom_map) == (1, 2)


def test_a_molfile_is_a_substrate_alone(tmp_path: Path) -> None:
    mol = Chem.MolFromSmiles("C/C=C/CBr")
    rdDepictor.Compute2DCoords(mol)
    path = tmp_path / "crotyl.mol"
    path.write_text(Chem.MolToMolBlock(mol), encoding="utf-8")
    assert read_scheme_file(path) == "C/C=C/CBr"


@pytest.mark.parametrize(
    ("block", "said"),
    [
        ("", "no molfile"),
        ("$RXN\n\n\n\n", "counts"),
        ("$RXN\n\n\n\n  2  1\n$MOL\n", "announces 3"),
        ("$RXN V3000\n", "no reactants"),
        ("$RXN\n\n\n\n  1  0\n$MOL\nrubbish\n", "Reactant 1"),
    ],
)
def test_a_damaged_block_is_refused_and_says_where(block: str, said: str) -> None:
    with pytest.raises(StructureError, match=said):
        scheme_of_block(block)


def test_a_missing_file_is_refused_with_its_name(tmp_path: Path) -> None:
    with pytest.raises(StructureError, match=r"nowhere\.rxn"):
        read_scheme_file(tmp_path / "nowhere.rxn")


def test_a_binary_file_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "picture.rxn"
    path.write_bytes(bytes(range(256)) * 20)
    with pytest.raises(StructureError):
        read_scheme_file(path)
