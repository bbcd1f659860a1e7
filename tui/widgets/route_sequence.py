"""The steps of a route as a list: the flow drawn at the left edge, two lines a step.

The first line holds name, bar and yield; the second says what is weakest, found, changed, and where the yield comes
from. Severities have marks and words beside their colour.
"""

from __future__ import annotations

from typing import Any, ClassVar

from rich.text import Text
from textual import on
from textual.binding import Binding, BindingType
from textual.events import Click, Resize
from textual.message import Message
from textual.widgets import OptionList
from textual.widgets.option_list import Option

from kb.record.finding import Interval
from kb.route.entries import Ledger
from kb.route.sequence import Step
from tui.route_words import SEQUENCE_HINT, Row, sequence_rows, step_cells, step_remarks


class RouteSequence(OptionList):
    """All steps, main line at the edge."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("enter,r", "select", "Runs behind", id="route.behind", tooltip="Open the runs behind a step's yield"),
    ]

    class Looked(Message):
        """The highlight is on a step; None where there are none."""

        def __init__(self, step: Step | None) -> None:
            super().__init__()
            self.step = step

    class BehindAsked(Message):
        """Somebody wants the runs behind a yield."""

        def __init__(self, step: Step) -> None:
            super().__init__()
            self.step = step

    def __init__(self, **options: Any) -> None:
        super().__init__(markup=False, compact=True, **options)
        self._ledger: Ledger | None = None
        self._file_yields: dict[str, Interval] = {}
        self._rows: tuple[Row, ...] = ()
        self._width = 0

    def show(self, ledger: Ledger | None, base: Ledger | None) -> None:
        """Replace the list; the highlight stays on the same step where it is still there.

        Args:
            base: the route as in the file, to name what was changed.
        """
        self._ledger = ledger
        self._file_yields = {e.step.name: e.step.yield_pct.pct for e in base.entries} if base else {}
        self._rows = sequence_rows(ledger.route) if ledger else ()
        self._fill()

    @property
    def chosen(self) -> Step | None:
        """Return the step under the highlight, as it is reckoned now."""
        at = self.highlighted
        return self._rows[at].step if at is not None and at < len(self._rows) else None

    def _fill(self) -> None:
        held = self.highlighted
        name = self.chosen.name if self.chosen else None
        names = [row.step.name for row in self._rows]
        self._width = self.scrollable_content_region.width
        prompts = [self._prompt(row) for row in self._rows]
        if len(prompts) == self.option_count and held is not None and name == names[held]:
            for at, prompt in enumerate(prompts):  # in place, so that list and highlight do not jump while typing
                self.replace_option_prompt_at_index(at, prompt)
            self.post_message(self.Looked(self.chosen))
            return
        self.clear_options()
        if not self._rows:
            self.add_option(Option(Text(SEQUENCE_HINT, style="dim"), disabled=True))
            self.post_message(self.Looked(None))
            return
        self.add_options([Option(prompt) for prompt in prompts])
        self.highlighted = names.index(name) if name in names else 0

    def _prompt(self, row: Row) -> Text:
        ledger = self._ledger
        assert ledger is not None  # there are rows only where there is a ledger
        width = max(self._width, 32)
        entry = next(e for e in ledger.entries if e.step.name == row.step.name)
        is_weakest = ledger.weakest is not None and ledger.weakest.step == row.step.name
        before = self._file_yields.get(row.step.name)
        changed = before if before is not None and before != row.step.yield_pct.pct else None
        text = Text(step_cells(row, width), no_wrap=True, overflow="ellipsis")
        text.highlight_regex(r"[█▒·┃]{3,}", self.app.theme_variables.get("primary", ""))
        text.append(f"\n{row.second.ljust(len(row.first) + 2)}")
        for number, (words, kind) in enumerate(step_remarks(row, entry, changed, is_weakest)):
            if number:
                text.append("; ", style=self._style("quiet"))
            text.append(words, style=self._style(kind or "quiet"))
        return text

    def _style(self, kind: str) -> str:
        tokens = self.app.theme_variables
        if kind in ("weak", "changed"):
            return f"bold {tokens.get('accent' if kind == 'weak' else 'primary', '')}".strip()
        return tokens.get("quiet" if kind == "quiet" else f"severity-{kind}", "")

    def on_resize(self, event: Resize) -> None:
        """Fit the bars to the new width."""
        if self._rows and self.scrollable_content_region.width != self._width:
            self._fill()

    def notify_style_update(self) -> None:
        """Colour again after a change of theme."""
        super().notify_style_update()
        if getattr(self, "_rows", ()) and self.is_mounted:
            self._fill()

    async def _on_click(self, event: Click) -> None:
        """Choose a step by one click; a click on the chosen one opens the runs behind it."""
        clicked = event.style.meta.get("option")
        if clicked is not None and clicked != self.highlighted:
            event.prevent_default()
            self.highlighted = clicked

    @on(OptionList.OptionHighlighted)
    def _looked(self, event: OptionList.OptionHighlighted) -> None:
        event.stop()
        self.post_message(self.Looked(self.chosen))

    @on(OptionList.OptionSelected)
    def _behind(self, event: OptionList.OptionSelected) -> None:
        event.stop()
        if self.chosen is not None:
            self.post_message(self.BehindAsked(self.chosen))
