"""Tables out: CSV and XLSX that open cleanly in a spreadsheet program and can carry no formula, and an empty template.

CSV is UTF-8 with a byte-order mark and CRLF, which spreadsheet programs expect; every cell passes `guarded`. In XLSX
text is stored as text, so nothing needs guarding; numbers and days are stored as such. Rows are written as they come:
memory does not grow with the book.
"""

from __future__ import annotations

import csv
import datetime as dt
import re
from collections.abc import Iterable, Mapping, Sequence
from pathlib import Path
from typing import Any

from kb.errors import ImportFileError
from kb.exchange.row_out import FIELDS_OUT, row_of
from kb.exchange.safe_cells import guarded
from kb.record.run import Run

LONGEST_XLSX_CELL = 32_767
"""Longest text of a workbook cell [characters] (the file format's limit); longer text is cut and says so."""

_CUT = " [cut here: the whole text is in the JSON Lines export]"
_NUMBERS = frozenset(name for name in FIELDS_OUT if name.endswith("/ %")) - {"split / %"}
_UNSTORABLE = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\ufffe\uffff\ud800-\udfff]")

EXAMPLE: Mapping[str, str] = {
    "date": "2024-05-17",
    "by": "AB",
    "project": "Example",
    "reference": "AB1-012",
    "scheme": "CC(Br)CCc1ccccc1.[Na+].[N-]=[N+]=[N-]>>CC(N=[N+]=[N-])CCc1ccccc1",
    "reagents": "NaN3 2 equiv",
    "additives": "TBAI 10 mol%",
    "solvent": "DMF:water 9:1",
    "temperature": "60 °C",
    "time": "16 h",
    "concentration": "0.2 M",
    "scale": "5 mmol",
    "split / %": "substitution 88; elimination 10; unreacted 2",
    "method": "nmr",
    "isolated yield / %": "79",
    "verdict": "worked",
    "note": "small molecule first; the product wanted on the right, whatever came of it",
}
"""The example of a template, in a remark (CSV) or on a sheet of its own (XLSX)."""


def write_csv(runs: Iterable[Run], path: Path, delimiter: str = ",") -> int:
    """Write runs as CSV; return how many."""
    return _write_csv((row_of(run) for run in runs), path, delimiter)


def write_xlsx(runs: Iterable[Run], path: Path) -> int:
    """Write runs as a workbook with one sheet; return how many."""
    book, sheet = _new_book("runs")
    written = 0
    for run in runs:
        cells = row_of(run)
        sheet.append([_cell(sheet, name, cells[name]) for name in FIELDS_OUT])
        written += 1
    book.save(path)
    return written


def write_template(path: Path) -> None:
    """Write an empty table with its headings and an example that an import passes over.

    Raises:
        ImportFileError: the ending is neither .csv nor .xlsx, or the file cannot be written.
    """
    if path.suffix.casefold() not in (".csv", ".xlsx"):
        raise ImportFileError(f"{path.name} is no name for a template.", "Use .csv or .xlsx.", path.suffix)
    try:
        _write_template(path)
    except OSError as error:
        raise ImportFileError(
            f"{path} cannot be written: {error.strerror}.", "Name another place.", str(path)
        ) from error


def _write_template(path: Path) -> None:
    headings = [name for name in FIELDS_OUT if name not in ("code", "uuid", "withdrawn")]
    if path.suffix.casefold() == ".xlsx":
        book, _ = _new_book("runs", headings)
        explained = book.create_sheet("how to fill in")
        explained.append(["column", "example"])
        for name in headings:
            explained.append([_cell(explained, "", name), _cell(explained, "", EXAMPLE.get(name, ""))])
        book.save(path)
        return
    with path.open("w", encoding="utf-8-sig", newline="") as file:
        writer = csv.writer(file, lineterminator="\r\n")
        writer.writerow(
            ["# One run a row. Only the scheme must be there; an empty cell means not recorded. For example:"]
        )
        writer.writerow(["# " + "; ".join(f"{name} = {text}" for name, text in EXAMPLE.items())])
        writer.writerow(headings)


def _write_csv(rows: Iterable[Mapping[str, str]], path: Path, delimiter: str) -> int:
    written = 0
    with path.open("w", encoding="utf-8-sig", newline="") as file:
        writer = csv.writer(file, delimiter=delimiter, lineterminator="\r\n")
        writer.writerow(FIELDS_OUT)
        for row in rows:
            writer.writerow([guarded(row[name]) for name in FIELDS_OUT])
            written += 1
    return written


def _new_book(title: str, headings: Sequence[str] = FIELDS_OUT) -> tuple[Any, Any]:
    import openpyxl
    from openpyxl.styles import Font

    book = openpyxl.Workbook(write_only=True)
    sheet = book.create_sheet(title)
    sheet.freeze_panes = "A2"
    cells = [_cell(sheet, "", name) for name in headings]
    for cell in cells:
        cell.font = Font(bold=True)
    sheet.append(cells)
    return book, sheet


def _cell(sheet: Any, name: str, text: str) -> Any:
    from openpyxl.cell import WriteOnlyCell

    if name in _NUMBERS and text:
        return WriteOnlyCell(sheet, value=float(text))
    if name == "date" and text:
        return WriteOnlyCell(sheet, value=dt.date.fromisoformat(text))
    storable = _UNSTORABLE.sub("\N{REPLACEMENT CHARACTER}", text)
    if len(storable) > LONGEST_XLSX_CELL:
        storable = storable[: LONGEST_XLSX_CELL - len(_CUT)] + _CUT
    cell = WriteOnlyCell(sheet, value=storable)
    if storable:
        cell.data_type = "s"
    return cell
