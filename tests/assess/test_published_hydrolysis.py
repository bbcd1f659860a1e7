"""Haloalkanes in water: how fast, and which way (tests/data/hydrolysis_haloalkanes.csv, US EPA, Stevens et al. 2017).

The model speaks alone here, without any run on record. Compounds from which a constant was set (column `set_from`,
"hydrolysis:SMILES") are left out.
"""

from __future__ import annotations

import csv
import math
from functools import cache
from pathlib import Path

import numpy as np
from rdkit import Chem
from scipy.stats import spearmanr

from kb.assess.published_centre import describe_centre
from kb.physorg.competition import compete
from kb.physorg.constants import rows_set_from
from kb.physorg.step import Medium, StepFacts
from kb.vocabulary import Fate, LeavingGroup

DATA = Path(__file__).resolve().parent.parent / "data" / "hydrolysis_haloalkanes.csv"
PER_S = {"sec^-1": 1.0, "hour^-1": 1 / 3600, "min^-1": 1 / 60, "months^-1": 1 / 2.63e6, "M^-1s^-1": 1.0, "M^-1s-1": 1.0}
HALIDES = (("iodide", "[CX4]I"), ("bromide", "[CX4]Br"), ("chloride", "[CX4]Cl"), ("fluoride", "[CX4]F"))


def hydroxide_molar(row: dict[str, str]) -> float:
    """Return [OH-]: 1 M for second-order constants, else from the pH with pKw 14 at 25 and 0.033 per kelvin less."""
    if row["k_units"].startswith("M^-1"):
        return 1.0
    try:
        return float(10 ** (float(row["pH"]) - 14 + 0.033 * (float(row["T_C"]) - 25)))
    except ValueError:
        return 1e-7


def modelled(row: dict[str, str]) -> tuple[float, float] | None:
    """Return (log10 of the rate constant [1/s], share of elimination), summed over like leaving groups."""
    mol = Chem.MolFromSmiles(row["smiles"])
    found = [(word, mol.GetSubstructMatches(Chem.MolFromSmarts(smarts))) for word, smarts in HALIDES]
    sites = [(match, word) for word, matches in found for match in matches]
    if not sites:
        return None
    best = sites[0][1]
    medium = Medium(
        nucleophile="hydroxide",
        base="hydroxide",
        nucleophile_molar=hydroxide_molar(row),
        base_molar=hydroxide_molar(row),
        solvent_kinds=frozenset({"protic", "water"}),
        solvent_y=3.49,
        solvent_n_t=-1.2,
        temperature_c=float(row["T_C"]),
    )
    rate = lost = 0.0
    for (centre, leaving), word in sites:
        if word != best:
            continue
        step = StepFacts(centre=describe_centre(mol, centre, leaving), leaving_group=LeavingGroup(word), medium=medium)
        result = compete(step)
        elimination = result.share_of(Fate.ELIMINATION)
        if result.half_life_h is None or elimination is None:
            continue
        k = math.log(2) / 3600 / result.half_life_h.mean
        rate += k
        lost += k * elimination.mean
    return (math.log10(rate), lost / rate) if rate else None


@cache
def compared() -> list[tuple[dict[str, str], float, float]]:
    """Return (row, log10 rate, share of elimination) of rows that count."""
    used = {name.removeprefix("hydrolysis:") for name in rows_set_from() if name.startswith("hydrolysis:")}
    with DATA.open(encoding="utf-8", newline="") as handle:
        kept = [row for row in csv.DictReader(handle) if row["smiles"] not in used]
    return [(row, *answer) for row in kept if (answer := modelled(row)) is not None]


def test_enough_rows_count() -> None:
    assert len(compared()) >= 35


def test_the_order_of_rates_is_that_measured() -> None:
    pairs = [
        (rate, math.log10(float(row["k_reported"]) * PER_S[row["k_units"]]))
        for row, rate, _ in compared()
        if row["k_units"] in PER_S and row["k_reported"]
    ]
    ours, measured = zip(*pairs, strict=True)
    assert spearmanr(ours, measured)[0] >= 0.8
    # To about a factor of ten, as the model says of itself.
    assert np.median(np.abs(np.array(ours) - np.array(measured))) < 1.0


def is_elimination(row: dict[str, str]) -> bool:
    """Return what the measurement's own paper says.

    The collection files 1,3-dibromopropane under elimination; the paper it cites (T. M. Vogel & M. Reinhard, Environ.
    Sci. Technol. 1986, 20, 992, abstract) says that it hydrolysed to alcohols with no elimination products detected.
    """
    return row["sheet"].startswith("2_") and row["name"] != "1,3-dibromopropane"


def test_substitution_against_elimination_without_any_record() -> None:
    # The issue asks 90 % with half of the rows on record; here the model is alone.
    right = [(share > 0.5) == is_elimination(row) for row, _, share in compared()]
    assert sum(right) / len(right) >= 0.9
    as_filed = [(share > 0.5) == row["sheet"].startswith("2_") for row, _, share in compared()]
    assert sum(as_filed) / len(as_filed) >= 0.8


def test_pentachloroethane_loses_hydrogen_chloride() -> None:
    by_name = {row["name"]: share for row, _, share in compared()}
    assert by_name["Pentachloroethane"] > 0.9
