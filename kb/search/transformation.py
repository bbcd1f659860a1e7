"""What changed: a transformation such as `C-Br>>C-N`, matched on the reacting centre and not just on both sides.

Reading. The left side is what the substrate has, the right side what it became. One atom of each is the
centre: the atom with map 1; without maps, the one carbon of a side, else the carbon beside what changes.
`[C:1]-Br>>[C:1]-N` and `C-Br>>C-N` say the same. An empty side asks for nothing.

A run answers when three things hold. The left side matches its substrate with the centre at the stored
reacting centre. What is lost there (left neighbours of the centre that the right side lacks) is the
recorded leaving group. The right side matches a product with its centre at the atom that the substrate's
centre became; that atom is found by laying the rest of the substrate, without what is lost, over the
product.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass

from rdkit import Chem

from kb.chem.query import ROOT_MAP, StructureQuery, find_match, parse_query, query_of_fragment
from kb.chem.query_traits import traits_of, types_of
from kb.errors import QueryError
from kb.vocabulary import LeavingGroup

LEAVING_ELEMENTS: dict[int, frozenset[str]] = {
    9: frozenset({LeavingGroup.FLUORIDE}),
    17: frozenset({LeavingGroup.CHLORIDE}),
    35: frozenset({LeavingGroup.BROMIDE}),
    53: frozenset({LeavingGroup.IODIDE}),
    16: frozenset({LeavingGroup.SULFONIUM, LeavingGroup.OTHER}),
    7: frozenset({LeavingGroup.AMMONIUM, LeavingGroup.DIAZONIUM, LeavingGroup.NITRO, LeavingGroup.OTHER}),
    8: frozenset(
        {
            LeavingGroup.MESYLATE,
            LeavingGroup.TOSYLATE,
            LeavingGroup.TRIFLATE,
            LeavingGroup.SULFONATE,
            LeavingGroup.SULFATE,
            LeavingGroup.PHOSPHATE,
            LeavingGroup.CARBOXYLATE,
            LeavingGroup.HYDROXYL,
            LeavingGroup.ALKOXIDE,
            LeavingGroup.EPOXIDE,
            LeavingGroup.OTHER,
        }
    ),
}
"""Leaving groups by the element that is bonded to the centre."""


@dataclass(frozen=True, slots=True)
class Transformation:
    """A transformation, read.

    Attributes:
        text: as entered.
        left: rooted query on the substrate; None = anything.
        right: rooted queries on a product, one of which must match; () = anything.
        lost: query atoms of the left side, bonded to the centre, that the right side lacks.
        leaving_groups: leaving groups that fit what is lost; None = nothing is said of it.
    """

    text: str
    left: StructureQuery | None
    right: tuple[StructureQuery, ...]
    lost: tuple[int, ...]
    leaving_groups: frozenset[str] | None


def parse_transformation(text: str) -> Transformation:
    """Read a transformation.

    Raises:
        QueryError: no arrow, both sides empty, a side that is no SMARTS, or no way to tell the centre.
    """
    sides = text.strip().split(">>")
    if len(sides) != 2 or not any(side.strip() for side in sides):
        raise QueryError(
            f"{text[:80]!r} is no transformation.", "Write what was and what became of it: C-Br>>C-N.", text
        )
    left, right = (parse_query(side.strip()) if side.strip() else None for side in sides)
    lefts = _rooted(left, right, text) if left else ()
    rights = _rooted(right, left, text) if right else ()
    if len(lefts) > 1:
        raise QueryError(
            f"It cannot be told which atom of '{sides[0].strip()[:60]}' is the reacting centre.",
            "Mark it with 1 on both sides: [C:1]-Br>>[C:1]-N.",
            text,
        )
    left = lefts[0] if lefts else None
    lost = _lost(left, rights[0]) if left and rights else ()
    groups: frozenset[str] | None = None
    if left is not None and lost:
        fitting = [_groups_of(left.mol.GetAtomWithIdx(atom)) for atom in lost]
        known = [found for found in fitting if found is not None]
        groups = frozenset().union(*known) if known and len(known) == len(fitting) else None
    return Transformation(text, left, rights, lost, groups)


def product_holds(transformation: Transformation, substrate: Chem.Mol, centre: int, product: Chem.Mol) -> bool:
    """Return whether the right side sits in a product where the substrate's centre went.

    Args:
        transformation: whose left side matches the substrate at the centre.
        substrate: the stored substrate.
        centre: its reacting centre.
        product: one product of the run.
    """
    fitting = [right for right in transformation.right if find_match(right, product) is not None]
    if not fitting:
        return not transformation.right
    lost = _lost_in(transformation, substrate, centre)
    places = _places(_rest_of(substrate, centre, lost, keep_orders=True), product)
    if not places:
        places = _places(_rest_of(substrate, centre, lost, keep_orders=False), product)
    return any(
        find_match(right, product, root_atom=place) is not None for place in places for right in fitting
    )


MOST_PLACES = 64
"""Ways of laying the rest of a substrate over a product that are tried."""
REACH = 5
"""Bonds from the centre within which the rest of a substrate must be found again: enough to tell one carbon from
another, and blind to what else the same run did farther off (judgement)."""


def _rooted(query: StructureQuery, other: StructureQuery | None, text: str) -> tuple[StructureQuery, ...]:
    """Return the query with its centre as root, once for each atom that may be meant."""
    if query.root is not None:
        return (query,)
    carbons = [a.GetIdx() for a in query.mol.GetAtoms() if _may_be(a, 6)]
    if len(carbons) > 1:
        hetero = [c for c in carbons if _neighbour_elements(query.mol, c) - {6}]
        changing = [c for c in hetero if other is None or _changes(query.mol, c, other.mol)]
        carbons = changing if len(changing) == 1 else (hetero if len(hetero) == 1 else carbons)
    if not carbons:
        raise QueryError(
            f"'{query.text[:60]}' holds no carbon that could be the reacting centre.",
            "Name the carbon: C-Br>>C-N.",
            text,
        )
    rooted = []
    for carbon in carbons:
        mol = Chem.RWMol(query.mol)
        mol.GetAtomWithIdx(carbon).SetAtomMapNum(ROOT_MAP)
        rooted.append(query_of_fragment(mol.GetMol(), query.text))
    return tuple(rooted)


def _may_be(atom: Chem.Atom, element: int) -> bool:
    return any(z == element for z, _ in types_of(traits_of(atom)))


def _neighbour_elements(mol: Chem.Mol, atom: int) -> set[int]:
    return {
        z for other in mol.GetAtomWithIdx(atom).GetNeighbors() for z, _ in types_of(traits_of(other))
    }


def _changes(mol: Chem.Mol, atom: int, other: Chem.Mol) -> bool:
    """Return whether no carbon of the other side has the same kinds of neighbour."""
    mine = _neighbour_elements(mol, atom)
    return all(_neighbour_elements(other, a.GetIdx()) != mine for a in other.GetAtoms() if _may_be(a, 6))


def _around(query: StructureQuery) -> list[tuple[int, frozenset[tuple[int, bool]], int]]:
    """Return (atom, what it may be, its map) of every neighbour of the root."""
    assert query.root is not None
    root = query.mol.GetAtomWithIdx(query.root)
    return [
        (a.GetIdx(), frozenset(types_of(traits_of(a))), a.GetAtomMapNum()) for a in root.GetNeighbors()
    ]


def _lost(left: StructureQuery, right: StructureQuery) -> tuple[int, ...]:
    """Return the left neighbours of the centre that have no counterpart on the right, maps before types."""
    remaining = _around(right)
    right_maps = {a.GetAtomMapNum() for a in right.mol.GetAtoms()} - {0}
    kept_types = Counter(types for _, types, number in remaining if not number)
    lost = []
    for atom, types, number in _around(left):
        if number:
            if number not in right_maps or number not in {n for _, _, n in remaining}:
                lost.append(atom)
        elif kept_types[types]:
            kept_types[types] -= 1
        else:
            lost.append(atom)
    return tuple(lost)


def _groups_of(atom: Chem.Atom) -> frozenset[str] | None:
    """Return the leaving groups that an atom can head; None where it does not say, or is a carbon."""
    elements = {z for z, _ in types_of(traits_of(atom))}
    if not elements or not elements <= LEAVING_ELEMENTS.keys():
        return None
    return frozenset().union(*(LEAVING_ELEMENTS[z] for z in elements))


def _lost_in(transformation: Transformation, substrate: Chem.Mol, centre: int) -> set[int]:
    """Return the substrate atoms that the left side says are lost, or the hetero atoms at the centre."""
    left = transformation.left
    if left is not None and transformation.lost:
        match = find_match(left, substrate, root_atom=centre)
        if match is not None:
            return {match[atom] for atom in transformation.lost}
    around = substrate.GetAtomWithIdx(centre).GetNeighbors()
    return {a.GetIdx() for a in around if a.GetAtomicNum() in LEAVING_ELEMENTS and not a.IsInRing()}


_BOND_SMARTS = {
    Chem.BondType.SINGLE: "-",
    Chem.BondType.DOUBLE: "=",
    Chem.BondType.TRIPLE: "#",
    Chem.BondType.AROMATIC: ":",
}


def _within(mol: Chem.Mol, centre: int) -> list[int]:
    """Return the atoms that are REACH bonds or fewer from the centre."""
    reached = [centre]
    edge = [centre]
    for _ in range(REACH):
        edge = [a.GetIdx() for at in edge for a in mol.GetAtomWithIdx(at).GetNeighbors()]
        edge = [atom for atom in dict.fromkeys(edge) if atom not in reached]
        reached += edge
    return reached


def _places(rest: StructureQuery, product: Chem.Mol) -> set[int]:
    """Return where in a product the centre can lie when the rest of the substrate is laid over it."""
    parameters = Chem.SubstructMatchParameters()
    parameters.maxMatches = MOST_PLACES  # type: ignore[assignment]
    parameters.uniquify = False  # type: ignore[assignment]
    root = rest.root or 0
    return {match[root] for match in product.GetSubstructMatches(rest.mol, parameters)}


def _rest_of(substrate: Chem.Mol, centre: int, lost: set[int], *, keep_orders: bool) -> StructureQuery:
    """Return the part of the substrate that stays with the centre, as a query for its elements.

    Args:
        substrate, centre: the stored substrate and its centre.
        lost: atoms that leave the centre.
        keep_orders: ask for the order of bonds that do not touch the centre; False after a shift or a transposition.
    """
    editable = Chem.RWMol(substrate)
    for atom in lost:
        if editable.GetBondBetweenAtoms(centre, atom) is not None:
            editable.RemoveBond(centre, atom)
    kept = _within(editable, centre)
    query = Chem.RWMol()
    place = {}
    for atom in kept:
        place[atom] = query.AddAtom(Chem.AtomFromSmarts(f"[#{substrate.GetAtomWithIdx(atom).GetAtomicNum()}]"))
    query.GetAtomWithIdx(place[centre]).SetAtomMapNum(ROOT_MAP)
    for bond in editable.GetBonds():
        i, j = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
        if i in place and j in place:
            query.AddBond(place[i], place[j], Chem.BondType.SINGLE)
            added = query.GetBondBetweenAtoms(place[i], place[j])
            order = _BOND_SMARTS.get(bond.GetBondType(), "~") if keep_orders and centre not in (i, j) else "~"
            query.ReplaceBond(added.GetIdx(), Chem.BondFromSmarts(order))
    mol = query.GetMol()
    mol.UpdatePropertyCache(strict=False)
    Chem.GetSymmSSSR(mol)
    return StructureQuery(text="", mol=mol, root=place[centre], is_loose=True)
