"""What is done in the place *failures*: adopting a rule, copying; and what it never does."""

from __future__ import annotations

from textual.widgets import Input

from tests.tui.driving import driven, on_screen, pressed, settled, words
from tests.tui.fake_audits import a_cluster, a_recurrence
from tests.tui.fake_book import NASTY, FakeBook
from tests.tui.fake_runs import a_run
from tui.screens.copying import CopyScreen
from tui.screens.failures import FailuresPlace
from tui.screens.failures_adopt import AdoptScreen


async def test_a_proposed_rule_is_adopted_after_its_trial_was_seen() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5", "a")
        assert isinstance(app.screen, AdoptScreen)
        seen = words(app)
        assert "acidity >= strong" in seen
        assert "on this book it warns of 2 failures, with 1 false alarm" in seen
        assert "R-0001, R-0004" in seen and "False alarms R-0002" in seen
        assert "signed JM" in seen
        app.screen.query_one("#adopt-title", Input).value = "Ethers die in acid"
        await pressed(pilot, "enter")
        assert book.adopted == [
            ("Ethers die in acid", "In 3 runs of this book: a labile group elsewhere was lost.", "JM")
        ]
        assert any("ethers-wxyz adopted" in n.message for n in app._notifications)
        assert book.asked.count("recurring") == 2
        assert "covered" in on_screen(app)
        assert app.screen.check_action("adopt", ()) is None


async def test_adopting_wants_a_title_and_a_reason_and_can_be_left() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5", "a")
        app.screen.query_one("#adopt-why", Input).value = " "
        await pilot.click("#adopt-go")
        await settled(pilot)
        assert isinstance(app.screen, AdoptScreen)
        assert "Give it a title and a reason first." in words(app)
        await pressed(pilot, "escape")
        assert isinstance(app.screen, FailuresPlace)
        await pressed(pilot, "a")
        await pilot.click("#adopt-cancel")
        await settled(pilot)
        assert isinstance(app.screen, FailuresPlace)
        assert not book.adopted


async def test_a_rule_that_the_book_refuses_is_told_in_place() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5", "a")
        app.screen.query_one("#adopt-title", Input).value = "refused"
        await pressed(pilot, "enter")
        assert "This rule cannot be kept." in words(app)
        assert not book.adopted


async def test_a_read_only_book_offers_no_adoption() -> None:
    async with driven(FakeBook(read_only=True)) as (app, pilot):
        await pressed(pilot, "f5")
        assert "read only" in on_screen(app)
        assert app.screen.check_action("adopt", ()) is None
        await pressed(pilot, "a")
        assert isinstance(app.screen, FailuresPlace)


async def test_only_a_kind_with_a_proposal_can_be_adopted_and_only_there() -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "f5")
        assert app.screen.check_action("adopt", ()) is True
        await pressed(pilot, "down", "down")
        assert app.screen.check_action("adopt", ()) is None
        await pressed(pilot, "2")
        assert app.screen.check_action("adopt", ()) is False
        assert app.screen.check_action("plan_it", ()) is False


async def test_parts_are_copied_as_markdown_json_and_smiles() -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "f5", "f8")
        assert isinstance(app.screen, CopyScreen)
        await pressed(pilot, "enter")
        assert app.clipboard == "CC(C)(C)OCCCBr"
        app.screen.action_copy_as("JSON")
        await settled(pilot)
        assert '"title": "Group loss: tertiary alkyl ether, a strong acid is present"' in app.clipboard
        app.screen.action_copy_as("Markdown")
        await settled(pilot)
        assert app.clipboard == "## Recurrence (invented)"
        await pressed(pilot, "2")
        app.screen.action_copy_as("Markdown")
        await settled(pilot)
        assert "| 2025-Q2 | 3 | 7 | 75 % |" in app.clipboard
        app.screen.action_copy_as("RXN")
        await settled(pilot)
        assert any("no RXN to copy" in n.message for n in app._notifications)
        await pressed(pilot, "3", "f8")
        assert any("nothing here to copy" in n.message for n in app._notifications)


async def test_a_book_without_failures_says_so() -> None:
    book = FakeBook()
    empty = a_recurrence().__class__(clusters=(), runs=12, failures=1, in_clusters=0, unplaced=0)
    book.recurring = lambda progress: empty  # type: ignore[method-assign]
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5")
        assert "nothing recurs in this book" in words(app)
        await pressed(pilot, "r", "a", "p", "s")
        assert isinstance(app.screen, FailuresPlace)


async def test_hostile_words_of_the_record_show_as_text() -> None:
    book = FakeBook()
    nasty = a_cluster(place=NASTY, projects=((NASTY, 2),), runs=("[red]R[/red]",))
    found = a_recurrence().__class__(clusters=(nasty,), runs=1, failures=1, in_clusters=1, unplaced=0)
    book.recurring = lambda progress: found  # type: ignore[method-assign]
    book.runs["[red]R[/red]"] = a_run(1, code="[red]R[/red]", note=NASTY)
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f5")
        assert "[red]not red[/red]" in on_screen(app)
        assert "\x1b" not in on_screen(app) and "\u202e" not in on_screen(app)
        await pressed(pilot, "r")
        assert "[red]R[/red]" in on_screen(app)
        assert "\x1b" not in on_screen(app) and "\u202e" not in on_screen(app)


async def test_nobody_is_named_in_any_part() -> None:
    async with driven(size=(160, 50)) as (app, pilot):
        app.book_words = ""
        await pressed(pilot, "f5")
        for keys in (("1",), ("2",), ("3", "f9"), ("4",), ("5", "f9")):
            await pressed(pilot, *keys)
            assert "JM" not in on_screen(app)
