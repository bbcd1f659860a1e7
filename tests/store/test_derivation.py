"""What is kept of a flask for comparing it with another: its reagents, whoever wrote or drew them."""

from __future__ import annotations

import pytest

from kb.book.plan_words import plan_from_words
from kb.record.outcome import Outcome, ProductSeen
from kb.record.run import Run
from kb.store.derivation import Account, account_of_plan, dissect, profile_from_json, profile_to_json
from kb.vocabulary import Confidence, Fate


def reagents(scheme: str, **words: object) -> frozenset[str]:
    return account_of_plan(plan_from_words({"scheme": scheme, **words})).profile.reagents


@pytest.mark.parametrize(
    ("scheme", "words", "expected", "why"),
    [
        ("CCCBr", {"reagents": ["NaN3"]}, {"[N-]=[N+]=[N-]"}, "a lone metal cation says nothing"),
        ("CCCBr.[N-]=[N+]=[N-].[K+]", {}, {"[N-]=[N+]=[N-]"}, "drawn or named, sodium or potassium: the same"),
        ("CCCBr.[SH:3][CH3:4]", {}, {"CS"}, "atom maps are left out"),
        ("CCCBr", {"reagents": ["NaN3"], "solvents": ["DMF"]}, {"[N-]=[N+]=[N-]"}, "solvents are no reagents"),
    ],
)
def test_the_flask_is_kept_as_plain_structures(
    scheme: str, words: dict[str, object], expected: set[str], why: str
) -> None:
    assert reagents(scheme, **words) == expected, why


def test_reagents_survive_the_store_s_text() -> None:
    profile = account_of_plan(plan_from_words({"scheme": "CCCBr", "reagents": ["NaN3"]})).profile
    assert profile_from_json(profile_to_json(profile)) == profile


def account(scheme: str, **words: object) -> Account:
    return account_of_plan(plan_from_words({"scheme": scheme, **words}))


def test_a_protic_solvent_is_offered_where_nothing_else_explains_the_product() -> None:
    told = account("CC1CO1>>CC(OC)CO", reagents=["H2SO4"], solvents=["MeOH"])
    assert told.reading.confidence is Confidence.MATCHED and told.facts.fate == "substitution"
    assert told.facts.nucleophile_class == "alcohol"
    assert told.profile.reagents == account("CC1CO1>>CC(OC)CO", reagents=["H2SO4"]).profile.reagents
    assert told.profile.solvents == {"methanol"}
    assert account("CC1CO1>>CC(OC)CO", reagents=["H2SO4"], solvents=["DMF"]).facts.fate is None


def test_a_solvent_does_not_push_a_nucleophile_aside() -> None:
    told = account("CCCBr>>CCCN=[N+]=[N-]", reagents=["NaN3"], solvents=["MeOH"])
    assert told.facts.nucleophile_class == "azide"
    assert not any("alcohol" in f.note for f in told.reading.possible)


def test_what_a_solvent_could_do_is_listed_but_settles_no_fate() -> None:
    told = account("CC(C)(C)Br", solvents=["MeOH"])
    assert told.reading.fate is None
    assert "COC(C)(C)C" in {f.product for f in told.reading.possible}


def test_reading_lone_hydrogen_ions_writes_nothing_to_the_screen(capfd: pytest.CaptureFixture[str]) -> None:
    account("CCCBr.[H-].[Na+]>>CC=C", solvents=["THF"])
    account("[H+].CC(C)=C.[H][H]", solvents=["MeOH"])
    assert capfd.readouterr().err == ""


def test_a_structure_is_stored_once_however_it_was_drawn() -> None:
    conditions = plan_from_words({"scheme": "CCBr", "reagents": ["NaN3"]}).conditions
    schemes = ("CCC(Br)C.C[O-]>>CCC(C)OC", "[CH3:4][CH:1]([Br:2])CC.[O-:5]C>>[CH3:4][CH:1](CC)[O:5]C")
    places = [set(dissect(Run(scheme=scheme, conditions=conditions))) for scheme in schemes]
    assert places[0] == places[1]
    assert ("substrate", 0, "CCC(C)Br") in places[0]
    assert all(":" not in smiles for _, _, smiles in places[0])


def test_products_stated_and_seen_are_one_where_they_are_the_same() -> None:
    outcome = Outcome(products=(ProductSeen(fate=Fate.SUBSTITUTION, smiles="COC(C)CC"),))
    run = Run(scheme="CCC(C)Br.C[O-]>>CCC(C)OC", outcome=outcome)
    assert [smiles for role, _, smiles in dissect(run) if role == "product"] == ["CCC(C)OC"]
