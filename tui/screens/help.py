"""Help: what the screen below is for, in its own words, and every key that works there."""

from __future__ import annotations

from typing import Any, ClassVar

from rich.text import Text
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import VerticalScroll
from textual.screen import ModalScreen, Screen
from textual.widgets import Footer, Static

MARKS_HELP = (
    "In drawings ◆ is the reacting carbon, ○ the leaving group, ▲ the motif of the finding that is highlighted, "
    "• what a search matched. Bars are solid up to the lower bound of the interval, shaded to the upper one, "
    "with ┃ at the mean. Every command is also in the palette (Ctrl+P)."
)


class HelpScreen(ModalScreen[None]):
    """The help of one screen."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape,f1,q", "dismiss", "Close", key_display="Esc", id="help.close", tooltip="Close the help"),
    ]

    def __init__(self, screen: Screen[Any]) -> None:
        super().__init__(classes="dialog-back")
        self._words = getattr(screen, "HELP", "")
        self._keys = help_keys(screen)

    def compose(self) -> ComposeResult:
        """Lay out the words and the keys."""
        paragraphs = [" ".join(part.split()) for part in self._words.split("\n\n")]
        text = Text("\n\n".join([*paragraphs, MARKS_HELP]) + "\n\n")
        for key, words in self._keys:
            text.append(f"{key:>12}  ", style="bold")
            text.append(f"{words}\n")
        with VerticalScroll(classes="dialog") as dialog:
            dialog.border_title = "Help"
            yield Static(text)
        yield Footer(show_command_palette=False)


def help_keys(screen: Screen[Any]) -> list[tuple[str, str]]:
    """Return keys and what they do, for the screen and the widget in focus, each action once."""
    seen: set[str] = set()
    lines: list[tuple[str, str]] = []
    for active in screen.active_bindings.values():
        binding = active.binding
        if binding.action in seen or not (binding.description and (binding.show or binding.tooltip)):
            continue
        seen.add(binding.action)
        lines.append((screen.app.get_key_display(binding), binding.tooltip or binding.description))
    return lines
