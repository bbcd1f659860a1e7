"""Configuration, shifts, refusals, relative rates: rows ST*, RE*, RR* of tests/data/check_values.csv, sources there."""

from __future__ import annotations

import math

import pytest

from kb.assess.published_centre import describe_centre
from kb.physorg.competition import Competition, compete
from kb.physorg.rates import cation_terms, centre_terms
from kb.physorg.step import Centre, Medium, StepFacts
from kb.physorg.stereo import StereoOutcome, expect_stereo
from kb.physorg.terms import total
from kb.vocabulary import CarbonClass, Fate, LeavingGroup
from tests.assess.published_rows import a_step, answer, is_test_row, rows

ACID = {"acid": "strong"}


def share(result: Competition, fate: Fate) -> float:
    found = result.share_of(fate)
    assert found is not None, result.no_number
    return found.mean


def stereo(step: StepFacts) -> StereoOutcome:
    outcome = expect_stereo(step, compete(step))
    assert outcome is not None
    return outcome


# Configuration ------------------------------------------------------------------------------------------------------


def test_secondary_bromide_with_hydroxide_inverts() -> None:
    # ST01: (R)-2-bromooctane, 100 % inversion under SN2 conditions (Solomons).
    outcome = stereo(a_step("CCCCCC[C@@H](C)Br", "Br", "HO-", "EtOH", 40.0))
    assert outcome.word == "inversion"
    assert outcome.net_inversion.mean > 0.95


@pytest.mark.parametrize(
    ("smiles", "group", "reagent", "solvent", "row", "pct"),
    [
        ("CC(Cl)c1ccccc1", "Cl", "KOAc", "AcOH", "ST02", 15),
        ("CCC(C)(OC(=O)c1ccc([N+](=O)[O-])cc1)c1ccccc1", "OPNB", "KOAc", "AcOH", "ST04", 5),
        ("CC[C@@](C)(Cl)CCCC(C)C", "Cl", "solvent", "80% EtOH/20% H2O", "ST14", 20),
        ("CCCCCCC(C)OS(=O)(=O)c1ccc(Br)cc1", "OBs", "solvent", "75% aq dioxane", "ST19", 77),
    ],
)
def test_net_inversion_lies_in_the_interval(
    smiles: str, group: str, reagent: str, solvent: str, row: str, pct: float
) -> None:
    assert is_test_row(row)
    outcome = stereo(a_step(smiles, group, reagent, solvent, None))
    assert outcome.net_inversion.low <= pct / 100 <= outcome.net_inversion.high, (row, outcome)


def test_net_retention_is_not_ruled_out() -> None:
    # ST07: 38 % net retention from a tertiary benzylic ester in aqueous acetone (Goering & Chang 1965).
    outcome = stereo(a_step("CCC(C)(OC(=O)c1ccc([N+](=O)[O-])cc1)c1ccccc1", "OPNB", "solvent", "80% acetone", None))
    assert outcome.net_inversion.low < -0.2
    assert outcome.word in ("racemisation", "unsettled")


def test_cations_lose_what_displacement_keeps() -> None:
    # Common practice: 2-octyl inverts, tertiary and benzylic centres racemise.
    secondary = stereo(a_step("CCCCCCC(C)Br", "Br", "NaN3", "DMSO", 25.0)).net_inversion.mean
    tertiary = stereo(a_step("CCC(C)(Cl)CCCC(C)C", "Cl", "solvent", "80% EtOH/20% H2O", 25.0)).net_inversion.mean
    benzylic = stereo(a_step("CC(Cl)c1ccccc1", "Cl", "solvent", "80% acetone", 25.0)).net_inversion.mean
    assert secondary > 0.95 > 0.6 > tertiary
    assert benzylic < 0.6


# Shifts -------------------------------------------------------------------------------------------------------------


def test_3_methyl_2_butanol_with_hydrogen_bromide_rearranges() -> None:
    # data/README of the check values; common practice: 2-bromo-2-methylbutane is the product.
    result = compete(a_step("CC(C)C(C)O", "OH2+", "", "H2O", 60.0, nucleophile="bromide", **ACID))
    assert result.fates[0][0] is Fate.REARRANGED
    assert result.fates[0][1].mean > 0.5


def test_2_methyl_1_propanol_with_hydrogen_bromide_does_not() -> None:
    result = compete(a_step("CC(C)CO", "OH2+", "", "H2O", 90.0, nucleophile="bromide", **ACID))
    assert share(result, Fate.REARRANGED) < 0.05
    assert share(result, Fate.SUBSTITUTION) > 0.9


def test_pinacolyl_alcohol_in_phosphoric_acid_moves_a_methyl() -> None:
    # RE01 (order of products) and RE02 (3 % not rearranged; that row set the constant).
    result = compete(a_step("CC(C)(C)C(C)O", "OH2+", "", "H2O", 80.0, **ACID))
    assert share(result, Fate.REARRANGED) > 0.9
    by_label = {a.label: a.of_alkenes.mean for a in result.alkenes}
    assert by_label["CC(C)=C(C)C"] > by_label["C=C(C)C(C)C"] > by_label.get("C=CC(C)(C)C", 0.0)


def test_neopentyl_rearranges_where_it_ionises_at_all() -> None:
    # RE04 Dostrovsky & Hughes 1946 (tert-pentyl products), the alcohol in hot acid: common practice.
    bromide = compete(a_step("CC(C)(C)CBr", "Br", "solvent", "aq EtOH", 125.0))
    assert bromide.fates[0][0] is Fate.REARRANGED
    alcohol = compete(a_step("CC(C)(C)CO", "OH2+", "", "H2O", 120.0, **ACID))
    assert alcohol.alkenes[0].label == "CC=C(C)C"


def test_chlorobutane_with_aluminium_chloride_moves_a_hydride() -> None:
    # RE10 set the size; that plain 1-chlorobutane without a Lewis acid does not shift is the control.
    moved = compete(
        a_step("CCCCCl", "Cl", "", "", 0.0, lewis_acid="strong", solvent_kinds=frozenset({"aromatic", "nonpolar"}))
    )
    assert moved.fates[0][0] is Fate.REARRANGED
    plain = compete(a_step("CCCCCl", "Cl", "NaOEt", "EtOH", 55.0))
    assert share(plain, Fate.REARRANGED) == 0.0


# Refusals -----------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("smiles", "group", "word"),
    [
        ("CC1(C)C2CCC1(Cl)CC2", "Cl", "bridgehead"),
        ("BrC12CC3CC(CC(C3)C1)C2", "Br", "bridgehead"),
        ("BrC12CCC(C1)CC2", "Br", "bridgehead"),
    ],
)
def test_bridgehead_halides_get_a_reason_and_no_number(smiles: str, group: str, word: str) -> None:
    # RE11: Bartlett & Knox 1939, nothing happens; RR23 to RR25.
    result = compete(a_step(smiles, group, "NaOEt", "EtOH", 80.0))
    assert not result.fates
    assert word in result.no_number
    assert "1939" in result.no_number


@pytest.mark.parametrize("kind", [CarbonClass.VINYL, CarbonClass.ARYL, CarbonClass.BRIDGEHEAD])
def test_closed_carbons_get_a_reason_and_no_number(kind: CarbonClass) -> None:
    medium = Medium(nucleophile="azide", solvent_kinds=frozenset({"polar-aprotic"}), temperature_c=60.0)
    step = StepFacts(centre=Centre(carbon_class=kind), leaving_group=LeavingGroup.BROMIDE, medium=medium)
    result = compete(step)
    assert not result.fates
    assert str(kind) in result.no_number


@pytest.mark.parametrize("group", [LeavingGroup.NITRO, LeavingGroup.OTHER])
def test_a_leaving_group_outside_the_tables_gets_no_number(group: LeavingGroup) -> None:
    medium = Medium(nucleophile="azide", solvent_kinds=frozenset({"polar-aprotic"}), temperature_c=60.0)
    step = StepFacts(centre=Centre(carbon_class=CarbonClass.PRIMARY), leaving_group=group, medium=medium)
    assert not compete(step).fates


def test_an_alcohol_without_acid_gets_a_reason_and_no_number() -> None:
    result = compete(a_step("CC(C)O", "OH2+", "NaN3", "DMSO", 80.0, acid="none"))
    assert not result.fates
    assert "does not leave" in result.no_number


def test_nothing_in_the_flask_gives_no_number() -> None:
    result = compete(a_step("CCCBr", "Br", "", "", 25.0))
    assert not result.fates
    assert result.no_number


# Relative rates -----------------------------------------------------------------------------------------------------


def sn2(smiles: str, group: str = "Br") -> float:
    return total(centre_terms(a_step(smiles, group, "NaOEt", "EtOH", 25.0).centre))


def test_sn2_order_by_class_branching_and_activation() -> None:
    # RR01 to RR11 (Solomons Table 6.4; Streitwieser 1956).
    rising = ["CC(C)(C)Br", "CC(C)(C)CBr", "CC(C)Br", "CC(C)CBr", "CCCBr", "CCBr", "CBr", "C=CCBr", "BrCc1ccccc1"]
    values = [sn2(s) for s in rising]
    assert values == sorted(values)


def test_alpha_carbonyl_and_nitrile_speed_sn2_by_orders_of_magnitude() -> None:
    # RR13, RR14: Conant, Kirner & Hussey 1925 against 1-chlorobutane with iodide, 1e5 and 3e3 (orders of magnitude).
    for name in ("RR13", "RR14"):
        row = rows()[name]
        gap = sn2(row["substrate_smiles"], "Cl") - sn2("CCCCCl", "Cl")
        assert gap == pytest.approx(math.log10(float(row["value"])), abs=1.2)


def test_solvolysis_in_water_spans_six_orders_from_ethyl_to_tert_butyl() -> None:
    # RR16 to RR19 (Solomons Table 6A): methyl 1.0, ethyl 1.0, tert-butyl 1.2e6 (isopropyl 11.6, text value).
    def rate(smiles: str) -> float:
        half_life = compete(a_step(smiles, "Br", "solvent", "H2O", 25.0)).half_life_h
        assert half_life is not None
        return 1 / half_life.mean

    ethyl = rate("CCBr")
    assert math.log10(rate("CBr") / ethyl) == pytest.approx(0, abs=0.5)
    assert math.log10(rate("CC(C)Br") / ethyl) == pytest.approx(math.log10(11.6), abs=0.7)
    assert math.log10(rate("CC(C)(C)Br") / ethyl) == pytest.approx(math.log10(1.2e6), abs=0.7)


def test_cation_order() -> None:
    # Common practice: tert-butyl over isopropyl; benzylic and donor-substituted cations above the plain ones.
    def ease(smiles: str) -> float:
        return total(cation_terms(a_step(smiles, "Cl", "solvent", "aq EtOH", 25.0).centre))

    rising = ["CCCl", "CC(C)Cl", "CC(Cl)c1ccccc1", "CC(C)(C)Cl", "ClC(c1ccccc1)c1ccccc1", "CC(C)(Cl)c1ccccc1"]
    values = [ease(s) for s in rising[:4]]
    assert values[0] < values[1] < min(values[2:])
    assert ease("CC(C)(Cl)c1ccccc1") > ease("CC(C)(C)Cl") + 2
    assert ease("COCCl") > ease("CC(C)(C)Cl")


def test_every_fate_and_channel_adds_up_and_says_why() -> None:
    result = answer("ZH01")
    assert sum(s.mean for _, s in result.fates) == pytest.approx(1)
    assert sum(c.share.mean for c in result.channels) == pytest.approx(1)
    assert sum(a.of_alkenes.mean for a in result.alkenes) == pytest.approx(1)
    for channel in result.channels:
        assert channel.terms
        assert all(t.because for t in channel.terms)
    assert result.sources


def test_the_same_step_always_gives_the_same_figures() -> None:
    assert answer("SE07") == answer("SE07")


@pytest.mark.parametrize("smiles", ["CC(C)C(C)Br", "BrC(C)C(C)C", "C(C(C)C)(Br)C"])
def test_atom_order_does_not_matter(smiles: str) -> None:
    one = compete(a_step(smiles, "Br", "NaOEt", "EtOH", 25.0))
    other = compete(a_step("CC(C)C(C)Br", "Br", "NaOEt", "EtOH", 25.0))
    assert {f: s.mean for f, s in one.fates} == pytest.approx({f: s.mean for f, s in other.fates}, abs=0.02)


def test_describe_centre_reads_a_cyclohexyl_centre() -> None:
    from rdkit import Chem

    centre = describe_centre(Chem.MolFromSmiles("C[C@@H]1CC[C@H]([C@@H](C1)Cl)C(C)C"), 5, 7)
    assert centre.ring_size == 6
    assert {n.label.split(" ")[0]: n.anti_hydrogens for n in centre.neighbours} == {"CH": 0.0, "CH2": 1.0}
    assert centre.is_stereocentre


def test_rates_are_the_sums_that_are_shown() -> None:
    result = answer("SE07")
    plain = [c for c in result.channels if c.kind != "ionisation"]
    assert plain
    for channel in plain:
        assert channel.log10_rate == pytest.approx(total(channel.terms), abs=0.05)


def test_a_shift_never_ends_on_a_bridgehead() -> None:
    from rdkit import Chem

    # 2-Norbornyl: a hydride from C1 would leave a bridgehead cation, which cannot flatten (Bredt; common practice).
    centre = describe_centre(Chem.MolFromSmiles("BrC1CC2CCC1C2"), 1, 0)
    assert all(s.cation.carbon_class is not CarbonClass.BRIDGEHEAD for s in centre.shifts)
    assert compete(a_step("BrC1CC2CCC1C2", "Br", "solvent", "aq EtOH", 60.0)).fates
