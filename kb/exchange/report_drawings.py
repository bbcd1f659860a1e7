"""Structures for pages: schemes with their centre marked, motifs of findings, a generalised place in an example.

It owns which atoms are marked and the words beside a drawing; the drawing itself is `kb.chem.layout`. A structure
that cannot be drawn is told in words with the reason, never left out.
"""

from __future__ import annotations

from collections.abc import Sequence

from kb.chem.facts import Reading
from kb.chem.layout import Mark, MarkKind, build_drawing, build_scheme
from kb.chem.layout_svg import legend, render_svg
from kb.chem.layout_values import MARK_GLYPHS, Drawing, Piece
from kb.errors import StructureError
from kb.exchange.report_blocks import Block, Figure, Row, Words
from kb.plain import plain


def scheme_blocks(scheme: str, reading: Reading | None = None) -> tuple[Block, ...]:
    """Draw a scheme, the reacting centre and its leaving group marked, with a legend."""
    marks: dict[int, list[Mark]] = {}
    for centre in reading.centres if reading is not None else ():
        of = marks.setdefault(centre.component, [])
        of.append(Mark(kind=MarkKind.CENTRE, atoms=(centre.atom,)))
        if centre.leaving_atom is not None:
            of.append(Mark(kind=MarkKind.LEAVING, atoms=(centre.leaving_atom,)))
    try:
        drawn = build_scheme(scheme, marks)
    except StructureError as error:
        return (Words(text=f"{plain(scheme)} cannot be drawn: {error}"),)
    row: list[Figure | str] = []
    for pieces, sign in ((drawn.left, "+"), (drawn.agents, "+"), (drawn.right, "+")):
        if pieces and row:
            row.append("with" if pieces is drawn.agents else "→")
        for place, piece in enumerate(pieces):
            row += [*([sign] if place else []), _piece(piece)]
    drawings = [p.drawing for p in (*drawn.left, *drawn.agents, *drawn.right) if p.drawing is not None]
    return (Row(figures=tuple(row)), *_legend(drawings))


def fragment(smiles: str, atoms: Sequence[int], title: str, kind: MarkKind = MarkKind.MOTIF) -> Figure | None:
    """Draw one structure with some atoms marked; None where it cannot be drawn."""
    try:
        drawing = build_drawing(smiles, [Mark(kind=kind, atoms=tuple(atoms))] if atoms else ())
    except StructureError:
        return None
    return Figure(
        svg=render_svg(drawing, title=title), alternative=drawing.text_alternative, caption=title, is_paper=True
    )


def _piece(piece: Piece) -> Figure | str:
    if piece.drawing is None:
        return f"{plain(piece.smiles)} ({piece.reason})" if piece.reason else plain(piece.smiles)
    return Figure(svg=render_svg(piece.drawing), alternative=piece.drawing.text_alternative, is_paper=True)


def _legend(drawings: Sequence[Drawing]) -> tuple[Block, ...]:
    shown = legend(drawings)
    if not shown:
        return ()
    return (Words(text=", ".join(f"{MARK_GLYPHS[kind]} {words}" for kind, words in shown), tone="quiet"),)
