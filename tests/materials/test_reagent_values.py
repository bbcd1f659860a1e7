"""The reagents' figures against the published ones in tests/data/check_values.csv (source in each row there).

Rows marked `memory` there, and nearly all of ours, are from memory, so two memories of one table are compared: digits
only as a guard against slips, ranks as what is relied on.
"""

from __future__ import annotations

import csv
from pathlib import Path

import pytest
from rdkit import Chem
from scipy.stats import spearmanr

from kb.materials.catalogue import Reagent, load_catalogue

CHECKS = Path(__file__).resolve().parent.parent / "data" / "check_values.csv"
CATALOGUE = load_catalogue()
BY_NAME = {r.name: r for r in CATALOGUE.reagents}

SPECIES = {
    "H2O": "water",
    "NO3-": "sodium nitrate",
    "F-": "potassium fluoride",
    "CH3CO2-": "sodium acetate",
    "Cl-": "lithium chloride",
    "pyridine": "pyridine",
    "HCO3-": "sodium bicarbonate",
    "Br-": "sodium bromide",
    "N3-": "sodium azide",
    "thiourea": "thiourea",
    "HO-": "sodium hydroxide",
    "aniline": "aniline",
    "SCN-": "potassium thiocyanate",
    "I-": "sodium iodide",
    "CN-": "sodium cyanide",
    "HS-": "sodium hydrosulfide",
    "S2O3(2-)": "sodium thiosulfate",
    "EtOH": "ethanol",
    "MeOH": "methanol",
    "NH3": "ammonia",
    "PPh3": "triphenylphosphine",
    "DMAP": "DMAP",
    "MeO-": "sodium methoxide",
    "piperidine": "piperidine",
    "DABCO": "DABCO",
}


def _rows(quantity: str) -> list[dict[str, str]]:
    with CHECKS.open(encoding="utf-8", newline="") as lines:
        return [r for r in csv.DictReader(lines) if r["quantity"] == quantity]


def _aqueous_pkas() -> list[tuple[str, float, Reagent]]:
    found = []
    for row in _rows("pKa of conjugate acid") + [r for r in _rows("pKa") if r["solvent"] == "H2O"]:
        if row["solvent"] != "H2O":
            continue
        smiles = Chem.MolToSmiles(Chem.MolFromSmiles(row["substrate_smiles"]))
        facts = CATALOGUE.ions.get(smiles) or CATALOGUE.reagent_by_smiles.get(smiles)
        if facts is not None and facts.pkah is not None:
            found.append((row["id"], float(row["value"]), facts))
    return found


@pytest.mark.parametrize(("row", "value", "facts"), _aqueous_pkas(), ids=lambda v: v if isinstance(v, str) else "")
def test_base_strength_agrees(row: str, value: float, facts: Reagent) -> None:
    assert facts.pkah == pytest.approx(value, abs=0.3), (row, facts.name)


def test_enough_base_strengths_are_compared() -> None:
    assert len(_aqueous_pkas()) >= 45


def test_swain_scott_n_agrees() -> None:
    rows = [r for r in _rows("Swain-Scott n (MeBr, water)") if r["nucleophile_or_base"] in SPECIES]
    ours = [BY_NAME[SPECIES[r["nucleophile_or_base"]]].swain_scott_n for r in rows]
    theirs = [float(r["value"]) for r in rows]
    assert len(rows) == 17
    assert None not in ours
    assert ours == pytest.approx(theirs, abs=0.15)


def test_mayr_n_ranks_alike() -> None:
    rows = [r for r in _rows("N") if r["nucleophile_or_base"] in SPECIES]
    ours = [BY_NAME[SPECIES[r["nucleophile_or_base"]]].mayr_n for r in rows]
    assert len(rows) >= 11
    assert spearmanr(ours, [float(r["value"]) for r in rows]).statistic > 0.98


def test_ionising_power_agrees() -> None:
    names = {"EtOH": "ethanol", "AcOH": "acetic acid", "MeOH": "methanol", "HCO2H": "formic acid", "H2O": "water"}
    values = {s.name: s.winstein_y for s in CATALOGUE.solvents}
    rows = [r for r in _rows("Y (tBuCl)") if r["solvent"] in names]
    assert len(rows) == 5
    assert [values[names[r["solvent"]]] for r in rows] == pytest.approx([float(r["value"]) for r in rows], abs=0.05)


def test_bulk_and_nucleophilicity_are_those_of_common_practice() -> None:
    hindered = ["potassium tert-butoxide", "N,N-diisopropylethylamine", "DBU", "2,6-lutidine"]
    unhindered = ["sodium ethoxide", "sodium hydroxide", "piperidine", "sodium hydride", "potassium carbonate"]
    assert {BY_NAME[n].bulk for n in hindered} == {"hindered"}
    assert {BY_NAME[n].bulk for n in unhindered} == {"unhindered"}
    good = ["sodium azide", "sodium iodide", "sodium thiophenoxide", "piperidine", "sodium methoxide", "sodium cyanide"]
    assert {BY_NAME[n].nucleophile for n in good} == {"good"}
    assert {BY_NAME[n].nucleophile for n in ("methanol", "water", "potassium tert-butoxide")} == {"weak"}
    assert {BY_NAME[n].nucleophile for n in ("sodium hydride", "sulfuric acid", "2,6-lutidine")} == {"none"}


def test_acid_levels_follow_the_pka() -> None:
    for reagent in CATALOGUE.reagents:
        if reagent.acidity == "strong" and reagent.pka is not None and reagent.name != "hydrogen fluoride pyridine":
            assert reagent.pka < 2.3, reagent.name
    strong = ["hydrogen chloride", "trifluoroacetic acid", "sulfuric acid", "p-toluenesulfonic acid"]
    assert {BY_NAME[n].acidity for n in [*strong, "methanesulfonic acid", "tetrafluoroboric acid"]} == {"strong"}
    weak = ["acetic acid", "citric acid", "ammonium chloride", "PPTS"]
    assert {BY_NAME[n].acidity for n in weak} == {"weak"}
    assert BY_NAME["phenol"].acidity == "none"  # no acid-labile group notices a phenol
