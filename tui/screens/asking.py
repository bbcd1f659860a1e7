"""Small dialogs: words to read, one line to type."""

from __future__ import annotations

from typing import ClassVar

from rich.text import Text
from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal, VerticalScroll
from textual.screen import ModalScreen
from textual.widgets import Button, Footer, Input, Static

from tui.present import safe
from tui.widgets.lines import SafeInput


class WordsScreen(ModalScreen[None]):
    """Words under a title."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape,enter,q", "dismiss", "Close", key_display="Esc", id="words.close", tooltip="Close"),
    ]

    def __init__(self, title: str, words: str) -> None:
        super().__init__(classes="dialog-back")
        self._title = title
        self._words = words

    def compose(self) -> ComposeResult:
        """Lay out the words."""
        with VerticalScroll(classes="dialog"):
            yield Static(Text(safe(self._title), style="bold"))
            yield Static(Text(safe(self._words, keep_lines=True)))
        yield Footer(show_command_palette=False)


class LineScreen(ModalScreen[str | None]):
    """One line to type, such as a reason; empty is refused, Escape gives None."""

    AUTO_FOCUS = "#line-input"

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "cancel", "Cancel", id="line.cancel", tooltip="Leave without doing it"),
    ]

    def __init__(self, title: str, words: str, value: str = "", go: str = "Go on") -> None:
        super().__init__(classes="dialog-back")
        self._title = title
        self._words = words
        self._value = value
        self._go = go

    def compose(self) -> ComposeResult:
        """Lay out the question, the line and the buttons."""
        with VerticalScroll(classes="dialog"):
            yield Static(Text(safe(self._title), style="bold"))
            yield Static(Text(safe(self._words, keep_lines=True)))
            yield SafeInput(self._value, id="line-input")
            yield Static("Write something first.", classes="trouble", id="line-trouble", markup=False)
            with Horizontal(classes="buttons"):
                yield Button(self._go, id="line-go", classes="-primary")
                yield Button("Cancel", id="line-cancel")

    @on(Input.Submitted)
    @on(Button.Pressed, "#line-go")
    def _go_on(self, event: Input.Submitted | Button.Pressed) -> None:
        event.stop()
        value = self.query_one("#line-input", Input).value.strip()
        self.query_one("#line-trouble").set_class(not value, "-shown")
        if value:
            self.dismiss(value)

    @on(Button.Pressed, "#line-cancel")
    def action_cancel(self) -> None:
        """Leave."""
        self.dismiss(None)
