"""The catalogue as a table: complete rows, canonical structures, valid registry numbers, words that are defined.

CAS check digits by the rule of the Chemical Abstracts Service; canonical SMILES by RDKit.
"""

from __future__ import annotations

import subprocess
import sys

import pytest
from rdkit import Chem

from kb.materials.catalogue import Material, Reagent, load_catalogue
from kb.materials.class_names import OXIDANT_CLASSES, REAGENT_CLASSES, SOLVENT_CLASSES, WIDER, add_wider
from kb.materials.profile import LEVELS

CATALOGUE = load_catalogue()
ALL = [*CATALOGUE.solvents, *CATALOGUE.reagents]


def test_there_are_enough_rows() -> None:
    assert len(CATALOGUE.solvents) >= 65
    assert len(CATALOGUE.reagents) >= 350


def test_every_row_says_where_it_comes_from() -> None:
    rows = [*ALL, *CATALOGUE.ions.values()]
    assert [r.name for r in rows if not r.source] == []
    # figures are from memory unless a test confirms them, so every row with figures says so
    unmarked = [r.name for r in rows if "(memory)" not in r.source and "common practice" not in r.source]
    assert unmarked == []


@pytest.mark.parametrize("table", ["solvents", "reagents"])
def test_names_are_not_given_twice_in_a_table(table: str) -> None:
    names = [m.name for m in getattr(CATALOGUE, table)]
    assert len(names) == len(set(names))


def test_structures_are_stored_canonically() -> None:
    def written(entry: Material) -> list[str]:
        extra = [entry.alkoxy] if isinstance(entry, Reagent) and entry.alkoxy else []
        return [s for s in (entry.smiles, *extra) if s]

    wrong = [
        (entry.name, smiles)
        for entry in [*ALL, *CATALOGUE.ions.values()]
        for smiles in written(entry)
        if Chem.MolToSmiles(Chem.MolFromSmiles(smiles)) != smiles
    ]
    assert wrong == []


def _has_valid_check_digit(cas_rn: str) -> bool:
    digits = cas_rn.replace("-", "")
    body, check = digits[:-1], int(digits[-1])
    return sum(int(d) * n for n, d in enumerate(reversed(body), start=1)) % 10 == check


def test_registry_numbers_have_valid_check_digits() -> None:
    assert _has_valid_check_digit("7732-18-5")  # water
    assert not _has_valid_check_digit("7732-18-4")
    assert [m.name for m in ALL if m.cas_rn and not _has_valid_check_digit(m.cas_rn)] == []


def test_class_words_are_all_defined() -> None:
    used = {word for r in [*CATALOGUE.reagents, *CATALOGUE.ions.values()] for word in r.classes}
    assert used - REAGENT_CLASSES.keys() == set()
    assert {word for s in CATALOGUE.solvents for word in s.classes} - SOLVENT_CLASSES.keys() == set()
    wider = {word for words in WIDER.values() for word in words}
    assert (wider | WIDER.keys()) - REAGENT_CLASSES.keys() == set()
    assert OXIDANT_CLASSES - REAGENT_CLASSES.keys() == set()


def test_levels_are_words_of_the_profile() -> None:
    for reagent in CATALOGUE.reagents:
        assert reagent.acidity in LEVELS["acidity"], reagent.name
        assert reagent.nucleophile in LEVELS["nucleophile"], reagent.name
        assert reagent.lewis in LEVELS["lewis_acid"], reagent.name
        assert reagent.hydride in LEVELS["hydride"], reagent.name
        assert reagent.bulk in (None, "unhindered", "hindered"), reagent.name
        assert (reagent.mayr_n is None) == (reagent.mayr_sn is None), reagent.name


def test_wider_words_come_along() -> None:
    assert add_wider(["primary_amine"]) == {"primary_amine", "amine"}
    assert {"hydrogen_halide", "hbr_or_tmsi", "bronsted_acid"} <= add_wider(["hydrogen_bromide"])
    assert {"organolithium", "organometallic"} <= add_wider(["alkyllithium"])
    assert "alkoxide" in next(r for r in CATALOGUE.reagents if r.name == "potassium tert-butoxide").classes


def test_a_solvent_that_acts_stands_in_both_tables() -> None:
    acting = [s for s in CATALOGUE.solvents if s.classes & {"alcohol", "carboxylic_acid", "strong_acid", "amine"}]
    common = {"methanol", "ethanol", "2-propanol", "acetic acid", "formic acid", "trifluoroacetic acid", "pyridine"}
    assert common <= {s.name for s in acting if s.smiles in CATALOGUE.reagent_by_smiles}
    acids_and_amines = [s for s in acting if "alcohol" not in s.classes]
    assert [s.name for s in acids_and_amines if s.smiles not in CATALOGUE.reagent_by_smiles] == []


def test_single_ions_speak_for_the_salts_they_come_from() -> None:
    assert CATALOGUE.ions["[OH-]"].pkah == 15.7
    assert CATALOGUE.ions["O=C([O-])[O-]"].classes == {"carbonate_base"}
    assert CATALOGUE.ions["CC(=O)[O-]"].classes == {"carboxylate"}  # not those of ammonium acetate
    assert CATALOGUE.ions["[N-]=[N+]=[N-]"].name == "azide"
    assert CATALOGUE.ions["[Na+]"].classes == frozenset()


def test_the_catalogue_loads_without_rdkit() -> None:
    check = (
        "import sys; from kb.materials.names import find_material; from kb.materials.classes import profile_of;"
        "from kb.materials.resolving import resolve_component; find_material('potasium carbonate');"
        "sys.exit('rdkit' in sys.modules)"
    )
    assert subprocess.run([sys.executable, "-c", check], check=False).returncode == 0
