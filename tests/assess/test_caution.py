"""Hazards: every hazard row of the published check values warns, with consequence, source and deference.

Source: `tests/data/check_values.csv`, rows HZ01 to HZ36 (named there row by row); azide ratios and gas volumes are
arithmetic; the usual hazards beyond the rows are common practice. Invented mixtures, none to be tried.
"""

from __future__ import annotations

import csv
from pathlib import Path

import pytest
from conditions_by_hand import a_profile
from rdkit import Chem

from kb.assess.caution import find_cautions
from kb.assess.caution_checks import azide_ratio, pressure_bar
from kb.assess.caution_table import load_cautions
from kb.assess.liability_rule import compile_motif
from kb.chem.facts import Reading
from kb.materials.profile import ConditionProfile
from kb.record.component import Component, SolventPart
from kb.record.conditions import Conditions
from kb.record.finding import Finding
from kb.vocabulary import Confidence, FindingKind, Role, Severity

VALUES = Path(__file__).parents[1] / "data" / "check_values.csv"
with VALUES.open(encoding="utf-8", newline="") as lines:
    HAZARDS = {row["id"]: row for row in csv.DictReader(lines) if row["id"].startswith("HZ")}
SERIOUS, CAUTION, NOTE = Severity.SERIOUS, Severity.CAUTION, Severity.NOTE


def cautions(
    facts: str = "",
    *fragments: str,
    products: tuple[str, ...] = (),
    profile: ConditionProfile | None = None,
    **conditions: object,
) -> tuple[Finding, ...]:
    return find_cautions(
        reading=Reading(scheme="", ok=True, confidence=Confidence.INFERRED),
        fragments=fragments,
        profile=profile or a_profile(facts),
        conditions=Conditions(**conditions),  # type: ignore[arg-type]
        products=products,
    )


def by_id(findings: tuple[Finding, ...]) -> dict[str, Severity]:
    return {f.rule_id: f.severity for f in findings}


ROWS = [
    # row, facts, fragments, conditions, rule, least severity ("forbid" in the row is serious, "warn" is caution)
    ("HZ10", "reagent=azide; solvent=chlorinated", ("ClCCl",), {}, "hazard-azide-halogenated-solvent", SERIOUS),
    (
        "HZ10",
        "reagent=azide; solvent=amide",
        (),
        {"workup": "extracted with DCM"},
        "hazard-azide-halogenated-solvent",
        SERIOUS,
    ),
    ("HZ11", "reagent=azide; acidity=strong", (), {}, "hazard-azide-strong-acid", SERIOUS),
    ("HZ11", "reagent=azide; acidity=none", (), {"workup": "1 M HCl"}, "hazard-azide-acid", CAUTION),
    ("HZ12", "reagent=azide+copper", (), {}, "hazard-azide-metals", SERIOUS),
    ("HZ12", "reagent=azide+halogen", (), {}, "hazard-azide-metals", SERIOUS),
    ("HZ12", "reagent=azide+dialkyl_sulfate", (), {}, "hazard-azide-metals", SERIOUS),
    ("HZ12", "reagent=azide; solvent=thio", (), {}, "hazard-azide-metals", SERIOUS),
    ("HZ12", "reagent=azide", ("O[N+](=O)[O-]",), {}, "hazard-azide-metals-drawn", SERIOUS),
    ("HZ12", "reagent=azide", ("CC(=O)[O-].CC(=O)[O-].[Pb+2]",), {}, "hazard-azide-metals-drawn", SERIOUS),
    (
        "HZ13",
        "reagent=metal_hydride; solvent=sulfoxide; temperature_c=20",
        (),
        {},
        "hazard-hydride-dipolar-solvent",
        CAUTION,
    ),
    (
        "HZ14",
        "reagent=metal_hydride; solvent=amide; temperature_c=20",
        (),
        {},
        "hazard-hydride-dipolar-solvent",
        CAUTION,
    ),
    (
        "HZ14",
        "reagent=metal_hydride; solvent=amide; temperature_c=20",
        (),
        {"scale_mmol": 200.0},
        "hazard-hydride-dipolar-solvent-scale",
        SERIOUS,
    ),
    (
        "HZ15",
        "reagent=metal_hydride; solvent=amide; temperature_c=60",
        (),
        {},
        "hazard-hydride-dipolar-solvent-warm",
        SERIOUS,
    ),
    ("HZ16", "reagent=acyl_halide; solvent=sulfoxide; temperature_c=20", (), {}, "hazard-dmso-reactive", CAUTION),
    ("HZ16", "solvent=sulfoxide; temperature_c=130", (), {}, "hazard-dmso-reactive", CAUTION),
    ("HZ16", "solvent=sulfoxide; temperature_c=25; acidity=strong", (), {}, "hazard-dmso-reactive", CAUTION),
    ("HZ16", "solvent=sulfoxide; temperature_c=25", ("CCCCBr",), {}, "hazard-dmso-electrophile", NOTE),
    (
        "HZ17",
        "solvent=sulfoxide; temperature_c=100",
        (),
        {"vessel": "sealed tube"},
        "hazard-dmso-closed-vessel",
        SERIOUS,
    ),
    ("HZ18", "solvent=amide; acidity=strong", (), {}, "hazard-dmf-reactive", CAUTION),
    ("HZ18", "solvent=amide; reagent=alkoxide; base_pkah=17", (), {}, "hazard-dmf-reactive", CAUTION),
    ("HZ18", "solvent=amide; reagent=thionyl_chloride", (), {}, "hazard-dmf-reactive", CAUTION),
    (
        "HZ19",
        "solvent=chlorinated; reagent=hydroxide; base_pkah=15.7",
        ("ClC(Cl)Cl",),
        {},
        "hazard-chloroform-base",
        SERIOUS,
    ),
    (
        "HZ19",
        "solvent=chlorinated+ketone; reagent=carbonate_base; base_pkah=10.3",
        ("ClC(Cl)Cl", "CC(C)=O"),
        {},
        "hazard-chloroform-base",
        SERIOUS,
    ),
    ("HZ19", "solvent=chlorinated; reagent=sodium", ("ClC(Cl)Cl",), {}, "hazard-chloroform-base", SERIOUS),
    ("HZ28", "reagent=cyanide; acidity=weak", (), {}, "hazard-cyanide-acid", SERIOUS),
    ("HZ29", "reagent=hydrazine", (), {}, "hazard-hydrazine", CAUTION),
    ("HZ29", "reagent=hydrazine+permanganate", (), {}, "hazard-hydrazine-oxidant", SERIOUS),
    ("HZ30", "", ("CI",), {}, "hazard-volatile-alkylator", CAUTION),
    ("HZ31", "", ("COS(=O)(=O)OC",), {}, "hazard-dialkyl-sulfate", SERIOUS),
    ("HZ32", "", ("[O-]Cl(=O)(=O)=O", "CC[N+](CC)(CC)CC"), {}, "hazard-perchlorate-organic-cation", SERIOUS),
    ("HZ32", "", ("[O-]Cl(=O)(=O)=O", "[Li+]"), {}, "hazard-perchlorate", CAUTION),
    ("HZ33", "reagent=hydroxide; base_pkah=15.7", ("C[N+](=O)[O-]",), {}, "hazard-nitroalkane-base", CAUTION),
    ("HZ33", "temperature_c=100", ("C[N+](=O)[O-]",), {"vessel": "closed"}, "hazard-nitroalkane-confined", SERIOUS),
    ("HZ34", "reagent=hydrogen_fluoride; fluoride=yes; acidity=weak", (), {}, "hazard-hydrogen-fluoride", SERIOUS),
    ("HZ34", "fluoride=yes; acidity=weak", (), {}, "hazard-fluoride-acid", CAUTION),
    ("HZ35", "temperature_c=100; bp_c=39.8", (), {"vessel": "microwave vial"}, "hazard-pressure", CAUTION),
    (
        "HZ36",
        "acidity=strong",
        ("CC(C)(C)OC(=O)NCc1ccccc1",),
        {"vessel": "sealed tube"},
        "hazard-gas-tert-butyl",
        SERIOUS,
    ),
]


@pytest.mark.parametrize(("row", "facts", "fragments", "conditions", "rule", "least"), ROWS)
def test_a_hazard_row_warns(
    row: str, facts: str, fragments: tuple[str, ...], conditions: dict[str, object], rule: str, least: Severity
) -> None:
    assert row in HAZARDS
    severities = by_id(cautions(facts, *fragments, **conditions))
    assert rule in severities, severities
    assert severities[rule].rank >= least.rank


AZIDES = [r for r in HAZARDS.values() if r["id"] in {f"HZ0{i}" for i in range(2, 10)}]


@pytest.mark.parametrize("row", AZIDES, ids=lambda r: r["id"])
def test_the_azide_ratio_is_the_published_arithmetic(row: dict[str, str]) -> None:
    ratio = azide_ratio(Chem.MolFromSmiles(row["substrate_smiles"]))
    assert ratio == pytest.approx(float(row["value"]), abs=0.001)


@pytest.mark.parametrize(
    ("smiles", "severity"),
    [
        ("CCCCCCCCCN=[N+]=[N-]", NOTE),
        ("CCCCCCCCN=[N+]=[N-]", CAUTION),
        ("[N-]=[N+]=NCc1ccccc1", CAUTION),
        ("CN=[N+]=[N-]", SERIOUS),
        ("[N-]=[N+]=NCN=[N+]=[N-]", SERIOUS),
        ("Cc1ccc(S(=O)(=O)N=[N+]=[N-])cc1", SERIOUS),  # passes by arithmetic (3.0), overridden
        ("CCCCCCCCCCCC(=O)N=[N+]=[N-]", SERIOUS),  # acyl azide, overridden
        ("CCCCCCCCCc1ccc(N=[N+]=[N-])cc1", CAUTION),  # aryl azide, overridden
    ],
)
def test_an_organic_azide_is_judged_by_ratio_and_override(smiles: str, severity: Severity) -> None:
    (finding,) = [f for f in cautions("", "CCBr", products=(smiles,)) if f.rule_id == "hazard-organic-azide"]
    assert finding.severity is severity
    assert "does not prove" in finding.why
    drawn = [f for f in cautions("", smiles) if f.rule_id == "hazard-organic-azide"]
    assert drawn[0].component == 0
    assert len(drawn[0].atoms) >= 4


@pytest.mark.parametrize("row", [r for r in HAZARDS.values() if 20 <= int(r["id"][2:]) <= 27], ids=lambda r: r["id"])
def test_a_peroxide_former_is_told_with_its_class_and_months(row: dict[str, str]) -> None:
    solvent = SolventPart(name="it", smiles=Chem.CanonSmiles(row["substrate_smiles"]))
    (finding,) = [f for f in cautions("", solvents=(solvent,)) if f.rule_id.startswith("hazard-peroxide-former")]
    published = row["value"][0]
    months = row["uncertainty_or_range"].split("within ")[1].split()[0]
    assert f"class {published}" in finding.title
    assert f"{months} months" in finding.why
    assert finding.severity is (CAUTION if published == "A" else NOTE)


def test_dichloromethane_at_100_degrees_is_about_five_and_a_half_bar() -> None:
    assert pressure_bar(39.8, 100.0) == pytest.approx(5.5, abs=0.15)  # HZ35
    assert pressure_bar(100.0, 100.0) == pytest.approx(1.013, abs=0.001)


def test_an_open_vessel_has_no_pressure() -> None:
    hot = a_profile("temperature_c=100; bp_c=39.8")
    assert "hazard-pressure" not in by_id(cautions(profile=hot, vessel="flask with condenser"))
    assert by_id(cautions(profile=hot))["hazard-pressure"] is CAUTION


@pytest.mark.parametrize(
    ("fragment", "product", "facts", "litres"),
    [
        ("CC(C)(C)OC(=O)NCc1ccccc1", "NCc1ccccc1", "acidity=strong", "4.9 L"),
        ("CC(C)(C)OC(=O)Cc1ccccc1", "OC(=O)Cc1ccccc1", "acidity=strong", "2.5 L"),
        ("CC(C)(C)OC(=O)NCC(=O)OC(C)(C)C", "NCC(=O)OC(C)(C)C", "acidity=strong", "4.9 L"),
        ("CC(C)(C)OC(=O)N(CC)C(=O)OC(C)(C)C", "", "acidity=strong", "9.8 L"),
    ],
)
def test_gas_is_reckoned_at_24_5_litres_a_mole(fragment: str, product: str, facts: str, litres: str) -> None:
    found = cautions(facts, fragment, products=(product,) if product else (), scale_mmol=100.0)
    (finding,) = [f for f in found if f.rule_id == "hazard-gas-tert-butyl"]
    assert litres in finding.why


def test_no_gas_where_nothing_is_lost() -> None:
    boc = "CC(C)(C)OC(=O)NCCBr"
    assert "hazard-gas-tert-butyl" not in by_id(cautions("acidity=none", boc))
    assert "hazard-gas-tert-butyl" not in by_id(cautions("acidity=strong", boc, products=("CC(C)(C)OC(=O)NCCO",)))


@pytest.mark.parametrize(
    ("facts", "fragments", "rule"),
    [
        ("reagent=azide; solvent=amide; acidity=none", ("CCBr",), "hazard-azide-acid"),
        ("reagent=azide; solvent=amide", ("CCCCCCCCl",), "hazard-azide-halogenated-drawn"),
        ("reagent=metal_hydride; solvent=thf; temperature_c=60", (), "hazard-hydride-dipolar-solvent"),
        ("reagent=cyanide; acidity=none", (), "hazard-cyanide-acid"),
        ("reagent=carbonate_base; base_pkah=10.3; solvent=chlorinated", ("ClC(Cl)Cl",), "hazard-chloroform-base"),
        ("solvent=sulfoxide; temperature_c=60; reagent=azide", (), "hazard-dmso-reactive"),
        ("solvent=amide; reagent=carbonate_base; base_pkah=10.3", (), "hazard-dmf-reactive"),
        ("fluoride=yes; acidity=none", (), "hazard-fluoride-acid"),
        ("", ("CCCCCCI",), "hazard-volatile-alkylator"),
        ("", ("OCCOCCCl",), "hazard-mustard"),
        ("", ("CC(=O)N(C)CCCl",), "hazard-mustard"),
        ("base_pkah=15.7", ("O=[N+]([O-])c1ccccc1",), "hazard-nitroalkane-base"),
        ("", ("CCO",), "hazard-energetic-group"),
    ],
)
def test_a_mixture_without_the_hazard_is_not_warned_of_it(facts: str, fragments: tuple[str, ...], rule: str) -> None:
    assert rule not in by_id(cautions(facts, *fragments))


def test_what_cannot_be_told_is_said_and_is_no_more_than_a_caution() -> None:
    unsure = a_profile("reagent=azide; solvent=amide", acidity=None, has_unknown_reagent=True)
    found = {f.rule_id: f for f in cautions(profile=unsure)}
    finding = found["hazard-azide-strong-acid"]
    assert finding.is_uncertain
    assert finding.severity is CAUTION
    assert "could not be classified" in finding.why


def test_one_group_is_told_once_the_most_severe() -> None:
    found = by_id(cautions("reagent=azide; acidity=strong; solvent=chlorinated"))
    assert "hazard-azide-strong-acid" in found
    assert "hazard-azide-acid" not in found


def test_a_component_known_by_structure_alone_counts() -> None:
    iodide = Component(role=Role.REAGENT, name="MeI", smiles="CI")
    assert "hazard-volatile-alkylator" in by_id(cautions("", components=(iodide,)))


def test_every_caution_has_consequence_source_and_defers_to_people() -> None:
    table = load_cautions()
    for rule in table.rules:
        assert rule.consequence.endswith(".")
        assert rule.do
        assert rule.source
        for motif in rule.motifs:
            compile_motif(motif)
    everything = cautions(
        "reagent=azide+copper+metal_hydride; acidity=strong; solvent=amide; temperature_c=120; bp_c=35",
        "CC(C)(C)OC(=O)NCCN=[N+]=[N-]",
        scale_mmol=500.0,
        vessel="sealed",
    )
    assert len(everything) > 6
    for finding in everything:
        assert finding.kind is FindingKind.CAUTION
        assert "local safety rules and qualified people decide" in finding.why
        assert finding.source
        assert finding.do_instead


def test_every_published_hazard_row_is_covered_by_these_tests() -> None:
    covered = {r[0] for r in ROWS} | {"HZ01"} | {r["id"] for r in AZIDES}
    covered |= {f"HZ{i}" for i in range(20, 28)}
    assert set(HAZARDS) == covered


@pytest.mark.parametrize("text", ["", "not a structure", "C1CC", "*", "[U]"])
def test_a_structure_that_cannot_be_read_stops_nothing(text: str) -> None:
    assert "hazard-cyanide" in by_id(cautions("reagent=cyanide", text, products=(text,)))
