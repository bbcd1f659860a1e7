"""A small book to search, its reading given by hand so that only the search is tested.

Eight runs: displacements, an elimination, a deprotection, at named centres, with conditions, notes and failures. The
centre of each is marked with map 1 in the scheme; facts are taken from there and from the table below, not from
`kb.chem.reading`.
"""

from __future__ import annotations

import datetime as dt
from pathlib import Path
from typing import Any

from rdkit import Chem

from kb.chem.screens import SCREEN_RECIPE, encode_structure
from kb.quantity import Temperature
from kb.record.component import Component, SolventPart
from kb.record.conditions import Conditions
from kb.record.derived import DerivedFacts
from kb.record.outcome import Failure, Outcome
from kb.record.run import Run
from kb.store.store import Store
from kb.vocabulary import Role, Verdict
from tests.factories import a_book

ROWS: tuple[dict[str, Any], ...] = (
    {"scheme": "CC(C)C[CH2:1]Br.[N-]=[N+]=[N-]>>CC(C)C[CH2:1]N=[N+]=[N-]", "leaving": "bromide", "class": "primary",
     "solvent": "DMF", "base": None, "t": 60.0, "note": "clean by NMR", "verdict": Verdict.WORKED, "day": 1},
    {"scheme": "C[CH:1](Br)CC.[N-]=[N+]=[N-]>>C[CH:1](N=[N+]=[N-])CC", "leaving": "bromide", "class": "secondary",
     "solvent": "DMSO", "base": None, "t": 40.0, "note": "emulsion at work-up", "verdict": Verdict.PARTLY, "day": 2},
    {"scheme": "C[CH:1](Br)CC>>C[CH:1]=CC", "leaving": "bromide", "class": "secondary",
     "solvent": "ethanol", "base": "KOtBu", "t": 78.0, "note": "smelled of alkene", "verdict": Verdict.FAILED,
     "failed": "elimination", "day": 3},
    {"scheme": "O=C(OC(C)(C)C)NC[CH2:1]Br.Oc1ccccc1>>O=C(OC(C)(C)C)NC[CH2:1]Oc1ccccc1", "leaving": "bromide",
     "class": "primary", "solvent": "DMF", "base": "K2CO3", "t": 80.0, "note": "slow, emulsions again",
     "verdict": Verdict.WORKED, "day": 4},
    {"scheme": "c1ccccc1[CH2:1]OS(C)(=O)=O.CC(=O)[O-]>>c1ccccc1[CH2:1]OC(C)=O", "leaving": "mesylate",
     "class": "primary", "solvent": "DMF", "base": None, "t": 22.0, "note": "", "verdict": None, "day": 5},
    {"scheme": "BrCCC[CH2:1]Cl.[N-]=[N+]=[N-]>>BrCCC[CH2:1]N=[N+]=[N-]", "leaving": "chloride", "class": "primary",
     "solvent": "THF", "base": None, "t": None, "note": "the bromide survived", "verdict": Verdict.WORKED, "day": None},
    {"scheme": "C[C@H:1](Br)CC.[S-]c1ccccc1>>C[C@@H:1](CC)Sc1ccccc1", "leaving": "bromide", "class": "secondary",
     "solvent": "N,N-dimethylformamide", "base": None, "t": 0.0, "note": "inverted",
     "verdict": Verdict.WORKED, "day": 7},
    {"scheme": "CC(C)(C)OC(=O)NCC>>NCC", "leaving": None, "class": None, "solvent": "dichloromethane", "base": None,
     "t": 22.0, "note": "100% <b>gone</b>", "verdict": Verdict.WORKED, "failed": "group-loss", "day": 8},
)  # fmt: skip


def a_run_of(row: dict[str, Any]) -> Run:
    """Return the run of a row."""
    t = row["t"]
    components = (Component(role=Role.BASE, name=row["base"]),) if row["base"] else ()
    return Run(
        scheme=row["scheme"],
        conditions=Conditions(
            components=components,
            solvents=(SolventPart(name=row["solvent"]),),
            temperature=None if t is None else Temperature(text=f"{t:g} C", start_c=t, end_c=t),
        ),
        outcome=Outcome(failures=(Failure(mode=row["failed"]),) if row.get("failed") else ()),
        verdict=row["verdict"],
        note=row["note"],
        date=None if row["day"] is None else dt.date(2025, 1, row["day"]),
        project="azides" if "[N-]" in row["scheme"] else None,
    )


def by_hand(run: Run) -> DerivedFacts:
    """Return the facts of a run from its marked centre and the table."""
    row: dict[str, Any] = next((r for r in ROWS if r["scheme"] == run.scheme), {})
    facts: dict[str, Any] = {"run_id": run.run_id, "recipe": SCREEN_RECIPE, "confidence": "matched"}
    for fragment in run.scheme.split(">>")[0].split("."):
        mol = Chem.MolFromSmiles(fragment)
        marked = [a.GetIdx() for a in mol.GetAtoms() if a.GetAtomMapNum() == 1]
        if marked:
            for atom in mol.GetAtoms():
                atom.SetAtomMapNum(0)
            smiles = Chem.MolToSmiles(mol)
            order = list(mol.GetPropsAsDict(includePrivate=True, includeComputed=True)["_smilesAtomOutputOrder"])
            facts |= {"substrate": smiles, "centre_atom": order.index(marked[0])}
    return DerivedFacts(**facts, leaving_group=row.get("leaving"), carbon_class=row.get("class"))


def parts(run: Run) -> list[tuple[str, int, str]]:
    """Return the fragments of the scheme: the marked one is the substrate."""
    left, right = run.scheme.split(">>")
    fragments = left.split(".")
    marked = next((n for n, s in enumerate(fragments) if ":1]" in s), 0)
    found = [("substrate" if n == marked else "reagent", n, s) for n, s in enumerate(fragments)]
    return found + [("product", n, s) for n, s in enumerate(right.split("."))]


CHEMISTRY: dict[str, Any] = {
    "derive": by_hand,
    "dissect": parts,
    "encode": encode_structure,
    "recipe": SCREEN_RECIPE,
}


def a_searchable_book(tmp_path: Path) -> Store:
    """Return an open book with the runs of ROWS, R-0001 to R-0008."""
    store = a_book(tmp_path, **CHEMISTRY)
    store.add_many([a_run_of(row) for row in ROWS], "MK")
    return store
