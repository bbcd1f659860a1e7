"""A route on the demo book, the real one: opened, looked into, changed, planned, handed round; the file untouched."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest

from kb import paths
from kb.book import build_demo
from kb.errors import InvalidRecord, RecordNotFound
from kb.progress import Silent
from tests.tui.driving import on_screen, pressed, settled, typed
from tui.application import SidepathApp
from tui.desk import Desk
from tui.opening import DeskOpener
from tui.route_state import edit_name
from tui.screens.planning import PlanningScreen
from tui.screens.route import RoutePlace
from tui.screens.run_detail import RunScreen
from tui.widgets.route_sequence import RouteSequence


@pytest.fixture(scope="module")
def demo_path(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path, _ = build_demo(str(tmp_path_factory.mktemp("demo") / "demo.sidepath"), Silent())
    return path


@pytest.fixture(autouse=True)
def own_list(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Keep the list of recent files in a folder of the test."""
    monkeypatch.setattr(paths, "recent_routes_file", lambda: tmp_path / "state" / "recent.json")


async def test_the_demo_route_from_the_example_to_a_page(demo_path: Path, tmp_path: Path) -> None:
    shipped = paths.shipped("seed_demo") / "route.toml"
    before = shipped.read_bytes()
    app = SidepathApp(DeskOpener(), place=str(demo_path), who="AB")
    async with app.run_test(size=(120, 40)) as pilot:
        while app.book is None:
            await answered(pilot)
        await pilot.press("f6", "e")
        await answered(pilot)
        screen = app.screen
        assert isinstance(screen, RoutePlace), on_screen(app)
        while screen._ledger is None:
            await answered(pilot)
        steps = screen.query_one(RouteSequence)
        assert [row.step.name for row in steps._rows] == ["azide", "free amine", "bromide", "join"]
        ledger = screen._ledger
        assert ledger.weakest is not None and ledger.weakest.unit == "EUR"
        await pressed(pilot, "enter")
        await answered(pilot)
        await pressed(pilot, "enter")
        await answered(pilot)
        assert isinstance(app.screen, RunScreen) and app.screen.shown_run is not None
        assert app.screen.shown_run.code in ("R-0001", "R-0006")
        await pressed(pilot, "escape", "escape", "end", "c")
        await typed(pilot, "#field-temperature", "130 C")
        await answered(pilot)
        changed = screen._ledger
        assert changed.overall_pct != ledger.overall_pct
        assert "published rates" in changed.route.step("join").yield_pct.note
        await typed(pilot, "#field-wanted", "5 g")
        await answered(pilot)
        assert screen._ledger.target_mmol == pytest.approx(2.5 * ledger.target_mmol)
        page = tmp_path / "page.html"
        await pressed(pilot, "escape", "f9")
        app.screen.query_one("#line-input").value = str(page)
        await pressed(pilot, "enter")
        await answered(pilot)
        assert "4-Azido-1-phenethylpiperidine" in page.read_text(encoding="utf-8")
        await pressed(pilot, "p")
        await answered(pilot)
        assert isinstance(app.screen, PlanningScreen)
        assert app.screen.form.state["temperature"] == "130 C"
        app.book.close()
    assert shipped.read_bytes() == before


async def answered(pilot: Any) -> None:
    """Wait for the book, however long this machine takes."""
    for _ in range(40):
        try:
            await settled(pilot, 4)
        except AssertionError:
            continue
        return
    raise AssertionError("no answer came")


def test_the_desk_keeps_what_it_checked_and_saves_pages_only_to_new_files(demo_path: Path, tmp_path: Path) -> None:
    desk = Desk(str(demo_path), read_only=True)
    try:
        route = desk.open_route(desk.route_example())
        edits = {edit_name("join", "temperature"): "90 C"}
        first = desk.imagine_route(route, edits)
        asked: list[object] = []
        desk._lend_for_routes = lambda: asked.append(1)  # type: ignore[assignment, return-value]
        again = desk.imagine_route(route, {**edits, edit_name("azide", "yield"): "90"})
        assert not asked  # the step with other conditions was not checked again
        assert again.ledger.route.step("join") == first.ledger.route.step("join")
        del desk._lend_for_routes
        page = tmp_path / "page.md"
        assert desk.save_page(first.ledger, str(page)) == str(page)
        assert "What goes in" in page.read_text(encoding="utf-8")
        for wrong, why in ((page, "is there already"), (tmp_path / "route.toml", "is no name for a page")):
            with pytest.raises(InvalidRecord, match=why):
                desk.save_page(first.ledger, str(wrong))
        place = str(tmp_path / "a.toml")
        Path(place).touch()
        desk.remember_route(place)
        assert desk.recent_routes() == (place,)
    finally:
        desk.close()


def test_the_example_is_refused_on_another_book(tmp_path: Path) -> None:
    DeskOpener().create(str(tmp_path / "own.sidepath")).close()
    desk = Desk(str(tmp_path / "own.sidepath"))
    try:
        with pytest.raises(RecordNotFound, match="another book is open"):
            desk.route_example()
    finally:
        desk.close()
