"""Slow work without waiting: tickets that drop stale answers, one job at a time, quiet progress, undo.

Pure bookkeeping and one thread-safe progress; the workers themselves are methods of the screens. A thread
cannot be stopped, only asked, so the newest question waits for the running one and the ones between are
never asked. Whoever works for a screen finds the progress of its job with `current_progress`, however many calls
lie between: the port's methods need not hand it down.
"""

from __future__ import annotations

import threading
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from contextvars import ContextVar
from typing import Generic, TypeVar

from kb.progress import Progress, Silent

Question = TypeVar("Question")


class LatestOnly(Generic[Question]):
    """One question in work, at most one waiting: the newest. Used from the event loop only."""

    def __init__(self) -> None:
        self.ticket = 0
        self._is_running = False
        self._waiting: tuple[int, Question] | None = None

    def ask(self, question: Question) -> tuple[int, Question] | None:
        """Take a question; return it with its ticket when it may start now, None when it waits."""
        self.ticket += 1
        if self._is_running:
            self._waiting = (self.ticket, question)
            return None
        self._is_running = True
        return self.ticket, question

    def finish(self) -> tuple[int, Question] | None:
        """Note that the running job ended; return the waiting question, now running, or None."""
        waiting, self._waiting = self._waiting, None
        self._is_running = waiting is not None
        return waiting

    def drop_waiting(self) -> None:
        """Drop the waiting question; the running one may still answer."""
        self._waiting = None

    def is_current(self, ticket: int) -> bool:
        """Tell whether an answer still matters."""
        return ticket == self.ticket

    @property
    def is_busy(self) -> bool:
        """Return True while a job runs."""
        return self._is_running

    def forget(self) -> None:
        """Make every answer on its way stale, and drop the waiting question."""
        self.ticket += 1
        self._waiting = None


class ThreadProgress:
    """A `kb.progress.Progress` that reports from a thread at most every 0.25 s and can be asked to stop."""

    def __init__(self, report: Callable[[int, int | None, str], None], every_s: float = 0.25) -> None:
        self._report = report
        self._every_s = every_s
        self._last = 0.0
        self._stop = threading.Event()

    def advance(self, done: int, total: int | None, note: str = "") -> None:
        """Pass the report on when enough time went by, and always at the end."""
        now = time.monotonic()
        if done == total or now - self._last >= self._every_s:
            self._last = now
            self._report(done, total, note)

    def cancel(self) -> None:
        """Ask the job to stop at its next look."""
        self._stop.set()

    def cancelled(self) -> bool:
        """Return True once somebody asked to stop."""
        return self._stop.is_set()


_progress: ContextVar[Progress] = ContextVar("progress", default=Silent())  # noqa: B039 - it holds nothing


def current_progress() -> Progress:
    """Return the progress of the job that the calling thread works for; a silent one outside of jobs."""
    return _progress.get()


@contextmanager
def working_for(progress: Progress) -> Iterator[None]:
    """Let everything that is called inside report to, and be stopped by, this progress."""
    token = _progress.set(progress)
    try:
        yield
    finally:
        _progress.reset(token)


class EditLog:
    """Undo and redo for a form held as one dictionary of texts.

    Changes of the same field within MERGE_S are one step, so that undo takes back a word, not a letter.
    """

    MERGE_S = 1.0
    """Changes of one field within this time are one step [s]."""

    def __init__(self, state: dict[str, str], limit: int = 200) -> None:
        self._states = [dict(state)]
        self._at = 0
        self._limit = limit
        self._last: tuple[str, float] = ("", -1e9)

    def note(self, field: str, state: dict[str, str], now: float | None = None) -> None:
        """Keep the state after a change of `field`."""
        moment = time.monotonic() if now is None else now
        if state == self._states[self._at]:
            return
        is_same = self._last[0] == field and moment - self._last[1] < self.MERGE_S and self._at > 0
        del self._states[self._at + 1 :]
        if is_same:
            self._states[self._at] = dict(state)
        else:
            self._states.append(dict(state))
            del self._states[: -self._limit]
        self._at = len(self._states) - 1
        self._last = (field, moment)

    def undo(self) -> dict[str, str] | None:
        """Return the state before the last change, None when there is none."""
        return self._step(-1)

    def redo(self) -> dict[str, str] | None:
        """Return the state after, None when there is none."""
        return self._step(1)

    def _step(self, by: int) -> dict[str, str] | None:
        if not 0 <= self._at + by < len(self._states):
            return None
        self._at += by
        self._last = ("", -1e9)
        return dict(self._states[self._at])
