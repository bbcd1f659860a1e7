"""Tables as they come: delimiters, encodings, marks, decimal commas, ragged rows, workbooks with real dates."""

from __future__ import annotations

import datetime as dt
from pathlib import Path

import openpyxl
import pytest

from kb.errors import ImportFileError
from kb.exchange.sources import open_source
from kb.exchange.tables_in import CsvTable, XlsxTable
from kb.record.run import Run
from kb.vocabulary import Fate

HEAD = "ref;date;scheme;solvent;T (°C);t / h;yield (%);SN2 (%);E2 (%);notes"
ROW = "MK1-003;17.05.2024;CCBr.[Na+].[I-]>>CCI;acetone;56,5;0,5;81,5;97;3;größer"


def runs_of(path: Path) -> list[Run]:
    found = []
    for row in open_source(path):
        assert row.rejection is None, row.rejection
        assert row.run is not None
        found.append(row.run)
    return found


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16", "utf-16-le", "cp1252"])
@pytest.mark.parametrize("delimiter", [";", "\t", "|"])
def test_any_delimiter_and_encoding_with_decimal_commas(encoding: str, delimiter: str, tmp_path: Path) -> None:
    path = tmp_path / "old.csv"
    path.write_bytes("\r\n".join([HEAD, ROW, "", ROW]).replace(";", delimiter).encode(encoding))
    run = runs_of(path)[0]
    assert run.note == "größer"
    assert run.date == dt.date(2024, 5, 17)
    assert run.conditions.temperature is not None and run.conditions.temperature.high_c == pytest.approx(56.5)
    assert run.conditions.time is not None and run.conditions.time.h == pytest.approx(0.5)
    assert run.outcome.isolated_yield_pct == pytest.approx(81.5)
    assert run.outcome.split == {Fate.SUBSTITUTION: pytest.approx(0.97), Fate.ELIMINATION: pytest.approx(0.03)}


def test_commas_inside_quotation_marks_and_lines_inside_cells_are_kept(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_text('scheme,solvent,note\nCCBr>>C=C,"1,4-dioxane","two\nlines, ""quoted"""\nCCCl>>C=C,DMF,next\n')
    table = list(CsvTable(path))
    assert [row.number for row in table] == [2, 4]
    first, second = runs_of(path)
    assert first.conditions.solvents[0].name == "1,4-dioxane"
    assert first.note == 'two\nlines, "quoted"'
    assert second.note == "next"


def test_titles_and_remarks_above_the_headings_are_passed_over(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_text("# invented\nReactions of 2024,,\n\nScheme,Solvent,Notes\nCCBr>>C=C,DMF,x\n")
    assert CsvTable(path).headings == ("Scheme", "Solvent", "Notes")
    assert len(runs_of(path)) == 1


def test_a_row_with_too_many_cells_is_refused_and_one_with_too_few_is_filled(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_text("scheme,solvent,note\nCCBr>>C=C,1,4-dioxane,x\nCCBr>>C=C\n")
    long, short = list(CsvTable(path))
    assert long.trouble is not None and "4 cells" in long.trouble
    assert short.trouble is None and short.values == ("CCBr>>C=C",)


def test_units_come_from_the_heading_only_for_bare_numbers(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_text("scheme,T / K,scale mmol,time (min)\nCCBr>>C=C,333,5,90\nCCBr>>C=C,rt,2 mol,overnight\n")
    first, second = runs_of(path)
    assert first.conditions.temperature is not None and first.conditions.temperature.high_c == pytest.approx(59.85)
    assert first.conditions.scale_mmol == 5
    assert first.conditions.time is not None and first.conditions.time.h == pytest.approx(1.5)
    assert second.conditions.temperature is not None and second.conditions.temperature.text == "rt"
    assert second.conditions.scale_mmol == 2000


def test_amount_columns_belong_to_the_material_on_their_left(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_text("scheme,nucleophile,eq,base,equiv.\nCCBr>>C=C,NaN3,1.5,K2CO3,2 equiv\nCCBr>>C=C,NaN3,,,\n")
    first, second = runs_of(path)
    assert [(c.name, c.equiv) for c in first.conditions.components] == [("NaN3", 1.5), ("K2CO3", 2.0)]
    assert [(c.name, c.equiv) for c in second.conditions.components] == [("NaN3", None)]


def test_words_for_numbers_go_to_the_note(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_text("scheme,yield (%),note\nCCBr>>C=C,trace,dark\nCCBr>>C=C,<5,\nCCBr>>C=C,n.d.,\nCCBr>>C=C,0,\n")
    found = runs_of(path)
    assert [r.outcome.isolated_yield_pct for r in found] == [None, None, None, 0.0]
    assert [r.note for r in found] == ["dark\n[yield (%): trace]", "[yield (%): <5]", "", ""]


def test_substrate_and_product_columns_make_a_scheme(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_text("starting material,product\nCCBr,C=C\nCCCl,\n")
    assert [r.scheme for r in runs_of(path)] == ["CCBr>>C=C", "CCCl>>"]


def test_a_workbook_gives_dates_percentages_and_numbers_as_they_were_typed(tmp_path: Path) -> None:
    book = openpyxl.Workbook()
    book.active.title = "cover"
    book.active["A1"] = "Our reactions"
    sheet = book.create_sheet("data")
    sheet.append(["Scheme", "Date", "Temp / °C", "Yield", "Notes"])
    sheet.append(["CCBr>>C=C", dt.datetime(2024, 5, 17), 80, 0.815, None])
    sheet.append([None, None, None, None, None])
    sheet.append(["CCBr>>C=C", "2024-05-18", "rt", 81.5, "#N/A"])
    sheet["D2"].number_format = "0.0%"
    book.save(tmp_path / "a.xlsx")
    table = XlsxTable(tmp_path / "a.xlsx")
    assert table.sheet == "data"
    assert [row.number for row in table] == [2, 4]
    first, second = runs_of(tmp_path / "a.xlsx")
    assert first.date == dt.date(2024, 5, 17) and second.date == dt.date(2024, 5, 18)
    assert first.outcome.isolated_yield_pct == second.outcome.isolated_yield_pct == pytest.approx(81.5)
    assert second.note == ""
    with pytest.raises(ImportFileError, match="no sheet"):
        XlsxTable(tmp_path / "a.xlsx", "elsewhere")


@pytest.mark.parametrize(
    ("name", "content", "why"),
    [
        ("a.csv", b"", "empty"),
        ("a.csv", b"\n\n\n", "no rows"),
        ("a.csv", b"a,b\n1,2\n", "No column tells the reaction"),
        ("a.csv", b"PK\x03\x04" + b"\0" * 50, "no text file"),
        ("a.xlsx", b"scheme,note\n", "no workbook"),
        ("a.docx", b"x", "names no format"),
    ],
)
def test_a_file_that_is_wrong_as_a_whole_is_refused_when_opened(
    name: str, content: bytes, why: str, tmp_path: Path
) -> None:
    (tmp_path / name).write_bytes(content)
    with pytest.raises(ImportFileError, match=why):
        open_source(tmp_path / name)


def test_a_missing_file_and_a_folder_are_said_to_be(tmp_path: Path) -> None:
    with pytest.raises(ImportFileError, match="There is no file"):
        open_source(tmp_path / "none.csv")
    (tmp_path / "folder.csv").mkdir()
    with pytest.raises(ImportFileError, match="is a folder"):
        open_source(tmp_path / "folder.csv")
