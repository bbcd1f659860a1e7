"""A carbon atom by itself: its class, what stands beside it, its beta hydrogens.

It knows no leaving groups and ranks nothing.

Carbon class counts carbon neighbours (IUPAC usage); bridgehead, vinyl and aryl win over the count. The
bridgehead test is geometric bookkeeping: an sp3 carbon with three ring bonds whose rings share more than one
bond (bridged, as in norbornane or adamantane), or that closes a cage of small rings (as in cubane); a fused
junction (decalin) is none.
"""

from __future__ import annotations

from kb.chem.molgraph import Molgraph
from kb.vocabulary import CarbonClass, CentreFlag


def find_carbon_class(graph: Molgraph, centre: int) -> CarbonClass | None:
    """Return the class of a carbon; None for carbonyl, nitrile and other carbons that no class describes."""
    if graph.aromatic[centre]:
        return CarbonClass.ARYL
    is_diazo = is_diazo_carbon(graph, centre)
    if graph.has_multiple_bond(centre) and not is_diazo:
        return CarbonClass.VINYL if graph.has_multiple_bond(centre, 6) else None
    if not is_diazo and not graph.is_sp3_carbon(centre):
        return None
    if is_bridgehead(graph, centre):
        return CarbonClass.BRIDGEHEAD
    carbons = sum(graph.elements[n] == 6 for n in graph.neighbours[centre])
    return (CarbonClass.METHYL, CarbonClass.PRIMARY, CarbonClass.SECONDARY, CarbonClass.TERTIARY)[min(carbons, 3)]


def is_diazo_carbon(graph: Molgraph, atom: int) -> bool:
    """Return whether an atom is the carbon of a diazo group, which an acid turns into an alkyl diazonium."""
    return any(
        code == 2 and graph.elements[n] == 7 and graph.charges[n] > 0 and graph.has_multiple_bond(n, 7)
        for n, code in graph.neighbours[atom].items()
    )


def is_bridgehead(graph: Molgraph, atom: int) -> bool:
    """Return whether an sp3 atom sits at a bridgehead or cage corner, so that it cannot become flat."""
    if not graph.in_ring[atom]:
        return False
    ring_bonds = [n for n in graph.neighbours[atom] if graph.in_ring[n]]
    if len(ring_bonds) < 3:
        return False
    rings = [frozenset(r) for r in graph.mol.GetRingInfo().AtomRings() if atom in r and len(r) <= 8]
    for i, first in enumerate(rings):
        if any(len(first & second) > 2 for second in rings[i + 1 :]):
            return True
    small = [r for r in rings if len(r) <= 5]
    return len(small) >= 3 and all(sum(n in r for r in small) >= 2 for n in ring_bonds[:3])


def find_flags(graph: Molgraph, centre: int, leaving: int | None) -> tuple[CentreFlag, ...]:
    """Return what stands beside a centre, in vocabulary order."""
    flags = set()
    for n, code in graph.neighbours[centre].items():
        if n == leaving or code != 1:
            continue
        if graph.aromatic[n]:
            flags.add(CentreFlag.BENZYLIC)
        elif graph.elements[n] in (7, 8, 16):
            flags.add(CentreFlag.ALPHA_HETEROATOM)
        elif graph.elements[n] == 6:
            flags |= _carbon_neighbour_flags(graph, centre, n)
    rings = [r for r in graph.mol.GetRingInfo().AtomRings() if centre in r and leaving not in r]
    if rings:
        flags.add(CentreFlag.RING)
        if min(len(r) for r in rings) <= 4:
            flags.add(CentreFlag.SMALL_RING)
    return tuple(flag for flag in CentreFlag if flag in flags)


def _carbon_neighbour_flags(graph: Molgraph, centre: int, n: int) -> set[CentreFlag]:
    """Return the flags that one carbon neighbour gives the centre."""
    bonds = graph.neighbours[n]
    for other, code in bonds.items():
        if code == 2:
            if graph.elements[other] == 6:
                return {CentreFlag.ALLYLIC}
            return {CentreFlag.ALPHA_CARBONYL} if graph.elements[other] in (7, 8, 16) else set()
        if code == 3:
            return {CentreFlag.PROPARGYLIC if graph.elements[other] == 6 else CentreFlag.ALPHA_CARBONYL}
    beyond = [o for o in bonds if o != centre and graph.elements[o] == 6]
    flags = set()
    if len(beyond) == 3:
        flags.add(CentreFlag.NEOPENTYL)
    if len(beyond) >= 2:
        flags.add(CentreFlag.BETA_BRANCHED)
    if any(graph.aromatic[o] for o in beyond):
        flags.add(CentreFlag.HOMOBENZYLIC)
    return flags


def count_beta_hydrogens(graph: Molgraph, centre: int) -> int:
    """Return the hydrogens on sp3 carbons beside the centre."""
    return sum(graph.hydrogens[n] for n in graph.neighbours[centre] if graph.is_sp3_carbon(n))


def has_drawn_configuration(graph: Molgraph, atom: int) -> bool:
    """Return whether the atom was drawn with a configuration."""
    return int(graph.mol.GetAtomWithIdx(atom).GetChiralTag()) in (1, 2)
