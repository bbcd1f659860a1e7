"""`read`: keys, words, exit status, batches."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from kb.vocabulary import CarbonClass, CentreFlag, Confidence, Fate, LeavingGroup
from tests.asking import ask, is_plain_refusal, widest

AZIDE = "CCC(C)Br.[Na+].[N-]=[N+]=[N-]>>CCC(C)N=[N+]=[N-]"
KEYS = {"scheme", "ok", "confidence", "fate", "centres", "nucleophile", "possible", "reason"}
CENTRE = {
    *("component", "atom", "atom_map", "carbon_class", "leaving_group", "leaving_atom", "leaving_atom_map", "flags"),
    "beta_hydrogens",
}


def test_a_reading_has_the_keys_of_the_contract() -> None:
    reading = ask("read", AZIDE, "--json").json
    assert set(reading) >= KEYS
    assert (reading["scheme"], reading["ok"], reading["confidence"], reading["fate"]) == (
        AZIDE,
        True,
        "matched",
        "substitution",
    )
    (centre,) = reading["centres"]
    assert set(centre) >= CENTRE
    assert (centre["component"], centre["atom"], centre["carbon_class"]) == (0, 2, "secondary")
    assert (centre["leaving_group"], centre["leaving_atom"]) == ("bromide", 4)
    assert set(reading["nucleophile"]) >= {"component", "atom", "atom_map", "class"}
    assert reading["nucleophile"]["class"] == "azide"
    assert all(set(p) >= {"fate", "product", "note"} for p in reading["possible"])
    assert {p["fate"] for p in reading["possible"]} >= {"substitution", "elimination"}


def test_maps_are_reported_and_may_be_ignored() -> None:
    mapped = "[CH3:1][CH2:2][Br:3].[I-:4]>>[CH3:1][CH2:2][I:4]"
    for words in (("read", mapped, "--json"), ("read", mapped, "--ignore-maps", "--json")):
        (centre,) = ask(*words).json["centres"]
        assert (centre["atom_map"], centre["leaving_atom_map"]) == (2, 3)


def test_the_words_are_those_of_the_contract() -> None:
    assert " ".join(Fate) == "substitution elimination rearranged transposed group-loss addition unreacted other"
    assert " ".join(CarbonClass) == "methyl primary secondary tertiary bridgehead vinyl aryl"
    assert " ".join(CentreFlag) == (
        "allylic benzylic propargylic alpha-carbonyl alpha-heteroatom beta-branched neopentyl ring small-ring "
        "homobenzylic"
    )
    assert " ".join(LeavingGroup) == (
        "fluoride chloride bromide iodide mesylate tosylate triflate sulfonate sulfate phosphate carboxylate hydroxyl "
        "alkoxide epoxide ammonium sulfonium diazonium nitro other"
    )
    assert set(Confidence) == {"matched", "inferred", "unresolved"}


@pytest.mark.parametrize("bad", ["C1CC", "C1CC>>CC", "CC>C", "CC(C)(C)(C)(C)C", "hello world"])
def test_a_bad_structure_is_refused_with_the_reason_in_both_forms(bad: str) -> None:
    answer = ask("read", bad, "--json")
    assert answer.status == 1
    assert is_plain_refusal(answer)
    reading = answer.json
    assert (reading["ok"], reading["confidence"], reading["centres"]) == (False, "unresolved", [])
    assert reading["reason"] and reading["error"]["code"] == "structure"


def test_what_is_parsed_but_not_resolved_is_an_answer_not_a_refusal() -> None:
    answer = ask("read", "CCCC>>CCCO", "--json")
    assert answer.status == 0
    assert answer.json["confidence"] == "unresolved" and answer.json["reason"]


def test_a_name_and_a_file_are_schemes_too(tmp_path: Path) -> None:
    assert ask("read", "tert-butyl bromide", "--json").json["centres"][0]["carbon_class"] == "tertiary"
    file = tmp_path / "step.rxn"
    block = Path(__file__).parents[1] / "data" / "displacement.rxn"
    file.write_text(block.read_text())
    assert ask("read", str(file), "--json").json["fate"] == "substitution"


def test_a_near_name_is_offered_not_taken() -> None:
    answer = ask("read", "potasium tert-butoxide")
    assert answer.status == 1
    assert "Did you mean potassium tert-butoxide" in answer.err


def test_a_batch_gives_one_line_a_row_in_order_bad_rows_included(tmp_path: Path) -> None:
    table = tmp_path / "steps.csv"
    table.write_text(f'id,step\n1,{AZIDE}\n2,C1CC\n3,\n4,"CCCC>>CCCO"\n')
    answer = ask("read", "--batch", str(table), "--column", "step")
    assert answer.status == 1
    lines = [json.loads(line) for line in answer.out.splitlines()]
    assert [line["ok"] for line in lines] == [True, False, False, True]
    assert [line["scheme"] for line in lines] == [AZIDE, "C1CC", "", "CCCC>>CCCO"]
    assert all(set(line) >= KEYS for line in lines)
    assert "2 of 4 rows could not be read" in answer.err


def test_a_batch_needs_its_column() -> None:
    assert ask("read", "--batch", "x.csv").status == 2
    assert ask("read", "CC", "--batch", "x.csv", "--column", "step").status == 2
    assert ask("read").status == 2


def test_a_batch_of_a_missing_file_or_column_is_refused(tmp_path: Path) -> None:
    table = tmp_path / "steps.csv"
    table.write_text("id,step\n1,CCBr\n")
    for file, column in ((tmp_path / "none.csv", "step"), (table, "scheme"), (tmp_path, "step")):
        answer = ask("read", "--batch", str(file), "--column", column)
        assert answer.status == 1
        assert is_plain_refusal(answer)


def test_the_text_fits_the_terminal() -> None:
    assert widest(ask("read", AZIDE).out) <= 80
    assert ask("read", AZIDE).out.startswith("matched: substitution")
