"""Steps that are done every day give no serious liability; their bad neighbours do.

Source: `tests/data/liability_cases/good_steps.csv`, common practice, written for this project.
"""

from __future__ import annotations

import csv
from pathlib import Path

import pytest

from kb.assess.liability import find_liabilities
from kb.book.plan_words import plan_from_words
from kb.record.finding import Finding
from kb.store.derivation import account_of_plan
from kb.vocabulary import Severity

Step = dict[str, str]
STEPS = Path(__file__).parents[1] / "data" / "liability_cases" / "good_steps.csv"
with STEPS.open(encoding="utf-8", newline="") as lines:
    GOOD = tuple(csv.DictReader(lines))


def findings_of(step: dict[str, str]) -> tuple[Finding, ...]:
    words = {key: step[key].split(";") for key in ("reagents", "bases", "solvents") if step[key]}
    plan = plan_from_words({"scheme": step["scheme"], "temperature": step["temperature"], **words})
    account = account_of_plan(plan)
    conditions = plan.conditions
    return find_liabilities(
        reading=account.reading,
        fragments=account.fragments,
        profile=account.profile,
        product=".".join(account.products) or None,
        others=[
            *(c.smiles for c in conditions.components if c.smiles),
            *(s.smiles for s in conditions.solvents if s.smiles),
        ],
    )


def a_step(scheme: str, reagents: str = "", bases: str = "", solvents: str = "", temperature: str = "25C") -> Step:
    return {"scheme": scheme, "reagents": reagents, "bases": bases, "solvents": solvents, "temperature": temperature}


def serious(step: dict[str, str]) -> set[str]:
    return {f.rule_id for f in findings_of(step) if f.severity is Severity.SERIOUS}


@pytest.mark.parametrize("step", GOOD, ids=lambda step: step["step"])
def test_a_good_step_gives_no_serious_liability(step: dict[str, str]) -> None:
    assert serious(step) == set()


def test_there_are_forty_good_steps_or_more() -> None:
    assert len({step["step"] for step in GOOD}) == len(GOOD) >= 40


@pytest.mark.parametrize(
    ("step", "rule"),
    [
        (a_step("CC(C)(C)Br.CCO>>CC(C)(C)OCC", bases="NaH", solvents="THF"), "tertiary-lg-basic-nucleophile"),
        (a_step("CCC(C)OS(C)(=O)=O>>CCC(C)O", bases="NaOH", solvents="water"), "secondary-lg-hydroxide-alkoxide"),
        (a_step("CC(C)C(C)O>>CC(C)C(C)Br", "HBr 48%"), "secondary-cation-hydride-shift"),
        (a_step("CC(C)(C)OC(=O)NCCO>>CC(C)(C)OC(=O)NCCBr", "HBr 48%"), "n-boc-strong-acid"),
        (a_step("CC(O)c1ccccc1.OCC>>CC(OCC)c1ccccc1", "H2SO4"), "tertiary-benzylic-alcohol-dehydration"),
        (a_step("CCCCBr>>CCCCN=[N+]=[N-]", "NaN3", solvents="DCM"), "strong-base-or-azide-in-chlorinated-solvent"),
    ],
)
def test_a_bad_neighbour_does(step: dict[str, str], rule: str) -> None:
    assert rule in serious(step)


def test_a_solvent_is_no_electrophile_for_an_amine() -> None:
    acylation = a_step("NCc1ccccc1.CC(=O)Cl>>CC(=O)NCc1ccccc1", bases="Et3N", solvents="DCM", temperature="0C")
    unread = a_step("NCc1ccccc1", "AcCl", "Et3N", "DCM", "0C")
    drawn = a_step("NCc1ccccc1.CS(=O)(=O)Cl>ClCCl>CS(=O)(=O)NCc1ccccc1", bases="Et3N", temperature="0C")
    amination = a_step("O=Cc1ccccc1.NCCCC>>CCCCNCc1ccccc1", "NaBH(OAc)3", solvents="DCM")
    for step in (acylation, unread, drawn, amination):
        assert not {f.rule_id for f in findings_of(step)} & {"primary-amine-overalkylation", "amine-quaternisation"}


def test_dichloroethane_that_is_drawn_as_what_reacts_is_an_electrophile() -> None:
    step = a_step("NCc1ccccc1.ClCCCl>>ClCCNCc1ccccc1", bases="K2CO3", solvents="MeCN")
    assert "primary-amine-overalkylation" in {f.rule_id for f in findings_of(step)}


def test_an_amine_both_drawn_and_named_is_told_of_once() -> None:
    step = a_step("NCc1ccccc1.CCCCBr", "BnNH2", solvents="MeCN")
    told = [f for f in findings_of(step) if f.rule_id == "primary-amine-overalkylation"]
    assert [f.component for f in told] == [0]


@pytest.mark.parametrize(
    ("step", "is_told"),
    [
        (a_step("CC(C)(C)O>>CC(C)(C)Cl", "HCl 37%"), False),
        (a_step("CC(C)(C)O", "HCl 37%"), False),  # the halide is inferred
        (a_step("CC(O)c1ccccc1", "HBr 48%"), False),
        (a_step("CC(O)c1ccccc1.OCC>>CC(OCC)c1ccccc1", "HCl 37%"), True),  # the ether is meant, not the halide
        (a_step("CC(C)(C)O", "H2SO4"), True),
        (a_step("OC(C)(C)CCC(O)c1ccccc1>>OC(C)(C)CCC(Br)c1ccccc1", "HBr 48%"), False),
    ],
)
def test_loss_of_water_is_no_worry_where_hydrogen_halide_gives_the_halide(step: dict[str, str], is_told: bool) -> None:
    found = {i for f in findings_of(step) for i in (f.rule_id, *f.also)}
    assert ("tertiary-benzylic-alcohol-dehydration" in found) is is_told


@pytest.mark.parametrize(
    ("step", "is_told"),
    [
        (a_step("OC1CCCCC1Br>>C1CC2OC2CC1", bases="NaOH", solvents="water"), False),
        (a_step("OC1CCCCC1Br", bases="NaOH", solvents="water"), False),  # the ring closure is inferred
        (a_step("O[C@@H]1CCCC[C@H]1Br", bases="NaOH", solvents="water"), False),  # trans
        (a_step("O[C@H]1CCCC[C@H]1Br", bases="NaOH", solvents="water"), True),  # cis: no way in from behind
        (a_step("OC1CCCCC1OS(C)(=O)=O>>C1CC2OC2CC1", bases="NaOH", solvents="water"), False),
        (a_step("OCCC(C)Br>>CC1CCO1", bases="NaOH", solvents="water"), True),  # an oxetane is slow
        (a_step("CC1CCCCC1Br", bases="NaOH", solvents="water"), True),  # no hydroxyl
        (a_step("OC1CCCCC1Br>>OC1CCCCC1O", bases="NaOH", solvents="water"), True),  # from outside
    ],
)
def test_loss_of_hx_is_no_worry_where_a_neighbour_closes_a_fast_ring(step: dict[str, str], is_told: bool) -> None:
    """Source: Winstein and Lucas, J. Am. Chem. Soc. 1939, 61, 1576 (trans opens and closes, cis does not; memory)."""
    found = {i for f in findings_of(step) for i in (f.rule_id, *f.also)}
    assert ("secondary-lg-hydroxide-alkoxide" in found) is is_told


@pytest.mark.parametrize(
    ("scheme", "is_told"),
    [
        ("CCOC(=O)CCBr.C1CCNC1>>CCOC(=O)CCN1CCCC1", False),
        ("CCOC(=O)CCBr.C1CCNC1", True),  # no product stated
        ("CCOC(=O)C[C@H](C)Br.C1CCNC1>>CCOC(=O)C[C@@H](C)N1CCCC1", True),  # the configuration would be lost
        ("CCOC(=O)CCBr.CC(=O)O>>CCOC(=O)CCOC(C)=O", True),
    ],
)
def test_elimination_that_the_amine_undoes_is_no_worry(scheme: str, is_told: bool) -> None:
    found = {f.rule_id for f in findings_of(a_step(scheme, bases="K2CO3", solvents="MeCN"))}
    assert ("beta-lg-acceptor-e1cb" in found) is is_told


@pytest.mark.parametrize(
    ("scheme", "rule", "is_told"),
    [
        ("BrC1CC2CCC1C2", "secondary-cation-hydride-shift", False),  # norbornyl
        ("BrC1C2CC3CC(C2)CC1C3", "secondary-cation-hydride-shift", False),  # 2-adamantyl
        ("CC(C)C(C)Br", "secondary-cation-hydride-shift", True),
        ("BrCC12CC3CC(CC(C3)C1)C2", "neopentyl-ionising-rearrangement", False),  # bridgehead CH2X
        ("BrCC(C)(C)C", "neopentyl-ionising-rearrangement", True),
        ("CC(Br)C12CC3CC(CC(C3)C1)C2", "secondary-cation-alkyl-shift", False),
        ("CC1(C)C2CCC1(C)C(Cl)C2", "secondary-cation-alkyl-shift", True),  # isobornyl: a ring bond moves
        ("CC(C)(C)C(C)Br", "secondary-cation-alkyl-shift", True),
    ],
)
def test_no_shift_leaves_a_cation_at_a_bridgehead(scheme: str, rule: str, is_told: bool) -> None:
    """Source: Bredt's rule; isobornyl chloride to camphene is the textbook shift at a bridgehead (memory)."""
    found = {i for f in findings_of(a_step(scheme, solvents="water", temperature="80C")) for i in (f.rule_id, *f.also)}
    assert (rule in found) is is_told


@pytest.mark.parametrize(
    ("scheme", "shown"),
    [
        ("C[C@H](Cl)c1ccccc1>>C[C@@H](O)c1ccccc1", "CC(O)c1ccccc1"),
        ("C[C@H](Cl)c1ccc([C@@H](C)CC)cc1>>C[C@@H](O)c1ccc([C@@H](C)CC)cc1", "CC[C@H](C)c1ccc(C(C)O)cc1"),
        ("C[C@H](Cl)c1ccccc1", None),  # no product stated, none made up
    ],
)
def test_an_ion_pair_gives_the_racemised_product_not_the_substrate(scheme: str, shown: str | None) -> None:
    found = findings_of(a_step(scheme, solvents="water", temperature="60C"))
    (finding,) = [f for f in found if f.rule_id == "ion-pair-racemisation"]
    assert finding.side_product == shown


def test_what_forms_at_an_ionising_centre_claims_no_configuration() -> None:
    found = findings_of(a_step("C[C@H](Cl)c1ccccc1", solvents="ethanol", temperature="60C"))
    (finding,) = [f for f in found if f.rule_id == "solvolysis-protic-solvent"]
    assert finding.side_product == "CCOC(C)c1ccccc1"
