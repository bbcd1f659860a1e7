"""Addition of halogen, or of halogen and a nucleophile, across an alkene: dihalides, halohydrins and their kin.

The halogen comes as a cation from X2 or from N-halogen and the like, the nucleophile from anywhere, the alkene's own
molecule included (halo ethers, halo lactones). Only the balance is looked at; anti geometry is not checked.
"""

from __future__ import annotations

from collections.abc import Iterator

from kb.chem.balance import NOTHING, Removal, Workbench
from kb.chem.fates_addition import multiple_bonds
from kb.chem.match import Match
from kb.chem.nucleophile import HALIDES
from kb.chem.skeleton import Target
from kb.vocabulary import Fate


def find_halogenations(bench: Workbench, target: Target) -> list[Match]:
    """Return the additions of X+ and a nucleophile that give a product."""
    found: list[Match] = []
    sources = list(_sources(bench))
    if not sources:
        return found
    for part in range(bench.count):
        for a, b in multiple_bonds(bench.graphs[part]):
            for source in sources:
                found.extend(_added(bench, target, part, (a, b), source))
                found.extend(_added(bench, target, part, (b, a), source))
    return found


def _sources(bench: Workbench) -> Iterator[tuple[int, int, Removal]]:
    """Yield (part, halogen atom, what it leaves behind) for every halogen bonded to a heteroatom or another halogen."""
    for part in range(bench.count):
        graph = bench.graphs[part]
        for atom, element in enumerate(graph.elements):
            if element not in HALIDES or len(graph.neighbours[atom]) != 1:
                continue
            (other,) = graph.neighbours[atom]
            if graph.elements[other] in (7, 17, 35, 53):
                departs = frozenset(graph.side_of(other, atom) or ())
                yield part, atom, bench.removal(part, atom, other, departs, -1)


def _added(
    bench: Workbench, target: Target, part: int, ends: tuple[int, int], source: tuple[int, int, Removal]
) -> Iterator[Match]:
    """Yield matches with the halogen on the second end and a nucleophile on the first."""
    giver, halogen, removal = source
    if giver == part:
        return
    graph = bench.graphs[giver]
    if len(graph) == 2:
        both = (bench.atom(giver, halogen), bench.atom(giver, 1 - halogen))
        yield from _tried(bench, target, (part, giver), NOTHING, ends, both, (giver, 1 - halogen, "halogen"))
    for other in bench.attackers:
        if other == giver and len(graph) == 2:
            continue
        parts = tuple(dict.fromkeys((part, giver, other)))
        for site in bench.nucleophiles(other):
            if site.gone is None and site.rank >= 20:
                both = (bench.atom(giver, halogen), bench.atom(other, site.atom))
                yield from _tried(bench, target, parts, removal, ends, both, (other, site.atom, site.word))


def _tried(
    bench: Workbench,
    target: Target,
    parts: tuple[int, ...],
    removal: Removal,
    ends: tuple[int, int],
    both: tuple[int, int],
    nucleophile: tuple[int, int, str],
) -> Iterator[Match]:
    """Yield the match when halogen and nucleophile on the two ends give the product."""
    if bench.excess(parts, target, removal) != (0, 0):
        return
    first, second = (bench.atom(parts[0], e) for e in ends)
    removals = [removal]
    if not removal.cuts:
        start = bench.pool.starts[parts[1]]
        removals = [bench.removal(parts[1], both[0] - start, both[1] - start, None, 0)]
    edit = bench.edit(parts, removals, ((second, both[0]), (first, both[1])))
    if edit and bench.gives(edit, target):
        what = "halogen" if nucleophile[2] == "halogen" else f"halogen and {nucleophile[2].replace('_', ' ')}"
        yield Match(
            fate=Fate.ADDITION,
            edit=edit,
            centres=((parts[0], ends[0], None),),
            nucleophile=None if nucleophile[2] == "halogen" else nucleophile,
            note=f"addition of {what} to a multiple bond",
            rank=30,
            cost=1 if nucleophile[0] != bench.water else 2,
        )
