"""When and where: failures by quarter, by mode, by what reacted and in what, as a table and as a plot."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from textual.app import ComposeResult
from textual.containers import Horizontal

from tui.failure_words import Behind, say_tally, tally_behind, tally_cells, tally_word
from tui.widgets.audit_view import AuditView
from tui.widgets.figures import Column, FigurePlot, FigureTable, Inks
from tui.widgets.panel import Panel

if TYPE_CHECKING:
    from kb.audit.tally import Tallied, Tally

COLUMNS = (
    Column("", 13, grows=1),
    Column("Failed", 6, is_figure=True),
    Column("Runs", 4, is_figure=True),
    Column("Share", 5, is_figure=True),
)
MOST_BARS = 12
"""Bars in a plot of classes; the table lists all."""


class TallyView(AuditView):
    """Counts."""

    KIND = "tally"
    TITLE = "When and where"
    WAITS = "Failures are counted here by quarter, by what went wrong, by carbon class and by conditions."

    audit: Tally | None

    def __init__(self) -> None:
        super().__init__()
        self._way = 0

    def compose_figures(self) -> ComposeResult:
        """Lay out the table and the plot."""
        with Horizontal():
            with Panel("By quarter", id="tally-counts"):
                yield FigureTable(COLUMNS, id="tally-table")
            with Panel("Failures █ among all runs ░", id="tally-drawn"):
                yield FigurePlot(id="tally-plot")

    @property
    def _shown(self) -> tuple[str, tuple[Tallied, ...]]:
        return self.audit.ways[self._way] if self.audit else ("", ())

    def show_figures(self) -> None:
        """Show one way of counting."""
        assert self.audit is not None
        way, words = self._shown
        table = self.query_one(FigureTable)
        rows = [tally_cells(t) for t in words]
        table.show_rows(rows)
        self.query_one("#tally-counts", Panel).say(f"By {way}  (s: {self._others(way)})")
        self.query_one(FigurePlot).draw(self._paint, "\n".join(" ".join(row) for row in rows))
        self.say(say_tally(self.audit))

    def _others(self, way: str) -> str:
        """Return the way that comes next."""
        names = [name for name, _ in self.audit.ways] if self.audit else [way]
        return names[(names.index(way) + 1) % len(names)]

    def turn(self) -> None:
        """Count another way."""
        if self.audit is not None:
            self._way = (self._way + 1) % len(self.audit.ways)
            self.show_figures()

    def _paint(self, plt: Any, inks: Inks, width: int) -> None:
        _, words = self._shown
        if not words:
            return
        if self._way == 0:
            self._paint_over_time(plt, inks, width, words)
        else:
            self._paint_classes(plt, inks, words)

    def _paint_over_time(self, plt: Any, inks: Inks, width: int, words: tuple[Tallied, ...]) -> None:
        """Draw columns: all runs of a quarter behind its failures."""
        places = list(range(1, len(words) + 1))
        plt.bar(places, [t.runs for t in words], marker="░", color=inks.soft, width=0.7)
        plt.bar(places, [len(t.failed) for t in words], marker="█", color=inks.strong, width=0.7)
        every = max(1, -(-len(words) * 8 // max(width - 6, 8)))
        plt.xticks(places[::every], [t.word for t in words][::every])
        most = max(t.runs for t in words)
        plt.ylim(0, most * 1.05)
        plt.yticks(whole_ticks(most))

    def _paint_classes(self, plt: Any, inks: Inks, words: tuple[Tallied, ...]) -> None:
        """Draw rows, most failures on top."""
        shown = words[:MOST_BARS][::-1]
        places = list(range(1, len(shown) + 1))
        plt.bar(places, [t.runs for t in shown], marker="░", color=inks.soft, width=0.6, orientation="h")
        plt.bar(
            places, [len(t.failed) for t in shown], marker="█", color=inks.strong, width=0.6, orientation="h"
        )
        plt.yticks(places, [tally_word(t) for t in shown])
        most = max(t.runs for t in shown)
        plt.xlim(0, most * 1.05)
        plt.xticks(whole_ticks(most))

    @property
    def behind(self) -> Behind | None:
        """Return the runs of the count under the cursor."""
        way, words = self._shown
        row = self.query_one(FigureTable).row
        return tally_behind(way, words[row]) if row is not None and row < len(words) else None


def whole_ticks(most: int) -> list[int]:
    """Return some four whole numbers from 0 to about `most`.

    >>> whole_ticks(84), whole_ticks(3)
    ([0, 20, 40, 60, 80], [0, 1, 2, 3])
    """
    step = next(s for power in range(10) for s in (10**power, 2 * 10**power, 5 * 10**power) if most / s <= 5)
    return list(range(0, most + 1, step))
