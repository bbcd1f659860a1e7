"""Ctrl-C kept from RDKit while RDKit runs a search of its own, and got back where it went there all the same.

RDKit takes SIGINT for itself during some searches (substructure libraries, common substructures): it stops and hands
back what it has as if that were all, and the program never hears of it. Worse, after a search on several threads its
handler stays in place, since each thread puts back what it found (measured with 2026.9.1): from then on Ctrl-C is dead.

Inside `uninterrupted` the signal is held back in this thread and in those that it starts, and arrives when the block is
left, so calls inside must be short, a second at most. Where other threads are about (NumPy's, the terminal interface's)
it may come through them; RDKit then writes a warning, which is listened for: `was_interrupted` says that the call is to
be made again, and the signal is handed on. The program's handler is put back in every case.
"""

from __future__ import annotations

import ctypes
import logging
import signal
import threading
from types import TracebackType

from kb.logs import tame_rdkit

_getsig, _setsig = ctypes.pythonapi.PyOS_getsig, ctypes.pythonapi.PyOS_setsig
_getsig.restype = _setsig.restype = ctypes.c_void_p
_getsig.argtypes, _setsig.argtypes = [ctypes.c_int], [ctypes.c_int, ctypes.c_void_p]
# signal.signal would do, but may only be called in the main thread


class uninterrupted(logging.Handler):
    """Hold SIGINT back until the block is left.

    Attributes:
        was_interrupted: RDKit said that the signal ended a search.
    """

    _lock = threading.Lock()
    _inside = 0
    _before: int | None = None

    def __init__(self) -> None:
        super().__init__(logging.WARNING)
        self.was_interrupted = False
        self._mask: set[signal.Signals] | None = None

    def emit(self, record: logging.LogRecord) -> None:
        """Take in what RDKit says."""
        self.was_interrupted |= "was interrupted" in record.getMessage()

    def __enter__(self) -> uninterrupted:
        tame_rdkit()
        with uninterrupted._lock:
            if not uninterrupted._inside:
                uninterrupted._before = _getsig(signal.SIGINT)
            uninterrupted._inside += 1
        logging.getLogger("rdkit").addHandler(self)
        if hasattr(signal, "pthread_sigmask"):  # not on Windows
            self._mask = set(signal.pthread_sigmask(signal.SIG_BLOCK, {signal.SIGINT}))  # type: ignore[arg-type]
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        logging.getLogger("rdkit").removeHandler(self)
        with uninterrupted._lock:
            uninterrupted._inside -= 1
            _setsig(signal.SIGINT, uninterrupted._before)
        if self._mask is not None:
            signal.pthread_sigmask(signal.SIG_SETMASK, self._mask)
        if self.was_interrupted:
            signal.raise_signal(signal.SIGINT)
