"""Oxidations, reductions and like changes: the product is one of the fragments with other atoms at its ends.

It recognises them so that they can be called `other`; it says nothing about how they are done. The test: take
off every atom that hangs on one bond and is no carbon (=O, -OH, halogen, the outer atoms of an azide), and
compare what is left. Same remainder, same ends on saturated carbon but for oxygen, other oxygens or
hydrogens: an oxidation or a reduction. A halogen that came or went at saturated carbon is left alone: that
would be a displacement whose partner was not stated.
"""

from __future__ import annotations

from dataclasses import dataclass

from kb.chem.molgraph import Molgraph
from kb.chem.skeleton import refine

_SMALLEST = 4


@dataclass(frozen=True, slots=True)
class Interchange:
    """A product that is a fragment with other ends: which part, and what kind of change."""

    part: int
    note: str


def find_interchange(graphs: list[Molgraph], product: Molgraph) -> Interchange | None:
    """Return the change of oxidation level that gives a product from one fragment; None when it is no such thing."""
    if len(product) < _SMALLEST:
        return None
    core = _core(product)
    for part, graph in enumerate(graphs):
        if len(graph) < _SMALLEST or graph.smiles == product.smiles or _core(graph) != core:
            continue
        if _ends(graph) != _ends(product):
            continue
        level = _level(product) - _level(graph)
        if level:
            return Interchange(part, "oxidation" if level > 0 else "reduction")
        return Interchange(part, "rearrangement of bonds within the molecule")
    return None


def _is_end(graph: Molgraph, atom: int) -> bool:
    return graph.elements[atom] != 6 and len(graph.neighbours[atom]) == 1


def _core(graph: Molgraph) -> int:
    """Return a hash of the skeleton without its end atoms; an azide or diazo group loses two."""
    known = graph.memo.get("core")
    if known is None:
        gone = {a for a in range(len(graph)) if _is_end(graph, a) and not _is_sole_nitrogen(graph, a)}
        gone |= {
            a
            for a in range(len(graph))
            if graph.elements[a] == 7
            and graph.charges[a] > 0
            and any(n in gone and graph.elements[n] == 7 for n in graph.neighbours[a])
        }
        kept = [a for a in range(len(graph)) if a not in gone]
        colours = refine(
            {a: graph.elements[a] for a in kept},
            {a: tuple(n for n in graph.neighbours[a] if n not in gone) for a in kept},
        )
        known = hash((len(kept), sum(colours.values())))
        graph.memo["core"] = known
    return known  # type: ignore[return-value]


def _is_sole_nitrogen(graph: Molgraph, atom: int) -> bool:
    """Return whether an end atom is a nitrogen on carbon: an amine or a nitrile keeps it."""
    return graph.elements[atom] == 7 and all(graph.elements[n] == 6 for n in graph.neighbours[atom])


def _ends(graph: Molgraph) -> tuple[int, ...]:
    """Return the end atoms on saturated carbon that could have left or come in, oxygen excepted, sorted."""
    return tuple(
        sorted(
            graph.elements[a]
            for a in range(len(graph))
            if _is_end(graph, a)
            and graph.elements[a] not in (7, 8)
            and any(graph.is_sp3_carbon(n) for n in graph.neighbours[a])
        )
    )


def _level(graph: Molgraph) -> int:
    """Return a sum that rises with oxidation: 2 for each oxygen, less the hydrogens, plus the charge."""
    return 2 * sum(z == 8 for z in graph.elements) - sum(graph.hydrogens) + sum(graph.charges)
