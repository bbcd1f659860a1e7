"""Products of adding H and a nucleophile, or a halogen, across a carbon-carbon multiple bond, both ways round.

Conjugate acceptors are attacked at the far end only; otherwise both regioisomers are listed, with the names
that the trade gives them (Markovnikov: the nucleophile on the carbon that makes the better cation). A cation
that would shift after protonation is listed too, since that is what surprises people.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from kb.chem.cations import cation_score, is_conjugate_end, iter_shifts
from kb.chem.facts import PossibleFate
from kb.chem.fates_displacement import Attacker, arrive
from kb.chem.molgraph import Molgraph
from kb.chem.sketch import Sketch
from kb.vocabulary import Fate

_MOST_BONDS = 3


def multiple_bonds(graph: Molgraph) -> list[tuple[int, int]]:
    """Return the carbon-carbon multiple bonds that are not aromatic, as pairs of atoms."""
    return [
        (a, b)
        for a, z in enumerate(graph.elements)
        if z == 6
        for b, code in graph.neighbours[a].items()
        if a < b and code in (2, 3) and graph.elements[b] == 6
    ]


def iter_additions(
    graph: Molgraph, attackers: Sequence[Attacker], *, with_proton: bool
) -> Iterator[PossibleFate]:
    """Yield additions to each multiple bond.

    Args:
        graph: the alkene.
        attackers: what may add.
        with_proton: acid is there, so that a cation forms first and may shift.
    """
    for a, b in multiple_bonds(graph)[:_MOST_BONDS]:
        for site, other in ((a, b), (b, a)):
            conjugate = is_conjugate_end(graph, site)
            if is_conjugate_end(graph, other) and not conjugate:
                continue
            for attacker in attackers:
                yield from _add(graph, attacker, site, other, _direction(graph, site, other, conjugate))
            if with_proton and not conjugate:
                yield from _shifted(graph, attackers, site, other)


def _direction(graph: Molgraph, site: int, other: int, conjugate: bool) -> str:
    """Return the trade's name for the direction of an addition."""
    if conjugate:
        return "conjugate"
    here, there = cation_score(graph, site, other), cation_score(graph, other, site)
    if here == there:
        return ""
    return "Markovnikov" if here > there else "anti-Markovnikov"


def _add(graph: Molgraph, attacker: Attacker, site: int, other: int, direction: str) -> Iterator[PossibleFate]:
    sketch = Sketch([graph, attacker.graph])
    is_alkyne = graph.neighbours[site][other] == 3
    sketch.make_single(site, other)
    sketch.change_hydrogens(other, 1)
    arrive(sketch, site, attacker, 1)
    note = f"{direction} addition of {attacker.word}".strip()
    if is_alkyne:
        for smiles, label in sketch.finish_alkene(site, other):
            yield PossibleFate(
                fate=Fate.ADDITION, product=smiles, note=note + (f", {label}" if label else "")
            )
        return
    drawn = sketch.finish(site)
    if drawn is not None:
        yield PossibleFate(fate=Fate.ADDITION, product=drawn, note=note)


def _shifted(
    graph: Molgraph, attackers: Sequence[Attacker], cation: int, other: int
) -> Iterator[PossibleFate]:
    """Yield captures after a 1,2-shift towards the cation that protonation makes."""
    if graph.neighbours[cation][other] != 2:
        return
    for origin, mover in iter_shifts(graph, cation, None):
        for attacker in attackers:
            sketch = Sketch([graph, attacker.graph])
            sketch.make_single(cation, other)
            sketch.change_hydrogens(other, 1)
            if mover is None:
                sketch.change_hydrogens(origin, -1)
                sketch.change_hydrogens(cation, 1)
            else:
                sketch.move(mover, origin, cation)
            sketch.clear_configuration((cation, origin))
            arrive(sketch, origin, attacker, 1)
            drawn = sketch.finish(origin)
            if drawn is not None:
                what = "hydride" if mover is None else "carbon"
                yield PossibleFate(
                    fate=Fate.REARRANGED,
                    product=drawn,
                    note=f"protonation, 1,2-{what} shift, then capture by {attacker.word}",
                )


def iter_halogenations(graph: Molgraph, halogens: Sequence[Molgraph], *, with_water: bool) -> Iterator[PossibleFate]:
    """Yield the dihalide, and in water the halohydrins, of each alkene with Br2, Cl2 or I2.

    Args:
        graph: the alkene.
        halogens: halogen molecules present.
        with_water: water is present too.
    """
    for a, b in multiple_bonds(graph)[:_MOST_BONDS]:
        if graph.neighbours[a][b] != 2:
            continue
        for halogen in halogens:
            yield from _halogenated(graph, a, b, halogen, None)
            if with_water:
                yield from _halogenated(graph, a, b, halogen, "O")
                yield from _halogenated(graph, b, a, halogen, "O")


def _halogenated(
    graph: Molgraph, first: int, second: int, halogen: Molgraph, other: str | None
) -> Iterator[PossibleFate]:
    """Yield halogen on the first carbon, and halogen or hydroxyl on the second."""
    from kb.chem.molgraph import molgraph_of

    sketch = Sketch([graph, halogen] if other is None else [graph, halogen, molgraph_of(other)])
    sketch.cut(sketch.atom(1, 0), sketch.atom(1, 1))
    sketch.make_single(first, second)
    sketch.mol.AddBond(first, sketch.atom(1, 0), sketch.mol.GetBondBetweenAtoms(first, second).GetBondType())
    if other is None:
        sketch.mol.AddBond(second, sketch.atom(1, 1), sketch.mol.GetBondBetweenAtoms(first, second).GetBondType())
    else:
        sketch.join(second, sketch.atom(2, 0))
    drawn = sketch.finish(first)
    if drawn is not None:
        note = "addition of halogen" if other is None else "halohydrin"
        yield PossibleFate(fate=Fate.ADDITION, product=drawn, note=note)
