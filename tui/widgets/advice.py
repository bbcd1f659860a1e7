"""One change and what it is likely to do: a list, each with its effect and what that rests on."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from rich.text import Text
from textual import on
from textual.message import Message
from textual.widgets import OptionList
from textual.widgets.option_list import Option

from kb.record.assessment import Advice
from tui.present import advice_line


class AdviceList(OptionList):
    """Single changes, most helpful first."""

    class Opened(Message):
        """One change is to be explained."""

        def __init__(self, advice: Advice) -> None:
            super().__init__()
            self.advice = advice

    def __init__(self, **options: Any) -> None:
        super().__init__(markup=False, compact=True, **options)
        self.advice: tuple[Advice, ...] = ()

    def show(self, advice: Sequence[Advice]) -> None:
        """Replace the list."""
        self.advice = tuple(advice)
        self.clear_options()
        if not advice:
            self.add_option(Option(Text("No single change stands out.", style="dim"), disabled=True))
            return
        for one in advice:
            change, effect = advice_line(one)
            text = Text(change, overflow="ellipsis")
            text.append(f"\n   {effect}", style="dim")
            self.add_option(Option(text))

    def on_focus(self) -> None:
        """Start on the first line, so that Enter always means something."""
        if self.highlighted is None and self.option_count:
            self.action_first()

    @on(OptionList.OptionSelected)
    def _opened(self, event: OptionList.OptionSelected) -> None:
        event.stop()
        if event.option_index < len(self.advice):
            self.post_message(self.Opened(self.advice[event.option_index]))
