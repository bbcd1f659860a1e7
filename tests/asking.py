"""Running one command in this process, as a terminal would: `ask("check", "CCBr", book=demo)`.

In process because a hundred subprocesses that each load RDKit would take minutes; what only a process can show (pipes,
signals, start-up) is tested with subprocesses in `tests/cli/test_process.py`.
"""

from __future__ import annotations

import contextlib
import io
import json
import sys
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from kb.cli.entry import run

WIDTH = 80


@dataclass(frozen=True)
class Answer:
    """What a command said."""

    status: int
    out: str
    err: str

    @property
    def json(self) -> Any:
        """Return the one JSON value on stdout, strictly read (NaN is none)."""
        return json.loads(self.out, parse_constant=_refuse)

    @property
    def error(self) -> dict[str, str]:
        """Return the contract's error object."""
        error = self.json["error"]
        assert set(error) == {"code", "message", "hint"}
        return dict(error)


def ask(*words: str, book: Path | str | None = None, stdin: str | None = None) -> Answer:
    """Run a command and return what it said.

    Args:
        words: command and arguments.
        book: put behind --book; None = no --book.
        stdin: text on standard input; None = as it is.
    """
    argv = [*(["--book", str(book)] if book is not None else []), *words]
    out, err = io.StringIO(), io.StringIO()
    before = sys.stdin
    if stdin is not None:
        sys.stdin = io.StringIO(stdin)
    try:
        with contextlib.redirect_stdout(out), contextlib.redirect_stderr(err):
            status = run(argv)
    finally:
        sys.stdin = before
    return Answer(status, out.getvalue(), err.getvalue())


def is_plain_refusal(answer: Answer) -> bool:
    """Return True where an answer is the contract's kind of failure: sentences on stderr, no traceback or own fault."""
    said = answer.err.strip()
    return (
        said.startswith("sidepath: ")
        and said.endswith((".", "?", "!", ")", "`"))
        and "Traceback" not in said
        and "itself failed" not in said
        and len(said) < 1500
        and not any(ord(c) < 32 and c != "\n" for c in answer.err + answer.out)
    )


def widest(text: str) -> int:
    """Return the length of the longest line."""
    return max((len(line) for line in text.splitlines()), default=0)


def _refuse(word: str) -> None:
    raise AssertionError(f"{word} is no JSON")
