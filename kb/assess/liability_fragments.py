"""The fragments of a scheme as the liability search needs them: read, told apart, and numbered as entered.

It owns which left-side fragments can carry a group worth keeping (the substrate and what it is joined
with, not solvents and reagents), where second reactants are looked for, and the way back from searched
atoms to atoms as entered. A fragment that cannot be read is passed over: the reading has said so.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache

from rdkit import Chem, rdBase

from kb.assess.liability_rule import Rule, compile_motif
from kb.chem.facts import Reading
from kb.materials.catalogue import load_catalogue
from kb.materials.profile import ConditionProfile

_ENTERED = "_entered"


@dataclass(frozen=True, slots=True, kw_only=True)
class Fragment:
    """One left-side fragment.

    Attributes:
        component: its position as entered; None = named, not drawn.
        mol: written hydrogens folded in.
        is_reactant: it holds a centre or the nucleophile, or holds carbon and is no catalogued material.
        may_attack: it could be the nucleophile: holds carbon or nitrogen and is no catalogued solvent.
    """

    component: int | None
    mol: Chem.Mol
    is_reactant: bool
    may_attack: bool


def read_fragments(fragments: Sequence[str], reading: Reading) -> tuple[Fragment, ...]:
    """Return each fragment that can be read, with what part it can play.

    Groups worth keeping are looked for in reactants only, since an ester that is the solvent is no loss.
    """
    certain = {c.component for c in reading.centres}
    if reading.nucleophile is not None:
        certain.add(reading.nucleophile.component)
    read = [(i, mol) for i, smiles in enumerate(fragments) if (mol := _read(smiles)) is not None]
    carbon = [(i, mol) for i, mol in read if any(a.GetAtomicNum() == 6 for a in mol.GetAtoms())]
    reactants = certain | {i for i, mol in carbon if not _is_material(mol)}
    if not reactants and carbon:
        reactants = {max(carbon, key=lambda pair: pair[1].GetNumHeavyAtoms())[0]}
    return tuple(
        Fragment(
            component=i,
            mol=mol,
            is_reactant=i in reactants,
            may_attack=i in reactants or not _is_solvent(mol),
        )
        for i, mol in read
    )


def read_named(profile: ConditionProfile, drawn: Sequence[Fragment] = ()) -> tuple[Fragment, ...]:
    """Return the nucleophile where it was named and not drawn; empty where none is known or it has no structure."""
    name = profile.nucleophile_name
    smiles = next((r.smiles for r in load_catalogue().reagents if name and r.name == name), None)
    mol = _read(smiles) if smiles else None
    if mol is None or _plain_smiles(mol) in {_plain_smiles(f.mol) for f in drawn}:
        return ()
    return (Fragment(component=None, mol=mol, is_reactant=False, may_attack=True),)


def find_partners(
    rule: Rule,
    component: int | None,
    flask: Sequence[Fragment],
    others: Sequence[str],
    profile: ConditionProfile,
) -> tuple[Chem.Mol, ...]:
    """Return molecules that fit a rule's second reactant, drawn ones first; empty where it needs none.

    A solvent (dichloromethane beside an amine) is no second reactant of a rule whose partner has to be brought,
    unless the scheme gives it that part. Where the condition line names the solvent, it is one.
    """
    if rule.partner is None:
        return ()
    pattern, _ = compile_motif(rule.partner)
    drawn = [f.mol for f in flask if f.component != component and (f.may_attack or rule.partner_from != "scheme")]
    named = [mol for smiles in (*others, *sorted(profile.solvent_alkoxy)) if (mol := _read(smiles)) is not None]
    if rule.partner_from == "scheme":
        named = [mol for mol in named if not _is_solvent(mol)]
    if rule.partner_from == "itself":
        drawn = [f.mol for f in flask if f.component == component]
    return tuple(mol for mol in (*drawn, *named) if mol.HasSubstructMatch(pattern))


def as_entered(flask: Sequence[Fragment], component: int | None, atoms: Sequence[int]) -> tuple[int, ...]:
    """Return atom indices in the fragment as entered (written hydrogens count there)."""
    mol = next((f.mol for f in flask if f.component == component), None)
    if mol is None or component is None:
        return ()
    return tuple(mol.GetAtomWithIdx(a).GetIntProp(_ENTERED) for a in atoms)


def find_entered(mol: Chem.Mol, entered: int) -> int | None:
    """Return the searched atom of an atom as entered, None where it is a written hydrogen that was folded in."""
    return next((a.GetIdx() for a in mol.GetAtoms() if a.GetIntProp(_ENTERED) == entered), None)


@lru_cache(maxsize=256)
def _read(smiles: str) -> Chem.Mol | None:
    """Return the fragment with written hydrogens folded in and every atom's entered index kept."""
    params = Chem.SmilesParserParams()
    params.removeHs = False  # type: ignore[assignment]
    with rdBase.BlockLogs():
        mol = Chem.MolFromSmiles(smiles, params)
        if mol is None:
            return None
        for atom in mol.GetAtoms():
            atom.SetIntProp(_ENTERED, atom.GetIdx())
        if any(a.GetAtomicNum() == 1 for a in mol.GetAtoms()):
            mol = Chem.RemoveHs(mol, sanitize=True)
    return mol


def _is_material(mol: Chem.Mol) -> bool:
    """Return True for a catalogued solvent or reagent."""
    smiles, catalogue = _plain_smiles(mol), load_catalogue()
    return smiles in catalogue.solvent_by_smiles or smiles in catalogue.reagent_by_smiles or smiles in catalogue.ions


def _is_solvent(mol: Chem.Mol) -> bool:
    return _plain_smiles(mol) in load_catalogue().solvent_by_smiles


def _plain_smiles(mol: Chem.Mol) -> str:
    plain = Chem.Mol(mol)
    for atom in plain.GetAtoms():
        atom.SetAtomMapNum(0)
    return Chem.MolToSmiles(plain)
