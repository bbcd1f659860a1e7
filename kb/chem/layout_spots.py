"""RDKit molecule with a layout to the atoms, bonds and labels of a `Drawing`.

It decides what a chemist would write: which carbons are named, where hydrogens stand, on which side the
second line of a double bond lies, which bond is wedged. It lays nothing out (`layout.py`) and draws nothing.
RDKit is imported inside the functions, so that loading this file costs nothing.
"""

from __future__ import annotations

import math
from typing import Any

from kb.chem.layout_values import AtomSpot, BondSpot, BondStyle, Drawing, Mark, Point, Side

_RDKIT_BOND_LENGTH = 1.5
_SIDES: dict[Side, Point] = {
    Side.EAST: (1.0, 0.0),
    Side.WEST: (-1.0, 0.0),
    Side.SOUTH: (0.0, 1.0),
    Side.NORTH: (0.0, -1.0),
}

_SIDES_ALONE = dict.fromkeys(("O", "S", "Se", "F", "Cl", "Br", "I"), (Side.WEST, Side.EAST))
"""Lone hydrides that the trade writes hydrogen first: H₂O, HBr."""


def build_spots(mol: Any, smiles: str, marks: tuple[Mark, ...], room: float) -> Drawing:
    """Turn a molecule with one conformer into a drawing; `room` is its `measure_room`."""
    from rdkit import Chem
    from rdkit.Chem import rdMolDescriptors

    lines = Chem.Mol(mol)
    try:
        Chem.Kekulize(lines, clearAromaticFlags=False)
    except Chem.KekulizeException:
        lines = Chem.Mol(mol)
    Chem.WedgeMolBonds(lines, lines.GetConformer())
    positions = lines.GetConformer().GetPositions() / _RDKIT_BOND_LENGTH
    left, top = float(positions[:, 0].min()), float(positions[:, 1].max())
    points = [(float(x) - left, top - float(y)) for x, y, _ in positions]
    atoms = tuple(_atom_spot(atom, points) for atom in lines.GetAtoms())
    rings = [tuple(ring) for ring in lines.GetRingInfo().AtomRings()]
    bonds = tuple(_bond_spot(bond, points, rings) for bond in lines.GetBonds())
    known = tuple(
        Mark(kind=m.kind, atoms=tuple(a for a in m.atoms if 0 <= a < len(atoms))) for m in marks if m.atoms
    )
    return Drawing(
        smiles=smiles,
        atoms=atoms,
        bonds=bonds,
        marks=known,
        width=max(x for x, _ in points),
        height=max(y for _, y in points),
        nearest=room,
        formula=rdMolDescriptors.CalcMolFormula(mol),
    )


def _atom_spot(atom: Any, points: list[Point]) -> AtomSpot:
    index, symbol = atom.GetIdx(), atom.GetSymbol()
    x, y = points[index]
    around = [points[n.GetIdx()] for n in atom.GetNeighbors()]
    is_bare = (
        symbol == "C"
        and around
        and not atom.GetFormalCharge()
        and not atom.GetIsotope()
        and not atom.GetNumRadicalElectrons()
        and not _is_straight((x, y), around)
    )
    return AtomSpot(
        index=index,
        x=x,
        y=y,
        element=symbol,
        hydrogens=0 if is_bare else atom.GetTotalNumHs(),
        charge=atom.GetFormalCharge(),
        isotope=atom.GetIsotope(),
        radicals=atom.GetNumRadicalElectrons(),
        is_labelled=not is_bare,
        sides=_free_sides((x, y), around) if around else _SIDES_ALONE.get(symbol, tuple(_SIDES)),
        cip=atom.GetProp("_CIPCode") if atom.HasProp("_CIPCode") else "",
    )


def _is_straight(spot: Point, around: list[Point]) -> bool:
    """Tell whether two bonds run straight through, where a bare corner could not be seen (alkyne, allene)."""
    if len(around) != 2:
        return False
    (ax, ay), (bx, by) = ((p[0] - spot[0], p[1] - spot[1]) for p in around)
    norm = math.hypot(ax, ay) * math.hypot(bx, by)
    return norm > 0 and (ax * bx + ay * by) / norm < -0.985


def _free_sides(spot: Point, around: list[Point]) -> tuple[Side, ...]:
    """Order the sides by how far the nearest bond is; level ones win over above and below by a little."""

    def blocked(side: Side) -> float:
        sx, sy = _SIDES[side]
        worst = -1.0
        for px, py in around:
            dx, dy = px - spot[0], py - spot[1]
            worst = max(worst, (dx * sx + dy * sy) / (math.hypot(dx, dy) or 1.0))
        return worst + (0.3 if side in (Side.NORTH, Side.SOUTH) else 0.0)

    order = list(_SIDES)
    return tuple(sorted(order, key=lambda side: (round(blocked(side), 3), order.index(side))))


def _bond_spot(bond: Any, points: list[Point], rings: list[tuple[int, ...]]) -> BondSpot:
    from rdkit import Chem

    kind = bond.GetBondType()
    begin, end = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
    directions = {
        Chem.BondDir.BEGINWEDGE: BondStyle.WEDGE,
        Chem.BondDir.BEGINDASH: BondStyle.HASH,
        Chem.BondDir.UNKNOWN: BondStyle.WAVY,
        Chem.BondDir.EITHERDOUBLE: BondStyle.WAVY,
    }
    style = directions.get(bond.GetBondDir(), BondStyle.PLAIN)
    if kind == Chem.BondType.DOUBLE:
        if bond.GetStereo() == Chem.BondStereo.STEREOANY:
            style = BondStyle.WAVY
        return BondSpot(
            begin=begin, end=end, order=2.0, style=style, lanes=_double_lanes(bond, points, rings)
        )
    if kind == Chem.BondType.TRIPLE:
        return BondSpot(begin=begin, end=end, order=3.0, lanes=(0.0, 1.0, -1.0))
    if kind == Chem.BondType.AROMATIC:
        lanes = (0.0, _inner_side(bond, points, rings) or 1.0)
        return BondSpot(begin=begin, end=end, order=1.5, lanes=lanes, is_second_dashed=True)
    if kind != Chem.BondType.SINGLE:
        style = BondStyle.DASHED
    return BondSpot(begin=begin, end=end, style=style)


def _double_lanes(bond: Any, points: list[Point], rings: list[tuple[int, ...]]) -> tuple[float, ...]:
    """Place the second line: inside the ring, else towards the fuller side, else both lines astride."""
    inner = _inner_side(bond, points, rings)
    if inner:
        return (0.0, inner)
    begin, end = bond.GetBeginAtom(), bond.GetEndAtom()
    if 1 in (begin.GetDegree(), end.GetDegree()) and 3 in (begin.GetDegree(), end.GetDegree()):
        return (0.5, -0.5)
    weight = 0.0
    for here, other in ((begin, end), (end, begin)):
        for neighbour in here.GetNeighbors():
            if neighbour.GetIdx() != other.GetIdx():
                weight += _side_of(points[begin.GetIdx()], points[end.GetIdx()], points[neighbour.GetIdx()])
    if abs(weight) < 0.1:
        return (0.5, -0.5) if begin.GetDegree() + end.GetDegree() in (2, 3, 6) else (0.0, 1.0)
    return (0.0, math.copysign(1.0, weight))


def _inner_side(bond: Any, points: list[Point], rings: list[tuple[int, ...]]) -> float:
    """Return +1 or -1 for the side of the smallest ring that holds the bond, 0 outside rings."""
    begin, end = bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()
    holding = [ring for ring in rings if begin in ring and end in ring]
    if not holding:
        return 0.0
    ring = min(holding, key=lambda r: (abs(len(r) - 6), len(r)))
    centre = (sum(points[a][0] for a in ring) / len(ring), sum(points[a][1] for a in ring) / len(ring))
    return math.copysign(1.0, _side_of(points[begin], points[end], centre))


def _side_of(begin: Point, end: Point, other: Point) -> float:
    """Return > 0 where `other` lies on the side of a positive lane (see `BondSpot.lanes`)."""
    ux, uy = end[0] - begin[0], end[1] - begin[1]
    return (other[0] - begin[0]) * uy - (other[1] - begin[1]) * ux
