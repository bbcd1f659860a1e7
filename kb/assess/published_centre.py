"""From a drawn structure to the plain centre that the published models ask for.

It owns the reading of branching, activation, beta hydrogens, drawn stereo in six-membered rings, the
alkenes that could form and the 1,2-shifts open to the cation. It judges nothing: no rate, no share. Atom
numbers are those of the molecule handed in. Geometry is worked out from the drawing only, without
coordinates: in a six-membered ring a hydrogen can stand anti-periplanar to the leaving group where the two
are drawn trans (E. L. Eliel; D. H. R. Barton, J. Chem. Soc. 1953, 1027); where the drawing does not say,
half a hydrogen is counted.
"""

from __future__ import annotations

from collections.abc import Sequence

from rdkit import Chem

from kb.assess.published_atoms import (
    HALOGENS,
    breaks_bredt,
    count_carbons,
    is_acceptor,
    is_bridgehead,
    is_sp3_carbon,
    size_word,
)
from kb.assess.published_products import cation_of, list_alkenes, shifted_cation, without_leaving_group
from kb.physorg.step import Centre, Neighbour, Shift
from kb.vocabulary import CarbonClass

_CLASSES = (CarbonClass.METHYL, CarbonClass.PRIMARY, CarbonClass.SECONDARY, CarbonClass.TERTIARY)


def describe_centre(
    mol: Chem.Mol,
    centre: int,
    leaving: int | None,
    carbon_class: CarbonClass | None = None,
    with_shifts: bool = True,
) -> Centre:
    """Describe a carbon and what surrounds it.

    Args:
        mol: sanitised molecule, hydrogens implicit.
        centre: the carbon.
        leaving: the atom that departs with the pair; None = it has departed (a cation).
        carbon_class: as already read; None = counted here.
        with_shifts: look for 1,2-shifts as well.
    """
    atom = mol.GetAtomWithIdx(centre)
    others = [n for n in atom.GetNeighbors() if n.GetIdx() != leaving]
    ring = _ring_size(mol, centre, leaving)
    neighbours = tuple(_describe_neighbour(mol, centre, n.GetIdx(), leaving, ring) for n in others if is_sp3_carbon(n))
    far = _far_end(mol, centre, leaving)
    return Centre(
        label=Chem.MolToSmiles(mol),
        carbon_class=carbon_class or _count_class(mol, centre, leaving),
        activations=_activations(mol, centre, leaving, others),
        aryl_count=sum(n.GetIsAromatic() for n in others),
        neighbours=neighbours,
        ring_size=ring,
        far_end_alkyl=None if far is None else count_carbons(mol, far[0], far[1]),
        is_symmetric_allyl=far is not None and _is_symmetric(mol, centre, far[0], leaving),
        shifts=_shifts(mol, centre, leaving) if with_shifts else (),
        is_stereocentre=atom.GetChiralTag() != Chem.ChiralType.CHI_UNSPECIFIED,
    )


def _describe_neighbour(mol: Chem.Mol, centre: int, here: int, leaving: int | None, ring: int | None) -> Neighbour:
    atom = mol.GetAtomWithIdx(here)
    hydrogens = atom.GetTotalNumHs()
    others = [n.GetIdx() for n in atom.GetNeighbors() if n.GetIdx() not in (centre, leaving)]
    possible = hydrogens > 0 and not breaks_bredt(mol, centre, here)
    return Neighbour(
        label=_name(mol, here, hydrogens),
        hydrogens=hydrogens,
        anti_hydrogens=_anti_hydrogens(mol, centre, here, leaving, ring) if possible else 0.0,
        substituents=tuple(sorted(size_word(mol, k, here) for k in others)),
        can_be_alkene=possible,
        alkenes=list_alkenes(mol, centre, here, leaving) if possible else (),
        in_small_ring=any(len(r) < 5 and here in r and centre not in r for r in mol.GetRingInfo().AtomRings()),
    )


def _anti_hydrogens(mol: Chem.Mol, centre: int, here: int, leaving: int | None, ring: int | None) -> float:
    atom = mol.GetAtomWithIdx(here)
    hydrogens = atom.GetTotalNumHs()
    shared = next((r for r in mol.GetRingInfo().AtomRings() if len(r) == 6 and centre in r and here in r), None)
    if ring != 6 or shared is None or leaving is None:
        return float(hydrogens)
    if hydrogens >= 2:
        return 1.0
    full = Chem.AddHs(mol)
    proton = next(n.GetIdx() for n in full.GetAtomWithIdx(here).GetNeighbors() if n.GetAtomicNum() == 1)
    at_centre, at_here = face_of(full, centre, leaving, shared), face_of(full, here, proton, shared)
    if at_centre is None or at_here is None:
        return 0.5
    return 1.0 if at_centre != at_here else 0.0


def face_of(full: Chem.Mol, atom: int, group: int, ring: Sequence[int]) -> int | None:
    """Return +1 or -1 for the face of the ring that a group is on, None where the drawing does not say.

    `full` has its hydrogens as atoms.

    Going round the ring one way, the order (previous, next, group, other) has the same handedness on every
    atom for groups of one face.
    """
    tag = full.GetAtomWithIdx(atom).GetChiralTag()
    if tag not in (Chem.ChiralType.CHI_TETRAHEDRAL_CCW, Chem.ChiralType.CHI_TETRAHEDRAL_CW):
        return None
    position = list(ring).index(atom)
    before, after = ring[position - 1], ring[(position + 1) % len(ring)]
    drawn = [b.GetOtherAtomIdx(atom) for b in full.GetAtomWithIdx(atom).GetBonds()]
    other = next((n for n in drawn if n not in (before, after, group)), None)
    if other is None or group not in drawn:
        return None
    wanted = [drawn.index(n) for n in (before, after, group, other)]
    swaps = sum(wanted[i] > wanted[j] for i in range(4) for j in range(i + 1, 4))
    sign = 1 if tag == Chem.ChiralType.CHI_TETRAHEDRAL_CCW else -1
    return sign if swaps % 2 == 0 else -sign


def _shifts(mol: Chem.Mol, centre: int, leaving: int | None) -> tuple[Shift, ...]:
    found: list[Shift] = []
    start = Chem.MolToSmiles(cation_of(mol, centre, leaving))
    for neighbour in mol.GetAtomWithIdx(centre).GetNeighbors():
        here = neighbour.GetIdx()
        if here == leaving or not is_sp3_carbon(neighbour) or is_bridgehead(mol, here):
            continue
        small = any(len(r) == 4 and here in r and centre not in r for r in mol.GetRingInfo().AtomRings())
        moves: list[tuple[str, int | None]] = []
        if neighbour.GetTotalNumHs():
            moves.append(("hydride", None))
        if not neighbour.GetTotalNumHs() or small:
            moves += [
                (
                    "aryl"
                    if k.GetIsAromatic()
                    else "ring"
                    if small and _in_four_ring(mol, here, k.GetIdx())
                    else "alkyl",
                    k.GetIdx(),
                )
                for k in neighbour.GetNeighbors()
                if k.GetIdx() not in (centre, leaving) and k.GetAtomicNum() == 6
            ]
        for migrant, group in moves:
            moved = shifted_cation(mol, centre, here, leaving, group)
            label = Chem.MolToSmiles(moved) if moved is not None else start
            if moved is None or label == start or any(s.cation.label == label for s in found):
                continue
            if _small_rings(moved) > _small_rings(mol):
                continue
            after = describe_centre(moved, here, None, None, with_shifts=False)
            if after.carbon_class in _CLASSES:  # a bridgehead cation cannot flatten
                found.append(Shift(migrant=migrant, cation=after))
    return tuple(found)


def _activations(mol: Chem.Mol, centre: int, leaving: int | None, others: Sequence[Chem.Atom]) -> tuple[str, ...]:
    words: list[str] = []
    for atom in others:
        number, index = atom.GetAtomicNum(), atom.GetIdx()
        if number in HALOGENS:
            words.append("alpha-halogen")
        elif number in (7, 8, 16) and not is_acceptor(atom):
            acylated = any(
                size_word(mol, n.GetIdx(), index) == "carbonyl" for n in atom.GetNeighbors() if n.GetIdx() != centre
            )
            if number == 7 or not acylated:
                words.append({7: "alpha-nitrogen", 8: "alpha-oxygen", 16: "alpha-sulfur"}[number])
            else:
                words.append("beta-heteroatom")
        elif number == 6 and not is_sp3_carbon(atom):
            words.append(_flat_word(mol, atom, centre))
        elif number == 6:
            if any(len(r) == 3 and index in r and centre not in r for r in mol.GetRingInfo().AtomRings()):
                words.append("cyclopropyl")
            for n in atom.GetNeighbors():
                if n.GetIdx() not in (centre, leaving):
                    if n.GetAtomicNum() in HALOGENS:
                        words.append("beta-halogen")
                    elif n.GetAtomicNum() in (7, 8):
                        words.append("beta-heteroatom")
    return tuple(words)


def _flat_word(mol: Chem.Mol, atom: Chem.Atom, centre: int) -> str:
    kind = size_word(mol, atom.GetIdx(), centre)
    if kind == "carbonyl":
        triple = any(b.GetBondTypeAsDouble() == 3 for b in atom.GetBonds())
        return "alpha-nitrile" if triple else "alpha-carbonyl"
    return {"aryl": "benzylic", "poor aryl": "benzylic", "vinyl": "allylic", "alkynyl": "propargylic"}.get(
        kind, "alpha-carbonyl"
    )


def _far_end(mol: Chem.Mol, centre: int, leaving: int | None) -> tuple[int, int] | None:
    """Return (far end, middle) of an allylic system through the centre, or None."""
    for middle in mol.GetAtomWithIdx(centre).GetNeighbors():
        if middle.GetIdx() == leaving or middle.GetAtomicNum() != 6 or middle.GetIsAromatic():
            continue
        for bond in middle.GetBonds():
            far = bond.GetOtherAtom(middle)
            if bond.GetBondTypeAsDouble() == 2 and far.GetAtomicNum() == 6 and not far.GetIsAromatic():
                return far.GetIdx(), middle.GetIdx()
    return None


def _is_symmetric(mol: Chem.Mol, centre: int, far: int, leaving: int | None) -> bool:
    """Return whether centre and far end of an allyl cation cannot be told apart."""
    cut = without_leaving_group(mol, centre, leaving)
    for bond in cut.GetBonds():
        if bond.GetIdx() and {bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()} & {far}:
            bond.SetStereo(Chem.BondStereo.STEREONONE)
    middle = next(
        n.GetIdx() for n in cut.GetAtomWithIdx(far).GetNeighbors() if cut.GetBondBetweenAtoms(n.GetIdx(), centre)
    )
    for end in (centre, far):
        cut.GetBondBetweenAtoms(middle, end).SetBondType(Chem.BondType.ONEANDAHALF)
        cut.GetAtomWithIdx(end).SetChiralTag(Chem.ChiralType.CHI_UNSPECIFIED)
    ranks = list(Chem.CanonicalRankAtoms(cut.GetMol(), breakTies=False, includeChirality=False))
    return ranks[centre] == ranks[far]


def _count_class(mol: Chem.Mol, centre: int, leaving: int | None) -> CarbonClass:
    if is_bridgehead(mol, centre):
        return CarbonClass.BRIDGEHEAD
    count = sum(n.GetAtomicNum() == 6 and n.GetIdx() != leaving for n in mol.GetAtomWithIdx(centre).GetNeighbors())
    return _CLASSES[min(count, 3)]


def _ring_size(mol: Chem.Mol, centre: int, leaving: int | None) -> int | None:
    """Return the smallest ring through the centre, rings through the leaving atom (epoxides) left out."""
    sizes = [len(r) for r in mol.GetRingInfo().AtomRings() if centre in r and leaving not in r]
    return min(sizes, default=None)


def _small_rings(mol: Chem.Mol) -> int:
    """Return how many rings of three or four there are; a shift that makes one more runs uphill."""
    return sum(len(r) < 5 for r in mol.GetRingInfo().AtomRings())


def _in_four_ring(mol: Chem.Mol, one: int, other: int) -> bool:
    return any(len(r) == 4 and one in r and other in r for r in mol.GetRingInfo().AtomRings())


def _name(mol: Chem.Mol, atom: int, hydrogens: int) -> str:
    """Return words for a neighbour: what it is and its number in the drawing (from 1)."""
    kind = {0: "quaternary carbon", 1: "CH", 2: "CH2", 3: "CH3"}.get(hydrogens, "carbon")
    return f"{kind} (atom {atom + 1})"
