"""A book of many different runs for benchmarks of the record as a whole, made once and kept.

Schemes are those of tests/data/patent_reactions.csv (its README names the source), each varied on both sides at once by
small groups on aromatic carbons, so that they read as real schemes do. Conditions, outcomes, dates and projects are
invented, drawn from a fixed seed: about a quarter of the runs fail, in modes that their kind allows, and failures
follow the conditions loosely, so that there is something to be found. Everything goes through the ordinary derivation.

Run as a module (`python -m tests.speed.record_set RUNS FOLDER`) it makes a book for use elsewhere.
"""

from __future__ import annotations

import csv
import datetime as dt
import random
import sys
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any
from uuid import UUID

from rdkit import Chem

from kb.book import create_book, open_book
from kb.book.plan_words import conditions_from_words
from kb.logs import tame_rdkit
from kb.record.conditions import Conditions
from kb.record.outcome import Failure, Outcome, ProductSeen
from kb.record.run import Run
from kb.vocabulary import Fate, Verdict

REACTIONS = Path(__file__).resolve().parents[1] / "data" / "patent_reactions.csv"
_GROUPS = ("F", "Cl", "C", "OC", "C#N", "C(F)(F)F", "OCC", "CC", "C(=O)OC(C)(C)C", "NC(=O)OC(C)(C)C", "C(=O)OC")
_SOLVENTS = ("DMF", "DMSO", "THF", "MeCN", "EtOH", "MeOH", "toluene", "dichloromethane", "acetone", "dioxane", "water",
             "AcOH", "NMP", "EtOAc")  # fmt: skip
_BASES = ("K2CO3", "NaH", "KOtBu", "DIPEA", "Cs2CO3", "Et3N", "NaOH", "DBU", "NaHCO3", "LiHMDS", "", "")
_ACIDS = ("HCl", "TFA", "TsOH", "H2SO4", "BF3.OEt2", "AcOH")
_NOTES = ("clean by NMR", "emulsion at work-up", "oiled out, crystallised later", "starting material left", "")
_MODES: dict[str, tuple[str, ...]] = {
    "substitution": ("elimination", "no-reaction", "over-reaction", "stalled", "solvolysis", "group-loss", "emulsion"),
    "elimination": ("substitution", "no-reaction", "group-loss", "transposition", "decomposition"),
    "addition": ("wrong-regioisomer", "decomposition", "no-reaction", "solvent-attack"),
}
_OTHER_MODES = ("group-loss", "decomposition", "no-reaction", "stalled", "isolation-loss", "reagent-quality")
_LOSSES = (
    ("[#6]C(=O)OC(C)(C)C", "[C:1](=O)OC([CH3])([CH3])[CH3]>>[C:1](=O)O"),
    ("[#7]C(=O)OC(C)(C)C", "[N:1]C(=O)OC([CH3])([CH3])[CH3]>>[N:1]"),
    ("[#6]C(=O)O[CH3]", "[C:1](=O)O[CH3]>>[C:1](=O)O"),
)
"""Groups that are lost: stated motif, and the change that makes what was found."""


def record_book(n: int, folder: Path) -> Path:
    """Return the file of a book of n runs, made now if it is not there."""
    place = folder / f"record-{n}"
    if not (place / "done").exists():
        place.mkdir(parents=True, exist_ok=True)
        address = create_book(str(place / "book.sidepath"))
        with open_book(address) as book:
            book.store.add_many(invented_runs(n), "XX")
        (place / "done").touch()
    return place / "book.sidepath"


def invented_runs(n: int, seed: int = 20260301) -> Iterator[Run]:
    """Yield n runs; the first of them are the same for any n."""
    tame_rdkit()
    chance = random.Random(seed)
    rows = _reactions()
    flasks: dict[tuple[str, ...], Conditions] = {}
    made = 0
    while made < n:
        row = chance.choice(rows)
        scheme = varied(row["rxn_smiles_mapped"], chance)
        if scheme is None:
            continue
        for _ in range(min(chance.choice((1, 1, 2, 3, 5)), n - made)):  # a scheme is tried more than once
            yield _a_run(scheme, row["kind"], chance, flasks)
            made += 1


def varied(mapped: str, chance: random.Random) -> str | None:
    """Return a mapped scheme with one or two groups put on aromatic carbons of both sides; None where none fits."""
    left, right = (Chem.RWMol(Chem.MolFromSmiles(side)) for side in (mapped.split(">")[0], mapped.split(">")[-1]))
    place = {a.GetAtomMapNum(): a.GetIdx() for a in left.GetAtoms() if a.GetAtomMapNum()}
    free = []
    for atom in right.GetAtoms():
        other = place.get(atom.GetAtomMapNum())
        if other is None:
            continue
        before = left.GetAtomWithIdx(other)
        if all(a.GetIsAromatic() and a.GetAtomicNum() == 6 and a.GetTotalNumHs() == 1 for a in (atom, before)):
            free.append((other, atom.GetIdx()))
    if not free:
        return None
    for at_left, at_right in chance.sample(free, min(len(free), chance.choice((1, 2)))):
        group = Chem.MolFromSmiles(chance.choice(_GROUPS))
        for mol, at in ((left, at_left), (right, at_right)):
            first = mol.GetNumAtoms()
            mol.InsertMol(group)
            mol.GetAtomWithIdx(at).SetNumExplicitHs(0)
            mol.AddBond(at, first, Chem.BondType.SINGLE)
    kept = {a.GetAtomMapNum() for a in right.GetAtoms()} - {0}
    sides = []
    for mol in (left, right):
        parts = []
        for part in Chem.GetMolFrags(mol.GetMol(), asMols=True, sanitizeFrags=False):
            if kept & {a.GetAtomMapNum() for a in part.GetAtoms()}:
                for atom in part.GetAtoms():
                    atom.SetAtomMapNum(0)
                parts.append(Chem.MolToSmiles(part))
        sides.append(".".join(parts))
    if any(Chem.MolFromSmiles(side) is None for side in sides):
        return None
    return ">>".join(sides)


def _reactions() -> list[dict[str, str]]:
    with REACTIONS.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(line for line in file if not line.startswith("#")))


def _a_run(scheme: str, kind: str, chance: random.Random, flasks: dict[tuple[str, ...], Conditions]) -> Run:
    acid = chance.choice(_ACIDS) if chance.random() < 0.25 else ""
    base = "" if acid else chance.choice(_BASES)
    warm = chance.choice((-78, -20, 0, 22, 22, 40, 60, 60, 80, 100, 120)) + chance.choice((0, 0, 0, 5))
    words = {
        "bases": base,
        "acids": acid,
        "solvents": chance.choice(_SOLVENTS),
        "temperature": f"{warm} C",
        "time": chance.choice(("1 h", "2 h", "4 h", "16 h", "2 d", "")),
    }
    key = tuple(words.values())
    if key not in flasks:
        flasks[key] = conditions_from_words(words)
    risk = 0.12 + 0.15 * (warm >= 80) + 0.12 * (base in ("NaH", "KOtBu", "LiHMDS")) + 0.12 * bool(acid)
    fails = chance.random() < risk
    outcome = _failed(scheme, kind, chance) if fails else _came_out(chance)
    return Run(
        scheme=scheme,
        conditions=replace(flasks[key], scale_mmol=chance.choice((0.1, 0.5, 1.0, 5.0, None))),
        outcome=outcome,
        verdict=Verdict.FAILED if fails else chance.choice((Verdict.WORKED, Verdict.WORKED, Verdict.PARTLY, None)),
        note=chance.choice(_NOTES),
        date=dt.date(2014, 1, 1) + dt.timedelta(days=chance.randrange(4300)),
        project=f"P{chance.randrange(40):02d}",
        by="XX",
        run_id=UUID(int=chance.getrandbits(128)),
    )


def _came_out(chance: random.Random) -> Outcome:
    got = float(chance.randrange(35, 99))
    if chance.random() < 0.7:
        return Outcome(isolated_yield_pct=got)
    wanted, rest = round(got / 100, 2), round(1 - got / 100, 2)
    return Outcome(
        products=(
            ProductSeen(fate=Fate.SUBSTITUTION, share=wanted),
            ProductSeen(fate=chance.choice((Fate.ELIMINATION, Fate.UNREACTED)), share=rest),
        )
    )


def _failed(scheme: str, kind: str, chance: random.Random) -> Outcome:
    got = float(chance.randrange(0, 30))
    mode = chance.choice(_MODES.get(kind, _OTHER_MODES))
    if mode != "group-loss":
        return Outcome(isolated_yield_pct=got, failures=(Failure(mode=mode),))
    substrate = Chem.MolFromSmiles(scheme.split(">")[0])
    for motif, change in _LOSSES:
        if not substrate.HasSubstructMatch(Chem.MolFromSmarts(motif)):
            continue
        if chance.random() < 0.5:
            return Outcome(isolated_yield_pct=got, failures=(Failure(mode=mode, motif=motif),))
        found = _changed(Chem.MolFromSmiles(scheme.split(">")[-1]), change)
        seen = (ProductSeen(fate=Fate.GROUP_LOSS, smiles=found),) if found else ()
        return Outcome(isolated_yield_pct=got, products=seen, failures=(Failure(mode=mode),))
    return Outcome(isolated_yield_pct=got, failures=(Failure(mode=mode),))


def _changed(mol: Any, change: str) -> str | None:
    from rdkit.Chem.rdChemReactions import ReactionFromSmarts

    for (product, *_,) in ReactionFromSmarts(change).RunReactants((mol,)):  # fmt: skip
        if Chem.SanitizeMol(product, catchErrors=True) == Chem.SanitizeFlags.SANITIZE_NONE:
            return str(Chem.MolToSmiles(product))
    return None


if __name__ == "__main__":
    print(record_book(int(sys.argv[1]), Path(sys.argv[2])))
