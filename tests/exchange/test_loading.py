"""An import as a job: every row counted once, nothing doubled, mendable rejects, stoppable, constant memory."""

from __future__ import annotations

import csv
import json
import tracemalloc
from pathlib import Path
from typing import Any

import pytest

from kb.exchange import loading
from kb.exchange.exporting import export_file
from kb.exchange.loading import load, load_file
from kb.exchange.rows import content_id
from kb.exchange.source import Read
from kb.exchange.sources import open_source
from tests.exchange.carried import KeptInMemory
from tests.factories import a_book, a_run

HEADINGS = "ref,scheme,solvent,temp,yield,note\n"


def table(path: Path, *rows: str) -> Path:
    path.write_text(HEADINGS + "".join(row + "\n" for row in rows), encoding="utf-8")
    return path


def good(number: int) -> str:
    return f"AB-{number},CCCCBr.[Na+].[I-]>>CCCCI,acetone,rt,{number % 100},note {number}"


def test_every_row_ends_in_exactly_one_count(tmp_path: Path) -> None:
    path = table(
        tmp_path / "a.csv", good(1), "AB-2,not a scheme,DMF,rt,5,", good(3), good(1), "AB-4,CCBr>>C=C,DMF,rt,500,"
    )
    report = load_file(path, KeptInMemory(), who="AB")
    assert (report.read, report.stored, report.duplicate, report.rejected) == (5, 2, 1, 2)
    assert [(r.row, r.column) for r in report.rejections] == [(3, "scheme"), (6, "yield")]
    assert {"read", "stored", "duplicate", "rejected", "stopped"} <= report.as_dict().keys()
    json.dumps(report.as_dict())


def test_a_second_import_of_the_same_file_stores_nothing(tmp_path: Path) -> None:
    path = table(tmp_path / "a.csv", *map(good, range(30)))
    with a_book(tmp_path) as book:
        first = load_file(path, book, who="AB")
        again = load_file(path, book, who="CD")
        assert (first.stored, again.stored, again.duplicate, book.count()) == (30, 0, 30, 30)


def test_a_run_amended_since_is_not_imported_anew(tmp_path: Path) -> None:
    path = table(tmp_path / "a.csv", good(1))
    with a_book(tmp_path) as book:
        load_file(path, book, who="AB")
        book.amend("R-0001", {"note": "corrected"}, who="CD", why="typing slip")
        assert load_file(path, book, who="AB").duplicate == 1
        assert book.get("R-0001").note == "corrected"


def test_identity_follows_what_the_file_says_not_the_order_of_its_columns(tmp_path: Path) -> None:
    one, other = tmp_path / "a.csv", tmp_path / "b.csv"
    one.write_text("scheme,solvent,note\nCCBr>>C=C,DMF,x\n")
    other.write_text("Notes;Solvents;Reaction\nx;DMF;CCBr>>C=C\n")
    (first,), (second,) = list(open_source(one)), list(open_source(other))
    assert first.run is not None and second.run is not None
    assert first.run.run_id == second.run.run_id
    assert content_id({"a": 1}) != content_id({"a": 2})


def test_the_identity_of_a_row_never_changes(tmp_path: Path) -> None:
    """A changed recipe would double every old import: this UUID was made once and is kept."""
    path = tmp_path / "a.csv"
    path.write_text("scheme,solvent,note\nCCBr>>C=C,DMF,x\n")
    (row,) = list(open_source(path))
    assert row.run is not None
    assert str(row.run.run_id) == "4f0928ac-7b78-562f-acd0-22826993d990"


def test_a_dry_run_counts_the_same_and_stores_nothing(tmp_path: Path) -> None:
    path = table(tmp_path / "a.csv", *map(good, range(25)), good(3), "x,broken(,DMF,rt,5,")
    with a_book(tmp_path) as book:
        load_file(table(tmp_path / "b.csv", good(1), good(2)), book, who="AB")
        rehearsed = load_file(path, book, who="AB", dry_run=True)
        assert book.count() == 2
        real = load_file(path, book, who="AB")
    counts = ("read", "stored", "duplicate", "rejected")
    assert [getattr(rehearsed, c) for c in counts] == [getattr(real, c) for c in counts] == [27, 23, 3, 1]


@pytest.mark.parametrize("ending", [".csv", ".jsonl", ".smi"])
def test_rejects_can_be_mended_and_fed_back(ending: str, tmp_path: Path) -> None:
    path, rejects = tmp_path / f"a{ending}", tmp_path / f"rejects{ending}"
    bad, mended = "CCBr>>C==C", "CCBr>>C=C"
    if ending == ".csv":
        table(path, good(1), f"AB-2,{bad},DMF,rt,5,=HYPERLINK(1)")
    elif ending == ".jsonl":
        path.write_text(f'{{"scheme": "CCCl>>C=C"}}\n{{"scheme": "{bad}", "nonsense": 1}}\n{{"scheme": "CC"\n')
    else:
        path.write_text(f"CCCl>>C=C\tfirst\n{bad}\tsecond\n")
    sink = KeptInMemory()
    report = load_file(path, sink, who="AB", rejects=rejects)
    assert report.stored == 1
    text = rejects.read_text(encoding="utf-8-sig")
    assert "=HYPERLINK" not in text.replace("'=HYPERLINK", "")
    again = load_file(rejects, sink, who="AB")
    assert (again.stored, again.rejected) == (0, report.rejected)
    mending = (
        text.replace(bad, mended)
        .replace(', "nonsense": 1', "")
        .replace('{\\"scheme\\": \\"CC\\"', '{\\"scheme\\": \\"CC\\"}')
    )
    rejects.write_text(mending, encoding="utf-8")
    final = load_file(rejects, sink, who="AB")
    assert (final.stored, final.rejected) == (report.rejected, 0)


def test_a_rejects_file_of_rejects_keeps_one_reason_a_row(tmp_path: Path) -> None:
    path = table(tmp_path / "a.csv", "AB-2,C(,DMF,rt,5,x")
    first, second = tmp_path / "r1.csv", tmp_path / "r2.csv"
    load_file(path, KeptInMemory(), who="AB", rejects=first)
    load_file(first, KeptInMemory(), who="AB", rejects=second)
    rows = list(csv.reader(second.open(encoding="utf-8-sig", newline="")))
    assert rows[0].count("sidepath reason") == 1
    assert len(rows[1]) == len(rows[0])


def test_no_rejects_file_appears_when_nothing_was_rejected(tmp_path: Path) -> None:
    load_file(table(tmp_path / "a.csv", good(1)), KeptInMemory(), who="AB", rejects=tmp_path / "r.csv")
    assert not (tmp_path / "r.csv").exists()


class StopAfter:
    """Progress that asks to stop once so many rows were seen."""

    def __init__(self, rows: int) -> None:
        self.rows, self.told = rows, list[tuple[int, int | None]]()

    def advance(self, done: int, total: int | None, note: str = "") -> None:
        self.told.append((done, total))

    def cancelled(self) -> bool:
        return bool(self.told) and self.told[-1][0] >= self.rows


def test_a_stopped_import_keeps_what_it_stored_and_goes_on_when_run_again(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(loading, "REPORT_EVERY_S", 0.0)
    monkeypatch.setattr(loading, "BATCH", 10)
    path = table(tmp_path / "a.csv", *map(good, range(95)))
    with a_book(tmp_path) as book:
        stopped = load_file(path, book, who="AB", progress=StopAfter(42))
        assert stopped.stopped and stopped.read == stopped.stored == book.count() == 42
        rest = load_file(path, book, who="AB")
        assert (rest.stopped, rest.stored, rest.duplicate, book.count()) == (False, 53, 42, 95)


def test_progress_tells_an_estimate_of_all_rows_that_comes_true(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(loading, "REPORT_EVERY_S", 0.0)
    watch = StopAfter(10**9)
    load_file(table(tmp_path / "a.csv", *map(good, range(300))), KeptInMemory(), who="AB", progress=watch)
    assert watch.told[-1] == (300, 300)
    assert all(total is None or total >= done for done, total in watch.told)


def test_runs_go_to_the_sink_as_one_stream_that_is_read_as_it_is_asked_for(tmp_path: Path) -> None:
    read_when_kept: list[int] = []

    class Watching(KeptInMemory):
        def add_many(self, many: Any, who: str, progress: Any = None) -> Any:
            read_when_kept.extend(job.read for _ in many)
            return KeptInMemory()

    source = loading.open_source(table(tmp_path / "a.csv", *map(good, range(20))))
    job = loading._Job(source, Watching(), "AB", loading.Silent(), False, None)
    job.run()
    assert read_when_kept == list(range(1, 21))


def test_unknown_names_are_kept_counted_and_reported(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_text("scheme,reagents,solvent\nCCBr>>C=C,unobtainium 2 equiv,DMF\nCCBr>>C=C,unobtainium,phlogiston\n")
    sink = KeptInMemory()
    report = load_file(path, sink, who="AB")
    assert dict(report.unknown_names) == {"unobtainium": 2, "phlogiston": 1}
    component = next(iter(sink.runs.values())).conditions.components[0]
    assert (component.name, component.smiles, component.equiv) == ("unobtainium", None, 2.0)


def test_memory_does_not_grow_with_the_file() -> None:
    class Endless:
        format_name = "csv"
        mapping = None
        done_share = 0.5

        def __init__(self, rows: int) -> None:
            from collections import Counter

            self.rows, self.unknown_names = rows, Counter[str]()

        def __iter__(self) -> Any:
            for number in range(self.rows):
                yield Read(row=number, run=a_run(note=str(number)))

    class Forgetful(KeptInMemory):
        def add_many(self, many: Any, who: str, progress: Any = None) -> Any:
            report = KeptInMemory()
            report.stored = sum(1 for _ in many)
            return report

    def peak(rows: int) -> int:
        tracemalloc.start()
        load(Endless(rows), Forgetful(), who="AB")
        top = tracemalloc.get_traced_memory()[1]
        tracemalloc.stop()
        return top

    peak(100)
    assert peak(8_000) < 1.3 * peak(2_000)


def test_an_exported_book_comes_back_as_duplicates(tmp_path: Path) -> None:
    with a_book(tmp_path) as book:
        book.add_many([a_run(note=str(n)) for n in range(12)], "AB")
        for ending in (".csv", ".xlsx", ".jsonl", ".rdf", ".sdf"):
            export_file(book.iter_runs(), tmp_path / f"all{ending}")
            report = load_file(tmp_path / f"all{ending}", book, who="AB")
            assert (report.stored, report.duplicate, report.rejected) == (0, 12, 0), ending
