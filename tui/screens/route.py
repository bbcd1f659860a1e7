"""Route: a sequence of steps, what it yields and needs, where it is weak, and what another yield would do.

It wires; looking up and reckoning are the book's, applying what-ifs is `tui.route_state`. The file is never written:
what is typed here lives until another file is opened, and every edit can be undone.
"""

from __future__ import annotations

from functools import partial
from pathlib import Path
from typing import ClassVar

from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Container, Vertical
from textual.content import Content
from textual.widgets import Static

from kb.chem.layout import SchemeDrawing
from kb.errors import SidepathError
from kb.record.finding import Finding
from kb.route.entries import Ledger
from kb.route.sequence import Route, Step
from tui.drawings import scheme_drawing
from tui.marks import mark_scheme
from tui.plan_state import state_of_plan
from tui.ports import BookPort, Imagined
from tui.present import arrow_words, reading_words, safe
from tui.route_state import MATTERS, TARGET, Edits, edit_name, lines_of, next_reason, wanted_in_file
from tui.route_words import rests_words, route_texts
from tui.screens.base import PlaceScreen
from tui.styles import HERE
from tui.widgets.findings import FindingsList
from tui.widgets.panel import Panel
from tui.widgets.route_lines import WANTED, RouteLines
from tui.widgets.route_sequence import RouteSequence
from tui.widgets.route_sum import RouteSum
from tui.widgets.structure import SchemeView

SETTLE_S = 0.15
"""Pause in typing after which the route is reckoned again [s]."""

NEEDS_ROUTE = ("reload", "wanted", "yield_line", "conditions", "matters", "as_in_file", "worries", "plan_it", "page")


class RoutePlace(PlaceScreen):
    """A route, reckoned as it is changed."""

    PLACE = "route"
    CSS_PATH = HERE / "route.tcss"
    HELP = """
Route. Opens a route file (o), or the demo's (e), and lists its steps: the main line at the edge, a branch indented
above the step that it joins. Each step has its yield with an 80 % interval and says where that comes from: the
record, an estimate, or typed in the file. Enter opens the runs behind it, f goes to what is known against it.

What if: type another yield (y) or other conditions (c) for the highlighted step, or another amount wanted (w); the sum
follows while you type, the file stays as it is. m says why a poor yield does not matter in a step; it is then no
weakness, and material that is cheap by that word costs nothing. Where the file names prices, steps are weighed in
money. x takes the step back to what the file says, Ctrl+Z undoes one edit. p takes the step to planning.

Yields of different steps are taken as independent: one bad bottle used in five steps breaks that. An estimate is no
permission: local safety rules and qualified people decide.
"""
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("o", "open_file", "Open", id="route.open", tooltip="Open a route file; recent ones are listed"),
        Binding("y", "yield_line", "Yield", id="route.yield", tooltip="Type another yield for the step"),
        Binding("c", "conditions", "Conditions", id="route.conditions", tooltip="Type other conditions for the step"),
        Binding("w", "wanted", "Wanted", id="route.wanted", tooltip="Type another amount of the product"),
        Binding("m", "matters", "May be poor", id="route.matters", tooltip="Say why a poor yield does not matter here"),
        Binding("f", "worries", "Findings", id="route.findings", tooltip="Go to what is known against the step"),
        Binding("p", "plan_it", "Plan", id="route.plan", tooltip="Take the step to planning, as it stands here"),
        Binding("x", "as_in_file", "As in file", id="route.reset", tooltip="Forget what was typed for the step"),
        Binding("f9", "page", "Page", key_display="F9", id="route.page", tooltip="Save a page to hand round"),
        Binding("e", "example", "Example", show=False, id="route.example", tooltip="Open the route of the demo book"),
        Binding("ctrl+r", "reload", "Reload", show=False, id="route.reload", tooltip="Read the file again"),
        Binding("escape", "to_steps", "Steps", show=False, id="route.steps", tooltip="Back to the list of steps"),
        Binding("ctrl+l", "numbers", "Numbers", show=False, id="route.numbers", tooltip="Atom numbers in the drawing"),
        Binding("ctrl+z", "undo", "Undo", show=False, id="route.undo", tooltip="Take back the last edit"),
        Binding("ctrl+y", "redo", "Redo", show=False, id="route.redo", tooltip="Do the edit again"),
    ]

    def __init__(self) -> None:
        super().__init__()
        self._path = ""
        self._route: Route | None = None
        self._base: Ledger | None = None
        self._ledger: Ledger | None = None
        self._errors: dict[str, SidepathError] = {}
        self._edits = Edits()
        self._step: Step | None = None
        self._drawing: SchemeDrawing | None = None
        self._finding: Finding | None = None

    def compose_place(self) -> ComposeResult:
        """Lay out the steps, the sum and the chosen step."""
        with Container(id="route"):
            with Vertical(id="route-side"):
                yield Panel("Sequence", RouteSequence(id="route-steps"), id="route-steps-panel")
                with Panel("Step", id="route-drawing-panel"):
                    yield SchemeView(id="route-drawing", with_legend=True)
                    yield Static("", id="route-reading", markup=False)
            yield Panel("Overall", RouteSum(id="route-sum"), id="route-sum-panel")
            with Vertical(id="route-step"):
                yield Panel("What if", RouteLines(id="route-lines"), id="route-lines-panel")
                yield Panel("Known against it", FindingsList(id="route-findings"), id="route-findings-panel")

    def on_mount(self) -> None:
        """Start in the list."""
        super().on_mount()
        self.query_one(RouteSequence).show(None, None)
        self.query_one("#route").add_class("-empty")
        self.query_one(RouteSequence).focus()

    def book_arrived(self, book: BookPort) -> None:
        """Look the open route up in the book; another book may know other runs."""
        self.query_one(RouteLines).use_book(book)
        if self._path:
            self._open(self._path)
        self.refresh_bindings()

    # opening

    def _open(self, path: str) -> None:
        from tui.screens.route_files import RouteFilesScreen

        self.app.push_screen(RouteFilesScreen(self._path, path), self._take)

    def _take(self, opened: tuple[str, Route] | None) -> None:
        """Take a route that was opened; the edits of the one before are forgotten, those of the same file stay."""
        if opened is None or self.book is None:
            return
        path, self._route = opened
        if path != self._path:
            self._path, self._edits = path, Edits()
        self._base = self._ledger = None
        self.show_trouble(None)
        self.query_one("#route-steps-panel", Panel).say(f"Sequence: {safe(self._route.title, 40)}")
        self.ask("base", partial(self.book.imagine_route, self._route, {}), self._take_base)
        self.query_one(RouteSequence).focus()

    def _take_base(self, found: Imagined) -> None:
        self._base = found.ledger
        self._reckon()

    # what if

    @on(RouteLines.Changed)
    def _edited(self, event: RouteLines.Changed) -> None:
        step = self._step
        if event.field == WANTED:
            self._edit(TARGET, event.text, wanted_in_file(self._route))
        elif step is not None and self._route is not None:
            own = lines_of(self._route.step(step.name))[event.field]
            self._edit(edit_name(step.name, event.field), event.text, own)

    def _edit(self, name: str, text: str, in_file: str) -> None:
        self._edits.note(name, text, in_file)
        self.later("reckon", SETTLE_S, self._reckon)

    def _reckon(self) -> None:
        if self.book is not None and self._route is not None:
            self.ask("reckon", partial(self.book.imagine_route, self._route, dict(self._edits.texts)), self._show)

    def _show(self, found: Imagined) -> None:
        self._ledger, self._errors = found.ledger, dict(found.errors)
        self.show_trouble(None)
        changed = f", {len(self._edits.texts)} changed" if self._edits.texts else ""
        self.query_one("#route-sum-panel", Panel).say(f"Overall, {len(found.ledger.entries)} steps{changed}")
        self.query_one("#route").remove_class("-empty")
        self.query_one(RouteSequence).show(found.ledger, self._base)
        self.refresh_bindings()

    @on(RouteSequence.Looked)
    def _looked(self, event: RouteSequence.Looked) -> None:
        self._step = event.step
        self.query_one(RouteSum).show(self._ledger, self._base, event.step.name if event.step else "")
        self._fill_lines()
        self._show_findings()
        self._draw_step()

    def _fill_lines(self) -> None:
        """Show the lines of the step as typed, else as in the file; nothing that is being typed is touched."""
        step, lines = self._step, self.query_one(RouteLines)
        if step is None or self._route is None:
            lines.fill({}, {}, set(), True)
            lines.show_errors({})
            self.query_one("#route-lines-panel", Panel).say("What if")
            return
        own = lines_of(self._route.step(step.name))
        typed = {f: text for f, text in self._edits.of_step(step.name).items() if f in own}
        if TARGET in self._edits.texts:
            typed[WANTED] = self._edits.texts[TARGET]
        pct = step.yield_pct.pct
        hints = {"yield": f"{pct.mean:.0f} ({pct.low:.0f}–{pct.high:.0f})"}
        lines.fill({**own, WANTED: wanted_in_file(self._route), **typed}, hints, set(typed), step.plan is None)
        errors = {f: self._errors[edit_name(step.name, f)] for f in own if edit_name(step.name, f) in self._errors}
        if TARGET in self._errors:
            errors[WANTED] = self._errors[TARGET]
        lines.show_errors(errors)
        self.query_one("#route-lines-panel", Panel).say(f"What if: {safe(step.name, 30)}")

    # the chosen step

    def _show_findings(self) -> None:
        step = self._step
        found = step.assessment.findings if step is not None and step.assessment is not None else ()
        has_scheme = step is not None and step.assessment is not None
        empty = "" if step is None else "Nothing known against it." if has_scheme else "No scheme, so nothing to check."
        listing = self.query_one("#route-findings", FindingsList)
        listing.show(found, empty)
        self._finding = listing.highlighted_finding
        count = f" ({len(found)})" if found else ""
        self.query_one("#route-findings-panel", Panel).say(f"Known against it{count}")

    def _draw_step(self) -> None:
        step = self._step
        words = self.query_one("#route-reading", Static)
        self._drawing = None
        if step is None:
            words.update("")
            self._show_drawing()
            return
        reading = f" {reading_words(step.assessment.reading)}" if step.assessment is not None else ""
        words.update(Content(rests_words(step) + reading))
        self.query_one("#route-drawing-panel", Panel).say(f"Step: {safe(step.name, 30)}")
        text = step.plan.scheme if step.plan is not None else step.product
        if text is None:
            self.forget("draw")
            self._show_drawing()
        else:
            self.ask("draw", partial(scheme_drawing, text), self._take_drawing)

    def _take_drawing(self, drawing: SchemeDrawing) -> None:
        self._drawing = drawing
        self._show_drawing()

    def _show_drawing(self) -> None:
        view = self.query_one("#route-drawing", SchemeView)
        view.in_words = self.app.in_words
        view.placeholder = "Neither scheme nor product is in the file." if self._step is not None else ""
        step = self._step
        if self._drawing is None or step is None:
            view.show(None)
            return
        reading = step.assessment.reading if step.assessment is not None else None
        above, below = arrow_words(step.plan.conditions) if step.plan and self._drawing.has_arrow else ("", "")
        view.show(mark_scheme(self._drawing, reading, self._finding), above, below)

    @on(FindingsList.Looked)
    def _finding_looked(self, event: FindingsList.Looked) -> None:
        self._finding = event.finding
        self._show_drawing()

    @on(FindingsList.Opened)
    def _open_finding(self, event: FindingsList.Opened) -> None:
        from tui.screens.finding_detail import FindingScreen

        reading = self._step.assessment.reading if self._step and self._step.assessment else None
        self.app.push_screen(FindingScreen(event.finding, self._drawing, reading))

    @on(RouteSequence.BehindAsked)
    def _open_behind(self, event: RouteSequence.BehindAsked) -> None:
        from tui.screens.route_runs import open_runs_behind

        open_runs_behind(self.app, event.step)

    # actions

    def copy_texts(self) -> dict[str, str]:
        """Return the route as reckoned now."""
        return route_texts(self._ledger, self._step) if self._ledger is not None else {}

    def check_action(self, action: str, parameters: tuple[object, ...]) -> bool | None:
        """Grey out what needs a route."""
        if action in NEEDS_ROUTE:
            return True if self._ledger is not None else None
        return True

    def action_open_file(self) -> None:
        """Ask which file."""
        self._open("")

    def action_reload(self) -> None:
        """Read the file again."""
        self._open(self._path)

    def action_example(self) -> None:
        """Open the demo's route."""
        if self.book is not None:
            self.ask("example", self.book.route_example, self._open)

    def action_to_steps(self) -> None:
        """Go to the list of steps."""
        self.query_one(RouteSequence).focus()

    def action_wanted(self) -> None:
        """Go to the amount wanted."""
        self.query_one(RouteLines).line(WANTED).focus()

    def action_yield_line(self) -> None:
        """Go to the yield."""
        self.query_one(RouteLines).line("yield").focus()

    def action_conditions(self) -> None:
        """Go to the conditions."""
        if self._step is not None and self._step.plan is None:
            self.app.notify("The file has no scheme for this step; type another yield.", markup=False)
            return
        self.query_one(RouteLines).line("solvent").focus()

    def action_worries(self) -> None:
        """Go to the findings."""
        self.query_one("#route-findings", FindingsList).focus()

    def action_matters(self) -> None:
        """Take the next reason why a poor yield does not matter."""
        if self._step is not None and self._route is not None:
            in_file = self._route.step(self._step.name).forgiven
            self._edit(edit_name(self._step.name, MATTERS), next_reason(self._step), in_file[0] if in_file else "")

    def action_as_in_file(self) -> None:
        """Forget the edits of the step; Ctrl+Z brings them back."""
        if self._step is not None:
            self._edits.forget_step(self._step.name)
            self._reckon()

    async def action_plan_it(self) -> None:
        """Take the step to planning."""
        if self._step is None:
            return
        if self._step.plan is None:
            self.app.notify("The file has no scheme for this step.", markup=False)
            return
        await self.app.plan_from(state_of_plan(self._step.plan))

    def action_page(self) -> None:
        """Ask where to save the page."""
        from tui.screens.asking import LineScreen

        name = f"{Path(self._path).stem or 'route'}.html"
        words = "As it is reckoned now, what-ifs included. A name that ends in .md gives Markdown."
        self.app.push_screen(LineScreen("Save the page of this route", words, name, go="Save"), self._save)

    def _save(self, name: str | None) -> None:
        book, ledger = self.book, self._ledger
        if name is not None and book is not None and ledger is not None:
            self.ask("page", partial(book.save_page, ledger, name), self._saved)

    def _saved(self, place: str) -> None:
        self.show_trouble(None)
        self.app.notify(f"Wrote {safe(place)}.", markup=False)

    def action_numbers(self) -> None:
        """Show or hide atom numbers."""
        view = self.query_one("#route-drawing", SchemeView)
        view.numbers = not view.numbers

    def action_undo(self) -> None:
        """Take back the last edit."""
        self._restored(self._edits.undo(), "Nothing to undo.")

    def action_redo(self) -> None:
        """Do the edit again."""
        self._restored(self._edits.redo(), "Nothing to redo.")

    def _restored(self, is_done: bool, otherwise: str) -> None:
        if is_done:
            self._reckon()
        else:
            self.app.notify(otherwise, markup=False, timeout=2)
