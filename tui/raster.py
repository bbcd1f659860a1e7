"""Braille raster: a `Drawing` to terminal cells, pure and free of Textual.

Each cell holds 2 x 4 dots, near enough square on the usual terminal. Labels and mark glyphs take whole cells
and win over dots, so a label is always read whole; atoms that show text are snapped to the middle of their
cell so that lines point at it. The scale is the largest at which everything fits and is legible; below that
the drawing is cropped round its marks and the notice says how many atoms were cut.

Legible means: no two labels share or touch a cell, every bond keeps at least two dots, no bond runs behind
the label of an atom that is not its own.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass, field

from kb.chem.layout import (
    MARK_GLYPHS,
    Drawing,
    LabelText,
    Point,
    Stroke,
    build_strokes,
)
from tui.dots import stroke_dots

SCALE_MAX = 13.0
SCALE_MIN = 5.0
"""Dots per bond length: above the first nothing is gained, below the second double bonds run together."""

GAP_DOTS = 2.0
GAP_DOTS_SMALL = 1.6
MIN_BOND_DOTS = 2

_BITS = ((0x01, 0x08), (0x02, 0x10), (0x04, 0x20), (0x40, 0x80))
_PHASES = ((0.0, 0.0), (0.0, 2.0), (1.0, 1.0), (1.0, 3.0))

Place = tuple[int, int]


@dataclass(frozen=True, slots=True, kw_only=True)
class Cell:
    """One character and the name of its ink ("bond", "label", "number", or a mark kind)."""

    char: str
    ink: str


@dataclass(frozen=True, slots=True, kw_only=True)
class PlacedLabel:
    """Where the text of one atom went; `cells` in unshifted coordinates of the picture."""

    atom: int
    cells: tuple[tuple[Place, str, str], ...]


@dataclass(slots=True)
class Picture:
    """A rastered drawing without bounds, before it is cut to a panel.

    Attributes:
        scale: dots per bond length.
        cells: by (column, row).
        labels: what was written, per atom.
        bond_dots: dots left visible, per bond.
        clashes: plain words for what could not be kept apart; empty = legible.
    """

    scale: float
    cells: dict[Place, Cell] = field(default_factory=dict)
    labels: list[PlacedLabel] = field(default_factory=list)
    bond_dots: list[int] = field(default_factory=list)
    clashes: list[str] = field(default_factory=list)
    spots: dict[int, Place] = field(default_factory=dict)

    @property
    def box(self) -> tuple[int, int, int, int]:
        """Return (left, top, right, bottom), the last two exclusive."""
        columns = [c for c, _ in self.cells] or [0]
        rows = [r for _, r in self.cells] or [0]
        return min(columns), min(rows), max(columns) + 1, max(rows) + 1

    @property
    def size(self) -> tuple[int, int]:
        """Return columns and rows taken."""
        left, top, right, bottom = self.box
        return right - left, bottom - top


@dataclass(frozen=True, slots=True, kw_only=True)
class Grid:
    """Cells cut to a panel, row by row; None = empty.

    Attributes:
        rows: `height` rows of `width` cells.
        notice: plain words when something was cut or could not be kept apart; "" otherwise.
        picture: what it was cut from.
    """

    rows: tuple[tuple[Cell | None, ...], ...]
    notice: str
    picture: Picture

    def plain_text(self) -> str:
        """Return the grid as text, colours left out."""
        return "\n".join("".join(c.char if c else " " for c in row).rstrip() for row in self.rows)


def build_picture(drawing: Drawing, scale: float, phase: Point = (0.0, 0.0), numbers: bool = False) -> Picture:
    """Raster a drawing at one scale.

    Args:
        scale: dots per bond length.
        phase: shift of the whole before snapping [dots]; another one may settle a clash.
        numbers: write atom numbers.
    """
    picture = Picture(scale=scale)
    points: list[Point] = []
    for atom in drawing.atoms:
        x, y = atom.x * scale + phase[0], atom.y * scale + phase[1]
        if atom.is_labelled or numbers or drawing.mark_of(atom.index):
            column, row = math.floor(x / 2), math.floor(y / 4)
            picture.spots[atom.index] = (column, row)
            x, y = column * 2 + 0.5, row * 4 + 1.5
        points.append((x, y))
    taken = _write_labels(drawing, picture, numbers)
    gap = GAP_DOTS if scale >= 7 else GAP_DOTS_SMALL
    _draw_bonds(drawing, picture, build_strokes(drawing, points, gap), taken)
    for label in picture.labels:
        for place, char, ink in label.cells:
            picture.cells[place] = Cell(char=char, ink=ink)
    return picture


def fit(drawing: Drawing, width: int, height: int, numbers: bool = False, cap: float = SCALE_MAX) -> Grid:
    """Raster a drawing into a panel, scaled, then cropped with a notice.

    Args:
        width, height: of the panel [cells], at least 1 each.
        cap: largest scale [dots per bond length], so that several drawings can share one.
    """
    fallback: Picture | None = None
    for scale in _scales(drawing, width, height, cap):
        for phase in _PHASES:
            picture = build_picture(drawing, scale, phase, numbers)
            columns, rows = picture.size
            if columns > width + 1 or rows > height + 1:
                break  # a shift by less than a cell cannot make it fit
            if columns > width or rows > height:
                continue
            if not picture.clashes:
                return _cut(drawing, picture, width, height)
            if fallback is None or len(picture.clashes) < len(fallback.clashes):
                fallback = picture
    legible = natural_picture(drawing, numbers, least=True)
    if fallback is not None and (legible.clashes or drawing.nearest < 0.3):
        return _cut(drawing, fallback, width, height)
    return _cut(drawing, legible, width, height)


def natural_picture(drawing: Drawing, numbers: bool = False, least: bool = False) -> Picture:
    """Return the drawing at a comfortable scale, or at the least legible one.

    The best that there is comes back where no scale keeps everything apart; its `clashes` say what remains.
    """
    scales = [SCALE_MIN + 0.5 * i for i in range(21)] if least else [10.0, 11.0, 12.0, 13.0, 14.0, 16.0]
    best: Picture | None = None
    for scale in scales:
        for phase in _PHASES:
            picture = build_picture(drawing, scale, phase, numbers)
            if best is None or len(picture.clashes) < len(best.clashes):
                best = picture
            if not picture.clashes:
                return picture
    assert best is not None  # the lists above are never empty
    return best


def _scales(drawing: Drawing, width: int, height: int, cap: float) -> Iterator[float]:
    """Yield scales worth trying, largest first: none that surely overflows, none below the least."""
    limit = cap
    if drawing.width > 0:
        limit = min(limit, (2 * width) / drawing.width)
    if drawing.height > 0:
        limit = min(limit, (4 * height) / drawing.height)
    scale = limit
    while scale >= SCALE_MIN:
        yield scale
        scale -= 0.5 if scale < 9 else 1.0


def _write_labels(drawing: Drawing, picture: Picture, numbers: bool) -> dict[Place, int]:
    """Place every label; return which atom holds each cell."""
    taken: dict[Place, int] = {}
    for index, (column, row) in picture.spots.items():
        atom = drawing.atoms[index]
        width = len(atom.element) if atom.is_labelled else 1
        for place in ((column + i, row) for i in range(width)):
            if place in taken and taken[place] != index:
                picture.clashes.append(f"{atom.element}{index} on atom {taken[place]}")
            taken[place] = index
    lines = {(b.begin, b.end) for b in drawing.bonds}
    neighbours: dict[int, list[int]] = {}
    for begin, end in lines:
        neighbours.setdefault(begin, []).append(end)
        neighbours.setdefault(end, []).append(begin)
    for index, spot in picture.spots.items():
        label = _place_label(drawing, index, spot, taken, numbers)
        if label is None:
            atom = drawing.atoms[index]
            label = _spell(drawing, index, spot, atom.label(atom.sides[0]), numbers)
            picture.clashes.append(f"label of {atom.element}{index}")
        for place, _, _ in label.cells:
            taken[place] = index
        picture.labels.append(label)
    return taken


def _place_label(
    drawing: Drawing, index: int, spot: Place, taken: dict[Place, int], numbers: bool
) -> PlacedLabel | None:
    """Return the label on the first side where it touches no other label, or None."""
    atom = drawing.atoms[index]
    sides = atom.sides if atom.hydrogens or not atom.is_labelled else atom.sides[:1]
    for glyph_after in (False, True):
        for side in sides:
            label = _spell(drawing, index, spot, atom.label(side), numbers, glyph_after)
            if all(_is_free(place, index, taken) for place, _, _ in label.cells):
                return label
    return None


def _is_free(place: Place, index: int, taken: dict[Place, int]) -> bool:
    """Tell whether a cell and its neighbours on the line are free, so that labels do not read as one word."""
    column, row = place
    return all(taken.get((column + step, row), index) == index for step in (-1, 0, 1))


def _spell(
    drawing: Drawing, index: int, spot: Place, text: LabelText, numbers: bool, glyph_after: bool = False
) -> PlacedLabel:
    """Turn a label, its mark and its number into cells."""
    atom, mark = drawing.atoms[index], drawing.mark_of(index)
    column, row = spot
    ink = str(mark) if mark else "label"
    glyph = MARK_GLYPHS[mark] if mark else ""
    number = str(index) if numbers else ""
    cells: list[tuple[Place, str, str]] = []
    if not atom.is_labelled:
        line, core_at = (glyph + number, 0) if glyph else (number, 0)
        inks = [ink] * len(glyph) + ["number"] * len(number)
    else:
        before = ("" if glyph_after else glyph) + text.before
        after = text.after + (":" + number if number else "") + (glyph if glyph_after else "")
        line, core_at = before + text.core + after, len(before)
        inks = [ink] * len(line)
        if number:
            start = len(before + text.core + text.after)
            inks[start : start + len(number) + 1] = ["number"] * (len(number) + 1)
    for offset, char in enumerate(line):
        cells.append(((column + offset - core_at, row), char, inks[offset]))
    for words, at in ((text.above, row - 1), (text.below, row + 1)):
        if atom.is_labelled:
            cells.extend(((column + i, at), char, ink) for i, char in enumerate(words))
    return PlacedLabel(atom=index, cells=tuple(cells))


def _draw_bonds(drawing: Drawing, picture: Picture, strokes: tuple[Stroke, ...], taken: dict[Place, int]) -> None:
    masks: dict[Place, int] = {}
    inks: dict[Place, str] = {}
    dots_of: list[set[Place]] = [set() for _ in drawing.bonds]
    crossed: set[tuple[int, int]] = set()
    for stroke in strokes:
        for x, y in stroke_dots(stroke):
            place = (x // 2, y // 4)
            holder = taken.get(place)
            if holder is not None:
                if holder not in (stroke.begin_atom, stroke.end_atom):
                    crossed.add((stroke.bond, holder))
                continue
            dots_of[stroke.bond].add((x, y))
            masks[place] = masks.get(place, 0) | _BITS[y % 4][x % 2]
            if stroke.mark is not None:
                inks[place] = str(stroke.mark)
    for place, mask in masks.items():
        picture.cells[place] = Cell(char=chr(0x2800 + mask), ink=inks.get(place, "bond"))
    picture.bond_dots = [len(dots) for dots in dots_of]
    for bond, count in enumerate(picture.bond_dots):
        if count < MIN_BOND_DOTS * len(drawing.bonds[bond].lanes):
            picture.clashes.append(f"bond {bond} hidden")
    picture.clashes.extend(f"bond {bond} behind atom {atom}" for bond, atom in sorted(crossed))


def _cut(drawing: Drawing, picture: Picture, width: int, height: int) -> Grid:
    """Centre the picture in the panel, or crop it round its marks."""
    left, top, right, bottom = picture.box
    columns, rows = right - left, bottom - top
    focus = [picture.spots[a] for m in drawing.marks[:1] for a in m.atoms if a in picture.spots]
    x0 = _start(left, columns, width, [c for c, _ in focus])
    y0 = _start(top, rows, height, [r for _, r in focus])
    lines = tuple(tuple(picture.cells.get((x0 + c, y0 + r)) for c in range(width)) for r in range(height))
    notices: list[str] = []
    if columns > width or rows > height:
        notices.append(f"cut to fit {columns}×{rows}")
    if picture.clashes:
        notices.append("some parts overlap")
    return Grid(rows=lines, notice="; ".join(notices), picture=picture)


def _start(first: int, extent: int, room: int, focus: list[int]) -> int:
    """Return the first column or row that shows: centred when all fits, else round the focus."""
    if extent <= room:
        return first - (room - extent) // 2
    middle = round(sum(focus) / len(focus)) if focus else first + extent // 2
    return max(first, min(middle - room // 2, first + extent - room))
