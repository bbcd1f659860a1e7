"""What conditions and words add to a structure query over many runs, and what importing and loading cost.

Run by name: `pytest -m speed tests/speed -s`. SIDEPATH_BENCH_RUNS sets the number of runs (100,000 unless
given). Figures are printed; what is asserted is that answers are equal and memory is within the promise.
"""

from __future__ import annotations

import datetime as dt
import os
import sqlite3
import statistics
import time
from collections.abc import Callable, Iterator
from concurrent.futures import ProcessPoolExecutor
from pathlib import Path

import pytest
from rdkit import Chem, RDLogger

from kb.chem.fingerprint import morgan_generator
from kb.chem.query import parse_query
from kb.chem.screens import encode_structure
from kb.search.criteria import Criteria
from kb.search.finder import Finder
from kb.search.index import StructureIndex
from kb.store.store import Store
from kb.vocabulary import Role, Verdict
from tests.speed.run_set import CHEMISTRY, run_book
from tests.speed.structure_set import blob_file, smiles_of, wanted

pytestmark = pytest.mark.speed

REPEATS = 5
QUERIES = (
    "CC(C)(C)OC(=O)N",
    "[CX4][Cl,Br,I]",
    "c1ccc(cc1)CO[CX4]",
    "[CX4;H1]([#6])([#6])[OX2H]",
    "COC(=O)[#6]",
    "C1CCNCC1",
    "c1ccncc1",
    "[$([CX4]Br),$([CX4]Cl)]",
    "C1CC1",
    "CBr",
)


@pytest.fixture(scope="module")
def cache(pytestconfig: pytest.Config) -> Path:
    assert pytestconfig.cache is not None
    return pytestconfig.cache.mkdir("sidepath-bench")


@pytest.fixture(scope="module")
def book(cache: Path) -> Iterator[Store]:
    path = run_book(wanted("RUNS", 100_000), cache)
    with Store.open(path, read_only=True, **CHEMISTRY) as store:
        yield store


def test_a_full_find_against_the_bare_structure_query(book: Store, capsys: pytest.CaptureFixture[str]) -> None:
    finder = Finder(book)
    began = time.perf_counter()
    finder.find(Criteria(substructure="CBr"))
    load_s = time.perf_counter() - began
    index = finder.live.index()
    lines, ratios = [], []
    for smarts in QUERIES:
        query = parse_query(smarts)
        full = Criteria(
            substructure=smarts,
            role=Role.SUBSTRATE,
            solvent="DMF",
            temp_from_c=20,
            temp_to_c=90,
            verdict=Verdict.WORKED,
            words="emulsion",
            since=dt.date(2021, 1, 1),
        )
        bare_s = _best_cpu(lambda query=query: index.substructure(query))  # type: ignore[misc]
        alone_s = _best_cpu(lambda smarts=smarts: finder.find(Criteria(substructure=smarts)))  # type: ignore[misc]
        full_s = _best_cpu(lambda full=full: finder.find(full))  # type: ignore[misc]
        ratios.append(full_s / bare_s)
        total = finder.find(full).total
        lines.append(
            f"{smarts:32s} {total:6d} {bare_s * 1e3:9.2f} {alone_s * 1e3:9.2f} {full_s * 1e3:9.2f} {ratios[-1]:7.2f}"
        )
    with capsys.disabled():
        print(f"\n{book.count()} runs, {len(index)} structures; first after {load_s:.1f} s; processor times [ms]")
        print(f"{'query':32s} {'runs':>6s} {'bare':>9s} {'find':>9s} {'full':>9s} {'full/bare':>7s}")
        print("\n".join(lines))
        print(f"full find over bare structure query: median {statistics.median(ratios):.2f}, most {max(ratios):.2f}")


def test_importing_structures_against_bare_rdkit(cache: Path, capsys: pytest.CaptureFixture[str]) -> None:
    texts = smiles_of(6000, cache)[:6000]
    bare_s = min(_timed(lambda: _bare(texts)) for _ in range(3))
    ours_s = min(_timed(lambda: _ours(texts)) for _ in range(3))
    with ProcessPoolExecutor(2) as pool:
        halves = [texts[::2], texts[1::2]]
        list(pool.map(_ours, halves))  # the workers have their memos now, as in any long import
        both_s = min(_timed(lambda: list(pool.map(_ours, halves))) for _ in range(3))
    with capsys.disabled():
        print(f"\nencoding {len(texts)} structures: {ours_s / len(texts) * 1e6:.0f} us each")
        print(f"bare parse, pattern and Morgan fingerprint: {bare_s / len(texts) * 1e6:.0f} us each")
        print(f"ratio {ours_s / bare_s:.2f}; two processes {ours_s / both_s:.2f} times as fast as one")


@pytest.mark.parametrize("size", [10_000, 100_000, 1_000_000])
def test_loading_grows_with_size_and_stays_within_memory(
    size: int, cache: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    if size > wanted("SIZE", 200_000):
        pytest.skip(f"SIDEPATH_BENCH_SIZE is below {size}")
    blobs = blob_file(size, cache)
    with sqlite3.connect(blobs.path) as connection:
        statement = "SELECT structure_id, mol_binary, augmented, morgan FROM structure ORDER BY structure_id"
        sum(1 for _ in connection.execute(statement))  # from the disk
        read_s, read_cpu_s = _both(lambda: sum(1 for _ in connection.execute(statement)))

        loaded: list[StructureIndex] = []

        def load() -> None:
            loaded.append(StructureIndex(reserve=size))
            rows = connection.execute(statement)
            while chunk := rows.fetchmany(256):
                loaded[0].append(*zip(*chunk, strict=True))

        # twice: memory that a virtual machine hands out for the first time costs more than all the rest
        first_s, first_cpu_s = _both(load)
        loaded.clear()
        before = _resident_bytes()
        load_s, load_cpu_s = _both(load)
    index = loaded[0]
    beyond = (_resident_bytes() - before - index.molecules.binary_bytes) / len(index)
    with capsys.disabled():
        print(
            f"\n{len(index)} structures: blobs read in {read_s:.2f} s, loaded in {first_s:.2f}, then {load_s:.2f} s "
            f"(ratios {first_s / read_s:.2f}, {load_s / read_s:.2f}; by the processor {first_cpu_s / read_cpu_s:.2f}, "
            f"{load_cpu_s / read_cpu_s:.2f}); {beyond:.0f} bytes each beyond the "
            f"molecules' {index.molecules.binary_bytes / len(index):.0f}"
        )
    if size >= 100_000:
        assert beyond <= 900


def test_a_book_loads_its_structures(book: Store, capsys: pytest.CaptureFixture[str]) -> None:
    statement = "SELECT structure_id, mol_binary, augmented, morgan FROM structure ORDER BY structure_id"
    with sqlite3.connect(book.book.address.path or "") as connection:
        sum(1 for _ in connection.execute(statement))  # from the disk
        read_s, read_cpu_s = _both(lambda: sum(1 for _ in connection.execute(statement)))
    finder = Finder(book)
    finder.live.follow()
    load_s, load_cpu_s = _both(lambda: finder.live.index())
    with capsys.disabled():
        print(
            f"\nbook: blobs read in {read_s:.2f} s, index loaded in {load_s:.2f} s "
            f"(ratio {load_s / read_s:.2f}, by the processor {load_cpu_s / read_cpu_s:.2f})"
        )


def _best_cpu(work: Callable[[], object]) -> float:
    """Return the least processor time of a few runs [s]: the clock would count what else the machine does."""
    best_s = float("inf")
    for _ in range(REPEATS):
        began = time.process_time()
        work()
        best_s = min(best_s, time.process_time() - began)
    return best_s


def _both(work: Callable[[], object]) -> tuple[float, float]:
    """Return the time by the clock and by the processor [s]."""
    began, began_cpu = time.perf_counter(), time.process_time()
    work()
    return time.perf_counter() - began, time.process_time() - began_cpu


def _timed(work: object) -> float:
    began = time.perf_counter()
    work()  # type: ignore[operator]
    return time.perf_counter() - began


def _bare(texts: list[str]) -> None:
    RDLogger.DisableLog("rdApp.*")
    for text in texts:
        mol = Chem.MolFromSmiles(text)
        Chem.PatternFingerprint(mol)
        morgan_generator().GetFingerprint(mol)


def _ours(texts: list[str]) -> None:
    RDLogger.DisableLog("rdApp.*")
    for text in texts:
        encode_structure(text)


def _resident_bytes() -> int:
    """Return the memory of this process; Linux only, where the benchmark is meant to run."""
    import ctypes
    import gc

    gc.collect()
    ctypes.CDLL(None).malloc_trim(0)
    return int(Path("/proc/self/statm").read_text().split()[1]) * os.sysconf("SC_PAGE_SIZE")
