"""Several like leaving groups in one substrate: which of them goes first by published rates.

It owns that choice. Where a scheme states no product, the reading picks one of several equal halogens by its looks;
rates may say otherwise (in pentachloroethane the hydrogen of one carbon and a chlorine of the other go long before
anything is displaced). Where a product is stated the centre is known and nothing is asked.
"""

from __future__ import annotations

import dataclasses

from rdkit import Chem

from kb.assess.published_atoms import HALOGENS, is_sp3_carbon
from kb.assess.published_centre import describe_centre
from kb.physorg.competition import compete_quickly
from kb.physorg.step import StepFacts

MOST_SITES = 4


def fastest_site(mol: Chem.Mol, leaving: int, step: StepFacts) -> StepFacts:
    """Return the step at whichever like halogen reacts fastest; the step itself where none does or rates are silent.

    Args:
        mol: the substrate.
        leaving: the leaving atom of the step as read.
        step: as read.
    """
    element = mol.GetAtomWithIdx(leaving).GetAtomicNum()
    first = compete_quickly(step)
    if element not in HALOGENS or first is None or first.half_life_h is None:
        return step
    ranks = list(Chem.CanonicalRankAtoms(mol, breakTies=False))
    seen, best, shortest = {ranks[leaving]}, step, first.half_life_h
    for atom in mol.GetAtoms():
        place = atom.GetIdx()
        if atom.GetAtomicNum() != element or ranks[place] in seen or atom.GetDegree() != 1 or len(seen) >= MOST_SITES:
            continue
        seen.add(ranks[place])
        carbon = atom.GetNeighbors()[0]
        if not is_sp3_carbon(carbon):
            continue
        rival = dataclasses.replace(step, centre=describe_centre(mol, carbon.GetIdx(), place))
        quick = compete_quickly(rival)
        if quick is not None and quick.half_life_h is not None and quick.half_life_h < shortest:
            best, shortest = rival, quick.half_life_h
    return best
