"""A `Drawing` as self-contained SVG: no scripts, no outside fonts, a title and a description in words.

It owns sizes and colours of the page, not geometry of the structure. Marks are drawn by shape *and* colour,
the same shapes as in the terminal. All text is escaped; what a user typed can only ever be text. Units: user
units of the SVG, BOND of them to a bond length.
"""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from html import escape

from kb.chem.layout_values import (
    MARK_WORDS,
    AtomSpot,
    BondStyle,
    Drawing,
    MarkKind,
    Point,
    Stroke,
    build_strokes,
)

BOND = 30.0
GAP = 5.0
_FONT = 13.0
_MARGIN = 24.0
_CHAR = 0.62 * _FONT

MARK_COLOURS: dict[MarkKind, str] = {
    MarkKind.CENTRE: "#8a2f7f",
    MarkKind.LEAVING: "#1f6f8b",
    MarkKind.MOTIF: "#a8480c",
    MarkKind.MATCH: "#3c6e3a",
}
"""Dark enough on white for text (contrast above 4.5 by the WCAG 2 formula; checked in tests)."""

_SMALL = {
    **dict(zip("₀₁₂₃₄₅₆₇₈₉", "0123456789", strict=True)),
    **dict(zip("⁰¹²³⁴⁵⁶⁷⁸⁹⁺⁻", "0123456789+−", strict=True)),
}


def render_svg(drawing: Drawing, title: str = "", numbers: bool = False) -> str:
    """Render one structure and return an SVG element.

    Args:
        title: what the picture shows; the text alternative follows it as the description.
        numbers: write atom numbers.
    """
    width = drawing.width * BOND + 2 * _MARGIN
    height = drawing.height * BOND + 2 * _MARGIN
    points = [(a.x * BOND + _MARGIN, a.y * BOND + _MARGIN) for a in drawing.atoms]
    parts = [
        f'<svg xmlns="http://www.w3.org/2000/svg" role="img" width="{width:.0f}" height="{height:.0f}" '
        f'viewBox="0 0 {width:.1f} {height:.1f}" font-family="Helvetica, Arial, sans-serif" '
        f'font-size="{_FONT:g}" stroke-linecap="round">',
        f"<title>{escape(title or drawing.formula or drawing.smiles)}</title>",
        f"<desc>{escape(drawing.text_alternative)}</desc>",
    ]
    for atom in drawing.atoms:
        kind = drawing.mark_of(atom.index)
        if kind is not None:
            parts.append(_mark(kind, points[atom.index]))
    for stroke in build_strokes(drawing, points, GAP):
        parts.append(_stroke(stroke, drawing))
    for atom in drawing.atoms:
        if atom.is_labelled:
            parts.append(_label(atom, points[atom.index]))
        if numbers:
            x, y = points[atom.index]
            parts.append(
                f'<text x="{x + 7:.1f}" y="{y - 7:.1f}" font-size="8" fill="#666">{atom.index}</text>'
            )
    parts.append("</svg>")
    return "".join(parts)


def _mark(kind: MarkKind, point: Point) -> str:
    """Return the shape behind an atom: lozenge, ring, triangle or disc, after `MARK_GLYPHS`."""
    x, y = point
    colour = MARK_COLOURS[kind]
    attributes = f'class="mark-{kind}" stroke="{colour}" stroke-width="1.5"'
    name = f"<title>{MARK_WORDS[kind]}</title>"
    if kind is MarkKind.LEAVING:
        return f'<circle cx="{x:.1f}" cy="{y:.1f}" r="11" fill="none" {attributes}>{name}</circle>'
    if kind is MarkKind.MATCH:
        filled = f'r="6" fill="{colour}" fill-opacity="0.35" {attributes}'
        return f'<circle cx="{x:.1f}" cy="{y:.1f}" {filled}>{name}</circle>'
    corners = (
        [(0, -12), (12, 0), (0, 12), (-12, 0)] if kind is MarkKind.CENTRE else [(0, -13), (12, 8), (-12, 8)]
    )
    text = " ".join(f"{x + dx:.1f},{y + dy:.1f}" for dx, dy in corners)
    return f'<polygon points="{text}" fill="{colour}" fill-opacity="0.2" {attributes}>{name}</polygon>'


def _stroke(stroke: Stroke, drawing: Drawing) -> str:
    start = _clear(stroke.start, stroke.end, drawing.atoms[stroke.begin_atom])
    end = _clear(stroke.end, stroke.start, drawing.atoms[stroke.end_atom])
    colour = MARK_COLOURS[stroke.mark] if stroke.mark else "#1b1b1b"
    (x1, y1), (x2, y2) = start, end
    length = math.hypot(x2 - x1, y2 - y1) or 1.0
    nx, ny = -(y2 - y1) / length, (x2 - x1) / length
    common = f'class="bond" data-bond="{stroke.bond}"'
    if stroke.style is BondStyle.WEDGE:
        corners = ((x1, y1), (x2 + 3.6 * nx, y2 + 3.6 * ny), (x2 - 3.6 * nx, y2 - 3.6 * ny))
        text = " ".join(f"{x:.1f},{y:.1f}" for x, y in corners)
        return f'<polygon points="{text}" fill="{colour}" {common}/>'
    path = f"M{x1:.1f} {y1:.1f}L{x2:.1f} {y2:.1f}"
    if stroke.style is BondStyle.HASH:
        rungs = max(3, int(length / 4))
        path = "".join(
            _rung(x1 + (x2 - x1) * s, y1 + (y2 - y1) * s, nx, ny, 0.6 + 3.2 * s)
            for s in ((i + 1) / rungs for i in range(rungs))
        )
    elif stroke.style is BondStyle.WAVY:
        path = _wave((x1, y1), (x2, y2), (nx, ny), length)
    is_broken = stroke.is_breaking or stroke.style is BondStyle.DASHED
    dashes = ' stroke-dasharray="4 3"' if is_broken and stroke.style is not BondStyle.HASH else ""
    return f'<path d="{path}" fill="none" stroke="{colour}" stroke-width="1.4"{dashes} {common}/>'


def _rung(x: float, y: float, nx: float, ny: float, half: float) -> str:
    return f"M{x - nx * half:.1f} {y - ny * half:.1f}L{x + nx * half:.1f} {y + ny * half:.1f}"


def _wave(start: Point, end: Point, normal: Point, length: float) -> str:
    humps = max(3, int(length / 5))
    path = f"M{start[0]:.1f} {start[1]:.1f}"
    for hump in range(humps):
        middle, stop = (hump + 0.5) / humps, (hump + 1) / humps
        sway = 4.0 if hump % 2 else -4.0
        mx = start[0] + (end[0] - start[0]) * middle + normal[0] * sway
        my = start[1] + (end[1] - start[1]) * middle + normal[1] * sway
        sx, sy = start[0] + (end[0] - start[0]) * stop, start[1] + (end[1] - start[1]) * stop
        path += f"Q{mx:.1f} {my:.1f} {sx:.1f} {sy:.1f}"
    return path


def _clear(here: Point, other: Point, atom: AtomSpot) -> Point:
    """Return where a line starts so that it stays clear of the atom's label."""
    if not atom.is_labelled:
        return here
    dx, dy = other[0] - here[0], other[1] - here[1]
    label = atom.label(atom.sides[0])
    reach_x = (
        _CHAR * (0.5 * len(label.core) + (len(label.after) if dx > 0 else len(label.before)) * 0.8) + 2.5
    )
    reach_y = 0.5 * _FONT + 2.5 + (_FONT if (label.above and dy < 0) or (label.below and dy > 0) else 0.0)
    share = min(reach_x / abs(dx) if dx else math.inf, reach_y / abs(dy) if dy else math.inf, 0.45)
    return here[0] + dx * share, here[1] + dy * share


def _label(atom: AtomSpot, point: Point) -> str:
    """Return the text of one atom: the element centred on the atom, the rest beside it."""
    x, y = point
    text = atom.label(atom.sides[0])
    base = y + 0.36 * _FONT
    half = _CHAR * len(text.core) / 2
    parts = [f'<text x="{x:.1f}" y="{base:.1f}" text-anchor="middle">{escape(text.core)}</text>']
    if text.after:
        parts.append(f'<text x="{x + half:.1f}" y="{base:.1f}">{_tspans(text.after)}</text>')
    if text.before:
        parts.append(
            f'<text x="{x - half:.1f}" y="{base:.1f}" text-anchor="end">{_tspans(text.before)}</text>'
        )
    for words, shift in ((text.above, -1.15 * _FONT), (text.below, _FONT)):
        if words:
            parts.append(f'<text x="{x - half:.1f}" y="{base + shift:.1f}">{_tspans(words)}</text>')
    return f'<g class="label" data-atom="{atom.index}">{"".join(parts)}</g>'


def _tspans(text: str) -> str:
    """Turn raised and lowered digits into small shifted text that every font has."""
    out = []
    shift = 0.0
    for run in re.findall(r"[₀-₉]+|[⁰¹²³⁴-⁹⁺⁻]+|[^₀-₉⁰¹²³⁴-⁹⁺⁻]+", text):
        want = 3.0 if "₀" <= run[0] <= "₉" else -5.0 if run[0] in _SMALL else 0.0
        size = ' font-size="9"' if want else ""
        plain = "".join(_SMALL.get(char, char) for char in run)
        out.append(f'<tspan dy="{want - shift:g}"{size}>{escape(plain)}</tspan>')
        shift = want
    return "".join(out)


def legend(drawings: Sequence[Drawing]) -> tuple[tuple[MarkKind, str], ...]:
    """Return the marks used in some drawings with their words, in order of precedence."""
    shown = {kind for drawing in drawings for kind in drawing.mark_kinds}
    return tuple((kind, MARK_WORDS[kind]) for kind in MarkKind if kind in shown)


__all__ = ["BOND", "MARK_COLOURS", "legend", "render_svg"]
