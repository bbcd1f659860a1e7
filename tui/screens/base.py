"""What every place shares: the bar with the places, questions to the book, trouble in place, copying.

It asks in worker threads and takes answers back on the event loop, one question of a kind at a time, newest
first served; a screen never calls the book directly. Errors of the family are shown as their sentence;
anything else is logged and shown as a fault of the program, and the screen stays usable.
"""

from __future__ import annotations

import logging
from collections.abc import Callable
from functools import partial
from typing import TYPE_CHECKING, Any, ClassVar, TypeVar

from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.message import Message
from textual.screen import Screen
from textual.timer import Timer
from textual.widgets import Footer, Static
from textual.worker import Worker, WorkerState

from kb.errors import SidepathError
from tui.jobs import LatestOnly, ThreadProgress, working_for
from tui.ports import BookPort
from tui.present import safe
from tui.widgets.place_bar import PlaceBar

if TYPE_CHECKING:
    from tui.application import SidepathApp

log = logging.getLogger(__name__)

Value = TypeVar("Value")
ScreenResult = TypeVar("ScreenResult")

FAULT = "Something went wrong inside the program; the log has the details. What you typed is safe."


class Answered(Message):
    """A worker is done: `take` is to be called on the event loop with what it found."""

    def __init__(self, kind: str, ticket: int, take: Callable[[], None]) -> None:
        super().__init__()
        self.kind = kind
        self.ticket = ticket
        self.take = take


class Progressed(Message):
    """A job got on; only the newest of these matters."""

    def __init__(self, kind: str, words: str) -> None:
        super().__init__()
        self.kind = kind
        self.words = words

    def can_replace(self, message: Message) -> bool:
        """Let a newer report take the place of one that was not shown yet."""
        return isinstance(message, Progressed) and message.kind == self.kind


class AskingScreen(Screen[ScreenResult]):
    """A screen that puts questions to the book."""

    HELP: ClassVar[str] = ""
    app: SidepathApp

    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("f1", "help", "Help", key_display="F1", id="help", tooltip="What this screen is for, and its keys"),
        Binding("f8", "copy", "Copy", key_display="F8", id="copy", tooltip="Copy as SMILES, Markdown or JSON"),
    ]

    def __init__(self, **options: Any) -> None:
        super().__init__(**options)
        self._delayed: dict[str, Timer] = {}
        self._boxes: dict[str, LatestOnly[tuple[Callable[[], Any], Callable[[Any], None], Any]]] = {}
        self._in_work: dict[str, ThreadProgress] = {}

    @property
    def book(self) -> BookPort | None:
        """Return the open book, None while it is being opened."""
        return self.app.book

    def on_mount(self) -> None:
        """Hear of the book when it is open."""
        self.watch(self.app, "book", self._book_changed)

    def on_unmount(self) -> None:
        """Stop what still runs: nobody will see the answer, and leaving would wait for it."""
        self._stop_all()

    def _book_changed(self, book: BookPort | None) -> None:
        if book is not None:
            self.book_arrived(book)

    def book_arrived(self, book: BookPort) -> None:
        """Take the open book; called again when another one is opened."""

    def ask(
        self,
        kind: str,
        work: Callable[[], Value],
        done: Callable[[Value], None],
        failed: Callable[[SidepathError], None] | None = None,
    ) -> None:
        """Run `work` in a thread and hand its value to `done`, unless a newer question came meanwhile.

        A job whose answer nobody waits for any more is told to stop, so that the newer one need not wait for it.
        """
        box = self._boxes.setdefault(kind, LatestOnly())
        if started := box.ask((work, done, failed or self.show_trouble)):
            self._start_job(kind, *started)
        elif kind in self._in_work:
            self._in_work[kind].cancel()

    def later(self, name: str, delay_s: float, what: Callable[[], None]) -> None:
        """Do something after a pause; asking again under the same name starts the pause anew."""
        if name in self._delayed:
            self._delayed[name].stop()
        self._delayed[name] = self.set_timer(delay_s, partial(self._now, name, what))

    def _now(self, name: str, what: Callable[[], None]) -> None:
        self._delayed.pop(name, None)
        what()

    def drop_later(self, name: str) -> None:
        """Do not do what waits under this name."""
        if name in self._delayed:
            self._delayed.pop(name).stop()

    def forget(self, kind: str) -> None:
        """Drop whatever answer of a kind is still on its way."""
        if kind in self._boxes:
            self._boxes[kind].forget()
        if kind in self._in_work:
            self._in_work[kind].cancel()

    @property
    def is_asking(self) -> bool:
        """Return True while any question is open or about to be asked."""
        return bool(self._delayed) or any(box.is_busy for box in self._boxes.values())

    def _start_job(
        self, kind: str, ticket: int, question: tuple[Callable[[], Any], Callable[[Any], None], Any]
    ) -> None:
        progress = ThreadProgress(partial(self._pass_on, kind))
        self._in_work[kind] = progress
        self.run_worker(
            partial(self._work, kind, ticket, question, progress),
            name=kind,
            group=kind,
            thread=True,
            exit_on_error=False,
        )
        self._show_busy()

    def _pass_on(self, kind: str, done: int, total: int | None, note: str) -> None:
        """In the thread: pass on how far a job is."""
        self.post_message(Progressed(kind, progress_words(done, total, note)))

    @on(Progressed)
    def _job_got_on(self, event: Progressed) -> None:
        event.stop()
        if event.kind in self._in_work:
            for bar in self.query(PlaceBar):
                bar.progress = event.words

    def _work(
        self,
        kind: str,
        ticket: int,
        question: tuple[Callable[[], Any], Callable[[Any], None], Any],
        progress: ThreadProgress,
    ) -> None:
        """In the thread: answer, or say why not. Anything unforeseen is left to the worker's own state."""
        work, done, failed = question
        try:
            with working_for(progress):
                value = work()
        except SidepathError as error:
            self.post_message(Answered(kind, ticket, partial(failed, error)))
        except SystemExit as error:  # would end the event loop, and with it the interface
            raise RuntimeError(f"a worker asked to end the program: {error}") from error
        else:
            self.post_message(Answered(kind, ticket, partial(done, value)))

    @on(Answered)
    def _job_answered(self, event: Answered) -> None:
        event.stop()
        box = self._boxes[event.kind]
        is_current = box.is_current(event.ticket)
        self._next_job(event.kind)
        if is_current:
            event.take()

    def _next_job(self, kind: str) -> None:
        if (progress := self._in_work.pop(kind, None)) is not None:
            progress.cancel()  # it has ended, or nobody will hear of it: then its thread is told to end
        if waiting := self._boxes[kind].finish():
            self._start_job(kind, *waiting)
        self._show_busy()

    @on(Worker.StateChanged)
    def _worker_changed(self, event: Worker.StateChanged) -> None:
        if event.state is WorkerState.ERROR and event.worker.group in self._boxes:
            log.error("worker %s failed", event.worker.name, exc_info=event.worker.error)
            self._next_job(event.worker.group)
            self.show_trouble(SidepathError(FAULT))
        elif event.state is WorkerState.CANCELLED and event.worker.group in self._boxes:
            self._next_job(event.worker.group)

    def _show_busy(self) -> None:
        for bar in self.query(PlaceBar):
            bar.is_busy = self.is_asking
            if not self._in_work:
                bar.progress = ""

    def show_trouble(self, error: SidepathError | None) -> None:
        """Show what went wrong at the foot of the screen; None takes it away."""
        for line in self.query("#place-trouble").results(Static):
            line.set_class(error is not None, "-shown")
            if error is not None:
                line.update(f"✗ {safe(error)}")

    def check_action(self, action: str, parameters: tuple[object, ...]) -> bool | None:
        """Offer to stop only while something runs."""
        if action == "stop":
            return bool(self._in_work)
        return True

    def action_stop(self) -> None:
        """Ask whatever runs to stop, and drop what waits behind it."""
        self._stop_all()

    def _stop_all(self) -> None:
        for box in self._boxes.values():
            box.drop_waiting()
        for progress in self._in_work.values():
            progress.cancel()

    def copy_texts(self) -> dict[str, str]:
        """Return what can be copied, by kind ("SMILES", "Markdown", "JSON")."""
        return {}

    def action_help(self) -> None:
        """Show the help of this screen."""
        from tui.screens.help import HelpScreen

        self.app.push_screen(HelpScreen(self))

    def action_copy(self) -> None:
        """Offer the kinds of text that can be copied."""
        from tui.screens.copying import CopyScreen

        texts = self.copy_texts()
        if not texts:
            self.app.notify("There is nothing here to copy yet.", markup=False)
            return
        self.app.push_screen(CopyScreen(texts))

    def action_copy_as(self, kind: str) -> None:
        """Copy one kind at once."""
        texts = self.copy_texts()
        if kind not in texts:
            self.app.notify(f"There is no {kind} to copy here.", markup=False)
            return
        self.app.copy_text(kind, texts[kind])


def progress_words(done: int, total: int | None, note: str) -> str:
    """Return how far a job is.

    >>> progress_words(4500, 100000, "runs read")
    '4,500 of 100,000 runs read'
    """
    count = f"{done:,}" + (f" of {total:,}" if total else "") if done or total else ""
    return " ".join(filter(None, (count, note)))


class PlaceScreen(AskingScreen[None]):
    """One of the places of the navigation."""

    PLACE: ClassVar[str] = ""
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding(
            "escape",
            "stop",
            "Stop",
            show=False,
            key_display="Esc",
            id="stop",
            tooltip="Stop the search or check that is running",
        ),
    ]

    def compose(self) -> ComposeResult:
        """Lay out the bar, the place itself, the trouble line and the keys."""
        yield PlaceBar(self.PLACE, id="place-bar")
        yield from self.compose_place()
        yield Static("", id="place-trouble", classes="trouble", markup=False)
        yield Footer(show_command_palette=False)

    def compose_place(self) -> ComposeResult:
        """Lay out the place."""
        yield from ()
