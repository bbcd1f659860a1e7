"""Lines and notes to type into that show any text safely: what acts on a terminal never reaches it.

A one-line field drops what acts when it is set, since such a character there is always a slip of the
clipboard. A note is kept to the letter and only *shown* with a mark in the place of each acting character.
"""

from __future__ import annotations

from typing import Any

from rich.text import Text
from textual.widgets import Input, TextArea

from kb.plain import plain


class SafeInput(Input):
    """A line that holds no acting characters."""

    def __init__(self, value: str | None = None, **options: Any) -> None:
        super().__init__(value, compact=True, **options)

    def validate_value(self, value: str) -> str:
        """Put a mark in the place of each acting character."""
        return plain(value)


class NoteArea(TextArea):
    """A note, kept to the letter and shown safely."""

    def get_line(self, line_index: int) -> Text:
        """Return a line as it is shown."""
        return Text(plain(self.document.get_line(line_index)), end="", no_wrap=True)
