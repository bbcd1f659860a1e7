"""A list of words to tick: the tick is a sign in the text, so that it shows without colour."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, ClassVar

from rich.text import Text
from textual import on
from textual.binding import Binding, BindingType
from textual.message import Message
from textual.widgets import OptionList
from textual.widgets.option_list import Option

from tui.present import safe


class TickList(OptionList):
    """Words with a box each; Enter, space or a click ticks."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("space", "select", "Tick", id="tick", tooltip="Tick, or take the tick away")
    ]

    class Changed(Message):
        """A tick was set or taken away."""

    def __init__(self, **options: Any) -> None:
        super().__init__(markup=False, compact=True, **options)
        self._choices: tuple[tuple[str, str], ...] = ()
        self._ticked: set[str] = set()

    def offer(self, choices: Sequence[tuple[str, str]]) -> None:
        """Replace the words: (word, what is shown)."""
        self._choices = tuple(choices)
        self.clear_options()
        self.add_options([Option(self._prompt(word)) for word, _ in self._choices])

    @property
    def ticked(self) -> tuple[str, ...]:
        """Return the ticked words in the order of the list; words not on offer come last."""
        known = tuple(word for word, _ in self._choices if word in self._ticked)
        return known + tuple(sorted(self._ticked - set(known)))

    def tick(self, words: Sequence[str]) -> None:
        """Tick just these words, without saying so."""
        self._ticked = set(words)
        for number, (word, _) in enumerate(self._choices):
            self.replace_option_prompt_at_index(number, self._prompt(word))

    def _prompt(self, word: str) -> Text:
        shown = dict(self._choices)[word]
        return Text(f"{'[x]' if word in self._ticked else '[ ]'} {safe(shown)}", no_wrap=True, overflow="ellipsis")

    @on(OptionList.OptionSelected)
    def _toggled(self, event: OptionList.OptionSelected) -> None:
        event.stop()
        word = self._choices[event.option_index][0]
        self._ticked ^= {word}
        self.replace_option_prompt_at_index(event.option_index, self._prompt(word))
        self.post_message(self.Changed())
