"""The desk keeps to the port and passes on what the real book answers, from several threads at once."""

from __future__ import annotations

import inspect
import subprocess
import sys
import threading
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path

import pytest

from kb.errors import NameUnknown, QueryError, SidepathError, StoreMissing
from kb.vocabulary import Role, Verdict
from tests.tui.fake_book import FakeBook, a_run
from tui.desk import Desk
from tui.opening import DeskOpener
from tui.ports import BookPort, FindQuery, RunQuery
from tui.serving import serve_on_loopback, serving_command


@pytest.fixture
def desk(tmp_path: Path) -> Iterator[Desk]:
    place = tmp_path / "group.sidepath"
    made = DeskOpener().create(str(place))
    for number in range(1, 8):
        verdict = Verdict.FAILED if number == 3 else Verdict.WORKED
        made.add(replace(a_run(number), code=None, verdict=verdict, note=f"emulsion {number}"), "JM")
    assert isinstance(made, Desk)
    yield made
    made.close()


@pytest.mark.parametrize("keeper", [Desk, FakeBook])
def test_the_port_is_kept_by_name_and_by_argument(keeper: type) -> None:
    for name, method in inspect.getmembers(BookPort, inspect.isfunction):
        if not name.startswith("_"):
            wanted = list(inspect.signature(method).parameters)
            assert list(inspect.signature(getattr(keeper, name)).parameters) == wanted, name
    for name in ("place", "is_read_only"):
        assert hasattr(keeper, name)


def test_pages_run_both_ways(desk: Desk) -> None:
    falling = desk.page(RunQuery(limit=3))
    assert (falling.total, len(falling.runs)) == (7, 3)
    codes = [r.code for r in desk.page(RunQuery(limit=100)).runs]
    assert [r.code for r in falling.runs] == codes[:3]
    rising: list[str | None] = []
    for offset in (0, 3, 6):
        rising += [r.code for r in desk.page(RunQuery(limit=3, offset=offset, is_ascending=True)).runs]
    assert rising == codes[::-1]


def test_pages_are_narrowed_by_words_verdict_and_code(desk: Desk) -> None:
    assert desk.page(RunQuery(verdict="failed")).total == 1
    assert desk.page(RunQuery(words="emulsion")).total == 7
    code = desk.page(RunQuery(limit=1)).runs[0].code or ""
    assert [r.code for r in desk.page(RunQuery(words=code)).runs] == [code]


def test_searches_give_runs_with_the_atoms_that_matched(desk: Desk) -> None:
    found = desk.find(FindQuery(substructure="OS(C)(=O)=O", verdict="failed"))
    assert found.total == 1
    assert len(found.hits[0].atoms) == 5
    assert found.hits[0].smiles
    with pytest.raises(QueryError):
        desk.find(FindQuery(substructure="C("))
    with pytest.raises(SidepathError):
        desk.find(FindQuery(similar="CCO", at_least="much"))


def test_names_are_resolved_and_offered(desk: Desk) -> None:
    assert desk.resolve_component("NaN3=1.5", Role.REAGENT).equiv == 1.5
    assert desk.resolve_solvent("THF:4").parts == 4
    with pytest.raises(NameUnknown):
        desk.resolve_solvent("quicksilver water of life")
    assert desk.lookup("sodium azid", "reagent")[0].name == "sodium azide"
    assert desk.lookup("DMF", "solvent") == ()
    assert desk.lookup("K2C", "reagent")[0].name == "K2CO3"
    assert all(offer.name.casefold().startswith("tetrahyd") for offer in desk.lookup("tetrahyd", "solvent")[:2])


def test_changes_are_told_in_words(desk: Desk) -> None:
    run = desk.page(RunQuery(limit=1)).runs[0]
    code = run.code or ""
    desk.amend(code, {"note": "dried again"}, "AB", "wet", run.revision)
    lines = desk.history(code)
    assert lines[0].what == "recorded"
    assert "dried again" in lines[1].what
    assert (lines[1].who, lines[1].why) == ("AB", "wet")
    assert desk.withdraw(code, "wrong", "AB").is_withdrawn
    assert desk.count() == 6


def test_drafts_are_kept_in_the_book(desk: Desk) -> None:
    desk.save_draft("run-1", {"scheme": "CCBr"})
    assert desk.load_draft("run-1") == {"scheme": "CCBr"}
    assert [d.title for d in desk.list_drafts()] == ["CCBr"]
    desk.delete_draft("run-1")
    assert desk.load_draft("run-1") is None


def test_several_threads_ask_at_once(desk: Desk) -> None:
    from tui.plan_state import read_plan

    plan = read_plan({"scheme": a_run().scheme, "reagent": "NaN3=1.5", "solvent": "DMF"}, desk).plan
    errors: list[BaseException] = []

    def work(call: object) -> None:
        try:
            for _ in range(3):
                call()  # type: ignore[operator]
        except BaseException as error:  # noqa: BLE001 - reported below
            errors.append(error)

    calls = (
        lambda: desk.check(plan),
        lambda: desk.page(RunQuery()),
        lambda: desk.find(FindQuery(words="emulsion")),
        lambda: desk.save_draft("plan", {"scheme": "CC"}),
        lambda: desk.what_if(plan, (20.0, 60.0)),
    )
    threads = [threading.Thread(target=work, args=(call,)) for call in calls]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join(60)
    assert errors == []


def test_a_missing_book_is_refused(tmp_path: Path) -> None:
    with pytest.raises(StoreMissing):
        DeskOpener().open(str(tmp_path / "nothing.sidepath"))


def test_only_this_machine_is_served() -> None:
    with pytest.raises(SidepathError, match="not this machine"):
        serve_on_loopback(None, None, 8317, host="0.0.0.0")
    command = serving_command("my book.sidepath", "J M")
    assert command.endswith("--book 'my book.sidepath' --as 'J M' tui")


def test_the_first_paint_loads_neither_the_book_nor_chemistry_nor_the_plot() -> None:
    names = ("rdkit", "sqlalchemy", "numpy", "plotext")
    script = f"import sys, tui.application; print([m for m in {names} if m in sys.modules])"
    result = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    assert result.stdout.strip() == "[]"
