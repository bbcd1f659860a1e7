"""From a reading and a profile to the published estimate: words translated, refusals in plain sentences."""

from __future__ import annotations

import pytest

from kb.assess.published import published_estimate, step_facts
from kb.assess.published_medium import bulk_of_smiles, medium_of
from kb.chem.facts import Reading
from kb.chem.reading import read_scheme
from kb.materials.profile import ConditionProfile
from kb.physorg.step import StepFacts
from kb.quantity import Temperature
from kb.record.component import Component, SolventPart
from kb.record.conditions import Conditions
from kb.record.plan import Plan
from kb.store.derivation import account_of_plan
from kb.vocabulary import Confidence, Fate, Role

ALCOHOL = {"solvent_classes": frozenset({"protic", "alcohol"}), "has_unknown_solvent": False, "winstein_y": -2.03}
DIPOLAR = {"solvent_classes": frozenset({"polar-aprotic", "amide"}), "has_unknown_solvent": False}


def a_profile(*classes: str, **facts: object) -> ConditionProfile:
    return ConditionProfile(reagent_classes=frozenset(classes), **facts)  # type: ignore[arg-type]


def shares(scheme: str, profile: ConditionProfile, base_smiles: str | None = None) -> dict[Fate, float]:
    reading = read_scheme(scheme)
    found = published_estimate(reading, reading.substrate or "", profile, base_smiles)
    return {fate: interval.mean for fate, interval in found.of_what_reacts}


def test_a_secondary_bromide_with_ethoxide_eliminates() -> None:
    # Hughes & Ingold, about 80 % (check rows SE07, SE08).
    profile = a_profile("alkoxide", base_pkah=15.9, base_bulk="unhindered", temperature_c=55.0, **ALCOHOL)
    assert shares("CC(C)Br", profile)[Fate.ELIMINATION] > 0.6


def test_a_secondary_mesylate_with_azide_substitutes() -> None:
    # Common practice for azide in DMF.
    profile = a_profile("azide", nucleophile_class="azide", swain_scott_n=4.0, temperature_c=60.0, **DIPOLAR)
    found = shares("CCCC(C)OS(C)(=O)=O.[N-]=[N+]=[N-]>>CCCC(C)N=[N+]=[N-]", profile)
    assert found[Fate.SUBSTITUTION] > 0.8


def test_atoms_are_counted_as_entered_not_as_canonical() -> None:
    # The canonical SMILES of the substrate starts at another atom; the estimate must not change.
    profile = a_profile("alkoxide", base_pkah=15.9, base_bulk="unhindered", temperature_c=55.0, **ALCOHOL)
    first = shares("BrC(C)CCc1ccccc1", profile)
    assert first == pytest.approx(shares("c1ccccc1CCC(C)Br", profile), abs=0.02)
    assert first


def test_bulk_is_read_from_the_base() -> None:
    # Brown & Moritani 1956: terminal alkene rises from EtO- over tBuO- and EtMe2CO- to Et3CO-.
    order = ["CC[O-]", "CC(C)(C)[O-]", "CCC(C)(C)[O-]", "CCC(CC)(CC)[O-]"]
    bulks = [bulk_of_smiles(s) for s in order]
    assert bulks[0] == 0.0
    assert bulks == sorted(bulks, key=lambda b: b or 0.0)
    assert len(set(bulks)) == 4
    assert bulk_of_smiles("CCN(CC)CC") is None
    profile = a_profile("alkoxide", "tertiary_alkoxide", base_pkah=17.0, base_bulk="hindered", **ALCOHOL)
    reading = read_scheme("CC(C)C(C)(C)Br")
    terminal = []
    for smiles in order[1:]:
        found = published_estimate(reading, reading.substrate or "", profile, smiles)
        terminal.append(next(a.of_alkenes.mean for a in found.alkenes if a.label == "C=C(C)C(C)C"))
    assert terminal == sorted(terminal)


@pytest.mark.parametrize(
    ("read", "classes", "pkah", "expected", "why"),
    [
        ("phenol", ("phenol", "carbonate_base"), 10.3, "phenoxide", "carbonate deprotonates a phenol"),
        ("thiol", ("thiol", "tertiary_amine"), 10.7, "thiolate", "triethylamine makes enough thiolate"),
        ("phenol", ("phenol",), None, "phenol", "nothing there takes the proton"),
        ("alcohol", ("alcohol", "carbonate_base"), 10.3, "alcohol", "carbonate does not deprotonate an alcohol"),
        ("imide", ("imide", "carbonate_base"), 10.3, "imide_anion", "phthalimide with carbonate"),
        ("amine", ("amine",), None, "secondary_amine", "wider word to the row that stands for it"),
        ("hydrogen_bromide", ("hydrogen_bromide",), None, "bromide", "what the acid brings"),
    ],
)
def test_the_nucleophile_after_the_base(
    read: str, classes: tuple[str, ...], pkah: float | None, expected: str, why: str
) -> None:
    medium = medium_of(a_profile(*classes, base_pkah=pkah, **DIPOLAR), read)
    assert medium.nucleophile == expected, why


def test_an_activated_alcohol_is_told_from_a_bare_one() -> None:
    bare = medium_of(a_profile("azide", acidity="none", **DIPOLAR), "azide", is_activated=True)
    active = medium_of(a_profile("mitsunobu", "azide", acidity="none", **DIPOLAR), "azide", is_activated=True)
    assert not bare.activates_hydroxyl
    assert active.activates_hydroxyl


def test_what_is_not_known_stays_so() -> None:
    medium = medium_of(ConditionProfile(has_unknown_reagent=True))
    assert medium.nucleophile is None
    assert medium.base is None
    assert medium.acid is None
    assert medium.temperature_c is None
    assert medium.is_protic is None
    assert not medium.is_complete


@pytest.mark.parametrize(
    ("scheme", "part"),
    [
        ("BrC12CC3CC(CC(C3)C1)C2", "bridgehead"),
        ("CC(C)(C)OC(=O)NCc1ccccc1>>NCc1ccccc1", "another kind"),
        ("C=CC>>CC(C)Br", "no published rates"),
        ("not a scheme", "no published rates"),
        ("C=CBr", "vinyl"),
        ("Brc1ccccc1", "aryl"),
    ],
)
def test_refusals_are_sentences_without_numbers(scheme: str, part: str) -> None:
    reading = read_scheme(scheme)
    found = published_estimate(reading, reading.substrate or "", a_profile("azide", **DIPOLAR))
    assert not found.fates
    assert part in found.note
    assert found.note.endswith(".")


def test_a_reading_that_does_not_fit_its_structure_is_refused() -> None:
    reading = read_scheme("CC(C)Br")
    centre = reading.centre
    assert centre is not None
    broken = Reading(scheme="", ok=True, confidence=Confidence.INFERRED, centres=(centre,))
    found = published_estimate(broken, "CC", a_profile("azide", **DIPOLAR))
    assert not found.fates
    assert "could not be matched" in found.note


def test_intervals_hold_their_mean_and_shares_add_up() -> None:
    reading = read_scheme("CCCC(C)Br")
    profile = a_profile("alkoxide", base_pkah=15.9, base_bulk="unhindered", **ALCOHOL)
    found = published_estimate(reading, "", profile)
    assert sum(i.mean for _, i in found.fates) == pytest.approx(1, abs=0.001)
    assert sum(i.mean for _, i in found.of_what_reacts) == pytest.approx(1, abs=0.001)
    for _, interval in (*found.fates, *found.of_what_reacts):
        assert 0 <= interval.low <= interval.mean <= interval.high <= 1
    assert found.channels and found.sources
    assert "25 °C taken" in found.note


def test_a_drawn_centre_gets_its_configuration_told() -> None:
    profile = a_profile("azide", nucleophile_class="azide", temperature_c=25.0, **DIPOLAR)
    reading = read_scheme("C[C@H](Br)CCCCCC.[N-]=[N+]=[N-]>>C[C@@H](N=[N+]=[N-])CCCCCC")
    found = published_estimate(reading, "", profile)
    assert found.stereo is not None and found.stereo.word == "inversion"
    flat = read_scheme("CC(Br)CCCCCC.[N-]=[N+]=[N-]>>CC(N=[N+]=[N-])CCCCCC")
    assert published_estimate(flat, "", profile).stereo is None


def test_step_facts_hand_over_the_ring_and_the_temperature() -> None:
    facts = step_facts(read_scheme("BrC1CCCCC1"), "", a_profile("azide", temperature_c=40.0, **DIPOLAR))
    assert isinstance(facts, StepFacts)
    assert facts.centre.ring_size == 6
    assert facts.medium.temperature_c == 40.0


def a_plan(scheme: str, temperature_c: float | None = None, solvents: tuple[str, ...] = (), **roles: str) -> Plan:
    components = tuple(Component(role=Role(role), name=name) for role, name in roles.items())
    given = None if temperature_c is None else Temperature(text="", start_c=temperature_c, end_c=temperature_c)
    return Plan(
        scheme=scheme,
        conditions=Conditions(
            components=components, solvents=tuple(SolventPart(name=s) for s in solvents), temperature=given
        ),
    )


def leading(plan: Plan) -> Fate | None:
    account = account_of_plan(plan)
    found = published_estimate(account.reading, account.facts.substrate or "", account.profile)
    return found.of_what_reacts[0][0] if found.of_what_reacts else None


@pytest.mark.parametrize(
    ("plan", "fate", "why"),
    [
        (a_plan("CCBr", 55.0, ("EtOH",), base="NaOEt"), Fate.SUBSTITUTION, "SE01"),
        (a_plan("CC(C)Br", 25.0, ("EtOH",), base="NaOEt"), Fate.ELIMINATION, "SE07"),
        (a_plan("CC(C)(C)Br", 25.0, ("EtOH",), base="NaOEt"), Fate.ELIMINATION, "SE10"),
        (a_plan("CC(C)(C)Br", 25.0, ("EtOH",)), Fate.SUBSTITUTION, "SE16"),
        (a_plan("CCCCCCCCBr", 40.0, ("tBuOH",), base="KOtBu"), Fate.ELIMINATION, "SE28"),
        (a_plan("CCCCCCCCOS(=O)(=O)c1ccc(C)cc1", 40.0, ("tBuOH",), base="KOtBu"), Fate.SUBSTITUTION, "SE29"),
        (a_plan("CCC(C)Cl", 120.0, ("DMSO",), reagent="NaCN"), Fate.SUBSTITUTION, "SE35"),
        (a_plan("CC(C)(C)C(C)O>>CC(C)=C(C)C", 80.0, acid="H3PO4"), Fate.REARRANGED, "RE02"),
        (a_plan("CC(C)C(C)O.Br>>CCC(C)(C)Br", 60.0, acid="HBr"), Fate.REARRANGED, "common practice"),
        (a_plan("CC(C)CO.Br>>CC(C)CBr", 90.0, acid="HBr"), Fate.SUBSTITUTION, "its negative control"),
        (a_plan("BrC12CC3CC(CC(C3)C1)C2", 80.0, ("DMF",), reagent="NaN3"), None, "RR23, bridgehead"),
    ],
    ids=lambda v: v if isinstance(v, str) else "",
)
def test_from_names_as_a_chemist_writes_them(plan: Plan, fate: Fate | None, why: str) -> None:
    assert leading(plan) is fate, why
