"""The sum of a route: overall yield in both ways of reckoning, what goes in, the weakest step and what it is worth.

It shows a ledger and nothing else; every word comes from `tui.route_words`.
"""

from __future__ import annotations

from typing import Any

from rich.console import Group, RenderableType
from rich.table import Table
from rich.text import Text
from textual.containers import VerticalScroll
from textual.events import Resize
from textual.widgets import Static

from kb.route.entries import Ledger
from tui.present import safe
from tui.route_words import (
    improvement_words,
    need_cells,
    need_remarks,
    overall_lines,
    target_words,
    weakest_words,
)

NARROW = 52
"""Below this width [cells] a material takes two lines."""

NOTHING = """A route file names the steps, in TOML:

target = "2 g"
product = "NCCc1ccccc1"
[[step]]
name = "azide"
from = "bromide"
run = "R-0042"
[[step]]
name = "amine"
yield = "82 (75 to 89)"

run takes the yield from the record, plan = { … } estimates it, yield gives it. `sidepath route --help` has the rest."""


class RouteSum(VerticalScroll):
    """The answer of a route; it takes the focus so that the arrow keys scroll it."""

    def __init__(self, **options: Any) -> None:
        super().__init__(**options)
        self._shown: tuple[Ledger, Ledger, str] | None = None

    def compose(self) -> Any:
        """Lay out one text."""
        yield Static(Text(NOTHING), id="route-sum-words")

    def show(self, ledger: Ledger | None, base: Ledger | None, chosen: str = "") -> None:
        """Show a ledger beside that of the file; None clears.

        Args:
            chosen: the step under the highlight; what bettering it buys is told too.
        """
        self._shown = (ledger, base or ledger, chosen) if ledger is not None else None
        self._write()

    def on_resize(self, event: Resize) -> None:
        """Fit the bars to the new width."""
        self._write()

    def _write(self) -> None:
        words = self.query_one("#route-sum-words", Static)
        if self._shown is None:
            words.update(Text(NOTHING))
            words.tooltip = None
            return
        words.update(self._sum(*self._shown))

    def _sum(self, ledger: Ledger, base: Ledger, chosen: str) -> RenderableType:
        tokens = self.app.theme_variables
        quiet, accent, primary = (tokens.get(name, "") for name in ("quiet", "accent", "primary"))
        width = max(self.scrollable_content_region.width, 34)
        yields = Text()
        for word, line in overall_lines(ledger, base, width):
            yields.append(f"{word:<12}", style="bold" if word == "Monte Carlo" else quiet)
            yields.append(f"{line}\n", style=primary if word == "Monte Carlo" else quiet)
        yields.append(f"For {target_words(ledger)}:", style="bold")
        rest = Text(weakest_words(ledger), style=accent)
        is_other = chosen and (ledger.weakest is None or ledger.weakest.step != chosen)
        if is_other and (words := improvement_words(ledger, chosen)):
            rest.append(f"\n{safe(chosen, 24)}: {words[0].lower()}{words[1:]}", style=tokens.get("foreground", ""))
        for line in need_remarks(ledger):
            rest.append(f"\n{line}", style=quiet)
        return Group(yields, _needs(ledger, width), rest)


def _needs(ledger: Ledger, width: int) -> RenderableType:
    """Return what goes in: a line each, two where the space is narrow."""
    rows = [need_cells(need, ledger) for need in ledger.needed]
    if width < NARROW:
        text = Text()
        for number, (name, mass, amount, cost) in enumerate(rows):
            text.append(("\n" if number else "") + name, style="bold")
            text.append(f" {', '.join(part for part in (mass, cost) if part)}\n  {amount}")
        return text
    table = Table.grid(padding=(0, 1), expand=False)
    table.add_column(overflow="ellipsis", no_wrap=True)
    table.add_column(justify="right", no_wrap=True, style="bold")
    table.add_column(justify="right", overflow="ellipsis", no_wrap=True)
    table.add_column(justify="right", no_wrap=True)
    for row in rows:
        table.add_row(*row)
    return table
