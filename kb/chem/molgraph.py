"""A molecule as plain lists: what the reading rules look at, atom by atom.

RDKit answers each small question with a call across the language border; the reading rules ask some thousands
of them for one scheme. So every fragment is taken apart once (and kept, since reagents come back in every
run) into plain lists, and the rules are written on those. It holds no chemistry beyond ring and aromaticity
facts.

Atoms are numbered by the canonical SMILES of the fragment, not by the entry: whatever a rule picks first is
then the same for every way of writing the same molecule. `scheme.Fragment.entered` leads back to the entry.
"""

from __future__ import annotations

from functools import lru_cache

from rdkit import Chem, rdBase

from kb.errors import StructureError

AROMATIC = 4
"""Bond code of an aromatic bond; 1, 2, 3 are the orders, 0 anything else (dative, zero)."""

_BOND_CODES = {
    Chem.BondType.SINGLE: 1,
    Chem.BondType.DOUBLE: 2,
    Chem.BondType.TRIPLE: 3,
    Chem.BondType.AROMATIC: AROMATIC,
}


class Molgraph:
    """A fragment as lists indexed by atom; read-only by convention, shared between readings.

    Attributes:
        smiles: canonical isomeric SMILES.
        mol: the RDKit molecule with the same numbering.
        elements: atomic numbers.
        neighbours: per atom, {neighbour: bond code}.
        hydrogens: attached hydrogens, implicit and isotopic ones included.
        charges: formal charges.
        aromatic: whether the atom is aromatic.
        in_ring: whether the atom is in a ring.
    """

    __slots__ = (
        "aromatic", "charges", "elements", "hydrogens", "in_ring", "memo", "mol", "neighbours", "smiles"
    )  # fmt: skip

    def __init__(self, smiles: str, mol: Chem.Mol) -> None:
        self.smiles = smiles
        self.mol = mol
        self.elements: list[int] = []
        self.hydrogens: list[int] = []
        self.charges: list[int] = []
        self.aromatic: list[bool] = []
        self.in_ring: list[bool] = []
        for atom in mol.GetAtoms():
            self.elements.append(atom.GetAtomicNum())
            self.hydrogens.append(atom.GetTotalNumHs())
            self.charges.append(atom.GetFormalCharge())
            self.aromatic.append(atom.GetIsAromatic())
            self.in_ring.append(atom.IsInRing())
        self.neighbours: list[dict[int, int]] = [{} for _ in self.elements]
        for bond in mol.GetBonds():
            begin, end = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
            code = _BOND_CODES.get(bond.GetBondType(), 0)
            self.neighbours[begin][end] = code
            self.neighbours[end][begin] = code
        self._fold_isotopic_hydrogens()
        self.memo: dict[str, object] = {}

    def _fold_isotopic_hydrogens(self) -> None:
        """Count a deuterium or tritium drawn as an atom among the hydrogens of its neighbour; it keeps its number."""
        for atom, element in enumerate(self.elements):
            if element != 1 or len(self.neighbours[atom]) != 1:
                continue
            (holder,) = self.neighbours[atom]
            if self.elements[holder] != 1:
                del self.neighbours[holder][atom]
                self.neighbours[atom].clear()
                self.hydrogens[holder] += 1

    def __len__(self) -> int:
        return len(self.elements)

    def is_sp3_carbon(self, atom: int) -> bool:
        """Return whether the atom is a carbon with single bonds only and no aromatic ring."""
        if self.elements[atom] != 6 or self.aromatic[atom] or self.charges[atom]:
            return False
        bonds = self.neighbours[atom]
        return all(code == 1 for code in bonds.values()) and len(bonds) + self.hydrogens[atom] == 4

    def has_multiple_bond(self, atom: int, to: int | None = None) -> bool:
        """Return whether the atom has a double or triple bond, to the element `to` if given."""
        return any(
            code in (2, 3) and (to is None or self.elements[n] == to)
            for n, code in self.neighbours[atom].items()
        )

    def side_of(self, atom: int, away_from: int) -> set[int] | None:
        """Return the atoms reached from `atom` without crossing its bond to `away_from`; None for a ring bond."""
        seen = {atom}
        stack = [n for n in self.neighbours[atom] if n != away_from]
        seen.update(stack)
        while stack:
            here = stack.pop()
            for n in self.neighbours[here]:
                if n == away_from:
                    return None
                if n not in seen:
                    seen.add(n)
                    stack.append(n)
        return seen


@lru_cache(maxsize=1024)
def molgraph_of(smiles: str) -> Molgraph:
    """Return the graph of a canonical SMILES; kept for the most recent 1024.

    Raises:
        StructureError: when RDKit cannot read its own canonical text back.
    """
    with rdBase.BlockLogs():
        mol = Chem.MolFromSmiles(smiles)
    if mol is None:
        raise StructureError(f"'{smiles[:80]}' could not be read back.", "Redraw the structure.", smiles[:80])
    return Molgraph(smiles, mol)
