"""Cautions say a thing once, say it where it applies, and read the vessel's words as meant.

Source: common practice and arithmetic; hydrogen sulfide: WISER, National Library of Medicine (excerpt read). Invented
mixtures, none to be tried.
"""

from __future__ import annotations

import dataclasses

import pytest

from kb.assess.caution import drop_told, find_cautions
from kb.assess.caution_mixture import is_vessel_closed
from kb.assess.caution_table import load_cautions
from kb.assess.liability import all_rules, find_liabilities
from kb.book.plan_words import plan_from_words
from kb.materials.names import find_material
from kb.record.finding import Evidence, Finding
from kb.store.derivation import account_of_plan
from kb.vocabulary import Severity


def found(scheme: str, **words: object) -> tuple[tuple[Finding, ...], tuple[Finding, ...]]:
    """Return liabilities and cautions."""
    plan = plan_from_words({"scheme": scheme, **words})
    account = account_of_plan(plan)
    liabilities = find_liabilities(reading=account.reading, fragments=account.fragments, profile=account.profile)
    cautions = find_cautions(
        reading=account.reading,
        fragments=account.fragments,
        profile=account.profile,
        conditions=plan.conditions,
        products=account.products,
    )
    return liabilities, cautions


def cautions(scheme: str, **words: object) -> dict[str, Finding]:
    return {f.rule_id: f for f in found(scheme, **words)[1]}


@pytest.mark.parametrize(
    ("vessel", "is_closed"),
    [
        ("sealed tube, no reflux condenser", True),
        ("no condenser, sealed", True),
        ("sealed tube with a condenser above it", True),
        ("flask with condenser", False),
        ("flask, not sealed, bubbler", False),
        ("never closed, vented", False),
        ("flask without a condenser", None),
        ("unsealed vial", None),
        ("reflux condenser, atmospheric pressure", False),
        ("pressure tube", True),
        ("flask in a closed fume hood", None),
        ("round-bottomed flask", None),
    ],
)
def test_closed_words_win_and_negated_words_say_nothing(vessel: str, is_closed: bool | None) -> None:
    assert is_vessel_closed(vessel) is is_closed


def test_a_sealed_tube_without_a_condenser_keeps_the_pressure_caution() -> None:
    hot = cautions("CCCCBr", solvents="DCM", temperature="100C", vessel="sealed tube, no reflux condenser")
    assert hot["hazard-pressure"].severity is Severity.SERIOUS


@pytest.mark.parametrize(
    "words",
    [
        {"scheme": "CCCBr>>CCCS", "reagents": ["NaSH"], "acids": ["HCl 37%"], "solvents": "water"},
        {"scheme": "CCCBr>>CCCS", "reagents": ["Na2S"], "acids": ["AcOH"], "solvents": "water"},
        {"scheme": "CCCBr.[SH-].[Na+].Cl>>CCCS", "solvents": "water"},
        {"scheme": "CCCBr.[S-2].[Na+].[Na+].OS(=O)(=O)O>>CCCS", "solvents": "water"},
        {"scheme": "CCCBr>>CCCS", "reagents": ["NaSH"], "solvents": "ethanol", "workup": "acidified with 1 M HCl"},
    ],
)
def test_sulfide_and_acid_give_hydrogen_sulfide(words: dict[str, object]) -> None:
    finding = cautions(**words)["hazard-hydrogen-sulfide-acid"]  # type: ignore[arg-type]
    assert finding.severity is Severity.SERIOUS
    assert "qualified people decide" in finding.why
    assert finding.source


@pytest.mark.parametrize(
    ("salt", "acid", "rule"),
    [
        ("NaCN", "AcOH", "hazard-cyanide-acid"),
        ("NaCN=2", "HCl=1", "hazard-cyanide-acid"),
        ("NaCN", "PPTS", "hazard-cyanide-acid"),
        ("NaSH=3", "HCl=1", "hazard-hydrogen-sulfide-acid"),
        ("NaN3=3", "AcOH=1", "hazard-azide-acid"),
        ("NaN3=3", "HCl=1", "hazard-azide-acid"),
    ],
)
def test_an_acid_that_the_salt_takes_up_frees_the_gas_all_the_same(salt: str, acid: str, rule: str) -> None:
    assert not cautions("CCCBr", reagents=[salt, acid], solvents="water")[rule].is_uncertain


def test_sulfide_without_acid_is_told_as_a_caution_and_a_thiol_is_not() -> None:
    plain = cautions("CCCBr>>CCCS", reagents=["NaSH"], solvents="DMF", workup="water, ethyl acetate")
    assert plain["hazard-sulfide"].severity is Severity.CAUTION
    assert "hazard-hydrogen-sulfide-acid" not in plain
    thiol = cautions("CCCBr.CCS>>CCCSCC", bases=["K2CO3"], solvents="DMF", workup="1 M HCl")
    assert not {"hazard-sulfide", "hazard-hydrogen-sulfide-acid"} & set(thiol)


@pytest.mark.parametrize(
    ("smiles", "is_energetic"),
    [
        ("O=C1CCC(=O)N1Br", False),
        ("O=C1CCC(=O)N1Cl", False),
        ("CC(=O)NBr", False),
        ("CN(C)Cl", True),
        ("ClN(Cl)Cl", True),
    ],
)
def test_an_n_haloimide_is_not_energetic_and_a_chloramine_is(smiles: str, is_energetic: bool) -> None:
    assert ("hazard-energetic-group" in cautions(f"CCCCO.{smiles}")) is is_energetic


@pytest.mark.parametrize(
    ("acid", "told", "word"),
    [
        ("AlCl3", "hazard-aluminium-titanium-halide", "luminium"),
        ("TiCl4", "hazard-aluminium-titanium-halide", "itanium"),
        ("BBr3", "hazard-boron-tribromide", "Boron"),
    ],
)
def test_a_metal_halide_is_called_by_its_name(acid: str, told: str, word: str) -> None:
    found_here = cautions("CCOC", reagents=[acid], solvents="toluene")
    assert [i for i in found_here if i.endswith(("halide", "bromide"))] == [told]
    assert word in found_here[told].title


@pytest.mark.parametrize(
    ("words", "rule", "told"),
    [
        (
            {"scheme": "CCCCBr>>CCCCN=[N+]=[N-]", "reagents": ["NaN3"], "solvents": "DCM", "temperature": "25C"},
            "strong-base-or-azide-in-chlorinated-solvent",
            "hazard-azide-halogenated-solvent",
        ),
        (
            {"scheme": "CCCCBr.OCC>>CCCCOCC", "bases": ["NaH"], "solvents": "DMF", "temperature": "60C"},
            "metal-hydride-in-dipolar-aprotic-heat",
            "hazard-hydride-dipolar-solvent-warm",
        ),
    ],
)
def test_what_a_caution_tells_as_strongly_the_liability_does_not_tell_again(
    words: dict[str, object], rule: str, told: str
) -> None:
    liabilities, hazards = found(**words)  # type: ignore[arg-type]
    assert rule in {f.rule_id for f in liabilities}
    assert told in {f.rule_id for f in hazards}
    left = drop_told(liabilities, hazards)
    assert {f.rule_id for f in liabilities} - {f.rule_id for f in left} == {rule}
    assert drop_told(liabilities, ()) == liabilities


def test_a_liability_stays_where_the_caution_is_weaker_or_the_book_holds_losses() -> None:
    strong, hazards = found("CCCCBr", bases=["KOH"], solvents="DCM", temperature="25C")
    assert "hazard-chlorinated-strong-base" in {f.rule_id for f in hazards}  # a caution; the rule is serious
    assert drop_told(strong, hazards) == strong
    azide, told = found("CCCCBr", reagents=["NaN3"], solvents="DCM")
    lost = tuple(dataclasses.replace(f, evidence=Evidence(lost=2, survived=0)) for f in azide)
    assert drop_told(lost, told) == lost


def test_every_caution_that_a_rule_names_is_in_the_table() -> None:
    known = {rule.rule_id for rule in load_cautions().rules}
    named = {name for rule in all_rules() for name in rule.also_caution}
    assert named
    assert named <= known


@pytest.mark.parametrize(
    ("solvent", "temperature", "scale", "is_told"),
    [
        ("DCM", "0C", None, False),
        ("DCM", "25C", None, False),
        ("DCM", "30C", None, True),
        ("DCM", "40C", None, True),
        ("DCM", "0C", "500 mmol", True),
        ("diethyl ether", "0C", None, False),
        ("diethyl ether", "25C", None, True),
        ("DCM", None, None, False),
    ],
)
def test_a_low_boiling_solvent_is_told_of_near_its_boiling_point_or_on_scale(
    solvent: str, temperature: str | None, scale: str | None, is_told: bool
) -> None:
    told = cautions("CCCCBr", solvents=solvent, temperature=temperature, scale=scale)
    assert ("hazard-low-boiling-solvent" in told) is is_told


def test_fire_is_spoken_of_with_ether_and_not_with_dichloromethane() -> None:
    ether = cautions("CCCCBr", solvents="diethyl ether", temperature="35C")["hazard-low-boiling-solvent"]
    chlorinated = cautions("CCCCBr", solvents="DCM", temperature="40C")["hazard-low-boiling-solvent"]
    assert "lights" in ether.why
    assert "flame" in " ".join(ether.do_instead)
    assert "lights" not in chlorinated.why
    assert "flame" not in " ".join(chlorinated.do_instead)


@pytest.mark.parametrize(
    ("scheme", "acid", "is_told"),
    [
        ("CC(C)(C)O>>CC(C)(C)Cl", "HCl 37%", False),
        ("CC(C)(C)O", "HCl 37%", False),
        ("CC(C)(C)O>>C=C(C)C", "H2SO4", True),
        ("CC(C)(C)O", "H2SO4", True),
        ("CC(C)(C)OC(=O)CCc1ccccc1>>OC(=O)CCc1ccccc1", "TFA", True),
    ],
)
def test_a_tert_butyl_group_that_changes_its_place_gives_no_gas(scheme: str, acid: str, is_told: bool) -> None:
    assert ("hazard-gas-tert-butyl" in cautions(scheme, acids=[acid])) is is_told


def test_azobisisobutyronitrile_and_diazomethane_are_known_and_warned_of() -> None:
    initiator = find_material("AIBN").exact
    diazomethane = find_material("CH2N2").exact
    assert initiator is not None
    assert initiator.name == "azobisisobutyronitrile"
    assert diazomethane is not None
    assert diazomethane.name == "diazomethane"
    assert "hazard-azo-initiator" in cautions("CCCCBr", additives=["AIBN"], solvents="toluene")
    assert cautions("CCCC(=O)O", reagents=["diazomethane"])["hazard-diazo"].severity is Severity.SERIOUS


@pytest.mark.parametrize("text", ["AIBX", "BAIX", "XIBB"])
def test_a_short_unknown_name_is_not_offered_another_compound_that_shares_some_letters(text: str) -> None:
    assert all(offer.score >= 80 for offer in find_material(text).offers)


def test_a_source_that_was_not_opened_is_marked_so() -> None:
    rules = {rule.rule_id: rule for rule in load_cautions().rules}
    assert "(memory)" in rules["hazard-cyanide-acid"].source  # tests/data/check_values.csv, HZ28: rule from memory
    assert "(abstract read)" in rules["hazard-dmf-reactive"].source  # HZ18: abstract
    gas = cautions("CC(C)(C)OC(=O)NCC>>NCC", acids=["TFA"])["hazard-gas-tert-butyl"]
    assert "(memory)" in gas.source
