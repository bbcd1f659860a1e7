"""Plots as SVG: bars with intervals, columns over time, a curve, a stair; no script, no font, no outside file.

It owns geometry and the words for those who cannot see it. Colours are classes of the page's style sheet, with a
fallback in the attribute; two series differ in pattern as well as in colour. All text is escaped. Shares are 0..1,
shown in percent.
"""

from __future__ import annotations

from collections.abc import Sequence
from html import escape

from kb.exchange.report_blocks import Figure
from kb.plain import plain, shortened
from kb.record.finding import Interval

_WIDE = 560
_LABEL = 175
_ROW = 26
_LETTERS = 26
_TALL = 190


def interval_bars(title: str, rows: Sequence[tuple[str, Interval]], scale: float = 100.0) -> Figure:
    """Draw one bar a row from 0 to 100 %, with its interval as a whisker.

    Args:
        rows: label and interval; means are 0..1 with scale 100, percent with scale 1.
    """
    span = _WIDE - _LABEL - 130
    height = _ROW * len(rows) + 30
    parts = [_axis_x(_LABEL, span, height - 22)]
    said = []
    for number, (label, interval) in enumerate(rows):
        y = 6 + number * _ROW
        mean, low, high = (min(max(v * scale / 100, 0.0), 1.0) for v in (interval.mean, interval.low, interval.high))
        x, a, b = (_LABEL + span * v for v in (mean, low, high))
        middle = y + 9
        words = f"{100 * mean:.0f} %" + (f" ({100 * low:.0f} to {100 * high:.0f})" if high > low else "")
        parts += [
            _text(_LABEL - 8, middle + 4, shortened(label, _LETTERS), "end"),
            f'<rect class="fill" x="{_LABEL}" y="{y + 3}" width="{max(x - _LABEL, 1):.1f}" height="12"/>',
            f'<path class="ink" d="M{a:.1f} {middle}H{b:.1f}M{a:.1f} {middle - 4}v8M{b:.1f} {middle - 4}v8"/>',
            _text(_LABEL + span + 8, middle + 4, words, "start"),
        ]
        said.append(f"{label} {words}")
    return _figure(title, "; ".join(said), _WIDE, height, parts)


def stacked_columns(
    title: str, labels: Sequence[str], lower: Sequence[int], upper: Sequence[int], names: tuple[str, str]
) -> Figure:
    """Draw a column for each label, `lower` filled and `upper` hatched on top of it."""
    most = max((a + b for a, b in zip(lower, upper, strict=True)), default=0) or 1
    left, base = 40, _TALL - 40
    step = (_WIDE - left - 10) / max(len(labels), 1)
    width = min(step * 0.62, 40)
    parts = [f'<path class="ink" d="M{left} 12V{base}H{_WIDE - 10}"/>']
    parts += [_text(left - 6, base - (base - 16) * v / most + 4, str(v), "end") for v in sorted({0, most})]
    said = []
    every = max(1, -(-len(labels) // 9))
    for number, (label, a, b) in enumerate(zip(labels, lower, upper, strict=True)):
        x = left + step * (number + 0.5) - width / 2
        tall_a, tall_b = ((base - 16) * v / most for v in (a, b))
        parts.append(
            f'<rect class="fill" x="{x:.1f}" y="{base - tall_a:.1f}" width="{width:.1f}" height="{tall_a:.1f}"/>'
        )
        parts.append(
            f'<rect class="open" x="{x:.1f}" y="{base - tall_a - tall_b:.1f}" '
            f'width="{width:.1f}" height="{tall_b:.1f}"/>'
        )
        if number % every == 0:
            parts.append(_text(x + width / 2, base + 15, label, "middle"))
        said.append(f"{label}: {a} {names[0]}" + (f", {b} {names[1]}" if names[1] else ""))
    if names[1]:
        parts += [
            f'<rect class="fill" x="{left}" y="{_TALL - 14}" width="10" height="10"/>',
            _text(left + 15, _TALL - 5, names[0], "start"),
            f'<rect class="open" x="{left + 180}" y="{_TALL - 14}" width="10" height="10"/>',
            _text(left + 195, _TALL - 5, names[1], "start"),
        ]
    return _figure(title, "; ".join(said), _WIDE, _TALL, parts)


def curve(
    title: str,
    points: Sequence[tuple[float, float]],
    x_name: str,
    y_name: str,
    marked: tuple[float, float] | None = None,
    diagonal: bool = False,
) -> Figure:
    """Draw y over x, both 0..1 and shown in percent; `marked` is one point to be ringed, `diagonal` draws y = x."""
    left, right, top, base = 52, _WIDE - 30, 12, 230
    width, height = right - left, base - top

    def place(point: tuple[float, float]) -> str:
        return f"{left + width * point[0]:.1f} {base - height * point[1]:.1f}"

    parts = [f'<path class="ink" d="M{left} {top}V{base}H{right}"/>']
    for share in (0, 0.5, 1):
        parts.append(_text(left + width * share, base + 16, f"{100 * share:.0f} %", "middle"))
        parts.append(_text(left - 6, base - height * share + 4, f"{100 * share:.0f} %", "end"))
    parts.append(_text(left + width / 2, base + 32, x_name, "middle"))
    parts.append(_text(left + 8, top + 10, y_name, "start"))
    if diagonal:
        parts.append(f'<path class="faint" d="M{place((0, 0))}L{place((1, 1))}"/>')
    ordered = sorted(points)
    if ordered:
        parts.append(f'<path class="line" d="M{"L".join(place(p) for p in ordered)}"/>')
    if marked is not None:
        x, y = place(marked).split()
        parts.append(f'<circle class="ring" cx="{x}" cy="{y}" r="6"/>')
    said = "; ".join(
        f"{x_name} {100 * x:.0f} %: {y_name} {100 * y:.0f} %" for x, y in ordered[:: max(1, len(ordered) // 8)]
    )
    return _figure(title, said, _WIDE, base + 42, parts)


def stair(title: str, steps: Sequence[tuple[str, float]]) -> Figure:
    """Draw what is left after each step, from 100 % down (shares 0..1)."""
    left, base = 52, 170
    width = (_WIDE - left - 16) / max(len(steps), 1)
    parts = [f'<path class="ink" d="M{left} 12V{base}H{_WIDE - 16}"/>']
    parts += [_text(left - 6, base - 150 * v + 4, f"{100 * v:.0f} %", "end") for v in (0, 0.5, 1)]
    path = [f"M{left} {base - 150:.1f}"]
    for number, (label, share) in enumerate(steps):
        x, y = left + width * number, base - 150 * share
        path.append(f"V{y:.1f}H{x + width:.1f}")
        parts.append(_text(x + width / 2, base + 15, f"{number + 1}", "middle"))
        parts.append(_text(x + width / 2, max(y - 6, 12), _percent(share), "middle"))
        parts[-1] = parts[-1].replace("</text>", f"<title>{escape(plain(label))}</title></text>")
    parts.append(f'<path class="line" d="{"".join(path)}"/>')
    parts.append(_text(left + (_WIDE - left) / 2, base + 32, "step", "middle"))
    said = "; ".join(f"after {label} {_percent(share)}" for label, share in steps)
    return _figure(title, said, _WIDE, base + 40, parts)


def _percent(share: float) -> str:
    return f"{100 * share:.0f} %" if share >= 0.1 else f"{100 * share:.2g} %"


def _axis_x(left: float, span: float, base: float) -> str:
    return "".join(
        f'<path class="faint" d="M{left + span * s:.1f} 2V{base}"/>'
        + _text(left + span * s, base + 16, f"{100 * s:.0f}" + (" %" if s == 1 else ""), "middle")
        for s in (0, 0.25, 0.5, 0.75, 1)
    )


def _text(x: float, y: float, words: str, anchor: str) -> str:
    return f'<text x="{x:.1f}" y="{y:.1f}" text-anchor="{anchor}">{escape(plain(words))}</text>'


def _figure(title: str, said: str, width: float, height: float, parts: Sequence[str]) -> Figure:
    svg = (
        f'<svg xmlns="http://www.w3.org/2000/svg" class="plot" role="img" width="{width:.0f}" height="{height:.0f}" '
        f'viewBox="0 0 {width:.0f} {height:.0f}" font-size="12"><title>{escape(plain(title))}</title>'
        f"<desc>{escape(plain(said))}</desc>{''.join(parts)}</svg>"
    )
    return Figure(svg=svg, alternative=f"{title}. {said}.", caption=title)
