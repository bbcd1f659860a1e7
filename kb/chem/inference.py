"""The principal centre of a scheme that states no product: what would most likely react first.

It ranks what is there (a leaving group, an alcohol that something present makes to leave, a labile group in
acid, a multiple bond with something to add) and names one, saying why; it never claims that it does react.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from kb.chem.cations import cation_score, is_conjugate_end
from kb.chem.centre import GOOD_RANK, LeavingSite, find_leaving_sites, is_haloform_carbon
from kb.chem.fates_addition import multiple_bonds
from kb.chem.fates_displacement import ACYL_SEEKERS
from kb.chem.fates_elimination import beta_carbons
from kb.chem.labile import comes_off, find_labile_groups
from kb.chem.molgraph import Molgraph
from kb.chem.nucleophile import find_nucleophile_sites
from kb.chem.promoters import Promoters
from kb.vocabulary import CarbonClass, LeavingGroup

_ACTIVATED_RANK = 70
_CONJUGATE_BASES = ("chloride", "bromide", "iodide", "fluoride", "sulfonate", "carboxylate", "phosphate_base")


@dataclass(frozen=True, slots=True)
class Guess:
    """A centre that was inferred.

    Attributes:
        part: the fragment; None when nothing in the scheme is known to react this way.
        centre: its carbon; None when it reacts without a bond at sp3 carbon breaking.
        leaving: the atom that would leave; None for an addition.
        site: the leaving site; None for an addition or a labile group.
        reason: a plain sentence.
    """

    part: int | None
    centre: int | None
    leaving: int | None
    site: LeavingSite | None
    reason: str


def guess_centre(graphs: Sequence[Molgraph], reactants: int, promoters: Promoters) -> Guess:
    """Return the principal centre of a scheme without a product.

    Args:
        graphs: left-side fragments, reactants first.
        reactants: how many are reactants; agents are looked at only when no reactant offers anything.
        promoters: what the flask does.
    """
    for parts in (range(reactants), range(reactants, len(graphs))):
        found = _among(graphs, parts, promoters)
        if found is not None:
            return found
    return Guess(None, None, None, None, "No leaving group, labile group or multiple bond was found.")


def _among(graphs: Sequence[Molgraph], parts: Sequence[int], promoters: Promoters) -> Guess | None:
    site = _best_site(graphs, parts, promoters)
    labile = _labile(graphs, parts, promoters)
    if labile is not None and promoters.is_acidic and not _has_real_nucleophile(graphs, labile.part):
        return labile
    if site is not None:
        return site
    return (
        _alkene(graphs, parts, needs_reason=not _can_add(graphs, promoters))
        or labile
        or _acyl(graphs, parts, promoters)
        or _poor_site(graphs, parts)
        or _alkene(graphs, parts, needs_reason=False)
    )


def _standing(graph: Molgraph, site: LeavingSite, promoters: Promoters) -> int:
    """Return the rank of a leaving group under what is in the flask."""
    if site.group is LeavingGroup.HYDROXYL and promoters.makes_hydroxyl_leave and site.is_sp3:
        return site.rank + _ACTIVATED_RANK - 12
    if site.group is LeavingGroup.AMMONIUM and promoters.strong_base and beta_carbons(graph, site.centre, site.leaving):
        return site.rank + 10
    return site.rank


def _best_site(graphs: Sequence[Molgraph], parts: Sequence[int], promoters: Promoters) -> Guess | None:
    """Return the readiest leaving group, when it leaves unaided or something present makes it."""
    best: tuple[int, int, LeavingSite] | None = None
    for part in parts:
        for site in find_leaving_sites(graphs[part]):
            standing = _standing(graphs[part], site, promoters)
            leaves = site.leaves_unaided or standing >= GOOD_RANK
            if site.is_sp3 and leaves and standing >= GOOD_RANK - 20 and (best is None or standing > best[0]):
                best = (standing, part, site)
    if best is None:
        return None
    _, part, site = best
    if site.carbon_class is CarbonClass.BRIDGEHEAD:
        reason = (
            f"The {site.group} sits at a bridgehead: it can be reached neither from the back for displacement "
            "nor lost to an alkene."
        )
    elif is_haloform_carbon(graphs[part], site.centre):
        reason = (
            f"The {site.group} shares its carbon with other halogens: displacement from the back hardly happens there; "
            "a strong base takes the proton, if there is one, and leaves a carbene."
        )
    elif site.group is LeavingGroup.HYDROXYL:
        reason = "No product was stated; the alcohol is made to leave by what is in the flask."
    else:
        reason = f"No product was stated; the {site.group} is the readiest leaving group."
    return Guess(part, site.centre, site.leaving, site, reason)


def _poor_site(graphs: Sequence[Molgraph], parts: Sequence[int]) -> Guess | None:
    """Return a group that leaves only when helped, or one on vinyl or aryl carbon, as the best there is."""
    best: tuple[int, int, LeavingSite] | None = None
    for part in parts:
        for site in find_leaving_sites(graphs[part]):
            if site.group is LeavingGroup.OTHER and site.is_sp3:
                continue
            if best is None or site.rank > best[0]:
                best = (site.rank, part, site)
    if best is None:
        return None
    _, part, site = best
    if site.is_sp3:
        reason = f"No product was stated; the {site.group} leaves only when something helps it."
    else:
        kind = "an aromatic" if site.carbon_class is CarbonClass.ARYL else "a vinylic"
        reason = f"The {site.group} sits on {kind} carbon: displacement from the back is closed there."
    return Guess(part, site.centre, site.leaving, site, reason)


def _labile(graphs: Sequence[Molgraph], parts: Sequence[int], promoters: Promoters) -> Guess | None:
    for part in parts:
        for group in find_labile_groups(graphs[part]):
            if group.promoter == "acid" and comes_off(group, promoters):
                reason = f"No product was stated; the {group.name} is what acid takes off."
                return Guess(part, group.carbon, group.leaving, None, reason)
    return None


def _acyl(graphs: Sequence[Molgraph], parts: Sequence[int], promoters: Promoters) -> Guess | None:
    """Return the ester that a nucleophile present meets at its carbonyl carbon.

    A small acyl group that hydroxide or an alkoxide takes off is a protecting group lost, as it is when the alcohol is
    stated; otherwise no carbon is named.
    """
    for part in parts:
        if not _has_ester(graphs[part]):
            continue
        words = {s.word for p, g in enumerate(graphs) if p != part for s in find_nucleophile_sites(g) if s.rank >= 34}
        seekers = words & ACYL_SEEKERS
        if not seekers:
            continue
        if seekers <= {"hydroxide", "alkoxide"}:
            for group in find_labile_groups(graphs[part]):
                if group.promoter == "base" and comes_off(group, promoters) and group.carbon is not None:
                    reason = f"No product was stated; the {group.name} group is what base takes off."
                    return Guess(part, group.carbon, group.leaving, None, reason)
        reason = "No product was stated; the nucleophile meets the ester at its carbonyl carbon."
        return Guess(part, None, None, None, reason)
    return None


def _has_ester(graph: Molgraph) -> bool:
    """Return whether a fragment holds an open-chain carboxylic ester of an sp3 carbon."""
    return any(s.group is LeavingGroup.CARBOXYLATE and s.is_sp3 and s.departs for s in find_leaving_sites(graph))


def _can_add(graphs: Sequence[Molgraph], promoters: Promoters) -> bool:
    """Return whether something present adds to a plain alkene: an acid, a halogen, a thiol."""
    return (
        promoters.strong_acid
        or promoters.lewis_acid
        or any(len(g) == 2 and set(g.elements) <= {17, 35, 53} for g in graphs)
        or any(s.word == "thiolate" and g.hydrogens[s.atom] for g in graphs for s in find_nucleophile_sites(g))
    )


def _alkene(graphs: Sequence[Molgraph], parts: Sequence[int], *, needs_reason: bool) -> Guess | None:
    """Return the end of a multiple bond where a nucleophile would land.

    Args:
        graphs: left-side fragments.
        parts: those to look at.
        needs_reason: take only bonds conjugated with an acceptor, which need no acid.
    """
    for part in parts:
        graph = graphs[part]
        for a, b in multiple_bonds(graph):
            if needs_reason and not (is_conjugate_end(graph, a) or is_conjugate_end(graph, b)):
                continue
            if is_conjugate_end(graph, a) != is_conjugate_end(graph, b):
                end = a if is_conjugate_end(graph, a) else b
            else:
                end = a if cation_score(graph, a, b) >= cation_score(graph, b, a) else b
            return Guess(part, end, None, None, "No product was stated; the multiple bond is where something can add.")
    return None


def _has_real_nucleophile(graphs: Sequence[Molgraph], substrate: int | None) -> bool:
    """Return whether another fragment holds a nucleophile that is more than the anion of an acid or a solvent."""
    return any(
        site.rank >= 40 and site.word not in _CONJUGATE_BASES
        for part, graph in enumerate(graphs)
        if part != substrate
        for site in find_nucleophile_sites(graph)
    )
