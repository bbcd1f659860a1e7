"""The terminal application: opens the book, holds the places, themes and the clipboard.

It owns no chemistry and no layout. First paint comes first: this file loads little and paints the bar, only
then is the planning place loaded and the book opened in a worker; until it is there, questions wait.
Stylesheets other than the common one belong to the screens that need them, for the same reason.
"""

from __future__ import annotations

import asyncio
import gc
import logging
import signal
from collections.abc import Callable, Iterable
from pathlib import Path
from typing import TYPE_CHECKING, Any, ClassVar

from textual import on
from textual.app import App, ComposeResult, SystemCommand
from textual.binding import Binding, BindingType
from textual.events import Key
from textual.reactive import reactive
from textual.screen import Screen
from textual.worker import Worker, WorkerState

from kb.errors import SidepathError, StoreMissing
from kb.plain import plain, shortened
from tui.messages import RunStored
from tui.palette import ActionProvider
from tui.styles import HERE
from tui.themes import THEME_OF_SETTING, THEMES, TOKENS
from tui.widgets.place_bar import PlaceBar

if TYPE_CHECKING:
    from tui.ports import BookPort, Opener

log = logging.getLogger(__name__)

STOPPED = "Sidepath stopped on a fault of the program. What you typed is kept as a draft; the log has the details."

SWITCH_S = 0.002
"""How long a worker thread may hold the interpreter while a key waits [s].

Python's own 5 ms is felt in typing.
"""


class SidepathApp(App[None]):
    """Plan a step, see what the record says, write down what came out."""

    TITLE = "Sidepath"
    CSS_PATH = HERE / "tokens.tcss"
    HORIZONTAL_BREAKPOINTS = [  # noqa: RUF012 - as declared by Textual
        (0, "-narrow"),
        (96, "-normal"),
        (150, "-wide"),
    ]
    VERTICAL_BREAKPOINTS = [(0, "-low"), (28, "-tall")]  # noqa: RUF012 - as declared by Textual
    COMMANDS: ClassVar[set[Any]] = {ActionProvider}
    MODES: ClassVar[dict[str, str | Callable[[], Screen[Any]]]] = {
        "planning": lambda: _late("tui.screens.planning", "PlanningScreen"),
        "runs": lambda: _late("tui.screens.runs", "RunsScreen"),
        "finding": lambda: _late("tui.screens.finding", "FindingPlace"),
        "failures": lambda: _late("tui.screens.failures", "FailuresPlace"),
        "route": lambda: _late("tui.screens.route", "RoutePlace"),
    }
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding(
            "f2",
            "place('planning')",
            "Planning",
            show=False,
            key_display="F2",
            id="place.planning",
            tooltip="Plan a step",
        ),
        Binding(
            "f3", "place('runs')", "Runs", show=False, key_display="F3", id="place.runs", tooltip="The runs of the book"
        ),
        Binding(
            "f4",
            "place('finding')",
            "Finding",
            show=False,
            key_display="F4",
            id="place.finding",
            tooltip="Search the record",
        ),
        Binding(
            "f5",
            "place('failures')",
            "Failures",
            show=False,
            key_display="F5",
            id="place.failures",
            tooltip="What keeps going wrong, hindsight, coverage, trust",
        ),
        Binding(
            "f6",
            "place('route')",
            "Route",
            show=False,
            key_display="F6",
            id="place.route",
            tooltip="A sequence of steps: what it yields, what it needs, where it is weak",
        ),
        Binding("ctrl+t", "next_theme", "Theme", show=False, id="theme", tooltip="Dark, light or high contrast"),
        Binding("ctrl+g", "words", "Words", show=False, id="words", tooltip="Words instead of drawings, and back"),
        Binding(
            "f10",
            "drafts",
            "Drafts",
            show=False,
            key_display="F10",
            id="drafts",
            tooltip="Forms that were kept unfinished",
        ),
        Binding("ctrl+o", "books", "Books", show=False, id="books", tooltip="Open another book"),
        Binding("ctrl+q", "quit", "Quit", id="quit", tooltip="Leave the program; drafts are kept"),
    ]

    book: reactive[BookPort | None] = reactive(None, init=False)
    book_words: reactive[str] = reactive("opening the book…")
    in_words: reactive[bool] = reactive(False)
    changes: int = 0
    """How often the record was changed from here; whoever shows a sum over it compares."""

    def __init__(self, opener: Opener, place: str | None = None, who: str = "", theme: str = "") -> None:
        super().__init__()
        self._opener = opener
        self._place = place
        self.who = who
        self._early: list[Key] | None = []
        for known in THEMES:
            self.register_theme(known)
        names = [known.name for known in THEMES]
        self.theme = theme if theme in names else names[0]

    def get_theme_variable_defaults(self) -> dict[str, str]:
        """Return our tokens, for themes that do not know them."""
        return dict(TOKENS)

    def get_system_commands(self, screen: Screen[Any]) -> Iterable[SystemCommand]:
        """Return nothing: every command comes from the bindings."""
        return ()

    def compose(self) -> ComposeResult:
        """Lay out the first paint: the bar alone."""
        yield PlaceBar("planning", id="place-bar")

    def on_mount(self) -> None:
        """Go to work once the bar is painted; when told to end from outside, leave the terminal as it was."""
        if not self.is_headless:
            for number in (signal.SIGTERM, signal.SIGHUP):
                asyncio.get_running_loop().add_signal_handler(number, self.exit)
        self.call_after_refresh(self._begin)

    def on_unmount(self) -> None:
        """Let go of the book when the program is left."""
        if self.book is not None:
            self.book.close()

    async def _begin(self) -> None:
        """Load the planning place and open the book."""
        self.open_book(lambda: self._opener.open(self._place))
        await self.switch_mode("planning")
        self.call_after_refresh(self._type_early_keys)

    def on_key(self, event: Key) -> None:
        """Keep what is typed before there is a form to type into."""
        if self._early is not None:
            self._early.append(event)

    def _type_early_keys(self) -> None:
        early, self._early = self._early or [], None
        for event in early:
            self.post_message(Key(event.key, event.character))

    @property
    def opener(self) -> Opener:
        """Return how books are opened."""
        return self._opener

    def _fatal_error(self) -> None:
        """Stop on a fault of the program with plain words; the traceback goes to the log."""
        log.error("stopped on a fault", exc_info=self._exception)
        self.panic(STOPPED)

    def open_book(self, how: Callable[[], BookPort]) -> None:
        """Open a book in a worker; `how` runs in its thread."""
        self.book_words = "opening the book…"
        self.run_worker(how, name="open", group="open", thread=True, exclusive=True, exit_on_error=False)

    @on(Worker.StateChanged)
    def _opened(self, event: Worker.StateChanged) -> None:
        if event.worker.group != "open":
            return
        if event.state is WorkerState.SUCCESS:
            if event.worker.result is not None:
                self.use_book(event.worker.result)
        elif event.state is WorkerState.ERROR:
            error = event.worker.error
            if not isinstance(error, SidepathError):
                log.error("opening the book failed", exc_info=error)
                error = SidepathError("The book could not be opened; the log has the details.")
            self.book_words = "no book open"
            self.action_books(None if isinstance(error, StoreMissing) and self._place is None else error)

    def use_book(self, book: BookPort) -> None:
        """Take a book that was opened; the one before is let go."""
        old, self.book = self.book, book
        if old is not None and old is not book:
            old.close()
        if not self.is_headless:
            gc.freeze()  # what is loaded stays; to look through it for garbage takes 60 ms, felt in typing
        self.count_runs()

    @on(RunStored)
    def count_runs(self) -> None:
        """Refresh the state of the book in the bar."""
        self.changes += 1
        book = self.book
        if book is not None:
            self.run_worker(
                lambda: self.call_from_thread(self._show_state, book, book.count()),
                name="count",
                group="count",
                thread=True,
                exclusive=True,
                exit_on_error=False,
            )

    def _show_state(self, book: BookPort, count: int) -> None:
        name = shortened(plain(Path(book.place).name or book.place), 24)
        writes = "read only" if book.is_read_only else shortened(plain(self.who or "nobody named"), 16)
        self.book_words = f"{name} · {count:,} run{'' if count == 1 else 's'} · {writes}"

    def copy_text(self, kind: str, text: str) -> None:
        """Put a text on the clipboard of the terminal (OSC 52) and say so."""
        self.copy_to_clipboard(text)
        self.notify(f"{kind} copied ({len(text)} characters).", markup=False, timeout=3)

    def watch_in_words(self, in_words: bool) -> None:
        """Show every drawing in words, or drawn."""
        for screen in self.screen_stack:
            for view in screen.query("SchemeView"):
                view.in_words = in_words  # type: ignore[attr-defined]

    async def plan_from(self, state: dict[str, str]) -> None:
        """Go to planning with a filled form."""
        while len(self.screen_stack) > 1:
            self.pop_screen()
        await self.switch_mode("planning")
        take = getattr(self.screen, "take", None)
        if take is not None:
            take(state)

    async def action_place(self, name: str) -> None:
        """Go to a place."""
        if name in self.MODES and not self.screen.is_modal:
            await self.switch_mode(name)

    def action_next_theme(self) -> None:
        """Take the next theme."""
        names = [known.name for known in THEMES]
        at = names.index(self.theme) if self.theme in names else -1
        self.theme = names[(at + 1) % len(names)]

    def action_words(self) -> None:
        """Switch between drawings and words."""
        self.in_words = not self.in_words

    def action_books(self, error: SidepathError | None = None) -> None:
        """Offer the demo, a new book or an existing one."""
        show_trouble = getattr(self.screen, "show_trouble", None)
        if self.screen.id == "first-run" and show_trouble is not None:
            show_trouble(error)
        else:
            self.push_screen(_late("tui.screens.firstrun", "FirstRunScreen", error))

    def action_drafts(self) -> None:
        """Offer the forms that were kept."""
        if self.book is not None and not self.screen.is_modal:
            self.push_screen(_late("tui.screens.drafts", "DraftsScreen"))


def run_application(book: str | None, who: str | None) -> None:
    """Run the terminal interface until it is closed.

    Args:
        book: path or URL; None = the settings' book, else the default place.
        who: initials of who writes; None = the settings', else the login name.

    Raises:
        SettingsError: the settings cannot be read.
        SidepathError: the interface stopped on a fault.
    """
    import getpass
    import sys

    from kb.logs import log_to_file
    from kb.paths import log_file, settings_file
    from kb.settings import load_settings
    from tui.opening import DeskOpener

    settings = load_settings({"book": book, "as": who}, file=settings_file())
    sys.setswitchinterval(SWITCH_S)
    with log_to_file(log_file()):
        app = SidepathApp(
            DeskOpener(),
            place=settings.book,
            who=settings.initials or getpass.getuser(),
            theme=THEME_OF_SETTING.get(settings.theme, ""),
        )
        app.run()
    if app.return_code:
        raise SidepathError("The terminal interface did not end as it should.", f"See {log_file()}.")


def _late(module: str, name: str, *arguments: Any) -> Screen[Any]:
    """Return a screen of a module that is loaded when the place is first visited, to keep the start short."""
    from importlib import import_module

    screen: Screen[Any] = getattr(import_module(module), name)(*arguments)
    return screen
