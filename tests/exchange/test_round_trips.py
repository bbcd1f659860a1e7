"""What goes out comes back: JSON Lines whole, tables and structure files in the fields that they carry."""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from kb.errors import ImportFileError
from kb.exchange.exporting import export_file
from kb.exchange.jsonlines import JsonLines
from kb.exchange.loading import load_file
from kb.record.run import Run
from tests.exchange.carried import KeptInMemory, carried_runs
from tests.factories import a_run, runs


def read_back(path: Path) -> list[Run]:
    sink = KeptInMemory()
    report = load_file(path, sink, who="AB")
    assert report.rejections == ()
    return list(sink.runs.values())


@given(many=st.lists(runs(), max_size=4, unique_by=lambda run: run.run_id))
def test_json_lines_give_back_every_run_whole(many: list[Run], tmp_path: Path) -> None:
    path = tmp_path / "all.jsonl"
    assert export_file(iter(many), path) == len(many)
    if many:
        assert [run for _, run, _ in JsonLines(path)] == many


@given(many=st.lists(carried_runs(), min_size=1, max_size=3, unique_by=lambda run: run.run_id))
def test_json_lines_of_runs_as_people_enter_them_are_imported_whole(many: list[Run], tmp_path: Path) -> None:
    path = tmp_path / "all.jsonl"
    export_file(iter(many), path)
    assert read_back(path) == many


@pytest.mark.soak
@settings(max_examples=5_000)
@given(run=runs())
def test_5000_random_runs_through_json_lines_come_back_equal(run: Run, tmp_path: Path) -> None:
    path = tmp_path / "one.jsonl"
    export_file(iter([run]), path)
    assert [found for _, found, _ in JsonLines(path)] == [run]


@pytest.mark.soak
@pytest.mark.parametrize("ending", [".jsonl", ".csv", ".tsv", ".xlsx", ".rdf", ".sdf"])
@settings(max_examples=1_000)
@given(many=st.lists(carried_runs(), min_size=5, max_size=5, unique_by=lambda run: run.run_id))
def test_5000_random_runs_come_back_equal_in_what_the_format_carries(
    many: list[Run], ending: str, tmp_path: Path
) -> None:
    path = tmp_path / f"all{ending}"
    export_file(iter(many), path)
    assert read_back(path) == many


@pytest.mark.parametrize("ending", [".csv", ".tsv", ".xlsx", ".rdf", ".sdf"])
@settings(max_examples=30)
@given(many=st.lists(carried_runs(), min_size=1, max_size=3, unique_by=lambda run: run.run_id))
def test_tables_and_structure_files_give_back_what_they_carry(many: list[Run], ending: str, tmp_path: Path) -> None:
    path = tmp_path / f"all{ending}"
    assert export_file(iter(many), path) == len(many)
    assert read_back(path) == many


@pytest.mark.parametrize("ending", [".csv", ".xlsx", ".rdf", ".sdf", ".smi", ".jsonl"])
@given(run=runs())
def test_any_run_that_a_book_keeps_can_be_exported(run: Run, ending: str, tmp_path: Path) -> None:
    path = tmp_path / f"one{ending}"
    assert export_file(iter([run]), path) == 1
    try:
        load_file(path, KeptInMemory(), who="AB")
    except ImportFileError as refused:  # a list of one scheme that is no structure is taken for another kind of file
        assert ending == ".smi" and "holds no reaction SMILES" in str(refused)


def test_an_rxn_file_carries_the_scheme_of_one_run(tmp_path: Path) -> None:
    run = a_run(scheme="C[C@H](Cl)c1ccccc1.[Na+].[I-]>CC(C)=O>C[C@@H](I)c1ccccc1")
    export_file(iter([run]), tmp_path / "one.rxn")
    assert [r.scheme for r in read_back(tmp_path / "one.rxn")] == [
        "C[C@H](Cl)c1ccccc1.[Na+].[I-]>CC(C)=O>C[C@@H](I)c1ccccc1"
    ]
    with pytest.raises(ImportFileError, match="one run"):
        export_file(iter([run, a_run()]), tmp_path / "two.rxn")


def test_an_export_that_is_stopped_leaves_the_old_file(tmp_path: Path) -> None:
    class Stop:
        def advance(self, done: int, total: int | None, note: str = "") -> None: ...

        def cancelled(self) -> bool:
            return True

    path = tmp_path / "runs.csv"
    path.write_text("kept")
    from kb.errors import Cancelled

    with pytest.raises(Cancelled):
        export_file(iter([a_run()]), path, Stop())
    assert path.read_text() == "kept"
    assert [p.name for p in tmp_path.iterdir()] == ["runs.csv"]


def test_an_export_to_nowhere_is_refused_in_a_sentence(tmp_path: Path) -> None:
    with pytest.raises(ImportFileError, match="cannot be written"):
        export_file(iter([a_run()]), tmp_path / "missing" / "runs.csv")
    with pytest.raises(ImportFileError, match="names no format"):
        export_file(iter([a_run()]), tmp_path / "runs.docx")
