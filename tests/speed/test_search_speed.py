"""Search benchmarks, run by name: `pytest -m speed tests/speed -s`. They print tables with ratios.

They compare, in one process and with the same threads, with RDKit's SubstructLibrary (CachedMolHolder +
PatternHolder) and with FPSim2 where it is installed. What they assert is that answers are equal; times are
printed, never asserted, and taken as the best of REPEATS since other work on the machine only ever adds.
SIDEPATH_BENCH_SIZE sets the number of structures (200,000 unless given), SIDEPATH_BENCH_THREADS the
threads.
"""

from __future__ import annotations

import os
import statistics
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from rdkit import Chem, DataStructs
from rdkit.Chem import rdSubstructLibrary

from kb.chem.query import match_parameters, parse_query
from kb.search.index import StructureIndex
from tests.search.queries import ALL
from tests.speed.structure_set import BlobFile, blob_file, wanted

pytestmark = pytest.mark.speed

REPEATS = 3
THREADS = wanted("THREADS", os.cpu_count() or 1)
SLOW_S = 0.25
"""A query that takes longer than this is timed once only [s]."""


@pytest.fixture(scope="module")
def cache(pytestconfig: pytest.Config) -> Path:
    assert pytestconfig.cache is not None
    return pytestconfig.cache.mkdir("sidepath-bench")


@pytest.fixture(scope="module")
def blobs(cache: Path) -> BlobFile:
    return blob_file(wanted("SIZE", 200_000), cache)


@pytest.fixture(scope="module")
def index(blobs: BlobFile) -> StructureIndex:
    made = StructureIndex(reserve=blobs.size, threads=THREADS)
    ids, *columns = zip(*blobs.rows("structure_id, mol_binary, augmented, morgan"), strict=True)
    made.append(ids, *columns)  # type: ignore[arg-type]
    return made


@pytest.fixture(scope="module")
def library(blobs: BlobFile) -> rdSubstructLibrary.SubstructLibrary:
    molecules, patterns = rdSubstructLibrary.CachedMolHolder(), rdSubstructLibrary.PatternHolder(2048)
    for binary, pattern in blobs.rows("mol_binary, pattern"):
        molecules.AddBinary(binary)
        patterns.AddFingerprint(DataStructs.CreateFromBinaryText(pattern))
    return rdSubstructLibrary.SubstructLibrary(molecules, patterns)


def best_of(work: Callable[[], Any]) -> tuple[float, float, Any]:
    """Return the shortest time of a few runs by the clock and by the processor [s], and the last answer.

    On a machine that others use, only the second is worth comparing; it adds up all threads.
    """
    best_s = best_cpu_s = float("inf")
    for _ in range(REPEATS):
        began, began_cpu = time.perf_counter(), time.process_time()
        answer = work()
        best_s = min(best_s, time.perf_counter() - began)
        best_cpu_s = min(best_cpu_s, time.process_time() - began_cpu)
        if best_s > SLOW_S:
            break
    return best_s, best_cpu_s, answer


def test_substructure_search_against_substruct_library(
    index: StructureIndex,
    library: rdSubstructLibrary.SubstructLibrary,
    capsys: pytest.CaptureFixture[str],
) -> None:
    step = wanted("STEP", 4)
    ratios: dict[str, list[float]] = {}
    cpu_ratios: dict[str, list[float]] = {}
    lines, different = [], []
    for kind, smarts in ALL[::step]:
        query = parse_query(smarts)
        parameters = match_parameters(query)
        ours_s, ours_cpu_s, ours = best_of(lambda query=query: index.substructure(query).rows.tolist())  # type: ignore[misc]
        theirs_s, theirs_cpu_s, theirs = best_of(
            lambda query=query, parameters=parameters: sorted(  # type: ignore[misc]
                library.GetMatches(query.mol, parameters, THREADS, len(index))
            )
        )
        if ours != theirs:
            different.append(smarts)
        ratio, cpu_ratio = theirs_s / ours_s, theirs_cpu_s / ours_cpu_s
        ratios.setdefault(kind, []).append(ratio)
        cpu_ratios.setdefault(kind, []).append(cpu_ratio)
        candidates = len(index.screen(query)[0])
        lines.append(
            f"{kind:10s} {smarts[:44]:44s} {len(ours):7d} {candidates:7d} {ours_s * 1e3:9.2f} "
            f"{theirs_s * 1e3:9.2f} {ratio:8.2f} {cpu_ratio:8.2f}"
        )
    with capsys.disabled():
        print(f"\n{len(index)} structures, {THREADS} threads, best of {REPEATS}; times in ms")
        head = ("hits", 7), ("left", 7), ("ours", 9), ("library", 9), ("ratio", 8), ("cpu", 8)
        print(f"{'kind':10s} {'query':44s} " + " ".join(f"{word:>{width}s}" for word, width in head))
        print("\n".join(lines))
        for clock, by_kind in (("clock", ratios), ("processor", cpu_ratios)):
            print(f"by the {clock}:")
            for kind, found in by_kind.items():
                print(f"  {kind:10s} median {statistics.median(found):8.2f}, lowest {min(found):6.2f}, n {len(found)}")
            core = by_kind.get("centre", []) + by_kind.get("protecting", [])
            every = [ratio for found in by_kind.values() for ratio in found]
            print(f"  reaction centres and protecting groups: median {statistics.median(core):.1f}")
            print(f"  all: lowest {min(every):.2f}; {sum(r < 1 / 1.1 for r in every)} of {len(every)} below 1/1.1")
    assert different == []


def test_top_fifty_against_fpsim2(
    index: StructureIndex, blobs: BlobFile, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    engine_class = pytest.importorskip("FPSim2", reason="FPSim2 is not installed (pip install FPSim2)").FPSim2Engine
    from FPSim2.io import create_db_file

    rows = [[smiles, n] for n, smiles in blobs.rows("structure_id, smiles")]
    file = str(tmp_path / "fps.h5")
    create_db_file(
        mols_source=rows,
        filename=file,
        mol_format="smiles",
        fp_type="Morgan",
        fp_params={"radius": 2, "fpSize": 2048},
        full_sanitization=True,
    )
    engine = engine_class(file)
    asked = [str(smiles) for smiles, _ in rows[:: len(rows) // 20]][:20]
    ratios, lines, different = [], [], []
    for smiles in asked:
        mol = Chem.MolFromSmiles(smiles)
        ours_s, _, ours = best_of(lambda mol=mol: index.similar(mol, limit=50))  # type: ignore[misc]
        theirs_s, _, theirs = best_of(
            lambda smiles=smiles: engine.top_k(smiles, k=50, threshold=0.0, n_workers=1)  # type: ignore[misc]
        )
        mine = [round(float(s), 4) for s in ours.scores]
        other = [round(float(s), 4) for s in theirs["coeff"]][: len(mine)]
        if mine != other:
            different.append(smiles)
        ratios.append(theirs_s / ours_s)
        lines.append(f"{smiles[:50]:50s} {ours_s * 1e3:8.2f} {theirs_s * 1e3:8.2f} {ratios[-1]:8.2f}")
    with capsys.disabled():
        print(f"\ntop 50 of {len(index)}, Morgan radius 2, 2048 bits, one thread each; times in ms")
        print(f"{'structure':50s} {'ours':>8s} {'FPSim2':>8s} {'ratio':>8s}")
        print("\n".join(lines))
        print(f"median ratio {statistics.median(ratios):.2f}, lowest {min(ratios):.2f}")
    assert different == []
