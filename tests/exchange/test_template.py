"""The empty template: it opens, says how to fill it in, and a filled one is read without a question."""

from __future__ import annotations

import csv
from pathlib import Path

import openpyxl
import pytest

from kb.errors import ImportFileError
from kb.exchange.headings import match_headings
from kb.exchange.loading import load_file
from kb.exchange.tables_out import EXAMPLE, write_template
from tests.exchange.carried import KeptInMemory


def headings_of(path: Path) -> list[str]:
    if path.suffix == ".xlsx":
        sheet = openpyxl.load_workbook(path)["runs"]
        return [str(cell.value) for cell in sheet[1]]
    rows = list(csv.reader(path.open(encoding="utf-8-sig", newline="")))
    return next(row for row in rows if not row[0].startswith("#"))


@pytest.mark.parametrize("ending", [".csv", ".xlsx"])
def test_every_column_of_the_template_is_one_that_an_import_knows(ending: str, tmp_path: Path) -> None:
    path = tmp_path / f"empty{ending}"
    write_template(path)
    assert {c.how for c in match_headings(headings_of(path)).columns} == {"exact"}
    report = load_file(path, KeptInMemory(), who="AB")
    assert (report.read, report.stored) == (0, 0)


@pytest.mark.parametrize("ending", [".csv", ".xlsx"])
def test_the_example_row_is_a_run(ending: str, tmp_path: Path) -> None:
    path = tmp_path / f"filled{ending}"
    write_template(path)
    headings = headings_of(path)
    row = [EXAMPLE.get(name, "") for name in headings]
    assert set(EXAMPLE) <= set(headings)
    if ending == ".csv":
        with path.open("a", encoding="utf-8", newline="") as file:
            csv.writer(file).writerow(row)
    else:
        book = openpyxl.load_workbook(path)
        book["runs"].append(row)
        book.save(path)
    sink = KeptInMemory()
    report = load_file(path, sink, who="AB")
    assert (report.stored, report.rejected, report.unknown_names) == (1, 0, ())
    (run,) = sink.runs.values()
    assert sum(run.outcome.split.values()) == pytest.approx(1)
    assert [(s.name, s.parts) for s in run.conditions.solvents] == [("DMF", 9.0), ("water", 1.0)]


def test_a_template_of_another_kind_is_refused(tmp_path: Path) -> None:
    with pytest.raises(ImportFileError, match="template"):
        write_template(tmp_path / "empty.rdf")
