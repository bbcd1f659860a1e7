"""The place *route*: every action and every way in which a file or a line can be wrong."""

from __future__ import annotations

import asyncio
import threading
from pathlib import Path
from typing import Any

import pytest
from textual.binding import Binding

from kb.errors import SidepathError, StoreBusy
from tests.tui.driving import driven, on_screen, pressed, settled, typed
from tests.tui.fake_book import FakeBook
from tests.tui.fake_routes import ROUTE, a_route_file
from tui.application import SidepathApp
from tui.palette import ActionProvider
from tui.screens import route as route_module
from tui.screens.finding_detail import FindingScreen
from tui.screens.planning import PlanningScreen
from tui.screens.route import RoutePlace
from tui.screens.route_files import RouteFilesScreen
from tui.screens.route_runs import RunsBehindScreen
from tui.screens.run_detail import RunScreen
from tui.widgets.findings import FindingsList
from tui.widgets.route_lines import RouteLines
from tui.widgets.route_sequence import RouteSequence
from tui.widgets.structure import SchemeView


@pytest.fixture(autouse=True)
def quick(monkeypatch: pytest.MonkeyPatch) -> None:
    """Shorten the pause in typing."""
    monkeypatch.setattr(route_module, "SETTLE_S", 0.01)


async def opened(pilot: Any, path: Path) -> RoutePlace:
    """Go to the place and open a file by typing its path."""
    await pressed(pilot, "f6", "o")
    assert isinstance(pilot.app.screen, RouteFilesScreen)
    await typed(pilot, "#route-path", str(path))
    await pressed(pilot, "enter")
    await settled(pilot, 5)
    assert isinstance(pilot.app.screen, RoutePlace), on_screen(pilot.app)
    return pilot.app.screen


def words(app: SidepathApp) -> str:
    """Return the screen as one line, so that wrapping does not matter."""
    return " ".join(on_screen(app).replace("│", " ").split())


def ledger_of(screen: RoutePlace) -> Any:
    """Return what is reckoned now."""
    assert screen._ledger is not None
    return screen._ledger


async def test_a_route_is_opened_in_two_keys_and_a_path_and_tells_its_sum(tmp_path: Path) -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "f6")
        assert "Open a route file with o" in words(app)
        screen = await opened(pilot, a_route_file(tmp_path))
        text = words(app)
        assert "Sequence: Invented route" in text and "Overall, 4 steps" in text
        for told in ("Monte Carlo", "closed form", "For 0.461 g (10 mmol):", "nine times in ten", "Weakest is"):
            assert told in text
        ledger = ledger_of(screen)
        assert f"{ledger.overall_pct.mean:.3g} %" in text
        names = [row.step.name for row in screen.query_one(RouteSequence)._rows]
        assert names == ["azide", "swap", "side", "join"]
        assert "├─╯" in text and "may be poor: cheap input" in text
        assert app.focused is screen.query_one(RouteSequence)


async def test_steps_say_where_their_yields_come_from(tmp_path: Path) -> None:
    async with driven(size=(160, 50)) as (app, pilot):
        await opened(pilot, a_route_file(tmp_path))
        text = words(app)
        for told in ("record: R-0001, R-0002", "estimate;", "typed in the file", "!! serious, 1"):
            assert told in text
        assert "2 recorded runs" in text  # the first step is chosen
        await pressed(pilot, "down")
        assert "solvolysis" in words(app) or "the solvent competes as nucleophile" in words(app)
        assert "secondary carbon" in words(app)  # its reading
        assert app.screen.query_one(SchemeView).drawing is not None
        await pressed(pilot, "down")
        assert "No scheme, so nothing to check." in words(app)
        assert "Neither scheme nor product is in the file." in words(app)


async def test_another_yield_changes_the_sum_while_typing_and_is_undone(tmp_path: Path) -> None:
    path = a_route_file(tmp_path)
    async with driven() as (app, pilot):
        screen = await opened(pilot, path)
        before = ledger_of(screen)
        await pressed(pilot, "end", "y")
        assert app.focused is screen.query_one(RouteLines).line("yield")
        await pressed(pilot, "1", "0", "0")
        after = ledger_of(screen)
        assert after.overall_pct.mean == pytest.approx(2 * before.overall_pct.mean, rel=1e-3)
        assert after.needed[0].mmol == pytest.approx(before.needed[0].mmol / 2, rel=1e-3)
        assert "Overall, 4 steps, 1 changed" in words(app)
        assert "in the file" in words(app) and "≠ 50 % in the file" in words(app)
        await pressed(pilot, "escape")
        assert app.focused is screen.query_one(RouteSequence)
        for _ in range(3):
            await pressed(pilot, "ctrl+z")
        assert ledger_of(screen).overall_pct == before.overall_pct
        assert "changed" not in words(app)
        await pressed(pilot, "ctrl+z")
        assert any("Nothing to undo" in n.message for n in app._notifications)
        for _ in range(4):
            await pressed(pilot, "ctrl+y")
        assert ledger_of(screen).overall_pct == after.overall_pct
        assert any("Nothing to redo" in n.message for n in app._notifications)
        assert screen.query_one(RouteLines).line("yield").value == "100"
        await pressed(pilot, "x")
        assert ledger_of(screen).overall_pct == before.overall_pct
        assert path.read_text(encoding="utf-8") == ROUTE


async def test_another_condition_checks_the_step_anew(tmp_path: Path) -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        screen = await opened(pilot, a_route_file(tmp_path))
        await pressed(pilot, "down")
        assert "the solvent competes" in words(app)
        await pressed(pilot, "c")
        assert app.focused is screen.query_one(RouteLines).line("solvent")
        await typed(pilot, "#field-solvent", "DMF")
        await settled(pilot, 4)
        assert "the solvent competes" not in words(app)
        assert {s.name for s in book.checked[-1].conditions.solvents} == {"DMF"}
        await pressed(pilot, "escape", "x")
        assert "the solvent competes" in words(app)
        await pressed(pilot, "down", "c")  # typed in the file, no scheme
        assert any("no scheme for this step" in n.message for n in app._notifications)
        assert screen.query_one(RouteLines).line("solvent").disabled


async def test_another_amount_wanted_scales_what_goes_in(tmp_path: Path) -> None:
    async with driven() as (app, pilot):
        screen = await opened(pilot, a_route_file(tmp_path))
        before = ledger_of(screen).needed[0].mmol
        await pressed(pilot, "w")
        assert screen.query_one(RouteLines).line("wanted").value == "0.4607 g"
        await typed(pilot, "#field-wanted", "20 mmol")
        assert ledger_of(screen).needed[0].mmol == pytest.approx(2 * before, rel=1e-3)
        await typed(pilot, "#field-wanted", "lots")
        assert "✗ Wanted:" in words(app)
        assert screen.query_one(RouteLines).line("wanted").has_class("-bad")
        assert ledger_of(screen).needed[0].mmol == pytest.approx(before, rel=1e-3)
        await typed(pilot, "#field-wanted", "0.4607 g")
        assert "✗" not in words(app) and screen._edits.texts == {}


@pytest.mark.parametrize(
    ("field", "text", "told"),
    [
        ("yield", "120", "It is 120. A yield lies above 0 and up to 100 %"),
        ("yield", "good", "is not a number"),
        ("solvent", "DFMX", "No solvent is called 'DFMX'"),
        ("temperature", "warmish", "✗ Temp.:"),
        ("concentration", "thick", "✗ Conc.:"),
    ],
)
async def test_a_bad_line_is_told_in_place_and_changes_nothing(
    tmp_path: Path, field: str, text: str, told: str
) -> None:
    async with driven() as (app, pilot):
        screen = await opened(pilot, a_route_file(tmp_path))
        before = ledger_of(screen).overall_pct
        await pressed(pilot, "down")
        await typed(pilot, f"#field-{field}", text)
        await settled(pilot, 4)
        assert told in words(app)
        assert screen.query_one(RouteLines).line(field).has_class("-bad")
        assert ledger_of(screen).overall_pct == before
        await pressed(pilot, "escape", "up")
        assert told not in words(app)  # it belongs to the other step
        await pressed(pilot, "down", "x")
        assert told not in words(app)


async def test_a_poor_yield_may_not_matter_and_the_weakest_step_is_then_another(tmp_path: Path) -> None:
    async with driven() as (app, pilot):
        screen = await opened(pilot, a_route_file(tmp_path))
        weakest = ledger_of(screen).weakest.step
        steps = screen.query_one(RouteSequence)
        steps.highlighted = next(i for i, row in enumerate(steps._rows) if row.step.name == weakest)
        await settled(pilot)
        await pressed(pilot, "m")
        assert "may be poor: cheap input" in words(app)
        assert ledger_of(screen).weakest.step != weakest
        assert "that counts" in words(app)
        for reason in ("easy separation", "volatile by-product"):
            await pressed(pilot, "m")
            assert steps.chosen is not None and steps.chosen.forgiven == (reason,)
        await pressed(pilot, "m")
        assert steps.chosen.forgiven == () and ledger_of(screen).weakest.step == weakest


async def test_the_runs_behind_a_yield_are_one_key_away(tmp_path: Path) -> None:
    async with driven() as (app, pilot):
        await opened(pilot, a_route_file(tmp_path))
        await pressed(pilot, "enter")
        assert isinstance(app.screen, RunsBehindScreen)
        assert "Runs behind the yield of azide" in words(app) and "R-0002" in words(app)
        await pressed(pilot, "enter")
        assert isinstance(app.screen, RunScreen)
        await pressed(pilot, "escape", "escape")
        await pressed(pilot, "down", "down", "enter")
        assert any("No runs stand behind" in n.message for n in app._notifications)
        one = ROUTE.replace('run = ["R-0001", "R-0002"]', 'run = "R-0003"')
        await opened(pilot, a_route_file(tmp_path, one, "one.toml"))
        await pressed(pilot, "home", "enter")
        assert isinstance(app.screen, RunScreen)


async def test_a_typed_yield_offers_the_closest_runs_and_says_so(tmp_path: Path) -> None:
    async with driven() as (app, pilot):
        await opened(pilot, a_route_file(tmp_path))
        await pressed(pilot, "down")
        await typed(pilot, "#field-yield", "70")
        await pressed(pilot, "escape", "enter")
        await settled(pilot, 4)
        assert isinstance(app.screen, RunsBehindScreen)
        assert "Closest runs to swap" in words(app) and "No runs stand behind it" in words(app)


async def test_a_run_that_cannot_be_fetched_is_told_in_place(tmp_path: Path) -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await opened(pilot, a_route_file(tmp_path))
        book.broken["get"] = StoreBusy("The book is held by another writer.", "Try again in a moment.")
        await pressed(pilot, "enter")
        await settled(pilot, 4)
        assert "held by another writer" in words(app)
        del book.broken["get"], book.runs["R-0001"]
        await pressed(pilot, "escape", "enter")
        await settled(pilot, 4)
        assert app.screen.query_one("#route-runs-table").codes == ("R-0002",)


async def test_findings_of_a_step_open_in_full(tmp_path: Path) -> None:
    async with driven() as (app, pilot):
        screen = await opened(pilot, a_route_file(tmp_path))
        await pressed(pilot, "down", "f")
        assert app.focused is screen.query_one(FindingsList)
        assert "motif" in [str(k) for k in screen.query_one(SchemeView).mark_kinds]
        await pressed(pilot, "enter")
        assert isinstance(app.screen, FindingScreen)
        assert "Ethanol captures the carbon" in words(app)
        await pressed(pilot, "escape", "escape")
        assert app.focused is screen.query_one(RouteSequence)


async def test_a_step_goes_to_planning_as_it_stands_here(tmp_path: Path) -> None:
    async with driven() as (app, pilot):
        await opened(pilot, a_route_file(tmp_path))
        await pressed(pilot, "down")
        await typed(pilot, "#field-temperature", "40 C")
        await pressed(pilot, "escape", "p")
        await settled(pilot, 4)
        assert isinstance(app.screen, PlanningScreen)
        state = app.screen.form.state
        assert (state["reagent"], state["solvent"], state["temperature"]) == ("NaN3=1.5", "EtOH", "40 C")
        await pressed(pilot, "f6", "down", "p")
        assert isinstance(app.screen, RoutePlace)
        assert any("no scheme for this step" in n.message for n in app._notifications)


async def test_a_route_is_copied_as_markdown_json_and_smiles(tmp_path: Path) -> None:
    async with driven() as (app, pilot):
        screen = await opened(pilot, a_route_file(tmp_path))
        await pressed(pilot, "down")
        screen.action_copy_as("Markdown")
        text = app.clipboard
        assert text.startswith("## Invented route") and "| 3 side | bulk | 40 % (30–50) |" in text
        assert "Weakest is" in text and "local safety rules" in text
        screen.action_copy_as("JSON")
        assert '"weakest"' in app.clipboard and '"closed_low"' in app.clipboard
        screen.action_copy_as("SMILES")
        assert app.clipboard.startswith("C[C@H](OS(C)(=O)=O)")


async def test_a_page_is_saved_and_trouble_with_it_told(tmp_path: Path) -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        screen = await opened(pilot, a_route_file(tmp_path))
        await pressed(pilot, "f9")
        assert "As it is reckoned now" in words(app)
        await pressed(pilot, "enter")
        await settled(pilot, 4)
        assert book.__dict__["pages"] == {"route.html": ledger_of(screen)}
        assert any("Wrote route.html" in n.message for n in app._notifications)
        book.broken["save_page"] = SidepathError("route.html is there already.", "Name another file.")
        await pressed(pilot, "f9", "enter")
        await settled(pilot, 4)
        assert "route.html is there already. Name another file." in words(app)
        await pressed(pilot, "f9", "escape")
        assert isinstance(app.screen, RoutePlace)


BAD = {
    "nowhere.toml": (None, "is not there"),
    "broken.toml": ("title = ", "broken.toml"),
    "typo.toml": ('[[step]]\nyeild = 50', "Did you mean 'yield'?"),
    "circle.toml": ('[[step]]\nname="a"\nfrom="b"\nyield=5\n[[step]]\nname="b"\nfrom="a"\nyield=5', "in a circle"),
    "smiles.toml": ('[[step]]\nplan = { scheme = "C1CC>>CC" }', "cannot be read"),
    "run.toml": ('[[step]]\nrun = "R-9999"', "No run is called R-9999"),
    "solvent.toml": ('[[step]]\nplan = { scheme = "CBr", solvents = ["DFMX"] }', "DFMX"),
    "huge.toml": ("# " + "x" * 1_000_001, "no route is that long"),
    "nasty.toml": ('title = "[red]\\u001b[31m\\u202e"\nsteps = 3', "has no 'steps'"),
    "many.toml": ("[[step]]\nyield = 90\n" * 300, "300 steps"),
}


async def test_every_bad_file_is_refused_in_place_and_can_be_mended(tmp_path: Path) -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "f6", "o")
        await pressed(pilot, "enter")
        assert "Say which file." in words(app)
        for name, (text, told) in BAD.items():
            place = tmp_path / name if text is None else a_route_file(tmp_path, text, name)
            await typed(pilot, "#route-path", str(place))
            await pressed(pilot, "enter")
            await settled(pilot, 4)
            assert isinstance(app.screen, RouteFilesScreen), name
            assert told in words(app), (name, on_screen(app))
            assert app.focused is app.screen.query_one("#route-path")
        await typed(pilot, "#route-path", str(a_route_file(tmp_path)))
        await pressed(pilot, "enter")
        await settled(pilot, 4)
        assert isinstance(app.screen, RoutePlace) and "Invented route" in words(app)


async def test_what_a_file_says_shows_as_text_and_acts_on_nothing(tmp_path: Path) -> None:
    nasty = "[red]x[/red]\\u001b[31m\\u202egnp \\U0001F9EA"
    text = f'title = "{nasty}"\nmoney = "{nasty}"\n[material.start]\nprice_per_g = 0\n[[step]]\nname = "{nasty}"\n'
    text += f'from = "start"\nyield = 50\n[[step]]\nname = "{"long " * 2000}"\nyield = 50'
    async with driven(size=(160, 50)) as (app, pilot):
        screen = await opened(pilot, a_route_file(tmp_path, text))
        for _ in range(2):
            shown = on_screen(app)
            assert "[red]x[/red]" in shown
            assert not any((ord(c) < 32 and c != "\n") or c in "\x1b\u202e\x9b" for c in shown)
            await pressed(pilot, "down")
        for copied in screen.copy_texts().values():
            assert ("\x1b" not in copied and "\u202e" not in copied) or copied.startswith("{")


async def test_looking_up_is_told_and_can_be_stopped(tmp_path: Path) -> None:
    book = FakeBook()
    book.gate = threading.Event()
    path = a_route_file(tmp_path)
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f6", "o")
        app.screen.query_one("#route-path").value = str(path)
        await pilot.press("enter")
        for _ in range(500):
            if "looking the steps up" in on_screen(app) or "azide" in on_screen(app):
                break
            await asyncio.sleep(0.01)
        await pilot.press("escape")
        await pilot.pause()
        assert "Stopped. Enter opens it again." in words(app)
        book.gate.set()
        await settled(pilot, 4)
        assert isinstance(app.screen, RouteFilesScreen)  # the stale answer was dropped
        await pressed(pilot, "enter")
        await settled(pilot, 4)
        assert isinstance(app.screen, RoutePlace)
        await pressed(pilot, "o", "escape")
        assert isinstance(app.screen, RoutePlace) and "Invented route" in words(app)


async def test_recent_files_and_the_example_are_offered_and_a_file_is_read_again(tmp_path: Path) -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f6", "e")
        assert "another book is open" in words(app)
        await pressed(pilot, "o")
        assert "No route was opened before." in words(app)
        await pressed(pilot, "escape")
        path = a_route_file(tmp_path)
        book.example = path
        await pressed(pilot, "e")
        await settled(pilot, 5)
        assert isinstance(app.screen, RoutePlace) and "Invented route" in words(app)
        assert "another book is open" not in words(app)
        await typed(pilot, "#field-yield", "10")
        await pressed(pilot, "escape")
        path.write_text(ROUTE.replace("Invented route", "Mended route"), encoding="utf-8")
        await pressed(pilot, "ctrl+r")
        await settled(pilot, 5)
        assert "Mended route" in words(app) and "1 changed" in words(app)
        await pressed(pilot, "o")
        assert "route.toml" in words(app)
        await pressed(pilot, "tab", "enter")
        await settled(pilot, 5)
        assert isinstance(app.screen, RoutePlace)
        book.broken["recent_routes"] = SidepathError("The list cannot be read.")
        await pressed(pilot, "o")
        assert "The list cannot be read." in words(app)


async def test_a_fault_while_reckoning_leaves_the_place_usable(tmp_path: Path) -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await opened(pilot, a_route_file(tmp_path))
        book.broken["imagine_route"] = RuntimeError("planted")
        await typed(pilot, "#field-yield", "70")
        assert "Something went wrong inside the program" in words(app)
        del book.broken["imagine_route"]
        await typed(pilot, "#field-yield", "71")
        assert "Something went wrong" not in words(app) and "1 changed" in words(app)


async def test_actions_that_need_a_route_are_grey_without_one(tmp_path: Path) -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "f6", "y", "w", "c", "m", "x", "f", "p", "f9", "ctrl+r", "f8", "enter")
        screen = app.screen
        assert isinstance(screen, RoutePlace)
        for action in route_module.NEEDS_ROUTE:
            assert screen.check_action(action, ()) is None
        await opened(pilot, a_route_file(tmp_path))
        for action in route_module.NEEDS_ROUTE:
            assert screen.check_action(action, ()) is True


async def test_words_take_the_place_of_drawings_here_too(tmp_path: Path) -> None:
    async with driven(size=(160, 50)) as (app, pilot):
        await opened(pilot, a_route_file(tmp_path))
        await pressed(pilot, "ctrl+g", "down")
        assert "reacting carbon ◆" in words(app)
        await pressed(pilot, "ctrl+g")
        assert "⠒" in on_screen(app)
        await pressed(pilot, "ctrl+l")
        assert app.screen.query_one(SchemeView).numbers


async def test_every_action_of_the_place_is_in_the_palette_and_under_the_mouse(tmp_path: Path) -> None:
    async with driven(size=(160, 50)) as (app, pilot):
        screen = await opened(pilot, a_route_file(tmp_path))
        offered = {title for title, _, _ in ActionProvider(screen)._actions()}
        for binding in (*RoutePlace.BINDINGS, *RouteSequence.BINDINGS):
            assert isinstance(binding, Binding)
            assert binding.description in offered, binding.description
        by_key = {active.binding.action for active in screen.active_bindings.values()}
        assert {b.action for b in RoutePlace.BINDINGS if isinstance(b, Binding)} <= by_key
        key = next(k for k in screen.query("FooterKey") if k.action == "open_file")  # type: ignore[attr-defined]
        await pilot.click(key)
        await settled(pilot)
        assert isinstance(app.screen, RouteFilesScreen)
        assert app.screen.query("Footer FooterKey")
        await pressed(pilot, "f1")
        assert "shows one" in words(app)
        await pressed(pilot, "escape", "escape")
        await pilot.click(RouteSequence, offset=(5, 3))  # the second step, in its second line
        await settled(pilot)
        chosen = screen.query_one(RouteSequence).chosen
        assert app.screen is screen and chosen is not None and chosen.name == "swap"
        await pilot.click(RouteSequence, offset=(5, 3))
        await settled(pilot)
        assert isinstance(app.screen, RunsBehindScreen)
