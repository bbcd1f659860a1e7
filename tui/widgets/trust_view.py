"""Trust: how well the estimates hold on this book, in words, as a plot and as tables."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from textual.app import ComposeResult
from textual.containers import Horizontal, VerticalScroll
from textual.widgets import Static

from tui.failure_words import Behind, reliability_lines, support_lines, trust_behind
from tui.widgets.audit_view import AuditView
from tui.widgets.figures import Column, FigurePlot, FigureTable, Inks
from tui.widgets.panel import Panel

if TYPE_CHECKING:
    from kb.audit.calibration import Calibration, MainShare

EXPECTED = (
    Column("Expected", 11, grows=1),
    Column("Runs", 4, is_figure=True),
    Column("Mean", 5, is_figure=True),
    Column("Found", 5, is_figure=True),
    Column("Inside", 6, is_figure=True),
)
SUPPORT = (
    Column("Close runs", 21, grows=1),
    Column("Runs", 4, is_figure=True),
    Column("Error", 6, is_figure=True),
)
ENOUGH = 5
"""Runs from which a mean says something."""


class TrustView(AuditView):
    """Calibration."""

    KIND = "calibration"
    TITLE = "Trust"
    IS_LONG = True
    WAITS = (
        "How far can the estimates be trusted? Each run, or a sample of a large book, is left out and expected from "
        "the others. This takes a while; you can work on meanwhile, and stop it. F9 starts."
    )

    audit: Calibration | None

    def __init__(self) -> None:
        super().__init__()
        self._by_support = False

    def compose_figures(self) -> ComposeResult:
        """Lay out the table and the plot."""
        with Horizontal():
            with Panel("By expected main share", id="trust-counts"):
                yield FigureTable(EXPECTED, id="trust-table")
                with VerticalScroll(id="trust-said"):
                    yield Static("", id="trust-words", markup=False)
            with Panel("Found ↑ against expected →, %", id="trust-drawn"):
                yield FigurePlot(id="trust-plot")
                yield Static("· a run  • of this row  ● mean", classes="quiet", id="trust-legend", markup=False)

    def show_figures(self) -> None:
        """Show the words, one table and the plot."""
        found = self.audit
        assert found is not None
        self.say(found.words[0])
        self.query_one("#trust-words", Static).update("\n".join(found.words[1:]))
        rows = [cells for cells, _ in self._lines]
        title = "Error, points  (s: expected share)" if self._by_support else "Main share  (s: close runs)"
        self.query_one("#trust-counts", Panel).say(title)
        self.query_one(FigureTable).show_columns(SUPPORT if self._by_support else EXPECTED, rows)
        self.query_one(FigurePlot).draw(self._paint, "\n".join(" ".join(row) for row in rows))

    @property
    def _lines(self) -> list[tuple[tuple[str, ...], tuple[MainShare, ...]]]:
        if self.audit is None:
            return []
        return support_lines(self.audit) if self._by_support else reliability_lines(self.audit)

    def turn(self) -> None:
        """Show the other table."""
        if self.audit is not None:
            self._by_support = not self._by_support
            self.show_figures()

    def look(self, table: FigureTable) -> None:
        """Mark the runs of the row under the cursor."""
        self.query_one(FigurePlot).refresh()

    def _paint(self, plt: Any, inks: Inks, width: int) -> None:
        found = self.audit
        if found is None:
            return
        plt.plot([0, 100], [0, 100], marker="braille", color=inks.quiet)
        for shares, marker, ink in ((found.main_shares, "·", inks.soft), (self._looked_at, "•", inks.marked)):
            if shares:
                plt.scatter(
                    [100 * m.expected for m in shares],
                    [100 * m.found for m in shares],
                    marker=marker,
                    color=ink,
                )
        means = [r for r in found.reliability if r.runs >= ENOUGH]
        if means:
            plt.scatter(
                [100 * r.expected for r in means],
                [100 * r.measured for r in means],
                marker="●",
                color=inks.strong,
            )
        plt.xlim(0, 100)
        plt.ylim(0, 100)
        plt.xticks([0, 25, 50, 75, 100])
        plt.yticks([0, 25, 50, 75, 100])

    @property
    def _looked_at(self) -> tuple[MainShare, ...]:
        row, lines = self.query_one(FigureTable).row, self._lines
        return lines[row][1] if row is not None and row < len(lines) else ()

    @property
    def behind(self) -> Behind | None:
        """Return the runs of the row under the cursor."""
        row, lines = self.query_one(FigureTable).row, self._lines
        if row is None or row >= len(lines):
            return None
        word = "Close runs" if self._by_support else "Expected main share"
        return trust_behind(f"{word}: {lines[row][0][0]}", lines[row][1])
