"""Where a bond can break: leaving groups in a fragment, the class of the carbon, and what stands beside it.

It proposes every bond from carbon to something that chemistry knows to depart, good or poor, and ranks them;
whether it does depart is for the match with the product (`matching`) or, when no product is stated, for the
rank. Vinyl and aryl carbons are reported with their class so that a reader sees why nothing happens there.

Source of the ladder in `_RANK`: common practice, the order of textbook leaving-
group tables.
"""

from __future__ import annotations

from dataclasses import dataclass

from kb.chem.carbon import (
    count_beta_hydrogens,
    find_carbon_class,
    find_flags,
    has_drawn_configuration,
    is_diazo_carbon,
)
from kb.chem.facts import Centre
from kb.chem.molgraph import AROMATIC, Molgraph
from kb.vocabulary import CarbonClass, LeavingGroup

HALOGENS = {9: LeavingGroup.FLUORIDE, 17: LeavingGroup.CHLORIDE, 35: LeavingGroup.BROMIDE, 53: LeavingGroup.IODIDE}

_RANK = {
    LeavingGroup.DIAZONIUM: 100,
    LeavingGroup.TRIFLATE: 95,
    LeavingGroup.IODIDE: 85,
    LeavingGroup.TOSYLATE: 80,
    LeavingGroup.MESYLATE: 80,
    LeavingGroup.SULFONATE: 80,
    LeavingGroup.BROMIDE: 75,
    LeavingGroup.SULFATE: 72,
    LeavingGroup.SULFONIUM: 60,
    LeavingGroup.CHLORIDE: 55,
    LeavingGroup.EPOXIDE: 50,
    LeavingGroup.PHOSPHATE: 45,
    LeavingGroup.AMMONIUM: 30,
    LeavingGroup.CARBOXYLATE: 15,
    LeavingGroup.HYDROXYL: 12,
    LeavingGroup.NITRO: 8,
    LeavingGroup.FLUORIDE: 8,
    LeavingGroup.OTHER: 5,
    LeavingGroup.ALKOXIDE: 4,
}

GOOD_RANK = 30
"""From this rank on a group departs without being activated first."""


@dataclass(frozen=True, slots=True)
class LeavingSite:
    """A bond from carbon to a group that can depart.

    Attributes:
        centre: carbon [canonical number].
        leaving: departing atom bonded to it.
        group: its word.
        departs: the atoms that go; None when the group stays tied on by a ring (epoxide, cyclic sulfate).
        carbon_class: class of the centre.
        rank: how readily, higher first; from the ladder, mended for the carbon.
        gain: what the centre's side gains in P (`skeleton.Cut`): -1, or 0 for a diazo carbon, which takes up a proton.
    """

    centre: int
    leaving: int
    group: LeavingGroup
    departs: frozenset[int] | None
    carbon_class: CarbonClass
    rank: int
    gain: int = -1

    @property
    def is_sp3(self) -> bool:
        """Return whether displacement at this carbon is a question at all."""
        return self.carbon_class not in (CarbonClass.VINYL, CarbonClass.ARYL)

    @property
    def leaves_unaided(self) -> bool:
        """Return whether the group departs without activation."""
        return _RANK[self.group] >= GOOD_RANK


def is_haloform_carbon(graph: Molgraph, centre: int) -> bool:
    """Return whether a carbon carries three halogens or more: displacement fails there and a base makes a carbene."""
    return sum(graph.elements[n] in HALOGENS for n in graph.neighbours[centre]) >= 3


def find_leaving_sites(graph: Molgraph) -> tuple[LeavingSite, ...]:
    """Return every leaving group of a fragment, best first; empty when there is none."""
    known = graph.memo.get("leaving")
    if known is None:
        sites = []
        for centre, element in enumerate(graph.elements):
            if element != 6 or graph.charges[centre] > 0:
                continue
            carbon_class: CarbonClass | None = None
            for leaving, code in graph.neighbours[centre].items():
                is_diazo = code == 2 and is_diazo_carbon(graph, centre)
                if (code != 1 and not is_diazo) or graph.elements[leaving] == 6:
                    continue
                group = LeavingGroup.DIAZONIUM if is_diazo else find_leaving_group(graph, centre, leaving)
                if group is None:
                    continue
                carbon_class = carbon_class or find_carbon_class(graph, centre)
                if carbon_class is None:
                    break
                if carbon_class in (CarbonClass.VINYL, CarbonClass.ARYL) and _RANK[group] < 8:
                    continue
                departs = graph.side_of(leaving, centre)
                sites.append(
                    LeavingSite(
                        centre,
                        leaving,
                        group,
                        None if departs is None else frozenset(departs),
                        carbon_class,
                        _RANK[group] + _readiness(graph, centre, carbon_class),
                        0 if is_diazo else -1,
                    )
                )
        known = tuple(sorted(sites, key=lambda s: (-s.rank, s.centre, s.leaving)))
        graph.memo["leaving"] = known
    return known  # type: ignore[return-value]


def find_leaving_group(graph: Molgraph, centre: int, leaving: int) -> LeavingGroup | None:
    """Return the word for the group that leaves with atom `leaving`, or None when nothing departs there."""
    element, charge = graph.elements[leaving], graph.charges[leaving]
    bonds = graph.neighbours[leaving]
    others = [n for n in bonds if n != centre]
    if element in HALOGENS:
        if charge > 0:
            return LeavingGroup.OTHER
        return HALOGENS[element] if not others else None
    if element == 8:
        return _oxygen_group(graph, leaving, others)
    if element == 7:
        if charge > 0:
            if any(graph.elements[n] == 7 and bonds[n] in (2, 3) for n in others):
                return LeavingGroup.DIAZONIUM if any(bonds[n] == 3 for n in others) else None
            if sum(graph.elements[n] == 8 for n in others) == 2:
                return LeavingGroup.NITRO
            if any(bonds[n] == 3 for n in others):
                return None
            if any(graph.charges[n] < 0 for n in others):
                # An amine oxide parts from carbon as hydroxylamine when it eliminates (Cope); ylides do not part so.
                is_oxide = any(graph.elements[n] == 8 for n in others) and not graph.has_multiple_bond(leaving)
                return LeavingGroup.OTHER if is_oxide and not graph.aromatic[leaving] else None
            # A protonated amine gives up its proton long before it leaves.
            return LeavingGroup.OTHER if graph.hydrogens[leaving] else LeavingGroup.AMMONIUM
        return None if charge or graph.has_multiple_bond(leaving) else LeavingGroup.OTHER
    if element == 16:
        if charge > 0:
            return LeavingGroup.SULFONIUM
        return LeavingGroup.OTHER if charge == 0 else None
    if element == 15 and charge > 0:
        return LeavingGroup.OTHER
    return LeavingGroup.OTHER if element in (34, 52) else None


def name_group(graph: Molgraph, site: LeavingSite) -> str:
    """Return a leaving group's name for a sentence, also where the vocabulary only says `other`."""
    if site.group is not LeavingGroup.OTHER:
        return str(site.group)
    element, bonds = graph.elements[site.leaving], graph.neighbours[site.leaving]
    oxygens = sum(graph.elements[n] == 8 for n in bonds)
    if element == 7:
        return "hydroxylamine" if oxygens else "amine"
    if element == 16:
        return ("thiolate", "sulfenate", "sulfinate", "sulfite")[min(oxygens, 3)]
    names = {8: "oxygen leaving group", 15: "phosphine", 34: "selenolate", 52: "tellurolate"}
    return names.get(element, "hypervalent halogen")


def _oxygen_group(graph: Molgraph, oxygen: int, others: list[int]) -> LeavingGroup | None:
    """Return the word for a group that leaves through oxygen."""
    if not others:
        return LeavingGroup.HYDROXYL
    if graph.charges[oxygen] > 0:
        return LeavingGroup.ALKOXIDE
    other = others[0]
    element, bonds = graph.elements[other], graph.neighbours[other]
    oxo = [n for n, code in bonds.items() if code == 2 and graph.elements[n] == 8]
    if element == 16:
        if len(oxo) < 2:
            return LeavingGroup.OTHER
        return _sulfonyl_group(graph, oxygen, other, oxo)
    if element == 15:
        return LeavingGroup.PHOSPHATE
    if element == 6:
        if oxo:
            return LeavingGroup.CARBOXYLATE
        if any(code == 2 and graph.elements[n] in (7, 16) for n, code in bonds.items()):
            return LeavingGroup.OTHER
        is_three_ring = any(n in graph.neighbours[oxygen] for n in bonds if n != oxygen)
        return LeavingGroup.EPOXIDE if is_three_ring else LeavingGroup.ALKOXIDE
    return LeavingGroup.ALKOXIDE if element in (5, 14) else LeavingGroup.OTHER


def _sulfonyl_group(graph: Molgraph, oxygen: int, sulfur: int, oxo: list[int]) -> LeavingGroup:
    """Return which sulfonate it is, by what else the sulfur carries."""
    rest = [n for n in graph.neighbours[sulfur] if n != oxygen and n not in oxo]
    if not rest:
        return LeavingGroup.SULFONATE
    carrier = rest[0]
    if graph.elements[carrier] == 8:
        return LeavingGroup.SULFATE
    if graph.elements[carrier] != 6:
        return LeavingGroup.SULFONATE
    beyond = [n for n in graph.neighbours[carrier] if n != sulfur]
    if not beyond:
        return LeavingGroup.MESYLATE
    if len(beyond) == 3 and all(graph.elements[n] == 9 for n in beyond):
        return LeavingGroup.TRIFLATE
    return LeavingGroup.TOSYLATE if _is_para_tolyl(graph, carrier) else LeavingGroup.SULFONATE


def _is_para_tolyl(graph: Molgraph, ipso: int) -> bool:
    """Return whether the aromatic carbon starts a 4-methylphenyl group with nothing else on it."""
    if not graph.aromatic[ipso] or graph.elements[ipso] != 6:
        return False
    ring = {ipso}
    edge = [ipso]
    while edge:
        here = edge.pop()
        for n, code in graph.neighbours[here].items():
            if code == AROMATIC and n not in ring:
                ring.add(n)
                edge.append(n)
    if len(ring) != 6 or any(graph.elements[a] != 6 for a in ring):
        return False
    methyls = [
        a
        for a in ring
        for n in graph.neighbours[a]
        if n not in ring and a != ipso and graph.elements[n] == 6 and graph.hydrogens[n] == 3
    ]
    hydrogens = sum(graph.hydrogens[a] for a in ring)
    if len(methyls) != 1 or hydrogens != 4:
        return False
    meta = [n for o in graph.neighbours[ipso] if o in ring for n in graph.neighbours[o] if n in ring and n != ipso]
    return methyls[0] not in meta and methyls[0] not in graph.neighbours[ipso]


def _readiness(graph: Molgraph, centre: int, carbon_class: CarbonClass) -> int:
    """Return how much the carbon itself raises or lowers the rank of its leaving group."""
    if carbon_class in (CarbonClass.VINYL, CarbonClass.ARYL):
        return -200
    if carbon_class is CarbonClass.BRIDGEHEAD:
        return -60
    step = {CarbonClass.METHYL: 6, CarbonClass.PRIMARY: 4, CarbonClass.SECONDARY: 1, CarbonClass.TERTIARY: 2}[
        carbon_class
    ]
    for n in graph.neighbours[centre]:
        if graph.aromatic[n] or (graph.elements[n] == 6 and graph.has_multiple_bond(n)):
            step += 6
            break
    halogens = sum(graph.elements[n] in HALOGENS for n in graph.neighbours[centre])
    return step - 25 * max(halogens - 1, 0)


def describe_centre(
    graph: Molgraph,
    centre: int,
    leaving: int | None,
    *,
    component: int,
    entered: tuple[int, ...],
    maps: tuple[int, ...],
    group: LeavingGroup | None = None,
) -> Centre:
    """Return the facts about a centre in the numbering of the entry.

    Args:
        graph: the fragment.
        centre: carbon [canonical number].
        leaving: departing atom [canonical number]; None for an addition.
        component: which left-side fragment it is.
        entered: canonical number -> position as entered.
        maps: canonical number -> map as entered, 0 = none.
        group: the word for the leaving group when the caller knows it; None = looked up.
    """
    if leaving is not None and group is None:
        known = LeavingGroup.DIAZONIUM if is_diazo_carbon(graph, centre) else None
        group = known or find_leaving_group(graph, centre, leaving) or LeavingGroup.OTHER
    return Centre(
        component=component,
        atom=entered[centre],
        atom_map=maps[centre] or None,
        carbon_class=find_carbon_class(graph, centre) or CarbonClass.VINYL,
        leaving_group=group,
        leaving_atom=None if leaving is None else entered[leaving],
        leaving_atom_map=None if leaving is None else maps[leaving] or None,
        flags=find_flags(graph, centre, leaving),
        beta_hydrogens=count_beta_hydrogens(graph, centre),
        is_stereocentre=has_drawn_configuration(graph, centre),
    )
