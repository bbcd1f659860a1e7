"""Atoms that can bond to a carbon with their own pair of electrons, and the class words of what they belong to.

It lists candidates generously (ions, free bases, salts, both ends of ambident groups, CH acids,
organometallics, halide sources) and ranks them; which one did react is for the match with the product. Words
are those of `kb.materials.class_names`, so that a scheme and a reagent list speak of the same thing.

A candidate may have to drop something first (the metal of an organometallic, the silyl group of an azide, all
of a halide source but its halide): then `gone` and `departs` say what.
"""

from __future__ import annotations

from kb.chem.molgraph import Molgraph
from kb.chem.nucleophile_carbon import carbon_sites
from kb.chem.nucleophile_site import METALS, NucleophileSite, is_acceptor, released
from kb.chem.promoters import Promoters

HALIDES = {9: "fluoride", 17: "chloride", 35: "bromide", 53: "iodide"}

__all__ = ["HALIDES", "NucleophileSite", "find_nucleophile_sites", "is_acceptor", "settle_word"]


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
                found.extend(carbon_sites(graph, atom))
        known = tuple(sorted(found, key=lambda s: (-s.rank, s.atom)))
        graph.memo["nucleophiles"] = known
    return known  # type: ignore[return-value]


_NEUTRAL = {"carboxylate": "carboxylic_acid", "phenoxide": "phenol", "thiolate": "thiol"}
"""Word of an anion -> word of its acid, for O-H and S-H that nothing in the flask deprotonates."""


def settle_word(graph: Molgraph, atom: int, word: str, promoters: Promoters) -> str:
    """Return the class word of an attacking atom under what is in the flask.

    Sites carry the word of the anion, since that is what attacks. It is kept where a base, a Mitsunobu pair or a diazo
    carbon takes the proton; an acid that stays one is called so.
    """
    if word == "alcohol" and promoters.strong_base:
        return "alkoxide"
    if word not in _NEUTRAL or promoters.strong_base or promoters.mild_base or promoters.mitsunobu:
        return word
    is_acid = graph.charges[atom] == 0 and graph.hydrogens[atom] > 0
    for carrier in graph.neighbours[atom] if word == "carboxylate" else ():
        is_acid = any(graph.elements[n] == 8 and graph.hydrogens[n] for n in graph.neighbours[carrier])
    return _NEUTRAL[word] if is_acid else word


def _partner(graph: Molgraph, atom: int, elements: frozenset[int] | tuple[int, ...]) -> int | None:
    """Return the first neighbour of one of the elements."""
    return next((n for n in graph.neighbours[atom] if graph.elements[n] in elements), None)


def _nitrogen(graph: Molgraph, atom: int) -> list[NucleophileSite]:
    bonds, charge, hydrogens = graph.neighbours[atom], graph.charges[atom], graph.hydrogens[atom]
    if charge > 0 and not hydrogens:
        return []
    pseudohalide = next((w for n in bonds if (w := _pseudohalide(graph, n))), None)
    metal = _partner(graph, atom, METALS | {14})
    if metal is not None and pseudohalide is not None:
        return [released(graph, atom, metal, pseudohalide, 60)]
    if pseudohalide is not None and not any(code == 3 for code in bonds.values()):
        return [NucleophileSite(atom, pseudohalide, 60 if pseudohalide == "cyanate" else 24)]
    if metal is not None:
        rest = [n for n in bonds if n != metal]
        is_azide = any(graph.elements[n] == 7 for n in rest)
        return [released(graph, atom, metal, "azide" if is_azide else "metal_amide", 70)]
    phosphorus = _partner(graph, atom, (15,))
    if phosphorus is not None and any(graph.charges[n] > 0 for n in bonds if graph.elements[n] == 7):
        return [released(graph, atom, phosphorus, "azide", 70)]
    if len(bonds) >= 4:
        return []
    nitrogens = [n for n in bonds if graph.elements[n] == 7]
    middle = [n for n in nitrogens if graph.charges[n] > 0 and len(graph.neighbours[n]) == 2]
    if middle and not graph.aromatic[middle[0]]:
        return _azide(graph, atom, middle[0]) if charge < 0 or len(bonds) == 1 else []
    if any(code == 3 for code in bonds.values()):
        carbon = next(iter(bonds))
        pseudohalide = _pseudohalide(graph, carbon)
        if pseudohalide is not None:
            return [NucleophileSite(atom, pseudohalide, 24)]
        is_ion = graph.charges[carbon] < 0 or graph.hydrogens[carbon] or _partner(graph, carbon, METALS) is not None
        return [NucleophileSite(atom, "cyanide", 22) if is_ion else NucleophileSite(atom, "nitrile", 8)]
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


def _pseudohalide(graph: Molgraph, carbon: int) -> str | None:
    """Return the word for the ion, acid or silyl compound of N-C-S or N-C-O; None when either end carries carbon."""
    bonds = graph.neighbours[carbon]
    if graph.elements[carbon] != 6 or len(bonds) != 2 or graph.hydrogens[carbon]:
        return None
    word = {15: "cyanate", 23: "thiocyanate"}.get(sum(graph.elements[n] for n in bonds))
    for end in bonds:
        if graph.elements[end] not in (7, 8, 16):
            return None
        if any(n != carbon and graph.elements[n] not in METALS | {1, 14} for n in graph.neighbours[end]):
            return None
    return word


def _azide(graph: Molgraph, atom: int, middle: int) -> list[NucleophileSite]:
    """Return an azide end as such, and as the amine that reduction in the same entry makes of it."""
    found = [NucleophileSite(atom, "azide", 90)]
    departs = graph.side_of(middle, atom)
    if departs is not None and len(departs) == 2 and graph.charges[atom] < 0:
        found.append(NucleophileSite(atom, "azide", 50, middle, frozenset(departs), None, 2))
    return found


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
    holder = _partner(graph, atom, METALS | {14})
    if holder is not None:
        return [released(graph, atom, holder, "alkoxide", 40)]
    if len(bonds) > 1:
        return []
    if not bonds:
        if graph.hydrogens[atom] == 0:
            return []
        return [NucleophileSite(atom, "hydroxide", 50) if charge < 0 else NucleophileSite(atom, "water", 20)]
    (carrier, code), = bonds.items()
    element = graph.elements[carrier]
    if element == 6 and _pseudohalide(graph, carrier):
        return [NucleophileSite(atom, "cyanate", 21)]
    if element == 6:
        return [_oxygen_on_carbon(graph, atom, carrier, code)]
    if element == 7:
        if sum(graph.elements[n] == 8 for n in graph.neighbours[carrier]) >= 2:
            is_salt = all(graph.elements[n] == 8 for n in graph.neighbours[carrier])
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
    if len(graph.neighbours[carrier]) == 3 and all(
        graph.elements[n] == 8 and len(graph.neighbours[n]) == 1 for n in graph.neighbours[carrier]
    ):
        return NucleophileSite(atom, "carbonate_base", 8)
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
    holder = _partner(graph, atom, METALS | {14})
    if holder is not None:
        return [released(graph, atom, holder, "thiolate", 78)]
    if not bonds:
        return [NucleophileSite(atom, "hydrosulfide", 80)]
    if len(bonds) == 2:
        return [NucleophileSite(atom, "thioether", 42)]
    (carrier, code), = bonds.items()
    if graph.elements[carrier] == 16:
        return [NucleophileSite(atom, "thiosulfate", 70)]
    if graph.elements[carrier] == 15:
        return [NucleophileSite(atom, "thiolate", 50)]
    if _pseudohalide(graph, carrier):
        return [NucleophileSite(atom, "thiocyanate", 72)]
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
        halogens = sum(graph.elements[n] in (17, 35, 53) for n in graph.neighbours[carrier])
        is_source = halogens >= 3 or (graph.has_multiple_bond(carrier) and not graph.aromatic[carrier])
        if not is_source or (len(graph) > 9 and halogens < 3):
            return []
    return [released(graph, atom, carrier, word, 10 if graph.elements[carrier] in HALIDES else 24)]
