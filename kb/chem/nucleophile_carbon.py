"""Carbon nucleophiles: organometallics, carbanions, CH acids, enols, alkynes, cyanide and its sources.

Ranks are judgements that order what is tried and shown; acceptors are counted, pKa values are not looked up.
"""

from __future__ import annotations

from kb.chem.molgraph import Molgraph
from kb.chem.nucleophile_site import METALS, NucleophileSite, is_acceptor, released

_METAL_WORDS = {3: "alkyllithium", 12: "grignard", 30: "organozinc", 29: "organocuprate", 5: "boronic_acid",
                50: "organostannane", 13: "organoaluminium"}  # fmt: skip


def carbon_sites(graph: Molgraph, atom: int) -> list[NucleophileSite]:
    """Return the ways in which a carbon atom can attack."""
    bonds, charge, hydrogens = graph.neighbours[atom], graph.charges[atom], graph.hydrogens[atom]
    if charge > 0:
        return []
    found = []
    for n in bonds:
        element = graph.elements[n]
        if element in METALS or (element == 14 and _leaves_silicon(graph, atom)):
            word = "cyanide" if graph.has_multiple_bond(atom, 7) else _METAL_WORDS.get(element, "organometallic")
            if any(code == 3 for m, code in bonds.items() if graph.elements[m] == 6):
                word = "acetylide"
            found.append(released(graph, atom, n, word, 70))
        elif element in (17, 35, 53):
            found.append(released(graph, atom, n, "grignard", 6))
        elif element == 6 and graph.has_multiple_bond(atom, 7) and _is_carbinol(graph, n):
            found.append(released(graph, atom, n, "cyanide", 60))
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


def _is_carbinol(graph: Molgraph, atom: int) -> bool:
    """Return whether a carbon carries OH, so that a cyanohydrin gives its cyanide back."""
    return graph.is_sp3_carbon(atom) and any(
        graph.elements[n] == 8 and len(graph.neighbours[n]) == 1 for n in graph.neighbours[atom]
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
        return "enolate", 26 if any(is_acceptor(graph, n) and not _is_acid_or_halide(graph, n) for n in bonds) else 12
    if any(graph.aromatic[n] or (graph.elements[n] == 6 and graph.has_multiple_bond(n)) for n in bonds):
        return "carbanion", 6
    return "carbanion", 1


def _is_acid_or_halide(graph: Molgraph, carbon: int) -> bool:
    """Return whether an acceptor is that of an acid, its salt or its halide, whose own reactions come first."""
    return any(
        (graph.elements[n] == 8 and code == 1 and len(graph.neighbours[n]) == 1) or graph.elements[n] in (17, 35, 53)
        for n, code in graph.neighbours[carbon].items()
    )


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
