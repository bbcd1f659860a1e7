"""A question about the whole record, asked in a process of its own, so that whoever asks stays free to do else.

It owns the process and what is said over the line between the two: progress comes back, a wish to stop goes out, the
answer or the error ends it. A thread would do the same work, but would hold the interpreter, and typing with it. The
process reads the book for itself and writes nothing to it. It ends with whoever asked, even when that one was killed.
It is started by hand, since `multiprocessing` wants a real standard error, which a terminal interface does not have.

A replay is kept in a file of the cache, so that one that was stopped goes on where it stopped; a file of another state
of the book is thrown away.
"""

from __future__ import annotations

import os
import subprocess
import sys
import threading
import time
from hashlib import sha256
from multiprocessing.connection import Connection
from pathlib import Path
from typing import TYPE_CHECKING, Any

from kb.errors import Cancelled, InvalidRecord, SidepathError
from kb.progress import Progress

if TYPE_CHECKING:
    from kb.book.facade import Book

QUESTIONS = ("recurring", "tally", "replay", "coverage", "calibration")
_LOOK_S = 0.1
"""How often a wish to stop is looked for [s]."""
_PATIENCE_S = 10.0
"""How long a process that was asked to stop may take to end by itself [s]."""
_NICE = 10
"""How far the work stands back behind whoever types; on Windows it does not."""
_RECEIVING = threading.Lock()
"""One answer is unpacked at a time: the first loads NumPy, which two threads at once cannot."""


def ask_beside(address: str, question: str, progress: Progress, replays: Path | None = None) -> Any:
    """Ask a question of QUESTIONS about a book, in a process of its own; return the answer.

    Args:
        address: path or URL of the book.
        replays: folder in which a replay is kept; None = it is not kept.

    Raises:
        Cancelled: progress asked to stop, and the question has no part answer to give.
        SidepathError: what the asked function raised; also when the process ended without an answer.
    """
    start = f"import sys; sys.path[:] = {sys.path!r}; from kb.book.beside import answer; answer()"
    process = subprocess.Popen(
        [sys.executable, "-c", start],
        stdin=subprocess.PIPE,
        stdout=subprocess.PIPE,
        stderr=subprocess.DEVNULL,
    )
    assert process.stdin is not None and process.stdout is not None  # both were asked for
    out = Connection(os.dup(process.stdin.fileno()), readable=False)
    back = Connection(os.dup(process.stdout.fileno()), writable=False)
    process.stdin.close()
    process.stdout.close()
    try:
        out.send((address, question, replays))
        return _listen(out, back, progress)
    except (EOFError, BrokenPipeError, ConnectionResetError):
        raise SidepathError(
            "The work on the record ended without an answer.", "Ask again; `sidepath --verbose audit` may tell why."
        ) from None
    finally:
        out.close()  # which ends the process, should it still be there
        back.close()
        try:
            process.wait(_PATIENCE_S)
        except subprocess.TimeoutExpired:
            process.kill()
            process.wait()


def _listen(out: Connection, back: Connection, progress: Progress) -> Any:
    told = False
    while True:
        if progress.cancelled() and not told:
            told = True
            out.send("stop")
        if not back.poll(_LOOK_S):
            continue
        with _RECEIVING:
            kind, value = back.recv()
        if kind == "progress":
            progress.advance(*value)
        elif kind == "error":
            raise value
        else:
            return value


class _Line:
    """Progress at the far end: reports go back over one line, a wish to stop comes over the other."""

    def __init__(self, wishes: Connection, back: Connection) -> None:
        self._wishes = wishes
        self._back = back
        self._last = 0.0
        self._stop = threading.Event()
        threading.Thread(target=self._wait, daemon=True).start()

    def _wait(self) -> None:
        try:
            self._wishes.recv()
            self._stop.set()
            self._wishes.recv()
        except (EOFError, OSError):
            os._exit(0)  # whoever asked is gone

    def advance(self, done: int, total: int | None, note: str = "") -> None:
        """Send a report when enough time went by."""
        now = time.monotonic()
        if now - self._last >= _LOOK_S:
            self._last = now
            self._back.send(("progress", (done, total, note)))

    def cancelled(self) -> bool:
        """Return True once the other end asked to stop."""
        return self._stop.is_set()


def answer() -> None:
    """Answer one question in the new process, which never touches the terminal."""
    if hasattr(os, "nice"):
        os.nice(_NICE)
    wishes, back = Connection(os.dup(0), writable=False), Connection(os.dup(1), readable=False)
    quiet = os.open(os.devnull, os.O_RDWR)
    for stream in (0, 1, 2):
        os.dup2(quiet, stream)
    address, question, replays = wishes.recv()
    from kb.book.facade import open_book

    try:
        with open_book(address, read_only=True) as book:
            value = _asked(book, question, _Line(wishes, back), replays)
        back.send(("answer", value))
    except SidepathError as error:
        back.send(("error", error))


def _asked(book: Book, question: str, progress: Progress, replays: Path | None) -> Any:
    from kb.book import whole

    if question == "recurring":
        return whole.find_recurring_failures(book, progress=progress)
    if question == "tally":
        return whole.tally_book(book, progress)
    if question == "coverage":
        answer = whole.measure_book_coverage(book, progress=progress)
        if progress.cancelled():
            raise Cancelled("The audit was stopped.", "Nothing was changed.")
        return answer
    if question == "calibration":
        return whole.calibrate_book(book, progress=progress)
    if question != "replay":
        raise ValueError(f"{question!r} is none of {QUESTIONS}")
    processes = whole.processes_for(book)
    if replays is None:
        return whole.replay_book(book, progress=progress, processes=processes)
    replays.mkdir(parents=True, exist_ok=True)
    keep = replays / f"replay-{sha256(book.path.encode('utf-8', 'surrogatepass')).hexdigest()[:16]}.jsonl"
    try:
        return whole.replay_book(book, progress=progress, processes=processes, keep=keep)
    except InvalidRecord:
        keep.unlink(missing_ok=True)
        return whole.replay_book(book, progress=progress, processes=processes, keep=keep)
