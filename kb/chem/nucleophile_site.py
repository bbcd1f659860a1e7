"""The nucleophilic atom as a value, and the few questions about atoms that its rules share.

It lists no nucleophiles (`nucleophile`, `nucleophile_carbon`).
"""

from __future__ import annotations

from dataclasses import dataclass

from kb.chem.molgraph import Molgraph

METALS = frozenset(
    (3, 4, 5, 11, 12, 13, 19, 20, 22, 25, 26, 27, 28, 29, 30, 31, 40, 46, 47, 48, 49, 50, 55, 58, 80, 82)
)
"""Elements that a nucleophilic atom parts from, boron included."""


@dataclass(frozen=True, slots=True)
class NucleophileSite:
    """An atom that can attack.

    Attributes:
        atom: it [canonical number].
        word: class word.
        rank: how willingly, higher first; a judgement that only orders what is tried and shown.
        gone: atom that must part from it first; None = none.
        departs: all that goes with that atom.
        holder: the atom that parts from `gone`; None = the attacking atom itself.
        gain: what the attacking side gains in P by parting (`skeleton.Cut`).
    """

    atom: int
    word: str
    rank: int
    gone: int | None = None
    departs: frozenset[int] = frozenset()
    holder: int | None = None
    gain: int = 1


def released(graph: Molgraph, atom: int, gone: int, word: str, rank: int) -> NucleophileSite:
    """Return a site that must first part from `gone`; a ring keeps it tied on."""
    departs = graph.side_of(gone, atom)
    return NucleophileSite(atom, word, rank, gone, frozenset(departs or ()))


def is_acceptor(graph: Molgraph, atom: int) -> bool:
    """Return whether the atom draws electrons: of carbonyl, nitrile, nitro, sulfonyl, phosphoryl or onium."""
    element = graph.elements[atom]
    if graph.aromatic[atom]:
        return False
    if element == 6:
        return any(
            code in (2, 3) and graph.elements[n] in (7, 8, 16) for n, code in graph.neighbours[atom].items()
        )
    if element == 7:
        return graph.charges[atom] > 0 and sum(graph.elements[n] == 8 for n in graph.neighbours[atom]) == 2
    if element in (15, 16):
        return graph.charges[atom] > 0 or graph.has_multiple_bond(atom, 8)
    return False
