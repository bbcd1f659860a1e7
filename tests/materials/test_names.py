"""Names as chemists write them: found exactly, by synonym, by label; near ones offered and never taken."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from kb.errors import NameUnknown
from kb.materials.catalogue import Material, Reagent, Solvent, load_catalogue
from kb.materials.names import by_smiles, find_material, get_material, parse_material

CATALOGUE = load_catalogue()


@pytest.mark.parametrize(
    ("text", "name"),
    [
        ("KOtBu", "potassium tert-butoxide"),
        ("t-BuOK", "potassium tert-butoxide"),
        ("KOt-Bu", "potassium tert-butoxide"),
        ("Potassium tert-Butoxide", "potassium tert-butoxide"),
        ("potassium t-butoxide", "potassium tert-butoxide"),
        ("K2CO3", "potassium carbonate"),
        ("K₂CO₃", "potassium carbonate"),  # subscripts
        ("TFA", "trifluoroacetic acid"),
        ("DIPEA", "N,N-diisopropylethylamine"),
        ("Hünig’s base", "N,N-diisopropylethylamine"),  # typographic apostrophe
        ("iPr2NEt", "N,N-diisopropylethylamine"),
        ("NaN3", "sodium azide"),
        ("DMF", "N,N-dimethylformamide"),
        ("2-MeTHF", "2-methyltetrahydrofuran"),
        ("2-methyl THF", "2-methyltetrahydrofuran"),
        ("mCPBA", "m-chloroperbenzoic acid"),
        ("m-CPBA", "m-chloroperbenzoic acid"),
        ("BF3·OEt2", "boron trifluoride etherate"),
        ("BF3.OEt2", "boron trifluoride etherate"),
        ("PPh₃", "triphenylphosphine"),
        ("α-picoline", "2-picoline"),
        ("sulphuric acid", "sulfuric acid"),
        ("aluminum chloride", "aluminium chloride"),
        ("triethyl amine", "triethylamine"),
        # labels
        ("HCl in dioxane", "hydrogen chloride"),
        ("4 M HCl", "hydrogen chloride"),
        ("aq. NaOH", "sodium hydroxide"),
        ("60% NaH", "sodium hydride"),
        ("1 M TBAF in THF", "tetrabutylammonium fluoride"),
        ("10% Pd/C", "palladium on carbon"),
        ("dry THF", "tetrahydrofuran"),
        ("HBr/AcOH", "hydrogen bromide"),
        ("NaOAc.3H2O", "sodium acetate"),
    ],
)
def test_a_name_is_found_however_it_is_written(text: str, name: str) -> None:
    match = find_material(text)
    assert match.exact is not None
    assert match.exact.name == name
    assert get_material(text).name == name


def test_every_listed_name_finds_its_own_entry() -> None:
    lost = []
    for table, kind in ((CATALOGUE.reagents, "reagent"), (CATALOGUE.solvents, "solvent")):
        for entry in table:
            for name in (entry.name, *entry.synonyms):
                if find_material(name, kind).exact != entry:
                    lost.append((name, entry.name))
    assert lost == []


@pytest.mark.parametrize(
    ("text", "name"),
    [
        ("potasium tert-butoxide", "potassium tert-butoxide"),
        ("sodium azid", "sodium azide"),
        ("tetrahydrofurane", "tetrahydrofuran"),
        ("thionyl chlorid", "thionyl chloride"),
    ],
)
def test_a_near_name_is_offered_and_never_taken(text: str, name: str) -> None:
    match = find_material(text)
    assert match.exact is None
    assert match.offers[0].entry.name == name
    assert match.near is not None
    assert match.near.name == name
    with pytest.raises(NameUnknown) as refused:
        get_material(text)
    assert name in refused.value.hint


@pytest.mark.parametrize("text", ["MeSH", "NaOM", "NaHH", "EtOG"])
def test_a_short_formula_is_never_near_since_one_letter_is_another_compound(text: str) -> None:
    match = find_material(text)
    assert match.exact is None
    assert match.near is None


@pytest.mark.parametrize(
    ("text", "first", "other"),
    [
        ("trietylamine", "triethylamine", "trimethylamine"),
        ("dichlormethane", "dichloromethane", "chloroform"),  # trichloromethane is as good a reading
    ],
)
def test_where_two_are_close_neither_is_near(text: str, first: str, other: str) -> None:
    match = find_material(text)
    assert match.exact is None
    assert match.near is None
    assert match.offers[0].entry.name == first
    assert other in {o.entry.name for o in match.offers}


def test_two_that_are_equally_close_are_both_offered() -> None:
    match = find_material("picoline")
    assert match.exact is None
    assert match.near is None
    assert {o.entry.name for o in match.offers[:3]} == {"2-picoline", "3-picoline", "4-picoline"}


def test_a_name_with_two_meanings_is_not_decided() -> None:
    match = find_material("EDC")  # a carbodiimide and 1,2-dichloroethane
    assert match.exact is None
    assert {o.score for o in match.offers} == {100.0}
    with pytest.raises(NameUnknown, match="several"):
        get_material("EDC")
    solvent = get_material("EDC", "solvent")
    assert isinstance(solvent, Solvent)
    assert solvent.name == "1,2-dichloroethane"
    assert isinstance(get_material("EDC", "reagent"), Reagent)


def test_spelling_decides_where_only_punctuation_differs() -> None:
    assert get_material("PDC").name == "pyridinium dichromate"
    assert get_material("Pd-C").name == "palladium on carbon"
    assert get_material("(COCl)2").name == "oxalyl chloride"
    assert get_material("COCl2").name == "phosgene"


def test_a_kind_narrows_the_search() -> None:
    assert isinstance(get_material("pyridine", "solvent"), Solvent)
    assert isinstance(get_material("pyridine"), Reagent)
    assert get_material("DBU", "base").name == "DBU"
    assert find_material("DBU", "acid").exact is None
    offers = find_material("potasium carbonate", "base").offers
    assert offers
    assert all("base" in o.entry.kinds for o in offers)


def test_nothing_alike_gives_no_offer_and_says_what_to_do() -> None:
    with pytest.raises(NameUnknown) as refused:
        get_material("xyzzyplugh")
    assert "SMILES" in refused.value.hint
    assert find_material("").offers == ()
    assert find_material("n" * 10_000).offers == ()


def test_a_refusal_shows_no_control_characters() -> None:
    with pytest.raises(NameUnknown) as refused:
        get_material("\x1b[31mNaN3x\x07")
    assert "\x1b" not in str(refused.value)
    assert "\x07" not in str(refused.value)


@pytest.mark.parametrize(
    ("text", "name", "conc_molar", "solvent", "is_aqueous"),
    [
        ("4 M HCl in dioxane", "hydrogen chloride", 4.0, "1,4-dioxane", False),
        ("HCl (4 M in dioxane)", "hydrogen chloride", 4.0, "1,4-dioxane", False),
        ("4 M HCl", "hydrogen chloride", 4.0, None, True),  # no solvent named: water (common practice)
        ("conc. HCl", "hydrogen chloride", None, None, True),
        ("conc. H2SO4", "sulfuric acid", None, None, False),
        ("2 N H2SO4", "sulfuric acid", 1.0, None, True),  # two protons
        ("1 N NaOH", "sodium hydroxide", 1.0, None, True),
        ("aq. NaOH", "sodium hydroxide", None, None, True),
        ("NaOH 2 M", "sodium hydroxide", 2.0, None, True),
        ("sat. NaHCO3", "sodium bicarbonate", None, None, True),
        ("1 M TBAF in THF", "tetrabutylammonium fluoride", 1.0, "tetrahydrofuran", False),
        ("n-BuLi (2.5 M in hexanes)", "n-butyllithium", 2.5, "n-hexane", False),
        ("60% NaH", "sodium hydride", None, None, False),
        ("NaH (60% in oil)", "sodium hydride", None, None, False),
        ("33% HBr in AcOH", "hydrogen bromide", None, "acetic acid", False),
        ("30% H2O2", "hydrogen peroxide", None, None, True),
        ("7 N NH3 in MeOH", "ammonia", 7.0, "methanol", False),
        ("HCl (g)", "hydrogen chloride", None, None, False),
        ("TsOH.H2O", "p-toluenesulfonic acid", None, None, False),
        ("200 mM NaN3", "sodium azide", 0.2, None, False),
    ],
)
def test_a_label_is_understood(
    text: str, name: str, conc_molar: float | None, solvent: str | None, is_aqueous: bool
) -> None:
    parsed = parse_material(text)
    assert parsed.entry.name == name
    assert parsed.conc_molar == conc_molar
    assert (parsed.solvent.name if parsed.solvent else None) == solvent
    assert parsed.is_aqueous is is_aqueous


def test_a_hydrochloride_is_its_base_with_a_remark() -> None:
    parsed = parse_material("benzylamine hydrochloride")
    assert parsed.entry.name == "benzylamine"
    assert parsed.label.is_hydrochloride
    assert parse_material("NH2OH.HCl").entry.name == "hydroxylamine hydrochloride"  # listed as such


def test_structures_find_their_entries() -> None:
    azide = by_smiles("[N-]=[N+]=[N-].[Na+]")
    assert azide is not None
    assert azide.name == "sodium azide"
    assert isinstance(by_smiles("CN(C)C=O"), Solvent)
    assert isinstance(by_smiles("c1ccncc1"), Reagent)
    assert isinstance(by_smiles("c1ccncc1", "solvent"), Solvent)
    assert by_smiles("CCCCCCCCCCCCCCCCCCC") is None


@given(st.text(max_size=60))
def test_any_text_gives_a_match_and_no_error(text: str) -> None:
    match = find_material(text)
    assert match.exact is None or match.near is None
    assert all(60 <= o.score <= 100 for o in match.offers)


@given(st.sampled_from(CATALOGUE.reagents), st.sampled_from([str.upper, str.lower, str.title]))
def test_case_does_not_matter_to_long_names(entry: Material, change: object) -> None:
    assert callable(change)
    if len(entry.name) > 8:
        found = find_material(change(entry.name), "reagent")
        assert found.exact == entry
