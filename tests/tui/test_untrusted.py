"""What people typed shows as text wherever it is shown, and changes nothing.

Markup, escapes, direction marks, emoji.
"""

from __future__ import annotations

import re
from dataclasses import replace

from tests.tui.driving import driven, on_screen, pressed, settled, typed
from tests.tui.fake_book import NASTY, FakeBook, a_run
from tui.screens.finding import FindingPlace
from tui.screens.run_detail import RunScreen

ACTING = re.compile(r"[\x00-\x08\x0b-\x1f\x7f-\x9f\u200b-\u200f\u202a-\u202e\u2066-\u2069]")


def assert_tame(text: str) -> None:
    """Check that a screen holds no character that acts; newlines part its lines."""
    assert ACTING.search(text) is None, ACTING.search(text)


async def test_a_nasty_run_shows_as_text_in_every_place() -> None:
    book = FakeBook(runs=1)
    nasty = a_run(
        1, note=NASTY, by="[b]x", project="\u202eevil [@click=app.quit]go[/]", reference="\x1b[2J", code="R-0001"
    )
    book.runs["R-0001"] = replace(nasty, conditions=replace(nasty.conditions, workup="[red]w[/red] \x9b31m"))
    async with driven(book, size=(160, 50)) as (app, pilot):
        await pressed(pilot, "f3")
        text = on_screen(app)
        assert_tame(text)
        assert "[red]not red[/red]" in text
        assert "[@click=app.quit]" in text
        await pressed(pilot, "enter")
        assert isinstance(app.screen, RunScreen)
        assert_tame(on_screen(app))
        await pressed(pilot, "end")
        assert_tame(on_screen(app))
        await pressed(pilot, "escape", "f4")
        await typed(pilot, "#find-words", "not red")
        await pressed(pilot, "enter")
        await settled(pilot)
        assert isinstance(app.screen, FindingPlace)
        assert_tame(on_screen(app))


async def test_a_nasty_form_is_typed_kept_and_refused_without_acting() -> None:
    book = FakeBook()
    async with driven(book) as (app, pilot):
        await typed(pilot, "#field-scheme", "[red]CCBr[/red]")
        await typed(pilot, "#field-solvent", "[bold]\x1b[31mDMF")
        await typed(pilot, "#field-temperature", "\u202e60")
        text = on_screen(app)
        assert_tame(text)
        assert "[red]CCBr[/red]" in text


async def test_five_kilobytes_pasted_and_two_hundred_fast_keys_lose_nothing() -> None:
    from textual.events import Key, Paste

    book = FakeBook()
    async with driven(book) as (app, pilot):
        line = app.screen.query_one("#field-scheme")
        line.focus()
        await pilot.pause()
        pasted = "C" * 5000
        line.post_message(Paste(pasted))
        await settled(pilot)
        assert line.value == pasted
        line.value = ""
        await settled(pilot)
        keys = "CC(=O)OCC1" * 20
        for character in keys:
            app.post_message(Key(character, character))
        await settled(pilot, 5)
        assert line.value == keys


async def test_letters_after_enter_belong_to_the_next_line_however_fast() -> None:
    from textual.events import Key

    async with driven() as (app, pilot):
        app.screen.query_one("#field-scheme").focus()
        await pilot.pause()
        for word in ("CCBr", "NaI", "K2CO3"):
            for character in word:
                app.post_message(Key(character, character))
            app.post_message(Key("enter", "\r"))
        await settled(pilot)
        state = app.screen.form.state
        assert (state["scheme"], state["reagent"], state["base"]) == ("CCBr", "NaI", "K2CO3")


async def test_resizing_while_typing_keeps_everything() -> None:
    async with driven() as (app, pilot):
        await typed(pilot, "#field-scheme", "CCBr")
        for size in ((80, 24), (160, 50), (40, 12), (100, 30)):
            await pilot.resize_terminal(*size)
            await settled(pilot, 1)
        assert app.screen.query_one("#field-scheme").value == "CCBr"
        assert "Step" in on_screen(app)


async def test_a_nasty_note_is_typed_and_shown_tamely_and_kept_to_the_letter() -> None:
    from textual.widgets import TextArea

    from tui.screens.entry import EntryScreen

    async with driven() as (app, pilot):
        screen = EntryScreen({"scheme": "CCBr"})
        await app.push_screen(screen)
        await settled(pilot)
        note = screen.query_one("#field-note", TextArea)
        note.text = NASTY
        note.focus()
        note.scroll_visible(animate=False)
        await settled(pilot)
        assert_tame(on_screen(app))
        assert note.text == NASTY
        assert "[red]not red[/red]" in on_screen(app)
