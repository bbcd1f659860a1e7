"""The head of a group on the demo book: what keeps going wrong, the runs behind it, a rule adopted and in force."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest

from kb.book import build_demo, open_book
from kb.progress import Silent
from tests.tui.driving import on_screen, pressed, settled
from tui.application import SidepathApp
from tui.opening import DeskOpener
from tui.screens.failures_adopt import AdoptScreen
from tui.screens.failures_runs import RunsBehindScreen
from tui.widgets.recurring_view import RecurringView


@pytest.fixture(scope="module")
def demo_path(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path, _ = build_demo(str(tmp_path_factory.mktemp("demo") / "demo.sidepath"), Silent())
    return path


async def test_from_the_costliest_failure_to_a_rule_in_force(demo_path: Path, tmp_path: Path) -> None:
    place = Path(shutil.copy(demo_path, tmp_path / "own.sidepath"))
    app = SidepathApp(DeskOpener(), place=str(place), who="GH")
    async with app.run_test(size=(120, 40)) as pilot:
        while app.book is None:
            await settled(pilot)
        await pilot.press("f5")
        await _answered(app, pilot)
        view = app.screen.query_one(RecurringView)
        assert view.audit is not None
        names = [c.name for c in view._clusters]
        assert "group-loss/tertiary-alkyl-ester" in names
        await pressed(pilot, *["down"] * names.index("group-loss/tertiary-alkyl-ester"))
        cluster = view.cluster
        assert cluster is not None and cluster.proposal is not None
        drawing = app.screen.query_one("#recurring-drawing").drawing
        assert drawing.left[0].drawing.marks[0].atoms == cluster.example[1]
        await pressed(pilot, "r")
        assert isinstance(app.screen, RunsBehindScreen)
        assert app.screen.shown_run is not None and app.screen.shown_run.code == cluster.runs[0]
        await pressed(pilot, "escape", "a")
        assert isinstance(app.screen, AdoptScreen)
        told = cluster.title
        await pilot.press("enter")
        await _answered(app, pilot)
        assert view.cluster is not None and view.cluster.name == cluster.name
        assert view.cluster.covered_by and view.cluster.covered_by[0][1] == len(cluster.proposal.trial.hits)
        app.screen.action_copy_as("Markdown")
        await _answered(app, pilot)
        assert "What keeps going wrong" in app.clipboard and told in app.clipboard
        await pilot.press("2")
        await _answered(app, pilot)
        assert f"{view.audit.failures} failures in" in on_screen(app)
        await pilot.press("4")
        await _answered(app, pilot)
        assert "Experiments that would teach most" in on_screen(app)
        app.book.close()
    with open_book(str(place), read_only=True) as book:
        (rule,) = [r for r in book.rules() if r.author == "GH"]
        assert rule.when == cluster.proposal.rule.when


async def _answered(app: SidepathApp, pilot: object) -> None:
    """Wait for an answer of the record, however long this machine takes."""
    for _ in range(40):
        try:
            await settled(pilot, 4)  # type: ignore[arg-type]
        except AssertionError:
            continue
        return
    raise AssertionError("no answer came")
