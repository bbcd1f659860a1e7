"""What every command shares: where the book is, who is asking, how to answer.

It owns the output channels: results to stdout, everything else to stderr; JSON when asked. It opens the book only
when a command asks for it, so that `--help` and completion load nothing heavy.
"""

from __future__ import annotations

import json
import os
import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from contextvars import ContextVar
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import typer

from kb.errors import SettingsError
from kb.plain import plain

if TYPE_CHECKING:
    from kb.book import Book


@dataclass(slots=True)
class Session:
    """The options given before or after the command.

    Attributes:
        book: path or URL; None = the default place.
        who: initials; None = SIDEPATH_AS, else the login name.
        as_json, quiet, verbose: as asked.
    """

    book: str | None = None
    who: str | None = None
    as_json: bool = False
    quiet: bool = False
    verbose: bool = False

    @property
    def initials(self) -> str:
        """Return who is asking.

        Raises:
            SettingsError: nobody is named and the login name is not to be had.
        """
        import getpass

        if self.who:
            return self.who
        try:
            return getpass.getuser()
        except (OSError, KeyError):
            raise SettingsError("Nobody is named.", "Give --as INITIALS or set SIDEPATH_AS.") from None

    @contextmanager
    def opened(self, *, read_only: bool = False) -> Iterator[Book]:
        """Open the book for the length of a command."""
        from kb.book import open_book

        with open_book(self.book, read_only=read_only) as book:
            yield book

    def answer(self, data: Any, text: str) -> None:
        """Print a result: JSON when asked, else text."""
        if self.as_json:
            self.print_json(data)
        elif text:
            typer.echo(text)

    def print_json(self, data: Any) -> None:
        """Print one JSON value on one line of stdout."""
        typer.echo(json.dumps(data, ensure_ascii=False))

    def say(self, text: str) -> None:
        """Tell the user something on stderr, unless --quiet."""
        if not self.quiet:
            typer.echo(plain(text, keep_lines=True), err=True)

    def progress(self, label: str) -> BarOnStderr:
        """Return a progress that draws one line on stderr (nothing with --quiet or away from a terminal)."""
        return BarOnStderr(label, shown=not self.quiet and sys.stderr.isatty())


class BarOnStderr:
    """Progress as one line rewritten at most four times a second; Ctrl-C asks the job to stop."""

    def __init__(self, label: str, *, shown: bool) -> None:
        self.label = label
        self.shown = shown
        self.stopped = False
        self._last = 0.0
        self._start = time.monotonic()

    def advance(self, done: int, total: int | None, note: str = "") -> None:
        """Redraw the line when a quarter of a second has passed."""
        now = time.monotonic()
        if not self.shown or (now - self._last < 0.25 and done != total):
            return
        self._last = now
        rate = done / max(now - self._start, 1e-6)
        of = f" of {total:,}" if total else ""
        left = f", {(total - done) / rate:.0f} s left" if total and rate > 0 and done < total else ""
        line = f"{self.label}: {done:,}{of} ({rate:,.0f}/s{left}) {plain(note)}"
        end = "\n" if done == total else ""
        sys.stderr.write("\r\x1b[2K" + line[:100] + end)
        sys.stderr.flush()

    def cancelled(self) -> bool:
        """Return True once Ctrl-C was pressed."""
        return self.stopped


def use_colour() -> bool:
    """Return True when stdout is a terminal and NO_COLOR is not set (no-color.org)."""
    return sys.stdout.isatty() and not os.environ.get("NO_COLOR")


_CURRENT: ContextVar[Session] = ContextVar("session")


def set_session(session: Session) -> None:
    """Make a session that of the running command; the root callback does."""
    _CURRENT.set(session)


def current_session() -> Session:
    """Return the session of the running command."""
    return _CURRENT.get()
