"""Exchange files that were cut or lost bits on their way: told in a sentence or read, and the book stays as it was.

The suite tries 100 places of every format; `pytest -m soak tests/exchange/test_harmed_files.py` tries 2,000, and what
is too heavy for every day: 200 MB on one line, and fuzz of ten thousand examples for every reader.
"""

from __future__ import annotations

import datetime as dt
import json
import random
import subprocess
import sys
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from kb.chem.query import parse_query
from kb.errors import ImportFileError, SidepathError
from kb.exchange.entry_rules import check_entry
from kb.exchange.exporting import export_file
from kb.exchange.jsonlines import run_from_line
from kb.exchange.loading import load_file
from kb.exchange.sources import FORMATS
from kb.quantity import parse_amount, parse_concentration, parse_duration, parse_equiv, parse_temperature
from kb.store.checking import verify
from tests.exchange.carried import KeptInMemory
from tests.factories import CHEMISTRY, a_book, a_run

ENDINGS = (".csv", ".xlsx", ".jsonl", ".rdf", ".sdf", ".rxn", ".smi")
ROOT = Path(__file__).parents[2]


@pytest.fixture(scope="module")
def whole(tmp_path_factory: pytest.TempPathFactory) -> dict[str, bytes]:
    """Return a sound file of each format, a few runs in it."""
    folder = tmp_path_factory.mktemp("whole")
    found = {}
    for ending in ENDINGS:
        many = [a_run(note=f"run {n}, oiled out", reference=f"MK-{n}") for n in range(1 if ending == ".rxn" else 6)]
        export_file(iter(many), folder / f"all{ending}")
        found[ending] = (folder / f"all{ending}").read_bytes()
    return found


def read(path: Path) -> str:
    """Return how an import ended; nothing but the error of the family may come out, and every row is accounted for."""
    try:
        report = load_file(path, KeptInMemory(), who="AB")
    except ImportFileError as error:
        assert error.message and error.hint and "Traceback" not in error.message
        return "refused"
    assert report.read == report.stored + report.duplicate + report.rejected
    assert all(r.reason for r in report.rejections)
    return "rejected" if report.rejected else "read"


def harm(content: bytes, ending: str, places: int, tmp_path: Path) -> dict[str, int]:
    """Cut and flip a file at many places; return how often each end was met."""
    chance = random.Random(20260101)
    met: dict[str, int] = {}
    for number in range(places):
        at = chance.randrange(len(content))
        flipped = bytearray(content)
        flipped[at] ^= 1 << chance.randrange(8)
        for name, harmed in (("cut", content[:at]), ("flip", bytes(flipped))):
            path = tmp_path / f"{name}{number % 2}{ending}"
            path.write_bytes(harmed)
            end = read(path)
            met[end] = met.get(end, 0) + 1
    return met


@pytest.mark.parametrize("ending", ENDINGS)
def test_a_cut_file_and_a_flipped_bit_are_told_or_read_at_100_places(
    ending: str, whole: dict[str, bytes], tmp_path: Path
) -> None:
    met = harm(whole[ending], ending, 100, tmp_path)
    assert sum(met.values()) == 200
    assert met.get("refused", 0) + met.get("rejected", 0) > 20, met


@pytest.mark.soak
@pytest.mark.parametrize("ending", ENDINGS)
def test_a_cut_file_and_a_flipped_bit_are_told_or_read_at_2000_places(
    ending: str, whole: dict[str, bytes], tmp_path: Path
) -> None:
    assert sum(harm(whole[ending], ending, 2_000, tmp_path).values()) == 4_000


def test_a_harmed_file_leaves_the_book_as_it_was_but_for_whole_rows(whole: dict[str, bytes], tmp_path: Path) -> None:
    with a_book(tmp_path, **CHEMISTRY) as store:
        store.add(a_run(), "MK")
        before = store.get("1")
        for ending in (".xlsx", ".jsonl", ".rdf"):
            for part in (3, 2):
                path = tmp_path / f"half{ending}"
                path.write_bytes(whole[ending][: len(whole[ending]) // part])
                try:
                    load_file(path, store, who="AB")
                except ImportFileError as error:
                    assert error.hint
        assert store.get("1") == before
        assert all(check.ok for check in verify(store))


def test_the_clock_may_go_back_between_two_runs(tmp_path: Path) -> None:
    """History is ordered by what followed on what, not by the clock alone."""
    moments = iter([dt.datetime(2024, 5, 17, tzinfo=dt.UTC), dt.datetime(1999, 1, 1, tzinfo=dt.UTC)] * 20)
    with a_book(tmp_path, clock=lambda: next(moments), **CHEMISTRY) as store:
        for n in range(4):
            store.add(a_run(note=str(n)), "MK")
        store.amend("1", {"note": "first"}, "MK", "mended")
        store.amend("1", {"note": "second"}, "MK", "mended again")
        assert store.get("1").note == "second"
        assert [entry.revision for entry in store.history("1")] == [1, 2, 3]
        assert [run.code for run in store.iter_runs()] == [f"R-000{n}" for n in range(1, 5)]
        assert all(check.ok for check in verify(store))


_ONE_LINE = """
import resource, sys
from pathlib import Path
from kb.errors import ImportFileError
from kb.exchange.loading import load_file
from tests.exchange.carried import KeptInMemory
import rdkit.Chem, openpyxl
resource.setrlimit(resource.RLIMIT_AS, (int(sys.argv[2]), int(sys.argv[2])))
try:
    report = load_file(Path(sys.argv[1]), KeptInMemory(), who="AB")
    print("read", report.read, "rejected", report.rejected)
except ImportFileError as error:
    print("refused", error)
print(resource.getrusage(resource.RUSAGE_SELF).ru_maxrss // 1024, "MB")
"""


@pytest.mark.soak
@pytest.mark.skipif(sys.platform != "linux", reason="RLIMIT_AS as Linux has it")
@pytest.mark.parametrize("ending", sorted(set(FORMATS) - {".xlsx", ".xlsm"}))
def test_200_mb_on_one_line_end_in_a_sentence_within_bounds(ending: str, tmp_path: Path) -> None:
    path = tmp_path / f"long{ending}"
    with path.open("w") as file:
        for _ in range(200):
            file.write("C" * 1_000_000)
    limit = 2_000_000_000
    done = subprocess.run(
        [sys.executable, "-c", _ONE_LINE, str(path), str(limit)],
        cwd=ROOT,
        env={"PYTHONPATH": f"{ROOT}:{ROOT / 'tests'}"},
        capture_output=True,
        text=True,
        timeout=600,
    )
    assert done.stdout.startswith(("refused", "read 1 rejected 1", "read 0")), (done.stdout, done.stderr)
    assert int(done.stdout.split()[-2]) < 600


def fuzzed(text: str) -> None:
    """Give one text to every reader of texts; only errors of the family come out."""
    for reader in (parse_temperature, parse_duration, parse_concentration, parse_amount, parse_equiv, parse_query):
        try:
            reader(text)
        except SidepathError as error:
            assert error.message
    for line in (text, json.dumps({"scheme": text}), json.dumps({"scheme": "CCBr", "note": text})):
        try:
            check_entry(run_from_line(line))
        except SidepathError as error:
            assert error.message


SIGNS = (*"CNO()[]=#.>$;,&!@+-0129%/\\{}:\"' \t", "->", "$(", "[#6]", "\\ud800", "null")
WORDS = ("eq", "mol%", "°C", "K", "min", "±", "–", "e9", "nan", "1e400")
pieces = st.lists(st.sampled_from((*SIGNS, *WORDS)), max_size=30).map("".join)


@given(text=pieces | st.text(max_size=60))
def test_smarts_quantities_and_json_of_any_kind_are_refused_or_read(text: str) -> None:
    fuzzed(text)


@pytest.mark.soak
@settings(max_examples=10_000)
@given(text=pieces | st.text(max_size=200))
def test_ten_thousand_smarts_quantities_and_json_are_refused_or_read(text: str) -> None:
    fuzzed(text)


@pytest.mark.soak
@settings(max_examples=10_000)
@given(content=st.binary(max_size=600) | pieces.map(str.encode), ending=st.sampled_from(sorted(FORMATS)))
def test_ten_thousand_files_of_any_bytes_are_refused_or_read(content: bytes, ending: str, tmp_path: Path) -> None:
    path = tmp_path / f"a{ending}"
    path.write_bytes(content)
    read(path)
