"""The shelf under the answer: closest runs, one change, temperature.

One at a time, all at once on a wide screen.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from textual.app import ComposeResult
from textual.containers import Vertical
from textual.message import Message
from textual.reactive import reactive

from kb.record.assessment import Assessment, Estimate
from tui.widgets.advice import AdviceList
from tui.widgets.panel import Panel
from tui.widgets.tables import PrecedentTable
from tui.widgets.whatif import WhatIfPlot

PARTS: tuple[tuple[str, str], ...] = (
    ("precedents-panel", "Closest runs"),
    ("advice-panel", "One change"),
    ("whatif-panel", "Temperature"),
)
TEMPERATURE = 2


class Shelf(Vertical):
    """What stands behind the answer."""

    index: reactive[int] = reactive(0)

    class Turned(Message):
        """Another part is in view."""

    def __init__(self, **options: Any) -> None:
        super().__init__(**options)
        self._counts = ("", "", "")

    def compose(self) -> ComposeResult:
        """Lay out the parts."""
        parts = (PrecedentTable(id="precedents"), AdviceList(id="advice"), WhatIfPlot(id="whatif"))
        for (panel, title), part in zip(PARTS, parts, strict=True):
            yield Panel(title, part, id=panel)

    def on_mount(self) -> None:
        """Show the first part."""
        self._bring_up()

    @property
    def is_temperature_in_view(self) -> bool:
        """Return True while the temperature plot can be seen."""
        return self.index == TEMPERATURE or self.screen.has_class("-wide")

    def show(self, assessment: Assessment | None) -> None:
        """Show precedents and advice; None clears."""
        precedents = assessment.precedents if assessment else ()
        advice = assessment.advice if assessment else ()
        self._counts = (f" {len(precedents)}", f" {len(advice)}", "") if assessment else ("", "", "")
        self.query_one(PrecedentTable).show(precedents)
        self.query_one(AdviceList).show(advice)
        self._title()

    def show_what_if(self, points: Sequence[tuple[float, Estimate]], remark: str) -> None:
        """Plot the temperatures, or say why there is no plot."""
        self.run_worker(self.query_one(WhatIfPlot).show(points, remark), group="plot", exclusive=True)

    def turn(self) -> None:
        """Bring the next part into view and the focus to it."""
        self.index = (self.index + 1) % len(PARTS)
        target = self.query_one(("#precedents", "#advice", "#whatif")[self.index])
        if target.focusable:
            target.focus()

    def watch_index(self) -> None:
        """Show another part."""
        if self.is_mounted:
            self._bring_up()
            self.post_message(self.Turned())

    def _bring_up(self) -> None:
        """Show one part; a wide screen shows all of them anyway."""
        for position, (panel, _) in enumerate(PARTS):
            self.query_one(f"#{panel}").set_class(position == self.index, "-shown")
        self._title()

    def _title(self) -> None:
        names = [f"{title}{count}" for (_, title), count in zip(PARTS, self._counts, strict=True)]
        for position, (panel, _) in enumerate(PARTS):
            others = names[position + 1 :] + names[:position]
            rest = "" if self.screen.has_class("-wide") else f"  (F7: {', '.join(others)})"
            self.query_one(f"#{panel}", Panel).say(f"{names[position]}{rest}")
