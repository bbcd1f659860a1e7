"""The search: what is meant to be lost is no worry, what is unknown is said, each thing is told once."""

from __future__ import annotations

import random

import pytest
from conditions_by_hand import a_profile
from rdkit import Chem

from kb.assess.liability import all_rules, find_liabilities, get_rule
from kb.assess.predicate import parse_predicate
from kb.assess.rulefile import build_rule
from kb.chem.facts import Centre, NucleophileFact, PossibleFate, Reading
from kb.errors import QueryError, RecordNotFound
from kb.materials.profile import ConditionProfile
from kb.record.finding import Finding
from kb.vocabulary import CarbonClass, Confidence, Fate, FindingKind, LeavingGroup, Severity

TFA = a_profile("acidity=strong; solvent=chlorinated; temperature_c=20")
BOC_ESTER = "CC(C)(C)OC(=O)NCC(=O)OC(C)(C)C"


def a_reading(scheme: str = "", **changes: object) -> Reading:
    values: dict[str, object] = {"scheme": scheme, "ok": True, "confidence": Confidence.INFERRED}
    return Reading(**(values | changes))  # type: ignore[arg-type]


def a_centre(atom: int, leaving: int | None = None, component: int = 0, **changes: object) -> Centre:
    values: dict[str, object] = {
        "component": component,
        "atom": atom,
        "carbon_class": CarbonClass.SECONDARY,
        "leaving_group": LeavingGroup.BROMIDE,
        "leaving_atom": leaving,
    }
    return Centre(**(values | changes))  # type: ignore[arg-type]


def found(
    scheme: str, profile: ConditionProfile, reading: Reading | None = None, **changes: object
) -> tuple[Finding, ...]:
    left = scheme.split(">")[0]
    return find_liabilities(
        reading=reading or a_reading(scheme),
        fragments=left.split("."),
        profile=profile,
        **changes,  # type: ignore[arg-type]
    )


def ids(findings: tuple[Finding, ...]) -> set[str]:
    return {i for f in findings for i in (f.rule_id, *f.also)}


def test_a_group_that_the_product_lacks_is_no_worry_but_one_that_should_stay_is() -> None:
    boc_off = found(f"{BOC_ESTER}>>NCC(=O)OC(C)(C)C", TFA)
    assert ids(boc_off) == {"tert-butyl-ester-strong-acid"}
    assert boc_off[0].severity is Severity.SERIOUS
    assert boc_off[0].side_product == "CC(C)(C)OC(=O)NCC(=O)O"
    ester_off = found(f"{BOC_ESTER}>>CC(C)(C)OC(=O)NCC(=O)O", TFA)
    assert ids(ester_off) == {"n-boc-strong-acid"}


def test_without_a_product_everything_should_stay() -> None:
    assert ids(found(BOC_ESTER, TFA)) == {"n-boc-strong-acid", "tert-butyl-ester-strong-acid"}


def test_with_intention_ignored_the_group_that_is_lost_fires_too() -> None:
    assert ids(found(f"{BOC_ESTER}>>NCC(=O)OC(C)(C)C", TFA, ignore_intention=True)) >= {"n-boc-strong-acid"}


def test_of_two_copies_the_one_found_again_in_the_product_is_the_worry() -> None:
    scheme = "CC(C)(C)OC(=O)NCCCCC(NC(=O)OC(C)(C)C)C(=O)OC>>NCCCCC(NC(=O)OC(C)(C)C)C(=O)OC"
    (finding,) = found(scheme, TFA)
    assert finding.rule_id == "n-boc-strong-acid"
    assert finding.atoms == tuple(range(13, 21))  # the one on the carbon that keeps it


def test_group_loss_without_a_stated_product_is_not_known_to_be_meant() -> None:
    reading = a_reading(
        "CC(C)(C)OC(=O)NCC",
        fate=Fate.GROUP_LOSS,
        centres=(a_centre(1, 4, carbon_class=CarbonClass.TERTIARY, leaving_group=LeavingGroup.CARBOXYLATE),),
    )
    assert ids(found("CC(C)(C)OC(=O)NCC", TFA, reading)) == {"n-boc-strong-acid"}


def test_the_matched_product_of_a_reading_counts_as_stated() -> None:
    reading = a_reading(
        "some-file.rxn",
        confidence=Confidence.MATCHED,
        fate=Fate.GROUP_LOSS,
        possible=(PossibleFate(fate=Fate.GROUP_LOSS, product="NCC(=O)OC(C)(C)C"),),
    )
    assert ids(found(BOC_ESTER, TFA, reading)) == {"tert-butyl-ester-strong-acid"}


def test_a_rule_for_the_centre_looks_only_there() -> None:
    two = "CC(Br)CCCCCC(C)(C)Br"
    base = a_profile("reagent=alkoxide; base_pkah=15.9; base_bulk=unhindered; nucleophile=good")
    assert ids(found(two, base, a_reading(two, centres=(a_centre(1, 2),)))) == {
        "secondary-lg-hydroxide-alkoxide",
        "unhindered-base-internal-alkene",
    }
    assert "tertiary-lg-basic-nucleophile" in ids(found(two, base, a_reading(two, centres=(a_centre(8, 11),))))


def test_a_fate_that_is_intended_is_no_worry() -> None:
    base = a_profile("reagent=alkoxide; base_pkah=15.9; base_bulk=unhindered; nucleophile=good")
    scheme = "CC(C)(C)Br>>C=C(C)C"
    meant = a_reading(scheme, fate=Fate.ELIMINATION, centres=(a_centre(1, 4),))
    ether = "CC(C)(C)Br>>CCOC(C)(C)C"
    feared = a_reading(ether, fate=Fate.SUBSTITUTION, centres=(a_centre(1, 4),))
    assert ids(found(scheme, base, meant)) == set()
    assert ids(found(ether, base, feared)) == {"tertiary-lg-basic-nucleophile"}


def test_the_reacting_centre_is_no_bystander() -> None:
    azide = a_profile("reagent=azide; nucleophile=good; solvent=polar-aprotic")
    scheme = "O=C(CBr)c1ccccc1"
    assert "alpha-halo-ketone-nucleophile" in ids(found(scheme, azide))
    reading = a_reading(scheme, fate=Fate.SUBSTITUTION, centres=(a_centre(2, 3),))
    assert "alpha-halo-ketone-nucleophile" not in ids(found(scheme, azide, reading))


def test_an_unresolved_reading_makes_centre_rules_cautions_at_most() -> None:
    base = a_profile("reagent=alkoxide; base_pkah=15.9; base_bulk=unhindered; nucleophile=good")
    unresolved = a_reading("CC(C)(C)Br", confidence=Confidence.UNRESOLVED)
    assert {f.severity for f in found("CC(C)(C)Br", base, unresolved)} == {Severity.CAUTION}


def test_rules_of_one_group_on_one_place_are_one_finding_the_most_severe_first() -> None:
    styrene = a_profile("reagent=tertiary_alkoxide; base_pkah=17; base_bulk=hindered; nucleophile=weak")
    scheme = "BrCCc1ccccc1"
    base_findings = found("CC(Br)Cc1ccccc1", styrene, a_reading(centres=(a_centre(1, 2),)))
    (finding,) = [f for f in base_findings if "arylethyl-lg-base-styrene" in (f.rule_id, *f.also)]
    assert {finding.rule_id, *finding.also} == {"arylethyl-lg-base-styrene", "secondary-lg-hindered-base"}
    assert len(set(finding.do_instead)) == len(finding.do_instead)
    assert "Also: " in finding.why
    assert [f.rule_id for f in found(scheme, styrene, a_reading(centres=(a_centre(1, 0),)))] == [
        "arylethyl-lg-base-styrene"
    ]


def test_several_copies_are_one_finding_that_counts_them() -> None:
    (finding,) = found("CC(C)(C)OC(=O)CCC(=O)OC(C)(C)C", TFA)
    assert "2 places" in finding.title
    assert len(finding.atoms) == 16


def test_findings_come_most_severe_first() -> None:
    ranks = [f.severity.rank for f in found("CC(C)(C)OC(=O)NCC(O)(CC)c1cc[nH]c1", TFA)]
    assert ranks == sorted(ranks, reverse=True)
    assert len(ranks) > 1


def test_what_is_missing_is_said_and_lowers_the_severity() -> None:
    hydroxide = a_profile("reagent=metal_hydride; solvent=amide; base_pkah=35")
    (finding,) = [f for f in found("CCCC", hydroxide) if f.rule_id == "metal-hydride-in-dipolar-aprotic-heat"]
    assert finding.is_uncertain
    assert finding.severity is Severity.CAUTION
    assert "temperature not given" in finding.why


def test_a_solvent_alone_with_no_temperature_warns_of_no_heat() -> None:
    assert found("CCCC", a_profile("solvent=amide")) == ()


def test_nothing_recorded_gives_no_flood() -> None:
    every_group = "CC(C)(C)OC(=O)NCC(OC1CCCCO1)CC(O[Si](C)(C)C)C(=O)OCC1OC1CBr"
    assert found(every_group, ConditionProfile()) == ()


def test_atoms_are_those_of_the_fragment_as_entered() -> None:
    mapped = "[CH3:7][CH2:8][O:9][Si:1]([CH3:2])([CH3:3])[CH3:4]"
    (finding,) = found(mapped, TFA)
    assert finding.atoms == (1, 2, 3, 4, 5, 6)
    assert finding.side_product == "CCO"
    hydrogens = "[H]C([H])([H])C([H])([H])O[Si](C)(C)C"
    (finding,) = found(hydrogens, TFA)
    assert finding.atoms == (4, 7, 8, 9, 10, 11)


def test_findings_do_not_depend_on_the_order_of_atoms() -> None:
    smiles = "CC(C)(C)OC(=O)N1CCC(O[Si](C)(C)C(C)(C)C)C1C(=O)OC(C)(C)C"
    mol = Chem.MolFromSmiles(smiles)
    expected = {(f.rule_id, f.severity, f.side_product, len(f.atoms)) for f in found(smiles, TFA)}
    assert len(expected) == 3
    generator = random.Random(7)
    for _ in range(10):
        order = list(range(mol.GetNumAtoms()))
        generator.shuffle(order)
        other = Chem.MolToSmiles(Chem.RenumberAtoms(mol, order), canonical=False)
        assert {(f.rule_id, f.severity, f.side_product, len(f.atoms)) for f in found(other, TFA)} == expected


def test_a_solvent_is_no_group_worth_keeping() -> None:
    lye = a_profile("reagent=hydroxide; base_pkah=15.7; nucleophile=good; water=yes")
    assert "alkyl-ester-saponification" not in ids(found("CCCCCCCCBr.CCOC(C)=O", lye))
    assert "alkyl-ester-saponification" in ids(found("CCCCCCCCOC(=O)CCC", lye))


def test_an_ester_and_its_own_alcohol_exchange_nothing() -> None:
    ethoxide = a_profile("reagent=alkoxide; base_pkah=15.9; solvent=alcohol; solvent_alkoxy=CCO")
    methoxide = a_profile("reagent=alkoxide; base_pkah=15.5; solvent=alcohol; solvent_alkoxy=CO")
    assert "ester-transesterification" not in ids(found("CCOC(=O)c1ccncc1", ethoxide))
    (finding,) = [f for f in found("CCOC(=O)c1ccncc1", methoxide) if f.rule_id == "ester-transesterification"]
    assert Chem.CanonSmiles("COC(=O)c1ccncc1") in (finding.side_product or "").split(".")


def test_a_second_reactant_must_be_there_where_the_rule_wants_one() -> None:
    amine = a_profile("reagent=primary_amine; nucleophile=good; base_pkah=9.3")
    nucleophile = NucleophileFact(component=0, atom=0, nucleophile_class="amine")
    alone = a_reading(nucleophile=nucleophile)
    assert "primary-amine-overalkylation" not in ids(found("NCc1ccccc1", amine, alone))
    pair = found("NCc1ccccc1.CCCCBr", amine, a_reading(nucleophile=nucleophile, centres=(a_centre(3, 4, 1),)))
    (finding,) = [f for f in pair if f.rule_id == "primary-amine-overalkylation"]
    assert finding.component == 0
    assert finding.side_product == "CCCCN(CCCC)Cc1ccccc1"


def test_a_nucleophile_that_is_named_but_not_drawn_counts() -> None:
    ammonia = a_profile("reagent=ammonia; nucleophile=good; base_pkah=9.2; nucleophile_name=ammonia")
    reading = a_reading("CCCCBr>>CCCCN", fate=Fate.SUBSTITUTION, centres=(a_centre(3, 4),))
    (finding,) = found("CCCCBr>>CCCCN", ammonia, reading)
    assert finding.rule_id == "primary-amine-overalkylation"
    assert finding.component is None
    assert finding.atoms == ()
    assert finding.side_product == "CCCCNCCCC"


def test_elimination_draws_no_alkene_at_a_bridgehead() -> None:
    base = a_profile("reagent=alkoxide; base_pkah=15.9; base_bulk=unhindered")
    assert found("BrC1CC2CCC1C2", base)[0].side_products == ("C1=CC2CCC1C2",)


def test_a_side_product_claims_no_configuration_where_bonds_changed_and_keeps_the_rest() -> None:
    (finding,) = found("C[C@H](O)[C@@H](C)OC(C)(C)C", TFA)
    assert finding.side_product == Chem.CanonSmiles("C[C@H](O)[C@@H](C)O")
    solvolysis = a_profile("solvent=protic; alcohol=yes; nucleophile=weak; ionising=yes; solvent_alkoxy=CO")
    made = [f for f in found("C[C@H](Cl)c1ccccc1", solvolysis) if f.rule_id == "solvolysis-protic-solvent"]
    assert made[0].side_product == "COC(C)c1ccccc1"


@pytest.mark.parametrize(
    "fragment",
    ["", "not a structure", "C1CC", "[Na+]", "*", "[2H]", "[CH2]", "C" * 3000],
    ids=["empty", "words", "open ring", "ion", "dummy", "bare deuterium", "carbene", "huge"],
)
def test_a_fragment_that_cannot_be_read_or_is_odd_hides_no_other(fragment: str) -> None:
    findings = find_liabilities(reading=a_reading(), fragments=[fragment, BOC_ESTER], profile=TFA)
    assert ids(findings) == {"n-boc-strong-acid", "tert-butyl-ester-strong-acid"}
    assert {f.component for f in findings} == {1}


def test_a_very_large_molecule_with_many_groups_is_still_one_finding_each() -> None:
    chain = "CC(C)(C)OC(=O)N" + "CCCN(C(=O)OC(C)(C)C)" * 40 + "C"
    (finding,) = found(chain, TFA)
    assert "41 places" in finding.title


def test_house_rules_are_searched_by_the_same_engine() -> None:
    rule = build_rule(
        {
            "id": "house-1",
            "title": "Our oxazoline opens in warm acid",
            "motif": "C1CN=CO1",
            "when": "acidity >= weak and temperature_c >= 40",
            "severity": "serious",
            "mechanism": "It opened three times.",
        },
        place="house rule",
    )
    warm = a_profile("acidity=weak; temperature_c=50")
    (finding,) = found("CC1=NCCO1", warm, rules=[rule], kind=FindingKind.HOUSE_RULE)
    assert finding.kind is FindingKind.HOUSE_RULE
    assert finding.rule_id == "house-1"


@pytest.mark.parametrize(
    ("entry", "word"),
    [
        ({"motif": "C"}, "id"),
        ({"id": "x", "title": "t", "when": "acidity >= strong", "mechanism": "m"}, "severity"),
        (
            {"id": "x", "title": "t", "when": "acidity >= strng", "severity": "note", "mechanism": "m", "motif": "C"},
            "strng",
        ),
        ({"id": "x", "title": "t", "when": "water", "severity": "dire", "mechanism": "m", "motif": "C"}, "dire"),
        ({"id": "x", "title": "t", "when": "water", "severity": "note", "mechanism": "m"}, "side"),
        (
            {"id": "x", "title": "t", "when": "water", "severity": "note", "mechanism": "m", "motif": "C", "moti": 1},
            "moti",
        ),
    ],
)
def test_a_rule_that_is_wrong_is_refused_by_name(entry: dict[str, object], word: str) -> None:
    with pytest.raises(QueryError) as caught:
        build_rule(entry, place="table.toml")
    assert "table.toml" in caught.value.message
    assert word in caught.value.message


def test_a_rule_is_got_by_its_id_or_refused() -> None:
    assert get_rule("n-boc-strong-acid").severity is Severity.SERIOUS
    with pytest.raises(RecordNotFound):
        get_rule("no-such-rule")


def test_every_rule_says_what_happens_what_to_do_and_where_it_stands_written() -> None:
    for rule in all_rules():
        assert rule.rule_id == rule.rule_id.lower()
        assert not rule.title.endswith(".")
        assert rule.mechanism.endswith(".")
        assert rule.do_instead
        assert rule.cited()
        assert rule.source_basis in ("memory", "common practice"), rule.rule_id
        assert parse_predicate(rule.when.text) == rule.when
