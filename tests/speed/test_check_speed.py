"""How long a check takes on a book of 100,000 runs, beside a bare similarity query on the same molecules.

The runs are the demo book's, taken again and again with other chain lengths, temperatures, times and
shares, put straight into columns; whole runs are read from the demo book on disk as they are asked for. Run
by name (`pytest -m speed -s`); it reports times and ratios and asserts none of them, since machines differ.
Plans are new to the view each time, so that nothing but the index and the motif hits is warm.
"""

from __future__ import annotations

import dataclasses
import json
import statistics
import time
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from rdkit import Chem

from kb.assess.assessment import assess
from kb.assess.record_view import RecordView
from kb.assess.table import build_table
from kb.book import Book, build_demo, open_book
from kb.book.plan_words import plan_from_words
from kb.chem.query import parse_query
from kb.progress import Silent
from kb.record.plan import Plan
from kb.record.run import Run
from kb.search.index import StructureIndex
from kb.store.failings import failings_by_run

RUNS = 100_000
CHAINS = 60
"""Chain lengths that make other molecules of a demo substrate."""


class DemoRuns:
    """Whole runs of the synthetic record, read from the demo book."""

    def __init__(self, book: Book, ids: list[Any]) -> None:
        self.book = book
        self.ids = ids

    def get(self, code: str) -> Run:
        return self.many([code])[0]

    def many(self, codes: Sequence[str]) -> list[Run]:
        places = [int(code[2:]) for code in codes]
        stored = {run.run_id: run for run in self.book.store.get_many([self.ids[p] for p in set(places)])}
        return [dataclasses.replace(stored[self.ids[int(code[2:])]], code=code) for code in codes]


def lengthened(smiles: str | None, by: int) -> str | None:
    """Return a substrate with a longer chain on its first atom, where that is a methyl; else as it is."""
    return f"{'C' * by}{smiles}" if smiles and smiles.startswith("CC") else smiles


def build(book: Book) -> tuple[RecordView, StructureIndex, np.ndarray]:
    """Return the view, an index of its distinct substrates and the index row of each run."""
    columns = book.store.derived_columns()
    failings = failings_by_run(book.store)
    n = len(columns["code"])
    random = np.random.default_rng(5)
    base = np.arange(RUNS) % n
    by = (np.arange(RUNS) // n) % CHAINS
    many: dict[str, Any] = {name: np.asarray(values)[base] for name, values in columns.items()}
    warmer = np.round(random.normal(0, 8, RUNS))
    many["temperature_c"] = many["temperature_c"] + warmer
    shares = np.nan_to_num(many["shares"]) * random.uniform(0.8, 1.2, (RUNS, 8))
    many["shares"] = np.where(
        np.isnan(many["shares"]), np.nan, shares / np.maximum(shares.sum(axis=1, keepdims=True), 1e-9)
    )
    many["code"] = [f"R-{place}" for place in range(RUNS)]
    many["substrate"] = [lengthened(s, int(k)) for s, k in zip(many["substrate"], by, strict=True)]
    many["centre_atom"] = many["centre_atom"] + np.array(
        [k if s and s.startswith("CC") else 0 for s, k in zip(many["substrate"], by, strict=True)]
    )
    texts: dict[tuple[str, float], str] = {}
    for place in range(RUNS):
        key = (many["profile_json"][place], float(warmer[place]))
        if key not in texts:
            values = json.loads(key[0])
            if values.get("temperature_c") is not None:
                values["temperature_c"] += key[1]
            texts[key] = json.dumps(values, separators=(",", ":"), sort_keys=True)
        many["profile_json"][place] = texts[key]
    distinct = list(dict.fromkeys(s for s in many["substrate"] if s))
    index = StructureIndex()
    index.append_smiles(range(len(distinct)), distinct)
    row_of = {smiles: row for row, smiles in enumerate(distinct)}
    index_row = np.array([row_of.get(s, -1) for s in many["substrate"]])

    def search(smarts: str) -> np.ndarray:
        hit = np.zeros(len(distinct) + 1, dtype=bool)
        hit[index.substructure(parse_query(smarts)).rows] = True
        return np.flatnonzero(hit[index_row])

    failures = [failings.get(int(columns["run_key"][b]), ()) for b in base]
    source = DemoRuns(book, [columns["run_id"][b] for b in base])
    return RecordView(build_table(many), None, failures, source, search), index, index_row


def plans(round_number: int) -> list[Plan]:
    """Return plans of several kinds, other molecules and temperatures each round."""
    chain = "C" * (round_number + 2)
    warm = 5 * (round_number % 5)
    words = [
        {
            "scheme": f"{chain}CC(C)OS(C)(=O)=O",
            "reagents": ["NaN3"],
            "solvents": ["DMF"],
            "temperature": f"{55 + warm} C",
        },
        {
            "scheme": f"{chain}Cc1ccc(CCBr)cc1.CCO",
            "bases": ["KOtBu"],
            "solvents": ["THF"],
            "temperature": f"{20 + warm} C",
        },
        {
            "scheme": f"CC(C)(C)OC(=O)N1CC({chain}OC(C)(C)C)C1>>CC(C)(C)O{chain}C1CNC1",
            "acids": ["HCl"],
            "solvents": ["dioxane"],
            "temperature": f"{10 + warm} C",
        },
        {"scheme": f"{chain}C(C)Br", "reagents": ["KCN"], "solvents": ["DMSO"], "temperature": f"{50 + warm} C"},
        {"scheme": f"C=CC({chain})Cl", "reagents": ["NaOAc"], "solvents": ["AcOH"], "temperature": f"{40 + warm} C"},
    ]
    return [plan_from_words(w) for w in words]


@pytest.mark.speed
def test_a_check_on_a_hundred_thousand_runs(tmp_path: Path) -> None:
    path, _ = build_demo(str(tmp_path / "demo.sidepath"), Silent())
    with open_book(path, read_only=True) as book:
        began = time.perf_counter()
        view, index, index_row = build(book)
        print(
            f"\n{len(view.table)} runs, {len(index)} molecules, {len(view.table.profiles)} sets of conditions, "
            f"built in {time.perf_counter() - began:.0f} s"
        )
        times: dict[str, list[float]] = {
            name: [] for name in ("similarity", "similarity, processor", "check", "check, processor")
        }
        for round_number in range(9):
            for kind, plan in enumerate(plans(round_number)):
                start, cpu_start = time.perf_counter(), time.process_time()
                mol = Chem.MolFromSmiles(plan.scheme.split(">")[0].split(".")[0])
                rest = index.scores(mol).astype(np.float64)[index_row]
                middle, cpu_middle = time.perf_counter(), time.process_time()
                answer = assess(plan, view, (), rest, 5)
                end, cpu_end = time.perf_counter(), time.process_time()
                assert answer.precedents
                if round_number:
                    times["similarity"].append(middle - start)
                    times["check"].append(end - middle)
                    times["similarity, processor"].append(cpu_middle - cpu_start)
                    times["check, processor"].append(cpu_end - cpu_middle)
                    times.setdefault(f"kind {kind}", []).append(end - middle)
                else:
                    print(f"  first check of kind {kind}: {1000 * (end - middle):.0f} ms")
        for name, values in times.items():
            print(f"  {name}: median {1000 * statistics.median(values):.1f} ms, worst {1000 * max(values):.0f} ms")
        ratio = statistics.median(times["check"]) / statistics.median(times["similarity"])
        print(f"  a check takes {ratio:.1f} times a bare similarity query beyond it")
