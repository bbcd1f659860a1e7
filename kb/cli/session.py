"""What every command shares: where the book is, who is asking, how to answer.

It owns the output channels: results to stdout, everything else to stderr; JSON when asked. It opens the book only
when a command asks for it, and reads the settings only then, so that `--help` and completion load nothing heavy.
"""

from __future__ import annotations

import json
import os
import signal
import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from contextvars import ContextVar
from dataclasses import dataclass
from functools import cached_property
from types import FrameType, TracebackType
from typing import TYPE_CHECKING, Any, TextIO

from kb.errors import Cancelled, SettingsError, SidepathError, StoreRefused
from kb.plain import excerpt, plain, plain_json

if TYPE_CHECKING:
    from kb.book import Book
    from kb.settings import Settings

LONGEST_MESSAGE = 600
"""Longest message on stderr [characters]; what a person typed may be part of it."""
LONGEST_INITIALS = 80
STDOUT = "<stdout>"
"""What an error names as its file when the answer could not be written."""


@dataclass(kw_only=True)
class Session:
    """The options given before or after the command.

    Attributes:
        book: path or URL; None = by the settings, else the default place.
        who: initials; None = by the settings, else the login name.
        as_json, quiet, verbose: as asked.
    """

    book: str | None = None
    who: str | None = None
    as_json: bool = False
    quiet: bool = False
    verbose: bool = False

    @cached_property
    def settings(self) -> Settings:
        """Return the settings, flags first.

        Raises:
            SettingsError: an unknown key or an impossible value.
        """
        from kb.paths import settings_file
        from kb.settings import load_settings

        return load_settings({"book": self.book, "as": self.who}, file=settings_file())

    @property
    def initials(self) -> str:
        """Return who is asking.

        Raises:
            SettingsError: nobody is named and the login name is not to be had, or the name is no name.
        """
        import getpass

        who = self.settings.initials
        if who is None:
            try:
                who = getpass.getuser()
            except (OSError, KeyError):
                raise SettingsError("Nobody is named.", "Give --as INITIALS or set SIDEPATH_AS.") from None
        if len(who) > LONGEST_INITIALS or not who.isprintable():
            raise SettingsError(
                f"{excerpt(who, 20)!r} are no initials.", "Give a few letters with --as or SIDEPATH_AS.", who
            )
        return who

    @contextmanager
    def opened(self, *, read_only: bool = False) -> Iterator[Book]:
        """Open the book for the length of a command."""
        from kb.book import open_book

        with open_book(self.settings.book, read_only=read_only, wait_s=self.settings.wait_s) as book:
            yield book

    @contextmanager
    def opened_if_possible(self) -> Iterator[Book]:
        """Open the book for writing where that is allowed, else for reading; for checks that can do more with it."""
        from kb.book import open_book

        try:
            book = open_book(self.settings.book, wait_s=self.settings.wait_s)
        except StoreRefused:
            book = open_book(self.settings.book, read_only=True)
        with book:
            yield book

    def answer(self, data: Any, text: str) -> None:
        """Print a result: JSON when asked, else text, which the caller has made safe."""
        if self.as_json:
            self.print_json(data)
        elif text:
            put(text)

    def print_json(self, data: Any) -> None:
        """Print one JSON value on one line of stdout."""
        put(json_line(data))

    def refuse(self, data: dict[str, Any], error: SidepathError) -> None:
        """Say an error on stderr; with JSON asked also the object on stdout, which has more to tell, with it inside."""
        if self.as_json:
            self.print_json(data | {"error": error.as_dict()})
        complain(error.as_dict())

    def say(self, text: str) -> None:
        """Tell the user something on stderr, unless --quiet."""
        if not self.quiet:
            write_line(sys.stderr, plain(excerpt(text, LONGEST_MESSAGE), keep_lines=True))

    def progress(self, label: str) -> BarOnStderr:
        """Return a progress, to be used as a context: one line on stderr, and Ctrl-C taken for a wish to stop.

        It draws nothing with --quiet or away from a terminal.
        """
        return BarOnStderr(label, shown=not self.quiet and sys.stderr.isatty())


class ReaderGone(Exception):
    """Raised when whoever read our answer has seen enough (`| head`); no failure."""


class Misused(Exception):
    """Raised when the words given are no command, or not as it wants them."""

    def __init__(self, message: str, hint: str) -> None:
        super().__init__(message, hint)
        self.message = message
        self.hint = hint


class BarOnStderr:
    """Progress as one line rewritten at most four times a second.

    The first Ctrl-C asks the job to stop at the next good place, so that what is finished is kept; the second one stops
    it where it is.
    """

    def __init__(self, label: str, *, shown: bool) -> None:
        self.label = label
        self.shown = shown
        self.stopped = False
        self._last = 0.0
        self._start = time.monotonic()
        self._open_line = False
        self._before: Any = None

    def __enter__(self) -> BarOnStderr:
        try:
            self._before = signal.signal(signal.SIGINT, self._ask_to_stop)
        except ValueError:  # only the main thread may set handlers
            self._before = None
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if self._before is not None:
            signal.signal(signal.SIGINT, self._before)
        if self._open_line:
            sys.stderr.write("\n")

    def _ask_to_stop(self, number: int, frame: FrameType | None) -> None:
        if self.stopped:
            raise KeyboardInterrupt
        self.stopped = True

    def check_stopped(self) -> None:
        """Raise Cancelled where the job was stopped; for jobs that give nothing when they are not finished."""
        if self.stopped:
            raise Cancelled("Stopped.", "What was finished before is kept.")

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
        self._open_line = done != total
        sys.stderr.write("\r\x1b[2K" + line[:79] + ("" if self._open_line else "\n"))
        sys.stderr.flush()

    def cancelled(self) -> bool:
        """Return True once Ctrl-C was pressed."""
        return self.stopped


def write_line(stream: TextIO, text: str) -> None:
    """Write a line to stdout or stderr at once; on Windows through Typer, which knows its old consoles."""
    if sys.platform == "win32":
        import typer

        typer.echo(text, file=stream)
        return
    stream.write(f"{text}\n")
    stream.flush()


def put(text: str) -> None:
    """Print a line of a result on stdout.

    Raises:
        ReaderGone: nobody reads any more.
        OSError: stdout takes no more; its file name is STDOUT, so that nobody blames the book.
    """
    try:
        write_line(sys.stdout, text)
    except BrokenPipeError:
        raise ReaderGone from None
    except OSError as error:
        error.filename = STDOUT
        raise


def json_line(data: Any) -> str:
    """Return a value as one line of JSON that is safe on a terminal and fits the encoding of stdout."""
    line = plain_json(json.dumps(data, ensure_ascii=False, default=str))
    try:
        line.encode(sys.stdout.encoding or "utf-8")
    except (UnicodeEncodeError, LookupError):
        return json.dumps(data, default=str)
    return line


def complain(error: dict[str, str]) -> None:
    """Say an error in plain sentences on stderr."""
    message, hint = (excerpt(error[part], LONGEST_MESSAGE) for part in ("message", "hint"))
    write_line(sys.stderr, f"sidepath: {plain(f'{message} {hint}'.strip())}")


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
