"""A book of many invented runs for benchmarks, made once and kept in pytest's cache.

Structures come from `structure_set.py`; which stand together, at what temperature and with what note is
drawn at random from a fixed seed. Nothing is read from the schemes: facts are drawn too, since only
searching is measured.
"""

from __future__ import annotations

import datetime as dt
import random
import shutil
from collections.abc import Iterator
from pathlib import Path
from typing import Any
from uuid import UUID

from kb.chem.screens import SCREEN_RECIPE, encode_structure
from kb.quantity import Temperature
from kb.record.component import Component, SolventPart
from kb.record.conditions import Conditions
from kb.record.derived import DerivedFacts
from kb.record.outcome import Failure, Outcome
from kb.record.run import Run
from kb.store.store import Store
from kb.vocabulary import CarbonClass, LeavingGroup, Role, Verdict
from tests.speed.structure_set import smiles_of

SOLVENTS = ("DMF", "DMSO", "THF", "MeCN", "ethanol", "toluene", "dichloromethane", "acetone")
BASES = ("K2CO3", "NaH", "KOtBu", "DIPEA", "Cs2CO3")
NOTES = (
    "clean conversion by NMR",
    "emulsion at work-up, left overnight",
    "smelled of alkene",
    "product oiled out and was crystallised",
    "starting material left after two days",
    "chromatography needed",
)


def _derive(run: Run) -> DerivedFacts:
    chance = random.Random(run.run_id.int)
    return DerivedFacts(
        run_id=run.run_id,
        recipe=SCREEN_RECIPE,
        confidence="matched",
        carbon_class=str(chance.choice(list(CarbonClass))),
        leaving_group=str(chance.choice(list(LeavingGroup))),
        substrate=run.scheme.split(".")[0],
        centre_atom=0,
    )


def _dissect(run: Run) -> list[tuple[str, int, str]]:
    left, right = run.scheme.split(">>")
    substrate, reagent = left.split(".")
    return [("substrate", 0, substrate), ("reagent", 1, reagent), ("product", 0, right)]


CHEMISTRY: dict[str, Any] = {
    "derive": _derive,
    "dissect": _dissect,
    "encode": encode_structure,
    "recipe": SCREEN_RECIPE,
}


def run_book(n: int, cache: Path) -> Path:
    """Return the file of a book of n runs, made now if it is not there."""
    recipe = "".join(c if c.isalnum() else "-" for c in SCREEN_RECIPE)
    folder = cache / f"runs-{n}-{recipe}"
    if not (folder / "done").exists():
        shutil.rmtree(folder, ignore_errors=True)
        folder.mkdir(parents=True)
        with Store.create(folder / "book.sidepath", **CHEMISTRY) as store:
            store.add_many(_runs(n, cache), "XX")
        (folder / "done").touch()
    return folder / "book.sidepath"


def _runs(n: int, cache: Path) -> Iterator[Run]:
    chance = random.Random(20260101)
    single = [s for s in smiles_of(n, cache) if "." not in s and ">" not in s]
    reagents = ["[N-]=[N+]=[N-]", "CC(=O)[O-]", "[S-]c1ccccc1", "C1CCNCC1", "CCO", "[C-]#N"]
    for number in range(n):
        t = chance.choice([-78, 0, 22, 40, 60, 80, 100])
        failed = (Failure(mode=chance.choice(["elimination", "group-loss"])),) if chance.random() < 0.2 else ()
        yield Run(
            scheme=f"{chance.choice(single)}.{chance.choice(reagents)}>>{chance.choice(single)}",
            conditions=Conditions(
                components=(Component(role=Role.BASE, name=chance.choice(BASES)),),
                solvents=(SolventPart(name=chance.choice(SOLVENTS)),),
                temperature=Temperature(text=f"{t} C", start_c=t, end_c=t),
            ),
            outcome=Outcome(failures=failed),
            verdict=chance.choice(list(Verdict)),
            note=chance.choice(NOTES),
            date=dt.date(2020, 1, 1) + dt.timedelta(days=chance.randrange(2000)),
            run_id=UUID(int=chance.getrandbits(128)),
        )
        if number % 10_000 == 0:
            chance.seed(number)
