"""When nothing that was enumerated is the product: set substrate and product side by side.

Two ways, the exact one first. (1) The product is the substrate with one leaving group replaced by something
that no stated fragment brings: a nucleophile that was left out of the scheme. (2) A maximum common
substructure, within a time limit, shows exactly one leaving group gone and its carbon newly bonded. Anything
less clear is no reading: the caller says `unresolved` and gives the reason from here.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from rdkit import Chem

from kb.chem.centre import LeavingSite, find_leaving_sites
from kb.chem.molgraph import Molgraph
from kb.chem.nucleophile_site import METALS
from kb.chem.skeleton import element_code, refine
from kb.chem.uninterrupted import uninterrupted

TIME_LIMIT_S = 1
"""Time allowed for one common substructure [s]."""

LARGEST = 70
"""Heavy atoms of the largest molecule for which a common substructure is sought."""

LARGEST_BY_BRANCH = 150
"""Heavy atoms of the largest product whose branches are compared one by one."""

_LEAST_SHARED = 0.6

_INSERTED = METALS - {5}
"""Elements whose bond to carbon says that a metal went in; a boryl group may well come as a nucleophile."""


@dataclass(frozen=True, slots=True)
class Comparison:
    """What the comparison shows.

    Attributes:
        part: the substrate; None when nothing clear came out.
        site: the leaving group that was replaced.
        reason: plain words, either for the reading or for why there is none.
    """

    part: int | None
    site: LeavingSite | None
    reason: str


def compare(graphs: list[Molgraph], product: Molgraph) -> Comparison:
    """Return which leaving group was replaced, going by substrate and product alone."""
    branches = list(_iter_branches(product)) if len(product) <= LARGEST_BY_BRANCH else []
    if any(True for _ in _iter_metal_bonds(product)):
        return Comparison(None, None, "The stated product has a bond from carbon to a metal; no displacement makes it.")
    exact = [
        (part, site)
        for part, graph in enumerate(graphs)
        for site in find_leaving_sites(graph)
        if site.is_sp3 and site.leaves_unaided and site.departs and _is_replaced(graph, site, product, branches)
    ]
    if exact:
        best = max(exact, key=lambda e: (len(graphs[e[0]]), e[1].rank))
        return Comparison(*best, "one group replaced by something that no stated component brings")
    return _by_common_part(graphs, product)


def _iter_branches(product: Molgraph) -> Iterator[tuple[int, frozenset[int]]]:
    """Yield (sp3 carbon, atoms of one branch on it) for every branch that hangs on one bond."""
    for carbon in range(len(product)):
        if product.is_sp3_carbon(carbon):
            for first in product.neighbours[carbon]:
                side = product.side_of(first, carbon)
                if side is not None:
                    yield carbon, frozenset(side)


def _iter_metal_bonds(product: Molgraph) -> Iterator[tuple[int, int]]:
    """Yield (carbon, metal) for every bond between the two."""
    for carbon, element in enumerate(product.elements):
        for metal in product.neighbours[carbon] if element == 6 else ():
            if product.elements[metal] in _INSERTED:
                yield carbon, metal


def find_metal_insertion(graphs: list[Molgraph], product: Molgraph) -> bool:
    """Return whether the product is a fragment with a metal where its leaving group was: Grignard and lithium reagents.

    The carbon takes electrons up instead of giving a place to a pair, so this is no displacement, whatever its class.
    """
    branches = []
    for carbon, metal in _iter_metal_bonds(product):
        side = product.side_of(metal, carbon)
        if side is not None:
            branches.append((carbon, frozenset(side)))
    return bool(branches) and any(
        site.departs is not None and _is_replaced(graph, site, product, branches, least=1)
        for graph in graphs
        for site in find_leaving_sites(graph)
    )


def _is_replaced(
    graph: Molgraph,
    site: LeavingSite,
    product: Molgraph,
    branches: list[tuple[int, frozenset[int]]],
    *,
    least: int = 3,
) -> bool:
    """Return whether the product is the substrate with another branch in place of the leaving group."""
    kept = [a for a in range(len(graph)) if a not in (site.departs or ())]
    if len(kept) < least or len(kept) >= len(product):
        return False
    wanted = sum(element_code(graph.elements[a]) for a in kept)
    hydrogens = sum(graph.hydrogens[a] for a in kept)
    mine: int | None = None
    for carbon, side in branches:
        if product.hydrogens[carbon] != graph.hydrogens[site.centre] or len(product) - len(side) != len(kept):
            continue
        rest = [a for a in range(len(product)) if a not in side]
        if sum(element_code(product.elements[a]) for a in rest) != wanted:
            continue
        if sum(product.hydrogens[a] for a in rest) != hydrogens:
            continue
        if mine is None:
            mine = _signature(graph, kept, site.centre)
        if _signature(product, rest, carbon) == mine:
            return True
    return False


def _signature(graph: Molgraph, atoms: list[int], centre: int) -> int:
    """Return a hash of part of a molecule that also says where in it the centre is."""
    inside = set(atoms)
    colours = refine(
        {a: graph.elements[a] for a in atoms},
        {a: tuple(n for n in graph.neighbours[a] if n in inside) for a in atoms},
    )
    return hash((len(atoms), sum(colours.values()), colours[centre]))


def _by_common_part(graphs: list[Molgraph], product: Molgraph) -> Comparison:
    """Return the reading of a maximum common substructure, where it is clear."""
    nothing = "None of the products that could be worked out is the stated one"
    candidates = [
        (part, graph)
        for part, graph in enumerate(graphs)
        if 5 <= len(graph) <= LARGEST and any(s.is_sp3 and s.leaves_unaided for s in find_leaving_sites(graph))
    ]
    if not candidates or len(product) > LARGEST or len(product) < 5:
        return Comparison(None, None, f"{nothing}.")
    part, graph = max(candidates, key=lambda c: len(c[1]))
    from rdkit.Chem import rdFMCS  # slow to load, seldom needed

    with uninterrupted():
        found = rdFMCS.FindMCS(
            [graph.mol, product.mol],
            timeout=TIME_LIMIT_S,
            atomCompare=rdFMCS.AtomCompare.CompareElements,
            bondCompare=rdFMCS.BondCompare.CompareOrder,
            ringMatchesRingOnly=True,
            completeRingsOnly=True,
        )
    if found.canceled:
        return Comparison(None, None, f"{nothing}, and comparing the structures took too long.")
    if found.numAtoms < _LEAST_SHARED * len(graph):
        return Comparison(None, None, f"{nothing}, and no component is much like it.")
    pattern = Chem.MolFromSmarts(found.smartsString)
    here, there = graph.mol.GetSubstructMatch(pattern), product.mol.GetSubstructMatch(pattern)
    pairs = dict(zip(here, there, strict=False))
    sites = [
        s
        for s in find_leaving_sites(graph)
        if s.is_sp3 and s.leaves_unaided and s.departs and s.centre in pairs and not set(pairs) & s.departs
    ]
    replaced = [s for s in sites if _is_newly_bonded(product, pairs, s)]
    if len(replaced) == 1 and found.numAtoms == len(graph) - len(replaced[0].departs or ()):
        return Comparison(part, replaced[0], "the largest common part has one leaving group replaced")
    return Comparison(None, None, f"{nothing}; compared side by side they differ in more than one place.")


def _is_newly_bonded(product: Molgraph, pairs: dict[int, int], site: LeavingSite) -> bool:
    """Return whether the centre has a neighbour in the product that is not of the common part."""
    carbon, shared = pairs[site.centre], set(pairs.values())
    return product.is_sp3_carbon(carbon) and any(n not in shared for n in product.neighbours[carbon])
