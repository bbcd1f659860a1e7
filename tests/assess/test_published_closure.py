"""Rings that close from within: which, how fast against one another, and where the drawing forbids it.

Order of ring sizes for amines: 5 > 6 > 3 > 7 > 4 (H. Freundlich & co-workers, G. Salomon, as in textbooks of physical
organic chemistry; memory). Epoxides from trans-halohydrins and not from cis ones: common practice.
"""

from __future__ import annotations

import pytest
from rdkit import Chem

from kb.assess.published import PublishedEstimate, published_estimate
from kb.assess.published_closure import find_closure
from kb.chem.reading import read_scheme
from kb.materials.profile import ConditionProfile
from kb.physorg.competition import compete
from kb.physorg.constants import leaving_scale
from kb.physorg.step import StepFacts
from kb.vocabulary import Fate

WATER = {"solvent_classes": frozenset({"protic", "water"}), "has_unknown_solvent": False, "winstein_y": 3.49}
NITRILE = {"solvent_classes": frozenset({"polar-aprotic", "nitrile"}), "has_unknown_solvent": False}
HYDROXIDE = ConditionProfile(
    reagent_classes=frozenset({"hydroxide"}), base_pkah=15.7, base_bulk="unhindered", temperature_c=25.0, **WATER  # type: ignore[arg-type]
)  # fmt: skip
CARBONATE = ConditionProfile(
    reagent_classes=frozenset({"carbonate_base"}), base_pkah=10.33, temperature_c=25.0, **NITRILE  # type: ignore[arg-type]
)  # fmt: skip
TRANS, CIS = "O[C@@H]1CCCC[C@H]1Br", "O[C@@H]1CCCC[C@@H]1Br"


def asked(scheme: str, profile: ConditionProfile) -> PublishedEstimate:
    reading = read_scheme(scheme)
    return published_estimate(reading, reading.substrate or "", profile)


@pytest.mark.parametrize("scheme", [f"{TRANS}>>C1CCC2OC2C1", TRANS])
def test_a_trans_bromohydrin_with_hydroxide_closes_to_the_epoxide(scheme: str) -> None:
    found = asked(scheme, HYDROXIDE)
    assert found.fates[0][0] is Fate.SUBSTITUTION
    assert found.fates[0][1].mean > 0.9
    assert found.channels[0].kind == "closure"
    assert found.stereo is not None and found.stereo.word == "inversion"


def test_a_cis_bromohydrin_cannot() -> None:
    found = asked(CIS, HYDROXIDE)
    assert all(c.kind != "closure" for c in found.channels)
    assert "cannot stand behind" in found.note


def test_undrawn_configuration_is_less_sure() -> None:
    undrawn, drawn = asked("OC1CCCCC1Br", HYDROXIDE), asked(TRANS, HYDROXIDE)
    assert undrawn.step is not None and undrawn.step.closure is not None and undrawn.step.closure.is_aligned is None
    assert undrawn.half_life_h is not None and drawn.half_life_h is not None
    assert undrawn.half_life_h.mean > drawn.half_life_h.mean


def closing_rate(carbons: int) -> float:
    found = asked("N" + "C" * carbons + "Br", CARBONATE)
    return next(c.log10_rate for c in found.channels if c.kind == "closure")


def test_amines_close_five_before_six_before_three_before_seven_before_four() -> None:
    rates = [closing_rate(n - 1) for n in (5, 6, 3, 7, 4)]
    assert rates == sorted(rates, reverse=True)
    assert rates[0] - rates[-1] > 3


@pytest.mark.parametrize(
    ("scheme", "profile"),
    [
        ("OCCCCCl>>C1CCCO1", HYDROXIDE),
        ("NCCCCBr>>C1CCCN1", CARBONATE),
        ("NCCCCCBr>>C1CCNCC1", CARBONATE),
    ],
)
def test_five_and_six_members_close(scheme: str, profile: ConditionProfile) -> None:
    found = asked(scheme, profile)
    assert found.channels[0].kind == "closure"
    assert dict(found.fates)[Fate.SUBSTITUTION].mean > 0.9
    assert any("Kirby" in s or "Freundlich" in s for s in found.sources)


def test_rings_outside_the_table_get_a_reason_and_no_number() -> None:
    found = asked("NCCCCCCCCBr>>C1CCCCCCCN1", CARBONATE)
    assert not found.fates
    assert "9-membered ring" in found.note and found.note.endswith("No honest number.")


def closure_of(smiles: str, base_pkah: float | None) -> object:
    mol = Chem.MolFromSmiles(smiles)
    centre, leaving = mol.GetSubstructMatch(Chem.MolFromSmarts("[CX4][Br]"))
    return find_closure(mol, centre, leaving, base_pkah)


@pytest.mark.parametrize(
    ("smiles", "pkah", "why"),
    [
        ("OCCCCBr", None, "an alcohol without a base hardly attacks"),
        ("CC(=O)NCCCCBr", 10.3, "an amide is no amine"),
        ("COCCCCBr", 15.7, "an ether has no proton to lose"),
        ("CCCCBr", 15.7, "nothing there attacks"),
        ("NCCCCCCCCBr", 10.3, "nine members"),
        ("N[C@H]1CC[C@@H](Br)CC1", 10.3, "a bridge"),
    ],
)
def test_what_does_not_attack_from_within(smiles: str, pkah: float | None, why: str) -> None:
    assert closure_of(smiles, pkah) is None, why


def test_a_ring_closes_beside_an_azide_that_was_brought() -> None:
    profile = ConditionProfile(
        reagent_classes=frozenset({"azide"}), nucleophile_class="azide", temperature_c=25.0, **NITRILE  # type: ignore[arg-type]
    )  # fmt: skip
    found = asked("NCCCCBr.[N-]=[N+]=[N-]>>NCCCCN=[N+]=[N-]", profile)
    kinds = {c.kind for c in found.channels if c.share.mean > 0.05}
    assert "closure" in kinds


def test_a_fused_ring_is_read_by_its_faces() -> None:
    trans = Chem.MolFromSmiles(TRANS)
    flipped = Chem.MolFromSmiles(TRANS.replace("@@", "?").replace("@", "@@").replace("?", "@"))
    for mol in (trans, flipped):
        centre, leaving = mol.GetSubstructMatch(Chem.MolFromSmarts("[CX4][Br]"))
        closure = find_closure(mol, centre, leaving, 15.7)
        assert closure is not None and closure.is_aligned is True
    cis = Chem.MolFromSmiles(CIS)
    centre, leaving = cis.GetSubstructMatch(Chem.MolFromSmarts("[CX4][Br]"))
    closure = find_closure(cis, centre, leaving, 15.7)
    assert closure is not None and closure.is_aligned is False


# Other sanities ---------------------------------------------------------------------------------------------------


def test_a_tertiary_alcohol_with_thionyl_chloride_and_pyridine_leans_to_alkene() -> None:
    # Common practice: SOCl2 or POCl3 with pyridine dehydrates tertiary alcohols.
    facts = {"base_pkah": 5.2, "temperature_c": 0.0}
    for solvent in ({}, {"solvent_classes": frozenset({"chlorinated", "weakly-polar"}), "has_unknown_solvent": False}):
        profile = ConditionProfile(
            reagent_classes=frozenset({"thionyl_chloride", "aromatic_amine_base"}), **facts, **solvent  # type: ignore[arg-type]
        )
        found = asked("CCC(C)(C)O", profile)
        assert found.fates[0][0] is Fate.ELIMINATION
        substituted = dict(found.fates)[Fate.SUBSTITUTION]
        assert substituted.mean < 0.45
        assert substituted.high > 0.05, "what the activated species does is not known well"
    primary = ConditionProfile(
        reagent_classes=frozenset({"thionyl_chloride", "aromatic_amine_base"}), **facts  # type: ignore[arg-type]
    )
    assert asked("CCCCO", primary).fates[0][0] is Fate.SUBSTITUTION


def test_the_leaving_scale_repeats_the_textbook() -> None:
    # Solomons, Organic Chemistry: F 1, Cl 200, Br 10 000, I 30 000, OTs 60 000.
    scale = leaving_scale()
    assert scale["fluoride"] == 0
    for group, times in (("chloride", 200), ("bromide", 10_000), ("iodide", 30_000), ("tosylate", 60_000)):
        assert 10 ** scale[group] == pytest.approx(times, rel=0.05)
    assert scale["triflate"] > scale["tosylate"] > scale["mesylate"] > scale["iodide"]


def test_a_closure_takes_part_in_the_competition() -> None:
    step = asked(TRANS, HYDROXIDE).step
    assert step is not None
    plain = StepFacts(centre=step.centre, leaving_group=step.leaving_group, medium=step.medium)
    share = compete(plain).share_of(Fate.SUBSTITUTION)
    assert share is not None and share.mean < 0.5
