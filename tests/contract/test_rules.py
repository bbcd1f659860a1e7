"""`rule add list test retire`: house rules are tried, kept, used and retired."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.asking import ask, is_plain_refusal, widest

WHEN = "acidity >= strong and temperature_c >= 40"
MOTIF = "[CX4]OC(C)(C)C"
RULE = ("tert-butyl ethers in hot acid", "--when", WHEN, "--motif", MOTIF, "--why", "lost before", "--source", "R-0158")
TRIAL = {"id", "hits", "false_alarms", "undecided", "failures_in_book"}


def test_a_rule_is_tried_before_it_is_adopted(demo_book: Path) -> None:
    said = ask("rule", "test", "--when", WHEN, "--motif", MOTIF, "--json", book=demo_book).json
    assert set(said) == TRIAL and said["failures_in_book"] >= 45
    for code in said["hits"][:5]:
        run = ask("show", code, "--json", book=demo_book).json
        assert run["verdict"] == "failed" or run["outcome"]["failures"]


def test_a_rule_that_was_added_warns_until_it_is_retired(own_demo_book: Path) -> None:
    plan = ("check", "CC(C)(C)OC1CCNCC1", "--acid", "HCl", "--temp", "60C", "--json")
    added = ask("rule", "add", *RULE, "--severity", "serious", "--as", "AB", "--json", book=own_demo_book).json
    assert set(added) == TRIAL
    (listed,) = ask("rule", "list", "--json", book=own_demo_book).json
    assert (listed["id"], listed["when"], listed["motif"], listed["by"]) == (added["id"], WHEN, MOTIF, "AB")
    found = [f for f in ask(*plan, book=own_demo_book).json["findings"] if f["kind"] == "house-rule"]
    assert [(f["title"], f["severity"]) for f in found] == [(RULE[0], "serious")]
    assert ask("rule", "test", added["id"], "--json", book=own_demo_book).json["hits"] == added["hits"]
    assert ask("rule", "retire", added["id"], "--why", "too wide", "--as", "AB", book=own_demo_book).status == 0
    assert not [f for f in ask(*plan, book=own_demo_book).json["findings"] if f["kind"] == "house-rule"]
    (listed,) = ask("rule", "list", "--json", book=own_demo_book).json
    assert listed["retired_why"] == "too wide"
    assert widest(ask("rule", "list", book=own_demo_book).out) <= 80


@pytest.mark.parametrize(
    ("words", "status"),
    [
        (("add", "t", "--when", "__import__('os')", "--why", "x"), 1),
        (("add", "t", "--when", "foo > 3", "--why", "x"), 1),
        (("add", "t", "--when", "temperature_c >", "--why", "x"), 1),
        (("add", "t", "--when", "(" * 5000, "--why", "x"), 1),
        (("add", "t", "--when", " and ".join(["temperature_c > 3"] * 3000), "--why", "x"), 1),
        (("add", "t", "--when", "temperature_c > 3", "--motif", "[C", "--why", "x"), 1),
        (("add", "t" * 20_000, "--when", "temperature_c > 3", "--why", "x"), 1),
        (("add", "", "--when", "temperature_c > 3", "--why", "x"), 1),
        (("add", "t", "--when", "", "--why", "x"), 1),
        (("add", "t", "--when", "temperature_c > 3", "--severity", "awful", "--why", "x"), 2),
        (("add", "t", "--when", "temperature_c > 3"), 2),
        (("add",), 2),
        (("test",), 2),
        (("test", "x", "--when", "temperature_c > 3"), 2),
        (("test", "nope"), 1),
        (("retire", "nope", "--why", "x"), 1),
        (("retire", "nope"), 2),
        ((), 2),
        (("frobnicate",), 2),
    ],
)
def test_what_is_no_rule_is_refused(own_demo_book: Path, words: tuple[str, ...], status: int) -> None:
    answer = ask("rule", *words, book=own_demo_book)
    assert answer.status == status and is_plain_refusal(answer)
    assert ask("rule", "list", "--json", book=own_demo_book).json == []
