"""What to expect: one bar per fate with its interval, and what the figures rest on.

The bar is solid up to the lower bound, shaded to the upper one and carries an upright at the mean, so it
reads without colour. Pressing Enter asks for the runs behind it.
"""

from __future__ import annotations

import textwrap
from typing import Any, ClassVar

from rich.segment import Segment
from textual.binding import Binding, BindingType
from textual.content import Content
from textual.events import Click
from textual.message import Message
from textual.reactive import reactive
from textual.strip import Strip
from textual.widget import Widget

from kb.record.assessment import Estimate
from tui.present import FATE_WORDS, bar_cells, bounds_short, estimate_rest, interval_words, percent, safe

WORD_WIDTH = 13
FIGURE_WIDTH = 14
REST_LINES = 3


class EstimateBars(Widget, can_focus=True):
    """The expected split."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding(
            "enter",
            "behind",
            "Runs behind",
            id="estimate.behind",
            tooltip="Open the runs behind these figures",
        )
    ]
    COMPONENT_CLASSES: ClassVar[set[str]] = {
        "estimate--bar",
        "estimate--mean",
        "estimate--rest",
        "estimate--word",
    }

    estimate: reactive[Estimate | None] = reactive(None, layout=True)
    waiting: reactive[str] = reactive("Type a scheme and the conditions.")

    class BehindAsked(Message):
        """Somebody wants the runs behind the figures."""

    def __init__(self, **options: Any) -> None:
        super().__init__(**options)

    @property
    def text_alternative(self) -> str:
        """Return the bars in words."""
        if self.estimate is None:
            return self.waiting
        parts = [
            f"{FATE_WORDS[fate]} {percent(share.mean)} ({interval_words(share)})" for fate, share in self.estimate.fates
        ]
        return "; ".join([*parts, estimate_rest(self.estimate)])

    def get_content_height(self, container: Any, viewport: Any, width: int) -> int:
        """Return one line per fate and those of the remark."""
        if self.estimate is None:
            return 1
        return len(self.estimate.fates) + len(self._rest(max(width, 10)))

    def render_line(self, y: int) -> Strip:
        """Return a bar, or a line of the remark."""
        width = self.size.width
        base = self.rich_style
        if self.estimate is None:
            return Strip([Segment(self.waiting, self._style("rest"))]).adjust_cell_length(width, base)
        fates = self.estimate.fates
        if y < len(fates):
            fate, share = fates[y]
            room = max(4, width - WORD_WIDTH - FIGURE_WIDTH)
            bar = bar_cells(share, room)
            upright = bar.find("┃")
            figures = f" {percent(share.mean):>4} {bounds_short(share):>8}"
            segments = [
                Segment(FATE_WORDS[fate].ljust(WORD_WIDTH), self._style("word")),
                Segment(bar[:upright], self._style("bar")),
                Segment("┃", self._style("mean")),
                Segment(bar[upright + 1 :], self._style("bar")),
                Segment(figures, self._style("word")),
            ]
            return Strip(segments).adjust_cell_length(width, base)
        rest = self._rest(width)
        line = rest[y - len(fates)] if y - len(fates) < len(rest) else ""
        return Strip([Segment(line, self._style("rest"))]).adjust_cell_length(width, base)

    def watch_estimate(self) -> None:
        """Keep the words for hovering and screen readers."""
        self.tooltip = Content(safe(self.text_alternative)) if self.estimate else None

    def action_behind(self) -> None:
        """Ask for the runs behind."""
        self.post_message(self.BehindAsked())

    def on_click(self, event: Click) -> None:
        """A second click on the bars asks for the runs behind."""
        if event.chain == 2:
            self.action_behind()

    def _style(self, name: str) -> Any:
        return self.get_component_rich_style(f"estimate--{name}")

    def _rest(self, width: int) -> list[str]:
        if self.estimate is None:
            return []
        return textwrap.wrap(estimate_rest(self.estimate), width, max_lines=REST_LINES, placeholder=" …")
