"""2D layout: a SMILES to a `Drawing` that the terminal, SVG and HTML share.

It asks RDKit for coordinates and turns them into atoms, bonds, wedges and labels. It refuses to standardise:
what was entered is drawn, atom for atom and in the order entered, so that the numbers of a reading or a
finding point at the right atoms. RDKit is loaded on the first call, not when this file is imported.

Where atoms collide in RDKit's first layout, two more are tried and the one with most room is taken; cages
that stay crowded are pushed apart (`layout_room`). No random numbers: the same SMILES always gives the same
picture.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from typing import Any

from kb.chem.layout_spots import build_spots
from kb.chem.layout_values import (
    MARK_GLYPHS,
    MARK_WORDS,
    AtomSpot,
    BondSpot,
    BondStyle,
    Drawing,
    LabelText,
    Mark,
    MarkKind,
    Piece,
    Point,
    SchemeDrawing,
    Side,
    Stroke,
    build_strokes,
)
from kb.errors import StructureError

__all__ = [
    "MARK_GLYPHS",
    "MARK_WORDS",
    "MAX_ATOMS",
    "AtomSpot",
    "BondSpot",
    "BondStyle",
    "Drawing",
    "LabelText",
    "Mark",
    "MarkKind",
    "Piece",
    "Point",
    "SchemeDrawing",
    "Side",
    "Stroke",
    "build_drawing",
    "build_scheme",
    "build_strokes",
    "split_scheme",
]

MAX_ATOMS = 400
"""Largest structure that is drawn [atoms]; a longer one is named by its SMILES (no screen shows it)."""

CROWDED = 0.5
"""Below this distance of unbonded atoms, or of an atom and a strange bond, room is sought [bond lengths]."""

COLLIDING = 0.35
"""Below this the atoms are pushed apart too; above it the regular picture of a cage reads better (by eye)."""


def build_drawing(smiles: str, marks: Iterable[Mark] = ()) -> Drawing:
    """Lay out one structure and return its drawing.

    Args:
        smiles: any number of fragments; explicit hydrogens are drawn as atoms.
        marks: atoms to mark; numbers outside the structure are ignored.

    Raises:
        StructureError: when the text cannot be read, is empty, or has more than MAX_ATOMS atoms.
    """
    mol = _parse(smiles)
    _lay_out(mol)
    return build_spots(mol, smiles, tuple(marks), _room(mol))


def split_scheme(text: str) -> tuple[tuple[str, ...], tuple[str, ...], tuple[str, ...], bool]:
    """Split a scheme into the fragments of its three sides and whether it has an arrow.

    Raises:
        StructureError: when there are arrows, but not two of them.
    """
    words = text.split()
    sides = re.split(r"(?<!-)>", words[0]) if words else [""]
    if len(sides) not in (1, 3):
        raise StructureError(
            f"The scheme has {len(sides) - 1} '>' signs.",
            "Write substrate.reagent>agents>product, or the substrate alone.",
            text,
        )
    parts = [tuple(piece for piece in side.split(".") if piece) for side in sides]
    if len(parts) == 1:
        return parts[0], (), (), False
    return parts[0], parts[1], parts[2], True


def build_scheme(text: str, marks: Mapping[int, Iterable[Mark]] | None = None) -> SchemeDrawing:
    """Lay out a scheme; a fragment that cannot be drawn is kept as text with the reason.

    Args:
        text: reaction SMILES, or a substrate alone.
        marks: by component, counted over the left side and then the agents.

    Raises:
        StructureError: when the arrows make no sense.
    """
    left, agents, right, has_arrow = split_scheme(text)
    by_component = marks or {}
    pieces = [_piece(smiles, by_component.get(number, ())) for number, smiles in enumerate(left + agents)]
    return SchemeDrawing(
        left=tuple(pieces[: len(left)]),
        agents=tuple(pieces[len(left) :]),
        right=tuple(_piece(smiles, ()) for smiles in right),
        has_arrow=has_arrow,
    )


def _piece(smiles: str, marks: Iterable[Mark]) -> Piece:
    try:
        return Piece(smiles=smiles, drawing=build_drawing(smiles, marks))
    except StructureError as error:
        return Piece(smiles=smiles, reason=str(error))


def _parse(smiles: str) -> Any:
    from rdkit import Chem, rdBase

    params = Chem.SmilesParserParams()
    params.removeHs = False  # type: ignore[assignment]
    params.strictCXSMILES = False  # type: ignore[assignment]
    blocked = rdBase.BlockLogs()
    try:
        mol = Chem.MolFromSmiles(smiles.strip(), params)
    finally:
        del blocked
    if mol is None or mol.GetNumAtoms() == 0:
        raise StructureError(f"{smiles[:60]!r} cannot be drawn.", "Check the SMILES.", smiles)
    if mol.GetNumAtoms() > MAX_ATOMS:
        raise StructureError(
            f"The structure has {mol.GetNumAtoms()} atoms; at most {MAX_ATOMS} are drawn.",
            "Read its SMILES instead.",
            smiles,
        )
    return mol


def _lay_out(mol: Any) -> None:
    """Give the molecule its one conformer: the roomiest of up to three layouts, if need be pushed apart."""
    from rdkit.Chem import rdCoordGen, rdDepictor

    rdDepictor.Compute2DCoords(mol, canonOrient=True, useRingTemplates=True)
    room = _room(mol)
    if room < CROWDED:
        best = mol.GetConformer().GetPositions()
        for attempt in (rdCoordGen.AddCoords, rdDepictor.Compute2DCoords):
            attempt(mol)
            rdDepictor.NormalizeDepiction(mol, canonicalize=1, scaleFactor=-1)
            if (found := _room(mol)) > room:
                room, best = found, mol.GetConformer().GetPositions()
        mol.GetConformer().SetPositions(best)
    if room < COLLIDING:
        _push_apart(mol)
    rdDepictor.StraightenDepiction(mol, minimizeRotation=True)


def _push_apart(mol: Any) -> None:
    """Replace the layout by one with more room, where springs find one."""
    import numpy as np

    from kb.chem.layout_room import make_room, measure_room

    points, ends = _arrays(mol)
    pushed = make_room(points, ends)
    if measure_room(pushed, ends) > measure_room(points, ends):
        mol.GetConformer().SetPositions(np.hstack([pushed, np.zeros((len(pushed), 1))]))


def _room(mol: Any) -> float:
    """Return the room of the molecule's layout; see `measure_room`."""
    from kb.chem.layout_room import measure_room

    return measure_room(*_arrays(mol))


def _arrays(mol: Any) -> tuple[Any, Any]:
    """Return places (n, 2) and bonds (m, 2) as arrays."""
    import numpy as np

    ends = [(bond.GetBeginAtomIdx(), bond.GetEndAtomIdx()) for bond in mol.GetBonds()]
    return mol.GetConformer().GetPositions()[:, :2], np.array(ends, dtype=int).reshape(-1, 2)
