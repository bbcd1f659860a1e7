"""Bookkeeping of atoms: does a set of bond changes turn these fragments into that product?

It compares *skeletons*: which atom is bonded to which, with elements only, no bond orders, no hydrogens, no
charges. So a salt, a tautomer, a resonance drawing or a protonation state never hides a match. What bond
orders would have told is kept in one number per structure, its *proton-free hydrogen count* P = hydrogens -
charge:

- adding or taking a proton leaves P as it was; joining a cation and an anion adds their P;
- a cut in which the kept part gives up the pair of electrons (a leaving group goes) costs the kept part 1;
- a cut in which the kept part keeps the pair (a protecting group goes) gains it 1;
- a reduction by hydride adds 2, an oxidation takes 2.

So elements, P and the skeleton together are the whole balance of a polar reaction, and a stated product that
needed a redox step cannot be taken for a displacement.

Matching is in three sieves: elements and P (integers), a sum over atoms of hashed environments of radius 2 (mended
only near the changed bonds), then Weisfeiler-Lehman refinement of the whole skeleton. By itself that takes norbornane
for dicyclopropylmethane, so it starts from how many atoms stand two and three bonds away, which tells such pairs apart;
only ways of closing rings of eight and more atoms could still be confused.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from kb.chem.molgraph import Molgraph

_ROUNDS = 14


def element_code(element: int) -> int:
    """Return the number whose sum over atoms stands for a molecular formula."""
    return hash((element, 7919, 104729)) & 0xFFFFFFFFFFFF


_CODES = [0 if z == 1 else element_code(z) for z in range(120)]
"""Hydrogen atoms (isotopic ones, hydride) are no part of a skeleton; P counts them."""


@dataclass(frozen=True, slots=True)
class Tally:
    """Summed up structure: `elements` is the sum of element codes, `protons` is P."""

    elements: int
    protons: int


@dataclass(frozen=True, slots=True)
class Target:
    """A stated product as skeleton.

    Attributes:
        tally: its elements and P.
        near: sum of radius-2 hashes.
        whole: refined hash.
        size: heavy atoms.
    """

    tally: Tally
    near: int
    whole: int
    size: int


@dataclass(frozen=True, slots=True)
class Cut:
    """A bond that breaks, seen from the atom that is kept.

    Attributes:
        kept: atom that stays [pool number].
        gone: atom bonded to it that goes, or that stays tied on by a ring.
        departs: every atom that goes with it; empty for a ring bond.
        gain: what the kept part's P gains: -1 leaving group, +1 protecting group, -2 oxygen of a carbonyl group.
    """

    kept: int
    gone: int
    departs: frozenset[int]
    gain: int


@dataclass(frozen=True, slots=True)
class Edit:
    """Bond changes that together give a candidate product.

    Attributes:
        parts: fragments whose atoms take part [pool part numbers].
        cuts: bonds broken.
        joins: bonds formed [pool atom pairs].
        gain: further change of P (hydride, oxidation).
    """

    parts: tuple[int, ...]
    cuts: tuple[Cut, ...]
    joins: tuple[tuple[int, int], ...]
    gain: int = 0


class Pool:
    """All left-side fragments (and second portions of them) under one numbering."""

    def __init__(self, graphs: Sequence[Molgraph]) -> None:
        self.graphs: list[Molgraph] = []
        self.starts: list[int] = []
        self.elements: list[int] = []
        self.protons: list[int] = []
        self.neighbours: list[tuple[int, ...]] = []
        self.part_of: list[int] = []
        self.tallies: list[Tally] = []
        self.nears: list[int] = []
        self._first: list[int] = []
        self._second: list[int] = []
        self._portions: dict[int, int] = {}
        for graph in graphs:
            self.add(graph)

    def add(self, graph: Molgraph) -> int:
        """Add a fragment; return its part number."""
        part, start = len(self.graphs), len(self.elements)
        self.graphs.append(graph)
        self.starts.append(start)
        summary = skeleton_summary(graph)
        self.elements.extend(graph.elements)
        self.protons.extend(summary.protons)
        self.neighbours.extend(tuple(n + start for n in bonds) for bonds in graph.neighbours)
        self.part_of.extend([part] * len(graph))
        self._first.extend(summary.first)
        self._second.extend(summary.second)
        self.tallies.append(summary.tally)
        self.nears.append(summary.near)
        return part

    def second_portion(self, part: int) -> int:
        """Return the part number of another molecule of the same fragment, added when first asked for."""
        if part not in self._portions:
            self._portions[part] = self.add(self.graphs[part])
        return self._portions[part]

    def tally_of(self, atoms: Iterable[int]) -> Tally:
        """Return the tally of a set of atoms."""
        elements = protons = 0
        for a in atoms:
            elements += _CODES[self.elements[a]]
            protons += self.protons[a]
        return Tally(elements, protons)

    def makes(self, edit: Edit, target: Target) -> bool:
        """Return whether the edit, carried out, gives the target; elements and P are taken as checked."""
        changed = self._overlay(edit)
        gone = {a for cut in edit.cuts for a in cut.departs}
        if self._near(edit, changed, gone) != target.near:
            return False
        return _digest(self._colours(edit, changed, gone)) == target.whole

    def places(self, edit: Edit, product: Molgraph, atoms: Iterable[int]) -> list[list[int]]:
        """Return, for each pool atom, the product atoms it may have become once an edit was found to give it.

        Skeletons with like branches offer several places for one atom.
        """
        gone = {a for cut in edit.cuts for a in cut.departs}
        colours = self._colours(edit, self._overlay(edit), gone)
        there = refined(product)
        return [[p for p, c in enumerate(there) if c == colours.get(a)] for a in atoms]

    def _colours(self, edit: Edit, changed: dict[int, tuple[int, ...]], gone: set[int]) -> dict[int, int]:
        """Return the refined colours of the atoms that are kept."""
        kept = [
            a
            for part in edit.parts
            for a in range(self.starts[part], self.starts[part] + len(self.graphs[part]))
            if a not in gone and self.elements[a] != 1
        ]
        lookup = self.neighbours
        adjacency = {a: changed[a] if a in changed else lookup[a] for a in kept}
        return refine({a: self.elements[a] for a in kept}, adjacency)

    def _overlay(self, edit: Edit) -> dict[int, tuple[int, ...]]:
        """Return the neighbours of every atom whose bonds change."""
        changed: dict[int, list[int]] = {}

        def listed(atom: int) -> list[int]:
            if atom not in changed:
                changed[atom] = list(self.neighbours[atom])
            return changed[atom]

        for cut in edit.cuts:
            if cut.gone in listed(cut.kept):
                listed(cut.kept).remove(cut.gone)
            if cut.kept in listed(cut.gone):
                listed(cut.gone).remove(cut.kept)
        for a, b in edit.joins:
            if b not in listed(a):
                listed(a).append(b)
                listed(b).append(a)
        return {a: tuple(ns) for a, ns in changed.items()}

    def _near(self, edit: Edit, changed: dict[int, tuple[int, ...]], gone: set[int]) -> int:
        """Return the sum of radius-2 hashes after the edit, worked out again only near the changes."""
        total = sum(self.nears[part] for part in edit.parts) - sum(self._second[a] for a in gone)
        old, elements, first = self.neighbours, self.elements, self._first
        fresh_first = {a: hash((elements[a], sum([_CODES[elements[n]] for n in ns]))) for a, ns in changed.items()}
        affected = set(changed)
        for a, ns in changed.items():
            affected.update(ns)
            affected.update(old[a])
        for a in affected:
            if a in gone:
                continue
            ns = changed[a] if a in changed else old[a]
            own = fresh_first.get(a, first[a])
            total += hash((own, sum([fresh_first.get(n, first[n]) for n in ns]))) - self._second[a]
        return total


@dataclass(frozen=True, slots=True)
class Summary:
    """What a graph contributes to a pool."""

    protons: tuple[int, ...]
    first: tuple[int, ...]
    second: tuple[int, ...]
    tally: Tally
    near: int


def skeleton_summary(graph: Molgraph) -> Summary:
    """Return the skeleton facts of a graph, worked out once."""
    known = graph.memo.get("skeleton")
    if known is None:
        elements, neighbours = graph.elements, graph.neighbours
        protons = tuple(h - q for h, q in zip(graph.hydrogens, graph.charges, strict=True))
        first = tuple(hash((z, sum([_CODES[elements[n]] for n in neighbours[a]]))) for a, z in enumerate(elements))
        second = tuple(
            0 if elements[a] == 1 else hash((f, sum([first[n] for n in neighbours[a]]))) for a, f in enumerate(first)
        )
        tally = Tally(sum([_CODES[z] for z in elements]), sum(protons))
        known = Summary(protons, first, second, tally, sum(second))
        graph.memo["skeleton"] = known
    return known  # type: ignore[return-value]


def target_of(graph: Molgraph) -> Target:
    """Return a graph as what an edit shall give."""
    summary = skeleton_summary(graph)
    heavy = {a: c for a, c in enumerate(refined(graph)) if graph.elements[a] != 1}
    return Target(tally=summary.tally, near=summary.near, whole=_digest(heavy), size=len(heavy))


def refined(graph: Molgraph) -> tuple[int, ...]:
    """Return the refined colour of every atom of a graph, 0 for hydrogen, worked out once."""
    known = graph.memo.get("colours")
    if known is None:
        heavy = {a: z for a, z in enumerate(graph.elements) if z != 1}
        colours = refine(heavy, {a: tuple(graph.neighbours[a]) for a in heavy})
        known = graph.memo["colours"] = tuple(colours.get(a, 0) for a in range(len(graph)))
    return known  # type: ignore[return-value]


def refine(elements: dict[int, int], adjacency: dict[int, tuple[int, ...]]) -> dict[int, int]:
    """Return a colour per atom that depends on the skeleton around it and not on the numbering."""
    colours = {a: hash((_CODES[z], *_shells(a, adjacency))) for a, z in elements.items()}
    distinct = len(set(colours.values()))
    for turn in range(_ROUNDS):
        colours = {a: hash((c, sum([colours[n] for n in adjacency[a]]))) for a, c in colours.items()}
        now = len(set(colours.values()))
        if now == distinct and turn > 5:
            break
        distinct = now
    return colours


def _shells(atom: int, adjacency: dict[int, tuple[int, ...]]) -> tuple[int, int]:
    """Return how many atoms stand two and three bonds away: it tells rings of up to seven atoms from chains."""
    first = adjacency[atom]
    second = {b for a in first for b in adjacency[a]}
    second.difference_update(first)
    second.discard(atom)
    third = {c for b in second for c in adjacency[b]}
    third.difference_update(second, first)
    return len(second), len(third)


def _digest(colours: dict[int, int]) -> int:
    return hash((len(colours), sum(colours.values())))
