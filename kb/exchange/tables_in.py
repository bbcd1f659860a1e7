"""Tables in: rows of text from CSV (any delimiter and encoding) and from XLSX, one at a time.

It owns finding the delimiter and the heading row, and bounding what a file can cost. It interprets no cell beyond
turning a workbook's numbers, dates and percentages into the text a person would have typed. It refuses workbooks that
unpack to far more than they weigh, or whose XML declares entities. Lines that start with `#` before the headings are
remarks. Row numbers are those a person sees: the line where the row starts, or the row of the sheet.
"""

from __future__ import annotations

import csv
import datetime as dt
import itertools
import re
import zipfile
import zlib
from collections.abc import Iterator, Sequence
from contextlib import closing
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from kb.errors import ImportFileError
from kb.exchange.headings import recognised
from kb.exchange.safe_cells import unguarded
from kb.exchange.text_in import LONGEST_LINE, LineTooLong, TextLines, unreadable

MAX_COLUMNS = 500
"""Most columns of a table."""

LONGEST_CELL = 131_072
"""Longest cell [characters]; a spreadsheet program stops at 32,767."""

HEADING_SEARCH = 30
"""The heading row is looked for among this many first rows."""

MAX_UNPACKED_BYTES = 1_500_000_000
MAX_SHARED_TEXT_BYTES = 150_000_000
MAX_RATIO = 250
MAX_MEMBERS = 5_000
"""Bounds on a workbook: unpacked size, its table of texts (the only part held in memory), unpacked over packed size
(for parts above 10 MB), and the number of parts. Judgements: a workbook of a million ordinary rows stays below."""

_BROKEN_ZIP = (zipfile.BadZipFile, zlib.error, NotImplementedError, RuntimeError, EOFError, ValueError)
_ERRORS = frozenset({"#N/A", "#VALUE!", "#REF!", "#DIV/0!", "#NUM!", "#NAME?", "#NULL!", "#####"})


@dataclass(frozen=True, slots=True, kw_only=True)
class TableRow:
    """One row as text.

    Attributes:
        number: line or sheet row, from 1.
        values: cells in column order.
        trouble: why the row could not be split into cells; None = it could.
    """

    number: int
    values: tuple[str, ...] = ()
    trouble: str | None = None


class CsvTable:
    """A delimited text file.

    Attributes:
        headings: of the heading row.
        delimiter, encoding: as found.
    """

    def __init__(self, path: Path, delimiter: str | None = None) -> None:
        self.path = path
        self._lines = TextLines(path)
        self.encoding = self._lines.encoding
        try:
            start = self._first_lines()
            self.delimiter = delimiter or _find_delimiter([text for _, text in start])
            self.headings, self.heading_line = self._find_headings(start)
        except BaseException:
            self._lines.__exit__(None, None, None)
            raise
        self._lines.__exit__(None, None, None)
        self._lines = TextLines(path)

    def __iter__(self) -> Iterator[TableRow]:
        """Yield the rows behind the heading row; blank rows are passed over."""
        lines = self._lines
        for _ in range(self.heading_line):
            next(lines, None)
        reader = csv.reader(lines, delimiter=self.delimiter, strict=False)
        csv.field_size_limit(LONGEST_CELL)
        with lines:
            while True:
                number = lines.line + 1
                try:
                    cells = next(reader)
                except StopIteration:
                    return
                except LineTooLong as error:
                    yield TableRow(number=number, trouble=str(error))
                    reader = csv.reader(lines, delimiter=self.delimiter, strict=False)
                    continue
                except csv.Error as error:
                    yield TableRow(number=number, trouble=_csv_trouble(error))
                    reader = csv.reader(lines, delimiter=self.delimiter, strict=False)
                    continue
                if any(cell.strip() for cell in cells):
                    yield self._row(number, cells)

    @property
    def done_share(self) -> float:
        """Return the part of the file that was read, 0..1."""
        return self._lines.done_bytes / max(self._lines.size_bytes, 1)

    def _row(self, number: int, cells: list[str]) -> TableRow:
        wide = len(self.headings)
        if len(cells) > wide and any(cell.strip() for cell in cells[wide:]):
            trouble = (
                f"The row has {len(cells)} cells and the heading row {wide}. "
                f"A cell that holds {self.delimiter!r} must stand in quotation marks."
            )
            return TableRow(number=number, values=tuple(cells[: wide + 5]), trouble=trouble)
        return TableRow(number=number, values=tuple(unguarded(cell) for cell in cells[:wide]))

    def _first_lines(self) -> list[tuple[int, str]]:
        found: list[tuple[int, str]] = []
        length = 0
        try:
            for text in self._lines:
                found.append((self._lines.line, text))
                length += len(text)
                if len(found) >= HEADING_SEARCH * 4 or length > LONGEST_LINE:
                    break
        except LineTooLong as error:
            if not found:
                raise ImportFileError(
                    f"The first line of {self.path.name} is too long to be a heading row.",
                    "Is it a table, one run a line?",
                    self.path.name,
                ) from error
        return found

    def _find_headings(self, start: Sequence[tuple[int, str]]) -> tuple[tuple[str, ...], int]:
        """Return the headings and the last line they take up: the row with most known headings, remarks aside."""
        lines = _Counted(text for _, text in start)
        reader = csv.reader(lines, delimiter=self.delimiter)
        best: tuple[int, tuple[str, ...], int] = (0, (), 0)
        first: tuple[tuple[str, ...], int] | None = None
        try:
            for cells in itertools.islice(reader, HEADING_SEARCH):
                if not any(c.strip() for c in cells) or cells[0].lstrip().startswith("#"):
                    continue
                if len(cells) > MAX_COLUMNS:
                    raise ImportFileError(
                        f"{self.path.name} has {len(cells):,} columns; at most {MAX_COLUMNS} are read.",
                        "Is the delimiter right?",
                        self.path.name,
                    )
                headings = tuple(unguarded(c).strip() for c in cells)
                if first is None:
                    first = headings, lines.given
                if recognised(headings) > best[0]:
                    best = recognised(headings), headings, lines.given
        except csv.Error as error:
            raise ImportFileError(f"{self.path.name}: {_csv_trouble(error)}", "Mend the heading row.") from error
        if best[0]:
            return best[1], best[2]
        if first is None:
            raise ImportFileError(f"{self.path.name} holds no rows.", "Give a heading row and runs.", self.path.name)
        return first


class XlsxTable:
    """One sheet of a workbook.

    Attributes:
        headings: of the heading row.
        sheet: its name.
    """

    def __init__(self, path: Path, sheet: str | None = None) -> None:
        check_workbook(path)
        self.path = path
        self._book = _open_workbook(path)
        names = self._book.sheetnames
        if sheet is not None and sheet not in names:
            raise ImportFileError(
                f"{path.name} has no sheet {sheet[:40]!r}.", f"Its sheets: {', '.join(names[:20])}.", sheet
            )
        best: tuple[int, str, tuple[str, ...], int] = (-1, names[0] if names else "", (), 0)
        for name in [sheet] if sheet else names[:50]:
            for row in itertools.islice(self._raw(name), HEADING_SEARCH):
                if row.values and row.values[0].lstrip().startswith("#"):
                    continue
                score = recognised(row.values)
                if any(row.values) and score > best[0]:
                    best = score, name, row.values, row.number
        if not best[2]:
            raise ImportFileError(f"{path.name} holds no rows.", "Give a heading row and runs.", path.name)
        self.sheet, self.headings, self._heading_row = best[1], tuple(h.strip() for h in best[2]), best[3]
        self._rows_read, self._rows_known = 0, self._book[self.sheet].max_row or 0

    def __iter__(self) -> Iterator[TableRow]:
        """Yield the rows below the heading row; blank rows are passed over."""
        with closing(self._book):
            for row in self._raw(self.sheet):
                self._rows_read = row.number
                if row.number > self._heading_row and any(v.strip() for v in row.values):
                    yield TableRow(number=row.number, values=row.values[: len(self.headings)])

    @property
    def done_share(self) -> float:
        """Return the part of the sheet that was read, 0..1, by the size that it states."""
        return min(self._rows_read / self._rows_known, 1.0) if self._rows_known else 0.0

    def _raw(self, name: str) -> Iterator[TableRow]:
        sheet = self._book[name]
        try:
            for number, cells in enumerate(sheet.iter_rows(max_col=MAX_COLUMNS), start=1):
                values = [_cell_text(cell) for cell in cells]
                while values and not values[-1]:
                    values.pop()
                if values:
                    yield TableRow(number=number, values=tuple(values))
        except (*_BROKEN_ZIP, KeyError, TypeError, OSError, SyntaxError) as error:
            raise ImportFileError(
                f"{self.path.name} breaks off in sheet {name[:40]!r}.",
                "Open it in a spreadsheet program and save it again.",
                self.path.name,
            ) from error


def check_workbook(path: Path) -> None:
    """Refuse a workbook that would cost far more than it weighs, before anything of it is unpacked into memory.

    Raises:
        ImportFileError: no workbook, too large when unpacked, or XML that declares a document type.
    """
    again = "Save it as a plain .xlsx, or as CSV."
    try:
        with zipfile.ZipFile(path) as archive:
            members = archive.infolist()
            if len(members) > MAX_MEMBERS or sum(m.file_size for m in members) > MAX_UNPACKED_BYTES:
                raise ImportFileError(f"{path.name} unpacks to more than can be read.", again, path.name)
            names = {m.filename for m in members}
            if "[Content_Types].xml" not in names:
                raise ImportFileError(f"{path.name} is no workbook.", again, path.name)
            for member in members:
                packed = max(member.compress_size, 1)
                is_text = member.filename.casefold().endswith("sharedstrings.xml")
                if (member.file_size > 10_000_000 and member.file_size / packed > MAX_RATIO) or (
                    is_text and member.file_size > MAX_SHARED_TEXT_BYTES
                ):
                    raise ImportFileError(f"{path.name} unpacks to more than can be read.", again, path.name)
                if member.filename.casefold().endswith((".xml", ".rels")):
                    with archive.open(member) as part:
                        start = part.read(65_536).replace(b"\0", b"")
                    if re.search(rb"<!\s*(?:DOCTYPE|ENTITY)", start, re.I):
                        raise ImportFileError(f"{path.name} declares XML entities, which no workbook needs.", again)
    except _BROKEN_ZIP as error:
        raise ImportFileError(f"{path.name} is no workbook, or a damaged one.", again, path.name) from error
    except OSError as error:
        raise unreadable(path, error) from error


def _open_workbook(path: Path) -> Any:
    import openpyxl

    try:
        return openpyxl.load_workbook(path, read_only=True, data_only=True, keep_links=False)
    except Exception as error:
        raise ImportFileError(
            f"{path.name} cannot be opened as a workbook.",
            "Open it in a spreadsheet program and save it again.",
            path.name,
        ) from error


def _cell_text(cell: Any) -> str:
    """Return what a person would have typed into the cell."""
    value = cell.value
    if value is None:
        return ""
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, int | float):
        is_percent = str(getattr(cell, "number_format", "") or "").rstrip().endswith("%")
        return f"{value * 100:.12g} %" if is_percent else f"{value:.12g}"
    if isinstance(value, dt.datetime):
        return value.date().isoformat() if value.time() == dt.time() else value.isoformat(sep=" ")
    if isinstance(value, dt.timedelta):
        return f"{value.total_seconds() / 3600:.6g} h"
    text = str(value)
    return "" if text in _ERRORS else text[:LONGEST_CELL]


class _Counted:
    """Lines that know how many were given."""

    def __init__(self, lines: Iterator[str]) -> None:
        self._lines = iter(lines)
        self.given = 0

    def __iter__(self) -> Iterator[str]:
        return self

    def __next__(self) -> str:
        text = next(self._lines)
        self.given += 1
        return text


def _find_delimiter(lines: Sequence[str]) -> str:
    """Return the delimiter that makes most known headings of one of the first rows, then most columns."""
    best = (-1, -1, ",")
    for delimiter in (",", ";", "\t", "|"):
        for text in lines[:HEADING_SEARCH]:
            if text.lstrip().startswith("#"):
                continue
            try:
                cells = next(csv.reader([text], delimiter=delimiter), [])
            except csv.Error:
                continue
            score = (recognised(cells[:MAX_COLUMNS]), len(cells), delimiter)
            if score[:2] > best[:2]:
                best = score
    return best[2]


def _csv_trouble(error: csv.Error) -> str:
    if "field larger" in str(error):
        return f"A cell is longer than {LONGEST_CELL:,} characters. A quotation mark may be missing."
    return f"The row cannot be split into cells ({error})."
