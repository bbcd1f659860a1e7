"""A whole scheme to terminal cells: fragments side by side, plus signs, arrow and conditions. Pure.

What does not fit is given up in a stated order: first the scale, then the spectators (agents are named
above the arrow instead), then the products, last the small fragments; the notice says what is not drawn. A
fragment without a drawing appears as its SMILES.
"""

from __future__ import annotations

from dataclasses import dataclass

from kb.chem.layout import Piece, SchemeDrawing
from kb.plain import shortened
from tui.raster import SCALE_MAX, SCALE_MIN, Cell, Grid, build_picture, fit

ARROW_MIN = 9
ARROW_ROOM = 50
"""Narrower panels give the substrate the room of the arrow once the products had to go [cells]."""

_GAP = 2


@dataclass(frozen=True, slots=True, kw_only=True)
class Panel:
    """Cells of a scheme, row by row, and what had to be left out."""

    rows: tuple[tuple[Cell | None, ...], ...]
    notice: str = ""

    def plain_text(self) -> str:
        """Return the panel as text, colours left out."""
        return "\n".join("".join(c.char if c else " " for c in row).rstrip() for row in self.rows)


def fit_scheme(
    scheme: SchemeDrawing,
    width: int,
    height: int,
    above: str = "",
    below: str = "",
    numbers: bool = False,
) -> Panel:
    """Raster a scheme into a panel.

    Args:
        width, height: of the panel [cells].
        above, below: words over and under the arrow, safe to show.
        numbers: write atom numbers.
    """
    rows_free, columns = max(height, 1), max(width, 1)
    if len(scheme.left) == 1 and not scheme.has_arrow and not (above or below):
        return _single(scheme.left[0], columns, rows_free, numbers)
    main = _largest(scheme.left)
    plans = [
        (scheme.left, scheme.right, ""),
        ((main,), scheme.right, "other reactants not drawn"),
        ((main,), scheme.right[:1], "further products not drawn"),
    ]
    if columns >= ARROW_ROOM:
        plans.append(((main,), (), "products not drawn" if scheme.right else ""))
    for left, right, notice in plans:
        if not left:
            continue
        for scale in (SCALE_MAX, 11.0, 9.5, 8.0, 7.0, 6.0, SCALE_MIN):
            panel = _try(left, right, scheme.has_arrow, columns, rows_free, above, below, scale, numbers)
            if panel is not None:
                return Panel(rows=panel, notice=notice)
    single = _single(main, columns, rows_free, numbers)
    notices = [single.notice, "only the substrate is drawn" if scheme.has_arrow else ""]
    return Panel(rows=single.rows, notice="; ".join(n for n in notices if n))


def _single(piece: Piece, width: int, height: int, numbers: bool) -> Panel:
    if piece.drawing is None:
        return Panel(rows=_text_rows(piece.smiles, width, height), notice=f"not drawn: {piece.reason}")
    grid: Grid = fit(piece.drawing, width, height, numbers)
    return Panel(rows=grid.rows, notice=grid.notice)


def _largest(pieces: tuple[Piece, ...]) -> Piece:
    """Return the fragment that matters most: one with marks, else the one with most atoms."""

    def weight(piece: Piece) -> tuple[int, int]:
        if piece.drawing is None:
            return 0, 0
        return len(piece.drawing.marks), len(piece.drawing.atoms)

    return max(pieces, key=weight)


def _text_rows(text: str, width: int, height: int) -> tuple[tuple[Cell | None, ...], ...]:
    """Return text wrapped into the panel, as label cells."""
    lines = [text[i : i + width] for i in range(0, len(text), width)][:height] or [""]
    if len(text) > width * height:
        lines[-1] = lines[-1][: max(width - 1, 0)] + "…"
    rows = [tuple(Cell(char=c, ink="label") for c in line) + (None,) * (width - len(line)) for line in lines]
    rows += [(None,) * width] * (height - len(rows))
    return tuple(rows)


def _try(
    left: tuple[Piece, ...],
    right: tuple[Piece, ...],
    has_arrow: bool,
    width: int,
    height: int,
    above: str,
    below: str,
    scale: float,
    numbers: bool,
) -> tuple[tuple[Cell | None, ...], ...] | None:
    """Return the rows at one scale, None when they do not fit or clash."""
    blocks: list[tuple[dict[tuple[int, int], Cell], int, int]] = []
    for side, pieces in ((0, left), (1, right)):
        if side == 1 and (has_arrow or above or below):
            blocks.append(_arrow(above, below, width))
        for position, piece in enumerate(pieces):
            if position:
                blocks.append(({(0, 0): Cell(char="+", ink="label")}, 1, 1))
            block = _block(piece, scale, width, numbers)
            if block is None:
                return None
            blocks.append(block)
    total = sum(w for _, w, _ in blocks) + _GAP * (len(blocks) - 1)
    if total > width or max(h for _, _, h in blocks) > height:
        return None
    grid: list[list[Cell | None]] = [[None] * width for _ in range(height)]
    column = (width - total) // 2
    for cells, block_width, block_height in blocks:
        top = (height - block_height) // 2
        for (c, r), cell in cells.items():
            grid[top + r][column + c] = cell
        column += block_width + _GAP
    return tuple(tuple(row) for row in grid)


def _block(
    piece: Piece, scale: float, width: int, numbers: bool
) -> tuple[dict[tuple[int, int], Cell], int, int] | None:
    if piece.drawing is None:
        text = shortened(piece.smiles, max(8, width // 4))
        return {(i, 0): Cell(char=c, ink="label") for i, c in enumerate(text)}, len(text), 1
    for phase in ((0.0, 0.0), (0.0, 2.0), (1.0, 1.0), (1.0, 3.0)):
        picture = build_picture(piece.drawing, scale, phase, numbers)
        if not picture.clashes or (scale <= SCALE_MIN and phase[1] == 3.0):
            left, top, right, bottom = picture.box
            cells = {(c - left, r - top): cell for (c, r), cell in picture.cells.items()}
            return cells, right - left, bottom - top
    return None


def _arrow(above: str, below: str, width: int) -> tuple[dict[tuple[int, int], Cell], int, int]:
    """Return the arrow with its words, three rows high, as wide as the words up to a third of the panel."""
    limit = max(ARROW_MIN, width // 3)
    over, under = shortened(above, limit), shortened(below, limit)
    length = max(ARROW_MIN, len(over), len(under))
    cells: dict[tuple[int, int], Cell] = {}
    for row, text in ((0, over), (2, under)):
        start = (length - len(text)) // 2
        cells.update({(start + i, row): Cell(char=c, ink="arrow") for i, c in enumerate(text)})
    cells.update({(i, 1): Cell(char="─", ink="arrow") for i in range(length - 1)})
    cells[length - 1, 1] = Cell(char="▶", ink="arrow")
    return cells, length, 3
