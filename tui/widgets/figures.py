"""A table of figures that fits its columns to the room, and a plot in the theme's own colours.

The table says which row is looked at and which is opened; what stands in the rows is the caller's. The plot is drawn
by a function of the caller's and drawn again when the theme changes; its figures stand in words in its tooltip, and
always in a table beside it.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

from rich.text import Text
from textual import on
from textual.color import Color
from textual.content import Content
from textual.events import Resize
from textual.message import Message
from textual.widgets import DataTable
from textual_plotext import PlotextPlot

Ink = tuple[int, int, int]


@dataclass(frozen=True, slots=True)
class Column:
    """One column.

    Attributes:
        width: least width [cells].
        grows: share of the room to spare.
        is_figure: set to the right.
        from_width: left out while the table is narrower [cells].
    """

    heading: str
    width: int
    grows: int = 0
    is_figure: bool = False
    from_width: int = 0


class FigureTable(DataTable[Text]):
    """Rows of words and figures."""

    class Looked(Message):
        """The cursor is on a row; None on an empty table."""

        def __init__(self, table: FigureTable, row: int | None) -> None:
            super().__init__()
            self.table = table
            self.row = row

    class Opened(Message):
        """The runs behind a row are asked for."""

        def __init__(self, table: FigureTable, row: int) -> None:
            super().__init__()
            self.table = table
            self.row = row

    def __init__(self, columns: Sequence[Column], **options: Any) -> None:
        super().__init__(cursor_type="row", zebra_stripes=False, show_row_labels=False, **options)
        self._columns = tuple(columns)
        self._rows_held: tuple[tuple[str, ...], ...] = ()
        self._fitted: tuple[tuple[int, int], ...] = ()

    def show_rows(self, rows: Sequence[tuple[str, ...]], at: int = 0) -> None:
        """Replace the rows; the cursor goes to one of them."""
        self._rows_held = tuple(rows)
        self._fill(at)

    def show_columns(self, columns: Sequence[Column], rows: Sequence[tuple[str, ...]]) -> None:
        """Replace columns and rows."""
        self._columns = tuple(columns)
        self._fitted = ()
        self.show_rows(rows)

    @property
    def row(self) -> int | None:
        """Return the row under the cursor."""
        return self.cursor_row if 0 <= self.cursor_row < len(self._rows_held) else None

    def on_resize(self, event: Resize) -> None:
        """Fit the columns anew."""
        if self._fit() != self._fitted:
            self._fill(self.cursor_row)

    def _fit(self) -> tuple[tuple[int, int], ...]:
        """Return (position, width) of the columns that have room."""
        room = self.size.width or 78
        shown = [(i, c) for i, c in enumerate(self._columns) if room >= c.from_width]
        spare = room - 2 - sum(c.width + 2 * self.cell_padding for _, c in shown)
        shares = sum(c.grows for _, c in shown) or 1
        return tuple((i, c.width + max(spare, 0) * c.grows // shares) for i, c in shown)

    def _fill(self, at: int) -> None:
        self._fitted = self._fit()
        self.clear(columns=True)
        for i, width in self._fitted:
            column = self._columns[i]
            heading = Text(column.heading, justify="right" if column.is_figure else "left")
            self.add_column(heading, width=width)
        for row in self._rows_held:
            self.add_row(*(self._cell(row[i], self._columns[i].is_figure) for i, _ in self._fitted))
        if self._rows_held:
            self.move_cursor(row=min(at, len(self._rows_held) - 1))
        else:
            self.post_message(self.Looked(self, None))

    @staticmethod
    def _cell(words: str, is_figure: bool) -> Text:
        return Text(words, no_wrap=True, overflow="ellipsis", justify="right" if is_figure else "left")

    @on(DataTable.RowHighlighted)
    def _looked(self, event: DataTable.RowHighlighted) -> None:
        event.stop()
        self.post_message(self.Looked(self, self.row))

    @on(DataTable.RowSelected)
    def _opened(self, event: DataTable.RowSelected) -> None:
        event.stop()
        if self.row is not None:
            self.post_message(self.Opened(self, self.row))


@dataclass(frozen=True, slots=True)
class Inks:
    """Colours of a plot: what matters most, what is beside it, what is marked, lines in the back."""

    strong: Ink
    soft: Ink
    marked: Ink
    quiet: Ink


Paint = Callable[[Any, Inks, int], None]
"""Draws with the plotting module, the inks and the width of the plot [cells]."""


class FigurePlot(PlotextPlot):
    """A plot that keeps to the theme."""

    def __init__(self, **options: Any) -> None:
        super().__init__(**options)
        self._paint: Paint | None = None

    def draw(self, paint: Paint | None, words: str = "") -> None:
        """Draw with a function; None clears."""
        self._paint = paint
        self.tooltip = Content(words) if words else None
        self.refresh()

    def render(self) -> Text:
        """Return the plot in the room there is and the colours of the theme."""
        width, height = self.size
        if self._paint is None or width < 12 or height < 4:
            return Text("")
        colours = self.app.theme_variables

        def ink(name: str) -> Ink:
            return Color.parse(colours[name]).rgb

        plt = self.plt
        plt.clear_figure()
        plt.plotsize(width, height)
        plt._set_size(width, height)  # without it a plot keeps its first size, as the base class remarks
        plt.canvas_color(ink("background"))
        plt.axes_color(ink("background"))
        plt.ticks_color(ink("quiet"))
        self._paint(plt, Inks(ink("severity-serious"), ink("primary"), ink("accent"), ink("quiet")), width)
        return Text.from_ansi(plt.build())
