"""What recurs: the kinds of failure in a table, the one under the cursor drawn and told below."""

from __future__ import annotations

from typing import TYPE_CHECKING

from rich.text import Text
from textual.app import ComposeResult
from textual.containers import Horizontal, VerticalScroll
from textual.message import Message
from textual.widgets import Static

from kb.audit.sayings import say_recurrence
from kb.chem.layout import MarkKind, SchemeDrawing
from tui.failure_words import ORDERS, Behind, cluster_behind, cluster_cells, cluster_lines
from tui.present import safe
from tui.widgets.audit_view import AuditView
from tui.widgets.figures import Column, FigureTable
from tui.widgets.panel import Panel
from tui.widgets.structure import SchemeView

if TYPE_CHECKING:
    from kb.audit.recurrence_values import Cluster, Recurrence

COLUMNS = (
    Column("Went wrong", 12, grows=1),
    Column("Where", 24, grows=2),
    Column("Under", 16, grows=3, from_width=96),
    Column("Runs", 4, is_figure=True),
    Column("Earlier", 7, is_figure=True),
    Column("Lost", 5, is_figure=True),
    Column("Latest", 7, from_width=120),
    Column("Rule", 8),
)

SHARED = {MarkKind.MOTIF: "what they share"}


class RecurringView(AuditView):
    """Kinds of failure."""

    KIND = "recurring"
    TITLE = "What recurs"
    WAITS = "Failures of one kind at one kind of place, under like conditions, are gathered here."

    audit: Recurrence | None

    class Drawn(Message):
        """A cluster is to be drawn; None = nothing."""

        def __init__(self, cluster: Cluster | None) -> None:
            super().__init__()
            self.cluster = cluster

    def __init__(self) -> None:
        super().__init__()
        self._order = 0
        self._clusters: tuple[Cluster, ...] = ()

    def compose_figures(self) -> ComposeResult:
        """Lay out the table, the drawing and the words."""
        with Panel("Kinds of failure", id="recurring-kinds"):
            yield FigureTable(COLUMNS, id="recurring-table")
        with Horizontal(id="recurring-one"):
            with Panel("The latest of them", id="recurring-shared"):
                yield SchemeView(id="recurring-drawing", with_legend=True, legend_words=SHARED)
            with Panel("This kind", id="recurring-told"), VerticalScroll():
                yield Static("", id="recurring-words")

    @property
    def cluster(self) -> Cluster | None:
        """Return the kind under the cursor."""
        row = self.query_one(FigureTable).row
        return self._clusters[row] if row is not None and row < len(self._clusters) else None

    def show_figures(self) -> None:
        """Show the kinds in the order chosen; the cursor stays on its kind."""
        assert self.audit is not None
        held = self.cluster.name if self.cluster else None
        word, key = ORDERS[self._order]
        self._clusters = tuple(sorted(self.audit.clusters, key=key))  # type: ignore[arg-type]
        names = [c.name for c in self._clusters]
        self.query_one("#recurring-kinds", Panel).say(
            f"Kinds of failure, by {word}; lost is mmol of substrate"
        )
        rows = [cluster_cells(c) for c in self._clusters]
        self.query_one(FigureTable).show_rows(rows, names.index(held) if held in names else 0)
        self.say(
            say_recurrence(self.audit)
            if rows
            else "No failure was recorded twice: nothing recurs in this book."
        )
        self._tell()

    def turn(self) -> None:
        """Take the next order."""
        self._order = (self._order + 1) % len(ORDERS)
        self.show_figures()

    def look(self, table: FigureTable) -> None:
        """Tell and draw the kind under the cursor."""
        self._tell()

    def _tell(self) -> None:
        cluster = self.cluster
        text = Text("\n".join(cluster_lines(cluster)) if cluster else "")
        self.query_one("#recurring-told", Panel).say(safe(cluster.title) if cluster else "This kind")
        self.query_one("#recurring-words", Static).update(text)
        self.query_one("#recurring-told VerticalScroll").scroll_home(animate=False)
        self.post_message(self.Drawn(cluster))

    def draw(self, cluster: Cluster, drawing: SchemeDrawing | None) -> None:
        """Show the drawing of a kind, if it is still the one under the cursor."""
        if cluster is self.cluster:
            view = self.query_one(SchemeView)
            view.placeholder = (
                "Nothing in the molecule is shared: see the words beside." if drawing is None else ""
            )
            view.show(drawing)

    @property
    def behind(self) -> Behind | None:
        """Return the runs of the kind under the cursor."""
        return cluster_behind(self.cluster) if self.cluster else None

    @property
    def run_to_plan(self) -> str | None:
        """Return the latest run of the kind."""
        return self.cluster.runs[-1] if self.cluster and self.cluster.runs else None
