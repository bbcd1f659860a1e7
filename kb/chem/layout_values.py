"""Drawing primitives: the values that the terminal, SVG and HTML all draw from.

It holds geometry and words, no RDKit and no pixels: whoever draws chooses the scale. It refuses to colour
atoms by element; colour is kept for the marks, and a mark always has a shape as well.
Conventions: lengths in bond lengths [1], x to the right, y *down*, the origin at the top left of the box
round the atoms. Atom numbers are positions in the SMILES as entered, the numbers that `Reading` and `Finding`
use.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field
from enum import StrEnum

Point = tuple[float, float]

_SUBSCRIPT = str.maketrans("0123456789", "₀₁₂₃₄₅₆₇₈₉")
_SUPERSCRIPT = str.maketrans("0123456789+-", "⁰¹²³⁴⁵⁶⁷⁸⁹⁺⁻")


class BondStyle(StrEnum):
    """How a bond line is drawn; a wedge starts narrow at `begin`."""

    PLAIN = "plain"
    WEDGE = "wedge"
    HASH = "hash"
    WAVY = "wavy"
    DASHED = "dashed"


class Side(StrEnum):
    """Where the hydrogens of a label stand, seen from the atom."""

    EAST = "east"
    WEST = "west"
    NORTH = "north"
    SOUTH = "south"


class MarkKind(StrEnum):
    """Why an atom is marked; earlier kinds win where an atom has several."""

    CENTRE = "centre"
    LEAVING = "leaving"
    MOTIF = "motif"
    MATCH = "match"


MARK_GLYPHS: dict[MarkKind, str] = {
    MarkKind.CENTRE: "◆",
    MarkKind.LEAVING: "○",
    MarkKind.MOTIF: "▲",
    MarkKind.MATCH: "•",
}
"""The shape of each mark, the same on every medium, so that colour is never the only carrier."""

MARK_WORDS: dict[MarkKind, str] = {
    MarkKind.CENTRE: "reacting carbon",
    MarkKind.LEAVING: "leaving group",
    MarkKind.MOTIF: "motif of the finding",
    MarkKind.MATCH: "matched",
}


@dataclass(frozen=True, slots=True, kw_only=True)
class Mark:
    """Atoms that are marked for one reason."""

    kind: MarkKind
    atoms: tuple[int, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class LabelText:
    """The words of one atom label, laid out for one side.

    Attributes:
        before, core, after: on the atom's own line; `core` is the element and sits on the atom.
        above, below: hydrogens that stand on the neighbouring line, centred on the atom; usually empty.
    """

    core: str
    before: str = ""
    after: str = ""
    above: str = ""
    below: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class AtomSpot:
    """One atom where it is drawn.

    Attributes:
        index: position in the SMILES as entered.
        x, y: place [bond lengths].
        element: symbol, "*" for an open position.
        hydrogens: implied hydrogens that the label must show.
        charge: formal charge [e]. isotope: mass number, 0 = natural. radicals: unpaired electrons.
        is_labelled: False for a carbon that is a bare corner.
        sides: sides for the hydrogens, freest first.
        cip: "R", "S" or "" (not drawn; told in words).
    """

    index: int
    x: float
    y: float
    element: str
    hydrogens: int = 0
    charge: int = 0
    isotope: int = 0
    radicals: int = 0
    is_labelled: bool = False
    sides: tuple[Side, ...] = (Side.EAST, Side.WEST, Side.SOUTH, Side.NORTH)
    cip: str = ""

    def label(self, side: Side) -> LabelText:
        """Return the label with its hydrogens on `side` ("NH₃⁺" to the east, "H₃N⁺" to the west)."""
        before = str(self.isotope).translate(_SUPERSCRIPT) if self.isotope else ""
        hydrogens = ""
        if self.hydrogens:
            count = str(self.hydrogens) if self.hydrogens > 1 else ""
            hydrogens = "H" + count.translate(_SUBSCRIPT)
        tail = "·" * self.radicals
        if self.charge:
            size = str(abs(self.charge)) if abs(self.charge) > 1 else ""
            tail += (size + ("+" if self.charge > 0 else "-")).translate(_SUPERSCRIPT)
        if not hydrogens or side is Side.EAST:
            return LabelText(core=self.element, before=before, after=hydrogens + tail)
        if side is Side.WEST:
            return LabelText(core=self.element, before=hydrogens + before, after=tail)
        if side is Side.NORTH:
            return LabelText(core=self.element, before=before, after=tail, above=hydrogens)
        return LabelText(core=self.element, before=before, after=tail, below=hydrogens)


@dataclass(frozen=True, slots=True, kw_only=True)
class BondSpot:
    """One bond.

    Attributes:
        begin, end: atom numbers; a wedge or hash is narrow at `begin`.
        order: 1, 2, 3, or 1.5 for an aromatic bond that could not be written as single and double.
        style: style of the main line.
        lanes: signed offsets of the lines in gaps; positive is to the left of begin-to-end on paper
            with y down. 0 runs from atom to atom, an offset of a whole gap is drawn shortened.
        is_second_dashed: lanes after the first are dashed (aromatic, partial).
    """

    begin: int
    end: int
    order: float = 1.0
    style: BondStyle = BondStyle.PLAIN
    lanes: tuple[float, ...] = (0.0,)
    is_second_dashed: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class Stroke:
    """One line to draw, in the units of the points it was made from.

    Attributes:
        bond: position in `Drawing.bonds`.
        start, end: where it runs; for wedge and hash from narrow to wide.
        style: see `BondStyle`.
        begin_atom, end_atom: whose labels may cut it short.
        mark: mark shared by both ends, else None.
        is_breaking: the bond from the reacting carbon to its leaving group; drawn broken.
    """

    bond: int
    start: Point
    end: Point
    style: BondStyle
    begin_atom: int
    end_atom: int
    mark: MarkKind | None = None
    is_breaking: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class Drawing:
    """A structure, laid out.

    Attributes:
        smiles: the text it was made from.
        atoms, bonds: in the order of the SMILES.
        marks: see `Mark`.
        width, height: of the box round the atoms [bond lengths].
        nearest: smallest distance of two atoms that are not bonded [bond lengths]; below 0.4 they collide.
        formula: molecular formula, for words.
    """

    smiles: str
    atoms: tuple[AtomSpot, ...]
    bonds: tuple[BondSpot, ...] = ()
    marks: tuple[Mark, ...] = ()
    width: float = 0.0
    height: float = 0.0
    nearest: float = math.inf
    formula: str = ""
    _by_atom: dict[int, MarkKind] = field(init=False, default_factory=dict, repr=False, compare=False)

    def __post_init__(self) -> None:
        order = list(MarkKind)
        for mark in sorted(self.marks, key=lambda m: order.index(m.kind)):
            for atom in mark.atoms:
                self._by_atom.setdefault(atom, mark.kind)

    def mark_of(self, atom: int) -> MarkKind | None:
        """Return why the atom is marked, or None."""
        return self._by_atom.get(atom)

    @property
    def mark_kinds(self) -> tuple[MarkKind, ...]:
        """Return the kinds that really show, in order of precedence (for a legend)."""
        shown = set(self._by_atom.values())
        return tuple(kind for kind in MarkKind if kind in shown)

    @property
    def text_alternative(self) -> str:
        """Return the drawing in words, for screen readers and for places without room."""
        words = [f"Structure {self.formula or self.smiles}", f"SMILES {self.smiles}"]
        for kind in self.mark_kinds:
            named = [f"{self.atoms[a].element}{a}" for a, k in sorted(self._by_atom.items()) if k is kind]
            words.append(f"{MARK_WORDS[kind]} {MARK_GLYPHS[kind]}: {', '.join(named)}")
        centres = [f"{a.element}{a.index} {a.cip}" for a in self.atoms if a.cip]
        if centres:
            words.append("configuration: " + ", ".join(centres))
        return "; ".join(words) + "."


def build_strokes(drawing: Drawing, points: Sequence[Point], gap: float) -> tuple[Stroke, ...]:
    """Build every line of a drawing.

    Args:
        drawing: what to draw.
        points: where each atom is, by atom number, in the units of the medium, y down.
        gap: distance between the lines of a multiple bond, same units.

    Returns:
        Strokes in bond order, at least one for each bond; not yet cut at labels.
    """
    strokes: list[Stroke] = []
    for number, bond in enumerate(drawing.bonds):
        (x1, y1), (x2, y2) = points[bond.begin], points[bond.end]
        length = math.hypot(x2 - x1, y2 - y1) or 1.0
        ux, uy = (x2 - x1) / length, (y2 - y1) / length
        kinds = (drawing.mark_of(bond.begin), drawing.mark_of(bond.end))
        shared = kinds[0] if kinds[0] is kinds[1] else None
        is_breaking = set(kinds) == {MarkKind.CENTRE, MarkKind.LEAVING}
        for position, lane in enumerate(bond.lanes):
            dx, dy = uy * lane * gap, -ux * lane * gap
            cut = min(0.2 * length, 0.9 * gap) if abs(lane) >= 1 and bond.order != 3 else 0.0
            style = BondStyle.DASHED if position and bond.is_second_dashed else bond.style
            strokes.append(
                Stroke(
                    bond=number,
                    start=(x1 + dx + ux * cut, y1 + dy + uy * cut),
                    end=(x2 + dx - ux * cut, y2 + dy - uy * cut),
                    style=style,
                    begin_atom=bond.begin,
                    end_atom=bond.end,
                    mark=MarkKind.LEAVING if is_breaking else shared,
                    is_breaking=is_breaking,
                )
            )
    return tuple(strokes)


@dataclass(frozen=True, slots=True, kw_only=True)
class Piece:
    """One fragment of a scheme: drawn, or kept as text with the reason why it is not drawn."""

    smiles: str
    drawing: Drawing | None = None
    reason: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class SchemeDrawing:
    """A scheme, side by side.

    Attributes:
        left, agents, right: fragments of each side, in the order entered.
        has_arrow: False where only a substrate was given.
    """

    left: tuple[Piece, ...]
    agents: tuple[Piece, ...] = ()
    right: tuple[Piece, ...] = ()
    has_arrow: bool = False
