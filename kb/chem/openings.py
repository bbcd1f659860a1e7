"""Where a nucleophile may land, and at what price: displacement, transposition, shift, addition, transfer.

An opening is a set of bond changes that leaves one atom short of a pair of electrons. Filled by a nucleophile
it is a substitution, an addition or a transfer; left empty it is an elimination. Nothing is judged by rate
here; `cost` says only how much must be assumed (0 = a group that departs by itself), so that the plainest
reading wins.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

from kb.chem.assumptions import departure_cost
from kb.chem.balance import Removal, Workbench
from kb.chem.cations import alkene_carbons, cation_score, is_conjugate_end, iter_shifts, ring_breaks
from kb.chem.centre import LeavingSite, find_leaving_sites, name_group
from kb.chem.molgraph import Molgraph
from kb.chem.nucleophile import NucleophileSite, is_acceptor
from kb.chem.skeleton import Cut
from kb.chem.transfer import find_transfer_sites
from kb.vocabulary import CarbonClass, Fate, LeavingGroup


@dataclass(frozen=True, slots=True)
class Opening:
    """Bond changes that let a nucleophile in.

    Attributes:
        part: the fragment.
        atom: where the nucleophile lands [number in the part].
        removals: what leaves.
        joins: bonds that form besides [pool numbers]; a migrating group.
        fate: the word when a nucleophile lands.
        centre: (atom, leaving atom or None) that names the centre; None when no carbon is displaced.
        group: the leaving group, for a note.
        site: the leaving site; None for additions and transfers.
        note: words for how.
        rank: readiness, higher first.
        cost: assumptions needed.
        gain: hydride equivalents taken up besides (reductive amination: 2).
    """

    part: int
    atom: int
    removals: tuple[Removal, ...]
    joins: tuple[tuple[int, int], ...]
    fate: Fate
    centre: tuple[int, int | None] | None
    group: LeavingGroup | None
    site: LeavingSite | None
    note: str
    rank: int
    cost: int
    gain: int = 0


def find_displacements(bench: Workbench) -> list[Opening]:
    """Return an opening for every leaving group at sp3 carbon, and for elimination at vinyl carbon."""
    found = []
    for part in range(bench.count):
        graph = bench.graphs[part]
        for site in find_leaving_sites(graph):
            if site.carbon_class is CarbonClass.ARYL:
                continue
            if site.gain == 0 and any(is_acceptor(graph, n) for n in graph.neighbours[site.centre]):
                found.append(_carbene(bench, part, site))
                continue
            found.append(
                Opening(
                    part=part,
                    atom=site.centre,
                    removals=(bench.of_site(part, site),),
                    joins=(),
                    fate=Fate.SUBSTITUTION if site.is_sp3 else Fate.OTHER,
                    centre=(site.centre, site.leaving),
                    group=site.group,
                    site=site,
                    note=f"displacement of {name_group(graph, site)}"
                    if site.is_sp3
                    else "substitution at a vinylic carbon",
                    rank=site.rank + _ease(graph, site),
                    cost=departure_cost(graph, site, bench.promoters),
                )
            )
            released = _released_from_ring(bench, part, site)
            if released is not None:
                found.append(replace(found[-1], removals=(released,)))
    return found


def _carbene(bench: Workbench, part: int, site: LeavingSite) -> Opening:
    """Return the opening of a diazo carbon beside an acceptor: a carbene, for acids seldom protonate it."""
    return Opening(
        part=part,
        atom=site.centre,
        removals=(bench.of_site(part, site),),
        joins=(),
        fate=Fate.OTHER,
        centre=None,
        group=None,
        site=None,
        note="insertion of a carbene",
        rank=site.rank,
        cost=0,
    )


def _ease(graph: Molgraph, site: LeavingSite) -> int:
    """Return how much the better cation speaks for one of two groups that both need help to leave."""
    return 0 if site.leaves_unaided else 6 * cation_score(graph, site.centre, site.leaving)


def _released_from_ring(bench: Workbench, part: int, site: LeavingSite) -> Removal | None:
    """Return the departure of a ring leaving group that the work-up frees at its other end too.

    Cyclic sulfates, sulfites, sulfamidates and carbonates: the opened ring loses SO3, SO2 or CO2 and leaves O-H or N-H.
    """
    graph = bench.graphs[part]
    if site.departs is not None:
        return None
    for hub in graph.neighbours[site.leaving]:
        if hub == site.centre or not (graph.elements[hub] == 16 or graph.has_multiple_bond(hub, 8)):
            continue
        for held, code in graph.neighbours[hub].items():
            if held == site.leaving or code != 1 or graph.elements[held] not in (7, 8) or not graph.in_ring[held]:
                continue
            gone = {site.leaving, hub, *(n for n, order in graph.neighbours[hub].items() if order == 2)}
            moved = frozenset(bench.atom(part, a) for a in gone)
            tally = bench.pool.tally_of(moved)
            cuts = (
                Cut(bench.atom(part, site.centre), bench.atom(part, site.leaving), moved, -1),
                Cut(bench.atom(part, held), bench.atom(part, hub), moved, 1),
            )
            return Removal(cuts, tally.elements, tally.protons)
    return None


def find_transpositions(bench: Workbench, displacements: list[Opening]) -> list[Opening]:
    """Return openings at the far end of an allylic or propargylic system."""
    found = []
    for opening in displacements:
        if opening.fate is not Fate.SUBSTITUTION or opening.cost > 1 or opening.site is None:
            continue
        graph = bench.graphs[opening.part]
        centre, leaving = opening.site.centre, opening.site.leaving
        for near, code in graph.neighbours[centre].items():
            if code != 1 or near == leaving or graph.elements[near] != 6 or graph.aromatic[near]:
                continue
            for far, order in graph.neighbours[near].items():
                if order in (2, 3) and graph.elements[far] == 6 and not graph.aromatic[far]:
                    found.append(
                        Opening(
                            part=opening.part,
                            atom=far,
                            removals=opening.removals,
                            joins=(),
                            fate=Fate.TRANSPOSED,
                            centre=opening.centre,
                            group=opening.group,
                            site=opening.site,
                            note=f"displacement of {name_group(graph, opening.site)} with allylic transposition",
                            rank=opening.rank - 10,
                            cost=opening.cost,
                        )
                    )
    return found


def find_shifts(bench: Workbench, displacements: list[Opening]) -> list[Opening]:
    """Return openings left by a 1,2-shift of hydrogen or carbon towards a leaving group's carbon."""
    found = []
    for opening in displacements:
        if opening.fate is not Fate.SUBSTITUTION or opening.cost > 1 or opening.site is None:
            continue
        graph, site = bench.graphs[opening.part], opening.site
        if site.carbon_class is CarbonClass.BRIDGEHEAD or site.departs is None:
            continue
        for origin, mover in iter_shifts(graph, site.centre, site.leaving):
            removals = opening.removals
            joins: tuple[tuple[int, int], ...] = ()
            if mover is not None:
                kept, gone = bench.atom(opening.part, origin), bench.atom(opening.part, mover)
                removals = (*removals, Removal((Cut(kept, gone, frozenset(), 0),)))
                joins = ((bench.atom(opening.part, site.centre), gone),)
            found.append(
                Opening(
                    part=opening.part,
                    atom=origin,
                    removals=removals,
                    joins=joins,
                    fate=Fate.REARRANGED,
                    centre=opening.centre,
                    group=opening.group,
                    site=site,
                    note=f"loss of {name_group(graph, site)} with a {_shift_word(mover)}, capture",
                    rank=opening.rank - 20,
                    cost=opening.cost,
                )
            )
    return found


def find_ring_openings(bench: Workbench, displacements: list[Opening]) -> list[Opening]:
    """Return openings at the far carbons of a cyclopropane beside a leaving group's carbon: homoallyl products."""
    found = []
    for opening in displacements:
        if opening.fate is not Fate.SUBSTITUTION or opening.cost > 1 or opening.site is None:
            continue
        graph, part, site = bench.graphs[opening.part], opening.part, opening.site
        for near, far in ring_breaks(graph, site.centre, site.leaving):
            gone = Removal((Cut(bench.atom(part, near), bench.atom(part, far), frozenset(), 0),))
            found.append(
                replace(
                    opening,
                    atom=far,
                    removals=(*opening.removals, gone),
                    fate=Fate.REARRANGED,
                    note=f"loss of {name_group(graph, site)} with opening of the cyclopropane, capture",
                    rank=opening.rank - 20,
                )
            )
    return found


def _shift_word(mover: int | None) -> str:
    return "1,2-hydride shift" if mover is None else "1,2-carbon shift"


def find_addition_shifts(bench: Workbench) -> list[Opening]:
    """Return openings left by protonation of a multiple bond and a 1,2-shift towards the cation."""
    found = []
    for part in range(bench.count):
        graph = bench.graphs[part]
        for cation in alkene_carbons(graph):
            ends = [n for n, code in graph.neighbours[cation].items() if code == 2 and graph.elements[n] == 6]
            for origin, mover in iter_shifts(graph, cation, None) if ends else ():
                removals: tuple[Removal, ...] = ()
                joins: tuple[tuple[int, int], ...] = ()
                if mover is not None:
                    kept, gone = bench.atom(part, origin), bench.atom(part, mover)
                    removals = (Removal((Cut(kept, gone, frozenset(), 0),)),)
                    joins = ((bench.atom(part, cation), gone),)
                found.append(
                    Opening(
                        part=part,
                        atom=origin,
                        removals=removals,
                        joins=joins,
                        fate=Fate.REARRANGED,
                        centre=(origin, None),
                        group=None,
                        site=None,
                        note=f"protonation of the alkene, {_shift_word(mover)}, capture",
                        rank=0,
                        cost=0,
                    )
                )
    return found


def find_additions(bench: Workbench) -> list[Opening]:
    """Return openings at both ends of every carbon-carbon multiple bond that is not aromatic."""
    found = []
    for part in range(bench.count):
        graph = bench.graphs[part]
        for carbon in alkene_carbons(graph):
            found.append(
                Opening(
                    part=part,
                    atom=carbon,
                    removals=(),
                    joins=(),
                    fate=Fate.ADDITION,
                    centre=(carbon, None),
                    group=None,
                    site=None,
                    note="addition to a multiple bond, capture",
                    rank=10 + (20 if is_conjugate_end(graph, carbon) else 0),
                    cost=0,
                )
            )
    return found


def find_transfers(bench: Workbench) -> list[Opening]:
    """Return openings at acyl, sulfonyl, silyl, phosphoryl, aryl and carbonyl atoms: fate `other`."""
    found = []
    for part in range(bench.count):
        graph = bench.graphs[part]
        for site in find_transfer_sites(graph):
            removals: tuple[Removal, ...] = ()
            if site.gone is not None:
                removals = (bench.removal(part, site.atom, site.gone, site.departs, site.gain),)
            for gain in (0, 2) if site.gain == -2 else (0,):
                found.append(
                    Opening(
                        part=part,
                        atom=site.atom,
                        removals=removals,
                        joins=(),
                        fate=Fate.OTHER,
                        centre=None,
                        group=None,
                        site=None,
                        note=site.name if not gain else "reductive amination",
                        rank=40,
                        cost=site.cost,
                        gain=gain,
                    )
                )
    return found


def fills(nucleophile: NucleophileSite, opening: Opening, graph: Molgraph) -> bool:
    """Return whether an attack from within the same molecule would change anything.

    Not by an atom that leaves, nor by one already bonded to the place.
    """
    atom = nucleophile.atom
    if atom == opening.atom or atom in graph.neighbours[opening.atom]:
        return False
    site = opening.site
    if site is None:
        return True
    return atom not in (site.centre, site.leaving) and not (site.departs and atom in site.departs)
