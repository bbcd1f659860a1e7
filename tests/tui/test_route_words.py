"""A route in words: the order of the steps, the flow at the edge, what a step says, what is applied where."""

from __future__ import annotations

from pathlib import Path

import pytest

from kb.record.finding import Interval
from kb.route.imagined import with_yield
from kb.route.ledger import reckon
from kb.route.sequence import Input, Material, Route, Step, StepYield
from tests.tui.fake_book import FakeBook
from tests.tui.fake_routes import a_route_file
from tui.route_state import MATTERS, TARGET, edit_name, lines_of, next_reason
from tui.route_words import (
    basis_words,
    findings_mark,
    improvement_words,
    need_cells,
    need_remarks,
    overall_lines,
    rests_words,
    route_texts,
    sequence_rows,
    step_cells,
    step_remarks,
    weakest_words,
)


def a_step(name: str, *inputs: str, pct: float = 50.0, low: float | None = None, high: float | None = None) -> Step:
    interval = Interval(mean=pct, low=pct if low is None else low, high=pct if high is None else high)
    return Step(
        name=name,
        yield_pct=StepYield(pct=interval, basis="given", note="as given in the file"),
        inputs=tuple(Input(name=one) for one in inputs),
    )


def a_route(*steps: Step) -> Route:
    made = {step.name for step in steps}
    used = dict.fromkeys(one.name for step in steps for one in step.inputs if one.name not in made)
    return Route(title="", steps=steps, materials=tuple(Material(name=name) for name in used))


def flow(route: Route) -> list[str]:
    """Return the drawing at the edge with the names."""
    return [line for row in sequence_rows(route) for line in (row.first + row.step.name, row.second.rstrip())]


def test_a_line_runs_down_the_edge_to_its_end() -> None:
    assert flow(a_route(a_step("a", "x"), a_step("b", "a"))) == ["● a", "│", "● b", "▼"]


def test_a_branch_stands_above_the_step_that_takes_it() -> None:
    route = a_route(a_step("a", "x"), a_step("s", "y"), a_step("t", "s"), a_step("b", "a"), a_step("c", "b", "t"))
    assert flow(route) == ["● a", "│", "● b", "│", "│ ● s", "│ │", "│ ● t", "├─╯", "● c", "▼"]
    rows = sequence_rows(route)
    assert [row.number for row in rows] == [1, 4, 2, 3, 5]
    assert [row.joins for row in rows] == [None, None, None, "c", None]


def test_a_branch_into_the_first_step_has_no_line_beside_it() -> None:
    route = a_route(a_step("s", "y"), a_step("a", "x", "s"), a_step("b", "a"))
    assert flow(route) == ["  ● s", "╭─╯", "● a", "│", "● b", "▼"]


def test_a_branch_of_a_branch_is_indented_twice() -> None:
    route = a_route(
        a_step("a", "x"), a_step("s", "y"), a_step("u", "z"), a_step("t", "s", "u"), a_step("b", "a", "t")
    )
    assert flow(route) == ["● a", "│", "│ ● s", "│ │", "│ │ ● u", "│ ├─╯", "│ ● t", "├─╯", "● b", "▼"]


def test_every_step_is_listed_once_however_often_it_is_taken() -> None:
    route = a_route(a_step("a", "x"), a_step("b", "a"), a_step("c", "b", "a"))
    assert sorted(row.step.name for row in sequence_rows(route)) == ["a", "b", "c"]


@pytest.mark.parametrize("width", [32, 36, 47, 80])
def test_bars_stand_under_each_other_and_lines_fit(width: int) -> None:
    route = a_route(
        a_step("a rather long name of a step", "x", pct=0.5),
        a_step("s", "y", pct=99, low=98, high=100),
        a_step("c", "a rather long name of a step", "s", pct=42, low=17, high=77),
    )
    cells = [step_cells(row, width) for row in sequence_rows(route)]
    assert all(len(line) <= width for line in cells)
    bars = {min(line.find(c) for c in "█▒·┃" if c in line) for line in cells}
    assert len(bars) == 1
    assert cells[0].endswith("0.5 %") and cells[2].endswith("42 %  (17–77)")


def test_a_step_says_what_is_weak_found_changed_and_where_its_yield_comes_from(tmp_path: Path) -> None:
    book = FakeBook()
    route = book.open_route(str(a_route_file(tmp_path)))
    found = book.imagine_route(route, {})
    rows = {row.step.name: row for row in sequence_rows(route)}
    entries = {e.step.name: e for e in found.ledger.entries}
    said = dict.fromkeys(rows, "")
    for name, row in rows.items():
        said[name] = "; ".join(t for t, _ in step_remarks(row, entries[name], None, name == "swap"))
    assert said["azide"].startswith("record: R-0001, R-0002; ")
    assert said["swap"].startswith("◀ weakest; !! serious, 1; estimate; ")
    assert said["side"].startswith("may be poor: cheap input; typed in the file; into join; ")
    changed = step_remarks(rows["join"], entries["join"], Interval(mean=61, low=61, high=61), False)
    assert changed[0] == ("≠ 61 % in the file", "changed")
    assert findings_mark(rows["side"].step) == ""
    assert "2 recorded runs" in rests_words(rows["azide"].step)
    imagined = with_yield(route, "join", 90).step("join")
    assert basis_words(imagined) == "typed here" and rests_words(imagined) == "90 %, typed here."


def test_the_sum_names_both_ways_the_amounts_and_what_bettering_buys(tmp_path: Path) -> None:
    book = FakeBook()
    base = book.imagine_route(book.open_route(str(a_route_file(tmp_path))), {}).ledger
    assert [word for word, _ in overall_lines(base, base, 60)] == ["Monte Carlo", "closed form"]
    better = reckon(with_yield(base.route, "join", 90))
    assert [word for word, _ in overall_lines(better, base, 60)] == ["Monte Carlo", "closed form", "in the file"]
    assert need_cells(base.needed[0], base)[3].endswith("EUR")
    bulk = next(n for n in base.needed if n.material == "bulk")
    assert need_cells(bulk, base)[3] == ""  # cheap by the chemist's word: no price is missed
    remarks = " ".join(need_remarks(base))
    assert "suffices nine times in ten; in closed form" in remarks and "Costs" in remarks
    assert base.weakest is not None and base.weakest.step in weakest_words(base)
    assert "save" in improvement_words(base, "join") and improvement_words(base, "no such step") == ""
    perfect = reckon(with_yield(a_route(a_step("a", "x")), "a", 100))
    assert weakest_words(perfect).startswith("No step is weak")
    assert set(route_texts(base, None)) == {"Markdown", "JSON"}


def test_edits_apply_in_order_and_one_bad_line_spoils_no_other(tmp_path: Path) -> None:
    book = FakeBook()
    route = book.open_route(str(a_route_file(tmp_path)))
    edits = {
        TARGET: "20 mmol",
        edit_name("swap", "solvent"): "DMF",
        edit_name("swap", "yield"): "77",
        edit_name("azide", "temperature"): "warmish",
        edit_name("join", "yield"): "lots",
        edit_name("join", MATTERS): "easy separation",
        edit_name("gone", "yield"): "10",  # a step of the file as it was before
    }
    found = book.imagine_route(route, edits)
    assert set(found.errors) == {edit_name("azide", "temperature"), edit_name("join", "yield")}
    swap = found.ledger.route.step("swap")
    assert swap.yield_pct.pct.mean == 77 and swap.findings == ()
    assert swap.plan is not None and [s.name for s in swap.plan.conditions.solvents] == ["DMF"]
    assert found.ledger.route.step("azide") == route.step("azide")
    assert found.ledger.route.step("join").forgiven == ("easy separation",)
    assert found.ledger.target_mmol == 20
    assert route.step("swap").yield_pct.pct.mean != 77  # the route itself is as it was


def test_lines_of_a_step_are_those_of_its_plan(tmp_path: Path) -> None:
    route = FakeBook().open_route(str(a_route_file(tmp_path)))
    assert lines_of(route.step("swap"))["reagent"] == "NaN3=1.5"
    assert set(lines_of(route.step("join")).values()) == {""}
    assert next_reason(route.step("side")) == "easy separation" and next_reason(route.step("join")) == "cheap input"
