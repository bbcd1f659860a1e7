"""Which carbons bear a positive charge well, what shifts towards a better one, which ends take a nucleophile.

It is the textbook ladder as integers that order and nothing more: no energies, no rates. Everything that asks
"would this ionise", "would that move" or "which end" asks here, so that all readings and drawings agree.
"""

from __future__ import annotations

from collections.abc import Iterator

from kb.chem.carbon import find_carbon_class
from kb.chem.molgraph import Molgraph
from kb.chem.nucleophile import is_acceptor
from kb.vocabulary import CarbonClass


def is_stabilised_cation(graph: Molgraph, carbon: int, leaving: int | None) -> bool:
    """Return whether a cation at the carbon would be allylic, benzylic, propargylic or next to a donor atom."""
    for n in graph.neighbours[carbon]:
        if n == leaving:
            continue
        if graph.aromatic[n] or (graph.elements[n] in (7, 8, 16) and graph.charges[n] <= 0):
            return True
        if graph.elements[n] == 6 and graph.has_multiple_bond(n, 6):
            return True
    return False


def iter_shifts(
    graph: Molgraph, centre: int, leaving: int | None, *, expected_only: bool = False
) -> Iterator[tuple[int, int | None]]:
    """Yield (carbon that ends up short, migrating atom) for 1,2-shifts to the centre; None as mover = hydrogen.

    Every sp3 neighbour offers its hydrogen, and its carbon substituents when the shift makes a better cation;
    whether it does is `cation_score`. A primary cation never forms: there something moves only as the group goes.

    Args:
        graph: the fragment.
        centre: where the charge would be.
        leaving: atom that leaves it; None = none.
        expected_only: for a primary centre, only shifts that are the rule: neopentyl, and growth of a small ring.
            Isobutyl, where 2-methyl-1-propanol and HBr give no shifted bromide, is left out then.
    """
    here = cation_score(graph, centre, leaving)
    is_primary = find_carbon_class(graph, centre) in (CarbonClass.PRIMARY, CarbonClass.METHYL)
    for origin, code in graph.neighbours[centre].items():
        if code != 1 or origin == leaving or not graph.is_sp3_carbon(origin):
            continue
        branches = sum(graph.elements[n] == 6 for n in graph.neighbours[origin])
        if is_primary and branches < (4 if expected_only and not _in_small_ring(graph, origin) else 3):
            continue
        if graph.hydrogens[origin] and cation_score(graph, origin, None) > here:
            yield origin, None
        if is_bridge_bound(graph, origin):
            continue
        for mover in graph.neighbours[origin]:
            if mover == centre or graph.elements[mover] != 6:
                continue
            if cation_score(graph, origin, mover) > here and mover not in graph.neighbours[centre]:
                yield origin, mover


def ring_breaks(graph: Molgraph, centre: int, leaving: int | None) -> Iterator[tuple[int, int]]:
    """Yield (near, far) for the bonds of a cyclopropane beside a cation that open to a homoallyl cation.

    Source: common textbook knowledge; cyclopropylcarbinyl, cyclobutyl and homoallyl products come together.
    """
    rings = [r for r in graph.mol.GetRingInfo().AtomRings() if len(r) == 3]
    for near, code in graph.neighbours[centre].items():
        if code != 1 or near == leaving or not graph.is_sp3_carbon(near):
            continue
        for ring in rings:
            if near in ring and centre not in ring and all(graph.is_sp3_carbon(a) for a in ring):
                for far in ring:
                    if far != near:
                        yield near, far


def _in_small_ring(graph: Molgraph, atom: int) -> bool:
    return any(atom in ring and len(ring) <= 4 for ring in graph.mol.GetRingInfo().AtomRings())


def is_bridge_bound(graph: Molgraph, atom: int) -> bool:
    """Return whether a cation at the atom would sit at a bridgehead."""
    return find_carbon_class(graph, atom) is CarbonClass.BRIDGEHEAD


def cation_score(graph: Molgraph, carbon: int, without: int | None) -> int:
    """Return how well a cation is held: carbon neighbours, plus 2 beside pi systems and 4 beside a donor atom.

    Args:
        graph: the fragment.
        carbon: where the charge would be.
        without: a neighbour that is gone (leaving atom, migrating group).

    Source: the textbook ladder methyl < primary < secondary < tertiary, allyl and benzyl about one class better; the
    figures only order, they are no energies.
    """
    score = 0
    for n in graph.neighbours[carbon]:
        if n == without:
            continue
        if graph.elements[n] == 6:
            score += 1
            if graph.aromatic[n] or graph.has_multiple_bond(n, 6):
                score += 2
            elif is_acceptor(graph, n):
                score -= 2
        elif graph.elements[n] in (7, 8, 16) and graph.charges[n] <= 0 and not graph.has_multiple_bond(n):
            score += 4
    if is_bridge_bound(graph, carbon):
        score -= 10
    return score


def alkene_carbons(graph: Molgraph) -> list[int]:
    """Return the carbons of carbon-carbon double and triple bonds that are not aromatic."""
    known = graph.memo.get("alkene carbons")
    if known is None:
        known = [
            a
            for a, z in enumerate(graph.elements)
            if z == 6 and not graph.aromatic[a] and graph.has_multiple_bond(a, 6)
        ]
        graph.memo["alkene carbons"] = known
    return known  # type: ignore[return-value]


def is_conjugate_end(graph: Molgraph, carbon: int) -> bool:
    """Return whether the far end of the carbon's multiple bond carries an acceptor."""
    return any(
        code in (2, 3)
        and graph.elements[n] == 6
        and any(m != carbon and (is_acceptor(graph, m) or _is_azine(graph, m)) for m in graph.neighbours[n])
        for n, code in graph.neighbours[carbon].items()
    )


def _is_azine(graph: Molgraph, atom: int) -> bool:
    """Return whether an aromatic carbon draws electrons because a ring nitrogen is beside it."""
    return graph.aromatic[atom] and any(
        graph.elements[n] == 7 and not graph.hydrogens[n] and len(graph.neighbours[n]) == 2
        for n in graph.neighbours[atom]
    )
