"""Files made to hurt: each is refused or its bad rows are counted, in a sentence, within bounds."""

from __future__ import annotations

import tracemalloc
import zipfile
from pathlib import Path

import openpyxl
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from kb.errors import ImportFileError
from kb.exchange import tables_in, text_in
from kb.exchange.loading import LoadReport, load_file
from kb.exchange.sources import FORMATS
from tests.exchange.carried import KeptInMemory

ENDINGS = sorted(FORMATS)


def read(path: Path) -> LoadReport | ImportFileError:
    try:
        report = load_file(path, KeptInMemory(), who="AB")
    except ImportFileError as error:
        assert str(error) and "\n" not in error.message
        return error
    assert report.read == report.stored + report.duplicate + report.rejected
    assert all(r.reason and len(r.reason) < 2000 for r in report.rejections)
    return report


@settings(max_examples=150)
@given(content=st.binary(max_size=300), ending=st.sampled_from(ENDINGS))
def test_bytes_of_any_kind_are_refused_or_read(content: bytes, ending: str, tmp_path: Path) -> None:
    path = tmp_path / f"a{ending}"
    path.write_bytes(content)
    read(path)


SIGNS = (",", ";", "\t", '"', "\n", "\r", "\0", "{", "}", "é", "\ufeff", "\\u0000", "\x1b[2J", "=1+1")
FRAMES = ("$RFMT\n", "$RXN\n", "$DTYPE a\n", "$DATUM b\n", "M  END\n", "$$$$\n", ">  <x>\n", "  3  1\n")
fragments = st.sampled_from(("scheme", "note", "CCBr>>C=C", '"scheme":', *SIGNS, *FRAMES))


@settings(max_examples=300)
@given(parts=st.lists(fragments, max_size=25), ending=st.sampled_from(ENDINGS), head=st.booleans())
def test_pieces_of_every_format_in_any_order_are_refused_or_read(
    parts: list[str], ending: str, head: bool, tmp_path: Path
) -> None:
    path = tmp_path / f"a{ending}"
    start = {"csv": "scheme,note\n", "rdf": "$RDFILE 1\n$RFMT\n"}.get(FORMATS[ending], "") if head else ""
    path.write_bytes((start + "".join(parts)).encode())
    read(path)


def test_one_endless_line_costs_no_memory(tmp_path: Path) -> None:
    for ending in (".csv", ".jsonl", ".sdf", ".smi"):
        path = tmp_path / f"a{ending}"
        with path.open("wb") as file:
            file.write(b"scheme,note\n" if ending == ".csv" else b"")
            for _ in range(60):
                file.write(b"x" * 1_000_000)
            file.write(b"\nCCBr>>C=C,after\n" if ending == ".csv" else b"\n")
        tracemalloc.start()
        found = read(path)
        peak = tracemalloc.get_traced_memory()[1]
        tracemalloc.stop()
        assert peak < 40_000_000, ending
        if ending == ".csv":
            assert isinstance(found, LoadReport)
            assert (found.stored, found.rejected) == (1, 1)


def test_a_first_line_that_never_ends_is_no_heading_row(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_bytes(b"a" * (text_in.LONGEST_LINE + 10))
    with pytest.raises(ImportFileError, match="too long to be a heading row"):
        load_file(path, KeptInMemory(), who="AB")


def test_a_million_columns_are_refused(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_text("scheme" + "," * 1_000_000 + "\nCCBr>>C=C\n")
    with pytest.raises(ImportFileError, match="columns"):
        load_file(path, KeptInMemory(), who="AB")


def test_a_quotation_mark_that_is_never_closed_loses_its_row_and_says_so(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    rows = "".join(f"CCBr>>C=C,{'x' * 90}{n}\n" for n in range(4000))
    path.write_text('scheme,note\nCCBr>>C=C,"open\n' + rows)
    found = read(path)
    assert isinstance(found, LoadReport)
    assert found.rejected >= 1 and "quotation mark" in found.rejections[0].reason
    assert found.stored > 2000


@pytest.mark.parametrize(
    ("member", "content"),
    [
        (
            "xl/sharedStrings.xml",
            b'<?xml version="1.0"?><!DOCTYPE x [<!ENTITY a "ha"><!ENTITY b "&a;&a;">]><sst>&b;</sst>',
        ),
        ("xl/workbook.xml", '<?xml version="1.0" encoding="UTF-16"?><!DOCTYPE x>'.encode("utf-16")),
    ],
)
def test_a_workbook_that_declares_entities_is_refused(member: str, content: bytes, tmp_path: Path) -> None:
    path = tmp_path / "a.xlsx"
    with zipfile.ZipFile(path, "w") as archive:
        archive.writestr("[Content_Types].xml", "<Types/>")
        archive.writestr(member, content)
    with pytest.raises(ImportFileError, match="entities"):
        load_file(path, KeptInMemory(), who="AB")


def test_a_workbook_that_unpacks_to_far_more_than_it_weighs_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "a.xlsx"
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        archive.writestr("[Content_Types].xml", "<Types/>")
        with archive.open("xl/worksheets/sheet1.xml", "w", force_zip64=True) as part:
            for _ in range(40):
                part.write(b" " * 1_000_000)
    assert path.stat().st_size < 200_000
    with pytest.raises(ImportFileError, match="unpacks to more"):
        load_file(path, KeptInMemory(), who="AB")


def test_a_damaged_workbook_is_refused_at_whatever_place_it_is_cut(tmp_path: Path) -> None:
    book = openpyxl.Workbook()
    book.active.append(["scheme", "note"])
    for n in range(50):
        book.active.append(["CCBr>>C=C", f"note {n}"])
    whole = tmp_path / "whole.xlsx"
    book.save(whole)
    content = whole.read_bytes()
    for cut in range(0, len(content), max(len(content) // 25, 1)):
        (tmp_path / "cut.xlsx").write_bytes(content[:cut])
        assert isinstance(read(tmp_path / "cut.xlsx"), ImportFileError)
        flipped = bytearray(content)
        flipped[cut] ^= 0xFF
        (tmp_path / "flipped.xlsx").write_bytes(flipped)
        read(tmp_path / "flipped.xlsx")


def test_a_sheet_that_claims_to_be_huge_is_read_to_its_real_end(tmp_path: Path) -> None:
    book = openpyxl.Workbook()
    book.active.append(["scheme", "note"])
    book.active.append(["CCBr>>C=C", "x"])
    book.active["ZZ3"] = "far right"
    book.save(tmp_path / "a.xlsx")
    found = read(tmp_path / "a.xlsx")
    assert isinstance(found, LoadReport) and found.stored == 1
    assert tables_in.MAX_COLUMNS < 702


def test_control_characters_in_cells_reach_the_note_or_are_refused_but_never_stop_the_import(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_bytes(b"scheme,note\nCCBr>>C=C,\x1b[31mred\x07\nCCBr>>C=C,nul\x00here\nCCBr>>C=C,fine\n")
    sink = KeptInMemory()
    report = load_file(path, sink, who="AB")
    assert (report.stored, report.rejected) == (2, 1)
    assert [r.note for r in sink.runs.values()] == ["\x1b[31mred\x07", "fine"]


JUNK = ("Dear all, the pump oil was changed today.\n" * 3, "a,b,c\n1,2,3\n", "{}\n", "<html><body>no</body></html>\n")


@pytest.mark.parametrize("text", JUNK)
@pytest.mark.parametrize("name", ["a.rdf", "a.rxn", "a.sdf", "a.smi"])
def test_a_file_that_holds_nothing_of_its_kind_is_refused_and_not_read_as_empty(
    name: str, text: str, tmp_path: Path
) -> None:
    path = tmp_path / name
    path.write_text(text)
    assert isinstance(read(path), ImportFileError), name


@pytest.mark.parametrize("head", ["$RDFILE 1\n", "$RDFILE 1\n$DATM 01/01/00 00:00\nwords\n" * 2])
def test_an_rdfile_without_a_record_is_refused(head: str, tmp_path: Path) -> None:
    path = tmp_path / "a.rdf"
    path.write_text(head)
    assert isinstance(read(path), ImportFileError)
