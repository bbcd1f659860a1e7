"""Structures and schemes in braille cells: shows a drawing at whatever size the widget has.

It rasters (`tui.raster`, `tui.scheme_raster`), caches the strips until size or drawing change, and colours
the inks by component classes. Where the screen is set to words, or nothing can be drawn, the text
alternative stands instead.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, ClassVar

from rich.segment import Segment
from rich.style import Style
from textual.content import Content
from textual.reactive import reactive
from textual.strip import Strip
from textual.widget import Widget

from kb.chem.layout import MARK_GLYPHS, MARK_WORDS, MarkKind, SchemeDrawing
from kb.plain import plain
from tui.raster import Cell
from tui.scheme_raster import Panel, fit_scheme

Rows = tuple[tuple[Cell | None, ...], ...]

SHORT_WORDS = {MarkKind.CENTRE: "carbon", MarkKind.LEAVING: "leaves", MarkKind.MOTIF: "motif"}
"""What marks mean, for panels too narrow for the whole words."""


class SchemeView(Widget):
    """One scheme or structure."""

    COMPONENT_CLASSES: ClassVar[set[str]] = {
        "drawing--bond",
        "drawing--label",
        "drawing--number",
        "drawing--arrow",
        "drawing--notice",
        "drawing--centre",
        "drawing--leaving",
        "drawing--motif",
        "drawing--match",
    }

    drawing: reactive[SchemeDrawing | None] = reactive(None)
    above: reactive[str] = reactive("")
    below: reactive[str] = reactive("")
    numbers: reactive[bool] = reactive(False)
    in_words: reactive[bool] = reactive(False)
    placeholder: reactive[str] = reactive("")

    def __init__(
        self, *, with_legend: bool = False, legend_words: Mapping[MarkKind, str] | None = None, **options: Any
    ) -> None:
        super().__init__(**options)
        self._with_legend = with_legend
        self._legend_words = {**MARK_WORDS, **(legend_words or {})}
        self._strips: list[Strip] = []
        self._made_for: object = None

    def show(self, drawing: SchemeDrawing | None, above: str = "", below: str = "") -> None:
        """Show a drawing with the words for its arrow; None clears."""
        self.drawing = drawing
        self.above = above
        self.below = below
        self.tooltip = Content(self.text_alternative) if drawing else None

    def watch_drawing(self) -> None:
        """Throw the old strips away."""
        self._made_for = None

    @property
    def text_alternative(self) -> str:
        """Return what the drawing shows, in words."""
        if self.drawing is None:
            return self.placeholder
        parts = []
        sides = (("", self.drawing.left), ("with ", self.drawing.agents), ("gives ", self.drawing.right))
        for lead, pieces in sides:
            for piece in pieces:
                words = piece.drawing.text_alternative if piece.drawing else f"{piece.smiles}: {piece.reason}"
                parts.append(lead + plain(words))
        return " ".join(parts)

    @property
    def mark_kinds(self) -> tuple[MarkKind, ...]:
        """Return the marks that show, for a legend."""
        if self.drawing is None:
            return ()
        pieces = self.drawing.left + self.drawing.agents + self.drawing.right
        shown = {kind for piece in pieces if piece.drawing for kind in piece.drawing.mark_kinds}
        return tuple(kind for kind in MarkKind if kind in shown)

    def notify_style_update(self) -> None:
        """Colour again after a change of theme."""
        super().notify_style_update()
        self._made_for = None

    def render_line(self, y: int) -> Strip:
        """Return one line of the drawing."""
        wanted = (
            self.size,
            self.drawing,
            self.above,
            self.below,
            self.numbers,
            self.in_words,
            self.placeholder,
        )
        if wanted != self._made_for:
            self._strips = self._make_strips(self.size.width, self.size.height)
            self._made_for = wanted
        return self._strips[y] if y < len(self._strips) else Strip.blank(self.size.width, self.rich_style)

    def _make_strips(self, width: int, height: int) -> list[Strip]:
        if width < 1 or height < 1:
            return []
        if self.drawing is None or self.in_words:
            return self._text_strips(self.text_alternative, width, height)
        legend = self._legend(width) if self._with_legend else []
        free = height - (1 if legend and height > 4 else 0)
        panel: Panel = fit_scheme(self.drawing, width, free, self.above, self.below, self.numbers)
        strips = [self._strip(row) for row in panel.rows]
        if panel.notice:
            text = plain(panel.notice)[:width].ljust(width)
            strips[-1] = Strip([Segment(text, self._ink("notice"))], width)
        if legend and height > 4:
            strips.append(Strip(legend).adjust_cell_length(width, self.rich_style))
        return strips

    def _legend(self, width: int) -> list[Segment]:
        """Say what the marks mean, in short words where the long ones do not all fit."""
        long = [f"{MARK_GLYPHS[kind]} {self._legend_words[kind]}" for kind in self.mark_kinds]
        fits = len("  ".join(long)) <= width
        short = [f"{MARK_GLYPHS[kind]} {self._short_word(kind)}" for kind in self.mark_kinds]
        segments: list[Segment] = []
        used = 0
        for kind, words in zip(self.mark_kinds, long if fits else short, strict=True):
            if used + len(words) > width:
                break
            used += len(words) + 2
            segments += [Segment(words, self._ink(str(kind))), Segment("  ", self.rich_style)]
        return segments

    def _short_word(self, kind: MarkKind) -> str:
        words = self._legend_words[kind]
        return SHORT_WORDS.get(kind, words) if words == MARK_WORDS[kind] else words

    def _strip(self, row: tuple[Cell | None, ...]) -> Strip:
        segments: list[Segment] = []
        run, ink = "", ""
        for cell in row:
            char, this = (cell.char, cell.ink) if cell else (" ", "")
            if this != ink and run:
                segments.append(Segment(run, self._ink(ink)))
                run = ""
            run, ink = run + char, this
        segments.append(Segment(run, self._ink(ink)))
        return Strip(segments, len(row))

    def _ink(self, name: str) -> Style:
        return self.get_component_rich_style(f"drawing--{name}") if name else self.rich_style

    def _text_strips(self, text: str, width: int, height: int) -> list[Strip]:
        lines: list[str] = []
        for word in text.split():
            while len(word) > width:
                lines.append(word[:width])
                word = word[width:]
            if lines and len(lines[-1]) + 1 + len(word) <= width and lines[-1]:
                lines[-1] += " " + word
            else:
                lines.append(word)
        style = self._ink("notice")
        return [Strip([Segment(line.ljust(width), style)], width) for line in lines[:height]]
