"""Finding.

Structures, transformations, words and conditions together, the hits drawn in a grid with their match.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import fields, replace
from functools import partial
from typing import ClassVar

from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Horizontal, Vertical
from textual.widgets import Input, Select, Static

from kb.chem.layout import SchemeDrawing
from kb.errors import SidepathError
from kb.record.run import Run
from kb.vocabulary import CarbonClass, LeavingGroup, Verdict
from tui.drawings import scheme_drawing
from tui.marks import mark_match
from tui.ports import BookPort, FindHit, FindPage, FindQuery
from tui.present import safe, words_of
from tui.screens.base import PlaceScreen
from tui.screens.run_actions import RunActions
from tui.screens.run_detail import RunScreen
from tui.styles import HERE
from tui.widgets.cards import HitCard, HitGrid
from tui.widgets.lines import SafeInput
from tui.widgets.panel import Panel
from tui.widgets.step_form import CatalogueSuggester

LINES: tuple[tuple[str, str, str], ...] = (
    ("substructure", "Holds", "SMARTS or SMILES, such as OC(=O)NC(C)(C)C"),
    ("similar", "Like", "SMILES"),
    ("at_least", "at least", "0.6"),
    ("transformation", "Change", "[C:1][Br]>>[C:1]N"),
    ("words", "Words", "emulsion"),
    ("solvent", "Solvent", "DMF"),
    ("base", "Base", "KOtBu"),
    ("temp_from", "From", "60 C"),
    ("temp_to", "To", "120 C"),
    ("since", "Since", "2026-01-01"),
)
ROWS: tuple[tuple[str, ...], ...] = (
    ("substructure",),
    ("similar", "at_least"),
    ("transformation",),
    ("words",),
    ("solvent", "base"),
    ("temp_from", "temp_to"),
    ("since",),
)
CHOICES: tuple[tuple[str, str, tuple[str, ...]], ...] = (
    ("role", "any role", ("substrate", "product", "reagent")),
    ("carbon_class", "any carbon", tuple(map(str, CarbonClass))),
    ("leaving_group", "any leaving group", tuple(map(str, LeavingGroup))),
    ("verdict", "any verdict", tuple(map(str, Verdict))),
    ("failed", "any outcome", ()),
)

Found = tuple[FindPage, list[tuple[FindHit, SchemeDrawing]]]


class FindingPlace(RunActions[None], PlaceScreen):
    """Search the record."""

    PLACE = "finding"
    CSS_PATH = HERE / "finding.tcss"
    HELP = """
Finding. Fill what you know, Enter searches; everything that is filled must hold. Holds takes a substructure
as SMARTS or SMILES, Like a whole structure, Change a transformation with atom maps on the atoms that
matter; solvent and base are completed from the catalogue, → takes the completion. Esc stops a search that
takes long. The matched atoms are marked • in the drawings. Arrow keys walk through the hits, Enter opens one, n
and b turn the pages.
"""
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("f9", "search", "Search", key_display="F9", id="find.search", tooltip="Search now"),
        Binding("ctrl+n", "clear", "New", id="find.new", tooltip="Empty the form"),
        Binding("slash", "form", "Form", key_display="/", show=False, id="find.form", tooltip="Back to the form"),
        Binding("n", "next_page", "Next page", id="find.next", tooltip="Next page"),
        Binding("b", "page_before", "Page before", show=False, id="find.before", tooltip="Page before"),
    ]

    def __init__(self) -> None:
        super().__init__()
        self._query = FindQuery()
        self._page = FindPage(total=0)
        kinds = {"solvent": "solvent", "base": "reagent"}
        self._suggesters = {name: CatalogueSuggester(kind, lambda *_: None) for name, kind in kinds.items()}

    def compose_place(self) -> ComposeResult:
        """Lay out the form and the hits."""
        words = {name: (title, example) for name, title, example in LINES}
        with Horizontal(id="finding"):
            with Panel("What is looked for", id="find-form"), Vertical(id="find-lines"):
                for row in ROWS:
                    with Horizontal(classes="form-row"):
                        for position, name in enumerate(row):
                            title, example = words[name]
                            classes = "form-word second" if position else "form-word"
                            yield Static(title, classes=classes, markup=False)
                            yield SafeInput(
                                placeholder=example,
                                id=f"find-{name}",
                                classes="line",
                                suggester=self._suggesters.get(name),
                            )
                for name, title, options in CHOICES:
                    pairs = [(words_of(option), option) for option in options]
                    yield Select(pairs, prompt=title, compact=True, id=f"find-{name}", classes="find-choice")
                yield Static("", id="find-trouble", classes="trouble", markup=False)
                yield Static("", id="find-notes", classes="quiet", markup=False)
            with Panel("Runs found", id="find-hits"):
                yield HitGrid(id="find-grid")

    def on_mount(self) -> None:
        """Start in the form."""
        super().on_mount()
        self.query_one("#find-substructure").focus()

    def book_arrived(self, book: BookPort) -> None:
        """Offer the book's words for failures, and names out of the catalogue."""
        for suggester in self._suggesters.values():
            suggester.book = book
        self.ask("modes", book.failure_modes, self._take_modes)

    def _take_modes(self, modes: object) -> None:
        pairs = [(f"{words_of(word)}: {meaning}", word) for word, meaning in modes]  # type: ignore[attr-defined]
        self.query_one("#find-failed", Select).set_options(pairs)

    @property
    def query_typed(self) -> FindQuery:
        """Return what the form asks."""
        values: dict[str, str] = {}
        for name, _, _ in LINES:
            values[name] = self.query_one(f"#find-{name}", Input).value.strip()
        for name, _, _ in CHOICES:
            value = self.query_one(f"#find-{name}", Select).value
            values[name] = value if isinstance(value, str) else ("any" if name == "role" else "")
        return FindQuery(**values)  # type: ignore[arg-type]

    @on(Input.Submitted)
    def _submitted(self, event: Input.Submitted) -> None:
        event.stop()
        self.action_search()

    def action_search(self) -> None:
        """Search from the first page."""
        query = self.query_typed
        asked = [f.name for f in fields(query) if f.name not in ("role", "page", "limit", "at_least")]
        if not any(getattr(query, name) for name in asked):
            self._show_trouble("Fill at least one line.")
            return
        self._search(query)

    def _search(self, query: FindQuery) -> None:
        book = self.book
        if book is None:
            return
        self._query = query
        self.query_one("#find-hits", Panel).say("Searching…")
        self.ask("find", partial(_find, query, book), self._show_found, self._not_found)

    async def _show(self, found: Found) -> None:
        await self.query_one(HitGrid).show(found[1], "Nothing in the record fits.", self.app.in_words)
        self.refresh_bindings()

    def _show_found(self, found: Found) -> None:
        self._page = found[0]
        page, query = found[0], self._query
        self._show_notes(page.notes)
        first = (query.page - 1) * query.limit
        shown = f"{first + 1} to {first + len(page.hits)} of {page.total:,}" if page.total else "none"
        took = f", {page.elapsed_ms:.0f} ms" if page.elapsed_ms is not None else ""
        self.query_one("#find-hits", Panel).say(f"Runs found: {shown}{took}")
        self.run_worker(self._show(found), group="cards", exclusive=True)

    def _not_found(self, error: SidepathError) -> None:
        self.query_one("#find-hits", Panel).say("Runs found")
        self._show_trouble(safe(error))

    def _show_notes(self, notes: Sequence[str]) -> None:
        """Show what the book remarks on a search."""
        self._show_trouble("")
        line = self.query_one("#find-notes", Static)
        line.update(safe(" ".join(notes)))

    def _show_trouble(self, words: str) -> None:
        trouble = self.query_one("#find-trouble", Static)
        trouble.set_class(bool(words), "-shown")
        trouble.update(f"✗ {words}" if words else "")

    @on(HitCard.Opened)
    def _open(self, event: HitCard.Opened) -> None:
        hit = event.hit
        self.app.push_screen(RunScreen(hit.run.code or "", hit.smiles, hit.atoms))

    @property
    def shown_run(self) -> Run | None:
        """Return the run of the card in focus."""
        grids = self.query(HitGrid)
        chosen = grids.first().chosen if grids and self.is_attached else None
        return chosen.run if chosen else None

    def run_changed(self, run: Run) -> None:
        """Search again."""
        self._search(self._query)

    def check_action(self, action: str, parameters: tuple[object, ...]) -> bool | None:
        """Grey out pages that are not there."""
        if action == "next_page":
            return True if self._query.page * self._query.limit < self._page.total else None
        if action == "page_before":
            return True if self._query.page > 1 else None
        return super().check_action(action, parameters)

    def action_form(self) -> None:
        """Go back to the form."""
        self.query_one("#find-substructure").focus()

    def action_clear(self) -> None:
        """Empty the form."""
        for line in self.query("#find-lines Input").results(Input):
            line.value = ""
        for choice in self.query("#find-lines Select").results(Select):
            choice.clear()
        self._show_trouble("")
        self.action_form()

    def action_next_page(self) -> None:
        """Turn the page."""
        self._search(replace(self._query, page=self._query.page + 1))

    def action_page_before(self) -> None:
        """Turn back."""
        self._search(replace(self._query, page=max(1, self._query.page - 1)))


def _find(query: FindQuery, book: BookPort) -> Found:
    """In the thread: search, and lay out the hits with their matches."""
    page = book.find(query)
    return page, [(hit, _drawn(hit)) for hit in page.hits]


def _drawn(hit: FindHit) -> SchemeDrawing:
    """Return the drawing of a hit: the fragment that matched where there is one, else the scheme."""
    if hit.smiles:
        return mark_match(scheme_drawing(hit.smiles), hit.smiles, hit.atoms)
    return scheme_drawing(hit.run.scheme)
