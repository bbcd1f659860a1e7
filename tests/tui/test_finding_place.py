"""Finding: what is filled is asked, hits are drawn with their match marked, errors stand in the form."""

from __future__ import annotations

from dataclasses import replace

from textual.widgets import Input, Select

from kb.record.outcome import Failure
from kb.vocabulary import Verdict
from tests.tui.driving import driven, on_screen, pressed, settled, typed
from tests.tui.fake_book import FakeBook
from tui.screens.finding import FindingPlace
from tui.screens.run_detail import RunScreen
from tui.widgets.cards import HitCard
from tui.widgets.structure import SchemeView


async def test_a_substructure_is_searched_drawn_and_opened() -> None:
    async with driven(FakeBook(runs=30)) as (app, pilot):
        await pressed(pilot, "f4")
        await typed(pilot, "#find-substructure", "OS(C)(=O)=O")
        await pressed(pilot, "enter")
        await settled(pilot, 5)
        assert "Runs found: 1 to 24 of 30" in on_screen(app)
        cards = list(app.screen.query(HitCard))
        assert len(cards) == 24
        assert "match" in [str(k) for k in cards[0].query_one(SchemeView).mark_kinds]
        assert "•" in on_screen(app)
        cards[0].focus()
        await pressed(pilot, "right")
        assert app.focused is cards[1]
        await pressed(pilot, "left", "enter")
        assert isinstance(app.screen, RunScreen)
        assert "match" in [str(k) for k in app.screen.query_one(SchemeView).mark_kinds]
        await pressed(pilot, "escape")
        await pressed(pilot, "n")
        await settled(pilot, 5)
        assert "25 to 30 of 30" in on_screen(app)
        assert app.screen.check_action("next_page", ()) is None
        await pressed(pilot, "b")
        await settled(pilot, 5)
        assert "1 to 24 of 30" in on_screen(app)


async def test_the_form_refuses_nothing_tells_errors_and_empties() -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "f4")
        await pressed(pilot, "f9")
        assert "Fill at least one line." in on_screen(app)
        await typed(pilot, "#find-substructure", "C(")
        await pressed(pilot, "enter")
        assert "is no SMARTS. Check the brackets." in str(app.screen.query_one("#find-trouble").render())
        await pressed(pilot, "ctrl+n")
        await typed(pilot, "#find-words", "nothing like it")
        await pressed(pilot, "enter")
        assert "Nothing in the record fits." in on_screen(app)
        assert "is no SMARTS" not in on_screen(app)
        await pressed(pilot, "tab", "slash")


async def test_choices_are_asked_with_the_lines() -> None:
    book = FakeBook()
    book.runs["R-0004"] = replace(book.runs["R-0004"], verdict=Verdict.FAILED)
    async with driven(book) as (app, pilot):
        await pressed(pilot, "f4")
        screen = app.screen
        assert isinstance(screen, FindingPlace)
        screen.query_one("#find-verdict", Select).value = "failed"
        screen.query_one("#find-failed", Select).value = "group-loss"
        assert screen.query_typed.verdict == "failed"
        assert screen.query_typed.failed == "group-loss"
        assert screen.query_typed.role == "any"
        await pressed(pilot, "f9")
        await settled(pilot, 5)
        assert [card.hit.run.code for card in screen.query(HitCard)] == ["R-0004"]
        screen.query_one(HitCard).focus()
        await pilot.pause()
        assert screen.copy_texts()["SMILES"] == book.runs["R-0004"].scheme
        await pressed(pilot, "ctrl+n")
        assert screen.query_typed.verdict == ""


async def test_a_failure_is_found_in_words_for_screen_readers() -> None:
    book = FakeBook(runs=1)
    run = book.runs["R-0001"]
    book.runs["R-0001"] = replace(run, outcome=replace(run.outcome, failures=(Failure(mode="elimination"),)))
    async with driven(book) as (app, pilot):
        await pressed(pilot, "ctrl+g", "f4")
        await typed(pilot, "#find-substructure", "S")
        await pressed(pilot, "enter")
        await settled(pilot, 5)
        assert "Structure" in on_screen(app)
        assert "matched •" in " ".join(on_screen(app).split())


async def test_solvent_and_base_are_completed_from_the_catalogue() -> None:
    async with driven() as (app, pilot):
        await pressed(pilot, "f4")
        for line, typed_so_far, whole in (("#find-solvent", "DM", "DMF"), ("#find-base", "K2C", "K2CO3")):
            field = app.screen.query_one(line, Input)
            field.focus()
            await pressed(pilot, *typed_so_far)
            await settled(pilot, 5)
            await pressed(pilot, "right")
            assert field.value == whole
