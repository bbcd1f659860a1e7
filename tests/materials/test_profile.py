"""What sets of conditions amount to, by common practice; published figures are named beside their check."""

from __future__ import annotations

from collections.abc import Sequence

import pytest
from hypothesis import given
from hypothesis import strategies as st

from kb.materials.class_names import OXIDANT_CLASSES, REAGENT_CLASSES, SOLVENT_CLASSES
from kb.materials.classes import profile_of
from kb.materials.profile import LEVELS, ConditionProfile
from kb.materials.resolving import resolve_component, resolve_solvents
from kb.quantity import parse_duration, parse_temperature
from kb.record.component import Component, SolventPart
from kb.record.conditions import Conditions
from kb.vocabulary import Role

_ROLES = {"with_": Role.REAGENT, "base": Role.BASE, "acid": Role.ACID, "add": Role.ADDITIVE}


def conditions(solvent: str = "", temp: str = "", time: str = "", atmosphere: str = "", **roles: str) -> Conditions:
    """Return conditions from words: components and solvents separated by semicolons."""
    components = [resolve_component(t.strip(), _ROLES[r]) for r, texts in roles.items() for t in texts.split(";")]
    solvents = [p for t in solvent.split(";") if t for p in resolve_solvents(t.strip())]
    return Conditions(
        components=tuple(components),
        solvents=tuple(solvents),
        temperature=parse_temperature(temp) if temp else None,
        time=parse_duration(time) if time else None,
        atmosphere=atmosphere or None,
    )


def profile(fragments: Sequence[str] = (), **words: str) -> ConditionProfile:
    return profile_of(conditions(**words), fragments)


def test_tfa_in_dichloromethane_is_strong_acid() -> None:
    found = profile(acid="TFA", solvent="DCM", temp="rt")
    assert (found.acidity, found.acid_name, found.ionising) == ("strong", "trifluoroacetic acid", True)
    assert (found.temperature_c, found.water, found.base_pkah) == (22, False, None)
    assert found.solvent_classes == {"chlorinated", "weakly-polar"}


def test_azide_in_dmf_is_a_good_nucleophile_in_a_dipolar_aprotic_solvent() -> None:
    found = profile(with_="NaN3", solvent="DMF", temp="80C")
    assert (found.nucleophile, found.nucleophile_class, found.nucleophile_name) == ("good", "azide", "sodium azide")
    assert found.swain_scott_n == 4.0  # Swain and Scott 1953 (memory)
    assert found.solvent_classes == {"amide", "polar-aprotic"}
    assert (found.acidity, found.ionising, found.halophile) == ("none", False, "none")
    assert found.permittivity == pytest.approx(38.25, rel=0.01)  # CRC via chemicals 1.5.2


def test_reflux_is_the_boiling_point_of_the_solvent() -> None:
    found = profile(base="NaOEt", solvent="EtOH", temp="reflux")
    assert found.temperature_c == pytest.approx(78.3, abs=0.2)  # chemicals 1.5.2: 78.4
    assert (found.base_bulk, found.alcohol, found.ionising) == ("unhindered", True, False)
    assert found.solvent_alkoxy == {"CCO"}


def test_reflux_of_a_mixture_is_the_lowest_boiling_point_and_unknown_without_solvent() -> None:
    assert profile(with_="NaI", solvent="THF:1; DCM:1", temp="reflux").temperature_c == pytest.approx(39.8)
    assert profile(with_="NaI", temp="reflux").temperature_c is None
    warming = profile(with_="NaI", solvent="acetone", temp="0C to reflux")
    assert (warming.temperature_low_c, warming.temperature_c) == (0, pytest.approx(56.1))


def test_carbonate_in_dmf() -> None:
    found = profile(base="K2CO3", solvent="DMF")
    assert found.reagent_classes == {"carbonate_base"}
    assert found.base_pkah == pytest.approx(10.33)  # CRC Handbook (memory)
    assert (found.base_bulk, found.acidity, found.base_name) == ("unhindered", "none", "potassium carbonate")


def test_a_hydrochloride_with_triethylamine_is_no_acid() -> None:
    for found in (
        profile(acid="HCl", base="Et3N", solvent="DCM"),
        profile(["Cl", "CCN(CC)CC", "ClCCl"]),
        profile(["Cl", "COc1ccc(CN)cc1"], base="Et3N", solvent="DMF"),
        profile(["Cl", "C1CCNCC1", "O=C([O-])[O-]", "[K+]", "[K+]"]),
    ):
        assert found.acidity == "none"
        assert found.base_pkah is not None
        assert "hydrogen_halide" not in found.reagent_classes
        assert found.ionising is False or found.has_unknown_solvent


@pytest.mark.parametrize(
    ("words", "acidity", "has_base"),
    [
        ({"acid": "HCl=3", "base": "Et3N=1"}, "strong", False),  # two thirds of the acid are left
        ({"acid": "HCl=1", "base": "Et3N=3"}, "none", True),
        ({"acid": "TFA=1.5", "base": "K2CO3=1"}, "none", True),  # carbonate takes two protons
        ({"acid": "TFA=5", "base": "K2CO3=1"}, "strong", False),
        ({"acid": "HCl", "base": "NaH"}, "none", True),  # the quench
        ({"acid": "HCl", "with_": "NaBH4"}, "none", False),
        ({"acid": "AcOH", "with_": "NaBH(OAc)3"}, "weak", False),  # reductive amination in acetic acid
        ({"acid": "AcOH", "base": "Et3N"}, "none", True),
        ({"acid": "HCl", "base": "pyridine"}, "weak", True),  # pyridinium
        ({"acid": "HCl", "base": "NaHCO3"}, "strong", True),  # reaction and work-up, two stages
        ({"acid": "TFA", "base": "NaHCO3"}, "strong", True),
        ({"acid": "TFA"}, "strong", False),
        ({"acid": "PPTS"}, "weak", False),
        ({"acid": "NH4Cl"}, "weak", False),
        ({"acid": "aq. citric acid"}, "weak", False),
        ({"acid": "HBF4"}, "strong", False),
        ({"acid": "formic acid"}, "strong", False),  # neat
        ({"acid": "formic acid", "solvent": "MeOH"}, "weak", False),
        ({"with_": "phenol"}, "none", False),
        ({"with_": "SOCl2"}, "strong", False),  # gives HCl with the alcohol
        ({"with_": "SOCl2", "base": "pyridine"}, "none", True),
        ({"with_": "AcCl", "solvent": "MeOH"}, "strong", False),
        ({"with_": "AcCl", "solvent": "DCM"}, "none", False),
    ],
)
def test_acid_and_base_are_settled(words: dict[str, str], acidity: str, has_base: bool) -> None:
    found = profile(**words)
    assert found.acidity == acidity
    assert (found.base_pkah is not None) is has_base


def test_an_acid_as_solvent_outlasts_a_little_base() -> None:
    assert profile(base="Et3N", solvent="TFA").acidity == "strong"
    assert profile(with_="NaOAc", solvent="AcOH").acidity == "weak"


@pytest.mark.parametrize(
    ("words", "is_ionising"),
    [
        ({"solvent": "MeOH"}, True),
        ({"solvent": "80% EtOH"}, True),
        ({"solvent": "aq. acetone"}, True),
        ({"solvent": "HFIP"}, True),
        ({"solvent": "tBuOH"}, False),  # Y = -3.26
        ({"solvent": "DMF"}, False),
        ({"with_": "AgNO3", "solvent": "EtOH"}, True),
        ({"with_": "BF3.OEt2", "solvent": "DCM"}, True),
        ({"acid": "H2SO4", "solvent": "DCM"}, True),
        ({"base": "NaOMe", "solvent": "MeOH"}, False),  # strong base, good nucleophile
        ({"with_": "NaN3", "solvent": "MeOH"}, False),  # good nucleophile
        ({"with_": "NaBH4", "solvent": "MeOH"}, False),
        ({"base": "KOtBu", "solvent": "THF"}, False),
    ],
)
def test_ionising_conditions(words: dict[str, str], is_ionising: bool) -> None:
    assert profile(**words).ionising is is_ionising


@pytest.mark.parametrize(
    ("words", "expected"),
    [
        ({"with_": "PPh3; DIAD; benzoic acid"}, {"mitsunobu", "carboxylate"}),
        ({"with_": "PPh3; CBr4"}, {"appel"}),
        ({"with_": "Zn", "solvent": "AcOH"}, {"zinc_acid"}),
        ({"with_": "TMSCl; NaI", "solvent": "MeCN"}, {"silyl_iodide", "hbr_or_tmsi"}),
        ({"with_": "NaBr", "acid": "H2SO4"}, {"hydrogen_bromide", "hydrogen_halide", "hbr_or_tmsi"}),
        ({"with_": "phenol", "base": "K2CO3"}, {"phenoxide"}),
        ({"with_": "thiophenol", "base": "Et3N"}, {"thiolate"}),
        ({"with_": "imidazole", "base": "NaH"}, {"azolide"}),
        ({"with_": "diethyl malonate", "base": "NaOEt"}, {"stabilised_carbanion", "enolate"}),
        ({"with_": "benzyl alcohol", "base": "NaH"}, {"alkoxide"}),
        ({"with_": "oxalyl chloride", "add": "DMSO", "solvent": "DCM"}, {"activated_dmso", "oxidant"}),
        ({"acid": "HBr"}, {"hydrogen_halide", "hydrogen_bromide", "hbr_or_tmsi"}),
        ({"base": "KOtBu"}, {"alkoxide", "tertiary_alkoxide"}),
        ({"with_": "benzylamine"}, {"primary_amine", "amine"}),
    ],
)
def test_pairs_and_wider_words_are_added(words: dict[str, str], expected: set[str]) -> None:
    assert expected <= profile(**words).reagent_classes


def test_imidazole_is_not_deprotonated_by_carbonate() -> None:
    assert "azolide" not in profile(with_="imidazole", base="K2CO3").reagent_classes
    assert "phenoxide" not in profile(with_="phenol").reagent_classes


@pytest.mark.parametrize(
    ("words", "fact", "value"),
    [
        ({"with_": "H2; Pd/C", "solvent": "MeOH"}, "hydrogenolysis", True),
        ({"with_": "Pd/C", "solvent": "MeOH", "atmosphere": "H2 (balloon)"}, "hydrogenolysis", True),
        ({"with_": "Pd/C; ammonium formate", "solvent": "MeOH"}, "hydrogenolysis", True),
        ({"with_": "Pd/C", "solvent": "MeOH"}, "hydrogenolysis", None),
        ({"with_": "NaBH4", "solvent": "MeOH"}, "hydrogenolysis", False),
        ({"with_": "Na; NH3"}, "dissolving_metal", True),
        ({"with_": "Na", "solvent": "EtOH"}, "dissolving_metal", None),
        ({"with_": "NaN3", "solvent": "DMF"}, "dissolving_metal", False),
        ({"base": "n-BuLi (2.5 M in hexanes)", "solvent": "THF"}, "organometallic", True),
        ({"with_": "NaBH4", "solvent": "MeOH"}, "hydride", "mild"),
        ({"with_": "LiAlH4", "solvent": "THF"}, "hydride", "strong"),
        ({"base": "NaH", "solvent": "DMF"}, "hydride", "none"),
        ({"with_": "TBAF", "solvent": "THF"}, "fluoride", True),
        ({"with_": "mCPBA", "solvent": "DCM"}, "peroxide", True),
        ({"with_": "AlCl3", "solvent": "DCM"}, "lewis_acid", "strong"),
        ({"with_": "MgBr2", "solvent": "THF"}, "lewis_acid", "mild"),
        ({"with_": "Hg(OAc)2", "solvent": "THF; water"}, "halophile", "mercury"),
        ({"with_": "CuI", "solvent": "DMF"}, "metal_catalyst", True),
        ({"with_": "NaN3", "solvent": "DMF", "time": "overnight"}, "prolonged", True),
        ({"with_": "NaN3", "solvent": "DMF", "time": "12 h"}, "prolonged", False),
        ({"base": "aq. NaOH", "solvent": "THF"}, "water", True),
        ({"acid": "HCl in MeOH", "solvent": "DCM"}, "alcohol", True),
        ({"acid": "HCl in MeOH", "solvent": "DCM"}, "permittivity", 8.9),
        ({"acid": "4 M HCl in dioxane"}, "water", False),
        ({"acid": "4 M HCl in dioxane"}, "bp_c", 101.2),
        ({"acid": "conc. HCl", "solvent": "MeOH"}, "water", True),
        ({"with_": "NaN3"}, "water", None),  # no solvent recorded
        ({"with_": "LiAlH4", "solvent": "THF"}, "alcohol", False),
    ],
)
def test_single_facts(words: dict[str, str], fact: str, value: object) -> None:
    assert getattr(profile(**words), fact) == value


def test_oxidants_are_named() -> None:
    assert profile(with_="mCPBA").oxidants == {"peracid"}
    assert profile(with_="DDQ").oxidants == {"ddq"}
    assert profile(with_="NaN3").oxidants == frozenset()


def test_the_nucleophile_meant_is_not_the_catalyst_or_the_base() -> None:
    assert profile(with_="benzylamine", add="TBAI", base="K2CO3").nucleophile_class == "primary_amine"
    assert profile(with_="NaN3", add="NaI").nucleophile_class == "azide"
    assert profile(with_="phthalimide", base="DBU").nucleophile_class == "imide_anion"
    assert profile(with_="PPh3; DIAD; phenol").nucleophile_class == "phenoxide"
    assert profile(base="NaOEt", solvent="EtOH").nucleophile_class == "alkoxide"
    assert profile(solvent="MeOH").nucleophile_class == "alcohol"
    assert profile(base="NaH", solvent="DMF").nucleophile == "none"


def test_a_scheme_says_what_is_not_recorded() -> None:
    fragments = ["[K+]", "[K+]", "O=C([O-])[O-]", "CN(C)C=O", "Oc1ccc(F)cc1"]
    found = profile(fragments)
    assert {"carbonate_base", "phenol", "phenoxide"} <= found.reagent_classes
    assert (found.nucleophile_class, found.base_pkah) == ("phenoxide", 10.33)
    assert "amide" in found.solvent_classes
    assert not found.has_unknown_reagent
    assert not found.has_unknown_solvent


def test_what_is_recorded_and_drawn_counts_once() -> None:
    recorded = profile(base="K2CO3=2", solvent="DMF")
    both = profile(["[K+]", "[K+]", "O=C([O-])[O-]", "CN(C)C=O"], base="K2CO3=2", solvent="DMF")
    assert both == recorded


def test_salts_come_apart_and_are_known_as_ions() -> None:
    assert profile(["[Na+]", "[N-]=[N+]=[N-]"]).nucleophile_class == "azide"
    assert profile(["[H-]", "[Na+]"]).reagent_classes == {"metal_hydride"}
    alanate = profile(["[H-]", "[H-]", "[H-]", "[H-]", "[Al+3]", "[Li+]"])
    assert (alanate.hydride, alanate.lewis_acid) == ("strong", "none")
    assert profile(["[Ag+]", "F[B-](F)(F)F"]).halophile == "silver"


def test_fragments_may_be_mapped_or_written_in_any_way() -> None:
    assert profile(["[NH2:5][CH2:6][c:7]1[cH:8][cH:9][cH:10][cH:11][cH:12]1"]) == profile(["NCc1ccccc1"])


def test_nothing_recorded_is_not_nothing_there() -> None:
    found = profile_of(Conditions())
    assert found == ConditionProfile()
    assert (found.acidity, found.water, found.organometallic, found.ionising) == (None, None, None, None)


def test_an_unknown_component_leaves_its_absences_open() -> None:
    mystery = Component(role=Role.REAGENT, name="powder from the back of the shelf")
    found = profile_of(Conditions(components=(mystery,), solvents=(SolventPart(name="DMF"),)))
    assert found.has_unknown_reagent
    assert (found.acidity, found.fluoride, found.nucleophile, found.halophile) == (None, None, None, None)
    acid = Component(role=Role.ACID, name="TFA")
    with_acid = profile_of(Conditions(components=(mystery, acid)))
    assert with_acid.acidity == "strong"  # a find stands whatever else is unknown
    base = Component(role=Role.BASE, name="NaH")
    assert profile_of(Conditions(components=(mystery, base))).acidity == "none"  # no acid lasts beside it


def test_an_unknown_solvent_is_said() -> None:
    odd = profile_of(Conditions(solvents=(SolventPart(name="mother liquor"),)))
    assert odd.has_unknown_solvent
    assert odd.permittivity is None
    assert odd.water is None


def test_mixtures_are_averaged_by_volume_and_aqueous_ones_have_a_y() -> None:
    mixture = profile(solvent="THF:1; DMF:1")
    assert mixture.permittivity == pytest.approx((7.5 + 38.3) / 2)
    assert mixture.winstein_y is None
    assert profile(solvent="EtOH:80; water:20").winstein_y == 0.0  # by definition of the scale
    assert profile(solvent="80% EtOH").winstein_y == 0.0
    assert profile(solvent="50% EtOH").winstein_y == pytest.approx(1.66)  # Fainberg and Winstein 1956 (memory)
    assert -0.75 < (profile(solvent="85% EtOH").winstein_y or 9) < 0.0
    assert profile(solvent="aq. EtOH").winstein_y is None  # shares not recorded


def test_y_falls_as_the_water_goes() -> None:
    values = [profile(solvent=f"{percent}% acetone").winstein_y for percent in (25, 40, 50, 60, 70, 80, 90)]
    assert None not in values
    assert values == sorted(values, key=lambda y: -(y or 0.0))


@given(st.lists(st.text(max_size=30), max_size=4))
def test_any_fragments_give_a_profile(fragments: list[str]) -> None:
    found = profile_of(Conditions(), fragments)
    assert found.reagent_classes <= REAGENT_CLASSES.keys()


_NAMES = ["TFA", "HCl", "Et3N", "K2CO3", "NaN3", "NaH", "KOtBu", "PPh3", "DIAD", "Pd/C", "NaBH4", "AgNO3", "AcOH"]


@given(
    st.lists(st.sampled_from(_NAMES), max_size=4),
    st.lists(st.sampled_from(["DMF", "DCM", "MeOH", "water", "TFA", "pyridine"]), max_size=2, unique=True),
)
def test_every_profile_keeps_to_the_vocabulary(names: list[str], solvents: list[str]) -> None:
    made = Conditions(
        components=tuple(Component(role=Role.REAGENT, name=n) for n in names),
        solvents=tuple(SolventPart(name=n) for n in solvents),
    )
    found = profile_of(made)
    assert found.reagent_classes <= REAGENT_CLASSES.keys()
    assert found.solvent_classes <= SOLVENT_CLASSES.keys()
    assert found.oxidants <= OXIDANT_CLASSES
    for fact, levels in LEVELS.items():
        assert getattr(found, fact) in (None, *levels)
    assert not (found.acidity == "strong" and found.ionising is False)
    assert profile_of(Conditions(components=made.components[::-1], solvents=made.solvents)).acidity == found.acidity
