"""Route files: the format as documented, JSON and TOML alike, and plain refusals."""

from __future__ import annotations

import json
import tomllib
from pathlib import Path
from typing import Any

import pytest

from kb.book import build_demo, open_book
from kb.book.routes import reckon_route
from kb.errors import ImportFileError, InvalidRecord, QuantityError, RecordNotFound
from kb.progress import Silent
from kb.route import routefile
from kb.route.routefile import draft_route, parse_yield, read_route


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
        from kb.book.routes import resolve_route

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
    ],
)
def test_files_that_do_not_fit_are_refused_with_the_place(words: Any, sentence: str) -> None:
    with pytest.raises(InvalidRecord, match=sentence):
        draft_route(words)


@pytest.mark.parametrize("content", [b"title = ", b"\xff\xfe\x00", b"{", b"[" * 5000])
def test_broken_files_are_refused(tmp_path: Path, content: bytes) -> None:
    for name in ("a.toml", "a.json"):
        path = tmp_path / name
        path.write_bytes(content)
        with pytest.raises((ImportFileError, InvalidRecord)):
            read_route(path)
    with pytest.raises(ImportFileError):
        read_route(tmp_path / "nowhere.toml")
