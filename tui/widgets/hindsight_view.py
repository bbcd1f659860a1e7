"""Hindsight: what a replay of the record would have warned of, at the rule in use and at every other threshold."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from rich.text import Text
from textual.app import ComposeResult
from textual.containers import Horizontal
from textual.widgets import Static

from kb.audit.sayings import say_replay
from tui.failure_words import Behind, hindsight_behind, point_cells, replay_notes, share_words
from tui.present import bar_cells, words_of
from tui.widgets.audit_view import AuditView
from tui.widgets.figures import Column, FigurePlot, FigureTable, Inks
from tui.widgets.panel import Panel

if TYPE_CHECKING:
    from kb.audit.replay import Hindsight
    from kb.audit.replay_report import ReplayReport

WAYS: tuple[tuple[str, tuple[Column, ...]], ...] = (
    (
        "threshold",
        (
            Column("From", 6, grows=1),
            Column("Warned", 6, is_figure=True),
            Column("Right", 6, is_figure=True),
            Column("False alarms", 12, is_figure=True),
        ),
    ),
    (
        "failure mode",
        (
            Column("Mode", 15, grows=1),
            Column("Failed", 6, is_figure=True),
            Column("Warned of, 80 %", 16, is_figure=True),
        ),
    ),
    (
        "quarter",
        (
            Column("Quarter", 7, grows=1),
            Column("Failed", 6, is_figure=True),
            Column("Warned", 6, is_figure=True),
            Column("False alarms", 12, is_figure=True),
        ),
    ),
)
IN_USE = "in use"


class HindsightView(AuditView):
    """A replay."""

    KIND = "replay"
    TITLE = "Hindsight"
    IS_LONG = True
    WAITS = (
        "Would the record have told us? Each run is checked against what stood in the book on the morning it was set "
        "up. This takes a while on a large book; you can work on meanwhile, and stop it. F9 starts."
    )

    audit: ReplayReport | None

    def __init__(self) -> None:
        super().__init__()
        self._way = 0

    def compose_figures(self) -> ComposeResult:
        """Lay out the shares, the table and the curve."""
        yield Static("", id="hindsight-shares")
        with Horizontal():
            with Panel("By threshold", id="hindsight-counts"):
                yield FigureTable(WAYS[0][1], id="hindsight-table")
            with Panel("Warned of, %: failures ↑ successes →", id="hindsight-drawn"):
                yield FigurePlot(id="hindsight-plot")
                yield Static(
                    "● in use   ◆ the row looked at", classes="quiet", id="hindsight-legend", markup=False
                )

    def show_figures(self) -> None:
        """Show the shares and one of the tables."""
        report = self.audit
        assert report is not None
        self.say(say_replay(report))
        self.query_one("#hindsight-shares", Static).update(self._shares(report))
        name, columns = WAYS[self._way]
        following = WAYS[(self._way + 1) % len(WAYS)][0]
        self.query_one("#hindsight-counts", Panel).say(f"By {name}  (s: {following})")
        rows = self._rows(report)
        self.query_one(FigureTable).show_columns(columns, rows)
        words = "\n".join(" ".join(point_cells(p)) for p in report.curve)
        self.query_one(FigurePlot).draw(self._paint, words)

    def _shares(self, report: ReplayReport) -> Text:
        lines = []
        for words, share in (
            ("failures warned of", report.recall),
            ("warnings that were right", report.precision),
            ("successes warned of", report.false_alarm_share),
        ):
            if share is not None:
                lines.append(f"{words:<25} {bar_cells(share, 24)}  {share_words(share)}")
        if notes := replay_notes(report):
            lines.append(notes)
        return Text("\n".join(lines), no_wrap=True, overflow="ellipsis")

    def _rows(self, report: ReplayReport) -> list[tuple[str, ...]]:
        if WAYS[self._way][0] == "failure mode":
            return [(words_of(m.mode), str(m.failures), share_words(m.share)) for m in report.by_mode]
        if WAYS[self._way][0] == "quarter":
            return [(p.name, str(p.failures), str(p.warned), str(p.false_alarms)) for p in report.periods]
        recall = f"{100 * report.recall.mean:.0f} %" if report.recall else "none"
        right = f"{100 * report.precision.mean:.0f} %" if report.precision else "none"
        return [(IN_USE, recall, right, str(report.false_alarms)), *(point_cells(p) for p in report.curve)]

    def turn(self) -> None:
        """Show the next table."""
        if self.audit is not None:
            self._way = (self._way + 1) % len(WAYS)
            self.show_figures()

    def look(self, table: FigureTable) -> None:
        """Mark the threshold under the cursor on the curve."""
        self.query_one(FigurePlot).refresh()

    def _paint(self, plt: Any, inks: Inks, width: int) -> None:
        report = self.audit
        if report is None or not report.curve:
            return
        across = [100 * p.false_alarm_share for p in report.curve]
        up = [100 * p.recall for p in report.curve]
        plt.plot([0, 100], [0, 100], marker="·", color=inks.quiet)
        plt.plot(across, up, marker="braille", color=inks.soft)
        if report.recall and report.false_alarm_share:
            plt.scatter(
                [100 * report.false_alarm_share.mean],
                [100 * report.recall.mean],
                marker="●",
                color=inks.strong,
            )
        row = self.query_one(FigureTable).row
        if self._way == 0 and row:
            plt.scatter([across[row - 1]], [up[row - 1]], marker="◆", color=inks.marked)
        plt.xlim(0, 100)
        plt.ylim(0, 100)
        plt.xticks([0, 25, 50, 75, 100])
        plt.yticks([0, 25, 50, 75, 100])

    @property
    def behind(self) -> Behind | None:
        """Return the replayed runs of the row under the cursor."""
        report, row = self.audit, self.query_one(FigureTable).row
        if report is None or row is None:
            return None
        if self._way == 0 and row > 0:
            threshold = report.curve[row - 1].threshold
            return hindsight_behind(
                f"Warned from a worry of {threshold:.2f}", report.runs, lambda r: r.worry >= threshold
            )
        title, runs = "The rule in use", report.runs
        if WAYS[self._way][0] == "failure mode":
            mode = report.by_mode[row].mode
            title, runs = (
                f"Failure mode: {words_of(mode)}",
                tuple(r for r in runs if mode in (r.modes or ("not named",))),
            )
        elif WAYS[self._way][0] == "quarter":
            period = report.periods[row].name
            title, runs = f"Quarter: {period}", tuple(r for r in runs if _quarter(r) == period)
        return hindsight_behind(title, runs, lambda r: r.warned)


def _quarter(run: Hindsight) -> str:
    return f"{run.date.year}-Q{(run.date.month + 2) // 3}"
