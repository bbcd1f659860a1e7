"""What can be done with one run wherever it is shown: plan it again, amend, withdraw, copy.

A mixin for screens that show runs; the screen says which run is meant and hears of changes.
"""

from __future__ import annotations

from functools import partial
from typing import Any, ClassVar

from textual.binding import Binding, BindingType

from kb.record.run import Run
from tui.copy_texts import run_texts
from tui.messages import RunStored
from tui.plan_state import state_of_run
from tui.screens.base import AskingScreen, ScreenResult

RUN_BINDINGS: list[BindingType] = [
    Binding("p", "plan_again", "Plan", id="run.plan", tooltip="Take scheme and conditions to planning"),
    Binding("a", "amend", "Amend", id="run.amend", tooltip="Change the run; old values are kept"),
    Binding("w", "withdraw", "Withdraw", id="run.withdraw", tooltip="Withdraw the run; it stays in the history"),
]

CHANGING = ("amend", "withdraw")


class RunActions(AskingScreen[ScreenResult]):
    """Screens that show runs."""

    BINDINGS: ClassVar[list[BindingType]] = RUN_BINDINGS

    @property
    def shown_run(self) -> Run | None:
        """Return the run that is meant."""
        return None

    def run_changed(self, run: Run) -> None:
        """Hear that a run was changed."""

    def copy_texts(self) -> dict[str, str]:
        """Return the run in the three kinds."""
        return run_texts(self.shown_run) if self.shown_run else {}

    def check_action(self, action: str, parameters: tuple[object, ...]) -> bool | None:
        """Grey out what needs a run, and what a read-only book refuses."""
        run = self.shown_run
        if action in (*CHANGING, "plan_again") and run is None:
            return None
        if action in CHANGING and (self.book is None or self.book.is_read_only or (run and run.is_withdrawn)):
            return None
        return super().check_action(action, parameters)

    async def action_plan_again(self) -> None:
        """Take the run to planning."""
        if self.shown_run is None:
            return
        await self.app.plan_from(state_of_run(self.shown_run))

    def action_amend(self) -> None:
        """Open the entry form on the run."""
        from tui.screens.entry import EntryScreen

        if self.shown_run is not None:
            self.app.push_screen(EntryScreen(state_of_run(self.shown_run), amending=self.shown_run), self._amended)

    def _amended(self, run: Run | None) -> None:
        if run is not None:
            self.run_changed(run)

    def action_withdraw(self) -> None:
        """Ask why, then withdraw."""
        from tui.screens.asking import LineScreen

        run = self.shown_run
        if run is None:
            return
        words = "It stays in the history but no longer speaks in checks. Why is it withdrawn?"
        screen = LineScreen(f"Withdraw {run.code}", words, go="Withdraw")
        self.app.push_screen(screen, partial(self._withdraw, run.code or ""))

    def _withdraw(self, code: str, why: str | None) -> None:
        book = self.book
        if why is None or book is None:
            return
        self.ask("withdraw", lambda: book.withdraw(code, why, self.app.who), self._withdrawn)

    def _withdrawn(self, run: Any) -> None:
        self.app.notify(f"{run.code} is withdrawn.", markup=False)
        self.run_changed(run)
        self.app.post_message(RunStored(run.code or ""))
