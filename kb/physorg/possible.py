"""Which fates a centre allows at all, whatever the flask.

It owns the structural answer, for masking what a record of other substrates would suggest (an alkene where no
hydrogen is beside the centre). It is generous: a fate is left out only where no published way leads to it.
"""

from __future__ import annotations

from kb.physorg.step import Centre, StepFacts
from kb.vocabulary import CarbonClass, Fate, LeavingGroup

_ALWAYS = frozenset({Fate.UNREACTED, Fate.OTHER, Fate.GROUP_LOSS, Fate.ADDITION, Fate.SUBSTITUTION})
_PARTICIPANTS = frozenset({"halogen", "hetero", "vinyl", "alkynyl"})


def possible_fates(step: StepFacts) -> frozenset[Fate]:
    """Return the fates that the centre of a step allows; those of other functions of the molecule always among them."""
    centre = step.centre
    found = set(_ALWAYS)
    if _can_eliminate(centre):
        found.add(Fate.ELIMINATION)
    if _can_rearrange(centre, step.leaving_group):
        found.add(Fate.REARRANGED)
    if (centre.far_end_alkyl is not None and not centre.is_symmetric_allyl) or "propargylic" in centre.activations:
        found.add(Fate.TRANSPOSED)
    return frozenset(found)


def _can_eliminate(centre: Centre) -> bool:
    """Return whether a hydrogen, or a halogen to go with the leaving group, stands where an alkene could form."""
    if centre.carbon_class in (CarbonClass.VINYL, CarbonClass.ARYL):
        return True  # alkynes, arynes
    if centre.activations.count("alpha-halogen") >= 2:
        return True  # carbenes
    if centre.far_end_alkyl or "beta-halogen" in centre.activations:
        return True  # 1,4-loss to a diene; loss of two halogens
    return any(n.hydrogens and n.can_be_alkene for n in centre.neighbours)


def _can_rearrange(centre: Centre, group: LeavingGroup) -> bool:
    """Return whether something can move: a 1,2-shift, a small ring that opens, a neighbour that takes part."""
    if centre.shifts or centre.ring_size in (3, 4) or group is LeavingGroup.EPOXIDE:
        return True
    if {"beta-heteroatom", "beta-halogen"} & set(centre.activations):
        return True
    return any(n.in_small_ring or _PARTICIPANTS & set(n.substituents) for n in centre.neighbours)
