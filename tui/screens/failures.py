"""Failures: the record as a whole in five parts, for whoever heads the group.

What recurs, when and where, hindsight, coverage, trust. Short questions are asked when a part is first seen; long ones
on a key. Each runs in a worker with progress and can be stopped; answers that are out of date are dropped, and an
answer that is older than the record says so. Nothing here is about people.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import partial
from typing import Any, ClassVar

from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal
from textual.content import Content
from textual.widgets import ContentSwitcher, Static
from textual.worker import Worker, WorkerState

from kb.chem.layout import MarkKind, SchemeDrawing
from kb.errors import Cancelled, SidepathError
from tui.copy_texts import audit_texts
from tui.drawings import scheme_drawing
from tui.failure_words import tally_markdown
from tui.jobs import ThreadProgress
from tui.marks import mark_match
from tui.messages import JobProgressed
from tui.plan_state import state_of_run
from tui.ports import BookPort
from tui.present import safe
from tui.screens.base import PlaceScreen
from tui.styles import HERE
from tui.widgets.audit_view import AuditView
from tui.widgets.coverage_view import CoverageView
from tui.widgets.hindsight_view import HindsightView
from tui.widgets.recurring_view import RecurringView
from tui.widgets.tally_view import TallyView
from tui.widgets.trust_view import TrustView

VIEWS: tuple[type[AuditView], ...] = (RecurringView, TallyView, HindsightView, CoverageView, TrustView)
KINDS = tuple(view.KIND for view in VIEWS)
OUT_OF_DATE = "The record has changed since; F9 looks again."


class FailuresPlace(PlaceScreen):
    """The record as a whole."""

    PLACE = "failures"
    CSS_PATH = HERE / "failures.tcss"
    HELP = """
Failures. The record as a whole, in five parts: 1 what recurs, 2 when and where, 3 hindsight (would the record have
told us?), 4 coverage (what we know nothing of, and what to try next), 5 trust (how well the estimates hold). Arrow
keys walk through the figures; Enter or r shows the runs behind the one under the cursor; s shows the figures another
way. F9 looks again, Escape stops what is being reckoned.

On a kind of failure, a adopts the house rule that is proposed for it: it then warns in every check. First you see what
it would have warned of in the whole book, and its false alarms.
"""
    BINDINGS: ClassVar[list[BindingType]] = [
        *(
            Binding(
                str(number),
                f"view('{view.KIND}')",
                view.TITLE,
                show=False,
                id=f"failures.{view.KIND}",
                tooltip=f"Show the part: {view.TITLE.lower()}",
            )
            for number, view in enumerate(VIEWS, 1)
        ),
        Binding(
            "r", "runs", "Runs", id="failures.runs", tooltip="The runs behind the figure under the cursor"
        ),
        Binding("s", "turn", "Show by", id="failures.turn", tooltip="Another order, count, table or choice"),
        Binding(
            "a", "adopt", "Adopt rule", id="failures.adopt", tooltip="Adopt the house rule that is proposed"
        ),
        Binding(
            "p",
            "plan_it",
            "Plan",
            id="failures.plan",
            tooltip="Take the latest such run or the experiment to planning",
        ),
        Binding(
            "f9",
            "look",
            "Look",
            key_display="F9",
            id="failures.look",
            tooltip="Ask the record, or ask it again",
        ),
        Binding("escape", "stop", "Stop", id="failures.stop", tooltip="Stop what is being reckoned"),
    ]

    def __init__(self) -> None:
        super().__init__()
        self._asked: dict[str, ThreadProgress] = {}
        self._of_change: dict[str, int] = {}

    def compose_place(self) -> ComposeResult:
        """Lay out the parts."""
        with Horizontal(id="failures-head"):
            yield Static("", id="failures-tabs")
        with ContentSwitcher(initial=f"view-{KINDS[0]}", id="failures-parts"):
            for view in VIEWS:
                yield view()
        yield Static("", id="failures-state", markup=False)

    def on_mount(self) -> None:
        """Show the first part."""
        super().on_mount()
        self._show_tabs()

    def on_unmount(self) -> None:
        """Ask everything to stop, so that leaving the program waits for nothing."""
        for progress in self._asked.values():
            progress.cancel()

    def book_arrived(self, book: BookPort) -> None:
        """Forget what was said of another book."""
        for kind in KINDS:
            self.forget(kind)
        for progress in self._asked.values():
            progress.cancel()
        self._asked.clear()
        self._of_change.clear()
        for view in self.query(AuditView):
            view.show(None)
        self._ask_if_short()

    def on_screen_resume(self) -> None:
        """Ask again where the record has changed and the question is short."""
        if self.book is not None and self.is_mounted:
            self._ask_if_short()

    # parts

    @property
    def view(self) -> AuditView:
        """Return the part in view."""
        return self.query_one(f"#{self.query_one(ContentSwitcher).current}", AuditView)

    def action_view(self, kind: str) -> None:
        """Show a part."""
        self.query_one(ContentSwitcher).current = f"view-{kind}"
        self.show_trouble(None)
        self._show_tabs()
        self._ask_if_short()
        self.view.take_focus()
        self.refresh_bindings()

    def _show_tabs(self) -> None:
        parts = []
        for number, view in enumerate(VIEWS, 1):
            here = view.KIND == self.view.KIND
            text = f"{'▸' if here else ' '}{number} {view.TITLE} "
            style = "bold $accent" if here else "$foreground"
            parts.append(Content.styled(text, style).stylize(f"@click=screen.view('{view.KIND}')"))
        self.query_one("#failures-tabs", Static).update(Content("").join(parts))
        self._show_state()

    # asking

    def _ask_if_short(self) -> None:
        """Ask for the part in view, unless it is up to date, on its way, or long."""
        kind = self.view.KIND
        is_current = self._of_change.get(kind) == self.app.changes
        if self.book is not None and not is_current and kind not in self._asked and not self.view.IS_LONG:
            self.action_look()
        self._show_state()

    def action_look(self) -> None:
        """Ask the record for the part in view."""
        book, kind = self.book, self.view.KIND
        if book is None or kind in self._asked:
            return
        self.show_trouble(None)
        progress = ThreadProgress(lambda *report: self._pass_on(kind, *report))
        self._asked[kind] = progress
        change = self.app.changes
        ask_book = getattr(book, kind)
        self.ask(
            kind, partial(ask_book, progress), partial(self._take, kind, change), partial(self._ended, kind)
        )
        self._show_state()
        self.refresh_bindings()

    def _pass_on(self, kind: str, done: int, total: int | None, note: str) -> None:
        """In the thread: pass progress on."""
        self.post_message(JobProgressed(kind, done, total, note))

    @on(JobProgressed)
    def _progressed(self, event: JobProgressed) -> None:
        event.stop()
        if event.kind in self._asked and event.kind == self.view.KIND:
            self._show_state(event)

    def _take(self, kind: str, change: int, audit: Any) -> None:
        self._asked.pop(kind, None)
        self._of_change[kind] = change
        view = self.query_one(f"#view-{kind}", AuditView)
        view.show(audit)
        if view is self.view and (self.focused is None or self.focused in view.query("*")):
            view.take_focus()
        self._show_state()
        self.refresh_bindings()

    def _ended(self, kind: str, error: SidepathError) -> None:
        """Say that there is no answer; the one before stays."""
        self._asked.pop(kind, None)
        view = self.query_one(f"#view-{kind}", AuditView)
        if view.audit is None:
            stopped = isinstance(error, Cancelled)
            view.say("Stopped. F9 looks again." if stopped else f"✗ {safe(error)} F9 tries again.")
        elif view is self.view:
            self.show_trouble(error)
        self._show_state()
        self.refresh_bindings()

    @on(Worker.StateChanged)
    def _failed_unforeseen(self, event: Worker.StateChanged) -> None:
        """Let a question be asked again whose worker broke; the trouble line says so."""
        if event.state in (WorkerState.ERROR, WorkerState.CANCELLED) and event.worker.group in self._asked:
            del self._asked[event.worker.group]
            self._show_state()
            self.refresh_bindings()

    def _show_state(self, event: JobProgressed | None = None) -> None:
        """Show how far the part in view is, or that it is out of date."""
        line = self.query_one("#failures-state", Static)
        kind = self.view.KIND
        words = ""
        if kind in self._asked:
            words = "Reading the record…  Escape stops"
            if event is not None and event.total:
                bar = "█" * round(20 * event.done / event.total)
                words = f"{bar:░<20} {event.done:,} of {event.total:,} {safe(event.note)}  Escape stops"
        elif kind in self._of_change and self._of_change[kind] != self.app.changes:
            words = OUT_OF_DATE
        line.update(words)
        line.display = bool(words)

    def action_stop(self) -> None:
        """Stop what is being reckoned for the part in view."""
        if progress := self._asked.get(self.view.KIND):
            progress.cancel()
            self.query_one("#failures-state", Static).update("Stopping…")

    # what is looked at

    @on(AuditView.Looked)
    def _looked(self, event: AuditView.Looked) -> None:
        event.stop()
        self.refresh_bindings()

    @on(RecurringView.Drawn)
    def _draw(self, event: RecurringView.Drawn) -> None:
        """Lay a kind of failure out with what its runs share marked."""
        event.stop()
        cluster, view = event.cluster, self.query_one(RecurringView)
        if cluster is None:
            return
        smiles, atoms = cluster.example
        if not smiles or not atoms:
            self.forget("draw")
            view.draw(cluster, None)
            return

        def lay_out() -> SchemeDrawing:
            return mark_match(scheme_drawing(smiles), smiles, atoms, MarkKind.MOTIF)

        self.ask("draw", lay_out, partial(view.draw, cluster))

    @on(AuditView.RunsAsked)
    def action_runs(self) -> None:
        """Show the runs behind the figure under the cursor."""
        from tui.screens.failures_runs import RunsBehindScreen

        held = self.view.behind
        if held is None:
            self.app.notify("No runs stand behind this.", markup=False)
            return
        self.app.push_screen(RunsBehindScreen(held))

    def action_turn(self) -> None:
        """Show the figures another way."""
        if self.view.audit is not None:
            self.view.turn()
        self.refresh_bindings()

    def action_plan_it(self) -> None:
        """Take a run to planning."""
        book, code = self.book, self.view.run_to_plan
        if book is not None and code is not None:
            self.ask("plan", partial(book.get, code), self._plan)

    def _plan(self, run: Any) -> None:
        self.app.run_worker(self.app.plan_from(state_of_run(run)), exclusive=True, group="plan-from")

    def action_adopt(self) -> None:
        """Show what the proposed rule does, and ask."""
        from tui.screens.failures_adopt import AdoptScreen

        view = self.view
        if isinstance(view, RecurringView) and view.cluster is not None and view.cluster.proposal is not None:
            proposal = view.cluster.proposal
            self.app.push_screen(AdoptScreen(proposal, self.app.who), partial(self._adopt, proposal))

    def _adopt(self, proposal: Any, worded: tuple[str, str] | None) -> None:
        book = self.book
        if worded is None or book is None:
            return
        title, why = worded
        self.ask(
            "adopt", partial(book.adopt, proposal, title, why, self.app.who), partial(self._adopted, title)
        )

    def _adopted(self, title: str, rule_id: str) -> None:
        self.app.notify(f"Rule {safe(rule_id)} adopted: {safe(title)}. It warns from now on.", markup=False)
        self.app.count_runs()
        self._ask_if_short()

    def check_action(self, action: str, parameters: tuple[object, ...]) -> bool | None:
        """Show keys where they work, grey them where they do not now."""
        if not self.is_mounted or action not in ("runs", "turn", "adopt", "plan_it", "look", "stop"):
            return super().check_action(action, parameters)
        view = self.view
        if action == "stop":
            return view.KIND in self._asked
        if action == "look":
            return None if view.KIND in self._asked or self.book is None else True
        if action == "turn":
            return True if view.audit is not None else None
        if action == "runs":
            return True if view.audit is not None and view.behind is not None else None
        if action == "plan_it":
            if not isinstance(view, RecurringView | CoverageView):
                return False
            return True if view.audit is not None and view.run_to_plan is not None else None
        if not isinstance(view, RecurringView):
            return False
        cluster = view.cluster if view.audit is not None else None
        is_possible = cluster is not None and cluster.proposal is not None
        return True if is_possible and self.book is not None and not self.book.is_read_only else None

    def action_copy(self) -> None:
        """Offer the part in view as Markdown and JSON, and a drawn structure as SMILES."""
        from tui.screens.copying import CopyScreen

        def offer(texts: dict[str, str]) -> None:
            self.app.push_screen(CopyScreen(texts))

        self._with_texts(offer)

    def action_copy_as(self, kind: str) -> None:
        """Copy one kind at once."""

        def copy(texts: dict[str, str]) -> None:
            if kind in texts:
                self.app.copy_text(kind, texts[kind])
            else:
                self.app.notify(f"There is no {kind} to copy here.", markup=False)

        self._with_texts(copy)

    def _with_texts(self, done: Callable[[dict[str, str]], None]) -> None:
        """Hand over what can be copied, once it is written."""
        book, view = self.book, self.view
        audit = view.audit
        if book is None or audit is None:
            self.app.notify("There is nothing here to copy yet.", markup=False)
            return
        cluster = view.cluster if isinstance(view, RecurringView) else None
        smiles = cluster.example[0] if cluster is not None else ""
        write = tally_markdown if isinstance(view, TallyView) else book.markdown
        self.ask("copy", lambda: audit_texts(audit, write(audit), smiles), done)
