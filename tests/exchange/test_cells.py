"""Cells as chemists fill them in: what is understood, and what is refused with the reason."""

from __future__ import annotations

import datetime as dt

import pytest

from kb.errors import InvalidRecord, QuantityError
from kb.exchange import cells
from kb.exchange.lookups import materials_in, products_seen, solvents_in
from kb.exchange.material_cells import read_materials, read_solvents
from kb.vocabulary import Cause, Fate, Method, Role, Verdict


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("NaN3 2 equiv; TBAI 10 mol%", [("NaN3", {"equiv": 2.0}), ("TBAI", {"loading_mol_pct": 10.0})]),
        ("2 equiv NaN3", [("NaN3", {"equiv": 2.0})]),
        ("NaN3=3", [("NaN3", {"equiv": 3.0})]),
        ("NaN3 (1,5 eq)", [("NaN3", {"equiv": 1.5})]),
        ("HCl 8 equiv (4 M)", [("HCl", {"equiv": 8.0, "conc_molar": 4.0})]),
        ("2,6-lutidine 1.5 equiv, KOAc", [("2,6-lutidine", {"equiv": 1.5}), ("KOAc", {})]),
        ("HCl, 4 M", [("HCl", {"conc_molar": 4.0})]),
        ("NaH + 15-crown-5", [("NaH", {}), ("15-crown-5", {})]),
        ("18-crown-6 0,1 equiv", [("18-crown-6", {"equiv": 0.1})]),
        ("Pd(PPh3)4 3 mol%", [("Pd(PPh3)4", {"loading_mol_pct": 3.0})]),
        ("2-MeTHF", [("2-MeTHF", {})]),
        ("NaH (60%) 1.5 equiv", [("NaH (60%)", {"equiv": 1.5})]),
        ("morpholine 3 mL\nDIPEA 250 mg", [("morpholine", {"volume_ml": 3.0}), ("DIPEA", {"mass_mg": 250.0})]),
        ('"wet; old" 5 mmol', [("wet; old", {"amount_mmol": 5.0})]),
    ],
)
def test_materials_are_read_with_their_amounts(text: str, expected: list[tuple[str, dict[str, float]]]) -> None:
    assert [(m.name, m.amounts) for m in read_materials(text)] == expected


@pytest.mark.parametrize(
    ("text", "why"),
    [
        ("5 g", "amount of nothing"),
        ("NaN3 2 equiv 3 equiv", "twice"),
        ("NaN3 100000 equiv", "equivalents"),
        ("; ".join(["NaN3"] * 61), "61 things"),
    ],
)
def test_impossible_materials_are_refused(text: str, why: str) -> None:
    with pytest.raises((InvalidRecord, QuantityError), match=why):
        read_materials(text)


def test_a_structure_in_braces_wins_over_the_catalogue_and_must_be_one() -> None:
    (drawn,) = materials_in("my phenol {Oc1ccc(F)cc1} 1.2 equiv", Role.REAGENT)
    assert (drawn.name, drawn.smiles, drawn.equiv) == ("my phenol", "Oc1ccc(F)cc1", 1.2)
    with pytest.raises(InvalidRecord, match="no structure"):
        materials_in("my phenol {c1ccc} 1 equiv", Role.REAGENT)


def test_a_label_that_states_a_strength_gives_it_and_the_cell_overrules_it() -> None:
    assert materials_in("4 M HCl in dioxane 8 equiv", Role.ACID)[0].equiv == 8
    assert materials_in("HCl (2 M) 8 equiv", Role.ACID)[0].conc_molar == 2


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("DMF", [("DMF", None)]),
        ("1,4-dioxane", [("1,4-dioxane", None)]),
        ("EtOH:water 3:1", [("EtOH", 3.0), ("water", 1.0)]),
        ("EtOH/water (3:1)", [("EtOH", 3.0), ("water", 1.0)]),
        ("MeOH/water 4/1 v/v", [("MeOH", 4.0), ("water", 1.0)]),
        ("DCM 9; MeOH 1", [("DCM", 9.0), ("MeOH", 1.0)]),
        ("10% MeOH in DCM", [("MeOH", 10.0), ("DCM", 90.0)]),
        ("THF + water", [("THF", None), ("water", None)]),
        ("DMF:3", [("DMF", 3.0)]),
        ("neat", []),
    ],
)
def test_solvents_are_read_with_their_parts(text: str, expected: list[tuple[str, float | None]]) -> None:
    assert [(name, parts) for name, _, parts in read_solvents(text)] == expected
    assert [(s.name, s.parts) for s in solvents_in(text)] == expected


def test_a_ratio_that_does_not_fit_is_refused() -> None:
    with pytest.raises(InvalidRecord, match="2 solvents and 3 parts"):
        read_solvents("dioxane/water 1:1:1")


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("substitution 88; elimination 10", [(Fate.SUBSTITUTION, 0.88), (Fate.ELIMINATION, 0.10)]),
        ("substitution=88,elimination=10", [(Fate.SUBSTITUTION, 0.88), (Fate.ELIMINATION, 0.10)]),
        ("SN2 87,5 %; E2 12,5 %", [(Fate.SUBSTITUTION, 0.875), (Fate.ELIMINATION, 0.125)]),
        ("88% sub / 12% SM", [(Fate.SUBSTITUTION, 0.88), (Fate.UNREACTED, 0.12)]),
        ("group loss: 97", [(Fate.GROUP_LOSS, 0.97)]),
        ("elimination ?", [(Fate.ELIMINATION, None)]),
        ("elimination 0", [(Fate.ELIMINATION, 0.0)]),
    ],
)
def test_splits_are_read_as_percent(text: str, expected: list[tuple[Fate, float | None]]) -> None:
    assert cells.read_split(text) == expected


@pytest.mark.parametrize(
    "text", ["substitution", "banana 3", "elimination 10; E2 5", "elimination 120", "elimination -3"]
)
def test_impossible_splits_are_refused(text: str) -> None:
    with pytest.raises((InvalidRecord, QuantityError)):
        cells.read_split(text)


def test_a_fraction_is_taken_only_where_the_heading_says_so() -> None:
    assert cells.read_split("elimination 0.88")[0][1] == pytest.approx(0.0088)
    assert cells.read_split("elimination 0.88", per=1)[0][1] == pytest.approx(0.88)


def test_products_come_with_share_and_fate_or_without() -> None:
    found = cells.read_products("C=CCCC 12 (elimination); OC1CCNCC1=66; C1=CC=CC=C1")
    assert [(p.smiles, p.share, p.fate) for p in found] == [
        ("C=CCCC", 0.12, Fate.ELIMINATION),
        ("OC1CCNCC1", 0.66, None),
        ("C1=CC=CC=C1", None, None),
    ]


def test_split_and_products_add_up_to_the_split() -> None:
    split = cells.read_split("substitution 30; elimination 60; unreacted 10")
    products = cells.read_products("C=CCCc1ccccc1 45 (elimination)")
    seen = products_seen(split, products, Method.GC)
    assert [(p.fate, p.smiles, p.share) for p in seen] == [
        (Fate.ELIMINATION, "C=CCCc1ccccc1", 0.45),
        (Fate.SUBSTITUTION, None, 0.3),
        (Fate.ELIMINATION, None, 0.15),
        (Fate.UNREACTED, None, 0.1),
    ]
    (alone,) = products_seen(cells.read_split("elimination 60"), cells.read_products("C=CCC (elimination)"), None)
    assert (alone.smiles, alone.share) == ("C=CCC", 0.6)


def test_a_product_without_a_fate_is_read_against_the_substrate() -> None:
    scheme = "CC(Br)CCc1ccccc1.[Na+].[N-]=[N+]=[N-]>>CC(N=[N+]=[N-])CCc1ccccc1"
    seen = products_seen([], cells.read_products("C=CCCc1ccccc1 12; CCO 3"), None, scheme)
    assert [p.fate for p in seen] == [Fate.ELIMINATION, Fate.OTHER]


@pytest.mark.parametrize(
    ("text", "order", "expected"),
    [
        ("2024-05-17", None, dt.date(2024, 5, 17)),
        ("17.05.2024", None, dt.date(2024, 5, 17)),
        ("17/05/2024", None, dt.date(2024, 5, 17)),
        ("05/17/2024", None, dt.date(2024, 5, 17)),
        ("03/04/2024", "dmy", dt.date(2024, 4, 3)),
        ("03/04/2024", "mdy", dt.date(2024, 3, 4)),
        ("5/5/2024", None, dt.date(2024, 5, 5)),
        ("17 May 2024", None, dt.date(2024, 5, 17)),
        ("2024-05-17 00:00:00", None, dt.date(2024, 5, 17)),
    ],
)
def test_dates_are_read(text: str, order: str | None, expected: dt.date) -> None:
    assert cells.read_date(text, order) == expected


@pytest.mark.parametrize(
    ("text", "why"),
    [("03/04/2024", "two ways"), ("31/31/2024", "no date"), ("1.2.24", "two digits"), ("soon", "no date")],
)
def test_dates_that_cannot_be_read_in_one_way_are_refused(text: str, why: str) -> None:
    with pytest.raises(QuantityError, match=why):
        cells.read_date(text)


def test_controlled_words_are_understood_as_people_write_them() -> None:
    assert cells.read_verdict("OK") is Verdict.WORKED
    assert cells.read_verdict("Partial") is Verdict.PARTLY
    assert cells.read_method("1H NMR") is Method.NMR
    assert cells.read_method("LCMS") is Method.HPLC
    assert cells.read_cause("Suspected") is Cause.SUSPECTED
    for read in (cells.read_verdict, cells.read_method, cells.read_cause, cells.read_fate):
        with pytest.raises(InvalidRecord):
            read("purple")


def test_a_measured_zero_is_recorded_and_a_dash_is_not() -> None:
    assert cells.is_recorded("0")
    assert not any(map(cells.is_recorded, ("", " - ", "n.d.", "N/A", None)))
