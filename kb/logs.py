"""Where log lines go: nowhere until a front end says so; and RDKit brought to speak the same way.

`kb` adds no handler and never prints. The command line sends log lines to stderr with `--verbose`; the terminal
interface sends them to a file only, since anything on stderr would be scribbled over the screen. RDKit writes to stderr
on its own until it is told to use Python's logging, so whoever is about to load it calls `tame_rdkit` first.
Log lines carry counts and ids, never structures or notes.
"""

from __future__ import annotations

import logging
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from functools import cache
from pathlib import Path

FORM = "%(asctime)s %(levelname)s %(name)s: %(message)s"
OURS = ("kb", "tui", "rdkit")
LARGEST_FILE_BYTES = 1_000_000


@cache
def tame_rdkit() -> None:
    """Make RDKit speak through the logger `rdkit`, and that logger through ours; loads RDKit's smallest module."""
    from rdkit import rdBase

    rdBase.LogToPythonLogger()
    theirs = logging.getLogger("rdkit")
    for handler in [*theirs.handlers]:
        if isinstance(handler, logging.StreamHandler) and not hasattr(handler, "baseFilename"):
            theirs.removeHandler(handler)  # RDKit adds one to stderr when it is imported
    if not theirs.handlers:
        theirs.addHandler(logging.NullHandler())


@contextmanager
def log_to_stderr(level: int = logging.INFO) -> Iterator[None]:
    """Send log lines to stderr while the context lasts; for the command line with `--verbose`."""
    with _handling(logging.StreamHandler(sys.stderr), level):
        yield


@contextmanager
def log_to_file(path: Path, level: int = logging.INFO) -> Iterator[None]:
    """Send log lines to a file while the context lasts; for the terminal interface. Two files of 1 MB are kept."""
    from logging.handlers import RotatingFileHandler  # brings sockets along, which the command line has no use for

    path.parent.mkdir(parents=True, exist_ok=True)
    with _handling(RotatingFileHandler(path, maxBytes=LARGEST_FILE_BYTES, backupCount=1, encoding="utf-8"), level):
        yield


@contextmanager
def _handling(handler: logging.Handler, level: int) -> Iterator[None]:
    handler.setFormatter(logging.Formatter(FORM))
    loggers = [logging.getLogger(name) for name in OURS]
    before = [logger.level for logger in loggers]
    for logger in loggers:
        logger.addHandler(handler)
        logger.setLevel(level)
    try:
        yield
    finally:
        for logger, was in zip(loggers, before, strict=True):
            logger.removeHandler(handler)
            logger.setLevel(was)
        handler.close()
