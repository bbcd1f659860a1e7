"""Route files: the format as documented, JSON and TOML alike, and plain refusals."""

from __future__ import annotations

import dataclasses
import json
import tomllib
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from kb import paths
from kb.book import Book, build_demo, open_book
from kb.book.routes import open_route, recheck_step, reckon_route, resolve_route
from kb.errors import Cancelled, ImportFileError, InvalidRecord, NameUnknown, QuantityError, RecordNotFound
from kb.progress import Silent
from kb.quantity import parse_temperature
from kb.route import routefile
from kb.route.ledger import reckon
from kb.route.routefile import draft_route, parse_yield, read_route
from kb.vocabulary import Fate


def documented() -> str:
    """Return the example that stands in the module's own text."""
    lines = (routefile.__doc__ or "").splitlines()
    return "\n".join(line[4:] for line in lines if line.startswith("    ") or not line.strip())


def test_the_documented_example_reads_and_reckons(tmp_path: Path) -> None:
    path = tmp_path / "route.toml"
    path.write_text(documented(), encoding="utf-8")
    draft = read_route(path)
    assert [s.name for s in draft.steps] == ["azide", "amine", "amide"]
    assert draft.steps[1].inputs[0].name == "azide"
    assert draft.steps[1].forgiven == ("cheap input",)
    assert draft.steps[2].inputs[1].equiv == 1.2
    assert {m.name for m in draft.materials} == {"bromide", "anhydride"}
    assert draft.target_mmol == pytest.approx(2000 / 163.22, rel=1e-3)
    book_path, _ = build_demo(str(tmp_path / "demo.sidepath"), Silent())
    with open_book(book_path, read_only=True) as book:
        ledger = reckon_route(book, path)
        assert [e.step.yield_pct.basis for e in ledger.entries][:2] == ["recorded", "given"]
        recorded = ledger.entries[0].step.yield_pct.pct
        assert recorded.mean == pytest.approx(book.get("R-0042").outcome.yield_pct)
        assert recorded.low < recorded.mean
        answer = ledger.as_dict()
        assert {"steps", "overall_yield_pct", "needed_mmol", "weakest"} <= set(answer)
        assert set(answer["overall_yield_pct"]) == {"mean", "low", "high"}
        json.dumps(answer)
        lost = draft_route({"step": [{"run": "R-9999"}]})
        with pytest.raises(RecordNotFound):
            resolve_route(book, lost)
        with pytest.raises(InvalidRecord, match="cannot be read"):
            resolve_route(book, draft_route({"step": [{"plan": {"scheme": "C1CC>>CC"}}]}))
        planned = {
            "scheme": "CCCCBr>>CCCCN=[N+]=[N-]",
            "reagents": ["NaN3=1.5"],
            "solvents": ["DMF"],
            "temperature": "60 C",
        }
        estimated = resolve_route(book, draft_route({"step": [{"plan": planned}]})).steps[0].yield_pct
        check = book.check(_plan(planned)).estimate.yield_pct
        assert check is not None and estimated.basis == "estimated"
        assert estimated.pct.mean == pytest.approx(check.mean, abs=0.1)


def _plan(words: dict[str, Any]) -> Any:
    from kb.book import plan_from_words

    return plan_from_words(words)


def test_json_reads_like_toml(tmp_path: Path) -> None:
    words = tomllib.loads(documented())
    path = tmp_path / "route.json"
    path.write_text(json.dumps(words), encoding="utf-8")
    draft = read_route(path)
    assert draft == draft_route(words, "route")


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        (82, (82, 82, 82)),
        ("82 %", (82, 82, 82)),
        ("82 (75 to 89)", (82, 75, 89)),
        ("82 % (75-89 %)", (82, 75, 89)),
        ("75 – 89", (82, 75, 89)),
        ("82,5 (75 to 90)", (82.5, 75, 90)),
    ],
)
def test_yields_are_read_as_written(text: object, expected: tuple[float, float, float]) -> None:
    got = parse_yield(text)
    assert (got.mean, got.low, got.high) == pytest.approx(expected)


@pytest.mark.parametrize("text", ["good", "", "110", "0", -4, True, None, "60 (70 to 80)", "nan", "1e999", [82]])
def test_yields_that_cannot_be_are_refused(text: object) -> None:
    with pytest.raises((InvalidRecord, QuantityError)):
        parse_yield(text)


@pytest.mark.parametrize(
    ("words", "sentence"),
    [
        ([], "is no table"),
        ({"step": []}, "no steps"),
        ({"steps": [{"yield": 50}]}, "has no 'steps'"),
        ({"step": [{}]}, "Step 1 has no yield"),
        ({"step": [{"yield": 50, "run": "R-1"}]}, "yield and run"),
        ({"step": [{"yield": 50, "from": 3}]}, "from holds 3"),
        ({"step": [{"yield": 50, "cheap_input": "yes"}]}, "cheap_input"),
        ({"step": [{"yield": 50}], "target": "2 g"}, "molar mass is not known"),
        ({"step": [{"yield": 50}], "target": 2}, "target is 2"),
        ({"step": [{"yield": 50}], "material": {"x": {}}}, "goes into no step"),
        ({"step": [{"yield": 50}], "material": {"starting material": {"smiles": "C1CC"}}}, "no structure"),
        ({"step": [{"yield": 50, "cost_per_mmol": -1}]}, "cost_per_mmol"),
        ({"step": [{"run": [4]}]}, "run is"),
        ({"step": [{"yeild": 50}]}, "has no 'yeild'. Did you mean 'yield'"),
        ({"step": [{"yield": 50}], "product": "C1CC"}, "The product: 'C1CC' is no structure"),
        ({"step": [{"yield": 50, "product": "C1CC"}]}, "product of step 1: 'C1CC' is no structure"),
        ({"step": [{"yield": 50, "from": [{"name": "a", "equiv": -1}]}]}, "equiv is -1"),
        ({"step": [{"plan": {"scheme": "CBr>>CC", "solvents": 3}}]}, "plan of step 1: solvents is 3"),
        ({"step": [{"plan": {"scheme": "CBr>>CC", "temperature": 60}}]}, "temperature is 60"),
        ({"step": [{"run": "R-0001", "plan": {"scheme": "CBr>>CC"}}]}, "run and plan"),
        ({"step": [{"yield": 50}] * 201}, "201 steps"),
    ],
)
def test_files_that_do_not_fit_are_refused_with_the_place(words: Any, sentence: str) -> None:
    with pytest.raises(InvalidRecord, match=sentence):
        draft_route(words)


def test_no_equivalents_at_all_are_refused_and_not_taken_for_one() -> None:
    with pytest.raises(InvalidRecord, match="takes 0 equiv"):
        resolve_route(NoBook(), draft_route({"step": [{"yield": 50, "from": [{"name": "a", "equiv": 0}]}]}))


def test_a_file_says_why_it_cannot_be_read(tmp_path: Path) -> None:
    (tmp_path / "folder.toml").mkdir()
    (tmp_path / "huge.toml").write_text("# " + "x" * 1_000_001)
    for name, why in (("nowhere.toml", "is not there"), ("folder.toml", "is a folder"), ("huge.toml", "no route is")):
        with pytest.raises(ImportFileError, match=why):
            read_route(tmp_path / name)
    with pytest.raises(ImportFileError, match="cannot be read"):
        read_route(Path("/dev/zero"))


class NoBook:
    """A book that nobody may ask: the shape of a route is refused before anything is looked up."""


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Book]:
    place, _ = build_demo(str(tmp_path_factory.mktemp("demo") / "demo.sidepath"), Silent())
    with open_book(place, read_only=True) as book:
        yield book


def test_the_shipped_route_is_convergent_and_has_every_kind_of_step(demo: Book) -> None:
    seen: list[tuple[int, int | None, str]] = []

    class Watched(Silent):
        def advance(self, done: int, total: int | None, note: str = "") -> None:
            seen.append((done, total, note))

    route = open_route(demo, paths.shipped("seed_demo") / "route.toml", Watched())
    assert [s.yield_pct.basis for s in route.steps] == ["recorded", "estimated", "given", "estimated"]
    assert [s.name for s in route.main_line] == ["azide", "free amine", "join"]
    assert route.joins("bromide") == ("join", 1.2)
    assert seen[0] == (0, 4, "azide") and seen[-1][:2] == (4, 4)
    recorded = route.step("azide")
    assert recorded.plan is not None and recorded.plan.scheme == demo.get("R-0006").scheme
    assert recorded.assessment is not None and recorded.findings
    assert "resemblance:R-0006" not in {f.rule_id for f in recorded.assessment.findings}
    given = route.step("bromide")
    assert given.yield_pct.pct.mean == 62 and given.assessment is not None
    ledger = reckon(route)
    assert ledger.reckoned_in == "EUR" and ledger.weakest is not None and ledger.weakest.step != "bromide"
    assert len(ledger.needed) == 2 and all(n.closed_low is not None for n in ledger.needed)


def test_a_step_is_checked_anew_with_other_conditions(demo: Book) -> None:
    route = open_route(demo, paths.shipped("seed_demo") / "route.toml")
    step = route.step("join")
    assert step.plan is not None
    warm, hot = (
        dataclasses.replace(step.plan, conditions=dataclasses.replace(step.plan.conditions, temperature=t))
        for t in (parse_temperature("90 C"), parse_temperature("130 C"))
    )
    changed = recheck_step(demo, step, warm)
    estimate = demo.check(warm, top=8).estimate
    assert estimate.yield_pct is not None and estimate.yield_runs
    assert changed.yield_pct.pct.mean == pytest.approx(estimate.yield_pct.mean, abs=0.1)
    assert changed.yield_pct.runs == estimate.yield_runs
    assert changed.inputs == step.inputs and changed.plan is warm
    rare = recheck_step(demo, step, hot)  # so hot that no yield is on record: a share alone is not taken for a yield
    estimate = demo.check(hot, top=8).estimate
    assert estimate.yield_pct is None
    share = dict(estimate.fates)[Fate.SUBSTITUTION]
    assert rare.yield_pct.pct.mean == pytest.approx(90 * share.mean, abs=0.1)
    assert "from published rates" in rare.yield_pct.note and "no yield on record" in rare.yield_pct.note
    assert rare.yield_pct.runs == tuple(code for code, _ in estimate.runs)


def test_looking_up_can_be_stopped(demo: Book) -> None:
    class Stopped(Silent):
        def cancelled(self) -> bool:
            return True

    with pytest.raises(Cancelled):
        open_route(demo, paths.shipped("seed_demo") / "route.toml", Stopped())


def test_a_bad_condition_names_its_step(demo: Book) -> None:
    draft = draft_route({"step": [{"name": "one", "plan": {"scheme": "CCBr>>CCN", "solvents": ["DFMX"]}}]})
    with pytest.raises(NameUnknown, match=r"Step 'one': No solvent is called .DFMX"):
        resolve_route(demo, draft)
    with pytest.raises(InvalidRecord, match="has no scheme"):
        resolve_route(demo, draft_route({"step": [{"plan": {"solvents": ["DMF"]}}]}))


@pytest.mark.parametrize("content", [b"title = ", b"\xff\xfe\x00", b"{", b"[" * 5000])
def test_broken_files_are_refused(tmp_path: Path, content: bytes) -> None:
    for name in ("a.toml", "a.json"):
        path = tmp_path / name
        path.write_bytes(content)
        with pytest.raises((ImportFileError, InvalidRecord)):
            read_route(path)
    with pytest.raises(ImportFileError):
        read_route(tmp_path / "nowhere.toml")
