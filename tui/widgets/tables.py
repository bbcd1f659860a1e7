"""Tables of runs and of precedents: a DataTable that takes values, not cells, and says which run is meant."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from rich.text import Text
from textual import on
from textual.message import Message
from textual.widgets import DataTable

from kb.record.assessment import Precedent
from kb.record.run import Run
from tui.present import precedent_cells, run_cells


class CodeTable(DataTable[Text]):
    """Rows that each stand for one run code."""

    HEADINGS: tuple[tuple[str, int], ...] = ()
    """Words and width [cells] of each column; fixed, so that a page turn does not make the columns jump."""

    class Looked(Message):
        """The cursor is on a run; None on an empty table."""

        def __init__(self, table: CodeTable, code: str | None) -> None:
            super().__init__()
            self.table = table
            self.code = code

    class Opened(Message):
        """A run is to be shown in full."""

        def __init__(self, table: CodeTable, code: str) -> None:
            super().__init__()
            self.table = table
            self.code = code

    def __init__(self, **options: Any) -> None:
        super().__init__(cursor_type="row", zebra_stripes=False, show_row_labels=False, **options)
        self.codes: tuple[str, ...] = ()

    def on_mount(self) -> None:
        """Write the headings once."""
        for heading, width in self.HEADINGS:
            self.add_column(heading, width=width)

    def show_rows(self, codes: Sequence[str], rows: Sequence[tuple[str, ...]]) -> None:
        """Replace the rows; the cursor stays on the same run where it is still there."""
        held = self.code
        self.codes = tuple(codes)
        self.clear()
        for row in rows:
            self.add_row(*(Text(cell, no_wrap=True, overflow="ellipsis") for cell in row))
        if held in self.codes:
            self.move_cursor(row=self.codes.index(held))
        if not rows:
            self.post_message(self.Looked(self, None))

    @property
    def code(self) -> str | None:
        """Return the run under the cursor."""
        return self.codes[self.cursor_row] if 0 <= self.cursor_row < len(self.codes) else None

    @on(DataTable.RowHighlighted)
    def _looked(self, event: DataTable.RowHighlighted) -> None:
        event.stop()
        self.post_message(self.Looked(self, self.code))

    @on(DataTable.RowSelected)
    def _opened(self, event: DataTable.RowSelected) -> None:
        event.stop()
        if self.code is not None:
            self.post_message(self.Opened(self, self.code))


class RunTable(CodeTable):
    """A page of runs."""

    HEADINGS = (
        ("Run", 7),
        ("Date", 10),
        ("By", 4),
        ("Verdict", 9),
        ("Split, %", 17),
        ("Yield", 6),
        ("Went wrong", 16),
        ("Conditions", 44),
    )

    def show(self, runs: Sequence[Run]) -> None:
        """Replace the rows."""
        self.show_rows([run.code or "" for run in runs], [run_cells(run) for run in runs])


class PrecedentTable(CodeTable):
    """The runs closest to a plan, with what differs."""

    HEADINGS = (("Run", 7), ("Like", 4), ("Split, %", 16), ("What differs", 44), ("Yield", 6), ("Verdict", 8))

    def show(self, precedents: Sequence[Precedent]) -> None:
        """Replace the rows."""
        self.show_rows([p.run for p in precedents], [precedent_cells(p) for p in precedents])
