"""Adopting a proposed house rule: what it would have done on the whole book, and under which words it is kept."""

from __future__ import annotations

from typing import TYPE_CHECKING, ClassVar

from rich.text import Text
from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal, VerticalScroll
from textual.screen import ModalScreen
from textual.widgets import Button, Input, Static

from kb.audit.sayings import say_trial
from tui.present import safe
from tui.widgets.lines import SafeInput

if TYPE_CHECKING:
    from kb.audit.recurrence_values import Proposal

MOST_CODES = 24
"""Codes listed; the runs behind the figure list all."""


class AdoptScreen(ModalScreen[tuple[str, str] | None]):
    """Title and reason of a rule, or None; both must be given."""

    AUTO_FOCUS = "#adopt-title"
    HELP = (
        "Adopting a house rule. Change its title and reason as you like; Enter adopts it, Escape leaves it."
    )
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "cancel", "Cancel", id="adopt.cancel", tooltip="Leave without adopting it"),
    ]

    def __init__(self, proposal: Proposal, who: str) -> None:
        super().__init__(classes="dialog-back")
        self._proposal = proposal
        self._who = who

    def compose(self) -> ComposeResult:
        """Lay out the rule, its trial, the words and the buttons."""
        rule, trial = self._proposal.rule, self._proposal.trial
        with VerticalScroll(classes="dialog") as dialog:
            dialog.border_title = "Adopt a house rule"
            yield Static(_line("Warns when", rule.when))
            yield Static(_line("Motif", rule.motif or "any substrate"))
            yield Static(_line("Severity", str(rule.severity)))
            yield Static(_line("Trial", say_trial(self._proposal)))
            yield Static(_line("Warns of", _codes(trial.hits)))
            yield Static(_line("False alarms", _codes(trial.false_alarms)))
            yield Static(_line("Cannot tell", _codes(trial.undecided)))
            yield Static(_line("Title", ""), classes="adopt-word")
            yield SafeInput(rule.title, id="adopt-title")
            yield Static(_line("Reason", ""), classes="adopt-word")
            yield SafeInput(rule.why, id="adopt-why")
            signed = (
                f"It warns in every check from now on, signed {safe(self._who)}; it can be retired later."
            )
            yield Static(signed, classes="quiet", markup=False)
            yield Static(
                "Give it a title and a reason first.", classes="trouble", id="adopt-trouble", markup=False
            )
            with Horizontal(classes="buttons"):
                yield Button("Adopt", id="adopt-go", classes="-primary")
                yield Button("Cancel", id="adopt-cancel")

    @on(Input.Submitted)
    @on(Button.Pressed, "#adopt-go")
    def _go_on(self, event: Input.Submitted | Button.Pressed) -> None:
        event.stop()
        title, why = (self.query_one(f"#adopt-{name}", Input).value.strip() for name in ("title", "why"))
        self.query_one("#adopt-trouble").set_class(not (title and why), "-shown")
        if title and why:
            self.dismiss((title, why))

    @on(Button.Pressed, "#adopt-cancel")
    def action_cancel(self) -> None:
        """Leave."""
        self.dismiss(None)


def _line(word: str, value: str) -> Text:
    text = Text(f"{word:<13}", style="bold")
    text.append(safe(value), style="not bold")
    return text


def _codes(codes: tuple[str, ...]) -> str:
    more = f" and {len(codes) - MOST_CODES} more" if len(codes) > MOST_CODES else ""
    return ", ".join(codes[:MOST_CODES]) + more if codes else "none"
