"""Copying: choose SMILES, Markdown or JSON."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, ClassVar

from rich.text import Text
from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.screen import ModalScreen
from textual.widgets import Footer, OptionList
from textual.widgets.option_list import Option

from tui.present import safe
from tui.widgets.panel import Panel

if TYPE_CHECKING:
    from tui.application import SidepathApp


class CopyScreen(ModalScreen[None]):
    """A short list of what can be copied."""

    app: SidepathApp
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "dismiss", "Close", key_display="Esc", id="copying.close", tooltip="Copy nothing"),
    ]

    def __init__(self, texts: Mapping[str, str]) -> None:
        super().__init__(classes="dialog-back")
        self._texts = dict(texts)

    def compose(self) -> ComposeResult:
        """Lay out the kinds with their first words."""
        options = []
        for kind, text in self._texts.items():
            line = Text(f"{kind:<10}", style="bold")
            line.append(safe(text, 56), style="dim")
            options.append(Option(line, id=kind))
        yield Panel("Copy as", OptionList(*options, compact=True, markup=False), classes="dialog", id="copy-panel")
        yield Footer(show_command_palette=False)

    @on(OptionList.OptionSelected)
    def _copy(self, event: OptionList.OptionSelected) -> None:
        event.stop()
        kind = event.option_id or ""
        self.app.copy_text(kind, self._texts[kind])
        self.dismiss()
