"""Text for a terminal: wrapping, headings, severity in words as well as colour, figures.

Lines are at most 80 columns wide, less where the terminal is narrower, never less than 40. It owns looks shared by all
commands; what is said is decided where the values are made. All text that came from a person passes `plain`.
"""

from __future__ import annotations

import os
import shutil
import sys
import textwrap
from collections.abc import Iterable, Sequence

from kb.cli.session import use_colour
from kb.plain import counted as counted
from kb.plain import excerpt, plain, shortened
from kb.vocabulary import Fate, Severity

WIDEST, NARROWEST = 80, 40
LONGEST_TEXT = 20_000
"""Longest text of one field that is shown [characters]; --json shows the whole."""
_BOLD, _PLAIN = "\x1b[1m", "\x1b[0m"
_COLOUR = {Severity.SERIOUS: "\x1b[31m", Severity.CAUTION: "\x1b[33m", Severity.NOTE: "\x1b[36m"}
"""Red, yellow and cyan (ECMA-48, select graphic rendition)."""


def width() -> int:
    """Return how many columns lines may take: 80, or fewer where a terminal or COLUMNS says so."""
    if not (sys.stdout.isatty() or os.environ.get("COLUMNS")):
        return WIDEST
    return max(NARROWEST, min(WIDEST, shutil.get_terminal_size((WIDEST, 24)).columns))


def heading(text: str) -> str:
    """Return a section heading."""
    return f"{_BOLD}{text}{_PLAIN}" if use_colour() else text.upper()


def severity_word(severity: Severity) -> str:
    """Return the severity as a word of fixed width, coloured where colour may be used."""
    word = f"{str(severity).upper():<7}"
    return f"{_COLOUR[severity]}{_BOLD}{word}{_PLAIN}" if use_colour() else word


def wrapped(text: str, indent: int = 0, first: str | None = None) -> list[str]:
    """Wrap text to the width.

    Args:
        text: made safe here, and cut where it is longer than LONGEST_TEXT.
        indent: spaces before each line.
        first: put before the first line instead of the indent (its visible width counts as `indent`).
    """
    pad = " " * indent
    columns = max(width() - indent, 12)
    lines: list[str] = []
    for paragraph in plain(excerpt(text, LONGEST_TEXT), keep_lines=True).split("\n"):
        lines += textwrap.wrap(
            paragraph, columns, break_long_words=True, break_on_hyphens=False, replace_whitespace=True
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
    """Return aligned rows, each cell cut to its width; the last column gives or takes what the terminal has."""
    room = width() - sum(widths[:-1]) - 2 * (len(widths) - 1)
    columns = [*widths[:-1], max(room, 8)]
    lines = []
    for cells in (header, *rows):
        line = "  ".join(f"{shortened(plain(c), w):<{w}}" for c, w in zip(cells, columns, strict=True))
        lines.append(line.rstrip()[: width()])
    lines.insert(1, "  ".join("-" * w for w in columns)[: width()])
    return lines
