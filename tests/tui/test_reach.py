"""Every action of every screen is reached: by a key of its own, and from the palette or by the mouse."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest
from textual.binding import Binding
from textual.command import CommandPalette
from textual.screen import Screen
from textual.widgets import Footer

from tests.tui.driving import driven, on_screen, pressed, settled
from tests.tui.test_planning import planned
from tui.application import SidepathApp
from tui.palette import ActionProvider
from tui.screens.entry import EntryScreen
from tui.screens.finding_detail import FindingScreen
from tui.screens.run_detail import RunScreen

MOVING = ("form.", "card.", "tick.", "bars.")
"""Keys that only move inside a widget; the mouse does the same by pointing."""


async def to_planning(app: SidepathApp, pilot: Any) -> None:
    await planned(pilot)


async def to_finding_of_planning(app: SidepathApp, pilot: Any) -> None:
    await planned(pilot)
    app.screen.query_one("#findings").focus()
    await pressed(pilot, "enter")


async def to_runs(app: SidepathApp, pilot: Any) -> None:
    await pressed(pilot, "f3")


async def to_finding(app: SidepathApp, pilot: Any) -> None:
    await pressed(pilot, "f4")
    app.screen.query_one("#find-words").value = "invented"  # type: ignore[attr-defined]
    await pressed(pilot, "f9")
    app.screen.query("HitCard").first().focus()
    await settled(pilot)


async def to_run(app: SidepathApp, pilot: Any) -> None:
    await pressed(pilot, "f3", "enter")


async def to_entry(app: SidepathApp, pilot: Any) -> None:
    await planned(pilot)
    await pressed(pilot, "f9")


SCREENS: tuple[tuple[str, Callable[[SidepathApp, Any], Any], type], ...] = (
    ("planning", to_planning, Screen),
    ("a finding of it", to_finding_of_planning, FindingScreen),
    ("runs", to_runs, Screen),
    ("a run", to_run, RunScreen),
    ("finding", to_finding, Screen),
    ("entry", to_entry, EntryScreen),
)


def bindings_of(screen: Screen[Any]) -> list[Binding]:
    """Return what our own classes of this screen bind, those that only move left out."""
    found: dict[str, Binding] = {}
    for owner in type(screen).__mro__:
        if owner.__module__.startswith("tui."):
            for binding in owner.__dict__.get("BINDINGS", []):
                if not (binding.id or "").startswith(MOVING):
                    found.setdefault(binding.action, binding)
    return list(found.values())


@pytest.mark.parametrize(("name", "go", "kind"), SCREENS, ids=[name for name, _, _ in SCREENS])
async def test_every_action_has_a_key_and_a_line_in_the_palette(
    name: str, go: Callable[[SidepathApp, Any], Any], kind: type
) -> None:
    async with driven(size=(160, 50)) as (app, pilot):
        await go(app, pilot)
        screen = app.screen
        assert isinstance(screen, kind)
        by_key = {active.binding.action: key for key, active in screen.active_bindings.items()}
        offered = {title for title, _, _ in ActionProvider(screen)._actions()}
        wanted = [*bindings_of(screen), *(() if screen.is_modal else SidepathApp.BINDINGS)]
        assert len(wanted) >= 2
        for binding in wanted:
            assert isinstance(binding, Binding)
            state = screen.check_action(binding.action.split("(")[0], ())
            if state is False:
                continue  # nothing to stop while nothing runs
            assert binding.action in by_key, (name, binding.action, "has no key: another binding took it")
            if state:
                assert binding.description in offered, (name, binding.description, "is not in the palette")


@pytest.mark.parametrize(("name", "go", "kind"), SCREENS, ids=[name for name, _, _ in SCREENS])
async def test_keys_that_show_at_the_foot_are_pressed_by_mouse(
    name: str, go: Callable[[SidepathApp, Any], Any], kind: type
) -> None:
    async with driven(size=(160, 50)) as (app, pilot):
        await go(app, pilot)
        keys = list(app.screen.query(Footer).first().query("FooterKey"))
        assert keys
        help_key = next(key for key in keys if key.action == "help")  # type: ignore[attr-defined]
        await pilot.click(help_key)
        await settled(pilot)
        assert app.screen.id == "help" or "HelpScreen" in type(app.screen).__name__
        await pressed(pilot, "escape")
        assert isinstance(app.screen, kind)


@pytest.mark.parametrize(("name", "go", "kind"), SCREENS, ids=[name for name, _, _ in SCREENS])
async def test_every_screen_has_help_of_its_own_and_the_palette(
    name: str, go: Callable[[SidepathApp, Any], Any], kind: type
) -> None:
    async with driven(size=(160, 50)) as (app, pilot):
        await go(app, pilot)
        words = str(getattr(type(app.screen), "HELP", "")).split()
        assert len(words) > 10, f"{name} does not say what it is for"
        await pressed(pilot, "f1")
        assert words[0] in on_screen(app)
        await pressed(pilot, "escape")
        await pressed(pilot, "ctrl+p")
        assert isinstance(app.screen, CommandPalette)
        await pressed(pilot, "escape")
