"""The entry form.

Products proposed, split live, drafts kept, errors in their field, nothing lost by a failed save.
"""

from __future__ import annotations

from textual.widgets import Select, TextArea

from kb.errors import StoreRefused
from tests.tui.driving import driven, on_screen, pressed, settled, typed
from tests.tui.fake_book import MESYLATE, NASTY, FakeBook
from tui.entry_state import read_split
from tui.screens.drafts import DraftsScreen
from tui.screens.entry import EntryScreen
from tui.screens.planning import PlanningScreen
from tui.widgets.product_rows import ProductEntry
from tui.widgets.structure import SchemeView
from tui.widgets.tick_list import TickList

PLAN = {"scheme": MESYLATE, "reagent": "NaN3=1.5", "solvent": "DMF", "temperature": "80 C"}


async def opened(app, pilot) -> EntryScreen:
    """Open the form on a plan."""
    screen = EntryScreen(dict(PLAN))
    await app.push_screen(screen)
    await settled(pilot, 4)
    return screen


async def test_a_run_is_recorded_from_three_integrals() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        screen = await opened(app, pilot)
        entries = list(screen.query(ProductEntry))
        assert len(entries) == 4
        assert all(e.query_one(SchemeView).drawing is not None for e in entries)
        for name, value in (("p0-value", "1.80"), ("p0-protons", "2"), ("p1-value", "0.08"), ("p2-value", "0.02")):
            screen.query_one(f"#{name}").value = value
        await settled(pilot)
        assert "90 % (88–92)" in on_screen(app), read_split(screen._state)
        screen.query_one("#field-verdict", Select).value = "partly"
        ticks = screen.query_one(TickList)
        ticks.focus()
        await pressed(pilot, "home", "space")
        assert ticks.ticked == ("elimination",)
        screen.query_one("#field-note", TextArea).text = "smelled of alkene at work-up"
        await settled(pilot)
        assert len(book.drafts) == 1
        await pressed(pilot, "ctrl+s")
        assert isinstance(app.screen, PlanningScreen)
        run = book.runs["R-0013"]
        assert run.note == "smelled of alkene at work-up"
        assert run.outcome.failures[0].mode == "elimination"
        assert run.outcome.products[0].share is not None
        assert book.drafts == {}


async def test_shares_must_add_up_and_the_form_says_when_they_do_not() -> None:
    async with driven() as (app, pilot):
        screen = await opened(app, pilot)
        screen.query_one("#field-how", Select).value = "shares"
        await settled(pilot)
        screen.query_one("#p0-value").value = "80"
        screen.query_one("#p1-value").value = "5"
        await settled(pilot)
        total = screen.query_one("#product-total")
        assert "Adds up to 85 %: something is missing" in str(total.render())
        assert total.has_class("-bad")
        screen.query_one("#p2-value").value = "15"
        await settled(pilot)
        assert "Adds up to 100 %." in str(total.render())
        screen.query_one("#p0-value").value = "lots"
        await settled(pilot)
        assert screen.query_one("#p0-value").has_class("-bad")


async def test_a_bad_field_is_named_and_focused_and_nothing_is_stored() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        screen = await opened(app, pilot)
        screen.query_one("#field-isolated").value = "lots"
        screen.query_one("#field-date").value = "yesterday"
        await settled(pilot)
        await pressed(pilot, "ctrl+s")
        assert app.screen is screen
        assert app.focused is screen.query_one("#field-isolated")
        assert screen.query_one("#field-date").has_class("-bad")
        assert "lots" in str(screen.query_one("#place-trouble").render())
        assert len(book.runs) == 12


async def test_a_save_that_fails_leaves_the_form_as_it_is() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        screen = await opened(app, pilot)
        book.broken["add"] = StoreRefused("The disk is full.", "Make room, then store again.")
        screen.query_one("#p0-value").value = "1"
        await settled(pilot)
        await pressed(pilot, "ctrl+s")
        assert app.screen is screen
        assert "The disk is full." in on_screen(app)
        assert screen.query_one("#p0-value").value == "1"
        book.broken.clear()
        await pressed(pilot, "ctrl+s")
        assert "R-0013" in book.runs


async def test_a_crash_loses_nothing_and_the_draft_is_taken_up() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        screen = await opened(app, pilot)
        screen.query_one("#p0-value").value = "1.8"
        screen.query_one("#field-note", TextArea).text = "half a"
        await settled(pilot)
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f10")
        assert isinstance(app.screen, DraftsScreen)
        assert MESYLATE[:30] in on_screen(app)
        await pressed(pilot, "enter")
        await settled(pilot, 4)
        assert isinstance(app.screen, EntryScreen)
        assert app.screen.query_one("#p0-value").value == "1.8"
        assert app.screen.query_one("#field-note", TextArea).text == "half a"
        await pressed(pilot, "escape")
        assert any("Kept as a draft" in n.message for n in app._notifications)
        await pressed(pilot, "f10")
        await pressed(pilot, "delete")
        assert "Nothing is kept." in on_screen(app)
        assert list(book.drafts) == ["plan"] or book.drafts == {}
        await pressed(pilot, "escape")
        assert isinstance(app.screen, PlanningScreen)


async def test_edits_are_undone_and_another_product_is_added() -> None:
    async with driven() as (app, pilot):
        screen = await opened(app, pilot)
        await typed(pilot, "#p0-value", "1.8")
        await typed(pilot, "#field-isolated", "50")
        screen.query_one("#field-isolated").focus()
        await pressed(pilot, "ctrl+z")
        assert screen.query_one("#field-isolated").value == ""
        assert screen.query_one("#p0-value").value == "1.8"
        await pressed(pilot, "ctrl+y")
        assert screen.query_one("#field-isolated").value == "50"
        await pressed(pilot, "f9")
        await pressed(pilot, *"CCO", "enter")
        await settled(pilot, 4)
        rows = list(screen.query(ProductEntry))
        assert rows[-1].row.smiles == "CCO"
        assert screen.query_one("#p0-value").value == "1.8"
        assert screen.copy_texts() == {"SMILES": MESYLATE}


async def test_a_bad_scheme_is_told_and_its_products_stay() -> None:
    async with driven() as (app, pilot):
        screen = await opened(app, pilot)
        await typed(pilot, "#field-scheme", "C1CC")
        await settled(pilot)
        assert screen.query_one("#reading").has_class("-bad")
        assert len(screen.query(ProductEntry)) == 4


async def test_a_read_only_book_takes_no_run_and_unsafe_notes_change_nothing() -> None:
    async with driven(FakeBook(read_only=True)) as (app, pilot):
        screen = await opened(app, pilot)
        assert screen.check_action("store", ()) is None
        screen.action_store()
        await settled(pilot)
        assert "open for reading only" in on_screen(app)
    book = FakeBook()
    async with driven(book) as (app, pilot):
        screen = await opened(app, pilot)
        screen.query_one("#field-note", TextArea).text = NASTY
        screen.query_one("#field-reference").value = "[bold]x[/bold]"
        await settled(pilot)
        await pressed(pilot, "ctrl+s")
        assert book.runs["R-0013"].note == NASTY
        assert book.runs["R-0013"].reference == "[bold]x[/bold]"
