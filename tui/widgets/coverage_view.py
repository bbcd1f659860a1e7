"""Coverage: what the record holds by class, where it is thin or contradicts itself, and what would teach most."""

from __future__ import annotations

from typing import TYPE_CHECKING

from rich.text import Text
from textual import on
from textual.app import ComposeResult
from textual.widgets import OptionList
from textual.widgets.option_list import Option

from kb.audit.sayings import say_coverage, say_experiment
from tui.failure_words import CELL_FILTERS, Behind, RunGroup, behind, cell_behind, cell_cells, chosen_cells
from tui.present import safe
from tui.widgets.audit_view import AuditView
from tui.widgets.figures import Column, FigureTable
from tui.widgets.panel import Panel

if TYPE_CHECKING:
    from kb.audit.coverage import Cell, Coverage

COLUMNS = (
    Column("Carbon", 9),
    Column("Leaving", 10, grows=1),
    Column("Reagent", 16, grows=2),
    Column("Solvent", 13, grows=1),
    Column("Runs", 4, is_figure=True),
    Column("Failed", 6, is_figure=True, from_width=90),
    Column("Best", 5, is_figure=True, from_width=90),
    Column("Mean", 6, is_figure=True),
    Column("", 3),
)
"""A reagent is the nucleophile, or the base or acid where nothing bonds."""
TITLES = {
    "all": "Combinations, fullest first: ◌ thin, ⇅ like flasks disagree; % of what was wanted",
    "thin": "Thin combinations ◌: two runs or fewer",
    "contradictory": "Combinations in which like flasks disagree ⇅",
}


class CoverageView(AuditView):
    """Cells and experiments."""

    KIND = "coverage"
    TITLE = "Coverage"
    WAITS = "What the record covers, by carbon class, leaving group, nucleophile or base, and solvent class."

    audit: Coverage | None

    def __init__(self) -> None:
        super().__init__()
        self._which = 0
        self._cells: tuple[Cell, ...] = ()

    def compose_figures(self) -> ComposeResult:
        """Lay out the cells and the experiments."""
        with Panel("Combinations", id="coverage-cells"):
            yield FigureTable(COLUMNS, id="coverage-table")
        with Panel("Experiments that would teach most  (p takes one to planning)", id="coverage-teach"):
            yield OptionList(compact=True, markup=False, id="coverage-experiments")

    def show_figures(self) -> None:
        """Show the cells chosen and the experiments."""
        coverage = self.audit
        assert coverage is not None
        which = CELL_FILTERS[self._which]
        self._cells = chosen_cells(coverage, which)
        following = CELL_FILTERS[(self._which + 1) % len(CELL_FILTERS)]
        self.query_one("#coverage-cells", Panel).say(f"{TITLES[which]}  (s: {following})")
        rows = [cell_cells(cell, coverage.contradictions) for cell in self._cells]
        self.query_one(FigureTable).show_rows(rows)
        self.say(say_coverage(coverage))
        experiments = self.query_one(OptionList)
        experiments.clear_options()
        for number, e in enumerate(coverage.experiments, 1):
            what, why = say_experiment(e)
            line = Text(f"{number}. {safe(what)}", style="bold")
            line.append(f"\n{safe(why)}", style="not bold")
            experiments.add_option(Option(line))
        experiments.highlighted = 0 if coverage.experiments else None
        if not coverage.experiments:
            experiments.add_option(
                Option("Nothing to propose: no recent step has a record to compare.", disabled=True)
            )

    def turn(self) -> None:
        """Show other cells."""
        if self.audit is not None:
            self._which = (self._which + 1) % len(CELL_FILTERS)
            self.show_figures()

    @property
    def _experiment(self) -> int | None:
        """Return the experiment in focus."""
        experiments = self.query_one(OptionList)
        if self.audit is None or not self.audit.experiments or not experiments.has_focus:
            return None
        return experiments.highlighted

    @on(OptionList.OptionHighlighted)
    @on(OptionList.OptionSelected)
    def _experiment_looked_at(self, event: OptionList.OptionMessage) -> None:
        event.stop()
        asks = isinstance(event, OptionList.OptionSelected)
        self.post_message(self.RunsAsked(self) if asks else self.Looked())

    @property
    def behind(self) -> Behind | None:
        """Return the runs of the cell, or the one that an experiment is like."""
        if self.audit is None:
            return None
        if (place := self._experiment) is not None:
            e = self.audit.experiments[place]
            return behind(e.words, RunGroup(title="it is like", codes=(e.like,) if e.like else ()))
        row = self.query_one(FigureTable).row
        return cell_behind(self._cells[row], self.audit.contradictions) if row is not None else None

    @property
    def run_to_plan(self) -> str | None:
        """Return the run that the experiment is like which was last looked at."""
        place = self.query_one(OptionList).highlighted or 0
        return (
            self.audit.experiments[place].like if self.audit is not None and self.audit.experiments else None
        )
