"""`import`, `export`, `template` and `mappings` as they are typed."""

from __future__ import annotations

import json
import os
import pty
import select
import subprocess
import sys
import time
from pathlib import Path

import openpyxl
import pytest

from kb import paths
from kb.exchange.json_schema import PUBLISHED
from tests.asking import ask, is_plain_refusal

HEAD = "Rxn SMILES,Solvent,Reaktion temprature (K),Yield / %,Date\n"
ROW = "CCCBr.[I-]>>CCCI,acetone,330,80,03/04/2024\n"


@pytest.fixture
def book(tmp_path: Path) -> Path:
    """Return a new book."""
    place = tmp_path / "own.sidepath"
    assert ask("new", book=place).status == 0
    return place


def table(tmp_path: Path, text: str = HEAD + ROW) -> Path:
    """Write a table."""
    path = tmp_path / "old.csv"
    path.write_text(text, encoding="utf-8")
    return path


@pytest.mark.parametrize("ending", ["csv", "xlsx"])
def test_a_template_is_written_filled_in_and_imported(ending: str, book: Path, tmp_path: Path) -> None:
    file = tmp_path / f"runs.{ending}"
    assert ask("template", str(file)).status == 0
    assert is_plain_refusal(ask("template", str(file)))  # never overwrites
    if ending == "csv":
        headings = file.read_text(encoding="utf-8-sig").splitlines()[-1].split(",")
        with file.open("a", encoding="utf-8") as handle:
            handle.write(",".join("CCCBr>>CC=C" if h == "scheme" else "" for h in headings) + "\r\n")
    else:
        workbook = openpyxl.load_workbook(file)
        sheet = workbook["runs"]
        headings = [cell.value for cell in sheet[1]]
        sheet.append(["CCCBr>>CC=C" if h == "scheme" else None for h in headings])
        workbook.save(file)
    assert ask("import", str(file), "--json", book=book).json["stored"] == 1


def test_the_json_schema_is_written_on_request(tmp_path: Path) -> None:
    file = tmp_path / "run.json"
    assert ask("template", str(file)).status == 0
    assert file.read_text(encoding="utf-8") == PUBLISHED.read_text(encoding="utf-8")


def test_a_template_of_another_ending_or_in_no_folder_is_refused(tmp_path: Path) -> None:
    for name in ("runs.doc", "none/runs.csv", "none/run.json"):
        assert is_plain_refusal(ask("template", str(tmp_path / name))), name


def test_a_dry_run_shows_what_each_heading_is_taken_for(book: Path, tmp_path: Path) -> None:
    said = ask("import", str(table(tmp_path)), "--dry-run", "--dates", "dmy", book=book).out
    assert "Rxn SMILES: scheme" in said
    assert "Reaktion temprature (K): temperature [K] (resembles it)" in said
    assert "would be stored" in said


def test_dates_with_slashes_want_their_order(book: Path, tmp_path: Path) -> None:
    file = table(tmp_path)
    assert ask("import", str(file), "--dry-run", "--json", book=book).json["rejected"] == 1
    for order, day in (("dmy", "2024-04-03"), ("mdy", "2024-03-04")):
        fresh = tmp_path / f"{order}.sidepath"
        ask("new", book=fresh)
        assert ask("import", str(file), "--dates", order, book=fresh).status == 0
        assert ask("runs", "--json", book=fresh).json["items"][0]["date"] == day


def test_an_order_that_is_none_is_refused(book: Path, tmp_path: Path) -> None:
    assert ask("import", str(table(tmp_path)), "--dates", "ymd", book=book).status == 2
    mapping = tmp_path / "m.json"
    mapping.write_text('{"columns": {}, "date_order": "ymd"}', encoding="utf-8")
    assert is_plain_refusal(ask("import", str(table(tmp_path)), "--mapping", str(mapping), book=book))


def test_a_mapping_is_saved_by_name_listed_shown_and_used(book: Path, tmp_path: Path) -> None:
    first = table(tmp_path, "what we ran,Solvent,T/K,when\nCCCBr.[I-]>>CCCI,acetone,330,03/04/2024\n")
    chosen = tmp_path / "chosen.json"
    columns = {"what we ran": "scheme", "T/K": {"field": "temperature", "unit": "K"}, "when": "date"}
    chosen.write_text(json.dumps({"columns": columns}), encoding="utf-8")
    assert is_plain_refusal(ask("import", str(first), book=book))
    words = ("--mapping", str(chosen), "--dates", "dmy", "--save-mapping", "old-table")
    assert ask("import", str(first), *words, book=book).status == 0
    assert ask("mappings", "--json").json == ["old-table"]
    assert "when: date" in ask("mappings", "old-table").out
    again = table(tmp_path, "when,what we ran,T/K\n05/06/2024,CCCBr.[I-]>>CCCI,300\n")
    assert ask("import", str(again), "--mapping", "old-table", book=book).status == 0
    assert {r["date"] for r in ask("runs", "--json", book=book).json["items"]} == {"2024-04-03", "2024-06-05"}


@pytest.mark.parametrize("name", ["../evil", "a/b", ".hidden", "", "x" * 61, "a\x1b[2J"])
def test_a_name_that_could_leave_the_folder_is_refused(name: str, book: Path, tmp_path: Path) -> None:
    answer = ask("import", str(table(tmp_path)), "--save-mapping", name, "--dates", "dmy", book=book)
    assert answer.status in (1, 2) and "Traceback" not in answer.err
    assert not list(paths.mappings_folder().parent.rglob("*.json")) and not (tmp_path / "evil.json").exists()


def test_a_mapping_that_is_not_there_is_told_with_the_near_one(book: Path, tmp_path: Path) -> None:
    file = str(table(tmp_path))
    ask("import", file, "--dates", "dmy", "--save-mapping", "pilot", book=book)
    answer = ask("import", file, "--mapping", "piolt", book=book)
    assert is_plain_refusal(answer) and "Did you mean pilot?" in answer.err


def test_a_sheet_is_chosen_by_name(book: Path, tmp_path: Path) -> None:
    workbook = openpyxl.Workbook()
    for name, smiles in (("2023", "CCBr>>C=C"), ("2024", "CCCBr>>CC=C")):
        sheet = workbook.create_sheet(name)
        sheet.append(["scheme"])
        sheet.append([smiles])
    file = tmp_path / "years.xlsx"
    workbook.save(file)
    assert ask("import", str(file), "--sheet", "2024", book=book).status == 0
    assert [r["scheme"] for r in ask("runs", "--json", book=book).json["items"]] == ["CCCBr>>CC=C"]
    answer = ask("import", str(file), "--sheet", "2025", book=book)
    assert is_plain_refusal(answer) and "2023" in answer.err


@pytest.mark.parametrize(("words", "answer", "stored"), [((), "n", 0), ((), "y", 1), (("--yes",), None, 1)])
def test_headings_that_only_resemble_a_field_are_asked_about_at_a_terminal(
    words: tuple[str, ...], answer: str | None, stored: int, book: Path, tmp_path: Path
) -> None:
    file = table(tmp_path)
    command = [sys.executable, "-m", "kb", "--book", str(book), "import", str(file), "--dates", "dmy", *words]
    master, slave = pty.openpty()
    process = subprocess.Popen(command, stdin=slave, stdout=slave, stderr=slave, env=os.environ | {"TERM": "xterm"})
    os.close(slave)
    said, until = b"", time.monotonic() + 120
    while time.monotonic() < until:
        if not select.select([master], [], [], 0.2)[0]:
            continue
        try:
            part = os.read(master, 4096)
        except OSError:  # the other end was closed
            break
        if not part:
            break
        said += part
        if answer is not None and b"[Y/n]" in said:
            os.write(master, answer.encode() + b"\n")
            answer = None
    process.wait(timeout=60)
    os.close(master)
    assert ask("runs", "--json", book=book).json["total"] == stored, said
    assert process.returncode == (0 if stored else 130)
