"""The rejects file: rows that an import refused, in their own format with the reason, to be mended and fed back.

A table's rejects are a CSV (UTF-8 with a byte-order mark, which spreadsheet programs expect) under the same headings,
with two columns in front that an import passes over. Lines of JSON stay JSON. Structure files keep their records, the
reason in a remark. Nothing is written until there is something to write.
"""

from __future__ import annotations

import csv
from collections.abc import Sequence
from pathlib import Path
from typing import Any, TextIO

from kb.errors import ImportFileError
from kb.exchange.jsonlines import rejected_line
from kb.exchange.rows import Rejection
from kb.exchange.safe_cells import guarded

ROW_HEADING = "sidepath row"
REASON_HEADING = "sidepath reason"


class RejectsFile:
    """One rejects file being written."""

    def __init__(self, path: Path, format_name: str, headings: Sequence[str]) -> None:
        """Start the file.

        Raises:
            ImportFileError: it cannot be written there.
        """
        self.format_name = format_name
        self._keep = [n for n, h in enumerate(headings) if h.strip().casefold() not in (ROW_HEADING, REASON_HEADING)]
        self._writer: Any = None
        is_table = format_name in ("csv", "xlsx")
        try:
            self._file: TextIO = path.open("w", encoding="utf-8-sig" if is_table else "utf-8", newline="")
        except OSError as error:
            raise ImportFileError(
                f"The rejects file {path} cannot be written: {error.strerror}.", "Name another place.", str(path)
            ) from error
        if is_table:
            self._writer = csv.writer(self._file, lineterminator="\r\n")
            self._writer.writerow([ROW_HEADING, REASON_HEADING, *(guarded(headings[n]) for n in self._keep)])

    def add(self, raw: Sequence[str] | str, rejection: Rejection) -> None:
        """Write one refused row with its reason."""
        where = f"{rejection.column}: " if rejection.column else ""
        reason = f"{where}{rejection.reason}"
        if self._writer is not None:
            cells = [raw[n] if n < len(raw) else "" for n in self._keep]
            beyond = list(raw[len(self._keep) :]) if len(raw) > len(self._keep) + 2 else []
            row = [str(rejection.row), reason, *cells, *beyond]
            self._writer.writerow([guarded(cell.replace("\0", "")) for cell in row])
        elif self.format_name == "jsonl":
            self._file.write(rejected_line(str(raw), rejection.row, reason) + "\n")
        else:
            self._file.write(_with_remark(str(raw), self.format_name, reason))

    def close(self) -> None:
        """Finish the file."""
        self._file.close()


def _with_remark(record: str, format_name: str, reason: str) -> str:
    plain = " ".join(reason.split())
    if format_name == "smi":
        return f"# {plain}\n{record.rstrip()}\n"
    if format_name == "rdf":
        return f"{record.rstrip()}\n$DTYPE SIDEPATH_REASON\n$DATUM {plain}\n"
    if format_name == "sdf":
        return f"{record.rstrip()}\n>  <sidepath reason>\n{plain}\n\n$$$$\n"
    return f"{record.rstrip()}\n"
