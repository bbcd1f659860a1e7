"""The back room: a second process in which the slow work on a book is done, so that typing never waits for it.

Python runs one thread at a time; a check on a hundred thousand runs, or RDKit being loaded, would hold up the keys
however short the turns are. So the screens' process only shows, and this is its end of the line to the other
one (`backroom_worker.py`), which is started once per book and opens it for reading only.

Requests have a lane; those of one lane are answered one after the other, lanes go side by side. A request that is
cancelled is told to stop; if the job does not listen within `GRACE_S`, its answer is dropped. A room that dies (out
of memory, killed) answers whatever waits with a sentence, and is started anew at the next question.

On the wire: a header (what, number, length) and a pickle. Both ends are this program, run by the same user.
"""

from __future__ import annotations

import contextlib
import logging
import os
import pickle
import queue
import struct
import subprocess
import sys
import threading
import time
from pathlib import Path
from typing import IO, Any

from kb.errors import Cancelled, SidepathError
from tui.jobs import current_progress

log = logging.getLogger(__name__)

HEADER = struct.Struct("<BQQ")
HELLO, ASK, CANCEL, VALUE, ERROR, PROGRESS, FAULT, GONE = range(8)
"""What a message is; GONE never travels, it stands for a line that was cut."""

GRACE_S = 1.0
"""How long a cancelled job may take to listen before its answer is dropped [s]."""

LOOK_S = 0.05
"""How often a waiting request looks whether it was cancelled [s]."""

TRIES = 3
"""How often in a row a room may die before it has answered anything; then there is none."""

START = "from tui.backroom_worker import main; main()"


class NoBackRoom(RuntimeError):
    """The second process cannot be had here; the work must be done in this one."""


class BackRoomFault(RuntimeError):
    """Something unforeseen in the back room; holds its traceback, for the log."""


def packed(value: Any) -> bytes:
    """Return a value as it travels."""
    return pickle.dumps(value, pickle.HIGHEST_PROTOCOL)


def send(line: IO[bytes], lock: threading.Lock, what: int, number: int, body: bytes) -> None:
    """Write one message."""
    with lock:
        line.write(HEADER.pack(what, number, len(body)))
        line.write(body)
        line.flush()


def receive(line: IO[bytes]) -> tuple[int, int, bytes] | None:
    """Read one message, its pickle still packed; None when the line was cut."""
    head = line.read(HEADER.size)
    if len(head) < HEADER.size:
        return None
    what, number, length = HEADER.unpack(head)
    body = line.read(length)
    return None if len(body) < length else (what, number, body)


class _Process:
    """One process and the thread that sorts its answers."""

    def __init__(self, place: str | None) -> None:
        if not sys.executable:
            raise NoBackRoom("no interpreter to start")
        paths = [path or str(Path.cwd()) for path in sys.path]
        environment = {**os.environ, "PYTHONPATH": os.pathsep.join(paths), "PYTHONSAFEPATH": "1"}
        try:
            self._process = subprocess.Popen(
                [sys.executable, "-c", START],
                stdin=subprocess.PIPE,
                stdout=subprocess.PIPE,
                stderr=subprocess.DEVNULL,
                env=environment,
            )
        except OSError as error:
            raise NoBackRoom(str(error)) from error
        assert self._process.stdin is not None
        assert self._process.stdout is not None
        self._out, self._in = self._process.stdin, self._process.stdout
        self._lock = threading.Lock()
        self._waiting: dict[int, queue.SimpleQueue[tuple[int, bytes]]] = {}
        self.is_alive = True
        self.has_answered = False
        self.tell(HELLO, 0, place)
        threading.Thread(target=self._sort, name="back room", daemon=True).start()

    @property
    def pid(self) -> int:
        return self._process.pid

    def expect(self, number: int) -> queue.SimpleQueue[tuple[int, bytes]]:
        """Return where the answers to a request will arrive."""
        box: queue.SimpleQueue[tuple[int, bytes]] = queue.SimpleQueue()
        self._waiting[number] = box
        if not self.is_alive:
            box.put((GONE, b""))
        return box

    def drop(self, number: int) -> None:
        self._waiting.pop(number, None)

    def tell(self, what: int, number: int, value: Any = None) -> None:
        """Send a message; a line that was cut is noticed by whoever waits for the answer."""
        try:
            send(self._out, self._lock, what, number, packed(value))
        except (OSError, ValueError):  # a closed line is a ValueError
            self.is_alive = False

    def _sort(self) -> None:
        try:
            while (message := receive(self._in)) is not None:
                what, number, body = message
                if what == FAULT and number == 0:
                    log.error("the back room could not work: %s", pickle.loads(body))
                    continue
                self.has_answered = True
                if (box := self._waiting.get(number)) is not None:
                    box.put((what, body))
        except (OSError, ValueError):
            pass
        self.is_alive = False
        for box in [*self._waiting.values()]:
            box.put((GONE, b""))

    def end(self) -> None:
        """Cut the line, which ends the process; one that does not listen is killed."""
        self.is_alive = False
        for box in [*self._waiting.values()]:
            box.put((GONE, b""))
        with contextlib.suppress(OSError):
            self._out.close()
        threading.Thread(target=self._bury, name="back room ends", daemon=True).start()

    def _bury(self) -> None:
        try:
            self._process.wait(2.0)
        except subprocess.TimeoutExpired:
            self._process.kill()
            self._process.wait()


class BackRoom:
    """Answers questions about one book in another process; any thread may ask.

    Args:
        place: path or URL of the book; None = the default one.
    """

    def __init__(self, place: str | None) -> None:
        self._place = place
        self._lock = threading.Lock()
        self._number = 0
        self._deaths = 0
        self._is_closed = False
        self._process: _Process | None = _Process(place)

    @property
    def pid(self) -> int | None:
        """Return the process, None while there is none."""
        process = self._process
        return process.pid if process is not None and process.is_alive else None

    def ask(self, lane: str, method: str, *args: Any, **options: Any) -> Any:
        """Have a method of the desk in the back room called, and return what it returned.

        Progress goes to, and the wish to stop comes from, the job of the calling thread (`tui.jobs`).

        Raises:
            SidepathError: as the method raised it; also when the room died meanwhile.
            Cancelled: the job was stopped.
            BackRoomFault: something unforeseen there.
            NoBackRoom: there is no second process to be had.
        """
        progress = current_progress()
        if progress.cancelled():
            raise Cancelled("Stopped.", "Ask again to go on.")
        process, number = self._take_number()
        box = process.expect(number)
        process.tell(ASK, number, (lane, method, args, options))
        stopped_at: float | None = None
        try:
            while True:
                if stopped_at is None and progress.cancelled():
                    stopped_at = time.monotonic()
                    process.tell(CANCEL, number)
                try:
                    what, body = box.get(timeout=LOOK_S)
                except queue.Empty:
                    if not process.is_alive:
                        what, body = GONE, b""
                    elif stopped_at is not None and time.monotonic() - stopped_at > GRACE_S:
                        raise Cancelled("Stopped.", "Ask again to go on.") from None
                    else:
                        continue
                if what == VALUE:
                    return pickle.loads(body)
                if what == ERROR:
                    raise pickle.loads(body)
                if what == FAULT:
                    raise BackRoomFault(pickle.loads(body))
                if what == GONE:
                    raise SidepathError(
                        "The part of the program that reads the book was stopped from outside.",
                        "Ask again: it starts anew. Nothing that was recorded is lost.",
                    )
                done, total, note = pickle.loads(body)
                progress.advance(done, total, note)
        finally:
            process.drop(number)

    def _take_number(self) -> tuple[_Process, int]:
        with self._lock:
            if self._is_closed:
                raise Cancelled("The book was closed.")
            if self._process is not None and not self._process.is_alive:
                self._deaths = 0 if self._process.has_answered else self._deaths + 1
                self._process = _Process(self._place) if self._deaths < TRIES else None
            if self._process is None:
                raise NoBackRoom("it died before it answered")
            self._number += 1
            return self._process, self._number

    def close(self) -> None:
        """End the process; whoever still waits is told that it is gone."""
        with self._lock:
            self._is_closed = True
            if self._process is not None:
                self._process.end()
