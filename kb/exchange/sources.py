"""Files as sources of runs: formats told apart, each row given once, as a run or as a rejection.

It owns which ending means which format and the step from a format's rows to runs; the formats themselves are read by
`tables_in`, `jsonlines` and `ctfile`. A file that is wrong as a whole is refused when it is opened, before anything is
stored.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any

from kb.errors import ImportFileError, SidepathError
from kb.exchange.entry_rules import check_entry
from kb.exchange.headings import ColumnMapping, match_headings
from kb.exchange.jsonlines import JsonLines
from kb.exchange.rows import Rejection, RowReader, RowRefused
from kb.exchange.source import Read, Source
from kb.exchange.tables_in import CsvTable, TableRow, XlsxTable
from kb.record.run import Run

FORMATS = {
    ".csv": "csv", ".tsv": "csv", ".txt": "csv", ".tab": "csv", ".xlsx": "xlsx", ".xlsm": "xlsx",
    ".jsonl": "jsonl", ".ndjson": "jsonl", ".rdf": "rdf", ".rd": "rdf", ".rxn": "rxn", ".sdf": "sdf", ".sd": "sdf",
    ".smi": "smi", ".rsmi": "smi", ".smiles": "smi",
}  # fmt: skip


def format_of(path: Path) -> str:
    """Return the format that a file's ending names.

    Raises:
        ImportFileError: none we know.
    """
    found = FORMATS.get(path.suffix.casefold())
    if found is None:
        raise ImportFileError(
            f"The ending of {path.name} names no format that can be read or written.",
            "Use .csv, .xlsx, .jsonl, .rdf, .rxn, .sdf or .smi.",
            path.suffix,
        )
    return found


def open_source(
    path: Path, *, format_name: str | None = None, mapping: Mapping[str, Any] | None = None, sheet: str | None = None
) -> Source:
    """Open a file for reading runs; its first lines are read, so that a wrong file is refused here.

    Args:
        path: the file.
        format_name: overrules the ending.
        mapping: a saved mapping of headings, for tables.
        sheet: which sheet of a workbook; None = the one whose headings are known best.

    Raises:
        ImportFileError: the file as a whole cannot be read.
    """
    kind = format_name or format_of(path)
    if kind == "csv":
        return TableSource(CsvTable(path), "csv", mapping)
    if kind == "xlsx":
        return TableSource(XlsxTable(path, sheet), "xlsx", mapping)
    if kind == "jsonl":
        return LineSource(path)
    if kind in ("rdf", "rxn", "sdf", "smi"):
        from kb.exchange.structure_sources import StructureSource

        return StructureSource(path, kind, mapping)
    raise ImportFileError(f"{kind!r} is no format.", "Use csv, xlsx, jsonl, rdf, rxn, sdf or smi.", kind)


class TableSource:
    """Rows of a table to runs."""

    def __init__(self, table: CsvTable | XlsxTable, format_name: str, saved: Mapping[str, Any] | None) -> None:
        self.table = table
        self.format_name = format_name
        self.mapping: ColumnMapping = match_headings(table.headings, saved)
        self._reader = RowReader(mapping=self.mapping)
        self.unknown_names = self._reader.unknown_names

    def __iter__(self) -> Iterator[Read]:
        for row in self.table:
            yield self._read(row)

    @property
    def done_share(self) -> float:
        return self.table.done_share

    def _read(self, row: TableRow) -> Read:
        if row.trouble:
            return Read(
                row=row.number, raw=row.values, rejection=Rejection(row=row.number, column=None, reason=row.trouble)
            )
        try:
            return Read(row=row.number, raw=row.values, run=self._reader.read(row.values))
        except RowRefused as error:
            column, reason = error.value if isinstance(error.value, tuple) else (None, str(error))
            return Read(
                row=row.number, raw=row.values, rejection=Rejection(row=row.number, column=column, reason=reason)
            )
        except SidepathError as error:
            return Read(
                row=row.number, raw=row.values, rejection=Rejection(row=row.number, column=None, reason=str(error))
            )


class LineSource:
    """Lines of JSON to runs."""

    format_name = "jsonl"
    mapping = None

    def __init__(self, path: Path) -> None:
        self._lines = JsonLines(path)
        self.unknown_names: Counter[str] = Counter()

    def __iter__(self) -> Iterator[Read]:
        for number, found, text in self._lines:
            if isinstance(found, Run):
                try:
                    check_entry(found)
                except SidepathError as error:
                    found = error
            if isinstance(found, Run):
                yield Read(row=number, run=found, raw=text)
            else:
                yield Read(row=number, raw=text, rejection=Rejection(row=number, column=None, reason=str(found)))

    @property
    def done_share(self) -> float:
        return self._lines.done_share
