"""Products after the skeleton or the double bond moved: 1,2-shifts with capture or loss, allylic transposition.

Shifts are drawn only towards a better cation on the textbook ladder (`openings.cation_score`), one shift
deep; whether the conditions ionise the substrate at all is for the reader of the list.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from kb.chem.carbon import is_bridgehead
from kb.chem.cations import iter_shifts, ring_breaks
from kb.chem.centre import LeavingSite
from kb.chem.facts import PossibleFate
from kb.chem.fates_displacement import Attacker, arrive, depart
from kb.chem.molgraph import Molgraph
from kb.chem.sketch import Sketch
from kb.vocabulary import CarbonClass, Fate


def iter_shifted(graph: Molgraph, site: LeavingSite, attackers: Sequence[Attacker]) -> Iterator[PossibleFate]:
    """Yield products of a 1,2-shift towards the leaving group's carbon, then capture or loss of a proton."""
    if site.carbon_class in (CarbonClass.BRIDGEHEAD, CarbonClass.VINYL, CarbonClass.ARYL, CarbonClass.METHYL):
        return
    if site.departs is None:
        return
    for origin, mover in iter_shifts(graph, site.centre, site.leaving, expected_only=True):
        what = _shift_word(graph, site.centre, mover)
        for attacker in attackers:
            sketch = _shifted(graph, site, origin, mover, [attacker.graph])
            arrive(sketch, origin, attacker, 1)
            drawn = sketch.finish(origin)
            if drawn is not None:
                yield PossibleFate(
                    fate=Fate.REARRANGED, product=drawn, note=f"{what}, then capture by {attacker.word}"
                )
        for beta in _protons_beside(graph, origin, site.centre, mover):
            sketch = _shifted(graph, site, origin, mover, [])
            sketch.change_hydrogens(beta, -1)
            sketch.make_double(origin, beta)
            for smiles, label in sketch.finish_alkene(origin, beta):
                note = f"{what}, then loss of a proton" + (f", {label}" if label else "")
                yield PossibleFate(fate=Fate.REARRANGED, product=smiles, note=note)


def iter_ring_openings(graph: Molgraph, site: LeavingSite, attackers: Sequence[Attacker]) -> Iterator[PossibleFate]:
    """Yield the homoallyl products that a cyclopropane beside the leaving group's carbon opens to."""
    if site.departs is None or site.carbon_class in (CarbonClass.BRIDGEHEAD, CarbonClass.VINYL, CarbonClass.ARYL):
        return
    for near, far in ring_breaks(graph, site.centre, site.leaving):
        for attacker in attackers:
            sketch = Sketch([graph, attacker.graph])
            depart(sketch, site)
            sketch.cut(near, far)
            sketch.make_double(site.centre, near)
            sketch.clear_configuration((far,))
            arrive(sketch, far, attacker, 1)
            for smiles, label in sketch.finish_alkene(site.centre, near):
                note = f"opening of the cyclopropane, then capture by {attacker.word}" + (f", {label}" if label else "")
                yield PossibleFate(fate=Fate.REARRANGED, product=smiles, note=note)


def _shift_word(graph: Molgraph, centre: int, mover: int | None) -> str:
    """Return what moves, in words."""
    if mover is None:
        return "1,2-hydride shift"
    if graph.aromatic[mover]:
        return "1,2-aryl shift"
    rings = graph.mol.GetRingInfo().AtomRings()
    if any(mover in r and any(n in r for n in graph.neighbours[centre] if n != mover) for r in rings):
        return "1,2-alkyl shift with change of ring size"
    return "1,2-methyl shift" if graph.hydrogens[mover] == 3 else "1,2-alkyl shift"


def _shifted(
    graph: Molgraph, site: LeavingSite, origin: int, mover: int | None, others: Sequence[Molgraph]
) -> Sketch:
    """Return a sketch in which the group left and the neighbour moved; `origin` has the open place."""
    sketch = Sketch([graph, *others])
    depart(sketch, site)
    if mover is None:
        sketch.change_hydrogens(origin, -1)
        sketch.change_hydrogens(site.centre, 1)
    else:
        sketch.move(mover, origin, site.centre)
    sketch.clear_configuration((site.centre, origin))
    return sketch


def _protons_beside(graph: Molgraph, origin: int, centre: int, mover: int | None) -> list[int]:
    """Return the atoms beside the shifted cation from which a proton can go."""
    found = []
    for n in graph.neighbours[origin]:
        if n == mover or is_bridgehead(graph, n):
            continue
        if n == centre:
            hydrogens = graph.hydrogens[centre] + (mover is None)
            if hydrogens:
                found.append(n)
        elif graph.is_sp3_carbon(n) and graph.hydrogens[n]:
            found.append(n)
    return found


def iter_transposed(
    graph: Molgraph, site: LeavingSite, attackers: Sequence[Attacker]
) -> Iterator[PossibleFate]:
    """Yield products of attack at the far end of an allylic or propargylic system."""
    if site.carbon_class in (CarbonClass.BRIDGEHEAD, CarbonClass.VINYL, CarbonClass.ARYL):
        return
    for near, code in graph.neighbours[site.centre].items():
        if code != 1 or near == site.leaving or graph.elements[near] != 6 or graph.aromatic[near]:
            continue
        for far, order in graph.neighbours[near].items():
            if order not in (2, 3) or graph.elements[far] != 6:
                continue
            word = "allylic transposition" if order == 2 else "attack at the far end gives an allene"
            for attacker in attackers:
                sketch = Sketch([graph, attacker.graph])
                depart(sketch, site)
                sketch.make_single(near, far)
                sketch.make_double(site.centre, near)
                arrive(sketch, far, attacker, 1)
                for smiles, label in sketch.finish_alkene(site.centre, near):
                    note = f"{word} by {attacker.word}" + (f", {label}" if label else "")
                    yield PossibleFate(fate=Fate.TRANSPOSED, product=smiles, note=note)
