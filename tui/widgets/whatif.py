"""The split over temperature: a plot of the expected shares, and the same figures as a table in words.

The plotting library is loaded when the plot is first shown. Each fate has its own point shape beside its
colour.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from textual.app import ComposeResult
from textual.containers import Vertical
from textual.content import Content
from textual.widgets import Static

from kb.record.assessment import Estimate
from kb.vocabulary import Fate
from tui.present import FATE_WORDS, interval_words, percent

SHAPES = ("●", "○", "▲", "+", "x", "*", "#", "%")
COLOURS = ("blue+", "orange+", "green+", "red+", "magenta+", "cyan+", "white", "gray+")


class WhatIfPlot(Vertical):
    """Expected shares at other temperatures."""

    def compose(self) -> ComposeResult:
        """Start with a remark; the plot comes with the first figures."""
        yield Static("Give a temperature to see what others would do.", id="whatif-words", markup=False)

    async def show(self, points: Sequence[tuple[float, Estimate]], remark: str = "") -> None:
        """Plot the shares; nothing to plot leaves the remark alone."""
        words = self.query_one("#whatif-words", Static)
        fates = self._fates(points)
        if not fates:
            words.update(Content(remark or "No figures to plot for this step."))
            words.display = True
            for plot in self.query("PlotextPlot"):
                plot.display = False
            return
        from textual_plotext import PlotextPlot

        existing = self.query(PlotextPlot)
        plot = existing.first() if existing else PlotextPlot()
        if not existing:
            await self.mount(plot)
        plot.display = True
        words.display = False
        self._draw(plot.plt, points, fates)
        plot.tooltip = Content(self.table_words(points))
        plot.refresh()

    @staticmethod
    def table_words(points: Sequence[tuple[float, Estimate]]) -> str:
        """Return the figures line by line, for screen readers and for copying."""
        lines = []
        for temperature_c, estimate in points:
            shares = ", ".join(f"{FATE_WORDS[f]} {percent(i.mean)} ({interval_words(i)})" for f, i in estimate.fates)
            lines.append(f"{temperature_c:.0f} °C: {shares}")
        return "\n".join(lines)

    @staticmethod
    def _fates(points: Sequence[tuple[float, Estimate]]) -> list[Fate]:
        """Return the fates worth a line: those that reach 2 % somewhere."""
        most: dict[Fate, float] = {}
        for _, estimate in points:
            for fate, share in estimate.fates:
                most[fate] = max(most.get(fate, 0.0), share.mean)
        return [fate for fate in Fate if most.get(fate, 0.0) >= 0.02]

    def _draw(self, plt: Any, points: Sequence[tuple[float, Estimate]], fates: Sequence[Fate]) -> None:
        plt.clear_figure()
        plt.theme("textual-design-dark" if self.app.current_theme.dark else "textual-design-light")
        for number, fate in enumerate(fates):
            shares = [(t, dict(e.fates).get(fate)) for t, e in points]
            known = [(t, i) for t, i in shares if i is not None]
            plt.plot(
                [t for t, _ in known],
                [100 * i.mean for _, i in known],
                marker=SHAPES[number],
                color=COLOURS[number],
                label=FATE_WORDS[fate],
            )
            for bound in ("low", "high"):
                plt.scatter(
                    [t for t, _ in known],
                    [100 * getattr(i, bound) for _, i in known],
                    marker="·",
                    color=COLOURS[number],
                )
        plt.ylim(0, 100)
        plt.yticks([0, 25, 50, 75, 100])
        plt.xlabel("bath temperature, °C")
        plt.ylabel("share, %")
