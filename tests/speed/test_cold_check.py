"""How long a cold `sidepath check` takes, from start to end of the process, on a book of 10,000 runs.

Its measure is a Python process that only imports rdkit.Chem and sqlalchemy.orm. Both are started in turn, so that
whatever else the machine does falls on both alike; wall time and processor time are reported as medians, the
processor's also as the best. Plans differ from one start to the next. The first check after a change of the book, which
reads it through the store and keeps the columns, is told apart. Run by name (`pytest -m speed -s`); it asserts that
the answers are right, and no times.
"""

from __future__ import annotations

import json
import os
import statistics
import subprocess
import sys
import time
from pathlib import Path
from typing import Any

import pytest

from kb.book import open_book, plan_from_words
from tests.speed.demo_set import demo_book_of

ROOT = Path(__file__).parents[2]
RUNS = 10_000
ROUNDS = 9
PEER = [sys.executable, "-c", "import rdkit.Chem, sqlalchemy.orm"]
PLANS: dict[str, tuple[dict[str, Any], list[str]]] = {
    "azide": (
        {"scheme": "{0}C(C)OS(C)(=O)=O", "reagents": ["NaN3"], "solvents": ["DMF"], "temperature": "60 C"},
        ["--with", "NaN3", "--solvent", "DMF", "--temp", "60 C"],
    ),
    "elimination": (
        {"scheme": "CC(C)(C)OC(=O)N{0}CCBr", "bases": ["KOtBu"], "solvents": ["THF"], "temperature": "0 C"},
        ["--base", "KOtBu", "--solvent", "THF", "--temp", "0 C"],
    ),
    "deprotection": (
        {"scheme": "CC(C)(C)OC(=O)N1CC({0}OC(C)(C)C)C1", "acids": ["HCl"], "solvents": ["dioxane"]},
        ["--acid", "HCl", "--solvent", "dioxane"],
    ),
}


def run_of(words: list[str]) -> tuple[bytes, float, float]:
    """Run a process; return its output, wall and processor time [s]."""
    began = time.perf_counter()
    process = subprocess.Popen(words, stdout=subprocess.PIPE)
    assert process.stdout is not None
    out = process.stdout.read()
    _, status, used = os.wait4(process.pid, 0)
    process.returncode = os.waitstatus_to_exitcode(status)
    assert process.returncode == 0
    return out, time.perf_counter() - began, used.ru_utime + used.ru_stime


@pytest.mark.speed
def test_a_cold_check_beside_bare_imports(
    pytestconfig: pytest.Config, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    assert pytestconfig.cache is not None
    place = demo_book_of(RUNS, Path(pytestconfig.cache.mkdir("sidepath-speed")))
    monkeypatch.setenv("PYTHONPATH", str(ROOT))
    monkeypatch.setenv("PYTHONPYCACHEPREFIX", str(tmp_path / "bytecode"))  # compiled once, as it is once installed
    monkeypatch.delenv("PYTHONDONTWRITEBYTECODE", raising=False)
    check = [sys.executable, "-m", "kb", "--book", str(place), "--json", "check"]
    first = {}
    for name, (words, flags) in PLANS.items():
        scheme = words["scheme"].format("CCC")
        first[name] = run_of([*check, scheme, *flags])
        with open_book(place, read_only=True) as book:
            expected = book.check(plan_from_words(words | {"scheme": scheme})).as_dict()
        assert json.loads(first[name][0]) == json.loads(json.dumps(expected, default=str))
    print(f"\nfirst check after a change: {first['azide'][2] * 1000:.0f} ms of the processor (compiles too)")
    run_of(PEER)
    peers: list[tuple[float, float]] = []
    for name, (words, flags) in PLANS.items():
        ours: list[tuple[float, float]] = []
        theirs: list[tuple[float, float]] = []
        for number in range(ROUNDS):
            theirs.append(run_of(PEER)[1:])
            ours.append(run_of([*check, words["scheme"].format("C" * (number + 4)), *flags])[1:])
        peers += theirs
        told = [
            f"{what} {1000 * ask(o):.0f} / {1000 * ask(p):.0f} ms = {ask(o) / ask(p):.2f}"
            for what, ask, o, p in (
                ("wall", statistics.median, [w for w, _ in ours], [w for w, _ in theirs]),
                ("processor", statistics.median, [c for _, c in ours], [c for _, c in theirs]),
                ("its best", min, [c for _, c in ours], [c for _, c in theirs]),
            )
        ]
        print(f"{name}: {'; '.join(told)}")
