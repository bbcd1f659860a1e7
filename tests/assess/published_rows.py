"""Rows of tests/data/check_values.csv as steps that the published models can be asked about.

Sources are in the rows themselves. The words of the rows (NaOEt, 80 % EtOH) are turned into media here by hand, with
Y and N_T as the rows YV02 to YV21 give them, so that the model is tested apart from the catalogue of materials.
"""

from __future__ import annotations

import csv
from functools import cache
from pathlib import Path

from rdkit import Chem

from kb.assess.published_centre import describe_centre
from kb.physorg.competition import Competition, compete
from kb.physorg.constants import rows_set_from
from kb.physorg.step import Medium, StepFacts
from kb.vocabulary import Fate, LeavingGroup

DATA = Path(__file__).resolve().parent.parent / "data"

GROUPS = {
    "Br": ("bromide", "[CX4][Br]"),
    "Cl": ("chloride", "[CX4]Cl"),
    "I": ("iodide", "[CX4]I"),
    "F": ("fluoride", "[CX4]F"),
    "OTs": ("tosylate", "[CX4]OS(=O)=O"),
    "OBs": ("sulfonate", "[CX4]OS(=O)=O"),
    "SMe2+": ("sulfonium", "[CX4;!$([CH3])][S+]"),
    "OPNB": ("carboxylate", "[CX4]OC=O"),
    "OH2+": ("hydroxyl", "[CX4][OH]"),
}

SOLVENTS: dict[str, dict[str, object]] = {
    "EtOH": {"solvent_kinds": frozenset({"protic", "alcohol"}), "solvent_y": -2.03, "solvent_n_t": 0.37},
    "MeOH": {"solvent_kinds": frozenset({"protic", "alcohol"}), "solvent_y": -1.09, "solvent_n_t": 0.17},
    "tBuOH": {"solvent_kinds": frozenset({"protic", "alcohol"}), "solvent_y": -3.3},
    "n-BuOH": {"solvent_kinds": frozenset({"protic", "alcohol"})},
    "80% EtOH/20% H2O": {
        "solvent_kinds": frozenset({"protic", "alcohol", "water"}),
        "solvent_y": 0.0,
        "solvent_n_t": 0.0,
    },
    "aq EtOH": {"solvent_kinds": frozenset({"protic", "alcohol", "water"})},
    "80% acetone": {"solvent_kinds": frozenset({"protic", "water", "polar-aprotic", "ketone"}), "solvent_y": -0.8},
    "75% aq dioxane": {"solvent_kinds": frozenset({"protic", "water", "weakly-polar", "ether"})},
    "H2O": {"solvent_kinds": frozenset({"protic", "water"}), "solvent_y": 3.49},
    "AcOH": {"solvent_kinds": frozenset({"protic", "carboxylic_acid"}), "solvent_y": -1.64},
    "DMSO": {"solvent_kinds": frozenset({"polar-aprotic", "sulfoxide"})},
    "": {},
    "(not stated; DMSO believed)": {},
}

REAGENTS: dict[str, dict[str, object]] = {
    "2 M NaOEt": {"nucleophile": "alkoxide", "base": "alkoxide", "nucleophile_molar": 2.0, "base_molar": 2.0},
    "CH3CO2-": {"nucleophile": "carboxylate"},
    "KOAc": {"nucleophile": "carboxylate"},
    "KCN": {"nucleophile": "cyanide"},
    "NaCN": {"nucleophile": "cyanide"},
    "NaN3": {"nucleophile": "azide"},
    "HO-": {"nucleophile": "hydroxide", "base": "hydroxide"},
    **{
        word: {"nucleophile": "alkoxide", "base": "alkoxide", "base_bulk": 0.0}
        for word in ("NaOEt", "EtO-", "KOEt", "MeO-")
    },
    **{
        word: {"nucleophile": "tertiary_alkoxide", "base": "tertiary_alkoxide", "base_bulk": bulk}
        for word, bulk in (("KOtBu", 1.0), ("tBuO-", 1.0), ("EtMe2CO-", 1.2), ("Et3CO-", 1.65))
    },
}

TEMPERATURES = {"heated": 100.0, "heat": 100.0, "120-145": 132.0}


@cache
def rows() -> dict[str, dict[str, str]]:
    """Return the rows by id."""
    with (DATA / "check_values.csv").open(encoding="utf-8", newline="") as handle:
        return {row["id"]: row for row in csv.DictReader(handle)}


def is_test_row(name: str) -> bool:
    """Return whether no constant was set from the row."""
    return name not in rows_set_from()


def a_step(
    smiles: str, group: str, reagent: str, solvent: str, temperature_c: float | None, **changes: object
) -> StepFacts:
    """Return a step from the words of a row; `changes` go to the medium."""
    word, smarts = GROUPS[group]
    mol = Chem.MolFromSmiles(smiles)
    centre, leaving = mol.GetSubstructMatch(Chem.MolFromSmarts(smarts))[:2]
    facts = {**SOLVENTS[solvent], **REAGENTS.get(reagent, {}), **changes}
    medium = Medium(temperature_c=temperature_c, **facts)  # type: ignore[arg-type]
    return StepFacts(centre=describe_centre(mol, centre, leaving), leaving_group=LeavingGroup(word), medium=medium)


def step_of_row(name: str) -> StepFacts:
    """Return the step of a row."""
    row = rows()[name]
    text = row["temperature_C"]
    try:
        temperature = float(text)
    except ValueError:
        temperature = TEMPERATURES.get(text)
    return a_step(
        row["substrate_smiles"], row["leaving_group"], row["nucleophile_or_base"], row["solvent"], temperature
    )


def answer(name: str) -> Competition:
    """Return what the model says to a row."""
    return compete(step_of_row(name))


def alkene_pct(result: Competition) -> float:
    """Return the share of alkene [%], shifted skeletons left out."""
    share = result.share_of(Fate.ELIMINATION)
    assert share is not None
    return 100 * share.mean


def among_alkenes_pct(result: Competition, *smiles: str) -> float:
    """Return the share of the alkenes given, among the alkenes [%], geometry as written."""
    wanted = {Chem.CanonSmiles(s) for s in smiles}
    return 100 * sum(a.of_alkenes.mean for a in result.alkenes if a.label in wanted)
