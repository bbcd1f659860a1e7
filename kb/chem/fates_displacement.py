"""Products of displacement at one leaving group: by each nucleophile present, between molecules and within one.

It draws what could form and says how; it does not say how fast (`kb.physorg`). At a drawn stereocentre the
product is inverted, except where the carbon ionises (tertiary), where no configuration is claimed.
Bridgehead, vinyl and aryl carbons give nothing here: backside attack cannot reach them.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from rdkit import Chem

from kb.chem.centre import LeavingSite, find_leaving_sites, is_haloform_carbon, name_group
from kb.chem.facts import PossibleFate
from kb.chem.molgraph import Molgraph
from kb.chem.nucleophile import NucleophileSite, find_nucleophile_sites
from kb.chem.sketch import Configuration, Sketch
from kb.chem.transfer import find_transfer_sites
from kb.vocabulary import CarbonClass, Fate, LeavingGroup

CLOSED = (CarbonClass.BRIDGEHEAD, CarbonClass.VINYL, CarbonClass.ARYL)
ACYL_SEEKERS = frozenset(
    {"hydroxide", "alkoxide", "grignard", "alkyllithium", "organometallic", "organoaluminium", "acetylide"}
)
"""Nucleophiles that meet an open-chain ester at its carbonyl carbon, never at the carbon of its alcohol."""

_RING_SIZES = (3, 5, 6, 7)
_LEAST_INNER_RANK = 34


@dataclass(frozen=True, slots=True)
class Attacker:
    """A nucleophilic atom of another molecule."""

    graph: Molgraph
    site: NucleophileSite

    @property
    def word(self) -> str:
        """Return the class word in plain letters."""
        return self.site.word.replace("_", " ")


def iter_displacements(
    graph: Molgraph, site: LeavingSite, attackers: Sequence[Attacker]
) -> Iterator[PossibleFate]:
    """Yield the substitution products of one leaving group."""
    if site.carbon_class in CLOSED or is_haloform_carbon(graph, site.centre):
        return
    for attacker in attackers:
        if site.group is LeavingGroup.CARBOXYLATE and site.departs and attacker.site.word in ACYL_SEEKERS:
            continue
        drawn = draw_displacement(graph, site, attacker, usual_configuration(graph, site))
        if drawn is not None:
            note = f"displacement of {name_group(graph, site)} by {attacker.word}"
            yield PossibleFate(fate=Fate.SUBSTITUTION, product=drawn, note=note)
    for inner in find_nucleophile_sites(graph):
        size = ring_size(graph, site, inner)
        if inner.rank < _LEAST_INNER_RANK or inner.gone is not None or size not in _RING_SIZES:
            continue
        if inner.word == "acetylide" or not site.leaves_unaided:
            continue
        drawn = draw_closure(graph, site, inner, usual_configuration(graph, site))
        if drawn is not None:
            yield PossibleFate(
                fate=Fate.SUBSTITUTION,
                product=drawn,
                note=f"ring of {size} closed by {inner.word.replace('_', ' ')}",
            )


def iter_double_displacements(graph: Molgraph, site: LeavingSite, attacker: Attacker) -> Iterator[PossibleFate]:
    """Yield the rings that one nucleophilic atom with two hydrogens closes on a second leaving group."""
    if attacker.graph.hydrogens[attacker.site.atom] < 2 or attacker.site.gone is not None:
        return
    for second in find_leaving_sites(graph):
        if second.centre == site.centre or not second.leaves_unaided or not second.departs:
            continue
        path = Chem.GetShortestPath(graph.mol, site.centre, second.centre)
        if second.carbon_class in CLOSED or len(path) + 1 not in _RING_SIZES or site.leaving in path:
            continue
        sketch = Sketch([graph, attacker.graph])
        for end in (site, second):
            depart(sketch, end)
            arrive(sketch, end.centre, attacker, 1)
        sketch.clear_configuration((site.centre, second.centre))
        drawn = sketch.finish(site.centre)
        if drawn is not None:
            note = f"ring of {len(path) + 1} closed by two displacements by {attacker.word}"
            yield PossibleFate(fate=Fate.SUBSTITUTION, product=drawn, note=note)


def iter_sulfonylations(graph: Molgraph, site: LeavingSite, others: Sequence[Molgraph]) -> Iterator[PossibleFate]:
    """Yield the sulfonate that an alcohol makes with a sulfonyl chloride or anhydride before anything is displaced."""
    if site.group is not LeavingGroup.HYDROXYL:
        return
    for other in others:
        for transfer in find_transfer_sites(other):
            if transfer.name != "sulfonylation" or transfer.gone is None or other.elements[transfer.gone] == 7:
                continue
            sketch = Sketch([graph, other])
            sketch.cut(sketch.atom(1, transfer.atom), sketch.atom(1, transfer.gone))
            sketch.join(sketch.atom(1, transfer.atom), site.leaving)
            drawn = sketch.finish(site.centre)
            if drawn is not None:
                yield PossibleFate(fate=Fate.OTHER, product=drawn, note="O-sulfonylation; no bond to carbon breaks")
                break


def usual_configuration(graph: Molgraph, site: LeavingSite) -> Configuration:
    """Return what displacement does to the configuration of the centre: inversion, or loss where it ionises."""
    return "lost" if site.carbon_class is CarbonClass.TERTIARY else "inverted"


def draw_displacement(
    graph: Molgraph, site: LeavingSite, attacker: Attacker, wanted: Configuration
) -> str | None:
    """Return the SMILES of the product, or None when it cannot be drawn."""
    sketch = Sketch([graph, attacker.graph])
    swaps = depart(sketch, site)
    arrive(sketch, site.centre, attacker, 1)
    sketch.set_configuration(site.centre, swaps, wanted)
    return sketch.finish(site.centre)


def depart(sketch: Sketch, site: LeavingSite) -> int:
    """Carry out the departure of a leaving group in a sketch; return `place_of` it for the configuration."""
    swaps = sketch.place_of(site.centre, site.leaving)
    sketch.cut(site.centre, site.leaving)
    sketch.cap(site.leaving)
    if site.gain == 0:
        sketch.change_hydrogens(site.centre, 1)
    return swaps


def arrive(sketch: Sketch, atom: int, attacker: Attacker, fragment: int) -> None:
    """Bond a nucleophile of another fragment to an atom with an open place."""
    site = attacker.site
    if site.gone is not None:
        holder = site.atom if site.holder is None else site.holder
        sketch.cut(sketch.atom(fragment, holder), sketch.atom(fragment, site.gone))
        sketch.change_hydrogens(sketch.atom(fragment, holder), 1)
    if site.word == "phosphite" and not attacker.graph.hydrogens[site.atom]:
        sketch.join(atom, sketch.atom(fragment, site.atom))
        _dealkylate(sketch, attacker, fragment)
        return
    as_enol = site.word in ("enolate", "silyl_enol_ether") and attacker.graph.has_multiple_bond(site.atom, 6)
    sketch.join(atom, sketch.atom(fragment, site.atom), as_enol=as_enol)


def _dealkylate(sketch: Sketch, attacker: Attacker, fragment: int) -> None:
    """Turn the phosphonium from a phosphite ester into the phosphonate: one alkyl group goes (Arbuzov)."""
    phosphorus = attacker.site.atom
    for oxygen in attacker.graph.neighbours[phosphorus]:
        for carbon in attacker.graph.neighbours[oxygen]:
            if attacker.graph.elements[oxygen] == 8 and attacker.graph.is_sp3_carbon(carbon):
                sketch.cut(sketch.atom(fragment, oxygen), sketch.atom(fragment, carbon))
                sketch.change_hydrogens(sketch.atom(fragment, carbon), 1)
                sketch.mol.GetAtomWithIdx(sketch.atom(fragment, phosphorus)).SetFormalCharge(0)
                sketch.make_double(sketch.atom(fragment, phosphorus), sketch.atom(fragment, oxygen))
                return


def ring_size(graph: Molgraph, site: LeavingSite, inner: NucleophileSite) -> int | None:
    """Return the size of the ring that an inner nucleophile would close; None when it leaves or is not connected."""
    if site.departs is not None and inner.atom in site.departs:
        return None
    seen = {site.centre, site.leaving}
    edge = [n for n in graph.neighbours[site.centre] if n != site.leaving]
    distance = 1
    while edge and distance < 8:
        if inner.atom in edge:
            return distance + 1 if distance > 1 else None
        seen.update(edge)
        edge = [n for e in edge for n in graph.neighbours[e] if n not in seen]
        distance += 1
    return None


def draw_closure(
    graph: Molgraph, site: LeavingSite, inner: NucleophileSite, wanted: Configuration
) -> str | None:
    """Return the SMILES of the ring that an atom of the molecule itself closes; None when it cannot be drawn."""
    sketch = Sketch([graph])
    swaps = depart(sketch, site)
    sketch.join(site.centre, inner.atom)
    sketch.set_configuration(site.centre, swaps, wanted)
    return sketch.finish(site.centre)
