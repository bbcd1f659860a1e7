"""Deriving in other processes: a run's facts, places and screens worked out on every core while the book is written.

It owns the processes and the pipes to them, nothing of what is derived. They are plain interpreters that import what
they need and never the program that started them, so a script without a guard is not run twice. One that cannot be
started, or that dies, is done without: its share is worked out here, slower and to the same content. A Ctrl-C meant for
the program does not reach them; when it is gone, however that came, they meet the end of their pipe and stop.

Content and order are those of one process: pieces come back in the order in which they went out.
"""

from __future__ import annotations

import logging
import os
import pickle
import subprocess
import sys
import threading
from collections import OrderedDict
from collections.abc import Callable, Sequence
from concurrent.futures import Future, ThreadPoolExecutor
from dataclasses import dataclass, field
from typing import IO, Any, Self

from kb.errors import Cancelled
from kb.record.run import Run
from kb.store.deriving import Deriving, Prepared
from kb.store.values import Encoded

log = logging.getLogger(__name__)

PIECE = 125
"""Runs handed to a process at a time: some tenths of a second of work."""

REMEMBERED = 50_000
"""Structures that a process remembers having encoded, so that common reagents are not sent over and over."""

_MOST_PROCESSES = 8
_START = (
    "import pickle, sys; sys.path[:] = pickle.load(sys.stdin.buffer); "
    "from kb.store.deriving_apart import serve; serve()"
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Piece:
    """What was derived from some runs.

    Attributes:
        prepared: facts and places, in the order of the runs.
        encoded: screens of their structures, as far as they were worked out with them.
    """

    prepared: tuple[Prepared, ...]
    encoded: dict[str, Encoded | None] = field(default_factory=dict)


def cores() -> int:
    """Return how many processes may derive at once: the cores that this one may use, eight at most."""
    here = getattr(os, "sched_getaffinity", None)
    return min(len(here(0)) if here else os.cpu_count() or 1, _MOST_PROCESSES)


class Apart:
    """Some processes that derive; use it as a context manager."""

    def __init__(self, deriving: Deriving) -> None:
        self._deriving = deriving
        self._opening = _opening(deriving)
        self._own = threading.local()
        self._processes: list[subprocess.Popen[bytes]] = []
        self._closing = False
        self._pool = ThreadPoolExecutor(max(deriving.processes, 1), thread_name_prefix="deriving")

    def __enter__(self) -> Self:
        return self

    def __exit__(self, *_: object) -> None:
        self._closing = True
        for process in self._processes:
            process.kill()
        self._pool.shutdown(cancel_futures=True)
        for process in self._processes:
            process.wait()
            for pipe in (process.stdin, process.stdout):
                if pipe is not None:
                    _close(pipe)

    def derive(self, runs: Sequence[Run]) -> list[Future[Piece]]:
        """Start deriving; return the pieces to come, in the order of the runs."""
        return [self._pool.submit(self._piece, runs[at : at + PIECE]) for at in range(0, len(runs), PIECE)]

    def _piece(self, runs: Sequence[Run]) -> Piece:
        process = self._process()
        if process is not None and process.stdin is not None and process.stdout is not None:
            try:
                pickle.dump(runs, process.stdin, pickle.HIGHEST_PROTOCOL)
                process.stdin.flush()
                found = pickle.load(process.stdout)
                if isinstance(found, Piece):
                    return found
            except (OSError, EOFError, ValueError, pickle.PickleError, AttributeError, ImportError) as error:
                log.info("a deriving process was lost (%s); its runs are derived here", type(error).__name__)
                self._own.process = None
        if self._closing:
            raise Cancelled("Stopped.", "What was finished before is kept.")
        return Piece(prepared=tuple(self._deriving.prepare(run) for run in runs))

    def _process(self) -> subprocess.Popen[bytes] | None:
        """Return the process of this thread, started when it is first asked for; None where there is none."""
        if not hasattr(self._own, "process"):
            self._own.process = self._started()
        found: subprocess.Popen[bytes] | None = self._own.process
        return found

    def _started(self) -> subprocess.Popen[bytes] | None:
        if self._opening is None or not sys.executable:
            return None
        try:
            process = subprocess.Popen(
                [sys.executable, "-c", _START],
                stdin=subprocess.PIPE,
                stdout=subprocess.PIPE,
                stderr=subprocess.DEVNULL,
                start_new_session=True,
            )
            self._processes.append(process)
            if process.stdin is not None:
                process.stdin.write(self._opening)
                process.stdin.flush()
        except OSError as error:
            log.info("no deriving process could be started (%s)", type(error).__name__)
            return None
        return process


def serve() -> None:
    """Derive what comes in on stdin and send it out on stdout until stdin ends."""
    incoming, outgoing = sys.stdin.buffer, os.fdopen(os.dup(1), "wb")
    silence = os.open(os.devnull, os.O_WRONLY)
    os.dup2(silence, 1)  # whatever prints must not stand between the answers
    answer = _answering(pickle.load(incoming))
    while True:
        try:
            runs = pickle.load(incoming)
        except EOFError:
            return
        pickle.dump(answer(runs), outgoing, pickle.HIGHEST_PROTOCOL)
        outgoing.flush()


def _answering(deriving: Deriving) -> Callable[[Sequence[Run]], Piece]:
    sent: OrderedDict[str, None] = OrderedDict()

    def answer(runs: Sequence[Run]) -> Piece:
        prepared = tuple(deriving.prepare(run) for run in runs)
        encoded: dict[str, Encoded | None] = {}
        if deriving.encode is not None:
            for smiles in dict.fromkeys(s for p in prepared for _, _, s in p.places):
                if smiles not in sent:
                    encoded[smiles] = deriving.encoded(smiles)
                sent[smiles] = None
                sent.move_to_end(smiles)
        while len(sent) > REMEMBERED:
            sent.popitem(last=False)
        return Piece(prepared=prepared, encoded=encoded)

    return answer


def _opening(deriving: Deriving) -> bytes | None:
    """Return what a process is told first; None where the callables cannot be named to another process."""
    try:
        return pickle.dumps(sys.path) + pickle.dumps(deriving)
    except (pickle.PickleError, AttributeError, TypeError):
        return None


def _close(pipe: IO[Any]) -> None:
    try:
        pipe.close()
    except OSError:
        return
