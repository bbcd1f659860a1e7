"""What runs in the back room: a desk on the same book, opened for reading, answering what comes down the line.

Each lane has a thread, so that a drawing does not wait for a check. It writes nothing but answers: standard output
is the line itself, so what libraries print goes nowhere. It ends when the line is cut, however the other end ended,
and takes a lower priority than the screens, whose keys come first.
"""

from __future__ import annotations

import contextlib
import os
import pickle
import queue
import sys
import threading
import traceback
from typing import IO, Any

from kb.errors import Cancelled, SidepathError
from tui.backroom import ASK, CANCEL, ERROR, FAULT, HELLO, PROGRESS, VALUE, packed, receive, send
from tui.jobs import ThreadProgress, working_for

NICENESS = 5
"""How far the screens' process goes before this one when both want the same core."""

SWITCH_S = 0.002
"""How long one lane may hold the interpreter while another waits [s]; a drawing waits for a check at most so long."""

DESK_METHODS = frozenset(
    {
        "check",
        "find",
        "imagine_route",
        "lookup",
        "open_route",
        "page",
        "read_scheme",
        "remarks",
        "resolve_component",
        "resolve_solvent",
        "scheme_text",
        "what_if",
    }
)
"""What may be asked for."""


class _Job:
    """One request in work or waiting."""

    def __init__(self, number: int, method: str, args: tuple[Any, ...], options: dict[str, Any], room: Room) -> None:
        self.number = number
        self.method = method
        self.args = args
        self.options = options
        self.progress = ThreadProgress(lambda *told: room.tell(PROGRESS, number, packed(told)))


class Room:
    """The desk, the lanes, and the line back.

    Args:
        place: of the book; None = the default one.
        out: the line.
    """

    def __init__(self, place: str | None, out: IO[bytes]) -> None:
        self._place = place
        self._out = out
        self._lock = threading.Lock()
        self._opening = threading.Lock()
        self._desk: Any = None
        self._lanes: dict[str, queue.SimpleQueue[_Job]] = {}
        self._jobs: dict[int, _Job] = {}

    def tell(self, what: int, number: int, body: bytes) -> None:
        """Send an answer; when nobody is there any more, there is nothing left to do."""
        try:
            send(self._out, self._lock, what, number, body)
        except OSError:
            os._exit(0)

    def take(self, number: int, lane: str, method: str, args: tuple[Any, ...], options: dict[str, Any]) -> None:
        """Put a request into its lane."""
        job = _Job(number, method, args, options, self)
        self._jobs[number] = job
        if lane not in self._lanes:
            self._lanes[lane] = queue.SimpleQueue()
            threading.Thread(target=self._serve, args=(self._lanes[lane],), name=lane, daemon=True).start()
        self._lanes[lane].put(job)

    def cancel(self, number: int) -> None:
        """Tell a job to stop; one that is done by now needs no telling."""
        if (job := self._jobs.get(number)) is not None:
            job.progress.cancel()

    def _serve(self, lane: queue.SimpleQueue[_Job]) -> None:
        while True:
            job = lane.get()
            try:
                if job.progress.cancelled():
                    raise Cancelled("Stopped.", "Ask again to go on.")
                with working_for(job.progress):
                    value = self._call(job)
                self._answer(VALUE, job, value)
            except SidepathError as error:
                self._answer(ERROR, job, error)
            except BaseException:  # noqa: BLE001 - whatever it is, the lane must live and the screens must hear of it
                self._answer(FAULT, job, traceback.format_exc())
            self._jobs.pop(job.number, None)

    def _call(self, job: _Job) -> Any:
        if job.method == "scheme_drawing":
            from tui.drawings import scheme_drawing

            return scheme_drawing(*job.args)
        if job.method not in DESK_METHODS:
            raise ValueError(f"{job.method} is not done here")
        return getattr(self.desk, job.method)(*job.args, **job.options)

    def _answer(self, what: int, job: _Job, value: Any) -> None:
        try:
            body = packed(value)
        except Exception as error:  # noqa: BLE001 - pickling calls whatever the value brings along
            what, body = FAULT, packed(f"{job.method} gave what cannot be sent: {error!r}")
        self.tell(what, job.number, body)

    @property
    def desk(self) -> Any:
        """Return the desk, opened when first needed."""
        with self._opening:
            if self._desk is None:
                from tui.desk import Desk

                self._desk = Desk(self._place, read_only=True)
            return self._desk


def main() -> None:
    """Answer until the line is cut."""
    line_in = os.fdopen(os.dup(0), "rb")
    line_out = os.fdopen(os.dup(1), "wb")
    nowhere = os.open(os.devnull, os.O_RDWR)
    for number in (0, 1, 2):
        os.dup2(nowhere, number)
    with contextlib.suppress(AttributeError, OSError):
        os.nice(NICENESS)
    sys.setswitchinterval(SWITCH_S)
    try:
        hello = receive(line_in)
        if hello is None or hello[0] != HELLO:
            return
        from tui.desk import load_chemistry

        room = Room(pickle.loads(hello[2]), line_out)
        load_chemistry()
    except BaseException:
        send(line_out, threading.Lock(), FAULT, 0, packed(traceback.format_exc()))
        raise
    while (message := receive(line_in)) is not None:
        what, number, body = message
        if what == ASK:
            room.take(number, *pickle.loads(body))
        elif what == CANCEL:
            room.cancel(number)
    os._exit(0)  # threads may be deep in a search; nothing here needs an orderly end
