"""`record`, `runs`, `show`, `history`, `amend`, `withdraw`: flags, keys, exit status, nothing lost."""

from __future__ import annotations

import datetime as dt
import json
from pathlib import Path

import pytest

from tests.asking import ask, is_plain_refusal, widest

AZIDE = "CCC(C)Br.[Na+].[N-]=[N+]=[N-]>>CCC(C)N=[N+]=[N-]"
EVERY_FLAG = (
    *("--with", "NaN3=1.5", "--base", "K2CO3=2", "--acid", "AcOH=0.1", "--add", "NaI=5 mol%", "--solvent", "DMF:3"),
    *("--solvent", "water:1", "--temp", "0C to rt", "--time", "overnight", "--conc", "0.2 M", "--scale", "5 mmol"),
    *("--atmosphere", "N2", "--split", "substitution=88,elimination=10,unreacted=2", "--by", "nmr", "--yield", "76"),
    *("--assay-yield", "80", "--conversion", "98", "--ee", "12", "--product", "CC=CC", "--failed", "elimination"),
    *("--motif", "[CX4]Br", "--cause", "suspected", "--note", "smelled of alkene", "--ref", "AB-12", "--project", "P1"),
    *("--date", "2025-03-04", "--verdict", "partly", "--as", "AB"),
)


def test_every_flag_lands_in_the_run(empty_book: Path | str) -> None:
    run = ask("record", AZIDE, *EVERY_FLAG, "--json", book=empty_book).json
    assert run["code"] == "R-0001" and run["scheme"] == AZIDE
    assert (run["verdict"], run["note"], run["by"], run["date"]) == ("partly", "smelled of alkene", "AB", "2025-03-04")
    assert (run["reference"], run["project"]) == ("AB-12", "P1")
    conditions, outcome = run["conditions"], run["outcome"]
    named = {c["role"]: (c["name"], c.get("equiv"), c.get("loading_mol_pct")) for c in conditions["components"]}
    assert named == {
        "reagent": ("NaN3", 1.5, None),
        "base": ("K2CO3", 2.0, None),
        "acid": ("AcOH", 0.1, None),
        "additive": ("NaI", None, 5.0),
    }
    assert [(s["name"], s["parts"]) for s in conditions["solvents"]] == [("DMF", 3.0), ("water", 1.0)]
    assert conditions["temperature"]["text"] == "0C to rt" and conditions["temperature"]["start_c"] == 0.0
    assert conditions["time"]["text"] == "overnight"
    assert (conditions["conc_molar"], conditions["scale_mmol"], conditions["atmosphere"]) == (0.2, 5.0, "N2")
    shares = [(p["fate"], p.get("share"), p["method"]) for p in outcome["products"]]
    assert shares == [
        ("substitution", 0.88, "nmr"),
        ("elimination", 0.1, "nmr"),
        ("unreacted", 0.02, "nmr"),
        ("elimination", None, "nmr"),
    ]
    assert (outcome["isolated_yield_pct"], outcome["assay_yield_pct"]) == (76.0, 80.0)
    assert (outcome["conversion_pct"], outcome["ee_pct"]) == (98.0, 12.0)
    assert outcome["failures"] == [{"mode": "elimination", "motif": "[CX4]Br", "cause": "suspected"}]


def test_a_run_shown_and_recorded_elsewhere_is_the_same_run(empty_book: Path | str, tmp_path: Path) -> None:
    ask("record", AZIDE, *EVERY_FLAG, book=empty_book)
    shown = ask("show", "R-0001", "--json", book=empty_book)
    other = tmp_path / "other.sidepath"
    ask("new", book=other)
    assert ask("record", "--from", "-", book=other, stdin=shown.out).status == 0
    assert ask("show", "R-0001", "--json", book=other).json == shown.json


def test_every_run_of_the_demo_makes_that_round_trip(demo_book: Path, empty_book: Path | str) -> None:
    page = ask("runs", "--limit", "25", "--json", book=demo_book).json["items"]
    lines = "".join(json.dumps(run) + "\n" for run in page)
    assert ask("record", "--from", "-", book=empty_book, stdin=lines).status == 0
    for run in page:
        assert ask("show", run["code"], "--json", book=empty_book).json == run


@pytest.mark.parametrize("form", ["object", "list", "lines"])
def test_record_from_takes_one_run_a_list_or_lines(empty_book: Path | str, tmp_path: Path, form: str) -> None:
    runs = [{"scheme": "CCBr>>CCO"}, {"scheme": "CCI>>CCO", "note": "two"}]
    lines = "\n".join(map(json.dumps, runs))
    text = {"object": json.dumps(runs[0], indent=1), "list": json.dumps(runs), "lines": lines}
    file = tmp_path / "runs.json"
    file.write_text(text[form])
    answer = ask("record", "--from", str(file), "--json", book=empty_book)
    assert answer.status == 0
    stored = answer.json if isinstance(answer.json, list) else [answer.json]
    assert [run["scheme"] for run in stored] == [run["scheme"] for run in runs][: len(stored)]
    assert ask("runs", "--json", book=empty_book).json["total"] == len(stored) == (1 if form == "object" else 2)


def test_of_several_runs_all_are_kept_or_none(empty_book: Path | str) -> None:
    lines = '{"scheme":"CCBr>>CCO"}\n{"scheme":"C1CC>>CCO"}\n'
    answer = ask("record", "--from", "-", "--json", book=empty_book, stdin=lines)
    assert (answer.status, answer.error["code"]) == (1, "structure")
    assert "Run 2 of 2" in answer.error["message"]
    assert ask("runs", "--json", book=empty_book).json["total"] == 0
    there = ask("record", "CCI>>CCO", "--as", "AB", "--json", book=empty_book).out
    assert ask("record", "--from", "-", book=empty_book, stdin='{"scheme":"CCBr>>CCO"}\n' + there).status == 1
    assert ask("runs", "--json", book=empty_book).json["total"] == 1


def test_the_same_run_is_not_recorded_twice(empty_book: Path | str) -> None:
    ask("record", AZIDE, "--as", "AB", book=empty_book)
    shown = ask("show", "1", "--json", book=empty_book).out
    answer = ask("record", "--from", "-", "--json", book=empty_book, stdin=shown)
    assert (answer.status, answer.error["code"]) == (1, "conflict")
    assert ask("runs", "--json", book=empty_book).json["total"] == 1


def test_what_does_not_add_up_is_said_and_kept(empty_book: Path | str) -> None:
    answer = ask("record", AZIDE, "--split", "substitution=88,elimination=30", "--yield", "104", book=empty_book)
    assert answer.status == 0
    assert "CAUTION: The split does not add up" in answer.err and "Yield over 100 %" in answer.err
    assert ask("show", "1", "--json", book=empty_book).json["outcome"]["isolated_yield_pct"] == 104
    assert "No outcome is recorded" in ask("record", AZIDE, book=empty_book).err
    assert "not understood" in ask("record", "CCCC>>CCCO", "--yield", "3", book=empty_book).err


def test_nothing_given_is_dropped_without_a_word(empty_book: Path | str) -> None:
    for words in (
        ("--motif", "[CX4]"),
        ("--cause", "confirmed"),
        ("--by", "gc"),
        ("--with", "frobnicate"),
        ("--split", ""),
        ("--failed", "elimnation"),
    ):
        answer = ask("record", AZIDE, *words, book=empty_book)
        assert answer.status == 1 and is_plain_refusal(answer), words
    assert ask("record", AZIDE, "--from", "-", book=empty_book, stdin="{}").status == 2
    assert ask("record", "--from", "-", "--note", "x", book=empty_book, stdin="{}").status == 2


def test_runs_come_in_pages(demo_book: Path) -> None:
    first = ask("runs", "--limit", "3", "--json", book=demo_book).json
    second = ask("runs", "--limit", "3", "--page", "2", "--json", book=demo_book).json
    beyond = ask("runs", "--page", "9999", "--json", book=demo_book).json
    assert set(first) >= {"total", "page", "items"}
    assert len(first["items"]) == len(second["items"]) == 3
    assert not {r["code"] for r in first["items"]} & {r["code"] for r in second["items"]}
    dates = [r["date"] for r in (*first["items"], *second["items"])]
    assert dates == sorted(dates, reverse=True)
    assert beyond["items"] == [] and beyond["total"] == first["total"] >= 200
    assert widest(ask("runs", book=demo_book).out) <= 80


@pytest.mark.parametrize("name", ["R-0158", "r158", "158", "R158"])
def test_a_code_may_be_typed_as_it_is_said(demo_book: Path, name: str) -> None:
    assert ask("show", name, "--json", book=demo_book).json["code"] == "R-0158"


def test_an_amendment_keeps_old_value_who_when_and_why(own_demo_book: Path) -> None:
    before = ask("show", "158", "--json", book=own_demo_book).json
    answer = ask(
        *("amend", "158", "--set", "yield=14", "--set", "note=weighed again", "--why", "wet", "--as", "AB", "--json"),
        book=own_demo_book,
    )
    assert answer.status == 0
    run = answer.json
    assert (run["outcome"]["isolated_yield_pct"], run["note"], run["revision"]) == (14, "weighed again", 2)
    said = ask("history", "158", "--json", book=own_demo_book).json
    assert said["run"] == "R-0158"
    entry = said["history"][-1]
    assert (entry["action"], entry["who"], entry["why"]) == ("amend", "AB", "wet")
    assert dt.datetime.fromisoformat(entry["at"]).tzinfo is not None
    old = {c["field"].rpartition(".")[2]: c["from"] for c in entry["changed"]}
    assert old["isolated_yield_pct"] == before["outcome"]["isolated_yield_pct"] and old["note"] == before["note"]
    text = ask("history", "158", book=own_demo_book).out
    assert "amend by AB" in text and "wet" in text and widest(text) <= 80


def test_an_amendment_keeps_what_was_not_named(own_demo_book: Path) -> None:
    before = ask("show", "158", "--json", book=own_demo_book).json
    words = ("--set", "split=group-loss=90,unreacted=10", "--set", "cause=confirmed", "--why", "integrated again")
    after = ask("amend", "158", *words, "--as", "AB", "--json", book=own_demo_book).json
    assert [(p["share"], p["method"]) for p in after["outcome"]["products"]] == [(0.9, "nmr"), (0.1, "nmr")]
    failure = dict(before["outcome"]["failures"][0], cause="confirmed")
    assert after["outcome"]["failures"] == [failure]


@pytest.mark.parametrize(
    ("setting", "hint"),
    [
        ("yeild=3", "Did you mean yield?"),
        ("note", "has no ="),
        ("verdict=great", "worked, partly, failed"),
        ("scheme=C1CC>>CC", "not valid SMILES"),
        ("scheme=", "without a scheme"),
        ("date=2999-01-01", "future"),
        ("base=frobnicate", "frobnicate"),
        ("temp=-400C", "absolute zero"),
    ],
)
def test_a_bad_amendment_changes_nothing(own_demo_book: Path, setting: str, hint: str) -> None:
    answer = ask("amend", "158", "--set", setting, "--why", "x", book=own_demo_book)
    assert answer.status == 1 and is_plain_refusal(answer)
    assert hint in answer.err
    assert ask("show", "158", "--json", book=own_demo_book).json["revision"] == 1


def test_a_withdrawn_run_stays_readable_but_is_listed_and_found_no_more(own_demo_book: Path) -> None:
    total = ask("runs", "--json", book=own_demo_book).json["total"]
    assert ask("withdraw", "158", book=own_demo_book).status == 2
    run = ask("withdraw", "158", "--why", "wrong bottle", "--as", "AB", "--json", book=own_demo_book).json
    assert run["withdrawn_why"] == "wrong bottle"
    assert ask("show", "158", "--json", book=own_demo_book).json["withdrawn_why"] == "wrong bottle"
    assert ask("runs", "--json", book=own_demo_book).json["total"] == total - 1
    assert ask("runs", "--withdrawn", "--json", book=own_demo_book).json["total"] == total
    again = ask("withdraw", "158", "--why", "again", "--json", book=own_demo_book)
    assert (again.status, again.error["code"]) == (1, "conflict")
    back = ask("reinstate", "158", "--why", "right bottle after all", "--as", "AB", "--json", book=own_demo_book)
    assert (back.status, back.json["withdrawn_why"]) == (0, None)
    assert ask("runs", "--json", book=own_demo_book).json["total"] == total
    assert ask("reinstate", "158", "--why", "again", book=own_demo_book).status == 1


@pytest.mark.parametrize("command", ["show", "history"])
@pytest.mark.parametrize("name", ["R-9999", "nonsense", "00000000-0000-0000-0000-000000000000"])
def test_a_run_that_is_not_there_is_refused(demo_book: Path, command: str, name: str) -> None:
    answer = ask(command, name, "--json", book=demo_book)
    assert (answer.status, answer.error["code"]) == (1, "not-found")
