"""The words of the command line: names, structures, amounts and parts."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from kb.errors import NameUnknown, QuantityError, SidepathError
from kb.materials.resolving import resolve_component, resolve_solvent, resolve_solvents
from kb.vocabulary import Role


@pytest.mark.parametrize(
    ("text", "name", "smiles", "fields"),
    [
        ("NaN3", "NaN3", "[N-]=[N+]=[N-].[Na+]", {}),
        ("NaN3=1.5", "NaN3", "[N-]=[N+]=[N-].[Na+]", {"equiv": 1.5}),
        ("NaN3=1,5 eq", "NaN3", "[N-]=[N+]=[N-].[Na+]", {"equiv": 1.5}),
        ("Pd/C=5 mol%", "Pd/C", "[Pd]", {"loading_mol_pct": 5.0}),
        ("HCl=4 mL", "HCl", "Cl", {"volume_ml": 4.0}),
        ("K2CO3=250 mg", "K2CO3", "O=C([O-])[O-].[K+].[K+]", {"mass_mg": 250.0}),
        ("K2CO3=2 mmol", "K2CO3", "O=C([O-])[O-].[K+].[K+]", {"amount_mmol": 2.0}),
        ("4 M HCl in dioxane=3", "4 M HCl in dioxane", "Cl", {"conc_molar": 4.0, "equiv": 3.0}),
        ("C=CCBr", "C=CCBr", "C=CCBr", {}),
        ("C=CCBr=2", "C=CCBr", "C=CCBr", {"equiv": 2.0}),
        ("C1=CCCCC=1", "C1=CCCCC=1", "C1=CCCCC=1", {}),  # the last = closes a ring
        ("C1=CCCCC1=1.2", "C1=CCCCC1", "C1=CCCCC1", {"equiv": 1.2}),
        ("O=C=O", "O=C=O", "O=C=O", {}),
        ("[CH3:1][NH2:2]=2", "[CH3:1][NH2:2]", "CN", {"equiv": 2.0}),
        ("celite", "celite", None, {}),
    ],
)
def test_a_component_is_read(text: str, name: str, smiles: str | None, fields: dict[str, float]) -> None:
    found = resolve_component(text, Role.REAGENT)
    assert (found.role, found.name, found.smiles) == (Role.REAGENT, name, smiles)
    amounts = ("equiv", "amount_mmol", "mass_mg", "volume_ml", "conc_molar", "loading_mol_pct")
    assert {f: getattr(found, f) for f in amounts if getattr(found, f) is not None} == fields


@pytest.mark.parametrize(
    ("text", "parts"),
    [
        ("DMF", [("DMF", None)]),
        ("DMF:3", [("DMF", 3.0)]),
        ("THF/H2O 4:1", [("THF", 4.0), ("H2O", 1.0)]),
        ("MeOH-DCM (1:9)", [("MeOH", 1.0), ("DCM", 9.0)]),
        ("hexanes:EtOAc 4:1", [("hexanes", 4.0), ("EtOAc", 1.0)]),
        ("EtOH/water", [("EtOH", None), ("water", None)]),
        ("80% EtOH", [("80% EtOH", None)]),
        ("C1CCOC1:2", [("C1CCOC1", 2.0)]),
        ("2-MeTHF:1", [("2-MeTHF", 1.0)]),
    ],
)
def test_solvents_are_read(text: str, parts: list[tuple[str, float | None]]) -> None:
    found = resolve_solvents(text)
    assert [(p.name, p.parts) for p in found] == parts
    assert all(p.smiles for p in found)


def test_one_solvent_at_a_time_is_said() -> None:
    with pytest.raises(NameUnknown) as refused:
        resolve_solvent("THF/H2O 4:1")
    assert "THF:4, H2O:1" in refused.value.hint
    assert resolve_solvent("DMF:3").parts == 3


@pytest.mark.parametrize(
    ("text", "error"),
    [
        ("foo", NameUnknown),
        ("foo=2", NameUnknown),
        ("", NameUnknown),
        ("=2", NameUnknown),
        ("KOtBuu", NameUnknown),
        ("C(C", NameUnknown),
        ("K2CO3=-1", QuantityError),
        ("K2CO3=abc", QuantityError),
        ("NaN3=", QuantityError),
    ],
)
def test_nonsense_is_refused(text: str, error: type[SidepathError]) -> None:
    with pytest.raises(error):
        resolve_component(text, Role.BASE)


@given(st.text(max_size=50))
def test_any_text_gives_a_value_or_a_refusal(text: str) -> None:
    for resolve in (lambda t: resolve_component(t, Role.REAGENT), resolve_solvents):
        try:
            resolve(text)
        except SidepathError as refused:
            assert refused.message
