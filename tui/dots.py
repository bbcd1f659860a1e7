"""One stroke of a drawing to braille dots: plain, broken, dashed, wavy, wedge and hash."""

from __future__ import annotations

import math
from collections.abc import Iterator

from kb.chem.layout import BondStyle, Point, Stroke

Place = tuple[int, int]


def stroke_dots(stroke: Stroke) -> Iterator[Place]:
    """Yield the dots (column, row) of one stroke given in dot units; a dot may come twice."""
    (x1, y1), (x2, y2) = stroke.start, stroke.end
    length = math.hypot(x2 - x1, y2 - y1) or 1.0
    ux, uy = (x2 - x1) / length, (y2 - y1) / length
    if stroke.style in (BondStyle.WEDGE, BondStyle.HASH):
        yield from _wedge_dots(stroke, (ux, uy), length)
        return
    steps = max(1, math.ceil(max(abs(x2 - x1), abs(y2 - y1))))
    for step in range(steps + 1):
        share = step / steps
        along = share * length
        if stroke.is_breaking and 0.38 < share < 0.62:
            continue
        if stroke.style is BondStyle.DASHED and int(along / 2) % 2:
            continue
        sway = 1.4 * math.sin(along * 1.6) if stroke.style is BondStyle.WAVY else 0.0
        yield round(x1 + ux * along - uy * sway), round(y1 + uy * along + ux * sway)


def _wedge_dots(stroke: Stroke, unit: Point, length: float) -> Iterator[Place]:
    """Yield a filled wedge, or rungs of growing width for a hash; with a gap where the bond breaks."""
    (x1, y1), (ux, uy) = stroke.start, unit
    half_width = min(2.2, 0.22 * length)
    is_hash = stroke.style is BondStyle.HASH
    along = 0.0
    while along <= length:
        share = along / length
        if not (stroke.is_breaking and 0.42 < share < 0.58):
            half = share * half_width + (0.6 if is_hash else 0.0)
            across = -half
            while across <= half + 1e-9:
                yield round(x1 + ux * along - uy * across), round(y1 + uy * along + ux * across)
                across += 0.5
        along += 3.0 if is_hash else 0.5
