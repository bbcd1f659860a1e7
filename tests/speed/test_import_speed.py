"""What an import costs beside the bare RDKit work for the same rows, and whether its memory stays flat.

Run by name: `pytest -m speed tests/speed/test_import_speed.py -n0 -s`. SIDEPATH_BENCH_ROWS sets the rows (5,000 unless
given; 100000 for the figure in DEVELOPERS.md). CPU time of this process and of its children, so that a busy machine
changes little; the peers run in the same process, on the same rows. Two peers, because an import does two things:

- `bare`: every structure of every row parsed, written canonically and fingerprinted (pattern, Morgan), nothing kept;
- `bare and what changed`: besides, the atoms that changed found by RDKit's own means without atom maps, the largest
  common substructure of the largest reactant and the product (rdFMCS), on a sample of rows. Sidepath finds centre,
  leaving group, nucleophile and fate instead.

Rows are the reactions of tests/data/patent_reactions.csv, under conditions drawn at random: 1,700 different schemes, so
with more rows schemes repeat, as they do where a group screens conditions. The first 1,700 rows are printed by
themselves.
"""

from __future__ import annotations

import csv
import os
import random
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from concurrent.futures import ProcessPoolExecutor
from multiprocessing import get_context
from pathlib import Path

import pytest
from rdkit import Chem, RDLogger
from rdkit.Chem import rdFMCS

from kb.chem.fingerprint import morgan_generator
from tests.speed.structure_set import DATA, wanted

pytestmark = pytest.mark.speed

HEADINGS = (
    "date,by,reference,scheme,bases,solvent,temperature,time,concentration,scale,split / %,method,isolated yield / %,"
    "verdict,note"
)
BASES = ("K2CO3 2 equiv", "NaH 1.1 equiv", "KOtBu 1.5 equiv", "DIPEA 3 equiv", "")
SOLVENTS = ("DMF", "DMSO", "THF", "MeCN", "EtOH", "toluene", "DCM", "acetone", "DMF:water 9:1")
NOTES = ("clean conversion by NMR", "emulsion at work-up", "smelled of alkene", "")
DIFFERENT = 1_700

_IMPORT = """
import resource, sys, time
from pathlib import Path
import kb.book.chemistry as chemistry
options = chemistry.store_options
chemistry.store_options = lambda: options() | {"processes": int(sys.argv[3])}
from kb.book import open_book
with open_book(sys.argv[2], create=True) as book:
    began = time.perf_counter()
    report = book.import_file(Path(sys.argv[1]), who="XX")
    passed = time.perf_counter() - began
used = [resource.getrusage(who) for who in (resource.RUSAGE_SELF, resource.RUSAGE_CHILDREN)]
cpu = sum(u.ru_utime + u.ru_stime for u in used)
assert report.stored == report.read, report
print(report.read, cpu, passed, used[0].ru_maxrss / 1024, used[1].ru_maxrss / 1024)
"""


def schemes() -> list[str]:
    """Return the schemes of the patent reactions, maps left out."""
    with (DATA / "patent_reactions.csv").open(encoding="utf-8", newline="") as file:
        return [row["rxn_smiles_unmapped"] for row in csv.DictReader(line for line in file if not line.startswith("#"))]


def table(path: Path, rows: Iterator[tuple[int, str]]) -> Path:
    """Write runs of the schemes under drawn conditions."""
    chance = random.Random(20260101)
    with path.open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file)
        writer.writerow(HEADINGS.split(","))
        for number, scheme in rows:
            share = chance.randrange(20, 95)
            day = f"20{chance.randrange(10, 25)}-0{chance.randrange(1, 10)}-1{chance.randrange(10)}"
            warm, long = chance.randrange(0, 120, 5), chance.choice(["16 h", "2 h", "overnight", "30 min"])
            writer.writerow(
                [
                    *(day, "XX", f"XX-{number}", scheme, chance.choice(BASES), chance.choice(SOLVENTS)),
                    *(f"{warm} °C", long, "0.2 M", "5 mmol", f"substitution {share}; elimination {100 - share}"),
                    *("nmr", str(share - 5), "worked", chance.choice(NOTES)),
                ]
            )
    return path


def imported(source: Path, folder: Path, processes: int) -> tuple[float, float, float, float]:
    """Return CPU and wall time [s] and the largest memory of the program and of a process beside it [MB]."""
    book = folder / f"{source.stem}-{processes}.sidepath"
    command = [sys.executable, "-c", _IMPORT, str(source), str(book), str(processes)]
    here = str(Path(__file__).resolve().parents[2])
    made = subprocess.run(
        command, capture_output=True, text=True, check=True, cwd=here, env=os.environ | {"PYTHONPATH": here}
    )
    _, cpu_s, wall_s, own_mb, other_mb = map(float, made.stdout.split())
    book.unlink()
    return cpu_s, wall_s, own_mb, other_mb


def bare(texts: list[str]) -> float:
    """Return the CPU time [s] of parsing, canonical SMILES and fingerprints of all structures."""
    RDLogger.DisableLog("rdApp.*")
    generator = morgan_generator()
    began = time.process_time()
    for text in texts:
        for part in text.replace(">", ".").split("."):
            if part:
                mol = Chem.MolFromSmiles(part)
                Chem.MolToSmiles(mol)
                Chem.PatternFingerprint(mol)
                generator.GetFingerprint(mol)
    return time.process_time() - began


def what_changed(texts: list[str]) -> float:
    """Return the CPU time [s] of finding what two sides have in common by rdFMCS."""
    began = time.process_time()
    for text in texts:
        left, _, right = text.split(">")
        reactants = [Chem.MolFromSmiles(part) for part in left.split(".")]
        product = Chem.MolFromSmiles(right.split(".")[0])
        rdFMCS.FindMCS([max(reactants, key=Chem.Mol.GetNumAtoms), product], timeout=5)
    return time.process_time() - began


def timed(work: Callable[[], object]) -> float:
    """Return the wall time [s] of some work."""
    began = time.perf_counter()
    work()
    return time.perf_counter() - began


def test_import_against_the_bare_rdkit_work_for_the_same_rows(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    texts = schemes()
    count = wanted("ROWS", 5_000)
    changed_us = what_changed(texts[:DIFFERENT:9]) / len(texts[:DIFFERENT:9]) * 1e6
    lines = []
    for rows, processes in ((DIFFERENT, 1), (count, 1), (count, 2)):
        these = [texts[n % len(texts)] for n in range(rows)]
        source = table(tmp_path / f"rows{rows}.csv", iter(enumerate(these)))
        sample = these[: max(DIFFERENT, 5_000)]
        before_us = bare(sample) / len(sample) * 1e6
        cpu_s, wall_s, own_mb, other_mb = imported(source, tmp_path, processes)
        bare_us = (before_us + bare(sample) / len(sample) * 1e6) / 2
        ours_us = cpu_s / rows * 1e6
        lines.append(
            f"{rows:8,d} {processes:9d} {ours_us:9.0f} {bare_us:6.0f} {ours_us / bare_us:7.2f} "
            f"{ours_us / (bare_us + changed_us):12.2f} {wall_s:8.1f} {own_mb:8.0f} {other_mb:8.0f}"
        )
    with capsys.disabled():
        print(f"\nmicroseconds of CPU a row; what changed, by rdFMCS: {changed_us:.0f} a row")
        print("    rows processes    import   bare   ratio with changed  wall/s   own/MB other/MB")
        print("\n".join(lines))


def test_two_processes_against_two_processes_of_bare_work(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    texts = (schemes() * 4)[:5_000]
    source = table(tmp_path / "rows.csv", iter(enumerate(texts)))
    with ProcessPoolExecutor(2, mp_context=get_context("spawn")) as pool:
        list(pool.map(bare, [texts[:50]] * 2))
        both_s = timed(lambda: list(pool.map(bare, [texts[::2], texts[1::2]])))
    one_s = timed(lambda: bare(texts))
    walls = {n: imported(source, tmp_path, n)[1] for n in (1, 2)}
    with capsys.disabled():
        print(f"\n{len(texts)} rows, two cores against one, wall time: import {walls[1] / walls[2]:.2f} times as fast")
        print(f"bare RDKit work {one_s / both_s:.2f} times; where other programs run, neither reaches two")


def test_memory_is_flat(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    few, many = 10_000, wanted("MEMORY_ROWS", 40_000)
    figures = []
    for rows in (few, many):
        source = table(tmp_path / f"cheap{rows}.csv", ((n, f"CCC{'C' * (n % 5)}Br.[I-]>>CCCI") for n in range(rows)))
        figures.append((rows, *imported(source, tmp_path, 2)[2:]))
    with capsys.disabled():
        for rows, own_mb, other_mb in figures:
            print(f"\n{rows:,} rows: at most {own_mb:.0f} MB, each process beside it {other_mb:.0f} MB")
    assert figures[1][1] < 1.25 * figures[0][1]
