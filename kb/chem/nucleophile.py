"""Atoms that can bond to a carbon with their own pair of electrons, and the class words of what they belong to.

It lists candidates generously (ions, free bases, salts, both ends of ambident groups, CH acids, organometallics, halide
sources) and ranks them; which one did react is for the match with the product. Words are those of
`kb.materials.class_names`, so that a scheme and a reagent list speak of the same thing.

A candidate may have to drop something first (the metal of an organometallic, the silyl group of an azide, all of a
halide source but its halide): then `gone` and `departs` say what.
"""

from __future__ import annotations

from dataclasses import dataclass

from kb.chem.molgraph import Molgraph

HALIDES = {9: "fluoride", 17: "chloride", 35: "bromide", 53: "iodide"}
_METALS = frozenset((3, 4, 5, 11, 12, 13, 19, 20, 22, 25, 26, 27, 28, 29, 30, 31, 40, 46, 47, 48, 49, 50, 55, 58, 80, 82))
_METAL_WORDS = {3: "alkyllithium", 12: "grignard", 30: "organozinc", 29: "organocuprate", 5: "boronic_acid",
                50: "organostannane", 13: "organoaluminium"}  # fmt: skip


@dataclass(frozen=True, slots=True)
class NucleophileSite:
    """An atom that can attack.

    Attributes:
        atom: it [canonical number].
        word: class word.
        rank: how willingly, higher first; a judgement that only orders what is tried and shown.
        gone: atom that must part from it first; None = none.
        departs: all that goes with that atom.
        holder: the atom that parts from `gone`; None = the attacking atom itself.
    """

    atom: int
    word: str
    rank: int
    gone: int | None = None
    departs: frozenset[int] = frozenset()
    holder: int | None = None


def find_nucleophile_sites(graph: Molgraph) -> tuple[NucleophileSite, ...]:
    """Return the atoms of a fragment that can attack, most willing first."""
    known = graph.memo.get("nucleophiles")
    if known is None:
        found: list[NucleophileSite] = []
        for atom, element in enumerate(graph.elements):
            if element == 7:
                found.extend(_nitrogen(graph, atom))
            elif element == 8:
                found.extend(_oxygen(graph, atom))
            elif element in (16, 34, 52):
                found.extend(_sulfur(graph, atom))
            elif element == 15:
                found.extend(_phosphorus(graph, atom))
            elif element in HALIDES:
                found.extend(_halide(graph, atom))
            elif element == 6:
                found.extend(_carbon(graph, atom))
        known = tuple(sorted(found, key=lambda s: (-s.rank, s.atom)))
        graph.memo["nucleophiles"] = known
    return known  # type: ignore[return-value]


def _released(graph: Molgraph, atom: int, gone: int, word: str, rank: int) -> NucleophileSite:
    """Return a site that must first part from `gone`; a ring keeps it tied on."""
    departs = graph.side_of(gone, atom)
    return NucleophileSite(atom, word, rank, gone, frozenset(departs or ()))


def _partner(graph: Molgraph, atom: int, elements: frozenset[int] | tuple[int, ...]) -> int | None:
    """Return the first neighbour of one of the elements."""
    return next((n for n in graph.neighbours[atom] if graph.elements[n] in elements), None)


def is_acceptor(graph: Molgraph, atom: int) -> bool:
    """Return whether the atom draws electrons from a neighbour: carbonyl, nitrile, nitro, sulfonyl, phosphoryl, onium."""
    element = graph.elements[atom]
    if graph.aromatic[atom]:
        return False
    if element == 6:
        return any(
            code in (2, 3) and graph.elements[n] in (7, 8, 16) for n, code in graph.neighbours[atom].items()
        )
    if element == 7:
        return graph.charges[atom] > 0 and sum(graph.elements[n] == 8 for n in graph.neighbours[atom]) == 2
    if element in (15, 16):
        return graph.charges[atom] > 0 or graph.has_multiple_bond(atom, 8)
    return False


def _nitrogen(graph: Molgraph, atom: int) -> list[NucleophileSite]:
    bonds, charge, hydrogens = graph.neighbours[atom], graph.charges[atom], graph.hydrogens[atom]
    if charge > 0 and not hydrogens:
        return []
    metal = _partner(graph, atom, tuple(_METALS | {14}))
    if metal is not None:
        rest = [n for n in bonds if n != metal]
        is_azide = any(graph.elements[n] == 7 for n in rest)
        return [_released(graph, atom, metal, "azide" if is_azide else "amine", 70)]
    if len(bonds) >= 4:
        return []
    nitrogens = [n for n in bonds if graph.elements[n] == 7]
    if any(graph.charges[n] > 0 and len(graph.neighbours[n]) == 2 and not graph.aromatic[n] for n in nitrogens):
        return [NucleophileSite(atom, "azide", 90)] if charge < 0 or len(bonds) == 1 else []
    if any(code == 3 for code in bonds.values()):
        return [NucleophileSite(atom, "nitrile", 8)]
    if charge == 0 and any(code == 2 and graph.elements[n] == 8 for n, code in bonds.items()):
        return [NucleophileSite(atom, "nitrite", 40)] if any(graph.charges[n] < 0 for n in bonds) else []
    if graph.aromatic[atom]:
        if hydrogens or charge < 0:
            return [NucleophileSite(atom, "azole", 62)]
        return [] if len(bonds) > 2 else [NucleophileSite(atom, "aromatic_amine_base", 44)]
    if not bonds:
        return [NucleophileSite(atom, "ammonia", 68)]
    word, rank = _amine_word(graph, atom)
    return [NucleophileSite(atom, word, rank)]


def _amine_word(graph: Molgraph, atom: int) -> tuple[str, int]:
    """Return the class word and rank of a nitrogen that is no azide, azole or nitrile."""
    bonds, hydrogens, charge = graph.neighbours[atom], graph.hydrogens[atom], graph.charges[atom]
    carbonyls = [n for n in bonds if graph.elements[n] == 6 and graph.has_multiple_bond(n, 8)]
    thiones = [n for n in bonds if graph.elements[n] == 6 and graph.has_multiple_bond(n, 16)]
    sulfonyls = [n for n in bonds if graph.elements[n] == 16 and graph.has_multiple_bond(n, 8)]
    lift = 20 if charge < 0 else 0
    if len(carbonyls) >= 2:
        return "imide", 58 + lift
    if sulfonyls:
        return "sulfonamide", (50 if hydrogens else 5) + lift
    if carbonyls:
        is_carbamate = any(
            graph.elements[o] == 8 and code == 1 for o, code in graph.neighbours[carbonyls[0]].items()
        )
        return ("carbamate" if is_carbamate else "amide"), (30 if hydrogens or charge < 0 else 4) + lift
    if thiones:
        return "thiourea", 25
    if graph.has_multiple_bond(atom):
        return "amidine_base", 46
    if any(graph.elements[n] == 8 for n in bonds):
        return "hydroxylamine", 60
    if any(graph.elements[n] == 7 for n in bonds):
        return "hydrazine", 64
    protons = hydrogens - max(charge, 0) - min(charge, 0)
    if any(graph.aromatic[n] for n in bonds):
        return "aromatic_amine", 60 if protons else 30
    if protons >= 2:
        return "primary_amine", 72
    return ("secondary_amine", 74) if protons else ("tertiary_amine", 52)


def _oxygen(graph: Molgraph, atom: int) -> list[NucleophileSite]:
    bonds, charge = graph.neighbours[atom], graph.charges[atom]
    if charge > 0:
        return []
    holder = _partner(graph, atom, tuple(_METALS | {14}))
    if holder is not None:
        return [_released(graph, atom, holder, "alkoxide", 40)]
    if len(bonds) > 1:
        return []
    if not bonds:
        if graph.hydrogens[atom] == 0:
            return []
        return [NucleophileSite(atom, "hydroxide", 50) if charge < 0 else NucleophileSite(atom, "water", 20)]
    (carrier, code), = bonds.items()
    element = graph.elements[carrier]
    if element == 6:
        return [_oxygen_on_carbon(graph, atom, carrier, code)]
    if element == 7:
        if sum(graph.elements[n] == 8 for n in graph.neighbours[carrier]) >= 2:
            is_salt = len(graph.neighbours[carrier]) - sum(graph.elements[n] == 8 for n in graph.neighbours[carrier]) == 0
            word = "nitrate" if len(graph.neighbours[carrier]) == 3 else "nitrite"
            return [NucleophileSite(atom, word, 30)] if is_salt and code == 1 else []
        if graph.charges[carrier] > 0:
            return [NucleophileSite(atom, "amine_oxide", 25)]
        return [NucleophileSite(atom, "oxime" if code == 1 else "nitrite", 55)]
    if element == 8:
        return [NucleophileSite(atom, "hydroperoxide", 45)]
    if element in (15, 16):
        word = "phosphate_base" if element == 15 else "sulfonate"
        return [NucleophileSite(atom, word, 22 if code == 1 else 6)]
    return []


def _oxygen_on_carbon(graph: Molgraph, atom: int, carrier: int, code: int) -> NucleophileSite:
    """Return the site for an oxygen whose one neighbour is carbon."""
    charge = graph.charges[atom]
    if graph.aromatic[carrier]:
        return NucleophileSite(atom, "phenoxide", 66 if code == 1 else 45)
    if graph.has_multiple_bond(carrier, 8):
        if code == 2:
            partner = any(
                graph.elements[n] == 8 and (graph.hydrogens[n] or graph.charges[n] < 0)
                for n in graph.neighbours[carrier]
            )
            return NucleophileSite(atom, "carboxylate" if partner else "amide", 38 if partner else 10)
        return NucleophileSite(atom, "carboxylate", 56 if charge < 0 else 48)
    if code == 2:
        return NucleophileSite(atom, "amide", 10)
    if graph.has_multiple_bond(carrier):
        return NucleophileSite(atom, "enolate", 36)
    if charge < 0:
        return NucleophileSite(atom, "alkoxide", 60)
    return NucleophileSite(atom, "alcohol", 34)


def _sulfur(graph: Molgraph, atom: int) -> list[NucleophileSite]:
    bonds, charge = graph.neighbours[atom], graph.charges[atom]
    if charge > 0:
        return []
    if graph.elements[atom] != 16:
        return [NucleophileSite(atom, "selenide", 76)] if len(bonds) <= 2 else []
    oxygens = [n for n in bonds if graph.elements[n] == 8]
    if oxygens:
        is_open = len(bonds) == 3 and any(graph.charges[o] < 0 or graph.hydrogens[o] for o in oxygens)
        word = "sulfite" if len(oxygens) == 3 else "sulfinate"
        return [NucleophileSite(atom, word, 60)] if is_open else []
    if len(bonds) > 2 or (len(bonds) == 2 and graph.aromatic[atom]):
        return []
    holder = _partner(graph, atom, tuple(_METALS | {14}))
    if holder is not None:
        return [_released(graph, atom, holder, "thiolate", 78)]
    if not bonds:
        return [NucleophileSite(atom, "hydrosulfide", 80)]
    if len(bonds) == 2:
        return [NucleophileSite(atom, "thioether", 42)]
    (carrier, code), = bonds.items()
    if graph.elements[carrier] == 16:
        return [NucleophileSite(atom, "thiosulfate", 70)]
    if graph.elements[carrier] == 15:
        return [NucleophileSite(atom, "thiolate", 50)]
    if code == 2:
        return [NucleophileSite(atom, "thiourea", 75)]
    if any(c == 3 for c in graph.neighbours[carrier].values()):
        return [NucleophileSite(atom, "thiocyanate", 72)]
    if graph.has_multiple_bond(carrier, 8):
        return [NucleophileSite(atom, "thiocarboxylate", 76)]
    if graph.has_multiple_bond(carrier, 16):
        return [NucleophileSite(atom, "xanthate", 76)]
    return [NucleophileSite(atom, "thiolate", 82)]


def _phosphorus(graph: Molgraph, atom: int) -> list[NucleophileSite]:
    bonds = graph.neighbours[atom]
    if graph.charges[atom] > 0 or len(bonds) > 3 or any(n for n in bonds if graph.elements[n] in (17, 35)):
        return []
    oxygens = sum(graph.elements[n] == 8 for n in bonds)
    if graph.hydrogens[atom] or graph.charges[atom] < 0:
        return [NucleophileSite(atom, "phosphite" if oxygens else "phosphide", 66)]
    if graph.has_multiple_bond(atom):
        return []
    return [NucleophileSite(atom, "phosphite" if oxygens else "phosphine", 58)]


def _halide(graph: Molgraph, atom: int) -> list[NucleophileSite]:
    bonds, word = graph.neighbours[atom], HALIDES[graph.elements[atom]]
    if graph.charges[atom] > 0:
        return []
    if not bonds:
        return [NucleophileSite(atom, word, 28 + (10 if word == "iodide" else 0))]
    if len(bonds) > 1:
        return []
    (carrier,) = bonds
    if graph.elements[carrier] == 6:
        halogens = sum(graph.elements[n] in HALIDES for n in graph.neighbours[carrier])
        is_source = halogens >= 3 or (graph.has_multiple_bond(carrier) and not graph.aromatic[carrier])
        if not is_source or (len(graph) > 9 and halogens < 3):
            return []
    return [_released(graph, atom, carrier, word, 24)]


def _carbon(graph: Molgraph, atom: int) -> list[NucleophileSite]:
    bonds, charge, hydrogens = graph.neighbours[atom], graph.charges[atom], graph.hydrogens[atom]
    if charge > 0:
        return []
    found = []
    for n in bonds:
        element = graph.elements[n]
        if element in _METALS or (element == 14 and _leaves_silicon(graph, atom)):
            word = "cyanide" if graph.has_multiple_bond(atom, 7) else _METAL_WORDS.get(element, "organometallic")
            if any(code == 3 for m, code in bonds.items() if graph.elements[m] == 6):
                word = "acetylide"
            found.append(_released(graph, atom, n, word, 70))
        elif element in (17, 35, 53):
            found.append(_released(graph, atom, n, "grignard", 6))
    if charge < 0:
        found.append(NucleophileSite(atom, _carbanion_word(graph, atom), 84))
        return found
    if not hydrogens:
        return found
    word, rank = _acidic_carbon(graph, atom)
    silicon = _silyl_enol(graph, atom)
    if silicon is not None:
        oxygen, gone = silicon
        departs = graph.side_of(gone, oxygen)
        found.append(NucleophileSite(atom, "silyl_enol_ether", 50, gone, frozenset(departs or ()), oxygen))
    found.append(NucleophileSite(atom, word, rank))
    return found


def _leaves_silicon(graph: Molgraph, atom: int) -> bool:
    """Return whether a carbon parts from silicon as a nucleophile: alkynyl, cyanide, aryl, CF3, allyl."""
    return (
        graph.has_multiple_bond(atom)
        or graph.aromatic[atom]
        or any(graph.elements[n] == 9 or graph.has_multiple_bond(n, 6) for n in graph.neighbours[atom])
    )


def _carbanion_word(graph: Molgraph, atom: int) -> str:
    """Return the word for a carbon drawn with a negative charge."""
    if graph.has_multiple_bond(atom, 7):
        return "cyanide"
    if graph.has_multiple_bond(atom, 6) and any(code == 3 for code in graph.neighbours[atom].values()):
        return "acetylide"
    acceptors = sum(is_acceptor(graph, n) for n in graph.neighbours[atom])
    if acceptors >= 2:
        return "stabilised_carbanion"
    if acceptors == 1:
        return "enolate"
    return "ylide" if any(graph.charges[n] > 0 for n in graph.neighbours[atom]) else "organometallic"


def _acidic_carbon(graph: Molgraph, atom: int) -> tuple[str, int]:
    """Return the word and rank of a carbon that would attack by giving up a hydrogen."""
    bonds = graph.neighbours[atom]
    if any(code == 3 for code in bonds.values()):
        return ("cyanide", 60) if graph.has_multiple_bond(atom, 7) else ("acetylide", 36)
    if graph.aromatic[atom]:
        return "arene_scavenger", 7
    if graph.has_multiple_bond(atom):
        if graph.has_multiple_bond(atom, 6):
            beyond = [n for n, code in bonds.items() if code == 2]
            donors = any(
                graph.elements[m] in (7, 8) and code == 1
                for n in beyond
                for m, code in graph.neighbours[n].items()
            )
            return ("enolate", 40) if donors else ("alkene", 5)
        return "aldehyde", 2
    acceptors = sum(is_acceptor(graph, n) for n in bonds)
    if acceptors >= 2:
        return "active_methylene", 57
    if acceptors:
        return "enolate", 26
    if any(graph.aromatic[n] or (graph.elements[n] == 6 and graph.has_multiple_bond(n)) for n in bonds):
        return "carbanion", 6
    return "carbanion", 1


def _silyl_enol(graph: Molgraph, atom: int) -> tuple[int, int] | None:
    """Return (oxygen, silicon) when the carbon is the open end of a silyl enol ether."""
    for n, code in graph.neighbours[atom].items():
        if code != 2 or graph.elements[n] != 6:
            continue
        for oxygen, order in graph.neighbours[n].items():
            if order == 1 and graph.elements[oxygen] == 8:
                for silicon in graph.neighbours[oxygen]:
                    if graph.elements[silicon] == 14:
                        return oxygen, silicon
    return None
