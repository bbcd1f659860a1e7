"""`audit`, `route` and `report` as typed: answers, the contract's keys, pages, plain refusals."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest

from kb.audit.calibration import calibrate
from kb.book import Book
from kb.cli.render_audit import render_calibration
from tests.asking import ask, is_plain_refusal, widest

ROUTE = """
target = "2 g"
product = "NCCc1ccccc1"
[material.bromide]
smiles = "BrCCc1ccccc1"
[[step]]
name = "azide"
from = "bromide"
run = "R-0042"
[[step]]
name = "amine"
yield = "60 (50 to 70)"
"""


def test_calibration_says_how_far_to_trust_the_book(demo_path: Path) -> None:
    said = ask("audit", "calibration", "--json", book=demo_path).json
    assert said["asked"] > 300 and said["main_share"]["error"] < said["main_share"]["all_runs_error"]


def test_calibration_as_text_fits_a_terminal(demo: Book) -> None:
    text = render_calibration(calibrate(demo.view(), most=30))
    assert "expected from the book without it" in " ".join(text.split()) and widest(text) <= 80


@pytest.fixture
def route_file(tmp_path: Path) -> Path:
    path = tmp_path / "route.toml"
    path.write_text(ROUTE, encoding="utf-8")
    return path


def test_recurring_failures_come_costliest_first_with_their_runs(demo_path: Path) -> None:
    said = ask("audit", "recurring", "--json", book=demo_path).json
    lost = [cluster["lost_mmol"] for cluster in said["clusters"]]
    assert lost == sorted(lost, reverse=True) and len(lost) > 10
    assert all(cluster["count"] == len(cluster["runs"]) >= 2 for cluster in said["clusters"])
    text = ask("audit", "recurring", book=demo_path)
    assert "proposed rule" in text.out and widest(text.out) <= 80


def test_a_proposed_rule_is_adopted_by_its_number(demo_path: Path, tmp_path: Path) -> None:
    own = Path(shutil.copy(demo_path, tmp_path / "own.sidepath"))
    said = ask("audit", "recurring", "--json", book=own).json
    number = next(i for i, c in enumerate(said["clusters"], 1) if c["name"] == "group-loss/tertiary-alkyl-ester")
    adopted = ask("audit", "recurring", "--adopt", str(number), "--json", "--as", "MK", book=own)
    assert adopted.status == 0
    rules = ask("rule", "list", "--json", book=own).json
    assert [r["id"] for r in rules] == [adopted.json["id"]]
    assert rules[0]["when"] == said["clusters"][number - 1]["proposal"]["when"]
    for wrong in ("0", "999", "no such", "²"):
        assert is_plain_refusal(ask("audit", "recurring", "--adopt", wrong, "--as", "MK", book=own))


def test_replay_has_the_keys_of_the_contract_and_adds_up(demo_path: Path, tmp_path: Path) -> None:
    page = tmp_path / "replay.html"
    words = ("audit", "replay", "--since", "2025-06-10", "--html", str(page))
    said = ask(*words, "--json", book=demo_path).json
    assert {"failures", "warned", "missed", "successes", "false_alarms", "by_mode"} <= set(said)
    assert said["warned"] + said["missed"] == said["failures"]
    assert "Would the record have told us?" in page.read_text(encoding="utf-8")
    text = ask("audit", "replay", "--since", "2025-06-25", book=demo_path)
    assert text.status == 0 and widest(text.out) <= 80


def test_coverage_takes_planned_steps(demo_path: Path, tmp_path: Path) -> None:
    plan = tmp_path / "plan.toml"
    plan.write_text('scheme = "CCC(C)Br>>CCC(C)N=[N+]=[N-]"\nreagents = ["NaN3"]\nsolvents = ["DMF"]\n')
    said = ask("audit", "coverage", "--plan", str(plan), "--json", book=demo_path).json
    assert [e["scheme"] for e in said["experiments"]] == ["CCC(C)Br>>CCC(C)N=[N+]=[N-]"]
    text = ask("audit", "coverage", book=demo_path)
    assert "Experiments that would teach most".upper() in text.out.upper() and widest(text.out) <= 80
    plan.write_text("steps = 3")
    assert is_plain_refusal(ask("audit", "coverage", "--plan", str(plan), book=demo_path))


def test_a_route_has_the_keys_of_the_contract(demo_path: Path, route_file: Path) -> None:
    said = ask("route", str(route_file), "--json", book=demo_path).json
    assert {"steps", "overall_yield_pct", "needed_mmol", "weakest"} <= set(said)
    first = said["steps"][0]["yield_pct"]["mean"] / 100
    assert said["overall_yield_pct"]["mean"] == pytest.approx(100 * first * 0.6, rel=0.01)
    assert said["needed_mmol"] == pytest.approx(said["target_mmol"] / (first * 0.6), rel=0.001)
    better = ask("route", str(route_file), "--what-if", "amine=90", "--json", book=demo_path).json
    assert better["needed_mmol"] == pytest.approx(said["needed_mmol"] * 0.6 / 0.9, rel=0.001)
    text = ask("route", str(route_file), book=demo_path)
    assert "start from" in " ".join(text.out.split()) and widest(text.out) <= 80


@pytest.mark.parametrize("wrong", ["nothing=90", "amine=lots", "amine", "amine=140"])
def test_a_what_if_that_cannot_be_is_refused(demo_path: Path, route_file: Path, wrong: str) -> None:
    assert is_plain_refusal(ask("route", str(route_file), "--what-if", wrong, book=demo_path))


def test_a_report_of_a_run_a_route_and_a_plan(demo_path: Path, route_file: Path, tmp_path: Path) -> None:
    plan = tmp_path / "plan.toml"
    plan.write_text('scheme = "CCC(C)Br>>CCC(C)N=[N+]=[N-]"\nreagents = ["NaN3"]\nsolvents = ["DMF"]\n')
    for what, says in (("R-0040", "Run R-0040"), (str(route_file), "What goes in"), (str(plan), "A planned step")):
        page, words = tmp_path / "page.html", tmp_path / "page.md"
        assert ask("report", what, "--html", str(page), "--md", str(words), book=demo_path).status == 0
        assert says in page.read_text(encoding="utf-8") and says in words.read_text(encoding="utf-8")


@pytest.mark.parametrize(
    ("what", "target", "status"),
    [
        ("R-9999", "page.html", 1),
        ("R-0040", ".", 1),
        ("R-0040", "no/such/folder/page.html", 1),
        ("x.toml", "p.html", 1),
    ],
)
def test_a_report_that_cannot_be_written_is_refused(
    demo_path: Path, tmp_path: Path, what: str, target: str, status: int
) -> None:
    said = ask("report", what, "--html", str(tmp_path / target), book=demo_path)
    assert said.status == status and is_plain_refusal(said)


def test_a_report_needs_a_place(demo_path: Path) -> None:
    assert ask("report", "R-0040", book=demo_path).status == 2
