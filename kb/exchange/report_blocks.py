"""A page to hand round, as values: sections of paragraphs, facts, tables, lists and figures.

It owns the shape of a page, so that HTML and Markdown say the same. It knows no chemistry and no markup. All text is
plain text: whoever renders it escapes it. The one exception is `Figure.svg`, which only the drawing code of this
project makes, from escaped text (`kb.chem.layout_svg`, `report_plots`).
"""

from __future__ import annotations

from dataclasses import dataclass

NO_PERMISSION = (
    "Figures and warnings describe a record; they are no permission. Hazards are for local rules and the people "
    "responsible for safety to judge."
)
"""Stands at the foot of every page."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Words:
    """A paragraph. `tone` is "", "quiet" or "quote" (what a person wrote, kept to the letter)."""

    text: str
    tone: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Facts:
    """Pairs of name and value."""

    pairs: tuple[tuple[str, str], ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Items:
    """A list of short texts."""

    texts: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Table:
    """A table.

    Attributes:
        caption: what it shows.
        header: of the columns.
        rows: cells as text, the first one heads its row.
        figures: columns (0-based) that hold figures and are set to the right.
    """

    caption: str
    header: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    figures: tuple[int, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Figure:
    """A drawing or a plot.

    Attributes:
        svg: element with its own title and description.
        alternative: the same in words, for readers of Markdown and of screens.
        caption: "" = none.
        is_paper: drawn in dark ink, needs a light ground in the dark theme too.
    """

    svg: str
    alternative: str
    caption: str = ""
    is_paper: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class Row:
    """Figures side by side, with signs between them ("+", "→")."""

    figures: tuple[Figure | str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Warn:
    """Something to worry about, with its severity ("serious", "caution", "note") as word, shape and colour."""

    severity: str
    title: str
    blocks: tuple[Block, ...] = ()


Block = Words | Facts | Items | Table | Figure | Row | Warn


@dataclass(frozen=True, slots=True, kw_only=True)
class Section:
    """A heading with what stands under it; `parts` are sections one level down."""

    heading: str
    blocks: tuple[Block, ...] = ()
    parts: tuple[Section, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Page:
    """A whole page.

    Attributes:
        title: h1.
        kind: what sort of page ("run", "assessment", "recurring failures" ...).
        lead: the answer first, in a sentence or two.
        source: book, count and day it was made from; for the foot.
    """

    title: str
    kind: str
    lead: str = ""
    sections: tuple[Section, ...] = ()
    source: str = ""
