"""Hit sets at scale: over five hundred queries on fifty thousand structures, each equal to brute force.

Run by name: `pytest -m soak tests/speed/test_hit_sets.py -s` (some minutes). Brute force is RDKit's own
match of every query with every structure, no screen in between. SIDEPATH_BENCH_SIZE sets another size.
"""

from __future__ import annotations

import os

import pytest
from rdkit.Chem import rdSubstructLibrary

from kb.chem.query import match_parameters, parse_query
from kb.search.index import StructureIndex
from tests.search.queries import ALL
from tests.speed.structure_set import blob_file, wanted

pytestmark = pytest.mark.soak


def test_hit_sets_equal_brute_force(pytestconfig: pytest.Config, capsys: pytest.CaptureFixture[str]) -> None:
    assert pytestconfig.cache is not None
    blobs = blob_file(wanted("SIZE", 50_000), pytestconfig.cache.mkdir("sidepath-bench"))
    ids, *columns = zip(*blobs.rows("structure_id, mol_binary, augmented, morgan"), strict=True)
    index = StructureIndex(reserve=blobs.size)
    index.append(ids, *columns)  # type: ignore[arg-type]
    holder = rdSubstructLibrary.CachedMolHolder()
    for binary in columns[0]:
        holder.AddBinary(binary)  # type: ignore[arg-type]
    brute = rdSubstructLibrary.SubstructLibrary(holder)
    different, hits, left = [], 0, 0
    for _, smarts in ALL:
        query = parse_query(smarts)
        want = sorted(brute.GetMatches(query.mol, match_parameters(query), os.cpu_count() or 1, len(index)))
        found = index.substructure(query)
        hits += len(want)
        left += len(index.screen(query)[0])
        if found.rows.tolist() != want or not found.complete:
            different.append(smarts)
    with capsys.disabled():
        print(
            f"\n{len(ALL)} queries on {len(index)} structures: {hits} hits, {left} candidates left by the screens, "
            f"{len(different)} hit sets different"
        )
    assert different == []
