"""What reacts without an sp3 carbon being displaced: transfer of acyl, sulfonyl, silyl or aryl, carbonyl groups.

These readings exist so that the record can say `other` with the right name, rather than leave an amide
coupling or a mesylation to be mistaken for a displacement. It lists bonds only; it judges nothing and draws
nothing.
"""

from __future__ import annotations

from dataclasses import dataclass

from kb.chem.carbon import is_diazo_carbon
from kb.chem.molgraph import Molgraph


@dataclass(frozen=True, slots=True)
class TransferSite:
    """An atom that takes a nucleophile by another way than displacement at sp3 carbon.

    Attributes:
        atom: it [canonical number].
        name: what the reaction is called.
        gone: atom that leaves; None for an addition to a multiple bond.
        departs: all that leaves with it; None when a ring holds it.
        gain: as in `skeleton.Cut`.
        cost: 0 for the usual leaving groups, more for those that seldom leave here.
    """

    atom: int
    name: str
    gone: int | None
    departs: frozenset[int] | None
    gain: int
    cost: int = 0


def find_transfer_sites(graph: Molgraph) -> tuple[TransferSite, ...]:
    """Return the electrophilic atoms of a fragment that are no sp3 carbon."""
    known = graph.memo.get("transfer")
    if known is None:
        found: list[TransferSite] = []
        for atom, element in enumerate(graph.elements):
            if element == 6 and not graph.is_sp3_carbon(atom):
                found.extend(_carbon(graph, atom))
            elif element in (14, 15, 16, 5):
                found.extend(_central(graph, atom, element))
        known = tuple(found)
        graph.memo["transfer"] = known
    return known  # type: ignore[return-value]


def _site(graph: Molgraph, atom: int, gone: int, name: str, gain: int = -1, cost: int = 0) -> TransferSite:
    departs = graph.side_of(gone, atom)
    return TransferSite(atom, name, gone, None if departs is None else frozenset(departs), gain, cost)


def _aryl_cost(graph: Molgraph, gone: int) -> int:
    """Return how unusual it is that this atom leaves an aromatic carbon: a phenol keeps its oxygen."""
    element = graph.elements[gone]
    if element in (9, 17, 35, 53, 5) or graph.charges[gone] > 0:
        return 0
    if element in (8, 16) and len(graph.neighbours[gone]) > 1:
        return 0 if any(graph.elements[n] == 16 for n in graph.neighbours[gone]) or element == 16 else 1
    return 3


def _carbon(graph: Molgraph, atom: int) -> list[TransferSite]:
    """Return the sites of an unsaturated carbon."""
    bonds = graph.neighbours[atom]
    found = []
    if graph.aromatic[atom]:
        for n in bonds:
            if graph.elements[n] in (9, 17, 35, 53, 8, 16, 7, 5) and not graph.aromatic[n]:
                found.append(_site(graph, atom, n, "substitution at an aromatic carbon", cost=_aryl_cost(graph, n)))
        return found
    if is_diazo_carbon(graph, atom):
        return []
    oxo = [n for n, code in bonds.items() if code == 2 and graph.elements[n] in (7, 8, 16)]
    if oxo:
        for n, code in bonds.items():
            if code == 1 and graph.elements[n] in (7, 8, 9, 16, 17, 35, 53):
                found.append(_site(graph, atom, n, "acyl transfer"))
        for n in oxo:
            found.append(_site(graph, atom, n, "condensation at a carbonyl group", -2))
        found.append(TransferSite(atom, "addition to a carbonyl group", None, None, 0))
        return found
    if any(code == 3 and graph.elements[n] == 7 for n, code in bonds.items()):
        return [TransferSite(atom, "addition to a nitrile", None, None, 0)]
    for n, code in bonds.items():
        if code == 1 and graph.elements[n] in (9, 17, 35, 53, 8, 16, 7):
            found.append(_site(graph, atom, n, "substitution at a vinylic carbon"))
    return found


def _central(graph: Molgraph, atom: int, element: int) -> list[TransferSite]:
    """Return the sites of silicon, phosphorus, sulfur and boron."""
    name = {14: "silylation", 15: "phosphorylation", 16: "sulfonylation", 5: "borylation"}[element]
    if element == 16 and not graph.has_multiple_bond(atom, 8):
        if not any(graph.elements[n] in (16, 17, 35) for n in graph.neighbours[atom]):
            return []
        name = "sulfenylation"
    return [
        _site(graph, atom, n, name)
        for n, code in graph.neighbours[atom].items()
        if code == 1 and graph.elements[n] in (7, 8, 9, 16, 17, 35, 53)
    ]
