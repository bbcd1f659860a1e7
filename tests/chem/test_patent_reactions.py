"""Readings of real reactions, atom maps ignored, against what the maps say.

Source: `tests/data/patent_reactions.csv` (D. M. Lowe, US patents, CC0; see its README). The map numbers name the true
centre and leaving atom; they are stripped before reading and looked at only to compare. Two atoms that the symmetry
of the molecule exchanges (both ends of a dibromide) count as the same: no reading without maps can tell which of them
the maps chose. Both halves of the rows (by a hash of the row's id) are held to the same bounds. The rules were worked
out mostly on half 0; the misses of half 1 were looked at as well, so it is a check against overfitting, no blind test.
"""

from __future__ import annotations

import csv
import hashlib
from collections import Counter
from functools import cache
from pathlib import Path

import pytest
from rdkit import Chem

from kb.chem.facts import Reading
from kb.chem.reading import read_scheme
from kb.chem.scheme import parse_scheme

DATA = Path(__file__).parents[1] / "data" / "patent_reactions.csv"
AT_SP3_CARBON = {"substitution", "elimination", "group-loss", "rearranged", "transposed"}
Row = dict[str, str]


def load_rows(kind: str, confidence: str, half: int | None = None) -> list[Row]:
    """Return the rows of a kind; half 0 or 1 picks by the hash of the row's id."""
    with DATA.open(encoding="utf-8", newline="") as handle:
        rows = [r for r in csv.DictReader(handle) if r["kind"] == kind and r["confidence"] == confidence]
    return [r for r in rows if half is None or _half(r["id"]) == half]


def _half(row_id: str) -> int:
    return int(hashlib.sha256(row_id.encode()).hexdigest(), 16) % 2


@cache
def reading_of(scheme: str) -> Reading:
    """Return the reading of a scheme with its maps ignored, made once for all tests of this file."""
    return read_scheme(scheme, ignore_maps=True)


def is_centre_right(row: Row, reading: Reading) -> bool:
    """Return whether centre and leaving atom are those of the maps, or their equals by symmetry."""
    centre = reading.centre
    if centre is None:
        return False
    found = (str(centre.atom_map or ""), str(centre.leaving_atom_map or ""))
    true = (row["centre_map"], row["lg_map"])
    if found == true:
        return True
    if not all(found) or not all(true):
        # A few entries leave the leaving atom unmapped; then the centre alone decides.
        return found[0] == true[0]
    for fragment in parse_scheme(row["rxn_smiles_mapped"]).left:
        maps = [str(m) for m in fragment.maps]
        if true[0] in maps and found[0] in maps and true[1] in maps and found[1] in maps:
            ranks = list(Chem.CanonicalRankAtoms(fragment.graph.mol, breakTies=False))
            return all(ranks[maps.index(f)] == ranks[maps.index(t)] for f, t in zip(found, true, strict=True))
    return False


def judge_substitutions(rows: list[Row]) -> Counter[str]:
    """Return how many are right, wrong or unresolved."""
    verdicts: Counter[str] = Counter()
    for row in rows:
        reading = reading_of(row["rxn_smiles_mapped"])
        if reading.fate is None:
            verdicts["unresolved"] += 1
        elif str(reading.fate) in AT_SP3_CARBON and is_centre_right(row, reading):
            verdicts["right"] += 1
        else:
            verdicts["wrong"] += 1
    return verdicts


@pytest.mark.parametrize("half", [0, 1])
def test_centre_and_leaving_atom_of_substitutions_are_right(half: int) -> None:
    rows = load_rows("substitution", "high", half)
    verdicts = judge_substitutions(rows)
    assert len(rows) > 300
    assert verdicts["right"] >= 0.97 * len(rows), verdicts
    assert verdicts["wrong"] <= 0.008 * len(rows), verdicts


@pytest.mark.parametrize(
    ("kind", "fate", "least"),
    [("acid_deprotection", "group-loss", 0.96), ("elimination", "elimination", 0.88), ("addition", "addition", 0.88)],
)
def test_the_other_fates_of_the_patent_rows_are_right(kind: str, fate: str, least: float) -> None:
    rows = load_rows(kind, "high")
    fates = Counter(str(reading_of(r["rxn_smiles_mapped"]).fate) for r in rows)
    assert fates[fate] >= least * len(rows), fates


def test_eliminations_and_additions_have_the_right_centre() -> None:
    for kind in ("elimination", "addition"):
        rows = load_rows(kind, "high")
        right = sum(is_centre_right(r, reading_of(r["rxn_smiles_mapped"])) for r in rows)
        assert right >= 0.88 * len(rows), (kind, right, len(rows))


@pytest.mark.parametrize("column", ["rxn_smiles_mapped", "rxn_smiles_unmapped"])
def test_reactions_elsewhere_are_seldom_taken_for_one_at_sp3_carbon(column: str) -> None:
    """The few that are taken so are displacements and deprotections by their chemistry; the maps hid it."""
    rows = load_rows("other", "")
    taken = [r["id"] for r in rows if str(reading_of(r[column]).fate) in AT_SP3_CARBON]
    assert len(rows) == 380
    assert len(taken) <= 0.02 * len(rows), taken


def test_unmapped_schemes_with_agents_over_the_arrow_are_read_alike() -> None:
    for kind, confidence, fate, least in [
        ("substitution", "high", "substitution", 0.97),
        ("acid_deprotection", "high", "group-loss", 0.96),
        ("elimination", "high", "elimination", 0.88),
        ("addition", "high", "addition", 0.88),
    ]:
        rows = load_rows(kind, confidence, 1)
        right = sum(str(reading_of(r["rxn_smiles_unmapped"]).fate) == fate for r in rows)
        assert right >= least * len(rows), (kind, right, len(rows))


def test_maps_when_used_agree_with_themselves() -> None:
    rows = [r for r in load_rows("substitution", "high", 0) if r["lg_map"]][:120]
    for row in rows:
        centres = read_scheme(row["rxn_smiles_mapped"]).centres
        assert (row["centre_map"], row["lg_map"]) in {(str(c.atom_map), str(c.leaving_atom_map)) for c in centres}


def test_every_list_of_possible_products_is_distinct_and_the_stated_one_leads_it() -> None:
    for row in load_rows("substitution", "high", 0)[::5]:
        reading = reading_of(row["rxn_smiles_mapped"])
        products = [p.product for p in reading.possible]
        assert len(products) == len(set(products))
        stated = {f.smiles for f in parse_scheme(row["rxn_smiles_mapped"]).products}
        assert products and products[0] in stated
