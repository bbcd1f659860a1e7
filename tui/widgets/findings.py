"""The findings of a check as a list, most severe first.

Mark and word of the severity, title, own evidence.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from rich.text import Text
from textual import on
from textual.message import Message
from textual.widgets import OptionList
from textual.widgets.option_list import Option

from kb.record.finding import Finding
from tui.present import evidence_words, finding_line


class FindingsList(OptionList):
    """What to worry about; the highlighted finding is marked in the drawing."""

    class Looked(Message):
        """The highlight moved to a finding, or to none."""

        def __init__(self, finding: Finding | None) -> None:
            super().__init__()
            self.finding = finding

    class Opened(Message):
        """A finding is to be shown in full."""

        def __init__(self, finding: Finding) -> None:
            super().__init__()
            self.finding = finding

    def __init__(self, **options: Any) -> None:
        super().__init__(markup=False, compact=True, **options)
        self.findings: tuple[Finding, ...] = ()

    def show(self, findings: Sequence[Finding], empty: str = "Nothing known against it.") -> None:
        """Replace the list; the highlight stays on the same rule where it is still there."""
        held = self.highlighted_finding
        if tuple(findings) == self.findings and self.option_count:
            return
        self.findings = tuple(findings)
        self.clear_options()
        if not findings:
            self.add_option(Option(Text(empty, style="dim"), disabled=True))
            self.post_message(self.Looked(None))
            return
        self.add_options([Option(self._prompt(finding)) for finding in findings])
        same = [i for i, f in enumerate(findings) if held and f.rule_id == held.rule_id]
        if same:
            self.highlighted = same[0]
        else:
            self.post_message(self.Looked(None))

    @property
    def highlighted_finding(self) -> Finding | None:
        """Return the finding under the highlight."""
        if self.highlighted is None or self.highlighted >= len(self.findings):
            return None
        return self.findings[self.highlighted]

    def _prompt(self, finding: Finding) -> Text:
        severity = str(finding.severity)
        style = self.app.theme_variables.get(f"severity-{severity}", "")
        text = Text(overflow="ellipsis")
        text.append(finding_line(finding), style=style)
        if evidence := evidence_words(finding.evidence, finding.kind):
            text.append(f"\n{evidence}")
        return text

    def on_focus(self) -> None:
        """Start on the first line, so that Enter always means something."""
        if self.highlighted is None and self.option_count:
            self.action_first()

    @on(OptionList.OptionHighlighted)
    def _looked(self, event: OptionList.OptionHighlighted) -> None:
        event.stop()
        self.post_message(self.Looked(self.highlighted_finding))

    @on(OptionList.OptionSelected)
    def _opened(self, event: OptionList.OptionSelected) -> None:
        event.stop()
        if finding := self.highlighted_finding:
            self.post_message(self.Opened(finding))
