"""Keys, help and palette: every action has an id, words and a key or a command.

Help lists what works here.
"""

from __future__ import annotations

import pytest
from textual.binding import Binding
from textual.command import CommandPalette
from textual.widgets import Input

from tests.tui.driving import driven, on_screen, pressed, settled
from tests.tui.fake_book import MESYLATE, FakeBook
from tests.tui.test_planning import planned
from tui.application import SidepathApp
from tui.palette import ActionProvider
from tui.screens import (
    asking,
    base,
    copying,
    drafts,
    entry,
    failures,
    failures_adopt,
    failures_runs,
    finding,
    finding_detail,
    firstrun,
    planning,
    route,
    route_files,
    route_runs,
    run_actions,
    run_detail,
    runs,
)
from tui.screens.copying import CopyScreen
from tui.screens.help import HelpScreen
from tui.themes import THEMES
from tui.widgets import cards, estimate, route_sequence, step_form, tick_list

OWNERS = [
    SidepathApp,
    base.AskingScreen,
    planning.PlanningScreen,
    route.RoutePlace,
    route_files.RouteFilesScreen,
    route_runs.RunsBehindScreen,
    route_sequence.RouteSequence,
    runs.RunsScreen,
    run_actions.RunActions,
    finding.FindingPlace,
    failures.FailuresPlace,
    failures_runs.RunsBehindScreen,
    failures_adopt.AdoptScreen,
    entry.EntryScreen,
    firstrun.FirstRunScreen,
    drafts.DraftsScreen,
    copying.CopyScreen,
    run_detail.RunScreen,
    finding_detail.FindingScreen,
    asking.WordsScreen,
    asking.LineScreen,
    cards.HitCard,
    estimate.EstimateBars,
    step_form.LineInput,
    tick_list.TickList,
]


def test_every_binding_has_an_id_of_its_own_and_says_what_it_does() -> None:
    seen: dict[str, str] = {}
    for owner in OWNERS:
        for binding in owner.__dict__.get("BINDINGS", []):
            assert isinstance(binding, Binding), owner
            assert binding.id, (owner, binding)
            assert binding.description
            assert binding.tooltip or not binding.show, (owner, binding)
            assert seen.setdefault(binding.id, owner.__name__) == owner.__name__ or owner is runs.RunsScreen


@pytest.mark.parametrize("owner", OWNERS, ids=lambda o: o.__name__)
def test_every_binding_leads_to_an_action(owner: type) -> None:
    for binding in owner.__dict__.get("BINDINGS", []):
        name = binding.action.split("(")[0]
        holder: type = SidepathApp if name.startswith("app.") else owner
        assert hasattr(holder, f"action_{name.removeprefix('app.')}"), (owner, binding.action)


async def test_help_names_the_place_and_its_keys_and_the_marks() -> None:
    async with driven(size=(100, 50)) as (app, pilot):
        for place, words in (
            ("f2", "The answer follows while you type"),
            ("f3", "narrow the list"),
            ("f4", "Enter searches"),
            ("f6", "Route. Opens a route file"),
            ("f5", "The record as a whole, in five parts"),
        ):
            await pressed(pilot, place)
            await pressed(pilot, "f1")
            assert isinstance(app.screen, HelpScreen)
            text = " ".join(on_screen(app).split())
            assert words in text
            assert "◆ is the reacting carbon" in text
            assert "F8" in text
            await pressed(pilot, "escape")


async def test_the_palette_offers_every_action_of_the_place_and_runs_it() -> None:
    async with driven() as (app, pilot):
        await planned(pilot)
        provider = ActionProvider(app.screen)
        titles = {title for title, _, _ in provider._actions()}
        assert titles >= {
            "Help",
            "Copy",
            "Run it",
            "Shelf",
            "Numbers",
            "New",
            "Undo",
            "Redo",
            "Runs",
            "Finding",
            "Failures",
        }
        assert titles >= {"Theme", "Words", "Drafts", "Books", "Quit", "Planning"}
        await pressed(pilot, "ctrl+p")
        assert isinstance(app.screen, CommandPalette)
        app.screen.query_one(Input).value = "search the record"
        await settled(pilot, 5)
        await pressed(pilot, "enter")
        assert app.current_mode == "finding"


async def test_copying_offers_three_kinds_and_reaches_the_clipboard() -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "f8")
        assert any("nothing here to copy" in n.message for n in app._notifications)
        await planned(pilot)
        await pressed(pilot, "f8")
        assert isinstance(app.screen, CopyScreen)
        await pressed(pilot, "down", "enter")
        assert app.clipboard.startswith("## Planned step")
        app.screen.action_copy_as("SMILES")
        assert app.clipboard == MESYLATE
        app.screen.action_copy_as("JSON")
        assert app.clipboard.startswith("{")
        app.screen.action_copy_as("RXN")
        await settled(pilot)
        assert any("no RXN to copy" in n.message for n in app._notifications)


async def test_themes_and_words_are_switched_by_key() -> None:
    async with driven() as (app, pilot):
        await planned(pilot)
        names = []
        for _ in THEMES:
            names.append(app.theme)
            await pressed(pilot, "ctrl+t")
        assert names == [theme.name for theme in THEMES]
        assert app.theme == names[0]
        await pressed(pilot, "ctrl+g")
        assert "reacting carbon ◆: C1" in " ".join(on_screen(app).split())
        await pressed(pilot, "ctrl+g")
        assert "⠒" in on_screen(app)


async def test_places_are_reached_by_mouse() -> None:
    async with driven(FakeBook()) as (app, pilot):
        await pilot.click("#place-tabs", offset=(16, 0))
        await settled(pilot)
        assert app.current_mode == "runs"
