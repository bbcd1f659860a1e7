"""Planning: the step is typed on the left, what the record says appears on the right while typing.

It wires; reading and checking are the book's. The scheme is read first and drawn; only a scheme that can be
read is checked. Whatever is in the form is kept as a draft, so that a closed lid loses nothing.
"""

from __future__ import annotations

from collections.abc import Sequence
from functools import partial
from typing import Any, ClassVar

from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Container, Vertical
from textual.content import Content
from textual.widgets import Static

from kb.chem.facts import Reading
from kb.chem.layout import SchemeDrawing
from kb.errors import Cancelled, ChemistryError, SidepathError
from kb.record.assessment import Assessment, Estimate
from kb.record.finding import Finding
from kb.record.plan import Plan
from tui.copy_texts import assessment_texts
from tui.drawings import scheme_drawing
from tui.jobs import EditLog
from tui.marks import mark_scheme
from tui.plan_state import PLAN_DRAFT, PlanRead, check_state, what_if_temperatures
from tui.ports import BookPort
from tui.present import advice_line, arrow_words, reading_words, safe
from tui.screens.base import PlaceScreen
from tui.styles import HERE
from tui.widgets.advice import AdviceList
from tui.widgets.estimate import EstimateBars
from tui.widgets.findings import FindingsList
from tui.widgets.panel import Panel
from tui.widgets.shelf import Shelf
from tui.widgets.step_form import StepForm
from tui.widgets.structure import SchemeView
from tui.widgets.tables import CodeTable, PrecedentTable

SETTLE_S = 0.15
"""Pause in typing after which the form is read [s].

Short enough to feel live, long enough to skip half words.
"""


class PlanningScreen(PlaceScreen):
    """Plan a step and see the answer as it is typed."""

    PLACE = "planning"
    CSS_PATH = HERE / "planning.tcss"
    HELP = """
Planning. Type the substrate or the whole scheme (SMILES, reaction SMILES, or a name), then the conditions;
several entries of a line are parted by semicolons, equivalents follow "=", parts of a solvent ":" (THF:4;
water:1). Names are completed from the catalogue: Enter or → takes the completion. The answer follows while
you type; Esc stops a check that takes long, Ctrl+R checks again.

What to expect shows the split between the fates with 80 % intervals. Known against it lists liabilities,
resemblance to recorded failures, house rules and cautions, most severe first; the highlighted one is marked
in the drawing, Enter tells all of it and opens the runs behind. Closest runs, one change and temperature
share the shelf. An estimate is no permission: local safety rules and qualified people decide.
"""
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("f9", "run_it", "Run it", key_display="F9", id="plan.run", tooltip="Record what came out of it"),
        Binding(
            "f7", "shelf", "Shelf", key_display="F7", id="plan.shelf", tooltip="Closest runs, one change, temperature"
        ),
        Binding("ctrl+l", "numbers", "Numbers", id="plan.numbers", tooltip="Atom numbers in the drawing"),
        Binding("ctrl+n", "clear", "New", id="plan.new", tooltip="Empty the form (can be undone)"),
        Binding("ctrl+r", "check_again", "Check again", show=False, id="plan.again", tooltip="Check the step again"),
        Binding("ctrl+z", "undo", "Undo", show=False, id="plan.undo", tooltip="Take back the last edit"),
        Binding("ctrl+y", "redo", "Redo", show=False, id="plan.redo", tooltip="Do the edit again"),
    ]

    def __init__(self) -> None:
        super().__init__()
        self._log = EditLog({})
        self._reading: Reading | None = None
        self._drawing: SchemeDrawing | None = None
        self._plan: Plan | None = None
        self._assessment: Assessment | None = None
        self._finding: Finding | None = None

    def compose_place(self) -> ComposeResult:
        """Lay out the step, the answer and the shelf."""
        with Container(id="planning"):
            with Vertical(id="step-side"):
                yield Panel("Step", StepForm(id="step-form"), id="step-panel")
                with Panel("Drawing", id="drawing-panel"):
                    yield SchemeView(id="plan-drawing", with_legend=True)
                    yield Static("", id="reading", markup=False)
            with Vertical(id="answer-side"):
                yield Panel("What to expect", EstimateBars(id="estimate"), id="estimate-panel")
                yield Panel("Known against it", FindingsList(id="findings"), id="findings-panel")
            yield Shelf(id="shelf")

    def on_mount(self) -> None:
        """Start in the scheme line."""
        super().on_mount()
        self.form.line("scheme").focus()

    @property
    def form(self) -> StepForm:
        """Return the form."""
        return self.query_one("#step-form", StepForm)

    def book_arrived(self, book: BookPort) -> None:
        """Take up what was kept, and read what is there."""
        self.form.use_book(book)
        self.refresh_bindings()
        if any(self.form.state.values()):
            self._read()
        else:
            self.ask("draft", lambda: book.load_draft(PLAN_DRAFT), self._take_draft)

    def _take_draft(self, draft: dict[str, Any] | None) -> None:
        if draft and not any(self.form.state.values()):
            self.take({k: v for k, v in draft.items() if isinstance(v, str)})

    def take(self, state: dict[str, str]) -> None:
        """Fill the form from elsewhere (a draft, a run planned again) and read it."""
        self.form.fill({field: state.get(field, "") for field in self.form.fields})
        self._log.note("*", self.form.state)
        self._read()

    # reading and checking

    @on(StepForm.Changed)
    def _edited(self, event: StepForm.Changed) -> None:
        self._log.note(event.field, self.form.state)
        self.later("read", SETTLE_S, self._read)

    def _read(self) -> None:
        """Put the form to the book; without a book or a scheme there is nothing to ask."""
        book, state = self.book, self.form.state
        if book is None:
            return
        if not book.is_read_only:
            self.ask("keep", partial(book.save_draft, PLAN_DRAFT, state), lambda _: None)
        if not state["scheme"].strip():
            for kind in ("read", "check", "whatif"):
                self.forget(kind)
            self._show_nothing("Type a scheme and the conditions.")
            return
        self.ask("read", partial(_read_scheme, state["scheme"].strip(), book), self._show_reading, self._show_bad)
        self.ask("check", partial(check_state, state, book), self._show_check, self._show_bad)

    def _show_reading(self, found: tuple[Reading, SchemeDrawing]) -> None:
        self._reading, self._drawing = found
        words = self.query_one("#reading", Static)
        words.set_class(not self._reading.ok, "-bad")
        told = ("" if self._reading.ok else "✗ ") + reading_words(self._reading)
        if str(words.content) != told:  # saves laying the screen out anew
            words.update(Content(told))
        self._draw()

    def _show_bad(self, error: SidepathError) -> None:
        """Show a scheme that nobody can read in its place; trouble with the book at the foot."""
        if isinstance(error, Cancelled):
            self.show_trouble(None)
            self._show_nothing("Stopped. Change a line, or press Ctrl+R, to check again.")
            return
        if not isinstance(error, ChemistryError):
            self.show_trouble(error)
            self._show_nothing("No answer; the foot of the screen says why.")
            return
        words = self.query_one("#reading", Static)
        words.add_class("-bad")
        words.update(Content(f"✗ {safe(error)}"))
        self._show_nothing("No answer: the scheme cannot be read.")

    def _show_check(self, found: tuple[PlanRead, Assessment | None]) -> None:
        read, assessment = found
        self._plan = read.plan
        self.form.show_errors(read.errors)
        self.show_trouble(None)
        if assessment is None:
            self._show_nothing("No answer: the scheme cannot be read.")
            return
        self._assessment = assessment
        self.query_one("#estimate", EstimateBars).estimate = assessment.estimate
        findings = self.query_one("#findings", FindingsList)
        findings.show(assessment.findings)
        self._finding = findings.highlighted_finding
        count = f" ({len(assessment.findings)})" if assessment.findings else ""
        self.query_one("#findings-panel", Panel).say(f"Known against it{count}")
        self.query_one(Shelf).show(assessment)
        self._draw()
        self._ask_what_if()

    def _show_nothing(self, why: str) -> None:
        self._assessment = None
        self._finding = None
        bars = self.query_one("#estimate", EstimateBars)
        bars.waiting, bars.estimate = why, None
        self.query_one("#findings", FindingsList).show((), "")
        self.query_one("#findings-panel", Panel).say("Known against it")
        self.query_one(Shelf).show(None)
        if not self.form.state["scheme"].strip():
            self._reading = self._drawing = None
            words = self.query_one("#reading", Static)
            words.remove_class("-bad")
            words.update("")
            self.form.show_errors({})
            self._draw()

    def _draw(self) -> None:
        view = self.query_one("#plan-drawing", SchemeView)
        view.in_words = self.app.in_words
        if self._drawing is None:
            view.show(None)
            return
        above, below = arrow_words(self._plan.conditions) if self._plan else ("", "")
        has_arrow = self._drawing.has_arrow
        marked = mark_scheme(self._drawing, self._reading, self._finding)
        view.show(marked, above if has_arrow else "", below if has_arrow else "")

    @on(Shelf.Turned)
    def _ask_what_if(self) -> None:
        """Ask for the temperatures while their plot can be seen."""
        book, assessment, shelf = self.book, self._assessment, self.query_one(Shelf)
        if book is None or not shelf.is_temperature_in_view:
            return
        if assessment is None:
            shelf.show_what_if((), "Nothing to plot yet.")
            return
        plan = assessment.plan
        self.ask("whatif", partial(self._what_if, plan, book), self._show_what_if, self._no_what_if)

    def _what_if(self, plan: Plan, book: BookPort) -> list[tuple[float, Estimate]]:
        """In the thread: one temperature at a time, given up as soon as the plan has changed."""
        points: list[tuple[float, Estimate]] = []
        for temperature_c in what_if_temperatures(plan):
            if self._assessment is None or self._assessment.plan is not plan:
                raise Cancelled("The plan changed.")
            points.extend(book.what_if(plan, (temperature_c,)))
        return points

    def _no_what_if(self, error: SidepathError) -> None:
        self.show_trouble(None if isinstance(error, Cancelled) else error)

    def _show_what_if(self, points: Sequence[tuple[float, Estimate]]) -> None:
        remark = "" if points else "Give a temperature in numbers to see what others would do."
        self.query_one(Shelf).show_what_if(points, remark)

    # opening what is behind

    @on(FindingsList.Looked)
    def _looked(self, event: FindingsList.Looked) -> None:
        self._finding = event.finding
        self._draw()

    @on(FindingsList.Opened)
    def _open_finding(self, event: FindingsList.Opened) -> None:
        from tui.screens.finding_detail import FindingScreen

        self.app.push_screen(FindingScreen(event.finding, self._drawing, self._reading))

    @on(EstimateBars.BehindAsked)
    def _open_behind(self) -> None:
        if self._assessment is None or not self._assessment.precedents:
            self.app.notify("There are no own runs behind these figures.", markup=False)
            return
        self.query_one(Shelf).index = 0
        self.query_one("#precedents", PrecedentTable).focus()

    @on(CodeTable.Opened)
    def _open_run(self, event: CodeTable.Opened) -> None:
        from tui.screens.run_detail import RunScreen

        self.app.push_screen(RunScreen(event.code))

    @on(AdviceList.Opened)
    def _open_advice(self, event: AdviceList.Opened) -> None:
        from tui.screens.asking import WordsScreen

        change, effect = advice_line(event.advice)
        self.app.push_screen(WordsScreen(change, f"{effect}\n\n{safe(event.advice.why, keep_lines=True)}"))

    # actions

    def copy_texts(self) -> dict[str, str]:
        """Return the checked plan, or the scheme alone before it is checked."""
        if self._assessment is not None:
            return assessment_texts(self._assessment)
        scheme = self.form.state["scheme"].strip()
        return {"SMILES": scheme} if scheme else {}

    def check_action(self, action: str, parameters: tuple[object, ...]) -> bool | None:
        """Grey out what makes no sense now."""
        if action == "run_it":
            return None if self.book is None or self.book.is_read_only else True
        return super().check_action(action, parameters)

    def action_run_it(self) -> None:
        """Open the entry form with this plan."""
        from tui.screens.entry import EntryScreen

        state = self.form.state
        if not state["scheme"].strip():
            self.app.notify("Type a scheme first.", markup=False)
            return
        self.app.push_screen(EntryScreen(state))

    def action_check_again(self) -> None:
        """Put the form to the book once more, after a stop or when others have recorded runs."""
        self._read()

    def action_shelf(self) -> None:
        """Turn the shelf."""
        self.query_one(Shelf).turn()

    def action_numbers(self) -> None:
        """Show or hide atom numbers."""
        view = self.query_one("#plan-drawing", SchemeView)
        view.numbers = not view.numbers

    def action_clear(self) -> None:
        """Empty the form."""
        self.take({})
        self.form.line("scheme").focus()

    def action_undo(self) -> None:
        """Take back the last edit."""
        self._restore(self._log.undo(), "Nothing to undo.")

    def action_redo(self) -> None:
        """Do the edit again."""
        self._restore(self._log.redo(), "Nothing to redo.")

    def _restore(self, state: dict[str, str] | None, otherwise: str) -> None:
        if state is None:
            self.app.notify(otherwise, markup=False, timeout=2)
            return
        self.form.fill({field: state.get(field, "") for field in self.form.fields})
        self._read()


def _read_scheme(text: str, book: BookPort) -> tuple[Reading, SchemeDrawing]:
    """In the thread: read a scheme and lay it out."""
    scheme = book.scheme_text(text)
    return book.read_scheme(scheme), scheme_drawing(scheme)
