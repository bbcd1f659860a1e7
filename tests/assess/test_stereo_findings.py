"""What becomes of a drawn centre, said once and with its source. Outcomes are textbook ones (Walden; ion pairs)."""

from __future__ import annotations

import pytest

from kb.assess.published import published_estimate
from kb.assess.stereo_findings import find_stereo_findings
from kb.book.plan_words import plan_from_words
from kb.record.finding import Finding
from kb.store.derivation import account_of_plan
from kb.vocabulary import FindingKind, Severity

SN2 = {"reagents": "NaN3", "solvents": "DMF", "temperature": "60 °C"}
SOLVOLYSIS = {"solvents": "water", "temperature": "25 °C"}


def stereo(scheme: str, fired: frozenset[str] = frozenset(), **words: str) -> tuple[Finding, ...]:
    account = account_of_plan(plan_from_words({"scheme": scheme, **words}))
    published = published_estimate(account.reading, account.facts.substrate or "", account.profile)
    return find_stereo_findings(account, published, fired)


def test_displacement_from_the_back_inverts_and_that_is_a_note() -> None:
    (finding,) = stereo("C[C@H](CCCC)OS(=O)(=O)c1ccc(C)cc1", **SN2)
    assert finding.kind is FindingKind.LIABILITY
    assert finding.severity is Severity.NOTE
    assert finding.title == "The drawn centre inverts"
    assert finding.atoms == (1,)
    assert finding.source


def test_an_ion_pair_that_lets_go_of_the_configuration_is_a_caution() -> None:
    (finding,) = stereo("C[C@H](Cl)c1ccc(OC)cc1", **SOLVOLYSIS)
    assert finding.severity is Severity.CAUTION
    assert "inverts" not in finding.title
    assert finding.do_instead


@pytest.mark.parametrize(
    ("scheme", "words", "why"),
    [
        ("CC(CCCC)OS(=O)(=O)c1ccc(C)cc1", SN2, "no configuration was drawn"),
        ("CCC[C@H](C)CBr", SN2, "the drawn centre is not the one that reacts"),
        ("C[C@H](Br)CC>>CC=CC", {"bases": "KOtBu", "solvents": "THF"}, "an alkene is wanted"),
        ("C1CC2CCC1(Br)C2", SN2, "nothing substitutes"),
        ("not a structure", SN2, "nothing was read"),
    ],
)
def test_otherwise_nothing_is_said(scheme: str, words: dict[str, str], why: str) -> None:
    assert stereo(scheme, **words) == (), why


def test_what_a_rule_has_already_warned_of_is_only_added_to() -> None:
    (finding,) = stereo("C[C@H](Cl)c1ccc(OC)cc1", frozenset({"ion-pair-racemisation"}), **SOLVOLYSIS)
    assert finding.severity is Severity.NOTE


def test_inversion_that_cannot_be_relied_on_is_a_caution() -> None:
    # An anisyl centre in methanol with a good nucleophile: mostly from the back, and nobody can be sure how much.
    words = {"reagents": "NaN3", "solvents": "MeOH", "temperature": "60 °C"}
    (finding,) = stereo("C[C@H](Br)c1ccc(OC)cc1", **words)
    assert finding.title == "The drawn centre mostly inverts"
    assert finding.severity is Severity.CAUTION


AZIDE = {"solvents": "DMF", "temperature": "60 °C"}


def test_a_product_drawn_with_retention_is_not_what_a_displacement_gives() -> None:
    drawn, expected = stereo("C[C@@H](OS(C)(=O)=O)CC.[N-]=[N+]=[N-]>>C[C@@H](N=[N+]=[N-])CC", **AZIDE)
    assert drawn.rule_id == "stereo:drawn-retention"
    assert drawn.severity is Severity.SERIOUS
    assert drawn.source and drawn.atoms == (1,)
    assert expected.title == "The drawn centre inverts"


def test_a_product_drawn_with_inversion_is_what_it_gives() -> None:
    (only,) = stereo("C[C@@H](OS(C)(=O)=O)CC.[N-]=[N+]=[N-]>>C[C@H](N=[N+]=[N-])CC", **AZIDE)
    assert only.severity is Severity.NOTE


@pytest.mark.parametrize("rule", ["ngp-beta-acyloxy", "thionyl-chloride-stereochemistry"])
def test_retention_is_only_noted_where_something_may_turn_the_centre_twice(rule: str) -> None:
    scheme = "C[C@@H](OS(C)(=O)=O)CC.[N-]=[N+]=[N-]>>C[C@@H](N=[N+]=[N-])CC"
    drawn = next(f for f in stereo(scheme, frozenset({rule}), **AZIDE) if f.rule_id == "stereo:drawn-retention")
    assert drawn.severity is Severity.NOTE
    assert "turn it twice" in drawn.why


def test_a_cis_halohydrin_drawn_to_close_is_serious() -> None:
    scheme = "O[C@@H]1CCCC[C@@H]1Br>>C1CC[C@@H]2O[C@@H]2C1"
    found = stereo(scheme, bases="NaOH", solvents="water", temperature="25 °C")
    drawn = next(f for f in found if f.rule_id == "stereo:drawn-impossible")
    assert drawn.severity is Severity.SERIOUS


def test_beside_other_drawn_centres_epimers_form_and_nothing_racemises() -> None:
    (lone,) = stereo("C[C@H](Cl)c1ccccc1", **SOLVOLYSIS)
    (with_others,) = stereo("C[C@H](Cl)c1ccc([C@H](C)CC)cc1", **SOLVOLYSIS)
    assert lone.title == "The drawn centre racemises"
    assert with_others.title == "The drawn centre gives both epimers"


def test_a_neighbouring_group_that_takes_part_has_the_word() -> None:
    assert stereo("C[C@H](Cl)c1ccccc1", frozenset({"ngp-beta-acyloxy"}), **SOLVOLYSIS) == ()
