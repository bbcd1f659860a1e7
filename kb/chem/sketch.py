"""Drawing a product: bond changes on a copy, hydrogens and charges kept right, stereo told honestly.

It knows how to carry out a change, not which one to make. Everything is done on Kekule structures with
counted hydrogens, so that aromatic rings and stereocentres survive edits beside them. A drawing that breaks a
rule of valence is no product: `finish` then returns nothing.

Stereo. A centre that takes a new partner in place of the old one keeps, inverts or loses its drawn
configuration as asked. Configurations elsewhere stay. Double bonds that the change touches are redrawn;
others stay.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from itertools import pairwise
from typing import Literal

from rdkit import Chem, rdBase

from kb.chem.molgraph import Molgraph

Configuration = Literal["inverted", "retained", "lost"]

_LONGEST_RELAY = 9
_MIRRORED = {
    Chem.ChiralType.CHI_TETRAHEDRAL_CW: Chem.ChiralType.CHI_TETRAHEDRAL_CCW,
    Chem.ChiralType.CHI_TETRAHEDRAL_CCW: Chem.ChiralType.CHI_TETRAHEDRAL_CW,
}


def _kekule(graph: Molgraph) -> Chem.Mol:
    """Return the fragment as Kekule structure with every hydrogen counted on its atom, kept with the graph."""
    known = graph.memo.get("kekule")
    if known is None:
        mol = Chem.RWMol(graph.mol)
        Chem.Kekulize(mol, clearAromaticFlags=True)
        for atom in mol.GetAtoms():
            atom.SetNumExplicitHs(atom.GetTotalNumHs())
            atom.SetNoImplicit(True)
        known = mol.GetMol()
        graph.memo["kekule"] = known
    return known  # type: ignore[return-value]


class Sketch:
    """One product in the making; atoms are numbered fragment after fragment as given."""

    def __init__(self, graphs: Sequence[Molgraph]) -> None:
        mol = _kekule(graphs[0])
        self.starts = [0]
        for graph in graphs[1:]:
            self.starts.append(mol.GetNumAtoms())
            mol = Chem.CombineMols(mol, _kekule(graph))
        self.mol = Chem.RWMol(mol)

    def atom(self, fragment: int, atom: int) -> int:
        """Return the number in the sketch of an atom of a fragment."""
        return self.starts[fragment] + atom

    def cut(self, a: int, b: int) -> None:
        """Break a bond; both ends are left with an open place."""
        for end in (a, b):
            self._forget_double_bonds(end)
        self.mol.RemoveBond(a, b)

    def change_hydrogens(self, atom: int, by: int) -> None:
        """Add or take hydrogens."""
        here = self.mol.GetAtomWithIdx(atom)
        if by < 0 and here.GetNumExplicitHs() == 0:
            heavy_hydrogen = next((n.GetIdx() for n in here.GetNeighbors() if n.GetAtomicNum() == 1), None)
            if heavy_hydrogen is not None:
                self.mol.RemoveBond(atom, heavy_hydrogen)
            return
        here.SetNumExplicitHs(here.GetNumExplicitHs() + by)

    def cap(self, atom: int) -> None:
        """Close an open place left by a cut: an anion is what departs, so it takes up its proton."""
        here = self.mol.GetAtomWithIdx(atom)
        if here.GetFormalCharge() > 0:
            here.SetFormalCharge(here.GetFormalCharge() - 1)
        else:
            self.change_hydrogens(atom, 1)

    def join(self, electrophile: int, nucleophile: int, *, as_enol: bool = False) -> None:
        """Bond an atom with an open place to a nucleophilic one, which pays with a charge or a proton or turns onium.

        An atom without a proton of its own takes it from along conjugated bonds, as a tautomer would (amide oxygen,
        second nitrogen of an azole).

        Args:
            electrophile: has an open place.
            nucleophile: attacks.
            as_enol: an enol or enamine carbon, which keeps its own hydrogen and frees the one on the heteroatom.
        """
        here = self.mol.GetAtomWithIdx(nucleophile)
        if as_enol and self._relay_proton(nucleophile):
            pass
        elif here.GetFormalCharge() < 0:
            here.SetFormalCharge(here.GetFormalCharge() + 1)
        elif here.GetNumExplicitHs() or any(n.GetAtomicNum() == 1 for n in here.GetNeighbors()):
            self.change_hydrogens(nucleophile, -1)
            self._shed_proton(here)
        elif not self._relay_proton(nucleophile) and not self._relay_charge(nucleophile):
            here.SetFormalCharge(here.GetFormalCharge() + 1)
        self._forget_double_bonds(nucleophile)
        self.mol.AddBond(electrophile, nucleophile, Chem.BondType.SINGLE)

    def _shed_proton(self, atom: Chem.Atom) -> None:
        """Take the extra proton off an ammonium or oxonium, so that the neutral product is drawn."""
        if atom.GetFormalCharge() > 0 and atom.GetNumExplicitHs():
            atom.SetFormalCharge(atom.GetFormalCharge() - 1)
            atom.SetNumExplicitHs(atom.GetNumExplicitHs() - 1)

    def _relay_proton(self, start: int) -> bool:
        """Shift bonds X=A-...-ZH to X-A=...=Z so that X is free to bond; False when there is no such path."""
        orders = {Chem.BondType.SINGLE: 1, Chem.BondType.DOUBLE: 2}
        queue: list[tuple[int, ...]] = [(start,)]
        while queue:
            path = queue.pop(0)
            want = 2 if len(path) % 2 else 1
            for bond in self.mol.GetAtomWithIdx(path[-1]).GetBonds():
                other = bond.GetOtherAtomIdx(path[-1])
                if other in path or orders.get(bond.GetBondType()) != want:
                    continue
                atom = self.mol.GetAtomWithIdx(other)
                is_donor = atom.GetAtomicNum() in (7, 8, 16) and (
                    atom.GetNumExplicitHs() or atom.GetFormalCharge() < 0
                )
                if want == 1 and is_donor:
                    self._flip((*path, other))
                    if atom.GetFormalCharge() < 0:
                        atom.SetFormalCharge(0)
                    else:
                        atom.SetNumExplicitHs(atom.GetNumExplicitHs() - 1)
                    return True
                if len(path) < _LONGEST_RELAY and atom.GetFormalCharge() == 0:
                    queue.append((*path, other))
        return False

    def _relay_charge(self, start: int) -> bool:
        """Shift one bond of X=C=Z(-) or X#C-Z(-) towards Z so that X is free to bond; False for anything else."""
        down = {Chem.BondType.TRIPLE: Chem.BondType.DOUBLE, Chem.BondType.DOUBLE: Chem.BondType.SINGLE}
        up = {lower: higher for higher, lower in down.items()}
        for bond in self.mol.GetAtomWithIdx(start).GetBonds():
            middle = bond.GetOtherAtom(self.mol.GetAtomWithIdx(start))
            if bond.GetBondType() not in down or middle.GetDegree() != 2:
                continue
            for second in middle.GetBonds():
                end = second.GetOtherAtom(middle)
                if end.GetIdx() == start or end.GetFormalCharge() >= 0 or end.GetAtomicNum() not in (7, 8, 16):
                    continue
                if second.GetBondType() in up:
                    bond.SetBondType(down[bond.GetBondType()])
                    second.SetBondType(up[second.GetBondType()])
                    end.SetFormalCharge(end.GetFormalCharge() + 1)
                    return True
        return False

    def _flip(self, path: Sequence[int]) -> None:
        for a, b in pairwise(path):
            bond = self.mol.GetBondBetweenAtoms(a, b)
            was_double = bond.GetBondType() == Chem.BondType.DOUBLE
            bond.SetBondType(Chem.BondType.SINGLE if was_double else Chem.BondType.DOUBLE)
            bond.SetStereo(Chem.BondStereo.STEREONONE)

    def make_double(self, a: int, b: int) -> None:
        """Raise the bond between two atoms with open places by one."""
        bond = self.mol.GetBondBetweenAtoms(a, b)
        up = {Chem.BondType.SINGLE: Chem.BondType.DOUBLE, Chem.BondType.DOUBLE: Chem.BondType.TRIPLE}
        bond.SetBondType(up.get(bond.GetBondType(), bond.GetBondType()))
        for end in (a, b):
            self.mol.GetAtomWithIdx(end).SetChiralTag(Chem.ChiralType.CHI_UNSPECIFIED)
            self._forget_double_bonds(end)

    def make_single(self, a: int, b: int) -> None:
        """Lower the bond between two atoms by one; both ends are left with an open place."""
        bond = self.mol.GetBondBetweenAtoms(a, b)
        down = {Chem.BondType.DOUBLE: Chem.BondType.SINGLE, Chem.BondType.TRIPLE: Chem.BondType.DOUBLE}
        bond.SetBondType(down.get(bond.GetBondType(), bond.GetBondType()))
        bond.SetStereo(Chem.BondStereo.STEREONONE)

    def move(self, group: int, origin: int, target: int) -> None:
        """Move a group from one atom to a neighbour with an open place (1,2-shift)."""
        self.cut(group, origin)
        self.mol.AddBond(target, group, Chem.BondType.SINGLE)

    def place_of(self, centre: int, neighbour: int) -> int:
        """Return how many bonds of the centre follow the one to a neighbour, for `set_configuration`."""
        order = [b.GetOtherAtomIdx(centre) for b in self.mol.GetAtomWithIdx(centre).GetBonds()]
        return len(order) - 1 - order.index(neighbour)

    def set_configuration(self, centre: int, swaps: int, wanted: Configuration) -> None:
        """Give a centre its configuration after its old partner was cut and the new one joined last.

        Args:
            centre: the stereocentre; nothing happens when none is drawn.
            swaps: `place_of` the old partner, taken before the cut.
            wanted: what became of the configuration.
        """
        atom = self.mol.GetAtomWithIdx(centre)
        tag = atom.GetChiralTag()
        if tag not in _MIRRORED:
            return
        if wanted == "lost":
            atom.SetChiralTag(Chem.ChiralType.CHI_UNSPECIFIED)
        elif (swaps % 2 == 1) == (wanted == "retained"):
            atom.SetChiralTag(_MIRRORED[tag])

    def clear_configuration(self, atoms: Iterable[int]) -> None:
        """Claim no configuration at the atoms."""
        for a in atoms:
            self.mol.GetAtomWithIdx(a).SetChiralTag(Chem.ChiralType.CHI_UNSPECIFIED)

    def _forget_double_bonds(self, atom: int) -> None:
        for bond in self.mol.GetAtomWithIdx(atom).GetBonds():
            if bond.GetBondType() == Chem.BondType.DOUBLE:
                bond.SetStereo(Chem.BondStereo.STEREONONE)
            else:
                other = bond.GetOtherAtom(self.mol.GetAtomWithIdx(atom))
                for second in other.GetBonds():
                    if second.GetBondType() == Chem.BondType.DOUBLE and atom in second.GetStereoAtoms():
                        second.SetStereo(Chem.BondStereo.STEREONONE)

    def finish(self, anchor: int) -> str | None:
        """Return the canonical SMILES of the molecule that holds an atom; None when it is no possible structure."""
        mol = self._sanitised(anchor)
        return None if mol is None else str(Chem.MolToSmiles(mol))

    def finish_alkene(self, a: int, b: int) -> list[tuple[str, str]]:
        """Return (SMILES, "E", "Z" or "") for the molecule with the new double bond between two atoms, E first.

        A bond in a ring of fewer than eight atoms, or with two like groups on one end, has one form and no label.
        """
        for end in (a, b):
            self.mol.GetAtomWithIdx(end).SetIntProp("alkene", 1)
        mol = self._sanitised(a)
        for end in (a, b):
            self.mol.GetAtomWithIdx(end).ClearProp("alkene")
        if mol is None:
            return []
        ends = [atom.GetIdx() for atom in mol.GetAtoms() if atom.HasProp("alkene")]
        bond = mol.GetBondBetweenAtoms(*ends) if len(ends) == 2 else None
        references = None if bond is None else _stereo_references(mol, bond)
        if bond is None or references is None:
            return [(str(Chem.MolToSmiles(mol)), "")]
        found = []
        for stereo in (Chem.BondStereo.STEREOTRANS, Chem.BondStereo.STEREOCIS):
            form = Chem.Mol(mol)
            here = form.GetBondWithIdx(bond.GetIdx())
            here.SetStereoAtoms(*references)
            here.SetStereo(stereo)
            Chem.SetDoubleBondNeighborDirections(form)
            Chem.AssignStereochemistry(form, cleanIt=True, force=True)
            label = {Chem.BondStereo.STEREOE: "E", Chem.BondStereo.STEREOZ: "Z"}.get(here.GetStereo(), "")
            found.append((str(Chem.MolToSmiles(form)), label))
        return sorted(found, key=lambda f: f[1])

    def _sanitised(self, anchor: int) -> Chem.Mol | None:
        with rdBase.BlockLogs():
            try:
                pieces: list[tuple[int, ...]] = []
                mols = Chem.GetMolFrags(
                    self.mol, asMols=True, sanitizeFrags=False, fragsMolAtomMapping=pieces
                )
                mol = next(m for m, atoms in zip(mols, pieces, strict=True) if anchor in atoms)
                Chem.SanitizeMol(mol)
                Chem.AssignStereochemistry(mol, cleanIt=True, force=True)
            except (ValueError, RuntimeError):
                return None
        return mol


def _stereo_references(mol: Chem.Mol, bond: Chem.Bond) -> tuple[int, int] | None:
    """Return one neighbour on each end of a double bond that can be E or Z; None when it cannot."""
    if bond.GetBondType() != Chem.BondType.DOUBLE:
        return None
    if any(bond.IsInRingSize(size) for size in range(3, 8)):
        return None
    ranks = list(Chem.CanonicalRankAtoms(mol, breakTies=False))
    references = []
    for here, there in ((bond.GetBeginAtom(), bond.GetEndAtomIdx()), (bond.GetEndAtom(), bond.GetBeginAtomIdx())):
        others = [n.GetIdx() for n in here.GetNeighbors() if n.GetIdx() != there]
        if not others or len({ranks[o] for o in others}) != len(others):
            return None
        if len(others) + here.GetTotalNumHs() != 2:
            return None
        references.append(others[0])
    return references[0], references[1]
