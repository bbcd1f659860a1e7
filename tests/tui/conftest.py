"""What every test of the interface starts from.

Short pauses, no blinking cursor, a helper that waits for answers.
"""

from __future__ import annotations

import pytest
from textual.widgets import Input, TextArea

from tui.jobs import EditLog
from tui.screens import entry, planning, runs


@pytest.fixture(autouse=True)
def calm(monkeypatch: pytest.MonkeyPatch) -> None:
    """Shorten the pauses in typing and keep the cursor still."""
    monkeypatch.setattr(planning, "SETTLE_S", 0.01)
    monkeypatch.setattr(entry, "KEEP_S", 0.01)
    monkeypatch.setattr(entry, "READ_S", 0.01)
    monkeypatch.setattr(runs, "FILTER_S", 0.01)
    monkeypatch.setattr(EditLog, "MERGE_S", 0.0)
    monkeypatch.setattr(Input, "cursor_blink", False)
    monkeypatch.setattr(TextArea, "cursor_blink", False)
