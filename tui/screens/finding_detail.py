"""One finding in full.

Why, the motif drawn, what would form, the own runs behind it, what others do, the source.
"""

from __future__ import annotations

from functools import partial
from typing import ClassVar

from rich.text import Text
from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal, Vertical, VerticalScroll
from textual.screen import ModalScreen
from textual.widgets import Footer, OptionList, Static
from textual.widgets.option_list import Option

from kb.chem.facts import Reading
from kb.chem.layout import SchemeDrawing
from kb.record.finding import Finding
from tui.drawings import scheme_drawing
from tui.marks import mark_scheme
from tui.present import evidence_words, finding_line, safe
from tui.styles import HERE
from tui.widgets.structure import SchemeView


class FindingScreen(ModalScreen[None]):
    """One finding; Enter on a run opens it."""

    AUTO_FOCUS = "#finding-runs, #finding-body"

    CSS_PATH = HERE / "runs.tcss"
    HELP = """
One finding in full: why it fires, the motif in the drawing, what would form, and the runs of this book in which the
group was lost or survived. Enter on a run opens it; Escape goes back to the plan.
"""
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "dismiss", "Back", key_display="Esc", id="finding.back", tooltip="Back to the plan"),
        Binding("f1", "help", "Help", key_display="F1", id="finding.help", tooltip="What this shows, and its keys"),
    ]

    def __init__(self, finding: Finding, drawing: SchemeDrawing | None, reading: Reading | None) -> None:
        super().__init__(classes="dialog-back")
        self._finding = finding
        self._drawing = drawing
        self._reading = reading

    def compose(self) -> ComposeResult:
        """Lay out what there is; parts without content are left out."""
        finding = self._finding
        with Vertical(classes="dialog finding-dialog"):
            style = self.app.theme_variables.get(f"severity-{finding.severity}", "")
            yield Static(Text(finding_line(finding), style=f"bold {style}"))
            with VerticalScroll(id="finding-body"):
                yield Static(Text(safe(finding.why, keep_lines=True)))
                with Horizontal(id="finding-drawings"):
                    if self._drawing is not None and finding.component is not None and finding.atoms:
                        yield SchemeView(id="finding-drawing", with_legend=True)
                    if finding.side_product:
                        yield Static("would\nform", classes="quiet finding-word", markup=False)
                        yield SchemeView(id="finding-product")
                for words in self._remarks():
                    yield Static(words)
            runs = finding.evidence.runs if finding.evidence else ()
            if runs:
                options = [Option(self._run_line(i, code), id=f"run-{i}") for i, code in enumerate(runs)]
                yield OptionList(*options, compact=True, markup=False, id="finding-runs")

        yield Footer(show_command_palette=False)

    def action_help(self) -> None:
        """Show the help of this screen."""
        from tui.screens.help import HelpScreen

        self.app.push_screen(HelpScreen(self))

    def on_mount(self) -> None:
        """Draw the motif, and lay the side product out in a worker."""
        views = self.query("#finding-drawing").results(SchemeView)
        for view in views:
            assert self._drawing is not None  # only then is the view there
            substrate = self._finding.component
            marked = mark_scheme(self._drawing, self._reading, self._finding)
            pieces = marked.left + marked.agents
            if substrate is not None and substrate < len(pieces):
                view.show(SchemeDrawing(left=(pieces[substrate],)))
        if self._finding.side_product:
            self.run_worker(
                partial(self._lay_out, self._finding.side_product), thread=True, exit_on_error=False, group="draw"
            )

    def _lay_out(self, smiles: str) -> None:
        drawing = scheme_drawing(smiles)
        self.app.call_from_thread(self._show_product, drawing)

    def _show_product(self, drawing: SchemeDrawing) -> None:
        for view in self.query("#finding-product").results(SchemeView):
            view.show(drawing)

    def _remarks(self) -> list[Text]:
        finding = self._finding
        lines: list[Text] = []
        if evidence := evidence_words(finding.evidence, finding.kind):
            lines.append(_line("Own record", evidence))
        for number, words in enumerate(finding.do_instead):
            lines.append(_line("Do instead" if number == 0 else "", safe(words)))
        if finding.is_uncertain:
            lines.append(_line("Open", "the conditions do not say enough to tell"))
        if finding.source:
            lines.append(_line("Source", safe(finding.source)))
        lines.append(_line("", "Local safety rules and qualified people decide."))
        return lines

    def _run_line(self, position: int, code: str) -> Text:
        evidence = self._finding.evidence
        word = "lost" if evidence and position < evidence.lost else "survived"
        text = Text(safe(code), style="bold")
        text.append(f"  {word}; Enter opens it", style="dim")
        return text

    @on(OptionList.OptionSelected, "#finding-runs")
    def _open(self, event: OptionList.OptionSelected) -> None:
        from tui.screens.run_detail import RunScreen

        event.stop()
        evidence = self._finding.evidence
        if evidence is not None:
            self.app.push_screen(RunScreen(evidence.runs[event.option_index]))


def _line(word: str, value: str) -> Text:
    text = Text(f"{word:<11} ", style="bold")
    text.append(value, style="not bold")
    return text
