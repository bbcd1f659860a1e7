"""The structures that benchmarks run on: drug-like ones from the registry, mixed with those of real reactions.

`molsets` 0.3.1 (D. Polykovskiy et al., Front. Pharmacol. 2020, 11, 565644; MIT licence) ships 1.6 million
training SMILES; its wheel is downloaded by pip, read and never installed. SIDEPATH_MOLSETS names a wheel
that is there already. They hold few alkyl halides, so the structures of tests/data are mixed in, evenly.

Encoding is slow, so each size is encoded once, on all cores, into a SQLite file in pytest's cache; the
file's name carries the recipe. It holds the blobs that a book holds, and RDKit's pattern fingerprint for
the comparison.
"""

from __future__ import annotations

import csv
import gzip
import itertools
import os
import sqlite3
import subprocess
import sys
import time
import zipfile
from collections.abc import Iterable, Iterator
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass
from pathlib import Path

import pytest
from rdkit import Chem, DataStructs, RDLogger

from kb.chem.screens import SCREEN_RECIPE, encode_mol

DATA = Path(__file__).resolve().parents[1] / "data"
WHEEL = "molsets-0.3.1-py3-none-any.whl"
INSIDE = "moses/dataset/data/train.csv.gz"


@dataclass(frozen=True)
class BlobFile:
    """Encoded structures in a SQLite file, and how long that took.

    Attributes:
        path: table `structure` with structure_id, smiles, mol_binary, augmented, morgan, pattern.
        size: how many.
    """

    path: Path
    size: int

    def rows(self, columns: str) -> Iterator[tuple[object, ...]]:
        """Yield rows of some columns, by id."""
        with sqlite3.connect(self.path) as connection:
            yield from connection.execute(f"SELECT {columns} FROM structure ORDER BY structure_id")


_ENVIRONMENT = {name: value for name, value in os.environ.items() if name.startswith("SIDEPATH_")}
"""Read here, since every test starts from an environment without them."""


def wanted(name: str, default: int) -> int:
    """Return a number of the benchmarks: SIDEPATH_BENCH_<name>, else the default."""
    return int(_ENVIRONMENT.get(f"SIDEPATH_BENCH_{name}", default))


def smiles_of(n: int, cache: Path) -> list[str]:
    """Return n different SMILES, those of real reactions spread evenly among drug-like ones."""
    real = list(dict.fromkeys(_reaction_smiles()))[:n]
    drug_like = list(itertools.islice(_drug_like(cache), n - len(real)))
    step = max(len(drug_like) // max(len(real), 1), 1)
    mixed: list[str] = []
    for at, text in enumerate(drug_like):
        mixed.append(text)
        if at % step == 0 and real:
            mixed.append(real.pop())
    return list(dict.fromkeys(mixed + real))[:n]


def blob_file(n: int, cache: Path) -> BlobFile:
    """Return the encoded set of that size, made now if it is not there."""
    recipe = "".join(c if c.isalnum() else "-" for c in SCREEN_RECIPE)
    path = cache / f"structures-{n}-{recipe}.sqlite"
    if not path.exists():
        draft = path.with_suffix(".draft")
        draft.unlink(missing_ok=True)
        began = time.perf_counter()
        with sqlite3.connect(draft) as connection:
            connection.execute(
                "CREATE TABLE structure (structure_id INTEGER PRIMARY KEY, smiles TEXT, mol_binary BLOB, "
                "augmented BLOB, morgan BLOB, pattern BLOB)"
            )
            numbers = itertools.count(1)
            with ProcessPoolExecutor() as pool:
                for rows in pool.map(_encoded, _chunks(smiles_of(n, cache), 2000)):
                    connection.executemany(
                        "INSERT INTO structure VALUES (?, ?, ?, ?, ?, ?)", [(next(numbers), *row) for row in rows]
                    )
        draft.rename(path)
        print(f"encoded {n} structures in {time.perf_counter() - began:.0f} s", file=sys.stderr)
    return BlobFile(path, n)


def _encoded(texts: list[str]) -> list[tuple[str, bytes, bytes, bytes, bytes]]:
    RDLogger.DisableLog("rdApp.*")
    rows = []
    for text in texts:
        mol = Chem.MolFromSmiles(text)
        if mol is not None:
            blobs = encode_mol(mol)
            pattern = DataStructs.BitVectToBinaryText(Chem.PatternFingerprint(mol))
            rows.append((text, blobs.mol_binary, blobs.augmented, blobs.morgan, pattern))
    return rows


def _chunks(items: list[str], size: int) -> Iterator[list[str]]:
    for start in range(0, len(items), size):
        yield items[start : start + size]


def _reaction_smiles() -> Iterable[str]:
    """Yield the structures of real reactions that the tests carry."""
    reactions = DATA / "patent_reactions.csv"
    if reactions.exists():
        with reactions.open(encoding="utf-8", newline="") as handle:
            lines = (line for line in handle if not line.startswith("#"))
            for row in csv.DictReader(lines):
                for side in row["rxn_smiles_unmapped"].split(">"):
                    yield from (part for part in side.split(".") if part)
    yield from (DATA / "search" / "structures.smi").read_text(encoding="utf-8").split()


def _drug_like(cache: Path) -> Iterator[str]:
    with zipfile.ZipFile(_wheel(cache)) as wheel, wheel.open(INSIDE) as packed, gzip.open(packed, "rt") as lines:
        next(lines)
        for line in lines:
            yield line.split(",")[0].strip()


def _wheel(cache: Path) -> Path:
    given = _ENVIRONMENT.get("SIDEPATH_MOLSETS")
    path = Path(given) if given else cache / WHEEL
    if not path.exists():
        fetch = [sys.executable, "-m", "pip", "download", "--no-deps", "-q", "-d", str(path.parent), "molsets==0.3.1"]
        if subprocess.run(fetch, check=False).returncode or not path.exists():
            pytest.skip("molsets 0.3.1 could not be downloaded; name its wheel in SIDEPATH_MOLSETS")
    return path
