"""Which atoms symmetry makes equal, and whether two readings of a product rival each other.

It chooses nothing: where readings rival, the caller says so; where atoms are equal, the caller takes one.
"""

from __future__ import annotations

from collections.abc import Sequence

from rdkit import Chem

from kb.chem.match import Match
from kb.chem.molgraph import Molgraph
from kb.vocabulary import Fate


def symmetry_classes(graph: Molgraph) -> list[int]:
    """Return a number per atom, equal for atoms that the molecule's symmetry exchanges, drawn configuration aside.

    The two ends of a meso epoxide are mirror images of each other; what tells them apart is the stated product.
    """
    known = graph.memo.get("symmetry")
    if known is None:
        known = list(Chem.CanonicalRankAtoms(graph.mol, breakTies=False, includeChirality=False))
        graph.memo["symmetry"] = known
    return known  # type: ignore[return-value]


def find_rival(graphs: Sequence[Molgraph], matches: Sequence[Match]) -> str:
    """Return why the best match cannot be told from another, or nothing when it stands alone.

    Two readings rival each other when they assume as little and differ in which carbon gave up its leaving group:
    an ether from two alcohols.
    """
    best = matches[0]
    if best.fate is not Fate.SUBSTITUTION or len(best.centres) != 1:
        return ""
    for other in matches[1:]:
        if other.cost != best.cost or other.fate is not Fate.SUBSTITUTION or len(other.centres) != 1:
            continue
        (part, centre, leaving), (part2, centre2, leaving2) = best.centres[0], other.centres[0]
        if part2 >= len(graphs) or part >= len(graphs) or leaving is None or leaving2 is None:
            continue
        if (graphs[part].smiles, symmetry_classes(graphs[part])[centre]) == (
            graphs[part2].smiles,
            symmetry_classes(graphs[part2])[centre2],
        ):
            continue
        if abs(other.rank - best.rank) < 10:
            return (
                "Two carbons could have given up their leaving group for the stated product, and nothing in the scheme "
                "tells which did."
            )
    return ""
