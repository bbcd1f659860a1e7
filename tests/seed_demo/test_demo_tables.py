"""The demo's tables are what they claim to be: enough, plausible, readable, invented, and truly planted."""

from __future__ import annotations

import csv
import importlib.util
import sys
import tomllib
from collections import Counter
from pathlib import Path
from types import ModuleType
from typing import Any

import pytest
from rdkit import Chem
from rdkit.Chem import AllChem

from kb.chem.reading import read_scheme
from kb.record.run import Run
from kb.vocabulary import Confidence, Fate, Role, Verdict

HERE = Path(__file__).resolve().parents[2] / "seed_demo"
PLANTED = tomllib.loads((HERE / "planted.toml").read_text(encoding="utf-8"))


class KeptInMemory:
    """A sink that keeps runs in a dictionary, as a store would by UUID."""

    def __init__(self) -> None:
        self.runs: dict[Any, Run] = {}
        self.stored = self.duplicate = 0

    def add_many(self, many: Any, who: str, progress: Any = None) -> KeptInMemory:
        many = list(many)
        fresh = {run.run_id: run for run in many if run.run_id not in self.runs}
        self.runs |= fresh
        report = KeptInMemory()
        report.stored, report.duplicate = len(fresh), len(many) - len(fresh)
        return report

    def get_many(self, run_ids: Any) -> tuple[Run, ...]:
        return tuple(self.runs[i] for i in run_ids if i in self.runs)


@pytest.fixture(scope="module")
def builder() -> ModuleType:
    spec = importlib.util.spec_from_file_location("seed_demo_build_under_test", HERE / "build.py")
    assert spec is not None and spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    sys.modules[spec.name] = module
    spec.loader.exec_module(module)
    return module


@pytest.fixture(scope="module")
def book(builder: ModuleType) -> KeptInMemory:
    sink = KeptInMemory()
    report = builder.build(sink)
    assert report.rejections == ()
    assert report.read == report.stored
    return sink


@pytest.fixture(scope="module")
def runs(book: KeptInMemory) -> dict[str, Run]:
    return {str(run.reference): run for run in book.runs.values()}


def test_every_table_says_at_its_head_that_it_is_invented() -> None:
    tables = sorted((HERE / "tables").glob("*.csv"))
    assert len(tables) >= 12
    for path in tables:
        assert "invented" in path.open(encoding="utf-8").readline(), path.name


def test_there_are_enough_runs_families_failures_and_modes_over_eighteen_months(runs: dict[str, Run]) -> None:
    failed = [run for run in runs.values() if run.verdict is Verdict.FAILED]
    modes = {failure.mode for run in failed for failure in run.outcome.failures}
    dates = sorted(run.date for run in runs.values() if run.date)
    assert len(runs) >= 200
    assert len(failed) >= 45
    assert len(modes) >= 10
    assert {run.verdict for run in runs.values()} == set(Verdict)
    assert 500 <= (dates[-1] - dates[0]).days <= 560


def test_building_twice_adds_nothing(builder: ModuleType, book: KeptInMemory) -> None:
    before = len(book.runs)
    again = builder.build(book)
    assert (again.stored, again.duplicate, len(book.runs)) == (0, before, before)


def test_every_material_is_known_by_name_or_drawn(builder: ModuleType) -> None:
    assert builder.AllTables().unknown_names == Counter()


def test_runs_go_in_by_date(book: KeptInMemory) -> None:
    moments = [run.recorded_at for run in book.runs.values()]
    assert moments == sorted(moments)  # type: ignore[type-var]


def test_schemes_are_read_as_what_was_wanted(runs: dict[str, Run]) -> None:
    unread = [r.scheme for r in runs.values() if read_scheme(r.scheme).confidence is not Confidence.MATCHED]
    assert len(unread) <= 0.02 * len(runs), unread


def test_products_noted_by_structure_have_the_fate_that_was_noted(runs: dict[str, Run]) -> None:
    """Eliminations are checked by enumeration; the formula of each must be the substrate's less the leaving acid."""
    checked = 0
    for run in runs.values():
        for product in run.outcome.products:
            if product.fate is Fate.ELIMINATION and product.smiles:
                checked += 1
                stated = f"{run.scheme.split('>')[0]}>>{product.smiles}"
                assert read_scheme(stated).fate is Fate.ELIMINATION, (run.reference, stated)
    assert checked >= 30


def test_isolated_yields_do_not_exceed_what_formed(runs: dict[str, Run]) -> None:
    for run in runs.values():
        split, isolated = run.outcome.split, run.outcome.isolated_yield_pct
        if isolated is not None and split and isolated <= 100:
            assert isolated <= 100 * max(split.values()) + 1, run.reference


def test_splits_add_up_except_where_bad_recording_was_planted(runs: dict[str, Run]) -> None:
    planted = {entry["run"] for entry in PLANTED["badly_recorded"] if "shares" in entry["lacks"]}
    off = {ref for ref, run in runs.items() if abs(sum(run.outcome.split.values()) - 1) > 0.0101}
    assert off == planted


def test_no_banned_chemistry() -> None:
    banned = [Chem.MolFromSmarts(s) for s in ("[NX3]-[NX3]", "[NX3]-[NX2]=[#6]", "[#6][NX2]=[NX2][#6]", "[Ag]")]
    for path in (HERE / "tables").glob("*.csv"):
        text = path.read_text(encoding="utf-8")
        for word in ("hydrazin", "hydrazon", "azodicarb", "DEAD", "DIAD", "silver", "Ag2O", "AgNO3", "AgBF4"):
            assert word not in text, (path.name, word)
        for row in csv.reader(text.splitlines()[2:]):
            mol = Chem.MolFromSmiles(row[5].split(">>")[0])
            assert not any(mol.HasSubstructMatch(q) for q in banned), row[5]


def test_planted_members_are_there_with_their_mode_and_in_date_order(runs: dict[str, Run]) -> None:
    assert len(PLANTED["cluster"]) >= 10
    for cluster in PLANTED["cluster"]:
        members = [runs[ref] for ref in cluster["members"]]
        dates = [run.date for run in members]
        assert len(members) >= 3
        assert dates == sorted(dates)  # type: ignore[type-var]
        assert all(cluster["mode"] in {f.mode for f in run.outcome.failures} for run in members), cluster["id"]
        assert set(cluster["preventable"]) <= set(cluster["members"][1:])
        assert not set(cluster["tolerated"]) & set(cluster["members"])


def test_a_preventable_member_has_an_earlier_one_that_was_no_hotter(runs: dict[str, Run]) -> None:
    def heat_c(run: Run) -> float:
        temperature = run.conditions.temperature
        assert temperature is not None
        return 80.0 if temperature.high_c is None else temperature.high_c

    for cluster in PLANTED["cluster"]:
        for ref in cluster["preventable"]:
            late = runs[ref]
            earlier = [runs[r] for r in cluster["members"] if runs[r].date < late.date]  # type: ignore[operator]
            assert any(heat_c(run) <= heat_c(late) + 5 for run in earlier), (cluster["id"], ref)


def test_planted_motifs_are_in_what_was_hit(runs: dict[str, Run]) -> None:
    for cluster in PLANTED["cluster"]:
        motif = Chem.MolFromSmarts(cluster["motif"])
        for ref in cluster["members"]:
            left = Chem.MolFromSmiles(runs[ref].scheme.split(">")[0])
            assert left.HasSubstructMatch(motif), (cluster["id"], ref)


def test_planted_contradictions_differ_only_in_outcome(runs: dict[str, Run]) -> None:
    for entry in PLANTED["contradiction"]:
        first, second = (runs[ref] for ref in entry["runs"])
        assert first.scheme == second.scheme
        for part in ("components", "solvents", "temperature", "time", "conc_molar"):
            assert getattr(first.conditions, part) == getattr(second.conditions, part), part
        shares = [100 * run.outcome.split[Fate.ELIMINATION] for run in (first, second)]
        assert shares == pytest.approx(entry["elimination_pct"])
        assert abs(shares[0] - shares[1]) > 40


def test_badly_recorded_runs_lack_what_is_said(runs: dict[str, Run]) -> None:
    def lacks(run: Run, what: str) -> bool:
        return {
            "temperature": run.conditions.temperature is None,
            "solvent": run.conditions.solvents == (),
            "date": run.date is None,
            "initials": run.by is None,
            "shares that add up": sum(run.outcome.split.values()) > 1.1,
            "a dry product: the yield is over 100 %": (run.outcome.isolated_yield_pct or 0) > 100,
        }[what]

    assert len(PLANTED["badly_recorded"]) >= 5
    for entry in PLANTED["badly_recorded"]:
        assert lacks(runs[entry["run"]], entry["lacks"]), entry


def test_the_book_holds_evidence_on_both_sides_of_the_planned_step(runs: dict[str, Run]) -> None:
    ether = Chem.MolFromSmarts("[CX4;!$([CX4]([CH3])([CH3])[CH3])][OX2][CX4]([CH3])([CH3])[CH3]")
    lost, survived = [], []
    for run in runs.values():
        acids = [c.name for c in run.conditions.components if c.role is Role.ACID]
        if not {"HCl", "TFA", "HBr"} & set(acids):
            continue
        if not Chem.MolFromSmiles(run.scheme.split(">")[0]).HasSubstructMatch(ether):
            continue
        (lost if "group-loss" in {f.mode for f in run.outcome.failures} else survived).append(run)
    assert len(lost) >= 5
    assert len(survived) >= 2
    assert all(run.conditions.temperature.high_c <= 10 and run.conditions.time.h <= 1 for run in survived)  # type: ignore[union-attr, operator]


def test_the_planned_step_removes_boc_and_keeps_the_ether() -> None:
    given = tomllib.loads((HERE / "planned_step.toml").read_text(encoding="utf-8"))
    substrate, product = (Chem.MolFromSmiles(side) for side in given["scheme"].split(">>"))
    cut = AllChem.ReactionFromSmarts("[NX3:1][CX3](=O)OC([CH3])([CH3])[CH3]>>[N:1]")
    made = {Chem.MolToSmiles(products[0]) for products in cut.RunReactants((substrate,))}
    assert made == {Chem.MolToSmiles(product)}
    assert product.HasSubstructMatch(Chem.MolFromSmarts("[CX4][OX2]C([CH3])([CH3])[CH3]"))


def test_the_planned_substrate_is_not_in_the_book(runs: dict[str, Run]) -> None:
    given = tomllib.loads((HERE / "planned_step.toml").read_text(encoding="utf-8"))
    planned = Chem.CanonSmiles(given["scheme"].split(">>")[0])
    assert planned not in {Chem.CanonSmiles(run.scheme.split(">")[0].split(".")[0]) for run in runs.values()}
