"""What a reading must assume: how much help a group needs to leave, and whether this nucleophile would land there.

Costs are small integers that only order readings of one product (0 = nothing assumed); they say nothing of rates or
yields. Where two readings balance equally, this is what decides between a displacement and an acyl transfer.
"""

from __future__ import annotations

from kb.chem.cations import is_stabilised_cation
from kb.chem.centre import LeavingSite
from kb.chem.molgraph import Molgraph
from kb.chem.promoters import Promoters
from kb.vocabulary import CarbonClass, Fate, LeavingGroup

_OXYGEN = ("carboxylate", "alcohol", "alkoxide", "water", "hydroxide", "phosphate_base", "sulfonate")
"""Nucleophiles that bring an oxygen of their own, so that the balance cannot tell whose oxygen was kept."""


def departure_cost(graph: Molgraph, site: LeavingSite, promoters: Promoters) -> int:
    """Return how much must be assumed for a group to depart: 0 by itself or made to, 1 needs a push, 2 rarely does."""
    group = site.group
    if site.leaves_unaided:
        return 0
    if group is LeavingGroup.HYDROXYL:
        return 0 if promoters.makes_hydroxyl_leave else 1
    if group is LeavingGroup.CARBOXYLATE:
        eased = site.carbon_class in (CarbonClass.TERTIARY, CarbonClass.METHYL) or is_stabilised_cation(
            graph, site.centre, site.leaving
        )
        return 0 if eased and (promoters.is_acidic or promoters.metal_catalyst or site.departs is None) else 1
    if group in (LeavingGroup.FLUORIDE, LeavingGroup.NITRO, LeavingGroup.ALKOXIDE):
        return 1
    return 2


def landing_cost(fate: Fate, group: LeavingGroup | None, word: str, promoters: Promoters) -> int:
    """Return what must be assumed for this nucleophile to land there, beyond the departure itself.

    An ester from an acid and an alcohol, an alcohol from an ester and water, are acyl transfers unless something says
    otherwise: taking them for displacements at the alkyl carbon costs 2.

    Args:
        fate: what the opening gives when filled.
        group: its leaving group; None = none.
        word: class word of the nucleophile.
        promoters: what else is in the flask.
    """
    if fate is Fate.OTHER and promoters.mitsunobu and word in ("alcohol", "alkoxide"):
        return 1
    if fate is Fate.OTHER or group is None:
        return 0
    if group is LeavingGroup.HYDROXYL and word in _OXYGEN:
        if word in ("alcohol", "alkoxide") and promoters.makes_hydroxyl_leave:
            return 1
        return 0 if promoters.mitsunobu and word == "carboxylate" else 2
    if group in (LeavingGroup.CARBOXYLATE, LeavingGroup.ALKOXIDE) and word in _OXYGEN:
        return 2
    return 0
