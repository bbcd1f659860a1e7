"""No cell of an export can act as a formula, and nothing is changed by the guard once it is read back."""

from __future__ import annotations

import csv
import re

import openpyxl
import pytest
from hypothesis import given
from hypothesis import strategies as st

from kb.exchange.exporting import export_file
from kb.exchange.safe_cells import guarded, unguarded
from tests.factories import a_run

HOSTILE = (
    '=HYPERLINK("http://example.org","x")',
    "+1+1",
    "-2+3",
    "@SUM(A1)",
    "\t=1+1",
    "\r=1+1",
    "  =1+1",
    "fine; =1+1",
    "a,=1+1",
    "line\n=1+1",
    "'=1+1",
    "\uff1d1+1",
)
dangerous = st.text(st.sampled_from("=+-@';,|\t\n\r ax1\uff1d"), max_size=12)


@given(text=dangerous | st.text(max_size=30))
def test_reading_gives_back_what_was_guarded(text: str) -> None:
    assert unguarded(guarded(text)) == text


@given(text=dangerous)
def test_no_guarded_cell_or_part_of_one_starts_like_a_formula(text: str) -> None:
    safe = guarded(text)
    if not re.fullmatch(r"[+-]?\d+([.,]\d+)?", safe):
        for part in re.split(r"[;,|\t\r\n]", safe):
            assert not part.lstrip().startswith(("=", "+", "-", "@", "\uff1d")), safe


def test_plain_numbers_and_temperatures_stay_readable() -> None:
    assert [guarded(t) for t in ("-78", "+3.5", "60 °C", "substitution 88; elimination 10")] == [
        "-78",
        "+3.5",
        "60 °C",
        "substitution 88; elimination 10",
    ]


@pytest.mark.parametrize("text", HOSTILE)
def test_hostile_notes_are_text_in_csv_and_xlsx(text: str, tmp_path) -> None:  # type: ignore[no-untyped-def]
    run = a_run(note=text, project=text, reference=text)
    export_file(iter([run]), tmp_path / "a.csv")
    with (tmp_path / "a.csv").open(encoding="utf-8-sig", newline="") as file:
        row = next(csv.DictReader(file))
    assert row["note"].lstrip()[0] not in "=+-@\uff1d"
    export_file(iter([run]), tmp_path / "a.xlsx")
    sheet = openpyxl.load_workbook(tmp_path / "a.xlsx").active
    assert not [c.coordinate for line in sheet.iter_rows() for c in line if c.data_type == "f"]
