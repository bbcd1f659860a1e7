"""Products of elimination from one leaving group: each distinct alkene, with E and Z.

It lists every alkene that a beta hydrogen allows; which one prevails depends on the base and is not said
here. Left out: alkenes at a bridgehead of a small bicycle (Bredt) and trans alkenes in rings of fewer than
eight atoms. A vinyl halide gives its alkyne.
"""

from __future__ import annotations

from collections.abc import Iterator

from kb.chem.carbon import is_bridgehead
from kb.chem.centre import LeavingSite, name_group
from kb.chem.facts import PossibleFate
from kb.chem.fates_displacement import depart
from kb.chem.molgraph import Molgraph
from kb.chem.sketch import Sketch
from kb.vocabulary import CarbonClass, Fate, LeavingGroup

_LOST_AS = {
    LeavingGroup.FLUORIDE: "HF",
    LeavingGroup.CHLORIDE: "HCl",
    LeavingGroup.BROMIDE: "HBr",
    LeavingGroup.IODIDE: "HI",
    LeavingGroup.HYDROXYL: "water",
    LeavingGroup.AMMONIUM: "amine",
    LeavingGroup.SULFONIUM: "sulfide",
    LeavingGroup.DIAZONIUM: "nitrogen",
    LeavingGroup.EPOXIDE: "the ring oxygen as alcohol",
    LeavingGroup.MESYLATE: "methanesulfonic acid",
    LeavingGroup.TOSYLATE: "toluenesulfonic acid",
    LeavingGroup.TRIFLATE: "triflic acid",
    LeavingGroup.SULFONATE: "the sulfonic acid",
    LeavingGroup.CARBOXYLATE: "the carboxylic acid",
    LeavingGroup.ALKOXIDE: "the alcohol",
    LeavingGroup.SULFATE: "the sulfuric acid part",
    LeavingGroup.PHOSPHATE: "the phosphoric acid part",
    LeavingGroup.NITRO: "nitrous acid",
}
_LOST_OTHER = {"thiolate": "the thiol", "sulfenate": "the sulfenic acid", "sulfinate": "the sulfinic acid",
               "sulfite": "the sulfurous acid part", "selenolate": "the selenol", "tellurolate": "the tellurol",
               "oxygen leaving group": "the oxygen leaving group as its acid"}  # fmt: skip


def iter_eliminations(graph: Molgraph, site: LeavingSite) -> Iterator[PossibleFate]:
    """Yield the alkenes that one leaving group can give, more substituted ones first."""
    name = name_group(graph, site)
    what = _LOST_AS.get(site.group) or _LOST_OTHER.get(name, f"the {name}")
    found = []
    for beta in beta_carbons(graph, site.centre, site.leaving):
        sketch = Sketch([graph])
        depart(sketch, site)
        sketch.change_hydrogens(beta, -1)
        sketch.make_double(site.centre, beta)
        degree = sum(graph.elements[n] == 6 for n in graph.neighbours[beta])
        for smiles, label in sketch.finish_alkene(site.centre, beta):
            found.append((-degree, label, smiles))
    degrees = {degree for degree, _, _ in found}
    for degree, label, smiles in sorted(found):
        side = ""
        if len(degrees) > 1:
            side = ", more substituted" if degree == min(degrees) else ", less substituted"
        note = f"loss of {what}{side}" + (f", {label}" if label else "")
        yield PossibleFate(fate=Fate.ELIMINATION, product=smiles, note=note)


def beta_carbons(graph: Molgraph, centre: int, leaving: int | None) -> list[int]:
    """Return the neighbours of a centre from which a hydrogen can go to make the double bond."""
    if is_bridgehead(graph, centre) or graph.aromatic[centre]:
        return []
    is_vinyl = graph.has_multiple_bond(centre)
    return [
        n
        for n, code in graph.neighbours[centre].items()
        if n != leaving
        and (leaving is None or leaving not in graph.neighbours[n])
        and graph.hydrogens[n]
        and graph.elements[n] == 6
        and (code == 2 if is_vinyl else code == 1 and graph.is_sp3_carbon(n))
        and not is_bridgehead(graph, n)
        and not (is_vinyl and graph.in_ring[n] and graph.in_ring[centre])
    ]


def can_eliminate(site: LeavingSite) -> bool:
    """Return whether elimination from this carbon is a question: not at aryl carbon or a bridgehead."""
    return site.carbon_class not in (CarbonClass.ARYL, CarbonClass.BRIDGEHEAD, CarbonClass.METHYL)
