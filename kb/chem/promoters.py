"""What the other components of a scheme do to the substrate, as far as their structures alone tell.

Only the questions that reading a scheme needs: is an alcohol made to leave, is there acid, base, fluoride or
hydrogen. It is no classification of reagents (`kb.materials.classes` is), knows no names, and an absent
reagent proves nothing: schemes from the literature often leave them out.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from kb.chem.carbon import is_diazo_carbon
from kb.chem.molgraph import Molgraph

_HALOGENS = (9, 17, 35, 53)
_ALKALI = frozenset((3, 11, 19, 37, 55))
_LEWIS_METALS = frozenset((13, 21, 22, 26, 30, 31, 40, 49, 50, 70, 71, 72, 83))
_HYDROGENATION_METALS = frozenset((28, 44, 45, 46, 77, 78))
_METALS = frozenset((*range(19, 32), *range(37, 51), *range(55, 84), 3, 11, 12, 13))


@dataclass(frozen=True, slots=True, kw_only=True)
class Promoters:
    """What is in the flask besides the substrate.

    Attributes:
        strong_acid: hydrogen halide, sulfuric, sulfonic, phosphoric or trifluoroacetic acid, a proton.
        weak_acid: a carboxylic acid.
        lewis_acid: halides or triflates of boron, aluminium, zinc, iron, tin, titanium..., silyl triflate.
        strong_base: hydroxide, alkoxide, hydride, metal amide, organolithium.
        mild_base: carbonate, phosphate, amine, sodium hydride, a diazo carbon; takes the proton of phenols and acids.
        fluoride: fluoride ion or HF.
        hydrogenation: hydrogen, or a metal that carries it.
        mitsunobu: phosphine with an azodicarboxylate, or a stabilised phosphorane.
        halogenating: makes a halide of an alcohol (thionyl, phosphorus and acyl halides, HX, phosphine with a halogen
            source, sulfur fluorides).
        sulfonylating: sulfonyl chloride, fluoride or anhydride.
        hydride: a metal or boron hydride that reduces.
        metal_catalyst: a late transition metal.
    """

    strong_acid: bool = False
    weak_acid: bool = False
    lewis_acid: bool = False
    strong_base: bool = False
    mild_base: bool = False
    fluoride: bool = False
    hydrogenation: bool = False
    mitsunobu: bool = False
    halogenating: bool = False
    sulfonylating: bool = False
    hydride: bool = False
    metal_catalyst: bool = False

    @property
    def makes_hydroxyl_leave(self) -> bool:
        """Return whether something present lets an alcohol depart."""
        return (
            self.strong_acid
            or self.lewis_acid
            or self.mitsunobu
            or self.halogenating
            or self.sulfonylating
            or self.metal_catalyst
        )

    @property
    def is_acidic(self) -> bool:
        """Return whether acid wins: strong acid, or weak acid without a strong base beside it."""
        return self.strong_acid or self.lewis_acid or (self.weak_acid and not self.strong_base)


def find_promoters(graphs: Iterable[Molgraph]) -> Promoters:
    """Return what the fragments of the left side tell about the conditions."""
    found: set[str] = set()
    for graph in graphs:
        found |= _words(graph)
    if "phosphine" in found:
        if "azodicarboxylate" in found:
            found.add("mitsunobu")
        if "halogen source" in found:
            found.add("halogenating")
    names = Promoters.__dataclass_fields__
    return Promoters(**{word: True for word in found if word in names})


def _words(graph: Molgraph) -> frozenset[str]:
    """Return the promoter words of one fragment, kept with it."""
    known = graph.memo.get("promoter words")
    if known is None:
        words: set[str] = set()
        for atom, element in enumerate(graph.elements):
            rule = _RULES.get(element)
            if rule is not None:
                words |= rule(graph, atom)
            elif element in _METALS:
                words |= _metal(graph, atom)
        if len(graph) == 2 and set(graph.elements) <= {17, 35, 53}:
            words.add("halogen source")
        known = frozenset(words)
        graph.memo["promoter words"] = known
    return known  # type: ignore[return-value]


def _metal(graph: Molgraph, atom: int) -> set[str]:
    element, bonds = graph.elements[atom], graph.neighbours[atom]
    words = set()
    is_salt = (graph.charges[atom] > 1 or bonds) and not any(graph.elements[n] == 6 for n in bonds)
    if element in _LEWIS_METALS and is_salt and not graph.hydrogens[atom]:
        words.add("lewis_acid")
    if element in _HYDROGENATION_METALS:
        words |= {"metal_catalyst", "hydrogenation"} if not bonds else {"metal_catalyst"}
    if element == 29:
        words.add("metal_catalyst")
    if element == 13 and (graph.hydrogens[atom] or graph.charges[atom] < 0):
        words.add("hydride")
    if element in _ALKALI and (graph.hydrogens[atom] or any(graph.elements[n] == 8 for n in bonds)):
        # Sodium hydride, or a base drawn with a bond to its metal.
        words.add("mild_base")
    if element in (3, 12) and any(graph.elements[n] == 6 for n in bonds):
        words.add("strong_base")
    return words


def _hydrogen(graph: Molgraph, atom: int) -> set[str]:
    if len(graph) == 2 and set(graph.elements) == {1}:
        return {"hydrogenation"}
    if len(graph) == 1:
        return {"strong_acid"} if graph.charges[atom] > 0 else {"strong_base"}
    return set()


def _boron(graph: Molgraph, atom: int) -> set[str]:
    if graph.hydrogens[atom]:
        return {"hydride"}
    if graph.charges[atom] >= 0 and any(graph.elements[n] in _HALOGENS for n in graph.neighbours[atom]):
        return {"lewis_acid"}
    return set()


def _carbon(graph: Molgraph, atom: int) -> set[str]:
    bonds = graph.neighbours[atom]
    halogens = sum(graph.elements[n] in (17, 35, 53) for n in bonds)
    words = set()
    if is_diazo_carbon(graph, atom):
        # It takes up the proton of an acid before it is displaced.
        words.add("mild_base")
    if halogens and graph.has_multiple_bond(atom, 8):
        words.add("halogenating")
    if halogens >= 3:
        words.add("halogen source")
    if graph.charges[atom] < 0 and not graph.has_multiple_bond(atom, 7):
        words.add("strong_base")
    return words


def _nitrogen(graph: Molgraph, atom: int) -> set[str]:
    bonds, charge = graph.neighbours[atom], graph.charges[atom]
    words = set()
    acylated = any(
        graph.elements[n] in (6, 16) and graph.has_multiple_bond(n, 8) for n in bonds if not graph.aromatic[n]
    )
    if any(code == 2 and graph.elements[n] == 7 for n, code in bonds.items()) and acylated:
        words.add("azodicarboxylate")
    if any(graph.elements[n] in (17, 35, 53) for n in bonds):
        words.add("halogen source")
    if charge < 0 and not acylated and not any(graph.charges[n] > 0 for n in bonds):
        words.add("strong_base")
    if charge == 0 and not acylated and not graph.has_multiple_bond(atom, 8) and not graph.has_multiple_bond(atom, 6):
        words.add("mild_base")
    return words


def _oxygen(graph: Molgraph, atom: int) -> set[str]:
    bonds, charge, hydrogens = graph.neighbours[atom], graph.charges[atom], graph.hydrogens[atom]
    if charge > 0 and hydrogens == 3:
        return {"strong_acid"}
    if charge < 0 and not bonds:
        return {"strong_base"}
    if len(bonds) != 1:
        return set()
    ((carrier, code),) = bonds.items()
    element = graph.elements[carrier]
    carbonyl = element == 6 and graph.has_multiple_bond(carrier, 8)
    if charge < 0:
        if element == 6 and not carbonyl and not graph.aromatic[carrier]:
            return {"strong_base"}
        return {"mild_base"} if carbonyl or element == 15 else set()
    if code != 1 or not hydrogens:
        return set()
    if carbonyl:
        if sum(graph.elements[n] == 8 for n in graph.neighbours[carrier]) > 2:
            return set()
        fluorines = any(
            sum(graph.elements[x] == 9 for x in graph.neighbours[n]) >= 2
            for n in graph.neighbours[carrier]
            if graph.elements[n] == 6
        )
        return {"strong_acid"} if fluorines else {"weak_acid"}
    if element in (16, 15, 17) and graph.has_multiple_bond(carrier, 8):
        return {"strong_acid"}
    if element == 7 and graph.charges[carrier] > 0:
        return {"strong_acid"}
    return set()


def _silicon(graph: Molgraph, atom: int) -> set[str]:
    words = set()
    for n in graph.neighbours[atom]:
        if graph.elements[n] in (17, 35, 53):
            words |= {"halogenating", "lewis_acid"}
        if graph.elements[n] == 8 and any(graph.elements[s] == 16 for s in graph.neighbours[n]):
            words.add("lewis_acid")
    return words


def _phosphorus(graph: Molgraph, atom: int) -> set[str]:
    bonds = graph.neighbours[atom]
    if graph.charges[atom] < 0:
        return set()
    if any(graph.elements[n] in _HALOGENS for n in bonds):
        return {"halogenating"}
    if len(bonds) == 3 and not graph.hydrogens[atom] and all(graph.elements[n] == 6 for n in bonds):
        return {"phosphine"}
    if any(code == 2 and graph.elements[n] == 6 for n, code in bonds.items()):
        return {"mitsunobu"}
    return set()


def _sulfur(graph: Molgraph, atom: int) -> set[str]:
    bonds = graph.neighbours[atom]
    oxo = sum(code == 2 and graph.elements[n] == 8 for n, code in bonds.items())
    halogens = [graph.elements[n] for n in bonds if graph.elements[n] in _HALOGENS]
    words = set()
    if halogens and oxo <= 1:
        words.add("halogenating")
    if halogens and oxo == 2:
        words.add("sulfonylating")
        if 9 in halogens:
            words.add("halogenating")
    if oxo == 2 and any(
        graph.elements[n] == 8 and any(graph.elements[s] == 16 and s != atom for s in graph.neighbours[n])
        for n in bonds
    ):
        words.add("sulfonylating")
    return words


def _halogen(graph: Molgraph, atom: int) -> set[str]:
    if graph.neighbours[atom]:
        return set()
    element = graph.elements[atom]
    if graph.hydrogens[atom]:
        return {"fluoride"} if element == 9 else {"strong_acid", "halogenating"}
    return {"fluoride"} if element == 9 and graph.charges[atom] < 0 else set()


_RULES = {
    1: _hydrogen, 5: _boron, 6: _carbon, 7: _nitrogen, 8: _oxygen, 14: _silicon, 15: _phosphorus, 16: _sulfur,
    9: _halogen, 17: _halogen, 35: _halogen, 53: _halogen,
}  # fmt: skip
