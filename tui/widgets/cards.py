"""Search hits as cards in a grid.

Each a drawing with its match marked, the run's code and its outcome in a line.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, ClassVar

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import ItemGrid, Vertical, VerticalScroll
from textual.content import Content
from textual.events import Click, DescendantFocus
from textual.message import Message
from textual.widgets import Static

from kb.chem.layout import SchemeDrawing
from tui.ports import FindHit
from tui.present import conditions_words, day, safe, split_short
from tui.widgets.structure import SchemeView


class HitCard(Vertical, can_focus=True):
    """One hit; Enter or a click opens the run."""

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("enter", "open", "Open run", id="card.open", tooltip="Open the run"),
        Binding("right", "app.focus_next", "Next", show=False, id="card.next"),
        Binding("left", "app.focus_previous", "Before", show=False, id="card.before"),
    ]

    class Opened(Message):
        """A hit is to be shown in full."""

        def __init__(self, hit: FindHit) -> None:
            super().__init__()
            self.hit = hit

    def __init__(self, hit: FindHit, drawing: SchemeDrawing, in_words: bool) -> None:
        super().__init__(classes="card")
        self.hit = hit
        self._drawing = drawing
        self._in_words = in_words

    def compose(self) -> ComposeResult:
        """Lay out the drawing and two lines."""
        run = self.hit.run
        score = f"  {self.hit.score:.2f}" if self.hit.score is not None else ""
        words = f"{safe(run.code or '')}  {run.verdict or 'no verdict'}{score}  {day(run.date)}"
        yield Static(Content(words), classes="card-title")
        view = SchemeView(classes="card-drawing")
        view.in_words = self._in_words
        view.show(self._drawing)
        yield view
        outcome = split_short(tuple(run.outcome.split.items())) or "split not measured"
        yield Static(Content(f"{outcome}; {conditions_words(run.conditions)}"), classes="card-words quiet")

    def action_open(self) -> None:
        """Open the run."""
        self.post_message(self.Opened(self.hit))

    def on_click(self, event: Click) -> None:
        """Open the run."""
        event.stop()
        self.action_open()


class HitGrid(VerticalScroll, can_focus=False):
    """All hits of a page."""

    def __init__(self, **options: Any) -> None:
        super().__init__(**options)

    @property
    def chosen(self) -> FindHit | None:
        """Return the hit in focus."""
        focused = self.screen.focused
        return focused.hit if isinstance(focused, HitCard) else None

    async def show(self, hits: Sequence[tuple[FindHit, SchemeDrawing]], empty: str, in_words: bool) -> None:
        """Replace the cards."""
        await self.remove_children()
        if not hits:
            await self.mount(Static(empty, markup=False, classes="quiet"))
            return
        cards = [HitCard(hit, drawing, in_words) for hit, drawing in hits]
        await self.mount(ItemGrid(*cards, min_column_width=28, classes="cards"))
        self.scroll_home(animate=False)

    def on_descendant_focus(self, event: DescendantFocus) -> None:
        """Bring the card into view."""
        if isinstance(event.widget, HitCard):
            event.widget.scroll_visible(animate=False)
            self.screen.refresh_bindings()
