"""A titled part of a screen: a rule with its title; the rule grows heavy while the focus is inside."""

from __future__ import annotations

from textual.containers import Vertical
from textual.content import Content
from textual.widget import Widget


class Panel(Vertical):
    """A part with a title in the trade's words."""

    def __init__(self, title: str, *children: Widget, id: str | None = None, classes: str = "") -> None:  # noqa: A002
        super().__init__(*children, id=id, classes=f"panel {classes}".strip())
        self.border_title = Content(title).markup

    def say(self, title: str) -> None:
        """Change the title."""
        self.border_title = Content(title).markup
