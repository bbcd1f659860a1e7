"""Text for a terminal 80 columns wide: wrapping, headings, severity in words as well as colour, figures.

It owns looks shared by all commands; what is said is decided where the values are made. All text that came from a
person passes `plain`.
"""

from __future__ import annotations

import textwrap
from collections.abc import Iterable, Sequence

import typer

from kb.cli.session import use_colour
from kb.plain import plain, shortened
from kb.vocabulary import Fate, Severity

WIDTH = 80
_COLOUR = {Severity.SERIOUS: "red", Severity.CAUTION: "yellow", Severity.NOTE: "cyan"}


def heading(text: str) -> str:
    """Return a section heading."""
    return typer.style(text, bold=True) if use_colour() else text.upper()


def severity_word(severity: Severity) -> str:
    """Return the severity as a word of fixed width, coloured where colour may be used."""
    word = f"{str(severity).upper():<7}"
    return typer.style(word, fg=_COLOUR[severity], bold=True) if use_colour() else word


def wrapped(text: str, indent: int = 0, first: str | None = None) -> list[str]:
    """Wrap text to the width.

    Args:
        text: made safe here.
        indent: spaces before each line.
        first: put before the first line instead of the indent (its visible width counts as `indent`).
    """
    pad = " " * indent
    lines: list[str] = []
    for paragraph in plain(text, keep_lines=True).split("\n"):
        lines += textwrap.wrap(
            paragraph, WIDTH - indent, break_long_words=True, break_on_hyphens=False, replace_whitespace=True
        ) or [""]
    out = [pad + line for line in lines]
    if first is not None and lines:
        out[0] = first + lines[0]
    return out


def percent(share: float) -> str:
    """Return a share 0..1 as whole percent, "<1 %" for a trace."""
    return "<1\N{NO-BREAK SPACE}%" if 0 < share < 0.005 else f"{100 * share:.0f}\N{NO-BREAK SPACE}%"


def bar(share: float, width: int = 20) -> str:
    """Return a share as a row of eighth-blocks."""
    eighths = round(share * width * 8)
    return "█" * (eighths // 8) + ("", "▏", "▎", "▍", "▌", "▋", "▊", "▉")[eighths % 8]


def split_words(split: Iterable[tuple[Fate, float]], limit: int = 3) -> str:
    """Return a split in short words, largest first."""
    return ", ".join(f"{fate} {100 * share:.0f}" for fate, share in list(split)[:limit])


def table(rows: Sequence[Sequence[str]], header: Sequence[str], widths: Sequence[int]) -> list[str]:
    """Return aligned rows, each cell cut to its width."""
    lines = []
    for cells in (header, *rows):
        line = "  ".join(f"{shortened(plain(c), w):<{w}}" for c, w in zip(cells, widths, strict=True))
        lines.append(line.rstrip())
    lines.insert(1, "  ".join("-" * w for w in widths))
    return lines
